"""Linear systems of one sparsity, a whole batch at a time.

Conductance matrices of small circuits are nearly trees. The order of elimination and the entries that fill in are
worked out once per topology; each operation then runs over the batch. Rows are not exchanged: the diagonal of a
conductance matrix dominates nearly always, callers check every answer, and members that fail come back in a small
batch, which a library routine solves with exchanges.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Vector = npt.NDArray[np.float64]

# Below this many members per unknown, a library call per member is as fast.
_ACROSS = 4

# Row of a step: unknown, slot of the factor, pairs of slots (pivot row's entry, this row's entry).
_Row = tuple[int, int, tuple[tuple[int, int], ...]]
# Step: pivot unknown, slot of the pivot, rows below, entries right of the pivot as (unknown, slot).
_Step = tuple[int, int, tuple[_Row, ...], tuple[tuple[int, int], ...]]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Elimination:
    """How to solve systems of one sparsity.

    Parameters
    ----------
    unknown : int
        Number of unknowns.
    flat : ndarray of int
        Position ``row * unknown + column`` of each stored entry (slot), fill-ins included.
    diagonal : ndarray of int
        Slots of the diagonal, by unknown.
    steps : tuple
        The elimination, in order.
    """

    unknown: int
    flat: npt.NDArray[np.intp]
    diagonal: npt.NDArray[np.intp]
    steps: tuple[_Step, ...]

    def dense(self, entries: Vector) -> Vector:
        """Return stored entries, shape ``(slots, batch)``, as full matrices ``(batch, unknown, unknown)``."""
        n = self.unknown
        full = np.zeros((entries.shape[1], n * n))
        full[:, self.flat] = entries.T
        return full.reshape(-1, n, n) if n else full.reshape(entries.shape[1], 0, 0)

    def solve(self, entries: Vector, right: Vector) -> Vector:
        """Solve one system per member.

        Parameters
        ----------
        entries : ndarray, shape (slots, batch)
            Overwritten.
        right : ndarray, shape (unknown, batch)
            Overwritten.

        Returns
        -------
        ndarray, shape (unknown, batch)
            Not finite where a matrix is singular.
        """
        n, batch = right.shape
        if n == 0:
            return right
        if batch < _ACROSS * n:
            return _solve_each(self.dense(entries), right)
        a, r = list(entries), list(right)
        scratch = np.empty(batch)
        multiply, subtract = np.multiply, np.subtract
        for k, pivot, rows, _ in self.steps:
            inverse = a[pivot]
            np.divide(1.0, inverse, out=inverse)
            for i, slot, pairs in rows:
                factor = a[slot]
                multiply(factor, inverse, out=factor)
                for source, target in pairs:
                    multiply(factor, a[source], out=scratch)
                    subtract(a[target], scratch, out=a[target])
                multiply(factor, r[k], out=scratch)
                subtract(r[i], scratch, out=r[i])
        for k, pivot, _, entries_right in reversed(self.steps):
            for j, slot in entries_right:
                multiply(a[slot], r[j], out=scratch)
                subtract(r[k], scratch, out=r[k])
            multiply(r[k], a[pivot], out=r[k])
        return right


def _solve_each(matrices: Vector, right: Vector) -> Vector:
    columns = np.ascontiguousarray(right.T)[:, :, None]
    try:
        return np.ascontiguousarray(np.linalg.solve(matrices, columns)[:, :, 0].T)
    except np.linalg.LinAlgError:
        out = np.full(right.shape, np.nan)
        for member in range(right.shape[1]):
            try:
                out[:, member] = np.linalg.solve(matrices[member], columns[member, :, 0])
            except np.linalg.LinAlgError:
                continue
        return out


def plan_elimination(pattern: npt.NDArray[np.bool_]) -> Elimination:
    """Return the elimination for matrices whose entries lie where ``pattern`` (or its transpose) is true.

    Unknowns with the fewest neighbours go first, which keeps a tree free of fill-ins.
    """
    n = len(pattern)
    neighbours = [{j for j in range(n) if j != i and (pattern[i, j] or pattern[j, i])} for i in range(n)]
    entries = {(i, i) for i in range(n)} | {(i, j) for i in range(n) for j in neighbours[i]}
    left = set(range(n))
    order: list[tuple[int, list[int]]] = []
    while left:
        k = min(left, key=lambda node: (len(neighbours[node]), node))
        around = sorted(neighbours[k])
        order.append((k, around))
        left.remove(k)
        for i in around:
            neighbours[i].discard(k)
            neighbours[i].update(j for j in around if j != i)
            entries.update((i, j) for j in around)
    stored = sorted(entries)
    slot = {place: number for number, place in enumerate(stored)}
    steps = tuple(
        (
            k,
            slot[k, k],
            tuple((i, slot[i, k], tuple((slot[k, j], slot[i, j]) for j in around)) for i in around),
            tuple((j, slot[k, j]) for j in around),
        )
        for k, around in order
    )
    return Elimination(
        unknown=n,
        flat=np.array([i * n + j for i, j in stored], dtype=np.intp),
        diagonal=np.array([slot[i, i] for i in range(n)], dtype=np.intp),
        steps=steps,
    )
