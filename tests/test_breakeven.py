"""Up to which parameter a level holds: against functions whose answer is known, and in whole findings."""

from __future__ import annotations

import re

import numpy as np
import pytest
from gauge_cells import BIPOLAR_CELL, BUS, PULL_UPS
from small_boards import case_of, findings_of, named

from levelcrossing.breakeven import break_even
from levelcrossing.corners import HIGH, Codes, Variable, values_of
from levelcrossing.model import Spread

THRESHOLD = Variable(key="Q1 threshold", spread=Spread(low=0.8, nominal=1.3, high=1.5), unit="V")
RAIL = Variable(key="+3V3", spread=Spread(low=3.2, nominal=3.3, high=3.4), unit="V")
WORST = np.array([HIGH, HIGH], dtype=np.int8)


@pytest.mark.parametrize(("limit", "sign", "words"), [(1.42, -1, "below 1.42 V"), (1.0, 1, "above 1 V")])
def test_the_value_at_which_a_known_margin_turns(limit: float, sign: int, words: str) -> None:
    def margin_of(codes: Codes) -> np.ndarray:
        return sign * (values_of(THRESHOLD.spread, codes[1]) - limit) ** 3  # bent, but its zero is known

    said = break_even(margin_of, [RAIL, THRESHOLD], WORST)
    assert said == f"it holds while VGS(th) of Q1 is {words} (0.8 V to 1.5 V in its data)"


def test_nothing_is_said_where_no_parameter_of_a_transistor_decides() -> None:
    assert not break_even(lambda codes: -np.ones(codes.shape[1]), [RAIL, THRESHOLD], WORST)
    assert not break_even(lambda codes: 3.3 - values_of(RAIL.spread, codes[0]), [RAIL, THRESHOLD], WORST)
    # a margin that turns twice has no one value
    assert not break_even(lambda codes: np.cos(codes[1] * 6), [RAIL, THRESHOLD], WORST)


@pytest.mark.parametrize("base", ["10k", "22k"])
def test_a_finding_states_the_gain_that_would_do(base: str) -> None:
    """Base current times reverse gain must carry the pull-up's current, less what VIL leaves across it."""
    text = BUS + PULL_UPS + BIPOLAR_CELL.format(base="+3V3").replace("1k", base)
    (found,) = named(findings_of(text), "low-not-reached")
    stated = re.search(r"it holds while the reverse gain of Q1 is above ([\d.]+) \(([\d.]+) to ([\d.]+)", found.text)
    assert found.outcome.value == "marginal" and stated is not None
    needed, least, greatest = (float(number) for number in stated.groups())
    assert least < needed < greatest
    # 0.65 V across the junction; the collector is the 5 V side's low, the emitter the 3.3 V side at VIL.
    ohms = float(base[:-1]) * 1e3
    crossing = next(one for one in case_of(text).crossings if one.crossing.receiver.number == "18")
    assert crossing.vil is not None
    for rail in (3.23, 3.37):
        base_amps = (rail - 0.04 - 0.65) / ohms
        emitter_amps = (rail - crossing.vil.nominal) / 9.9e3
        if emitter_amps / base_amps == pytest.approx(needed, rel=0.12):
            return
    pytest.fail("no corner of the supply explains the stated gain")


def test_a_diode_beside_the_transistor_keeps_its_corner() -> None:
    text = BUS + PULL_UPS + BIPOLAR_CELL.format(base="+3V3").replace("1k", "22k")
    text += "D1 BAT54 Diode:BAT54 | 1 K passive +5V | 2 A passive /SDA5\n"
    (found,) = named(findings_of(text), "low-not-reached")
    assert "it holds while the reverse gain of Q1" in found.text
