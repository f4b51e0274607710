"""One pin as the review understands it: what it drives, how it reads, what it bears."""

from __future__ import annotations

from dataclasses import dataclass

from levelcrossing.model.quantities import Basis, Level, Spread
from levelcrossing.model.trade import PinFacts


@dataclass(frozen=True, slots=True, kw_only=True)
class Drive:
    """How a pin drives.

    Parameters
    ----------
    style : str
        ``push-pull``, ``open-drain`` (low only), ``open-source`` (high only).
    high, low : Level
        Unloaded levels [V] as functions of the supply.
    high_ohms, low_ohms : Spread
        Output resistances [ohm]; the greatest comes from the rated points.
    limit_amps : float or None
        Absolute maximum output current [A].
    rated_low_amps : float or None
        Current that the pin is guaranteed to sink at its rated low level [A].
    basis, source
    """

    style: str
    high: Level
    low: Level
    high_ohms: Spread
    low_ohms: Spread
    limit_amps: float | None
    rated_low_amps: float | None
    basis: Basis
    source: str
    tristate: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Receive:
    """How a pin reads, and what it bears.

    Parameters
    ----------
    vih, vil, vmax, vmin : Level
        Input levels and absolute maximum and minimum [V], functions of the supply.
    vmax_off : Level or None
        Absolute maximum with the supply at 0 V [V]; None when ``vmax`` at 0 V is meant.
    clamp_high, clamp_low : bool
        Diode to the supply, to ground.
    injection_amps : float or None
        Continuous clamp current the maker allows [A]; None when no such rating is known.
    capacitance_farads : Spread
    leakage_amps : float
    off_tolerant : bool
        Specified to bear a signal while unpowered.
    reads : bool
        False for a pin that bears the line's voltage without reading it (an open-drain output).
    basis, source
    """

    vih: Level
    vil: Level
    vmax: Level
    vmin: Level
    vmax_off: Level | None
    clamp_high: bool
    clamp_low: bool
    injection_amps: float | None
    capacitance_farads: Spread
    leakage_amps: float
    off_tolerant: bool
    basis: Basis
    source: str
    reads: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class PinModel:
    """One pin as the review understands it.

    Parameters
    ----------
    part, number, name, net : str
    role : str
        ``signal``, ``supply``, ``supply-out``, ``ground``, ``analog``, ``control``, ``far-end``, ``element`` (a pin of
        a resistor, transistor ...), ``unused``.
    supply : str
        Net of the rail that supplies the pin; empty when unknown or when ``supply_volts`` is fixed.
    supply_volts : Spread or None
        The supply's voltage [V], from the rail or fixed inside the part.
    drive, receive : Drive, Receive or None
    when : str
        What must be true for the pin to drive ("U1.PC4 is configured as an output"); empty when nothing need be.
    basis : Basis
        Of direction and levels together.
    why : str
        Why the pin could not be modelled, when it could not; else the evidence in a few words.
    declared_far_end, inferred_far_end : bool
        A connector pin whose other side the user declared, or whose level was inferred.
    facts : PinFacts or None
    """

    part: str
    number: str
    name: str
    net: str
    role: str
    supply: str = ""
    supply_volts: Spread | None = None
    drive: Drive | None = None
    receive: Receive | None = None
    when: str = ""
    basis: Basis = Basis.ASSUMED
    why: str = ""
    declared_far_end: bool = False
    inferred_far_end: bool = False
    facts: PinFacts | None = None
    pull_up_ohms: float | None = None

    @property
    def label(self) -> str:
        """``U3.12 (SDA)``, or ``U3.12`` for a pin without a name of its own."""
        plain = self.name.replace("~", "").replace("{slash}", "/").strip("{}").split("/")[0].strip("{}")
        return f"{self.part}.{self.number}" + (f" ({plain})" if plain and plain != self.number else "")
