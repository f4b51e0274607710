"""The circuit between two supplies: elements, islands, shifters and crossings."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from levelcrossing.model.pins import PinModel
from levelcrossing.model.quantities import Basis, Spread


@dataclass(frozen=True, slots=True, kw_only=True)
class Element:
    """A two- or three-terminal element of a link.

    Parameters
    ----------
    kind : str
        ``resistor``, ``link`` (0 ohm, ferrite, closed jumper), ``capacitor``, ``diode``, ``zener``, ``bipolar``,
        ``mosfet``, ``switch`` (pass FET inside a translator).
    part : str
        Reference of the part it belongs to.
    nets : tuple of str
        Nets by terminal: resistor (1, 2); diode (anode, cathode); bipolar (collector, base, emitter); mosfet (drain,
        gate, source); switch (side a, side b).
    ohms, farads : Spread or None
    facts : MosfetFacts, BipolarFacts, DiodeFacts, TranslatorFacts or None
    basis : Basis
    terminals : tuple of str
        Pin numbers in the order of ``nets``.
    note : str
    """

    kind: str
    part: str
    nets: tuple[str, ...]
    terminals: tuple[str, ...] = ()
    ohms: Spread | None = None
    farads: Spread | None = None
    facts: Any = None
    basis: Basis = Basis.TRACED
    value: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Island:
    """The nets that stay connected once the board is cut at its rails, with all that touches them.

    Parameters
    ----------
    index : int
    nets : tuple of str
        Sorted names of the nets that are not rails.
    elements : tuple of Element
    pins : tuple of PinModel
        Pins of integrated circuits and connectors on these nets.
    rails : tuple of str
        Nets of the rails that elements of the island touch.
    """

    index: int
    nets: tuple[str, ...]
    elements: tuple[Element, ...]
    pins: tuple[PinModel, ...]
    rails: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Shifter:
    """The part or parts of a link that change the level.

    ``kind`` is one of ``wire``, ``series-resistor``, ``divider``, ``clamp``, ``diode``, ``bipolar-pass``,
    ``mosfet-pass``, ``inverting-stage``, ``open-drain``, ``buffer``, ``translator``, ``isolator``, ``unnamed``.
    """

    kind: str
    parts: tuple[str, ...] = ()
    title: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Crossing:
    """One driver and one receiver on different supplies.

    Parameters
    ----------
    driver : PinModel or None
        None when a rail drives through a resistor; then ``driver_rail`` names it.
    driver_rail : str
        Net of the rail that supplies the driver (or is the driver).
    receiver : PinModel
    receiver_rail : str
    link : tuple of str
        References of the parts in between, from driver to receiver.
    shifter : Shifter
    island : int
        Index of the island of the receiver.
    two_way : bool
        The same pair also crosses the other way.
    inverting : bool
    condition : str
        What must be true for the crossing to carry a signal at all.
    level_if : str
        What must be true for the receiver's levels to matter; empty when they do.
    basis : Basis
    stage_driver : PinModel or None
        The pin that drives the receiver's island when the signal comes through a translator: its output on that side.
    segment : bool
        The first half of a way through a translator (driver to the translator's input); shown only when it is not sound.
    inferred : str
        How the level of a far end was inferred; empty when nothing was inferred. An inferred level proves nothing.
    """

    driver: PinModel | None
    driver_rail: str
    receiver: PinModel
    receiver_rail: str
    link: tuple[str, ...] = ()
    shifter: Shifter = Shifter(kind="wire")
    island: int = 0
    two_way: bool = False
    inverting: bool = False
    through: tuple[str, ...] = ()
    condition: str = ""
    level_if: str = ""
    basis: Basis = Basis.ASSUMED
    stage_driver: PinModel | None = None
    segment: bool = False
    inferred: str = ""

    @property
    def to_switch(self) -> bool:
        """Tell whether the receiver is the gate or base of a transistor that switches a load."""
        return self.receiver.role == "gate"

    @property
    def source(self) -> str:
        """Name the driver for people: ``U1.5 (TX) on +5V``, or ``+5V through R3``."""
        if self.driver is None:
            return f"{self.driver_rail} through {self.link[0]}" if self.link else self.driver_rail
        through = f" through {' and '.join(self.through)}" if self.through else ""
        return self.driver.label + (f" on {self.driver_rail}" if self.driver_rail else "") + through

    @property
    def target(self) -> str:
        """Name the receiver for people: ``U2.7 (RX) on +3V3``."""
        return self.receiver.label + (f" on {self.receiver_rail}" if self.receiver_rail else "")
