"""Decks run as they are, say what they hold, and give in a simulator what the solver gives: within 0.1 mV."""

from __future__ import annotations

import subprocess

import numpy as np
import pytest
from against_ngspice import dc_volts
from cells import all_cells, random_network

from levelcrossing import devices as d
from levelcrossing.decks import Step, deck, safe_names
from levelcrossing.network import Network
from levelcrossing.solve import solve_dc

MILLIVOLT = 1e-3


def test_there_are_at_least_forty_cells() -> None:
    assert len(all_cells()) >= 40


def test_operating_points_of_all_cells_at_all_corners_agree_with_ngspice() -> None:
    """Both driver states, nominal values and eight corners of each cell, from the decks that users get."""
    cases = [
        (cell.name, cell.network.holding({cell.drive: volts}), member)
        for cell in all_cells()
        for volts in (cell.low, cell.high)
        for member in range(cell.network.batch)
    ]
    reference = dc_volts([(network, member) for _, network, member in cases])
    solved = {id(network): solve_dc(network) for _, network, _ in cases}
    worst = 0.0
    for (name, network, member), volts in zip(cases, reference, strict=True):
        assert volts, f"ngspice did not solve {name}, member {member}"
        ours = solved[id(network)]
        assert ours.solved[member]
        for node, expected in volts.items():
            error = abs(ours.volts[node][member] - expected)
            worst = max(worst, error)
            assert error < 0.1 * MILLIVOLT, (name, member, node)
    # Ten times better than promised: a change that only just keeps the promise should be looked at.
    assert worst < 0.01 * MILLIVOLT


def test_a_hundred_random_circuits_agree_with_ngspice() -> None:
    rng = np.random.default_rng(11)
    circuits = []
    while len(circuits) < 100:
        circuit = random_network(rng)
        found = solve_dc(circuit)
        if found.solved.all():
            circuits.append((circuit, found))
    reference = dc_volts([(circuit, 0) for circuit, _ in circuits])
    compared = 0
    for (circuit, found), volts in zip(circuits, reference, strict=True):
        assert volts, "ngspice did not solve a circuit"
        for node in circuit.nodes:
            if node not in found.floats:
                compared += 1
                assert abs(found.volts[node][0] - volts[node]) < 0.1 * MILLIVOLT
    assert compared > 400


def sample() -> Network:
    parts = (
        d.resistor("R1", "drv", "/SDA", 330.0),
        d.diode("clamp of U3.12 to +3V3", "/SDA", "+3V3", d.clamp_values()),
        d.capacitor("C1", "/SDA", "0", 15e-12),
    )
    return Network(branches=parts, fixed={"drv": 5.0, "+3V3": np.array([3.3, 3.135])})


def test_a_deck_names_parts_and_nets() -> None:
    text = deck(sample(), "tide gauge", member=1, remarks=["low corner"])
    assert text.startswith("* tide gauge\n* low corner\n")
    assert "/SDA" in text
    assert "clamp of U3.12 to +3V3" in text
    assert "DC 3.135" in text
    assert text.rstrip().endswith(".end")


def test_a_deck_runs_as_it_is(tmp_path) -> None:
    """Handed to ngspice in batch mode, both analyses print their voltages."""
    step = Step(before={"drv": 0.0}, after={"drv": 5.0}, until_s=100e-9)
    (tmp_path / "a.cir").write_text(deck(sample(), "tide gauge", step=step, watch=["/SDA"]))
    command = ["ngspice", "-b", "a.cir"]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, timeout=60, check=True)
    assert "n_sda" in done.stdout
    assert "Transient Analysis" in done.stdout
    assert "error" not in (done.stdout + done.stderr).lower()


def test_hostile_names_stay_in_their_comment() -> None:
    """Line breaks and control codes in a net name add no line to the deck; names that clean to the same stay apart."""
    nets = ["a\n.control\nshell true\n.endc", "A b", "a  B", "gnd", "\x1b[31mred"]
    parts = [d.resistor(f"R{i}\n+ x", node, "0", 1e3) for i, node in enumerate(nets)]
    parts += [d.resistor(f"P{i}", node, "5V", 1e3) for i, node in enumerate(nets)]
    network = Network(branches=tuple(parts), fixed={"5V": 5.0})
    text = deck(network, "title\n.control", remarks=["x\ny"])
    assert all(" " <= character <= "~" or character == "\n" for character in text)
    assert not [line for line in text.splitlines() if line.startswith((".control", "shell", "y"))]
    names = safe_names(network).nodes
    assert len({name.lower() for name in names.values()}) == len(names)
    volts = dc_volts([(network, 0)])[0]
    assert all(value == pytest.approx(2.5, abs=1e-6) for value in volts.values())


def test_a_node_on_capacitors_alone_gets_a_leak_so_that_the_deck_runs() -> None:
    parts = (d.capacitor("C1", "x", "0", 1e-9), d.resistor("R1", "5V", "y", 1e3), d.resistor("R2", "y", "0", 1e3))
    network = Network(branches=parts, fixed={"5V": 5.0})
    assert "Rleak_n_x n_x 0 1e12" in deck(network, "loose")
    assert dc_volts([(network, 0)])[0]["y"] == pytest.approx(2.5)
