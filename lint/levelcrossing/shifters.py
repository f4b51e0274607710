"""Name the part of a link that changes the level. A name explains; it never decides a verdict."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from levelcrossing.model import Element, Island, PartFacts, PinModel, Rails, Shifter


def inverts(path: Sequence[Element], start: str) -> bool:
    """Tell whether a way from the net ``start`` inverts: it enters an odd number of transistors at their control."""
    turns = [step for step in path if step.kind in ("mosfet", "bipolar") and not _passes(step, path, start)]
    return len(turns) % 2 == 1


def recognise(
    island: Island,
    path: Sequence[Element],
    driver: PinModel,
    receiver: PinModel,
    rails: Rails,
    facts: Mapping[str, PartFacts],
) -> Shifter:
    """Name the shifter on the way from a driver to a receiver.

    Parameters
    ----------
    island : Island
    path : sequence of Element
        From driver to receiver; empty for a plain wire.
    driver, receiver : PinModel
    rails : Rails
    facts : mapping
        Reference to the part's row, to tell buffers.

    Returns
    -------
    Shifter
    """
    active = [element for element in path if element.kind in ("mosfet", "bipolar", "switch", "diode", "zener")]
    resistors = [element for element in path if element.kind == "resistor"]
    for element in active:
        if element.kind == "switch":
            return Shifter(kind="translator", parts=(element.part,), title="pass switch")
        if element.kind in ("mosfet", "bipolar"):
            through = _passes(element, path, driver.net)
            if not through:
                return Shifter(
                    kind="inverting-stage", parts=(element.part,), title=f"{element.value} from control to output"
                )
            kind = "mosfet-pass" if element.kind == "mosfet" else "bipolar-pass"
            return Shifter(kind=kind, parts=(element.part,), title=f"{element.value} between the two sides")
        if element.kind in ("diode", "zener"):
            return Shifter(kind="diode", parts=(element.part,), title=f"{element.value} in series")
    ends = {receiver.net, *(net for element in path for net in element.nets)}
    to_rail = [
        element
        for element in island.elements
        if any(net in ends for net in element.nets) and any(net in rails.by_net for net in element.nets)
    ]
    grounded = [
        element
        for element in to_rail
        if element.kind == "resistor" and any(rails.is_ground(net) for net in element.nets)
    ]
    clamps = [element for element in to_rail if element.kind in ("diode", "zener")]
    if resistors and grounded and any(receiver.net in element.nets for element in grounded):
        return Shifter(
            kind="divider",
            parts=tuple(dict.fromkeys(element.part for element in [*resistors, *grounded])),
            title="resistor divider",
        )
    if resistors and clamps:
        return Shifter(
            kind="clamp",
            parts=tuple(dict.fromkeys(element.part for element in [*resistors, *clamps])),
            title="series resistor and clamp",
        )
    if driver.drive is not None and driver.drive.style == "open-drain":
        pulls = [
            element
            for element in to_rail
            if element.kind == "resistor" and not any(rails.is_ground(net) for net in element.nets)
        ]
        return Shifter(
            kind="open-drain",
            parts=tuple(dict.fromkeys(element.part for element in pulls)),
            title="open drain and pull-up",
        )
    known = facts.get(receiver.part)
    if known is not None and known.group == "logic" and not resistors:
        return Shifter(kind="buffer", parts=(receiver.part,), title=known.title)
    if resistors:
        return Shifter(
            kind="series-resistor",
            parts=tuple(dict.fromkeys(element.part for element in resistors)),
            title="series resistor",
        )
    return Shifter(kind="wire")


def _passes(element: Element, path: Sequence[Element], start: str) -> bool:
    """Tell whether a way goes through a transistor's channel (True) or from its control terminal (False)."""
    here = start
    for step in path:
        entry = here
        others = [net for net in step.nets if net != entry]
        if step is element:
            return entry != element.nets[1]
        after = path[path.index(step) + 1]
        onward = [net for net in others if net in after.nets]
        here = onward[0] if onward else others[0]
    return True
