from __future__ import annotations

import numpy as np

from levelcrossing.corners import (
    FULL_COMBINATIONS,
    HIGH,
    LOW,
    NOMINAL,
    Variable,
    all_corners,
    chosen_corners,
    in_words,
    one_at_a_time,
    values_of,
)
from levelcrossing.model import Spread


def test_member_0_is_always_nominal() -> None:
    for codes in (one_at_a_time(4), all_corners(4), chosen_corners(10, [1.0] * 10)):
        assert (codes[:, 0] == NOMINAL).all()


def test_all_corners_hold_every_combination_once_and_are_the_same_from_run_to_run() -> None:
    codes = all_corners(3)
    extremes = [tuple(column) for column in codes.T if NOMINAL not in column]
    assert set(extremes) >= {(a, b, c) for a in (LOW, HIGH) for b in (LOW, HIGH) for c in (LOW, HIGH)}
    assert np.array_equal(codes, all_corners(3))


def test_with_many_variables_the_less_influential_ones_push_one_way_together() -> None:
    influence = [float(10 - index) for index in range(FULL_COMBINATIONS)] + [0.5, -0.25]
    codes = chosen_corners(len(influence), influence)
    pushing_up = {tuple(column) for column in codes[-2:, 1:].T}
    assert pushing_up == {(HIGH, LOW), (LOW, HIGH), (NOMINAL, NOMINAL)}


def test_values_follow_codes() -> None:
    spread = Spread(low=1.0, nominal=2.0, high=4.0)
    assert values_of(spread, np.array([0, 1, 2], dtype=np.int8)).tolist() == [1.0, 2.0, 4.0]


def test_a_corner_in_words_names_the_most_influential_first_and_leaves_out_the_nominal() -> None:
    variables = [
        Variable(key="R1", spread=Spread(low=990.0, nominal=1000.0, high=1010.0), unit="Ω"),
        Variable(key="+5V", spread=Spread(low=4.75, nominal=5.0, high=5.25), unit="V"),
        Variable(key="Q1 gain", spread=Spread(low=1.0, nominal=2.0, high=3.0)),
    ]
    words = in_words(variables, [HIGH, HIGH, LOW], [0.1, 1.0, 0.5])
    assert words == "+5V at 5.25 V, Q1 gain at its least, R1 at 1.01 kΩ"
    assert in_words(variables, [NOMINAL, HIGH, NOMINAL], [0.1, 1.0, 0.5]) == "+5V at 5.25 V"
