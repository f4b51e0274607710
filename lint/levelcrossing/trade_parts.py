"""From a ``[[part]]`` row of trade data to what it says of a part and of each of its pins."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from levelcrossing import levels
from levelcrossing.model import Level, PartFacts, Pin, PinFacts, SupplyFacts
from levelcrossing.trade_pins import (
    level,
    level_pair,
    matches,
    names_of,
    output_points,
    pin_pattern,
    plain_name,
    power_facts,
    remembered,
    scaled,
)
from levelcrossing.trade_rows import Row

_POWER_DOWN = {"always": True, "powered": False, "never": False}


def part_facts(row: Row, text: str, where: str, names: Sequence[Row] = ()) -> PartFacts:
    """Return what a ``[[part]]`` row says.

    Parameters
    ----------
    row : Row
    text : str
        The normal text that matched.
    where : str
        Where the text stands (``value``, ``field MPN``, ``symbol``).
    names : sequence of Row
        The ``[[pin_names]]`` rows: what names imply where the row itself says nothing of a pin.
    """
    supplies = _supplies(row)
    base = _base(row)
    exceptions = [(item["names"], item) for item in row.get("pins", ()) if applies(item, text)]

    implied = [item for table in names if _is_about(table, row, text) for item in table.get("pins")]

    def pin_facts(pin: Pin) -> PinFacts:
        name = plain_name(pin.name)
        power = power_facts(name, supplies)
        if power is not None and (power.direction != "ground" or pin.kind not in ("input", "output", "bidirectional")):
            return power
        for pattern, values in exceptions:
            if name and matches(pattern, pin.name):
                return excepted(base, values, row)
        return replace(base, direction=_implied(implied, name)) if name else base

    tolerant = row.get("tolerant")
    return PartFacts(
        title=row.get("title") or text[:24] or row.id,
        group=row.get("group", "other"),
        provenance=row.provenance_for(text),
        supplies=supplies,
        pin=remembered(pin_facts),
        partial_power_down=None
        if any("tolerant" in item for _, item in exceptions)
        else _POWER_DOWN.get(tolerant or ""),
        matched=where,
        doubtful=row.get("doubtful", ""),
        note=row.get("note", ""),
    )


def _is_about(table: Row, row: Row, text: str) -> bool:
    return row.get("group", "other") in table.get("groups") and applies(table.data, text)


def _implied(items: Sequence[Mapping[str, Any]], name: str) -> str | None:
    """Return the direction that a name implies; of several in one name (``SDI/SDA``) only if they agree."""
    whole, *pieces = names_of(name)
    found = _direction(items, whole)
    if found is None and pieces:
        agreed = {direction for piece in pieces if (direction := _direction(items, piece)) is not None}
        found = agreed.pop() if len(agreed) == 1 else None
    return found


def _direction(items: Sequence[Mapping[str, Any]], name: str) -> str | None:
    return next((str(item["direction"]) for item in items if pin_pattern(item["names"]).fullmatch(name)), None)


def applies(values: Mapping[str, Any], text: str) -> bool:
    """Tell whether a pin entry holds for the part number that matched."""
    only = values.get("parts")
    return only is None or re.match(only, text, re.IGNORECASE) is not None


def _supplies(row: Row) -> tuple[SupplyFacts, ...]:
    return tuple(
        SupplyFacts(
            pins=item["pins"],
            low_volts=item["volts"][0] if "volts" in item else None,
            high_volts=item["volts"][1] if "volts" in item else None,
            role=item["role"],
        )
        for item in row.get("supplies", ())
    )


def _base(row: Row) -> PinFacts:
    vih, vil = level_pair(row.data)
    ceiling, ceiling_off, clamp = _ceiling(row.data)
    fixed_supply = row.get("io_volts")
    return PinFacts(
        supply=row.get("io_supply") or None,
        supply_volts=float(fixed_supply) if fixed_supply is not None else None,
        vih=vih,
        vil=vil,
        vmax=ceiling,
        vmax_off=ceiling_off,
        vmin=level(row.get("input_min_volts")),
        clamp_high=clamp,
        clamp_low=None if clamp is None else True,
        injection_amps=scaled(row.get("clamp_milliamperes"), 1e-3),
        outputs=output_points(row.get("outputs", ())),
        open_high=level(row.get("output_high_volts")),
        open_low=level(row.get("output_low_volts")),
        output_amps=scaled(row.get("output_max_milliamperes"), 1e-3),
        capacitance_farads=scaled(row.get("capacitance_picofarads"), 1e-12),
        pull_up_ohms=row.get("pull_up_ohms"),
    )


def _ceiling(values: Mapping[str, Any]) -> tuple[Level | None, Level | None, bool | None]:
    """Return the greatest input voltage, the one with the supply off, and whether a diode leads to the supply.

    A pin with a diode to its supply needs no limit of its own for the supply off: it follows from the first.
    """
    pieces = values.get("input_max_by_supply")
    if pieces:
        most: Level | None = levels.by_supply(
            [(tuple(piece["supply_volts"]), piece["input_max_volts"]) for piece in pieces]
        )
    else:
        most = level(values.get("input_max_volts"))
    if most is None:
        return None, None, None
    off = level(values.get("input_max_off_volts"))
    tolerant = values.get("tolerant")
    moves = "V" in most.text and not pieces
    if tolerant == "always":
        return most, off or (levels.at_zero(most) if moves else most), False
    if tolerant == "powered":
        if off is None and (moves or pieces):
            off = levels.fixed(most.at(0.0))
        return most, off, False
    # a limit that follows the supply means a diode to it; a fixed one says nothing about a diode
    return most, None, True if moves or tolerant == "never" else None


def excepted(base: PinFacts, values: Mapping[str, Any], row: Row) -> PinFacts:
    """Lay one entry of a row's pin list over the row's defaults."""
    changes: dict[str, Any] = {}
    for key, field in (("direction", "direction"), ("supply", "supply"), ("side", "side"), ("note", "note")):
        if key in values:
            changes[field] = values[key]
    for key, field in (("vih_volts", "vih"), ("vil_volts", "vil")):
        if key in values:
            changes[field] = level(values[key])
    if "io_volts" in values:
        changes["supply_volts"] = float(values["io_volts"])
        changes["supply"] = values.get("supply")
    if "pull_up_ohms" in values:
        changes["pull_up_ohms"] = float(values["pull_up_ohms"])
    if "capacitance_picofarads" in values:
        changes["capacitance_farads"] = values["capacitance_picofarads"] * 1e-12
    if "input_max_volts" in values or "tolerant" in values or "input_max_off_volts" in values:
        merged: dict[str, Any] = {
            key: row.get(key) for key in ("input_max_volts", "tolerant", "input_max_by_supply") if key in row.data
        }
        if "input_max_volts" in values:
            merged.pop("input_max_by_supply", None)
            if row.get("tolerant") == "never" and "tolerant" not in values and "V" not in values["input_max_volts"]:
                merged.pop("tolerant", None)  # a fixed limit of its own: nothing is said of a diode
        merged.update(
            {key: values[key] for key in ("input_max_volts", "tolerant", "input_max_off_volts") if key in values}
        )
        if merged.get("tolerant") == "powered" and "input_max_off_volts" in row.data:
            merged.setdefault("input_max_off_volts", row.get("input_max_off_volts"))
        changes["vmax"], changes["vmax_off"], changes["clamp_high"] = _ceiling(merged)
    return replace(base, **changes)
