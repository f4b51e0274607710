"""The usable bit rate against ngspice, against all patterns and against closed forms."""

from __future__ import annotations

import math

import numpy as np
import pytest
from against_ngspice import node_volts, waves
from cells import N_FET, Cell, all_cells
from cells import NPN as CELL_NPN

from levelcrossing import devices as d
from levelcrossing.bitrate import VALID_FROM, TimingJob, pattern_response, received, timing, timings
from levelcrossing.decks import Step
from levelcrossing.network import Network
from levelcrossing.solve import solve_dc

CELLS = {cell.name: cell for cell in all_cells()}


def rc(ohms: float, farads: float) -> Network:
    parts = (d.resistor("R1", "drv", "x", ohms), d.capacitor("C1", "x", "0", farads))
    return Network(branches=parts, fixed={"drv": 0.0})


MEMBERS = (0, 6)


def thresholds(cell: Cell) -> tuple[np.ndarray, np.ndarray]:
    """Return VIH and VIL at 70 and 30 % of what arrives."""
    low = solve_dc(cell.network.holding({cell.drive: cell.low})).volts[cell.out]
    high = solve_dc(cell.network.holding({cell.drive: cell.high})).volts[cell.out]
    least, most = np.minimum(low, high), np.maximum(low, high)
    return least + 0.7 * (most - least), least + 0.3 * (most - least)


def lone_bit_deck(cell: Cell, member: int, bits: str, bit_s: float) -> tuple[Network, int, Step]:
    """Return a case whose driver follows a pattern: a ramp node per change, added up by the deck's own source."""
    levels = [cell.low if bit == "0" else cell.high for bit in bits]
    corners = [(0.0, levels[0])]
    for position in range(1, len(bits)):
        if levels[position] != levels[position - 1]:
            corners += [(position * bit_s, levels[position - 1]), (position * bit_s + 1e-9, levels[position])]
    points = tuple(corners)
    step = Step(before={cell.drive: levels[0]}, after={}, until_s=len(bits) * bit_s, points={cell.drive: points})
    return cell.network, member, step


def test_ngspice_passes_just_below_the_rate_and_fails_just_above() -> None:
    """The lone-bit patterns, run by ngspice at 0.97 and at 1.03 times the rate that we call usable.

    All cells, at nominal values and one corner each.
    """
    cases, labels, found = [], [], {}
    for name, cell in CELLS.items():
        vih, vil = thresholds(cell)
        found[name] = timing(cell.network, {cell.drive: cell.low}, {cell.drive: cell.high}, cell.out, vih, vil)
        for member in MEMBERS:
            length = float(found[name].bit_s[member])
            assert np.isfinite(length), name
            for share in (0.97, 1.03):
                for bits in ("0010", "1101"):
                    cases.append(lone_bit_deck(cell, member, bits, length / share))
                    labels.append((name, member, share, bits, length / share, vih[member], vil[member]))
    passed: dict[tuple[str, int, float], bool] = {}
    for (name, member, share, bits, length, vih, vil), (network, vectors) in zip(
        labels, waves(cases, points=1500), strict=True
    ):
        times, volts = vectors["time"], node_volts(network, vectors, CELLS[name].out)
        good = True
        for position, bit in enumerate(bits):
            wants_high = (bit == "1") != bool(found[name].inverting[member])
            window = (times >= (position + VALID_FROM) * length) & (times <= (position + 1) * length)
            good &= bool((volts[window] >= vih).all() if wants_high else (volts[window] <= vil).all())
        passed[name, member, share] = passed.get((name, member, share), True) and good
    assert len(passed) >= 2 * 2 * 40
    assert {key for key, good in passed.items() if key[2] == 0.97 and not good} == set()
    assert {key for key, good in passed.items() if key[2] == 1.03 and good} == set()


@pytest.mark.parametrize("name", ["divider", "bipolar cell with 4k7 base downwards", "mosfet cell upwards"])
def test_all_62_patterns_arrive_at_the_usable_rate(name: str) -> None:
    """Every pattern of six bits that changes at all, at 0.99 times the usable rate, at nominal values."""
    cell = CELLS[name]
    vih, vil = thresholds(cell)
    low, high = {cell.drive: cell.low}, {cell.drive: cell.high}
    found = timing(cell.network, low, high, cell.out, vih, vil)
    nominal = cell.network.taking(np.array([0]))
    bit_s = found.bit_s[:1] / 0.99
    for number in range(1, 63):
        bits = f"{number:06b}"
        shape = pattern_response(nominal, low, high, bits, bit_s, (cell.out,))
        assert received(shape, cell.out, bits, bit_s, vih[:1], vil[:1], found.inverting[:1]).all(), bits


def test_a_circuit_that_remembers_gets_a_longer_bit_than_its_delays_suggest() -> None:
    cell = CELLS["inverting stage with speed up capacitor"]
    vih, vil = thresholds(cell)
    found = timing(cell.network, {cell.drive: cell.low}, {cell.drive: cell.high}, cell.out, vih, vil)
    assert found.remembers[0]
    assert found.bit_s[0] > 1.02 * max(found.delay_high_s[0], found.delay_low_s[0]) / VALID_FROM


def test_rate_falls_with_load_and_says_what_limits_it() -> None:
    def cell(farads: np.ndarray) -> Network:
        parts = (
            d.resistor("RP", "3V3", "x", 4.7e3),
            d.capacitor("C1", "x", "0", farads),
            d.gated("driver", "x", "0", 50.0),
        )
        return Network(branches=parts, fixed={"3V3": 3.3, d.gate_of("driver"): d.GATE_OFF_VOLTS})

    gate = d.gate_of("driver")
    network = cell(np.array([10e-12, 50e-12, 400e-12]))
    found = timing(network, {gate: d.GATE_ON_VOLTS}, {gate: d.GATE_OFF_VOLTS}, "x", 2.31, 0.99)
    assert found.solved.all()
    assert found.limited_by_rise.all()
    assert not found.inverting.any()
    # An RC rise from nearly 0 V: 0.75 / (RC ln(1 / 0.3))
    expected = 0.75 / (4.7e3 * np.array([10e-12, 50e-12, 400e-12]) * math.log(1 / 0.3))
    assert found.bit_rate == pytest.approx(expected, rel=0.02)


def test_an_unreachable_level_allows_no_rate_at_all() -> None:
    found = timing(rc(1e3, 10e-12), {"drv": 0.0}, {"drv": 3.3}, "x", 3.5, 1.5)
    assert found.bit_rate[0] == 0.0
    assert found.delay_high_s[0] == math.inf


def test_levels_near_a_threshold_are_flagged() -> None:
    found = timing(rc(1e3, 10e-12), {"drv": 0.0}, {"drv": 3.3}, "x", np.array(3.27), 1.0)
    assert found.near_plateau.all()
    found = timing(rc(1e3, 10e-12), {"drv": 0.0}, {"drv": 3.3}, "x", np.array(2.31), 1.0)
    assert not found.near_plateau.any()


def test_circuits_of_equal_topology_are_timed_in_one_batch() -> None:
    """Three cells, two of them alike but for names and values, come back in order with their own figures."""

    def pull_up(node: str, ohms: float, farads: float) -> TimingJob:
        parts = (
            d.resistor(f"R{node}", "3V3", node, ohms),
            d.capacitor(f"C{node}", node, "0", farads),
            d.gated(f"driver of {node}", node, "0", 50.0),
        )
        gate = d.gate_of(f"driver of {node}")
        network = Network(branches=parts, fixed={"3V3": 3.3, gate: d.GATE_OFF_VOLTS})
        low, high = {gate: d.GATE_ON_VOLTS}, {gate: d.GATE_OFF_VOLTS}
        return TimingJob(network=network, low=low, high=high, watch=node, vih_volts=2.31, vil_volts=0.99)

    cell = CELLS["divider"]
    vih, vil = thresholds(cell)
    other = TimingJob(
        network=cell.network,
        low={cell.drive: cell.low},
        high={cell.drive: cell.high},
        watch=cell.out,
        vih_volts=vih,
        vil_volts=vil,
    )
    jobs = [pull_up("/SDA", 2.2e3, 100e-12), other, pull_up("/SCL", 10e3, 50e-12)]
    for job, found in zip(jobs, timings(jobs), strict=True):
        alone = timing(job.network, job.low, job.high, job.watch, job.vih_volts, job.vil_volts)
        assert found.bit_rate == pytest.approx(alone.bit_rate, rel=5e-3)
        assert found.rise_s == pytest.approx(alone.rise_s, rel=5e-3)
        assert found.high_volts == pytest.approx(alone.high_volts)


# ------------------------------------------------------------------------------- common practice, not published figures

LOADS = np.array([15e-12, 30e-12, 50e-12, 200e-12])
KHZ_125, MHZ_1, MHZ_8 = 2 * 125e3, 2 * 1e6, 2 * 8e6  # a clock needs two bits per period


def practice(parts: list, drive: str, high: float, out: str, vih: float, vil: float) -> np.ndarray:
    """Return the usable bit rates [bit/s] at the loads above, driven through 40 ohm."""
    branches = (*parts, d.resistor("driver", "drv", drive, 40.0), d.capacitor("load", out, "0", LOADS))
    network = Network(branches=branches, fixed={"3V3": 3.3, "5V": 5.0, "drv": 0.0})
    return timing(network, {"drv": 0.0}, {"drv": high}, out, vih, vil).bit_rate


def test_common_practice_a_divider_is_for_slow_signals() -> None:
    """2 k over 3 k: fine at 125 kHz, poor at 1 MHz, useless at 8 MHz.

    The solution agrees on 125 kHz at every load, on 8 MHz from 30 pF on (a board's trace, a pin and a probe), but on
    1 MHz only from about 200 pF on: at the loads of one pin a divider of this resistance is good for 1 MHz.
    """
    parts = [d.resistor("R1", "a", "x", 2e3), d.resistor("R2", "x", "0", 3e3)]
    rate = practice(parts, "a", 5.0, "x", 2.31, 0.99)
    assert (rate > KHZ_125).all()
    assert rate[0] > MHZ_8
    assert (rate[1:] < MHZ_8).all()
    assert (rate[:3] > MHZ_1).all()
    assert rate[3] < 1.1 * MHZ_1


def test_common_practice_a_bipolar_cell_slows_at_1_megahertz() -> None:
    """Base through 1 k, 10 k pull-ups: good at 125 kHz, slowing at 1 MHz, not to be trusted at 8 MHz.

    The solution agrees for a 5 V CMOS receiver: stored charge keeps the transistor on for half a microsecond. A
    receiver with TTL levels sees the driver through the saturated transistor and is much faster.
    """
    values = {**CELL_NPN, "beta_reverse": 4.0}
    parts = [
        d.resistor("RB", "3V3", "b", 1e3),
        d.resistor("RH", "5V", "hi", 10e3),
        d.resistor("RL", "3V3", "lo", 10e3),
        d.capacitor("CL", "lo", "0", 15e-12),
        *d.bipolar("Q1", "hi", "b", "lo", values),
    ]
    rate = practice(parts, "lo", 3.3, "hi", 3.5, 1.5)
    assert (rate > KHZ_125).all()
    assert (rate < MHZ_1).all()
    assert (practice(parts, "lo", 3.3, "hi", 2.0, 0.8)[:3] > MHZ_8).all()


def test_common_practice_a_mosfet_cell_still_follows_at_8_megahertz() -> None:
    """Gate at 3.3 V, 10 k pull-ups: still follows at 8 MHz.

    The solution agrees where a push-pull driver meets a receiver with TTL levels, which the conducting transistor
    alone brings up to 2 V. A 5 V CMOS receiver waits for the 10 k pull-up and gets a third of that at best.
    """
    parts = [
        d.resistor("RH", "5V", "hi", 10e3),
        d.resistor("RL", "3V3", "lo", 10e3),
        d.capacitor("CL", "lo", "0", 15e-12),
        d.mosfet("Q1", "hi", "3V3", "lo", N_FET),
    ]
    assert (practice(parts, "lo", 3.3, "hi", 2.0, 0.8) > MHZ_8).all()
    assert (practice(parts, "lo", 3.3, "hi", 3.5, 1.5) < 0.4 * MHZ_8).all()
