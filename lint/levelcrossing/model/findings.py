"""What the rules say."""

from __future__ import annotations

from dataclasses import dataclass

from levelcrossing.model.quantities import Basis, Outcome, Place


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing that the user should know.

    Parameters
    ----------
    rule : str
        Name of the rule.
    outcome : Outcome
    text : str
        What is wrong, with figures, in one or two sentences.
    remedy : str
        What to change, with computed values where possible.
    part, pin, net : str
        Where it bites; pin is the pin number.
    condition : str
        What must be true for it to bite; empty when nothing need be.
    basis : Basis
        Of the weakest figure.
    crossing : int or None
        Index into ``Review.crossings``.
    also : tuple of str
        Other places with the same cause, as ``U1.7``.
    sources : tuple of str
        Documents behind the figures.
    at : Place or None
    waived : str or None
        Reason of the waiver that accepts it.
    cause : str
        Findings of equal cause are one; the rule of most insight explains it.
    fingerprint : str
        Stays equal while the circuit does.
    """

    rule: str
    outcome: Outcome
    text: str
    remedy: str = ""
    part: str = ""
    pin: str = ""
    net: str = ""
    condition: str = ""
    basis: Basis = Basis.ASSUMED
    crossing: int | None = None
    also: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()
    at: Place | None = None
    waived: str | None = None
    cause: str = ""
    fingerprint: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class NotJudged:
    """A signal pin that could not be judged, and why."""

    part: str
    pin: str
    why: str
    name: str = ""
    net: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Coverage:
    """How much of the board was judged: counts of signal pins, and each one that was not."""

    signal_pins: int
    judged: int
    not_judged: tuple[NotJudged, ...] = ()
    better_than_assumed: int = 0
