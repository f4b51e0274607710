"""Every command of the README is run, and the story it tells comes true; what it shows of the JSON form is there."""

from __future__ import annotations

import json
import os
import re
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from levelcrossing.cli import COMMANDS

ROOT = Path(__file__).resolve().parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def section(title: str) -> str:
    """Return the text of a section, up to the next heading of any level."""
    return re.search(rf"^#+ {re.escape(title)}\n(.*?)(?=^#+ (?!.*END)[A-Z]|\Z)", README, re.MULTILINE | re.DOTALL)[1]  # type: ignore[index]


def blocks(text: str, language: str = "sh") -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", text, re.MULTILINE | re.DOTALL)


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with the sample boards and the programs that the README calls."""
    folder = tmp_path_factory.mktemp("readme")
    shutil.copytree(ROOT / "sample_boards", folder / "sample_boards")
    for name, module in (("levelcrossing", "levelcrossing"), ("pre-commit", "pre_commit")):
        program = folder / "bin" / name
        program.parent.mkdir(exist_ok=True)
        program.write_text(f'#!/bin/sh\nexec "{sys.executable}" -m {module} "$@"\n', encoding="utf-8")
        program.chmod(0o755)
    return folder


def shell(script: str, folder: Path, place: Path) -> subprocess.CompletedProcess[str]:
    """Run one block as a user would paste it; its status is that of its last command."""
    environment = os.environ | {
        "PATH": f"{place / 'bin'}:{os.environ['PATH']}",
        "PYTHONPATH": str(ROOT / "lint"),
        "PRE_COMMIT_HOME": str(place / "cache"),
        "GIT_CONFIG_GLOBAL": os.devnull,
    }
    for role in ("AUTHOR", "COMMITTER"):
        environment |= {f"GIT_{role}_NAME": "gauge", f"GIT_{role}_EMAIL": "gauge@example.org"}
    environment.pop("GITHUB_STEP_SUMMARY", None)
    return subprocess.run(
        ["bash", "-c", script], cwd=folder, env=environment, capture_output=True, text=True, check=False
    )


COMMAND_LINES = [line for line in blocks(section("Commands"))[0].splitlines() if line.startswith("levelcrossing ")]


@pytest.mark.parametrize("line", COMMAND_LINES)
def test_a_command_works(place: Path, line: str) -> None:
    done = shell(line, place / "sample_boards", place)
    finds_something = "faulty" in line and " waive " not in line
    assert done.returncode == (1 if finds_something else 0), done.stdout + done.stderr
    assert not done.stderr


def test_every_command_is_shown() -> None:
    assert {line.split()[1] for line in COMMAND_LINES} == set(COMMANDS)


def test_the_first_command_reviews_a_board_that_is_there(place: Path) -> None:
    first = blocks(README)[0]
    review = first[first.index(".venv/bin/levelcrossing") :].removeprefix(".venv/bin/")
    done = shell(review, place, place)
    assert done.returncode == 1, done.stderr
    assert "damage" in done.stdout.splitlines()[1]


def test_the_report_that_is_shown_is_what_the_program_writes(place: Path) -> None:
    """Lines cut short end in an ellipsis."""
    done = shell("levelcrossing review sample_boards/tide_gauge_faulty/tide_gauge_faulty.net", place, place)
    written = " ".join(done.stdout.split())
    for line in blocks(section("Reading a report"), "text")[0].splitlines():
        for piece in re.split(r"\s*;?\s*\(?\.\.\.\)?,?\s*", line):
            assert " ".join(piece.split()) in written, piece


@pytest.mark.parametrize("line", [line for line in blocks(section("Other hosts"))[0].splitlines() if line])
def test_a_command_for_other_hosts_works(place: Path, line: str) -> None:
    faulty = place / "sample_boards" / "tide_gauge_faulty" / "tide_gauge_faulty.kicad_sch"
    shutil.copy(faulty, place / "board.kicad_sch")
    done = shell(line, place, place)
    assert done.returncode == 1, done.stderr
    assert (place / line.split("#")[0].split()[-1]).stat().st_size > 100


def test_the_story_comes_true(place: Path) -> None:
    pytest.importorskip("pre_commit", reason="the hook runs under the real program")
    start, change, annotate, compare, waive = blocks(section("The story of a change"))
    begun = shell(start, place, place)
    assert begun.returncode == 0, begun.stdout + begun.stderr
    gauge = place / "gauge"

    stopped = shell(change, gauge, place)
    assert stopped.returncode == 1
    told = stopped.stdout + stopped.stderr
    assert re.search(r"damage +U2\.23 .*clamp-current", told)
    line = int(re.search(r"tide_gauge\.kicad_sch:(\d+)", told)[1])  # type: ignore[index]

    annotated = shell(annotate, gauge, place)
    assert f"::error file=tide_gauge.kicad_sch,line={line}," in annotated.stdout

    compared = shell(compare, gauge, place)
    assert compared.returncode == 1
    assert "1 worse" in compared.stdout

    accepted = shell(waive, gauge, place)
    assert accepted.returncode == 0, accepted.stdout + accepted.stderr
    assert len(shell("git log --oneline", gauge, place).stdout.splitlines()) == 2
    after = shell("levelcrossing review tide_gauge.kicad_sch", gauge, place)
    assert after.returncode == 0
    assert "prototype only, ten boards" in after.stdout


def test_the_json_that_is_shown_has_the_keys_of_the_form(place: Path) -> None:
    (shown,) = [json.loads(block) for block in blocks(section("JSON"), "json")]
    done = shell("levelcrossing review sample_boards/tide_gauge_faulty --as json", place, place)
    written = json.loads(done.stdout)
    assert shown["form"] == written["form"]
    same_shape(shown, written, "")


def same_shape(shown: Any, written: Any, where: str) -> None:
    """Hold that every key shown is written; of lists the first items are compared."""
    if isinstance(shown, dict) and isinstance(written, dict):
        for key, value in shown.items():
            assert key in written, f"{where}.{key}"
            same_shape(value, written[key], f"{where}.{key}")
    elif isinstance(shown, list) and isinstance(written, list) and shown and written:
        same_shape(shown[0], written[0], f"{where}[]")
