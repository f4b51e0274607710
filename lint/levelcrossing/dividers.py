"""Resistor dividers of preferred values, solved with their driver and receiver before they are proposed."""

from __future__ import annotations

import itertools
from functools import lru_cache

import numpy as np

from levelcrossing import devices
from levelcrossing.bitrate import TimingJob, timings
from levelcrossing.circuits import level_at
from levelcrossing.model import Drive, Level, Receive, Spread
from levelcrossing.network import GROUND, Network
from levelcrossing.solve import solve_dc
from levelcrossing.units import SERIES

# Series resistors of a divider that are tried, the frugal ones first [ohm]: a few kilohms load a CMOS output by a
# milliampere and still charge 15 pF within a microsecond (common practice); a fast line needs less.
DIVIDER_OHMS = ((1_000.0, 4_700.0), (330.0, 1_000.0), (150.0, 330.0))
TOLERANCE = 0.01
ALIKE_VOLTS = 0.03
# What the driver's own pin adds to the circuit of a proposed divider [F].
DRIVER_FARADS = 5e-12
NO_OHMS = Spread(low=0.0, nominal=0.0, high=0.0)


def divider(
    high: Spread,
    vih: float,
    vmax: float,
    *,
    output_ohms: Spread = NO_OHMS,
    tops: tuple[float, float] = DIVIDER_OHMS[0],
    series: str = "E24",
) -> tuple[float, float, float] | None:
    """Find preferred values that bring a level within a window at every corner.

    Parameters
    ----------
    high : Spread
        Unloaded high level of the driver [V].
    vih, vmax : float
        Least and greatest voltage wanted at the receiver [V].
    output_ohms : Spread
        Output resistance of the driver [ohm].
    tops : tuple of (float, float)
        Least and greatest series resistor [ohm].
    series : str
        ``E24`` or ``E96`` (IEC 60063).

    Returns
    -------
    tuple of (float, float, float) or None
        Series resistor [ohm], resistor to ground [ohm], usual level [V]; the pair whose usual level lies near the
        middle of the window, None when none fits. Resistors are taken at 1 %.
    """
    middle = (max(vih, 0.75 * vmax) + vmax) / 2
    steps = np.array(SERIES[series])
    first = np.unique(np.concatenate([steps * scale for scale in (10.0, 100.0, 1_000.0)]))
    first = first[(first >= tops[0] * 0.6) & (first <= tops[1])]
    second = np.unique(np.concatenate([steps * scale for scale in (100.0, 1_000.0, 10_000.0)]))
    top, bottom = (grid.ravel() for grid in np.meshgrid(first, second, indexing="ij"))
    over, under = 1 + TOLERANCE, 1 - TOLERANCE
    least = high.low * bottom * under / (bottom * under + top * over + output_ohms.high)
    most = high.high * bottom * over / (bottom * over + top * under + output_ohms.low)
    usual = high.nominal * bottom / (bottom + top + output_ohms.nominal)
    fits = np.flatnonzero((least >= vih) & (most <= vmax))
    if not fits.size:
        return None
    distance = np.abs(usual[fits] - middle)
    # Of pairs that are as good, the one whose resistance lies amid the range.
    alike = fits[distance <= distance.min() + ALIKE_VOLTS]
    best = alike[np.argmin(np.abs(np.log(top[alike] / np.sqrt(tops[0] * tops[1]))))]
    return float(top[best]), float(bottom[best]), float(usual[best])


@lru_cache(maxsize=512)
def solved_divider(
    supply: Spread,
    drive: Drive,
    rail: Spread,
    receive: Receive,
    needed_bit_s: float | None,
    stray_farads: float = 10e-12,
) -> tuple[float, float, float] | None:
    """Find a divider between two pins and solve it: levels at every corner, and the rate when one is needed.

    Parameters
    ----------
    supply, rail : Spread
        Supplies of the driver and of the receiver [V].
    drive : Drive
    receive : Receive
    needed_bit_s : float or None
        Rate that the line must carry [bit/s].
    stray_farads : float
        Of each net [F].

    Returns
    -------
    tuple of (float, float, float) or None
        As :func:`divider`; None when no preferred values pass.
    """
    window = _window(receive.vih, receive.vmax, rail)
    unloaded = Spread(
        low=float(drive.high.at(supply.low)),
        nominal=float(drive.high.at(supply.nominal)),
        high=float(drive.high.at(supply.high)),
    )
    for tops in DIVIDER_OHMS:
        found = divider(unloaded, *window, output_ohms=drive.high_ohms, tops=tops)
        if found is not None and _passes(found[0], found[1], supply, drive, rail, receive, needed_bit_s, stray_farads):
            return found
    return None


def _passes(
    top: float,
    bottom: float,
    supply: Spread,
    drive: Drive,
    rail: Spread,
    receive: Receive,
    needed_bit_s: float | None,
    stray_farads: float,
) -> bool:
    """Solve a divider with its driver and receiver at every corner."""
    ends = [
        (supply.low, supply.high),
        (rail.low, rail.high),
        (0, 2),
        (top * (1 - TOLERANCE), top * (1 + TOLERANCE)),
        (bottom * (1 - TOLERANCE), bottom * (1 + TOLERANCE)),
    ]
    feed, reads, strength, series, ground = np.array(list(itertools.product(*ends))).T
    strong = strength == 0
    high_ohms = np.where(strong, drive.high_ohms.low, drive.high_ohms.high)
    low_ohms = np.where(strong, drive.low_ohms.low, drive.low_ohms.high)
    load = receive.capacitance_farads.high + stray_farads
    network = Network(
        branches=(
            devices.gated("low output", "out", GROUND, low_ohms),
            devices.gated("high output", "out", "level inside the driver", high_ohms),
            devices.resistor("series", "out", "in", series),
            devices.resistor("to ground", "in", GROUND, ground),
            devices.capacitor("driver", "out", GROUND, DRIVER_FARADS + stray_farads),
            devices.capacitor("load", "in", GROUND, load),
        ),
        fixed={"level inside the driver": level_at(drive.high, feed)},
    )
    gates = [devices.gate_of(label) for label in ("low output", "high output")]
    on, off = devices.GATE_ON_VOLTS, devices.GATE_OFF_VOLTS
    low, high = dict(zip(gates, (on, off), strict=True)), dict(zip(gates, (off, on), strict=True))
    vih, vil = level_at(receive.vih, reads), level_at(receive.vil, reads)
    sent, rests = (solve_dc(network.holding(levels)) for levels in (high, low))
    if not (np.all(sent.solved) and np.all(rests.solved)):
        return False
    arrives, stays = sent.volts["in"], rests.volts["in"]
    if np.any(arrives < vih) or np.any(arrives > level_at(receive.vmax, reads)) or np.any(stays > vil):
        return False
    if needed_bit_s is None:
        return True
    job = TimingJob(network=network.holding(low), low=low, high=high, watch="in", vih_volts=vih, vil_volts=vil)
    (timing,) = timings([job], confirm=False)
    return bool(np.all(timing.solved)) and float(timing.bit_s.max()) * needed_bit_s <= 1.0


def _window(vih: Level, vmax: Level, supply: Spread) -> tuple[float, float]:
    """Return the window that holds at both extremes of the receiver's supply [V]."""
    return max(vih.at(supply.low), vih.at(supply.high)), min(vmax.at(supply.low), vmax.at(supply.high))
