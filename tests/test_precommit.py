"""The hook under real pre-commit, on a real git repository with two boards.

The hook's own definition is used; only its environment is the one that runs the tests, so that no package is fetched.
With ``LEVELCROSSING_TRY_REPO=1`` the same repository is also checked by ``pre-commit try-repo``, which installs this
checkout from its last commit.
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from written_boards import FAULTY, SOUND, box_path, netlist, sheet

yaml = pytest.importorskip("yaml", reason="pre-commit brings it")
pytest.importorskip("pre_commit", reason="the hook is tested with the real program")

CHECKOUT = Path(__file__).resolve().parents[1]
HOOK = yaml.safe_load((CHECKOUT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8"))[0]


def _run(folder: Path, *words: str, check: bool = True) -> subprocess.CompletedProcess[str]:
    environment = os.environ | {
        "GIT_AUTHOR_NAME": "t",
        "GIT_AUTHOR_EMAIL": "t@example.org",
        "GIT_COMMITTER_NAME": "t",
        "GIT_COMMITTER_EMAIL": "t@example.org",
        "PRE_COMMIT_COLOR": "never",
        "PYTHONPATH": str(CHECKOUT / "lint"),
    }
    done = subprocess.run(words, cwd=folder, capture_output=True, text=True, env=environment, check=False)
    if check and done.returncode:
        raise AssertionError(f"{words}: {done.stdout}{done.stderr}")
    return done


@pytest.fixture
def repository(tmp_path: Path) -> Path:
    """Return a clone with a sound and a faulty board; the faulty part of the latter stands on a sub-sheet."""
    origin = tmp_path / "origin"
    for name, text in {
        "sounder/sounder.kicad_sch": sheet(SOUND, name="sounder"),
        "sounder/sounder.kicad_pro": "{}",
        "gauge/gauge.kicad_sch": sheet("", children=["echo.kicad_sch"], number=2),
        "gauge/gauge.kicad_pro": "{}",
        "gauge/echo.kicad_sch": sheet(FAULTY, number=3, parent=box_path(2)),
        "spice/filter.net": "* low pass\nR1 a b 1k\n.end\n",
        "readme.txt": "two boards\n",
    }.items():
        (origin / name).parent.mkdir(parents=True, exist_ok=True)
        (origin / name).write_text(text, encoding="utf-8")
    # The installed command may be another version than this checkout.
    program = f"{sys.executable} -m {HOOK['entry']}"
    settings = {"repo": "local", "hooks": [HOOK | {"language": "system", "entry": program}]}
    (origin / ".pre-commit-config.yaml").write_text(yaml.safe_dump({"repos": [settings]}), encoding="utf-8")
    _run(origin, "git", "init", "--quiet")
    _run(origin, "git", "add", "-A")
    _run(origin, "git", "commit", "--quiet", "-m", "two boards")
    clone = tmp_path / "clone"
    _run(tmp_path, "git", "clone", "--quiet", str(origin), str(clone))
    return clone


def _hook(folder: Path, *files: str) -> subprocess.CompletedProcess[str]:
    return _run(folder, sys.executable, "-m", "pre_commit", "run", "--files", *files, check=False)


def test_a_sound_board_passes(repository: Path) -> None:
    done = _hook(repository, "sounder/sounder.kicad_sch")
    assert done.returncode == 0, done.stdout + done.stderr
    assert "Passed" in done.stdout


def test_a_faulty_board_fails_on_the_right_line_and_passes_with_a_waiver(repository: Path) -> None:
    done = _hook(repository, "gauge/echo.kicad_sch")
    assert done.returncode == 1, done.stdout + done.stderr
    assert "input-overvoltage" in done.stdout
    place = re.search(r"gauge/echo\.kicad_sch:(\d+)", done.stdout)
    assert place, done.stdout
    lines = (repository / "gauge" / "echo.kicad_sch").read_text(encoding="utf-8").splitlines()
    symbols = [number for number, line in enumerate(lines, 1) if line.startswith("  (symbol ")]
    start = max(number for number in symbols if number <= int(place[1]))
    block = "\n".join(lines[start - 1 : start + 9])
    assert '"U2"' in block, f"line {place[1]} does not stand within U2:\n{block}"

    waive = ("waive", "gauge/gauge.kicad_sch", "--rule", "input-overvoltage", "--at", "U2.2")
    _run(repository, sys.executable, "-m", "levelcrossing", *waive, "--reason", "this gate is 5 V tolerant")
    again = _hook(repository, "gauge/echo.kicad_sch", "gauge/levelcrossing.toml")
    assert again.returncode == 0, again.stdout + again.stderr


def test_each_board_is_reviewed_once(repository: Path) -> None:
    (repository / "gauge" / "gauge.net").write_text(netlist(FAULTY), encoding="utf-8")
    files = ["gauge/gauge.kicad_sch", "gauge/echo.kicad_sch", "gauge/gauge.net", "spice/filter.net"]
    done = _run(
        repository, sys.executable, "-m", *HOOK["entry"].split(), "--as", "json", *files, check=False
    )  # fmt: skip
    assert done.returncode == 1, done.stderr
    assert done.stdout.count('"coverage"') == 1
    assert '"path": "gauge/gauge.kicad_sch"' in done.stdout


def test_other_files_do_not_start_the_hook(repository: Path) -> None:
    done = _hook(repository, "readme.txt")
    assert done.returncode == 0
    assert "no files to check" in done.stdout


def test_files_that_are_no_netlists_of_boards_pass(repository: Path) -> None:
    done = _hook(repository, "spice/filter.net")
    assert done.returncode == 0, done.stdout + done.stderr


def test_a_commit_is_stopped_and_then_let_through(repository: Path) -> None:
    """The whole story: install the hook, break the sound board, commit, put it right, commit."""
    _run(repository, sys.executable, "-m", "pre_commit", "install")
    board = repository / "sounder" / "sounder.kicad_sch"
    board.write_text(sheet(FAULTY, name="sounder"), encoding="utf-8")
    _run(repository, "git", "add", "-A")
    stopped = _run(repository, "git", "commit", "-m", "save a resistor", check=False)
    assert stopped.returncode == 1
    assert "sounder/sounder.kicad_sch" in stopped.stdout + stopped.stderr
    board.write_text(sheet(SOUND.replace("18k", "17.8k"), name="sounder"), encoding="utf-8")
    _run(repository, "git", "add", "-A")
    _run(repository, "git", "commit", "-m", "another divider")


@pytest.mark.parametrize(
    ("name", "starts"),
    [
        ("a.kicad_sch", True),
        ("deep/er/a.net", True),
        ("levelcrossing.toml", True),
        ("x/levelcrossing.toml", True),
        ("levelcrossing-parts.toml", True),
        ("x/levelcrossing-parts.toml", True),
        ("levelcrossing-other.toml", False),
        ("notlevelcrossing.toml", False),
        ("a.kicad_sch.bak", False),
        ("internet", False),
        ("pyproject.toml", False),
    ],
)
def test_which_files_start_the_hook(name: str, starts: bool) -> None:
    assert bool(re.search(HOOK["files"], name)) is starts


def test_the_hook_runs_in_one_process() -> None:
    """Several processes would each see a part of the files and review a board twice."""
    assert HOOK["require_serial"] is True
    assert HOOK["language"] == "python"


@pytest.mark.skipif(
    os.environ.get("LEVELCROSSING_TRY_REPO") != "1", reason="fetches packages; LEVELCROSSING_TRY_REPO=1"
)
def test_try_repo(repository: Path) -> None:
    command = (sys.executable, "-m", "pre_commit", "try-repo", str(CHECKOUT), "levelcrossing", "--files")
    assert _run(repository, *command, "sounder/sounder.kicad_sch", check=False).returncode == 0
    done = _run(repository, *command, "gauge/echo.kicad_sch", check=False)
    assert done.returncode == 1
    assert "gauge/echo.kicad_sch:" in done.stdout


# ------------------------------------------------------------------------------------------------ the reusable workflow


def test_the_workflow_gives_text_from_outside_to_no_script() -> None:
    """An expression inside a script is text that a stranger's branch name could continue."""
    workflow = yaml.safe_load((CHECKOUT / ".github/workflows/board-review.yml").read_text(encoding="utf-8"))
    steps = workflow["jobs"]["review"]["steps"]
    scripts = [step["run"] for step in steps if "run" in step]
    assert len(scripts) == 3
    assert not any("${{" in script for script in scripts)
    assert workflow["permissions"] == {"contents": "read"}
    assert not any(step.get("with", {}).get("persist-credentials", False) for step in steps)


def test_the_workflow_uses_options_that_exist() -> None:
    from levelcrossing import compare
    from levelcrossing.cli import parse

    text = (CHECKOUT / ".github/workflows/board-review.yml").read_text(encoding="utf-8")
    assert "levelcrossing compare" in text
    assert "levelcrossing review" in text
    name, args = parse(
        ["compare", "--against", "x", "--as", "markdown", "--stop-at", "damage", "--accept-new-waivers", "--", "a"]
    )
    assert name == "compare"
    assert (args.against, args.form, args.stop_at, args.accept_new_waivers, args.paths) == (
        "x",
        "markdown",
        "damage",
        True,
        ["a"],
    )
    assert compare.add_arguments is not None
    name, args = parse(["review", "--changed", "--as", "workflow", "--stop-at", "never", "--", "a", "b"])
    assert (name, args.form, args.stop_at, args.changed, args.paths) == (
        "review",
        "workflow",
        "never",
        True,
        ["a", "b"],
    )
