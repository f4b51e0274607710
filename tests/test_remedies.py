from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Spread
from levelcrossing.remedies import divider
from levelcrossing.units import E24


def test_a_proposed_divider_holds_its_window_at_every_corner_with_preferred_values() -> None:
    high, vih, vmax = Spread(low=4.75, nominal=5.0, high=5.25), 2.31, 3.43
    found = divider(high, vih, vmax)
    assert found is not None
    top, bottom, usual = found
    for volts in (high.low, high.high):
        for a in (0.99, 1.01):
            for b in (0.99, 1.01):
                level = volts * bottom * b / (bottom * b + top * a)
                assert vih <= level <= vmax
    assert usual == pytest.approx(5.0 * bottom / (top + bottom))
    assert all(
        any(value == pytest.approx(step * 10**power) for step in E24 for power in range(6)) for value in (top, bottom)
    )


def test_no_divider_is_proposed_where_none_can_hold() -> None:
    assert divider(Spread(low=2.0, nominal=5.0, high=8.0), 2.5, 3.0) is None


def test_a_finding_carries_the_computed_values() -> None:
    over = named(findings_of(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A")), "input-overvoltage")
    assert "divider of" in over[0].remedy and "Ω" in over[0].remedy
