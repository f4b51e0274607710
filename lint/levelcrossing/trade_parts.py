"""From a row of trade data to what it says of a part and of each of its pins."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from functools import lru_cache
from typing import Any

from levelcrossing import levels
from levelcrossing.model import (
    ControlFacts,
    Level,
    OutputPoint,
    Part,
    PartFacts,
    Pin,
    PinFacts,
    SupplyFacts,
    TranslatorFacts,
)
from levelcrossing.trade_rows import Row

GROUND = re.compile(
    r"[A-Z]{0,2}GND_?\w{0,6}|[AD]?VSS_?\w{0,4}|EP|EPAD|PAD|THERMAL\w*|TPAD|GROUND|COM_GND|EARTH|SHIELD|0V|EXPOSED_?PAD",
    re.IGNORECASE,
)
LOGIC_SUPPLY = r"VCC|VDD|V\+|VCC\d?|VDD\d?|VCCO?"
_OPEN = PinFacts()


@lru_cache(maxsize=4096)
def plain_name(name: str) -> str:
    """Return a pin's name without overbars and blanks: ``~{OE}`` gives ``OE``."""
    return re.sub(r"~\{([^}]*)\}", r"\1", name).replace("~", "").replace(" ", "").strip()


@lru_cache(maxsize=4096)
def names_of(name: str) -> tuple[str, ...]:
    """Return the whole plain name and the alternatives in it (``PB0/AIN0``, ``DO(IO1)``)."""
    whole = plain_name(name)
    pieces = [piece for piece in re.split(r"[/()|,;]", whole) if piece]
    return tuple(dict.fromkeys([whole, *pieces]))


@lru_cache(maxsize=4096)
def _pattern(text: str) -> re.Pattern[str]:
    return re.compile(text, re.IGNORECASE)


def matches(pattern: str, name: str) -> re.Match[str] | None:
    """Match a pin-name pattern against a name as a whole, or against one of its alternatives."""
    compiled = _pattern(pattern)
    for candidate in names_of(name):
        found = compiled.fullmatch(candidate)
        if found is not None:
            return found
    return None


def level(text: str | None) -> Level | None:
    """Return the level of an expression, or None for none."""
    return None if text is None else _level(text)


@lru_cache(maxsize=1024)
def _level(text: str) -> Level:
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


# ------------------------------------------------------------------------------------------------------ ordinary parts


def part_facts(row: Row, text: str, where: str) -> PartFacts:
    """Return what a ``[[part]]`` row says.

    Parameters
    ----------
    row : Row
    text : str
        The normal text that matched.
    where : str
        Where the text stands (``value``, ``field MPN``, ``symbol``).
    """
    supplies = _supplies(row)
    base = _base(row)
    exceptions = [(item["names"], item) for item in row.get("pins", ()) if _applies(item, text)]

    def pin_facts(pin: Pin) -> PinFacts:
        name = plain_name(pin.name)
        power = power_facts(name, supplies)
        if power is not None and (power.direction != "ground" or pin.kind not in ("input", "output", "bidirectional")):
            return power
        for pattern, values in exceptions:
            if name and matches(pattern, pin.name):
                return _excepted(base, values, row)
        return base

    tolerant = row.get("tolerant")
    return PartFacts(
        title=row.get("title") or row.id,
        group=row.get("group", "other"),
        provenance=row.provenance,
        supplies=supplies,
        pin=remembered(pin_facts),
        partial_power_down={"always": True, "powered": False, "never": False}.get(tolerant or ""),
        matched=where,
        doubtful=row.get("doubtful", ""),
        note=row.get("note", ""),
    )


def _applies(values: Mapping[str, Any], text: str) -> bool:
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


def power_facts(name: str, supplies: Sequence[SupplyFacts]) -> PinFacts | None:
    """Return the facts of a supply or ground pin, or None when the name is no such pin's."""
    for supply in supplies:
        if _pattern(supply.pins).fullmatch(name):
            return PinFacts(direction="supply-out" if supply.role == "out" else "supply")
    if name and GROUND.fullmatch(name):
        return PinFacts(direction="ground")
    return None


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
        output_amps=scaled(row.get("output_max_milliamperes"), 1e-3),
        capacitance_farads=scaled(row.get("capacitance_picofarads"), 1e-12),
        pull_up_ohms=row.get("pull_up_ohms"),
    )


def _ceiling(values: Mapping[str, Any]) -> tuple[Level | None, Level | None, bool | None]:
    """Return the greatest input voltage, the one with the supply off, and whether a diode leads to the supply."""
    pieces = values.get("input_max_by_supply")
    if pieces:
        most: Level | None = levels.by_supply([(tuple(piece["supply_volts"]), piece["input_max_volts"]) for piece in pieces])
    else:
        most = level(values.get("input_max_volts"))
    off = level(values.get("input_max_off_volts"))
    if most is None:
        return None, off, None
    tolerant = values.get("tolerant")
    moves = "V" in most.text and not pieces
    if tolerant == "always":
        return most, off or (None if moves else most), False
    if tolerant == "powered":
        return most, off, False
    if off is None and moves:
        off = levels.at_zero(most)
    # a limit that follows the supply means a diode to it; a fixed limit says nothing about one
    return most, off, True if moves else (True if tolerant == "never" else None)


def _excepted(base: PinFacts, values: Mapping[str, Any], row: Row) -> PinFacts:
    changes: dict[str, Any] = {}
    for key, field in (("direction", "direction"), ("supply", "supply"), ("side", "side"), ("note", "note")):
        if key in values:
            changes[field] = values[key]
    for key, field in (("vih_volts", "vih"), ("vil_volts", "vil")):
        if key in values:
            changes[field] = level(values[key])
    if "io_volts" in values:
        changes["supply_volts"] = float(values["io_volts"])
    if "pull_up_ohms" in values:
        changes["pull_up_ohms"] = float(values["pull_up_ohms"])
    if "capacitance_picofarads" in values:
        changes["capacitance_farads"] = values["capacitance_picofarads"] * 1e-12
    if "input_max_volts" in values or "tolerant" in values or "input_max_off_volts" in values:
        merged = {key: row.get(key) for key in ("input_max_volts", "tolerant", "input_max_by_supply") if key in row.data}
        if "input_max_volts" in values:
            merged.pop("input_max_by_supply", None)
            if row.get("tolerant") == "never" and "tolerant" not in values and "V" not in values["input_max_volts"]:
                merged.pop("tolerant", None)  # a fixed limit of its own: nothing is said of a diode
        merged.update({key: values[key] for key in ("input_max_volts", "tolerant", "input_max_off_volts") if key in values})
        changes["vmax"], changes["vmax_off"], changes["clamp_high"] = _ceiling(merged)
    return replace(base, **changes)


# ------------------------------------------------------------------------------------------------------- logic families

_NUMBER = re.compile(
    r"(?:74|54)[A-Z]*?(?P<gates>[1238]?[GT](?=U?\d))?(?P<unbuffered>U(?=\d))?(?P<number>\d{2,6})"
    r"|(?:NC7|NL[123]?7|TC7)[A-Z]{1,3}?(?P<small>U?\d{2,4})"
    r"|NL(?:U[123]G|17SZ|17VHC)(?P<other>\d{2,4})"
    r"|(?:CD|HEF|MC1|TC)?(?P<cmos>4\d{3,4})"
    r"|(?:LVC|LVT|LCX|HCT?|AHCT?)H?(?P<bare>\d{2,5})"
)


def function_numbers(text: str) -> list[str]:
    """Return the function numbers that a logic part's name may stand for, the likeliest first.

    ``74LVC1G125`` gives ``1G125``; ``NC7SZ125`` gives ``1G125``; ``CD4011BE`` gives ``4011``.
    """
    found = _NUMBER.search(text)
    if found is None:
        return []
    if found["number"]:
        number = found["number"]
        gates = found["gates"] or ""
        if gates.endswith("T") and gates != "1T":
            gates = ""  # 74LV4T125 is a quad 125
        return [f"{gates}{number}", f"1G{number}"] if gates == "1T" else [f"{gates}{number}"]
    if found["small"]:
        gates = "2G" if text[found.start() :].startswith(("NC7W", "NL27")) else "3G" if text.startswith("NL37") else "1G"
        return [f"{gates}{found['small']}"]
    if found["other"]:
        gates = re.search(r"NLU([123])G", text)
        return [f"{gates[1] if gates else 1}G{found['other']}"]
    return [found["cmos"] or found["bare"]]


class Functions:
    """The ``[[function]]`` rows by their numbers."""

    def __init__(self, rows: Sequence[Row]) -> None:
        self.rows = rows
        self.by_number: dict[str, Row] | None = None

    def of(self, text: str) -> tuple[Row, str] | None:
        """Return the function row of a logic part's name, with the number that was found."""
        if self.by_number is None:
            self.by_number = {}
            for row in self.rows:
                for number in row.get("numbers", ()):
                    self.by_number.setdefault(number, row)
        for number in function_numbers(text):
            if number in self.by_number:
                return self.by_number[number], number
        return None


def family_facts(
    row: Row, functions: Functions, part: Part, text: str, where: str, translator: TranslatorFacts | None = None
) -> PartFacts:
    """Return what a ``[[family]]`` row says of a part, joined with the pins of its function."""
    base = family_pin(row)
    low, high = row.get("supply_volts")
    supplies = (SupplyFacts(pins=LOGIC_SUPPLY, low_volts=low, high_volts=high, role="io"),)
    found = functions.of(text)
    off = row.get("partial_power_down")
    outputs_clamp = off == "inputs" and base.clamp_high is False

    def pin_facts(pin: Pin) -> PinFacts:
        power = power_facts(plain_name(pin.name), supplies)
        if power is not None:
            return power
        if pin.kind in ("power_in", "power_out") and not plain_name(pin.name):
            return PinFacts(direction="supply")
        direction, channel, side, open_drain = _logic_pin(found, pin, part)
        values: dict[str, Any] = {"direction": direction, "channel": channel, "side": side}
        if direction == "out" and open_drain:
            values["direction"] = "open-drain"
        elif outputs_clamp and direction in ("out", "inout"):
            # the inputs of this family have no diode to the supply, its outputs have
            values.update(vmax=_level("V+0.5"), vmax_off=levels.fixed(0.5), clamp_high=True)
        if direction == "analog":
            values.update(vih=None, vil=None, outputs=(), vmax=_level("V+0.5"), vmax_off=levels.fixed(0.5), clamp_high=True)
        return replace(base, **values)

    return PartFacts(
        title=_family_title(row, text),
        group="logic",
        provenance=row.provenance,
        supplies=supplies,
        pin=remembered(pin_facts),
        translator=translator,
        partial_power_down={"all": True, "inputs": True, "none": False}[off],
        matched=where,
        doubtful=row.get("doubtful", ""),
        note=row.get("note", ""),
    )


def _family_title(row: Row, text: str) -> str:
    title = str(row.get("title") or row.id)
    numbers = function_numbers(text)
    if not numbers:
        return title
    return f"74{title}{numbers[0]}" if text.startswith(("74", "54")) and title.isupper() and title.isalpha() else text


def family_pin(row: Row) -> PinFacts:
    """Return what a family says of any of its signal pins."""
    vih, vil = level_pair(row.data)
    most = level(row.get("input_max_volts"))
    off_state = row.get("partial_power_down")
    tolerant = row.get("clamp") != "both"
    assert most is not None
    return PinFacts(
        supply=LOGIC_SUPPLY,
        vih=vih,
        vil=vil,
        vmax=most,
        vmax_off=most if tolerant and off_state in ("all", "inputs") else levels.at_zero(most) if not tolerant else None,
        vmin=levels.fixed(-0.5),
        clamp_high=not tolerant,
        clamp_low=row.get("clamp") != "none",
        injection_amps=scaled(row.get("clamp_milliamperes"), 1e-3),
        outputs=output_points(row.get("outputs", ())),
        output_amps=scaled(row.get("output_max_milliamperes"), 1e-3),
        capacitance_farads=scaled(row.get("capacitance_picofarads"), 1e-12),
    )


_OUT_NAMES = re.compile(r"\d?Y[\da-h]?\d?|Q\w{0,2}'?|\d?Q\d?|O\d+|OUT\w*|\d?Z", re.IGNORECASE)
_KIND_DIRECTION = {"input": "in", "output": "out", "tri_state": "out", "open_collector": "out", "bidirectional": "inout"}


def _logic_pin(found: tuple[Row, str] | None, pin: Pin, part: Part) -> tuple[str | None, str, str, bool]:
    """Return direction, channel, side of a logic pin, and whether an output only pulls low."""
    name = plain_name(pin.name)
    if found is None:
        if name and _OUT_NAMES.fullmatch(name):
            return "out", "", "", False
        return _KIND_DIRECTION.get(pin.kind), "", "", False
    row, number = found
    open_drain = bool(row.get("open_drain"))
    outputs = row.get("outputs_for", {}).get(number) or row.get("outputs", ())
    if name:
        for item in row.get("pins", ()):
            hit = matches(item["names"], pin.name)
            if hit is not None:
                return item["direction"], channel_of(hit), item.get("side", ""), open_drain
    if outputs and (not name or name == pin.number or not _has_names(part)):
        return ("out" if pin.number in outputs else "in"), "", "", open_drain
    if name and _OUT_NAMES.fullmatch(name):
        return "out", "", "", open_drain
    return _KIND_DIRECTION.get(pin.kind), "", "", open_drain


def _has_names(part: Part) -> bool:
    return any(plain_name(pin.name) not in ("", pin.number) for pin in part.pins if pin.kind not in ("power_in", "power_out"))


def channel_of(found: re.Match[str]) -> str:
    """Return the channel that a pattern's groups name: ``2A4`` gives ``2-4``; empty without groups."""
    pieces = [group for group in found.groups() if group]
    return "-".join(pieces).upper()


# --------------------------------------------------------------------------------------------------------- translators


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
            (float(item.get("a_volts", 0.0)), item.get("b_volts"), item["megabits_per_second"] * 1e6)
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
        SupplyFacts(pins=pattern, low_volts=limits[0] if limits else None, high_volts=limits[1] if limits else None, role="io")
        for pattern, limits in _side_supplies(row)
    )
    exceptions = [(item["names"], item) for item in row.get("pins", ()) if _applies(item, text)]
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
        facts = sides.get(side, _OPEN)
        for pattern, values in exceptions:
            if name and matches(pattern, pin.name):
                facts = sides.get(values.get("side") or side, facts)
                return replace(_excepted(facts, values, row), side=values.get("side") or side, channel=channel)
        return replace(facts, channel=channel)

    return PartFacts(
        title=row.get("title") or row.id,
        group="translator",
        provenance=row.provenance,
        supplies=supplies,
        pin=remembered(pin_facts),
        translator=whole,
        partial_power_down=row.get("partial_power_down"),
        matched=where,
        doubtful=row.get("doubtful", ""),
        note=row.get("note", "") or " ".join(row.get("notes", ())),
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
    direction = {"a-to-b": {"a": "in", "b": "out"}, "b-to-a": {"a": "out", "b": "in"}}.get(whole.direction, {}).get(side)
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
        vmax_off=(levels.at_zero(most) if moves and most else most) if row.get("partial_power_down") or moves else None,
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
        vih=None if reference else vih or start.vih or _level("0.65*V"),
        vil=None if reference else vil or start.vil or _level("0.35*V"),
        vmax=most,
        vmax_off=most if row.get("partial_power_down") else None,
        clamp_high=None if most is None else "V" in most.text,
        clamp_low=True,
        outputs=(),
    )
