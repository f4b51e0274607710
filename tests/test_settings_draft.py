"""``settings`` drafts a file from what a review could not know, and the draft declares nothing by itself."""

from __future__ import annotations

import re
from dataclasses import replace

from levelcrossing.model import (
    Basis,
    Board,
    Coverage,
    Crossing,
    Level,
    NotJudged,
    Outcome,
    Part,
    Pin,
    PinModel,
    Rails,
    Receive,
    Review,
    ReviewedCrossing,
    Settings,
    SolvedCrossing,
    Spread,
)
from levelcrossing.settings import parse_settings
from levelcrossing.settings_draft import draft

RECEIVE = Receive(
    vih=Level(text="V", pieces=()),
    vil=Level(text="V", pieces=()),
    vmax=Level(text="V", pieces=()),
    vmin=Level(text="V", pieces=()),
    vmax_off=None,
    clamp_high=True,
    clamp_low=True,
    injection_amps=None,
    capacitance_farads=Spread.exactly(1e-11),
    leakage_amps=0.0,
    off_tolerant=False,
    basis=Basis.ASSUMED,
    source="",
)


def _pin(part: str, number: str, name: str, **more: object) -> PinModel:
    return replace(PinModel(part=part, number=number, name=name, net=f"/{name}", role="signal"), **more)  # type: ignore[arg-type]


def _review(
    unknown: tuple[tuple[str, str], ...], not_judged: tuple[NotJudged, ...], *pairs: tuple[PinModel, PinModel]
) -> Review:
    parts = tuple(
        Part(
            reference=name,
            value=f"value of {name}",
            library="Connector" if name[0] == "J" else "",
            pins=tuple(Pin(part=name, number=str(number), name="", kind="passive", net="") for number in range(1, 9)),
        )
        for name in ("J2", "J10", "U3", "U4")
    )
    return Review(
        board=Board(path="gauge.net", form="netlist", parts=parts, nets=()),
        rails=Rails(by_net={}, unknown=unknown),
        crossings=tuple(
            ReviewedCrossing(
                solved=SolvedCrossing(
                    crossing=Crossing(driver=driver, driver_rail="A", receiver=receiver, receiver_rail="B"), states={}
                ),
                verdict=Outcome.UNKNOWN,
                condition="",
            )
            for driver, receiver in pairs
        ),
        findings=(),
        coverage=Coverage(signal_pins=9, judged=1, not_judged=not_judged),
    )


REVIEW = _review(
    (("VMOT", "the voltage of what is plugged into J1"),),
    (
        NotJudged(part="J10", pin="3", why="unknown", name="TX", net="/TX"),
        NotJudged(part="U4", pin="7", why="no supply"),
    ),
    (
        _pin("J2", "1", "RX", role="far-end", inferred_far_end=True, why="J2 carries +5V"),
        _pin("U3", "2", "IN", receive=RECEIVE),
    ),
    (_pin("U4", "1", "OUT", receive=replace(RECEIVE, basis=Basis.LIBRARY)), _pin("U3", "5", "EN", receive=RECEIVE)),
)


def test_the_draft_names_what_the_review_could_not_know() -> None:
    text = draft(REVIEW)
    assert '# "VMOT" = "?"' in text
    assert "the voltage of what is plugged into J1" in text
    assert re.search(r'# "J2" = \{rail = "\?"\} +# value of J2: pin 1 \(/RX\) inferred: J2 carries \+5V', text)
    assert re.search(r'# "J10" = \{rail = "\?"\} +# value of J10: pin 3 \(TX\)', text)
    assert re.search(r'# "U3" = \{tolerates = \?, vih = \?, vil = \?\} +# value of U3: pin 2 \(IN\), 5 \(EN\)', text)
    assert re.search(r'# "U4" = .*: pin 7 not judged: no supply', text), "a known pin of U4 is not asked for"
    assert "1 (OUT)" not in text
    assert text.index('"J2"') < text.index('"J10"'), "in the board's order"


def test_the_draft_declares_nothing_until_it_is_filled_in() -> None:
    assert parse_settings(draft(REVIEW)) == Settings(file="levelcrossing.toml")


def test_a_filled_in_draft_is_valid() -> None:
    """Taking the # away and writing figures for the question marks is all there is to do."""
    lines = []
    for line in draft(REVIEW).splitlines():
        entry = re.match(r"# (\"[^\"]+\" = .*|\w+ = \".*)", line)
        lines.append(
            (entry[1] if entry else line)
            .replace('"?"', '"5"')
            .replace("vih = ?", "vih = 2")
            .replace("vil = ?", "vil = 1")
            .replace("?", "5")
        )
    settings = parse_settings("\n".join(lines))
    assert settings.rails["VMOT"].nominal == 5
    assert set(settings.far_ends) == {"J2", "J10"}
    assert set(settings.pins) == {"U3", "U4"}
    assert settings.stop_at is Outcome.MALFUNCTION
    assert settings.rates == (("/SPI_*", 8e6),)


def test_a_review_that_knew_everything_says_so() -> None:
    text = draft(_review((), ()))
    assert "Every supply found has a voltage." in text
    assert "No connector carries a signal whose other side is not known." in text
    assert "Every part that takes part in a crossing is known." in text
    assert "?" not in text


def test_hostile_names_stay_on_their_line() -> None:
    nasty = 'V"\n[[waivers]]\nrule = "too-slow"\x1b[31m\u202e'
    text = draft(_review(((nasty, nasty),), (NotJudged(part="J2", pin="1\n", why=nasty, name=nasty, net=nasty),)))
    assert parse_settings(text) == Settings(file="levelcrossing.toml")
    assert all(line.isprintable() for line in text.split("\n"))
