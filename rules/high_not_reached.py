"""A high does not reach the receiver's high level.

Why: between its low and its high level an input may read either, may oscillate, and a CMOS input draws current. What works
on the bench at room temperature fails in the field.

What to do: a buffer with a TTL-level input at the receiver's supply, a translator, a pull-up to the receiver's supply
behind an open drain, or a receiver whose high level lies lower.

Speaks when the solved voltage at the receiver, with the driver high, stays below VIH: malfunction at the usual values,
marginal when only a corner fails.

Stays quiet when VIH is reached at every corner.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_volts

NAME = "high-not-reached"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("VIH of the receiver's data sheet or family (JESD7-A, JESD8C.01, JESD20, JESD36 ...)",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing whose high falls short."""
    for index, solved in enumerate(case.crossings):
        if solved.crossing.to_switch or (solved.crossing.driver is None and solved.crossing.island < 0):
            continue
        for state in solved.states.values():
            margin = state.high_margin
            if not state.solved or margin is None or margin.spread.low >= -1e-6:
                continue
            nominal = margin.spread.nominal < -1e-6
            where = "" if nominal else " in the corner " + (margin.worst_corner or "of all tolerances")
            text = (
                f"{solved.crossing.target} reads a high from {format_volts(solved.vih.nominal if solved.vih else margin.limit)} up; {solved.crossing.source} brings it to "
                f"{format_volts(state.receiver_volts.nominal)} ({format_volts(margin.at)} against {format_volts(margin.limit)}{where or ' at worst'})."
            ) + (f" In that corner {margin.break_even}." if margin.break_even else "")
            yield solved.finding(index, NAME, Outcome.MALFUNCTION if nominal else Outcome.MARGINAL, text, level=True)
