"""sink-current: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES, resistor
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
