"""input-floating: speaks and stays quiet."""

from __future__ import annotations

from gauge_cells import SUPPLIES, resistor
from small_boards import findings_of, named

GATE = "U1 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /N | 2 - output /Y\n"


def test_a_lone_logic_input_speaks() -> None:
    (finding,) = named(findings_of(SUPPLIES + GATE), "input-floating")
    assert (finding.part, finding.pin) == ("U1", "1")


def test_stays_quiet_when_anything_holds_the_net() -> None:
    assert not named(findings_of(SUPPLIES + GATE + resistor("R1", "10k", "/N", "GND")), "input-floating")
    connector = "J1 Conn_01x02 Connector_Generic:Conn_01x02 | 1 Pin_1 passive /N | 2 Pin_2 passive GND\n"
    assert not named(findings_of(SUPPLIES + GATE + connector), "input-floating")


def test_stays_quiet_on_a_lone_input_of_an_interface_part() -> None:
    """Modem inputs of serial adapters are pulled up inside (maker's data sheets)."""
    adapter = "U5 CH340G Interface_USB:CH340G | 16 VCC power_in +5V | 1 GND power_in GND | 9 ~{CTS} input /CTS\n"
    assert not named(findings_of(SUPPLIES + adapter), "input-floating")
