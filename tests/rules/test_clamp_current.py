"""clamp-current: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Finding, Outcome


def through(ohms: str) -> list[Finding]:
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", ohms, "/Y", "/A")
    return named(findings_of(text), "clamp-current")


# (5 V - 3.3 V - about 0.65 V) / R crosses 1 mA near 1.05 kilohm (closed form; 1 mA is common practice).
@pytest.mark.parametrize(
    ("ohms", "outcome"), [("910", Outcome.DAMAGE), ("1.2k", Outcome.MARGINAL), ("10k", Outcome.MARGINAL)]
)
def test_above_1_ma_it_is_damage_and_below_marginal(ohms: str, outcome: Outcome) -> None:
    assert [finding.outcome for finding in through(ohms)] == [outcome]


def test_stays_quiet_when_the_diode_does_not_conduct() -> None:
    divider = resistor("R1", "1.8k", "/Y", "/A") + resistor("R2", "3.3k", "/A", "GND")
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + divider
    assert not named(findings_of(text), "clamp-current")


def test_a_stiff_driver_is_left_to_input_overvoltage() -> None:
    assert through("47") == []


@pytest.mark.parametrize("diode", ["BAT54", "BAT85", "1N5819", "1N4148"])
def test_a_diode_that_blocks_the_high_is_no_clamp_current(diode: str) -> None:
    """A diode shifter: its cathode at the 5 V output, a pull-up to 3.3 V (common practice); only leakage flows back."""
    text = (
        SUPPLIES
        + CONTROLLER
        + INVERTER_5V.format(out="/Y")
        + f"D1 {diode} Diode:{diode} | 1 K passive /Y | 2 A passive /A\n"
        + resistor("R1", "10k", "+3V3", "/A")
    )
    assert not named(findings_of(text), "clamp-current")
