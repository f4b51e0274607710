"""too-slow: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from small_boards import case_of, findings_of, named

from levelcrossing.model import Outcome, Settings

DIVIDER = (
    SUPPLIES
    + CONTROLLER
    + INVERTER_5V.format(out="/Y")
    + resistor("R1", "18k", "/Y", "/A")
    + resistor("R2", "33k", "/A", "GND")
)


def test_the_limits_are_the_usable_and_the_usual_rate() -> None:
    speed = next(solved.speed for solved in case_of(DIVIDER).crossings if solved.speed is not None)
    between = (speed.usable_bit_s + speed.nominal_bit_s) / 2
    for rate, outcome in (
        (0.99 * speed.usable_bit_s, None),
        (between, Outcome.MARGINAL),
        (1.01 * speed.nominal_bit_s, Outcome.MALFUNCTION),
    ):
        findings = named(findings_of(DIVIDER, Settings(rates=(("/A", rate),))), "too-slow")
        assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])


def test_stays_quiet_when_nothing_tells_the_rate() -> None:
    assert not named(findings_of(DIVIDER), "too-slow")


@pytest.mark.parametrize(("ohms", "speaks"), [("10k", False), ("1M", True)])
def test_a_serial_line_is_asked_for_its_usual_rate(ohms: str, speaks: bool) -> None:
    """115,200 bit/s: common practice."""
    text = (
        SUPPLIES
        + (
            "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /UART_TX\n"
            "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /UART_TX | 2 - output /Y\n"
        )
        + resistor("R1", ohms, "+5V", "/UART_TX")
    )
    assert bool(named(findings_of(text), "too-slow")) is speaks


@pytest.mark.parametrize(("ohms", "speaks"), [("10k", False), ("33k", False), ("47k", True)])
def test_an_i2c_line_rises_within_its_mode_s_limit(ohms: str, speaks: bool) -> None:
    """Standard mode: 1000 ns from 30 % to 70 %, 0.8473 R C (UM10204 table 11 and section 7.1); 30 pF here."""
    text = (
        SUPPLIES
        + CONTROLLER
        + ("U3 DS1307Z+ Timer_RTC:DS1307Z+ | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA bidirectional /SDA\n")
        + resistor("R1", ohms, "+3V3", "/SDA")
    )
    assert any("30 %" in finding.text for finding in named(findings_of(text), "too-slow")) is speaks


SENSOR = "U8 MCP3008 Analog_ADC:MCP3008 | 16 VDD power_in +3V3 | 9 DGND power_in GND | 13 CLK input /SPI_SCK | 11 Din input /SPI_MOSI\n"
HOST = (
    "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input GND | 2 - output /HOST_SCK"
    " | 3 - input GND | 4 - output /HOST_MOSI\n"
)


@pytest.mark.parametrize(("top", "bottom", "speaks"), [("1k", "1.8k", False), ("22k", "39k", True)])
def test_a_bus_that_usually_runs_faster_is_unknown_until_its_rate_is_stated(
    top: str, bottom: str, speaks: bool
) -> None:
    """SPI at 10 Mbit/s: common practice; a bus of 22 kilohm dividers is good for about 1 Mbit/s."""
    text = SUPPLIES + HOST + SENSOR
    for number, line in ((1, "SCK"), (3, "MOSI")):
        text += resistor(f"R{number}", top, f"/HOST_{line}", f"/SPI_{line}")
        text += resistor(f"R{number + 1}", bottom, f"/SPI_{line}", "GND")
    found = named(findings_of(text), "too-slow")
    assert [finding.outcome for finding in found] == ([Outcome.UNKNOWN] if speaks else [])
    if not speaks:
        return
    (one,) = found
    assert "SPI usually runs at 10 Mbit/s" in one.text and len(one.also) == 1
    # The line that the remedy proposes settles it.
    rate = one.remedy.split('" = "')[1].split('"')[0]
    assert rate.endswith("M") and 0.5 < float(rate[:-1]) < 3
    settled = Settings(rates=(("/SPI_*", float(rate[:-1]) * 1e6),))
    assert not named(findings_of(text, settled), "too-slow")
    assert named(findings_of(text, Settings(rates=(("/SPI_*", 10e6),))), "too-slow")[0].outcome is Outcome.MALFUNCTION


def test_names_that_mean_something_only_together_say_nothing_alone() -> None:
    """A net CLK without data lines beside it is no SPI."""
    text = SUPPLIES + HOST + SENSOR.replace("/SPI_MOSI", "/OTHER")
    text += resistor("R1", "22k", "/HOST_SCK", "/SPI_SCK") + resistor("R2", "39k", "/SPI_SCK", "GND")
    text += resistor("R3", "22k", "/HOST_MOSI", "/OTHER") + resistor("R4", "39k", "/OTHER", "GND")
    assert not named(findings_of(text), "too-slow")


@pytest.mark.parametrize(("ohms", "speaks"), [("330", False), ("10k", True)])
def test_an_addressable_led_is_told_by_its_pin_and_needs_its_shortest_pulse(ohms: str, speaks: bool) -> None:
    """WS2812B: a zero is a pulse of 0.4 us (Worldsemi data sheet, timing table), 15 pF and 10 pF of stray."""
    text = (
        SUPPLIES
        + HOST.replace("/HOST_SCK", "/X")
        + "D1 WS2812B LED:WS2812B | 1 VDD power_in +3V3 | 3 VSS power_in GND | 4 DIN input /L | 2 DOUT output /M\n"
        + resistor("R1", ohms, "/X", "/L")
    )
    found = named(findings_of(text), "too-slow")
    assert bool(found) is speaks
    assert all("0.4 µs" in finding.text for finding in found)


def translated(value: str, drain: bool) -> str:
    driver = "74LVC1G07" if drain else "74LVC1G34"
    return (
        SUPPLIES
        + f"U4 {driver} 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /A\n"
        + f"U7 {value} Logic_LevelTranslator:x | 1 VCCA power_in +3V3 | 14 VCCB power_in +5V | 7 GND power_in GND"
        " | 8 OE input +3V3 | 2 A1 bidirectional /A | 13 B1 bidirectional /B\n"
        + "U3 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input /B | 4 - output /Z\n"
    )


@pytest.mark.parametrize(
    ("value", "drain", "rate", "speaks"),
    [
        # TI TXS0104E SCES651: 24 Mbit/s push-pull at 3.3 and 5 V, 2 Mbit/s open-drain
        ("TXS0104E", False, 24e6, False),
        ("TXS0104E", False, 25e6, True),
        ("TXS0104E", True, 2e6, False),
        ("TXS0104E", True, 2.1e6, True),
        # TXB0104: 100 Mbit/s from 2.5 V on side A up (from memory)
        ("TXB0104D", False, 100e6, False),
        ("TXB0104D", False, 110e6, True),
    ],
)
def test_a_translator_is_held_against_its_maker_s_rate(value: str, drain: bool, rate: float, speaks: bool) -> None:
    found = named(findings_of(translated(value, drain), Settings(rates=(("/B", rate),))), "too-slow")
    assert [finding.part for finding in found] == (["U7"] if speaks else [])
    assert all(finding.outcome is Outcome.MALFUNCTION and "rated for" in finding.text for finding in found)


@pytest.mark.parametrize(("stated", "speaks"), [(None, False), ("100k", False), ("400k", True)])
def test_a_stated_rate_chooses_the_mode_of_an_i2c_line(stated: str | None, speaks: bool) -> None:
    """Fast mode: 300 ns from 30 % to 70 % (UM10204 table 11); 15 kilohm into 30 pF takes 380 ns."""
    text = (
        SUPPLIES
        + CONTROLLER
        + "U3 DS1307Z+ Timer_RTC:DS1307Z+ | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA bidirectional /SDA\n"
        + resistor("R1", "15k", "+3V3", "/SDA")
    )
    settings = Settings(rates=(("/SDA", float(stated[:-1]) * 1e3),)) if stated else Settings()
    found = named(findings_of(text, settings), "too-slow")
    assert any("300 ns" in finding.text for finding in found) is speaks


def test_the_remedy_states_both_ends_of_the_pull_up_window() -> None:
    """UM10204 section 7.1: at most tr / (0.8473 Cb) = 39.3 kohm at 1 us and 30 pF, at least (VDD - 0.4 V) / 3 mA."""
    text = (
        SUPPLIES
        + CONTROLLER
        + "U3 DS1307Z+ Timer_RTC:DS1307Z+ | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA bidirectional /SDA\n"
        + resistor("R1", "68k", "+3V3", "/SDA")
    )
    slow = [finding for finding in named(findings_of(text), "too-slow") if finding.part == "U1"]
    assert "39 kΩ at most" in slow[0].remedy
    assert "990 Ω at least" in slow[0].remedy and "3 mA" in slow[0].remedy  # (3.366 - 0.4) / 3 mA


@pytest.mark.parametrize(
    ("rate", "outcome"), [(2 * 125e3, None), (2 * 1e6, Outcome.MARGINAL), (2 * 8e6, Outcome.MALFUNCTION)]
)
def test_a_divider_on_a_breadboard(rate: float, outcome: Outcome | None) -> None:
    """2 k over 3 k: fine at 125 kHz, poor at 1 MHz, useless at 8 MHz (common practice); 120 pF of wires, rows and a probe."""
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y")
    text += resistor("R1", "2k", "/Y", "/A") + resistor("R2", "3k", "/A", "GND")
    settings = Settings(stray_farads=120e-12, rates=(("/A", rate),))
    found = [finding.outcome for finding in named(findings_of(text, settings), "too-slow")]
    assert found == ([outcome] if outcome else [])
