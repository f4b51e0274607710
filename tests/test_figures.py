"""Figures of a crossing move, or they do not."""

from __future__ import annotations

import pytest
from kiln_logger import row

from levelcrossing.figures import differs, figures_of, worst_margin


@pytest.mark.parametrize(
    ("before", "after", "unit", "moved"),
    [
        (3.3, 3.3019, "V", False),
        (3.3, 3.3021, "V", True),
        (1e6, 1.004e6, "bit/s", False),
        (1e6, 1.006e6, "bit/s", True),
        (1e-9, 5e-9, "A", False),
        (1e-3, 1.1e-3, "A", True),
        (None, 1.0, "V", True),
        (None, None, "V", False),
    ],
)
def test_rounding_is_no_change(before: float | None, after: float | None, unit: str, moved: bool) -> None:
    assert differs(before, after, unit) is moved


def test_the_worst_margin_is_that_of_the_nearest_limit() -> None:
    """High 3.1 V over VIH 2.31 V, low 0.1 V under VIL 0.99 V, 3.4 V under a rating of 3.6 V."""
    assert worst_margin(row()) == pytest.approx(0.2)
    assert worst_margin(row(top=5.25)) == pytest.approx(3.6 - 5.25)
    assert worst_margin(row(top=2.5)) == pytest.approx(2.5 - 0.3 - 2.31)


def test_the_voltage_without_clamps_is_held_against_the_rating() -> None:
    clamped = row(top=3.7) | {
        "states": {"high": {"open_volts": {"max": 5.25}, "clamp_amps": {"max": 2e-3}, "solved": True}}
    }
    figures = {figure.name: figure for figure in figures_of(None, clamped)}
    assert figures["voltage, greatest"].after == 5.25
    assert figures["clamp current, greatest"].after == 2e-3
    assert "usable rate" not in figures
    unsolved = row() | {"states": {"high": {"open_volts": {"max": 9.0}, "solved": False}}}
    assert {figure.name: figure.after for figure in figures_of(None, unsolved)}["voltage, greatest"] == 3.4
