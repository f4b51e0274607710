"""What the readers of parts, logic families and translators share: names of pins, levels, output points."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from functools import lru_cache
from typing import Any

from levelcrossing import levels
from levelcrossing.model import Level, OutputPoint, Pin, PinFacts, SupplyFacts

GROUND = re.compile(
    r"[A-Z]{0,2}GND_?\w{0,6}|[AD]?VSS_?\w{0,4}|EP|EPAD|PAD|THERMAL\w*|TPAD|GROUND|COM_GND|EARTH|SHIELD|0V|EXPOSED_?PAD",
    re.IGNORECASE,
)
LOGIC_SUPPLY = r"VCC|VDD|V\+|VCC\d?|VDD\d?|VCCO?"


@lru_cache(maxsize=4096)
def plain_name(name: str) -> str:
    """Return a pin's name without overbars and blanks: ``~{OE}`` gives ``OE``."""
    return re.sub(r"~\{([^}]*)\}", r"\1", name).replace("~", "").replace(" ", "").strip("#").strip()


@lru_cache(maxsize=4096)
def names_of(name: str) -> tuple[str, ...]:
    """Return the whole plain name and the alternatives in it (``PB0/AIN0``, ``DO(IO1)``)."""
    whole = plain_name(name)
    pieces = [piece for piece in re.split(r"[/()|,;]", whole) if piece]
    return tuple(dict.fromkeys([whole, *pieces]))


@lru_cache(maxsize=4096)
def pin_pattern(text: str) -> re.Pattern[str]:
    """Return a pattern on pin names, compiled."""
    return re.compile(text, re.IGNORECASE)


def matches(pattern: str, name: str) -> re.Match[str] | None:
    """Match a pin-name pattern against a name as a whole, or against one of its alternatives."""
    compiled = pin_pattern(pattern)
    for candidate in names_of(name):
        found = compiled.fullmatch(candidate)
        if found is not None:
            return found
    return None


def level(text: str | None) -> Level | None:
    """Return the level of an expression, or None for none."""
    return None if text is None else parsed(text)


@lru_cache(maxsize=1024)
def parsed(text: str) -> Level:
    """Return the level of an expression."""
    return levels.parse(text)


def level_pair(values: Mapping[str, Any], prefix: str = "") -> tuple[Level | None, Level | None]:
    """Return VIH and VIL of a row [V], whether given once or by supply."""
    pieces = values.get(f"{prefix}levels")
    if pieces:
        return (
            levels.by_supply([(tuple(piece["supply_volts"]), piece["vih_volts"]) for piece in pieces]),
            levels.by_supply([(tuple(piece["supply_volts"]), piece["vil_volts"]) for piece in pieces]),
        )
    return level(values.get(f"{prefix}vih_volts")), level(values.get(f"{prefix}vil_volts"))


def output_points(values: Sequence[Mapping[str, Any]]) -> tuple[OutputPoint, ...]:
    """Return the rated output points of a row."""
    return tuple(
        OutputPoint(
            supply_volts=float(point["supply_volts"]),
            voh=level(point.get("voh_volts")),
            ioh_amps=point.get("ioh_milliamperes", 0) * 1e-3,
            vol=level(point.get("vol_volts")),
            iol_amps=point.get("iol_milliamperes", 0) * 1e-3,
        )
        for point in values
    )


def scaled(value: float | None, factor: float) -> float | None:
    """Return ``value`` times ``factor``, or None for none."""
    return None if value is None else value * factor


def remembered(function: Callable[[Pin], PinFacts]) -> Callable[[Pin], PinFacts]:
    """Remember what was said of a pin by its number, name and kind."""
    known: dict[tuple[str, str, str], PinFacts] = {}

    def ask(pin: Pin) -> PinFacts:
        key = (pin.number, pin.name, pin.kind)
        if key not in known:
            known[key] = function(pin)
        return known[key]

    return ask


def power_facts(name: str, supplies: Sequence[SupplyFacts]) -> PinFacts | None:
    """Return the facts of a supply or ground pin, or None when the name is no such pin's."""
    for supply in supplies:
        if pin_pattern(supply.pins).fullmatch(name):
            return PinFacts(direction="supply-out" if supply.role == "out" else "supply")
    if name and GROUND.fullmatch(name):
        return PinFacts(direction="ground")
    return None


def channel_of(found: re.Match[str]) -> str:
    """Return the channel that a pattern's groups name: ``2A4`` gives ``2-4``; empty without groups."""
    pieces = [group for group in found.groups() if group]
    return "-".join(pieces).upper()
