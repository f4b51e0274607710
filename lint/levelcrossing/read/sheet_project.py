"""A project of sheets: its root, its files, and every use of every sheet.

A sheet may be used more than once, and each use calls its symbols by other references. Newer files keep them with the
symbol (``instances``), KiCad 6 keeps them in the root sheet (``symbol_instances``). Where neither knows the use, the
first reference of the symbol counts and a remark says so; KiCad itself would leave its nets without a label out.
"""

from __future__ import annotations

import json
import os
import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from levelcrossing.errors import InputError
from levelcrossing.read.sheet_files import (
    Instance,
    LibraryPin,
    LibrarySymbol,
    SheetBox,
    SheetFile,
    SheetSymbol,
    read_sheet_file,
    read_text,
)

DEEPEST_TREE = 50
"""Sheets within sheets."""

LEVELS_ABOVE = 4
"""How many folders above a sub-sheet are searched for the project that uses it."""

MOST_USES = 20_000
"""Uses of sheets in one project; reused sheets within reused sheets multiply."""

_SHEET_FILE = re.compile(r'\(property\s+"(?:[^"\\]|\\.)*"\s+"((?:[^"\\]|\\.)*\.kicad_sch)"')


@dataclass(slots=True, kw_only=True)
class Use:
    """One use of a sheet.

    Parameters
    ----------
    file : SheetFile
    path : str
        Identifiers from the root on, as the sheets write them: ``/root/box/box``.
    names : str
        Names of the sheets, ``/power/``.
    box : SheetBox or None
        As which it is drawn on its parent; None for the root.
    parent : int
        Index of the parent's use, -1 for the root.
    page : str
        Page number as text.
    fitted, on_board : bool
        False when this sheet or one above is marked so.
    """

    index: int
    file: SheetFile
    path: str
    names: str
    depth: int
    box: SheetBox | None
    parent: int
    page: str
    fitted: bool = True
    on_board: bool = True
    children: dict[int, int] = field(default_factory=dict)


class Project:
    """All sheets below a root.

    Parameters
    ----------
    root : Path
        The root sheet.
    """

    def __init__(self, root: Path) -> None:
        self.root = root
        self.folder = root.parent
        self.remarks: list[str] = []
        self.unsure: dict[str, int] = {}
        self.files: dict[Path, SheetFile] = {}
        self.uses: list[Use] = []
        self.settings = _project_settings(root.with_suffix(".kicad_pro"))
        self.aliases: dict[str, tuple[str, ...]] = {}
        self._symbols: dict[tuple[Path, str], tuple[LibrarySymbol, tuple[tuple[int, int, LibraryPin], ...]] | None] = {}
        self._grow()

    def shown(self, path: Path) -> str:
        """Return how a file is named in messages: relative to the project's folder where it lies within."""
        return Path(os.path.relpath(path, self.folder)).as_posix()

    @property
    def variables(self) -> dict[str, str]:
        """Text variables of the project file."""
        found = self.settings.get("text_variables")
        return {str(key): str(text) for key, text in found.items()} if isinstance(found, dict) else {}

    def in_page_order(self) -> list[Use]:
        """Return the uses in order of their page numbers."""
        return sorted(self.uses, key=lambda use: (_page_key(use.page), use.index))

    def instance(self, use: Use, symbol: SheetSymbol) -> Instance:
        """Return how a symbol is called on a use of its sheet."""
        for path, instance in symbol.instances:
            if path == use.path:
                return instance
        below_root = "/" + use.path[1:].partition("/")[2]
        old = self.uses[0].file.old_instances.get(f"{below_root.rstrip('/')}/{symbol.uuid}")
        if old is not None:
            return old
        self.unsure[use.names] = self.unsure.get(use.names, 0) + 1
        for _, instance in symbol.instances[:1]:
            return instance
        return Instance(reference=symbol.field("Reference"), unit=symbol.unit)

    def library(
        self, file: SheetFile, symbol: SheetSymbol
    ) -> tuple[LibrarySymbol, tuple[tuple[int, int, LibraryPin], ...]] | None:
        """Return a symbol's library drawing with the pins that it has itself or from its parent."""
        name = symbol.library_name or symbol.library_id
        key = (file.path, name)
        if key not in self._symbols:
            self._symbols[key] = _with_parents(file, name)
        return self._symbols[key]

    # ------------------------------------------------------------------------------------------------ growing the tree

    def _file(self, path: Path, asked_by: SheetFile | None) -> SheetFile:
        known = self.files.get(path)
        if known is None:
            if asked_by is not None and not path.exists():
                line = _line_of(asked_by.path, path.name)
                raise InputError(
                    f"names the sub-sheet {self.shown(path)}, which does not exist",
                    remedy="restore it or remove its box",
                    file=self.shown(asked_by.path),
                    line=line,
                )
            known = self.files[path] = read_sheet_file(path, self.shown(path))
            self.remarks.extend(known.remarks)
            self.aliases.update(known.aliases)
            if not path.resolve().is_relative_to(self.folder.resolve()):
                self.remarks.append(f"{self.shown(path)}: the sheet lies outside the project's folder")
        return known

    def _grow(self) -> None:
        schematic = self.settings.get("schematic")
        aliases = schematic.get("bus_aliases") if isinstance(schematic, dict) else None
        tops = schematic.get("top_level_sheets") if isinstance(schematic, dict) else None
        if isinstance(tops, list) and len(tops) > 1:
            self.remarks.append(
                f"{self.root.stem}.kicad_pro: the project has {len(tops)} top-level sheets; "
                f"only {self.root.name} and what lies below it was read"
            )
        if isinstance(aliases, dict):
            self.aliases.update(
                {str(key): tuple(map(str, members)) for key, members in aliases.items() if isinstance(members, list)}
            )
        file = self._file(self.root, None)
        self.uses.append(
            Use(
                index=0,
                file=file,
                path=f"/{file.uuid}",
                names="/",
                depth=1,
                box=None,
                parent=-1,
                page=file.old_pages.get("/", "1"),
            )
        )
        index = 0
        while index < len(self.uses):
            self._grow_below(index)
            index += 1

    def _grow_below(self, index: int) -> None:
        use = self.uses[index]
        for position, box in enumerate(use.file.boxes):
            path = self._child_path(use.file, box)
            self._refuse_loop(index, path)
            child = self._file(path, use.file)
            if len(self.uses) >= MOST_USES or use.depth >= DEEPEST_TREE:
                raise InputError(
                    f"has more than {MOST_USES} sheets or more than {DEEPEST_TREE} within each other",
                    remedy="is it one project?",
                    file=self.shown(self.root),
                )
            below = f"{use.path}/{box.uuid}"
            page = dict(box.pages).get(use.path, "")
            if not page:
                page = self.uses[0].file.old_pages.get("/" + below[1:].partition("/")[2], "")
            use.children[position] = len(self.uses)
            self.uses.append(
                Use(
                    index=len(self.uses),
                    file=child,
                    path=below,
                    names=f"{use.names}{box.name}/",
                    depth=use.depth + 1,
                    box=box,
                    parent=index,
                    page=page,
                    fitted=use.fitted and box.fitted,
                    on_board=use.on_board and box.on_board,
                )
            )

    def _child_path(self, file: SheetFile, box: SheetBox) -> Path:
        name = box.file.replace("\\", "/")
        for variable, text in {"KIPRJMOD": str(self.folder), **self.variables}.items():
            name = name.replace("${" + variable + "}", text)
        if not name:
            raise InputError(
                f"has a sheet box {box.name!r} that names no file",
                remedy="give it a file or remove it",
                file=self.shown(file.path),
            )
        # KiCad takes the file beside the sheet that names it.
        return Path(os.path.normpath(file.path.parent / name))

    def _refuse_loop(self, index: int, path: Path) -> None:
        while index >= 0:
            if self.uses[index].file.path == path:
                raise InputError(
                    f"is a sub-sheet of itself ({self.uses[index].names} holds it again)",
                    remedy="remove the sheet box that closes the loop",
                    file=self.shown(path),
                )
            index = self.uses[index].parent


def _with_parents(file: SheetFile, name: str) -> tuple[LibrarySymbol, tuple[tuple[int, int, LibraryPin], ...]] | None:
    symbol = file.library.get(name)
    if symbol is None:
        return None
    own, pins, fields, units, power = symbol, symbol.pins, dict(symbol.fields), symbol.units, symbol.power
    seen = {name}
    while own.parent:
        prefix = name.rpartition(":")[0]
        parent = file.library.get(f"{prefix}:{own.parent}" if prefix else own.parent) or file.library.get(own.parent)
        if parent is None or parent.name in seen:
            break
        seen.add(parent.name)
        own = parent
        pins = pins or own.pins
        fields = {**dict(own.fields), **fields}
        units = max(units, own.units)
        power = power or own.power
    whole = LibrarySymbol(
        name=symbol.name, parent="", power=power, pins=pins, fields=tuple(fields.items()), units=units
    )
    return whole, pins


def _page_key(page: str) -> tuple[int, int, str]:
    return (0, int(page), "") if page.isdigit() else (1, 0, page)


def _project_settings(path: Path) -> dict[str, Any]:
    """Return the project file's settings; nothing when there is none or it cannot be read."""
    if not path.is_file():
        return {}
    try:
        found = json.loads(read_text(path, path.name))
    except (ValueError, RecursionError):
        return {}
    return found if isinstance(found, dict) else {}


def _line_of(path: Path, text: str) -> int:
    try:
        for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), 1):
            if text in line:
                return number
    except (OSError, UnicodeDecodeError):
        pass
    return 0


# --------------------------------------------------------------------------------------------------- finding the root


def find_root(path: Path) -> Path:
    """Return the root sheet of a sheet, project file or project folder.

    Parameters
    ----------
    path : Path
        A ``.kicad_sch`` (the root or one of its sub-sheets), a ``.kicad_pro`` or a folder.

    Returns
    -------
    Path
        The root sheet; the sheet itself when no other sheet beside it leads to it.

    Raises
    ------
    InputError
        When there is no sheet, or more than one root to choose from.
    """
    if path.is_dir():
        return _root_in(path)
    if path.suffix == ".kicad_pro":
        root = path.with_suffix(".kicad_sch")
        if not root.is_file():
            raise InputError("has no sheet of the same name beside it", remedy=f"expected {root.name}", file=str(path))
        return root
    if path.suffix == ".sch":
        raise InputError(
            "is a sheet of KiCad 5 or older", remedy="open it with KiCad 6 or newer and save it", file=str(path)
        )
    if path.with_suffix(".kicad_pro").is_file():
        return path
    return _above(path)


def _root_in(folder: Path) -> Path:
    projects = sorted(found for found in folder.glob("*.kicad_pro") if found.with_suffix(".kicad_sch").is_file())
    if len(projects) == 1:
        return projects[0].with_suffix(".kicad_sch")
    if projects:
        names = ", ".join(found.name for found in projects[:5])
        raise InputError(f"holds {len(projects)} projects: {names}", remedy="name one of them", file=str(folder))
    sheets = sorted(folder.glob("*.kicad_sch"))
    if not sheets:
        old = next(iter(sorted(folder.glob("*.sch"))), None)
        if old is not None:
            raise InputError(
                f"holds sheets of KiCad 5 or older ({old.name})",
                remedy="open them with KiCad 6 or newer and save them",
                file=str(folder),
            )
        raise InputError("holds no KiCad sheet", remedy="name the project's folder", file=str(folder))
    used = {child for sheet in sheets for child in _children_of(sheet)}
    roots = [sheet for sheet in sheets if sheet.resolve() not in used]
    if len(roots) == 1:
        return roots[0]
    names = ", ".join(found.name for found in (roots or sheets)[:5])
    raise InputError(f"holds several sheets and no project file: {names}", remedy="name one of them", file=str(folder))


def _children_of(sheet: Path) -> set[Path]:
    """Return the sub-sheets that a sheet names, by a scan of its text."""
    try:
        text = sheet.read_text(encoding="utf-8", errors="replace") if sheet.is_file() else ""
    except OSError:
        return set()
    return {(sheet.parent / found.replace("\\", "/")).resolve() for found in _SHEET_FILE.findall(text)}


def _above(path: Path) -> Path:
    """Go from a sub-sheet to the root above it, through the sheets of its folder and of project folders above."""
    if not path.is_file():
        return path
    folders = [path.parent]
    for folder in list(path.absolute().parents)[1:LEVELS_ABOVE]:
        if any(folder.glob("*.kicad_pro")):
            folders.append(Path(os.path.relpath(folder)) if not path.is_absolute() else folder)
    parents: dict[Path, list[Path]] = {}
    for folder in folders:
        for sheet in sorted(folder.glob("*.kicad_sch")):
            for child in _children_of(sheet):
                parents.setdefault(child, []).append(sheet)
    sheet = path
    seen = {path.resolve()}
    while True:
        above = parents.get(sheet.resolve(), [])
        own = [found for found in above if found.with_suffix(".kicad_pro").is_file()]
        step = (own or above)[:1]
        if not step or step[0].resolve() in seen:
            return sheet
        sheet = step[0]
        seen.add(sheet.resolve())
