"""The supplies with their evidence."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from levelcrossing.model.quantities import Basis, Spread


@dataclass(frozen=True, slots=True, kw_only=True)
class Evidence:
    """One reason to believe that a rail has a voltage.

    ``kind``: ``settings``, ``field``, ``regulator``, ``feedback``, ``name``, ``connector``, ``upstream``, ``diode``,
    ``battery``, ``ground``, ``use``. ``text`` is a sentence for the user, naming parts and nets.
    """

    kind: str
    volts: Spread | None
    basis: Basis
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Rail:
    """A net held at a steady voltage.

    Parameters
    ----------
    net : str
        Name of the net.
    volts : Spread or None
        Its voltage [V]; None when nothing tells.
    basis : Basis
    evidence : tuple of Evidence
        Strongest first; the first one decided.
    domain : str
        The net this rail is fed from, all the way up through ferrites, links and fuses (itself for a source). Rails of
        one domain come up and go down together.
    ground : bool
    disagreement : str
        A sentence when two pieces of evidence contradict each other; empty otherwise.
    load_farads : float
        Decoupling capacitance found on the net [F].
    fed_by : str
        Net that a regulator or converter makes this rail from; empty when it comes from elsewhere or nothing tells.
    """

    net: str
    volts: Spread | None
    basis: Basis
    evidence: tuple[Evidence, ...]
    domain: str
    ground: bool = False
    disagreement: str = ""
    load_farads: float = 0.0
    fed_by: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Rails:
    """All rails of a board.

    Parameters
    ----------
    by_net : mapping from net name to Rail
    unknown : tuple of (str, str)
        Supply nets without a voltage: net, and what would settle it.
    limits : tuple of Finding-like remarks
        (rail net, text) for rails that cannot be reached (input below output plus dropout) and the like.
    """

    by_net: Mapping[str, Rail]
    unknown: tuple[tuple[str, str], ...] = ()
    remarks: tuple[RailRemark, ...] = ()

    def volts(self, net: str) -> Spread | None:
        """Return the voltage of a net if it is a rail that has one, else None."""
        rail = self.by_net.get(net)
        return rail.volts if rail else None

    def is_ground(self, net: str) -> bool:
        """Tell whether a net is a ground."""
        rail = self.by_net.get(net)
        return bool(rail and rail.ground)


@dataclass(frozen=True, slots=True, kw_only=True)
class RailRemark:
    """Something wrong with a rail: ``kind`` is ``conflict``, ``dropout`` or ``input-range``."""

    kind: str
    net: str
    part: str
    text: str
    remedy: str = ""
    basis: Basis = Basis.TRACED
