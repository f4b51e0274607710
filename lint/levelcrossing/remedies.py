"""What to change: a proposal for a crossing in trouble, with computed values."""

from __future__ import annotations

from levelcrossing.model import Crossing, Level, SolvedCrossing, Spread
from levelcrossing.units import E24, format_si, format_volts

# Total resistance from which a divider's values are looked for [ohm]: a few kilohms load a CMOS output by a milliampere
# and still charge 15 pF within a microsecond (common practice).
DIVIDER_OHMS = (1_000.0, 4_700.0)


def divider(high: Spread, vih: float, vmax: float, tolerance: float = 0.01) -> tuple[float, float, float] | None:
    """Find E24 values that bring a level within a window at every corner.

    Parameters
    ----------
    high : Spread
        Unloaded high level of the driver [V].
    vih, vmax : float
        Least and greatest voltage wanted at the receiver [V].
    tolerance : float
        Of each resistor [1].

    Returns
    -------
    tuple of (float, float, float) or None
        Series resistor [ohm], resistor to ground [ohm], usual level [V]; the pair whose usual level lies nearest the
        middle of the window, None when none fits.
    """
    best: tuple[float, tuple[float, float, float]] | None = None
    middle = (max(vih, 0.75 * vmax) + vmax) / 2
    for decade in (100.0, 1_000.0):
        for first in E24:
            top = first * decade
            if not DIVIDER_OHMS[0] * 0.6 <= top <= DIVIDER_OHMS[1]:
                continue
            for scale in (100.0, 1_000.0, 10_000.0):
                for second in E24:
                    bottom = second * scale
                    least = high.low * (bottom * (1 - tolerance)) / (bottom * (1 - tolerance) + top * (1 + tolerance))
                    most = high.high * (bottom * (1 + tolerance)) / (bottom * (1 + tolerance) + top * (1 - tolerance))
                    usual = high.nominal * bottom / (bottom + top)
                    if least >= vih and most <= vmax:
                        distance = abs(usual - middle) + top * 1e-7
                        if best is None or distance < best[0]:
                            best = (distance, (top, bottom, usual))
    return best[1] if best else None


def propose(solved: SolvedCrossing) -> str:
    """Return a proposal for a crossing, empty when its supplies are not known.

    Parameters
    ----------
    solved : SolvedCrossing

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
        limits = _window(receiver.receive.vih, receiver.receive.vmax, receiver.supply_volts)
        found = divider(driver.supply_volts, *limits)
        by_values = ""
        if found is not None:
            top, bottom, usual = found
            by_values = f"a divider of {format_si(top, 'Ω')} in series and {format_si(bottom, 'Ω')} to ground ({format_volts(usual)}), or "
        return f"Use {by_values}a buffer with inputs tolerant of {format_volts(driver.supply_volts.high)} on {rail} (74LVC1G17 class)."
    if 4.4 < receiver.supply_volts.nominal < 5.6:
        return f"Put a buffer with TTL-level inputs on {rail} before it (74AHCT1G125 class reads a high from 2.0 V)."
    return f"Use a dual-supply translator (74LVC1T45 class) between {crossing.driver_rail or 'the driver’s supply'} and {rail}."


def _window(vih: Level, vmax: Level, supply: Spread) -> tuple[float, float]:
    """Return the window that holds at both extremes of the receiver's supply [V]."""
    return max(vih.at(supply.low), vih.at(supply.high)), min(vmax.at(supply.low), vmax.at(supply.high))


def _pair(crossing: Crossing) -> str:
    rails = [rail for rail in (crossing.driver_rail, crossing.receiver_rail) if rail]
    between = " and ".join(rails) if len(rails) == 2 else "the two supplies"
    return f"The line is used both ways: put a MOSFET pair (BSS138 class, gate and source side on the lower supply, 4.7 kΩ on each side) or a two-way translator between {between}."
