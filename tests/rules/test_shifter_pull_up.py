"""shifter-pull-up: speaks and stays quiet."""

from __future__ import annotations

from gauge_cells import BUS, CONTROLLER, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import findings_of, named

OPEN_DRAIN = (
    "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /Z\n"
    "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /Z | 2 - output /Y\n"
)


def test_a_pass_cell_without_a_pull_up_on_the_low_side_speaks_once() -> None:
    without = "\n".join(line for line in PULL_UPS.splitlines() if not line.startswith("R5")) + "\n"
    (finding,) = findings_of(BUS + without + MOSFET_PAIR)
    assert finding.rule == "shifter-pull-up" and "from /SDA to +3V3" in finding.remedy


def test_an_open_drain_without_a_pull_up_speaks() -> None:
    assert named(findings_of(SUPPLIES + OPEN_DRAIN), "shifter-pull-up")


def test_stays_quiet_with_a_pull_up_and_where_a_connector_may_hold_the_line() -> None:
    assert not named(findings_of(SUPPLIES + OPEN_DRAIN + resistor("R1", "10k", "+5V", "/Z")), "shifter-pull-up")
    connector = "J1 Conn_01x02 Connector_Generic:Conn_01x02 | 1 Pin_1 passive /Z | 2 Pin_2 passive GND\n"
    assert not named(findings_of(SUPPLIES + CONTROLLER + OPEN_DRAIN + connector), "shifter-pull-up")
