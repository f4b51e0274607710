"""translator-supplies: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES
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


DRIVER = "U4 74LVC1G34 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /X\n"
READER = "U3 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input /Q | 4 - output /Y\n"
SIDES = {"A": "| 1 VCCA power_in +3V3 ", "B": "| 14 VCCB power_in +5V "}
WHOLE = (
    f"U7 TXB0104D Logic_LevelTranslator:x {SIDES['A']}{SIDES['B']}| 7 GND power_in GND"
    " | 8 OE input +3V3 | 2 A1 bidirectional /X | 13 B1 bidirectional /Q\n"
)


@pytest.mark.parametrize("side", ["A", "B"])
@pytest.mark.parametrize(
    ("net", "words"), [("GND", "lies on GND"), ("/alone", "hangs on nothing"), (None, "has no such pin")]
)
def test_a_side_without_supply_is_said_once(side: str, net: str | None, words: str) -> None:
    """Levels that fail for want of that supply are no findings of their own."""
    rail = {"A": "+3V3", "B": "+5V"}[side]
    broken = WHOLE.replace(SIDES[side], SIDES[side].replace(rail, net) if net else "")
    findings = [one for one in findings_of(SUPPLIES + DRIVER + READER + broken) if one.outcome is not Outcome.UNKNOWN]
    assert [(one.rule, one.part) for one in findings] == [("translator-supplies", "U7")]
    assert words in findings[0].text and f"Side {side} of U7" in findings[0].text


def test_both_sides_supplied_stay_quiet() -> None:
    assert not findings_of(SUPPLIES + DRIVER + READER + WHOLE)


def test_a_supply_pin_under_another_name_is_not_called_missing() -> None:
    renamed = WHOLE.replace("VCCB", "VDD_HI")
    assert not named(findings_of(SUPPLIES + DRIVER + READER + renamed), "translator-supplies")
