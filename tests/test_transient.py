"""Edges and delays against closed forms and against ngspice."""

from __future__ import annotations

import math

import numpy as np
import pytest
from against_ngspice import node_volts, waves
from cells import Cell, all_cells

from levelcrossing import devices as d
from levelcrossing.decks import Step
from levelcrossing.network import Network, stack
from levelcrossing.solve import solve_dc
from levelcrossing.transient import StepResponse, step_response
from levelcrossing.waveforms import Waves, last_invalid_s

CELLS = {cell.name: cell for cell in all_cells()}
MEMBERS = (0, 3, 6)


def rc(ohms: float, farads: float, rail: float = 0.0) -> Network:
    parts = (d.resistor("R1", "drv", "x", ohms), d.capacitor("C1", "x", "0", farads))
    return Network(branches=parts, fixed={"drv": rail})


# --------------------------------------------------------------------------------------------------------- closed forms


@pytest.mark.parametrize(("ohms", "farads"), [(10e3, 50e-12), (333.0, 15e-12), (1e6, 1e-6)])
def test_rc_rises_in_2_197_rc(ohms: float, farads: float) -> None:
    """10 to 90 % of an RC takes ln 9 = 2.197 RC (text book)."""
    found = step_response(rc(ohms, farads), {"drv": 0.0}, {"drv": 5.0}, ["x"], edge_s=1e-4 * ohms * farads)
    assert found.solved.all()
    assert found.edge_s("x")[0] == pytest.approx(math.log(9) * ohms * farads, rel=4e-3)


def test_rc_rises_from_30_to_70_percent_in_0_8473_rc() -> None:
    """UM10204 section 7.1: t = 0.8473 RC; 4.7 k and 50 pF give 199 ns, 10 k 424 ns."""
    for ohms, expected_s in ((4.7e3, 199e-9), (10e3, 424e-9)):
        found = step_response(rc(ohms, 50e-12), {"drv": 0.0}, {"drv": 3.3}, ["x"])
        assert found.edge_s("x", 0.3, 0.7)[0] == pytest.approx(expected_s, abs=1.5e-9)


def test_pull_up_of_the_published_example_just_meets_fast_mode() -> None:
    """TI SLVA689 section 4: 200 pF and 300 ns allow 1.77 k."""
    found = step_response(rc(1.77e3, 200e-12), {"drv": 0.0}, {"drv": 3.3}, ["x"])
    assert found.edge_s("x", 0.3, 0.7)[0] == pytest.approx(300e-9, rel=0.004)


def test_divider_charges_through_its_parallel_resistance() -> None:
    """10 k over 20 k into 15 pF: 2.197 * 6.667 k * 15 pF = 220 ns."""
    parts = (d.resistor("R1", "drv", "x", 10e3), d.resistor("R2", "x", "0", 20e3), d.capacitor("C1", "x", "0", 15e-12))
    found = step_response(Network(branches=parts, fixed={"drv": 0.0}), {"drv": 0.0}, {"drv": 5.0}, ["x"])
    assert found.edge_s("x")[0] == pytest.approx(219.7e-9, rel=4e-3)


def test_slow_ramp_passes_an_rc_with_a_lag_of_rc() -> None:
    """A ramp much longer than RC arrives RC later at the same slope (text book)."""
    found = step_response(rc(1e3, 10e-12), {"drv": 0.0}, {"drv": 5.0}, ["x"], edge_s=1e-6)
    assert found.delay_s("x", 2.5)[0] == pytest.approx(0.5e-6 + 10e-9, rel=2e-3)
    assert found.edge_s("x")[0] == pytest.approx(0.8e-6, rel=2e-3)


def test_current_into_a_capacitor_is_a_ramp() -> None:
    """V = I t / C: 20 uA into 10 pF, switched by a gated path, reach 2 V after 1 us."""
    parts = (
        d.current("I1", "5V", "x", 20e-6),
        d.capacitor("C1", "x", "0", 10e-12),
        d.gated("driver", "x", "0", 50.0),
        d.diode("D1", "x", "5V", d.clamp_values()),
    )
    gate = d.gate_of("driver")
    network = Network(branches=parts, fixed={"5V": 5.0, gate: d.GATE_ON_VOLTS})
    found = step_response(network, {gate: d.GATE_ON_VOLTS}, {gate: d.GATE_OFF_VOLTS}, ["x"])
    assert found.delay_s("x", 2.0)[0] == pytest.approx(1e-6, rel=3e-3)


def test_storage_time_follows_the_transit_times() -> None:
    """The base current that remains decides how long a saturated transistor stays on (charge control).

    A transistor whose reverse transit time is worked out for a storage time of 200 ns must show that storage time in
    the test it is stated for: 10 mA, 1 mA of base current in, 1 mA out.
    """
    transit = d.reverse_transit_s(200e-9, 0.4e-9, 150.0, 3.0)
    values = {
        "polarity": 1.0, "saturation_amps": 7e-15, "beta_forward": 150.0, "beta_reverse": 3.0, "base_ohms": 10.0,
        "cbe_farads": 1e-15, "cbc_farads": 1e-15, "transit_s": 0.4e-9, "reverse_transit_s": transit,
    }  # fmt: skip
    parts = [d.resistor("RC", "V", "x", 1e3), d.resistor("RB", "drv", "b", 10e3)]
    parts += d.bipolar("Q1", "x", "b", "0", values)
    network = Network(branches=tuple(parts), fixed={"V": 10.0, "drv": 0.0})
    found = step_response(network, {"drv": 10.75}, {"drv": -9.25}, ["x"])
    assert found.delay_s("x", 1.0)[0] == pytest.approx(200e-9, rel=0.05)


def test_a_level_that_is_never_reached_is_infinitely_late() -> None:
    found = step_response(rc(1e3, 10e-12), {"drv": 0.0}, {"drv": 2.0}, ["x"])
    assert found.delay_s("x", 2.31)[0] == math.inf


# ------------------------------------------------------------------------------------------------------ against ngspice


def both_ways(cell: Cell) -> tuple[Network, np.ndarray, np.ndarray, StepResponse]:
    network = stack([cell.network, cell.network])
    before = np.repeat([cell.low, cell.high], cell.network.batch)
    after = np.repeat([cell.high, cell.low], cell.network.batch)
    found = step_response(network, {cell.drive: before}, {cell.drive: after}, [cell.out])
    return network, before, after, found


def test_edges_and_delays_of_all_cells_agree_with_ngspice() -> None:
    """Rise and fall of each cell at nominal values and two corners: 10-90 %, 30-70 % and the delays to 30 and 70 %.

    Within 1 % at the 95th percentile and 5 % at worst.
    """
    cases, ours = [], []
    for cell in CELLS.values():
        network, before, after, found = both_ways(cell)
        assert found.solved.all(), cell.name
        for way in (0, 1):
            for member in MEMBERS:
                k = way * cell.network.batch + member
                until = float(found.waves.times[-1, k]) * 1.1
                step = Step(before={cell.drive: before[k]}, after={cell.drive: after[k]}, until_s=until)
                cases.append((network, k, step))
                ours.append((cell, found, k))
    errors = []
    for (cell, found, k), (network, vectors) in zip(ours, waves(cases, points=1000), strict=True):
        assert vectors, f"ngspice did not run {cell.name}"
        start, end = found.before.volts[cell.out], found.after.volts[cell.out]
        if abs(end[k] - start[k]) < 0.05:
            continue
        times, volts = vectors["time"], node_volts(network, vectors, cell.out)
        theirs = Waves(
            times=times[:, None],
            volts={"x": volts[:, None]},
            corners=np.zeros((times.size, 1), dtype=bool),
            count=np.array([times.size]),
            complete=np.array([True]),
        )
        mine, other = {}, {}
        for part in (0.1, 0.3, 0.7, 0.9):
            mine[part] = found.delay_s(cell.out, start + part * (end - start))[k]
            level = start[k] + part * (end[k] - start[k])
            other[part] = last_invalid_s(theirs, "x", level, bool(end[k] > start[k]))[0]
        for name, a, b in (
            ("10-90", mine[0.9] - mine[0.1], other[0.9] - other[0.1]),
            ("30-70", mine[0.7] - mine[0.3], other[0.7] - other[0.3]),
            ("to 30", mine[0.3], other[0.3]),
            ("to 70", mine[0.7], other[0.7]),
        ):
            errors.append((abs(a / b - 1), cell.name, k, name))
    sizes = np.array([error for error, *_ in errors])
    assert len(sizes) > 1000
    assert np.percentile(sizes, 95) < 0.01, sorted(errors)[-20:]
    assert sizes.max() < 0.05, sorted(errors)[-5:]


def test_members_in_time_influence_each_other_by_less_than_the_step_error() -> None:
    """Each member has its own time and step, but shares the rounds of iteration with the others."""
    cell = CELLS["bipolar cell upwards"]
    together = step_response(cell.network, {cell.drive: 0.0}, {cell.drive: 3.3}, [cell.out])
    for member in (0, 5, 8):
        alone = step_response(cell.network.taking(np.array([member])), {cell.drive: 0.0}, {cell.drive: 3.3}, [cell.out])
        assert alone.edge_s(cell.out)[0] == pytest.approx(together.edge_s(cell.out)[member], rel=2e-3)


def test_quasi_static_integral_of_a_zener_clamped_node() -> None:
    """Without stored charge, t = integral of C dV / I with the settled current at each voltage."""
    zener = {"saturation_amps": 2e-15, "ideality": 1.1, "zener_amps": 1.2e-6, "zener_ideality": 15.0}
    parts = (d.resistor("R1", "drv", "x", 1e3), d.diode("D1", "0", "x", zener))
    levels = np.linspace(0.3, 2.5, 400)
    held = Network(branches=parts, fixed={"drv": 5.0, "x": levels})
    amps = -solve_dc(held).amps_from("x")
    expected = float(np.sum(np.diff(levels) * 50e-12 * (1 / amps[1:] + 1 / amps[:-1])))
    network = Network(branches=(*parts, d.capacitor("C1", "x", "0", 100e-12)), fixed={"drv": 0.0})
    found = step_response(network, {"drv": 0.0}, {"drv": 5.0}, ["x"], edge_s=1e-11)
    assert found.delay_s("x", 2.5)[0] - found.delay_s("x", 0.3)[0] == pytest.approx(expected, rel=4e-3)
