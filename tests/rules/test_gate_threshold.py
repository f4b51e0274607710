"""gate-threshold: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import BUS, MOSFET_PAIR, PULL_UPS
from small_boards import findings_of, named


@pytest.mark.parametrize(("part", "speaks"), [("2N7000", True), ("2N7002", False), ("BSS138", False)])
def test_at_a_3_3_v_gate(part: str, speaks: bool) -> None:
    """Greatest thresholds 3.0 V, 2.5 V, 1.5 V (onsemi 2N7000, 2N7002, BSS138 data sheets) against 3.23 V less the low."""
    assert bool(named(findings_of(BUS + PULL_UPS + MOSFET_PAIR.replace("BSS138", part)), "gate-threshold")) is speaks


LOW = (
    "J9 USB Connector:USB_B_Micro | 1 VBUS power_out +5V | 5 GND power_in GND\n"
    "U9 AP2112K-{volts} Regulator_Linear:x | 1 VIN power_in +5V | 2 GND power_in GND | 3 EN input +5V | 5 VOUT power_out VLOW\n"
    "C1 10u Device:C | 1 - passive VLOW | 2 - passive GND\nC2 10u Device:C | 1 - passive +5V | 2 - passive GND\n"
    "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input GND | 4 - output /HI\n"
    "U2 74LVC1G17 74xGxx:x | 5 VCC power_in VLOW | 3 GND power_in GND | 2 - input /LO | 4 - output /Y\n"
    "Q1 BSS138 Transistor_FET:BSS138 | 1 G passive VLOW | 2 S passive /LO | 3 D passive /HI\n"
    "R1 10k Device:R | 1 - passive VLOW | 2 - passive /LO\nR2 10k Device:R | 1 - passive +5V | 2 - passive /HI\n"
)


@pytest.mark.parametrize(("volts", "speaks"), [("1.8", False), ("1.5", True)])
def test_a_bss138_needs_1_5_v_and_something_over(volts: str, speaks: bool) -> None:
    assert bool(named(findings_of(LOW.format(volts=volts)), "gate-threshold")) is speaks
