"""The trade library: what is known of a part, a device, a regulator or the name of a rail, and from where.

The rows stand in ``rules/trade/*.toml``; house and project files may add rows or take the place of some.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from functools import cached_property
from pathlib import Path
from typing import TypeVar

from levelcrossing import trade_devices, trade_logic, trade_parts, trade_pins, trade_translators
from levelcrossing.errors import TradeDataError
from levelcrossing.model import (
    BipolarFacts,
    BusFacts,
    DiodeFacts,
    MosfetFacts,
    Part,
    PartFacts,
    Provenance,
    RegulatorFacts,
    Spread,
)
from levelcrossing.trade_buses import bus_facts
from levelcrossing.trade_files import overridden, read_extra, read_folder
from levelcrossing.trade_match import Matcher, texts
from levelcrossing.trade_names import RailNames
from levelcrossing.trade_rows import Row

_PASSIVE = re.compile(r"^(R|RN|RP|RV|C|L|FB|F|TP|JP|SJ|H|MH|Y|X|XTAL|FID|SW|BT)\d+[A-Z]?$")
_PASSIVE_LIBRARY = re.compile(
    r"^(Device|pspice|Switch|Mechanical|Jumper|TestPoint|Connector_Generic.*|Graphic)$", re.IGNORECASE
)
_Facts = TypeVar("_Facts")
_Key = tuple[str, tuple[tuple[str, str], ...], str]


class Tradebook:
    """All rows of trade data, searched by part.

    Parameters
    ----------
    rows : sequence of Row
        House rows first.
    """

    def __init__(self, rows: Sequence[Row]) -> None:
        self.rows = tuple(rows)
        self._remembered: dict[tuple[str, _Key, tuple[tuple[str, str, str], ...]], object] = {}

    def table(self, name: str) -> list[Row]:
        """Return the rows of one table in their order."""
        return [row for row in self.rows if row.table == name]

    # ------------------------------------------------------------------------------------------------------- parts

    def part(self, part: Part) -> PartFacts | None:
        """Return what is known of a part: translators first, then logic families, then other parts.

        The value is searched first, then the fields that hold a part number, the symbol last: symbols often carry the
        wrong family.
        """
        return self._once("part", part, self._find_part)

    def _find_part(self, part: Part) -> PartFacts | None:
        if _PASSIVE.match(part.reference) and (_PASSIVE_LIBRARY.match(part.library) or len(part.pins) < 3):
            return None
        for text, where in texts(part):
            if text.isdigit() and (where != "value" or _PASSIVE.match(part.reference)):
                continue
            found = self.part_of(text, where, part)
            if found is not None:
                return found
        return None

    def part_of(self, text: str, where: str, part: Part) -> PartFacts | None:
        """Return the facts that one normal text stands for.

        Rows of the house or the project come before all shipped ones, whatever their tables.
        """
        hit = self._translators.find(text)
        family = self._families.find(text)
        if self._own_parts and not any(found is not None and found[0].own for found in (hit, family)):
            own = self._own_parts.find(text)
            if own is not None and _reference_fits(own[0], part):
                return trade_parts.part_facts(own[0], text, where, self._implied)
        if hit is not None and not (family is not None and family[0].own and not hit[0].own):
            row = hit[0]
            if row.get("family_by_name"):
                if family is not None:
                    whole = trade_translators.translator_facts(row)
                    return trade_logic.family_facts(family[0], self._functions, part, text, where, whole)
            else:
                return trade_translators.two_sided_facts(row, self._family(row), part, text, where)
        if family is not None:
            return trade_logic.family_facts(family[0], self._functions, part, text, where)
        other = self._parts.find(text)
        if other is not None and _reference_fits(other[0], part):
            return trade_parts.part_facts(other[0], text, where, self._implied)
        return None

    def _family(self, row: Row) -> Row | None:
        name = row.get("family")
        if name is None:
            return None
        for family in self.table("family"):
            if family.id == name:
                return family
        raise row.refuse(f"names an unknown family '{name}'")

    # ----------------------------------------------------------------------------------------------------- devices

    def mosfet(self, part: Part) -> MosfetFacts | None:
        """Return a MOSFET's data, that of an unknown one when the part plainly is one, or None."""
        return self._once("mosfet", part, self._find_mosfet)

    def _find_mosfet(self, part: Part) -> MosfetFacts | None:
        row = self._device(part, self._mosfets, ("nmos", "pmos"))
        return None if row is None else trade_devices.mosfet_facts(row)

    def bipolar(self, part: Part) -> BipolarFacts | None:
        """Return a bipolar transistor's data, that of an unknown one when the part plainly is one, or None."""
        return self._once("bipolar", part, self._find_bipolar)

    def _find_bipolar(self, part: Part) -> BipolarFacts | None:
        row = self._device(part, self._bipolars, ("npn", "pnp"))
        return None if row is None else trade_devices.bipolar_facts(row)

    def diode(self, part: Part) -> DiodeFacts | None:
        """Return a diode's or Zener's data, that of an unknown one when the part plainly is one, or None."""
        return self._once("diode", part, self._find_diode)

    def _find_diode(self, part: Part) -> DiodeFacts | None:
        kind = trade_devices.kind_of(part)
        if kind in ("nmos", "pmos", "npn", "pnp") or _PASSIVE.match(part.reference):
            return None
        for text, where in texts(part):
            hit = self._diodes.find(text)
            if hit is not None and (where != "symbol" or not kind or hit[0].get("kind") == kind or kind == "diode"):
                return trade_devices.diode_facts(hit[0])
            volts = trade_devices.zener_from_number(text)
            if volts is not None and where != "symbol":
                return trade_devices.diode_facts(self._generic("zener"), volts)
        if kind == "zener":
            volts = trade_devices.plain_volts(part.value)
            return None if volts is None else trade_devices.diode_facts(self._generic("zener"), volts)
        if kind in trade_devices.GENERIC:
            return trade_devices.diode_facts(self._generic(kind))
        return None

    def _device(self, part: Part, matcher: Matcher, kinds: tuple[str, str]) -> Row | None:
        kind = trade_devices.kind_of(part)
        if kind and kind not in kinds:
            return None
        if _PASSIVE.match(part.reference) or self._translators_know(part):
            return None
        for text, where in texts(part):
            hit = matcher.find(text)
            if hit is None:
                continue
            if where == "symbol" and kind and part.value.strip("~ ") and not _same_polarity(hit[0], kind):
                continue
            return hit[0]
        return self._generic(kind) if kind in kinds else None

    def _translators_know(self, part: Part) -> bool:
        return any(self._translators.find(text) is not None for text, where in texts(part) if where == "value")

    def _generic(self, kind: str) -> Row:
        table, name = trade_devices.GENERIC[kind]
        for row in self.table(table):
            if row.id == name:
                return row
        raise TradeDataError(f"the row '{name}' of [[{table}]] is missing", file="rules/trade")

    # -------------------------------------------------------------------------------------------------- regulators

    def regulator(self, part: Part) -> RegulatorFacts | None:
        """Return a voltage regulator's data, or None when the part is none that is known."""
        return self._once("regulator", part, self._find_regulator)

    def _find_regulator(self, part: Part) -> RegulatorFacts | None:
        if _PASSIVE.match(part.reference):
            return None
        known = texts(part)
        looks = _looks_like_regulator(part)
        for text, where in known:
            hit = self._fixed.find(text)
            if hit is not None:
                facts = trade_devices.regulator_facts(hit[0], hit[1], text, self._pin_names)
                if facts is not None:
                    return facts
            hit = self._adjustable.find(text)
            if hit is not None:
                return trade_devices.regulator_facts(hit[0], hit[1], text, self._pin_names)
            if where == "value" and looks and self._pin_names is not None:
                volts = trade_devices.plain_volts(part.value)
                if volts is not None:
                    return trade_devices.regulator_of_value(volts, self._pin_names)
        return None

    # -------------------------------------------------------------------------------------------------- rail names

    def rail_volts(self, net_name: str) -> tuple[Spread, Provenance] | None:
        """Return the voltage that a net's name carries [V], with its source; None when it carries none."""
        return self._names.volts(net_name)

    def looks_like_signal(self, net_name: str) -> bool:
        """Tell whether a net's name is a signal's although it may hold a voltage."""
        return self._names.looks_like_signal(net_name)

    def looks_like_ground(self, net_name: str) -> bool:
        """Tell whether a net is named like ground."""
        return self._names.looks_like_ground(net_name)

    @cached_property
    def buses(self) -> tuple[BusFacts, ...]:
        """The electrical rules of common buses."""
        return tuple(bus_facts(row) for row in self.table("bus"))

    # ----------------------------------------------------------------------------------------------------- helpers

    def _once(self, what: str, part: Part, find: Callable[[Part], _Facts | None]) -> _Facts | None:
        """Search once for all parts of equal value, fields, symbol and pins."""
        key: _Key = (part.value, part.fields, f"{part.library}:{part.symbol}:{part.reference.rstrip('0123456789')}")
        pins = tuple((pin.number, pin.name, pin.kind) for pin in part.pins)
        full = (what, key, pins)
        if full not in self._remembered:
            self._remembered[full] = find(part)
        return self._remembered[full]  # type: ignore[return-value]

    @cached_property
    def _translators(self) -> Matcher:
        return Matcher(self.table("translator"))

    @cached_property
    def _families(self) -> Matcher:
        return Matcher(self.table("family"))

    @cached_property
    def _parts(self) -> Matcher:
        return Matcher(self.table("part"))

    @cached_property
    def _own_parts(self) -> Matcher | None:
        own = [row for row in self.table("part") if row.own]
        return Matcher(own) if own else None

    @cached_property
    def _implied(self) -> list[Row]:
        return self.table("pin_names")

    @cached_property
    def _mosfets(self) -> Matcher:
        return Matcher(self.table("mosfet"))

    @cached_property
    def _bipolars(self) -> Matcher:
        return Matcher(self.table("bipolar"))

    @cached_property
    def _diodes(self) -> Matcher:
        return Matcher(self.table("diode"))

    @cached_property
    def _fixed(self) -> Matcher:
        return Matcher(self.table("fixed"), guarded=False)

    @cached_property
    def _adjustable(self) -> Matcher:
        return Matcher(self.table("adjustable"), guarded=False)

    @cached_property
    def _functions(self) -> trade_logic.Functions:
        return trade_logic.Functions(self.table("function"))

    @cached_property
    def _names(self) -> RailNames:
        return RailNames([row for row in self.rows if row.table in ("rail_name", "rail_range", "word_list")])

    @cached_property
    def _pin_names(self) -> Row | None:
        return next(iter(self.table("defaults")), None)


def _same_polarity(row: Row, kind: str) -> bool:
    return bool({"nmos": "n", "pmos": "p"}.get(kind, kind) == row.get("polarity"))


def _reference_fits(row: Row, part: Part) -> bool:
    pattern = row.get("references")
    return pattern is None or not part.reference or re.match(pattern, part.reference) is not None


def _looks_like_regulator(part: Part) -> bool:
    """Tell whether library, symbol or pin names say that a part is a voltage regulator."""
    if re.search(r"regulator|ldo|dcdc|dc-dc|buck|converter", f"{part.library} {part.symbol}", re.IGNORECASE):
        return True
    names = {trade_pins.plain_name(pin.name).upper() for pin in part.pins}
    return bool(names & {"VO", "VOUT", "OUT"}) and bool(names & {"VI", "VIN", "IN"}) and bool(names & {"GND", "ADJ"})


def default_folder() -> Path:
    """Return the folder of the shipped rows: beside the package when installed, in the repository in a checkout."""
    here = Path(__file__).resolve().parent
    for folder in (here / "rules" / "trade", here.parent.parent / "rules" / "trade"):
        if folder.is_dir():
            return folder
    raise TradeDataError("the trade data is missing from this installation", remedy="install levelcrossing again")


def load(folder: Path | None = None, extra: Sequence[Path] = ()) -> Tradebook:
    """Read the trade library.

    Parameters
    ----------
    folder : Path, optional
        Where the shipped rows stand.
    extra : sequence of Path
        Files of house or project rows; they come first and may take the place of shipped rows of equal table and id.

    Raises
    ------
    TradeDataError
        If a row is malformed, has no source or contradicts itself; with file and line.
    """
    return Tradebook(overridden(read_folder(folder or default_folder()), read_extra(extra)))
