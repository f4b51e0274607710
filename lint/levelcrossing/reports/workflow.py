"""Annotations for hosted builds: workflow commands on standard output.

A command is ``::level property=value,...::message``. In values ``%``, carriage return, line feed, ``:`` and ``,`` are
escaped as ``%25``, ``%0D``, ``%0A``, ``%3A``, ``%2C``; in the message the first three. Hosts show about ten annotations
of each level per step, so the worst come first, and the last one says how many there are beyond.
"""

from __future__ import annotations

from collections.abc import Sequence

from levelcrossing.model import Finding, Outcome, Review
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import annotation, annotation_property, place_path, visible

SHOWN = 10
"""Annotations of one level that hosts show per step."""

LEVELS = {
    Outcome.DAMAGE: "error",
    Outcome.MALFUNCTION: "error",
    Outcome.MARGINAL: "warning",
    Outcome.UNKNOWN: "notice",
    Outcome.SOUND: "notice",
}


def workflow_report(reviews: Sequence[Review], *, base: str = "") -> str:
    """Return the annotations of one or several reviews, worst first.

    Parameters
    ----------
    reviews : sequence of Review
    base : str
        The working folder, absolute; paths are made relative to it.

    Returns
    -------
    str
        One command per line.
    """
    found = [(finding, review) for review in reviews for finding in phrases.open_findings(review)]
    found.sort(key=lambda pair: (pair[0].outcome.rank, bool(pair[0].condition)))
    # The closing line is a notice itself and needs a place among those shown.
    room = {"error": SHOWN, "warning": SHOWN, "notice": SHOWN - 1}
    lines = []
    for finding, review in found:
        level = LEVELS[finding.outcome]
        if room[level]:
            room[level] -= 1
            lines.append(_command(level, finding, review, base))
    heads = [f"{visible(review.board.path)}: {phrases.headline(review)}" for review in reviews]
    hidden = len(found) - len(lines)
    if hidden:
        heads.append(
            f"{phrases.count(hidden, 'more finding')} not shown here; the summary and the other forms list all."
        )
    heads.append(phrases.NOTICE)
    lines.append(f"::notice title=levelcrossing::{annotation(chr(10).join(heads))}")
    return "\n".join(lines) + "\n"


def _command(level: str, finding: Finding, review: Review, base: str) -> str:
    properties = []
    path = place_path(finding.at.file, base) if finding.at else None
    line = finding.at.line if finding.at and path else 0
    path = path or place_path(review.board.path, base)
    if path:
        properties += [("file", visible(path, 0)), ("line", str(max(1, line)))]
    where = phrases.spot(finding)
    title = f"{finding.outcome.value}: {finding.rule}" + (f" at {where}" if where else "")
    properties.append(("title", visible(title)))
    texts = [visible(finding.text)]
    if finding.condition:
        texts.append(f"Only if {visible(finding.condition)}.")
    if finding.remedy:
        texts.append(f"Remedy: {visible(finding.remedy)}")
    if finding.also:
        texts.append(f"Also at {visible(phrases.places(finding.also, 12))}.")
    written = ",".join(f"{name}={annotation_property(value)}" for name, value in properties)
    return f"::{level} {written}::{annotation(chr(10).join(texts))}"
