"""Reading times off waveforms."""

from __future__ import annotations

import math

import numpy as np
import pytest

from levelcrossing.waveforms import Waves, last_invalid_s


def test_the_last_invalid_time_counts_not_the_first_crossing() -> None:
    t = np.linspace(0, 8, 801)[:, None]
    v = np.where(t < 1, 0, np.where(t < 2, 3.0, np.where(t < 4, 1.0, 3.0)))
    corners, complete = np.zeros(t.shape, dtype=bool), np.array([True])
    shape = Waves(times=t, volts={"x": v}, corners=corners, count=np.array([801]), complete=complete)
    assert last_invalid_s(shape, "x", 2.0, above=True)[0] == pytest.approx(4.0, abs=0.011)
    assert last_invalid_s(shape, "x", 2.0, above=True, until_s=2.5)[0] == math.inf
    assert last_invalid_s(shape, "x", 2.0, above=True, from_s=5.0)[0] == 5.0


def test_a_crossing_between_coarse_points_is_read_off_a_cubic() -> None:
    """An exponential sampled five times per time constant: the crossing is met within 0.1 % of the time constant."""
    t = np.arange(0, 8, 0.2)[:, None]
    complete, count = np.array([True]), np.array([len(t)])
    shape = Waves(times=t, volts={"x": 1 - np.exp(-t)}, corners=np.zeros(t.shape, bool), count=count, complete=complete)
    for level in (0.1, 0.5, 0.7, 0.9):
        expected = -math.log(1 - level)
        assert last_invalid_s(shape, "x", level, above=True)[0] == pytest.approx(expected, abs=1e-3)


def test_members_have_thresholds_and_directions_of_their_own() -> None:
    t = np.linspace(0, 1, 11)[:, None].repeat(2, axis=1)
    volts = np.stack([t[:, 0], 1 - t[:, 1]], axis=1)
    complete, count = np.array([True, True]), np.array([11, 11])
    shape = Waves(times=t, volts={"x": volts}, corners=np.zeros(t.shape, bool), count=count, complete=complete)
    found = last_invalid_s(shape, "x", np.array([0.25, 0.35]), above=np.array([True, False]))
    assert found == pytest.approx([0.25, 0.65])


def test_a_member_that_is_right_throughout_is_never_late() -> None:
    t = np.linspace(0, 1, 11)[:, None]
    complete, count = np.array([True]), np.array([11])
    shape = Waves(times=t, volts={"x": 5 + t}, corners=np.zeros(t.shape, bool), count=count, complete=complete)
    assert last_invalid_s(shape, "x", 3.0, above=True)[0] == 0.0
