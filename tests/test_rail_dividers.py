"""The output of an adjustable regulator is the textbook's, and its divider is found among what stands beside it."""

from __future__ import annotations

from dataclasses import replace

import pytest
from small_boards import BOOK, board_of

from levelcrossing.model import RegulatorFacts, Settings, Spread
from levelcrossing.rail_dividers import Divider, feedback_volts, read_divider
from levelcrossing.rail_links import Joints
from levelcrossing.rail_scene import Scene

BUCK = "U1 TPS62125DSG Regulator:TPS62125 | 1 VIN power_in +12V | 2 GND power_in GND | 3 SW output SWN | 4 FB input FBN"
TANK = "C1 22u Device:C | 1 - passive VOUT1 | 2 - passive GND"
TOP = "R1 31k6 Device:R | 1 - passive VOUT1 | 2 - passive FBN"
BOTTOM = "R2 10k Device:R | 1 - passive FBN | 2 - passive GND"


def adjustable(formula: str, reference: Spread, adjust_amps: float = 0.0) -> RegulatorFacts:
    facts = BOOK.regulator(board_of(BUCK).parts[0])
    assert facts is not None
    return replace(facts, formula=formula, reference=reference, adjust_amps=adjust_amps)


def test_ground_referred_divider_is_the_textbook_formula() -> None:
    """0.8 V (1 + 52.3 k / 10 k) = 4.984 V."""
    volts = feedback_volts(
        adjustable("ground-referred", Spread.exactly(0.8)), Spread.exactly(52.3e3), Spread.exactly(10e3)
    )
    assert volts.nominal == pytest.approx(4.984)
    assert volts.low == pytest.approx(volts.high)


def test_floating_divider_is_the_textbook_formula() -> None:
    """1.25 V (1 + 720 / 240) + 50 uA * 720 = 5.036 V."""
    facts = adjustable("floating", Spread.exactly(1.25), 50e-6)
    assert feedback_volts(facts, Spread.exactly(240), Spread.exactly(720)).nominal == pytest.approx(5.036)


def test_spread_of_a_divider_takes_the_worst_of_reference_and_resistors() -> None:
    """1 % resistors 1:1 and a reference of 0.6 V +-2 %: 0.588 (1 + 0.99/1.01) to 0.612 (1 + 1.01/0.99)."""
    facts = adjustable("ground-referred", Spread.around(0.6, 0.02))
    volts = feedback_volts(facts, Spread.around(10e3, 0.01), Spread.around(10e3, 0.01))
    assert volts.low == pytest.approx(0.588 * (1 + 0.99 / 1.01))
    assert volts.high == pytest.approx(0.612 * (1 + 1.01 / 0.99))


def divider(*lines: str, output: str = "VOUT1") -> Divider | None:
    scene = Scene(board_of("\n".join((BUCK, TANK, *lines))), BOOK, Settings())
    return read_divider(scene, Joints(scene), "FBN", output, {"+12V"})


def test_both_resistors_with_their_tolerance() -> None:
    found = divider(TOP, BOTTOM.replace("10k", "10k/0.1%"))
    assert found is not None
    assert (found.top.low, found.top.nominal, found.top.high) == pytest.approx((31284, 31600, 31916))
    assert (found.bottom.low, found.bottom.high) == pytest.approx((9990, 10010))
    assert found.words == "R1 31.6 kΩ over R2 10 kΩ"


def test_the_top_is_found_when_the_output_is_not_known() -> None:
    found = divider(TOP, BOTTOM, output="")
    assert found is not None
    assert found.top_net == "VOUT1"


def test_a_sense_resistor_may_stand_before_the_divider() -> None:
    sense = "R7 0R1 Device:R | 1 - passive RAW | 2 - passive VOUT1"
    assert divider(TOP, BOTTOM, sense, output="RAW") is not None
    assert divider(TOP, BOTTOM, sense.replace("0R1", "47k"), output="RAW") is None


@pytest.mark.parametrize(
    "lines",
    [
        (TOP,),  # nothing to ground
        (BOTTOM,),  # nothing to the output
        (TOP, BOTTOM.replace("10k", "?")),
        (TOP, BOTTOM, BOTTOM.replace("R2 10k", "R3 ?")),  # an unread one beside a read one
        (TOP, "RV1 10k Device:R_Potentiometer | 1 - passive FBN | 2 - passive GND | 3 - passive GND"),
    ],
)
def test_what_cannot_be_read_gives_nothing(lines: tuple[str, ...]) -> None:
    assert divider(*lines) is None
