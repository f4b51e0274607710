"""Networks: what is refused, and how batches are joined and taken apart."""

from __future__ import annotations

import numpy as np
import pytest

from levelcrossing import devices as d
from levelcrossing.network import Branch, Network, slices, stack, topology
from levelcrossing.solve import solve_dc


def network(*parts: Branch, **fixed: float) -> Network:
    return Network(branches=parts, fixed=fixed)


def test_stacking_keeps_order_and_values() -> None:
    def divider(lower: float, name: str) -> Network:
        parts = (d.resistor(f"{name}1", "in", name, 1e3), d.resistor(f"{name}2", name, "0", lower))
        return Network(branches=parts, fixed={"in": 5.0})

    renamed = [divider(1e3, "x").canonical(), divider(4e3, "y").canonical()]
    assert topology(renamed[0][0]) == topology(renamed[1][0])
    found = solve_dc(stack([n for n, _ in renamed]))
    parts = slices([n for n, _ in renamed])
    node = next(new for new, old in renamed[1][1].items() if old == "y")
    assert found.volts[node][parts[0]] == pytest.approx([2.5])
    assert found.volts[node][parts[1]] == pytest.approx([4.0])
    with pytest.raises(ValueError, match="different topology"):
        stack([divider(1e3, "x"), Network(branches=(d.resistor("R", "in", "x", 1.0),), fixed={"in": 1.0})])


def test_malformed_branches_are_refused() -> None:
    with pytest.raises(ValueError, match="no branch kind"):
        Branch(kind="inductor", label="L1", nodes=("a", "b"), values={})
    with pytest.raises(ValueError, match="has 2 nodes"):
        Branch(kind="resistor", label="R1", nodes=("a",), values={"ohms": 1.0})
    with pytest.raises(ValueError, match="missing"):
        Branch(kind="resistor", label="R1", nodes=("a", "b"), values={})
    with pytest.raises(ValueError, match="two branches"):
        network(d.resistor("R1", "a", "0", 1.0), d.resistor("R1", "a", "0", 1.0))
    with pytest.raises(ValueError, match="batch sizes"):
        network(d.resistor("R1", "a", "0", np.ones(2)), d.resistor("R2", "a", "0", np.ones(3)))


def test_members_can_be_taken_in_any_order_and_number() -> None:
    """Also when nothing differs between them: the batch has the size that was asked for."""
    plain = network(d.resistor("R1", "A", "x", 1e3), d.resistor("R2", "x", "0", 1e3), A=5.0)
    assert plain.taking(np.array([0, 0, 0])).batch == 3
    spread = Network(branches=plain.branches, fixed={"A": np.array([1.0, 2.0, 3.0])})
    assert solve_dc(spread.taking(np.array([2, 0]))).volts["x"] == pytest.approx([1.5, 0.5])
    assert spread.member(1).fixed["A"] == 2.0


def test_a_branch_can_be_left_out() -> None:
    whole = network(d.resistor("R1", "A", "x", 1e3), d.resistor("R2", "x", "0", 1e3), A=5.0)
    assert solve_dc(whole.without("R2")).volts["x"] == pytest.approx([5.0])
