"""From a ``[[translator]]`` row of trade data to what it says of a two-sided part and of each of its pins."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from levelcrossing import levels
from levelcrossing.model import ControlFacts, Part, PartFacts, Pin, PinFacts, RatePoint, SupplyFacts, TranslatorFacts
from levelcrossing.trade_logic import family_pin
from levelcrossing.trade_parts import applies, excepted
from levelcrossing.trade_pins import (
    channel_of,
    level,
    level_pair,
    matches,
    output_points,
    parsed,
    plain_name,
    power_facts,
    remembered,
    scaled,
)
from levelcrossing.trade_rows import Row

_OPEN = PinFacts()


def translator_facts(row: Row) -> TranslatorFacts:
    """Return what a ``[[translator]]`` row says of the part as a whole."""
    a_range, b_range = row.get("a_volts") or row.get("switch_volts"), row.get("b_volts") or row.get("switch_volts")
    kind = row.get("kind")
    direction = row.get("direction") or {
        "dual-dir": "dir-pin",
        "dual-fixed": "a-to-b",
        "single": "by-channel",
        "isolator": "by-channel",
    }.get(kind, "auto")
    return TranslatorFacts(
        kind=kind,
        a_supply=row.get("a_supply", ""),
        b_supply=row.get("b_supply", ""),
        a_range=tuple(a_range) if a_range else None,
        b_range=tuple(b_range) if b_range else None,
        order=row.get("order", "any"),
        direction=direction,
        controls=tuple(
            ControlFacts(
                pins=item["pins"],
                use=item["use"],
                supply=item["supply"],
                active=item.get("active", "H"),
                meaning=item.get("meaning", ""),
                most_volts=item.get("max_volts"),
            )
            for item in row.get("controls", ())
        ),
        pull_least_ohms=row.get("pull_least_ohms"),
        output_ohms=row.get("output_ohms"),
        pull_up_ohms=row.get("pull_up_ohms"),
        pull_up_needed=bool(row.get("pull_up_needed", False)),
        open_drain_ok=bool(row.get("open_drain_ok", kind not in ("auto-buffer", "dual-dir", "dual-fixed", "single"))),
        push_pull_ok=bool(row.get("push_pull_ok", True)),
        switch_ohms=row.get("switch_ohms"),
        switch_threshold_volts=row.get("switch_threshold_volts"),
        pass_level=level(row.get("pass_max_volts")),
        rates=tuple(
            RatePoint(
                bits_per_second=item["megabits_per_second"] * 1e6,
                a_volts=item.get("a_volts"),
                b_volts=item.get("b_volts"),
                open_drain=item.get("mode") == "open-drain",
            )
            for item in row.get("rates", ())
        ),
        load_most_farads=scaled(row.get("load_max_picofarads"), 1e-12),
        partial_power_down=bool(row.get("partial_power_down", False)),
        inverting=bool(row.get("inverting", False)),
        notes=tuple(row.get("notes", ())),
    )


def two_sided_facts(row: Row, family: Row | None, part: Part, text: str, where: str) -> PartFacts:
    """Return what a ``[[translator]]`` row says of a part and its pins, each on its own side."""
    whole = translator_facts(row)
    sides = {side: _side_pin(row, family, side, whole) for side in "ab"}
    supplies = tuple(
        SupplyFacts(
            pins=pattern, low_volts=limits[0] if limits else None, high_volts=limits[1] if limits else None, role="io"
        )
        for pattern, limits in _side_supplies(row)
    )
    loose = _pin_of_no_side(row, sides["a"])
    exceptions = [(item["names"], item) for item in row.get("pins", ()) if applies(item, text)]
    half = max((int(pin.number) for pin in part.pins if pin.number.isdigit()), default=0) / 2

    def pin_facts(pin: Pin) -> PinFacts:
        name = plain_name(pin.name)
        power = power_facts(name, supplies)
        if power is not None:
            return power
        for control in whole.controls:
            if name and matches(control.pins, pin.name):
                return _control_pin(row, family, control)
        side, channel = _side_and_channel(row, pin)
        if not side and row.get("side_by_number") and pin.number.isdigit():
            side = "a" if int(pin.number) <= half else "b"
        facts = sides.get(side, loose)
        for pattern, values in exceptions:
            if name and matches(pattern, pin.name):
                facts = sides.get(values.get("side") or side, facts)
                return replace(excepted(facts, values, row), side=values.get("side") or side, channel=channel)
        return replace(facts, channel=channel)

    return PartFacts(
        title=row.get("title") or text[:24] or row.id,
        group="translator",
        provenance=row.provenance_for(text),
        supplies=supplies,
        pin=remembered(pin_facts),
        translator=whole,
        partial_power_down=row.get("partial_power_down"),
        matched=where,
        doubtful=row.get("doubtful", ""),
        note=row.get("note", "") or " ".join(row.get("notes", ())),
    )


def _pin_of_no_side(row: Row, near: PinFacts) -> PinFacts:
    """Return what holds for a pin that belongs to neither side: levels of the row as a whole, ratings as side A."""
    vih, vil = level_pair(row.data)
    if vih is None:
        return _OPEN
    return replace(
        _OPEN,
        vih=vih,
        vil=vil,
        vmax=near.vmax,
        vmax_off=near.vmax_off,
        clamp_high=near.clamp_high,
        clamp_low=near.clamp_low,
        supply=near.supply,
        capacitance_farads=near.capacitance_farads,
    )


def _side_supplies(row: Row) -> list[tuple[str, Any]]:
    found = [(row.data[f"{side}_supply"], row.get(f"{side}_volts")) for side in "ab" if f"{side}_supply" in row.data]
    if "switch_supply" in row.data:
        found.append((row.data["switch_supply"], row.get("switch_volts")))
    return found


def _side_and_channel(row: Row, pin: Pin) -> tuple[str, str]:
    for side in "ab":
        pattern = row.get(f"{side}_pins")
        if pattern:
            found = matches(pattern, pin.name)
            if found is not None:
                return side, channel_of(found)
    return "", ""


def _side_pin(row: Row, family: Row | None, side: str, whole: TranslatorFacts) -> PinFacts:
    start = family_pin(family) if family is not None else _OPEN
    vih, vil = level_pair(row.data, f"{side}_")
    if vih is None:
        vih, vil = level_pair(row.data)
    most = level(row.get(f"{side}_max_volts") or row.get("input_max_volts"))
    if most is None:
        most = start.vmax
    moves = most is not None and "V" in most.text
    direction = {"a-to-b": {"a": "in", "b": "out"}, "b-to-a": {"a": "out", "b": "in"}}.get(whole.direction, {}).get(
        side
    )
    if direction is None and whole.kind in ("auto-buffer", "auto-pass", "dual-dir", "bus-switch", "fet-switch"):
        direction = "inout"
    if row.get("open_drain") and whole.kind in ("i2c-buffer", "isolator"):
        direction = "open-drain"
    passes = whole.kind in ("bus-switch", "fet-switch")
    return replace(
        start,
        direction=direction,
        supply=row.get(f"{side}_supply") or row.get("switch_supply") or start.supply,
        vih=None if passes else vih or start.vih,
        vil=None if passes else vil or start.vil,
        vmax=most,
        vmax_off=most if row.get("partial_power_down") and not moves else None,
        clamp_high=moves if most is not None else None,
        clamp_low=True,
        outputs=() if passes else output_points(row.get("outputs", ())) or start.outputs,
        pull_up_ohms=row.get("pull_up_ohms"),
        capacitance_farads=scaled(row.get("capacitance_picofarads"), 1e-12) or start.capacitance_farads,
        side=side,
    )


def _control_pin(row: Row, family: Row | None, control: ControlFacts) -> PinFacts:
    start = family_pin(family) if family is not None else _OPEN
    vih, vil = level_pair(row.data)
    most = levels.fixed(control.most_volts) if control.most_volts is not None else start.vmax
    if most is None:
        most = level(row.get("a_max_volts") or row.get("input_max_volts"))
    reference = control.use == "reference"
    return replace(
        start,
        direction="in",
        supply=control.supply,
        vih=None if reference else vih or start.vih or parsed("0.65*V"),
        vil=None if reference else vil or start.vil or parsed("0.35*V"),
        vmax=most,
        vmax_off=most if row.get("partial_power_down") else None,
        clamp_high=None if most is None else "V" in most.text,
        clamp_low=True,
        outputs=(),
    )
