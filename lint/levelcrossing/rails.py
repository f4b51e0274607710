"""From a board to its rails: which nets are held at a steady voltage, at which, and why that is believed.

The way: what gives a net its voltage by itself (``rail_sources``) decides for the whole group of nets that are joined
outright (``rail_links``); the strongest evidence wins, and evidence that contradicts it is told. Groups without any are
then fed through resistors, diodes, switches and jumpers from groups that have one.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import replace

from levelcrossing import units
from levelcrossing.model import Basis, Board, Evidence, Rail, RailRemark, Rails, Settings, Spread
from levelcrossing.rail_limits import regulator_remarks
from levelcrossing.rail_links import Feed, Joints, across_coil, find_feeds
from levelcrossing.rail_scene import Scene
from levelcrossing.rail_sources import Sources
from levelcrossing.tradebook import Tradebook

STRENGTH = (
    "ground",
    "settings",
    "field",
    "regulator",
    "feedback",
    "name",
    "connector",
    "upstream",
    "diode",
    "battery",
    "use",
)
"""Kinds of evidence, strongest first."""

DISAGREE = 0.06
"""Usual voltages further apart than this contradict each other [1]; real rails keep within 5 % of their name."""

NEAR = 0.03
"""Closer than this they never do, whatever their tolerances [1]: names are rounded."""

_DECLARED = ("settings", "field")
_AUTOMATIC = re.compile(r"Net-\(|N\$|unconnected-\(")
_ROUNDS = 12


def trace_rails(board: Board, book: Tradebook, settings: Settings) -> Rails:
    """Find the rails of a board.

    Parameters
    ----------
    board : Board
    book : Tradebook
    settings : Settings

    Returns
    -------
    Rails
        Every net that is a rail with its evidence, supply nets without a voltage, and what is wrong with rails.
    """
    return _Tracing(Scene(board, book, settings)).rails()


class _Tracing:
    """One tracing: groups of joined nets, their voltages, and how those without one are fed."""

    def __init__(self, scene: Scene) -> None:
        self.scene = scene
        self.joints = Joints(scene)
        self.sources = Sources(scene, self.joints)
        self.into: dict[str, list[Feed]] = defaultdict(list)
        for feed in find_feeds(scene, self.joints):
            self.into[self.joints.group(feed.target)].append(feed)
        self.groups: dict[str, tuple[str, ...]] = {}
        for net in sorted(scene.pins_on):
            if net not in scene.grounds:
                group = self.joints.group(net)
                self.groups[group] = self.joints.nets(group)
        # Evidence of each group with the net that it belongs to, strongest first.
        self.known: dict[str, list[tuple[str, Evidence]]] = {}
        self.fed: dict[str, list[tuple[str, Evidence]]] = {}
        self.origin: dict[str, tuple[str, ...]] = {}
        self.remarks: list[RailRemark] = []

    def rails(self) -> Rails:
        """Do the whole work."""
        for group, nets in self.groups.items():
            found = [(net, item) for net in nets for item in self.sources.evidence.get(net, ())]
            if found:
                self.known[group] = self._ordered(found)
        self._feed(("resistor", "filter", "switch", "diode"))
        self._feed(("choice",))
        self._feed(("resistor", "filter", "switch", "diode"))
        self._take_use()
        self._feed(("resistor", "filter", "switch", "diode", "choice"))
        by_net = dict(self._grounds())
        for group, nets in self.groups.items():
            by_net.update(self._rails_of(group, nets))
        unknown = tuple(self._unknown(by_net))
        self.remarks += regulator_remarks(self.scene, self.sources.conversions, by_net)
        ordered = tuple(
            sorted(self.remarks, key=lambda remark: (remark.kind, units.natural_key(remark.net), remark.part))
        )
        return Rails(by_net=dict(sorted(by_net.items())), unknown=unknown, remarks=ordered)

    # ------------------------------------------------------------------------------------------------------ own voltage

    def _ordered(self, found: Sequence[tuple[str, Evidence]]) -> list[tuple[str, Evidence]]:
        """Sort evidence by strength; what states a range goes before a name that agrees and states less.

        ``+5V`` on a USB connector is 4.4 to 5.25 V; ``VBAT`` on a coin cell is that cell's voltage.
        """

        def key(entry: tuple[str, Evidence]) -> tuple[object, ...]:
            net, item = entry
            assumed = (net, item.text) not in self.sources.ranged
            return STRENGTH.index(item.kind), assumed, units.natural_key(net), item.text

        ordered = sorted(found, key=key)
        first_net, first = ordered[0]
        if first.kind != "name" or first.volts is None:
            return ordered
        point = (first_net, first.text) not in self.sources.ranged
        for entry in ordered[1:]:
            volts = entry[1].volts
            if volts is None or (entry[0], entry[1].text) not in self.sources.ranged:
                continue
            near = abs(volts.nominal - first.volts.nominal) <= NEAR * abs(first.volts.nominal)
            cell = entry[1].kind == "battery" and first.volts.low <= volts.low and volts.high <= first.volts.high
            if cell or (point and near and entry[1].kind in ("name", "connector")):
                return [entry, *(other for other in ordered if other is not entry)]
        return ordered

    def _volts(self, group: str) -> Spread | None:
        for found in (self.known.get(group), self.fed.get(group)):
            if found:
                return found[0][1].volts
        return None

    def _take_use(self) -> None:
        for group, nets in self.groups.items():
            if self._volts(group) is None and self._supply_like(nets):
                item = self.sources.from_use(nets)
                if item is not None:
                    self.known[group] = [(nets[0], item)]

    # ---------------------------------------------------------------------------------------------------------- feeding

    def _supply_like(self, nets: Sequence[str]) -> bool:
        """Tell whether a group without a voltage may be a rail: it supplies a part, or is decoupled and no signal."""
        scene = self.scene
        if any(scene.supplies(net) or scene.pulled_supply(net) for net in nets):
            return True
        if any(scene.signal_named(net) for net in nets):
            return False
        return any(scene.decoupled(net) for net in nets) and not any(next(scene.signal_pins(net), None) for net in nets)

    def _feed(self, kinds: Sequence[str]) -> None:
        """Give groups without a voltage that of the groups that feed them, round after round."""
        into = {
            group: [feed for feed in feeds if feed.kind in kinds]
            for group, feeds in self.into.items()
            if group not in self.known and group in self.groups and self._supply_like(self.groups[group])
        }
        for _ in range(_ROUNDS):
            fresh = False
            for group, feeds in into.items():
                found = self._combined(group, feeds)
                was = self.fed.get(group)
                if found is None or (was and was[0][1] == found[0]):
                    continue
                if was and was[0][1].kind == "upstream" and found[0].kind == "diode":
                    continue
                # At once, so that two groups that lead into each other never feed each other.
                supplied = [net for net in self.groups[group] if self.scene.keeps_company(net)]
                self.fed[group] = [(self._chief(supplied or self.groups[group]), found[0])]
                self.origin[group] = found[1]
                fresh = True
            if not fresh:
                return

    def _combined(self, group: str, feeds: Sequence[Feed]) -> tuple[Evidence, tuple[str, ...]] | None:
        """Combine all feeds of a group: any of them may hold it, so its range spans them all."""
        ways: list[tuple[Feed, Spread]] = []
        for feed in feeds:
            source = self.joints.group(feed.source)
            volts = self._volts(source)
            if volts is None or volts.nominal <= 0.5 or group in self._ancestors(source):
                continue
            if feed.kind == "filter" and not self._filtered(self.groups[group]):
                continue
            less = _less(volts, feed.drop)
            if less.nominal > 0.3:
                ways.append((feed, less))
        if not ways:
            return None
        ways.sort(key=lambda way: (-way[1].nominal, way[0].part, way[0].source))
        low = min(volts.low for _, volts in ways)
        high = max(volts.high for _, volts in ways)
        volts = Spread(low=low, nominal=ways[0][1].nominal, high=high)
        told = list(dict.fromkeys(f"{self._label(feed.source)} {feed.words}" for feed, _ in ways))
        diode = any(feed.kind == "diode" for feed, _ in ways)
        text = "fed from " + ", or from ".join(told)
        basis = Basis.ASSUMED if any(feed.kind == "choice" for feed, _ in ways) else Basis.TRACED
        sources = tuple(sorted({self.joints.group(feed.source) for feed, _ in ways}))
        return Evidence(kind="diode" if diode else "upstream", volts=volts, basis=basis, text=text), sources

    def _label(self, net: str) -> str:
        """Return a net's name for the user: that of a joined net when its own is automatic."""
        if not _AUTOMATIC.match(net):
            return net
        named = [other for other in self.joints.nets(self.joints.group(net)) if not _AUTOMATIC.match(other)]
        return named[0] if named else net

    def _ancestors(self, group: str) -> set[str]:
        seen: set[str] = set()
        waiting = [group]
        while waiting:
            here = waiting.pop()
            if here not in seen:
                seen.add(here)
                waiting.extend(self.origin.get(here, ()))
        return seen

    def _filtered(self, nets: Sequence[str]) -> bool:
        """Tell whether a group behind a larger resistor is a filtered supply: it supplies a part and is no signal."""
        scene = self.scene
        supplied = any(scene.supplies(net) for net in nets)
        return supplied and not any(next(scene.signal_pins(net), None) for net in nets)

    def _also_fed(self, group: str) -> Iterator[tuple[str, Evidence]]:
        """Yield what feeds a group that has only its name: worth knowing, though the name decides."""
        known = self.known.get(group, ())
        if not known or any(item.kind not in ("name", "use") for _, item in known):
            return
        for feed in self.into.get(group, ()):
            source = self.joints.group(feed.source)
            volts = self._volts(source)
            if volts is None or volts.nominal <= 0.5 or feed.kind in ("filter", "choice"):
                continue
            strong = any(
                item.kind in ("regulator", "feedback", "connector", "battery") for _, item in self.known.get(source, ())
            )
            if feed.kind == "diode" or strong:
                kind = "diode" if feed.kind == "diode" else "upstream"
                text = f"fed from {self._label(feed.source)} {feed.words}"
                yield feed.target, Evidence(kind=kind, volts=_less(volts, feed.drop), basis=Basis.TRACED, text=text)

    # --------------------------------------------------------------------------------------------------------- deciding

    def _grounds(self) -> Iterator[tuple[str, Rail]]:
        scene = self.scene
        size = {net: len(scene.pins_on[net]) for net in scene.grounds}
        main = max(sorted(size), key=lambda net: size[net], default="")
        for net, why in sorted(scene.grounds.items()):
            members = self.joints.nets(self.joints.group(net))
            domain = max(sorted(members), key=lambda member: size.get(member, 0))
            text = f"{net} is a ground: {why}"
            if main not in members:
                text += f"; nothing joins it to {main}, so it was taken as a ground of its own at 0 V"
            item = Evidence(kind="ground", volts=Spread.exactly(0.0), basis=Basis.TRACED, text=text)
            yield (
                net,
                Rail(
                    net=net, volts=Spread.exactly(0.0), basis=Basis.TRACED, evidence=(item,), domain=domain, ground=True
                ),
            )

    def _rails_of(self, group: str, nets: Sequence[str]) -> Iterator[tuple[str, Rail]]:
        found = self.known.get(group) or self.fed.get(group) or []
        if not found and not self._powered_by(nets):
            return
        domain = self._domain(group)
        disagreement = self._disagreement(found) if found else ""
        found = [*found, *self._also_fed(group)]
        for net in nets:
            if not self._belongs(net, nets, found):
                continue
            evidence = tuple(dict.fromkeys(self._as_seen(net, owner, item) for owner, item in _own_first(net, found)))
            yield (
                net,
                Rail(
                    net=net,
                    volts=evidence[0].volts if evidence else None,
                    basis=evidence[0].basis if evidence else Basis.ASSUMED,
                    evidence=evidence,
                    domain=domain,
                    disagreement=disagreement,
                    load_farads=self.scene.farads.get(net, 0.0),
                    fed_by=self._fed_by(group),
                ),
            )

    def _powered_by(self, nets: Sequence[str]) -> bool:
        """Tell whether a group without a voltage is a supply all the same; a bias pin on a pull-up alone is none."""
        scene = self.scene
        if any(scene.pulled_supply(net) for net in nets):
            return True
        pins = [pin for net in nets for pin in scene.pins_on[net]]
        if len(pins) < 2 or not any(scene.role(pin) in ("in", "out") for pin in pins):
            return False
        return self._sources_on(nets) or not any(scene.kinds[pin.part].startswith("resistor") for pin in pins)

    def _sources_on(self, nets: Sequence[str]) -> bool:
        """Tell whether anything on a group could feed it: a connector, a coil, a way from elsewhere, a second part."""
        scene = self.scene
        pins = [pin for net in nets for pin in scene.pins_on[net]]
        if len({pin.part for pin in pins if scene.active(pin.part)}) > 1:
            return True
        if any(
            scene.kinds[pin.part] in ("connector", "inductor", "transistor", "diode", "battery", "switch")
            for pin in pins
        ):
            return True
        return self.joints.group(nets[0]) in self.into

    def _belongs(self, net: str, nets: Sequence[str], found: Sequence[tuple[str, Evidence]]) -> bool:
        """Tell whether a net of a group is a rail itself; a mode pin strapped to a supply by 0 ohm is none."""
        scene = self.scene
        if len(nets) == 1 or any(owner == net for owner, _ in found) or scene.keeps_company(net):
            return True
        return next(scene.signal_pins(net), None) is None and not scene.signal_named(net)

    def _as_seen(self, net: str, owner: str, item: Evidence) -> Evidence:
        if owner == net or self.joints.group(owner) != self.joints.group(net):
            return item
        way = self.joints.words(net, owner)
        if not way.removeprefix("through ") or item.kind in ("upstream", "diode", "use"):
            return item
        return replace(
            item,
            kind="upstream",
            text=f"joined to {owner} {way}: {item.text}",
            basis=Basis.weakest(item.basis, Basis.TRACED),
        )

    def _domain(self, group: str) -> str:
        """Return the net that feeds a group: where its source stands, else the largest whose name decided."""
        nets = self.groups[group]
        found = self.known.get(group) or self.fed.get(group) or []
        sources = [owner for owner, item in found if item.kind in ("regulator", "feedback", "battery", "connector")]
        if sources:
            return sources[0]
        small = {
            self.joints.group(feed.source) for feed in self.into.get(group, ()) if feed.kind in ("resistor", "filter")
        }
        origin = self.origin.get(group, ())
        fed = group not in self.known and len(origin) == 1 and origin[0] in small
        above = origin[0] if fed else self._larger(group, small)
        if above:
            return self._domain(above)
        owners = [owner for owner, item in found if item.kind == found[0][1].kind]
        return self._chief(owners or [net for net in nets if self._belongs(net, nets, found)])

    def _chief(self, nets: Sequence[str]) -> str:
        """Return the net with most pins, the first by name of equals."""
        return max(sorted(nets), key=lambda net: len(self.scene.pins_on[net]), default="")

    def _larger(self, group: str, above: set[str]) -> str:
        """Return the group of equal voltage that feeds a named one through a resistor, if it is one and the larger."""
        volts = self._volts(group)
        if volts is None or group not in self.known or len(above) != 1:
            return ""
        (other,) = above
        theirs = self._volts(other) if other in self.known else None
        near = theirs is not None and abs(theirs.nominal - volts.nominal) <= NEAR * abs(volts.nominal)
        return other if near and self._size(other) > self._size(group) else ""

    def _size(self, group: str) -> int:
        return sum(len(self.scene.pins_on[net]) for net in self.groups.get(group, ()))

    def _fed_by(self, group: str) -> str:
        made = [one for one in self.sources.conversions if self.joints.group(one.output) == group]
        if len(made) == 1 and made[0].source and not made[0].switched:
            return made[0].source
        origin = self.origin.get(group, ())
        if group not in self.known and len(origin) == 1:
            ways = self.into.get(group, ())
            alone = {self.joints.group(feed.source) for feed in ways} == set(origin)
            if alone and {feed.kind for feed in ways} <= {"diode", "resistor", "filter"}:
                return self._domain(origin[0])
        return ""

    def _disagreement(self, found: Sequence[tuple[str, Evidence]]) -> str:
        """Return what contradicts the evidence that decided, and remark it once."""
        owner, first = found[0]
        if first.kind in _DECLARED or first.volts is None:
            return ""
        for other_net, other in found[1:]:
            if other.volts is None or other.kind == "use" or not _contradict(first.volts, other.volts):
                continue
            says, against = units.format_volts_apart(first.volts.nominal, other.volts.nominal)
            net = other_net if other.kind == "name" else owner
            join = "" if other_net == owner else f" and is joined to {other_net} {self.joints.words(owner, other_net)}"
            reason = _about(other_net, owner, other.text)
            text = f"{owner}{join}: {says} because {first.text}, but {against} because {reason}."
            remedy = (
                f"Correct the part, the divider or the name; or declare the rail under [rails] in levelcrossing.toml: "
                f'"{owner}" = "{first.volts.nominal:.3g}".'
            )
            part = next((one.part for one in self.sources.conversions if one.output == owner), "")
            self.remarks.append(
                RailRemark(kind="conflict", net=net, part=part, text=text, remedy=remedy, basis=first.basis)
            )
            return text
        return ""

    # ---------------------------------------------------------------------------------------------------- what is wrong

    def _unknown(self, by_net: dict[str, Rail]) -> Iterator[tuple[str, str]]:
        """Yield the nets without a voltage that supply integrated circuits, one for each group."""
        for nets in self.groups.values():
            if any(by_net[net].volts is not None for net in nets if net in by_net) or not any(
                net in by_net for net in nets
            ):
                continue
            supplied = [pin for net in nets for pin in self.scene.supplies(net) if self._matters(pin.part)]
            pulled = [net for net in nets if self.scene.pulled_supply(net)]
            # What one part alone hangs on may be its own inner supply; several parts share a rail.
            shared = len({pin.part for pin in supplied}) > 1
            if not (supplied and (shared or self._sources_on(nets))) and not pulled:
                continue
            net = self._chief([net for net in nets if net in by_net])
            whom = [f"{pin.part} ({pin.name or pin.number})" for pin in supplied]
            whom = whom or [pin.part for net in pulled for pin in self.scene.pins_on[net] if self._hangs(pin.part)]
            hints = [f"supplies {self._listed(whom)}"]
            hints += list(self._makers(nets))
            yield (
                net,
                f'State its volts or a range under [rails] in levelcrossing.toml: "{net}" = "?"; it '
                + "; ".join(hints),
            )

    def _makers(self, nets: Sequence[str]) -> Iterator[str]:
        """Yield what makes or feeds a supply without a voltage, as far as it shows."""
        scene = self.scene
        told = [self.sources.made_by[net] for net in nets if net in self.sources.made_by]
        if told:
            yield told[0]
            return
        for net in nets:
            for other in across_coil(scene, net):
                makers = sorted(
                    {pin.part for pin in scene.pins_on[other] if scene.active(pin.part) and scene.switching(other)}
                )
                if makers:
                    yield f"{scene.title(makers[0])} makes it, whose output the trade data does not tell"
                    return
            out = [pin for pin in scene.supplies(net, "out") if scene.converter(pin.part)]
            if out:
                title = f"{scene.title(out[0].part)} makes it at pin {out[0].name}"
                yield f"{title}, whose output the trade data does not tell"
                return
        ways = self.into.get(self.joints.group(nets[0]), ())
        feeds = sorted({f"{feed.part} from {self._label(feed.source)}" for feed in ways if self._plausible(feed)})
        if feeds:
            yield f"may be fed through {self._listed(feeds)}"

    def _hangs(self, reference: str) -> bool:
        return self.scene.kinds[reference].startswith(("resistor", "transistor"))

    def _plausible(self, feed: Feed) -> bool:
        """Tell whether a way is worth naming: not a pull-up from a signal."""
        if feed.kind == "filter":
            return False
        scene = self.scene
        lead = any(scene.kinds[pin.part] == "connector" for pin in scene.pins_on[feed.source])
        return lead or scene.keeps_company(feed.source)

    def _matters(self, reference: str) -> bool:
        return not self.scene.converter(reference)

    @staticmethod
    def _listed(words: Sequence[str]) -> str:
        unique = list(dict.fromkeys(words))
        return ", ".join(unique[:4]) + (f" and {len(unique) - 4} more" if len(unique) > 4 else "")


def _contradict(first: Spread, other: Spread) -> bool:
    """Tell whether two voltages cannot be one: usual values apart, and one of the ranges does not hold the other's."""
    most = max(abs(first.nominal), abs(other.nominal))
    apart = abs(first.nominal - other.nominal) / most if most else 0.0
    overlap = first.low <= other.high and other.low <= first.high
    held = first.low <= other.nominal <= first.high or other.low <= first.nominal <= other.high
    return (apart > DISAGREE and not held) or (apart > NEAR and not overlap)


def _own_first(net: str, found: Sequence[tuple[str, Evidence]]) -> Sequence[tuple[str, Evidence]]:
    """Put a net's own evidence first when it says just what the deciding evidence of its group says."""
    if not found:
        return found
    decided = found[0][1]
    for entry in found[1:]:
        if entry[0] == net and found[0][0] != net and entry[1].kind == decided.kind and entry[1].volts == decided.volts:
            return [entry, *(other for other in found if other is not entry)]
    return found


def _less(volts: Spread, drop: Spread) -> Spread:
    """Return a voltage less a drop [V]."""
    return Spread(low=volts.low - drop.high, nominal=volts.nominal - drop.nominal, high=volts.high - drop.low)


def _about(net: str, owner: str, text: str) -> str:
    return text if net == owner else text.replace("its name", f"the name {net}")
