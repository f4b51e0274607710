"""Every driver and receiver on different supplies within an island, and every rail that drives a receiver."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import networkx

from levelcrossing import measuring, partkinds, shifters, switches
from levelcrossing import pins as pin_models
from levelcrossing.islands import SWITCH_KINDS
from levelcrossing.model import (
    Basis,
    Board,
    Crossing,
    Element,
    Island,
    NotJudged,
    PartFacts,
    PinModel,
    Rails,
    Shifter,
    Spread,
)

# Two supplies are one for this purpose when their usual voltages are this close [1]: 3.3 V and 3.35 V rails of two
# regulators do not make a crossing, 3.0 V and 3.3 V do.
SAME_SUPPLY = 0.04
SERIES_AT_MOST_OHMS = 2_200.0
# A connector fed with more than this carries power; nothing says that its signals are logic of that level [V].
MOST_LOGIC_VOLTS = 5.6
DOWNWARD_KINDS = frozenset({"divider", "clamp"})
CHAIN_KINDS = frozenset({"auto-buffer", "dual-dir", "dual-fixed", "i2c-buffer"})
# Hosts whose signal level is fixed by their maker, told from the connector's reference, value or symbol.
KNOWN_HOSTS = (
    (
        re.compile(r"RASPBERRY|\bRPI|RPI_?\d|PI_?ZERO", re.I),
        3.3,
        "Raspberry Pi, whose header signals are 3.3 V (maker's GPIO documentation)",
    ),
)
ANALOG_NET = re.compile(
    # The ID pin of a USB socket is open or grounded by the cable.
    r"ID$|.*(TMDS|USB_?D[PMN+-]|CSI|DSI|MDI|ETH|_D\d?[PN]$|.*\w[+-]$|[_.](P|N)$|LVDS|CANH|CANL|RS485|AUDIO|SPK|MIC|ANT)",
    re.I,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Survey:
    """What was found: crossings, and the signal pins that could not be judged."""

    crossings: tuple[Crossing, ...]
    not_judged: tuple[NotJudged, ...]
    far_ends: tuple[tuple[str, str, str], ...] = ()


def same_supply(a: Spread, b: Spread) -> bool:
    """Tell whether two supply voltages count as one."""
    return abs(a.nominal - b.nominal) <= SAME_SUPPLY * max(abs(a.nominal), abs(b.nominal))


def find_crossings(
    board: Board,
    rails: Rails,
    pins: Mapping[tuple[str, str], PinModel],
    facts: Mapping[str, PartFacts],
    islands: Sequence[Island],
) -> Survey:
    """Find every crossing of a board.

    Parameters
    ----------
    board : Board
    rails : Rails
    pins : mapping
        (reference, number) to PinModel.
    facts : mapping
        Reference to the part's row.
    islands : sequence of Island

    Returns
    -------
    Survey
        Crossings in a stable order, with what could not be judged and why.
    """
    finder = _Finder(board, rails, pins, facts, islands)
    finder.note_jumpers(board)
    return finder.run()


class _Finder:
    def __init__(
        self,
        board: Board,
        rails: Rails,
        pins: Mapping[tuple[str, str], PinModel],
        facts: Mapping[str, PartFacts],
        islands: Sequence[Island],
    ) -> None:
        self.rails = rails
        self.facts = facts
        self.pins = pins
        self.values = {part.reference: f"{part.value} {part.symbol}" for part in board.parts}
        self.supplies_on: dict[str, list[tuple[str, Spread]]] = defaultdict(list)
        for (reference, _), pin in pins.items():
            volts = rails.volts(pin.net)
            if pin.role == "supply" and volts is not None and volts.nominal > 0.5:
                self.supplies_on[reference].append((pin.net, volts))
        self.not_judged: dict[tuple[str, str], NotJudged] = {}
        self.far_ends: dict[tuple[str, str], str] = {}
        self.islands = [_Field(self._with_far_ends(island), rails) for island in islands]
        self.by_net = {net: field for field in self.islands for net in field.island.nets}
        self.drivers_of = {id(field): self._drivers(field) for field in self.islands}

    def run(self) -> Survey:
        found: list[Crossing] = []
        for field in self.islands:
            found.extend(_without_detours(list(self._direct(field))))
            found.extend(self._from_rails(field))
        found.extend(self._through_translators())
        found.extend(self._tied_inputs())
        found.extend(list(self._to_switches(found)))
        found = _two_way(found)
        found.sort(key=_order)
        return Survey(
            crossings=tuple(found),
            not_judged=tuple(self.not_judged[key] for key in sorted(self.not_judged)),
            far_ends=tuple((part, number, why) for (part, number), why in sorted(self.far_ends.items())),
        )

    # -- far ends ----------------------------------------------------------------------------------------------------

    def _with_far_ends(self, island: Island) -> Island:
        """Give undeclared connector pins the level that the board suggests, marked as inferred."""
        if not any(pin.role == "far-end" and not pin.declared_far_end for pin in island.pins):
            return island
        pulls = pull_ups(island, self.rails)
        near = _near_groups(island)
        new: list[PinModel] = []
        for pin in island.pins:
            if pin.role != "far-end" or pin.declared_far_end:
                new.append(pin)
                continue
            pulled = [(rail, volts) for net in near[pin.net] for rail, volts, _ in pulls.get(net, ())]
            new.append(self._inferred(pin, pulled))
        return replace(island, pins=tuple(new))

    def _inferred(self, pin: PinModel, pulled: Sequence[tuple[str, Spread]]) -> PinModel:
        if any(ANALOG_NET.match(name) for name in (pin.net, pin.name)):
            self._note_higher(pin, pulled)
            return pin
        host = next(
            (known for known in KNOWN_HOSTS if known[0].search(f"{pin.part} {self.values.get(pin.part, '')}")), None
        )
        if host is not None:
            volts = Spread.around(host[1], 0.05)
            why = f"{pin.part} goes to a {host[2]}"
            rail, style, basis = "", False, Basis.TRACED
        elif pulled and not self._fed_with_less(pin, pulled):
            rail, volts = max(pulled, key=lambda pull: pull[1].nominal)
            why = (
                f"the other side of {pin.part}.{pin.number} is an open-drain line at the level of its pull-up to {rail}"
            )
            style, basis = True, Basis.TRACED
            self._note_higher(pin, pulled)
        else:
            supplies = self.supplies_on.get(pin.part, [])
            nominal = {round(volts.nominal, 2) for _, volts in supplies}
            if len(nominal) != 1:
                return pin
            rail, volts = supplies[0]
            if volts.nominal > MOST_LOGIC_VOLTS:
                return pin
            why = f"the other side of {pin.part}.{pin.number} works from {rail}, the only supply on {pin.part}"
            style, basis = bool(pulled), Basis.ASSUMED
        return replace(
            pin,
            supply=rail,
            supply_volts=volts,
            drive=pin_models.far_end_drive(open_drain=style, basis=basis),
            receive=replace(
                pin_models.cmos_receive(),
                clamp_high=False,
                source="an ordinary CMOS input is assumed beyond the connector",
            ),
            basis=Basis.ASSUMED,
            inferred_far_end=True,
            why=why,
        )

    def _fed_with_less(self, pin: PinModel, pulled: Sequence[tuple[str, Spread]]) -> bool:
        """Tell whether all supplies on the pin's connector lie below its pull-up: then that need not be the level there."""
        level = max(volts.nominal for _, volts in pulled)
        supplies = self.supplies_on.get(pin.part, [])
        return bool(supplies) and all(volts.nominal < (1 - SAME_SUPPLY) * level for _, volts in supplies)

    def _note_higher(self, pin: PinModel, pulled: Sequence[tuple[str, Spread]]) -> None:
        """Note that a pull-up tells the level only if what is plugged in has none of its own to a higher supply."""
        if not pulled:
            return
        level = max(volts.nominal for _, volts in pulled)
        higher = [name for name, volts in self.supplies_on.get(pin.part, []) if volts.nominal > 1.04 * level]
        if higher:
            self.far_ends[pin.part, pin.number] = f"{pin.part} also carries {higher[0]}"

    # -- drivers -----------------------------------------------------------------------------------------------------

    def _is_switch(self, pin: PinModel) -> bool:
        known = self.facts.get(pin.part)
        return known is not None and known.translator is not None and known.translator.kind in SWITCH_KINDS

    def _drivers(self, field: _Field) -> list[PinModel]:
        """Return the pins that may drive an island; possible drivers give way to certain ones."""
        drivers = [pin for pin in field.island.pins if pin.drive is not None and not self._is_switch(pin)]
        certain = [
            pin
            for pin in drivers
            if not pin.when and pin.role == "signal" and pin.drive and pin.drive.style == "push-pull"
        ]
        if any(pin.drive is not None and not pin.drive.tristate for pin in certain):
            return [pin for pin in drivers if (not pin.when and pin.role == "signal") or pin.declared_far_end]
        readers = [pin for pin in field.island.pins if pin.receive is not None and pin.drive is None]
        possible = [pin for pin in drivers if pin.when]
        others = [pin for pin in drivers if not pin.when]
        far = [pin for pin in field.island.pins if pin.role == "far-end"]
        if len(possible) == 1 and not others and readers and not far:
            alone = replace(
                possible[0],
                when="",
                basis=Basis.weakest(possible[0].basis, Basis.TRACED),
                why="the only pin that can drive this net",
            )
            return [alone]
        return drivers

    # -- the three sources of crossings --------------------------------------------------------------------------------

    def _direct(self, field: _Field) -> Iterator[Crossing]:
        receivers = [pin for pin in field.island.pins if pin.receive is not None and not self._is_switch(pin)]
        drivers = self.drivers_of[id(field)]
        self._note_unknown(field, drivers, receivers)
        for driver in drivers:
            for receiver in receivers:
                if (driver.part, driver.number) == (receiver.part, receiver.number):
                    continue
                if driver.part == receiver.part and driver.role == "far-end":
                    continue
                if driver.supply_volts is None or receiver.supply_volts is None:
                    continue
                if (
                    driver.role == "far-end"
                    and receiver.role == "far-end"
                    and not (_settled(driver) and _settled(receiver))
                ):
                    continue
                if same_supply(driver.supply_volts, receiver.supply_volts):
                    continue
                path = field.path(driver.net, receiver.net)
                if path is None:
                    continue
                yield self._crossing(field, driver, receiver, path, segment=self.rails.is_ground(receiver.supply))

    def _crossing(
        self, field: _Field, driver: PinModel, receiver: PinModel, path: Sequence[Element], **more: object
    ) -> Crossing:
        shifter = shifters.recognise(field.island, path, driver, receiver, self.rails, self.facts)
        crossing = Crossing(
            driver=driver,
            driver_rail=driver.supply,
            receiver=receiver,
            receiver_rail=receiver.supply,
            link=tuple(dict.fromkeys(element.part for element in path)),
            shifter=shifter,
            island=field.island.index,
            inverting=shifters.inverts(path, driver.net),
            condition=" and ".join(
                dict.fromkeys([*([driver.when] if driver.when else []), *_far_condition(driver, receiver)])
            ),
            inferred=_guessed(driver, receiver),
            basis=Basis.weakest(driver.basis, receiver.basis, *(element.basis for element in path)),
        )
        return replace(crossing, **more) if more else crossing  # type: ignore[arg-type]

    def _from_rails(self, field: _Field) -> Iterator[Crossing]:
        """Rails that reach a receiver through resistors (a pull-up to another supply), whatever drives the net."""
        drivers = self.drivers_of[id(field)]
        near = field.near
        pulls = field.pulls
        for receiver in field.island.pins:
            if (
                receiver.receive is None
                or receiver.supply_volts is None
                or receiver.role == "far-end"
                or self._is_switch(receiver)
            ):
                continue
            if _held(drivers, near[receiver.net]):
                continue
            seen: set[str] = set()
            for net in near[receiver.net]:
                for rail, volts, element in pulls.get(net, ()):
                    if rail in seen or same_supply(volts, receiver.supply_volts):
                        continue
                    seen.add(rail)
                    path = field.path(net, receiver.net) or []
                    reader, level_if = self._divided(field, receiver, drivers)
                    yield Crossing(
                        driver=None,
                        driver_rail=rail,
                        receiver=reader,
                        receiver_rail=receiver.supply,
                        link=tuple(dict.fromkeys([element.part, *(step.part for step in path)])),
                        shifter=Shifter(kind="series-resistor", parts=(element.part,), title=f"pull-up to {rail}"),
                        island=field.island.index,
                        condition="",
                        level_if=level_if,
                        segment=self.rails.is_ground(receiver.supply),
                        basis=Basis.weakest(receiver.basis, self.rails.by_net[rail].basis),
                    )

    def _divided(self, field: _Field, receiver: PinModel, drivers: Sequence[PinModel]) -> tuple[PinModel, str]:
        """Return the receiver and on what its levels depend, when a divider brings it the voltage of a rail."""
        nets = field.near[receiver.net]
        if receiver.receive is None or not any(
            measuring.pulled_down(net, field.island.elements, self.rails) for net in nets
        ):
            return receiver, ""
        if any(pin.net in nets and pin.part != receiver.part for pin in drivers):
            return receiver, ""
        measured = measuring.measures(receiver, nets, self.facts.get(receiver.part))
        if measured:
            return replace(receiver, receive=replace(receiver.receive, reads=False)), ""
        return receiver, f"{receiver.label} reads a level there, not an analogue voltage" if measured is None else ""

    def _through_translators(self) -> Iterator[Crossing]:
        for reference in sorted(self.facts):
            known = self.facts[reference]
            if known.translator is None or known.translator.kind not in CHAIN_KINDS:
                continue
            channels: dict[str, dict[str, PinModel]] = defaultdict(dict)
            for (part, _), pin in self.pins.items():
                if part == reference and pin.facts is not None and pin.facts.side and pin.net in self.by_net:
                    channels[pin.facts.channel][pin.facts.side] = pin
            for _, sides in sorted(channels.items()):
                if set(sides) == {"a", "b"}:
                    yield from self._chain(reference, known, sides["a"], sides["b"])
                    yield from self._chain(reference, known, sides["b"], sides["a"])

    def _chain(self, reference: str, known: PartFacts, into: PinModel, out: PinModel) -> Iterator[Crossing]:
        if into.receive is None or out.drive is None or into.supply_volts is None or out.supply_volts is None:
            return
        assert known.translator is not None
        near_side, far_side = self.by_net[into.net], self.by_net[out.net]
        if near_side is far_side:
            return
        sources = [
            pin
            for pin in self.drivers_of[id(near_side)]
            if pin.part != reference and pin.supply_volts is not None and near_side.path(pin.net, into.net) is not None
        ]
        sinks = [
            pin
            for pin in far_side.island.pins
            if pin.part != reference
            and pin.receive is not None
            and pin.supply_volts is not None
            and not self._is_switch(pin)
        ]
        shifter = Shifter(kind="translator", parts=(reference,), title=known.title)
        for source in sources:
            for sink in sinks:
                assert source.supply_volts is not None and sink.supply_volts is not None
                if same_supply(source.supply_volts, sink.supply_volts) or (
                    source.role == "far-end" and sink.role == "far-end" and not (_settled(source) and _settled(sink))
                ):
                    continue
                path = far_side.path(out.net, sink.net)
                if path is None:
                    continue
                condition = " and ".join(
                    dict.fromkeys(
                        text
                        for text in (
                            source.when,
                            ""
                            if known.translator.direction == "auto" or known.translator.kind == "auto-buffer"
                            else out.when,
                            *_far_condition(source, sink),
                        )
                        if text
                    )
                )
                yield Crossing(
                    driver=source,
                    driver_rail=source.supply,
                    receiver=sink,
                    receiver_rail=sink.supply,
                    link=tuple(
                        dict.fromkeys(
                            [
                                *(step.part for step in near_side.path(source.net, into.net) or ()),
                                reference,
                                *(step.part for step in path),
                            ]
                        )
                    ),
                    shifter=shifter,
                    island=far_side.island.index,
                    through=(reference,),
                    condition=condition,
                    stage_driver=replace(out, when=""),
                    inferred=_guessed(source, sink),
                    basis=Basis.weakest(source.basis, sink.basis, out.basis),
                )

    def _to_switches(self, found: Sequence[Crossing]) -> Iterator[Crossing]:
        """Gates and bases of transistors that switch a load, not a signal: those on the way to no receiver."""
        shifting = {part for crossing in found if crossing.driver is not None for part in crossing.link}
        for field in self.islands:
            for gate in switches.switch_terminals(field.island, self.rails, self.pins):
                if gate.part in shifting or gate.supply_volts is None:
                    continue
                drivers = self.drivers_of[id(field)]
                for driver in drivers:
                    if driver.role != "signal" or driver.supply_volts is None:
                        continue
                    path = field.path(driver.net, gate.net)
                    if path is None or same_supply(driver.supply_volts, gate.supply_volts):
                        continue
                    if len(drivers) == 1 and len(field.island.pins) == 1:
                        driver = replace(driver, when="", why="the only pin that can drive the transistor")
                    # To ground there is no second supply: such a switch is only worth a word where it may not close.
                    yield self._crossing(field, driver, gate, path, segment=self.rails.is_ground(gate.supply))

    def _tied_inputs(self) -> Iterator[Crossing]:
        """Yield inputs tied straight to a rail that is not their own supply."""
        for pin in self.pins.values():
            if pin.role != "signal" or pin.receive is None or pin.supply_volts is None:
                continue
            volts = self.rails.volts(pin.net)
            if volts is None or volts.nominal < 0.5 or same_supply(volts, pin.supply_volts) or self._is_switch(pin):
                continue
            yield Crossing(
                driver=None,
                driver_rail=pin.net,
                receiver=pin,
                receiver_rail=pin.supply,
                shifter=Shifter(kind="wire", title=f"tied to {pin.net}"),
                island=-1,
                basis=Basis.weakest(pin.basis, self.rails.by_net[pin.net].basis),
            )

    # -- what cannot be judged -----------------------------------------------------------------------------------------

    def note_jumpers(self, board: Board) -> None:
        """Note the receivers that a jumper of unknown state may join to another supply's driver."""
        for part in board.parts:
            if (
                not part.fitted
                or partkinds.kind_of(part) != "jumper"
                or len(part.pins) != 2
                or partkinds.joined_pins(part)
            ):
                continue
            first, second = (self.by_net.get(pin.net) for pin in part.pins)
            if (
                first is None
                or second is None
                or first is second
                or re.search(r"OPEN", f"{part.value} {part.symbol}", re.I)
            ):
                continue
            for near, far in ((first, second), (second, first)):
                levels = [
                    pin.supply_volts
                    for pin in self.drivers_of[id(far)]
                    if pin.supply_volts is not None and pin.role == "signal" and not pin.when
                ]
                for pin in near.island.pins:
                    if (
                        pin.role == "signal"
                        and pin.receive is not None
                        and pin.supply_volts is not None
                        and any(not same_supply(level, pin.supply_volts) for level in levels)
                    ):
                        why = f"{part.reference} ({part.value}) is a jumper whose state nothing tells; closed, it joins this pin to a driver on another supply"
                        self.not_judged[pin.part, pin.number] = NotJudged(
                            part=pin.part, pin=pin.number, name=pin.name, net=pin.net, why=why
                        )

    def _note_unknown(self, field: _Field, drivers: Sequence[PinModel], receivers: Sequence[PinModel]) -> None:
        active = {(pin.part, pin.number): pin for pin in [*drivers, *receivers] if pin.role == "signal"}
        if not active:
            return
        for key, pin in active.items():
            others = [other for other in field.island.pins if (other.part, other.number) != key]
            if pin.supply_volts is None and others:
                self.not_judged[key] = NotJudged(part=pin.part, pin=pin.number, name=pin.name, net=pin.net, why=pin.why)
        for pin in field.island.pins:
            if (
                pin.role == "far-end"
                and pin.supply_volts is None
                and not any(ANALOG_NET.match(net) for net in (pin.net, pin.name))
            ):
                self.far_ends[pin.part, pin.number] = f"nothing tells the level beyond {pin.part}.{pin.number}"


class _Field:
    """An island with its directed graph of signal ways."""

    def __init__(self, island: Island, rails: Rails) -> None:
        self.island = island
        self.pulls = pull_ups(island, rails)
        self.near = _near_groups(island)
        self.graph: networkx.MultiDiGraph[str] = networkx.MultiDiGraph()
        self.graph.add_nodes_from(island.nets)
        for element in island.elements:
            for source, target in _signal_ways(element):
                if source in self.graph and target in self.graph:
                    self.graph.add_edge(source, target, element=element)
        self._paths: dict[tuple[str, str], list[Element] | None] = {}

    def path(self, source: str, target: str) -> list[Element] | None:
        """Return the elements on the shortest way between two nets, or None when no signal can go that way."""
        if source == target:
            return []
        key = (source, target)
        if key not in self._paths:
            try:
                nets = networkx.shortest_path(self.graph, source, target)
            except (networkx.NetworkXNoPath, networkx.NodeNotFound):
                self._paths[key] = None
            else:
                steps = []
                for a, b in pairwise(nets):
                    edges = self.graph.get_edge_data(a, b)
                    steps.append(min((data["element"] for data in edges.values()), key=_preference))
                self._paths[key] = steps
        return self._paths[key]


def _preference(element: Element) -> tuple[int, float, str]:
    """Prefer the element that carries the signal best: link, switch, transistor, resistor by value, diode."""
    order = {"link": 0, "switch": 1, "mosfet": 2, "bipolar": 3, "resistor": 4, "diode": 5, "zener": 6}
    return order.get(element.kind, 9), element.ohms.nominal if element.ohms else 0.0, element.part


def _signal_ways(element: Element) -> Iterator[tuple[str, str]]:
    """Yield the net pairs between which an element carries a signal, in its direction."""
    match element.kind:
        case "mosfet":
            drain, gate, source = element.nets
            yield from ((drain, source), (source, drain), (gate, drain), (gate, source))
        case "bipolar":
            collector, base, emitter = element.nets
            yield from ((collector, emitter), (emitter, collector), (base, collector), (base, emitter))
        case "capacitor":
            return
        case _:
            yield element.nets[0], element.nets[1]
            yield element.nets[1], element.nets[0]


def pull_ups(island: Island, rails: Rails) -> dict[str, list[tuple[str, Spread, Element]]]:
    """Return, by net, the positive rails that reach it through one resistor: rail, its voltage, the resistor."""
    found: dict[str, list[tuple[str, Spread, Element]]] = defaultdict(list)
    for element in island.elements:
        if element.kind not in ("resistor", "link"):
            continue
        for net, other in (element.nets, element.nets[::-1]):
            volts = rails.volts(other)
            if net in island.nets and volts is not None and volts.nominal > 0.5:
                found[net].append((other, volts, element))
    return found


def _near_groups(island: Island) -> dict[str, tuple[str, ...]]:
    """Return for each net those it is tied to by links and small series resistors, itself first."""
    graph: networkx.Graph[str] = networkx.Graph()
    graph.add_nodes_from(island.nets)
    for element in island.elements:
        small = element.kind == "link" or (
            element.kind == "resistor" and element.ohms is not None and element.ohms.nominal <= SERIES_AT_MOST_OHMS
        )
        if small and element.nets[0] in graph and element.nets[1] in graph:
            graph.add_edge(*element.nets)
    groups: dict[str, tuple[str, ...]] = {}
    for component in networkx.connected_components(graph):
        for net in component:
            groups[net] = (net, *sorted(component - {net}))
    return groups


def _held(drivers: Sequence[PinModel], nets: Sequence[str]) -> bool:
    """Tell whether a push-pull output that never lets go holds one of these nets."""
    return any(
        pin.net in nets
        and not pin.when
        # A general-purpose pin lets go at reset, even where it is the only one that can drive.
        and pin.receive is None
        and pin.role == "signal"
        and pin.drive is not None
        and pin.drive.style == "push-pull"
        and not pin.drive.tristate
        for pin in drivers
    )


def _settled(pin: PinModel) -> bool:
    """Tell whether the level of a pin rests on the board or the settings: not so for a far end guessed from a supply pin."""
    return not pin.inferred_far_end or pin.drive is None or pin.drive.basis is Basis.TRACED


def _guessed(*pins: PinModel) -> str:
    """Say how the level of far ends was guessed; empty when none was."""
    return "; ".join(dict.fromkeys(pin.why for pin in pins if not _settled(pin)))


def _far_condition(*pins: PinModel) -> list[str]:
    """Say what must be true of far ends whose level a pull-up on the board tells."""
    return [pin.why for pin in pins if pin.inferred_far_end and _settled(pin)]


def _without_detours(found: Sequence[Crossing]) -> list[Crossing]:
    """Leave out the way up through what only brings levels down, between two pins that could go either way.

    A divider or a clamp between two configurable pins says which of them drives: the one on the higher supply.
    """
    down = {
        _ends(crossing) for crossing in found if crossing.driver is not None and crossing.shifter.kind in DOWNWARD_KINDS
    }

    def detour(crossing: Crossing) -> bool:
        driver, receiver = crossing.driver, crossing.receiver
        if driver is None or driver.supply_volts is None or receiver.supply_volts is None:
            return False
        either = bool(driver.when) and bool(receiver.when) and receiver.drive is not None
        upwards = driver.supply_volts.nominal < receiver.supply_volts.nominal
        return either and upwards and _ends(crossing)[::-1] in down

    return [crossing for crossing in found if not detour(crossing)]


def _two_way(found: Sequence[Crossing]) -> list[Crossing]:
    ends = {_ends(crossing) for crossing in found if crossing.driver is not None}
    return [
        replace(crossing, two_way=True) if crossing.driver is not None and _ends(crossing)[::-1] in ends else crossing
        for crossing in found
    ]


def _ends(crossing: Crossing) -> tuple[tuple[str, str], tuple[str, str]]:
    assert crossing.driver is not None
    return (crossing.driver.part, crossing.driver.number), (crossing.receiver.part, crossing.receiver.number)


def _order(crossing: Crossing) -> tuple[object, ...]:
    from levelcrossing.units import natural_key

    driver = crossing.driver
    return (
        natural_key(crossing.receiver.part),
        natural_key(crossing.receiver.number),
        natural_key(driver.part if driver else ""),
        natural_key(driver.number if driver else ""),
        crossing.driver_rail,
        crossing.link,
    )
