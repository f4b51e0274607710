"""Old files come from git's store, and neither the work tree nor the configuration has a say."""

from __future__ import annotations

import subprocess
from pathlib import Path

import pytest

from levelcrossing.errors import CommandError
from levelcrossing.revisions import files_of
from levelcrossing.settings import load_settings


def _git(folder: Path, *words: str) -> str:
    done = subprocess.run(
        ["git", "-c", "user.name=t", "-c", "user.email=t@example.org", "-c", "init.defaultBranch=main", *words],
        cwd=folder,
        check=True,
        capture_output=True,
        text=True,
    )
    return done.stdout


@pytest.fixture
def repository(tmp_path: Path) -> Path:
    """Return a clone-like work tree: a root sheet with a sub-sheet elsewhere, settings at the top, one commit."""
    top = tmp_path / "work"
    (top / "kiln").mkdir(parents=True)
    (top / "common").mkdir()
    (top / "kiln" / "kiln.kicad_sch").write_bytes(b"old root\r\n")
    (top / "common" / "power.kicad_sch").write_text("old sub", encoding="utf-8")
    (top / "levelcrossing.toml").write_text('[rails]\n"A" = "5"\n', encoding="utf-8")
    (top / "secret.txt").write_text("not a sheet", encoding="utf-8")
    (top / ".gitattributes").write_text("*.kicad_sch filter=evil -text\n", encoding="utf-8")
    (top / "common" / "link.kicad_sch").symlink_to("/etc/hostname")
    _git(tmp_path, "init", "work")
    _git(top, "add", "-A")
    _git(top, "commit", "-m", "old")
    return top


def test_old_files_come_from_git_and_nothing_is_touched(repository: Path, tmp_path: Path) -> None:
    board = repository / "kiln" / "kiln.kicad_sch"
    board.write_text("new root", encoding="utf-8")
    mark = tmp_path / "filter-ran"
    for key in ("filter.evil.smudge", "filter.evil.clean", "core.fsmonitor"):
        _git(repository, "config", key, f"touch {mark}; cat")
    (repository / ".git" / "index").touch()
    before = {file: (file.stat().st_mtime_ns, file.stat().st_size) for file in repository.rglob("*") if file.is_file()}
    with files_of([str(board)], "HEAD") as old:
        path = old.old(str(board))
        assert path is not None
        assert Path(path).read_bytes() == b"old root\r\n", "as committed, no filter and no change of line ends"
        assert (Path(path).parents[1] / "common" / "power.kicad_sch").read_text(encoding="utf-8") == "old sub"
        assert not (Path(path).parents[1] / "common" / "link.kicad_sch").exists(), "links are left out"
        assert not (Path(path).parents[1] / "secret.txt").exists(), "only what a review needs"
        assert set(load_settings(path).rails) == {"A"}
        assert old.old(str(repository / "kiln")) == str(Path(path).parent)
        assert old.old(str(repository / "kiln" / "absent.net")) is None
    assert not Path(path).exists()
    after = {file: (file.stat().st_mtime_ns, file.stat().st_size) for file in repository.rglob("*") if file.is_file()}
    assert after == before
    assert not mark.exists()


def test_several_boards_may_be_old_at_once(repository: Path) -> None:
    paths = [str(repository / "kiln" / "kiln.kicad_sch"), str(repository / "common" / "power.kicad_sch")]
    with files_of(paths, "main") as old:
        assert all(old.old(path) is not None for path in paths)


@pytest.mark.parametrize(
    "revision", ["", "no-such", "--upload-pack=x", "-x", "HEAD~99", "HEAD\nHEAD", "HEAD:levelcrossing.toml"]
)
def test_revisions_that_are_none(repository: Path, revision: str) -> None:
    with pytest.raises(CommandError) as caught, files_of([str(repository / "levelcrossing.toml")], revision):
        pass
    assert "\n" not in str(caught.value)


def test_no_repository_and_paths_outside(repository: Path, tmp_path: Path) -> None:
    outside = tmp_path / "outside.net"
    outside.write_text("x", encoding="utf-8")
    with pytest.raises(CommandError, match="git failed"), files_of([str(outside)], "HEAD"):
        pass
    with (
        pytest.raises(CommandError, match="outside"),
        files_of([str(repository / "levelcrossing.toml"), str(outside)], "HEAD"),
    ):
        pass
    with pytest.raises(CommandError, match="existing folder"), files_of([str(tmp_path / "no" / "x.net")], "HEAD"):
        pass


def test_a_hook_environment_does_not_mislead(repository: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """While a hook runs, git names its own repository in the environment."""
    monkeypatch.setenv("GIT_DIR", str(tmp_path / "elsewhere"))
    monkeypatch.setenv("GIT_INDEX_FILE", str(tmp_path / "index"))
    with files_of([str(repository / "kiln" / "kiln.kicad_sch")], "HEAD") as old:
        assert old.old(str(repository / "kiln" / "kiln.kicad_sch")) is not None
