"""A driver must sink more current than it is rated for.

Why: the pull-ups of all sides of a line add up in the one output that pulls it low. Above its rated current its low level
is no longer guaranteed, and far above it the output is destroyed.

What to do: larger pull-ups, fewer of them in parallel, or a stronger driver.

Speaks when the solved current into a low output passes the current at which its low level is guaranteed (marginal), or
its absolute maximum (damage).

Stays quiet when the current keeps within the rating at every corner, when no rating is known, and up to the absolute
maximum where the low only turns a switch transistor on or off.
"""

from collections.abc import Iterator
from dataclasses import replace

from levelcrossing.model import Basis, CaseFile, Finding, Outcome

NAME = "sink-current"
OUTCOME = Outcome.DAMAGE
SOURCES = (
    "IOL and absolute maximum output current of the driver's data sheet",
    "UM10204 table 10: 3 mA for I2C outputs",
)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per driver over its current."""
    done: set[tuple[str, str]] = set()
    for index, solved in enumerate(case.crossings):
        pin = solved.crossing.stage_driver or solved.crossing.driver
        state = solved.states.get("low")
        if pin is None or pin.drive is None or state is None or not state.solved or (pin.part, pin.number) in done:
            continue
        amps = state.driver_amps
        rated, most = pin.drive.rated_low_amps, pin.drive.limit_amps
        what_rated = "its low level is guaranteed up to"
        line = case.line_rates.get(pin.net)
        if (
            line is not None
            and line.sink_amps is not None
            and (rated is None or rated < line.sink_amps or pin.drive.basis is Basis.ASSUMED)
        ):
            # What its bus asks of every part; data sheets may state the low level at less.
            rated, what_rated = line.sink_amps, "its bus asks every driver to sink"
        if most is not None and amps.high > most * (1 + 1e-9):
            outcome, limit, what = (
                Outcome.DAMAGE if amps.nominal > most else Outcome.MARGINAL,
                most,
                "its absolute maximum is",
            )
        elif rated is not None and not solved.crossing.to_switch and amps.high > rated * (1 + 1e-9):
            outcome, limit, what = Outcome.MARGINAL, rated, what_rated
        else:
            continue
        done.add((pin.part, pin.number))
        text = f"{pin.label} must sink {amps.nominal * 1e3:.2g} mA, {amps.high * 1e3:.2g} mA at worst, to hold {solved.crossing.target} low; {what} {limit * 1e3:.2g} mA."
        found = solved.finding(
            index,
            NAME,
            outcome,
            text,
            remedy="Use larger pull-ups on this line, or a driver rated for the current.",
            cause=f"sink {pin.part}.{pin.number}",
        )
        # It is the driver that suffers.
        yield replace(found, part=pin.part, pin=pin.number, net=pin.net)
