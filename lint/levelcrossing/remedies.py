"""What to change: a proposal for a crossing in trouble, with computed values."""

from __future__ import annotations

from levelcrossing.dividers import solved_divider
from levelcrossing.model import Crossing, LineRate, SolvedCrossing
from levelcrossing.units import format_si, format_volts


def propose(solved: SolvedCrossing, line: LineRate | None = None, stray_farads: float = 10e-12) -> str:
    """Return a proposal for a crossing, empty when its supplies are not known.

    Parameters
    ----------
    solved : SolvedCrossing
    line : LineRate, optional
        What its net must carry.
    stray_farads : float
        Of each net [F].

    Returns
    -------
    str
        One or two sentences with values.
    """
    crossing = solved.crossing
    driver = crossing.stage_driver or crossing.driver
    receiver = crossing.receiver
    if receiver.supply_volts is None or receiver.receive is None:
        return ""
    rail = crossing.receiver_rail or f"{receiver.supply_volts.nominal:g} V"
    if driver is None:
        return f"Tie the pull-up to {rail}, or put a shifter between the supplies."
    if driver.supply_volts is None or driver.drive is None:
        return ""
    down = driver.supply_volts.nominal > receiver.supply_volts.nominal
    if driver.drive.style == "open-drain":
        return f"{crossing.source} only pulls low: pull the line up to {rail} (4.7 kΩ) and to no other supply."
    if crossing.two_way:
        return _pair(crossing)
    if down:
        needed = None if line is None else line.needed_bit_s
        found = solved_divider(
            driver.supply_volts, driver.drive, receiver.supply_volts, receiver.receive, needed, stray_farads
        )
        by_values = ""
        if found is not None:
            top, bottom, usual = found
            by_values = f"a divider of {format_si(top, 'Ω')} in series and {format_si(bottom, 'Ω')} to ground ({format_volts(usual)}), or "
        return f"Use {by_values}a buffer with inputs tolerant of {format_volts(driver.supply_volts.high)} on {rail} (74LVC1G17 class)."
    if 4.4 < receiver.supply_volts.nominal < 5.6:
        return f"Put a buffer with TTL-level inputs on {rail} before it (74AHCT1G125 class reads a high from 2.0 V)."
    return f"Use a dual-supply translator (74LVC1T45 class) between {crossing.driver_rail or 'the driver’s supply'} and {rail}."


def _pair(crossing: Crossing) -> str:
    rails = [rail for rail in (crossing.driver_rail, crossing.receiver_rail) if rail]
    between = " and ".join(rails) if len(rails) == 2 else "the two supplies"
    return f"The line is used both ways: put a MOSFET pair (BSS138 class, gate and source side on the lower supply, 4.7 kΩ on each side) or a two-way translator between {between}."
