"""The figures of a crossing in the JSON form of a review, to hold two revisions against each other."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

VOLTS_THAT_MATTER = 0.002
"""Voltages closer than this count as equal: the order of equal parts may move a solution by rounding only."""

SHARE_THAT_MATTERS = 0.005
"""The same for rates and currents, as a fraction."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A figure before and after; ``unit`` is ``V``, ``A`` or ``bit/s``; ``limit`` is what it is held against after."""

    name: str
    before: float | None
    after: float | None
    unit: str
    limit: float | None = None
    limit_word: str = ""


def _at(row: Mapping[str, Any] | None, *keys: str) -> float | None:
    value: Any = row
    for key in keys:
        value = value.get(key) if isinstance(value, Mapping) else None
    if type(value) not in (int, float) or abs(value) > 1e30:
        return None
    return float(value) if math.isfinite(value) else None


def _most(row: Mapping[str, Any] | None, what: str) -> float | None:
    """Return the greatest of a spread over all states."""
    states = (row or {}).get("states")
    solved = [
        state
        for state in (states.values() if isinstance(states, Mapping) else ())
        if isinstance(state, Mapping) and state.get("solved", True)
    ]
    found = [_at(state, what, "max") for state in solved]
    known = [value for value in found if value is not None]
    return max(known) if known else None


def _limit(row: Mapping[str, Any] | None, name: str, end: str) -> float | None:
    worst = _at(row, "levels", f"{name}_range", end)
    return worst if worst is not None else _at(row, "levels", name)


def _measures(row: Mapping[str, Any] | None) -> Iterator[tuple[str, float | None, str, float | None, str]]:
    highest = _most(row, "open_volts")
    yield "high level, least", _at(row, "levels", "high", "min"), "V", _limit(row, "vih", "max"), "must reach"
    yield "low level, greatest", _at(row, "levels", "low", "max"), "V", _limit(row, "vil", "min"), "must not exceed"
    top = highest if highest is not None else _at(row, "levels", "high", "max")
    yield "voltage, greatest", top, "V", _limit(row, "vmax", "min"), "rated for"
    yield "clamp current, greatest", _most(row, "clamp_amps"), "A", None, ""
    yield "usable rate", _at(row, "speed", "usable_bit_s"), "bit/s", _at(row, "speed", "needed_bit_s"), "needs"


def figures_of(before: Mapping[str, Any] | None, after: Mapping[str, Any]) -> Iterator[Figure]:
    """Yield the figures of a crossing that either revision knows."""
    for (name, was, unit, _, _), (_, now, _, limit, word) in zip(_measures(before), _measures(after), strict=True):
        if was is not None or now is not None:
            yield Figure(name=name, before=was, after=now, unit=unit, limit=limit, limit_word=word)


def differs(before: float | None, after: float | None, unit: str) -> bool:
    """Tell whether a figure moved by more than rounding."""
    if before is None or after is None:
        return before is not after
    if unit == "V":
        return abs(after - before) > VOLTS_THAT_MATTER
    if unit == "A" and abs(after - before) < 1e-6:
        return False
    return abs(after - before) > SHARE_THAT_MATTERS * max(abs(before), abs(after))


def worst_margin(row: Mapping[str, Any]) -> float:
    """Return the least distance of a crossing's voltages to their limits [V]; negative where one is exceeded."""
    margins = []
    for name, value, unit, limit, _ in _measures(row):
        if value is not None and limit is not None and unit == "V":
            margins.append(value - limit if name.startswith("high") else limit - value)
    return min(margins, default=math.inf) if margins else 0.0
