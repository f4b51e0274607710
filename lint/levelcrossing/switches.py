"""Gates and bases of transistors that switch a load: what they need from the logic that drives them.

A P-channel MOSFET or PNP transistor with its source or emitter on a supply is off only while its gate or base stays close
to that supply; an N-channel MOSFET to ground is on only when the logic's high exceeds its threshold. Such a terminal is
a receiver like an input, with levels that follow from the transistor.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace

from levelcrossing.levels import parse
from levelcrossing.model import Basis, BipolarFacts, Element, Island, MosfetFacts, PinModel, Rails, Receive, Spread

# A threshold is stated at a current of 0.25 mA to 1 mA; below this much more than it, a channel is no switch [V] (practice).
OVERDRIVE_VOLTS = 0.2
# Between emitter and base: a PNP transistor conducts microamperes at 0.4 V, and is on at 0.5 V (practice).
OFF_VOLTS, ON_VOLTS = 0.4, 0.5
# Digital transistors with built-in resistors state the voltage that keeps them off as 0.5 V (ROHM DTA114E, from memory).
DIGITAL_OFF_VOLTS, DIGITAL_ON_VOLTS = 0.5, 1.0
ROLE = "gate"


def switch_terminals(island: Island, rails: Rails, pins: Mapping[tuple[str, str], PinModel]) -> Iterator[PinModel]:
    """Yield the gate or base of every transistor of an island that stands on a rail, as a pin that reads.

    Parameters
    ----------
    island : Island
    rails : Rails
    pins : mapping
        (reference, number) to PinModel.

    Yields
    ------
    PinModel
        Of role ``gate``; its supply is the rail of the source or emitter, ground for an N channel. Levels [V] follow
        from the threshold; the maximum is what the gate bears from its source.
    """
    for element in island.elements:
        if element.kind not in ("mosfet", "bipolar") or len(element.terminals) < 3:
            continue
        control, foot = element.nets[1], element.nets[2]
        pin = pins.get((element.part, element.terminals[1]))
        volts = rails.volts(foot)
        if pin is None or volts is None or control not in island.nets:
            continue
        receive = _receive(element, grounded=rails.is_ground(foot))
        if receive is not None:
            yield replace(
                pin,
                role=ROLE,
                supply=foot,
                supply_volts=volts,
                receive=receive,
                basis=Basis.weakest(element.basis, receive.basis),
            )


def _receive(element: Element, *, grounded: bool) -> Receive | None:
    facts = element.facts
    if isinstance(facts, MosfetFacts):
        threshold, most = facts.threshold_volts, facts.vgs_max_volts
        on = threshold.high + OVERDRIVE_VOLTS
        if facts.polarity == "p" and not grounded:
            high, low = f"V-{threshold.low:.6g}", f"V-{on:.6g}"
        elif facts.polarity == "n" and grounded:
            high, low = f"{on:.6g}", f"{threshold.low:.6g}"
        else:
            return None
        top, bottom = f"V+{most:.6g}", f"V-{most:.6g}"
    elif isinstance(facts, BipolarFacts) and facts.polarity == "pnp" and not grounded:
        digital = bool(facts.base_ohms)
        off, on = (DIGITAL_OFF_VOLTS, DIGITAL_ON_VOLTS) if digital else (OFF_VOLTS, ON_VOLTS)
        high, low = f"V-{off:.6g}", f"V-{on:.6g}"
        top, bottom = f"V+{facts.vebo_volts:.6g}", "V-40"
    else:
        return None
    return Receive(
        vih=parse(high),
        vil=parse(low),
        vmax=parse(top),
        vmin=parse(bottom),
        vmax_off=None,
        clamp_high=False,
        clamp_low=False,
        injection_amps=None,
        # The transistor itself stands in the circuit with its capacitances.
        capacitance_farads=Spread.exactly(0.0),
        leakage_amps=0.0,
        off_tolerant=True,
        basis=Basis.ASSUMED if facts.generic else Basis.LIBRARY,
        source=facts.provenance.source,
    )
