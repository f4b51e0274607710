"""What the rules may look at, and the whole result for one board."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from levelcrossing.model.board import Board
from levelcrossing.model.circuits import Island
from levelcrossing.model.findings import Coverage, Finding
from levelcrossing.model.pins import PinModel
from levelcrossing.model.quantities import Outcome
from levelcrossing.model.rails import Rails
from levelcrossing.model.settings import Settings
from levelcrossing.model.solutions import SolvedCrossing
from levelcrossing.model.trade import LineRate, PartFacts


@dataclass(frozen=True, slots=True, kw_only=True)
class CaseFile:
    """All that a rule may look at."""

    board: Board
    rails: Rails
    pins: Mapping[tuple[str, str], PinModel]
    facts: Mapping[str, PartFacts]
    islands: tuple[Island, ...]
    crossings: tuple[SolvedCrossing, ...]
    settings: Settings
    not_judged: tuple[tuple[PinModel, str], ...] = ()
    line_rates: Mapping[str, LineRate] = field(default_factory=dict)
    left_out: tuple[tuple[str, str], ...] = ()
    """Transistors that no circuit holds, with their values: nothing tells what they are."""

    def pins_of(self, part: str) -> Iterator[PinModel]:
        """Yield the pins of one part."""
        for (reference, _), pin in self.pins.items():
            if reference == part:
                yield pin


@dataclass(frozen=True, slots=True, kw_only=True)
class ReviewedCrossing:
    """A crossing with its verdict."""

    solved: SolvedCrossing
    verdict: Outcome
    condition: str
    findings: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Review:
    """The whole result for one board.

    Parameters
    ----------
    board : Board
    rails : Rails
    crossings : tuple of ReviewedCrossing
    findings : tuple of Finding
        Worst first.
    coverage : Coverage
    assumptions : tuple of str
        What the whole review took for granted.
    out_of_scope : tuple of str
        What came in sight and was not judged (mains, isolation, batteries, medical use).
    remarks : tuple of str
        From the reader, the settings and the waivers.
    suggestions : tuple of str
        Parts that were judged without trade data.
    rows_to_fill : tuple of str
        A row of trade data for each of them, to fill in and pass with ``--facts``.
    """

    board: Board
    rails: Rails
    crossings: tuple[ReviewedCrossing, ...]
    findings: tuple[Finding, ...]
    coverage: Coverage
    assumptions: tuple[str, ...] = ()
    out_of_scope: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()
    suggestions: tuple[str, ...] = ()
    rows_to_fill: tuple[str, ...] = ()

    def count(self, outcome: Outcome) -> int:
        """Return how many findings that no waiver accepts have this outcome."""
        return sum(1 for finding in self.findings if finding.outcome is outcome and finding.waived is None)
