"""How fast a circuit is good for: edges, delays and the highest bit rate at which the worst pattern still arrives.

A bit counts as received when the level is valid from three quarters of the bit on until its end. A step from rest gives
the first estimate, 0.75 / (longest delay). It is exact for circuits in which an edge from rest is the slowest, and too
hopeful where the circuit remembers (stored charge, overshoot): so the two lone-bit patterns 000010 and 111101 are run
at the estimated rate, and where one fails the bit is lengthened until both pass.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields

import numpy as np

from levelcrossing.arrays import Flags
from levelcrossing.network import Network, Value, Vector, slices, stack, topology
from levelcrossing.solve import DcSolution, solve_dc
from levelcrossing.transient import EDGE_S, STEP_ERROR_VOLTS, follow, stage, step_response
from levelcrossing.waveforms import Waves, last_invalid_s

# From this part of each bit on, the received level must be valid.
VALID_FROM = 0.75
# The patterns whose last change comes soonest after a long rest.
LONE_BITS = ("000010", "111101")
# How much longer than the estimate a bit is tried, coarse; each failure is then narrowed twice.
_LENGTHENED = (1.0, 1.15, 1.35, 1.6, 2.0, 2.6, 3.5, 5.0, 8.0)
_FINER = 8
# What the integration of a pattern may differ from that of a step [1].
_SLACK = 3e-3


@dataclass(frozen=True, kw_only=True, eq=False)
class Timing:
    """What a circuit does to the edges of its driver; all arrays have shape (batch,).

    Parameters
    ----------
    high_volts, low_volts : ndarray
        Settled received levels [V], the higher and the lower one.
    inverting : ndarray of bool
        Whether the received level is low while the driver is high.
    rise_s, fall_s : ndarray
        10 to 90 % of the received swing [s].
    rise_30_70_s : ndarray
        30 to 70 %, as bus specifications count a rise [s].
    delay_high_s, delay_low_s : ndarray
        From the start of the driver's edge until the level is valid for good [s]; infinite when it never is.
    bit_s : ndarray
        Shortest bit that arrives [s]; infinite when none does.
    remembers : ndarray of bool
        The lone-bit patterns needed a longer bit than the delays suggest.
    least_volts, greatest_volts : ndarray
        Extremes of the received voltage on the way [V].
    near_plateau : ndarray of bool
        A settled level lies within 50 mV of its threshold: the delay depends on millivolts.
    solved : ndarray of bool
    """

    high_volts: Vector
    low_volts: Vector
    inverting: Flags
    rise_s: Vector
    fall_s: Vector
    rise_30_70_s: Vector
    delay_high_s: Vector
    delay_low_s: Vector
    bit_s: Vector
    remembers: Flags
    least_volts: Vector
    greatest_volts: Vector
    near_plateau: Flags
    solved: Flags

    @property
    def bit_rate(self) -> Vector:
        """Highest bit rate that arrives [bit/s]; 0 when none does."""
        with np.errstate(divide="ignore"):
            return np.where(np.isfinite(self.bit_s), 1.0 / self.bit_s, 0.0)

    @property
    def limited_by_rise(self) -> Flags:
        """Whether the rise (of the received level) limits the rate, else the fall."""
        flags: Flags = self.delay_high_s >= self.delay_low_s
        return flags


def timing(
    network: Network,
    low: Mapping[str, Value],
    high: Mapping[str, Value],
    watch: str,
    vih_volts: Value,
    vil_volts: Value,
    *,
    edge_s: float = EDGE_S,
    confirm: bool = True,
    error_volts: float = STEP_ERROR_VOLTS,
    start: DcSolution | None = None,
) -> Timing:
    """Work out edges, delays and the shortest bit of a circuit.

    Parameters
    ----------
    network : Network
    low, high : mapping from fixed node to float or ndarray
        Fixed voltages [V] while the driver is low and while it is high.
    watch : str
        The receiver's node.
    vih_volts, vil_volts : float or ndarray
        Its thresholds [V].
    edge_s : float
        Length of the driver's own edge [s].
    confirm : bool
        Run the lone-bit patterns.
    error_volts : float
        Local error allowed per step [V].
    start : DcSolution, optional
        Where the search for the operating points starts; of twice the batch.

    Returns
    -------
    Timing
    """
    batch = network.batch
    vih = np.broadcast_to(np.asarray(vih_volts, dtype=float), (batch,))
    vil = np.broadcast_to(np.asarray(vil_volts, dtype=float), (batch,))
    both = stack([_sized(network), _sized(network)])

    def joined(first: Mapping[str, Value], second: Mapping[str, Value]) -> dict[str, Value]:
        def wide(value: Value) -> Vector:
            return np.broadcast_to(np.asarray(value, dtype=float), (batch,))

        return {node: np.concatenate([wide(first[node]), wide(second[node])]) for node in first}

    response = step_response(
        both, joined(low, high), joined(high, low), (watch,), edge_s=edge_s, error_volts=error_volts, start=start
    )
    up, down = np.arange(batch), np.arange(batch) + batch
    driver_low, driver_high = response.before.volts[watch][:batch], response.after.volts[watch][:batch]
    inverting: Flags = driver_high < driver_low
    rises, falls = np.where(inverting, down, up), np.where(inverting, up, down)
    edges, slow_edges = response.edge_s(watch), response.edge_s(watch, 0.3, 0.7)
    to_high = last_invalid_s(response.waves, watch, np.tile(vih, 2), above=True)
    to_low = last_invalid_s(response.waves, watch, np.tile(vil, 2), above=False)
    rests_high, rests_low = np.maximum(driver_low, driver_high), np.minimum(driver_low, driver_high)
    # A settled level that is not valid is never valid for good, whatever the record's end says.
    delay_high = np.where(rests_high >= vih, to_high[rises], np.inf)
    delay_low = np.where(rests_low <= vil, to_low[falls], np.inf)
    solved = response.solved[:batch] & response.solved[batch:]
    slowest = np.maximum(delay_high, delay_low)
    bit = np.maximum(slowest / VALID_FROM, 2.0 * edge_s)
    bit = np.where(solved, bit, np.nan)
    remembers = np.zeros(batch, dtype=bool)
    if confirm:
        bit, remembers = _confirmed(network, low, high, watch, vih, vil, inverting, bit, edge_s, error_volts)
    least, greatest = response.extreme_volts(watch)
    return Timing(
        high_volts=rests_high,
        low_volts=rests_low,
        inverting=inverting,
        rise_s=edges[rises],
        fall_s=edges[falls],
        rise_30_70_s=slow_edges[rises],
        delay_high_s=delay_high,
        delay_low_s=delay_low,
        bit_s=bit,
        remembers=remembers,
        least_volts=np.minimum(least[:batch], least[batch:]),
        greatest_volts=np.maximum(greatest[:batch], greatest[batch:]),
        near_plateau=(np.abs(rests_high - vih) < 0.05) | (np.abs(rests_low - vil) < 0.05),
        solved=solved,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TimingJob:
    """One circuit to time; the fields are the arguments of :func:`timing`."""

    network: Network
    low: Mapping[str, Value]
    high: Mapping[str, Value]
    watch: str
    vih_volts: Value
    vil_volts: Value
    edge_s: float = EDGE_S

    def member(self, index: int) -> TimingJob:
        """Return one member of the batch, all its values plain floats."""

        def pick(value: Value) -> float:
            flat = np.ravel(value)
            return float(flat[index if flat.size > 1 else 0])

        return TimingJob(
            network=self.network.member(index),
            low={node: pick(volts) for node, volts in self.low.items()},
            high={node: pick(volts) for node, volts in self.high.items()},
            watch=self.watch,
            vih_volts=pick(self.vih_volts),
            vil_volts=pick(self.vil_volts),
            edge_s=self.edge_s,
        )


def timings(jobs: Sequence[TimingJob], *, confirm: bool = True) -> list[Timing]:
    """Time many circuits; those of equal topology share a batch, which is what makes them fast.

    Parameters
    ----------
    jobs : sequence of TimingJob
    confirm : bool
        Run the lone-bit patterns.

    Returns
    -------
    list of Timing
        In the order of the jobs.
    """
    groups: dict[object, list[tuple[int, Network, dict[str, str]]]] = {}
    for position, job in enumerate(jobs):
        plain, names = _sized(job.network).canonical()
        new = {old: name for name, old in names.items()}
        key = (topology(plain), tuple(sorted(new[node] for node in job.low)), new[job.watch], job.edge_s)
        groups.setdefault(key, []).append((position, plain, new))
    out: list[Timing | None] = [None] * len(jobs)
    for members in groups.values():
        several = [jobs[position] for position, _, _ in members]
        sizes = [network.batch for _, network, _ in members]

        def joined(values: Sequence[Value], sizes: Sequence[int] = sizes) -> Vector:
            wide = [np.broadcast_to(np.asarray(v, dtype=float), (k,)) for v, k in zip(values, sizes, strict=True)]
            return np.concatenate(wide)

        def moved(
            levels: Sequence[Mapping[str, Value]], members: Sequence[tuple[int, Network, dict[str, str]]] = members
        ) -> dict[str, Value]:
            first = members[0][2]
            translated = [
                {new[node]: v for node, v in level.items()} for level, (_, _, new) in zip(levels, members, strict=True)
            ]
            return {first[n]: joined([level[first[n]] for level in translated]) for n in levels[0]}

        whole = stack([network for _, network, _ in members])
        found = timing(
            whole,
            moved([job.low for job in several]),
            moved([job.high for job in several]),
            members[0][2][several[0].watch],
            joined([job.vih_volts for job in several]),
            joined([job.vil_volts for job in several]),
            edge_s=several[0].edge_s,
            confirm=confirm,
        )
        for (position, _, _), part in zip(members, slices([network for _, network, _ in members]), strict=True):
            out[position] = Timing(**{item.name: getattr(found, item.name)[part] for item in fields(found)})
    return [found for found in out if found is not None]


def _sized(network: Network) -> Network:
    return network.taking(np.arange(network.batch))


def pattern_response(
    network: Network,
    low: Mapping[str, Value],
    high: Mapping[str, Value],
    bits: str,
    bit_s: Vector,
    watch: Sequence[str],
    *,
    edge_s: float = EDGE_S,
    error_volts: float = STEP_ERROR_VOLTS,
    start: DcSolution | None = None,
) -> Waves:
    """Drive a circuit with a bit pattern from rest.

    Parameters
    ----------
    network : Network
    low, high : mapping from fixed node to float or ndarray
        Fixed voltages while the driver sends 0 and 1 [V].
    bits : str
        Zeros and ones. The circuit rests in the first one.
    bit_s : ndarray, shape (batch,)
        Length of a bit [s].
    watch : sequence of str
    edge_s, error_volts
        As in :func:`levelcrossing.transient.step_response`.
    start : DcSolution, optional
        Where the search for the operating point starts.

    Returns
    -------
    Waves
        Time 0 is the beginning of the first bit.
    """
    levels = {"0": low, "1": high}
    rest = solve_dc(network.holding(levels[bits[0]]), start)
    other = solve_dc(network.holding(levels["1" if bits[0] == "0" else "0"]), rest)
    arrays = rest._arrays
    edge = np.minimum(edge_s, 0.5 * bit_s)
    times, stages = [np.zeros(network.batch)], [stage(network, arrays, levels[bits[0]])]
    for position in range(1, len(bits)):
        if bits[position] != bits[position - 1]:
            times += [position * bit_s, position * bit_s + edge]
            stages += [stages[-1], stage(network, arrays, levels[bits[position]])]
    times.append(len(bits) * bit_s)
    stages.append(stages[-1])
    swing = np.abs(rest._state[: arrays.unknown] - other._state[: arrays.unknown])
    return follow(
        rest,
        np.array(times),
        np.stack(stages),
        watch,
        swing=swing,
        first_s=edge / 50.0,
        error_volts=error_volts,
    )


def received(
    waves: Waves, watch: str, bits: str, bit_s: Vector, vih_volts: Vector, vil_volts: Vector, inverting: Flags
) -> Flags:
    """Return which members receive every bit of a pattern: valid from 75 % of each bit on until its end."""
    good = waves.complete.copy()
    for position, bit in enumerate(bits):
        wants_high = inverting if bit == "0" else ~inverting
        level = np.where(wants_high, vih_volts, vil_volts)
        begin, end = position * bit_s, (position + 1) * bit_s
        last = last_invalid_s(waves, watch, level, wants_high, from_s=begin, until_s=end)
        good &= last <= begin + VALID_FROM * (1.0 + _SLACK) * bit_s
    return good


def _confirmed(
    network: Network,
    low: Mapping[str, Value],
    high: Mapping[str, Value],
    watch: str,
    vih: Vector,
    vil: Vector,
    inverting: Flags,
    bit: Vector,
    edge_s: float,
    error_volts: float,
) -> tuple[Vector, Flags]:
    """Return bit lengths [s] at which both lone-bit patterns arrive, and where that took more than the estimate."""
    open_ = np.flatnonzero(np.isfinite(bit))
    out = bit.copy()
    if not open_.size:
        return out, np.zeros(bit.shape, dtype=bool)

    def passing(members: Vector, lengths: Vector) -> Flags:
        """Return for each pair of member and bit length whether it passes."""
        index = members.astype(np.intp)

        def pick(first: Mapping[str, Value], second: Mapping[str, Value]) -> dict[str, Value]:
            def wide(value: Value) -> Vector:
                return np.broadcast_to(np.asarray(value, dtype=float), bit.shape)[index]

            return {node: np.concatenate([wide(first[node]), wide(second[node])]) for node in first}

        # Both patterns run as one batch: the second is the first with the driver's levels exchanged. The rest before
        # the lone bit is a settled state, one bit of it stands for all.
        twice = np.tile(index, 2)
        short, bit_s = LONE_BITS[0][3:], np.tile(lengths, 2)
        waves = pattern_response(
            network.taking(twice),
            pick(low, high),
            pick(high, low),
            short,
            bit_s,
            (watch,),
            edge_s=edge_s,
            error_volts=error_volts,
        )
        exchanged = np.concatenate([inverting[index], ~inverting[index]])
        good = received(waves, watch, short, bit_s, vih[twice], vil[twice], exchanged)
        both: Flags = good[: index.size] & good[index.size :]
        return both

    fine = passing(open_.astype(float), bit[open_])
    failing = open_[~fine]
    remembers = np.zeros(bit.shape, dtype=bool)
    remembers[failing] = True
    if failing.size:
        below, above = np.ones(failing.size), np.full(failing.size, np.inf)
        grid = np.tile(np.array(_LENGTHENED[1:])[:, None], (1, failing.size))
        for _ in range(3):
            members = np.tile(failing.astype(float), len(grid))
            good = passing(members, (grid * bit[failing]).ravel()).reshape(grid.shape)
            # Good from here on upwards: a pass between failures does not count.
            lasting = np.logical_and.accumulate(good[::-1], axis=0)[::-1]
            candidates = np.where(lasting, grid, np.inf)
            above = np.minimum(above, candidates.min(axis=0))
            below = np.maximum(below, np.where(lasting, 1.0, grid).max(axis=0))
            finite = np.where(np.isfinite(above), above, below)
            shares = np.linspace(0.0, 1.0, _FINER + 2)[1:-1]
            grid = below + shares[:, None] * (finite - below)
        out[failing] = above * bit[failing]
    return out, remembers
