"""Voltage levels written as expressions of the supply, ``0.7*V``: read them safely, without ``eval``.

The grammar holds numbers, the supply ``V`` [V], ``+ - * /``, parentheses, ``min(a, b)`` and ``max(a, b)``. A parsed
level is a function that takes a float or a numpy array of supplies and gives the same shape back [V].
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from typing import Any

from levelcrossing.model import Level

Function = Callable[[Any], Any]
Piece = tuple[float, float, Function]

EVERYWHERE = (0.0, float("inf"))
"""The supply range of a level that is given without one [V]."""

_TOKEN = re.compile(r"\s*(?:(?P<number>\d+(?:\.\d*)?|\.\d+)|(?P<word>[A-Za-z]+)|(?P<sign>[-+*/(),]))")
_LONGEST = 200  # characters; no level of a real data sheet comes near it


class LevelError(ValueError):
    """An expression that is no level; its text says what is wrong and where."""


def parse(text: str, supply_range: tuple[float, float] = EVERYWHERE) -> Level:
    """Read one expression.

    Parameters
    ----------
    text : str
        For example ``0.7*V``, ``V-0.45``, ``2.0`` or ``min(V+3.6, 5.5)``.
    supply_range : tuple of float
        Supplies for which the level is given [V].

    Returns
    -------
    Level
        With a single piece.

    Raises
    ------
    LevelError
        If the text is not an expression of this grammar.
    """
    return Level(text=text, pieces=((*supply_range, compiled(text)),))


def by_supply(pieces: Sequence[tuple[tuple[float, float], str]]) -> Level:
    """Join several expressions, each valid in its own supply range [V], into one level."""
    if len(pieces) == 1:
        return parse(pieces[0][1], pieces[0][0])
    return Level(
        text=" | ".join(f"{text} ({low:g}..{high:g} V)" for (low, high), text in pieces),
        pieces=tuple((low, high, compiled(text)) for (low, high), text in pieces),
    )


def fixed(volts: float) -> Level:
    """Return a level that does not depend on the supply [V]."""
    return Level(text=f"{volts:g}", pieces=((*EVERYWHERE, _constant(volts)),))


def at_zero(level: Level) -> Level:
    """Return the level that remains when the supply is off (V = 0) [V]."""
    return fixed(round(level.pieces[0][2](0.0), 6))


def depends_on_supply(level: Level) -> bool:
    """Tell whether the level moves with the supply."""
    return "V" in re.sub(r"\(\S+\.\.\S+ V\)", "", level.text)


def compiled(text: str) -> Function:
    """Return the function that an expression stands for; see `parse`."""
    if len(text) > _LONGEST:
        raise LevelError(f"an expression of {len(text)} characters is too long for a level")
    reader = _Reader(text)
    function = reader.sum()
    if reader.token is not None:
        raise LevelError(f"'{reader.token}' is not expected in '{text}'")
    return function


class _Reader:
    """Recursive descent over the tokens of one expression; the nesting is bounded by the length."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.tokens: list[str] = []
        place = 0
        stripped = text.rstrip()
        while place < len(stripped):
            found = _TOKEN.match(stripped, place)
            if found is None:
                raise LevelError(f"'{stripped[place]}' in '{text}' is neither a number, V, + - * / ( ) nor min, max")
            self.tokens.append(found[found.lastgroup or 0])
            place = found.end()
        self.place = 0

    @property
    def token(self) -> str | None:
        return self.tokens[self.place] if self.place < len(self.tokens) else None

    def take(self, *wanted: str) -> str | None:
        if self.token in wanted:
            self.place += 1
            return self.tokens[self.place - 1]
        return None

    def need(self, wanted: str) -> None:
        if self.take(wanted) is None:
            raise LevelError(f"'{wanted}' is missing in '{self.text}'")

    def sum(self) -> Function:
        left = self.product()
        while sign := self.take("+", "-"):
            left = _added(left, self.product()) if sign == "+" else _subtracted(left, self.product())
        return left

    def product(self) -> Function:
        left = self.factor()
        while sign := self.take("*", "/"):
            left = _multiplied(left, self.factor()) if sign == "*" else _divided(left, self.factor())
        return left

    def factor(self) -> Function:
        if self.take("-"):
            return _subtracted(_constant(0.0), self.factor())
        if self.take("("):
            inner = self.sum()
            self.need(")")
            return inner
        if name := self.take("min", "max"):
            self.need("(")
            first = self.sum()
            self.need(",")
            second = self.sum()
            self.need(")")
            return _lesser(first, second) if name == "min" else _greater(first, second)
        if self.take("V"):
            return _supply
        token = self.token
        if token is None:
            raise LevelError(f"'{self.text}' ends too early")
        if not (token[0].isdigit() or token[0] == "."):
            raise LevelError(f"'{token}' is not expected in '{self.text}'")
        self.place += 1
        return _constant(float(token))


def _supply(volts: Any) -> Any:
    return volts


def _constant(value: float) -> Function:
    return lambda volts: value + 0.0 * volts  # keeps the shape of an array


def _added(left: Function, right: Function) -> Function:
    return lambda volts: left(volts) + right(volts)


def _subtracted(left: Function, right: Function) -> Function:
    return lambda volts: left(volts) - right(volts)


def _multiplied(left: Function, right: Function) -> Function:
    return lambda volts: left(volts) * right(volts)


def _divided(left: Function, right: Function) -> Function:
    return lambda volts: left(volts) / right(volts)


def _lesser(left: Function, right: Function) -> Function:
    # written with abs so that floats and arrays take the same way without loading numpy here
    return lambda volts: (left(volts) + right(volts) - abs(left(volts) - right(volts))) / 2


def _greater(left: Function, right: Function) -> Function:
    return lambda volts: (left(volts) + right(volts) + abs(left(volts) - right(volts))) / 2
