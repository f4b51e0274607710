"""The feedback divider of an adjustable regulator: which resistors belong to it, and the output that they make."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from levelcrossing import partkinds, units
from levelcrossing.model import RegulatorFacts, Spread
from levelcrossing.rail_links import SMALL_SERIES_OHMS, Joints
from levelcrossing.rail_scene import Scene

_MOST_STEPS = 8
_ASIDE = frozenset({"capacitor", "test-point"}) | partkinds.LINK_KINDS
"""Kinds that carry no direct current away from a node of the divider, or are part of the node itself."""


@dataclass(frozen=True, slots=True)
class Divider:
    """A feedback divider: the net at its top, both resistances [ohm], and its parts for the user."""

    top_net: str
    top: Spread
    bottom: Spread
    words: str


@dataclass(frozen=True, slots=True)
class _Branch:
    """A chain of resistors from a node: where it ends, its resistance [ohm] (None when unread), its parts."""

    end: str
    ohms: Spread | None
    words: str


def read_divider(scene: Scene, joints: Joints, node: str, output: str, inputs: set[str]) -> Divider | None:
    """Read the resistors of a feedback node: those down to ground, those up to the output.

    Parameters
    ----------
    scene : Scene
    joints : Joints
    node : str
        Net of the feedback pin.
    output : str
        Net that the regulator makes; empty when its pins do not tell.
    inputs : set of str
        Nets that the regulator is fed from.

    Returns
    -------
    Divider or None
        None when the resistors are no divider, or one of them cannot be read (no value, a potentiometer).

    Notes
    -----
    Capacitors beside them (feed-forward) do not matter at DC. A resistor to anything else (a margining input) is left
    out.
    """
    ups: dict[str, list[_Branch]] = defaultdict(list)
    downs: list[_Branch] = []
    for branch in _branches(scene, joints, node):
        if branch.end in scene.grounds:
            downs.append(branch)
        else:
            ups[joints.group(branch.end)].append(branch)
    wanted = joints.group(output) if output else ""
    if wanted not in ups:
        held = {joints.group(net) for net in inputs}
        others = [group for group in ups if group not in held and scene.keeps_company(ups[group][0].end)]
        if wanted:
            # The output pin may stand before a sense resistor.
            others = [group for group in others if _near(scene, joints, group, wanted)]
        if len(others) != 1:
            return None
        wanted = others[0]
    top, bottom = _parallel(ups[wanted]), _parallel(downs)
    if top is None or bottom is None:
        return None
    return Divider(ups[wanted][0].end, top, bottom, f"{_named(ups[wanted])} over {_named(downs)}")


def _near(scene: Scene, joints: Joints, group: str, wanted: str) -> bool:
    """Tell whether a small resistor leads from one group to another."""
    for net in joints.nets(wanted):
        for pin in scene.pins_on.get(net, ()):
            part = scene.parts[pin.part]
            ohms = units.parse_resistance(part.value)
            if ohms is None or ohms > SMALL_SERIES_OHMS or not scene.kinds[pin.part].startswith("resistor"):
                continue
            if any(joints.group(end.net) == group for pair in partkinds.element_pairs(part) for end in pair):
                return True
    return False


def _branches(scene: Scene, joints: Joints, node: str) -> Iterator[_Branch]:
    """Yield the resistor chains that leave a node, each up to the next net where more than two things meet."""
    here = joints.group(node)
    for net in joints.nets(here):
        for pin in scene.pins_on.get(net, ()):
            if scene.kinds[pin.part] == "resistor":
                branch = _chain(scene, joints, net, pin.part, here)
                if branch is not None:
                    yield branch


def _chain(scene: Scene, joints: Joints, net: str, reference: str, here: str) -> _Branch | None:
    names: list[str] = []
    total, reach, read = 0.0, 0.0, True
    for _ in range(_MOST_STEPS):
        part = scene.parts[reference]
        pair = next((pair for pair in partkinds.element_pairs(part) if net in (pair[0].net, pair[1].net)), None)
        if pair is None:
            return None
        net = pair[1].net if pair[0].net == net else pair[0].net
        if not net or joints.group(net) == here:
            return None
        ohms = units.parse_resistance(part.value) if len(part.pins) == 2 else None
        read = read and ohms is not None
        tolerance = units.resistor_tolerance(part.value) or scene.settings.resistor_tolerance
        total, reach = total + (ohms or 0.0), reach + (ohms or 0.0) * tolerance
        names.append(f"{reference} {units.format_si(ohms or 0.0, 'Ω')}")
        onward = _onward(scene, joints, net, reference)
        if onward is None:
            break
        net, reference = onward
    spread = Spread(low=total - reach, nominal=total, high=total + reach) if read else None
    return _Branch(net, spread, "+".join(names))


def _onward(scene: Scene, joints: Joints, net: str, behind: str) -> tuple[str, str] | None:
    """Return the net and the resistor that a chain goes on with, when nothing else meets there; None at its end."""
    if net in scene.grounds or scene.keeps_company(net):
        return None
    others = [
        (near, pin.part)
        for near in joints.nets(joints.group(net))
        for pin in scene.pins_on.get(near, ())
        if pin.part != behind and scene.kinds[pin.part] not in _ASIDE
    ]
    return others[0] if len(others) == 1 and scene.kinds[others[0][1]] == "resistor" else None


def _named(branches: Sequence[_Branch]) -> str:
    return " ∥ ".join(branch.words for branch in branches)


def _parallel(branches: Sequence[_Branch]) -> Spread | None:
    """Return the resistance of branches side by side [ohm]; None when there is none or one is unread."""
    read = [branch.ohms for branch in branches if branch.ohms is not None]
    if not read or len(read) < len(branches):
        return None

    def of(values: list[float]) -> float:
        return 0.0 if 0.0 in values else 1 / sum(1 / value for value in values)

    return Spread(
        low=of([ohms.low for ohms in read]),
        nominal=of([ohms.nominal for ohms in read]),
        high=of([ohms.high for ohms in read]),
    )


def feedback_volts(facts: RegulatorFacts, top: Spread, bottom: Spread) -> Spread:
    """Return the output of an adjustable regulator from its feedback divider.

    Parameters
    ----------
    facts : RegulatorFacts
        With its reference voltage [V]. ``formula`` tells parts that hold the feedback pin at the reference above ground
        from those that hold the reference between output and adjust pin (``floating``).
    top, bottom : Spread
        Resistance from the output to the feedback pin, and from there to ground [ohm].

    Returns
    -------
    Spread
        Output [V]: ``vref (1 + top / bottom)``; floating ``vref (1 + bottom / top) + iadj bottom``.

    Examples
    --------
    With 0.8 V, 52.3 kohm over 10 kohm: 0.8 (1 + 5.23) = 4.984 V.
    """
    reference = facts.reference
    assert reference is not None
    floating = facts.formula == "floating"

    def out(vref: float, upper: float, lower: float) -> float:
        if floating:
            return vref * (1 + lower / upper) + facts.adjust_amps * lower
        return vref * (1 + upper / lower)

    nominal = out(reference.nominal, top.nominal, bottom.nominal)
    ends = [
        out(vref, a, b)
        for vref in (reference.low, reference.high)
        for a in (top.low, top.high)
        for b in (bottom.low, bottom.high)
    ]
    return Spread(low=min(ends), nominal=nominal, high=max(ends))
