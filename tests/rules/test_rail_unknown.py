"""rail-unknown: speaks and stays quiet."""

from __future__ import annotations

from gauge_cells import SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Settings, Spread

PART = (
    "U1 74HC14 74xx:74HC14 | 14 VCC power_in {rail} | 7 GND power_in GND | 1 - input /A | 2 - output /Y\n"
    "U2 74HC04 74xx:74HC04 | 14 VCC power_in {rail} | 7 GND power_in GND | 1 - input /Y | 2 - output /A\n"
    "C9 100n Device:C | 1 - passive {rail} | 2 - passive GND\n"
)


def test_a_supply_without_a_voltage_is_named_with_what_settles_it() -> None:
    (finding,) = named(findings_of(SUPPLIES + PART.format(rail="VCC")), "rail-unknown")
    assert finding.net == "VCC" and '"VCC"' in finding.remedy


def test_stays_quiet_once_the_rail_is_known_or_declared() -> None:
    assert not named(findings_of(SUPPLIES + PART.format(rail="+5V")), "rail-unknown")
    declared = Settings(rails={"VCC": Spread.exactly(5.0)})
    assert not named(findings_of(SUPPLIES + PART.format(rail="VCC"), declared), "rail-unknown")
