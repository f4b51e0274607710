"""Edges and rates of whole crossings against closed forms."""

from __future__ import annotations

import math

import pytest
from gauge_cells import BUS, CONTROLLER, INVERTER_5V, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import case_of

from levelcrossing.model import Settings, SolvedCrossing


def timed(text: str, receiver: str, settings: Settings | None = None) -> SolvedCrossing:
    (found,) = [
        solved
        for solved in case_of(text, settings).crossings
        if f"{solved.crossing.receiver.part}.{solved.crossing.receiver.number}" == receiver and solved.crossing.driver
    ]
    assert found.speed is not None
    return found


@pytest.mark.parametrize(("top", "bottom"), [("2k", "3k"), ("10k", "20k")])
def test_a_divider_rises_in_2_2_of_its_parallel_resistance_and_its_load(top: str, bottom: str) -> None:
    """2.197 RC (ln 9); the driver adds its own output resistance."""
    text = (
        SUPPLIES
        + CONTROLLER
        + INVERTER_5V.format(out="/Y")
        + resistor("R1", top, "/Y", "/A")
        + resistor("R2", bottom, "/A", "GND")
    )
    solved = timed(text, "U1.6")
    speed, drive = solved.speed, solved.crossing.driver.drive  # type: ignore[union-attr]
    assert speed is not None and drive is not None
    series = float(top[:-1]) * 1e3 + drive.high_ohms.nominal
    ohms = 1 / (1 / series + 1 / (float(bottom[:-1]) * 1e3))
    assert speed.rise_s.nominal == pytest.approx(math.log(9) * ohms * speed.load_farads, rel=0.02)
    assert "R1" in speed.limit


OPEN_DRAIN = (
    "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /Z\n"
    "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /Z | 2 - output /Y\n"
)


def test_an_open_drain_rises_through_its_pull_up() -> None:
    """10-90 % in 2.197 RC, 30-70 % in 0.8473 RC (UM10204 section 7.1)."""
    speed = timed(SUPPLIES + OPEN_DRAIN + resistor("R1", "10k", "+5V", "/Z"), "U2.1").speed
    assert speed is not None and speed.rise_30_70_s is not None
    assert speed.rise_s.nominal == pytest.approx(math.log(9) * 10e3 * speed.load_farads, rel=0.02)
    assert speed.rise_30_70_s.nominal == pytest.approx(math.log(7 / 3) * 10e3 * speed.load_farads, rel=0.02)
    assert speed.limit == "the rise through R1 (10 kΩ)"


def test_more_stray_capacitance_is_slower_and_a_smaller_pull_up_faster() -> None:
    base = SUPPLIES + OPEN_DRAIN
    usual = timed(base + resistor("R1", "10k", "+5V", "/Z"), "U2.1").speed
    loaded = timed(base + resistor("R1", "10k", "+5V", "/Z"), "U2.1", Settings(stray_farads=100e-12)).speed
    strong = timed(base + resistor("R1", "1k", "+5V", "/Z"), "U2.1").speed
    assert usual is not None and loaded is not None and strong is not None
    assert loaded.usable_bit_s < usual.usable_bit_s < strong.usable_bit_s
    assert usual.usable_bit_s < usual.nominal_bit_s


def test_a_weak_auto_direction_buffer_is_not_timed_by_its_static_resistance() -> None:
    text = (
        SUPPLIES
        + CONTROLLER
        + (
            "U7 TXB0104D Logic_LevelTranslator:x | 1 VCCA power_in +3V3 | 14 VCCB power_in +5V | 7 GND power_in GND | 8 OE input +3V3"
            " | 2 A1 bidirectional /A | 13 B1 bidirectional /Q\n"
            "U3 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input /Q | 4 - output /Z\n"
        )
    )
    assert all(solved.speed is None for solved in case_of(text).crossings)


def test_an_i2c_line_is_recognised_by_its_name_and_asked_for_100_kbit_per_second() -> None:
    speed = timed(BUS + PULL_UPS + MOSFET_PAIR, "U1.18").speed
    assert speed is not None and speed.needed_bit_s == 100e3
    assert speed.line is not None and "I2C" in speed.line.why
