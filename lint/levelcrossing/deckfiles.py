"""SPICE decks of all solved crossings, for anyone who checks with a simulator.

One file per crossing and state for the operating point, and one per timed crossing for its edges.
"""

from __future__ import annotations

from collections.abc import Mapping

from levelcrossing.bitrate import TimingJob
from levelcrossing.decks import Step, deck
from levelcrossing.model import CaseFile, SolvedCrossing, Speed
from levelcrossing.network import Value
from levelcrossing.solutions import network_of, planned_states
from levelcrossing.solve import solve_dc
from levelcrossing.speeds import timing_job
from levelcrossing.units import format_si

# Steps per edge that the simulator is held to.
STEPS_PER_EDGE = 60
# How many times its slowest edge or delay a level rests: junctions close slowly.
RESTS = 100


def deck_files(case: CaseFile) -> dict[str, str]:
    """Return the decks at nominal values.

    Parameters
    ----------
    case : CaseFile

    Returns
    -------
    dict
        File name to text, in the order of the crossings. The number in a name is that of the crossing in the JSON form;
        the name ends in the driver's state (``high``, ``low``, ``released``) or in ``edges``.
    """
    files: dict[str, str] = {}
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        driver = f"{crossing.driver.part}.{crossing.driver.number}" if crossing.driver else crossing.driver_rail
        stem = f"{index:03d}_{driver}_to_{crossing.receiver.part}.{crossing.receiver.number}"
        ends = (f"from {crossing.source}", f"to {crossing.target}")
        for state in planned_states(crossing):
            if state not in solved.states or not solved.states[state].solved:
                continue
            network = network_of(crossing, case.islands, case.rails, state)
            remarks = (*ends, f"driver {state}, every value nominal")
            files[_safe(f"{stem}_{state}") + ".cir"] = deck(network, f"crossing {index}, {state}", remarks=remarks)
        if solved.speed is not None:
            text = _edges(case, solved, solved.speed, f"crossing {index}, edges", ends)
            if text:
                files[_safe(f"{stem}_edges") + ".cir"] = text
    return files


def _edges(case: CaseFile, solved: SolvedCrossing, speed: Speed, title: str, ends: tuple[str, str]) -> str:
    """Return a deck in which the driver goes high, rests, and goes low again, with its edges measured."""
    drains = speed.line is not None and speed.line.open_drain
    made = timing_job(solved.crossing, case.islands, case.rails, case.settings, drains=drains)
    if made is None:
        return ""
    job = made[0].member(0)
    before, after = _floats(job.low), _floats(job.high)
    low, high = (float(solve_dc(job.network.holding(levels)).volts[job.watch][0]) for levels in (before, after))
    shortest = min(speed.rise_s.nominal, speed.fall_s.nominal)
    half = RESTS * max(
        speed.rise_s.nominal, speed.fall_s.nominal, speed.delay_high_s.nominal, speed.delay_low_s.nominal, job.edge_s
    )
    remarks = (
        *ends,
        f"every value nominal; the driver goes high at 0 and low at {format_si(half, 's')}",
        "the driver's outputs are paths that a gate node opens and closes, resistance as rated",
        f"found here: rise {format_si(speed.rise_s.nominal, 's')}, fall {format_si(speed.fall_s.nominal, 's')} (10 to 90 %),"
        f" VIH after {format_si(speed.delay_high_s.nominal, 's')}, VIL after {format_si(speed.delay_low_s.nominal, 's')}",
    )
    points = {
        node: (
            (0.0, before[node]),
            (job.edge_s, after[node]),
            (half, after[node]),
            (half + job.edge_s, before[node]),
        )
        for node in before
        if before[node] != after[node]
    }
    step = Step(
        before=before,
        after=after,
        until_s=2 * half,
        edge_s=job.edge_s,
        points=points,
        longest_s=max(shortest / STEPS_PER_EDGE, half / 20_000),
    )
    return deck(
        job.network, title, step=step, watch=(job.watch,), remarks=remarks, measures=_measures(job, low, high, half)
    )


def _measures(job: TimingJob, low: float, high: float, half: float) -> list[str]:
    """Return what to measure: the edges of the received level, and the last moment at which it is not valid yet."""
    bottom, swing = min(low, high), abs(high - low)
    ten, ninety = bottom + 0.1 * swing, bottom + 0.9 * swing
    rises_at, falls_at = (0.0, half) if high > low else (half, 0.0)
    vih, vil = float(job.vih_volts), float(job.vil_volts)

    def window(start: float) -> str:
        return f"from={start:.9g} to={start + half:.9g}"

    def edge(name: str, first: float, last: float, way: str, start: float) -> str:
        return (
            f".meas tran {name} trig {{watch}} val={first:.9g} {way}=1 td={start:.9g}"
            f" targ {{watch}} val={last:.9g} {way}=1 td={start:.9g}"
        )

    def valid(name: str, level: float, way: str, start: float) -> list[str]:
        return [
            f".meas tran at_{name} when {{watch}}={level:.9g} {way}=last {window(start)}",
            f".meas tran delay_{name} param='at_{name}-{start:.9g}'",
        ]

    return [
        edge("rise", ten, ninety, "rise", rises_at),
        edge("fall", ninety, ten, "fall", falls_at),
        *valid("vih", vih, "rise", rises_at),
        *valid("vil", vil, "fall", falls_at),
    ]


def _floats(levels: Mapping[str, Value]) -> dict[str, float]:
    return {node: float(volts) for node, volts in levels.items()}


def _safe(name: str) -> str:
    """Return a file name of plain characters: names come from a board, which may be a stranger's."""
    kept = (
        character if character.isascii() and (character.isalnum() or character in "-_.") else "_" for character in name
    )
    return "".join(kept).replace("..", "_")[:120]
