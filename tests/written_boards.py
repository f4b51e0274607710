"""Boards written as files: a netlist or a sheet from a few lines of text, for tests that go the whole way.

One part a line, as in ``small_boards``: ``REFERENCE VALUE LIBRARY:SYMBOL | PIN NAME TYPE NET | ...``; ``-`` for none.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass

GRID_MM = 2.54

# A tide gauge: the sounder's echo leaves a gate on 5 V and enters a gate on 3.3 V.
HEADER = """
J1 Supply Connector:Conn_01x03 | 1 Pin_1 passive +5V | 2 Pin_2 passive +3V3 | 3 Pin_3 passive GND
U1 74HC1G04 74xGxx:74HC1G04 | 2 A input ECHO_IN | 3 GND power_in GND | 4 Y output ECHO_5V | 5 VCC power_in +5V
U2 74HC1G04 74xGxx:74HC1G04 | 2 A input ECHO_3V | 3 GND power_in GND | 4 Y output ECHO_OUT | 5 VCC power_in +3V3
R9 10k Device:R | 1 - passive ECHO_IN | 2 - passive GND
"""
SOUND = (
    HEADER
    + """
R1 10k Device:R | 1 - passive ECHO_5V | 2 - passive ECHO_3V
R2 18k Device:R | 1 - passive ECHO_3V | 2 - passive GND
"""
)
FAULTY = (
    HEADER
    + """
R1 10R Device:R | 1 - passive ECHO_5V | 2 - passive ECHO_3V
"""
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Written:
    """A part to be written: pins as (number, name, type, net)."""

    reference: str
    value: str
    symbol: str
    pins: tuple[tuple[str, str, str, str], ...]
    fields: tuple[tuple[str, str], ...] = ()


def parts_of(text: str) -> list[Written]:
    """Read the lines."""
    parts = []
    for line in text.strip().splitlines():
        if not line.strip() or line.startswith("#"):
            continue
        head, *pins = [piece.strip() for piece in line.split("|")]
        reference, value, symbol, *more = head.split()
        split = [pin.split(maxsplit=3) for pin in pins]
        parts.append(
            Written(
                reference=reference,
                value=value,
                symbol=symbol,
                pins=tuple((number, "" if name == "-" else name, kind, net) for number, name, kind, net in split),
                fields=tuple((name.replace("_", " "), text) for name, _, text in (one.partition("=") for one in more)),
            )
        )
    return parts


def renamed(text: str, references: Mapping[str, str], nets: Mapping[str, str]) -> str:
    """Return a board with other references and net names, in another order."""
    lines = []
    for part in parts_of(text):
        pins = [f"{number} {name or '-'} {kind} {nets.get(net, net)}" for number, name, kind, net in part.pins]
        reference = references.get(part.reference, part.reference)
        lines.append(" | ".join([f"{reference} {part.value} {part.symbol}", *pins]))
    return "\n".join(reversed(lines))


def netlist(text: str) -> str:
    """Write a netlist in brackets, of the form that KiCad 6 and later export."""
    parts = parts_of(text)
    lines = ['(export (version "E")', '  (design (source "gauge.kicad_sch") (tool "Eeschema 9.0.2"))', "  (components"]
    for part in parts:
        library, _, symbol = part.symbol.partition(":")
        fields = "".join(f' (field (name "{name}") "{value}")' for name, value in part.fields)
        lines += [
            f'    (comp (ref "{part.reference}")',
            f'      (value "{part.value}")',
            f"      (fields{fields})" if fields else "      (fields)",
            f'      (libsource (lib "{library}") (part "{symbol}") (description ""))',
            '      (sheetpath (names "/") (tstamps "/")))',
        ]
    lines += ["  )", "  (nets"]
    nets: dict[str, list[str]] = {}
    for part in parts:
        for number, name, kind, net in part.pins:
            function = f' (pinfunction "{name}")' if name else ""
            node = f'(node (ref "{part.reference}") (pin "{number}"){function} (pintype "{kind}"))'
            nets.setdefault(net, []).append(node)
    for code, (net, nodes) in enumerate(sorted(nets.items()), 1):
        lines.append(f'    (net (code "{code}") (name "{net}")')
        lines += [f"      {node}" for node in nodes]
        lines.append("    )")
    return "\n".join([*lines, "  ))", ""])


def sheet(text: str, *, children: Iterable[str] = (), number: int = 1, parent: str = "", name: str = "gauge") -> str:
    """Write a sheet: parts in a row, a global label on each pin, sub-sheets without pins.

    ``number`` makes the identifiers of a sheet; ``parent`` is the path on which a sub-sheet stands.
    """
    own = f"00000000-0000-4000-8{number:03d}-000000000000"
    path = parent or f"/{own}"
    lines = [
        "(kicad_sch",
        "  (version 20250114)",
        '  (generator "eeschema")',
        '  (generator_version "9.0")',
        f'  (uuid "{own}")',
        '  (paper "A3")',
        "  (lib_symbols",
    ]
    parts = parts_of(text)
    for index, part in enumerate(parts):
        lines += _library(part, index)
    lines.append("  )")
    for index, part in enumerate(parts):
        lines += _placed(part, index, number, path, name)
    for index, child in enumerate(children, 1):
        box = f"00000000-0000-4000-8{number:03d}-{900 + index:012d}"
        lines += [
            f"  (sheet (at {10 + 30 * index} 200) (size 20 20)",
            f'    (uuid "{box}")',
            f'    (property "Sheetname" "part {index}" (at 0 0 0))',
            f'    (property "Sheetfile" "{child}" (at 0 0 0))',
            f'    (instances (project "{name}" (path "{path}" (page "{index + 1}")))))',
        ]
    if not parent:
        lines.append('  (sheet_instances (path "/" (page "1")))')
    return "\n".join([*lines, ")", ""])


def box_path(number: int = 1, index: int = 1) -> str:
    """Return the path of a sub-sheet on the root sheet of a number."""
    head = f"00000000-0000-4000-8{number:03d}"
    return f"/{head}-000000000000/{head}-{900 + index:012d}"


def _library(part: Written, index: int) -> Iterator[str]:
    name = f"written:S{index}"
    yield f'    (symbol "{name}" (exclude_from_sim no) (in_bom yes) (on_board yes)'
    for key, value in (
        ("Reference", part.reference.rstrip("0123456789")),
        ("Value", "x"),
        ("Footprint", ""),
        ("Datasheet", ""),
    ):
        yield f'      (property "{key}" "{value}" (at 0 0 0))'
    yield f'      (symbol "S{index}_1_1"'
    for row, (number, pin_name, kind, _) in enumerate(part.pins):
        yield f"        (pin {kind} line (at 0 {-row * GRID_MM:g} 0) (length 0)"
        yield f'          (name "{pin_name or "~"}") (number "{number}"))'
    yield "      ))"


def _placed(part: Written, index: int, number: int, path: str, project: str) -> Iterator[str]:
    x, y = 10 * GRID_MM * (index + 1), 10 * GRID_MM
    yield f'  (symbol (lib_id "written:S{index}") (at {x:g} {y:g} 0) (unit 1)'
    yield "    (exclude_from_sim no) (in_bom yes) (on_board yes) (dnp no)"
    yield f'    (uuid "00000000-0000-4000-8{number:03d}-{index + 1:012d}")'
    pairs = (("Reference", part.reference), ("Value", part.value), ("Footprint", ""), ("Datasheet", ""), *part.fields)
    for key, value in pairs:
        yield f'    (property "{key}" "{value}" (at {x:g} {y:g} 0))'
    yield f'    (instances (project "{project}" (path "{path}" (reference "{part.reference}") (unit 1)))))'
    for row, (_, _, _, net) in enumerate(part.pins):
        mark = f"00000000-0000-4000-8{number:03d}-{1000 * (index + 1) + row:012d}"
        yield f'  (global_label "{net}" (shape input) (at {x:g} {y + row * GRID_MM:g} 0)'
        yield f'    (effects (font (size 1.27 1.27))) (uuid "{mark}"))'
