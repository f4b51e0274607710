"""From a ``[[family]]`` row and the function number to what is known of a logic part and its pins."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from levelcrossing import levels
from levelcrossing.model import Part, PartFacts, Pin, PinFacts, SupplyFacts, TranslatorFacts
from levelcrossing.trade_pins import (
    LOGIC_SUPPLY,
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
        gates = (
            "2G" if text[found.start() :].startswith(("NC7W", "NL27")) else "3G" if text.startswith("NL37") else "1G"
        )
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
            values.update(vmax=parsed("V+0.5"), vmax_off=None, clamp_high=True)
        if direction == "analog":
            values.update(vih=None, vil=None, outputs=(), vmax=parsed("V+0.5"), vmax_off=None, clamp_high=True)
        return replace(base, **values)

    return PartFacts(
        title=_family_title(row, text),
        group="logic",
        provenance=row.provenance,
        supplies=supplies,
        pin=remembered(pin_facts),
        translator=translator,
        partial_power_down={"all": True, "inputs": None, "none": False}[off],
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
        vmax_off=most if tolerant and off_state in ("all", "inputs") else None,
        vmin=levels.fixed(-0.5),
        clamp_high=not tolerant,
        clamp_low=row.get("clamp") != "none",
        injection_amps=scaled(row.get("clamp_milliamperes"), 1e-3),
        outputs=output_points(row.get("outputs", ())),
        output_amps=scaled(row.get("output_max_milliamperes"), 1e-3),
        capacitance_farads=scaled(row.get("capacitance_picofarads"), 1e-12),
    )


_OUT_NAMES = re.compile(r"\d?Y[\da-h]?\d?|Q\w{0,2}'?|\d?Q\d?|O\d+|OUT\w*|\d?Z", re.IGNORECASE)
_KIND_DIRECTION = {
    "input": "in",
    "output": "out",
    "tri_state": "out",
    "open_collector": "out",
    "bidirectional": "inout",
}


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
    return any(
        plain_name(pin.name) not in ("", pin.number) for pin in part.pins if pin.kind not in ("power_in", "power_out")
    )
