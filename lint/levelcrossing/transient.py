"""Circuits in time: step responses, edges, delays and the bit rate that a circuit is good for.

All members of a batch advance side by side, each with its own time and step. The trapezoidal rule integrates, started
by two backward-Euler steps after every corner of a driver's waveform; the step follows the local error, taken from the
difference between prediction and solution. Charges of capacitors and of junctions (transit time times current) are
what is integrated, so that no charge is lost.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from levelcrossing.arrays import Arrays, Flags, Index
from levelcrossing.elimination import Elimination, plan_elimination
from levelcrossing.network import Network, Value, Vector
from levelcrossing.solve import DcSolution, solve_dc
from levelcrossing.waveforms import Waves, last_invalid_s

# Error allowed in one step [V]; at a third of it edges and delays move by less than 0.2 %.
STEP_ERROR_VOLTS = 1e-3
# The error allowed in a junction's charge: its fraction is the allowed volts over the first figure [V], its floor what
# they put onto the second [F].
_CHARGE_VOLTS, _CHARGE_FARADS = 0.15, 10e-12
# The first step after a corner is this part of the edge.
_FIRST_PART = 50.0
# A watched node moves by no more than this part of its swing per step, or this much [V].
_STRIDE_PART, _STRIDE_VOLTS = 0.12, 5e-3
# Newton's last correction within a step may be this large [V]: what remains is its square over the thermal voltage.
_NEWTON_VOLTS = 1e-3
_NEWTON_ITERATIONS = 7
_ENOUGH = 0.8
_MOST_SWEEPS = 6000
# A response has settled when every node is this close to its final voltage: part of the swing, floor [V].
_SETTLED_PART, _SETTLED_VOLTS = 0.005, 2e-3
# Length of a driver's edge unless stated [s]: what a 3.3 V CMOS output does into a light load (assumption).
EDGE_S = 1e-9
# Resistance beyond which a node does not set the pace of a circuit [ohm].
_PACE_OHMS = 1e7


# ------------------------------------------------------------------------------------------------------------ the march


@dataclass(slots=True, eq=False)
class _Dynamics:
    """The arrays of a network with what stores charge.

    ``into`` is that of :class:`Arrays` with further columns for capacitors, then charged junctions; ``spread`` with
    further columns for charged junctions; ``cap_spread`` is the same for capacitors.
    """

    arrays: Arrays
    charged: Index
    into: Vector
    spread: Vector
    cap_spread: Vector
    cap_f: Vector
    transit: Vector
    base: Vector
    elimination: Elimination

    def taken(self, keep: Index) -> _Dynamics:
        return _Dynamics(
            arrays=self.arrays.taken(keep),
            charged=self.charged,
            into=self.into,
            spread=self.spread,
            cap_spread=self.cap_spread,
            cap_f=self.cap_f[:, keep] if self.cap_f.shape[1] > 1 else self.cap_f,
            transit=self.transit[:, keep] if self.transit.shape[1] > 1 else self.transit,
            base=self.base[:, keep] if self.base.shape[1] > 1 else self.base,
            elimination=self.elimination,
        )


def _dynamics(arrays: Arrays) -> _Dynamics:
    n = arrays.unknown
    charged = np.flatnonzero((arrays.jun_tt > 0).any(axis=1)) if arrays.jun_a.size else np.empty(0, dtype=np.intp)
    ends = [
        *zip(arrays.cap_p.tolist(), arrays.cap_q.tolist(), strict=True),
        *((int(arrays.jun_a[j]), int(arrays.jun_c[j])) for j in charged),
    ]
    into = np.zeros((len(arrays.names), len(ends)))
    spread = np.zeros((n, n, len(ends)))
    for column, (p, q) in enumerate(ends):
        into[p, column] += 1.0
        into[q, column] -= 1.0
        for row, col, sign in ((p, p, 1.0), (q, q, 1.0), (p, q, -1.0), (q, p, -1.0)):
            if row < n and col < n and p != q:
                spread[row, col, column] += sign
    # The resistive entries and the capacitive ones, on common slots.
    known = arrays.elimination.flat
    pattern = (spread != 0).any(axis=2)
    pattern.flat[known] = True
    elimination = plan_elimination(pattern)
    resistive = np.zeros((n * n, arrays.spread.shape[1]))
    resistive[known] = arrays.spread
    base = np.zeros((n * n, arrays.base.shape[1]))
    base[known] = arrays.base
    flat = spread.reshape(n * n, len(ends))
    n_caps = arrays.cap_p.size
    devices = np.hstack([resistive, flat[:, n_caps:]])
    return _Dynamics(
        arrays=arrays,
        charged=charged,
        into=np.ascontiguousarray(np.hstack([arrays.into[:n], into[:n]])),
        spread=np.ascontiguousarray(devices[elimination.flat]),
        cap_spread=np.ascontiguousarray(flat[elimination.flat][:, :n_caps]),
        cap_f=arrays.cap_f,
        transit=arrays.jun_tt[charged] if charged.size else np.empty((0, 1)),
        base=np.ascontiguousarray(base[elimination.flat]),
        elimination=elimination,
    )


def _march(
    dyn: _Dynamics,
    start: Vector,
    breaks: Vector,
    levels: Vector,
    watch: Sequence[int],
    *,
    first_s: Vector,
    stride: Vector,
    goal: Vector | None = None,
    reach: Vector | None = None,
    error_volts: float = STEP_ERROR_VOLTS,
) -> tuple[Vector, Vector, Flags, npt.NDArray[np.intp], Flags]:
    """Advance all members from ``start``.

    Parameters
    ----------
    dyn : _Dynamics
    start : ndarray, shape (nodes, batch)
        Settled node voltages [V].
    breaks : ndarray, shape (corners, batch)
        Times at which fixed nodes' waveforms have corners, first to last [s].
    levels : ndarray, shape (corners, fixed, batch)
        Fixed voltages at those times [V], linear in between.
    watch : sequence of int
        Rows of nodes to record.
    first_s : ndarray, shape (batch,)
        First step after each corner [s].
    stride : ndarray, shape (watched, batch)
        How far a watched node may move in one step [V], so that its edges can be read between points.
    goal, reach : ndarray, shape (unknown, batch), optional
        A member stops in its last segment once every unknown is within ``reach`` of ``goal`` [V].
    error_volts : float
        Local error allowed per step [V].

    Returns
    -------
    times, volts, corners, count, complete
        As :class:`Waves` has them, ``volts`` of shape ``(watched, points, batch)``.
    """
    n = dyn.arrays.unknown
    batch = start.shape[1]
    live = np.arange(batch)
    complete = np.zeros(batch, dtype=bool)
    time, dt = breaks[0].copy(), first_s.copy()  # every array below is a copy of its own: they are changed in place
    segment = np.zeros(batch, dtype=np.intp)
    known = np.ones(batch, dtype=np.intp)
    last = len(breaks) - 1
    resting = bool((levels[last] == levels[last - 1]).all())
    v0 = start.copy()
    t1, t2 = time - 1.0, time - 2.0
    # stored charge and its current, settled: no current flows into it
    n_caps = dyn.cap_f.shape[0] if dyn.arrays.cap_p.size else 0
    ports = n_caps + dyn.charged.size
    charge = np.empty((ports, batch))
    charge[:n_caps] = dyn.cap_f[:n_caps] * (v0[dyn.arrays.cap_p] - v0[dyn.arrays.cap_q])
    if dyn.charged.size:
        charge[n_caps:] = dyn.transit * dyn.arrays.junctions(dyn.arrays.junction_volts(v0))[0][dyn.charged]
    flow = np.zeros((ports, batch))
    # What the error is judged on: unknown voltages and the charges of junctions, which hardly show in voltages.
    state = np.concatenate([v0[:n], charge[n_caps:]])
    state1, state2 = state.copy(), state.copy()

    record_t, record_v = [time.copy()], [start[list(watch)]]
    record_ok, record_corner = [np.ones(batch, dtype=bool)], [np.ones(batch, dtype=bool)]
    columns = np.arange(batch)
    rows = [row for row in watch if row < n]
    charge_part, charge_floor = error_volts / _CHARGE_VOLTS, error_volts * _CHARGE_FARADS

    for _ in range(_MOST_SWEEPS):
        end = breaks[segment + 1, columns]
        # A step that would leave a sliver before the corner is stretched or halved.
        rest = end - time
        step = np.where(dt >= 0.999 * rest, rest, np.where(dt > 0.6 * rest, 0.5 * rest, dt))
        lands = step == rest
        now = np.where(lands, end, time + step)

        # prediction by divided differences over the points since the corner
        third, second = known >= 3, known >= 2
        h1 = now - t1
        slope = (state - state1) / (time - t1)
        bend = np.where(third, (slope - (state1 - state2) / (t1 - t2)) / (time - t2), 0.0)
        guess = state + np.where(second, step, 0.0) * (slope + h1 * bend)
        v = np.empty_like(v0)
        v[:n] = guess[:n]
        if resting and int(segment.min()) == last - 1:
            v[n:] = levels[last]
        else:
            from_s = breaks[segment, columns]
            share = (now - from_s) / (end - from_s)
            low, high = levels[segment, :, columns].T, levels[segment + 1, :, columns].T
            v[n:] = low + share * (high - low)

        rate = np.where(third, 2.0, 1.0) / step
        past = rate * charge + np.where(third, flow, 0.0)
        v, stored, settled = _solve_step(dyn, v, v0, rate, past, n_caps)

        # local error: trapezoidal -h³/12 v''', backward Euler h²/2 v'', from the miss of the prediction
        reached = np.concatenate([v[:n], stored[n_caps:]])
        miss = np.abs(reached - guess)
        miss[:n] /= error_volts
        miss[n:] /= charge_part * np.abs(reached[n:]) + charge_floor
        scale = np.where(third, 0.5 * step * step / (h1 * (now - t2)), np.where(second, step / h1, 0.0))
        error = np.where(settled, miss.max(axis=0, initial=0.0) * scale, np.inf)
        grown = np.where(third, np.cbrt(1.0 / np.maximum(error, 1e-12)), np.sqrt(1.0 / np.maximum(error, 1e-12)))
        accepted = error <= 1.3
        factor = np.where(settled, np.clip(0.9 * grown, 0.2, 2.5), 0.3)

        landed = accepted & lands
        if accepted.all():
            flow, charge = rate * stored - past, stored
            state2, state1, state, v0 = state1, state, reached, v
            t2, t1, time = t1, time, now
        else:
            for kept, new in (
                (flow, rate * stored - past),
                (charge, stored),
                (state2, state1),
                (state1, state),
                (state, reached),
                (v0, v),
                (t2, t1),
                (t1, time),
                (time, now),
            ):
                np.copyto(kept, new, where=accepted)
        known = np.where(landed, 1, np.where(accepted, np.minimum(known + 1, 3), known))
        segment = segment + landed
        pace = (np.abs(state[rows] - state1[rows]) / stride).max(axis=0, initial=0.0)
        steady = (time - t1) / np.maximum(pace, 1e-9)
        dt = np.where(landed, first_s, np.where(accepted, np.minimum(step * factor, steady), step * factor))

        if live.size == batch:
            record_t.append(time.copy())
            record_v.append(v0[list(watch)])
            record_ok.append(accepted)
            record_corner.append(landed)
        else:
            whole_t, whole_v = np.zeros(batch), np.zeros((len(watch), batch))
            whole_ok, whole_corner = np.zeros(batch, dtype=bool), np.zeros(batch, dtype=bool)
            whole_t[live], whole_v[:, live] = time, v0[list(watch)]
            whole_ok[live], whole_corner[live] = accepted, landed
            record_t.append(whole_t)
            record_v.append(whole_v)
            record_ok.append(whole_ok)
            record_corner.append(whole_corner)

        over = segment >= last
        if goal is not None and reach is not None:
            near = (np.abs(v0[:n] - goal[:, live]) <= reach[:, live]).all(axis=0)
            over |= near & (segment == last - 1) & (known > 2) & accepted
        lost = step < 1e-17
        stop = over | lost
        if stop.any():
            complete[live[over & ~lost]] = True
            if stop.all():
                break
            segment = np.where(stop, last - 1, segment)
            keep = np.flatnonzero(~stop)
            live, time, dt, segment, known = live[keep], time[keep], dt[keep], segment[keep], known[keep]
            t1, t2, first_s = t1[keep], t2[keep], first_s[keep]
            v0, state, state1, state2 = v0[:, keep], state[:, keep], state1[:, keep], state2[:, keep]
            charge, flow = charge[:, keep], flow[:, keep]
            breaks, levels = breaks[:, keep], levels[:, :, keep]
            columns, stride = np.arange(keep.size), stride[:, keep]
            dyn = dyn.taken(keep)
    return _packed(record_t, record_v, record_ok, record_corner, complete)


def _solve_step(
    dyn: _Dynamics, v: Vector, before: Vector, rate: Vector, past: Vector, n_caps: int
) -> tuple[Vector, Vector, Flags]:
    """Solve one step of every member; return voltages, stored charges and which members settled."""
    arrays = dyn.arrays
    n, batch = arrays.unknown, v.shape[1]
    limited = arrays.junction_volts(v)
    if limited.size:
        limited = arrays.limit(limited, arrays.junction_volts(before))
    stored = np.empty((n_caps + dyn.charged.size, batch))
    charge_rate = rate * dyn.transit if dyn.charged.size else None
    resting = dyn.base + dyn.cap_spread @ (rate * dyn.cap_f[:n_caps]) if n_caps else dyn.base
    with np.errstate(all="ignore"):
        for iteration in range(_NEWTON_ITERATIONS):
            flows, slopes, amps, siemens = arrays.evaluate(v, limited)
            np.multiply(dyn.cap_f[:n_caps], v[arrays.cap_p] - v[arrays.cap_q], out=stored[:n_caps])
            if charge_rate is not None:
                np.multiply(dyn.transit, amps[dyn.charged], out=stored[n_caps:])
                slopes = np.concatenate([slopes, charge_rate * siemens[dyn.charged]])
            right = dyn.into @ np.concatenate([flows, rate * stored - past])
            entries = dyn.spread @ slopes
            entries += resting
            change = dyn.elimination.solve(entries, right)
            v[:n] -= change
            size = np.abs(change).max(axis=0, initial=0.0)
            settled = size < _NEWTON_VOLTS
            if arrays.linear:
                settled = np.isfinite(size)
            elif limited.size:
                wished = arrays.junction_volts(v)
                after = arrays.limit(wished, limited)
                settled &= np.abs(wished - limited).max(axis=0) < 2 * _NEWTON_VOLTS
                limited = after
            # Stragglers hold nobody up: they take a shorter step in the next round.
            if settled.all() or (iteration >= 3 and np.count_nonzero(settled) >= _ENOUGH * batch):
                break
    # What was stored is linear in the last correction; that keeps charge exactly conserved from step to step.
    stored[:n_caps] = dyn.cap_f[:n_caps] * (v[arrays.cap_p] - v[arrays.cap_q])
    if charge_rate is not None:
        stored[n_caps:] -= dyn.transit * siemens[dyn.charged] * _across(arrays, change)[dyn.charged]
    return v, stored, settled


def _across(arrays: Arrays, change: Vector) -> Vector:
    """Return how a change of the unknown nodes [V] changes the junctions' voltages [V]."""
    whole = np.zeros((len(arrays.names), change.shape[1]))
    whole[: arrays.unknown] = change
    return whole[arrays.jun_a] - whole[arrays.jun_c]


def _packed(
    times: list[Vector], volts: list[Vector], accepted: list[Flags], corners: list[Flags], complete: Flags
) -> tuple[Vector, Vector, Flags, npt.NDArray[np.intp], Flags]:
    """Close the gaps that rejected steps left; return times, volts, corners, counts and the flags given."""
    ok = np.array(accepted)
    count = ok.sum(axis=0)
    order = np.argsort(~ok, axis=0, kind="stable")[: int(count.max())]
    position = np.minimum(np.arange(len(order))[:, None], count - 1)
    order = np.take_along_axis(order, position, axis=0)
    t = np.take_along_axis(np.array(times), order, axis=0)
    corner = np.take_along_axis(np.array(corners), order, axis=0)
    v = np.stack(
        [np.take_along_axis(np.array([row[k] for row in volts]), order, axis=0) for k in range(volts[0].shape[0])]
    )
    return t, v, corner, count, complete


# -------------------------------------------------------------------------------------------------------- step response


@dataclass(frozen=True, kw_only=True, eq=False)
class StepResponse:
    """What a step of fixed nodes does.

    Parameters
    ----------
    before, after : DcSolution
        The settled circuit before and long after the step.
    waves : Waves
        Time 0 is the start of the driver's edge.
    solved : ndarray of bool, shape (batch,)
        Both operating points and the way between them were solved.
    """

    before: DcSolution
    after: DcSolution
    waves: Waves
    solved: Flags

    def delay_s(self, node: str, level_volts: Value) -> Vector:
        """Return the last time at which the node is short of a level [V] that it should pass [s], shape (batch,).

        Infinity where it never stays past the level. The direction is that of the node's own step.
        """
        above = self.after.volts[node] > self.before.volts[node]
        return np.where(self.solved, last_invalid_s(self.waves, node, level_volts, above), np.nan)

    def edge_s(self, node: str, low: float = 0.1, high: float = 0.9) -> Vector:
        """Return the time between two fractions of the node's own swing [s]; not a number without a swing."""
        start, end = self.before.volts[node], self.after.volts[node]
        first = self.delay_s(node, start + low * (end - start))
        second = self.delay_s(node, start + high * (end - start))
        swing = np.abs(end - start) > 1e-3
        with np.errstate(invalid="ignore"):
            return np.where(swing, second - first, np.nan)

    def extreme_volts(self, node: str) -> tuple[Vector, Vector]:
        """Return least and greatest voltage on the way [V]: what over- and undershoot reach."""
        volts = self.waves.volts[node]
        return volts.min(axis=0), volts.max(axis=0)


def stage(network: Network, arrays: Arrays, moved: Mapping[str, Value]) -> Vector:
    """Return fixed voltages [V], shape ``(fixed, batch)``, some of them moved."""
    held = {**network.fixed, **moved}
    names = arrays.names[arrays.unknown :]
    return np.array([np.broadcast_to(np.asarray(held[name], dtype=float), (network.batch,)) for name in names])


def pace_s(network: Network, *states: DcSolution) -> Vector:
    """Return an upper estimate of a circuit's slowest time constant [s], shape (batch,).

    Sum over nodes of resistance times the capacitance on it (the open-circuit time constants), at the slower of the
    operating points, plus the storage of saturated junctions.
    """
    arrays = states[0]._arrays
    load = np.zeros((len(arrays.names), network.batch))
    for row, (p, q) in enumerate(zip(arrays.cap_p, arrays.cap_q, strict=True)):
        load[p] += arrays.cap_f[row]
        load[q] += arrays.cap_f[row]
    slowest = np.zeros(network.batch)
    for state in states:
        ohms = np.minimum(np.broadcast_to(state._ohms, (arrays.unknown, network.batch)), _PACE_OHMS)
        slowest = np.maximum(slowest, (ohms * load[: arrays.unknown]).sum(axis=0))
    storage = np.broadcast_to(arrays.jun_tt, (arrays.jun_tt.shape[0], network.batch)).sum(axis=0)
    total: Vector = slowest + 10.0 * storage
    return total


def step_response(
    network: Network,
    before: Mapping[str, Value],
    after: Mapping[str, Value],
    watch: Sequence[str],
    *,
    edge_s: float = EDGE_S,
    until_s: float | None = None,
    error_volts: float = STEP_ERROR_VOLTS,
    start: DcSolution | None = None,
) -> StepResponse:
    """Let fixed nodes ramp from one voltage to another and follow the circuit until it has settled.

    Parameters
    ----------
    network : Network
    before, after : mapping from fixed node to float or ndarray
        Voltages that change [V]; all others stay as the network has them. A rise and a fall are two members.
    watch : sequence of str
        Nodes to record.
    edge_s : float
        Length of the ramp [s].
    until_s : float, optional
        Give up after this time [s]; ten thousand time constants of the circuit when missing.
    error_volts : float
        Local error allowed per step [V].
    start : DcSolution, optional
        Where the search for the operating points starts.

    Returns
    -------
    StepResponse
    """
    first = solve_dc(network.holding(before), start)
    final = solve_dc(network.holding(after), start)
    arrays, batch = first._arrays, network.batch
    n = arrays.unknown
    if until_s is not None:
        span = np.full(batch, until_s)
    else:
        # Members end when they have settled; time constants at the ends say little of what lies between them.
        span = edge_s + 1e4 * np.maximum(pace_s(network, first, final), edge_s)
    breaks = np.stack([np.zeros(batch), np.full(batch, edge_s), np.maximum(span, 1.01 * edge_s)])
    low, high = stage(network, arrays, before), stage(network, arrays, after)
    goal = final._state[:n]
    swing = np.abs(goal - first._state[:n])
    reach = np.maximum(_SETTLED_PART * swing, _SETTLED_VOLTS)
    # A node that hangs on leakage never arrives; nothing waits for it.
    reach[final._ohms > _PACE_OHMS * 10] = np.inf
    waves = follow(
        first,
        breaks,
        np.stack([low, high, high]),
        watch,
        swing=swing,
        first_s=np.full(batch, edge_s / _FIRST_PART),
        goal=goal,
        reach=reach,
        error_volts=error_volts,
    )
    return StepResponse(before=first, after=final, waves=waves, solved=first.solved & final.solved & waves.complete)


def follow(
    start: DcSolution,
    breaks: Vector,
    levels: Vector,
    watch: Sequence[str],
    *,
    swing: Vector,
    first_s: Vector,
    goal: Vector | None = None,
    reach: Vector | None = None,
    error_volts: float = STEP_ERROR_VOLTS,
) -> Waves:
    """Follow a circuit from an operating point through piecewise linear waveforms of its fixed nodes.

    Parameters
    ----------
    start : DcSolution
    breaks : ndarray, shape (corners, batch)
        Times of the waveforms' corners, first to last [s].
    levels : ndarray, shape (corners, fixed, batch)
        Fixed voltages there [V], in the order of the sorted names of fixed nodes.
    watch : sequence of str
    swing : ndarray, shape (unknown, batch)
        How far each unknown node is expected to move [V].
    first_s : ndarray, shape (batch,)
        First step after each corner [s].
    goal, reach : ndarray, shape (unknown, batch), optional
        A member ends early once every unknown is this close to its goal [V].
    error_volts : float
        Local error allowed per step [V].
    """
    arrays = start._arrays
    rows = [arrays.names.index(node) for node in watch]
    times, volts, corners, count, complete = _march(
        _dynamics(arrays),
        start._state,
        breaks,
        levels,
        rows,
        first_s=first_s,
        stride=np.maximum(_STRIDE_PART * swing[[row for row in rows if row < arrays.unknown]], _STRIDE_VOLTS),
        goal=goal,
        reach=reach,
        error_volts=error_volts,
    )
    return Waves(
        times=times,
        volts={node: volts[k] for k, node in enumerate(watch)},
        corners=corners,
        count=count,
        complete=complete,
    )
