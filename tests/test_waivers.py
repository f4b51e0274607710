"""A waiver stands for one circuit: renumbering keeps it, a change of the circuit ends it, and nothing goes unsaid."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import pytest

from levelcrossing.model import (
    Basis,
    Board,
    Coverage,
    Crossing,
    Element,
    Finding,
    Net,
    Outcome,
    Part,
    Pin,
    PinModel,
    Rail,
    Rails,
    Review,
    ReviewedCrossing,
    Settings,
    SolvedCrossing,
    Spread,
    Waiver,
)
from levelcrossing.waivers import apply_waivers, fingerprint, fingerprinted

TODAY = "2026-06-15"

# A tide gauge: the 5 V sounder U1 sends to the 3.3 V logger U2 through R1, with R2 to ground; R3 has no part in it.
PARTS = {
    "U1": ("SOUNDER-5", {"1": "+5V", "2": "/ECHO", "3": "GND"}),
    "U2": ("LOGGER-3", {"1": "+3V3", "2": "Net-(R1-Pad2)", "3": "GND", "4": "/LED"}),
    "R1": ("10k", {"1": "/ECHO", "2": "Net-(R1-Pad2)"}),
    "R2": ("20k", {"1": "Net-(R1-Pad2)", "2": "GND"}),
    "R3": ("1M", {"1": "/LED", "2": "+3V3"}),
}
VOLTS = {"+5V": 5.0, "+3V3": 3.3, "GND": 0.0}
Parts = dict[str, tuple[str, dict[str, str]]]


def _review(parts: Parts, volts: dict[str, float], names: Callable[[str], str] = lambda name: name) -> Review:
    """Return a review with one finding: U2.2 receives what U1.2 sends, wherever these are called now."""
    board_parts = tuple(
        Part(
            reference=names(reference),
            value=value,
            pins=tuple(
                Pin(part=names(reference), number=number, name="", kind="", net=net) for number, net in pins.items()
            ),
        )
        for reference, (value, pins) in sorted(parts.items(), key=lambda item: names(item[0]))
    )
    nets: dict[str, list[tuple[str, str]]] = {}
    for part in board_parts:
        for pin in part.pins:
            nets.setdefault(pin.net, []).append((part.reference, pin.number))
    board = Board(
        path="gauge.net",
        form="netlist",
        parts=board_parts,
        nets=tuple(Net(name=name, pins=tuple(sorted(pins))) for name, pins in sorted(nets.items())),
    )
    rails = Rails(
        by_net={
            net: Rail(
                net=net,
                volts=Spread.around(value, 0.05),
                basis=Basis.TRACED,
                evidence=(),
                domain=net,
                ground=value == 0,
            )
            for net, value in volts.items()
        }
    )

    def end(reference: str, number: str) -> PinModel:
        return PinModel(part=names(reference), number=number, name="", net=parts[reference][1][number], role="signal")

    link = tuple(names(reference) for reference in ("R1",) if reference in parts)
    solved = SolvedCrossing(
        crossing=Crossing(
            driver=end("U1", "2"),
            driver_rail=parts["U1"][1]["1"],
            receiver=end("U2", "2"),
            receiver_rail=parts["U2"][1]["1"],
            link=link,
        ),
        states={},
        elements=tuple(
            Element(kind="resistor", part=names(reference), nets=tuple(pins.values()))
            for reference, (_, pins) in parts.items()
            if reference.startswith("R")
        ),
    )
    finding = Finding(
        rule="input-overvoltage",
        outcome=Outcome.DAMAGE,
        text="",
        part=names("U2"),
        pin="2",
        net=parts["U2"][1]["2"],
        crossing=0,
    )
    review = Review(
        board=board,
        rails=rails,
        crossings=(ReviewedCrossing(solved=solved, verdict=Outcome.DAMAGE, condition="", findings=(0,)),),
        findings=(finding,),
        coverage=Coverage(signal_pins=2, judged=2),
    )
    return replace(review, findings=fingerprinted(review.findings, review))


def _print(parts: Parts, volts: dict[str, float] = VOLTS, names: Callable[[str], str] = lambda name: name) -> str:
    return _review(parts, volts, names).findings[0].fingerprint


def _renamed(nets: dict[str, str]) -> Parts:
    return {
        reference: (value, {number: nets.get(net, net) for number, net in pins.items()})
        for reference, (value, pins) in PARTS.items()
    }


def _with(reference: str, value: str | None = None, **pins: str) -> Parts:
    old_value, old_pins = PARTS.get(reference, ("", {}))
    return PARTS | {reference: (value or old_value, old_pins | {name.strip("_"): net for name, net in pins.items()})}


def test_a_fingerprint_survives_renumbering() -> None:
    before = _print(PARTS)
    assert before.startswith("1:")
    assert _print(_renamed({"/ECHO": "/SOUND", "Net-(R1-Pad2)": "Net-(U2-Pad2)"})) == before
    renumbered = {"U1": "U12", "U2": "U1", "R1": "R7", "R2": "R1", "R3": "R2"}
    assert _print(PARTS, names=renumbered.__getitem__) == before
    assert _print(_renamed({"+3V3": "VDD"}), {"+5V": 5.0, "VDD": 3.3, "GND": 0.0}) == before, (
        "a rail under another name"
    )
    assert _print(_with("R1", _2="/ECHO", _1="Net-(R1-Pad2)")) == before, "a resistor has no direction"
    assert _print(_with("R1", "10 kOhm")) == before, "the same value in another spelling"
    assert _print(_with("R3", "470k")) == before, "another circuit of the board"


@pytest.mark.parametrize(
    ("what", "parts", "volts"),
    [
        ("a resistor of another value", _with("R1", "12k"), VOLTS),
        ("another receiver", _with("U2", "LOGGER-5"), VOLTS),
        ("another driver", _with("U1", "SOUNDER-3"), VOLTS),
        ("another rail for the driver", PARTS, VOLTS | {"+5V": 9.0}),
        ("the receiver on another rail", _with("U2", _1="+5V"), VOLTS),
        ("a part removed", {name: part for name, part in PARTS.items() if name != "R2"}, VOLTS),
        ("a part added", PARTS | {"R9": ("1k", {"1": "Net-(R1-Pad2)", "2": "+3V3"})}, VOLTS),
        ("a resistor to another rail", _with("R2", _2="+3V3"), VOLTS),
        ("another pin of the receiver", _with("U2", _5="Net-(R1-Pad2)"), VOLTS),
    ],
)
def test_a_fingerprint_ends_with_the_circuit(what: str, parts: Parts, volts: dict[str, float]) -> None:
    assert _print(parts, volts) != _print(PARTS), what


def test_a_transistor_turned_round_is_another_circuit() -> None:
    one = _with("Q1", "BSS138", _1="+3V3", _2="Net-(R1-Pad2)", _3="/ECHO")
    other = _with("Q1", "BSS138", _1="+3V3", _2="/ECHO", _3="Net-(R1-Pad2)")
    assert _print(one) != _print(other)


def test_a_fingerprint_tells_rules_apart_and_needs_no_crossing() -> None:
    review = _review(PARTS, VOLTS)
    finding = review.findings[0]
    assert fingerprint(replace(finding, rule="clamp-current"), review) != finding.fingerprint
    on_rail = Finding(rule="rail-unknown", outcome=Outcome.UNKNOWN, text="", net="+5V")
    assert fingerprint(on_rail, review) != fingerprint(replace(on_rail, net="+3V3"), review)
    part = Finding(rule="supply-range", outcome=Outcome.DAMAGE, text="", part="U1")
    assert fingerprint(part, review) != fingerprint(replace(part, part="U2"), review)
    gone = Finding(rule="supply-range", outcome=Outcome.DAMAGE, text="", part="U99", pin="1", crossing=7)
    assert fingerprint(gone, review).startswith("1:"), "a place that is not on the board is no reason to fail"


# ------------------------------------------------------------------------------------------------------------ applying


def _finding(part: str, pin: str, mark: str, rule: str = "too-slow", net: str = "/SDA") -> Finding:
    return Finding(rule=rule, outcome=Outcome.MALFUNCTION, text="", part=part, pin=pin, net=net, fingerprint=mark)


def _settings(*waivers: Waiver) -> Settings:
    return Settings(file="levelcrossing.toml", waivers=waivers)


FINDINGS = (_finding("U1", "3", "1:aa"), _finding("U1", "4", "1:bb"), _finding("U2", "3", "1:cc", rule="clamp-current"))


@pytest.mark.parametrize(
    ("at", "accepted"),
    [("U1.3", [0]), ("U1", [0, 1]), ("/SDA", [0, 1]), ("U1.33", None), ("U", None), ("U1.", None), ("*", None)],
)
def test_a_place_is_a_pin_a_part_or_a_net(at: str, accepted: list[int] | None) -> None:
    findings, remarks = apply_waivers(FINDINGS, _settings(Waiver(rule="too-slow", at=at, reason="why", line=4)), TODAY)
    assert [index for index, finding in enumerate(findings) if finding.waived == "why"] == (accepted or [])
    assert len(remarks) == (accepted is None)
    if remarks:
        assert remarks[0].startswith("waiver of too-slow at ")
        assert "(levelcrossing.toml:4): matches no finding" in remarks[0]


@pytest.mark.parametrize(
    ("until", "holds"), [("2026-06-15", True), ("2026-06-14", False), ("2027-01-01", True), ("", True)]
)
def test_the_last_day_counts(until: str, holds: bool) -> None:
    findings, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="U1.3", reason="why", until=until)), TODAY
    )
    assert (findings[0].waived == "why") is holds
    assert bool(remarks) is not holds
    if remarks:
        assert "expired after 2026-06-14, its finding counts again" in remarks[0]


def test_an_expired_waiver_of_nothing_may_go() -> None:
    _, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="U9", reason="x", until="2020-01-01")), TODAY
    )
    assert "remove it" in remarks[0]


def test_without_a_date_the_last_day_is_said_to_be_unchecked() -> None:
    waiver = Waiver(rule="too-slow", at="U1.3", reason="why", until="2020-01-01")
    findings, remarks = apply_waivers(FINDINGS, _settings(waiver), "")
    assert findings[0].waived == "why"
    assert "could not be checked" in remarks[0]
    dated = replace(_settings(waiver), today=TODAY)
    assert apply_waivers(FINDINGS, dated)[0][0].waived is None, "the day of the settings is used"


def test_a_fingerprint_narrows_a_waiver() -> None:
    kept, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="U1", reason="w", fingerprint="1:bb")), TODAY
    )
    assert [finding.waived for finding in kept] == [None, "w", None]
    assert not remarks


def test_a_changed_circuit_ends_a_waiver() -> None:
    kept, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="U1.3", reason="w", fingerprint="1:zz")), TODAY
    )
    assert all(finding.waived is None for finding in kept)
    assert "the circuit has changed" in remarks[0]


def test_a_renumbered_part_is_followed_and_told() -> None:
    moved = (_finding("U7", "3", "1:aa"), *FINDINGS[1:])
    waiver = Waiver(rule="too-slow", at="U1.3", reason="w", fingerprint="1:aa")
    kept, remarks = apply_waivers(moved, _settings(waiver), TODAY)
    assert [finding.waived for finding in kept] == ["w", None, None]
    assert "the circuit is now at 'U7.3'" in remarks[0]


def test_equal_circuits_are_told_apart_by_their_place() -> None:
    """Two equal channels: a waiver of one does not silence the other, wherever its own has gone."""
    twins = (_finding("U1", "3", "1:aa"), _finding("U2", "3", "1:aa"))
    waiver = Waiver(rule="too-slow", at="U1.3", reason="w", fingerprint="1:aa")
    assert [finding.waived for finding in apply_waivers(twins, _settings(waiver), TODAY)[0]] == ["w", None]
    gone = (_finding("U5", "3", "1:aa"), _finding("U6", "3", "1:aa"))
    kept, remarks = apply_waivers(gone, _settings(waiver), TODAY)
    assert all(finding.waived is None for finding in kept)
    assert "name the one that is meant" in remarks[0]


def test_a_place_that_now_holds_another_circuit_is_not_silenced_by_the_old_one() -> None:
    """After renumbering U1.3 is another fault; the waiver must neither move silently nor accept it."""
    swapped = (_finding("U1", "3", "1:new"), _finding("U7", "3", "1:aa"))
    waiver = Waiver(rule="too-slow", at="U1.3", reason="w", fingerprint="1:aa")
    kept, remarks = apply_waivers(swapped, _settings(waiver), TODAY)
    assert all(finding.waived is None for finding in kept)
    assert len(remarks) == 1


def test_rules_that_do_not_exist_and_old_fingerprints_are_told() -> None:
    rules = ("too-slow", "clamp-current")
    _, remarks = apply_waivers(FINDINGS, _settings(Waiver(rule="to-slow", at="U1", reason="w")), TODAY, rules)
    assert "no such rule, did you mean 'too-slow'?" in remarks[0]
    kept, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="U1", reason="w", fingerprint="0:aa")), TODAY
    )
    assert all(finding.waived is None for finding in kept)
    assert "another form" in remarks[0]


def test_remarks_show_hostile_places_harmlessly() -> None:
    _, remarks = apply_waivers(
        FINDINGS, _settings(Waiver(rule="too-slow", at="\x1b[31mU1\n::error::", reason="w")), TODAY
    )
    assert remarks[0].isprintable()


def _grouped(head: tuple[str, str], *also: str) -> Callable[[Callable[[str], str]], str]:
    def mark(names: Callable[[str], str]) -> str:
        review = _review(PARTS, VOLTS, names)
        places = tuple(names(place.partition(".")[0]) + "." + place.partition(".")[2] for place in also)
        finding = Finding(
            rule="input-floating", outcome=Outcome.MARGINAL, text="", part=names(head[0]), pin=head[1], also=places,
            net=PARTS[head[0]][1][head[1]],
        )  # fmt: skip
        return fingerprint(finding, review)

    return mark


def test_which_place_of_one_cause_stands_first_does_not_matter() -> None:
    """Places are sorted by reference; after renumbering another one may be the first."""
    one, other = _grouped(("U1", "2"), "U2.2", "U2.4"), _grouped(("U2", "4"), "U1.2", "U2.2")
    assert one(str) == other(str)
    assert one(str) == other({"U1": "U5", "U2": "U1", "R1": "R3", "R2": "R1", "R3": "R2"}.__getitem__)
    assert one(str) != _grouped(("U1", "2"), "U2.2")(str), "a place less is another finding"


def test_a_waiver_of_any_place_of_its_cause_holds_with_a_fingerprint_only() -> None:
    together = (replace(_finding("U1", "3", "1:aa"), also=("U2.4",)),)
    waiver = Waiver(rule="too-slow", at="U2.4", reason="w", fingerprint="1:aa")
    kept, remarks = apply_waivers(together, _settings(waiver), TODAY)
    assert (kept[0].waived, remarks) == ("w", ())
    kept, remarks = apply_waivers(together, _settings(replace(waiver, fingerprint="")), TODAY)
    assert kept[0].waived is None, "one of several places is not all of them"
    assert "the finding there is told at 'U1.3', name that" in remarks[0]
