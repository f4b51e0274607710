"""What the user states."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from levelcrossing.model.quantities import Outcome, Spread


@dataclass(frozen=True, slots=True, kw_only=True)
class PinSetting:
    """What the user declared of a pin: tolerated volts, direction, levels, rail (net name or volts).

    ``levels`` is ``ttl``, ``cmos`` or empty. ``volts`` is set when ``rail`` was given as a voltage.
    """

    tolerates_volts: float | None = None
    drives: bool | None = None
    reads: bool | None = None
    open_drain: bool | None = None
    vih_volts: float | None = None
    vil_volts: float | None = None
    rail: str = ""
    volts: Spread | None = None
    line: int = 0
    levels: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Waiver:
    """An accepted finding.

    ``at`` is a part, a pin ``U1.3`` or a net; ``until`` the last day as ``YYYY-MM-DD``; ``fingerprint`` narrows it to
    one circuit.
    """

    rule: str
    at: str
    reason: str
    until: str = ""
    fingerprint: str = ""
    line: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """What the user declared for a board.

    Parameters
    ----------
    file : str
        Where it was read from; empty for none.
    rails : mapping from net name or pattern to Spread
    pins : mapping from ``U3.4`` to PinSetting
    far_ends : mapping from ``J2.3`` or ``J2`` to PinSetting
    rates : tuple of (pattern, float)
        Bit rate [bit/s] by net name pattern.
    waivers : tuple of Waiver
    rail_tolerance, resistor_tolerance : float
        Fractions [1].
    stray_farads : float
        Per net [F].
    thin_margin_volts : float
        Below this a margin is called thin [V].
    stop_at : Outcome or None
        None when the settings do not say, ``SOUND`` for never.
    today : str
        Day on which waivers are judged, ``YYYY-MM-DD``; empty when unknown.
    parts_file : str
        File of the project's own trade rows; empty when there is none.
    parts_rows : tuple of (str, str)
        Their names, each with a digest of the row, for comparing revisions.
    """

    file: str = ""
    rails: Mapping[str, Spread] = field(default_factory=dict)
    pins: Mapping[str, PinSetting] = field(default_factory=dict)
    far_ends: Mapping[str, PinSetting] = field(default_factory=dict)
    rates: tuple[tuple[str, float], ...] = ()
    waivers: tuple[Waiver, ...] = ()
    rail_tolerance: float = 0.05
    resistor_tolerance: float = 0.01
    stray_farads: float = 10e-12
    thin_margin_volts: float = 0.05
    stop_at: Outcome | None = None
    parts_file: str = ""
    parts_rows: tuple[tuple[str, str], ...] = ()
    today: str = ""
