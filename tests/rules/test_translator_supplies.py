"""translator-supplies: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread

TXB = (
    "U7 TXB0104D Logic_LevelTranslator:TXB0104D | 1 VCCA power_in VA | 14 VCCB power_in VB | 7 GND power_in GND | 8 OE input VA"
    " | 2 A1 bidirectional /A | 13 B1 bidirectional /B\nC1 1u Device:C | 1 - passive VA | 2 - passive GND\nC2 1u Device:C | 1 - passive VB | 2 - passive GND\n"
)


@pytest.mark.parametrize(
    ("a", "b", "outcome"),
    [(1.8, 3.3, None), (3.3, 3.3, None), (3.3, 5.0, None), (3.3, 1.8, Outcome.MALFUNCTION), (3.6, 5.0, None), (3.7, 5.0, Outcome.DAMAGE), (1.0, 3.3, Outcome.MALFUNCTION)],
)  # fmt: skip
def test_range_and_order_of_a_txb0104(a: float, b: float, outcome: Outcome | None) -> None:
    """VCCA 1.2 to 3.6 V, VCCB 1.65 to 5.5 V, VCCA <= VCCB (TI TXB0104 SCES650); 2 % over is a round figure missed."""
    settings = Settings(rails={"VA": Spread.exactly(a), "VB": Spread.exactly(b)}, rail_tolerance=0.0)
    assert [finding.outcome for finding in named(findings_of(TXB, settings), "translator-supplies")] == (
        [outcome] if outcome else []
    )
