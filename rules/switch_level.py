"""A driver does not turn a switch transistor off, or not surely on.

Why: a P-channel MOSFET with its source on 5 V is off only with its gate near 5 V. A 3.3 V output leaves it 1.7 V, more
than its threshold: the load never goes off. The other way round, a power MOSFET with a threshold of up to 4 V hardly
conducts with 3.3 V on its gate, heats up and drops the load's voltage.

What to do: drive a high-side switch through a small N-channel or NPN transistor to ground, with the pull-up at the
source's supply; at the low side take a transistor whose greatest threshold lies a volt below the logic's high.

Speaks when the solved gate or base voltage, in the state that should turn the transistor off or on, does not: malfunction
at the usual threshold and values, marginal for the least or greatest threshold or in a corner.

Stays quiet when the transistor is surely off in one state and surely on in the other, and for transistors that carry a
signal (those are judged with their receiver).
"""

from collections.abc import Iterator

from levelcrossing.model import (
    BipolarFacts,
    CaseFile,
    Element,
    Finding,
    MosfetFacts,
    Outcome,
    SolvedCrossing,
    StateResult,
)
from levelcrossing.units import format_volts

NAME = "switch-level"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("VGS(th) rows of the transistor's data sheet", "0.4 V to 0.5 V between emitter and base: common practice")

# What a transistor that is to carry a load should have above its usual threshold [V] (practice).
USUAL_OVERDRIVE_VOLTS = 0.5
# By how much the greatest threshold should lie below the logic's high when choosing a transistor [V] (practice).
CHOICE_VOLTS = 1.0


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per transistor and state that the driver does not bring about."""
    for index, solved in enumerate(case.crossings):
        if not solved.crossing.to_switch:
            continue
        element = next(
            (one for one in solved.elements if one.part == solved.crossing.receiver.part and one.facts), None
        )
        if element is None:
            continue
        for state in solved.states.values():
            found = _of(index, solved, element, state)
            if found is not None:
                yield found
                break


def _of(index: int, solved: SolvedCrossing, element: Element, state: StateResult) -> Finding | None:
    margin = state.high_margin or state.low_margin
    if not state.solved or margin is None or margin.spread.low >= -1e-6:
        return None
    crossing, facts = solved.crossing, element.facts
    foot, volts = crossing.receiver.supply_volts, state.receiver_volts
    assert foot is not None
    name = f"{element.part} ({element.value})" if element.value else element.part
    high_side = not isinstance(facts, MosfetFacts) or facts.polarity == "p"
    left = foot.nominal - volts.nominal if high_side else volts.nominal - foot.nominal
    should_be_off = (state.high_margin is not None) == high_side
    terminal, other = ("gate", "source") if isinstance(facts, MosfetFacts) else ("base", "emitter")
    brings = (
        f"{crossing.source} brings its {terminal} to {format_volts(volts.nominal)} ({format_volts(margin.at)} at worst)"
    )
    if isinstance(facts, MosfetFacts):
        threshold = facts.threshold_volts
        usual = f"usually {format_volts(threshold.nominal)}"
        if should_be_off:
            fails = left > threshold.nominal
            text = f"{name} does not turn off: {brings}, {format_volts(left)} from its {other} at {format_volts(foot.nominal)}, and may conduct from {format_volts(threshold.low)} on ({usual})."
        else:
            fails = left < threshold.nominal + USUAL_OVERDRIVE_VOLTS
            text = f"{name} may not turn on: {brings}, {format_volts(left)} from its {other}, and its threshold may be as high as {format_volts(threshold.high)} ({usual})."
    else:
        assert isinstance(facts, BipolarFacts)
        fails = margin.spread.nominal < 0
        text = (
            f"{name} does not turn off: {brings}, {format_volts(left)} below its {other} at {format_volts(foot.nominal)}."
            if should_be_off
            else f"{name} may not turn on: {brings}, only {format_volts(left)} below its {other}."
        )
    if should_be_off and not fails:
        text = text.replace("does not turn off", "may not turn off")
    return solved.finding(
        index,
        NAME,
        Outcome.MALFUNCTION if fails else Outcome.MARGINAL,
        text,
        part=element.part,
        remedy=_remedy(solved, should_be_off, left),
        cause=f"switch {element.part} {'off' if should_be_off else 'on'}",
    )


def _remedy(solved: SolvedCrossing, should_be_off: bool, left: float) -> str:
    crossing = solved.crossing
    if should_be_off:
        return (
            f"Drive {crossing.receiver.part} through an NPN or N-channel transistor to ground, with a pull-up from "
            f"{crossing.receiver.net} to {crossing.receiver_rail}; that inverts the signal."
        )
    return f"Take a transistor whose greatest threshold is below about {format_volts(max(left - CHOICE_VOLTS, 0.3))}, or drive it from a higher supply."
