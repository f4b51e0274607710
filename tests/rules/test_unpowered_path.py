"""unpowered-path: the two halves and the limit are in tests/test_offstates.py; here what the finding says."""

from __future__ import annotations

from gauge_cells import CONTROLLER, INVERTER_5V, resistor
from small_boards import findings_of, named

APART = (
    "J9 USB Connector:USB_B_Micro | 1 VBUS power_out +5V | 5 GND power_in GND\n"
    "J8 Host Connector_Generic:Conn_01x02 | 1 3V3 passive +3V3 | 2 GND passive GND\n"
    "C1 10u Device:C | 1 - passive +3V3 | 2 - passive GND\nC2 10u Device:C | 1 - passive +5V | 2 - passive GND\n"
)


def test_it_names_the_dead_rail_the_current_and_the_condition() -> None:
    text = APART + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", "1k", "/Y", "/A")
    (finding,) = named(findings_of(text), "unpowered-path")
    assert finding.text.startswith("With +3V3 off, 4 mA") and "+3V3 can be off while +5V is on" in finding.condition


def test_stays_quiet_when_one_supply_is_made_from_the_other() -> None:
    made = APART.replace(
        "J8 Host Connector_Generic:Conn_01x02 | 1 3V3 passive +3V3 | 2 GND passive GND",
        "U9 AMS1117-3.3 Regulator_Linear:x | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in +5V",
    )
    text = made + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", "1k", "/Y", "/A")
    assert not named(findings_of(text), "unpowered-path")
