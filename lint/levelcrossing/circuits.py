"""From an island, a driver's state and a batch of corners to the arrays that the solver takes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from levelcrossing import devices
from levelcrossing.corners import Codes, Variable, values_of
from levelcrossing.model import (
    BipolarFacts,
    DiodeFacts,
    Drive,
    Element,
    Island,
    Level,
    MosfetFacts,
    PinModel,
    Rails,
    Spread,
    TranslatorFacts,
)
from levelcrossing.network import GROUND, Branch, Network, Value

# Beyond this many unknown nodes a link is no level shifter any more: it is said to be out of scope.
MOST_NODES = 24
# Built-in pull-ups spread this far (common practice; makers state 30 to 50 %).
PULL_SPREAD = 0.3
DRIVER = "inside the driver"
# Threshold of the pass transistor of a bus switch, where the trade data has none [V] (order of magnitude, practice).
SWITCH_THRESHOLD_VOLTS = 0.8

EXTREMES: tuple[devices.Extreme, devices.Extreme, devices.Extreme] = ("low", "nominal", "high")
Vector = npt.NDArray[np.float64]


def level_at(level: Level, volts: Vector) -> Vector:
    """Evaluate a level at an array of supply voltages [V]."""
    unique, back = np.unique(volts, return_inverse=True)
    return np.array([level.at(float(value)) for value in unique])[back]


@dataclass(slots=True)
class Plan:
    """A circuit whose values wait for corners.

    Parameters
    ----------
    variables : list of Variable
    makers : list of callable
        Each gives its branches from the codes by key.
    fixed : dict
        Fixed node to a callable that gives its volts from the codes.
    """

    variables: list[Variable] = field(default_factory=list)
    makers: list[Callable[[Mapping[str, Codes]], Sequence[Branch]]] = field(default_factory=list)
    fixed: dict[str, Callable[[Mapping[str, Codes]], Value]] = field(default_factory=dict)
    missing: list[str] = field(default_factory=list)

    def variable(self, key: str, spread: Spread, unit: str = "") -> str:
        """Register a tolerance once and return its key."""
        if all(known.key != key for known in self.variables):
            self.variables.append(Variable(key=key, spread=spread, unit=unit))
        return key

    def network(self, codes: Codes) -> Network:
        """Return the network at these corners; shape of ``codes`` is (variables, members)."""
        by_key = {variable.key: codes[row] for row, variable in enumerate(self.variables)}
        branches = [branch for maker in self.makers for branch in maker(by_key)]
        return Network(branches=tuple(branches), fixed={node: give(by_key) for node, give in self.fixed.items()})

    def values(self, key: str, codes: Codes) -> Vector:
        """Return a variable's values at these corners."""
        for row, variable in enumerate(self.variables):
            if variable.key == key:
                return values_of(variable.spread, codes[row])
        raise KeyError(key)


class Builder:
    """Builds the plan of one island for one driver.

    Parameters
    ----------
    island : Island
    rails : Rails
    driver : PinModel or None
        The pin that drives; None when only the rails do.
    state : str
        ``high``, ``low`` or ``released``.
    rail_overrides : mapping from rail net to Spread or None
        Voltages to use instead (0 V for a dead rail); None leaves the rail floating.
    others : sequence of (PinModel, str)
        Further drivers and their states, where one circuit combines several signals.
    """

    def __init__(
        self,
        island: Island,
        rails: Rails,
        driver: PinModel | None,
        state: str,
        *,
        rail_overrides: Mapping[str, Spread | None] | None = None,
        with_capacitance: bool = False,
        stray_farads: float = 0.0,
        others: Sequence[tuple[PinModel, str]] = (),
    ) -> None:
        self.island = island
        self.rails = rails
        self.overrides = rail_overrides or {}
        self.plan = Plan()
        self.with_capacitance = with_capacitance
        self._relevant = set(island.nets)
        for element in island.elements:
            self._element(element)
        for pin in island.pins:
            self._pin(pin, dead_end=driver is not None and pin.part == driver.part and pin.number == driver.number)
        if with_capacitance:
            for net in island.nets:
                self._capacitor(f"stray of {net}", net, Spread.exactly(stray_farads))
        if driver is not None and driver.drive is not None and state != "released":
            self._driver(driver, driver.drive, state, DRIVER)
        for other, other_state in others:
            if other.drive is not None and other_state != "released":
                self._driver(other, other.drive, other_state, f"inside {other.part}.{other.number}")

    # -- nodes -------------------------------------------------------------------------------------------------------

    def node(self, net: str) -> str:
        """Return the solver's node for a net: ground, a fixed rail, or the net itself."""
        if self.rails.is_ground(net):
            return GROUND
        if net in self.rails.by_net and net not in self._relevant:
            self.rail(net)
        return net

    def rail(self, net: str) -> str | None:
        """Hold a rail's net at its voltage; return the variable's key, or None for ground and floating rails."""
        if self.rails.is_ground(net):
            return None
        if net in self.overrides:
            spread = self.overrides[net]
            if spread is None:
                return None
        else:
            spread = self.rails.volts(net)
            if spread is None:
                self.plan.missing.append(net)
                return None
        key = self.plan.variable(net, spread, "V")
        self.plan.fixed[net] = lambda codes: values_of(spread, codes[key])
        return key

    def supply_node(self, pin: PinModel) -> str | None:
        """Return a fixed node at the supply of a pin, None when its voltage is not known."""
        if pin.supply and (pin.supply in self.overrides or self.rails.volts(pin.supply) is not None):
            return self.node(pin.supply) if self.rail(pin.supply) is not None or pin.supply in self.overrides else None
        if pin.supply_volts is None:
            return None
        key = self.supply_key(pin)
        assert key is not None
        spread = pin.supply_volts
        self.plan.fixed[key] = lambda codes: values_of(spread, codes[key])
        return key

    def supply_key(self, pin: PinModel) -> str | None:
        """Return the variable that is the supply voltage of a pin."""
        if pin.supply and (pin.supply in self.overrides or self.rails.volts(pin.supply) is not None):
            return self.rail(pin.supply)
        if pin.supply_volts is None:
            return None
        return self.plan.variable(f"supply inside {pin.part}", pin.supply_volts, "V")

    # -- branches ----------------------------------------------------------------------------------------------------

    def _spread_resistor(self, label: str, key: str, a: str, b: str, ohms: Spread) -> None:
        variable = self.plan.variable(key, ohms, "Ω")
        self.plan.makers.append(lambda codes: (devices.resistor(label, a, b, values_of(ohms, codes[variable])),))

    def _capacitor(self, label: str, net: str, farads: Spread) -> None:
        if farads.high <= 0:
            return
        node = self.node(net)
        self.plan.makers.append(lambda codes: (devices.capacitor(label, node, GROUND, farads.nominal),))

    def _element(self, element: Element) -> None:
        nodes = tuple(self.node(net) for net in element.nets)
        label = f"{element.part} {'-'.join(element.terminals)}" if element.terminals else element.part
        match element.kind:
            case "resistor":
                if element.ohms is None:
                    self.plan.missing.append(element.part)
                    return
                self._spread_resistor(label, element.part, nodes[0], nodes[1], element.ohms)
            case "link":
                ohms = element.ohms.nominal if element.ohms else 0.1
                self.plan.makers.append(lambda codes: (devices.resistor(label, nodes[0], nodes[1], ohms),))
            case "capacitor":
                if self.with_capacitance and element.farads is not None:
                    farads = element.farads.nominal
                    self.plan.makers.append(lambda codes: (devices.capacitor(label, nodes[0], nodes[1], farads),))
            case "diode" | "zener":
                self._diode(label, element.part, nodes, element.facts)
            case "bipolar":
                self._bipolar(label, element.part, nodes, element.facts)
            case "mosfet":
                self._mosfet(label, element.part, nodes, element.facts)
            case "switch":
                self._switch(label, element, nodes)
            case _:
                self.plan.missing.append(element.part)

    def _diode(self, label: str, part: str, nodes: Sequence[str], facts: DiodeFacts) -> None:
        table = [[devices.diode_values(facts, drop=drop, breakdown=at) for at in EXTREMES] for drop in EXTREMES]
        drop = self.plan.variable(f"{part} drop", Spread(low=0, nominal=1, high=2))
        zener = self.plan.variable(f"{part} breakdown", Spread(low=0, nominal=1, high=2)) if facts.zener_volts else None
        names = table[1][1].keys()
        arrays = {name: np.array([[table[i][j][name] for j in range(3)] for i in range(3)]) for name in names}

        def make(codes: Mapping[str, Codes]) -> Sequence[Branch]:
            # A diode's curves stand at their extremes only; in a sweep of something else the codes come as floats.
            rows = np.rint(codes[drop]).astype(np.intp)
            columns = np.rint(codes[zener]).astype(np.intp) if zener else np.ones_like(rows)
            values: dict[str, Value] = {name: arrays[name][rows, columns] for name in names}
            return (devices.diode(label, nodes[0], nodes[1], values),)

        self.plan.makers.append(make)

    def _bipolar(self, label: str, part: str, nodes: Sequence[str], facts: BipolarFacts) -> None:
        base = devices.bipolar_values(facts)
        forward = self.plan.variable(f"{part} gain", facts.beta_forward)
        reverse = self.plan.variable(f"{part} reverse gain", facts.beta_reverse)

        def make(codes: Mapping[str, Codes]) -> Sequence[Branch]:
            values: dict[str, Value] = dict(base)
            values["beta_forward"] = values_of(facts.beta_forward, codes[forward])
            values["beta_reverse"] = np.maximum(values_of(facts.beta_reverse, codes[reverse]), 0.01)
            return devices.bipolar(
                label,
                nodes[0],
                nodes[1],
                nodes[2],
                values,
                base_ohms=facts.base_ohms,
                base_emitter_ohms=facts.base_emitter_ohms,
            )

        self.plan.makers.append(make)

    def _mosfet(self, label: str, part: str, nodes: Sequence[str], facts: MosfetFacts) -> None:
        base = devices.mosfet_values(facts)
        threshold = self.plan.variable(f"{part} threshold", facts.threshold_volts, "V")
        gain = self.plan.variable(f"{part} gain", facts.gain)

        def make(codes: Mapping[str, Codes]) -> Sequence[Branch]:
            values: dict[str, Value] = dict(base)
            values["threshold_volts"] = values_of(facts.threshold_volts, codes[threshold])
            values["gain"] = values_of(facts.gain, codes[gain])
            return (devices.mosfet(label, nodes[0], nodes[1], nodes[2], values),)

        self.plan.makers.append(make)

    def _switch(self, label: str, element: Element, nodes: Sequence[str]) -> None:
        """Add a pass switch: a channel whose internal gate lies one threshold above the highest level that it passes.

        Pull-ups inside the part belong to its pins.
        """
        facts = element.facts
        assert isinstance(facts, TranslatorFacts)
        # The gate is biased from the lower of the two supplies, whichever side a pin of it is met first.
        ends = [
            (self.overrides.get(pin.supply, pin.supply_volts), pin)
            for pin in self.island.pins
            if pin.part == element.part and pin.net in element.nets and pin.supply_volts is not None
        ]
        biased = min(
            ((volts, pin) for volts, pin in ends if volts is not None), key=lambda end: end[0].nominal, default=None
        )
        if biased is None:
            self.plan.missing.append(element.part)
            return
        supply, side = biased
        threshold = facts.switch_threshold_volts or SWITCH_THRESHOLD_VOLTS
        key = self.supply_key(side)
        gate = f"gate inside {label}"
        passed = facts.pass_level

        def bias(codes: Mapping[str, Codes]) -> Value:
            volts = values_of(supply, codes[key]) if key is not None else np.asarray(supply.nominal)
            return (volts if passed is None else level_at(passed, volts)) + threshold

        self.plan.fixed[gate] = bias
        highest = float(supply.nominal if passed is None else passed.at(supply.nominal))
        ohms = facts.switch_ohms or 10.0
        gain = 1.0 / (ohms * max(highest, 0.5))
        self.plan.makers.append(
            lambda codes: (devices.switch(label, nodes[0], gate, nodes[1], threshold_volts=threshold, gain=gain),)
        )

    def _pin(self, pin: PinModel, *, dead_end: bool) -> None:
        """Add what a pin that does not drive is to the circuit: its clamp to the supply, its pull-up, its capacitance."""
        label = f"{pin.part}.{pin.number}"
        if pin.receive is not None and pin.receive.clamp_high:
            rail = self.supply_node(pin)
            if rail is not None:
                clamp = devices.diode(f"clamp of {label}", pin.net, rail, devices.clamp_values())
                self.plan.makers.append(lambda codes: (clamp,))
        if pin.pull_up_ohms and pin.role == "signal" and not dead_end:
            rail = self.supply_node(pin)
            if rail is not None:
                self._spread_resistor(
                    f"pull-up inside {label}",
                    f"pull-up inside {label}",
                    rail,
                    pin.net,
                    Spread.around(pin.pull_up_ohms, PULL_SPREAD),
                )
        if self.with_capacitance:
            farads = pin.receive.capacitance_farads if pin.receive is not None else Spread.exactly(5e-12)
            self._capacitor(f"input of {label}", pin.net, farads)

    def _driver(self, pin: PinModel, drive: Drive, state: str, source: str) -> None:
        level, ohms = (drive.high, drive.high_ohms) if state == "high" else (drive.low, drive.low_ohms)
        supply = self.supply_key(pin)
        output = self.plan.variable(f"output resistance of {pin.part}.{pin.number}", ohms, "Ω")
        spread = pin.supply_volts
        assert spread is not None
        override = self.overrides.get(pin.supply)
        if override is not None:
            spread = override
        held = spread

        def volts(codes: Mapping[str, Codes]) -> Value:
            if supply is None:
                return level.at(held.nominal)
            return level_at(level, values_of(held, codes[supply]))

        self.plan.fixed[source] = volts
        label = f"output of {pin.part}.{pin.number}"
        self.plan.makers.append(
            lambda codes: (devices.resistor(label, source, pin.net, values_of(ohms, codes[output])),)
        )
