"""From figures of the trade to parameters: the solved element shows the figures that it was made from."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from small_boards import BOOK, board_of

from levelcrossing import devices as d
from levelcrossing.model import BipolarFacts, DiodeFacts, MosfetFacts, Provenance, Spread
from levelcrossing.network import Branch, Network
from levelcrossing.solve import solve_dc

ROW = Provenance(row="test", source="invented for the test", certainty="practice")

SIGNAL = DiodeFacts(
    kind="signal",
    forward=((1e-4, 0.50, 0.0), (1e-3, 0.62, 0.0), (5e-3, 0.70, 0.72), (1e-2, 0.75, 1.0)),
    capacitance_farads=4e-12,
    reverse_max_volts=75.0,
    zener_volts=None,
    zener_amps=0.0,
    zener_ohms=0.0,
    knee_ohms=0.0,
    knee_amps=0.0,
    forward_max_amps=0.2,
    provenance=ROW,
)
ZENER = dataclasses.replace(
    SIGNAL,
    kind="zener",
    forward=(),
    zener_volts=Spread(low=3.1, nominal=3.3, high=3.5),
    zener_amps=5e-3,
    zener_ohms=85.0,
    knee_ohms=350.0,
    knee_amps=1e-3,
)
FET = MosfetFacts(
    polarity="n",
    threshold_volts=Spread(low=0.8, nominal=1.3, high=1.5),
    gain=Spread(low=0.056, nominal=0.31, high=0.5),
    ciss_farads=27e-12,
    coss_farads=13e-12,
    crss_farads=6e-12,
    body_drop_volts=0.8,
    vgs_max_volts=20.0,
    vds_max_volts=50.0,
    gate_least_volts=4.5,
    id_max_amps=0.22,
    provenance=ROW,
)
NPN = BipolarFacts(
    polarity="npn",
    beta_forward=Spread(low=70.0, nominal=150.0, high=300.0),
    beta_reverse=Spread(low=0.74, nominal=4.0, high=20.0),
    vbe_volts=0.65,
    vbe_at_amps=1e-3,
    vce_sat_volts=0.2,
    cbe_farads=8e-12,
    cbc_farads=4e-12,
    transit_s=0.5e-9,
    storage_s=Spread(low=100e-9, nominal=200e-9, high=200e-9),
    vebo_volts=6.0,
    vceo_volts=40.0,
    ic_max_amps=0.2,
    base_ohms=0.0,
    base_emitter_ohms=None,
    provenance=ROW,
)


def drop_at(branch: Branch, amps: float) -> float:
    """Return the voltage from the first node of a two-node branch (``x``) to ground at a current [A] into it."""
    return float(solve_dc(Network(branches=(branch, d.current("I", "0", "x", amps)), fixed={})).volts["x"][0])


@pytest.mark.parametrize(("amps", "volts"), [(1e-4, 0.50), (1e-3, 0.62), (5e-3, 0.70), (1e-2, 0.75)])
def test_a_diode_passes_through_its_typical_points(amps: float, volts: float) -> None:
    assert drop_at(d.diode("D", "x", "0", d.diode_values(SIGNAL)), amps) == pytest.approx(volts, abs=0.012)


@pytest.mark.parametrize(("amps", "volts"), [(1e-4, 0.24), (1e-3, 0.32), (1e-2, 0.40)])
def test_the_greatest_drop_at_small_currents_is_not_that_of_large_ones(amps: float, volts: float) -> None:
    """BAT54 of five makers: 0.24, 0.32, 0.40 V at most at 0.1, 1, 10 mA, although 1.0 V at 100 mA."""
    facts = BOOK.diode(board_of("D1 BAT54 Diode:BAT54 | 1 K passive /K | 2 A passive /Q").parts[0])
    assert facts is not None
    found = drop_at(d.diode("D", "x", "0", d.diode_values(facts, drop="high")), amps)
    assert volts - 0.01 < found < volts + 0.04


def test_extremes_of_the_drop_lie_on_either_side() -> None:
    least, usual, most = (
        drop_at(d.diode("D", "x", "0", d.diode_values(SIGNAL, drop=drop)), 1e-2) for drop in ("low", "nominal", "high")
    )
    assert most == pytest.approx(1.0, abs=0.012)
    assert least == pytest.approx(usual - d.LEAST_DROP_SHIFT_VOLTS, abs=0.005)


@pytest.mark.parametrize("missing", [0.0, float("nan")])
def test_a_row_with_greatest_drops_only_gives_a_lower_typical_one(missing: float) -> None:
    facts = dataclasses.replace(SIGNAL, forward=((1e-3, missing, 0.715), (1e-2, missing, 0.855)))
    usual = drop_at(d.diode("D", "x", "0", d.diode_values(facts)), 1e-3)
    most = drop_at(d.diode("D", "x", "0", d.diode_values(facts, drop="high")), 1e-3)
    assert 0.55 < usual < 0.65
    assert most == pytest.approx(0.72, abs=0.03)


def test_a_diode_without_any_point_is_generic_of_its_kind() -> None:
    for kind, volts in (("signal", 0.62), ("schottky", 0.25), ("led", 1.7), ("zener", 0.7)):
        facts = dataclasses.replace(SIGNAL, kind=kind, forward=())
        assert drop_at(d.diode("D", "x", "0", d.diode_values(facts)), 1e-3) == pytest.approx(volts, abs=0.002)


@pytest.mark.parametrize(("extreme", "volts"), [("low", 3.1), ("nominal", 3.3), ("high", 3.5)])
def test_a_zener_shows_its_voltage_and_both_resistances(extreme: d.Extreme, volts: float) -> None:
    """Stated: the voltage at 5 mA, 85 ohm there and 350 ohm at 1 mA."""
    branch = d.diode("D", "0", "x", d.diode_values(ZENER, breakdown=extreme))
    assert drop_at(branch, 5e-3) == pytest.approx(volts, abs=1e-3)
    assert (drop_at(branch, 5.05e-3) - drop_at(branch, 4.95e-3)) / 1e-4 == pytest.approx(85.0, rel=0.01)
    assert (drop_at(branch, 1.01e-3) - drop_at(branch, 0.99e-3)) / 2e-5 == pytest.approx(350.0, rel=0.01)


def test_a_3v3_zener_at_1_milliampere_is_soft() -> None:
    """A BZX84C3V3 shows 2.3 to 2.9 V at 1 mA (maker's curve), clearly less than its 3.3 V at 5 mA."""
    assert 2.3 < drop_at(d.diode("D", "0", "x", d.diode_values(ZENER)), 1e-3) < 2.9


@pytest.mark.parametrize("volts", [2.4, 5.1, 12.0, 36.0])
@pytest.mark.parametrize("ohms", [0.0, 10.0, 90.0])
def test_any_zener_voltage_is_met(volts: float, ohms: float) -> None:
    values, series = d.zener_values(volts, ohms=ohms)
    forward = {"saturation_amps": 1e-14, "ideality": 1.0, "series_ohms": series}
    assert drop_at(d.diode("D", "0", "x", {**forward, **values}), 5e-3) == pytest.approx(volts, abs=2e-3)


def test_a_generic_clamp_drops_0_7_volt_at_1_milliampere() -> None:
    branch = d.diode("D", "x", "0", d.clamp_values())
    assert drop_at(branch, 1e-3) == pytest.approx(0.7, abs=1e-4)
    assert drop_at(branch, 20e-3) == pytest.approx(1.0, abs=0.05)


@pytest.mark.parametrize(("threshold", "gain"), [("low", "high"), ("nominal", "nominal"), ("high", "low")])
def test_a_mosfet_has_the_resistance_that_its_gain_stands_for(threshold: d.Extreme, gain: d.Extreme) -> None:
    """1 / Rds = K (VGS - Vth)."""
    values = d.mosfet_values(FET, threshold=threshold, gain=gain)
    parts = (d.mosfet("Q", "x", "gate", "0", values), d.current("I", "0", "x", 1e-4))
    found = solve_dc(Network(branches=parts, fixed={"gate": 4.5}))
    siemens = getattr(FET.gain, gain) * (4.5 - getattr(FET.threshold_volts, threshold))
    assert found.volts["x"][0] / 1e-4 == pytest.approx(1 / siemens, rel=1e-3)


def test_a_p_channel_mirrors_an_n_channel() -> None:
    values = d.mosfet_values(dataclasses.replace(FET, polarity="p"))
    n_parts = (d.mosfet("Q", "x", "gate", "0", d.mosfet_values(FET)), d.resistor("R", "x", "rail", 1e3))
    p_parts = (d.mosfet("Q", "x", "gate", "0", values), d.resistor("R", "x", "rail", 1e3))
    for gate in (-4.0, 0.0, 1.5, 3.0):
        n_volts = solve_dc(Network(branches=n_parts, fixed={"gate": gate, "rail": 5.0})).volts["x"][0]
        p_volts = solve_dc(Network(branches=p_parts, fixed={"gate": -gate, "rail": -5.0})).volts["x"][0]
        assert p_volts == pytest.approx(-n_volts, abs=1e-9)


def test_capacitances_of_a_mosfet_add_up_to_what_is_stated() -> None:
    """Ciss = Cgs + Cgd, Coss = Cds + Cgd, Crss = Cgd."""
    values = d.mosfet_values(FET)
    assert values["cgs_farads"] + values["cgd_farads"] == pytest.approx(27e-12)
    assert values["cds_farads"] + values["cgd_farads"] == pytest.approx(13e-12)
    assert values["cgd_farads"] == pytest.approx(6e-12)


def test_a_body_diode_drops_what_is_stated() -> None:
    parts = (d.mosfet("Q", "0", "off", "x", d.mosfet_values(FET)), d.current("I", "0", "x", 0.03))
    assert solve_dc(Network(branches=parts, fixed={"off": -9.0})).volts["x"][0] == pytest.approx(0.8, abs=1e-6)


@pytest.mark.parametrize("extreme", ["low", "nominal", "high"])
def test_a_bipolar_transistor_has_the_stated_gains_both_ways(extreme: d.Extreme) -> None:
    values = d.bipolar_values(NPN, beta_forward=extreme, beta_reverse=extreme)
    for ends, spread in ((("V", "b", "0"), NPN.beta_forward), (("0", "b", "V"), NPN.beta_reverse)):
        parts = (*d.bipolar("Q", *ends, values), d.current("I", "0", "b", 10e-6))
        found = solve_dc(Network(branches=parts, fixed={"V": 2.0}))
        assert found.amps_from("V")[0] == pytest.approx(getattr(spread, extreme) * 10e-6, rel=1e-4)


def test_a_digital_transistor_brings_its_resistors() -> None:
    """10 k and 10 k: the base sees half the input until it conducts."""
    parts = d.bipolar("Q", "x", "in", "0", d.bipolar_values(NPN), base_ohms=10e3, base_emitter_ohms=10e3)
    assert [branch.kind for branch in parts] == ["resistor", "resistor", "bipolar"]
    held = {"5V": 5.0, "in": np.array([0.5, 3.3])}
    found = solve_dc(Network(branches=(*parts, d.resistor("RC", "5V", "x", 4.7e3)), fixed=held))
    assert found.volts["Q inner base"][0] == pytest.approx(0.25, abs=1e-3)
    assert found.volts["x"][0] > 4.9
    assert found.volts["x"][1] < 0.2


def test_a_gated_path_is_a_resistance_or_nothing() -> None:
    parts = (d.gated("D", "x", "0", 50.0), d.resistor("R", "5V", "x", 950.0))
    gate = d.gate_of("D")
    network = Network(branches=parts, fixed={"5V": 5.0, gate: np.array([d.GATE_ON_VOLTS, d.GATE_OFF_VOLTS])})
    assert solve_dc(network).volts["x"] == pytest.approx([0.25, 5.0], abs=1e-3)


def test_a_longer_storage_time_needs_a_longer_reverse_transit_time() -> None:
    short = d.bipolar_values(NPN, storage="low")["reverse_transit_s"]
    long = d.bipolar_values(NPN, storage="high")["reverse_transit_s"]
    assert 0 < short < long
    assert d.reverse_transit_s(0.0, 1e-9, 100.0, 1.0) == 0.0
