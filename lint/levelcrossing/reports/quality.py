"""Findings as a code-quality list (the JSON that hosts of merge requests read): one entry per open finding."""

from __future__ import annotations

import hashlib
import json
import posixpath
from collections.abc import Sequence

from levelcrossing.model import Outcome, Review
from levelcrossing.reports import phrases
from levelcrossing.reports.clean import place_path, visible

SEVERITIES = {
    Outcome.DAMAGE: "blocker",
    Outcome.MALFUNCTION: "critical",
    Outcome.MARGINAL: "minor",
    Outcome.UNKNOWN: "info",
    Outcome.SOUND: "info",
}


def quality_report(reviews: Sequence[Review], *, base: str = "") -> str:
    """Return the list; every entry has a fingerprint of its own and a path inside the working folder ``base``."""
    entries = []
    seen: dict[str, int] = {}
    for review in reviews:
        # Entries without a path are refused; a board outside the folder is known by its name alone.
        board = place_path(review.board.path, base) or visible(posixpath.basename(review.board.path) or "board")
        for finding in phrases.open_findings(review):
            path = place_path(finding.at.file, base) if finding.at else None
            line = finding.at.line if finding.at and path else 1
            mark = "\x1f".join([board, finding.rule, finding.fingerprint or finding.text, finding.part, finding.pin])
            seen[mark] = seen.get(mark, 0) + 1
            digest = hashlib.sha256(f"{mark}\x1f{seen[mark]}".encode("utf-8", "backslashreplace")).hexdigest()
            where = phrases.spot(finding)
            text = (f"{where}: " if where else "") + finding.text
            if finding.condition:
                text += f" Only if {finding.condition}."
            if finding.remedy:
                text += f" Remedy: {finding.remedy}"
            entries.append(
                {
                    "type": "issue",
                    "check_name": visible(finding.rule),
                    "description": visible(text, 2000),
                    "categories": ["Bug Risk"],
                    "severity": SEVERITIES[finding.outcome],
                    "fingerprint": digest,
                    "location": {"path": visible(path or board, 0), "lines": {"begin": max(1, line)}},
                }
            )
    return json.dumps(entries, indent=1, ensure_ascii=True) + "\n"
