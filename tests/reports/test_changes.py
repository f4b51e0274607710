"""A comparison as text, Markdown and JSON."""

from __future__ import annotations

import json
from dataclasses import replace

from kiln_logger import SOUND, finding, row, side

from levelcrossing.differences import compare_sides
from levelcrossing.model import Settings
from levelcrossing.reports.changes import json_changes, markdown_changes, text_changes


def test_reports_are_harmless_and_the_same_twice() -> None:
    nasty = "\x1b[31m](http://x.example)<b>|`::error::\u202e@all #1"
    hostile = row("damage", ("U1" + nasty, "1"), top=5.25, findings=(0,))
    new = side(nasty, [hostile], [finding(text=nasty, remedy=nasty, waived=nasty)], settings=Settings())
    comparison = compare_sides(replace(SOUND, settings=Settings()), new)
    for make in (text_changes, markdown_changes):
        report = make([comparison])
        assert report == make([compare_sides(replace(SOUND, settings=Settings()), new)])
        assert all(line.isprintable() for line in report.splitlines())
        assert "::error" not in report or make is markdown_changes
    plain = json.loads(json_changes([comparison]))
    assert plain["fails"] is True
    assert plain["changes"][0]["findings"][0]["text"] == nasty
    assert json_changes([comparison]).isascii()
    assert len(json.loads(json_changes([comparison, comparison]))["comparisons"]) == 2
