"""driver-conflict: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import INVERTER_5V, SUPPLIES, resistor
from small_boards import findings_of, named

SECOND = "U4 74HC04 74xx:74HC04 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input GND | 2 - output {out}\n"


def test_two_outputs_on_one_net_speak_once() -> None:
    assert (
        len(named(findings_of(SUPPLIES + INVERTER_5V.format(out="/Y") + SECOND.format(out="/Y")), "driver-conflict"))
        == 1
    )


@pytest.mark.parametrize(("ohms", "speaks"), [("91", True), ("100", False)])
def test_the_limit_is_100_ohms_between_them(ohms: str, speaks: bool) -> None:
    text = SUPPLIES + INVERTER_5V.format(out="/Y") + SECOND.format(out="/Z") + resistor("R1", ohms, "/Y", "/Z")
    assert bool(named(findings_of(text), "driver-conflict")) is speaks


def test_stays_quiet_when_one_can_let_go() -> None:
    tri = "U4 74HC1G125 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 1 - input /EN | 2 - input GND | 4 - tri_state /Y\n"
    assert not named(findings_of(SUPPLIES + INVERTER_5V.format(out="/Y") + tri), "driver-conflict")
    drain = "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input GND | 4 - output /Y\n"
    assert not named(findings_of(SUPPLIES + INVERTER_5V.format(out="/Y") + drain), "driver-conflict")
