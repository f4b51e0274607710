"""From a path to text: size, kind and encoding of a file are checked before anything is understood in it."""

from __future__ import annotations

import re
import stat
from pathlib import Path

from levelcrossing.errors import InputError

LARGEST_BYTES = 100_000_000  # the largest real netlist seen has 8.6 MB
EXPORT = "export a netlist from KiCad's schematic editor, or name the .kicad_sch"

_OWN_FORM = "export it from KiCad 5 or newer in KiCad's own form"

# What a file is when it is no netlist of KiCad's, by its first characters (case ignored, white space before skipped).
_KINDS = (
    (r"# EESchema Netlist", "is a netlist of the old pcbnew form", _OWN_FORM),
    (
        r"EESchema Schematic File",
        "is a sheet of KiCad 5 or older",
        "open it in KiCad 6 or newer and save it, or export its netlist",
    ),
    (r"EESchema-LIBRARY", "is a symbol library of KiCad 5 or older", EXPORT),
    (r"PCBNEW-BOARD", "is a board layout of an old KiCad", EXPORT),
    (r"\(\s*kicad_pcb\b", "is a board layout, which holds no pin types", EXPORT),
    (r"\(\s*kicad_symbol_lib\b", "is a symbol library", EXPORT),
    (r"\(\s*(footprint|module)\b", "is a footprint", EXPORT),
    (r"\(\s*(kicad_wks|page_layout|drawing_sheet)\b", "is a drawing frame", EXPORT),
    (r"\(\s*(sym|fp)_lib_table\b", "is a table of libraries", EXPORT),
    (r"\(\s*edif\b", "is a netlist in EDIF form", EXPORT),
    (r"\(\s*pcb\b", "is a layout for a router", EXPORT),
    (r"\(\s*\{", "is a netlist of the old pcbnew form", _OWN_FORM),
    (r"%PDF-", "is a PDF document", EXPORT),
    (r"PK\x03\x04", "is a zip archive", "unpack it and name the netlist within"),
    (r"\x1f\x8b|BZh|\xfd7zXZ|7z\xbc\xaf|Rar!", "is a packed archive", "unpack it and name the netlist within"),
    (r"\x89PNG|\xff\xd8\xff|GIF8|BM..\0\0|II\*\0|MM\0\*", "is a picture", EXPORT),
    (r"\x7fELF|MZ.{0,60}\0", "is a program", EXPORT),
    (r"(%FS[LT]|%MO|%TF|G04\b|G01\b)", "is a Gerber layer", EXPORT),
    (r"M48\b|;\s*DRILL", "is a drill file", EXPORT),
    (r"\.title\b|\*.*\bspice\b|\.(include|lib|model|subckt)\b", "is a SPICE deck", EXPORT),
    (r"\*[A-Z-]+\*|\$PACKAGES|\.HEA\b|\[\s*$", "is a netlist, but not in KiCad's form", EXPORT),
    (r"\{\s*(\"|\})|\[\s*[\{\"\d]", "is JSON data", EXPORT),
    (r"<(!doctype\s+)?html", "is a web page", "download the file itself, not the page that shows it"),
    (r"<svg", "is a drawing", EXPORT),
    (r"version https://git-lfs", "is a pointer to a large file that was not fetched", "fetch it with git lfs pull"),
    (r"<{7} |={7}$|>{7} ", "holds the marks of an unsettled merge", "settle the merge and export again"),
)
_COMPILED = tuple(
    (re.compile(rf"\s*(?:{pattern})", re.IGNORECASE | re.MULTILINE), what, remedy) for pattern, what, remedy in _KINDS
)


def read_bytes(path: Path, shown: str) -> bytes:
    """Return the bytes of a regular file of bearable size.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name as the user gave it, for errors.

    Raises
    ------
    InputError
        When it is missing, no regular file, unreadable, empty or too large.
    """
    try:
        found = path.stat()
        if stat.S_ISDIR(found.st_mode):
            raise InputError("is a folder", remedy=EXPORT, file=shown)
        if not stat.S_ISREG(found.st_mode):
            remedy = "write the netlist to a file and name that"
            raise InputError("is a pipe or a device, not a file", remedy=remedy, file=shown)
        if found.st_size > LARGEST_BYTES:
            raise _too_large(found.st_size, shown)
        with path.open("rb") as stream:
            data = stream.read(LARGEST_BYTES + 1)
    except FileNotFoundError:
        raise InputError("does not exist", remedy="check the path", file=shown) from None
    except PermissionError:
        raise InputError("may not be read", remedy="check its permissions", file=shown) from None
    except (OSError, ValueError) as error:
        # ValueError: a path with a zero character.
        why = getattr(error, "strerror", None) or str(error)
        raise InputError(f"cannot be read: {why}", remedy="check the path", file=shown) from None
    if len(data) > LARGEST_BYTES:
        raise _too_large(len(data), shown)
    if not data.strip():
        raise InputError("is empty", remedy="export the netlist again", file=shown)
    return data


def _too_large(size: int, shown: str) -> InputError:
    what = f"has {size / 1e6:,.0f} MB, more than the {LARGEST_BYTES // 1_000_000} MB that are read"
    return InputError(what, remedy="no netlist is that large; check the path", file=shown)


def refuse_other_kinds(data: bytes, shown: str) -> None:
    """Raise when the first bytes show that a file is of a kind that holds no netlist.

    Parameters
    ----------
    data : bytes
        The file.
    shown : str
        Its name for errors.

    Raises
    ------
    InputError
        Naming the kind.
    """
    if data.startswith((b"\xff\xfe", b"\xfe\xff")) or data[:2] in (b"(\0", b"\0(", b"<\0", b"\0<"):
        raise InputError("is UTF-16 text", remedy="save it as UTF-8, or export it again", file=shown, line=1)
    head = data[:2000].removeprefix(b"\xef\xbb\xbf").decode("latin-1")
    for pattern, what, remedy in _COMPILED:
        if pattern.match(head):
            raise InputError(what, remedy=remedy, file=shown, line=1)
    if b"\0" in data.rstrip(b"\0\x1a \t\r\n"):
        raise InputError("is no text (it holds zero bytes)", remedy=EXPORT, file=shown)


def decoded(data: bytes) -> tuple[str, tuple[str, ...]]:
    """Return bytes as text, and a remark when they were not UTF-8.

    Parameters
    ----------
    data : bytes
        A file without zero bytes.
    """
    try:
        return data.decode("utf-8-sig"), ()
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        remark = f"line {line} is not UTF-8: the file was read as Latin-1, some letters may be wrong"
        return data.decode("latin-1"), (remark,)
