"""Operating points against closed forms, against Kirchhoff, and what is said of circuits that have none."""

from __future__ import annotations

import math

import numpy as np
import pytest
from cells import CLAMP, N_FET, NPN, SIGNAL, all_cells, random_network

from levelcrossing import devices as d
from levelcrossing import solve
from levelcrossing.devices import THERMAL_VOLTS as VT
from levelcrossing.network import Branch, Network
from levelcrossing.solve import solve_dc


def lambert_w(x: float) -> float:
    w = math.log1p(x)
    for _ in range(60):
        w -= (w * math.exp(w) - x) / (math.exp(w) * (w + 1))
    return w


def network(*parts: Branch, **fixed: float) -> Network:
    return Network(branches=parts, fixed=fixed)


# --------------------------------------------------------------------------------------------------------- closed forms


def test_divider_of_2k_and_3k_turns_5_volts_into_3() -> None:
    """Kirchhoff; common practice of the trade as a check value."""
    found = solve_dc(network(d.resistor("R1", "in", "x", 2e3), d.resistor("R2", "x", "0", 3e3), **{"in": 5.0}))
    assert found.volts["x"][0] == pytest.approx(3.0, abs=1e-12)
    assert found.branch_amps("R1")[:, 0] == pytest.approx([1e-3, -1e-3])
    assert found.amps_from("in")[0] == pytest.approx(1e-3)


@pytest.mark.parametrize("load_ohms", [1e3, 10e3, 100e3])
@pytest.mark.parametrize("gain", [0.05, 0.3])
def test_follower_settles_a_threshold_and_a_root_below_its_gate(load_ohms: float, gain: float) -> None:
    """V = Vg - Vth - sqrt(2 V / (K R)): the square law in saturation, Shichman and Hodges 1968."""
    fet = d.switch("Q1", "5V", "gate", "x", threshold_volts=1.2, gain=gain)
    found = solve_dc(network(fet, d.resistor("R1", "x", "0", load_ohms), **{"5V": 5.0, "gate": 3.3}))
    volts = found.volts["x"][0]
    assert volts == pytest.approx(3.3 - 1.2 - math.sqrt(2 * volts / (gain * load_ohms)), abs=1e-7)


@pytest.mark.parametrize("low_volts", [0.0, 0.2, 0.4])
def test_low_through_a_mosfet_cell_rises_by_its_resistance(low_volts: float) -> None:
    """VL + Ron VH / RH with Ron = 1 / (K (VGS - Vth)), first order in Ron / RH."""
    found = solve_dc(
        network(
            d.mosfet("Q1", "hi", "3V3", "lo", N_FET),
            d.resistor("RH", "5V", "hi", 10e3),
            **{"5V": 5.0, "3V3": 3.3, "lo": low_volts},
        )
    )
    on_ohms = 1 / (0.3 * (3.3 - low_volts - 1.3))
    assert found.volts["hi"][0] == pytest.approx(low_volts + on_ohms * (5.0 - low_volts) / 10e3, rel=1e-3, abs=1e-6)


@pytest.mark.parametrize("reverse", [False, True])
@pytest.mark.parametrize("base_amps", [50e-6, 200e-6, 1e-3])
def test_saturation_voltage_is_that_of_ebers_and_moll(reverse: bool, base_amps: float) -> None:
    """VCE = VT ln((1/aR + IC/(IB bR)) / (1 - IC/(IB bF))), both ways round; Ebers and Moll 1954."""
    collector_amps = 25e-6
    ends = ("0", "b", "x") if reverse else ("x", "b", "0")
    parts = (
        *d.bipolar("Q1", *ends, NPN),
        d.current("IB", "0", "b", base_amps),
        d.current("IC", "0", "x", collector_amps),
    )
    volts = solve_dc(network(*parts)).volts["x"][0]
    forward, backward = (0.74, 150.0) if reverse else (150.0, 0.74)
    forced = collector_amps / base_amps
    expected = VT * math.log(((1 + backward) / backward + forced / backward) / (1 - forced / forward))
    assert volts == pytest.approx(expected, abs=2e-6)


@pytest.mark.parametrize(("ohms", "rule_of_thumb_error"), [(100.0, 0.12), (1e3, 0.05)])
def test_clamp_current_is_that_of_the_lambert_function(ohms: float, rule_of_thumb_error: float) -> None:
    """I = N VT / R W(IS R / (N VT) exp((V + IS R) / (N VT))) - IS, the exact solution of a diode behind a resistor.

    The usual (V - Vrail - 0.6 V) / R is too high by about the stated fraction.
    """
    isat = d.saturation_amps(0.7, 1e-3)
    diode = d.diode("D1", "x", "3V3", {"saturation_amps": isat, "ideality": 1.0})
    found = solve_dc(network(d.resistor("R1", "in", "x", ohms), diode, **{"in": 5.0, "3V3": 3.3}))
    amps = found.branch_amps("D1")[0, 0]
    excess = isat * ohms / VT * math.exp((1.7 + isat * ohms) / VT)
    assert amps == pytest.approx(VT / ohms * lambert_w(excess) - isat, rel=1e-8)
    assert (1.7 - 0.6) / ohms / amps - 1 == pytest.approx(rule_of_thumb_error, abs=0.07)


def test_pull_up_against_a_weak_driver_is_a_divider() -> None:
    """Text book: 4.5 k at 0 V against 10 k to 3.3 V, 3.3 * 4.5 / 14.5; TI's TXB0104 formula for its low level."""
    parts = (d.resistor("D", "drv", "x", 4.5e3), d.resistor("RP", "3V3", "x", 10e3))
    found = solve_dc(network(*parts, **{"drv": 0.0, "3V3": 3.3}))
    assert found.volts["x"][0] == pytest.approx(1.024, abs=5e-4)


def test_mosfet_conducts_both_ways_alike() -> None:
    """The square law is symmetric: exchanging drain and source of a channel changes nothing."""
    parts = [d.resistor("R1", "5V", "a", 1e3), d.resistor("R2", "b", "0", 470.0)]
    one = network(*parts, d.switch("Q", "a", "g", "b", threshold_volts=0.9, gain=0.02), **{"5V": 5.0, "g": 4.0})
    two = network(*parts, d.switch("Q", "b", "g", "a", threshold_volts=0.9, gain=0.02), **{"5V": 5.0, "g": 4.0})
    assert solve_dc(one).volts["b"][0] == pytest.approx(solve_dc(two).volts["b"][0], abs=1e-9)


# ------------------------------------------------------------------------------------------- what only a solution shows


def test_reversed_mosfet_lifts_the_low_side_through_its_body_diode() -> None:
    parts = [d.resistor("driver", "drv", "hi", 40.0), d.resistor("RL", "3V3", "lo", 10e3)]
    found = solve_dc(network(*parts, d.mosfet("Q1", "lo", "3V3", "hi", N_FET), **{"3V3": 3.3, "drv": 5.0}))
    assert 4.1 < found.volts["lo"][0] < 4.6


def test_gate_on_the_wrong_rail_lifts_the_low_side() -> None:
    parts = [d.resistor("driver", "drv", "hi", 40.0), d.resistor("RL", "3V3", "lo", 10e3)]
    found = solve_dc(network(*parts, d.mosfet("Q1", "hi", "5V", "lo", N_FET), **{"3V3": 3.3, "5V": 5.0, "drv": 5.0}))
    assert found.volts["lo"][0] == pytest.approx(5.0 - 1.3, abs=0.1)


def test_body_diode_feeds_a_dead_rail() -> None:
    parts = [d.resistor("driver", "drv", "lo", 40.0), d.resistor("RH", "off", "hi", 10e3)]
    found = solve_dc(network(*parts, d.mosfet("Q1", "hi", "3V3", "lo", N_FET), **{"3V3": 3.3, "off": 0.0, "drv": 3.3}))
    assert found.branch_amps("RH")[0, 0] < -150e-6


# ---------------------------------------------------------------------------------------------------------- Kirchhoff


@pytest.mark.parametrize("cell", all_cells(), ids=lambda cell: cell.name)
def test_currents_balance_in_every_cell(cell) -> None:
    """At each node the terminal currents of all branches cancel; fixed nodes supply what their branches take."""
    found = solve_dc(cell.network.holding({cell.drive: cell.high}))
    assert found.solved.all()
    sums: dict[str, np.ndarray] = {}
    for branch in cell.network.branches:
        amps = found.branch_amps(branch.label)
        assert np.abs(amps.sum(axis=0)).max() < 1e-12
        for node in dict.fromkeys(branch.nodes):
            sums[node] = sums.get(node, 0.0) + amps[branch.nodes.index(node)]
    for node, amps in sums.items():
        supplied = found.amps_from(node) if node in cell.network.fixed else 0.0
        assert np.abs(amps - supplied).max() < 1e-9, node


def test_random_circuits_pass_kirchhoff_or_are_called_unsolved() -> None:
    """5,000 circuits of 3 to 8 nodes with elements of all kinds: at most one in a thousand may stay unsolved."""
    rng = np.random.default_rng(20240607)
    unsolved = 0
    for _ in range(5000):
        circuit = random_network(rng)
        found = solve_dc(circuit)
        if not found.solved.all():
            unsolved += 1
            assert "Kirchhoff" in found.why
            continue
        sums = dict.fromkeys(circuit.nodes, 0.0)
        sizes = dict.fromkeys(circuit.nodes, 0.0)
        for branch in circuit.branches:
            amps = found.branch_amps(branch.label)[:, 0]
            for node in dict.fromkeys(branch.nodes):
                if node in sums:
                    sums[node] += amps[branch.nodes.index(node)]
                    sizes[node] += abs(amps[branch.nodes.index(node)])
        for node, missed in sums.items():
            assert abs(missed) <= 1e-11 + 2e-6 * sizes[node]
    assert unsolved <= 5


def test_a_junction_straight_across_stiff_supplies_is_unsolved_not_invented() -> None:
    """12 V through two bare junctions into ground: no finite currents balance, and no voltage is made up."""
    diode = {"saturation_amps": 1e-15, "ideality": 1.0}
    found = solve_dc(network(d.diode("D1", "A", "x", diode), d.diode("D2", "x", "0", diode), A=12.0))
    assert not found.solved.all()
    assert "Kirchhoff" in found.why


# ------------------------------------------------------------------------------------------------------------- batches


@pytest.mark.parametrize("cell", all_cells()[::4], ids=lambda cell: cell.name)
def test_members_of_a_batch_do_not_influence_each_other(cell) -> None:
    whole = solve_dc(cell.network.holding({cell.drive: cell.high}))
    for member in range(0, cell.network.batch, 3):
        alone = solve_dc(cell.network.holding({cell.drive: cell.high}).member(member))
        for node in cell.network.nodes:
            assert whole.volts[node][member] == pytest.approx(alone.volts[node][0], abs=1e-7)


def test_large_batches_give_what_small_ones_give() -> None:
    """Elimination across the batch (large) and a library call per member (small) are two ways to one answer."""
    for cell in all_cells():
        held = cell.network.holding({cell.drive: cell.high})
        large = solve_dc(held.taking(np.tile(np.arange(held.batch), 30)))
        small = solve_dc(held)
        for node in held.nodes:
            assert np.abs(large.volts[node][-held.batch :] - small.volts[node]).max() < 1e-7, (cell.name, node)


def test_a_warm_start_leads_to_the_same_answer() -> None:
    for cell in all_cells():
        low = solve_dc(cell.network.holding({cell.drive: cell.low}))
        warm = solve_dc(cell.network.holding({cell.drive: cell.high}), start=low)
        cold = solve_dc(cell.network.holding({cell.drive: cell.high}))
        for node in cell.network.nodes:
            assert np.abs(warm.volts[node] - cold.volts[node]).max() < 1e-6, (cell.name, node)


# ------------------------------------------------------------------------------------------------- no voltage, and why


def test_a_node_without_any_path_floats() -> None:
    found = solve_dc(network(d.capacitor("C1", "/SDA", "0", 1e-9), d.resistor("R1", "5V", "x", 1e3), **{"5V": 5.0}))
    assert found.floating == {"/SDA"}
    assert "/SDA hangs on nothing that conducts" in found.why
    assert found.solved.all()


def test_two_nodes_joined_to_each_other_only_float_together() -> None:
    found = solve_dc(network(d.resistor("R1", "a", "b", 1e3), d.capacitor("C1", "b", "5V", 1e-9), **{"5V": 5.0}))
    assert found.floating == {"a", "b"}


def test_a_node_behind_a_channel_floats_only_where_it_is_off() -> None:
    """Flags by member: gate at 3.3 V holds the node, gate at 0 V leaves it to leakage."""
    parts = (d.switch("Q1", "5V", "gate", "x", threshold_volts=1.0, gain=0.1), d.resistor("R1", "x", "y", 1e3))
    pulled = d.resistor("R2", "y", "5V", 1e3)
    off = Network(branches=parts, fixed={"5V": 0.2, "gate": np.array([0.0, 3.3])})
    found = solve_dc(off)
    assert found.floats["x"].tolist() == [True, False]
    assert "leakage" in found.why
    assert not solve_dc(Network(branches=(*parts, pulled), fixed=off.fixed)).floating


def test_ten_megohm_are_not_called_floating() -> None:
    found = solve_dc(network(d.resistor("R1", "5V", "x", 10e6), d.diode("clamp", "x", "5V", CLAMP), **{"5V": 5.0}))
    assert not found.floating
    assert found.node_ohms("x")[0] == pytest.approx(10e6, rel=0.01)


def test_a_junction_across_two_rails_is_structural() -> None:
    parts = (d.diode("D1", "5V", "3V3", SIGNAL), d.resistor("R1", "5V", "x", 1e3))
    found = solve_dc(network(*parts, **{"5V": 5.0, "3V3": 3.3}))
    assert found.structural == ("D1",)
    assert "D1 lies straight across 5V and 3V3" in found.why
    assert found.volts["x"][0] == pytest.approx(5.0)


def test_nothing_to_solve_is_solved() -> None:
    found = solve_dc(network(d.resistor("R1", "5V", "0", 1e3), **{"5V": 5.0}))
    assert found.solved.all()
    assert found.amps_from("5V")[0] == pytest.approx(5e-3)


@pytest.mark.parametrize("place", ["rail", "part"])
def test_what_is_no_number_is_never_solved(place: str) -> None:
    """A member with a missing figure is unsolved; its neighbours in the batch are not."""
    ohms, rail = np.array([1e3, 1e3, 1e3]), np.array([5.0, 5.0, 5.0])
    (ohms if place == "part" else rail)[1] = np.nan
    parts = (d.resistor("R1", "A", "x", ohms), d.diode("D1", "x", "0", CLAMP))
    found = solve_dc(Network(branches=parts, fixed={"A": rail}))
    assert found.solved.tolist() == [True, False, True]


@pytest.mark.parametrize("most", range(1, 16))
def test_members_that_drop_out_in_the_last_step_allowed_leave_the_others_open(most: int) -> None:
    """A batch of which some settle at once: whatever was called converged is the answer of the full iteration."""
    supplies = np.concatenate([np.zeros(6), np.linspace(0.5, 40.0, 11)])
    whole = Network(
        branches=(d.resistor("R1", "in", "x", 1e3), d.diode("D1", "x", "0", SIGNAL)), fixed={"in": supplies}
    )
    arrays = solve.lay_out(whole)[0]
    start = solve.starting_volts(whole, arrays, None)
    volts, done = solve._newton(arrays, start, iterations=most)
    assert done.shape == supplies.shape and done[:6].all() and (most > 2 or not done.all())
    x = arrays.names.index("x")
    assert volts[x][done] == pytest.approx(solve_dc(whole).volts["x"][done], abs=1e-6)
