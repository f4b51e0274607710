"""The rows of ``rules/trade/*.toml``: read them, and refuse what is malformed.

A file is cut at its ``[[table]]`` headers; a row's figures are read when the row is first needed, which keeps the start
short. Whether the shipped files are sound is checked once, when they are changed: ``CHECKED`` beside them holds a
checksum of each file that passed the full check, and a file whose checksum differs is checked in full at load. Files of
the house or of a project are always checked in full.
"""

from __future__ import annotations

import re
import tomllib
import zlib
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

from levelcrossing.errors import TradeDataError
from levelcrossing.model import Provenance

STAMP = "CHECKED"
_HEADER = re.compile(r"^\[\[\s*([A-Za-z_]+)\s*\]\]", re.MULTILINE)
_ID = re.compile(r"^id\s*=\s*\"((?:[^\"\\]|\\.)*)\"", re.MULTILINE)
_MATCH = re.compile(r"^match\s*=\s*(\[.*\])\s*$", re.MULTILINE)
_STRINGS = re.compile(r"'([^']*)'|\"((?:[^\"\\]|\\.)*)\"")


class Row:
    """One row of trade data.

    Parameters
    ----------
    table, file : str
        Kind of row (``part``) and the file it stands in.
    line : int
        Line of its header, counted from 1.
    text : str
        The row as written, header included.
    """

    __slots__ = ("_data", "file", "id", "line", "patterns", "table", "text")

    def __init__(self, table: str, file: str, line: int, text: str) -> None:
        self.table = table
        self.file = file
        self.line = line
        self.text = text
        self._data: dict[str, Any] | None = None
        found = _ID.search(text)
        self.id = found[1] if found else str(self.data.get("id", ""))
        self.patterns = self._read_patterns()

    def _read_patterns(self) -> tuple[str, ...]:
        found = _MATCH.search(self.text)
        if found is not None and "\\\\" not in found[1]:
            return tuple(single or double for single, double in _STRINGS.findall(found[1]))
        if "match" not in self.text:
            return ()
        patterns = self.data.get("match", ())
        return tuple(patterns) if isinstance(patterns, list) else (str(patterns),)

    @property
    def data(self) -> dict[str, Any]:
        """The row's keys and values, read on first use."""
        if self._data is None:
            try:
                self._data = tomllib.loads(self.text)[self.table][0]
            except (tomllib.TOMLDecodeError, KeyError, IndexError) as fault:
                raise self.refuse(f"is not TOML: {fault}") from fault
        return self._data

    def get(self, key: str, default: Any = None) -> Any:
        """Return a value, or the default."""
        return self.data.get(key, default)

    @property
    def provenance(self) -> Provenance:
        """Where the row comes from."""
        return Provenance(
            row=self.id,
            source=str(self.get("source", "")),
            certainty=str(self.get("certainty", "")),
            file=self.file,
            line=self.line,
        )

    def refuse(self, what: str, remedy: str = "") -> TradeDataError:
        """Return the error that says what is wrong with this row, and where it stands."""
        name = f" '{self.id}'" if getattr(self, "id", "") else ""
        return TradeDataError(f"[[{self.table}]]{name} {what}", remedy=remedy, file=self.file, line=self.line)


def read_rows(path: Path, label: str | None = None, text: str | None = None) -> list[Row]:
    """Cut one file into its rows, in file order, without looking into them.

    Parameters
    ----------
    path : Path
        The file.
    label : str, optional
        How the file is called in messages; its path by default.
    text : str, optional
        Its content, when it has been read already.
    """
    label = label or str(path)
    if text is None:
        text = read_text(path, label)
    rows = []
    heads = list(_HEADER.finditer(text))
    line, place = 1, 0
    for index, head in enumerate(heads):
        line += text.count("\n", place, head.start())
        place = head.start()
        end = heads[index + 1].start() if index + 1 < len(heads) else len(text)
        rows.append(Row(head[1], label, line, text[head.start() : end]))
    return rows


def read_text(path: Path, label: str) -> str:
    """Return the text of a file of trade data."""
    try:
        return path.read_text(encoding="utf-8").replace("\r\n", "\n")
    except (OSError, UnicodeDecodeError) as fault:
        raise TradeDataError(f"cannot be read: {fault}", file=label) from fault


def read_folder(folder: Path) -> list[Row]:
    """Read all shipped rows, and check in full each file that changed since the last full check."""
    from levelcrossing import trade_schema  # only needed when something changed

    passed = read_stamp(folder)
    rows: list[Row] = []
    for path in sorted(folder.glob("*.toml")):
        text = read_text(path, path.name)
        found = read_rows(path, f"rules/trade/{path.name}", text)
        if passed.get(path.name) != checksum(text):
            trade_schema.check_file(f"rules/trade/{path.name}", text, found)
        rows += found
    if not rows:
        raise TradeDataError("holds no trade data (*.toml)", file=str(folder))
    return rows


def read_extra(paths: Iterable[Path]) -> list[Row]:
    """Read and check the rows of house or project files."""
    from levelcrossing import trade_schema

    rows: list[Row] = []
    for path in paths:
        text = read_text(path, str(path))
        found = read_rows(path, None, text)
        trade_schema.check_file(str(path), text, found)
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
    from levelcrossing import trade_schema

    lines = ["# Checksums of the files that passed the full check; made by: python -m levelcrossing.trade_rows"]
    for path in sorted(folder.glob("*.toml")):
        text = read_text(path, path.name)
        trade_schema.check_file(f"rules/trade/{path.name}", text, read_rows(path, f"rules/trade/{path.name}", text))
        lines.append(f"{path.name} {checksum(text)}")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":  # a maintainer's step after editing rows
    import sys

    here = Path(sys.argv[1]) if len(sys.argv) > 1 else Path("rules/trade")
    (here / STAMP).write_text(stamp_text(here), encoding="utf-8")
