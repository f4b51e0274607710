"""A network laid out as arrays, batch on the last axis, and the evaluation of all its branches at once.

Every device is taken apart into resistors, sources, junctions with the flows they control, channels and capacitors;
incidence matrices put the currents and their derivatives where they belong.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from levelcrossing.devices import THERMAL_VOLTS
from levelcrossing.elimination import Elimination, plan_elimination
from levelcrossing.network import GROUND, Branch, Network, Value, Vector, common_values

Flags = npt.NDArray[np.bool_]
Index = npt.NDArray[np.intp]

# Conductance across every junction and channel, the usual one of circuit simulators [S].
GMIN = 1e-12
_HOTTEST = 300.0


@dataclass(slots=True, eq=False)
class Arrays:
    """A network laid out for evaluation; every value array has shape ``(count, batch)`` or ``(count, 1)``.

    Attributes
    ----------
    names : tuple of str
        Unknown nodes (inner nodes of devices last), then fixed ones.
    unknown : int
        How many of them are unknown.
    base : ndarray
        Constant part of the conductance matrix, ``(slots, batch or 1)``; slots as ``elimination`` has them.
    elimination : Elimination
        How systems with this matrix are solved.
    """

    names: tuple[str, ...]
    unknown: int
    inner: Mapping[str, int]
    # resistors and leakage: current from p to q
    res_p: Index
    res_q: Index
    res_g: Vector
    # sources
    src_amps: Vector
    # junctions
    jun_a: Index
    jun_c: Index
    jun_is: Vector
    jun_nvt: Vector
    jun_off: Vector
    jun_crit: Vector
    jun_tt: Vector
    leaky: bool
    # flows of junction currents: from p to q, times a weight
    flow_j: Index
    flow_w: Vector
    # channels
    mos_d: Index
    mos_g: Index
    mos_s: Index
    mos_p: Vector
    mos_vt: Vector
    mos_k: Vector
    # capacitors
    cap_p: Index
    cap_q: Index
    cap_f: Vector
    # incidence: unknowns by (resistors, sources, flows, channels); matrix entries by (flow g, mos g, s, d)
    into: Vector
    spread: Vector
    base: Vector
    elimination: Elimination

    @property
    def linear(self) -> bool:
        """Nothing but resistors and sources: one step solves it."""
        return not (self.jun_a.size or self.mos_d.size)

    def taken(self, members: Index) -> Arrays:
        """Return the arrays of some members only."""
        changes = {name: getattr(self, name)[:, members] for name in _BATCHED if getattr(self, name).shape[1] > 1}
        twin = object.__new__(Arrays)
        for name in _SLOTS:
            setattr(twin, name, changes.get(name, getattr(self, name)))
        return twin

    def junction_volts(self, volts: Vector) -> Vector:
        """Return the voltage across every junction, offsets taken off [V]."""
        return volts[self.jun_a] - volts[self.jun_c] - self.jun_off

    def junctions(self, across: Vector) -> tuple[Vector, Vector]:
        """Return current [A] and conductance [S] of every junction at given voltages [V]."""
        hot = np.exp(np.minimum(across / self.jun_nvt, _HOTTEST))
        hot *= self.jun_is
        amps = hot - self.jun_is
        if self.leaky:
            # Beyond 3 N VT of reverse voltage the usual simulators let the current approach -IS by a cubic instead of
            # by the exponential; it differs by 5 % of IS, which shows for Schottky diodes behind large resistors.
            knee = 3.0 * self.jun_nvt
            reverse = across < -knee
            if reverse.any():
                back = np.where(reverse, across, -knee)
                cubic = (knee / (math.e * back)) ** 3
                amps = np.where(reverse, -self.jun_is * (1.0 + cubic), amps)
                hot = np.where(reverse, 3.0 * self.jun_is * cubic / back * self.jun_nvt, hot)
        hot /= self.jun_nvt
        hot += GMIN
        amps += GMIN * across
        return amps, hot

    def evaluate(self, volts: Vector, limited: Vector | None = None) -> tuple[Vector, Vector, Vector, Vector]:
        """Return what every branch carries, and how that changes.

        Parameters
        ----------
        volts : ndarray, shape (nodes, batch)
            Node voltages [V].
        limited : ndarray, shape (junctions, batch), optional
            Junction voltages to linearise at [V]; those of the nodes when missing.

        Returns
        -------
        flows : ndarray, shape (branches, batch)
            Currents [A] of resistors, sources, junction flows and channels, linearised to ``volts``.
        slopes : ndarray
            Conductances [S] in the order of ``spread``'s columns.
        junction_amps, junction_siemens : ndarray
            Of the junctions themselves; the currents linearised to ``volts`` too.
        """
        batch = volts.shape[1]
        n_res, n_src, n_flow, n_mos = self.res_p.size, self.src_amps.shape[0], self.flow_j.size, self.mos_d.size
        flows = np.empty((n_res + n_src + n_flow + n_mos, batch))
        slopes = np.empty((n_flow + 3 * n_mos, batch))
        amps = siemens = _NOTHING
        at = 0
        if n_res:
            np.subtract(volts[self.res_p], volts[self.res_q], out=flows[:n_res])
            flows[:n_res] *= self.res_g
            at = n_res
        if n_src:
            flows[at : at + n_src] = self.src_amps
            at += n_src
        if n_flow:
            across = self.junction_volts(volts)
            if limited is None:
                amps, siemens = self.junctions(across)
            else:
                amps, siemens = self.junctions(limited)
                amps += siemens * (across - limited)
            np.multiply(self.flow_w, amps[self.flow_j], out=flows[at : at + n_flow])
            np.multiply(self.flow_w, siemens[self.flow_j], out=slopes[:n_flow])
            at += n_flow
        if n_mos:
            gate = volts[self.mos_g]
            drop_s = self.mos_p * (gate - volts[self.mos_s]) - self.mos_vt
            drop_d = self.mos_p * (gate - volts[self.mos_d]) - self.mos_vt
            np.maximum(drop_s, 0.0, out=drop_s)
            np.maximum(drop_d, 0.0, out=drop_d)
            # K/2 (s² - d²) = K/2 (s - d)(s + d)
            difference = self.mos_k * (drop_s - drop_d)
            np.multiply(difference, drop_s + drop_d, out=flows[at:])
            flows[at:] *= 0.5 * self.mos_p
            flows[at:] += GMIN * (volts[self.mos_d] - volts[self.mos_s])
            slopes[n_flow : n_flow + n_mos] = difference
            np.multiply(self.mos_k, drop_s, out=slopes[n_flow + n_mos : n_flow + 2 * n_mos])
            np.multiply(self.mos_k, drop_d, out=slopes[n_flow + 2 * n_mos :])
        return flows, slopes, amps, siemens

    def matrix(self, slopes: Vector) -> Vector:
        """Return the entries of the conductance matrix [S], shape ``(slots, batch)``."""
        entries = self.spread @ slopes
        entries += self.base
        return entries

    def limit(self, new: Vector, old: Vector) -> Vector:
        """Return junction voltages [V] for the next linearisation: no step may outrun the exponential."""
        step = new - old
        fast = (new > self.jun_crit) & (np.abs(step) > 2.0 * self.jun_nvt)
        if not fast.any():
            return new
        nvt = np.broadcast_to(self.jun_nvt, new.shape)[fast]
        crit = np.broadcast_to(self.jun_crit, new.shape)[fast]
        before, after = old[fast], new[fast]
        ratio = 1.0 + (after - before) / nvt
        grown = np.where(ratio > 0, before + nvt * np.log(np.maximum(ratio, 1e-300)), crit)
        started = nvt * np.log(np.maximum(after / nvt, 1e-300))
        out = new.copy()
        out[fast] = np.where(before > 0, grown, started)
        return out


_NOTHING: Vector = np.empty((0, 1))
_SLOTS = tuple(Arrays.__dataclass_fields__)
_BATCHED = (
    "res_g",
    "src_amps",
    "jun_is",
    "jun_nvt",
    "jun_off",
    "jun_crit",
    "jun_tt",
    "flow_w",
    "mos_p",
    "mos_vt",
    "mos_k",
    "cap_f",
    "base",
)


class _Layout:
    """Collects what branches consist of."""

    def __init__(self, network: Network) -> None:
        self.inner: dict[str, int] = {}
        self.index: dict[str, int] = {name: i for i, name in enumerate(network.nodes)}
        inner_names = []
        for branch in network.branches:
            key = {"diode": "series_ohms", "bipolar": "base_ohms"}.get(branch.kind)
            if key and np.any(np.asarray(branch.value(key)) > 0):
                name = f"{branch.label}\0"
                self.inner[branch.label] = self.index[name] = len(self.index)
                inner_names.append(name)
        self.unknown = len(self.index)
        held = sorted(network.fixed)
        for name in held:
            self.index[name] = len(self.index)
        self.names = (*network.nodes, *inner_names, *held)
        self.res: list[tuple[int, int, Value]] = []
        self.src: list[tuple[int, int, Value]] = []
        self.jun: list[tuple[int, int, Value, Value, Value, Value]] = []
        self.flow: list[tuple[int, int, int, Value]] = []
        self.mos: list[tuple[int, int, int, Value, Value, Value]] = []
        self.cap: list[tuple[int, int, Value]] = []
        # rows of each branch's own parts: kind of row and number, for reading currents back
        self.parts: dict[str, list[tuple[str, int]]] = {}
        for branch in network.branches:
            self.add(branch)

    def add(self, branch: Branch) -> None:
        nodes = [self.index[node] for node in branch.nodes]
        parts = self.parts.setdefault(branch.label, [])
        if branch.kind == "resistor":
            parts.append(("res", len(self.res)))
            self.res.append((nodes[0], nodes[1], 1.0 / np.maximum(np.asarray(branch.values["ohms"]), 1e-6)))
        elif branch.kind == "current":
            parts.append(("src", len(self.src)))
            self.src.append((nodes[0], nodes[1], branch.values["amps"]))
        elif branch.kind == "capacitor":
            self.capacitor(nodes[0], nodes[1], branch.values["farads"])
        elif branch.kind == "diode":
            self.diode(branch, nodes[0], nodes[1], parts)
        elif branch.kind == "bipolar":
            self.bipolar(branch, nodes, parts)
        else:
            self.mosfet(branch, nodes, parts)

    def capacitor(self, p: int, q: int, farads: Value) -> None:
        if np.any(np.asarray(farads) > 0):
            self.cap.append((p, q, farads))

    def junction(self, a: int, c: int, isat: Value, ideality: Value, offset: Value = 0.0, transit: Value = 0.0) -> int:
        self.jun.append((a, c, isat, np.asarray(ideality) * THERMAL_VOLTS, offset, transit))
        return len(self.jun) - 1

    def plain(self, a: int, c: int, parts: list[tuple[str, int]], *values: Value) -> None:
        """Add a junction whose current flows from its anode to its cathode."""
        parts.append(("flow", len(self.flow)))
        self.flow.append((a, c, self.junction(a, c, *values), 1.0))

    def diode(self, branch: Branch, anode: int, cathode: int, parts: list[tuple[str, int]]) -> None:
        inside = anode
        if branch.label in self.inner:
            inside = self.inner[branch.label]
            parts.append(("res", len(self.res)))
            ohms = np.maximum(np.asarray(branch.value("series_ohms")), 1e-3)
            self.res.append((anode, inside, 1.0 / ohms))
        self.plain(
            inside,
            cathode,
            parts,
            branch.values["saturation_amps"],
            branch.values["ideality"],
            0.0,
            branch.value("transit_s"),
        )
        self.capacitor(inside, cathode, branch.value("junction_farads"))
        if "zener_amps" in branch.values:
            self.plain(
                cathode,
                inside,
                parts,
                branch.values["zener_amps"],
                branch.value("zener_ideality", 1.0),
                branch.value("zener_offset_volts"),
            )

    def bipolar(self, branch: Branch, nodes: Sequence[int], parts: list[tuple[str, int]]) -> None:
        collector, base, emitter = nodes
        if branch.label in self.inner:
            inside = self.inner[branch.label]
            parts.append(("res", len(self.res)))
            self.res.append((base, inside, 1.0 / np.maximum(np.asarray(branch.value("base_ohms")), 1e-3)))
            base = inside
        npn = float(np.ravel(branch.values["polarity"])[0]) > 0
        isat = branch.values["saturation_amps"]
        for far, other, beta, transit in (
            (emitter, collector, branch.values["beta_forward"], branch.value("transit_s")),
            (collector, emitter, branch.values["beta_reverse"], branch.value("reverse_transit_s")),
        ):
            ends = (base, far) if npn else (far, base)
            number = self.junction(*ends, isat, 1.0, 0.0, transit)
            across = (other, far) if npn else (far, other)
            parts.append(("flow", len(self.flow)))
            self.flow.append((*across, number, 1.0))
            parts.append(("flow", len(self.flow)))
            self.flow.append((*ends, number, 1.0 / np.asarray(beta)))
        self.capacitor(base, emitter, branch.value("cbe_farads"))
        self.capacitor(base, collector, branch.value("cbc_farads"))

    def mosfet(self, branch: Branch, nodes: Sequence[int], parts: list[tuple[str, int]]) -> None:
        drain, gate, source = nodes
        parts.append(("mos", len(self.mos)))
        values = branch.values
        self.mos.append((drain, gate, source, values["polarity"], values["threshold_volts"], values["gain"]))
        if "body_amps" in values:
            channel_n = float(np.ravel(values["polarity"])[0]) > 0
            ends = (source, drain) if channel_n else (drain, source)
            self.plain(*ends, parts, values["body_amps"], branch.value("body_ideality", 1.0))
        self.capacitor(gate, source, branch.value("cgs_farads"))
        self.capacitor(gate, drain, branch.value("cgd_farads"))
        self.capacitor(drain, source, branch.value("cds_farads"))

    def groups_without_path(self) -> list[set[int]]:
        """Return groups of unknown nodes that no conducting branch links to a fixed node."""
        parent = list(range(len(self.names)))

        def root(node: int) -> int:
            while parent[node] != node:
                parent[node] = parent[parent[node]]
                node = parent[node]
            return node

        links = [(p, q) for p, q, _ in self.res]
        links += [(a, c) for a, c, *_ in self.jun]
        links += [(d, s) for d, _, s, *_ in self.mos]
        for p, q in links:
            parent[root(p)] = root(q)
        held = {root(node) for node in range(self.unknown, len(self.names))}
        groups: dict[int, set[int]] = {}
        for node in range(self.unknown):
            if root(node) not in held:
                groups.setdefault(root(node), set()).add(node)
        return sorted(groups.values(), key=min)


def _column(rows: Sequence[tuple[Any, ...]], position: int) -> Index:
    return np.array([row[position] for row in rows], dtype=np.intp)


def _values(rows: Sequence[tuple[Any, ...]], position: int) -> Vector:
    return common_values([row[position] for row in rows])


def lay_out(network: Network) -> tuple[Arrays, tuple[frozenset[str], ...], Mapping[str, list[tuple[str, int]]]]:
    """Return the network as arrays, the groups of nodes without any path, and the rows of each branch."""
    plan = _Layout(network)
    loose = plan.groups_without_path()
    ground = plan.names.index(GROUND)
    plan.res.extend((node, ground, GMIN) for group in loose for node in sorted(group))
    n, total = plan.unknown, len(plan.names)
    flow_pq = [(p, q) for p, q, *_ in plan.flow]
    ends = (
        [(p, q) for p, q, _ in plan.res]
        + [(p, q) for p, q, _ in plan.src]
        + flow_pq
        + [(d, s) for d, _, s, *_ in plan.mos]
    )
    into = np.zeros((total, len(ends)))
    for column, (p, q) in enumerate(ends):
        into[p, column] += 1.0
        into[q, column] -= 1.0
    n_mos = len(plan.mos)
    spread = np.zeros((total, total, len(plan.flow) + 3 * n_mos))
    for column, (p, q, j, _) in enumerate(plan.flow):
        a, c = plan.jun[j][:2]
        for row, sign in ((p, 1.0), (q, -1.0)):
            spread[row, a, column] += sign
            spread[row, c, column] -= sign
    for number, (d, g, s, *_) in enumerate(plan.mos):
        for node, sign, offset in ((g, 1.0, 0), (s, -1.0, 1), (d, 1.0, 2)):
            column = len(plan.flow) + offset * n_mos + number
            spread[d, node, column] += sign
            spread[s, node, column] -= sign
    res_g = _values(plan.res, 2)
    width = res_g.shape[1] if plan.res else 1
    base = np.zeros((total, total, width))
    for row, (p, q, _) in enumerate(plan.res):
        base[p, p] += res_g[row]
        base[q, q] += res_g[row]
        base[p, q] -= res_g[row]
        base[q, p] -= res_g[row]
    for d, _, s, *_ in plan.mos:
        for p, q in ((d, s), (s, d)):
            base[p, p] += GMIN
            base[p, q] -= GMIN
    elimination = plan_elimination((base[:n, :n] != 0).any(axis=2) | (spread[:n, :n] != 0).any(axis=2))
    isat, nvt = _values(plan.jun, 2), _values(plan.jun, 3)
    arrays = Arrays(
        names=plan.names,
        unknown=n,
        inner=plan.inner,
        res_p=_column(plan.res, 0),
        res_q=_column(plan.res, 1),
        res_g=res_g,
        src_amps=_values(plan.src, 2),
        jun_a=_column(plan.jun, 0),
        jun_c=_column(plan.jun, 1),
        jun_is=isat,
        jun_nvt=nvt,
        jun_off=_values(plan.jun, 4),
        jun_crit=nvt * np.log(nvt / (math.sqrt(2.0) * isat)) if plan.jun else _NOTHING,
        jun_tt=_values(plan.jun, 5),
        leaky=bool(plan.jun) and bool((isat > 1e-11).any()),
        flow_j=_column(plan.flow, 2),
        flow_w=_values(plan.flow, 3),
        mos_d=_column(plan.mos, 0),
        mos_g=_column(plan.mos, 1),
        mos_s=_column(plan.mos, 2),
        mos_p=_values(plan.mos, 3),
        mos_vt=_values(plan.mos, 4),
        mos_k=_values(plan.mos, 5),
        cap_p=_column(plan.cap, 0),
        cap_q=_column(plan.cap, 1),
        cap_f=_values(plan.cap, 2),
        into=into,
        spread=np.ascontiguousarray(spread[:n, :n].reshape(n * n, spread.shape[2])[elimination.flat]),
        base=np.ascontiguousarray(base[:n, :n].reshape(n * n, width)[elimination.flat]),
        elimination=elimination,
    )
    return arrays, tuple(frozenset(plan.names[i] for i in group) for group in loose), plan.parts
