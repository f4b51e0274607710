"""What the wheel holds, and that it runs away from the checkout."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tarfile
import tomllib
import zipfile
from collections.abc import Iterator
from pathlib import Path

import pytest

pytest.importorskip("hatchling", reason="the wheel is built with it")

ROOT = Path(__file__).resolve().parents[1]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
VERSION = PROJECT["version"]


def run(*words: object, cwd: Path, **more: str) -> subprocess.CompletedProcess[str]:
    environment = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")} | more
    return subprocess.run(
        [str(word) for word in words], cwd=cwd, env=environment, capture_output=True, text=True, check=False
    )


@pytest.fixture(scope="module")
def source(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a copy of the project's files: building writes beside them."""
    copy = tmp_path_factory.mktemp("source") / "project"
    rubbish = shutil.ignore_patterns(".git", ".venv", "*_cache", "__pycache__", "dist", "build", "*.egg-info")
    shutil.copytree(ROOT, copy, ignore=rubbish)
    # What a used checkout holds and a wheel must not.
    (copy / "rules" / "__pycache__").mkdir()
    (copy / "rules" / "__pycache__" / "too_slow.cpython-311.pyc").write_bytes(b"old")
    return copy


def built(source: Path, kind: str, target: Path) -> Path:
    code = f"import hatchling.build as b; print(b.build_{kind}({str(target)!r}))"
    done = run(sys.executable, "-c", code, cwd=source)
    assert done.returncode == 0, done.stderr
    return target / done.stdout.split()[-1]


@pytest.fixture(scope="module")
def wheel(source: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return built(source, "wheel", tmp_path_factory.mktemp("wheel"))


@pytest.fixture(scope="module")
def sdist(source: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return built(source, "sdist", tmp_path_factory.mktemp("sdist"))


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder outside the checkout that holds what the wheel would put into site-packages."""
    folder = tmp_path_factory.mktemp("site")
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(folder)
    return folder


def names(wheel: Path) -> set[str]:
    with zipfile.ZipFile(wheel) as archive:
        return set(archive.namelist())


def modules_and_data() -> Iterator[str]:
    """Yield what must be in the wheel, as named there."""
    for path in (ROOT / "lint" / "levelcrossing").rglob("*.py"):
        yield path.relative_to(ROOT / "lint").as_posix()
    for path in [*(ROOT / "rules").glob("*.py"), *(ROOT / "rules" / "trade").iterdir()]:
        if path.is_file():
            yield f"levelcrossing/{path.relative_to(ROOT).as_posix()}"


def test_the_wheel_holds_the_engine_the_rules_and_the_trade_data(wheel: Path) -> None:
    assert names(wheel) >= set(modules_and_data())
    assert "levelcrossing/rules/trade/parts.toml" in names(wheel)


def test_the_wheel_puts_one_package_at_the_top_and_nothing_else(wheel: Path) -> None:
    assert {name.split("/")[0] for name in names(wheel)} == {"levelcrossing", f"levelcrossing-{VERSION}.dist-info"}


def test_the_wheel_holds_no_compiled_leftovers(wheel: Path) -> None:
    assert not [name for name in names(wheel) if "__pycache__" in name or name.endswith(".pyc")]


def test_the_wheel_carries_licence_readme_and_command(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        about = archive.read(f"levelcrossing-{VERSION}.dist-info/METADATA").decode()
        commands = archive.read(f"levelcrossing-{VERSION}.dist-info/entry_points.txt").decode()
    assert "License-Expression: GPL-3.0-or-later" in about
    assert (ROOT / "README.md").read_text(encoding="utf-8").splitlines()[0] in about
    assert "levelcrossing = levelcrossing.cli:main" in commands
    assert f"levelcrossing-{VERSION}.dist-info/licenses/LICENSE" in names(wheel)


def test_the_version_stands_in_one_form_everywhere() -> None:
    from levelcrossing import __version__

    assert __version__ == VERSION


def test_the_sdist_builds_the_same_wheel(sdist: Path, wheel: Path, tmp_path: Path) -> None:
    with tarfile.open(sdist) as archive:
        archive.extractall(tmp_path, filter="data")
    inside = tmp_path / f"levelcrossing-{VERSION}"
    assert (inside / "tests" / "test_packaging.py").is_file(), "whoever has the sdist can run the tests"
    assert (inside / ".pre-commit-hooks.yaml").is_file()
    again = built(inside, "wheel", tmp_path)
    assert names(again) == names(wheel)


def test_the_installed_program_finds_its_rules_and_its_trade_data(installed: Path, tmp_path: Path) -> None:
    def levelcrossing(*words: object) -> subprocess.CompletedProcess[str]:
        return run(sys.executable, "-m", "levelcrossing", *words, cwd=tmp_path, PYTHONPATH=str(installed))

    assert levelcrossing("--version").stdout == f"levelcrossing {VERSION}\n"
    rules = levelcrossing("rules")
    assert rules.returncode == 0, rules.stderr
    assert "input-overvoltage" in rules.stdout
    board = ROOT / "tests" / "read" / "good_input" / "door_sensor.net"
    review = levelcrossing("review", board, "--as", "json", "--stop-at", "never")
    assert review.returncode == 0, review.stderr
    assert '"form": 1' in review.stdout
