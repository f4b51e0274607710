"""A comparison of two revisions as text, Markdown and JSON."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import Any

from levelcrossing import __version__
from levelcrossing.differences import Change, Comparison
from levelcrossing.figures import Figure
from levelcrossing.reports import clean
from levelcrossing.reports.jsonform import number
from levelcrossing.reports.phrases import NOTICE, count, quantity

FORM = 1

_HEADS = {
    "worse": "Worse",
    "added": "Added",
    "unclear": "No longer judged",
    "better": "Better",
    "removed": "Removed",
    "moved": "Same verdict, other figures",
}
_COUNTED = {
    "worse": "worse",
    "added": "added",
    "unclear": "no longer judged",
    "better": "better",
    "removed": "removed",
    "moved": "with other figures",
}
_TABLES = (
    ("new_waivers", "Waivers added in this change"),
    ("declared", "Declared differently (settings or fields)"),
    ("rails", "Rails"),
    ("coverage", "Coverage"),
    ("remarks", "Remarks"),
)


def summary(comparison: Comparison) -> str:
    """Return what changed in one line."""
    before, after = comparison.crossings
    crossings = f"{count(before, 'crossing')} before, {after} after"
    if comparison.empty:
        return f"no crossing and no finding changed ({crossings})"
    words = [f"{len(found)} {word}" for kind, word in _COUNTED.items() if (found := comparison.of_kind(kind))]
    return f"{', '.join(words) or 'nothing better or worse'} ({crossings})"


def ending(comparisons: Sequence[Comparison]) -> str:
    """Return the sentence that explains the exit status."""
    failing = sum(change.counts for one in comparisons for change in one.changes)
    if failing:
        verb = "counts" if failing == 1 else "count"
        return f"{count(failing, 'change')} {verb} against this revision."
    return "Nothing became worse at or above the stop level."


def _verdicts(change: Change) -> str:
    if change.before is None:
        return change.after or ""
    if change.after is None:
        return f"was {change.before}"
    return change.after if change.before == change.after else f"{change.before} -> {change.after}"


def _figure(figure: Figure) -> str:
    def shown(value: float | None) -> str:
        if value is None:
            return "not known"
        return f"{value:.2f} V" if figure.unit == "V" else quantity(value, figure.unit)

    text = shown(figure.after) if figure.before is None else f"{shown(figure.before)} -> {shown(figure.after)}"
    if figure.limit is None or figure.after is None:
        return f"{figure.name}: {text}"
    return f"{figure.name}: {text} ({figure.limit_word} {shown(figure.limit)})"


def _interesting(change: Change) -> Sequence[Figure]:
    """Leave out the figures of an added crossing that is sound."""
    return () if change.kind == "added" and change.after == "sound" else change.figures


def _words(finding: Any) -> str:
    condition = f" (if {finding['condition']})" if finding.get("condition") else ""
    waived = f" [accepted: {finding['waived']}]" if finding.get("waived") is not None else ""
    return f"{finding['outcome']} {finding['rule']}: {finding['text']}{condition}{waived}"


def text_changes(comparisons: Sequence[Comparison], *, everything: bool = False) -> str:
    """Return comparisons for a terminal or a log."""
    lines: list[str] = []
    safe = clean.terminal
    for comparison in comparisons:
        lines += [f"{safe(comparison.old)} -> {safe(comparison.new)}", f"  {summary(comparison)}", ""]
        for kind, head in _HEADS.items():
            found = comparison.of_kind(kind)
            if kind == "moved" and not everything:
                continue
            for change in found:
                lines.append(f"{head.lower()}: {safe(change.title)}: {_verdicts(change)}")
                lines += [f"    {_figure(figure)}" for figure in _interesting(change)]
                lines += [f"    {safe(note)}" for note in change.notes]
                for finding in change.findings:
                    lines.append(f"    {safe(_words(finding))}")
                    if finding.get("remedy"):
                        lines.append(f"      what to do: {safe(finding['remedy'])}")
                lines.append("")
        for name, head in _TABLES:
            entries: Sequence[str] = getattr(comparison, name)
            if entries:
                lines += [f"{head}:", *(f"    {safe(entry)}" for entry in entries), ""]
    return "\n".join([*lines, ending(comparisons), NOTICE, ""])


def markdown_changes(comparisons: Sequence[Comparison], *, everything: bool = False) -> str:
    """Return comparisons for the description of a pull request."""
    lines = ["## Level crossings: what this change does", ""]
    safe = clean.markdown
    for comparison in comparisons:
        lines += [f"### {clean.code_span(comparison.new)} against {clean.code_span(comparison.old)}", ""]
        lines += [summary(comparison)[:1].upper() + summary(comparison)[1:] + ".", ""]
        for kind, head in _HEADS.items():
            found = comparison.of_kind(kind)
            if found and (kind != "moved" or everything):
                lines += [f"#### {head}", "", *_bullets(found, safe), ""]
        for name, head in _TABLES:
            entries: Sequence[str] = getattr(comparison, name)
            if entries:
                lines += [f"#### {head}", "", *(f"- {safe(entry)}" for entry in entries), ""]
    return "\n".join([*lines, f"**{ending(comparisons)}**", "", NOTICE, ""])


def _bullets(changes: Sequence[Change], safe: Callable[[str], str]) -> Iterator[str]:
    for change in changes:
        title = " → ".join(safe(end) for end in change.title.split(" -> "))
        yield f"- {title}: **{_verdicts(change).replace('->', '→')}**"
        for figure in _interesting(change):  # words and figures of our own, nothing from the board
            yield f"  - {_figure(figure).replace('->', '→')}"
        for note in change.notes:
            yield f"  - {safe(note)}"
        for finding in change.findings:
            yield f"  - {safe(_words(finding))}"
            if finding.get("remedy"):
                yield f"    - what to do: {safe(finding['remedy'])}"


def json_changes(comparisons: Sequence[Comparison]) -> str:
    """Return comparisons as JSON; one as an object, several under ``comparisons``."""
    forms = [_form(comparison) for comparison in comparisons]
    tool = {"name": "levelcrossing", "version": __version__}
    content = (
        {"form": FORM, "tool": tool, **forms[0]}
        if len(forms) == 1
        else {"form": FORM, "tool": tool, "comparisons": forms}
    )
    return json.dumps(content, indent=1, ensure_ascii=True, allow_nan=False) + "\n"


def _form(comparison: Comparison) -> dict[str, Any]:
    return {
        "old": comparison.old,
        "new": comparison.new,
        "fails": comparison.fails,
        "stop_at": comparison.stop_at.value if comparison.stop_at is not None else "never",
        "crossings": {"before": comparison.crossings[0], "after": comparison.crossings[1]},
        "changes": [
            {
                "kind": change.kind,
                "title": change.title,
                "before": change.before,
                "after": change.after,
                "counts": change.counts,
                "figures": [
                    {
                        "name": figure.name,
                        "before": number(figure.before),
                        "after": number(figure.after),
                        "unit": figure.unit,
                        "limit": number(figure.limit),
                    }
                    for figure in change.figures
                ],
                "findings": [_finding(finding) for finding in change.findings],
                "notes": list(change.notes),
            }
            for change in comparison.changes
        ],
        "new_waivers": list(comparison.new_waivers),
        "declared": list(comparison.declared),
        "rails": list(comparison.rails),
        "coverage": list(comparison.coverage),
        "remarks": list(comparison.remarks),
    }


def _finding(finding: Mapping[str, Any]) -> dict[str, Any]:
    words = ("rule", "outcome", "condition", "part", "pin", "net", "text", "remedy", "waived", "fingerprint")
    at = finding.get("at")
    known = isinstance(at, Mapping) and isinstance(at.get("file"), str) and isinstance(at.get("line"), int)
    place = {"file": at["file"], "line": at["line"]} if isinstance(at, Mapping) and known else None
    return {**{word: finding.get(word) for word in words}, "also": list(finding.get("also", ())), "at": place}
