"""One review whatever the input, the same from run to run; every crossing has a verdict."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from gauge_cells import BUS, CONTROLLER, INVERTER_5V, MOSFET_PAIR, PULL_UPS, SUPPLIES
from small_boards import board_of

from levelcrossing.model import Finding, Outcome, Review, Settings
from levelcrossing.read import read_board
from levelcrossing.review import review_board

HERE = Path(__file__).parent
SAMPLES = sorted(HERE.parent.glob("sample_boards/*/*.kicad_sch"))
TOP_SHEETS = [sheet for sheet in SAMPLES if sheet.stem == sheet.parent.name] + [
    HERE / "read/good_input/door_sensor.kicad_sch"
]


def review_of(text: str) -> Review:
    return review_board(board_of(text), Settings())


def without_places(finding: Finding) -> Finding:
    return replace(finding, at=None)


@pytest.mark.parametrize("sheet", TOP_SHEETS, ids=lambda sheet: sheet.stem)
def test_sheets_and_netlist_of_a_board_give_the_same_review(sheet: Path) -> None:
    from_sheets = review_board(read_board(str(sheet)), Settings())
    for other in (sheet.with_suffix(".net"), sheet.with_suffix(".xml")):
        if not other.exists():
            continue
        from_netlist = review_board(read_board(str(other)), Settings())
        assert dict(from_sheets.rails.by_net) == dict(from_netlist.rails.by_net)
        assert [without_places(finding) for finding in from_sheets.findings] == [
            without_places(finding) for finding in from_netlist.findings
        ]
        assert [one.verdict for one in from_sheets.crossings] == [one.verdict for one in from_netlist.crossings]


def test_a_review_is_the_same_from_run_to_run() -> None:
    text = BUS + PULL_UPS + MOSFET_PAIR + INVERTER_5V.format(out="/A")
    assert review_of(text).findings == review_of(text).findings


def test_the_order_of_parts_and_nets_does_not_matter() -> None:
    text = BUS + PULL_UPS + MOSFET_PAIR + INVERTER_5V.format(out="/A")
    backwards = "\n".join(reversed(text.strip().splitlines()))
    assert review_of(text).findings == review_of(backwards).findings


def test_every_crossing_has_a_verdict_and_the_worst_finding_decides_it() -> None:
    result = review_of(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A"))
    assert result.crossings
    for one in result.crossings:
        outcomes = [result.findings[number].outcome for number in one.findings]
        assert one.verdict is (Outcome.worst(*outcomes) if outcomes else Outcome.SOUND)


def test_a_right_board_says_nothing() -> None:
    assert review_of(BUS + PULL_UPS + MOSFET_PAIR).findings == ()


def test_findings_come_worst_first() -> None:
    ranks = [
        finding.outcome.rank
        for finding in review_of(
            SUPPLIES
            + CONTROLLER
            + INVERTER_5V.format(out="/A")
            + "U4 74HC04 74xx:74HC04 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /N\n"
        ).findings
    ]
    assert ranks == sorted(ranks) and len(set(ranks)) > 1


def test_coverage_counts_every_signal_pin_once() -> None:
    coverage = review_of(
        SUPPLIES
        + "U1 XYZ Local:X | 1 VDD power_in VQ | 2 GND power_in GND | 3 A input /A\nU2 74HC04 74xx:74HC04 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input GND | 2 - output /A\n"
    ).coverage
    assert coverage.signal_pins == coverage.judged + len(coverage.not_judged)
    assert any(entry.part == "U1" for entry in coverage.not_judged)
