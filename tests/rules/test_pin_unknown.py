"""pin-unknown: speaks and stays quiet."""

from __future__ import annotations

from gauge_cells import CONTROLLER, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings, Spread

CONNECTOR = (
    "J1 Conn_01x03 Connector_Generic:Conn_01x03 | 1 Pin_1 passive /A | 2 Pin_2 passive /B | 3 Pin_3 passive GND\n"
)


def test_one_finding_per_connector_with_a_line_to_paste() -> None:
    (finding,) = named(findings_of(SUPPLIES + CONTROLLER + CONNECTOR), "pin-unknown")
    assert finding.outcome is Outcome.UNKNOWN and finding.also == ("J1.2",) and "[far_ends]" in finding.remedy


def test_stays_quiet_once_the_far_end_is_declared() -> None:
    settings = Settings(far_ends={"J1": PinSetting(volts=Spread.exactly(3.3))})
    assert not named(findings_of(SUPPLIES + CONTROLLER + CONNECTOR, settings), "pin-unknown")


def test_a_part_whose_supply_nothing_tells_is_named() -> None:
    text = (
        SUPPLIES
        + CONTROLLER
        + "U5 XYZ Local:X | 1 VDDA1 power_in +5V | 2 VDDB2 power_in +3V3 | 3 GND power_in GND | 4 DIN input /A\n"
    )
    findings = named(findings_of(text), "pin-unknown")
    assert any(finding.part == "U5" and "several supplies" in finding.text for finding in findings)
