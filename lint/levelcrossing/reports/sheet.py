"""A page of text under construction: words wrapped by us, styles kept beside them.

The same lines serve a pipe (characters only) and a terminal (with styles, drawn by rich). Wrapping is done here, so that
both look alike and a pipe needs no drawing library.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass, field

from levelcrossing.reports.clean import terminal

Segment = tuple[str, str]
"""Text and the name of its style, empty for none."""


def cells(text: str) -> int:
    """Return how many columns a text takes on a terminal."""
    if text.isascii():
        return len(text)
    wide = sum(1 for character in text if unicodedata.east_asian_width(character) in ("W", "F"))
    marks = sum(1 for character in text if unicodedata.category(character) in ("Mn", "Me"))
    return len(text) + wide - marks


def chunks(text: str, width: int) -> list[str]:
    """Cut a word into pieces of at most ``width`` columns."""
    pieces: list[str] = []
    piece, taken = "", 0
    for character in text:
        size = cells(character)
        if taken + size > width and piece:
            pieces.append(piece)
            piece, taken = "", 0
        piece += character
        taken += size
    return [*pieces, piece]


def wrap(text: str, first: int, rest: int) -> list[str]:
    """Wrap a text to ``first`` columns on its first line and ``rest`` on the others; over-long words are cut."""
    lines: list[str] = []
    line, taken, room = "", 0, first
    for word in text.split(" "):
        if not word:
            continue
        size = cells(word)
        if line and taken + 1 + size > room:
            lines.append(line)
            line, taken, room = "", 0, rest
        if size > room:
            pieces = chunks(word, rest)
            lines.extend([line] if line else [])
            lines.extend(pieces[:-1])
            line, taken, room = pieces[-1], cells(pieces[-1]), rest
            continue
        line = f"{line} {word}" if line else word
        taken = cells(line)
    return [*lines, line]


@dataclass(slots=True)
class Sheet:
    """Lines of styled segments.

    Parameters
    ----------
    width : int
        Columns; no line is longer.
    lines : list
        Each a list of segments.
    """

    width: int
    lines: list[list[Segment]] = field(default_factory=list)

    def blank(self) -> None:
        """Add an empty line, unless the last one is empty already."""
        if self.lines and self.lines[-1]:
            self.lines.append([])

    def line(self, *segments: Segment) -> None:
        """Add one line as it is; the texts are taken as clean."""
        self.lines.append(list(segments))

    def text(self, text: str, *, indent: int = 0, label: str = "", label_style: str = "dim", style: str = "") -> None:
        """Add wrapped text, with a label in the margin of its first line.

        Parameters
        ----------
        text : str
            Any text; made harmless here.
        indent : int
            Columns before every line [characters].
        label : str
            Stands within the indent of the first line.
        label_style, style : str
        """
        room = max(self.width - indent, 16)
        for number, line in enumerate(wrap(terminal(text), room, room)):
            if number == 0 and label:
                self.lines.append([(label.ljust(indent), label_style), (line, style)])
            else:
                self.lines.append([(" " * indent, ""), (line, style)])

    def rows(self, rows: Sequence[Sequence[str]], *, indent: int = 2, styles: Sequence[str] = ()) -> None:
        """Add a table of columns; the last column is wrapped."""
        cleaned = [[terminal(cell) for cell in row] for row in rows]
        if not cleaned:
            return
        fixed = len(cleaned[0]) - 1
        most = max(6, min((self.width - indent) // 2, (self.width - indent - 20) // max(fixed, 1) - 2))
        widths = [min(most, max(cells(row[index]) for row in cleaned)) for index in range(len(cleaned[0]) - 1)]
        lead = indent + sum(widths) + 2 * len(widths)
        for row in cleaned:
            columns = [chunks(cell, width) if cell else [""] for cell, width in zip(row, widths, strict=False)]
            columns.append(wrap(row[-1], max(self.width - lead, 16), max(self.width - lead, 16)))
            for number in range(max(len(column) for column in columns)):
                segments: list[Segment] = [(" " * indent, "")]
                for index, column in enumerate(columns):
                    cell = column[number] if number < len(column) else ""
                    style = styles[index] if index < len(styles) else ""
                    if index < len(widths):
                        cell += " " * (widths[index] - cells(cell) + 2)
                    segments.append((cell, style))
                self.lines.append(segments)

    def plain(self) -> str:
        """Return the page as characters alone."""
        return "".join("".join(text for text, _ in line).rstrip() + "\n" for line in self.lines)
