"""A low does not reach the receiver's low level.

Why: a low that stays above VIL may be read as a high or as noise. It happens behind diodes, weak drivers against strong
pull-ups, dividers, and transistors that cannot conduct enough.

What to do: a larger pull-up, a stronger driver, a transistor with a lower threshold, or a real translator in place of a
diode or a weak one.

Speaks when the solved voltage at the receiver, with the driver low, stays above VIL: malfunction at the usual values,
marginal when only a corner fails.

Stays quiet when VIL is reached at every corner.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_volts

NAME = "low-not-reached"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("VIL of the receiver's data sheet or family (JESD7-A, JESD8C.01, JESD20, JESD36 ...)",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing whose low stays too high."""
    for index, solved in enumerate(case.crossings):
        if solved.crossing.to_switch:
            continue
        for state in solved.states.values():
            margin = state.low_margin
            if not state.solved or margin is None or margin.spread.low >= -1e-6:
                continue
            nominal = margin.spread.nominal < -1e-6
            where = " at worst" if nominal else f" in the corner {margin.worst_corner or 'of all tolerances'}"
            text = (
                f"{solved.crossing.target} reads a low from {format_volts(solved.vil.nominal if solved.vil else margin.limit)} down; {solved.crossing.source} brings it to "
                f"{format_volts(state.receiver_volts.nominal)} ({format_volts(margin.at)} against {format_volts(margin.limit)}{where})."
            ) + (f" In that corner {margin.break_even}." if margin.break_even else "")
            parts = " and ".join(solved.crossing.shifter.parts)
            remedy = f"Use larger pull-ups on {solved.crossing.receiver.net}, a stronger driver" + (
                f", or a MOSFET pair or a translator in place of {parts}." if parts else "."
            )
            yield solved.finding(
                index, NAME, Outcome.MALFUNCTION if nominal else Outcome.MARGINAL, text, remedy=remedy, level=True
            )
