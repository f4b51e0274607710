"""The files of an older revision, read from git without touching the work tree.

Only git's object store is read (``rev-parse``, ``ls-tree``, ``cat-file``): no checkout, no filters, no hooks, no
network. What a review needs, sheets, netlists, project and settings files, is written to a temporary folder that is
removed afterwards. Links and names that would lead out of that folder are left out.
"""

from __future__ import annotations

import contextlib
import os
import subprocess
import tempfile
from collections.abc import Iterator, Sequence, Set
from dataclasses import dataclass
from pathlib import Path, PurePosixPath

from levelcrossing.errors import CommandError
from levelcrossing.settings import FILE_NAME, PARTS_NAME

_ENDINGS = (".kicad_sch", ".sch", ".kicad_pro", ".pro", ".net", ".xml")
_MOST_BYTES = 400_000_000
_MOST_SECONDS = 120
_REGULAR = (b"100644", b"100755")


@dataclass(frozen=True, slots=True, kw_only=True)
class OldFiles:
    """A revision's files in a temporary folder.

    Parameters
    ----------
    top : Path
        The work tree's root.
    root : Path
        The temporary folder that stands for it.
    """

    top: Path
    root: Path

    def there(self, path: str) -> Path:
        """Return where the old version of a file or folder of the work tree is, or would be."""
        return self.root / _within(path, self.top)

    def old(self, path: str) -> str | None:
        """Return the old version of a file; None when the revision lacks it."""
        there = self.there(path)
        return str(there) if there.exists() else None


@contextlib.contextmanager
def files_of(paths: Sequence[str], revision: str) -> Iterator[OldFiles]:
    """Provide reviewed files or folders as they were in a revision, with the sheets and settings around them.

    Parameters
    ----------
    paths : sequence of str
        Files or folders in the work tree of one git repository; at least one.
    revision : str
        Any name that git gives to a commit.

    Yields
    ------
    OldFiles
        Valid until the context ends.

    Raises
    ------
    CommandError
        When there is no git, no repository or no such revision.
    """
    first = Path(os.path.abspath(paths[0]))
    folder = first if first.is_dir() else first.parent
    if not folder.is_dir():
        raise CommandError(f"{paths[0]} is not in an existing folder", remedy="name a file of the work tree")
    top = Path(_git(folder, "rev-parse", "--show-toplevel").decode("utf-8", "surrogateescape").rstrip("\n")).resolve()
    commit = _commit(folder, revision)
    reviewed = {_within(path, top).as_posix() for path in paths}
    with tempfile.TemporaryDirectory(prefix="levelcrossing-") as temporary:
        root = Path(temporary).resolve()
        (root / ".git").mkdir()  # the search for settings ends here
        _write_tree(folder, commit, root, reviewed)
        yield OldFiles(top=top, root=root)


def _within(path: str, top: Path) -> Path:
    """Return a path relative to the repository's root."""
    target = Path(os.path.abspath(path))
    try:
        # The folder may be reached through a link; the file itself is named as git names it.
        return (target.parent.resolve() / target.name).relative_to(top) if target != top else Path()
    except ValueError:
        raise CommandError(f"{path} lies outside of the repository", remedy="name a file of the work tree") from None


def _commit(folder: Path, revision: str) -> str:
    if not revision or revision.startswith("-") or "\0" in revision or "\n" in revision:
        raise CommandError(f"{revision!r} is not the name of a revision")
    try:
        name = _git(folder, "rev-parse", "--verify", "--quiet", "--end-of-options", f"{revision}^{{commit}}")
    except CommandError:
        remedy = "fetch it first; a shallow clone holds the last commit only"
        raise CommandError(f"git knows no revision {revision!r}", remedy=remedy) from None
    return name.decode("ascii").strip()


def _write_tree(folder: Path, commit: str, root: Path, reviewed: Set[str]) -> None:
    """Write what a review may need of a commit below ``root``."""
    wanted: list[tuple[bytes, PurePosixPath]] = []
    for entry in _git(folder, "ls-tree", "-r", "-z", "--full-tree", commit).split(b"\0"):
        if not entry:
            continue
        meta, _, raw = entry.partition(b"\t")
        mode, _, blob = meta.split(b" ")[:3]
        name = PurePosixPath(raw.decode("utf-8", "surrogateescape"))
        needed = name.suffix in _ENDINGS or name.name in (FILE_NAME, PARTS_NAME) or str(name) in reviewed
        if needed and mode in _REGULAR and _stays_inside(name):
            wanted.append((blob, name))
    written = 0
    for (_, name), data in zip(wanted, _blobs(folder, [blob for blob, _ in wanted]), strict=True):
        written += len(data)
        if written > _MOST_BYTES:
            raise CommandError(f"the schematics of the revision are larger than {_MOST_BYTES // 1_000_000} MB")
        file = root / name
        with contextlib.suppress(OSError, ValueError):  # a name that this system cannot hold is no board of ours
            file.parent.mkdir(parents=True, exist_ok=True)
            file.write_bytes(data)


def _stays_inside(name: PurePosixPath) -> bool:
    odd = any(part in (".", "..") or part.casefold() == ".git" or "\\" in part or ":" in part for part in name.parts)
    return not name.is_absolute() and not odd


def _blobs(folder: Path, names: Sequence[bytes]) -> Iterator[bytes]:
    """Yield the content of blobs, unfiltered, in order."""
    if not names:
        return
    output = _git(folder, "cat-file", "--batch", feed=b"\n".join(names) + b"\n")
    position = 0
    for name in names:
        end = output.index(b"\n", position)
        fields = output[position:end].split(b" ")
        if len(fields) != 3 or fields[1] != b"blob":
            remedy = "fetch the revision completely (a partial clone lacks its files)"
            raise CommandError(f"git does not have object {name.decode('ascii')}", remedy=remedy)
        size = int(fields[2])
        yield output[end + 1 : end + 1 + size]
        position = end + 1 + size + 1


def _git(folder: Path, *arguments: str, feed: bytes | None = None) -> bytes:
    # Nothing that the repository's configuration names may start a program, ask for a password or fetch.
    safe = ["-c", "core.fsmonitor=false", "-c", f"core.hooksPath={os.devnull}", "--no-pager", "--literal-pathspecs"]
    environment = os.environ | {
        "GIT_OPTIONAL_LOCKS": "0",
        "GIT_NO_LAZY_FETCH": "1",
        "GIT_NO_REPLACE_OBJECTS": "1",
        "GIT_TERMINAL_PROMPT": "0",
        "LC_ALL": "C",
    }
    # Set while git runs a hook; they would point at another repository than the one of the file.
    for name in ("GIT_DIR", "GIT_WORK_TREE", "GIT_INDEX_FILE", "GIT_PREFIX"):
        environment.pop(name, None)
    try:
        done = subprocess.run(
            ["git", *safe, *arguments],
            cwd=folder,
            input=feed,
            stdin=subprocess.DEVNULL if feed is None else None,
            capture_output=True,
            timeout=_MOST_SECONDS,
            check=False,
            env=environment,
        )
    except FileNotFoundError:
        raise CommandError("git is not installed", remedy="compare two files instead") from None
    except subprocess.TimeoutExpired:
        raise CommandError(f"git did not answer within {_MOST_SECONDS} s") from None
    if done.returncode:
        lines = done.stderr.decode("utf-8", "replace").strip().splitlines()
        what = "".join(c if c.isprintable() else " " for c in lines[0])[:200] if lines else "it gave no reason"
        raise CommandError(f"git failed: {what}", remedy="compare two files instead")
    return done.stdout
