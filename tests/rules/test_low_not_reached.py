"""low-not-reached: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from small_boards import case_of, findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings

DIODE = "D1 1N4148W Diode:1N4148W | 1 K passive /Y | 2 A passive /A\n"
CELL = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + DIODE + resistor("R1", "1k", "+3V3", "/A")


@pytest.mark.parametrize(("vil", "speaks"), [(0.5, True), (1.4, False)])
def test_a_silicon_diode_in_series_leaves_about_0_7_v(vil: float, speaks: bool) -> None:
    """0.7 V at a few milliamperes, 0.6 V to 0.95 V over its spread (1N4148 data sheets)."""
    findings = named(findings_of(CELL, Settings(pins={"U1.6": PinSetting(vil_volts=vil)})), "low-not-reached")
    assert bool(findings) is speaks


def test_a_weak_driver_against_a_pull_up_speaks_with_the_maker_s_figure() -> None:
    """TXB0104 at 3.3 V and 4.7 kilohm: V x 4.5k / (R + 4.5k) (TI TXB0104, detailed design procedure), here with 4 k static."""
    text = (
        SUPPLIES
        + CONTROLLER
        + (
            "U7 TXB0104D Logic_LevelTranslator:TXB0104D | 1 VCCA power_in +3V3 | 14 VCCB power_in +5V | 7 GND power_in GND | 8 OE input +3V3"
            " | 2 A1 bidirectional /SDA | 13 B1 bidirectional /SDA5\n"
            "U3 DS1307Z+ Timer_RTC:DS1307Z+ | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA bidirectional /SDA5\n"
        )
        + resistor("R1", "4.7k", "+3V3", "/SDA")
    )
    (finding,) = [finding for finding in named(findings_of(text), "translator-load") if finding.pin == "2"]
    assert finding.outcome is Outcome.MALFUNCTION and "4.7 kΩ" in finding.text
    low = next(one.low for one in case_of(text).crossings if one.crossing.receiver.part == "U1")
    assert low is not None and low.nominal == pytest.approx(3.3 * 4.0 / (4.7 + 4.0), rel=0.01)


def test_stays_quiet_when_the_low_is_held_at_every_corner() -> None:
    schottky = CELL.replace("1N4148W Diode:1N4148W", "BAT54 Diode:BAT54").replace("R1 1k", "R1 10k")
    assert not named(findings_of(schottky, Settings(pins={"U1.6": PinSetting(vil_volts=0.8)})), "low-not-reached")
