"""Where each part, pin and net of a board stands: file, line and column.

Nothing here is read before a place is asked for, and then only text is scanned: a finding on a board of 20 MB of sheets
must not cost a second reading of them. Sheets are preferred: for a netlist alone, the sheets that lie beside it are
found by their names, and the symbols on them by the identifiers that the netlist carries. Where that fails, the line in
the netlist itself is given.
"""

from __future__ import annotations

import os
import re
from bisect import bisect_right
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from xml.sax.saxutils import escape

from levelcrossing.errors import InputError
from levelcrossing.model import Board, Net, Part, Place
from levelcrossing.read.sheet_names import as_net_name

_TEXT = r'"((?:[^"\\]|\\.)*)"'
_SYMBOL = re.compile(r"\(symbol\s+\(lib_(?:id|name)\b")
_UUID = re.compile(r'\(uuid\s+"?([^\s")]+)"?\s*\)')
_REFERENCE = re.compile(rf'(?:\(reference\s+|\(property\s+"Reference"\s+){_TEXT}')
_VALUE = re.compile(rf'\(property\s+"Value"\s+{_TEXT}')
_LABEL = re.compile(rf"\((global_label|hierarchical_label|label)\s+{_TEXT}")
_OLD_INSTANCE = re.compile(rf'\(path\s+"[^"]*/([^"/]+)"\s+\(reference\s+{_TEXT}\)\s*\(unit\s+(\d+)')
_BOX = re.compile(r"\(sheet\s+\(at\b")
_PROPERTY = re.compile(rf"\(property\s+{_TEXT}\s+{_TEXT}")
_UNIT = re.compile(r"\(unit\s+(\d+)\)")
_LIBRARY_NAME = re.compile(rf"\(lib_name\s+{_TEXT}")
_LIBRARY_ID = re.compile(rf"\(lib_id\s+{_TEXT}")
_UNIT_BODY = re.compile(r'\(symbol\s+"(?:[^"\\]|\\.)*_(\d+)_\d+"')
_BRACKET = re.compile(r'"(?:[^"\\]|\\.)*"|[()]')
_ENOUGH_PARTS = 20
"""So many parts of a netlist are looked for on sheets that lie beside it."""


def _unescaped(text: str) -> str:
    return re.sub(r"\\(.)", lambda match: {"n": "\n", "r": "\r", "t": "\t"}.get(match[1], match[1]), text)


def _end_of_block(text: str, start: int) -> int:
    """Return where the bracket opened at ``start`` closes."""
    depth = 0
    for match in _BRACKET.finditer(text, start):
        if match[0] == "(":
            depth += 1
        elif match[0] == ")":
            depth -= 1
            if depth == 0:
                return match.end()
    return len(text)


@dataclass(slots=True, kw_only=True)
class _Block:
    """A symbol placed on a sheet: where its text starts and ends."""

    sheet: _Text
    start: int
    end: int

    def unit(self, reference: str, old_units: dict[tuple[str, str], int]) -> int:
        """Return which unit it is where it is called by a reference."""
        text = self.sheet.text
        own = re.compile(rf'\(reference\s+"{_written(reference)}"\)\s*\(unit\s+(\d+)\)').search(
            text, self.start, self.end
        )
        uuid = _UUID.search(text, self.start, self.end)
        if own is None and uuid is not None and (reference, uuid[1]) in old_units:
            return old_units[reference, uuid[1]]
        found = own or _UNIT.search(text, self.start, self.end)
        return int(found[1]) if found else 1


def _written(text: str) -> str:
    """Return a pattern for text between quotes."""
    return re.escape(text.replace("\\", "\\\\").replace('"', '\\"'))


class _Text:
    """A file's text, with what is found in it on demand."""

    def __init__(self, path: Path, shown: str) -> None:
        self.shown = shown
        try:
            self.text = path.read_text(encoding="utf-8-sig", errors="replace")
        except OSError:
            self.text = ""

    @cached_property
    def line_starts(self) -> list[int]:
        return [0, *(match.end() for match in re.finditer("\n", self.text))]

    def place(self, offset: int) -> Place:
        line = bisect_right(self.line_starts, offset)
        return Place(file=self.shown, line=line, column=offset - self.line_starts[line - 1] + 1)

    @cached_property
    def blocks(self) -> list[int]:
        """Starts of the placed symbols."""
        return [match.start() for match in _SYMBOL.finditer(self.text)]

    def block_at(self, offset: int) -> _Block | None:
        """Return the placed symbol whose text holds an offset."""
        index = bisect_right(self.blocks, offset) - 1
        if index < 0:
            return None
        start = self.blocks[index]
        end = _end_of_block(self.text, start)
        return _Block(sheet=self, start=start, end=end) if offset < end else None

    @cached_property
    def references(self) -> dict[str, list[int]]:
        """By reference, where in the text it is given to a placed symbol."""
        found: dict[str, list[int]] = {}
        for match in _REFERENCE.finditer(self.text):
            found.setdefault(_unescaped(match[1]), []).append(match.start())
        return found

    @cached_property
    def uuids(self) -> dict[str, int]:
        found: dict[str, int] = {}
        for match in _UUID.finditer(self.text):
            found.setdefault(match[1], match.start())
        return found

    @cached_property
    def labels(self) -> dict[tuple[bool, str], int]:
        """By whether it is global and its text as in a net name, where the first such label stands."""
        found: dict[tuple[bool, str], int] = {}
        for match in _LABEL.finditer(self.text):
            key = (match[1] == "global_label", as_net_name(_unescaped(match[2])))
            found.setdefault(key, match.start())
        return found

    @cached_property
    def values(self) -> dict[str, list[int]]:
        found: dict[str, list[int]] = {}
        for match in _VALUE.finditer(self.text):
            found.setdefault(as_net_name(_unescaped(match[1])), []).append(match.start())
        return found

    def boxes(self) -> Iterator[tuple[str, str]]:
        """Yield name and file of each sub-sheet drawn on this sheet."""
        for match in _BOX.finditer(self.text):
            texts = _PROPERTY.findall(self.text, match.start(), _end_of_block(self.text, match.start()))
            if len(texts) >= 2:
                yield _unescaped(texts[0][1]), _unescaped(texts[1][1])

    def unit_of_pin(self, block: _Block, number: str) -> int | None:
        """Return the unit to which the library drawing gives a pin; 0 for all units, None when it is unknown."""
        name = _LIBRARY_NAME.search(self.text, block.start, block.end)
        name = name or _LIBRARY_ID.search(self.text, block.start, block.end)
        if name is None:
            return None
        library = re.compile(rf'\(symbol\s+"{re.escape(name[1])}"').search(self.text)
        if library is None:
            return None
        end = _end_of_block(self.text, library.start())
        pin = re.compile(rf'\(number\s+"{_written(number)}"').search(self.text, library.start(), end)
        if pin is None:
            return None
        unit = None
        for body in _UNIT_BODY.finditer(self.text, library.start() + 1, pin.start()):
            unit = int(body[1])
        return unit


@dataclass(slots=True)
class Places:
    """Finds where things of a board stand; nothing is read before the first question.

    Parameters
    ----------
    board : Board
    """

    board: Board
    _sheets: list[_Text] | None = None
    _own: _Text | None = None
    _old: dict[tuple[str, str], int] | None = None
    _parts: dict[str, Part] | None = None
    _nets: dict[str, Net] | None = None
    _paths: dict[str, list[_Text]] | None = None
    _known: dict[tuple[str, str, str], Place | None] = field(default_factory=dict)

    def place_of_part(self, reference: str) -> Place | None:
        """Return where a part's symbol stands (of several units the first), or None when it is not to be found."""
        return self._once("part", reference, "", lambda: self._part_place(reference))

    def place_of_pin(self, reference: str, number: str) -> Place | None:
        """Return where a pin stands: in its symbol on the sheet, else on its net in the netlist."""
        return self._once("pin", reference, number, lambda: self._pin_place(reference, number))

    def place_of_net(self, name: str) -> Place | None:
        """Return where a net is named: its label or power symbol, else the first pin that is on it."""
        return self._once("net", name, "", lambda: self._net_place(name))

    def _once(self, kind: str, one: str, other: str, find: Callable[[], Place | None]) -> Place | None:
        key = (kind, one, other)
        if key not in self._known:
            self._known[key] = find()
        return self._known[key]

    # ------------------------------------------------------------------------------------------------------- the files

    def _folder(self) -> Path:
        path = Path(self.board.path)
        if self.board.form == "sheets":
            from levelcrossing.read.sheet_project import find_root  # loads kiutils, which netlists do not need

            try:
                return find_root(path).parent  # a sub-sheet may lie deeper than the root that names the sheets
            except InputError:
                return path.parent
        return path.parent

    def sheets(self) -> list[_Text]:
        """Return the sheets of the board, root first; none when they are not beside a netlist."""
        if self._sheets is None:
            folder = self._folder()
            self._sheets = []
            for name in self.board.sheet_files:
                path = Path(os.path.normpath(folder / name))
                if path.suffix == ".kicad_sch" and path.is_file():
                    self._sheets.append(_Text(path, path.as_posix()))
            if self.board.form != "sheets" and not self._belong(self._sheets):
                self._sheets = []
        return self._sheets

    def _belong(self, sheets: list[_Text]) -> bool:
        """Whether sheets beside a netlist are those it was exported from: one of its symbols is on them."""
        uuids = [uuid for part in self.board.parts[:_ENOUGH_PARTS] for uuid in part.uuids]
        return any(uuid in sheet.text for sheet in sheets for uuid in uuids)

    def _netlist(self) -> _Text | None:
        if self.board.form == "sheets":
            return None
        if self._own is None:
            self._own = _Text(Path(self.board.path), self.board.path)
        return self._own

    def _part(self, reference: str) -> Part | None:
        if self._parts is None:
            self._parts = {part.reference: part for part in self.board.parts}
        return self._parts.get(reference)

    # --------------------------------------------------------------------------------------------------------- symbols

    def _blocks(self, reference: str) -> list[_Block]:
        """Return the placed symbols of a part, its first unit first."""
        part = self._part(reference)
        blocks: dict[tuple[str, int], _Block] = {}

        def take(sheet: _Text, offset: int | None) -> None:
            block = None if offset is None else sheet.block_at(offset)
            if block is not None:
                blocks.setdefault((sheet.shown, block.start), block)

        for sheet in self.sheets():
            for uuid in part.uuids if part is not None else ():
                take(sheet, sheet.uuids.get(uuid))
        for called, uuid in self._old_units():
            if called == reference:
                for sheet in self.sheets():
                    take(sheet, sheet.uuids.get(uuid))
        # Units on other sheets, which a netlist does not list; a netlist that is older than the sheets may call them
        # otherwise, so the reference alone counts only beside a symbol that the identifiers confirm, or without any.
        if blocks or part is None or not part.uuids:
            for sheet in self.sheets():
                for offset in sheet.references.get(reference, ()):
                    take(sheet, offset)
        order = {sheet.shown: index for index, sheet in enumerate(self.sheets())}
        old = self._old_units()
        return sorted(
            blocks.values(), key=lambda block: (block.unit(reference, old), order[block.sheet.shown], block.start)
        )

    def _old_units(self) -> dict[tuple[str, str], int]:
        """Return by reference and identifier the units that KiCad 6 lists in the root sheet."""
        if self._old is None:
            self._old = {}
            for sheet in self.sheets()[:1]:
                start = sheet.text.rfind("(symbol_instances")
                if start >= 0:
                    for match in _OLD_INSTANCE.finditer(sheet.text, start):
                        self._old[_unescaped(match[2]), match[1]] = int(match[3])
        return self._old

    def _part_place(self, reference: str) -> Place | None:
        for block in self._blocks(reference):
            return block.sheet.place(block.start)
        own = self._netlist()
        return None if own is None else _in_netlist(own, *_part_patterns(reference))

    def _pin_place(self, reference: str, number: str) -> Place | None:
        blocks = self._blocks(reference)
        pin = re.compile(rf'\(pin\s+"{_written(number)}"')
        holding: list[_Block] = []
        for block in blocks:
            unit = block.sheet.unit_of_pin(block, number) if len(blocks) > 1 else None
            if unit in (None, 0, block.unit(reference, self._old_units())):
                holding.append(block)
        for block in holding or blocks:
            found = pin.search(block.sheet.text, block.start, block.end)
            return block.sheet.place(found.start() if found else block.start)
        own = self._netlist()
        if own is None:
            return None
        return _in_netlist(own, *_node_patterns(reference, number)) or self.place_of_part(reference)

    # ------------------------------------------------------------------------------------------------------------ nets

    def _net(self, name: str) -> Net | None:
        if self._nets is None:
            self._nets = {net.name: net for net in self.board.nets}
        return self._nets.get(name)

    def _net_place(self, name: str) -> Place | None:
        if name.startswith("/"):
            path, _, text = name.rpartition("/")
            on_path = self._by_path().get(f"{path}/", [])
            for sheet in [*on_path, *self.sheets()]:
                if (False, text) in sheet.labels:
                    return sheet.place(sheet.labels[False, text])
        else:
            for sheet in self.sheets():
                if (True, name) in sheet.labels:
                    return sheet.place(sheet.labels[True, name])
            for sheet in self.sheets():
                for offset in sheet.values.get(name, ()):
                    block = sheet.block_at(offset)
                    if block is not None and _is_power(block):
                        return sheet.place(block.start)
        net = self._net(name)
        if net is not None and self.sheets():
            named = [pin for pin in net.pins if f"({pin[0]}-" in name or pin[0] in name]
            for reference, number in [*named, *net.pins]:
                if self._blocks(reference):
                    return self.place_of_pin(reference, number)
        own = self._netlist()
        return None if own is None else _in_netlist(own, *_net_patterns(name))

    def _by_path(self) -> dict[str, list[_Text]]:
        """Return the sheets by the path of names on which they are used."""
        if self._paths is None:
            self._paths = {}
            by_file = {Path(sheet.shown): sheet for sheet in self.sheets()}
            waiting = [("/", sheet, 1) for sheet in self.sheets()[:1]]
            while waiting:
                names, sheet, depth = waiting.pop()
                self._paths.setdefault(names, []).append(sheet)
                if depth < 20 and len(self._paths) < 10_000:
                    for box, file in sheet.boxes():
                        child = by_file.get(Path(os.path.normpath(Path(sheet.shown).parent / file)))
                        if child is not None:
                            waiting.append((f"{names}{box}/", child, depth + 1))
        return self._paths


def _is_power(block: _Block) -> bool:
    reference = re.compile(r'\(property\s+"Reference"\s+"#').search(block.sheet.text, block.start, block.end)
    return reference is not None


# ------------------------------------------------------------------------------------------------ lines of the netlist


def _in_netlist(own: _Text, *patterns: str) -> Place | None:
    """Return where the first of several patterns is met."""
    for pattern in patterns:
        found = re.search(pattern, own.text)
        if found:
            return own.place(found.start())
    return None


def _forms(text: str) -> str:
    """Return a pattern for text as netlists write it: quoted, or bare in the older form."""
    return rf'(?:"{_written(text)}"|{re.escape(text)})'


def _attribute(text: str) -> str:
    return re.escape(escape(text, {'"': "&quot;"}))


def _part_patterns(reference: str) -> tuple[str, str]:
    return rf"\(comp\s+\(ref\s+{_forms(reference)}\)", rf'<comp\s[^>]*ref="{_attribute(reference)}"'


def _node_patterns(reference: str, number: str) -> tuple[str, str]:
    return (
        rf"\(node\s+\(ref\s+{_forms(reference)}\)\s+\(pin\s+{_forms(number)}\)",
        rf'<node\s[^>]*ref="{_attribute(reference)}"\s[^>]*pin="{_attribute(number)}"',
    )


def _net_patterns(name: str) -> tuple[str, str]:
    return (
        rf'\(net\s+\(code\s+"?\d+"?\)\s+\(name\s+{_forms(name)}\)',
        rf'<net\s[^>]*name="{_attribute(name)}"',
    )
