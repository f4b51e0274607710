"""Waveforms and what is read off them.

A delay is the *last* time at which a level is not valid, counted from the start of the driver's edge: an overshoot or a
plateau that is crossed twice does not flatter it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from levelcrossing.arrays import Flags, Index
from levelcrossing.network import Value, Vector


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Waves:
    """Waveforms of a batch, each member with its own times.

    Parameters
    ----------
    times : ndarray, shape (points, batch)
        Times [s]; points beyond a member's ``count`` repeat its last one.
    volts : mapping from node to ndarray, shape (points, batch)
        Voltages [V].
    corners : ndarray of bool, shape (points, batch)
        Points at which a driver's waveform has a corner.
    count : ndarray of int, shape (batch,)
    complete : ndarray of bool, shape (batch,)
        False where integration gave up.
    """

    times: Vector
    volts: Mapping[str, Vector]
    corners: Flags
    count: npt.NDArray[np.intp]
    complete: Flags


def last_invalid_s(
    waves: Waves,
    node: str,
    level_volts: Value,
    above: Flags | bool,
    *,
    from_s: Vector | float = -np.inf,
    until_s: Vector | float = np.inf,
) -> Vector:
    """Return the last time at which a node is on the wrong side of a level.

    Parameters
    ----------
    waves : Waves
    node : str
    level_volts : float or ndarray, shape (batch,)
        The level [V].
    above : bool or ndarray of bool
        Whether the right side is above the level (else below).
    from_s, until_s : float or ndarray
        Only this window counts [s].

    Returns
    -------
    ndarray, shape (batch,)
        Time [s]; ``from_s`` (or 0) when the node is right throughout, infinity when it is wrong at the end.
    """
    t, v = waves.times, waves.volts[node]
    points, batch = t.shape
    sign = np.where(np.broadcast_to(np.asarray(above), (batch,)), 1.0, -1.0)
    level = np.broadcast_to(np.asarray(level_volts, dtype=float), (batch,))
    short = sign * (level - v)
    begin = np.broadcast_to(np.asarray(from_s, dtype=float), (batch,))
    finish = np.broadcast_to(np.asarray(until_s, dtype=float), (batch,))
    tiny = 1e-9 * np.where(np.isfinite(finish), finish, t[-1])
    used = (np.arange(points)[:, None] < waves.count) & (t >= begin - tiny) & (t <= finish + tiny)
    wrong = used & (short > 0)
    any_wrong = wrong.any(axis=0)
    index = points - 1 - np.argmax(wrong[::-1], axis=0)
    last_used = points - 1 - np.argmax(used[::-1], axis=0)
    at_end = any_wrong & (index >= last_used)
    columns = np.arange(batch)
    cross = _crossing(waves, v, np.minimum(index, points - 2), level, columns)
    never = np.where(np.isfinite(begin), begin, 0.0)
    return np.where(at_end, np.inf, np.where(any_wrong, cross, never))


def _crossing(waves: Waves, v: Vector, index: Index, level: Vector, columns: Index) -> Vector:
    """Return when ``v`` passes ``level`` between points ``index`` and the next, by a cubic through four points.

    Where a driver's corner or the end of the record is near, fewer points are used; the cubic is inverted by bisection
    and confined to the interval.
    """
    t = waves.times
    ta, tb = t[index, columns], t[index + 1, columns]
    va, vb = v[index, columns], v[index + 1, columns]
    width = np.where(tb > ta, tb - ta, 1.0)
    # Hermite slopes from neighbours on the same side of a corner; the chord where there is none.
    chord = (vb - va) / width
    before = np.maximum(index - 1, 0)
    tz, vz = t[before, columns], v[before, columns]
    left_ok = (index > 0) & ~waves.corners[index, columns] & (tz < ta)
    gap = np.where(left_ok, ta - tz, 1.0)
    earlier = (va - vz) / gap
    slope_a = np.where(left_ok, (earlier * width + chord * gap) / (gap + width), chord)
    after = np.minimum(index + 2, len(t) - 1)
    tc, vc = t[after, columns], v[after, columns]
    right_ok = (index + 2 < waves.count) & ~waves.corners[index + 1, columns] & (tc > tb)
    gap = np.where(right_ok, tc - tb, 1.0)
    later = (vc - vb) / gap
    slope_b = np.where(right_ok, (later * width + chord * gap) / (gap + width), chord)
    # A missing neighbour leaves a parabola: its end slopes average to the chord.
    slope_a = np.where(left_ok, slope_a, np.where(right_ok, 2 * chord - slope_b, chord))
    slope_b = np.where(right_ok, slope_b, np.where(left_ok, 2 * chord - slope_a, chord))
    lo, hi = np.zeros_like(ta), np.ones_like(ta)
    starts_below = va < level
    for _ in range(40):
        mid = 0.5 * (lo + hi)
        s2, s3 = mid * mid, mid * mid * mid
        value = (
            (2 * s3 - 3 * s2 + 1) * va
            + (s3 - 2 * s2 + mid) * width * slope_a
            + (3 * s2 - 2 * s3) * vb
            + (s3 - s2) * width * slope_b
        )
        still = (value < level) == starts_below
        lo, hi = np.where(still, mid, lo), np.where(still, hi, mid)
    crossing: Vector = ta + 0.5 * (lo + hi) * width
    return crossing
