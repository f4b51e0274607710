"""A shifter's MOSFET is not sure to conduct at the gate voltage it gets.

Why: the threshold of a part spreads over a volt or more. A 2N7000 may need 3.0 V where a 3.3 V gate over a 0.4 V low
leaves 2.9 V: one sample works on the bench, the next batch does not.

What to do: take a part whose greatest threshold lies well below the gate voltage (at 3.3 V a BSS138, at 1.8 V an FDV301N
class part).

Speaks when the gate voltage less the driver's low, at the least supply, lies less than 0.2 V above the greatest threshold
(marginal), and when the solved low fails for want of gate voltage.

Stays quiet when the gate has more than that to spare and the low is reached at every corner of the threshold.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, MosfetFacts, Outcome
from levelcrossing.units import format_volts

NAME = "gate-threshold"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("VGS(th) rows of the transistor's data sheet", "NXP AN10441 rev. 01")
EXPLAINS = ("low-not-reached", "margin-thin")

# A threshold is stated at a current of 0.25 mA to 1 mA; below this much more than it, a channel is no switch [V] (practice).
OVERDRIVE_VOLTS = 0.2
# Where the low fails, a gate up to this much above the greatest threshold is taken to be the cause [V].
FAILING_VOLTS = 0.3


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per transistor whose threshold may be too high."""
    done: set[str] = set()
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        if crossing.shifter.kind not in ("mosfet-pass", "inverting-stage"):
            continue
        element = next(
            (
                element
                for element in solved.elements
                if element.part in crossing.shifter.parts and isinstance(element.facts, MosfetFacts)
            ),
            None,
        )
        if element is None or element.part in done:
            continue
        lows = [state for state in solved.states.values() if state.solved and state.low_margin is not None]
        if not lows:
            continue
        state = min(lows, key=lambda low: low.low_margin.spread.low if low.low_margin is not None else 0.0)
        assert state.low_margin is not None
        failing = state.low_margin.spread.low < -1e-6
        volts = case.rails.volts(element.nets[1])
        if crossing.shifter.kind == "mosfet-pass" and volts is None:
            continue
        gate = (
            volts.low
            if volts is not None
            else (
                crossing.driver.supply_volts.low
                if crossing.driver is not None and crossing.driver.supply_volts is not None
                else 0.0
            )
        )
        threshold = element.facts.threshold_volts
        drive = gate - max(state.driver_volts.high, 0.0) if crossing.shifter.kind == "mosfet-pass" else gate
        if drive > threshold.high + (FAILING_VOLTS if failing else OVERDRIVE_VOLTS):
            continue
        if crossing.shifter.kind != "mosfet-pass" and not failing:
            continue
        done.add(element.part)
        text = (
            f"{element.part} ({element.value}) gets {format_volts(drive)} from gate to source, its threshold may be as high as {format_volts(threshold.high)} "
            f"(usually {format_volts(threshold.nominal)}): "
            + (
                f"{crossing.target} then stays at {format_volts(state.low_margin.at)} where a low ends at {format_volts(state.low_margin.limit)}."
                if failing
                else f"it conducts with hardly any overdrive; the low of {crossing.target} still ends at {format_volts(state.low_margin.at)}."
            )
        )
        if state.low_margin.break_even:
            text += f" At the least favourable corner {state.low_margin.break_even}."
        outcome = Outcome.MALFUNCTION if state.low_margin.spread.nominal < 0 else Outcome.MARGINAL
        yield solved.finding(
            index,
            NAME,
            outcome,
            text,
            part=element.part,
            remedy=f"Take a transistor whose greatest threshold is below about {format_volts(max(drive - 0.5, 0.3))}.",
            cause=f"threshold {element.part}",
        )
