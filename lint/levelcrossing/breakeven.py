"""Up to which value of a transistor's parameter a level still holds, where the verdict hangs on it."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from levelcrossing.corners import HIGH, LOW, Codes, Variable
from levelcrossing.units import format_volts

Vector = npt.NDArray[np.float64]
# Values tried over a parameter's range, then again between the two that enclose the change.
SAMPLES = 17


def break_even(margin_of: Callable[[Codes], Vector], variables: Sequence[Variable], worst: Codes) -> str:
    """Say at which value of a threshold or gain a margin that fails in a corner becomes positive.

    Parameters
    ----------
    margin_of : callable
        Margin [V] of a batch of corners; codes between low (0), nominal (1) and high (2) stand for values between.
    variables : sequence of Variable
    worst : ndarray, shape (variables,)
        Codes of the corner that fails; every other tolerance stays there.

    Returns
    -------
    str
        ``it holds while VGS(th) of Q1 is below 2.6 V (0.8 V to 3 V in its data)``; empty when no single parameter
        decides.
    """
    for row, variable in enumerate(variables):
        said = _in_words(variable, variables)
        if not said or variable.spread.low == variable.spread.high:
            continue
        codes = np.linspace(LOW, HIGH, SAMPLES)
        margins = margin_of(_varied(worst, row, codes))
        turns = np.flatnonzero(np.diff(margins >= 0))
        if turns.size != 1:
            continue
        first = int(turns[0])
        codes = np.linspace(codes[first], codes[first + 1], SAMPLES)
        margins = margin_of(_varied(worst, row, codes))
        turns = np.flatnonzero(np.diff(margins >= 0))
        if turns.size != 1:
            continue
        first = int(turns[0])
        rises = margins[first + 1] > margins[first]
        at = float(np.interp(0.0, np.sort(margins[first : first + 2]), codes[first : first + 2][:: 1 if rises else -1]))
        spread = variable.spread
        value = float(np.interp(at, [LOW, 1, HIGH], [spread.low, spread.nominal, spread.high]))
        way = "above" if rises else "below"
        if variable.unit == "V":
            return f"it holds while {said} is {way} {format_volts(value)} ({format_volts(spread.low)} to {format_volts(spread.high)} in its data)"
        return f"it holds while {said} is {way} {value:.2g} ({spread.low:.2g} to {spread.high:.2g} in its data)"
    return ""


def _in_words(variable: Variable, variables: Sequence[Variable]) -> str:
    """Name a parameter as data sheets do; empty for what is no parameter of a transistor that people look up."""
    part, _, what = variable.key.partition(" ")
    if what == "threshold":
        return f"VGS(th) of {part}"
    if what == "gain" and all(other.key != f"{part} threshold" for other in variables):
        return f"hFE of {part}"
    if what == "reverse gain":
        return f"the reverse gain of {part}"
    return ""


def _varied(worst: Codes, row: int, codes: Vector) -> npt.NDArray[np.float64]:
    grid = np.repeat(np.asarray(worst, dtype=float)[:, None], codes.size, axis=1)
    grid[row] = codes
    return grid
