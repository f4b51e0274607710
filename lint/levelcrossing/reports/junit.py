"""The review as JUnit XML: one case per crossing and one per finding that belongs to none.

A case fails from the stop level on; what is unknown or accepted by a waiver is skipped with the reason; the rest passes.
"""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree
from collections.abc import Sequence

from levelcrossing.model import Finding, Outcome, Review
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import xml as clean


def junit_report(reviews: Sequence[Review], *, stops: Sequence[Outcome | None] = (), base: str = "") -> str:
    """Return the XML document.

    Parameters
    ----------
    reviews : sequence of Review
    stops : sequence of Outcome or None
        Stop level of each review, None for never; malfunction where none is given.
    base : str
        Not used; the form names boards, not files.

    Returns
    -------
    str
    """
    root = ElementTree.Element("testsuites", name="levelcrossing")
    for number, review in enumerate(reviews):
        stop = stops[number] if number < len(stops) else Outcome.MALFUNCTION
        _suite(root, review, stop)
    for name in ("tests", "failures", "skipped"):
        root.set(name, str(sum(int(suite.get(name, "0")) for suite in root)))
    ElementTree.indent(root)
    return "<?xml version='1.0' encoding='UTF-8'?>\n" + ElementTree.tostring(root, encoding="unicode") + "\n"


def _suite(root: ElementTree.Element, review: Review, stop: Outcome | None) -> None:
    suite = ElementTree.SubElement(root, "testsuite", name=clean(review.board.path))
    for one in review.crossings:
        crossing = one.solved.crossing
        found = [review.findings[index] for index in one.findings if 0 <= index < len(review.findings)]
        _case(suite, "crossing", f"{crossing.source} to {crossing.target}", found, one.verdict, stop, one.solved.why)
    in_crossings = {index for one in review.crossings for index in one.findings}
    for index, finding in enumerate(review.findings):
        if index not in in_crossings:
            where = phrases.spot(finding) or "the whole board"
            _case(suite, finding.rule, where, [finding], finding.outcome, stop, "")
    cases = list(suite)
    suite.set("tests", str(len(cases)))
    suite.set("failures", str(sum(1 for case in cases if case.find("failure") is not None)))
    suite.set("skipped", str(sum(1 for case in cases if case.find("skipped") is not None)))
    suite.set("errors", "0")
    cover = review.coverage
    texts = [f"{cover.judged} of {phrases.count(cover.signal_pins, 'signal pin')} judged.", *review.out_of_scope]
    output = ElementTree.SubElement(suite, "system-out")
    output.text = "\n".join(clean(text) for text in [*texts, *review.remarks, phrases.NOTICE])


def _case(
    suite: ElementTree.Element,
    group: str,
    name: str,
    found: Sequence[Finding],
    verdict: Outcome,
    stop: Outcome | None,
    why: str,
) -> None:
    case = ElementTree.SubElement(suite, "testcase", classname=clean(f"levelcrossing.{group}"), name=clean(name))
    open_ones = [finding for finding in found if finding.waived is None]
    worst = min(open_ones, key=lambda finding: finding.outcome.rank, default=None)
    if worst is not None and stop is not None and worst.outcome.rank <= stop.rank:
        failure = ElementTree.SubElement(case, "failure", type=worst.outcome.value, message=clean(worst.text))
        failure.text = "\n\n".join(_text(finding) for finding in open_ones)
    elif worst is None and found:
        ElementTree.SubElement(case, "skipped", message=clean(f"accepted by waiver: {found[0].waived}"))
    elif verdict is Outcome.UNKNOWN or (worst is not None and worst.outcome is Outcome.UNKNOWN):
        reason = worst.text if worst is not None else why or "could not be judged"
        ElementTree.SubElement(case, "skipped", message=clean(f"unknown: {reason}"))
    elif worst is not None:
        ElementTree.SubElement(case, "system-out").text = "\n\n".join(_text(finding) for finding in open_ones)


def _text(finding: Finding) -> str:
    lines = [f"{finding.outcome.value}, {finding.rule}: {clean(finding.text)}"]
    if finding.condition:
        lines.append(f"only if: {clean(finding.condition)}")
    if finding.remedy:
        lines.append(f"remedy: {clean(finding.remedy)}")
    if finding.at is not None:
        lines.append(f"at: {clean(finding.at.file)}:{finding.at.line}")
    return "\n".join(lines)
