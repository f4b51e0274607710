"""A live signal feeds a part whose supply is off.

Why: through its clamp diodes the part draws its supply from the signal: it half works, keeps a reset from happening, lets
its rail float at a volt or two, and the current may exceed what driver and diode bear.

What to do: a part with partial power-down protection (Ioff), a series resistor large enough, an open drain pulled up to
the supply that goes off, or switch both supplies together.

Speaks when the two supplies can be up without each other and the solved current into the dead rail exceeds 1 mA (marginal)
or the rated injection current (damage), or when a pin without protection exceeds its rating while unpowered.

Stays quiet when one supply is made from the other, when the part is specified for partial power-down, and when less than
1 mA flows.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_si

NAME = "unpowered-path"
OUTCOME = Outcome.DAMAGE
SOURCES = (
    "Ioff and injected-current rows of the parts' data sheets",
    "1 mA where nothing is rated: common practice, no standard",
)
UNRATED_AMPS = 1e-3


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing that back-feeds a dead rail."""
    for index, solved in enumerate(case.crossings):
        receive = solved.crossing.receiver.receive
        if not solved.off_states or receive is None:
            continue
        for off in solved.off_states:
            amps = off.into_rail_amps
            receiver_off = off.case.startswith("receiver")
            if receiver_off and receive.off_tolerant:
                continue
            if off.case == "receiver-off-floating" or amps.nominal < UNRATED_AMPS:
                continue
            rated = receive.injection_amps if receiver_off else None
            outcome = Outcome.DAMAGE if rated is not None and amps.nominal > rated else Outcome.MARGINAL
            floating = next((other for other in solved.off_states if other.case == "receiver-off-floating"), None)
            lifted = ""
            if (
                receiver_off
                and floating is not None
                and floating.lifted_volts is not None
                and floating.lifted_volts.nominal > 0.5
            ):
                lifted = f"; left floating, {off.dead_rail} rises to about {floating.lifted_volts.nominal:.1f} V over a 10 kΩ load"
            text = f"With {off.dead_rail} off, {format_si(amps.nominal, 'A', 2)} flow from {off.path} into the dead supply{lifted}."
            yield solved.finding(
                index, NAME, outcome, text, condition=f"{off.dead_rail} can be off while {solved.crossing.driver_rail if receiver_off else solved.crossing.receiver_rail} is on",
                remedy="Use a part specified for partial power-down (Ioff), enlarge the series resistance, or switch both supplies together.", cause=f"off {off.dead_rail} {solved.crossing.receiver.part}",
            )  # fmt: skip
            break
