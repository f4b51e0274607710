"""The MOSFET of a shifter is turned round.

Why: the body diode must point from the low side to the high side (source on the low side). Turned round, it conducts from
the high supply into the low side all the time.

What to do: exchange drain and source, so that the source and the gate's supply are on the low side.

Speaks when an N-channel MOSFET between two pulled-up sides has its drain on the side of the lower supply (for a P-channel
part: the other way round), with the solved voltage it puts on the low side.

Stays quiet when the source is on the low side, and when both sides are on one supply.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Element, Finding, Outcome, SolvedCrossing
from levelcrossing.units import format_volts

NAME = "shifter-reversed"
OUTCOME = Outcome.DAMAGE
SOURCES = ("NXP AN10441, Level shifting techniques in I2C-bus design, rev. 01 (source on the low-voltage side)",)
EXPLAINS = (
    "input-overvoltage",
    "clamp-current",
    "low-not-reached",
    "high-not-reached",
    "margin-thin",
    "sink-current",
    "pull-up-rail",
    "gate-threshold",
    "shifter-pull-up",
    "unpowered-path",
    "too-slow",
)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per reversed transistor."""
    done: set[str] = set()
    for index, solved in enumerate(case.crossings):
        if solved.crossing.shifter.kind != "mosfet-pass":
            continue
        element = next(
            (
                element
                for element in solved.elements
                if element.part in solved.crossing.shifter.parts and element.kind == "mosfet"
            ),
            None,
        )
        if element is None or element.part in done:
            continue
        low_side = _low_side(solved, case)
        if low_side is None:
            continue
        wrong = element.nets[0] if element.facts.polarity == "n" else element.nets[2]
        if low_side != wrong:
            continue
        state = max((state for state in solved.states.values()), key=lambda state: state.open_volts.nominal)
        done.add(element.part)
        text = (
            f"{element.part} ({element.value}) has its drain on {element.nets[0]}, the low side: its body diode carries current from the high supply into the low side, "
            f"which {solved.crossing.target} sees as up to {format_volts(state.open_volts.nominal)}."
        )
        yield solved.finding(
            index, NAME, Outcome.MALFUNCTION, text, part=element.part,
            remedy=f"Exchange drain and source of {element.part}: source to {element.nets[0]}, drain to {element.nets[2]}.", cause=f"reversed {element.part}",
        )  # fmt: skip


def _low_side(solved: SolvedCrossing, case: CaseFile) -> str | None:
    """Return the net of the shifter's channel that lies towards the lower supply."""
    crossing = solved.crossing
    driver, receiver = crossing.driver, crossing.receiver
    if driver is None or driver.supply_volts is None or receiver.supply_volts is None:
        return None
    element = next(element for element in solved.elements if element.part in crossing.shifter.parts)
    ends = (element.nets[0], element.nets[2])
    receiver_low = receiver.supply_volts.nominal < driver.supply_volts.nominal
    receiver_end = _towards(receiver.net, ends, solved.elements, element)
    if receiver_end is None:
        return None
    other = ends[1] if receiver_end == ends[0] else ends[0]
    return receiver_end if receiver_low else other


def _towards(net: str, ends: tuple[str, str], elements: tuple[Element, ...], without: Element) -> str | None:
    """Return the end of the channel that a net hangs on through resistors and links."""
    seen, frontier = {net}, [net]
    while frontier:
        here = frontier.pop()
        if here in ends:
            return here
        for element in elements:
            if element is not without and element.kind in ("resistor", "link") and here in element.nets:
                frontier.extend(other for other in element.nets if other not in seen)
                seen.update(element.nets)
    return None
