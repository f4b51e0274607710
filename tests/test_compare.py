"""``compare`` on whole boards: five edits of one board, saved reviews and git revisions."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from kiln_logger import BAD, finding, row, side

from levelcrossing.compare import saved_form, stop_level
from levelcrossing.errors import InputError
from levelcrossing.model import Outcome, Settings


def test_a_change_cannot_lower_its_own_bar() -> None:
    strict, never = Settings(stop_at=Outcome.MARGINAL), Settings(stop_at=Outcome.SOUND)
    old, new = side("old", settings=strict), side("new", settings=never)
    assert stop_level(None, old, new) is Outcome.MARGINAL
    assert stop_level(None, side("old", settings=Settings()), new) is Outcome.MALFUNCTION
    assert stop_level("damage", old, new) is Outcome.DAMAGE
    assert stop_level("never", old, new) is None
    assert stop_level(None, side("saved"), new) is None, "a saved review has no settings of its own"


# -------------------------------------------------------------------------------------------------------- saved reviews


def test_saved_reviews_are_checked(tmp_path: Path) -> None:
    file = tmp_path / "saved.json"
    good = {**BAD.form}
    file.write_text(json.dumps(good), encoding="utf-8")
    assert saved_form(str(file)) == good
    file.write_text(json.dumps({"form": 1, "reviews": [good]}), encoding="utf-8")
    assert saved_form(str(file)) == good
    file.write_text(json.dumps({"form": 1, "reviews": [good, good]}), encoding="utf-8")
    with pytest.raises(InputError, match="several boards"):
        saved_form(str(file))


@pytest.mark.parametrize(
    "text",
    [
        "",
        "[]",
        "{}",
        '{"form": 2}',
        '{"form": 1}',
        "[" * 100_000,
        json.dumps({**BAD.form, "crossings": [{}]}),
        json.dumps({**BAD.form, "crossings": [row("superb")]}),
        json.dumps({**BAD.form, "crossings": [row(findings=(7,))]}),
        json.dumps({**BAD.form, "crossings": [row(link=(3,))]}),  # type: ignore[arg-type]
        json.dumps({**BAD.form, "findings": [finding(rule=3)]}),
        json.dumps({**BAD.form, "findings": [finding(fingerprint=[])]}),
        json.dumps({**BAD.form, "rails": [{"net": "A", "low": "x", "nominal": 1, "high": 1}]}),
        json.dumps({**BAD.form, "coverage": {}}),
    ],
)
def test_what_is_no_saved_review_is_one_line(tmp_path: Path, text: str) -> None:
    file = tmp_path / "saved.json"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        saved_form(str(file))
    assert "\n" not in str(caught.value)
