"""Small quantities: how sure, how bad, from where to where, which level, which place."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from enum import StrEnum
from typing import Any


class Basis(StrEnum):
    """Where a figure came from; the order of definition is from strongest to weakest."""

    DECLARED = "declared"
    LIBRARY = "library"
    TRACED = "traced"
    ASSUMED = "assumed"

    @property
    def rank(self) -> int:
        """Position from strongest (0) to weakest (3)."""
        return list(Basis).index(self)

    @staticmethod
    def weakest(*bases: Basis) -> Basis:
        """Return the weakest of several; ``DECLARED`` when there are none."""
        return max(bases, key=lambda basis: basis.rank, default=Basis.DECLARED)


class Outcome(StrEnum):
    """A verdict, from worst to best."""

    DAMAGE = "damage"
    MALFUNCTION = "malfunction"
    MARGINAL = "marginal"
    UNKNOWN = "unknown"
    SOUND = "sound"

    @property
    def rank(self) -> int:
        """Position from worst (0) to best (4)."""
        return list(Outcome).index(self)

    @staticmethod
    def worst(*outcomes: Outcome) -> Outcome:
        """Return the worst of several; ``SOUND`` when there are none."""
        return min(outcomes, key=lambda outcome: outcome.rank, default=Outcome.SOUND)


@dataclass(frozen=True, slots=True, kw_only=True)
class Spread:
    """A quantity with its extremes.

    Parameters
    ----------
    low, nominal, high : float
        Least, usual and greatest value, in the unit that the owner of the spread states.
    """

    low: float
    nominal: float
    high: float

    @staticmethod
    def exactly(value: float) -> Spread:
        """Return a spread without width."""
        return Spread(low=value, nominal=value, high=value)

    @staticmethod
    def around(value: float, tolerance: float) -> Spread:
        """Return ``value`` plus and minus the fraction ``tolerance`` [1]."""
        reach = abs(value) * tolerance
        return Spread(low=value - reach, nominal=value, high=value + reach)

    def shifted(self, offset: float) -> Spread:
        """Return the spread moved by ``offset`` [same unit]."""
        return Spread(low=self.low + offset, nominal=self.nominal + offset, high=self.high + offset)

    def scaled(self, factor: float) -> Spread:
        """Return the spread times a positive ``factor`` [1]."""
        return Spread(low=self.low * factor, nominal=self.nominal * factor, high=self.high * factor)


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """A voltage as a function of the supply of its pin, e.g. ``0.7*V``.

    Parameters
    ----------
    text : str
        The expression as written in the trade data (several, by supply range, joined with `` | ``).
    pieces : tuple of (float, float, callable)
        Supply range [V] (both ends included) and the function from supply [V] to level [V] valid in it. The callables
        take floats or numpy arrays.
    """

    text: str
    pieces: tuple[tuple[float, float, Callable[[Any], Any]], ...] = field(compare=False)

    def at(self, supply_volts: float) -> float:
        """Return the level at one supply voltage.

        Parameters
        ----------
        supply_volts : float
            Supply of the pin [V].

        Returns
        -------
        float
            Level [V]. Outside all ranges the nearest range's expression is used.
        """
        best: tuple[float, float] | None = None
        for low, high, function in self.pieces:
            distance = max(low - supply_volts, supply_volts - high, 0.0)
            if best is None or distance < best[0]:
                best = (distance, float(function(supply_volts)))
        assert best is not None
        return best[1]


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """A line in a file of the reviewed project; lines and columns count from 1, 0 means unknown."""

    file: str
    line: int
    column: int = 0
