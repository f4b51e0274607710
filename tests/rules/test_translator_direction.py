"""translator-direction: speaks and stays quiet."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread

T45 = (
    "U7 SN74LVC1T45DBV Logic_LevelTranslator:x | 1 VCCA power_in +3V3 | 6 VCCB power_in +5V | 2 GND power_in GND | 5 DIR input {dir}"
    " | 3 A bidirectional /A | 4 B bidirectional /B\n"
)
NEAR = "U1 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /A\n"
FAR = "U2 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input /B | 4 - output /Z\n"


@pytest.mark.parametrize(("tied", "speaks"), [("+3V3", False), ("GND", True), ("/DIR", True)])
def test_a_channel_driven_from_a(tied: str, speaks: bool) -> None:
    """DIR high is A to B; low turns the channel against its driver (TI SN74LVC1T45 SCES515, function table)."""
    assert bool(named(findings_of(SUPPLIES + NEAR + FAR + T45.format(dir=tied)), "translator-direction")) is speaks


def test_a_driven_direction_stays_quiet() -> None:
    control = "U3 74LVC1G04 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /DIR\n"
    assert not named(findings_of(SUPPLIES + NEAR + FAR + control + T45.format(dir="/DIR")), "translator-direction")


def test_a_channel_turned_round_is_one_finding() -> None:
    """The conflict at one end and the floating input at the other have one cause."""
    (found,) = findings_of(SUPPLIES + NEAR + FAR + T45.format(dir="GND"))
    assert (found.rule, found.part, found.outcome) == ("translator-direction", "U7", Outcome.DAMAGE)
    assert {"U1.4", "U2.2"} <= set(found.also)


def test_a_common_direction_cannot_carry_an_answer_with_its_question() -> None:
    """MISO runs against MOSI: a buffer with one direction for both drives against the device (common practice)."""
    text = (
        SUPPLIES
        + "U7 74LVC8T245PW Local:x | 1 VCCA power_in +3V3 | 23 VCCB power_in +5V | 11 GND power_in GND | 2 DIR input +3V3"
        " | 22 ~{OE} input GND | 3 A1 bidirectional /A | 21 B1 bidirectional /B | 4 A2 bidirectional /MISO | 20 B2 bidirectional /MISO5\n"
        + NEAR
        + "U1 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /B | 2 - output /MISO5\n".replace(
            "U1", "U2"
        )
        + "U6 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /MISO | 4 - output /Y\n"
    )
    (found,) = named(findings_of(text), "translator-direction")
    assert (found.pin, found.outcome) == ("20", Outcome.DAMAGE)


@pytest.mark.parametrize(("volts", "speaks"), [(2.14, True), (2.15, False)])
def test_the_rail_that_a_direction_pin_is_tied_to_reaches_its_high(volts: float, speaks: bool) -> None:
    """0.65 VCCA at 3.3 V is 2.145 V (TI SN74LVC1T45 SCES515: 0.65 VCCI at 1.65 to 1.95 V, taken at every supply)."""
    text = SUPPLIES + NEAR + FAR + "J3 Conn Connector:x | 1 1 passive VX | 2 2 passive GND\n" + T45.format(dir="VX")
    settings = Settings(rails={"VX": Spread.exactly(volts)})
    assert bool(named(findings_of(text, settings), "translator-direction")) is speaks
