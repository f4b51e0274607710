"""KiCad netlists in brackets (``.net``), of KiCad 4 to 10."""

from __future__ import annotations

from pathlib import Path

from levelcrossing.model import Board
from levelcrossing.read.brackets import read_brackets
from levelcrossing.read.gather import gather
from levelcrossing.read.opening import decoded, read_bytes, refuse_other_kinds


def read_netlist(path: str | Path, text: str | None = None) -> Board:
    """Read a board from a netlist in brackets.

    Parameters
    ----------
    path : str or Path
        The file.
    text : str or None
        Its text, when it was read already; the file is not touched then.

    Returns
    -------
    Board

    Raises
    ------
    InputError
        When the file cannot be read, is of another kind, is damaged, or holds no parts.
    """
    shown = str(path)
    remarks: tuple[str, ...] = ()
    if text is None:
        data = read_bytes(Path(path), shown)
        refuse_other_kinds(data, shown)
        text, remarks = decoded(data)
    return gather(read_brackets(text, shown), shown, "netlist", remarks)
