"""Circuits as the solver sees them: branches between named nodes, a batch of values on the last axis.

A node is *fixed* when something ideal holds its voltage (a rail, the source inside a driver, ground ``"0"``); fixed
nodes are eliminated, their currents follow from Kirchhoff's law. All other nodes are unknowns. Members of a batch share
one topology and differ in values (corners, states, samples).

Kinds of branch, their nodes and their values (each a float or an array of shape ``(batch,)``):

================ =========================== ======================================================================
kind             nodes                       values
================ =========================== ======================================================================
``resistor``     a, b                        ``ohms``
``capacitor``    a, b                        ``farads``
``current``      from, to                    ``amps``: flows through the branch from the first node to the second
``diode``        anode, cathode              ``saturation_amps`` ``ideality`` ``series_ohms`` ``junction_farads``
                                             ``transit_s``; a Zener also ``zener_amps`` ``zener_ideality``
                                             ``zener_offset_volts``
``bipolar``      collector, base, emitter    ``polarity`` (+1 NPN, -1 PNP) ``saturation_amps`` ``beta_forward``
                                             ``beta_reverse`` ``base_ohms`` ``cbe_farads`` ``cbc_farads``
                                             ``transit_s`` ``reverse_transit_s``
``mosfet``       drain, gate, source         ``polarity`` (+1 N, -1 P) ``threshold_volts`` ``gain`` [A/V²]
                                             ``cgs_farads`` ``cgd_farads`` ``cds_farads``; with a body diode also
                                             ``body_amps`` ``body_ideality``
================ =========================== ======================================================================
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

Vector: TypeAlias = npt.NDArray[np.float64]
Value: TypeAlias = "float | Vector"

GROUND = "0"

# How many nodes each kind has, which values it must have and which it may have.
_SHAPES: Mapping[str, tuple[int, frozenset[str], frozenset[str]]] = {
    "resistor": (2, frozenset({"ohms"}), frozenset()),
    "capacitor": (2, frozenset({"farads"}), frozenset()),
    "current": (2, frozenset({"amps"}), frozenset()),
    "diode": (
        2,
        frozenset({"saturation_amps", "ideality"}),
        frozenset(
            {"series_ohms", "junction_farads", "transit_s", "zener_amps", "zener_ideality", "zener_offset_volts"}
        ),
    ),
    "bipolar": (
        3,
        frozenset({"polarity", "saturation_amps", "beta_forward", "beta_reverse"}),
        frozenset({"base_ohms", "cbe_farads", "cbc_farads", "transit_s", "reverse_transit_s"}),
    ),
    "mosfet": (
        3,
        frozenset({"polarity", "threshold_volts", "gain"}),
        frozenset({"body_amps", "body_ideality", "cgs_farads", "cgd_farads", "cds_farads"}),
    ),
}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Branch:
    """One element between named nodes; the module's table lists kinds, nodes and values.

    Parameters
    ----------
    kind : str
    label : str
        What people call it (``R4``, ``clamp of U3.12 to +3V3``); unique within a network.
    nodes : tuple of str
    values : mapping from str to float or ndarray
        A scalar or one value per member of the batch.
    """

    kind: str
    label: str
    nodes: tuple[str, ...]
    values: Mapping[str, Value]

    def __post_init__(self) -> None:
        shape = _SHAPES.get(self.kind)
        if shape is None:
            raise ValueError(f"{self.label}: no branch kind {self.kind!r}")
        count, needed, optional = shape
        if len(self.nodes) != count:
            raise ValueError(f"{self.label}: a {self.kind} has {count} nodes, not {len(self.nodes)}")
        missing = needed - self.values.keys()
        unknown = self.values.keys() - needed - optional
        if missing or unknown:
            raise ValueError(f"{self.label}: values missing {sorted(missing)}, unknown {sorted(unknown)}")

    def value(self, name: str, default: float = 0.0) -> Value:
        """Return one value, or ``default`` when the branch does not have it."""
        return self.values.get(name, default)

    def moved(self, names: Mapping[str, str]) -> Branch:
        """Return the branch with nodes renamed; nodes that ``names`` lacks stay."""
        return Branch(
            kind=self.kind,
            label=self.label,
            nodes=tuple(names.get(node, node) for node in self.nodes),
            values=self.values,
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Network:
    """A circuit with a batch of values.

    Parameters
    ----------
    branches : tuple of Branch
    fixed : mapping from node to float or ndarray
        Nodes whose voltage is given [V]. Ground ``"0"`` is always among them.

    Attributes
    ----------
    batch : int
        How many members; every array among the values has shape ``(batch,)``.
    """

    branches: tuple[Branch, ...]
    fixed: Mapping[str, Value]
    batch: int = field(init=False)

    def __post_init__(self) -> None:
        held = dict(self.fixed)
        held.setdefault(GROUND, 0.0)
        object.__setattr__(self, "fixed", held)
        labels = [branch.label for branch in self.branches]
        if len(set(labels)) != len(labels):
            raise ValueError(f"two branches are called {next(x for x in labels if labels.count(x) > 1)!r}")
        sizes = {np.size(value) for value in self._all_values() if np.ndim(value)} - {1}
        if len(sizes) > 1:
            raise ValueError(f"values of different batch sizes: {sorted(sizes)}")
        object.__setattr__(self, "batch", sizes.pop() if sizes else 1)

    def _all_values(self) -> Iterable[Value]:
        yield from self.fixed.values()
        for branch in self.branches:
            yield from branch.values.values()

    @property
    def nodes(self) -> tuple[str, ...]:
        """Names of the unknown nodes, sorted."""
        return tuple(sorted({node for branch in self.branches for node in branch.nodes} - self.fixed.keys()))

    def branch(self, label: str) -> Branch:
        """Return the branch of this label; ``KeyError`` when there is none."""
        for branch in self.branches:
            if branch.label == label:
                return branch
        raise KeyError(label)

    def without(self, *labels: str) -> Network:
        """Return the network without some branches."""
        return Network(branches=tuple(b for b in self.branches if b.label not in labels), fixed=self.fixed)

    def holding(self, volts: Mapping[str, Value]) -> Network:
        """Return the network with other (or more) fixed voltages [V]."""
        return Network(branches=self.branches, fixed={**self.fixed, **volts})

    def taking(self, members: npt.NDArray[np.intp]) -> Network:
        """Return a network whose batch is made of some members, in the order given, repeats allowed."""

        def pick(value: Value) -> Value:
            return np.ravel(value)[members] if np.size(value) > 1 else float(np.ravel(value)[0])

        fixed = {node: pick(volts) for node, volts in self.fixed.items()}
        # Ground carries the size of the batch, should nothing else differ between the members.
        fixed[GROUND] = np.broadcast_to(fixed[GROUND], members.shape).copy()
        return Network(
            branches=tuple(
                Branch(
                    kind=branch.kind,
                    label=branch.label,
                    nodes=branch.nodes,
                    values={name: pick(value) for name, value in branch.values.items()},
                )
                for branch in self.branches
            ),
            fixed=fixed,
        )

    def member(self, index: int) -> Network:
        """Return one member of the batch as a network of batch 1."""

        def pick(value: Value) -> float:
            flat = np.ravel(value)
            return float(flat[index if flat.size > 1 else 0])

        return Network(
            branches=tuple(
                Branch(
                    kind=branch.kind,
                    label=branch.label,
                    nodes=branch.nodes,
                    values={name: pick(value) for name, value in branch.values.items()},
                )
                for branch in self.branches
            ),
            fixed={node: pick(volts) for node, volts in self.fixed.items()},
        )

    def canonical(self) -> tuple[Network, dict[str, str]]:
        """Return the network with nodes renamed by order of appearance, and the names from new to old.

        Circuits that differ only in names become equal in :func:`topology`, so that :func:`stack` can join them.
        """
        names: dict[str, str] = {GROUND: GROUND}
        for branch in self.branches:
            for node in branch.nodes:
                if node not in names:
                    names[node] = f"{'f' if node in self.fixed else 'n'}{len(names)}"
        for node in self.fixed:
            names.setdefault(node, f"f{len(names)}")
        renamed = Network(
            branches=tuple(
                Branch(
                    kind=branch.kind,
                    label=f"{position}",
                    nodes=tuple(names[node] for node in branch.nodes),
                    values=branch.values,
                )
                for position, branch in enumerate(self.branches)
            ),
            fixed={names[node]: volts for node, volts in self.fixed.items()},
        )
        return renamed, {new: old for old, new in names.items()}


def topology(network: Network) -> tuple[object, ...]:
    """Return a hashable key; networks of equal keys can be stacked."""
    return (
        tuple((b.kind, b.nodes, tuple(sorted(b.values)), _polarity(b)) for b in network.branches),
        tuple(sorted(network.fixed)),
    )


def _polarity(branch: Branch) -> float:
    return float(np.ravel(branch.value("polarity"))[0])


def stack(networks: Sequence[Network]) -> Network:
    """Join networks of equal topology into one batch, in order.

    Parameters
    ----------
    networks : sequence of Network
        All of one :func:`topology`; labels are taken from the first.

    Returns
    -------
    Network
        Its batch is the sum of theirs.
    """
    first = networks[0]
    key = topology(first)
    if any(topology(other) != key for other in networks[1:]):
        raise ValueError("networks of different topology cannot be stacked")
    if len(networks) == 1:
        return first

    def join(values: Sequence[Value]) -> Value:
        if all(np.ndim(value) == 0 for value in values) and len({float(value) for value in values}) == 1:
            return values[0]
        spread = [np.broadcast_to(np.ravel(v), (net.batch,)) for v, net in zip(values, networks, strict=True)]
        return np.concatenate(spread).astype(float)

    return Network(
        branches=tuple(
            Branch(
                kind=branch.kind,
                label=branch.label,
                nodes=branch.nodes,
                values={name: join([net.branches[i].values[name] for net in networks]) for name in branch.values},
            )
            for i, branch in enumerate(first.branches)
        ),
        fixed={node: join([net.fixed[node] for net in networks]) for node in first.fixed},
    )


def slices(networks: Sequence[Network]) -> list[slice]:
    """Return where each of the stacked networks lies within the joint batch."""
    edges = np.cumsum([0, *(network.batch for network in networks)])
    return [slice(int(a), int(b)) for a, b in pairwise(edges)]


def common_values(values: Iterable[Value]) -> Vector:
    """Stack scalars and vectors as rows of one array of shape ``(rows, batch)`` or ``(rows, 1)``."""
    rows = [np.atleast_1d(np.asarray(value, dtype=float)) for value in values]
    width = max((row.size for row in rows), default=1)
    return np.array([np.broadcast_to(row, (width,)) for row in rows]).reshape(len(rows), width)
