"""Corners: every tolerance at its extremes, as one batch.

A corner is a column of codes, one per variable: 0 for its low, 1 for its nominal, 2 for its high extreme. Member 0 of a
batch is always the nominal circuit.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from levelcrossing.model import Spread

LOW, NOMINAL, HIGH = 0, 1, 2
# All combinations are taken of this many variables; further ones follow the sign of their influence (2 x 128 members).
FULL_COMBINATIONS = 7
INTERIOR_SAMPLES = 8

# Whole codes choose an extreme; codes between them, for a sweep, stand for values between.
Codes = npt.NDArray[np.int8] | npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Variable:
    """One tolerance.

    Parameters
    ----------
    key : str
        Unique name (``rail +5V``, ``R4``, ``Q1 threshold``).
    spread : Spread
        Its values, in whatever unit the variable has.
    unit : str
        For people: ``V``, ``Ω`` ... ; empty when only "least" and "greatest" make sense.
    """

    key: str
    spread: Spread
    unit: str = ""


def one_at_a_time(count: int) -> Codes:
    """Return the nominal column, then each variable low, then each variable high; shape (count, 1 + 2 count)."""
    codes = np.full((count, 1 + 2 * count), NOMINAL, dtype=np.int8)
    for index in range(count):
        codes[index, 1 + index] = LOW
        codes[index, 1 + count + index] = HIGH
    return codes


def all_corners(count: int) -> Codes:
    """Return the nominal column, all ``2**count`` combinations and a few random mixtures; shape (count, members).

    The mixtures (seeded, so equal from run to run) take each variable low, nominal or high: a quantity need not be
    extreme at the extremes.
    """
    if count == 0:
        return np.full((0, 1), NOMINAL, dtype=np.int8)
    grid = np.indices((2,) * count, dtype=np.int8).reshape(count, -1) * HIGH
    mixtures = np.random.default_rng(20260101).integers(
        0, 3, size=(count, INTERIOR_SAMPLES if count > 2 else 0), dtype=np.int8
    )
    return np.concatenate([np.full((count, 1), NOMINAL, dtype=np.int8), grid.astype(np.int8), mixtures], axis=1)


def chosen_corners(count: int, influence: Sequence[float]) -> Codes:
    """Return corners for more variables than can be combined in full.

    Parameters
    ----------
    count : int
        Number of variables.
    influence : sequence of float
        Change of the result from each variable's low to its high extreme, signed.

    Returns
    -------
    ndarray of int8, shape (count, members)
        All combinations of the most influential variables, twice: the others all pushing the result up, and all down.
    """
    order = sorted(range(count), key=lambda index: -abs(influence[index]))
    leading, rest = order[:FULL_COMBINATIONS], order[FULL_COMBINATIONS:]
    grid = all_corners(len(leading))
    codes = np.full((count, 2 * grid.shape[1]), NOMINAL, dtype=np.int8)
    for row, index in enumerate(leading):
        codes[index] = np.concatenate([grid[row], grid[row]])
    half = grid.shape[1]
    for index in rest:
        codes[index, 1:half] = HIGH if influence[index] >= 0 else LOW
        codes[index, half + 1 :] = LOW if influence[index] >= 0 else HIGH
    return codes


def values_of(spread: Spread, codes: Codes) -> npt.NDArray[np.float64]:
    """Return the values that one row of codes stands for; codes that are no whole numbers stand for values between."""
    values = np.array([spread.low, spread.nominal, spread.high])
    if np.issubdtype(codes.dtype, np.floating):
        return np.asarray(np.interp(codes, [LOW, NOMINAL, HIGH], values), dtype=np.float64)
    chosen: npt.NDArray[np.float64] = values[codes]
    return chosen


def in_words(variables: Sequence[Variable], column: Sequence[int], influence: Sequence[float] | None = None) -> str:
    """Describe a corner for people: ``+5V at 5.25 V, R1 at 1.01 kΩ``; at most four, the most influential first."""
    from levelcrossing.units import format_si

    order = range(len(variables))
    if influence is not None:
        order = sorted(order, key=lambda index: -abs(influence[index]))  # type: ignore[assignment]
    words: list[str] = []
    for index in order:
        variable, code = variables[index], int(column[index])
        if code == NOMINAL or variable.spread.low == variable.spread.high:
            continue
        if influence is not None and abs(influence[index]) < 1e-3 and words:
            continue
        value = (variable.spread.low, variable.spread.nominal, variable.spread.high)[code]
        if variable.unit == "V":
            words.append(f"{variable.key} at {value:.2f} V")
        elif variable.unit:
            words.append(f"{variable.key} at {format_si(value, variable.unit)}")
        else:
            words.append(f"{variable.key} at its {'least' if code == LOW else 'greatest'}")
        if len(words) == 4:
            break
    return ", ".join(words)
