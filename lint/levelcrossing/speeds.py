"""How fast each crossing is good for, and how fast it must be.

The circuit is that of the DC solution with its capacitances: pins, transistors, diodes, stray. A driver's two states are
two paths that open and close; an open drain has the lower one only.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from levelcrossing import devices
from levelcrossing.bitrate import Timing, TimingJob, timings
from levelcrossing.circuits import MOST_NODES, Builder, level_at
from levelcrossing.corners import HIGH, LOW, NOMINAL, Codes, Variable
from levelcrossing.model import (
    Crossing,
    Element,
    Island,
    LineRate,
    PinModel,
    Rails,
    Settings,
    SolvedCrossing,
    Speed,
    Spread,
    TranslatorFacts,
)
from levelcrossing.network import GROUND, Network
from levelcrossing.solutions import neighbourhood, with_end
from levelcrossing.units import format_si

Vector = npt.NDArray[np.float64]
HIGH_PATH, LOW_PATH = "high output", "low output"
# By how much more load the sensitivity to it is worked out [F].
MORE_FARADS = 10e-12


def with_speeds(
    solved: Sequence[SolvedCrossing],
    islands: Sequence[Island],
    rails: Rails,
    line_rates: Mapping[str, LineRate],
    settings: Settings,
) -> tuple[SolvedCrossing, ...]:
    """Time every crossing whose levels are reached at the usual values.

    On a bus of open drains every driver only pulls low, whatever its pin could do.

    Parameters
    ----------
    solved : sequence of SolvedCrossing
        With their DC states.
    islands : sequence of Island
    rails : Rails
    line_rates : mapping from net to LineRate
        What each line must carry, where something tells.
    settings : Settings
        Stray capacitance.

    Returns
    -------
    tuple of SolvedCrossing
        In the order given; ``speed`` stays None where nothing can be timed.
    """
    jobs: list[TimingJob] = []
    wanted: list[tuple[int, Island, float]] = []
    seen: dict[tuple[object, ...], int] = {}
    job_of: dict[int, int] = {}
    for index, one in enumerate(solved):
        if not _levels_hold(one):
            continue
        line = line_of(one.crossing, line_rates)
        made = timing_job(one.crossing, islands, rails, settings, drains=line is not None and line.open_drain)
        if made is None:
            continue
        job, island, load = made
        key = _key(job)
        if key not in seen:
            seen[key] = len(jobs)
            jobs.append(job)
        job_of[index] = seen[key]
        wanted.append((index, island, load))
    try:
        found = timings(jobs) if jobs else []
        loaded = _with_more_load(jobs, found)
    except (ValueError, np.linalg.LinAlgError):
        return tuple(solved)
    result = list(solved)
    for index, island, load in wanted:
        speed = _speed(solved[index].crossing, island, found[job_of[index]], load, line_rates)
        if speed is not None:
            speed = replace(speed, loaded_bit_s=loaded.get(job_of[index]))
            result[index] = replace(solved[index], speed=speed)
    return tuple(result)


def _with_more_load(jobs: Sequence[TimingJob], found: Sequence[Timing]) -> dict[int, float]:
    """Return, by the position of a job, the rate at its slowest corner with 10 pF more at the receiver [bit/s]."""
    more = {position: one for position, job in enumerate(jobs) if (one := _loaded(job, found[position])) is not None}
    again = timings(list(more.values()), confirm=False) if more else []
    return {
        position: float(timing.bit_rate[0])
        for position, timing in zip(more, again, strict=True)
        if bool(timing.solved[0])
    }


def _levels_hold(one: SolvedCrossing) -> bool:
    pin = one.crossing.stage_driver or one.crossing.driver
    if pin is None or pin.drive is None or pin.drive.style == "open-source" or one.crossing.island < 0 or one.why:
        return False
    if _accelerated(one):
        return False
    margins = [margin for state in one.states.values() for margin in (state.high_margin, state.low_margin) if margin]
    both = one.high is not None and one.low is not None
    return both and len(one.states) == 2 and all(margin.spread.nominal > 0 for margin in margins)


def _accelerated(one: SolvedCrossing) -> bool:
    """Tell a translator with edge accelerators: its static circuit says nothing of its speed."""
    pin = one.crossing.stage_driver
    weak = pin is not None and pin.drive is not None and pin.drive.low_ohms.nominal >= 500
    passed = any(
        isinstance(element.facts, TranslatorFacts) and element.facts.kind == "auto-pass"
        for element in one.elements
        if element.part in one.crossing.link
    )
    return weak or passed


def line_of(crossing: Crossing, line_rates: Mapping[str, LineRate]) -> LineRate | None:
    """Return what a crossing must carry: the receiver's net counts before the driver's."""
    nets = (crossing.receiver.net, crossing.driver.net if crossing.driver is not None else "")
    return next((line_rates[net] for net in nets if net in line_rates), None)


def timing_job(
    crossing: Crossing, islands: Sequence[Island], rails: Rails, settings: Settings, *, drains: bool
) -> tuple[TimingJob, Island, float] | None:
    """Return the circuit of a crossing with its capacitances and a driver that switches; member 0 has the usual values.

    Parameters
    ----------
    crossing : Crossing
        With a driver that is modelled.
    islands : sequence of Island
    rails : Rails
    settings : Settings
    drains : bool
        Take the driver for an open drain, whatever its pin could do.

    Returns
    -------
    tuple of (TimingJob, Island, float) or None
        The circuit, the island it was made from, and the capacitance on the receiver's net [F]; None when the driver
        does not stand in that circuit or a value is missing.
    """
    pin = crossing.stage_driver or crossing.driver
    assert pin is not None and pin.drive is not None and pin.supply_volts is not None
    island = with_end(islands[crossing.island], crossing)
    if len(island.nets) > MOST_NODES:
        island = neighbourhood(island, crossing)
    builder = Builder(island, rails, pin, "released", with_capacitance=True, stray_farads=settings.stray_farads)
    supply = builder.supply_key(pin)
    reads = builder.supply_key(crossing.receiver)
    output = builder.plan.variable(f"output of {pin.part}.{pin.number}", Spread(low=0, nominal=1, high=2))
    if builder.plan.missing or pin.net not in island.nets:
        return None
    variables = builder.plan.variables
    codes = slow_corners(variables, {key for key in (supply, reads) if key is not None})
    row = next(position for position, variable in enumerate(variables) if variable.key == output)
    network = builder.plan.network(codes)
    drive = pin.drive
    supplies = (
        builder.plan.values(supply, codes) if supply is not None else np.full(codes.shape[1], pin.supply_volts.nominal)
    )
    branches = list(network.branches)
    fixed = dict(network.fixed)
    gates = [LOW_PATH]
    branches.append(devices.gated(LOW_PATH, pin.net, "0", _values(drive.low_ohms, codes[row])))
    if drive.style == "push-pull" and not drains:
        gates.append(HIGH_PATH)
        fixed["level inside the driver"] = level_at(drive.high, supplies)
        branches.append(
            devices.gated(HIGH_PATH, pin.net, "level inside the driver", _values(drive.high_ohms, codes[row]))
        )
    low = {devices.gate_of(LOW_PATH): devices.GATE_ON_VOLTS}
    high = {devices.gate_of(LOW_PATH): devices.GATE_OFF_VOLTS}
    if HIGH_PATH in gates:
        low[devices.gate_of(HIGH_PATH)] = devices.GATE_OFF_VOLTS
        high[devices.gate_of(HIGH_PATH)] = devices.GATE_ON_VOLTS
    for gate, volts in low.items():
        fixed[gate] = volts
    receive = crossing.receiver.receive
    assert receive is not None and crossing.receiver.supply_volts is not None
    at = (
        builder.plan.values(reads, codes)
        if reads is not None
        else np.full(codes.shape[1], crossing.receiver.supply_volts.nominal)
    )
    job = TimingJob(
        network=Network(branches=tuple(branches), fixed=fixed),
        low=low,
        high=high,
        watch=crossing.receiver.net,
        vih_volts=level_at(receive.vih, at),
        vil_volts=level_at(receive.vil, at),
    )
    farads = [
        branch.values["farads"]
        for branch in branches
        if branch.kind == "capacitor" and crossing.receiver.net in branch.nodes
    ]
    load = float(sum(float(np.ravel(value)[0]) for value in farads))
    return job, island, load


def _key(job: TimingJob) -> tuple[object, ...]:
    """Return what makes two circuits the same, names apart."""
    plain, names = job.network.canonical()
    new = {old: name for name, old in names.items()}
    parts: list[object] = [new[job.watch]]
    for branch in plain.branches:
        parts.append((branch.kind, branch.nodes))
        parts += [(name, np.asarray(value, dtype=float).tobytes()) for name, value in sorted(branch.values.items())]
    parts += [(node, np.asarray(value, dtype=float).tobytes()) for node, value in sorted(plain.fixed.items())]
    parts += [np.asarray(job.vih_volts).tobytes(), np.asarray(job.vil_volts).tobytes()]
    return tuple(parts)


def _values(ohms: Spread, codes: Codes) -> Vector:
    return np.array([ohms.low, ohms.nominal, ohms.high])[codes]


def slow_corners(variables: Sequence[Variable], rails: set[str]) -> Codes:
    """Return the corners that matter for time: usual, fast, and slow at each end of the two supplies.

    Slow is: resistances high, gains low, thresholds high. Shape (variables, members); member 0 is nominal.
    """

    def code(variable: Variable, slow: bool) -> int:
        if "gain" in variable.key:
            return LOW if slow else HIGH
        return HIGH if slow else LOW

    columns = [[NOMINAL] * len(variables), [code(variable, False) for variable in variables]]
    for ends in ((LOW, LOW), (LOW, HIGH), (HIGH, LOW), (HIGH, HIGH)):
        by_rail = dict(zip(sorted(rails), ends, strict=False))
        columns.append(
            [
                by_rail.get(
                    variable.key,
                    NOMINAL
                    if variable.unit == "V" and variable.key not in rails and "threshold" not in variable.key
                    else code(variable, True),
                )
                for variable in variables
            ]
        )
    return np.array(columns, dtype=np.int8).T.reshape(len(variables), len(columns))


def _spread(values: Vector) -> Spread:
    finite = values[np.isfinite(values)]
    most = float(values.max())
    least = float(finite.min()) if finite.size else most
    return Spread(low=least, nominal=float(values[0]), high=most)


def _speed(
    crossing: Crossing, island: Island, timing: Timing, load: float, line_rates: Mapping[str, LineRate]
) -> Speed | None:
    if not bool(np.all(timing.solved)) or not math.isfinite(float(timing.bit_s[0])):
        return None
    line = line_of(crossing, line_rates)
    worst = float(timing.bit_s.max())
    usual = float(timing.bit_s[0])
    return Speed(
        rise_s=_spread(timing.rise_s),
        fall_s=_spread(timing.fall_s),
        delay_high_s=_spread(timing.delay_high_s),
        delay_low_s=_spread(timing.delay_low_s),
        usable_bit_s=1.0 / worst if math.isfinite(worst) and worst > 0 else 0.0,
        nominal_bit_s=1.0 / usual if usual > 0 else 0.0,
        load_farads=load,
        limit=_limit(crossing, island, timing, line is not None and line.open_drain),
        rise_30_70_s=_spread(timing.rise_30_70_s),
        accuracy=_accuracy(crossing, island),
        line=line,
    )


def _loaded(job: TimingJob, timing: Timing) -> TimingJob | None:
    """Return the slowest corner of a circuit with 10 pF more at the receiver, to see what load costs.

    None where a circuit remembers earlier bits: its rate does not follow from one edge.
    """
    if not bool(np.all(timing.solved)) or bool(np.any(timing.remembers)) or not np.all(np.isfinite(timing.bit_s)):
        return None
    worst = job.member(int(np.argmax(timing.bit_s)))
    more = devices.capacitor("more load", job.watch, GROUND, MORE_FARADS)
    return replace(worst, network=Network(branches=(*worst.network.branches, more), fixed=worst.network.fixed))


def _accuracy(crossing: Crossing, island: Island) -> str:
    """Say how far the models bear a rate (charge storage and capacitances of transistors vary by maker)."""
    own = {*crossing.link, *crossing.shifter.parts}
    bipolar = [element.part for element in island.elements if element.kind == "bipolar" and element.part in own]
    fets = [element.part for element in island.elements if element.kind == "mosfet" and element.part in own]
    if bipolar:
        return f"{bipolar[0]} stores charge, which varies up to ten times from maker to maker"
    if fets:
        return f"the capacitance of {fets[0]} varies up to twice from maker to maker"
    return "to about 10 %"


def _limit(crossing: Crossing, island: Island, timing: Timing, drains: bool) -> str:
    """Say which edge limits, and through what it runs."""
    slow_high = float(np.nanmax(timing.delay_high_s)) >= float(np.nanmax(timing.delay_low_s))
    edge = "rise" if slow_high else "fall"
    pin = crossing.stage_driver or crossing.driver
    if bool(np.any(timing.remembers)):
        return f"what {', '.join(crossing.shifter.parts)} remembers of the bits before"
    through = _resistor_on(crossing, island, pin, slow_high, drains)
    if through is not None and through.ohms is not None:
        return f"the {edge} through {through.part} ({format_si(through.ohms.nominal, 'Ω')})"
    return f"the {edge} through the output of {pin.part}" if pin is not None else f"the {edge}"


def _resistor_on(
    crossing: Crossing, island: Island, pin: PinModel | None, slow_high: bool, drains: bool
) -> Element | None:
    """Return the resistor that an edge runs through: in the link, or the pull-up of the receiver's net for a rise."""
    own = [element for element in island.elements if element.kind == "resistor" and element.ohms is not None]
    series = [element for element in own if element.part in crossing.link]
    pulls = [element for element in own if crossing.receiver.net in element.nets and element.part not in crossing.link]
    released = drains or (pin is not None and pin.drive is not None and pin.drive.style == "open-drain")
    passing = crossing.shifter.kind in ("mosfet-pass", "bipolar-pass", "diode", "inverting-stage", "open-drain")
    candidates = pulls if slow_high and (released or passing) and pulls else series
    return max(candidates, key=lambda element: element.ohms.nominal if element.ohms else 0.0, default=None)
