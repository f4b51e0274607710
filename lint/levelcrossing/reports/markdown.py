"""A summary in Markdown, for pull requests and the summary page of a build. Holds no HTML and no links."""

from __future__ import annotations

from collections.abc import Sequence

from levelcrossing.model import Finding, Outcome, Review
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import code_span, place_path
from levelcrossing.reports.clean import markdown as clean

MOST = 60
"""Findings written in full per board; hosts cut long summaries anywhere, this one says what it left out."""


def markdown_report(reviews: Sequence[Review], *, base: str = "") -> str:
    """Return the summary of one or several reviews.

    Parameters
    ----------
    reviews : sequence of Review
    base : str
        The working folder, absolute; paths are shown relative to it.

    Returns
    -------
    str
        CommonMark with the usual table extension.
    """
    lines: list[str] = ["# Level crossings", ""]
    if len(reviews) > 1:
        outcomes = [outcome for outcome in Outcome if outcome is not Outcome.SOUND]
        lines += ["| board | " + " | ".join(outcome.value for outcome in outcomes) + " |"]
        lines += ["| --- |" + " ---: |" * len(outcomes)]
        for review in reviews:
            numbers = [str(review.count(outcome)) for outcome in outcomes]
            lines.append(f"| {code_span(_path(review, base))} | " + " | ".join(numbers) + " |")
        lines.append("")
    for review in reviews:
        lines += _board(review, base)
    lines += [f"_{phrases.NOTICE}_"]
    return "\n".join(lines) + "\n"


def _path(review: Review, base: str) -> str:
    return place_path(review.board.path, base) or review.board.path


def _board(review: Review, base: str) -> list[str]:
    cover = review.coverage
    lines = [f"## {code_span(_path(review, base))}: {phrases.headline(review)}", ""]
    verdicts = ", ".join(f"{number} {verdict.value}" for verdict, number in phrases.verdict_counts(review) if number)
    crossings = phrases.count(len(review.crossings), "crossing") + (f" ({verdicts})" if verdicts else "")
    lines += [f"{crossings}; {cover.judged} of {phrases.count(cover.signal_pins, 'signal pin')} judged.", ""]
    last: Outcome | None = None
    found = phrases.open_findings(review)
    for finding in found[:MOST]:
        if finding.outcome is not last:
            last = finding.outcome
            lines += [f"### {last.value.capitalize()}: {phrases.MEANING[last]}", ""]
        lines += [*_finding(finding, base), ""]
    if len(found) > MOST:
        lines += [f"… and {phrases.count(len(found) - MOST, 'more finding')}.", ""]
    waived = [finding for finding in review.findings if finding.waived is not None]
    if waived:
        lines += ["### Accepted by waiver", ""]
        lines += [
            f"- {code_span(finding.rule)} at {_where(finding)}: {clean(finding.waived or '')}" for finding in waived
        ]
        lines.append("")
    if review.rails.unknown:
        lines += ["### Supplies without a voltage", ""]
        lines += [f"- {code_span(net)}: {clean(settle)}" for net, settle in review.rails.unknown]
        lines.append("")
    reasons = phrases.reasons(review)
    if reasons:
        lines += ["### Not judged", ""]
        lines += [f"- {len(pins)}: {clean(why)} ({clean(phrases.places(pins, 6))})" for why, pins in reasons[:12]]
        if len(reasons) > 12:
            lines.append(f"- and {phrases.count(len(reasons) - 12, 'other reason')}")
        lines.append("")
    further = [*review.out_of_scope, *dict.fromkeys((*review.board.remarks, *review.remarks))]
    if further:
        lines += ["### Remarks", ""]
        lines += [f"- {clean(text)}" for text in further[:20]]
        if len(further) > 20:
            lines.append(f"- and {len(further) - 20} more")
        lines.append("")
    return lines


def _where(finding: Finding) -> str:
    place = code_span(phrases.spot(finding)) or "the whole board"
    return place + (f" on {code_span(finding.net)}" if finding.part and finding.net else "")


def _finding(finding: Finding, base: str) -> list[str]:
    lines = [f"- **{finding.outcome.value}** at {_where(finding)}, rule {code_span(finding.rule)}", ""]
    path = place_path(finding.at.file, base) if finding.at else None
    lines.append(f"  {clean(finding.text)}")
    further = []
    if finding.condition:
        further.append(f"  - only if: {clean(finding.condition)}")
    if finding.remedy:
        further.append(f"  - remedy: {clean(finding.remedy)}")
    if finding.also:
        further.append(f"  - also at: {clean(phrases.places(finding.also, 12))}")
    if phrases.grounds_known(finding):
        further.append(f"  - rests on: {phrases.BASIS[finding.basis.value]}")
    if path and finding.at and finding.at.line:
        further.append(f"  - at: {code_span(f'{path}:{finding.at.line}')}")
    return [*lines, "", *further]
