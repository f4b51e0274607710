"""A transistor of a shifter exceeds a voltage rating.

Why: gates of small MOSFETs break down at 8 V to 20 V, base-emitter junctions in reverse at 5 V to 6 V; both are easily
exceeded where 12 V or 24 V meet logic.

What to do: take a part with a higher rating, or divide or clamp the voltage at the terminal.

Speaks when the solved gate-source, drain-source, emitter-base or collector-emitter voltage passes its rating: damage at
the usual values, marginal at a corner.

Stays quiet when all voltages keep within the ratings at every corner.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_volts

NAME = "junction-rating"
OUTCOME = Outcome.DAMAGE
SOURCES = ("absolute maximum ratings of the transistor's data sheet",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per rating exceeded."""
    done: set[tuple[str, str]] = set()
    for index, solved in enumerate(case.crossings):
        for state in solved.states.values():
            for stress in state.stresses:
                if (
                    not state.solved
                    or stress.volts.high <= stress.limit_volts + 1e-6
                    or (stress.part, stress.what) in done
                ):
                    continue
                done.add((stress.part, stress.what))
                outcome = Outcome.DAMAGE if stress.volts.nominal > stress.limit_volts else Outcome.MARGINAL
                text = f"{stress.part} bears {format_volts(stress.limit_volts)} of {stress.what} and gets {format_volts(stress.volts.nominal)}, {format_volts(stress.volts.high)} at worst."
                yield solved.finding(
                    index,
                    NAME,
                    outcome,
                    text,
                    part=stress.part,
                    remedy=f"Take a part rated above {format_volts(stress.volts.high)} for {stress.what}, or limit the voltage at its terminal.",
                    cause=f"stress {stress.part} {stress.what}",
                )
