"""The voltage ladder of one crossing as plain rows: what is sent, what arrives and what the receiver takes.

One scale for all rows. ``terminal.py`` draws it with characters, ``page.py`` as a picture; both use the same figures.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from levelcrossing.model import SolvedCrossing as Solved
from levelcrossing.model import Spread, StateResult
from levelcrossing.reports.phrases import volts

# Beyond a limit by less than this is rounding [V].
_HAIR_VOLTS = 5e-3

# A clamp diode that takes less does not act on the level [A].
_CLAMP_AMPS = 10e-6

COMFORTABLE_VOLTS = 0.2
"""A margin above this is not worth a remark under a ladder [V]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Bar:
    """One range of voltages.

    Parameters
    ----------
    low, high : float
        Ends [V].
    over : bool
        It passes what the receiver bears, at some corner.
    """

    low: float
    high: float
    over: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One line of bars: who, the bars from low to high, and its figures in words."""

    label: str
    who: str
    bars: tuple[Bar, ...]
    figures: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Zone:
    """What the receiver makes of a range of voltages.

    ``kind`` is ``low`` (read as low), ``between`` (not guaranteed either way), ``high`` (read as high) or ``over``
    (beyond the absolute maximum).
    """

    low: float
    high: float
    kind: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Ladder:
    """A whole ladder.

    Parameters
    ----------
    bottom, top : float
        Ends of the scale [V].
    step : float
        Distance of the marks [V].
    rows : tuple of Row
        Sent and arriving levels.
    zones : tuple of Zone
        The receiver's view, from bottom to top without gaps.
    reader : str
        Name of the receiver.
    limits : tuple of (str, float)
        ``VIL``, ``VIH`` and ``max`` [V] at their least favourable corner, rising; those that are known.
    notes : tuple of str
        Margins that are gone or thin, in words.
    source : str
        What drives when no pin does, else empty.
    """

    bottom: float
    top: float
    step: float
    rows: tuple[Row, ...]
    zones: tuple[Zone, ...]
    reader: str
    limits: tuple[tuple[str, float], ...]
    notes: tuple[str, ...]
    source: str = ""

    def marks(self) -> tuple[float, ...]:
        """Return the voltages that the scale names."""
        first = math.ceil(self.bottom / self.step - 1e-9)
        last = math.floor(self.top / self.step + 1e-9)
        return tuple(round(index * self.step, 6) for index in range(first, last + 1))


def ladder(solved: Solved) -> Ladder | None:
    """Return the ladder of a crossing, or None when nothing could be solved or no limit is known.

    Parameters
    ----------
    solved : SolvedCrossing

    Returns
    -------
    Ladder or None
    """
    states = [state for state in solved.states.values() if state.solved]
    if not states or (solved.vih is None and solved.vil is None and solved.vmax is None):
        return None
    crossing = solved.crossing
    sent = _bars(states, lambda state: state.driver_volts)
    arrives = _bars(states, lambda state: state.open_volts, _passes)
    if not arrives:
        return None
    vil = solved.vil.low if solved.vil else None
    vih = solved.vih.high if solved.vih else None
    vmax = solved.vmax.low if solved.vmax else None
    figures = [bar.high for bar in (*sent, *arrives)] + [value for value in (vil, vih, vmax) if value is not None]
    lows = [bar.low for bar in (*sent, *arrives)]
    step = _step(max(figures) - min(0.0, *lows))
    top = step * math.ceil((max(figures) + 0.15 * step) / step)
    bottom = min(0.0, step * math.floor((min(lows) + 0.05 * step) / step))
    if crossing.driver is None:
        source = f"{crossing.driver_rail} through {crossing.link[0]}" if crossing.link else crossing.driver_rail
        sent = ()
        source_row: tuple[Row, ...] = ()
        label = source
    else:
        source = f"{crossing.driver.part}.{crossing.driver.number}"
        source_row = (Row(label="sent", who=source, bars=sent, figures=_figures(sent)),) if sent else ()
        label = ""
    reader = f"{crossing.receiver.part}.{crossing.receiver.number}"
    arrival = Row(label="arrives", who=reader, bars=arrives, figures=_figures(arrives))
    notes = _notes(solved)
    limits = [(name, value) for name, value in (("VIL", vil), ("VIH", vih), ("max", vmax)) if value is not None]
    return Ladder(
        bottom=bottom,
        top=top,
        step=step,
        rows=(*source_row, arrival),
        zones=_zones(bottom, top, vil, vih, vmax),
        reader=reader,
        limits=tuple(sorted(limits, key=lambda limit: limit[1])),
        notes=notes,
        source=label,
    )


def _passes(state: StateResult) -> bool:
    margin = state.rating_margin
    return margin is not None and margin.spread.low < -_HAIR_VOLTS


def _bars(
    states: Sequence[StateResult],
    pick: Callable[[StateResult], Spread],
    over: Callable[[StateResult], bool] = lambda state: False,
) -> tuple[Bar, ...]:
    """Return the ranges of all states from low to high; ranges that overlap are one."""
    bars: list[Bar] = []
    found = [(pick(state), over(state)) for state in states if not state.floating]
    finite = [(spread, passes) for spread, passes in found if math.isfinite(spread.low) and math.isfinite(spread.high)]
    for spread, passes in sorted(finite, key=lambda pair: (pair[0].low, pair[0].high)):
        if bars and spread.low <= bars[-1].high:
            last = bars.pop()
            bars.append(Bar(low=last.low, high=max(last.high, spread.high), over=last.over or passes))
        else:
            bars.append(Bar(low=spread.low, high=spread.high, over=passes))
    return tuple(bars)


def _figures(bars: tuple[Bar, ...]) -> str:
    ends = [(volts(bar.low), volts(bar.high)) for bar in bars]
    return ", ".join(low if low == high else f"{low}..{high}" for low, high in ends) + " V"


def _step(reach: float) -> float:
    for step in (0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0):
        if reach / step <= 8:
            return step
    return 10.0 ** math.ceil(math.log10(reach / 8))


def _zones(bottom: float, top: float, vil: float | None, vih: float | None, vmax: float | None) -> tuple[Zone, ...]:
    over = vmax if vmax is not None else top
    zones = []
    low_end = min(vil if vil is not None else bottom, over)
    high_start = min(max(vih if vih is not None else over, low_end), over)
    for low, high, kind in (
        (bottom, low_end, "low"),
        (low_end, high_start, "between"),
        (high_start, over, "high"),
        (over, top, "over"),
    ):
        if high - low > 1e-9:
            zones.append(Zone(low=low, high=high, kind=kind))
    return tuple(zones)


def _notes(solved: Solved) -> tuple[str, ...]:
    """Say which margins are gone or thin, in the solver's own figures.

    A supply moves both what is sent and what is taken, so the ends of two bars need not belong to one corner; the margins
    do.
    """
    notes = []
    for name, state in sorted(solved.states.items()):
        if not state.solved:
            continue
        lead = "" if solved.crossing.driver is None else f"driver {name}: "
        if state.floating:
            notes.append(f"{lead}nothing sets the voltage at the receiver")
            continue
        for margin, lost, spare in (
            (state.rating_margin, "above what the receiver bears", "below what the receiver bears"),
            (state.low_rating_margin, "below what the receiver bears", "above the least the receiver bears"),
            (state.high_margin, "short of a guaranteed high", "above VIH"),
            (state.low_margin, "above a guaranteed low", "below VIL"),
        ):
            if margin is None or margin.spread.low >= COMFORTABLE_VOLTS:
                continue
            short = margin.spread.low < -_HAIR_VOLTS
            size = f"{volts(abs(margin.spread.low))} V {lost if short else spare}"
            corner = f" ({margin.worst_corner})" if margin.worst_corner else ""
            if margin is state.rating_margin and state.clamp_amps.high > _CLAMP_AMPS:
                corner += ", its own clamp diode left aside"
            notes.append(f"{lead}{'' if short else 'only '}{size}{corner}")
    return tuple(notes)
