"""Rows of trade data to fill in, for parts that the library does not know: ready to paste into a file for ``--facts``."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from levelcrossing.model import CaseFile, PinModel

# Names that TOML literal strings cannot hold, or that would end the row, are left to the user.
_PLAIN = re.compile(r"[\x20-\x26\x28-\x7e]+")
# No part number is longer.
MOST_LETTERS = 60
_DIRECTIONS = {(True, True): "inout", (True, False): "out", (False, True): "in"}


def house_row(number: str, pins: Sequence[PinModel] = (), supplies: Mapping[str, float] | None = None) -> str:
    """Return a row of trade data to fill in.

    Parameters
    ----------
    number : str
        Part number, or a part's value.
    pins : sequence of PinModel
        The part's pins as the board shows them, for their directions.
    supplies : mapping from pin name to volts, optional
        What the board feeds the part with [V].

    Returns
    -------
    str
        TOML that loads as it stands and says of itself that nobody has looked the figures up.
    """
    # One word that TOML and a regular expression can hold: what else a value says is a package or a remark.
    word = "".join(character for character in number.split(" ")[0].split("(")[0] if _PLAIN.fullmatch(character))
    shown = word.replace("\\", "").replace('"', "").strip()[:MOST_LETTERS] or "PART"
    lines = [
        "[[part]]",
        f'id = "{shown}"',
        f"match = ['{re.escape(shown)}']",
        f'examples = ["{shown}"]',
        'group = "other"',
        *_supplies(supplies or {}),
        'vih_volts = "0.7*V"',
        'vil_volts = "0.3*V"',
        'input_max_volts = "V+0.3"',
        *_directions(pins),
        'source = "not looked up yet: name the data sheet and its table"',
        'certainty = "practice"   # datasheet, once the figures above come from one',
    ]
    return "\n".join(lines) + "\n"


def house_rows(case: CaseFile) -> tuple[str, ...]:
    """Return a row for each value of which nothing is known although signals were judged on it."""
    values = {part.reference: part.value for part in case.board.parts}
    pins: dict[str, list[PinModel]] = {}
    unknown: dict[str, str] = {}
    for pin in case.pins.values():
        pins.setdefault(pin.part, []).append(pin)
        if pin.role == "signal" and pin.part not in case.facts:
            unknown.setdefault(values[pin.part], pin.part)
    rows = []
    for value, reference in sorted(unknown.items()):
        supplies = {
            pin.name: volts.nominal
            for pin in pins[reference]
            if pin.role == "supply" and (volts := case.rails.volts(pin.net)) is not None and volts.nominal > 0
        }
        rows.append(house_row(value, pins[reference], supplies))
    return tuple(rows)


def _supplies(supplies: Mapping[str, float]) -> list[str]:
    found = {name: volts for name, volts in supplies.items() if _PLAIN.fullmatch(name)}
    if not found:
        return ["supplies = [ { pins = 'VDD|VCC', volts = [3.0, 3.6], role = \"io\" } ]", "io_supply = 'VDD|VCC'"]
    lines = ["supplies = ["]
    for name, volts in found.items():
        lines.append(
            f"  {{ pins = '{re.escape(name)}', volts = [{0.9 * volts:.2f}, {1.1 * volts:.2f}], role = \"io\" }},"
            f"   # this board gives it {volts:.2f} V"
        )
    return [*lines, "]", f"io_supply = '{re.escape(next(iter(found)))}'"]


def _directions(pins: Sequence[PinModel]) -> list[str]:
    names: dict[str, list[str]] = {}
    for pin in pins:
        direction = _DIRECTIONS.get((pin.drive is not None, pin.receive is not None))
        if pin.role != "signal" or direction is None or not _PLAIN.fullmatch(pin.name):
            continue
        if pin.drive is not None and pin.drive.style == "open-drain":
            direction = "open-drain"
        plain = re.sub(r"[~{}]", "", pin.name)
        if plain not in names.setdefault(direction, []):
            names[direction].append(plain)
    if not names:
        return []
    lines = ["pins = [   # directions as this review took them"]
    for direction, members in names.items():
        lines.append(f"  {{ names = '{'|'.join(re.escape(name) for name in members)}', direction = \"{direction}\" }},")
    return [*lines, "]"]
