"""KiCad sheets -> Board, without KiCad: the same board that its exported netlist gives."""

from __future__ import annotations

import re
from collections import defaultdict
from dataclasses import dataclass
from pathlib import Path

from levelcrossing.model import Board, Net, Part, Pin
from levelcrossing.read.sheet_files import (
    POWER_BY_VALUE_VERSION,
    Instance,
    LibrarySymbol,
    SheetSymbol,
)
from levelcrossing.read.sheet_geometry import Group, PlacedPin, placed_pin, touching
from levelcrossing.read.sheet_names import resolve, unit_letters
from levelcrossing.read.sheet_nets import DrawnNet, Nets, SheetUse, UsedPin
from levelcrossing.read.sheet_project import Project, Use, find_root

_OWN_FIELDS = frozenset({"Reference", "Value", "Footprint", "Datasheet"})


@dataclass(slots=True, kw_only=True)
class _Unit:
    """A symbol on one use of its sheet."""

    use: int
    symbol: SheetSymbol
    instance: Instance
    library: LibrarySymbol | None


def read_sheets(path: str | Path) -> Board:
    """Read a board from its sheets.

    Parameters
    ----------
    path : str or Path
        A ``.kicad_sch`` (root or sub-sheet), a ``.kicad_pro`` or a project folder.

    Returns
    -------
    Board

    Raises
    ------
    InputError
        When a sheet is missing, damaged, too old or a sub-sheet of itself.
    """
    given = Path(path)
    root = find_root(given)
    project = Project(root)
    reader = _Reader(project)
    drawn = Nets(reader.sheet_uses(), project.aliases).drawn()
    remarks = list(project.remarks)
    if given.is_file() and given.suffix == ".kicad_sch" and given != root:
        remarks.append(f"{given.name} is a sub-sheet: the whole board was read from {root.name}")
    return Board(
        path=str(path),
        form="sheets",
        maker=project.uses[0].file.maker,
        parts=reader.parts(drawn),
        nets=_nets(drawn),
        remarks=tuple(remarks),
        sheet_files=tuple(dict.fromkeys(project.shown(use.file.path) for use in project.uses)),
    )


def natural(text: str) -> list[tuple[int, int, str]]:
    """Return a sort key that puts R2 before R10."""
    return [(0, int(run), "") if run.isdigit() else (1, 0, run) for run in re.findall(r"\d+|\D+", text)]


def _nets(drawn: list[DrawnNet]) -> tuple[Net, ...]:
    nets = []
    for net in drawn:
        pins = {(used.reference, used.pin.number) for used in net.pins}
        nets.append(Net(name=net.name, pins=tuple(sorted(pins))))
    return tuple(sorted(nets, key=lambda net: net.name))


class _Reader:
    def __init__(self, project: Project) -> None:
        self.project = project
        self.geometry: dict[tuple[object, ...], list[Group]] = {}
        self.units: list[list[_Unit]] = [
            [
                _Unit(
                    use=index,
                    symbol=symbol,
                    instance=project.instance(use, symbol),
                    library=self._library(use, symbol),
                )
                for symbol in use.file.symbols
            ]
            for index, use in enumerate(project.uses)
        ]
        self.by_reference: dict[str, list[_Unit]] = defaultdict(list)
        for units in self.units:
            for unit in units:
                self.by_reference[unit.instance.reference].append(unit)

    def _library(self, use: Use, symbol: SheetSymbol) -> LibrarySymbol | None:
        found = self.project.library(use.file, symbol)
        return None if found is None else found[0]

    # ------------------------------------------------------------------------------------------------------ the nets

    def sheet_uses(self) -> list[SheetUse]:
        """Return every use of every sheet with what touches on it."""
        return [self._sheet_use(index, use) for index, use in enumerate(self.project.uses)]

    def _sheet_use(self, index: int, use: Use) -> SheetUse:
        units = self.units[index]
        key = (use.file.path, *(unit.instance.unit for unit in units))
        groups = self.geometry.get(key)
        if groups is None:
            pins = [pin for position, unit in enumerate(units) for pin in self._placed(position, unit)]
            groups = self.geometry[key] = touching(use.file, pins)
        names = _several_names(groups)
        return SheetUse(
            names=use.names,
            depth=use.depth,
            groups=groups,
            pin_of=lambda pin: self._used(index, pin, names),
            shown=lambda text: resolve(text, lambda name: self._sheet_variable(use, name)),
            children=use.children,
        )

    def _placed(self, position: int, unit: _Unit) -> list[PlacedPin]:
        if unit.library is None:
            return []
        chosen = dict(unit.symbol.alternates)
        return [
            placed_pin(position, unit.symbol, pin, chosen)
            for number, style, pin in unit.library.pins
            if number in (0, unit.instance.unit) and style in (0, unit.symbol.style)
        ]

    def _used(self, index: int, pin: PlacedPin, names: dict[tuple[int, str, bool], set[str]]) -> UsedPin:
        use = self.project.uses[index]
        unit = self.units[index][pin.symbol]
        library = unit.library
        assert library is not None
        power = None
        if pin.kind == "power_in":
            if library.power:
                power = self._shown_value(unit)
                if use.file.version < POWER_BY_VALUE_VERSION:
                    power = pin.name
            elif pin.hidden:
                power = pin.name
        reference = unit.instance.reference
        same = names.get((pin.symbol, pin.name, pin.kind == "no_connect"), set())
        return UsedPin(
            reference=reference,
            symbol=(index, pin.symbol),
            pin=pin,
            unit=unit_letters(unit.instance.unit) if library.units > 1 else "",
            several=len(same) > 1,
            netlisted=not reference.startswith("#") and unit.symbol.on_board and use.on_board and not library.power,
            power=power,
            power_local=library.power == "local",
        )

    # --------------------------------------------------------------------------------------------------- text variables

    def _sheet_variable(self, use: Use, name: str) -> str | None:
        reference, colon, inner = name.partition(":")
        if colon:
            units = self.by_reference.get(reference)
            return self._symbol_variable(units[0], inner) if units else None
        if use.box is not None:
            for field, text in use.box.fields:
                if field == name:
                    return text
        fixed = {
            "SHEETNAME": use.box.name if use.box is not None else "",
            "SHEETFILE": use.box.file if use.box is not None else "",
            "SHEETPATH": use.names,
            "FILENAME": use.file.path.name,
            "PROJECTNAME": self.project.root.stem,
            "#": use.page,
            "##": str(len(self.project.uses)),
        }
        if name in fixed:
            return fixed[name]
        if name in use.file.titles:
            return use.file.titles[name]
        return self.project.variables.get(name)

    def _symbol_variable(self, unit: _Unit, name: str) -> str | None:
        fixed = {
            "REFERENCE": unit.instance.reference,
            "VALUE": self._value(unit),
            "FOOTPRINT": self._footprint(unit),
            "DATASHEET": unit.symbol.field("Datasheet"),
            "UNIT": unit_letters(unit.instance.unit),
            "DNP": "" if unit.symbol.fitted else "DNP",
            "SYMBOL_NAME": unit.symbol.library_id.rpartition(":")[2],
            "SYMBOL_LIBRARY": unit.symbol.library_id.rpartition(":")[0],
        }
        if name.upper() in fixed:
            return fixed[name.upper()]
        for field, text in unit.symbol.fields:
            if field.casefold() == name.casefold():
                return text
        return None

    def _shown(self, unit: _Unit, text: str) -> str:
        if "${" not in text:
            return text

        def lookup(name: str) -> str | None:
            found = self._symbol_variable(unit, name)
            return self._sheet_variable(self.project.uses[unit.use], name) if found is None else found

        return resolve(text, lookup)

    def _value(self, unit: _Unit) -> str:
        return unit.symbol.field("Value")

    def _footprint(self, unit: _Unit) -> str:
        return unit.symbol.field("Footprint")

    def _shown_value(self, unit: _Unit) -> str:
        return self._shown(unit, self._value(unit))

    # ------------------------------------------------------------------------------------------------------ the parts

    def parts(self, drawn: list[DrawnNet]) -> tuple[Part, ...]:
        """Return all parts with their pins."""
        net_of: dict[tuple[str, str], tuple[str, PlacedPin, bool]] = {}
        for net in sorted(drawn, key=lambda net: net.name):
            stacked = net.crossed and _stacked(net)
            for used in net.pins:
                net_of.setdefault((used.reference, used.pin.number), (net.name, used.pin, stacked))
        parts = []
        found: dict[str, list[_Unit]] = defaultdict(list)
        for index in self.project.in_page_order():
            for unit in self.units[index]:
                use = self.project.uses[index]
                power = unit.library is not None and unit.library.power
                if (
                    unit.symbol.on_board
                    and use.on_board
                    and not power
                    and not unit.instance.reference.startswith("#")
                ):
                    found[unit.instance.reference].append(unit)
        for reference, units in found.items():
            parts.append(self._part(reference, units, net_of))
        return tuple(sorted(parts, key=lambda part: natural(part.reference)))

    def _part(
        self, reference: str, units: list[_Unit], net_of: dict[tuple[str, str], tuple[str, PlacedPin, bool]]
    ) -> Part:
        first = units[0]
        library = first.library
        by_unit = sorted(units, key=lambda unit: unit.instance.unit)
        several = library is not None and library.units > 1
        told = by_unit if several else [first]
        fields: dict[str, str] = {}
        for unit in told:
            for name, text in unit.symbol.fields:
                if name not in _OWN_FIELDS and not fields.get(name):
                    fields[name] = self._shown(unit, text)
        pins: dict[str, Pin] = {}
        if library is not None:
            for _, _, pin in library.pins:
                net, placed, stacked = net_of.get((reference, pin.number), ("", None, False))
                name = placed.name if placed is not None else "" if pin.name == "~" else pin.name
                kind = placed.kind if placed is not None else pin.kind
                pins.setdefault(
                    pin.number, Pin(part=reference, number=pin.number, name=name, kind=kind, net=net, unused=stacked)
                )
        library_name, _, symbol_name = first.symbol.library_id.rpartition(":")
        return Part(
            reference=reference,
            value=self._told(told, lambda unit: self._shown_value(unit)) or "~",
            library=library_name,
            symbol=symbol_name,
            description=_library_field(library, "Description", "ki_description"),
            keywords=_library_field(library, "ki_keywords"),
            footprint=self._told(told, lambda unit: self._shown(unit, self._footprint(unit))),
            fields=tuple(fields.items()),
            fitted=first.symbol.fitted and self.project.uses[first.use].fitted,
            not_fitted_why="",
            sheet=self.project.uses[first.use].names,
            uuids=tuple(sorted(unit.symbol.uuid for unit in units)),
            pins=tuple(sorted(pins.values(), key=lambda pin: natural(pin.number))),
        )

    @staticmethod
    def _told(units, say) -> str:
        return next((text for text in map(say, units) if text), "")


def _library_field(library: LibrarySymbol | None, *names: str) -> str:
    if library is None:
        return ""
    return next((library.field(name) for name in names if library.field(name)), "")


def _several_names(groups: list[Group]) -> dict[tuple[int, str, bool], set[str]]:
    """Return by symbol, pin name and whether it is a no-connect pin the numbers of the pins so called."""
    found: dict[tuple[int, str, bool], set[str]] = defaultdict(set)
    for group in groups:
        for pin in group.pins:
            found[pin.symbol, pin.name, pin.kind == "no_connect"].add(pin.number)
    return found


def _stacked(net: DrawnNet) -> bool:
    """Whether all pins of a net are one pin drawn several times at one point."""
    return len({(used.symbol, used.pin.at, used.pin.name) for used in net.pins}) == 1
