"""translator-direction: speaks and stays quiet."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES
from small_boards import findings_of, named

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
