"""A comparison says what a revision changed, and nothing when only names did."""

from __future__ import annotations

from dataclasses import replace

from kiln_logger import BAD, SOUND, board, finding, kiln, kinds, row, side

from levelcrossing.differences import compare_sides
from levelcrossing.model import Outcome, PinSetting, Settings, Spread, Waiver
from levelcrossing.reports.changes import text_changes


def test_equal_reviews_say_nothing() -> None:
    for one in (SOUND, BAD):
        comparison = compare_sides(one, replace(one, label="new"))
        assert comparison.empty
        assert not comparison.fails


def test_renumbering_alone_says_nothing() -> None:
    names, nets = {"U1": "U5", "R1": "R9", "U2": "U3"}, {"/IN1": "/X", "+3V3": "VDD", "/OUT1": "/Y"}
    old = side("old", [row("damage", top=5.25, findings=(0,))], [finding()], board(kiln()))
    there = row("damage", ("U5", "1"), ("U3", "1"), ("R9",), 5.25, ("+5V", "VDD"), (0,))
    new = side("new", [there], [finding(part="U3", net="/X", fingerprint="1:other")], board(kiln(), names, nets))
    rails = {"rails": [{"net": "+3V3", "low": 3.1, "nominal": 3.3, "high": 3.5}]}
    renamed = {"rails": [{"net": "VDD", "low": 3.1, "nominal": 3.3, "high": 3.5}]}
    comparison = compare_sides(
        replace(old, form={**old.form, **rails}, settings=Settings(pins={"U2.1": PinSetting(tolerates_volts=5)})),
        replace(
            new, form={**new.form, **renamed}, settings=Settings(pins={"U3.1": PinSetting(tolerates_volts=5, line=9)})
        ),
    )
    assert comparison.empty, comparison


def test_worse_is_told_with_figures_and_fails() -> None:
    comparison = compare_sides(SOUND, BAD)
    assert kinds(comparison) == [("worse", True)]
    assert comparison.fails
    change = comparison.changes[0]
    assert (change.before, change.after) == ("sound", "damage")
    figure = next(figure for figure in change.figures if figure.name == "voltage, greatest")
    assert (figure.before, figure.after, figure.limit) == (3.4, 5.25, 3.6)
    text = text_changes([comparison])
    assert "worse: U1.1 (Y) on +5V -> U2.1 (A) on +3V3 through R1: sound -> damage" in text
    assert "voltage, greatest: 3.40 V -> 5.25 V (rated for 3.60 V)" in text
    assert "damage input-overvoltage: U2.1 sees 5.25 V" in text
    assert "what to do: fit a divider" in text


def test_better_does_not_fail() -> None:
    comparison = compare_sides(BAD, SOUND)
    assert kinds(comparison) == [("better", False)]
    assert not comparison.fails


def test_more_of_the_same_fault_is_worse_and_less_is_better() -> None:
    more = side("new", [row("damage", top=5.6, findings=(0,))], [finding()])
    assert kinds(compare_sides(BAD, more)) == [("worse", True)]
    assert kinds(compare_sides(more, BAD)) == [("better", False)]
    rounding = side("new", [row("damage", top=5.2501, findings=(0,))], [finding()])
    assert compare_sides(BAD, rounding).empty


def test_figures_of_sound_crossings_are_shown_on_demand_only() -> None:
    comparison = compare_sides(SOUND, side("new", [row(top=3.3)]))
    assert kinds(comparison) == [("moved", False)]
    assert "3.40 V -> 3.30 V" not in text_changes([comparison])
    assert "3.40 V -> 3.30 V" in text_changes([comparison], everything=True)


def test_added_and_removed_crossings() -> None:
    other = row("damage", ("U1", "2"), ("U2", "2"), ("R2",), 5.25, findings=(0,))
    wider = side("new", [row(), other], [finding(pin="2", crossing=1)])
    added = compare_sides(SOUND, wider)
    assert kinds(added) == [("added", True)]
    assert kinds(compare_sides(wider, SOUND)) == [("removed", False)]
    assert kinds(compare_sides(SOUND, side("new", [row(), row("sound", ("U1", "2"), ("U2", "2"))]))) == [
        ("added", False)
    ]


def test_what_can_no_longer_be_judged_is_never_called_better() -> None:
    lost = side("new", [row("unknown", findings=(0,))], [finding("unknown", rule="pin-unknown")])
    assert kinds(compare_sides(BAD, lost)) == [("unclear", False)]
    assert kinds(compare_sides(BAD, lost, stop_at=Outcome.UNKNOWN)) == [("unclear", True)]
    assert kinds(compare_sides(lost, BAD)) == [("worse", True)]


def test_a_part_swapped_for_another_keeps_its_crossing() -> None:
    """The receiver has another reference and value; the driver's pin and the link tell that it is the same wire."""
    new = side("new", [row("sound", end=("U9", "7"))])
    comparison = compare_sides(BAD, new)
    assert kinds(comparison) == [("better", False)]


def test_the_stop_level_decides_what_counts() -> None:
    marginal = side("new", [row("marginal", top=3.55, findings=(0,))], [finding("marginal", rule="margin-thin")])
    assert not compare_sides(SOUND, marginal).fails
    assert compare_sides(SOUND, marginal, stop_at=Outcome.MARGINAL).fails
    assert not compare_sides(SOUND, BAD, stop_at=None).fails


def test_findings_without_a_crossing_are_compared_too() -> None:
    range_finding = finding(rule="supply-range", pin=None, crossing=None, fingerprint="1:bb")
    old, new = side("old", [row()]), side("new", [row()], [range_finding])
    assert kinds(compare_sides(old, new)) == [("added", True)]
    assert kinds(compare_sides(new, old)) == [("removed", False)]
    milder = side("new", [row()], [range_finding | {"outcome": "marginal"}])
    assert kinds(compare_sides(new, milder)) == [("better", False)]


def test_a_waiver_of_the_same_change_is_reported_and_silences_nothing() -> None:
    waived = side("new", [row("damage", top=5.25, findings=(0,))], [finding(waived="trust me")], settings=Settings())
    comparison = compare_sides(replace(SOUND, settings=Settings()), waived)
    assert comparison.fails
    assert comparison.new_waivers == (
        "damage input-overvoltage at U2.1 is accepted by a waiver added in this change: trust me",
    )
    agreed = compare_sides(replace(SOUND, settings=Settings()), waived, accept_new_waivers=True)
    assert not agreed.fails
    assert agreed.new_waivers, "it is still told"


def test_a_waiver_of_an_old_fault_is_reported_without_failing() -> None:
    """The fault is not of this change; that it goes quiet is."""
    waived = side("new", [row("damage", top=5.25, findings=(0,))], [finding(waived="trust me")], settings=Settings())
    comparison = compare_sides(replace(BAD, settings=Settings()), waived)
    assert not comparison.fails
    assert comparison.new_waivers
    assert not comparison.empty


def test_a_waiver_of_the_old_revision_holds() -> None:
    agreed = Settings(waivers=(Waiver(rule="input-overvoltage", at="U2.1", reason="never fitted", fingerprint="1:aa"),))
    waived = side("new", [row("damage", top=5.25, findings=(0,))], [finding(waived="never fitted")], settings=agreed)
    comparison = compare_sides(replace(SOUND, settings=agreed), waived)
    assert not comparison.fails
    assert comparison.new_waivers == ()


def test_a_waiver_taken_away_counts_again() -> None:
    old = side("old", [row("damage", top=5.25, findings=(0,))], [finding(waived="never fitted")])
    comparison = compare_sides(old, BAD)
    assert kinds(comparison) == [("worse", True)]
    assert "the waiver that accepted it is gone" in text_changes([comparison])


def test_what_is_declared_otherwise_is_told() -> None:
    """A change that declares its own fault away shows what it declared."""
    old = replace(BAD, label="old", settings=Settings(rails={"+5V": Spread.around(5, 0.05)}))
    new = replace(
        SOUND,
        label="new",
        settings=Settings(pins={"U2.1": PinSetting(tolerates_volts=60.0)}, stop_at=Outcome.SOUND, stray_farads=1e-12),
    )
    declared = compare_sides(old, new).declared
    assert declared == (
        "pin U2.1: not declared -> tolerates 60",
        "rail +5V: 5 V (4.75 to 5.25 V) -> not declared",
        "stop level: not declared -> never",
        "stray farads: not declared -> 1e-12",
    )


def test_coverage_and_rails() -> None:
    pin = {"part": "U2", "pin": "3", "why": "no data", "name": "", "net": ""}
    old = side("old", [row()], rails=[{"net": "+5V", "low": 4.75, "nominal": 5.0, "high": 5.25}])
    new = side(
        "new",
        [row()],
        rails=[
            {"net": "+5V", "low": None, "nominal": None, "high": None},
            {"net": "V", "low": 1, "nominal": 1, "high": 1},
        ],
        coverage={"signal_pins": 4, "judged": 3, "not_judged": [pin]},
    )
    comparison = compare_sides(old, new)
    assert comparison.rails == ("+5V: 5 V (4.75 to 5.25 V) -> voltage unknown", "V: new rail, 1 V")
    assert "U2.3 (no data)" in comparison.coverage[0]
    assert compare_sides(new, replace(new, label="again")).empty


def test_one_cause_at_several_places_is_one_finding_whichever_stands_first() -> None:
    floating = {"rule": "input-floating", "outcome": "marginal", "crossing": None, "fingerprint": ""}
    old = side("old", findings=[finding(part="U1", pin="3", also=["U2.4", "U2.5"], **floating)])
    new = side("new", findings=[finding(part="U2", pin="5", also=["U1.3", "U2.4"], **floating)])
    assert compare_sides(old, new).empty
    wider = side("new", findings=[finding(part="U2", pin="5", also=["U1.3", "U2.4", "U9.1"], **floating)])
    comparison = compare_sides(old, wider, stop_at=Outcome.MARGINAL)
    assert kinds(comparison) == [("worse", True)]
    assert comparison.changes[0].notes == ("now also at U9.1",)
    assert compare_sides(wider, old).empty
    overlapping = side("new", findings=[finding(part="U9", pin="1", also=["U2.4"], **floating)])
    assert kinds(compare_sides(old, overlapping)) == [("worse", False)]
    assert kinds(compare_sides(old, side("new", findings=[finding(part="U9", pin="1", **floating)]))) == [
        ("added", False),
        ("removed", False),
    ]
