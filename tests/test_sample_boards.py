"""The sample boards and their expected reviews.

After a change that is meant to change a review, write the expected one anew from the repository's root:
``levelcrossing review sample_boards/NAME/NAME.net --as json --to sample_boards/NAME/expected.json``.
"""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import pytest

from levelcrossing.model import Settings
from levelcrossing.read import read_board
from levelcrossing.reports.jsonform import json_report
from levelcrossing.review import review_board

BOARDS = Path(__file__).parent.parent / "sample_boards"
NAMES = sorted(folder.name for folder in BOARDS.iterdir() if folder.is_dir())
RIGHT = ["kiln_logger", "tide_gauge"]


def reviewed(name: str) -> dict[str, Any]:
    review = review_board(read_board(str(BOARDS / name / f"{name}.net")), Settings())
    result: dict[str, Any] = json.loads(json_report([review]))
    return result


def rounded(value: Any) -> Any:
    """Figures to four digits: linear algebra differs in the last ones from machine to machine."""
    if isinstance(value, float):
        return float(f"{value:.4g}") if abs(value) > 1e-6 else 0.0
    if isinstance(value, list):
        return [rounded(item) for item in value]
    if isinstance(value, dict):
        return {key: rounded(item) for key, item in value.items()}
    return value


@pytest.mark.parametrize("name", NAMES)
def test_a_sample_board_gets_its_expected_review(name: str) -> None:
    expected = json.loads((BOARDS / name / "expected.json").read_text(encoding="utf-8"))
    found = reviewed(name)
    for key in ("rails", "coverage"):
        assert rounded(found[key]) == rounded(expected[key])
    for key in ("rule", "outcome", "condition", "basis", "part", "pin", "net", "text", "remedy"):
        assert [finding[key] for finding in found["findings"]] == [finding[key] for finding in expected["findings"]]
    for key in ("from", "to", "link", "shifter", "verdict", "levels"):
        assert rounded([crossing[key] for crossing in found["crossings"]]) == rounded(
            [crossing[key] for crossing in expected["crossings"]]
        )


@pytest.mark.parametrize("name", RIGHT)
def test_a_board_done_right_has_no_finding(name: str) -> None:
    found = reviewed(name)
    assert found["findings"] == []
    assert found["crossings"] and all(crossing["verdict"] == "sound" for crossing in found["crossings"])
    assert found["coverage"]["judged"] == found["coverage"]["signal_pins"]


def test_every_fault_is_explained_once_by_its_rule() -> None:
    """The table in the faulty board's README says which rule explains which fault, and where."""
    table = (BOARDS / "tide_gauge_faulty" / "README.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\|[^|]+\|[^|]+\| `([a-z-]+)` \| ([A-Z]+\d+(?:\.\d+)?)", table, re.MULTILINE)
    findings = reviewed("tide_gauge_faulty")["findings"]
    assert len(rows) == len(findings) >= 14
    for rule, place in rows:
        here = [
            finding
            for finding in findings
            if finding["rule"] == rule
            and any(
                spot.split(".")[0] == place or spot == place
                for spot in (f"{finding['part']}.{finding['pin']}", *finding["also"])
            )
        ]
        assert len(here) == 1, (rule, place)


@pytest.mark.parametrize("name", NAMES)
def test_sheets_are_drawn_on_the_grid(name: str) -> None:
    """1.27 mm, so that wires meet pins when an engineer goes on drawing."""
    text = (BOARDS / name / f"{name}.kicad_sch").read_text(encoding="utf-8")
    body = text[text.index("(title_block") :].split("(lib_symbols", 1)[1]
    wires = re.findall(r"\(wire\s+\(pts\s+\(xy ([-\d.]+) ([-\d.]+)\) \(xy ([-\d.]+) ([-\d.]+)\)", body)
    assert len(wires) > 40
    for wire in wires:
        for coordinate in wire:
            assert abs(float(coordinate) / 1.27 - round(float(coordinate) / 1.27)) < 1e-3
