"""One ``.kicad_sch`` file, taken apart into what connectivity and parts need.

kiutils reads the s-expressions. Its tree of lists is taken apart here rather than its objects, which leave out a pin's
``(hide yes)``, the chosen pin alternate, ``(power local)`` and the body style; the tree has them all, and one walk over
it is enough. kiutils' objects are the second reader in the tests.

All coordinates are whole steps of 100 nm (KiCad's own), so that equal points are equal numbers.
"""

from __future__ import annotations

import os
import stat
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import pairwise
from pathlib import Path
from typing import Any

from kiutils.utils.sexpr import parse_sexp

from levelcrossing.errors import InputError
from levelcrossing.read.brackets import read_brackets

STEPS_PER_MM = 10_000
"""Steps of 100 nm in a millimetre."""

OLDEST_VERSION = 20200310
"""First day of the s-expression sheets (KiCad 5.99, the preparation of 6)."""

NEWEST_VERSION = 20260399
"""Last file version of KiCad 10; newer files are read with a remark."""

POWER_BY_VALUE_VERSION = 20230221
"""From this version on a power symbol names its net by its value, before by its pin (seen in exported netlists)."""

LARGEST_FILE_BYTES = 100_000_000
"""A larger file is refused: the largest real sheets have a hundredth of it."""

DEEPEST_NESTING = 200
"""Brackets within brackets; real sheets stay below 20."""

Point = tuple[int, int]
Tree = list[Any]


@dataclass(frozen=True, slots=True, kw_only=True)
class LibraryPin:
    """A pin as its library symbol draws it: where it connects (y upwards, steps of 100 nm), what it is."""

    number: str
    name: str
    kind: str
    at: Point
    hidden: bool
    alternates: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class LibrarySymbol:
    """A symbol in the sheet's own copy of the library.

    Parameters
    ----------
    power : str
        ``global``, ``local`` or empty.
    pins : tuple of (unit, body style, LibraryPin)
        Unit 0 belongs to all units, style 0 to all styles.
    fields : tuple of (str, str)
    """

    name: str
    parent: str
    power: str
    pins: tuple[tuple[int, int, LibraryPin], ...]
    fields: tuple[tuple[str, str], ...]
    units: int

    def field(self, name: str) -> str:
        """Return a field's text, or an empty text."""
        return next((text for key, text in self.fields if key == name), "")


@dataclass(frozen=True, slots=True, kw_only=True)
class Instance:
    """How a symbol is called on one use of its sheet."""

    reference: str
    unit: int
    value: str | None = None
    footprint: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetSymbol:
    """A symbol placed on a sheet."""

    uuid: str
    library_id: str
    library_name: str
    at: Point
    angle: int
    mirror: str
    unit: int
    style: int
    fields: tuple[tuple[str, str], ...]
    on_board: bool
    in_bom: bool
    fitted: bool
    alternates: tuple[tuple[str, str], ...]
    instances: tuple[tuple[str, Instance], ...]

    def field(self, name: str) -> str:
        """Return a field's text, or an empty text."""
        return next((text for key, text in self.fields if key == name), "")


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A wire, a bus or a bus entry between two points."""

    start: Point
    end: Point
    kind: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Label:
    """A label (``local``, ``global``, ``hierarchical``) or the pin of a sheet box (``sheet``)."""

    kind: str
    text: str
    at: Point
    box: int = -1
    shape: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetBox:
    """A sub-sheet as drawn on its parent."""

    uuid: str
    name: str
    file: str
    pins: tuple[Label, ...]
    fields: tuple[tuple[str, str], ...]
    fitted: bool
    on_board: bool
    pages: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SheetFile:
    """The contents of one sheet file."""

    path: Path
    version: int
    maker: str
    uuid: str
    library: dict[str, LibrarySymbol]
    symbols: tuple[SheetSymbol, ...]
    lines: tuple[Line, ...]
    labels: tuple[Label, ...]
    crosses: tuple[Point, ...]
    boxes: tuple[SheetBox, ...]
    aliases: dict[str, tuple[str, ...]]
    titles: dict[str, str]
    old_instances: dict[str, Instance] = field(default_factory=dict)
    old_pages: dict[str, str] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()


# --------------------------------------------------------------------------------------------------- from the file


def read_text(path: Path, shown: str) -> str:
    """Return the text of a regular UTF-8 file that does not change meanwhile."""
    try:
        before = os.stat(path)
        if not stat.S_ISREG(before.st_mode):
            raise InputError("is no file", remedy="name a sheet, a project file or a project folder", file=shown)
        if before.st_size > LARGEST_FILE_BYTES:
            most = LARGEST_FILE_BYTES // 1_000_000
            raise InputError(
                f"has {before.st_size // 1_000_000} MB, more than the {most} MB that are read",
                remedy="is it really a KiCad sheet?",
                file=shown,
            )
        data = path.read_bytes()
        after = os.stat(path)
    except OSError as error:
        raise InputError(f"cannot be read: {error.strerror or error}", remedy="check the path", file=shown) from None
    if (before.st_mtime_ns, before.st_size) != (after.st_mtime_ns, after.st_size) or len(data) != after.st_size:
        raise InputError("changed while it was being read", remedy="run the review again", file=shown)
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise InputError("is not UTF-8 text", remedy="save it with KiCad again", file=shown, line=line) from None


def read_sheet_file(path: Path, shown: str) -> SheetFile:
    """Read one ``.kicad_sch``.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        How messages name it.

    Returns
    -------
    SheetFile

    Raises
    ------
    InputError
        When it is no readable sheet.
    """
    text = read_text(path, shown)
    if not text.strip():
        raise InputError("is empty", remedy="save it with KiCad again", file=shown)
    head = text[:200].lstrip()
    if head.startswith("EESchema Schematic"):
        raise InputError(
            "is a sheet of KiCad 5 or older", remedy="open it with KiCad 6 or newer and save it", file=shown, line=1
        )
    if not head.startswith("(kicad_sch"):
        raise InputError("is no KiCad sheet", remedy="a sheet starts with (kicad_sch", file=shown, line=1)
    tree = _tree(text, shown)
    try:
        return _sheet(tree, path, shown)
    except (IndexError, TypeError, ValueError, AttributeError, ArithmeticError) as error:
        raise InputError(
            f"holds something that no KiCad sheet has ({error})", remedy="save it with KiCad again", file=shown
        ) from None


def _tree(text: str, shown: str) -> Tree:
    _check_brackets(text, shown)
    # kiutils takes the quote after an escaped backslash for an escaped quote; a stand-in that no sheet holds avoids it.
    stand_in = "\ue000" if "\\\\" in text else ""
    try:
        tree = parse_sexp(text.replace("\\\\", stand_in) if stand_in else text)
    except (AssertionError, IndexError, AttributeError, NotImplementedError):
        try:
            read_brackets(text, shown)  # knows the line
        except InputError as error:
            raise InputError(
                error.what, remedy="the file is truncated or damaged", file=shown, line=error.line
            ) from None
        raise InputError(
            "has brackets that do not match", remedy="the file is truncated or damaged", file=shown
        ) from None
    if not isinstance(tree, list) or not tree or tree[0] != "kicad_sch":
        raise InputError("is no KiCad sheet", remedy="a sheet starts with (kicad_sch", file=shown, line=1)
    return tree


def _check_brackets(text: str, shown: str) -> None:
    """Refuse text whose nesting no sheet has, before anything is built from it."""
    if "(" * DEEPEST_NESTING in text:
        line = text.count("\n", 0, text.index("(" * DEEPEST_NESTING)) + 1
        raise InputError("is nested too deep", remedy="is it really a KiCad sheet?", file=shown, line=line)


def _plain(value: Any) -> str:
    """Return a token as text, escapes resolved."""
    text = value if isinstance(value, str) else str(value)
    if "\\" in text:
        text = text.replace("\\n", "\n").replace("\\r", "\r").replace("\\t", "\t")
    return text.replace("\ue000", "\\") if "\ue000" in text else text


def _children(node: Tree, name: str) -> Iterator[Tree]:
    for item in node:
        if isinstance(item, list) and item and item[0] == name:
            yield item


def _child(node: Tree, name: str) -> Tree | None:
    return next(_children(node, name), None)


def _text(node: Tree, name: str, default: str = "") -> str:
    item = _child(node, name)
    return _plain(item[1]) if item is not None and len(item) > 1 and not isinstance(item[1], list) else default


def _flag(node: Tree, name: str, default: bool) -> bool:
    """Return a yes/no item: ``(name yes)``, ``(name)`` or the bare word ``name`` count as yes."""
    for item in node:
        if item == name:
            return True
        if isinstance(item, list) and item and item[0] == name:
            return len(item) < 2 or item[1] in ("yes", "true", 1)
    return default


def _steps(value: Any) -> int:
    return round(float(value) * STEPS_PER_MM)


def _point(node: Tree | None) -> Point:
    return (0, 0) if node is None else (_steps(node[1]), _steps(node[2]))


def _fields(node: Tree) -> tuple[tuple[str, str], ...]:
    found = []
    for item in _children(node, "property"):
        words = [word for word in item[1:] if not isinstance(word, list)]
        if words and words[0] == "private" and len(words) > 2:
            words = words[1:]
        if words:
            text = _plain(words[1]) if len(words) > 1 else ""
            found.append((_plain(words[0]), "" if text == "~" else text))  # a lone ~ has always meant "empty"
    return tuple(found)


def _library_pin(node: Tree) -> LibraryPin:
    number = _text(node, "number")
    return LibraryPin(
        number="" if number == "~" else number,
        name=_text(node, "name"),
        kind=str(node[1]),
        at=_point(_child(node, "at")),
        hidden=_flag(node, "hide", False),
        alternates=tuple((_plain(item[1]), str(item[2])) for item in _children(node, "alternate")),
    )


def _library_symbol(node: Tree) -> LibrarySymbol:
    power = _child(node, "power")
    pins: list[tuple[int, int, LibraryPin]] = []
    most = 1
    for body in _children(node, "symbol"):
        _, unit, style = _plain(body[1]).rsplit("_", 2)
        most = max(most, int(unit))
        pins.extend((int(unit), int(style), _library_pin(pin)) for pin in _children(body, "pin"))
    return LibrarySymbol(
        name=_plain(node[1]),
        parent=_text(node, "extends"),
        power="" if power is None else "local" if "local" in power[1:] else "global",
        pins=tuple(pins),
        fields=_fields(node),
        units=most,
    )


def _instance(node: Tree) -> Instance:
    value, footprint = _child(node, "value"), _child(node, "footprint")
    return Instance(
        reference=_text(node, "reference"),
        unit=int(_text(node, "unit", "1")),
        value=None if value is None else _plain(value[1]),
        footprint=None if footprint is None else _plain(footprint[1]),
    )


def _symbol(node: Tree) -> SheetSymbol:
    at = _child(node, "at")
    alternates = []
    for pin in _children(node, "pin"):
        chosen = _text(pin, "alternate")
        if chosen:
            alternates.append((_plain(pin[1]), chosen))
    instances: list[tuple[str, Instance]] = []
    for group in _children(node, "instances"):
        for project in _children(group, "project"):
            instances.extend((_plain(path[1]), _instance(path)) for path in _children(project, "path"))
    style = _text(node, "body_style") or _text(node, "convert") or "1"
    return SheetSymbol(
        uuid=_text(node, "uuid"),
        library_id=_text(node, "lib_id"),
        library_name=_text(node, "lib_name"),
        at=_point(at),
        angle=int(float(at[3])) % 360 if at is not None and len(at) > 3 else 0,
        mirror=_text(node, "mirror"),
        unit=int(_text(node, "unit", "1")),
        style=int(style) if style.isdigit() else 1,
        fields=_fields(node),
        on_board=_flag(node, "on_board", True),
        in_bom=_flag(node, "in_bom", True),
        fitted=not _flag(node, "dnp", False),
        alternates=tuple(alternates),
        instances=tuple(instances),
    )


def _box(node: Tree, index: int) -> SheetBox:
    fields = _fields(node)
    named = dict(fields)
    # Sheets that KiCad 6 wrote in another language name the two differently; they always come first.
    texts = [text for _, text in fields[:2]] + ["", ""]
    pages: list[tuple[str, str]] = []
    for group in _children(node, "instances"):
        for project in _children(group, "project"):
            pages.extend((_plain(path[1]), _text(path, "page")) for path in _children(project, "path"))
    return SheetBox(
        uuid=_text(node, "uuid"),
        name=named.get("Sheetname", named.get("Sheet name", texts[0])),
        file=named.get("Sheetfile", named.get("Sheet file", texts[1])),
        pins=tuple(
            Label(kind="sheet", text=_plain(pin[1]), at=_point(_child(pin, "at")), box=index, shape=str(pin[2]))
            for pin in _children(node, "pin")
        ),
        fields=fields,
        fitted=not _flag(node, "dnp", False),
        on_board=_flag(node, "on_board", True),
        pages=tuple(pages),
    )


def _lines(node: Tree) -> Iterator[Line]:
    points = [_point(item) for item in _children(_child(node, "pts") or [], "xy")]
    for start, end in pairwise(points):
        yield Line(start=start, end=end, kind=node[0])


def _entry(node: Tree) -> Line:
    start, size = _point(_child(node, "at")), _point(_child(node, "size"))
    return Line(start=start, end=(start[0] + size[0], start[1] + size[1]), kind="entry")


LABEL_KINDS = {"label": "local", "global_label": "global", "hierarchical_label": "hierarchical"}


def _sheet(tree: Tree, path: Path, shown: str) -> SheetFile:
    version = int(_text(tree, "version", "0"))
    if version < OLDEST_VERSION:
        raise InputError(
            f"has the file version {version}, older than KiCad 6",
            remedy="open it with KiCad 6 or newer and save it",
            file=shown,
        )
    remarks = []
    if version > NEWEST_VERSION:
        remarks.append(
            f"{shown}: file version {version} is newer than those known ({NEWEST_VERSION // 100}); read like KiCad 10"
        )
    library: dict[str, LibrarySymbol] = {}
    symbols: list[SheetSymbol] = []
    lines: list[Line] = []
    labels: list[Label] = []
    crosses: list[Point] = []
    boxes: list[SheetBox] = []
    aliases: dict[str, tuple[str, ...]] = {}
    titles: dict[str, str] = {}
    old: dict[str, Instance] = {}
    pages: dict[str, str] = {}

    def library_symbols(node: Tree) -> None:
        for item in _children(node, "symbol"):
            symbol = _library_symbol(item)
            library[symbol.name] = symbol

    def label(node: Tree) -> None:
        labels.append(Label(kind=LABEL_KINDS[node[0]], text=_plain(node[1]), at=_point(_child(node, "at"))))

    def alias(node: Tree) -> None:
        members = _child(node, "members") or []
        aliases[_plain(node[1])] = tuple(_plain(member) for member in members[1:])

    def title_block(node: Tree) -> None:
        for item in node[1:]:
            if item[0] == "comment":
                titles[f"COMMENT{item[1]}"] = _plain(item[2]) if len(item) > 2 else ""
            elif len(item) > 1:
                name = {"title": "TITLE", "date": "ISSUE_DATE", "rev": "REVISION", "company": "COMPANY"}.get(item[0])
                if name:
                    titles[name] = _plain(item[1])

    def old_instances(node: Tree) -> None:
        for item in _children(node, "path"):
            old[_plain(item[1])] = _instance(item)

    def old_pages(node: Tree) -> None:
        for item in _children(node, "path"):
            pages[_plain(item[1])] = _text(item, "page")

    handlers: dict[str, Callable[[Tree], object]] = {
        "lib_symbols": library_symbols,
        "symbol": lambda node: symbols.append(_symbol(node)),
        "wire": lambda node: lines.extend(_lines(node)),
        "bus": lambda node: lines.extend(_lines(node)),
        "bus_entry": lambda node: lines.append(_entry(node)),
        "label": label,
        "global_label": label,
        "hierarchical_label": label,
        "no_connect": lambda node: crosses.append(_point(_child(node, "at"))),
        "sheet": lambda node: boxes.append(_box(node, len(boxes))),
        "bus_alias": alias,
        "title_block": title_block,
        "symbol_instances": old_instances,
        "sheet_instances": old_pages,
    }
    for node in tree:
        if isinstance(node, list) and node:
            handler = handlers.get(node[0])
            if handler is not None:
                handler(node)
    return SheetFile(
        path=path,
        version=version,
        maker=f"{_text(tree, 'generator')} {_text(tree, 'generator_version')}".strip(),
        uuid=_text(tree, "uuid"),
        library=library,
        symbols=tuple(symbols),
        lines=tuple(lines),
        labels=tuple(labels),
        crosses=tuple(crosses),
        boxes=tuple(boxes),
        aliases=aliases,
        titles=titles,
        old_instances=old,
        old_pages=pages,
        remarks=tuple(remarks),
    )
