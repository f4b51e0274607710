"""An input sees more than its absolute maximum.

Why: beyond the absolute maximum rating an input may be destroyed at once or age in weeks; a pin without a clamp diode
has nothing that holds the voltage, and a stiff driver on a pin with a clamp diode pushes tens of milliamperes through it.

What to do: bring the level down (divider, tolerant buffer, translator), take a receiver that tolerates the level, or run
both ends from one supply.

Speaks when the solved voltage at the pin, its own clamp diode left aside, passes the rating and either there is no clamp
diode or nothing limits the current into it. Damage at the usual supplies, marginal when only a corner passes the rating.

Stays quiet when the pin is rated for the voltage, when resistance limits the clamp current (then clamp-current judges),
and when a clamp diode would not even begin to conduct.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_amps, format_volts

NAME = "input-overvoltage"
OUTCOME = Outcome.DAMAGE
SOURCES = (
    "absolute maximum ratings of the receiver's data sheet; for parts of which nothing is known, V + 0.3 V (common practice)",
)

# A clamp diode that takes less than this does not act on the pin [A]: the rating "V + 0.3 V" exists to keep it off.
QUIET_AMPS = 10e-6
# Above this nothing limits the current to speak of [A]; between the two, clamp-current judges.
STIFF_AMPS = 5e-3


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing whose receiver is over its rating."""
    for index, solved in enumerate(case.crossings):
        if solved.crossing.to_switch:
            continue
        receive = solved.crossing.receiver.receive
        worst = None
        for state in solved.states.values():
            if (
                state.solved
                and state.rating_margin is not None
                and (worst is None or state.rating_margin.spread.low < worst.rating_margin.spread.low)
            ):
                worst = state
        if worst is None or worst.rating_margin is None or receive is None or worst.rating_margin.spread.low >= -1e-9:
            continue
        margin = worst.rating_margin
        # A pin tied straight to another rail has no solved clamp current: whatever the rail can give flows.
        tied = solved.crossing.island < 0
        clamped = receive.clamp_high and not tied
        if clamped and worst.clamp_amps.high < STIFF_AMPS:
            continue
        nominal = margin.spread.nominal < -1e-9 and not (clamped and worst.clamp_amps.nominal < QUIET_AMPS)
        volts = worst.open_volts
        corner = f" at worst ({margin.worst_corner})" if margin.worst_corner else ""
        text = (
            f"{solved.crossing.target} gets {format_volts(volts.nominal)}, {format_volts(margin.at)}{corner}, from {solved.crossing.source}; "
            f"it bears at most {format_volts(margin.limit)}"
        )
        if clamped:
            text += f"; its clamp diode takes {format_amps(worst.clamp_amps.nominal)}, {format_amps(worst.clamp_amps.high)} at worst"
        remedy = (
            f"Tie {solved.crossing.receiver.label} to {solved.crossing.receiver_rail or 'its own supply'}."
            if tied
            else ""
        )
        yield solved.finding(
            index,
            NAME,
            Outcome.DAMAGE if nominal else Outcome.MARGINAL,
            text + ".",
            remedy=remedy,
            cause=f"over {solved.crossing.receiver.part}.{solved.crossing.receiver.number} {solved.crossing.driver_rail}",
        )
