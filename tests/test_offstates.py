"""Power-down: what flows into a dead supply, and when that may be asked at all."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from small_boards import case_of, findings_of, named

from levelcrossing.offstates import can_be_off

# Two boards' worth of supply: 3.3 V comes in at a connector of its own.
APART = """
J9 USB Connector:USB_B_Micro | 1 VBUS power_out +5V | 5 GND power_in GND
J8 Host Connector_Generic:Conn_01x02 | 1 3V3 passive +3V3 | 2 GND passive GND
C1 10u Device:C | 1 - passive +3V3 | 2 - passive GND
C2 10u Device:C | 1 - passive +5V | 2 - passive GND
"""


def test_a_rail_made_from_the_live_one_is_not_taken_as_off() -> None:
    assert not can_be_off(case_of(SUPPLIES + CONTROLLER).rails, "+3V3", "+5V")


def test_a_rail_from_another_connector_can_be_off() -> None:
    assert can_be_off(case_of(APART + CONTROLLER).rails, "+3V3", "+5V")


def test_the_current_into_a_dead_supply_is_that_through_resistor_and_clamp() -> None:
    """(5 V - about 0.73 V at 4 mA) over 1 kΩ, the output and the diode's 10 Ω, closed form."""
    case = case_of(APART + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", "1k", "/Y", "/A"))
    off = {
        state.case: state
        for solved in case.crossings
        for state in solved.off_states
        if solved.crossing.receiver.number == "6"
    }
    output = next(solved.crossing.driver.drive.high_ohms.nominal for solved in case.crossings if solved.crossing.driver)  # type: ignore[union-attr]
    expected = (5.0 - 0.73) / (1000 + output + 10)
    assert off["receiver-off-grounded"].into_rail_amps.nominal == pytest.approx(expected, rel=0.01)
    floating = off["receiver-off-floating"]
    assert floating.lifted_volts is not None
    # 10 kΩ of load behind 1 kΩ and a diode: (5 - 0.6) x 10/11.
    assert floating.lifted_volts.nominal == pytest.approx(4.4 * 10 / 11, abs=0.15)


def test_the_finding_speaks_above_1_mA_and_not_below() -> None:
    def findings(ohms: str) -> list[object]:
        text = APART + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", ohms, "/Y", "/A")
        return [finding for finding in findings_of(text) if finding.rule == "unpowered-path"]

    assert findings("3.9k") and not findings("4.7k")


def test_a_part_specified_for_partial_power_down_stays_quiet() -> None:
    tolerant = (
        "U4 74LVC1G17 74xGxx:74LVC1G17 | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /Y | 4 - output /Z\n"
    )
    assert not named(findings_of(APART + INVERTER_5V.format(out="/Y") + tolerant), "unpowered-path")
