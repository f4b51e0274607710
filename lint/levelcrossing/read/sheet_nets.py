"""From what touches on each sheet to the nets of the whole board, named as KiCad names them.

The way:

1. On each use of a sheet, groups that share a name are one (labels of any kind and power pins; not sheet pins).
2. A group's own name is that of its strongest driver: global label, power pin, local power pin, local label,
   hierarchical label, sheet pin, pin. Of equals the first in the alphabet.
3. Sheet pins meet hierarchical labels of the same text; buses meet member by member, vectors by position, groups by
   name. What is joined so takes the name of the strongest, then the one nearest the root, then the first in the
   alphabet. A member of a bus is named by its bus unless something global drives it.
4. A net that has a second global name takes the nets of that name along, on whatever sheet they are.
5. Nets of one name are one net. Names that only pins give are kept apart by ``_1``, ``_2`` ...

All of it was found by drawing small sheets and comparing with what KiCad 9 exports for them; tests/read/small_sheets
holds those that show one rule each. Two things are left to chance in KiCad itself and may differ: to which of several
wires a label belongs that stands where they cross, and which of several equal sheet pins without a label below keeps
its name without a number.
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
        self.members = Union()
        self.member_places: list[tuple[int, int]] = []
        self.members_of: dict[int, list[int]] = {}
        self.bus_uses: dict[int, int] = {}
        self.on_members: dict[int, list[int]] = defaultdict(list)

    def drawn(self) -> list[DrawnNet]:
        """Return all nets that hold a pin of a part."""
        self._gather()
        self._join_names()
        owns = self._strongest()
        sheet_of = [self.union.find(index) for index in range(len(self.union.parents))]
        self._take_members(owns, sheet_of)
        self._join_sheets(owns, sheet_of)
        claims = self._claims(owns, sheet_of)
        self._join_members(claims)
        return self._named(self._settled(owns, claims))

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

    def _take_members(self, owns: dict[int, list[_Own]], sheet_of: list[int]) -> None:
        """Take the members of each bus and find the sets of groups that are on them by their names."""
        use_of = {sheet_of[index]: node.use for index, node in enumerate(self.nodes) if node.is_bus}
        known: dict[tuple[int, str], int] = {}
        last_of = {owns[root][0].name: root for root in use_of if owns[root]}
        strong = {owns[root][0].name for root in use_of if owns[root] and owns[root][0].strength > SHEET_PIN}
        for root, use in use_of.items():
            names = owns[root]
            if not names or names[0].bus is None:
                continue
            first = names[0].bus
            self.bus_uses[root] = use
            members = self.members_of[root] = [self.members.add() for _ in first.members]
            self.member_places.extend((root, position) for position in range(len(members)))
            name = names[0].name
            if names[0].strength == SHEET_PIN and (name in strong or last_of[name] != root):
                continue  # another bus of that name has the nets of its members' names
            for own in names:
                if own.bus is not None and (own is names[0] or own.strength > SHEET_PIN):
                    for position, other in _matches(first, own.bus):
                        place = (use, own.bus.members[other].name)
                        self.members.join(members[position], known.setdefault(place, members[position]))
                        key = self.keys.get(place)
                        if key is not None and members[position] not in self.on_members[sheet_of[key]]:
                            self.on_members[sheet_of[key]].append(members[position])

    def _join_sheets(self, owns: dict[int, list[_Own]], sheet_of: list[int]) -> None:
        """Join sheet pins with the hierarchical labels below, and buses member by member."""
        hierarchical = {
            (node.use, text) for node in self.nodes for label, text in node.labels if label.kind == "hierarchical"
        }
        for index, node in enumerate(self.nodes):
            for label, text in node.labels:
                child = self.uses[node.use].children.get(label.box) if label.kind == "sheet" else None
                if child is None or (child, text) not in hierarchical:
                    continue
                above, below = sheet_of[index], sheet_of[self.keys[child, text]]
                if above in self.members_of and below in self.members_of:
                    first, second = owns[above][0].bus, owns[below][0].bus
                    assert first is not None and second is not None
                    for position, other in _matches(first, second):
                        self.members.join(self.members_of[above][position], self.members_of[below][other])
                if node.is_bus == (below in self.members_of):
                    self.union.join(above, below)

    def _join_members(self, claims: dict[int, _Claim]) -> None:
        """Join the nets that are one member of a bus.

        A global name on the topmost sheet of the bus is the member's for all. One further down stays where it is, but
        for the net on the topmost sheet, which takes the first of them.
        """
        best = self._best(claims)
        nets: dict[int, list[int]] = defaultdict(list)
        for root in claims:
            for member in self.on_members.get(root, ()):
                nets[self.members.find(member)].append(root)
        top: dict[int, int] = {}
        for member, (bus, _) in enumerate(self.member_places):
            whole = self.members.find(member)
            depth = self.uses[self.bus_uses[bus]].depth
            top[whole] = min(top.get(whole, depth), depth)
        joins: list[tuple[int, int]] = []
        for whole, roots in nets.items():
            shared = [root for root in roots if best[self.union.find(root)].own.strength >= POWER]
            plain = [root for root in roots if root not in shared]
            at_top = [root for root in roots if self.uses[claims[root].use].depth == top[whole]]
            lead = next((root for root in at_top if root in shared), None)
            if lead is None and shared:
                joins.extend((shared[0], root) for root in at_top)
                plain = [root for root in plain if root not in at_top]
            joins.extend((plain[0] if lead is None else lead, root) for root in plain)
        for one, other in joins:
            self.union.join(one, other)

    # ---------------------------------------------------------------------------------------------------------- names

    def _named(self, best: dict[int, _Own]) -> list[DrawnNet]:
        sets: dict[int, list[int]] = defaultdict(list)
        for index, node in enumerate(self.nodes):
            if not node.is_bus or node.pins:
                sets[self.union.find(index)].append(index)
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

    def _claims(self, owns: dict[int, list[_Own]], sheet_of: list[int]) -> dict[int, _Claim]:
        """Return by set of equal names on a sheet, in the order of the sheets, what it brings into its net."""
        bus_names: dict[int, _Own] = {}
        for root in self.members_of:
            whole = self.union.find(root)
            if whole not in bus_names or owns[root][0].key < bus_names[whole].key:
                bus_names[whole] = owns[root][0]
        claims: dict[int, _Claim] = {}
        for index, node in enumerate(self.nodes):
            root = sheet_of[index]
            names = owns.get(root)
            if not names or root in claims or (node.is_bus and not node.pins):
                continue
            own = names[0]
            if own.strength < POWER and root in self.on_members:
                # The bus gives the name, the net keeps its standing.
                found = []
                for member in self.on_members[root]:
                    bus, position = self.member_places[member]
                    found.append(self._member_name(owns[bus][0], bus_names[self.union.find(bus)], position))
                member_name = min(found, key=lambda found: found.key)
                own = _Own(max(own.strength, HIERARCHICAL), own.depth, member_name.name, member_name.short)
            claims[root] = _Claim(node.use, own)
        return claims

    def _best(self, claims: dict[int, _Claim]) -> dict[int, _Claim]:
        """Return by net the claim that names it."""
        best: dict[int, _Claim] = {}
        for root, claim in claims.items():
            whole = self.union.find(root)
            if whole not in best or _across(claim) < _across(best[whole]):
                best[whole] = claim
        return best

    def _settled(self, owns: dict[int, list[_Own]], claims: dict[int, _Claim]) -> dict[int, _Own]:
        """Return the name of each net, second global names taking along the nets of that name."""
        roots_of: dict[int, list[int]] = defaultdict(list)
        for root in claims:
            roots_of[self.union.find(root)].append(root)
        best = self._best(claims)
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
