"""Words and figures of the reports for people."""

from __future__ import annotations

import pytest

from levelcrossing.model import Spread
from levelcrossing.reports.phrases import places, plain_number, quantity, span


@pytest.mark.parametrize(
    ("names", "text"),
    [
        ([], ""),
        (["U2.7"], "U2.7"),
        (["J1.1", "J1.2", "J1.3", "U2.7"], "J1 pins 1 to 3, U2.7"),
        (["J1.2", "J1.1"], "J1 pins 1, 2"),
        (["J1.10", "J1.9", "J1.8", "J1.A4"], "J1 pins 8 to 10, A4"),
        (["P1.A2", "P1.A3", "P1.A4", "P1.B5", "P1.C6"], "P1 pins A2 to A4, B5, C6"),
        (["P1.01", "P1.02", "P1.03"], "P1 pins 01, 02, 03"),
        (["5.0V/3.3V1.4"], "5.0V/3.3V1.4"),
        (["R7", "R8"], "R7, R8"),
        (["U1.1", "U1.1"], "U1.1"),
        (
            [f"J1.{number}" for number in range(1, 60, 2)],
            "J1 pins 1, 3, 5, 7, 9, 11, 13, 15, 17, 19, 21, 23 and 18 more",
        ),
    ],
)
def test_places_in_few_words(names: list[str], text: str) -> None:
    assert places(names) == text


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (4700.0, "4.7 kΩ"),
        (0.0, "0 Ω"),
        (1e6, "1 MΩ"),
        (999.9, "1 kΩ"),
        (0.01, "10 mΩ"),
        (1e-15, "0.001 pΩ"),
        (150.0, "150 Ω"),
    ],
)
def test_quantities_have_prefixes(value: float, text: str) -> None:
    assert quantity(value, "Ω") == text


def test_numbers_without_needless_zeros() -> None:
    assert [plain_number(value) for value in (3.30, 5.0, -0.001, 12.345, 100.0)] == ["3.3", "5", "0", "12.35", "100"]


def test_a_spread_without_width_is_one_figure() -> None:
    assert span(Spread.exactly(1.8)) == "1.8 V"
    assert span(Spread(low=4.75, nominal=5, high=5.25)) == "4.75 to 5.25 V"
