"""sink-current: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Outcome

OPEN_DRAIN = (
    "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /Z\n"
    "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /Z | 2 - output /Y\n"
)


@pytest.mark.parametrize(("ohms", "speaks"), [("4.7k", False), ("1k", False), ("47", True)])
def test_by_the_current_through_the_pull_up(ohms: str, speaks: bool) -> None:
    """74LVC: low level guaranteed at 24 mA, 50 mA at most (TI and Nexperia LVC data sheets)."""
    findings = named(findings_of(SUPPLIES + OPEN_DRAIN + resistor("R1", ohms, "+5V", "/Z")), "sink-current")
    assert bool(findings) is speaks
    if speaks:
        assert (findings[0].part, findings[0].pin, findings[0].outcome) == ("U4", "4", Outcome.DAMAGE)


@pytest.mark.parametrize(("ohms", "speaks"), [("10k", False), ("4.7k", False), ("2.2k", True)])
def test_a_part_without_data_is_asked_for_what_its_bus_asks(ohms: str, speaks: bool) -> None:
    """I2C: 3 mA at 0.4 V (UM10204 table 10). Both sides: 5.25 V and 3.37 V through 2.2 kohm less 1 % are 3.9 mA."""
    sensor = (
        "U3 QX77 Tide:QX77 | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA open_collector /SDA5 | 6 SCL input /SCL5\n"
    )
    text = SUPPLIES + CONTROLLER + sensor + PULL_UPS.replace("10k", ohms) + MOSFET_PAIR
    findings = [finding for finding in named(findings_of(text), "sink-current") if finding.part == "U3"]
    assert [finding.outcome for finding in findings] == ([Outcome.MARGINAL] if speaks else [])
    assert all("3 mA" in finding.text and "bus" in finding.text for finding in findings)
