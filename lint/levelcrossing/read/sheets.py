"""KiCad sheets -> Board, without KiCad: the same board that its exported netlist gives."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from levelcrossing.errors import InputError
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
from levelcrossing.units import natural_key

_OWN_FIELDS = frozenset({"Reference", "Value", "Footprint", "Datasheet"})
_DROPPED_FIELDS = ("Sim.Enable", "Spice_")
"""Beginnings of the fields for simulation that KiCad itself replaces when it reads an older sheet."""

_MOST_NAMED = 6


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
    drawn = sorted(Nets(reader.sheet_uses(), project.aliases).drawn(), key=lambda net: natural_key(net.name))
    parts = reader.parts(drawn)
    nets = reader.nets(drawn)
    remarks = [*project.remarks, *reader.remarks]
    remarks += [
        f"the sheet {names} has {count} symbols that are not annotated for this use of it; their first references count"
        for names, count in project.unsure.items()
    ]
    if given.is_file() and given.suffix == ".kicad_sch" and given != root:
        remarks.append(f"{given.name} is a sub-sheet: the whole board was read from {root.name}")
    return Board(
        path=str(path),
        form="sheets",
        maker=project.uses[0].file.maker,
        parts=parts,
        nets=nets,
        remarks=tuple(remarks),
        sheet_files=tuple(dict.fromkeys(project.shown(use.file.path) for use in project.in_page_order())),
    )


class _Reader:
    def __init__(self, project: Project) -> None:
        self.project = project
        self.remarks: list[str] = []
        self.net_of: dict[tuple[str, str], tuple[str, PlacedPin, bool]] = {}
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
            netlisted=self._is_part(unit),
            on_board=unit.symbol.on_board and use.on_board,
            names=not library.power and not library.field("Reference").startswith("#"),
            power=power,
            power_local=library.power == "local",
        )

    # --------------------------------------------------------------------------------------------------- text variables

    def _sheet_variable(self, use: Use, name: str) -> str | None:
        if use.box is not None:
            for field, text in use.box.fields:
                if field == name:
                    return text
        fixed = {
            "SHEETNAME": use.box.name if use.box is not None else "",
            "SHEETFILE": use.box.file if use.box is not None else "",
            "SHEETPATH": use.names,
            "FILENAME": use.file.path.name,
            "PROJECTNAME": self.project.root.stem if self.project.settings else "",
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
        return unit.symbol.field("Value") if unit.instance.value is None else unit.instance.value

    def _footprint(self, unit: _Unit) -> str:
        return unit.symbol.field("Footprint") if unit.instance.footprint is None else unit.instance.footprint

    def _shown_value(self, unit: _Unit) -> str:
        return self._shown(unit, self._value(unit))

    # ------------------------------------------------------------------------------------------------------ the parts

    def nets(self, drawn: list[DrawnNet]) -> tuple[Net, ...]:
        """Return all nets; a pin that is on several counts on the first."""
        nets = [
            Net(
                name=net.name,
                pins=tuple(
                    sorted(
                        {
                            (used.reference, used.pin.number)
                            for used in net.pins
                            if used.pin.number and self.net_of[used.reference, used.pin.number][0] == net.name
                        }
                    )
                ),
            )
            for net in drawn
        ]
        return tuple(sorted(nets, key=lambda net: net.name))

    def parts(self, drawn: list[DrawnNet]) -> tuple[Part, ...]:
        """Return all parts with their pins."""
        found: dict[str, list[_Unit]] = defaultdict(list)
        for use in self.project.in_page_order():
            for unit in self.units[use.index]:
                if self._is_part(unit):
                    found[unit.instance.reference].append(unit)
        if not found:
            raise InputError(
                "holds no parts", remedy="place symbols, or name the root sheet", file=self.project.root.name
            )
        doubled = {reference for reference, units in found.items() if self._doubled(units)}
        twice: dict[str, None] = {}
        for net in drawn:
            for used in net.pins:
                if not used.pin.number:
                    continue  # a hole or the like: on a net, but nothing can name it
                known = self.net_of.setdefault((used.reference, used.pin.number), (net.name, used.pin, net.unused))
                if known[0] != net.name:
                    if used.reference in doubled:
                        raise InputError(
                            f"has several parts called {used.reference}: "
                            f"pin {used.pin.number} is on {known[0]!r} and on {net.name!r}",
                            remedy="annotate the schematic",
                            file=self.project.root.name,
                        )
                    twice[f"{used.reference}.{used.pin.number}"] = None
        if doubled:
            self.remarks.append(f"given to several parts that are alike: {_named(doubled)}; taken as one part each")
        if twice:
            self.remarks.append(f"pins on several nets: {_named(twice)}; taken as on the first")
        parts = [self._part(reference, units) for reference, units in found.items()]
        return tuple(sorted(parts, key=lambda part: natural_key(part.reference)))

    def _doubled(self, units: list[_Unit]) -> bool:
        """Whether parts of one unit on several sheets have one reference; refuse when they are not even alike."""
        first = units[0]
        if (first.library is not None and first.library.units > 1) or len({unit.use for unit in units}) == 1:
            return False
        if len({(self._shown_value(unit), unit.symbol.library_id) for unit in units}) > 1:
            raise InputError(
                f"has different parts of the same reference: {first.instance.reference}",
                remedy="annotate the schematic",
                file=self.project.root.name,
            )
        return True

    def _is_part(self, unit: _Unit) -> bool:
        use = self.project.uses[unit.use]
        power = unit.library is not None and unit.library.power
        reference = unit.instance.reference
        return unit.symbol.on_board and use.on_board and not power and bool(reference) and not reference.startswith("#")

    def _part(self, reference: str, units: list[_Unit]) -> Part:
        first = units[0]
        library = first.library
        several = library is not None and library.units > 1
        told = sorted(units, key=lambda unit: unit.instance.unit) if several else [first]
        # Named in the order of the sheets, told by the lowest unit that has the field.
        fields = {name: "" for unit in (units if several else told) for name, _ in unit.symbol.fields}
        for unit in reversed(told):
            for name, text in unit.symbol.fields:
                fields[name] = self._shown(unit, text)
        # KiCad has had a field of its own for the description since 8: the fifth, exported last. A user's field of that
        # name in an older sheet keeps its place, but KiCad exports the text of its own, which is empty there.
        users_own = {name for name, _ in first.symbol.fields[len(_OWN_FIELDS) + 1 :]}
        about = ""
        if "Description" not in users_own:
            about = _first_text(self._shown(unit, unit.symbol.field("Description")) for unit in told)
            fields.pop("Description", None)
        fields["Description"] = about
        fields = {
            name: text
            for name, text in fields.items()
            if name not in _OWN_FIELDS and not name.startswith(_DROPPED_FIELDS)
        }
        box = self.project.uses[first.use].box
        for name, text in box.fields[2:] if box is not None else ():
            if name not in _OWN_FIELDS:
                fields.setdefault(name, self._shown(first, text))
        pins: dict[str, Pin] = {}
        for _, _, pin in library.pins if library is not None else ():
            net, placed, unused = self.net_of.get((reference, pin.number), ("", None, False))
            name = placed.name if placed is not None else "" if pin.name == "~" else pin.name
            kind = placed.drawn_kind if placed is not None else pin.kind
            pins.setdefault(
                pin.number, Pin(part=reference, number=pin.number, name=name, kind=kind, net=net, unused=unused)
            )
        library_name, _, symbol_name = first.symbol.library_id.rpartition(":")
        if first.symbol.library_name:
            # The sheet has its own version of the symbol, which belongs to no library.
            library_name, symbol_name = "", first.symbol.library_name
        return Part(
            reference=reference,
            value=_first_text(self._shown_value(unit) for unit in told) or "~",
            library=library_name,
            symbol=symbol_name,
            description=_library_description(library) or about,
            keywords=library.field("ki_keywords") if library is not None else "",
            footprint=_first_text(self._shown(unit, self._footprint(unit)) for unit in told),
            fields=tuple(fields.items()),
            fitted=first.symbol.fitted and self.project.uses[first.use].fitted,
            sheet=self.project.uses[first.use].names,
            # Like the exported netlist: the units on the sheet of the first one.
            uuids=tuple(sorted({unit.symbol.uuid for unit in units if unit.use == first.use})),
            pins=tuple(sorted(pins.values(), key=lambda pin: natural_key(pin.number))),
        )


def _named(names: Iterable[str]) -> str:
    found = sorted(names, key=natural_key)
    rest = f" and {len(found) - _MOST_NAMED} more" if len(found) > _MOST_NAMED else ""
    return ", ".join(found[:_MOST_NAMED]) + rest


def _first_text(texts: Iterable[str]) -> str:
    return next((text for text in texts if text), "")


def _library_description(library: LibrarySymbol | None) -> str:
    if library is None:
        return ""
    return (library.field("Description") or library.field("ki_description")).strip()


def _several_names(groups: list[Group]) -> dict[tuple[int, str, bool], set[str]]:
    """Return by symbol, pin name and whether it is a no-connect pin the numbers of the pins so called."""
    found: dict[tuple[int, str, bool], set[str]] = defaultdict(set)
    for group in groups:
        for pin in group.pins:
            found[pin.symbol, pin.name, pin.kind == "no_connect"].add(pin.number)
    return found
