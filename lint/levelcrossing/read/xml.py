"""KiCad netlists in XML, read without entities, document types or anything outside the file."""

from __future__ import annotations

from pathlib import Path
from xml.parsers import expat

from levelcrossing.errors import InputError
from levelcrossing.model import Board
from levelcrossing.read.brackets import DEEPEST, MOST_TOKENS, Tree
from levelcrossing.read.gather import gather
from levelcrossing.read.opening import read_bytes


class _Shaper:
    """Turns elements into the shape of the bracketed form: ``<comp ref="R1">`` becomes ``(comp (ref R1))``.

    Both forms come from one tree in KiCad, so that one reader serves both.
    """

    def __init__(self, file: str) -> None:
        self.file = file
        self.root: Tree = []
        self._above: list[Tree] = [self.root]
        self._texts: list[list[str]] = [[]]
        self._count = 0
        self._parser = expat.ParserCreate()
        self._parser.buffer_text = True
        self._parser.StartElementHandler = self._start
        self._parser.EndElementHandler = self._end
        self._parser.CharacterDataHandler = self._text
        self._parser.StartDoctypeDeclHandler = self._doctype

    def shape(self, data: bytes) -> Tree:
        """Return the tree of a file's bytes."""
        try:
            self._parser.Parse(data, True)
        except expat.ExpatError as error:
            what = f"is no sound XML: {expat.ErrorString(error.code)}"
            raise InputError(what, remedy="export it again", file=self.file, line=error.lineno) from None
        except (LookupError, ValueError) as error:
            # An encoding that Python does not know, or that is no encoding of text.
            what = f"is XML in an unknown encoding ({error})"
            raise InputError(what, remedy="export it again", file=self.file, line=1) from None
        top = self.root[0]
        assert isinstance(top, list)
        return top

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self._count += 1 + len(attributes)
        line = self._parser.CurrentLineNumber
        if len(self._above) > DEEPEST or self._count > MOST_TOKENS:
            deep = len(self._above) > DEEPEST
            what = f"nests elements more than {DEEPEST} deep" if deep else f"holds more than {MOST_TOKENS:,} elements"
            raise InputError(what, remedy="no netlist does; export it again", file=self.file, line=line)
        node: Tree = [name]
        for label, text in attributes.items():
            node.append([label, text])
        self._above[-1].append(node)
        self._above.append(node)
        self._texts.append([])

    def _end(self, name: str) -> None:
        node = self._above.pop()
        text = "".join(self._texts.pop())
        # White space between elements is layout; in an element without children it is its text.
        has_elements = any(isinstance(item, list) for item in node[1:])
        if text.strip() or (text and not has_elements):
            node.append(text)

    def _text(self, text: str) -> None:
        self._texts[-1].append(text)

    def _doctype(self, *_: object) -> None:
        raise InputError(
            "declares a document type, which no KiCad netlist does",
            remedy="export it again; document types are refused because they can reach outside the file",
            file=self.file,
            line=self._parser.CurrentLineNumber,
        )


def read_xml(path: str | Path, data: bytes | None = None) -> Board:
    """Read a board from a netlist in XML.

    Parameters
    ----------
    path : str or Path
        The file.
    data : bytes or None
        Its content, when it was read already; the file is not touched then.

    Returns
    -------
    Board

    Raises
    ------
    InputError
        When the file cannot be read, is no sound XML, declares a document type, or is no netlist.
    """
    shown = str(path)
    if data is None:
        data = read_bytes(Path(path), shown)
    return gather(_Shaper(shown).shape(data.rstrip(b"\0\x1a \t\r\n")), shown, "xml")
