"""A level holds at every corner, but barely.

Why: noise, ground bounce and what the models leave out need room. Standard logic families leave 0.4 V between a worst
output and an input; a few tens of millivolts are no margin.

What to do: raise the level or lower the threshold by the means named under high-not-reached and low-not-reached.

Speaks when the least margin to VIH or VIL over all corners is positive but under the set limit (50 mV unless the settings
say otherwise).

Stays quiet when there is more room, and when a corner fails outright (then high-not-reached or low-not-reached speaks).
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome

NAME = "margin-thin"
OUTCOME = Outcome.MARGINAL
SOURCES = (
    "noise margins of logic families, e.g. 0.4 V between LVTTL parts (JESD8C.01); the limit itself is common practice",
)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing with little room."""
    limit = case.settings.thin_margin_volts
    for index, solved in enumerate(case.crossings):
        if solved.crossing.to_switch:
            continue
        for state in solved.states.values():
            for margin, level in ((state.high_margin, "high"), (state.low_margin, "low")):
                if not state.solved or margin is None or not -1e-6 <= margin.spread.low < limit - 1e-9:
                    continue
                text = (
                    f"{solved.crossing.target} reads a {level} from {solved.crossing.source} with only {margin.spread.low * 1e3:.0f} mV to spare"
                    f" ({margin.at:.2f} V against {margin.limit:.2f} V; {margin.worst_corner or 'at the usual values'}); {margin.spread.nominal * 1e3:.0f} mV at the usual values."
                )
                yield solved.finding(index, NAME, Outcome.MARGINAL, text, level=True)
