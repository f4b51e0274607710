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
