"""How a supply goes on from net to net: what joins two nets outright, and what feeds one from another with a drop.

References
----------
Drops in a supply path between some milliamperes and an ampere: Schottky 0.2-0.5 V (1N5819: 0.60 V at most at 1 A, about
0.2 V at 10 mA), silicon 0.6-1.0 V (1N4148: 1.0 V at most at 10 mA; 1N4001: 1.1 V at most at 1 A); from data sheets,
remembered. Part numbers of load switches: makers' data sheets, remembered.
"""

from __future__ import annotations

import re
from collections import defaultdict, deque
from collections.abc import Iterator
from dataclasses import dataclass

from levelcrossing import partkinds, units
from levelcrossing.diodepins import diode_pairs
from levelcrossing.model import Part, Pin, Spread
from levelcrossing.rail_scene import Scene, plain_words

SCHOTTKY_DROP = Spread(low=0.2, nominal=0.3, high=0.5)
SILICON_DROP = Spread(low=0.6, nominal=0.7, high=1.0)
SATURATED_DROP = Spread(low=0.0, nominal=0.1, high=0.3)
NO_DROP = Spread(low=0.0, nominal=0.0, high=0.0)
SMALL_SERIES_OHMS = 10.0
FILTER_SERIES_OHMS = 10_000.0
LINK_OHMS = 0.5

_LOAD_SWITCH = re.compile(
    r"(LOAD|POWER|HIGH[- ]?SIDE|USB).{0,20}SWITCH|POWER[- ]?DISTRIBUTION|CURRENT[- ]LIMIT|IDEAL[- ]DIODE|POWER[- ]MUX|"
    r"\bE-?FUSE\b|^(TPS20\d\d|TPS229\d\d|TPS259\d|TPS2[12]1\d|AP2[128]\d\d[A-Z]*[DSW]|AP22\d{3}|SY628\d|MIC20\d\d|"
    r"MIC25\d\d|MIC940\d\d|NCP38\d|RT97\d\d|FPF[12]\d{3}|SIP32\d{3}|STMPS\d{4}|LM66[12]\d\d|LTC4411|LTC4412|MAX40200|"
    r"ADP19\d|CH217|TPD3S014|SLG59M|DML30\d\d)",
    re.IGNORECASE,
)
_SWITCH_INPUT = r"V?_?INP?\d?[AB]?|VCC|VDD|VBUS_?IN|VIN\d?|IN[12AB]|VS"
_SWITCH_OUTPUT = r"V?_?OUT\d?[AB]?|VOUT\d?|OUT[12AB]?|VO|VBUS_?OUT"

_WORDS = {
    "link": "0 Ω",
    "jumper": "closed jumper",
    "net-tie": "net tie",
    "shunt": "shunt",
    "resistor": "0 Ω",
    "inductor": "coil",
}


@dataclass(frozen=True, slots=True)
class Feed:
    """A way by which one net may feed another: from where to where, by which part, with which drop [V].

    ``kind`` is ``resistor``, ``filter`` (a larger one), ``diode``, ``switch`` (transistor or integrated circuit) or
    ``choice`` (a jumper, header or mechanical switch that may be set this way).
    """

    source: str
    target: str
    part: str
    kind: str
    drop: Spread
    words: str


class Joints:
    """Nets that are galvanically one supply: joined by links, closed jumpers, net ties, fuses, ferrites and coils.

    Parameters
    ----------
    scene : Scene
    """

    def __init__(self, scene: Scene) -> None:
        self.scene = scene
        self._beside: dict[str, list[tuple[str, str]]] = defaultdict(list)
        for reference, part in scene.parts.items():
            for a, b in self._joined(reference, part):
                if a.net and b.net and a.net != b.net:
                    self._beside[a.net].append((b.net, reference))
                    self._beside[b.net].append((a.net, reference))
        self._group: dict[str, str] = {}
        self.members: dict[str, tuple[str, ...]] = {}
        for net in sorted(self._beside):
            if net not in self._group:
                found = sorted(self._reached(net))
                self.members[net] = tuple(found)
                self._group.update(dict.fromkeys(found, net))

    def group(self, net: str) -> str:
        """Return the name of the group that a net belongs to; a net of its own is a group of its own."""
        return self._group.get(net, net)

    def nets(self, group: str) -> tuple[str, ...]:
        """Return the nets of a group, sorted."""
        return self.members.get(group, (group,))

    def path(self, start: str, end: str) -> tuple[str, ...]:
        """Return the parts on the shortest way between two nets of one group."""
        came: dict[str, tuple[str, str]] = {start: ("", "")}
        queue = deque([start])
        while queue and end not in came:
            net = queue.popleft()
            for other, part in self._beside.get(net, ()):
                if other not in came:
                    came[other] = (net, part)
                    queue.append(other)
        parts: list[str] = []
        net = end
        while came.get(net, ("", ""))[0]:
            net, part = came[net]
            parts.append(part)
        return tuple(reversed(parts))

    def words(self, start: str, end: str) -> str:
        """Return the way between two nets for the user: ``through L3 (ferrite) and F1 (fuse)``."""
        parts = self.path(start, end)
        named = [f"{part} ({self._word(part)})" for part in parts[:3]]
        more = f" and {len(parts) - 3} more" if len(parts) > 3 else ""
        return "through " + " and ".join(named) + more

    def _word(self, reference: str) -> str:
        kind = self.scene.kinds[reference]
        return _WORDS.get(kind, kind)

    def _reached(self, start: str) -> set[str]:
        """Walk from a net; a ground joins grounds only, so that a strap to ground never makes a rail of it."""
        seen, waiting = {start}, [start]
        while waiting:
            net = waiting.pop()
            for other, _ in self._beside[net]:
                if other not in seen and (other in self.scene.grounds) == (net in self.scene.grounds):
                    seen.add(other)
                    waiting.append(other)
        return seen

    def _joined(self, reference: str, part: Part) -> Iterator[tuple[Pin, Pin]]:
        kind = self.scene.kinds[reference]
        if kind in partkinds.LINK_KINDS or kind == "shunt":
            coil = kind in ("inductor", "ferrite")
            for a, b in partkinds.joined_pins(part):
                if not (coil and (self.scene.switching(a.net) or self.scene.switching(b.net))):
                    yield a, b
        if kind in ("resistor", "shunt"):
            ohms = units.parse_resistance(part.value)
            if kind == "shunt" or (ohms is not None and ohms < LINK_OHMS):
                yield from partkinds.element_pairs(part)


def across_coil(scene: Scene, net: str) -> tuple[str, ...]:
    """Return the nets on the other side of the coils on a net, without grounds."""
    found: dict[str, None] = {}
    for pin in scene.pins_on.get(net, ()):
        if scene.kinds[pin.part] in ("inductor", "ferrite"):
            for a, b in partkinds.element_pairs(scene.parts[pin.part]):
                other = b.net if a.net == net else a.net if b.net == net else ""
                if other and other != net and other not in scene.grounds:
                    found[other] = None
    return tuple(found)


def find_feeds(scene: Scene, joints: Joints) -> tuple[Feed, ...]:
    """Find every way by which one supply may feed another.

    Returns
    -------
    tuple of Feed
        In the order of the board's parts.
    """
    feeds: list[Feed] = []
    for reference, part in scene.parts.items():
        kind = scene.kinds[reference]
        if kind in ("resistor", "resistor-pack"):
            feeds.extend(_through_resistor(part))
        elif kind == "diode":
            feeds.extend(_through_diode(scene, part))
        elif kind == "transistor":
            feeds.extend(_through_transistor(scene, part))
        elif kind in ("ic", "regulator") and reference not in scene.regulators:
            feeds.extend(_through_load_switch(part))
        elif kind in ("jumper", "switch", "connector"):
            feeds.extend(_through_choice(scene, part))
    return tuple(
        feed
        for feed in feeds
        if feed.source not in scene.grounds
        and feed.target not in scene.grounds
        and joints.group(feed.source) != joints.group(feed.target)
    )


def _both(a: str, b: str, part: str, kind: str, drop: Spread, words: str) -> Iterator[Feed]:
    if a and b and a != b:
        yield Feed(a, b, part, kind, drop, words)
        yield Feed(b, a, part, kind, drop, words)


def _through_resistor(part: Part) -> Iterator[Feed]:
    ohms = units.parse_resistance(part.value)
    if ohms is None or not LINK_OHMS <= ohms <= FILTER_SERIES_OHMS:
        return
    kind = "resistor" if ohms <= SMALL_SERIES_OHMS else "filter"
    words = f"through {part.reference} ({units.format_si(ohms, 'Ω')}; its drop is small and not known)"
    for a, b in partkinds.element_pairs(part):
        yield from _both(a.net, b.net, part.reference, kind, NO_DROP, words)


def _through_diode(scene: Scene, part: Part) -> Iterator[Feed]:
    facts = scene.book.diode(part)
    if facts is not None and facts.kind in ("led", "zener", "suppressor"):
        return
    schottky = facts is not None and facts.kind == "schottky"
    schottky = schottky or re.search(r"SCHOTTKY", f"{part.symbol} {part.description}", re.IGNORECASE) is not None
    drop = SCHOTTKY_DROP if schottky else SILICON_DROP
    name = "Schottky diode" if schottky else "silicon diode"
    words = f"through {part.reference} ({name}, {drop.low:g} to {drop.high:g} V less)"
    for anode, cathode in diode_pairs(part):
        if anode.net and cathode.net:
            yield Feed(anode.net, cathode.net, part.reference, "diode", drop, words)


def _through_transistor(scene: Scene, part: Part) -> Iterator[Feed]:
    pins = {word.upper()[:1]: pin for pin in part.pins for word in plain_words(pin)[:1]}
    if len(part.pins) == 3 and not any(pin.name for pin in part.pins):
        # The SOT-23 habit for symbols without pin names: gate 1, source 2, drain 3 (common practice).
        pins = {{"1": "G", "2": "S", "3": "D"}.get(pin.number, "?"): pin for pin in part.pins}
    mosfet = scene.book.mosfet(part)
    if mosfet is not None:
        if mosfet.polarity == "p" and {"D", "S"} <= set(pins) and len(part.pins) <= 8:
            words = f"through {part.reference} (P-channel switch, taken as on)"
            yield from _both(pins["S"].net, pins["D"].net, part.reference, "switch", NO_DROP, words)
        return
    bipolar = scene.book.bipolar(part)
    if bipolar is not None and bipolar.polarity == "pnp" and {"E", "C"} <= set(pins) and len(part.pins) == 3:
        words = f"through {part.reference} (PNP switch, taken as on)"
        yield Feed(pins["E"].net, pins["C"].net, part.reference, "switch", SATURATED_DROP, words)


def _through_load_switch(part: Part) -> Iterator[Feed]:
    texts = (part.value, part.symbol, part.description, part.keywords, part.library)
    if not any(_LOAD_SWITCH.search(text) for text in texts if text):
        return
    inputs, outputs = [], []
    for pin in part.pins:
        name = next(iter(plain_words(pin)), "")
        if re.fullmatch(_SWITCH_OUTPUT, name, re.IGNORECASE):
            outputs.append(pin)
        elif re.fullmatch(_SWITCH_INPUT, name, re.IGNORECASE) and pin.kind not in ("output", "open_collector"):
            inputs.append(pin)
    words = f"through {part.reference} ({part.value}, a power switch taken as on)"
    for source in dict.fromkeys(pin.net for pin in inputs):
        for target in dict.fromkeys(pin.net for pin in outputs):
            if source and target and source != target:
                yield Feed(source, target, part.reference, "switch", NO_DROP, words)


def _through_choice(scene: Scene, part: Part) -> Iterator[Feed]:
    """Ways that a jumper, a header used as one or a switch opens when it is set so."""
    pins = part.pins
    if scene.kinds[part.reference] == "connector":
        # A header between supplies only: no ground, no signal; else it leads off the board.
        nets = {pin.net for pin in pins}
        header = 3 <= len(pins) <= 8 and len(nets) < len(pins) + 1 and not nets & set(scene.grounds) and "" not in nets
        if not header or any(next(scene.signal_pins(net), None) is not None for net in nets):
            return
    elif partkinds.joined_pins(part) or len(pins) > 8:
        return
    words = f"through {part.reference} ({part.value}) when it is set so"
    for a, b in partkinds.element_pairs(part) or _neighbours(pins):
        yield from _both(a.net, b.net, part.reference, "choice", NO_DROP, words)


def _neighbours(pins: tuple[Pin, ...]) -> Iterator[tuple[Pin, Pin]]:
    if len(pins) == 3:
        yield pins[0], pins[1]
        yield pins[1], pins[2]
    elif len(pins) % 2 == 0:
        yield from zip(pins[::2], pins[1::2], strict=True)
