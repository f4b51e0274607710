"""The pen that draws the small sheets of this folder (see cases.py).

Coordinates are in grid steps of 2.54 mm. Identifiers are counted, so that drawing twice gives the same bytes.
"""

from __future__ import annotations

import re
from itertools import pairwise
from pathlib import Path

GRID_MM = 2.54
PASSIVE = "passive"
NUMBER = re.compile(r'\(number "([^"]*)"')
FONT = "(effects (font (size 1.27 1.27)))"


def _pin(kind: str, x: float, y: float, name: str, number: str, *, hide: bool = False, more: str = "") -> str:
    hidden = " (hide yes)" if hide else ""
    return (
        f'(pin {kind} line (at {x * GRID_MM:g} {y * GRID_MM:g} 0) (length 0){hidden} (name "{name}") '
        f'(number "{number}"){more})'
    )


def _symbol(name: str, prefix: str, units: dict[str, list[str]], *, flags: str = "", value: str = "") -> str:
    short = name.split(":")[-1]
    bodies = " ".join(f'(symbol "{short}_{unit}" {" ".join(pins)})' for unit, pins in units.items())
    return (
        f'(symbol "{name}" {flags} (in_bom yes) (on_board yes) (property "Reference" "{prefix}" (at 0 0 0)) '
        f'(property "Value" "{value or short}" (at 0 0 0)) (property "Footprint" "" (at 0 0 0)) '
        f'(property "Datasheet" "" (at 0 0 0)) {bodies})'
    )


LIBRARY = {
    "own:TP": _symbol("own:TP", "TP", {"1_1": [_pin(PASSIVE, 0, 0, "1", "1")]}),
    "own:NP": _symbol("own:NP", "NP", {"1_1": [_pin("input", 0, 0, "IN", "7")]}),
    "own:NCP": _symbol("own:NCP", "NCP", {"1_1": [_pin("no_connect", 0, 0, "NC", "8")]}),
    "own:R": _symbol("own:R", "R", {"1_1": [_pin(PASSIVE, 0, 1, "~", "1"), _pin(PASSIVE, 0, -1, "~", "2")]}),
    "own:L": _symbol("own:L", "L", {"1_1": [_pin(PASSIVE, 0, 1, "A", "1"), _pin(PASSIVE, 2, -1, "K", "2")]}),
    "own:VCC": _symbol("own:VCC", "#PWR", {"1_1": [_pin("power_in", 0, 0, "VCC", "1", hide=True)]}, flags="(power)"),
    "own:LOC": _symbol(
        "own:LOC", "#PWR", {"1_1": [_pin("power_in", 0, 0, "LOC", "1", hide=True)]}, flags="(power local)"
    ),
    "own:FLAG": _symbol("own:FLAG", "#FLG", {"1_1": [_pin("power_out", 0, 0, "pwr", "1")]}, flags="(power)"),
    "own:IC": _symbol(
        "own:IC",
        "U",
        {
            "1_1": [_pin("input", 0, 0, "A", "1"), _pin("output", 3, 0, "Y", "2")],
            "2_1": [_pin("input", 0, 0, "A", "3"), _pin("output", 3, 0, "Y", "4")],
            "0_1": [
                _pin("power_in", 1, 1, "VCC", "14", hide=True),
                _pin("power_in", 1, -1, "GND", "7", hide=True),
            ],
        },
    ),
    "own:TWIN": _symbol(
        "own:TWIN",
        "U",
        {"1_1": [_pin("bidirectional", 0, 0, "IO/A", "1"), _pin("bidirectional", 3, 0, "IO/A", "2")]},
    ),
    "own:ALT": _symbol(
        "own:ALT",
        "U",
        {
            "1_1": [
                _pin("bidirectional", 0, 0, "PA0", "1", more=' (alternate "TX" output line)'),
                _pin("bidirectional", 3, 0, "PA1", "2", more=' (alternate "RX" input line)'),
            ]
        },
    ),
    "own:STACK": _symbol(
        "own:STACK",
        "U",
        {
            "1_1": [
                _pin(PASSIVE, 0, 0, "S", "1"),
                _pin(PASSIVE, 0, 0, "S", "2", hide=True),
                _pin(PASSIVE, 3, 0, "S", "1"),
            ]
        },
    ),
    "own:BASE": _symbol("own:BASE", "Q", {"1_1": [_pin(PASSIVE, 0, 0, "B", "1"), _pin(PASSIVE, 3, 0, "E", "2")]}),
    "own:TWICE": _symbol(
        "own:TWICE",
        "K",
        {
            "1_1": [_pin(PASSIVE, 0, 0, "P", "1"), _pin(PASSIVE, 3, 0, "Q", "2")],
            "1_2": [_pin(PASSIVE, 0, 1, "P", "1"), _pin(PASSIVE, 3, 1, "Q", "2")],
        },
    ),
    "own:DERIVED": '(symbol "own:DERIVED" (extends "BASE") (property "Reference" "Q" (at 0 0 0)) '
    '(property "Value" "DERIVED" (at 0 0 0)))',
    "TP_1": _symbol("TP_1", "TP", {"1_1": [_pin(PASSIVE, 2, 0, "1", "1")]}),
    "own:TIE": _symbol("own:TIE", "NT", {"1_1": [_pin(PASSIVE, -1, 0, "1", "1"), _pin(PASSIVE, 1, 0, "2", "2")]}),
}
PARENTS = {"own:DERIVED": ("own:BASE",)}


class Drawing:
    """One sheet under the pen."""

    def __init__(self, name: str, *, version: int = 20250114, number: int = 1) -> None:
        self.name = name
        self.version = version
        self.number = number
        self.root: Drawing = self
        self.old_instances: list[str] = []
        self.old_pages: list[str] = []
        self.items: list[str] = []
        self.used: list[str] = []
        self.count = 0
        self.uuid = self._next()
        self.path = f"/{self.uuid}"
        self.paths: list[str] = []

    def _next(self) -> str:
        self.count += 1
        return f"00000000-0000-4000-8{self.number:03d}-{self.count:012d}"

    def _at(self, x: float, y: float) -> str:
        return (
            f"{(x + 10) * GRID_MM:.4f}".rstrip("0").rstrip(".")
            + " "
            + f"{(y + 10) * GRID_MM:.4f}".rstrip("0").rstrip(".")
        )

    def wire(self, *points: tuple[float, float], kind: str = "wire") -> Drawing:
        for start, end in pairwise(points):
            self.items.append(
                f"({kind} (pts (xy {self._at(*start)}) (xy {self._at(*end)})) "
                f'(stroke (width 0) (type default)) (uuid "{self._next()}"))'
            )
        return self

    def bus(self, *points: tuple[float, float]) -> Drawing:
        return self.wire(*points, kind="bus")

    def entry(self, x: float, y: float, dx: float = 1, dy: float = 1) -> Drawing:
        self.items.append(
            f"(bus_entry (at {self._at(x, y)}) (size {dx * GRID_MM:g} {dy * GRID_MM:g}) "
            f'(stroke (width 0) (type default)) (uuid "{self._next()}"))'
        )
        return self

    def dot(self, x: float, y: float) -> Drawing:
        self.items.append(f'(junction (at {self._at(x, y)}) (diameter 0) (color 0 0 0 0) (uuid "{self._next()}"))')
        return self

    def cross(self, x: float, y: float) -> Drawing:
        self.items.append(f'(no_connect (at {self._at(x, y)}) (uuid "{self._next()}"))')
        return self

    def label(self, text: str, x: float, y: float, kind: str = "label", shape: str = "input") -> Drawing:
        shaped = "" if kind == "label" else f"(shape {shape}) "
        self.items.append(f'({kind} "{text}" {shaped}(at {self._at(x, y)} 0) {FONT} (uuid "{self._next()}"))')
        return self

    def glob(self, text: str, x: float, y: float) -> Drawing:
        return self.label(text, x, y, "global_label")

    def hier(self, text: str, x: float, y: float, shape: str = "input") -> Drawing:
        return self.label(text, x, y, "hierarchical_label", shape)

    def part(
        self,
        library: str,
        reference: str | list[str],
        x: float,
        y: float,
        *,
        angle: int = 0,
        mirror: str = "",
        unit: int = 1,
        value: str = "",
        flags: str = "",
        fields: dict[str, str] | None = None,
        more: str = "",
        lib_name: str = "",
        units: list[int] | None = None,
    ) -> Drawing:
        for name in (*PARENTS.get(lib_name or library, ()), lib_name or library):
            if name not in self.used:
                self.used.append(name)
        references = [reference] if isinstance(reference, str) else reference
        paths = self.paths or [self.path]
        instances = " ".join(
            f'(path "{path}" (reference "{name}") (unit {number}))'
            for path, name, number in zip(paths, references, units or [unit] * len(paths), strict=False)
        )
        turned = f" (mirror {mirror})" if mirror else ""
        extra = " ".join(f'(property "{key}" "{text}" (at 0 0 0))' for key, text in (fields or {}).items())
        uuid = self._next()
        if self.old:
            # KiCad 6 keeps the references of all uses in the root sheet, with paths that leave the root out.
            for path, name in zip(paths, references, strict=False):
                below = "/" + path[1:].partition("/")[2]
                self.root.old_instances.append(
                    f'(path "{below.rstrip("/")}/{uuid}" (reference "{name}") (unit {unit}) '
                    f'(value "{value or library.split(":")[-1]}") (footprint ""))'
                )
        ending = "" if self.old else f'(instances (project "" {instances}))'
        plain = (
            "(in_bom yes) (on_board yes)" if self.old else "(exclude_from_sim no) (in_bom yes) (on_board yes) (dnp no)"
        )
        named = f'(lib_name "{lib_name}") ' if lib_name else ""
        if "(pin" not in more:
            # As KiCad does: each symbol lists the pins of its unit.
            bodies = re.findall(r'\(symbol "[^"]*_(\d+)_\d+" (.*?)(?=\(symbol "|$)', LIBRARY[lib_name or library])
            numbers = [found for body, pins in bodies if int(body) in (0, unit) for found in NUMBER.findall(pins)]
            more += " ".join(f'(pin "{number}" (uuid "{self._next()}"))' for number in dict.fromkeys(numbers))
        self.items.append(
            f'(symbol {named}(lib_id "{library}") (at {self._at(x, y)} {angle}){turned} (unit {unit}) '
            f"{flags or plain} "
            f'(uuid "{uuid}") (property "Reference" "{references[0]}" (at 0 0 0)) '
            f'(property "Value" "{value or library.split(":")[-1]}" (at 0 0 0)) (property "Footprint" "" (at 0 0 0)) '
            f'(property "Datasheet" "" (at 0 0 0)) {extra} {more} {ending})'
        )
        return self

    def tp(self, *spots: tuple[str | list[str], float, float]) -> Drawing:
        for reference, x, y in spots:
            self.part("own:TP", reference, x, y)
        return self

    def sheet(
        self, name: str, child: Drawing, x: float, y: float, pins: list[tuple[str, str, float, float]], file: str = ""
    ) -> Drawing:
        uuid = self._next()
        child.root = self.root
        if self.old:
            self.root.old_pages.append(f'(path "/{uuid}" (page "{len(self.root.old_pages) + 2}"))')
        page = len(child.paths) + child.number
        child.paths.extend(f"{path}/{uuid}" for path in (self.paths or [self.path]))
        drawn = " ".join(
            f'(pin "{text}" {shape} (at {self._at(px, py)} 180) {FONT} (uuid "{self._next()}"))'
            for text, shape, px, py in pins
        )
        flags = "" if self.old else "(exclude_from_sim no) (in_bom yes) (on_board yes) (dnp no) "
        names = ("Sheet name", "Sheet file") if self.old else ("Sheetname", "Sheetfile")
        own = " ".join(f'(path "{path}" (page "{page + i}"))' for i, path in enumerate(self.paths or [self.path]))
        pages = "" if self.old else f'(instances (project "" {own}))'
        self.items.append(
            f"(sheet (at {self._at(x, y)}) (size 12.7 25.4) {flags}"
            f'(stroke (width 0) (type solid)) (fill (color 0 0 0 0)) (uuid "{uuid}") '
            f'(property "{names[0]}" "{name}" (at 0 0 0)) '
            f'(property "{names[1]}" "{file or child.name + ".kicad_sch"}" (at 0 0 0)) {drawn} {pages})'
        )
        return self

    def alias(self, name: str, *members: str) -> Drawing:
        quoted = " ".join(f'"{member}"' for member in members)
        self.items.append(f'(bus_alias "{name}" (members {quoted}))')
        return self

    @property
    def old(self) -> bool:
        """Whether it is drawn as KiCad 6 does."""
        return self.version < 20220000

    def text(self) -> str:
        library = "\n    ".join(LIBRARY[name] for name in self.used)
        if self.old:
            library = library.replace(" (hide yes)", " hide")
        body = "\n  ".join(self.items)
        maker = "(generator eeschema)" if self.old else '(generator "eeschema") (generator_version "9.0")'
        ending = '(sheet_instances (path "/" (page "1"))' + " ".join(self.old_pages) + ")"
        if self.old_instances:
            ending += "\n  (symbol_instances\n    " + "\n    ".join(self.old_instances) + ")"
        return (
            f'(kicad_sch (version {self.version}) {maker}\n  (uuid "{self.uuid}")\n  (paper "A4")\n'
            f"  (lib_symbols\n    {library})\n  {body}\n  {ending})\n"
        )

    def save(self, folder: Path) -> Path:
        file = folder / f"{self.name}.kicad_sch"
        file.write_text(self.text(), encoding="utf-8")
        return file
