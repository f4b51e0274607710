"""Readers: a file on disk becomes a :class:`levelcrossing.model.Board`."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

from levelcrossing.errors import InputError
from levelcrossing.model import Board, Part
from levelcrossing.read.fitted import fitting
from levelcrossing.read.netlist import read_netlist
from levelcrossing.read.opening import EXPORT, decoded, read_bytes, refuse_other_kinds
from levelcrossing.read.xml import read_xml

__all__ = ["read_board"]

_SHEET = re.compile(rb"\s*\(\s*kicad_sch\b")
_XML = re.compile(rb"\s*<(?:\?xml|!DOCTYPE|!--|export\b)", re.IGNORECASE)


def read_board(path: str | Path) -> Board:
    """Read a board from whatever a path names.

    Parameters
    ----------
    path : str or Path
        A netlist (in brackets or XML), a ``.kicad_sch``, a ``.kicad_pro`` or a project folder. What a file holds
        decides, not how it is called.

    Returns
    -------
    Board

    Raises
    ------
    InputError
        One line: file, line where one is at fault, what is wrong, what to do.
    """
    shown = str(path)
    file = Path(path)
    if _is_folder(file):
        _check_folder(file, shown)
        return _from_sheets(path)
    if file.suffix == ".kicad_pro" and file.is_file():
        return _from_sheets(path)
    data = read_bytes(file, shown)
    body = data.removeprefix(b"\xef\xbb\xbf")
    if _SHEET.match(body):
        return _from_sheets(path)
    if _XML.match(body) and not re.match(rb"\s*<!DOCTYPE\s+html", body, re.IGNORECASE):
        return read_xml(path, data)
    refuse_other_kinds(data, shown)
    if not body.lstrip().startswith(b"("):
        raise InputError("is no KiCad netlist and no sheet", remedy=EXPORT, file=shown, line=1)
    text, remarks = decoded(data)
    board = read_netlist(path, text)
    return replace(board, remarks=(*remarks, *board.remarks))


def _is_folder(file: Path) -> bool:
    try:
        return file.is_dir()
    except (OSError, ValueError):
        return False  # reading it will say what is wrong


def _check_folder(folder: Path, shown: str) -> None:
    """Raise when a folder holds no project, naming a netlist that it may hold."""
    try:
        names = sorted(entry.name for entry in folder.iterdir())
    except OSError as error:
        raise InputError(f"cannot be read: {error.strerror}", remedy="check its permissions", file=shown) from None
    if any(name.endswith((".kicad_pro", ".kicad_sch")) for name in names):
        return
    netlists = [name for name in names if name.endswith((".net", ".xml"))]
    remedy = f"name the netlist itself: {folder / netlists[0]}" if netlists else "name a project, a sheet or a netlist"
    raise InputError("is a folder without a KiCad project", remedy=remedy, file=shown)


def _from_sheets(path: str | Path) -> Board:
    """Read the sheets, and judge by fields and values which parts are fitted, as for netlists."""
    from levelcrossing.read.sheets import read_sheets  # loads kiutils, which netlists do not need

    board = read_sheets(path)
    remarks = list(board.remarks)
    parts: list[Part] = []
    for part in board.parts:
        symbol = f"{part.library}:{part.symbol}"
        why, remark = fitting(part.value, symbol, part.footprint, part.description, part.fields, not part.fitted)
        if remark:
            remarks.append(f"{part.reference} {remark}")
        parts.append(replace(part, fitted=not why, not_fitted_why=why))
    return replace(board, parts=tuple(parts), remarks=tuple(remarks))
