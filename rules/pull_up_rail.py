"""A pull-up goes to the wrong supply.

Why: while nothing drives the line (at reset, between bytes, with an open drain) the pull-up sets the level, so its supply
must be the one the receivers work from.

What to do: tie the pull-up to the supply of the lowest receiver on the line, or put a shifter between the parts.

Speaks when a rail that reaches a receiver through a resistor exceeds the receiver's rating or leans on its clamp diode, or
leaves it short of VIH.

Stays quiet when every receiver on the line bears and reads the pull-up's level.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_volts

NAME = "pull-up-rail"
OUTCOME = Outcome.DAMAGE
SOURCES = (
    "UM10204 section 7.1 (pull-ups belong to the bus supply)",
    "the receiver's ratings, as named with the finding",
)
EXPLAINS = ("input-overvoltage", "clamp-current", "high-not-reached", "margin-thin")

QUIET_AMPS = 10e-6


def covers(case: CaseFile, finding: Finding, other: Finding) -> bool:
    """Stand for what the pull-up brings about, not for what a push-pull output does on the same line."""
    if other.crossing is None:
        return True
    crossing = case.crossings[other.crossing].crossing
    pin = crossing.stage_driver or crossing.driver
    return pin is None or (pin.drive is not None and pin.drive.style == "open-drain")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per pull-up and receiver that do not go together."""
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        state = solved.states.get("released")
        if crossing.driver is not None or crossing.island < 0 or state is None or not state.solved or not crossing.link:
            continue
        resistor, rail = crossing.link[0], crossing.driver_rail
        receive = crossing.receiver.receive
        over = state.rating_margin is not None and state.rating_margin.spread.nominal < 0
        if (
            over
            and state.rating_margin is not None
            and not (receive is not None and receive.clamp_high and state.clamp_amps.high < QUIET_AMPS)
        ):
            rated = receive.injection_amps if receive is not None else None
            if rated is not None and state.clamp_amps.high <= rated:
                continue
            text = f"{resistor} pulls {crossing.target} to {rail}: {format_volts(state.open_volts.nominal)} where {format_volts(state.rating_margin.limit)} is the limit."
            better = f" Tie {resistor} to {crossing.receiver_rail} instead of {rail}." if crossing.receiver_rail else ""
            outcome = Outcome.MARGINAL
            if receive is not None and (not receive.clamp_high or state.clamp_amps.nominal > 1e-3):
                outcome = Outcome.DAMAGE
            yield solved.finding(
                index,
                NAME,
                outcome,
                text,
                remedy=better.strip(),
                cause=f"{resistor} {rail} {crossing.receiver.part}.{crossing.receiver.number}",
            )
        elif state.high_margin is not None and state.high_margin.spread.low < -1e-6:
            text = (
                f"{resistor} pulls {crossing.target} only to {rail}, {format_volts(state.receiver_volts.nominal)}; it reads a high from "
                f"{format_volts(solved.vih.nominal if solved.vih else state.high_margin.limit)} up ({format_volts(state.high_margin.at)} against {format_volts(state.high_margin.limit)} at worst)."
            )
            outcome = Outcome.MALFUNCTION if state.high_margin.spread.nominal < -1e-6 else Outcome.MARGINAL
            better = (
                f"Tie {resistor} to {crossing.receiver_rail} if every part on the line bears it; otherwise put a shifter between the supplies."
                if crossing.receiver_rail
                else ""
            )
            yield solved.finding(
                index,
                NAME,
                outcome,
                text,
                remedy=better,
                level=True,
                cause=f"{resistor} {rail} {crossing.receiver.part}.{crossing.receiver.number}",
            )
