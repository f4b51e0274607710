"""margin-thin: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import PinSetting, Settings

GATE = "U2 74HCT1G125 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 1 - input GND | 2 - input /A | 4 - tri_state /Y\n"


@pytest.mark.parametrize(("vih", "speaks"), [(3.18, False), (3.19, True), (3.23, True), (3.26, False)])
def test_between_the_least_margin_and_50_mv(vih: float, speaks: bool) -> None:
    """The least high is 3.234 V; at 3.26 V the high is not reached at all, which another rule says."""
    settings = Settings(pins={"U2.2": PinSetting(vih_volts=vih)})
    assert bool(named(findings_of(SUPPLIES + CONTROLLER + GATE, settings), "margin-thin")) is speaks


def test_the_limit_is_a_setting() -> None:
    settings = Settings(pins={"U2.2": PinSetting(vih_volts=3.0)}, thin_margin_volts=0.3)
    assert named(findings_of(SUPPLIES + CONTROLLER + GATE, settings), "margin-thin")
