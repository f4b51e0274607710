"""The rows of a file of trade data: cut it at its ``[[table]]`` headers and keep where each row stands.

A row's figures are read when the row is first needed, which keeps the start of a review short.
"""

from __future__ import annotations

import re
import tomllib
from dataclasses import replace
from pathlib import Path
from typing import Any

from levelcrossing.errors import TradeDataError
from levelcrossing.model import Provenance

_HEADER = re.compile(r"^\[\[\s*([A-Za-z_]+)\s*\]\]", re.MULTILINE)
_ID = re.compile(r"^id\s*=\s*\"((?:[^\"\\]|\\.)*)\"", re.MULTILINE)
_MATCH = re.compile(r"^match\s*=\s*(\[.*\])\s*$", re.MULTILINE)
_STRINGS = re.compile(r"'([^']*)'|\"((?:[^\"\\]|\\.)*)\"")


# How the files of the shipped rows are called in messages.
SHIPPED = "rules/trade/"


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
                found = re.search(r"line (\d+)", str(fault))
                raise TradeDataError(
                    f"[[{self.table}]] is not TOML: {re.sub(r' [(]at line.*', '', str(fault))}",
                    file=self.file,
                    line=self.line + (int(found[1]) - 1 if found else 0),
                ) from fault
        return self._data

    @property
    def own(self) -> bool:
        """A row of the house or the project, not a shipped one."""
        return not self.file.startswith(SHIPPED)

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
            groups=tuple(
                (key.removeprefix("certainty_"), str(value))
                for key, value in self.data.items()
                if key.startswith("certainty_")
            ),
        )

    def provenance_for(self, text: str) -> Provenance:
        """Return where the row's figures for one part come from: what was read may be the sheet of a relative.

        Parameters
        ----------
        text : str
            The normal text of the part that matched.

        Returns
        -------
        Provenance
            From memory for a part that is not among the row's ``sure_members``.
        """
        whole, members = self.provenance, self.get("sure_members", ())
        if not members or any(re.match(member, text) for member in members):
            return whole
        return replace(whole, source=f"{whole.source}; taken for this part too", certainty="memory", groups=())

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
