"""The files of trade data: the shipped ones, and those of a house or a project.

Whether the shipped files are sound is checked once, when they change: ``CHECKED`` beside them holds a checksum of
each file that passed the full check, and a file whose checksum differs is checked in full at load. Files of the house
or of a project are always checked in full.
"""

from __future__ import annotations

import zlib
from collections.abc import Iterable, Sequence
from pathlib import Path

from levelcrossing.errors import TradeDataError
from levelcrossing.trade_rows import Row, read_rows, read_text
from levelcrossing.trade_schema import check_file

STAMP = "CHECKED"


def read_folder(folder: Path) -> list[Row]:
    """Read all shipped rows, and check in full each file that changed since the last full check."""
    passed = read_stamp(folder)
    rows: list[Row] = []
    for path in sorted(folder.glob("*.toml")):
        text = read_text(path, path.name)
        found = read_rows(path, f"rules/trade/{path.name}", text)
        if passed.get(path.name) != checksum(text):
            check_file(f"rules/trade/{path.name}", text, found)
        rows += found
    if not rows:
        raise TradeDataError("holds no trade data (*.toml)", file=str(folder))
    return rows


def read_extra(paths: Iterable[Path]) -> list[Row]:
    """Read and check the rows of house or project files."""
    rows: list[Row] = []
    for path in paths:
        text = read_text(path, str(path))
        found = read_rows(path, None, text)
        check_file(str(path), text, found)
        rows += found
    return rows


def overridden(rows: Sequence[Row], extra: Sequence[Row]) -> list[Row]:
    """Put extra rows before the shipped ones; an extra row takes the place of the shipped row of its table and id."""
    taken = {(row.table, row.id) for row in extra}
    return [*extra, *(row for row in rows if (row.table, row.id) not in taken)]


def checksum(text: str) -> str:
    """Return the checksum under which a checked file is remembered."""
    raw = text.encode()
    return f"{zlib.crc32(raw):08x}-{len(raw)}"


def read_stamp(folder: Path) -> dict[str, str]:
    """Return which files passed the full check, by name."""
    try:
        lines = (folder / STAMP).read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError):
        return {}
    return dict(line.split(" ", 1) for line in lines if " " in line and not line.startswith("#"))


def stamp_text(folder: Path) -> str:
    """Check every file in full and return the text that ``CHECKED`` should hold."""
    lines = ["# Checksums of the files that passed the full check; made by: python -m levelcrossing.trade_files"]
    for path in sorted(folder.glob("*.toml")):
        text = read_text(path, path.name)
        check_file(f"rules/trade/{path.name}", text, read_rows(path, f"rules/trade/{path.name}", text))
        lines.append(f"{path.name} {checksum(text)}")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":  # a maintainer's step after editing rows
    import sys

    here = Path(sys.argv[1]) if len(sys.argv) > 1 else Path("rules/trade")
    (here / STAMP).write_text(stamp_text(here), encoding="utf-8")
