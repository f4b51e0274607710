"""Cut the board at its rails: what stays connected through parts is an island, the unit that is solved."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence

import networkx

from levelcrossing import partkinds, units
from levelcrossing.diodepins import diode_pairs
from levelcrossing.model import (
    Basis,
    Board,
    Element,
    Island,
    Part,
    PartFacts,
    Pin,
    PinModel,
    Rails,
    Settings,
    Spread,
)
from levelcrossing.pinnames import pin_words
from levelcrossing.tradebook import Tradebook

# A 0-ohm link, a ferrite or a closed jumper at DC [ohm]: IEC 60115 jumpers are 50 milliohm at most; ferrites reach 1 ohm.
LINK_OHMS = Spread(low=0.02, nominal=0.1, high=0.5)
SWITCH_KINDS = frozenset({"fet-switch", "bus-switch", "auto-pass"})

MOSFET_TERMINALS = {"D": "D", "DRAIN": "D", "G": "G", "GATE": "G", "S": "S", "SOURCE": "S"}
BIPOLAR_TERMINALS = {"C": "C", "COLLECTOR": "C", "B": "B", "BASE": "B", "E": "E", "EMITTER": "E"}
# Pin order 1, 2, 3 when a symbol names nothing: the SOT-23 habit of makers (common practice).
SOT23_MOSFET = {"1": "G", "2": "S", "3": "D"}
SOT23_BIPOLAR = {"1": "B", "2": "E", "3": "C"}


def find_elements(
    board: Board, book: Tradebook, facts: Mapping[str, PartFacts], settings: Settings
) -> tuple[Element, ...]:
    """Turn every fitted passive part, diode, transistor and pass switch into elements.

    Parameters
    ----------
    board : Board
    book : Tradebook
    facts : mapping
        Reference to the part's row, for pass switches inside integrated circuits.
    settings : Settings

    Returns
    -------
    tuple of Element
        In the order of the board's parts.
    """
    elements: list[Element] = []
    for part in board.parts:
        if part.fitted and part.pins:
            elements.extend(_elements_of(part, book, facts.get(part.reference), settings))
    return tuple(element for element in elements if len(set(element.nets)) > 1 and all(element.nets))


def _elements_of(part: Part, book: Tradebook, facts: PartFacts | None, settings: Settings) -> Iterable[Element]:
    kind = partkinds.kind_of(part)
    if kind in ("resistor", "resistor-pack", "shunt"):
        return _resistors(part, settings)
    if kind in partkinds.LINK_KINDS:
        return [_two(part, "link", a, b, ohms=LINK_OHMS) for a, b in partkinds.joined_pins(part)]
    if kind == "capacitor":
        farads = units.parse_capacitance(part.value)
        spread = Spread.around(farads, 0.2) if farads else None
        return [_two(part, "capacitor", a, b, farads=spread) for a, b in partkinds.element_pairs(part)]
    if kind in ("diode", "zener", "led", "suppressor"):
        return _diodes(part, book)
    if kind == "transistor":
        return _transistors(part, book)
    if facts is not None and facts.translator is not None and facts.translator.kind in SWITCH_KINDS:
        return _switches(part, facts)
    return ()


def _two(
    part: Part,
    kind: str,
    a: Pin,
    b: Pin,
    *,
    ohms: Spread | None = None,
    farads: Spread | None = None,
    facts: object = None,
    basis: Basis = Basis.TRACED,
    note: str = "",
) -> Element:
    return Element(
        kind=kind,
        part=part.reference,
        nets=(a.net, b.net),
        terminals=(a.number, b.number),
        value=part.value,
        ohms=ohms,
        farads=farads,
        facts=facts,
        basis=basis,
        note=note,
    )


def _resistors(part: Part, settings: Settings) -> Iterable[Element]:
    ohms = units.parse_resistance(part.value)
    tolerance = units.resistor_tolerance(part.value) or settings.resistor_tolerance
    for a, b in partkinds.element_pairs(part):
        if ohms is None:
            yield _two(part, "resistor", a, b, ohms=None, note="value not understood")
        elif ohms < 0.5:
            yield _two(part, "link", a, b, ohms=LINK_OHMS)
        else:
            yield _two(part, "resistor", a, b, ohms=Spread.around(ohms, tolerance))


def _diodes(part: Part, book: Tradebook) -> Iterable[Element]:
    facts = book.diode(part)
    if facts is None:
        return
    kind = "zener" if facts.zener_volts is not None else "diode"
    for anode, cathode in diode_pairs(part):
        yield Element(
            kind=kind,
            part=part.reference,
            nets=(anode.net, cathode.net),
            terminals=(anode.number, cathode.number),
            facts=facts,
            basis=Basis.ASSUMED if facts.generic else Basis.LIBRARY,
            value=part.value,
        )


def _device_index(pin: Pin, roles: Mapping[str, str]) -> tuple[str, str] | None:
    """Return (device, role) of a transistor pin: ``G2`` gives ("2", "G"), ``G`` gives ("", "G")."""
    for word in pin_words(pin.name):
        match = re.fullmatch(r"(\d?)([A-Z]+?)_?(\d?)", word.upper())
        if match and match.group(2) in roles:
            return match.group(1) or match.group(3), roles[match.group(2)]
    return None


def transistor_devices(
    part: Part, roles: Mapping[str, str], sot23: Mapping[str, str]
) -> list[tuple[dict[str, Pin], str]]:
    """Group the pins of a transistor or a transistor pair into devices.

    Parameters
    ----------
    part : Part
    roles : mapping
        Pin names to terminal letters.
    sot23 : mapping
        Terminal letters by pin number, for symbols whose pins have no names.

    Returns
    -------
    list of (dict, str)
        Terminal letter to pin for each complete device, and a remark when the pin order had to be taken from habit.
    """
    devices: dict[str, dict[str, Pin]] = defaultdict(dict)
    for pin in part.pins:
        found = _device_index(pin, roles)
        if found and found[1] not in devices[found[0]]:
            devices[found[0]][found[1]] = pin
    letters = set(roles.values())
    complete = [(terminals, "") for _, terminals in sorted(devices.items()) if set(terminals) == letters]
    if complete:
        return complete
    by_number = {pin.number: pin for pin in part.pins}
    order = re.search(r"_([A-Z]{3})(?:_|$)", part.symbol.upper())
    if order and set(order.group(1)) == letters and {"1", "2", "3"} <= set(by_number):
        return [({letter: by_number[str(place + 1)] for place, letter in enumerate(order.group(1))}, "")]
    if len(part.pins) == 3 and set(sot23) == set(by_number):
        return [
            (
                {letter: by_number[number] for number, letter in sot23.items()},
                "pin order 1 2 3 taken from the SOT-23 habit",
            )
        ]
    return []


def _transistors(part: Part, book: Tradebook) -> Iterable[Element]:
    mosfet = book.mosfet(part)
    if mosfet is not None:
        for pins, note in transistor_devices(part, MOSFET_TERMINALS, SOT23_MOSFET):
            yield _three(part, "mosfet", (pins["D"], pins["G"], pins["S"]), mosfet, mosfet.generic, note)
        return
    bipolar = book.bipolar(part)
    if bipolar is not None:
        for pins, note in transistor_devices(part, BIPOLAR_TERMINALS, SOT23_BIPOLAR):
            yield _three(part, "bipolar", (pins["C"], pins["B"], pins["E"]), bipolar, bipolar.generic, note)


def _three(part: Part, kind: str, pins: tuple[Pin, Pin, Pin], facts: object, generic: bool, note: str) -> Element:
    return Element(
        kind=kind,
        part=part.reference,
        nets=tuple(pin.net for pin in pins),
        terminals=tuple(pin.number for pin in pins),
        facts=facts,
        basis=Basis.ASSUMED if generic or note else Basis.LIBRARY,
        value=part.value,
        note=note,
    )


def _switches(part: Part, facts: PartFacts) -> Iterable[Element]:
    channels: dict[str, dict[str, list[Pin]]] = defaultdict(lambda: defaultdict(list))
    for pin in part.pins:
        known = facts.pin(pin)
        if known.channel and known.side and pin.net:
            channels[known.channel][known.side].append(pin)
    for _, sides in sorted(channels.items()):
        for a in sides.get("a", ()):
            for b in sides.get("b", ()):
                yield _two(part, "switch", a, b, facts=facts.translator, basis=Basis.LIBRARY)


def find_islands(
    board: Board, rails: Rails, pins: Mapping[tuple[str, str], PinModel], elements: Sequence[Element]
) -> tuple[Island, ...]:
    """Cut at the rails and collect what stays connected through elements.

    Parameters
    ----------
    board : Board
    rails : Rails
    pins : mapping
        Models of all pins.
    elements : sequence of Element

    Returns
    -------
    tuple of Island
        Sorted by their first net; islands without a pin that drives, reads or leads off the board are left out.
    """
    graph: networkx.Graph[str] = networkx.Graph()
    graph.add_nodes_from(net.name for net in board.nets if net.name not in rails.by_net)
    for element in elements:
        own = [net for net in dict.fromkeys(element.nets) if net in graph]
        if element.kind != "capacitor":
            graph.add_edges_from((own[0], other) for other in own[1:])
    touching: dict[str, list[Element]] = defaultdict(list)
    for element in elements:
        for net in dict.fromkeys(element.nets):
            touching[net].append(element)
    on_net: dict[str, list[PinModel]] = defaultdict(list)
    for pin in pins.values():
        if pin.role in ("signal", "far-end") and pin.net:
            on_net[pin.net].append(pin)
    islands: list[Island] = []
    for component in sorted(sorted(nets) for nets in networkx.connected_components(graph)):
        members = [pin for net in component for pin in on_net.get(net, ())]
        if not members:
            continue
        own_elements = list(dict.fromkeys(element for net in component for element in touching.get(net, ())))
        islands.append(
            Island(
                index=len(islands),
                nets=tuple(component),
                elements=tuple(own_elements),
                pins=tuple(members),
                rails=tuple(sorted({net for element in own_elements for net in element.nets if net in rails.by_net})),
            )
        )
    return tuple(islands)


def left_out(
    board: Board, elements: Sequence[Element], islands: Sequence[Island], book: Tradebook
) -> tuple[tuple[str, str], ...]:
    """Return the transistors that no circuit holds although they touch signals, each with its value.

    Parameters
    ----------
    board : Board
    elements : sequence of Element
    islands : sequence of Island
    book : Tradebook
        Arrays of transistors that it knows as drivers are none of these.

    Returns
    -------
    tuple of (str, str)
        References and values of fitted transistors of which neither number nor symbol tells the polarity.
    """
    modelled = {element.part for element in elements}
    signals = {net for island in islands if any(pin.role == "signal" for pin in island.pins) for net in island.nets}
    return tuple(
        (part.reference, part.value)
        for part in board.parts
        if part.fitted
        and part.reference not in modelled
        and partkinds.kind_of(part) == "transistor"
        and any(pin.net in signals for pin in part.pins)
        and book.part(part) is None
    )
