"""high-not-reached: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings

GATE = (
    "U2 {value} 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 1 - input GND | 2 - input /A | 4 - tri_state /Y\n"
)


def test_speaks_when_3_3_v_drives_hc_at_5_v() -> None:
    """74HC at 5 V reads a high from 3.5 V (JESD7-A)."""
    (finding,) = named(findings_of(SUPPLIES + CONTROLLER + GATE.format(value="74HC1G125")), "high-not-reached")
    assert finding.outcome is Outcome.MALFUNCTION and "3.5 V" in finding.text


@pytest.mark.parametrize("value", ["74HCT1G125", "74AHCT1G125"])
def test_stays_quiet_on_ttl_thresholds(value: str) -> None:
    """HCT and AHCT read a high from 2.0 V (JESD7-A, JESD20)."""
    assert not named(findings_of(SUPPLIES + CONTROLLER + GATE.format(value=value)), "high-not-reached")


@pytest.mark.parametrize(("vih", "outcome"), [(3.23, None), (3.25, Outcome.MARGINAL), (3.31, Outcome.MALFUNCTION)])
def test_the_limit_is_the_least_and_the_usual_high(vih: float, outcome: Outcome | None) -> None:
    """+3V3 of an AMS1117-3.3 is 3.234 V at least and 3.3 V usually."""
    settings = Settings(pins={"U2.2": PinSetting(vih_volts=vih)})
    findings = named(findings_of(SUPPLIES + CONTROLLER + GATE.format(value="74HCT1G125"), settings), "high-not-reached")
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])
