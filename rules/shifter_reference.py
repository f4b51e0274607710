"""The gate or base of a shifter goes to the wrong supply.

Why: the gate (or base) sets how high the low side can rise. On the high supply it lets the high side's level through; on
too low a supply the transistor does not conduct.

What to do: tie the gate (or the base resistor) to the supply of the low side.

Speaks when the control terminal of a MOSFET or bipolar pass cell is on a rail that is not the lower of the two supplies.

Stays quiet when it is on the lower supply, driven by a signal (an enable), or on a rail that does no harm: levels hold and
the low side stays at its supply.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome, SolvedCrossing, StateResult
from levelcrossing.units import format_volts

NAME = "shifter-reference"
OUTCOME = Outcome.DAMAGE
SOURCES = ("NXP AN10441 rev. 01: gate to the lower supply voltage VDD1", "the bipolar cell: common practice")
EXPLAINS = (
    "input-overvoltage",
    "clamp-current",
    "low-not-reached",
    "high-not-reached",
    "margin-thin",
    "sink-current",
    "gate-threshold",
    "junction-rating",
    "pull-up-rail",
    "unpowered-path",
    "too-slow",
)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per shifter whose control terminal is on the wrong rail."""
    done: set[str] = set()
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        if crossing.shifter.kind not in ("mosfet-pass", "bipolar-pass") or crossing.driver is None:
            continue
        element = next(
            (
                element
                for element in solved.elements
                if element.part in crossing.shifter.parts and element.kind in ("mosfet", "bipolar")
            ),
            None,
        )
        if (
            element is None
            or element.part in done
            or crossing.driver.supply_volts is None
            or crossing.receiver.supply_volts is None
        ):
            continue
        rail = _control_rail(solved, case, element.nets[1])
        volts = case.rails.volts(rail) if rail else None
        if volts is None:
            continue
        lower = min(crossing.driver.supply_volts.nominal, crossing.receiver.supply_volts.nominal)
        if abs(volts.nominal - lower) <= 0.1 * lower or volts.nominal < 0.3:
            continue
        what = "gate" if element.kind == "mosfet" else "base"
        # A gate above the lower supply lets the higher level through; one below it may still work: the levels decide.
        troubled = any(
            _fails(state) or _lifted(other, state, lower)
            for other in case.crossings
            if element.part in other.crossing.shifter.parts
            for state in other.states.values()
        )
        if not troubled:
            continue
        done.add(element.part)
        rail_low = min(
            (crossing.driver_rail, crossing.receiver_rail), key=lambda net: (case.rails.volts(net) or volts).nominal
        )
        text = (
            f"The {what} of {element.part} ({element.value}) is on {rail} ({format_volts(volts.nominal)}), but the lower of its two sides works from {format_volts(lower)}: "
            f"{'the low side can rise towards the high supply' if volts.nominal > lower else 'the transistor hardly conducts'}."
        )
        yield solved.finding(
            index,
            NAME,
            Outcome.MARGINAL,
            text,
            part=element.part,
            remedy=f"Tie the {what} of {element.part} to {rail_low or 'the lower supply'}.",
            cause=f"reference {element.part}",
        )


def _fails(state: StateResult) -> bool:
    """Tell whether a level or a rating fails in a state, at the worst corner."""
    return any(
        margin is not None and margin.spread.low < 0
        for margin in (state.rating_margin, state.high_margin, state.low_margin)
    )


def _lifted(solved: SolvedCrossing, state: StateResult, lower: float) -> bool:
    """Tell whether the low side rises above its own supply, harm or none."""
    supply = solved.crossing.receiver.supply_volts
    on_low_side = supply is not None and supply.nominal <= lower * 1.01
    return on_low_side and not state.floating and state.open_volts.nominal > lower * 1.05


def _control_rail(solved: SolvedCrossing, case: CaseFile, net: str) -> str | None:
    """Return the rail that a control terminal is on, directly or through one resistor."""
    if net in case.rails.by_net:
        return net
    for element in solved.elements:
        if element.kind in ("resistor", "link") and net in element.nets:
            other = element.nets[1] if element.nets[0] == net else element.nets[0]
            if other in case.rails.by_net and not case.rails.is_ground(other):
                return other
    return None
