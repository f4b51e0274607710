"""What a row of trade data may hold: every key with its kind, and the checks that refuse a row.

The kinds: ``text``, ``texts``, ``number``, ``flag``, ``level`` (an expression of the supply), ``range`` (two ascending
numbers), ``spread`` (three), ``regex`` (one regular expression), ``regexes``, ``names`` (a table of text to number),
``name-lists``, ``pairs`` and ``rows:NAME`` (a list of tables whose keys are `KEYS` of that name).
"""

from __future__ import annotations

import difflib
import math
import re
import tomllib
from collections.abc import Mapping, Sequence
from typing import Any

from levelcrossing.errors import TradeDataError
from levelcrossing.levels import LevelError, compiled
from levelcrossing.trade_rows import Row

CERTAINTIES = ("datasheet", "secondary", "memory", "practice")
_ANY = {
    "id": "text",
    "source": "text",
    "certainty": "certainty",
    "note": "text",
    "notes": "texts",
    "doubtful": "text",
    "checked": "text",
}
_NAMED = {
    **_ANY,
    "match": "regexes",
    "examples": "texts",
    "title": "text",
    "maker": "text",
    "generic": "flag",
    "sure_members": "regexes",
}
_CERTAINTY = {f"certainty_{part}": "certainty" for part in ("levels", "outputs", "maxima", "rates", "reverse_gain")}
_LEVELS = {"vih_volts": "level", "vil_volts": "level", "levels": "rows:levels"}
_INPUT = {
    "input_max_volts": "level",
    "input_max_off_volts": "level",
    "input_recommended_volts": "level",
    "input_min_volts": "level",
    "clamp_milliamperes": "number",
    "capacitance_picofarads": "number",
    "output_high_volts": "level",
    "output_low_volts": "level",
    "output_max_milliamperes": "number",
}
_FORWARD = {"forward": "rows:forward", "capacitance_picofarads": "number"}
_REGULATOR = {
    **_NAMED,
    "input_pins": "regex",
    "output_pins": "regex",
    "ground_pins": "regex",
    "feedback_pins": "regex",
    "enable_pins": "regex",
    "switch_pins": "regex",
    "through_inductor": "flag",
    "boost": "flag",
    "isolated": "flag",
    "input_max_volts": "number",
    "input_max_by_part": "names",
    "dropout_volts": "number",
    "output_max_milliamperes": "number",
    "tolerance_percent": "number",
}

KEYS: dict[str, dict[str, str]] = {
    "standard": {
        **_ANY,
        **_LEVELS,
        "number": "text",
        "title": "text",
        "supply_volts": "range",
        "outputs": "rows:outputs",
        "points": "rows:points",
    },
    "document": {**_ANY, "title": "text", "covers": "texts"},
    "family": {
        **_NAMED,
        **_CERTAINTY,
        **_LEVELS,
        **_INPUT,
        "supply_volts": "range",
        "outputs": "rows:outputs",
        "clamp": "clamp",
        "partial_power_down": "power-down",
        "output_off_max_volts": "level",
        "input_low_current_milliamperes": "number",
        "delay_nanoseconds": "pairs",
    },
    "function": {
        **_ANY,
        "numbers": "texts",
        "pins": "rows:pins",
        "outputs": "texts",
        "outputs_for": "name-lists",
        "controls": "texts",
        "open_drain": "flag",
        "schmitt": "flag",
    },
    "part": {
        **_NAMED,
        **_CERTAINTY,
        **_LEVELS,
        **_INPUT,
        "group": "group",
        "supplies": "rows:supplies",
        "io_supply": "regex",
        "io_volts": "number",
        "levels_fixed": "flag",
        "outputs": "rows:outputs",
        "tolerant": "tolerant",
        "input_max_by_supply": "rows:maxima",
        "input_max_supply": "regex",
        "pull_up_ohms": "number",
        "pins": "rows:pins",
        "references": "regex",
    },
    "translator": {
        **_NAMED,
        **_CERTAINTY,
        **_LEVELS,
        **_INPUT,
        "kind": "kind",
        "family": "text",
        "family_by_name": "flag",
        **{f"{side}_{key}": kind for side in "ab" for key, kind in _LEVELS.items()},
        **{f"{side}_supply": "regex" for side in "ab"},
        **{f"{side}_volts": "range" for side in "ab"},
        **{f"{side}_pins": "regex" for side in "ab"},
        **{f"{side}_max_volts": "level" for side in "ab"},
        "switch_supply": "regex",
        "switch_volts": "range",
        "order": "order",
        "direction": "direction",
        "controls": "rows:controls",
        "outputs": "rows:outputs",
        "pins": "rows:pins",
        "output_ohms": "number",
        "output_ohms_in_formula": "number",
        "driver_least_milliamperes": "number",
        "pull_least_ohms": "number",
        "pull_up_ohms": "number",
        "pull_up_low_ohms": "number",
        "pull_up_needed": "flag",
        "load_max_picofarads": "number",
        "open_drain": "flag",
        "open_drain_ok": "flag",
        "push_pull_ok": "flag",
        "bus_hold": "flag",
        "bias_ohms": "number",
        "switch_ohms": "number",
        "switch_threshold_volts": "number",
        "pass_max_volts": "level",
        "pass_points": "rows:pass",
        "partial_power_down": "flag",
        "side_by_number": "flag",
        "inverting": "flag",
        "rates": "rows:rates",
        "current_transfer_least_percent": "number",
        "led_volts": "number",
    },
    "mosfet": {
        **_NAMED,
        "polarity": "np",
        "threshold_volts": "spread",
        "threshold_milliamperes": "number",
        "on_resistance": "rows:resistance",
        "gate_least_volts": "number",
        "gain_amperes_per_volt2": "spread",
        "input_picofarads": "number",
        "output_picofarads": "number",
        "transfer_picofarads": "number",
        "capacitance_drain_volts": "number",
        "body_diode_volts": "number",
        "gate_max_volts": "number",
        "drain_max_volts": "number",
        "drain_max_milliamperes": "number",
        "note_dual": "text",
    },
    "bipolar": {
        **_NAMED,
        **_CERTAINTY,
        "polarity": "npn",
        "gain": "spread",
        "gain_milliamperes": "number",
        "gain_points": "rows:gain",
        "gain_groups": "name-lists",
        "reverse_gain": "spread",
        "base_emitter_volts": "number",
        "base_emitter_milliamperes": "number",
        "saturation_volts": "number",
        "saturation_milliamperes": "number",
        "base_emitter_picofarads": "number",
        "base_collector_picofarads": "number",
        "transition_megahertz": "number",
        "storage_nanoseconds": "spread",
        "emitter_base_max_volts": "number",
        "collector_max_volts": "number",
        "collector_max_milliamperes": "number",
        "base_ohms": "number",
        "base_emitter_ohms": "number",
        "resistor_tolerance_percent": "number",
        "on": "names",
        "off_input_volts": "number",
        "note_dual": "text",
    },
    "diode": {
        **_NAMED,
        **_FORWARD,
        "kind": "diode-kind",
        "reverse_max_volts": "number",
        "forward_max_milliamperes": "number",
        "recovery_nanoseconds": "number",
        "leakage_microamperes": "number",
        "zener_volts": "spread",
        "zener_milliamperes": "number",
        "zener_ohms": "number",
        "knee_ohms": "number",
        "knee_milliamperes": "number",
        "zener_tolerance_percent": "number",
        "volts_from_value": "flag",
        "points": "rows:zener",
        "note_pins": "text",
    },
    "fixed": {**_REGULATOR, "code": "code", "table": "names", "negative": "flag"},
    "adjustable": {
        **_REGULATOR,
        "reference_volts": "number",
        "reference_by_part": "names",
        "reference_range_volts": "range",
        "formula": "formula",
        "adjust_microamperes": "number",
    },
    "defaults": {**_ANY, **{key: kind for key, kind in _REGULATOR.items() if key.endswith("_pins")}},
    "bus": {
        **_ANY,
        "names": "name-regexes",
        "pins": "name-regexes",
        "drive": "text",
        "vih_volts": "level",
        "vil_volts": "level",
        "title": "text",
        "rate_bits_per_second": "number",
        "rate_least_bits_per_second": "number",
        "rate_least_why": "text",
        "together": "texts",
        "parts": "regex",
        "rise_max_nanoseconds": "number",
        "rise_fraction": "number",
        "modes": "rows:modes",
        "sink_milliamperes": "number",
        "sink_volts": "number",
        "pull_up_ohms": "range",
        "pin_picofarads": "number",
        "rules": "texts",
        "both_directions": "flag",
        "open_drain": "flag",
    },
    "pin_names": {**_ANY, "groups": "texts", "parts": "regex", "pins": "rows:pins"},
    "rail_name": {**_ANY, "match": "regexes", "examples": "name-values", "volts": "name-text", "not_alone": "flag"},
    "word_list": {**_ANY, "words": "texts", "match": "regexes"},
    "rail_range": {**_ANY, "match": "regexes", "examples": "texts", "volts": "spread"},
    # parts of rows
    "levels": {"supply_volts": "range", "vih_volts": "level", "vil_volts": "level"},
    "outputs": {
        "supply_volts": "number",
        "voh_volts": "level",
        "ioh_milliamperes": "number",
        "vol_volts": "level",
        "iol_milliamperes": "number",
    },
    "points": {"supply_volts": "number", "vih_volts": "number", "vil_volts": "number"},
    "supplies": {"pins": "regex", "volts": "range", "role": "role"},
    "maxima": {"supply_volts": "range", "input_max_volts": "level"},
    "pins": {
        "names": "regex",
        "parts": "regex",
        "direction": "pin-direction",
        "supply": "regex",
        "vih_volts": "level",
        "vil_volts": "level",
        "input_max_volts": "level",
        "input_max_off_volts": "level",
        "tolerant": "tolerant",
        "side": "side",
        "pull_up_ohms": "number",
        "capacitance_picofarads": "number",
        "io_volts": "number",
        "note": "text",
    },
    "controls": {
        "pins": "regex",
        "use": "use",
        "supply": "regex",
        "active": "active",
        "meaning": "text",
        "max_volts": "number",
        "parts": "regex",
    },
    "rates": {"a_volts": "number", "b_volts": "number", "megabits_per_second": "number", "mode": "text"},
    "pass": {"supply_volts": "number", "least_volts": "number", "typical_volts": "number", "greatest_volts": "number"},
    "resistance": {"gate_volts": "number", "milliamperes": "number", "typical_ohms": "number", "max_ohms": "number"},
    "gain": {"milliamperes": "number", "least": "number", "greatest": "number"},
    "forward": {"milliamperes": "number", "typical_volts": "number", "max_volts": "number"},
    "zener": {"milliamperes": "number", "least_volts": "number", "greatest_volts": "number", "max_ohms": "number"},
    "modes": {
        "id": "text",
        "bits_per_second": "number",
        "rise_max_nanoseconds": "number",
        "rise_min_nanoseconds": "number",
        "fall_max_nanoseconds": "number",
        "load_max_picofarads": "number",
        "sink_milliamperes": "number",
        "sink_volts": "number",
        "note": "text",
    },
}

NEEDED: dict[str, tuple[str, ...]] = {
    "family": ("supply_volts", "levels", "input_max_volts", "clamp", "partial_power_down"),
    "function": ("numbers", "pins"),
    "part": ("match", "group"),
    "translator": ("match", "kind"),
    "mosfet": ("polarity", "threshold_volts", "gain_amperes_per_volt2", "gate_max_volts", "drain_max_volts"),
    "bipolar": ("polarity", "gain", "reverse_gain", "emitter_base_max_volts"),
    "diode": ("kind", "forward"),
    "fixed": ("match", "code"),
    "adjustable": ("match", "reference_volts", "formula"),
    "pin_names": ("groups", "pins"),
    "rail_name": ("match", "volts"),
    "supplies": ("pins", "role"),
    "outputs": ("supply_volts",),
    "levels": ("supply_volts", "vih_volts", "vil_volts"),
    "controls": ("pins", "use", "supply"),
    "pins": ("names",),
}

CHOICES: dict[str, tuple[str, ...]] = {
    "certainty": CERTAINTIES,
    "clamp": ("low", "both", "none"),
    "power-down": ("all", "inputs", "none"),
    "tolerant": ("always", "powered", "never"),
    "np": ("n", "p"),
    "npn": ("npn", "pnp"),
    "code": ("decimal", "tenths", "hundredths", "whole", "table"),
    "formula": ("ground-referred", "floating"),
    "direction": ("dir-pin", "a-to-b", "b-to-a", "auto", "by-channel"),
    "pin-direction": (
        "in",
        "out",
        "inout",
        "open-drain",
        "open-source",
        "analog",
        "supply",
        "supply-out",
        "ground",
        "passive",
    ),
    "side": ("a", "b"),
    "use": ("enable", "direction", "reference"),
    "active": ("H", "L"),
    "role": ("io", "core", "analog", "motor", "usb", "backup", "in", "out", "bias"),
    "diode-kind": ("signal", "schottky", "rectifier", "led", "zener", "suppressor"),
    "kind": (
        "auto-buffer",
        "auto-pass",
        "fet-switch",
        "dual-dir",
        "dual-fixed",
        "single",
        "bus-switch",
        "i2c-buffer",
        "isolator",
    ),
    "group": (
        "logic",
        "mcu",
        "fpga",
        "module",
        "memory",
        "sensor",
        "display",
        "transceiver",
        "driver",
        "translator",
        "analog",
        "passive",
        "connector",
        "other",
    ),
}

# Rows may come from a stranger's project: a repeat of repeats, (a+)+, can keep a matcher busy for hours.
MOST_PATTERN = 600
_REPEATS_REPEATED = re.compile(r"\((?:[^()\\]|\\.)*[*+](?:[^()\\]|\\.)*\)[*+{]")
_ORDER = re.compile(r"any|a(\+\d+(\.\d+)?)?<=b|b(\+\d+(\.\d+)?)?<=a")


def check_file(label: str, text: str, rows: Sequence[Row]) -> None:
    """Refuse a file that is not sound; see `check_row`."""
    try:
        whole = tomllib.loads(text)
    except tomllib.TOMLDecodeError as fault:
        found = re.search(r"line (\d+)", str(fault))
        raise TradeDataError(f"is not TOML: {fault}", file=label, line=int(found[1]) if found else 0) from fault
    for key, value in whole.items():
        if not isinstance(value, list):
            raise TradeDataError(
                f"'{key}' stands outside any [[table]]", remedy="rows begin with [[part]]", file=label, line=1
            )
    seen: dict[tuple[str, str], int] = {}
    for row in rows:
        check_row(row)
        before = seen.setdefault((row.table, row.id), row.line)
        if before != row.line:
            raise row.refuse(f"has the same id as the row in line {before}")


def check_row(row: Row) -> None:
    """Refuse a row that is malformed, has no source or contradicts itself.

    Raises
    ------
    TradeDataError
        With the file and the line of the row's header.
    """
    if row.table not in KEYS:
        raise row.refuse("is no kind of row", f"known: {', '.join(sorted(NEEDED))}")
    if not row.id:
        raise row.refuse("has no id")
    _check_keys(row, row.table, row.data, row.table)
    if not str(row.get("source", "")).strip():
        raise row.refuse("has no source", "name the document, with table or page")
    if "certainty" not in row.data:
        raise row.refuse("has no certainty", f"one of {', '.join(CERTAINTIES)}")
    if row.table in ("mosfet", "bipolar", "diode") and "match" not in row.data and not row.get("generic"):
        raise row.refuse("has neither match nor generic = true")
    _check_levels(row)


def _check_keys(row: Row, kind: str, values: Mapping[str, Any], where: str) -> None:
    known = KEYS[kind]
    for key, value in values.items():
        if key not in known:
            near = difflib.get_close_matches(key, known, 1)
            raise row.refuse(f"has an unknown key '{key}' in {where}", f"did you mean '{near[0]}'?" if near else "")
        _check_value(row, known[key], value, key)
    for key in NEEDED.get(kind, ()):
        if key not in values:
            raise row.refuse(f"lacks '{key}' in {where}")


def _check_value(row: Row, kind: str, value: Any, key: str) -> None:
    if kind.startswith("rows:"):
        _need(row, isinstance(value, list) and all(isinstance(item, dict) for item in value), key, "a list of tables")
        for item in value:
            _check_keys(row, kind[5:], item, key)
    elif kind in CHOICES:
        _need(row, value in CHOICES[kind], key, f"one of {', '.join(CHOICES[kind])}")
    elif kind == "text":
        _need(row, isinstance(value, str) and bool(value.strip()), key, "a text")
    elif kind == "texts":
        _need(row, isinstance(value, list) and all(isinstance(item, str) for item in value), key, "a list of texts")
    elif kind == "flag":
        _need(row, isinstance(value, bool), key, "true or false")
    elif kind == "number":
        _need(row, _is_number(value), key, "a number")
    elif kind in ("range", "spread"):
        count = 2 if kind == "range" else 3
        right = isinstance(value, list) and len(value) == count and all(_is_number(item) for item in value)
        _need(row, right, key, f"{count} numbers")
        _need(row, sorted(value) == list(value), key, "in ascending order")
    elif kind == "level":
        _need(row, isinstance(value, str), key, "an expression of V in quotes")
        try:
            compiled(value)
        except LevelError as fault:
            raise row.refuse(f"has a wrong '{key}': {fault}") from fault
    elif kind in ("regex", "regexes"):
        _need(
            row,
            isinstance(value, str) if kind == "regex" else isinstance(value, list) and bool(value),
            key,
            "a pattern",
        )
        for pattern in [value] if kind == "regex" else value:
            _check_regex(row, pattern, key)
    elif kind == "order":
        _need(row, isinstance(value, str) and bool(_ORDER.fullmatch(value)), key, "any, a<=b, b<=a or a+0.8<=b")
    elif kind == "pairs":
        right = isinstance(value, list) and all(isinstance(item, list) and len(item) == 2 for item in value)
        _need(row, right, key, "pairs of numbers")
    else:
        _need(row, isinstance(value, (dict, str)), key, "a table")
        if kind == "name-regexes":
            for pattern in value.values():
                _check_regex(row, pattern, key)


def _check_regex(row: Row, pattern: Any, key: str) -> None:
    _need(row, isinstance(pattern, str), key, "a pattern")
    try:
        found = re.compile(pattern, re.IGNORECASE)
    except re.error as fault:
        raise row.refuse(f"has a wrong pattern '{pattern}' in '{key}': {fault}") from fault
    if len(pattern) > MOST_PATTERN or _REPEATS_REPEATED.search(pattern):
        raise row.refuse(
            f"has a pattern in '{key}' that may take for ever: '{pattern[:60]}'", "write it without repeats of repeats"
        )
    if key == "match" and row.table not in ("rail_name", "rail_range", "word_list"):
        if found.match("") is not None:
            raise row.refuse(f"has a pattern that matches nothing at all: '{pattern}'")
        if _has_open_alternatives(pattern):
            raise row.refuse(f"has alternatives outside parentheses: '{pattern}'", "make them patterns of their own")


def _has_open_alternatives(pattern: str) -> bool:
    depth = 0
    escaped = in_class = False
    for letter in pattern:
        if escaped:
            escaped = False
        elif letter == "\\":
            escaped = True
        elif in_class:
            in_class = letter != "]"
        elif letter == "[":
            in_class = True
        elif letter in "()":
            depth += 1 if letter == "(" else -1
        elif letter == "|" and depth == 0:
            return True
    return False


def _check_levels(row: Row) -> None:
    """Refuse levels that contradict each other at some supply of their range."""
    ranges = _supply_ranges(row)
    for prefix in ("", "a_", "b_"):
        own = ranges.get(prefix, ranges[""])
        if f"{prefix}vih_volts" in row.data and f"{prefix}vil_volts" in row.data:
            _check_pair(row, own, row.data[f"{prefix}vih_volts"], row.data[f"{prefix}vil_volts"])
        for piece in row.get(f"{prefix}levels", ()):
            _check_pair(row, piece["supply_volts"], piece["vih_volts"], piece["vil_volts"])
    for pin in row.get("pins", ()):
        if isinstance(pin, dict) and "vih_volts" in pin and "vil_volts" in pin:
            _check_pair(row, ranges[""], pin["vih_volts"], pin["vil_volts"])
    for point in row.get("outputs", ()):
        if not isinstance(point, dict) or "voh_volts" not in point or "vol_volts" not in point:
            continue
        supply = point["supply_volts"]
        high, low = _at(row, point["voh_volts"], supply), _at(row, point["vol_volts"], supply)
        if low >= high:
            raise row.refuse(f"has an output low of {low:g} V that is not below its high of {high:g} V at {supply:g} V")
        if high > supply + 1e-9:
            raise row.refuse(f"has an output high of {high:g} V above its supply of {supply:g} V")


def _supply_ranges(row: Row) -> dict[str, list[float]]:
    whole = row.get("supply_volts") or row.get("switch_volts")
    found: dict[str, list[float]] = {}
    for side in "ab":
        if f"{side}_volts" in row.data:
            found[f"{side}_"] = row.data[f"{side}_volts"]
    if whole is None and row.table == "part":
        pattern = row.get("io_supply")
        matching = [item for item in row.get("supplies", ()) if item.get("role") == "io" and "volts" in item]
        exact = [item for item in matching if item["pins"] == pattern] or matching
        if exact:
            whole = [min(item["volts"][0] for item in exact[:1]), max(item["volts"][1] for item in exact[:1])]
        elif "io_volts" in row.data:
            whole = [row.data["io_volts"]] * 2
    found[""] = whole or found.get("a_") or [3.3, 3.3]
    return found


def _check_pair(row: Row, supplies: Sequence[float], high: str, low: str) -> None:
    for share in (0.0, 0.25, 0.5, 0.75, 1.0):
        supply = supplies[0] + (supplies[1] - supplies[0]) * share
        vih, vil = _at(row, high, supply), _at(row, low, supply)
        if vil >= vih:
            raise row.refuse(f"has VIL {vil:g} V not below VIH {vih:g} V at {supply:g} V ('{low}' and '{high}')")


def _at(row: Row, text: str, supply: float) -> float:
    try:
        return float(compiled(text)(float(supply)))
    except ZeroDivisionError as fault:
        raise row.refuse(f"divides by zero in '{text}' at {supply:g} V") from fault


def _is_number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def _need(row: Row, right: bool, key: str, wanted: str) -> None:
    if not right:
        raise row.refuse(f"needs {wanted} for '{key}'")
