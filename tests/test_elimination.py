"""Elimination along the sparsity gives what a library routine gives."""

from __future__ import annotations

import numpy as np
import pytest

from levelcrossing.elimination import plan_elimination


@pytest.mark.parametrize("batch", [1, 3, 200])
@pytest.mark.parametrize("unknown", [1, 2, 5, 9])
def test_solutions_are_those_of_a_library_routine(unknown: int, batch: int) -> None:
    """Random sparsities with a dominant diagonal, small batches and large ones."""
    rng = np.random.default_rng(unknown * 1000 + batch)
    for _ in range(20):
        pattern = rng.random((unknown, unknown)) < 0.35
        plan = plan_elimination(pattern)
        matrices = np.where((pattern | pattern.T), rng.normal(size=(batch, unknown, unknown)), 0.0)
        matrices[:, np.arange(unknown), np.arange(unknown)] = 3.0 * unknown
        right = rng.normal(size=(unknown, batch))
        entries = matrices.reshape(batch, -1)[:, plan.flat].T.copy()
        assert plan.dense(entries) == pytest.approx(matrices)
        expected = np.linalg.solve(matrices, right.T[:, :, None])[:, :, 0].T
        assert plan.solve(entries, right.copy()) == pytest.approx(expected, rel=1e-10, abs=1e-12)


def test_a_tree_gets_no_fill_ins() -> None:
    """A star of six: the centre goes last, and nothing is stored beyond the star itself."""
    pattern = np.eye(7, dtype=bool)
    pattern[0, :] = True
    assert len(plan_elimination(pattern).flat) == 7 + 2 * 6


@pytest.mark.parametrize("batch", [2, 100])
def test_a_singular_member_is_not_finite_and_spoils_no_other(batch: int) -> None:
    plan = plan_elimination(np.ones((2, 2), dtype=bool))
    entries = np.tile(np.array([2.0, 1.0, 1.0, 2.0])[:, None], (1, batch))
    entries[:, 1] = [1.0, 1.0, 1.0, 1.0]
    with np.errstate(all="ignore"):
        found = plan.solve(entries, np.tile(np.array([[3.0], [3.0]]), (1, batch)))
    assert not np.isfinite(found[:, 1]).all()
    assert found[:, 0] == pytest.approx([1.0, 1.0])
