"""From what touches on each sheet to the nets of the whole board, named as KiCad names them.

The way:

1. On each use of a sheet, groups that share a name are one (labels of any kind and power pins; not sheet pins).
2. A group's own name is that of its strongest driver: global label, power pin, local power pin, local label,
   hierarchical label, sheet pin, pin. Of equals the first in the alphabet.
3. Sheet pins meet hierarchical labels of the same text; buses meet member by member, vectors by position, groups by
   name. What is joined so takes the name of the strongest, then the one nearest the root, then the first in the
   alphabet. A member of a bus is named by its bus unless something global drives it.
4. Nets of one name are one net. Names that only pins give are kept apart by ``_1``, ``_2`` ...
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

from levelcrossing.read.sheet_files import Label
from levelcrossing.read.sheet_geometry import Group, PlacedPin, Union
from levelcrossing.read.sheet_names import Bus, as_net_name, bus_of, pin_net_name

GLOBAL, POWER, LOCAL_POWER, LOCAL, HIERARCHICAL, SHEET_PIN = 7, 6, 5, 4, 3, 2
_STRENGTH = {"global": GLOBAL, "local": LOCAL, "hierarchical": HIERARCHICAL, "sheet": SHEET_PIN}


@dataclass(frozen=True, slots=True, kw_only=True)
class UsedPin:
    """A pin on one use of a sheet, with what naming needs of its symbol.

    ``power`` is the net that a power pin names, with ``power_local`` telling whether only on its sheet; ``names`` tells
    whether a net may be named after the pin, which power flags and the like do not.
    """

    reference: str
    symbol: tuple[int, int]
    pin: PlacedPin
    unit: str
    several: bool
    netlisted: bool
    on_board: bool
    names: bool
    power: str | None = None
    power_local: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetUse:
    """One use of a sheet: its groups and its place in the tree of sheets.

    Parameters
    ----------
    names : str
        Path in the names of sheets, ``/`` or ``/power/``.
    depth : int
        1 at the root.
    groups : list of Group
    pin_of : callable
        From a placed pin to the used pin.
    shown : callable
        Resolves the text variables of a label.
    children : mapping from sheet box to the index of its use
    """

    names: str
    depth: int
    groups: list[Group]
    pin_of: Callable[[PlacedPin], UsedPin]
    shown: Callable[[str], str]
    children: dict[int, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class DrawnNet:
    """A net as drawn: name, pins, and the groups (use, group) it consists of.

    ``unused`` is set when it bears a no-connect mark and holds nothing but one pin, however often drawn at its point.
    """

    name: str
    pins: tuple[UsedPin, ...]
    unused: bool
    groups: tuple[tuple[int, int], ...]


@dataclass(slots=True)
class _Own:
    """What a group (or several of equal name on a sheet) calls itself."""

    strength: int
    depth: int
    name: str
    short: str
    bus: Bus | None = None

    @property
    def key(self) -> tuple[int, int, str]:
        return (-self.strength, self.depth, self.name)


@dataclass(slots=True)
class _Claim:
    """The name that one set of groups brings into its net."""

    use: int
    own: _Own


@dataclass(slots=True)
class _Node:
    use: int
    group: int
    pins: list[UsedPin]
    labels: list[tuple[Label, str]]
    is_bus: bool
    crossed: bool
    own: list[_Own] = field(default_factory=list)


class Nets:
    """Works out the nets of all uses of all sheets."""

    def __init__(self, uses: list[SheetUse], aliases: dict[str, tuple[str, ...]]) -> None:
        self.uses = uses
        self.aliases = aliases
        self.union = Union()
        self.nodes: list[_Node] = []
        self.keys: dict[tuple[int, str], int] = {}
        self.buses: dict[str, Bus | None] = {}

    def drawn(self) -> list[DrawnNet]:
        """Return all nets that hold a pin of a part."""
        self._gather()
        self._join_names()
        owns = self._strongest()
        sheet_of = [self.union.find(index) for index in range(len(self.union.parents))]
        attached = self._join_sheets(owns, sheet_of)
        return self._named(owns, sheet_of, attached)

    def _bus(self, text: str) -> Bus | None:
        if "[" not in text and "{" not in text:
            return None
        if text not in self.buses:
            self.buses[text] = bus_of(text, self.aliases)
        return self.buses[text]

    def _gather(self) -> None:
        for use_index, use in enumerate(self.uses):
            for group_index, group in enumerate(use.groups):
                labels = [(label, as_net_name(use.shown(label.text))) for label in group.labels]
                is_bus = group.on_bus or (
                    not group.on_wire and not group.pins and any(self._bus(text) for _, text in labels)
                )
                pins = [use.pin_of(pin) for pin in group.pins]
                node = _Node(use_index, group_index, pins, labels, is_bus, group.crossed)
                for label, text in labels:
                    strength = _STRENGTH[label.kind]
                    bus = self._bus(text) if is_bus else None
                    if is_bus and bus is None and not pins:
                        continue
                    name = text if strength == GLOBAL else use.names + text
                    node.own.append(_Own(strength, use.depth, name, text, bus))
                for used in pins:
                    if used.power is not None:
                        text = as_net_name(used.power)
                        name = use.names + text if used.power_local else text
                        node.own.append(_Own(LOCAL_POWER if used.power_local else POWER, use.depth, name, text))
                node.own.sort(key=lambda own: own.key)
                self.nodes.append(node)
                self.union.add()

    def _key(self, use: int, name: str) -> int:
        found = self.keys.get((use, name))
        if found is None:
            found = self.keys[use, name] = self.union.add()
        return found

    def _join_names(self) -> None:
        for index, node in enumerate(self.nodes):
            for own in node.own:
                if own.strength > SHEET_PIN:
                    self.union.join(index, self._key(node.use, own.short))
        self._join_sheet_pins()

    def _join_sheet_pins(self) -> None:
        """Join a sheet pin that alone names its net to nets of that name which go by another, stronger name."""
        known = {(node.use, own.short) for node in self.nodes for own in node.own if own.strength > SHEET_PIN}
        firsts = {node.own[0].name for node in self.nodes if node.own and node.own[0].strength > SHEET_PIN}
        globals_ = {(node.use, node.own[0].short) for node in self.nodes if node.own and node.own[0].strength >= POWER}
        alone = {}
        for index, node in enumerate(self.nodes):
            if node.own and node.own[0].strength == SHEET_PIN and not node.is_bus:
                alone[node.own[0].name] = index
        for name, index in alone.items():
            node = self.nodes[index]
            place = (node.use, node.own[0].short)
            if place in known and name not in firsts and place not in globals_:
                self.union.join(index, self._key(*place))

    def _strongest(self) -> dict[int, list[_Own]]:
        """Return by set of equal names on a sheet its names, strongest first."""
        owns: dict[int, list[_Own]] = defaultdict(list)
        for index, node in enumerate(self.nodes):
            owns[self.union.find(index)].extend(node.own)
        for found in owns.values():
            found.sort(key=lambda own: own.key)
        return owns

    # -------------------------------------------------------------------------------------- across sheets and buses

    def _join_sheets(self, owns: dict[int, list[_Own]], sheet_of: list[int]) -> dict[int, list[tuple[int, int]]]:
        """Join through sheet pins and buses; return by set the bus members it is."""
        attached: dict[int, list[tuple[int, int]]] = defaultdict(list)

        def attach(member: int, bus: int, position: int) -> None:
            attached[sheet_of[member] if member < len(sheet_of) else member].append((bus, position))

        bus_members = self._bus_members(owns, sheet_of, attach)
        for index, node in enumerate(self.nodes):
            for label, text in node.labels:
                if label.kind != "sheet":
                    continue
                child = self.uses[node.use].children.get(label.box)
                below = None if child is None else self.keys.get((child, text))
                if below is None or not self._has_hierarchical(child, text):
                    continue
                above_bus, below_bus = sheet_of[index], sheet_of[below]
                if above_bus in bus_members and below_bus in bus_members:
                    self._join_buses(owns, above_bus, below_bus, bus_members)
                if node.is_bus == (below_bus in bus_members):
                    self.union.join(index, below)
        return attached

    def _has_hierarchical(self, use: int | None, text: str) -> bool:
        return use is not None and (use, text) in self.hierarchical

    @property
    def hierarchical(self) -> set[tuple[int, str]]:
        """Uses and texts of the hierarchical labels."""
        if not hasattr(self, "_hierarchical"):
            self._hierarchical = {
                (node.use, text) for node in self.nodes for label, text in node.labels if label.kind == "hierarchical"
            }
        return self._hierarchical

    def _bus_members(
        self, owns: dict[int, list[_Own]], sheet_of: list[int], attach: Callable[[int, int, int], None]
    ) -> dict[int, list[int]]:
        """Return by bus the sets of its members, the members of its other names joined to them.

        ``attach`` is told every such set, its bus and its position on it.
        """
        use_of = {sheet_of[index]: node.use for index, node in enumerate(self.nodes) if node.is_bus}
        members: dict[int, list[int]] = {}
        last_of = {owns[root][0].name: root for root in use_of if owns[root]}
        strong = {owns[root][0].name for root in use_of if owns[root] and owns[root][0].strength > SHEET_PIN}
        for root, use in use_of.items():
            names = owns[root]
            if not names or names[0].bus is None:
                continue
            first = names[0].bus
            name = names[0].name
            if names[0].strength == SHEET_PIN and (name in strong or last_of[name] != root):
                # Another bus of that name is not this one: its members stand for themselves.
                members[root] = [self.union.add() for _ in first.members]
            else:
                members[root] = [self._key(use, member.name) for member in first.members]
            for position, found in enumerate(members[root]):
                attach(found, root, position)
            for other in names[1:]:
                if other.bus is None or other.strength == SHEET_PIN:
                    continue
                for position, member in _matches(first, other.bus):
                    also = self._key(use, other.bus.members[member].name)
                    self.union.join(members[root][position], also)
                    attach(also, root, position)
        return members

    def _join_buses(self, owns: dict[int, list[_Own]], above: int, below: int, members: dict[int, list[int]]) -> None:
        first, second = owns[above][0].bus, owns[below][0].bus
        if first is None or second is None:
            return
        for position, other in _matches(first, second):
            self.union.join(members[above][position], members[below][other])

    # ---------------------------------------------------------------------------------------------------------- names

    def _named(
        self, owns: dict[int, list[_Own]], sheet_of: list[int], attached: dict[int, list[tuple[int, int]]]
    ) -> list[DrawnNet]:
        bus_names: dict[int, _Own] = {}
        for root, names in owns.items():
            if names and names[0].bus is not None:
                whole = self.union.find(root)
                if whole not in bus_names or names[0].key < bus_names[whole].key:
                    bus_names[whole] = names[0]
        sets: dict[int, list[int]] = defaultdict(list)
        for index, node in enumerate(self.nodes):
            if not node.is_bus or node.pins:
                sets[self.union.find(index)].append(index)
        claims = self._claims(owns, sheet_of, attached, bus_names, sets)
        best = self._settled(owns, claims)
        strong: dict[str, list[int]] = defaultdict(list)
        weak: list[tuple[str, list[int]]] = []
        for whole, indices in sets.items():
            own = best.get(whole)
            if own is not None and own.strength > SHEET_PIN:
                strong[own.name].extend(indices)
            elif own is not None:
                weak.append((own.name, indices))
            else:
                name = self._pin_name(indices)
                if name:
                    weak.append((name, indices))
        return self._finish(strong, weak)

    def _claims(
        self,
        owns: dict[int, list[_Own]],
        sheet_of: list[int],
        attached: dict[int, list[tuple[int, int]]],
        bus_names: dict[int, _Own],
        sets: dict[int, list[int]],
    ) -> dict[int, _Claim]:
        """Return by set of equal names on a sheet, in the order of the sheets, what it brings into its net."""
        claims: dict[int, _Claim] = {}
        for index in sorted(index for indices in sets.values() for index in indices):
            root = sheet_of[index]
            names = owns.get(root)
            if not names or root in claims:
                continue
            own = names[0]
            if own.strength < POWER and root in attached:
                # The bus gives the name, the net keeps its standing.
                member = min(
                    (
                        self._member_name(owns[bus][0], bus_names[self.union.find(bus)], position)
                        for bus, position in attached[root]
                    ),
                    key=lambda found: found.key,
                )
                own = _Own(max(own.strength, HIERARCHICAL), own.depth, member.name, member.short)
            claims[root] = _Claim(self.nodes[index].use, own)
        return claims

    def _settled(self, owns: dict[int, list[_Own]], claims: dict[int, _Claim]) -> dict[int, _Own]:
        """Return the name of each net, second global names taking along the nets of that name."""
        roots_of: dict[int, list[int]] = defaultdict(list)
        for root in claims:
            roots_of[self.union.find(root)].append(root)
        best = {whole: min((claims[root] for root in roots), key=_across) for whole, roots in roots_of.items()}
        named: dict[str, list[int]] = defaultdict(list)
        for root in claims:
            if owns[root][0].strength >= POWER:
                for short in {own.short for own in owns[root]}:
                    named[short].append(root)
        taken: set[int] = set()
        for whole, roots in roots_of.items():
            first = owns[roots[0]]
            if roots[0] in taken:
                continue
            for other in first[1:]:
                if other.strength < POWER or other.name == first[0].name:
                    continue
                for root in named[other.short]:
                    theirs = self.union.find(root)
                    if theirs == whole or root in taken:
                        continue
                    taken.add(root)
                    name = best[whole].own
                    claim = claims[root]
                    claims[root] = _Claim(claim.use, _Own(claim.own.strength, claim.own.depth, name.name, name.short))
                    best[theirs] = min((claims[found] for found in roots_of[theirs]), key=_across)
        return {whole: claim.own for whole, claim in best.items()}

    def _member_name(self, own: _Own, whole: _Own, position: int) -> _Own:
        """Return the name of a bus member: that of the strongest bus it is joined with, where it has such a member."""
        assert own.bus is not None and whole.bus is not None
        for first, second in _matches(whole.bus, own.bus):
            if second == position:
                name = whole.bus.members[first].name
                path = whole.name[: len(whole.name) - len(whole.short)]
                return _Own(whole.strength, whole.depth, path + name, name)
        name = own.bus.members[position].name
        return _Own(own.strength, own.depth, own.name[: len(own.name) - len(own.short)] + name, name)

    def _pin_name(self, indices: Iterable[int]) -> str:
        """Return the name that pins give a net; empty when no pin can."""
        pins = [used for index in indices for used in self.nodes[index].pins if not used.reference.endswith("?")]
        unused = len(pins) == 1 or any(self.nodes[index].crossed for index in indices)
        unused = unused or any(used.pin.kind == "no_connect" for used in pins)
        names = []
        for used in pins:
            if used.names:
                name = pin_net_name(
                    reference=used.reference,
                    unit=used.unit,
                    number=used.pin.number,
                    name=used.pin.drawn_name,
                    several=used.several,
                    unused=unused,
                )
                names.append((not used.on_board, "-Pad" in name, name))
        return min(names)[2] if names else ""

    def _finish(self, strong: dict[str, list[int]], weak: list[tuple[str, list[int]]]) -> list[DrawnNet]:
        nets = list(strong.items())
        taken = {node.own[0].name for node in self.nodes if node.own and node.own[0].strength > SHEET_PIN}
        # Names are told apart while they still read Net-(...): the last of equals keeps the plain name.
        waiting = Counter(_as_net(name) for name, _ in weak)
        for name, indices in sorted(weak, key=lambda item: item[1][0]):
            plain = _as_net(name)
            waiting[plain] -= 1
            count = 0
            while (count == 0 and (waiting[plain] or plain in taken)) or (count and f"{plain}_{count}" in taken):
                count += 1
            suffix = f"_{count}" if count else ""
            taken.add(plain + suffix)
            nets.append((name + suffix, indices))
        drawn = []
        for name, indices in nets:
            everything = [used for index in indices for used in self.nodes[index].pins]
            pins = [used for used in everything if used.netlisted]
            if pins:
                alone = len({(used.symbol, used.pin.at, used.pin.name) for used in everything}) == 1
                drawn.append(
                    DrawnNet(
                        name=name,
                        pins=tuple(pins),
                        unused=alone and any(self.nodes[index].crossed for index in indices),
                        groups=tuple((self.nodes[index].use, self.nodes[index].group) for index in indices),
                    )
                )
        return drawn


def _across(claim: _Claim) -> tuple[int, int, int, str]:
    """Rank names across sheets: a power symbol is worth as much as a global label, of equals the first sheet's wins."""
    shared = claim.own.strength >= POWER
    return (-min(claim.own.strength, POWER), claim.own.depth, claim.use if shared else 0, claim.own.name)


def _as_net(name: str) -> str:
    return "Net-" + name.removeprefix("unconnected-") if name.startswith("unconnected-") else name


def _matches(first: Bus, second: Bus) -> list[tuple[int, int]]:
    """Return which members of two buses meet: vectors by position, groups by name."""
    if first.vector and second.vector:
        return [(index, index) for index in range(min(len(first.members), len(second.members)))]
    if first.vector != second.vector:
        return []
    where = {member.bare: index for index, member in enumerate(first.members)}
    return [(where[m.bare], index) for index, m in enumerate(second.members) if m.bare in where]
