"""The operating point: all members of a batch at once, by Newton's method on node voltages.

Rails and ideal drivers are fixed nodes and no unknowns. Arrays carry the batch on the last axis. Junction voltages are
limited between iterations, nothing else is; whatever comes out is gated on its true Kirchhoff residual. Members that do
not pass go through damped iteration, steps of conductance to ground, steps of the sources and slow settling, in this
order; what still fails is called unsolved.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from levelcrossing.arrays import Arrays, Flags, lay_out
from levelcrossing.network import Branch, Network, Value, Vector

# A node whose resistance to all fixed nodes exceeds this hangs on leakage alone [ohm].
FLOATING_OHMS = 2e8
# Newton is done when the answer lies this close to the point of linearisation [V].
_CLOSE_VOLTS = 1e-8
# Kirchhoff's law holds when a node's currents cancel to this fraction of what flows through it, plus a floor [A].
_RESIDUAL_FRACTION, _RESIDUAL_AMPS = 1e-6, 1e-12
# A balance of larger currents than this is no answer: something bare lies across stiff supplies [A].
_MOST_AMPS = 1e3
_ITERATIONS = 60
_LONGEST = 300


# --------------------------------------------------------------------------------------------------------------- Newton


def _residual(arrays: Arrays, volts: Vector, extra: Vector | float = 0.0) -> tuple[Vector, Vector]:
    """Return by member how far Kirchhoff's law is missed [A], and by how much it may be [A]."""
    n = arrays.unknown
    with np.errstate(all="ignore"):
        flows = arrays.evaluate(volts)[0]
        missed = np.abs(arrays.into[:n] @ flows + extra * volts[:n])
        through = np.abs(arrays.into[:n]) @ np.abs(flows)
        ratio = missed / (_RESIDUAL_AMPS + _RESIDUAL_FRACTION * through)
        ratio[through > _MOST_AMPS] = np.inf
    worst = np.where(np.isfinite(ratio), ratio, np.inf)
    return worst.max(axis=0, initial=0.0), missed.max(axis=0, initial=0.0)


def _newton(
    arrays: Arrays,
    volts: Vector,
    *,
    extra: float = 0.0,
    anchor: Vector | None = None,
    longest_step: float = math.inf,
    iterations: int = _ITERATIONS,
) -> tuple[Vector, Flags]:
    """Iterate from ``volts`` (all nodes, fixed ones in place); return new voltages and which members converged.

    ``extra`` is a conductance [S] from every unknown node to ground, or to the voltages ``anchor`` [V];
    ``longest_step`` bounds a step of any node [V].
    """
    n = arrays.unknown
    out = volts.copy()
    done = np.zeros(volts.shape[1], dtype=bool)
    live = np.arange(volts.shape[1])
    part, v = arrays, volts.copy()
    limited = part.junction_volts(v)
    limited = np.minimum(limited, part.jun_crit) if limited.size else limited
    diagonal = arrays.elimination.diagonal
    with np.errstate(all="ignore"):
        for _ in range(iterations):
            flows, slopes, _, _ = part.evaluate(v, limited)
            right = part.into[:n] @ flows
            matrix = part.matrix(slopes)
            if extra:
                matrix[diagonal] += extra
                right += extra * (v[:n] if anchor is None else v[:n] - anchor[:, live])
            step = part.elimination.solve(matrix, right)
            size = np.abs(step).max(axis=0, initial=0.0)
            if math.isfinite(longest_step):
                step *= np.minimum(1.0, longest_step / np.maximum(size, 1e-300))
            v[:n] -= step
            settled = size < _CLOSE_VOLTS
            if part.linear:
                settled = np.isfinite(size)
            elif limited.size:
                wished = part.junction_volts(v)
                limited_next = part.limit(wished, limited)
                settled &= np.abs(wished - limited).max(axis=0) < _CLOSE_VOLTS
                limited = limited_next
            lost = ~np.isfinite(size)
            stop = settled | lost
            if stop.any():
                if stop.all():
                    out[:, live] = v
                    done[live] = settled & ~lost
                    return out, done
                # Members that are done drop out once they are a fair share; copying costs about one iteration.
                if np.count_nonzero(stop) * 3 >= stop.size:
                    gone = live[stop]
                    out[:, gone] = v[:, stop]
                    done[gone] = settled[stop] & ~lost[stop]
                    keep = np.flatnonzero(~stop)
                    live, part, v, limited = live[keep], part.taken(keep), v[:, keep], limited[:, keep]
                    settled, lost = settled[keep], lost[keep]
        out[:, live] = v
        done[live] = settled & ~lost
    return out, done


def _gated(arrays: Arrays, volts: Vector) -> Flags:
    ratio, _ = _residual(arrays, volts)
    good: Flags = ratio <= 1.0
    return good


def _rescue(arrays: Arrays, start: Vector) -> tuple[Vector, Flags, tuple[str, ...]]:
    """Try the slower ways, in order, on members that Newton's method alone did not solve."""
    n = arrays.unknown
    cold = start.copy()
    cold[:n] = 0.0
    best = cold.copy()
    good = np.zeros(start.shape[1], dtype=bool)
    used: list[str] = []
    ways = (
        ("damped", _damped),
        ("conductance steps", _by_conductance),
        ("source steps", _by_sources),
        ("slow settling", _by_settling),
    )
    for name, way in ways:
        open_ = np.flatnonzero(~good)
        if not open_.size:
            break
        used.append(name)
        part = arrays.taken(open_)
        found = way(part, cold[:, open_].copy())
        passed = _gated(part, found)
        best[:, open_[passed]] = found[:, passed]
        good[open_[passed]] = True
    return best, good, tuple(used)


def _damped(arrays: Arrays, volts: Vector) -> Vector:
    return _newton(arrays, volts, longest_step=0.3, iterations=_LONGEST)[0]


def _by_conductance(arrays: Arrays, volts: Vector) -> Vector:
    conductance = 1e-2
    while conductance > 1e-13:
        volts = np.nan_to_num(_newton(arrays, volts, extra=conductance, longest_step=0.5, iterations=100)[0])
        conductance /= 4.0
    return _newton(arrays, volts, longest_step=0.3, iterations=_LONGEST)[0]


def _by_sources(arrays: Arrays, volts: Vector) -> Vector:
    n = arrays.unknown
    goal = volts[n:].copy()
    amps = arrays.src_amps
    part = arrays.taken(np.arange(volts.shape[1]))
    for share in np.linspace(0.05, 1.0, 20):
        volts[n:] = goal * share
        part.src_amps = amps * share
        volts = np.nan_to_num(_newton(part, volts, longest_step=0.3, iterations=_LONGEST)[0])
    return volts


# ------------------------------------------------------------------------------------------------------------- solution


def _by_settling(arrays: Arrays, volts: Vector) -> Vector:
    """Let every node settle like a capacitor, in ever longer steps: leads a circuit with memory into a stable state."""
    n = arrays.unknown
    extra = 1.0
    for _ in range(120):
        moved, converged = _newton(arrays, volts, extra=extra, anchor=volts[:n].copy(), longest_step=0.5, iterations=60)
        volts = np.where(converged & np.isfinite(moved).all(axis=0), moved, volts)
        # One pace for all: a member that fails stays where it is while the steps shorten again.
        extra = extra / 2.0 if converged.all() else extra * 3.0
        if extra < 1e-12:
            break
    return _newton(arrays, volts, longest_step=0.3, iterations=_LONGEST)[0]


@dataclass(frozen=True, kw_only=True, eq=False)
class DcSolution:
    """The operating points of a batch.

    Parameters
    ----------
    network : Network
    volts : mapping from node to ndarray, shape (batch,)
        Voltage of every node [V], fixed ones included.
    solved : ndarray of bool, shape (batch,)
        Whether Kirchhoff's law holds at the answer.
    residual_amps : ndarray, shape (batch,)
        By how much it is missed at the worst node [A].
    rescued : tuple of str
        Which slower ways were needed for some member.
    structural : tuple of str
        Junctions and channels that lie straight across two fixed nodes: what they carry means nothing.
    """

    network: Network
    volts: Mapping[str, Vector]
    solved: Flags
    residual_amps: Vector
    rescued: tuple[str, ...]
    structural: tuple[str, ...]
    _arrays: Arrays
    _state: Vector
    _loose: tuple[frozenset[str], ...]
    _parts: Mapping[str, list[tuple[str, int]]]

    @cached_property
    def floats(self) -> Mapping[str, Flags]:
        """Unknown nodes that hang on leakage alone in some member, each with flags by member.

        Either no conducting branch links the node to a fixed one, or all that do are off: the resistance that the node
        sees at the operating point exceeds 200 megohm.
        """
        arrays, n = self._arrays, self._arrays.unknown
        outer = len(self.network.nodes)
        ohms = self._ohms
        out: dict[str, Flags] = {}
        for i in range(min(outer, n)):
            hanging = ohms[i] > FLOATING_OHMS
            if hanging.any():
                out[arrays.names[i]] = hanging
        return out

    @cached_property
    def _ohms(self) -> Vector:
        arrays, n = self._arrays, self._arrays.unknown
        batch = self._state.shape[1]
        with np.errstate(all="ignore"):
            _, slopes, _, _ = arrays.evaluate(self._state)
            matrix = arrays.matrix(slopes)
            eye = np.eye(n)
            # Only the outer nodes are asked about, one right-hand side each.
            out = np.empty((n, batch))
            for i in range(n):
                right = np.repeat(eye[:, i : i + 1], batch, axis=1)
                out[i] = arrays.elimination.solve(matrix.copy(), right)[i]
        return np.where(np.isfinite(out) & (out > 0), out, np.inf)

    def node_ohms(self, node: str) -> Vector:
        """Return the small-signal resistance that a node sees at the operating point [ohm], shape (batch,)."""
        names = self._arrays.names
        position = names.index(node)
        if position >= self._arrays.unknown:
            return np.zeros(self._state.shape[1])
        ohms: Vector = self._ohms[position]
        return ohms

    @property
    def floating(self) -> frozenset[str]:
        """Nodes that hang on leakage alone in at least one member."""
        return frozenset(self.floats)

    @cached_property
    def _flows(self) -> Vector:
        with np.errstate(all="ignore"):
            return self._arrays.evaluate(self._state)[0]

    def branch_amps(self, label: str) -> Vector:
        """Return the current into each terminal of a branch [A], shape ``(terminals, batch)``.

        Terminals come in the order of the branch's nodes. A capacitor carries none.
        """
        branch = self.network.branch(label)
        arrays = self._arrays
        starts = {
            "res": 0,
            "src": arrays.res_p.size,
            "flow": arrays.res_p.size + arrays.src_amps.shape[0],
            "mos": arrays.res_p.size + arrays.src_amps.shape[0] + arrays.flow_j.size,
        }
        rows = [starts[kind] + number for kind, number in self._parts[label]]
        batch = self._state.shape[1]
        out = np.zeros((len(branch.nodes), batch))
        if rows:
            at_nodes = arrays.into[:, rows] @ self._flows[rows]
            for terminal, node in enumerate(branch.nodes):
                if branch.nodes.index(node) == terminal:
                    out[terminal] = at_nodes[arrays.names.index(node)]
        return out

    def amps_from(self, node: str) -> Vector:
        """Return the current that a fixed node supplies to the circuit [A], shape (batch,)."""
        position = self._arrays.names.index(node)
        out: Vector = self._arrays.into[position] @ self._flows
        return out

    @property
    def why(self) -> str:
        """What is wrong, in circuit words; empty when nothing is."""
        notes = []
        for label in self.structural:
            branch = self.network.branch(label)
            ends = _main_ends(branch)
            notes.append(f"{label} lies straight across {ends[0]} and {ends[1]} with nothing to limit its current")
        for group in self._loose:
            outer = sorted(group & set(self.network.nodes))
            if outer:
                verb = "hangs" if len(outer) == 1 else "hang"
                notes.append(f"{' and '.join(outer)} {verb} on nothing that conducts: no path to any supply or ground")
        reported = {node for group in self._loose for node in group}
        off = sorted(node for node in self.floating if node not in reported)
        if off:
            verb = "is" if len(off) == 1 else "are"
            notes.append(f"{' and '.join(off)} {verb} held by leakage alone: everything that could hold it is off")
        bad = int(np.count_nonzero(~self.solved))
        if bad:
            notes.append(f"no voltages satisfy Kirchhoff's law in {bad} of {self.solved.size} cases")
        return "; ".join(notes)


def _main_ends(branch: Branch) -> tuple[str, str]:
    return branch.nodes[0], branch.nodes[-1]


def _across_fixed(network: Network) -> tuple[str, ...]:
    found = []
    for branch in network.branches:
        if branch.kind not in ("diode", "mosfet"):
            continue
        a, b = _main_ends(branch)
        if a != b and a in network.fixed and b in network.fixed:
            found.append(branch.label)
    return tuple(found)


def starting_volts(network: Network, arrays: Arrays, start: DcSolution | Mapping[str, Value] | None) -> Vector:
    """Return node voltages to start from [V], shape ``(nodes, batch)``, fixed nodes in place."""
    volts = np.zeros((len(arrays.names), network.batch))
    for i in range(arrays.unknown, len(arrays.names)):
        volts[i] = network.fixed[arrays.names[i]]
    if isinstance(start, DcSolution):
        known = start._arrays
        if known.names[: known.unknown] == arrays.names[: arrays.unknown]:
            volts[: arrays.unknown] = start._state[: known.unknown]
        else:
            start = start.volts
    if isinstance(start, Mapping):
        for i in range(arrays.unknown):
            if arrays.names[i] in start:
                volts[i] = start[arrays.names[i]]
    return volts


def solve_dc(network: Network, start: DcSolution | Mapping[str, Value] | None = None) -> DcSolution:
    """Solve the operating points of a batch.

    Parameters
    ----------
    network : Network
    start : DcSolution or mapping from node to volts, optional
        Where to start from, e.g. the nominal answer when corners are asked for: saves half the iterations.

    Returns
    -------
    DcSolution
    """
    arrays, loose, parts = lay_out(network)
    volts = starting_volts(network, arrays, start)
    found, converged = _newton(arrays, volts)
    # A voltage or value that is no number has no answer; nothing else may be made of it on the way.
    sane = np.isfinite(volts).all(axis=0)
    good = converged & _gated(arrays, found)
    rescued: tuple[str, ...] = ()
    if not (good | ~sane).all():
        open_ = np.flatnonzero(~good & sane)
        better, passed, rescued = _rescue(arrays.taken(open_), volts[:, open_])
        found[:, open_] = better
        good[open_] = passed
    good &= sane
    _, missed = _residual(arrays, found)
    return DcSolution(
        network=network,
        volts={name: found[i] for i, name in enumerate(arrays.names) if not name.endswith("\0")},
        solved=good,
        residual_amps=missed,
        rescued=rescued,
        structural=_across_fixed(network),
        _arrays=arrays,
        _state=found,
        _loose=loose,
        _parts=parts,
    )
