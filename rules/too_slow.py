"""A crossing is too slow for what it must carry.

Why: edges through kilohms and picofarads take their time; a bit that is over before the level is reached never arrives.

What to do: smaller resistors, a stronger pull-up, less capacitance, or another shifter (a buffer or a translator).

Speaks when the rate that the settings or the bus ask for exceeds what the solved circuit is good for: malfunction at the
usual values, marginal when only the slow corner fails; and when the 30-70 % rise of an I2C line exceeds the limit of its
mode.

Stays quiet when nothing tells the rate, and when the slow corner still carries it.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_si

NAME = "too-slow"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("UM10204 table 11 (rise times, rates)", "the rate that the settings state", "UART rates: common practice")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing that cannot carry its rate."""
    for index, solved in enumerate(case.crossings):
        speed = solved.speed
        if speed is None or speed.needed_bit_s is None:
            continue
        rise, most = speed.rise_30_70_s, speed.rise_30_70_max_s
        if rise is not None and most is not None and rise.high > most * (1 + 1e-9):
            text = (
                f"The line from {solved.crossing.source} to {solved.crossing.target} rises from 30 % to 70 % in {format_si(rise.nominal, 's', 2)}, "
                f"{format_si(rise.high, 's', 2)} at worst, into {format_si(speed.load_farads, 'F', 2)}; its bus allows {format_si(most, 's', 2)} ({speed.needed_why})."
            )
            outcome = Outcome.MALFUNCTION if rise.nominal > most else Outcome.MARGINAL
            yield solved.finding(index, NAME, outcome, text, remedy="Use a smaller pull-up, or shorten the line.")
            continue
        if speed.usable_bit_s >= speed.needed_bit_s * (1 - 1e-9):
            continue
        usual = speed.nominal_bit_s < speed.needed_bit_s * (1 - 1e-9)
        text = (
            f"{solved.crossing.source} to {solved.crossing.target} is good for {format_si(speed.usable_bit_s, 'bit/s', 2)} into "
            f"{format_si(speed.load_farads, 'F', 2)} ({format_si(speed.nominal_bit_s, 'bit/s', 2)} at the usual values), limited by {speed.limit}; "
            f"it must carry {format_si(speed.needed_bit_s, 'bit/s', 2)}: {speed.needed_why}."
        )
        yield solved.finding(
            index,
            NAME,
            Outcome.MALFUNCTION if usual else Outcome.MARGINAL,
            text,
            remedy=f"Shorten {speed.limit.removeprefix('the ')}: smaller resistors or a buffer; `levelcrossing size` works one out.",
        )
