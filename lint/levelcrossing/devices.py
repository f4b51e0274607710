"""Element models: what the facts of the trade become in the solver's parameters.

Equations (textbook symbols; the solver evaluates them, :mod:`levelcrossing.decks` hands the same ones to a simulator):

* junction: ``I = IS (exp(V / (N VT)) - 1)``, behind a series resistance; stored charge ``TT I``;
* Zener: a second junction the other way round, behind an offset voltage: ``I = IZ (exp((VR - V0) / (NZ VT)) - 1)``.
  ``NZ`` gives the soft knee of low-voltage Zeners, which one exponential of a plain junction cannot;
* bipolar transistor: Ebers-Moll in transport form, both directions, charges ``TF`` and ``TR``;
* MOSFET: square law ``I = K/2 ([VGS - VT]+² - [VGD - VT]+²)``, which is symmetric in drain and source, with its body
  diode and constant capacitances.

All at 27 °C.

References
----------
.. [1] J. J. Ebers and J. L. Moll, "Large-signal behavior of junction transistors", Proc. IRE 42 (1954) 1761-1772.
.. [2] H. Shichman and D. A. Hodges, "Modeling and simulation of insulated-gate field-effect transistor switching
   circuits", IEEE J. Solid-State Circuits 3 (1968) 285-289.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

from levelcrossing.network import Branch, Value

if TYPE_CHECKING:
    from levelcrossing.model import BipolarFacts, DiodeFacts, MosfetFacts, Spread

Extreme = Literal["low", "nominal", "high"]

# Boltzmann's constant over the elementary charge (both exact in the SI) at 300.15 K [V].
THERMAL_VOLTS = 1.380649e-23 / 1.602176634e-19 * 300.15

# A base always has some resistance; 10 ohm is the usual order for small-signal parts (assumption).
BASE_OHMS = 10.0
# Least series resistance of any junction (assumption; keeps currents finite).
LEAST_SERIES_OHMS = 0.5
# A generic input clamp diode: about 0.7 V at 1 mA and 1 V at 20 mA (assumption, no maker specifies it).
CLAMP_VOLTS, CLAMP_AMPS, CLAMP_OHMS = 0.7, 1e-3, 10.0
# Forward drop where the facts hold none, by kind: volts at 1 mA, ideality (assumption, family typical).
_GENERIC_FORWARD = {
    "signal": (0.62, 1.8),
    "schottky": (0.25, 1.05),
    "rectifier": (0.60, 1.8),
    "led": (1.70, 2.0),
    "zener": (0.70, 1.1),
    "suppressor": (0.70, 1.1),
}
# Saturation current of the Zener branch where an offset voltage is used: too small to matter when off [A].
_ZENER_AMPS = 1e-16
# How far a good diode's drop may lie below the typical one [V] (assumption, see below).
LEAST_DROP_SHIFT_VOLTS = 0.05
# Where a body diode's drop is stated without a current [A]: the figures stand for about 10-100 mA (assumption).
_BODY_AMPS = 0.03


def resistor(label: str, a: str, b: str, ohms: Value) -> Branch:
    """Return a resistor of ``ohms`` [ohm] between nodes ``a`` and ``b``."""
    return Branch(kind="resistor", label=label, nodes=(a, b), values={"ohms": ohms})


def capacitor(label: str, a: str, b: str, farads: Value) -> Branch:
    """Return a capacitor of ``farads`` [F] between nodes ``a`` and ``b``."""
    return Branch(kind="capacitor", label=label, nodes=(a, b), values={"farads": farads})


def current(label: str, a: str, b: str, amps: Value) -> Branch:
    """Return a source that draws ``amps`` [A] out of node ``a`` and pushes it into node ``b``."""
    return Branch(kind="current", label=label, nodes=(a, b), values={"amps": amps})


def saturation_amps(volts: float, amps: float, ideality: float = 1.0) -> float:
    """Return the saturation current [A] of a junction that carries ``amps`` [A] at ``volts`` [V].

    Examples
    --------
    >>> print(f"{saturation_amps(0.7, 1e-3):.3g} A")
    1.76e-15 A
    """
    return amps / math.expm1(volts / (ideality * THERMAL_VOLTS))


def _pick(spread: Spread, extreme: Extreme) -> float:
    return float(getattr(spread, extreme))


# ---------------------------------------------------------------------------------------------------------------- diode


def _known(value: float | None) -> bool:
    return value is not None and math.isfinite(value) and value > 0


def _forward_points(facts: DiodeFacts, drop: Extreme) -> list[tuple[float, float]]:
    """Return (amperes, volts) of the forward curve, the drop at the wished extreme.

    Where a row has only a greatest drop, 85 % of it stands for the typical one (assumption); the least drop lies as far
    below the typical one as the greatest lies above it, but 50 mV at most: makers' maxima hold a guard band that says
    nothing of how far a good sample falls short of the typical, and 50 mV is a factor of seven in leakage (assumption).
    """
    points = []
    for amps, typical, most in facts.forward:
        if not _known(amps) or not (_known(typical) or _known(most)):
            continue
        usual = typical if _known(typical) else 0.85 * most
        reach = max(most - usual, 0.0) if _known(most) else 0.0
        points.append((amps, usual + {"low": -min(reach, LEAST_DROP_SHIFT_VOLTS), "nominal": 0.0, "high": reach}[drop]))
    return sorted(points)


def _fitted_forward(facts: DiodeFacts, drop: Extreme) -> tuple[float, float, float]:
    """Return saturation current [A], ideality [1] and series resistance [ohm] through the forward points.

    The typical curve gives ideality and resistance. The greatest drop starts where its first limit stands and reaches
    its last one through more resistance: limits spread far more at large currents than at small ones, where a level is
    at stake. The least drop is the typical curve, moved as a whole.
    """
    volts_at_1ma, ideality = _GENERIC_FORWARD.get(facts.kind, _GENERIC_FORWARD["signal"])
    series = LEAST_SERIES_OHMS
    usual = _forward_points(facts, "nominal")
    if not usual:
        return saturation_amps(volts_at_1ma, 1e-3, ideality), ideality, series
    if len(usual) > 1:
        # Two unknowns from the ends of the curve, ideality first: at small currents the resistance does not matter.
        (i0, v0), (i1, v1) = usual[0], usual[1]
        most = 4.0 if facts.kind == "led" else 2.2
        ideality = min(max((v1 - v0) / (THERMAL_VOLTS * math.log(i1 / i0)), 1.0), most)
        series = _series_ohms(usual, ideality)
    amps, volts = usual[0]
    moved = _forward_points(facts, drop)
    shifts = [after - before for (_, before), (_, after) in zip(usual, moved, strict=True)]
    if drop == "high":
        first = volts + next((shift for shift in shifts if shift), 0.0)
        if len(moved) > 1:
            series = max(series, _series_ohms([(amps, first), moved[-1]], ideality))
    else:
        first = volts + max(shifts, key=abs)
    across = max(first - series * amps, 0.3 * volts)
    return saturation_amps(across, amps, ideality), ideality, series


def _series_ohms(points: Sequence[tuple[float, float]], ideality: float) -> float:
    """Return the resistance [ohm] that leads an exponential through the first point to the last one."""
    (i0, v0), (ia, va) = points[0], points[-1]
    rest = va - v0 - ideality * THERMAL_VOLTS * math.log(ia / i0)
    return max(rest / (ia - i0), LEAST_SERIES_OHMS)


def diode_values(facts: DiodeFacts, *, drop: Extreme = "nominal", breakdown: Extreme = "nominal") -> dict[str, float]:
    """Return the values of a ``diode`` branch.

    Parameters
    ----------
    facts : DiodeFacts
    drop : {"low", "nominal", "high"}
        Which extreme of the forward drop.
    breakdown : {"low", "nominal", "high"}
        Which extreme of the Zener voltage.

    Returns
    -------
    dict
        As the table in :mod:`levelcrossing.network` has it.
    """
    isat, ideality, series = _fitted_forward(facts, drop)
    values = {
        "saturation_amps": isat,
        "ideality": ideality,
        "series_ohms": series,
        "junction_farads": facts.capacitance_farads,
        "transit_s": 0.0,
    }
    if facts.zener_volts is not None:
        zener, series = zener_values(
            _pick(facts.zener_volts, breakdown),
            facts.zener_amps,
            ohms=facts.zener_ohms,
            knee_ohms=facts.knee_ohms,
            knee_amps=facts.knee_amps,
        )
        values.update(zener, series_ohms=series)
    return values


def zener_values(
    volts: float, amps: float = 5e-3, *, ohms: float = 0.0, knee_ohms: float = 0.0, knee_amps: float = 1e-3
) -> tuple[dict[str, float], float]:
    """Return the Zener part of a ``diode`` branch's values and the series resistance [ohm] that goes with it.

    Parameters
    ----------
    volts, amps : float
        The point that the maker states [V, A].
    ohms : float
        Differential resistance there [ohm]; 0 when unknown.
    knee_ohms, knee_amps : float
        Differential resistance at the knee [ohm] and its current [A]; 0 ohm when unknown.

    Notes
    -----
    One exponential behind a resistance has ``dV/dI = NZ VT / I + RS``; the two differential resistances give both.
    Where the knee is unknown, nine tenths of the resistance at the stated current count as knee (assumption).
    """
    if not _known(amps):
        amps = 5e-3
    if not _known(ohms):
        # Soft below 5 V (tunnelling), hard above (avalanche): typical BZX84 resistances at 5 mA, rounded (assumption).
        ohms = 85.0 if volts < 5 else 20.0
    knee_volts = 0.9 * ohms * amps
    if _known(knee_ohms) and _known(knee_amps) and knee_amps < amps and knee_ohms > ohms:
        knee_volts = min((knee_ohms - ohms) / (1 / knee_amps - 1 / amps), 0.98 * ohms * amps)
    knee_volts = max(knee_volts, THERMAL_VOLTS)
    series = max(ohms - knee_volts / amps, LEAST_SERIES_OHMS)
    across = volts - series * amps
    isat = amps / math.expm1(min(across / knee_volts, 600.0))
    offset = 0.0
    if isat < _ZENER_AMPS:
        isat = _ZENER_AMPS
        offset = across - knee_volts * math.log1p(amps / isat)
    return {
        "zener_amps": isat,
        "zener_ideality": knee_volts / THERMAL_VOLTS,
        "zener_offset_volts": offset,
    }, series


def clamp_values(*, volts: float = CLAMP_VOLTS, farads: float = 0.0) -> dict[str, float]:
    """Return the values of a ``diode`` branch for a generic input clamp of ``volts`` [V] at 1 mA.

    The pin's capacitance is stated for the pin as a whole, so the clamp itself has none unless ``farads`` [F] says so.
    """
    return {
        "saturation_amps": saturation_amps(volts - CLAMP_OHMS * CLAMP_AMPS, CLAMP_AMPS),
        "ideality": 1.0,
        "series_ohms": CLAMP_OHMS,
        "junction_farads": farads,
        "transit_s": 0.0,
    }


def diode(label: str, anode: str, cathode: str, values: dict[str, Value] | dict[str, float]) -> Branch:
    """Return a diode or Zener; ``values`` come from :func:`diode_values` or :func:`clamp_values`."""
    return Branch(kind="diode", label=label, nodes=(anode, cathode), values=dict(values))


# -------------------------------------------------------------------------------------------------------------- bipolar


def bipolar_values(
    facts: BipolarFacts,
    *,
    beta_forward: Extreme = "nominal",
    beta_reverse: Extreme = "nominal",
    storage: Extreme = "nominal",
) -> dict[str, float]:
    """Return the values of a ``bipolar`` branch; the arguments choose an extreme of each spread.

    The built-in resistors of a digital transistor are branches of their own: see :func:`bipolar`.
    """
    forward = _pick(facts.beta_forward, beta_forward)
    reverse = max(_pick(facts.beta_reverse, beta_reverse), 0.01)
    volts = facts.vbe_volts if _known(facts.vbe_volts) else 0.65
    amps = facts.vbe_at_amps if _known(facts.vbe_at_amps) else 1e-3
    transit = facts.transit_s if _known(facts.transit_s) else 0.5e-9
    return {
        "polarity": 1.0 if facts.polarity == "npn" else -1.0,
        "saturation_amps": saturation_amps(volts, amps),
        "beta_forward": forward,
        "beta_reverse": reverse,
        "base_ohms": BASE_OHMS,
        "cbe_farads": facts.cbe_farads,
        "cbc_farads": facts.cbc_farads,
        "transit_s": transit,
        "reverse_transit_s": reverse_transit_s(_pick(facts.storage_s, storage), transit, forward, reverse),
    }


def reverse_transit_s(storage_s: float, transit_s: float, beta_forward: float, beta_reverse: float) -> float:
    """Return the reverse transit time [s] that gives a stated storage time.

    Parameters
    ----------
    storage_s : float
        Storage time [s] of the usual test: collector current ten times the base current, the same base current to
        switch off.
    transit_s, beta_forward, beta_reverse : float
        Forward transit time [s], current gains [1].

    Notes
    -----
    The test takes ``ts = TS ln((IB1 + IB2) / (IC/BF + IB2))``; the saturation time constant of Ebers-Moll is
    ``TS = AF (TF + AR TR) / (1 - AF AR)``.
    """
    alpha_f, alpha_r = beta_forward / (1 + beta_forward), beta_reverse / (1 + beta_reverse)
    fraction = math.log(2 / (1 + min(10 / beta_forward, 0.9)))
    constant = max(storage_s, 0.0) / fraction
    return max((constant * (1 - alpha_f * alpha_r) / alpha_f - transit_s) / alpha_r, 0.0)


def bipolar(
    label: str,
    collector: str,
    base: str,
    emitter: str,
    values: dict[str, Value] | dict[str, float],
    *,
    base_ohms: Value = 0.0,
    base_emitter_ohms: Value | None = None,
) -> tuple[Branch, ...]:
    """Return a bipolar transistor, with the built-in resistors [ohm] of a digital one where given."""
    branches = []
    inner = base
    if isinstance(base_ohms, float | int) and base_ohms <= 0:
        base_ohms = 0.0
    else:
        inner = f"{label} inner base"
        branches.append(resistor(f"{label} base resistor", base, inner, base_ohms))
    if base_emitter_ohms is not None:
        branches.append(resistor(f"{label} base-emitter resistor", inner, emitter, base_emitter_ohms))
    branches.append(Branch(kind="bipolar", label=label, nodes=(collector, inner, emitter), values=dict(values)))
    return tuple(branches)


# --------------------------------------------------------------------------------------------------------------- mosfet


def mosfet_values(facts: MosfetFacts, *, threshold: Extreme = "nominal", gain: Extreme = "nominal") -> dict[str, float]:
    """Return the values of a ``mosfet`` branch; the arguments choose an extreme of each spread.

    The stated threshold is used as the square law's: it is stated at some 0.25 mA, which lies 40 to 60 mV above, a
    small error on the cautious side of conducting.
    """
    drop = facts.body_drop_volts if _known(facts.body_drop_volts) else 0.8
    return {
        "polarity": 1.0 if facts.polarity == "n" else -1.0,
        "threshold_volts": _pick(facts.threshold_volts, threshold),
        "gain": _pick(facts.gain, gain),
        "body_amps": saturation_amps(drop, _BODY_AMPS),
        "body_ideality": 1.0,
        "cgs_farads": max(facts.ciss_farads - facts.crss_farads, 0.0),
        "cgd_farads": facts.crss_farads,
        "cds_farads": max(facts.coss_farads - facts.crss_farads, 0.0),
    }


def mosfet(label: str, drain: str, gate: str, source: str, values: dict[str, Value] | dict[str, float]) -> Branch:
    """Return a MOSFET; ``values`` come from :func:`mosfet_values`."""
    return Branch(kind="mosfet", label=label, nodes=(drain, gate, source), values=dict(values))


def switch(
    label: str, a: str, gate: str, b: str, *, threshold_volts: Value, gain: Value, farads: Value = 0.0
) -> Branch:
    """Return the pass transistor of a bus switch or translator: symmetric, without a body diode.

    Parameters
    ----------
    a, gate, b : str
        Nodes of side a, the (internal) gate and side b.
    threshold_volts, gain, farads : float or ndarray
        Threshold [V], gain [A/V²], capacitance between the sides [F].
    """
    values: dict[str, Value] = {
        "polarity": 1.0,
        "threshold_volts": threshold_volts,
        "gain": gain,
        "cds_farads": farads,
    }
    return Branch(kind="mosfet", label=label, nodes=(a, gate, b), values=values)


# Voltages of the gate node of a gated path: on, off [V]. On is so high that the path's resistance hardly depends on its
# own voltages (0.5 % at 5 V).
GATE_ON_VOLTS, GATE_OFF_VOLTS = 1000.0, -50.0


def gated(label: str, a: str, b: str, ohms: Value) -> Branch:
    """Return a path of ``ohms`` [ohm] that a fixed node opens and closes, e.g. the output of an open-drain driver.

    Its gate node is :func:`gate_of` of the label: hold it at ``GATE_ON_VOLTS`` or ``GATE_OFF_VOLTS``; a ramp between
    them is a linear ramp of the conductance.
    """
    values: dict[str, Value] = {
        "polarity": 1.0,
        "threshold_volts": 0.0,
        "gain": 1.0 / (GATE_ON_VOLTS * ohms),
    }
    return Branch(kind="mosfet", label=label, nodes=(a, gate_of(label), b), values=values)


def gate_of(label: str) -> str:
    """Return the name of the gate node of a :func:`gated` path."""
    return f"gate of {label}"
