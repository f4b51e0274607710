"""Only its clamp diode holds an input below its driver's level.

Why: when a higher level reaches a pin through a resistor, the diode to the pin's supply conducts. Makers who allow that
state an injection current; others state an absolute maximum voltage that the pin then exceeds. The current also lifts a
lightly loaded supply.

What to do: bring the level down with a divider or a buffer, or tie the pull-up to the receiver's own supply; a larger
series resistor only lowers the current.

Speaks when the unclamped voltage passes the rating and the clamp diode conducts a limited current: damage above the
rated injection current, or above 1 mA where no injection current is rated; marginal below 1 mA without a rating.

Stays quiet when the current stays within a rated injection current, when the diode takes less than 10 µA, and when it
takes nothing at the usual values and less than 100 µA in the worst corner: that is the leakage of junctions that block.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_amps, format_volts

NAME = "clamp-current"
OUTCOME = Outcome.DAMAGE
SOURCES = (
    "injected-current ratings of the receiver's data sheet",
    "1 mA where the maker rates none: common practice, no standard",
)

QUIET_AMPS = 10e-6
STIFF_AMPS = 5e-3
# What is nothing at the usual values and this little in the worst corner flows through junctions that block [A].
LEAKING_AMPS, LEAKAGE_AMPS = 1e-6, 100e-6
UNRATED_AMPS = 1e-3


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing that leans on a clamp diode."""
    for index, solved in enumerate(case.crossings):
        receive = solved.crossing.receiver.receive
        if receive is None or not receive.clamp_high:
            continue
        states = [state for state in solved.states.values() if state.solved and state.rating_margin is not None]
        if not states:
            continue
        worst = max(states, key=lambda state: state.clamp_amps.high)
        amps = worst.clamp_amps
        if (
            worst.rating_margin is None
            or worst.rating_margin.spread.low >= 0
            or not QUIET_AMPS <= amps.high < STIFF_AMPS
            or (amps.nominal < LEAKING_AMPS and amps.high < LEAKAGE_AMPS)
        ):
            continue
        limit = receive.injection_amps
        text = (
            f"{solved.crossing.target} would rise to {format_volts(worst.open_volts.nominal)} (rating {format_volts(worst.rating_margin.limit)}); its clamp diode holds it "
            f"and takes {format_amps(amps.nominal)}, {format_amps(amps.high)} at worst, from {solved.crossing.source}"
        )
        if limit is not None:
            if amps.high <= limit * (1 + 1e-9):
                continue
            outcome = Outcome.DAMAGE if amps.nominal > limit else Outcome.MARGINAL
            text += f"; the maker allows {format_amps(limit)}."
        elif amps.nominal > UNRATED_AMPS:
            outcome = Outcome.DAMAGE
            text += "; no injection current is known for this part, and above 1 mA is not defensible (common practice)."
        else:
            outcome = Outcome.MARGINAL
            text += "; no injection current is known for this part, below 1 mA it usually survives (common practice)."
        yield solved.finding(
            index,
            NAME,
            outcome,
            text,
            cause=f"over {solved.crossing.receiver.part}.{solved.crossing.receiver.number} {solved.crossing.driver_rail}",
        )
