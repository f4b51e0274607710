"""Circuits for the solver's tests: the usual cells between two supplies, each with nominal values and corners.

The parts' figures are round numbers of the right size, not those of particular makers.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from levelcrossing import devices as d
from levelcrossing.network import Branch, Network, Value

N_FET = {
    "polarity": 1.0,
    "threshold_volts": 1.3,
    "gain": 0.3,
    "body_amps": d.saturation_amps(0.8, 0.03),
    "body_ideality": 1.0,
    "cgs_farads": 21e-12,
    "cgd_farads": 6e-12,
    "cds_farads": 7e-12,
}
P_FET = {**N_FET, "polarity": -1.0, "threshold_volts": 0.9, "cgs_farads": 60e-12, "cgd_farads": 15e-12}
NPN = {
    "polarity": 1.0,
    "saturation_amps": 7e-15,
    "beta_forward": 150.0,
    "beta_reverse": 0.74,
    "base_ohms": 10.0,
    "cbe_farads": 8e-12,
    "cbc_farads": 4e-12,
    "transit_s": 0.4e-9,
    "reverse_transit_s": 200e-9,
}
PNP = {**NPN, "polarity": -1.0, "beta_reverse": 3.4, "cbe_farads": 10e-12}
SIGNAL = {
    "saturation_amps": 2.7e-9,
    "ideality": 1.85,
    "series_ohms": 0.8,
    "junction_farads": 3e-12,
    "transit_s": 4e-9,
}
SCHOTTKY = {"saturation_amps": 2e-7, "ideality": 1.04, "series_ohms": 2.0, "junction_farads": 8e-12, "transit_s": 0.0}
CLAMP = d.clamp_values()


def zener(volts: float, ohms: float, knee_ohms: float) -> dict[str, float]:
    values, series = d.zener_values(volts, ohms=ohms, knee_ohms=knee_ohms)
    forward = {"saturation_amps": 2e-15, "ideality": 1.1, "junction_farads": 90e-12, "transit_s": 0.0}
    return {**forward, "series_ohms": series, **values}


@dataclass(frozen=True, kw_only=True)
class Cell:
    """A circuit with one driver: ``drive`` ramps between ``low`` and ``high``, ``out`` is what the receiver sees."""

    name: str
    network: Network
    drive: str
    low: float
    high: float
    out: str


Parts = list[Branch]
Maker = Callable[..., tuple[Parts, dict[str, Value], str, str, float, float]]
MAKERS: dict[str, Maker] = {}


def cell(maker: Maker) -> Maker:
    MAKERS[maker.__name__.replace("_", " ")] = maker
    return maker


def corners(maker: Maker) -> Network:
    """Return nominal values and the eight corners of resistors ±5 %, rails ±5 % and the device's spread."""
    signs = np.array([(0.0, 0.0, 0.0), *itertools.product((-1.0, 1.0), repeat=3)]).T
    branches, fixed, *_ = maker(1 + 0.05 * signs[0], 1 + 0.05 * signs[1], signs[2])
    return Network(branches=tuple(branches), fixed=fixed)


def all_cells() -> list[Cell]:
    out = []
    for name, maker in MAKERS.items():
        network = corners(maker)
        _, _, drive, watch, low, high = maker(np.ones(1), np.ones(1), np.zeros(1))
        out.append(Cell(name=name, network=network, drive=drive, low=low, high=high, out=watch))
    return out


def load(node: str, farads: float = 15e-12) -> Branch:
    return d.capacitor(f"load on {node}", node, "0", farads)


def driver(node: str, ohms: Value = 40.0) -> Branch:
    return d.resistor(f"driver of {node}", "drv", node, ohms)


def rails(k, **others):
    return {"3V3": 3.3 * k, "5V": 5.0 * k, "drv": 0.0, **others}


def fet(s, **other):
    return {**N_FET, "threshold_volts": 1.3 + 0.3 * s, "gain": 0.3 * 1.6**-s, **other}


def npn(s, **other):
    return {**NPN, "beta_forward": 150.0 * 2.0**s, "beta_reverse": 1.5 * 2.0**s, **other}


# ------------------------------------------------------------------------------------------------- resistors and clamps


@cell
def divider(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 2e3 * r), d.resistor("R2", "x", "0", 3e3), load("x")]
    return parts, rails(k), "drv", "x", 0.0, 5.0


@cell
def divider_with_speed_up_capacitor(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 10e3 * r), d.resistor("R2", "x", "0", 20e3), load("x")]
    return [*parts, d.capacitor("C1", "a", "x", 5e-12 + 2e-12 * s)], rails(k), "drv", "x", 0.0, 5.0


@cell
def divider_behind_filter(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1.8e3 * r), d.resistor("R2", "x", "0", 3.3e3)]
    parts += [d.resistor("R3", "x", "y", 1e3), load("y"), d.capacitor("C1", "x", "0", 1e-9)]
    return parts, rails(k), "drv", "y", 0.0, 5.0


@cell
def divider_into_clamped_input(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1e3 * r), d.resistor("R2", "x", "0", 10e3), load("x")]
    parts += [d.diode("clamp up", "x", "3V3", CLAMP), d.diode("clamp down", "0", "x", CLAMP)]
    return parts, rails(k), "drv", "x", 0.0, 5.0


@cell
def series_resistor_into_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1e3 * r), load("x")]
    return [*parts, d.diode("clamp up", "x", "3V3", CLAMP)], rails(k), "drv", "x", 0.0, 5.0


@cell
def hundred_ohm_into_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 100 * r), load("x")]
    return [*parts, d.diode("clamp up", "x", "3V3", d.clamp_values(volts=0.65))], rails(k), "drv", "x", 0.0, 5.0


@cell
def schottky_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1e3 * r), load("x")]
    return [*parts, d.diode("D1", "x", "3V3", SCHOTTKY)], rails(k), "drv", "x", 0.0, 5.0


@cell
def clamp_to_ground_of_a_bipolar_swing(r, k, s):
    parts = [driver("a", 300.0), d.resistor("R1", "a", "x", 4.7e3 * r), load("x")]
    parts += [d.diode("D1", "0", "x", SIGNAL), d.diode("D2", "x", "3V3", SIGNAL)]
    return parts, rails(k), "drv", "x", -9.0, 9.0


@cell
def zener_3v3_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 470 * r), load("x")]
    return [*parts, d.diode("D1", "0", "x", zener(3.3, 85.0, 400.0))], rails(k), "drv", "x", 0.0, 5.0


@cell
def zener_5v1_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 2.2e3 * r), load("x")]
    return [*parts, d.diode("D1", "0", "x", zener(5.1, 40.0, 400.0))], rails(k), "drv", "x", 0.0, 12.0


@cell
def zener_10v_clamp(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 4.7e3 * r), load("x")]
    return [*parts, d.diode("D1", "0", "x", zener(10.0, 8.0, 50.0))], rails(k), "drv", "x", -1.0, 24.0


@cell
def weak_driver_fights_pull_up(r, k, s):
    parts = [driver("a", 4e3), d.resistor("R1", "a", "3V3", 10e3 * r), load("a")]
    return parts, rails(k), "drv", "a", 0.0, 3.3


@cell
def diode_passes_the_low(r, k, s):
    parts = [driver("a"), d.resistor("R1", "x", "3V3", 4.7e3 * r), load("x"), d.diode("D1", "x", "a", SIGNAL)]
    return parts, rails(k), "drv", "x", 0.0, 5.0


@cell
def schottky_passes_the_low(r, k, s):
    parts = [driver("a"), d.resistor("R1", "x", "3V3", 10e3 * r), load("x"), d.diode("D1", "x", "a", SCHOTTKY)]
    return parts, rails(k), "drv", "x", 0.0, 5.0


@cell
def clamp_into_a_dead_rail(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1e3 * r), load("x"), d.diode("clamp up", "x", "off", CLAMP)]
    return parts, rails(k, off=0.0), "drv", "x", 0.0, 5.0


@cell
def clamp_lifts_a_floating_rail(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "x", 1e3 * r), load("x"), d.diode("clamp up", "x", "rail", CLAMP)]
    parts += [d.resistor("rail load", "rail", "0", 10e3), d.capacitor("C1", "rail", "0", 1e-9)]
    return parts, rails(k), "drv", "rail", 0.0, 5.0


# ------------------------------------------------------------------------------------------------------------- bipolar


def _bipolar_cell(r, k, s, base_ohms, drive, out, high, rest=True, driver_ohms=40.0):
    parts = [driver(drive, driver_ohms), d.resistor("RB", "3V3", "b", base_ohms * r)]
    parts += [d.resistor("RH", "5V", "hi", 10e3), load("hi"), load("lo")]
    if rest:
        parts.append(d.resistor("RL", "3V3", "lo", 10e3 * r))
    parts += d.bipolar("Q1", "hi", "b", "lo", npn(s))
    return parts, rails(k), "drv", out, 0.0, high


@cell
def bipolar_cell_upwards(r, k, s):
    return _bipolar_cell(r, k, s, 1e3, "lo", "hi", 3.3)


@cell
def bipolar_cell_downwards(r, k, s):
    return _bipolar_cell(r, k, s, 1e3, "hi", "lo", 5.0)


@cell
def bipolar_cell_with_4k7_base_downwards(r, k, s):
    return _bipolar_cell(r, k, s, 4.7e3, "hi", "lo", 5.0)


@cell
def bipolar_cell_with_10k_base_upwards(r, k, s):
    return _bipolar_cell(r, k, s, 10e3, "lo", "hi", 3.3)


@cell
def bipolar_cell_from_a_weak_driver(r, k, s):
    return _bipolar_cell(r, k, s, 10e3, "lo", "hi", 3.3, rest=False, driver_ohms=1e3)


@cell
def inverting_npn_stage(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 10e3 * r), d.resistor("RC", "5V", "x", 4.7e3), load("x")]
    return [*parts, *d.bipolar("Q1", "x", "b", "0", npn(s))], rails(k), "drv", "x", 0.0, 3.3


@cell
def two_inverting_npn_stages(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 10e3 * r), d.resistor("RC", "3V3", "m", 4.7e3)]
    parts += [d.resistor("RB2", "m", "b2", 10e3), d.resistor("RC2", "5V", "x", 2.2e3), load("x")]
    parts += [*d.bipolar("Q1", "m", "b", "0", npn(s)), *d.bipolar("Q2", "x", "b2", "0", npn(s))]
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def inverting_stage_with_speed_up_capacitor(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 10e3 * r), d.resistor("RC", "5V", "x", 1e3), load("x")]
    parts += [d.capacitor("C1", "a", "b", 47e-12), d.resistor("RE", "b", "0", 22e3)]
    return [*parts, *d.bipolar("Q1", "x", "b", "0", npn(s))], rails(k), "drv", "x", 0.0, 3.3


@cell
def inverting_stage_with_schottky_across(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 4.7e3 * r), d.resistor("RC", "5V", "x", 1e3), load("x")]
    parts += [d.diode("D1", "b", "x", SCHOTTKY)]
    return [*parts, *d.bipolar("Q1", "x", "b", "0", npn(s))], rails(k), "drv", "x", 0.0, 3.3


@cell
def digital_transistor(r, k, s):
    parts = [driver("a"), d.resistor("RC", "5V", "x", 4.7e3), load("x")]
    parts += d.bipolar("Q1", "x", "a", "0", npn(s), base_ohms=10e3 * r, base_emitter_ohms=10e3)
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def digital_transistor_47k(r, k, s):
    parts = [driver("a"), d.resistor("RC", "5V", "x", 10e3), load("x", 30e-12)]
    parts += d.bipolar("Q1", "x", "a", "0", npn(s), base_ohms=47e3 * r, base_emitter_ohms=47e3)
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def emitter_follower(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 100 * r), d.resistor("RE", "x", "0", 2.2e3), load("x", 50e-12)]
    return [*parts, *d.bipolar("Q1", "3V3", "b", "x", npn(s))], rails(k), "drv", "x", 0.0, 3.3


@cell
def pnp_high_side(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 4.7e3 * r), d.resistor("RE", "b", "3V3", 10e3)]
    parts += [d.resistor("RL", "x", "0", 1e3), load("x")]
    parts += d.bipolar("Q1", "x", "b", "3V3", {**PNP, "beta_forward": 100.0 * 2.0**s})
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def npn_lamp_driver(r, k, s):
    lamp = {"saturation_amps": 1e-18, "ideality": 2.0, "series_ohms": 5.0, "junction_farads": 30e-12, "transit_s": 0.0}
    parts = [driver("a"), d.resistor("RB", "a", "b", 2.2e3 * r), d.resistor("RC", "y", "x", 330.0), load("x")]
    parts += [d.diode("D1", "5V", "y", lamp), d.resistor("RX", "5V", "x", 47e3)]
    return [*parts, *d.bipolar("Q1", "x", "b", "0", npn(s))], rails(k), "drv", "x", 0.0, 3.3


# -------------------------------------------------------------------------------------------------------------- mosfets


def _mosfet_cell(r, k, s, drive, out, high, *, reverse=False, gate="3V3", low_pull=10e3, high_pull=10e3):
    parts = [driver(drive), d.resistor("RH", "5V", "hi", high_pull), load("hi"), load("lo")]
    parts.append(d.resistor("RL", "3V3" if low_pull < 1e6 else "0", "lo", low_pull * r))
    ends = ("lo", "hi") if reverse else ("hi", "lo")
    parts.append(d.mosfet("Q1", ends[0], gate, ends[1], fet(s)))
    return parts, rails(k), "drv", out, 0.0, high


@cell
def mosfet_cell_upwards(r, k, s):
    return _mosfet_cell(r, k, s, "lo", "hi", 3.3)


@cell
def mosfet_cell_downwards(r, k, s):
    return _mosfet_cell(r, k, s, "hi", "lo", 5.0)


@cell
def mosfet_cell_with_strong_pull_ups(r, k, s):
    return _mosfet_cell(r, k, s, "lo", "hi", 3.3, low_pull=1e3, high_pull=1e3)


@cell
def mosfet_cell_reversed(r, k, s):
    return _mosfet_cell(r, k, s, "hi", "lo", 5.0, reverse=True)


@cell
def mosfet_cell_reversed_upwards(r, k, s):
    return _mosfet_cell(r, k, s, "lo", "hi", 3.3, reverse=True)


@cell
def mosfet_cell_gate_on_the_wrong_rail(r, k, s):
    return _mosfet_cell(r, k, s, "hi", "lo", 5.0, gate="5V")


@cell
def mosfet_cell_gate_on_the_wrong_rail_upwards(r, k, s):
    return _mosfet_cell(r, k, s, "lo", "hi", 3.3, gate="5V")


@cell
def mosfet_cell_without_low_pull_up(r, k, s):
    # A leakage of 10 megohm stands for the receiver; without it the node would have no voltage.
    return _mosfet_cell(r, k, s, "hi", "lo", 5.0, low_pull=10e6)


@cell
def mosfet_cell_at_1v8(r, k, s):
    parts = [driver("lo"), d.resistor("RH", "3V3", "hi", 10e3), d.resistor("RL", "1V8", "lo", 10e3 * r)]
    parts += [load("hi"), load("lo")]
    parts.append(d.mosfet("Q1", "hi", "1V8", "lo", fet(s, threshold_volts=0.85 + 0.2 * s)))
    return parts, rails(k, **{"1V8": 1.8 * k}), "drv", "hi", 0.0, 1.8


@cell
def mosfet_cell_with_series_resistors(r, k, s):
    parts = [driver("a"), d.resistor("R1", "a", "lo", 330 * r), d.resistor("RH", "5V", "hi", 4.7e3), load("y", 50e-12)]
    parts += [d.resistor("RL", "3V3", "lo", 4.7e3), d.resistor("R2", "hi", "y", 100.0)]
    return [*parts, d.mosfet("Q1", "hi", "3V3", "lo", fet(s))], rails(k), "drv", "y", 0.0, 3.3


@cell
def inverting_mosfet_stage(r, k, s):
    parts = [driver("g", 100.0), d.resistor("RD", "5V", "x", 4.7e3 * r), load("x")]
    return [*parts, d.mosfet("Q1", "x", "g", "0", fet(s))], rails(k), "drv", "x", 0.0, 3.3


@cell
def two_inverting_mosfet_stages(r, k, s):
    parts = [driver("g"), d.resistor("RD", "3V3", "m", 4.7e3 * r), d.resistor("RD2", "5V", "x", 2.2e3), load("x")]
    parts += [d.mosfet("Q1", "m", "g", "0", fet(s)), d.mosfet("Q2", "x", "m", "0", fet(s))]
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def open_drain_bus(r, k, s):
    parts = [driver("g"), d.resistor("RP", "3V3", "x", 2.2e3 * r), load("x", 200e-12)]
    return [*parts, d.mosfet("Q1", "x", "g", "0", fet(s, gain=0.03))], rails(k), "drv", "x", 0.0, 3.3


@cell
def pmos_load_switch(r, k, s):
    parts = [driver("a"), d.resistor("RB", "a", "b", 10e3), d.resistor("RG", "5V", "g", 10e3 * r)]
    parts += [d.resistor("RL", "x", "0", 100.0), load("x", 1e-9)]
    parts += d.bipolar("Q2", "g", "b", "0", npn(s))
    parts.append(d.mosfet("Q1", "x", "g", "5V", {**P_FET, "threshold_volts": 0.9 + 0.3 * s}))
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def pmos_load_switch_with_mosfet(r, k, s):
    parts = [driver("g2"), d.resistor("RG", "5V", "g", 47e3 * r), d.resistor("RL", "x", "0", 220.0), load("x", 1e-9)]
    parts.append(d.mosfet("Q2", "g", "g2", "0", fet(s)))
    parts.append(d.mosfet("Q1", "x", "g", "5V", {**P_FET, "threshold_volts": 0.9 + 0.3 * s}))
    return parts, rails(k), "drv", "x", 0.0, 3.3


@cell
def bus_switch(r, k, s):
    parts = [driver("a"), d.resistor("RL", "x", "0", 100e3 * r), load("x", 30e-12)]
    parts.append(d.switch("U1.1", "a", "gate", "x", threshold_volts=0.9 + 0.2 * s, gain=0.05, farads=2e-12))
    return parts, rails(k, gate=4.2 * k), "drv", "x", 0.0, 5.0


@cell
def bus_switch_with_pull_up(r, k, s):
    parts = [driver("a", 25.0), d.resistor("RP", "5V", "x", 1e3 * r), d.resistor("RP2", "3V3", "a", 2.2e3)]
    parts.append(load("x", 50e-12))
    parts.append(d.switch("U1.1", "a", "gate", "x", threshold_volts=0.7 + 0.1 * s, gain=0.06))
    return parts, rails(k, gate=3.9 * k), "drv", "x", 0.0, 3.3


@cell
def dead_low_rail_behind_a_mosfet_cell(r, k, s):
    parts = [driver("hi", 1e3), d.resistor("RH", "5V", "hi", 10e3 * r), d.resistor("RL", "off", "lo", 10e3)]
    parts += [load("hi"), load("lo")]
    return [*parts, d.mosfet("Q1", "hi", "off", "lo", fet(s))], rails(k, off=0.0), "drv", "hi", 0.0, 5.0


# --------------------------------------------------------------------------------------------------------------- random


def random_network(rng: np.random.Generator) -> Network:
    """Return a circuit of 3 to 8 nodes with elements of every kind between nodes drawn at random.

    Every node has a resistor towards a supply, directly or through others, so that it has a voltage at all.
    """
    count = int(rng.integers(3, 9))
    nodes = [f"n{i}" for i in range(count)]
    fixed: dict[str, Value] = {
        "A": float(rng.choice([1.8, 3.3, 5.0, 12.0])),
        "B": float(rng.uniform(-5, 5)),
        "drv": float(rng.choice([0.0, 3.3, 5.0])),
    }
    every = [*nodes, *fixed, "0"]

    def pick(number: int) -> list[str]:
        return [str(node) for node in rng.choice(every, size=number, replace=False)]

    parts: Parts = []
    for i, node in enumerate(nodes):
        parts.append(d.resistor(f"R{i}", node, str(rng.choice([*nodes[:i], *fixed, "0"])), 10 ** rng.uniform(1, 5.5)))
    kinds = ["resistor", "current", "signal", "schottky", "clamp", "zener", "npn", "pnp", "nmos", "pmos", "switch"]
    for i in range(int(rng.integers(2, 2 + count))):
        kind, label = str(rng.choice(kinds)), f"X{i}"
        if kind == "resistor":
            parts.append(d.resistor(label, *pick(2), 10 ** rng.uniform(1, 6)))
        elif kind == "current":
            parts.append(d.current(label, *pick(2), 10 ** rng.uniform(-9, -4)))
        elif kind in ("signal", "schottky", "clamp"):
            parts.append(d.diode(label, *pick(2), {"signal": SIGNAL, "schottky": SCHOTTKY, "clamp": CLAMP}[kind]))
        elif kind == "zener":
            values = zener(float(rng.choice([2.4, 3.3, 5.1, 10.0])), rng.uniform(10, 90), rng.uniform(50, 500))
            parts.append(d.diode(label, *pick(2), values))
        elif kind in ("npn", "pnp"):
            gains = {"beta_forward": 10 ** rng.uniform(1.3, 2.8), "beta_reverse": 10 ** rng.uniform(-1, 1.3)}
            parts += d.bipolar(label, *pick(3), {**(NPN if kind == "npn" else PNP), **gains})
        elif kind in ("nmos", "pmos"):
            figures = {"threshold_volts": rng.uniform(0.5, 3), "gain": 10 ** rng.uniform(-2.5, 0)}
            drain, gate, source = pick(3)
            # Half an ohm in the source: a body diode straight across two supplies has no operating point.
            parts.append(d.resistor(f"{label} source", source, f"{label} s", 0.5))
            values = {**(N_FET if kind == "nmos" else P_FET), **figures}
            parts.append(d.mosfet(label, drain, gate, f"{label} s", values))
        else:
            a, gate, b = pick(3)
            threshold, gain = rng.uniform(0.4, 1.0), 10 ** rng.uniform(-2, 0)
            parts.append(d.switch(label, a, gate, b, threshold_volts=threshold, gain=gain))
    return Network(branches=tuple(parts), fixed=fixed)
