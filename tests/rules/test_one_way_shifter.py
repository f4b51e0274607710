"""one-way-shifter: speaks and stays quiet."""

from __future__ import annotations

from gauge_cells import BUS, CLOCK_5V, CONTROLLER, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import findings_of, named

# A diode passes the clock chip's low to the controller, but not the controller's low to the clock chip.
ONE_WAY = (
    SUPPLIES
    + CONTROLLER
    + CLOCK_5V
    + "D1 BAT54 Diode:BAT54 | 1 K passive /SDA5 | 2 A passive /SDA\n"
    + resistor("R1", "10k", "+3V3", "/SDA")
    + resistor("R2", "10k", "+5V", "/SDA5")
)


def test_data_behind_a_diode_speaks() -> None:
    assert named(findings_of(ONE_WAY), "one-way-shifter")


def test_a_mosfet_pair_stays_quiet() -> None:
    assert not named(findings_of(BUS + PULL_UPS + MOSFET_PAIR), "one-way-shifter")
