"""The report for people: order, completeness, and a ladder that shows the truth on one scale."""

from __future__ import annotations

from dataclasses import replace

import pytest
from sample_review import FIVE, LOW, THREE, margin, sample_review, state

from levelcrossing.model import Outcome, SolvedCrossing, Spread
from levelcrossing.reports.ladder import Ladder, ladder
from levelcrossing.reports.sheet import Sheet, cells, wrap
from levelcrossing.reports.terminal import UNICODE, draw_ladder, plain_report


def report(everything: bool = False, width: int = 100) -> str:
    return plain_report([sample_review()], width=width, everything=everything)


def test_counts_come_first_and_the_worst_first() -> None:
    lines = report().splitlines()
    assert lines[0] == "gauge/gauge.net"
    assert lines[1] == "  1 damage   1 malfunction   1 marginal   1 unknown"
    order = [report().index(f"── {outcome.value} ") for outcome in Outcome]
    assert order == sorted(order)


def test_a_finding_says_everything() -> None:
    text = report()
    first = text[text.index("  1  damage") : text.index("── malfunction")]
    for words in (
        "U2.7 (RX) on net /ECHO",
        "input-overvoltage",
        "gauge/echo.kicad_sch:212",
        "bears at most 3.44 V",
        "only if   U1.5 is configured as an output",
        "remedy    Put 2 k in series and 3 k to ground: 3.0 V.",
        "also at   U2 pins 9, 10",
        "weakest figure: assumed",
        "+5V at 4.75 to 5.25 V (traced), +3V3 at 3.13 to 3.46 V (traced)",
        "U1 drives as 74HC family, JEDEC JESD7A",
        "U2 reads as an ordinary CMOS input",
        "1.81 V above what the receiver bears (+5V at 5.25 V)",
    ):
        assert words in first, words
    # The source that the driver's line quotes already is not repeated.
    assert first.count("JEDEC JESD7A") == 1


def test_the_rest_is_said_too() -> None:
    text = report()
    for words in (
        'VMOT  [rails] "VMOT" = "24"',
        '"VMOT" = "?"',
        "17 of 20 signal pins judged",
        "2  the level on the other side is not known: J1 pins 1, 2",
        "accepted by waiver",
        "because: a bench set-up only",
        "resistors ±1 %",
        "BT1: batteries",
        "a part without a symbol was left out",
        "waivers: 2 matches nothing",
        "not a safety approval",
    ):
        assert words in text, words


def test_sound_crossings_are_counted_or_shown() -> None:
    assert "1 crossing at every corner; --all shows them" in report()
    assert "U2.7 (RX) on +3V3 to U1.5 (TX) on +5V" not in report()
    text = report(everything=True)
    assert "U2.7 (RX) on +3V3 to U1.5 (TX) on +5V through R1 (series resistor)" in text
    assert "high 3.13 to 3.46 V (VIH 2), low 0 to 0.05 V (VIL 0.8), at most 5.25 V" in text


def test_a_ladder_is_drawn_once_per_crossing() -> None:
    review = sample_review()
    again = replace(review.findings[0], rule="clamp-current")
    text = plain_report([replace(review, findings=(review.findings[0], again))])
    assert text.count("sent     U1.5") == 1
    assert "ladder    drawn at finding 1" in text


def test_several_boards_are_counted_together_first() -> None:
    text = plain_report([sample_review(), sample_review()])
    assert text.startswith("2 boards: 2 damage, 2 malfunction, 2 marginal, 2 unknown\n")


def test_nothing_found_is_said() -> None:
    review = sample_review()
    text = plain_report([replace(review, findings=(), crossings=review.crossings[2:3])])
    assert "nothing found" in text


# ------------------------------------------------------------------------------------------------------------- ladder


def wire() -> SolvedCrossing:
    return sample_review().crossings[0].solved


def drawn(solved: SolvedCrossing, width: int = 100) -> list[str]:
    drawing = ladder(solved)
    assert drawing is not None
    sheet = Sheet(width=width)
    draw_ladder(sheet, drawing, UNICODE)
    return sheet.plain().splitlines()


@pytest.mark.parametrize("width", [80, 100, 140])
def test_levels_and_limits_stand_on_one_scale(width: int) -> None:
    """The column of each bar and edge, read back through the scale's own marks, is its voltage."""
    scale, axis, sent, arrives, takes = drawn(wire(), width)[:5]
    ticks = [at for at, character in enumerate(axis) if character == "┴"]
    names = [float(word) for word in scale.replace("V", "").split()]
    assert len(ticks) == len(names)
    per_volt = (ticks[-1] - ticks[0]) / (names[-1] - names[0])

    def volts(at: int) -> float:
        return names[0] + (at - ticks[0]) / per_volt

    half = 0.51 / per_volt
    for row in (sent, arrives):
        blocks = [at for at, character in enumerate(row) if character == "█"]
        high = [at for at in blocks if volts(at) > 2]
        assert volts(high[0]) == pytest.approx(4.75, abs=half)
        assert volts(high[-1]) == pytest.approx(5.25, abs=half)
        assert volts(blocks[0]) == pytest.approx(0.0, abs=half)
    edges = [volts(at) for at, character in enumerate(takes) if character == "│"]
    assert edges == pytest.approx([3.135 * 0.3, 3.465 * 0.7, 3.435], abs=half)


def test_zones_cover_the_scale_without_gaps() -> None:
    drawing = ladder(wire())
    assert isinstance(drawing, Ladder)
    ends = [drawing.bottom, *(zone.high for zone in drawing.zones)]
    assert [zone.low for zone in drawing.zones] == ends[:-1]
    assert ends[-1] == drawing.top
    assert [zone.kind for zone in drawing.zones] == ["low", "between", "high", "over"]


def test_no_ladder_without_a_solution_or_limits() -> None:
    assert ladder(sample_review().crossings[3].solved) is None
    assert ladder(replace(wire(), vih=None, vil=None, vmax=None)) is None


def test_a_limit_that_moves_with_the_level_is_no_trouble() -> None:
    """Bars may overlap the limit's worst corner while no single corner exceeds it: the margins decide what is said."""
    solved = replace(
        wire(),
        states={
            "high": state("high", FIVE, rating_margin=margin(0.3), high_margin=margin(1.0)),
            "low": state("low", LOW),
        },
        vmax=FIVE.shifted(0.3),
    )
    drawing = ladder(solved)
    assert drawing is not None and drawing.notes == ()


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"rating_margin": margin(-0.5)}, "0.5 V above what the receiver bears"),
        ({"rating_margin": margin(0.1)}, "only 0.1 V below what the receiver bears"),
        ({"high_margin": margin(-0.4)}, "0.4 V short of a guaranteed high"),
        ({"high_margin": margin(0.05, "R1 +1 %")}, "only 0.05 V above VIH (R1 +1 %)"),
        ({"low_margin": margin(-0.2)}, "0.2 V above a guaranteed low"),
        ({"low_rating_margin": margin(-3.0)}, "3 V below what the receiver bears"),
    ],
)
def test_notes_name_the_margin(given: dict[str, object], words: str) -> None:
    drawing = ladder(replace(wire(), states={"high": state("high", THREE, **given)}))  # type: ignore[arg-type]
    assert drawing is not None
    assert drawing.notes == (f"driver high: {words}",)


def test_negative_levels_extend_the_scale() -> None:
    below = Spread(low=-3.2, nominal=-3.0, high=-2.8)
    drawing = ladder(replace(wire(), states={"low": state("low", below)}))
    assert drawing is not None and drawing.bottom <= -3.2


# -------------------------------------------------------------------------------------------------------------- sheet


@pytest.mark.parametrize(
    ("text", "lines"),
    [
        ("", [""]),
        ("one two", ["one two"]),
        ("one two three", ["one two", "three"]),
        ("abcdefghijklmno", ["abcdefgh", "ijklmno"]),
        ("a abcdefghijklmno b", ["a", "abcdefgh", "ijklmno", "b"]),
        ("日本語日本語", ["日本語日", "本語"]),
    ],
)
def test_wrapping(text: str, lines: list[str]) -> None:
    assert wrap(text, 8, 8) == lines
    assert all(cells(line) <= 8 for line in wrap(text, 8, 8))
