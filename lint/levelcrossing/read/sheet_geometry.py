"""What touches what on one sheet: wires, buses, pins and labels gathered into groups.

The rules are those that exported netlists show:

- ends of wires and buses, pins, labels and no-connect marks connect where their points coincide;
- a label or the pin of a sheet box also connects in the middle of a wire or bus (the first of several), unless
  another label, a pin or a no-connect mark stands at the same point; a pin of a symbol does not;
- a junction dot does nothing by itself: KiCad has split the wires under it when it wrote the file;
- crossing or overlapping wires connect nothing;
- a bus entry is a wire, but does not connect at an end that lies on a bus;
- a pin of type ``no_connect`` connects to nothing.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field

from levelcrossing.read.sheet_files import Label, LibraryPin, Line, Point, SheetFile, SheetSymbol


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedPin:
    """A pin on a sheet.

    ``symbol`` is the index of its symbol in the file; ``name`` and ``kind`` are those of the chosen alternate. KiCad
    names nets and exports types as the library draws the pin: ``drawn_name``, ``drawn_kind``.
    """

    symbol: int
    number: str
    name: str
    drawn_name: str
    drawn_kind: str
    kind: str
    hidden: bool
    at: Point


@dataclass(slots=True, kw_only=True)
class Group:
    """Things of one sheet that touch."""

    pins: list[PlacedPin] = field(default_factory=list)
    labels: list[Label] = field(default_factory=list)
    on_bus: bool = False
    on_wire: bool = False
    crossed: bool = False


class Union:
    """Disjoint sets of the numbers 0, 1, 2 ..."""

    __slots__ = ("parents",)

    def __init__(self, size: int = 0) -> None:
        self.parents = list(range(size))

    def add(self) -> int:
        """Add a set of one and return its number."""
        self.parents.append(len(self.parents))
        return len(self.parents) - 1

    def find(self, item: int) -> int:
        """Return the number that stands for the set of ``item``."""
        parents = self.parents
        while parents[item] != item:
            parents[item] = parents[parents[item]]
            item = parents[item]
        return item

    def join(self, one: int, other: int) -> None:
        """Make one set of two; the lower number stands for it."""
        one, other = self.find(one), self.find(other)
        if one != other:
            self.parents[max(one, other)] = min(one, other)


def turned(symbol: SheetSymbol, at: Point) -> Point:
    """Return where a point of the library drawing (y upwards) lands on the sheet (y downwards)."""
    x, y = at[0], -at[1]
    for _ in range(symbol.angle // 90):
        x, y = y, -x
    if symbol.mirror == "x":
        y = -y
    elif symbol.mirror == "y":
        x = -x
    return symbol.at[0] + x, symbol.at[1] + y


def placed_pin(index: int, symbol: SheetSymbol, pin: LibraryPin, chosen: dict[str, str]) -> PlacedPin:
    """Return a library pin as it stands on the sheet, the chosen alternate applied."""
    name, kind = pin.name, pin.kind
    alternate = chosen.get(pin.number)
    if alternate is not None:
        for other, other_kind in pin.alternates:
            if other == alternate:
                name, kind = other, other_kind
    return PlacedPin(
        symbol=index,
        number=pin.number,
        name="" if name == "~" else name,
        drawn_name="" if pin.name == "~" else pin.name,
        drawn_kind=pin.kind,
        kind=kind,
        hidden=pin.hidden,
        at=turned(symbol, pin.at),
    )


class _Segments:
    """Finds the line on whose inside a point lies."""

    def __init__(self, lines: Iterable[tuple[int, Line]]) -> None:
        self.level: dict[int, list[tuple[int, int, int]]] = defaultdict(list)
        self.upright: dict[int, list[tuple[int, int, int]]] = defaultdict(list)
        self.slanted: list[tuple[int, Line]] = []
        for index, line in lines:
            (x0, y0), (x1, y1) = line.start, line.end
            if y0 == y1:
                self.level[y0].append((min(x0, x1), max(x0, x1), index))
            elif x0 == x1:
                self.upright[x0].append((min(y0, y1), max(y0, y1), index))
            else:
                self.slanted.append((index, line))

    def holding(self, point: Point) -> list[int]:
        """Return the lines that pass through a point or end there, in file order."""
        x, y = point
        found = [index for low, high, index in self.level.get(y, ()) if low <= x <= high]
        found += [index for low, high, index in self.upright.get(x, ()) if low <= y <= high]
        for index, line in self.slanted:
            (x0, y0), (x1, y1) = line.start, line.end
            if (
                min(x0, x1) <= x <= max(x0, x1)
                and min(y0, y1) <= y <= max(y0, y1)
                and (x - x0) * (y1 - y0) == (y - y0) * (x1 - x0)
            ):
                found.append(index)
        return sorted(found)


def touching(sheet: SheetFile, pins: list[PlacedPin]) -> list[Group]:
    """Gather what touches on a sheet.

    Parameters
    ----------
    sheet : SheetFile
    pins : list of PlacedPin

    Returns
    -------
    list of Group
        Groups that hold a pin or a label.
    """
    lines = sheet.lines
    labels = [*sheet.labels, *(pin for box in sheet.boxes for pin in box.pins)]
    union = Union(len(lines) + len(labels) + len(pins))
    buses = _Segments((i, line) for i, line in enumerate(lines) if line.kind == "bus")
    at: dict[Point, int] = {}

    def put(item: int, point: Point) -> None:
        known = at.setdefault(point, item)
        if known != item:
            union.join(known, item)

    for index, line in enumerate(lines):
        for point in (line.start, line.end):
            if line.kind != "entry" or not buses.holding(point):
                put(index, point)
    segments = _Segments(enumerate(lines))
    first_label = len(lines)
    crowd = Counter(label.at for label in labels) + Counter(pin.at for pin in pins) + Counter(sheet.crosses)
    for index, label in enumerate(labels, first_label):
        if crowd[label.at] == 1:
            for line_index in segments.holding(label.at)[:1]:
                union.join(line_index, index)
        put(index, label.at)
    first_pin = first_label + len(labels)
    for index, pin in enumerate(pins, first_pin):
        if pin.kind != "no_connect":
            put(index, pin.at)

    groups: dict[int, Group] = {}

    def group(item: int) -> Group:
        root = union.find(item)
        found = groups.get(root)
        if found is None:
            found = groups[root] = Group()
        return found

    for index, label in enumerate(labels, first_label):
        group(index).labels.append(label)
    for index, pin in enumerate(pins, first_pin):
        group(index).pins.append(pin)
    for index, line in enumerate(lines):
        known = groups.get(union.find(index))
        if known is not None:
            known.on_bus = known.on_bus or line.kind == "bus"
            known.on_wire = known.on_wire or line.kind != "bus"
    for point in sheet.crosses:
        if point in at:
            known = groups.get(union.find(at[point]))
            if known is not None:
                known.crossed = True
    return list(groups.values())
