"""The review as SARIF 2.1.0 (OASIS standard), for hosts that show findings at their lines.

One run holds all boards: hosts refuse several runs of one tool in one upload. Paths are relative to the working folder;
what would lead out of it is left out, and the finding stands on the board's own file.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import Any

from levelcrossing import __version__
from levelcrossing.model import Finding, Outcome, Review
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import place_uri, visible
from levelcrossing.reports.clean import sarif as clean
from levelcrossing.rulebook import RuleFile

SCHEMA = "https://json.schemastore.org/sarif-2.1.0.json"
LEVELS = {
    Outcome.DAMAGE: "error",
    Outcome.MALFUNCTION: "error",
    Outcome.MARGINAL: "warning",
    Outcome.UNKNOWN: "note",
    Outcome.SOUND: "none",
}
ROOT = "%SRCROOT%"


def sarif_report(reviews: Sequence[Review], rules: Sequence[RuleFile], *, base: str = "") -> str:
    """Return the SARIF log of one or several reviews.

    Parameters
    ----------
    reviews : sequence of Review
    rules : sequence of RuleFile
        All rules that ran; each is described once.
    base : str
        The working folder, absolute; paths are made relative to it.

    Returns
    -------
    str
        JSON in ASCII with a newline at the end.
    """
    described = {rule.name: _rule(rule) for rule in rules}
    for review in reviews:
        for finding in review.findings:
            described.setdefault(finding.rule, {"id": clean(finding.rule)})
    index = {name: number for number, name in enumerate(sorted(described))}
    run: dict[str, Any] = {
        "tool": {
            "driver": {
                "name": "levelcrossing",
                "version": __version__,
                "semanticVersion": __version__,
                "shortDescription": {"text": "Reviews the signals of a board that cross from one supply to another."},
                "rules": [described[name] for name in sorted(described)],
            }
        },
        "columnKind": "utf16CodeUnits",
        "originalUriBaseIds": {ROOT: {"description": {"text": "The folder in which the review was run."}}},
        "invocations": [
            {
                "executionSuccessful": True,
                "toolExecutionNotifications": [note for review in reviews for note in _notes(review, base)],
            }
        ],
        "results": [_result(finding, review, index, base) for review in reviews for finding in review.findings],
    }
    return json.dumps({"$schema": SCHEMA, "version": "2.1.0", "runs": [run]}, indent=1, ensure_ascii=True) + "\n"


def _rule(rule: RuleFile) -> dict[str, Any]:
    text = f"{rule.text}\n\nSources:\n" + "\n".join(f"- {source}" for source in rule.sources)
    return {
        "id": rule.name,
        "shortDescription": {"text": rule.title + "."},
        "fullDescription": {"text": rule.why or rule.title + "."},
        "help": {"text": text, "markdown": f"**{rule.name}**\n\n{text}"},
        "defaultConfiguration": {"level": LEVELS[rule.outcome]},
        "properties": {"tags": ["logic levels", rule.outcome.value]},
    }


def _location(finding: Finding | None, review: Review, base: str) -> dict[str, Any]:
    location: dict[str, Any] = {}
    at = finding.at if finding else None
    uri = place_uri(at.file, base) if at else None
    line = at.line if at and uri else 0
    uri = uri or place_uri(review.board.path, base)
    if uri is not None:
        physical: dict[str, Any] = {"artifactLocation": {"uri": uri, "uriBaseId": ROOT}}
        physical["region"] = {"startLine": max(1, line)}
        if at and line > 0 and at.column > 0:
            physical["region"]["startColumn"] = at.column
        location["physicalLocation"] = physical
    if finding is not None:
        names = [("part", finding.part), ("pin", f"{finding.part}.{finding.pin}" if finding.pin else "")]
        logical = [{"name": visible(name), "kind": kind} for kind, name in [*names, ("net", finding.net)] if name]
        if logical:
            location["logicalLocations"] = logical
    return location


def message(finding: Finding) -> str:
    """Return the whole message of a finding as plain text: what, on which condition, what to do."""
    lines = [clean(finding.text)]
    if finding.condition:
        lines.append(f"Only if {clean(finding.condition)}.")
    if finding.remedy:
        lines.append(f"Remedy: {clean(finding.remedy)}")
    if finding.also:
        lines.append(f"Also at {clean(phrases.places(finding.also, 16))}.")
    return "\n".join(lines)


def _result(finding: Finding, review: Review, index: Mapping[str, int], base: str) -> dict[str, Any]:
    result: dict[str, Any] = {
        "ruleId": clean(finding.rule),
        "ruleIndex": index[finding.rule],
        "level": LEVELS[finding.outcome],
        "message": {"text": message(finding)},
        "properties": {
            "outcome": finding.outcome.value,
            "basis": finding.basis.value,
            "conditional": bool(finding.condition),
        },
    }
    location = _location(finding, review, base)
    if location:
        result["locations"] = [location]
    if finding.fingerprint:
        result["partialFingerprints"] = {"circuit/v1": visible(finding.fingerprint)}
    if finding.waived is not None:
        result["suppressions"] = [{"kind": "external", "status": "accepted", "justification": visible(finding.waived)}]
    return result


def _notes(review: Review, base: str) -> list[dict[str, Any]]:
    cover = review.coverage
    texts = [
        f"{visible(review.board.path)}: {cover.judged} of {phrases.count(cover.signal_pins, 'signal pin')} judged."
    ]
    texts += [f"Not judged: {text}" for text in review.out_of_scope]
    texts += [*review.remarks, phrases.NOTICE]
    notes = []
    for text in texts:
        note: dict[str, Any] = {"level": "note", "message": {"text": clean(text)}}
        location = _location(None, review, base)
        if location:
            note["locations"] = [location]
        notes.append(note)
    return notes
