from __future__ import annotations

import re

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.dividers import divider
from levelcrossing.model import Outcome, Settings, Spread
from levelcrossing.units import E24, SERIES


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


@pytest.mark.parametrize("rate", [None, 1e6, 8e6, 20e6])
def test_the_proposed_divider_put_in_settles_the_finding(rate: float | None) -> None:
    settings = Settings(rates=(("/A", rate),)) if rate else Settings()
    (over,) = named(findings_of(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A"), settings), "input-overvoltage")
    found = re.search(r"([\d.]+) (k?)Ω in series and ([\d.]+) (k?)Ω to ground", over.remedy)
    assert found is not None
    top, bottom = found[1] + (found[2] or "R"), found[3] + (found[4] or "R")
    mended = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y")
    mended += resistor("R1", top, "/Y", "/A") + resistor("R2", bottom, "/A", "GND")
    assert not [one for one in findings_of(mended, settings) if one.outcome is not Outcome.UNKNOWN]


def test_no_divider_is_proposed_that_is_too_slow() -> None:
    settings = Settings(rates=(("/A", 400e6),))
    (over,) = named(findings_of(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A"), settings), "input-overvoltage")
    assert "divider" not in over.remedy and "buffer" in over.remedy


@pytest.mark.parametrize("series", ["E24", "E96"])
def test_a_divider_is_made_of_the_series_asked_for(series: str) -> None:
    """IEC 60063."""
    found = divider(Spread.around(5.0, 0.05), 2.31, 3.43, series=series)
    assert found is not None
    for value in found[:2]:
        assert any(value == pytest.approx(step * 10**power) for step in SERIES[series] for power in range(6))


def test_the_driver_s_own_resistance_counts() -> None:
    """V R2 / (R1 + R2 + output): 2.5 V at 5 V when the output is as large as the rest."""
    none = divider(Spread.exactly(5.0), 2.45, 2.55)
    large = divider(Spread.exactly(5.0), 2.45, 2.55, output_ohms=Spread.exactly(1000.0))
    assert none is not None and large is not None
    assert large[2] == pytest.approx(5.0 * large[1] / (large[0] + large[1] + 1000.0))
    assert none[2] == pytest.approx(5.0 * none[1] / (none[0] + none[1]))
    assert large[1] > large[0]
