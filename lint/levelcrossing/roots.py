"""Which boards a set of changed files belongs to.

A hook is given the files of a change: a sub-sheet, two sheets of one project, a settings file, a netlist beside its
schematic. Each leads to the boards that it is part of, and every board is reviewed once.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from levelcrossing.settings import FILE_NAME, PARTS_NAME, find_settings, repository_root

_CHILD = re.compile(rb'\(\s*property\s+"Sheet ?file"\s+"((?:[^"\\]|\\.)*)"')
_SOURCE = re.compile(rb'\(\s*source\s+"?([^")\r\n]*)')
_MOST_SHEETS = 5000
_HEAD_BYTES = 4000


@dataclass(frozen=True, slots=True, kw_only=True)
class Boards:
    """Files to review, each board once, and what was left out and why."""

    paths: tuple[str, ...]
    remarks: tuple[str, ...] = ()


def boards_of(changed: Sequence[str]) -> Boards:
    """Return the boards that changed files belong to.

    Parameters
    ----------
    changed : sequence of str
        Sheets, netlists, project and settings files; anything else is taken as a board as it is.

    Returns
    -------
    Boards
        Root sheets and netlists in a fixed order. A netlist is left out when its own schematic is among them.
    """
    sheets: dict[Path, str] = {}
    others: dict[Path, str] = {}
    netlists: dict[Path, str] = {}
    remarks: list[str] = []
    trees: dict[Path, _Sheets] = {}
    for name in changed:
        path = Path(os.path.abspath(name))
        if path.is_dir() or path.suffix not in (".kicad_sch", ".kicad_pro", ".net", ".toml"):
            others[path] = name
        elif path.suffix == ".net":
            if path.is_file() and not _is_netlist(path):
                remarks.append(f"{name}: left out, it is not a netlist of a board")
            else:
                netlists[path] = name
        else:
            base = repository_root(path.parent) or path.parent
            tree = trees.setdefault(base, _Sheets(base))
            found = sorted(tree.boards_with(path))
            if not found:
                remarks.append(f"{name}: no board uses it")
            for root in found:
                sheets[root] = name if root == path else _like(root, name)
    for path, name in netlists.items():
        drawn = next((root for root in sheets if _same_board(path, root)), None)
        if drawn is None:
            others[path] = name
        else:
            remarks.append(f"{name}: reviewed as {sheets[drawn]}")
    merged = sheets | others
    return Boards(paths=tuple(merged[path] for path in sorted(merged)), remarks=tuple(remarks))


def _like(path: Path, example: str) -> str:
    """Return a path in the way the example is given: absolute, or relative to the working folder."""
    if os.path.isabs(example):
        return str(path)
    return Path(os.path.relpath(path)).as_posix()


class _Sheets:
    """All sheets below a folder, and which of them uses which."""

    def __init__(self, base: Path) -> None:
        self._base = base
        self._parents: dict[Path, set[Path]] | None = None

    def boards_with(self, path: Path) -> set[Path]:
        """Return the root sheets that a sheet, project file or settings file has to do with."""
        if path.name in (FILE_NAME, PARTS_NAME):
            own = {sheet for sheet in self._known() if sheet.is_relative_to(path.parent)}
            return {root for sheet in own for root in self._roots(sheet) if find_settings(str(root), path.name) == path}
        if path.suffix == ".kicad_pro":
            root = path.with_suffix(".kicad_sch")
            return {root} if root.is_file() else set()
        return self._roots(path) if path.suffix == ".kicad_sch" else set()

    def _roots(self, sheet: Path) -> set[Path]:
        parents = self._links()
        seen, waiting, roots = set[Path](), [sheet], set[Path]()
        while waiting:
            here = waiting.pop()
            if here in seen:
                continue
            seen.add(here)
            above = parents.get(here, set())
            # A project of its own stays a board even where another project draws it as a sheet.
            if not above - {here} or here.with_suffix(".kicad_pro").is_file():
                roots.add(here)
            waiting.extend(above)
        return roots or {sheet}  # sheets that use each other in a ring have no root; the reader will say so

    def _known(self) -> Iterable[Path]:
        return sorted(self._sheet_files())

    def _links(self) -> dict[Path, set[Path]]:
        if self._parents is None:
            self._parents = {}
            for sheet in self._sheet_files():
                for child in _children(sheet):
                    if child.is_relative_to(self._base):
                        self._parents.setdefault(child, set()).add(sheet)
        return self._parents

    def _sheet_files(self) -> Iterator[Path]:
        count = 0
        for folder, inner, files in os.walk(self._base):
            inner[:] = sorted(name for name in inner if not name.startswith(".") and name != "node_modules")
            for name in sorted(files):
                if name.endswith(".kicad_sch"):
                    count += 1
                    if count > _MOST_SHEETS:
                        return
                    yield Path(folder, name)


def _children(sheet: Path) -> Iterator[Path]:
    try:
        if not sheet.is_file():
            return
        text = sheet.read_bytes()
    except OSError:  # the reader says what is wrong with it when it is reviewed
        return
    if b"Sheetfile" not in text and b"Sheet file" not in text:
        return
    for match in _CHILD.finditer(text):
        name = match[1].decode("utf-8", "replace").replace("\\\\", "/").replace("\\", "")
        if name and "\0" not in name:
            yield Path(os.path.normpath(sheet.parent / name))


def _is_netlist(path: Path) -> bool:
    """Tell a board's netlist from other files called ``.net`` (simulation decks, other layouts)."""
    return _head(path).lstrip(b"\xef\xbb\xbf \t\r\n").startswith(b"(export")


def _same_board(netlist: Path, root: Path) -> bool:
    """Tell whether a netlist was exported from a root sheet at or above its folder."""
    if not netlist.is_relative_to(root.parent):
        return False
    if netlist.stem == root.stem:
        return True
    source = _SOURCE.search(_head(netlist))
    return source is not None and re.split(rb"[/\\]", source[1].strip())[-1] == os.fsencode(root.name)


def _head(path: Path) -> bytes:
    try:
        if not path.is_file():
            return b""
        with path.open("rb") as stream:
            return stream.read(_HEAD_BYTES)
    except OSError:
        return b""
