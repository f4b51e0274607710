"""Draws the small sheets of this folder: each shows one rule of connectivity.

Coordinates are in grid steps of 2.54 mm. Identifiers are counted, so that drawing twice gives the same bytes.
"""

from __future__ import annotations

from pathlib import Path

GRID_MM = 2.54
PASSIVE = "passive"


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
    "own:L": _symbol(
        "own:L", "L", {"1_1": [_pin(PASSIVE, 0, 1, "A", "1"), _pin(PASSIVE, 2, -1, "K", "2")]}
    ),
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
        {"1_1": [_pin(PASSIVE, 0, 0, "S", "1"), _pin(PASSIVE, 0, 0, "S", "2", hide=True), _pin(PASSIVE, 3, 0, "S", "1")]},
    ),
}


class Drawing:
    """One sheet under the pen."""

    def __init__(self, name: str, *, root: str = "", version: int = 20250114, number: int = 1) -> None:
        self.name = name
        self.version = version
        self.number = number
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
        return f"{(x + 10) * GRID_MM:.4f}".rstrip("0").rstrip(".") + " " + f"{(y + 10) * GRID_MM:.4f}".rstrip("0").rstrip(".")

    def wire(self, *points: tuple[float, float], kind: str = "wire") -> Drawing:
        for start, end in zip(points, points[1:]):
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
        self.items.append(
            f'({kind} "{text}" {shaped}(at {self._at(x, y)} 0) (effects (font (size 1.27 1.27))) (uuid "{self._next()}"))'
        )
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
    ) -> Drawing:
        if library not in self.used:
            self.used.append(library)
        references = [reference] if isinstance(reference, str) else reference
        paths = self.paths or [self.path]
        instances = " ".join(
            f'(path "{path}" (reference "{name}") (unit {unit}))' for path, name in zip(paths, references)
        )
        turned = f" (mirror {mirror})" if mirror else ""
        extra = " ".join(f'(property "{key}" "{text}" (at 0 0 0))' for key, text in (fields or {}).items())
        self.items.append(
            f'(symbol (lib_id "{library}") (at {self._at(x, y)} {angle}){turned} (unit {unit}) '
            f"{flags or '(exclude_from_sim no) (in_bom yes) (on_board yes) (dnp no)'} "
            f'(uuid "{self._next()}") (property "Reference" "{references[0]}" (at 0 0 0)) '
            f'(property "Value" "{value or library.split(":")[-1]}" (at 0 0 0)) (property "Footprint" "" (at 0 0 0)) '
            f'(property "Datasheet" "" (at 0 0 0)) {extra} {more} (instances (project "" {instances})))'
        )
        return self

    def tp(self, *spots: tuple[str, float, float]) -> Drawing:
        for reference, x, y in spots:
            self.part("own:TP", reference, x, y)
        return self

    def sheet(
        self, name: str, child: Drawing, x: float, y: float, pins: list[tuple[str, str, float, float]], file: str = ""
    ) -> Drawing:
        uuid = self._next()
        child.paths.extend(f"{path}/{uuid}" for path in (self.paths or [self.path]))
        drawn = " ".join(
            f'(pin "{text}" {shape} (at {self._at(px, py)} 180) (effects (font (size 1.27 1.27))) (uuid "{self._next()}"))'
            for text, shape, px, py in pins
        )
        self.items.append(
            f"(sheet (at {self._at(x, y)}) (size 12.7 25.4) (exclude_from_sim no) (in_bom yes) (on_board yes) (dnp no) "
            f'(stroke (width 0) (type solid)) (fill (color 0 0 0 0)) (uuid "{uuid}") '
            f'(property "Sheetname" "{name}" (at 0 0 0)) (property "Sheetfile" "{file or child.name + ".kicad_sch"}" (at 0 0 0)) '
            f'{drawn} (instances (project "" (path "{self.path}" (page "{len(child.paths) + 1}")))))'
        )
        return self

    def alias(self, name: str, *members: str) -> Drawing:
        quoted = " ".join(f'"{member}"' for member in members)
        self.items.append(f'(bus_alias "{name}" (members {quoted}))')
        return self

    def save(self, folder: Path) -> Path:
        library = "\n    ".join(LIBRARY[name] for name in self.used)
        body = "\n  ".join(self.items)
        file = folder / f"{self.name}.kicad_sch"
        file.write_text(
            f'(kicad_sch (version {self.version}) (generator "eeschema") (generator_version "9.0")\n'
            f'  (uuid "{self.uuid}")\n  (paper "A4")\n  (lib_symbols\n    {library})\n  {body}\n'
            f'  (sheet_instances (path "/" (page "1")))\n  (embedded_fonts no))\n',
            encoding="utf-8",
        )
        return file
