"""Small boards from a few lines of text, for tests.

One part a line: ``REFERENCE VALUE LIBRARY:SYMBOL | PIN NAME TYPE NET | ...``; a pin's name or type may be ``-``::

    R1 10k Device:R | 1 - passive +5V | 2 - passive /SDA
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import replace

from levelcrossing import tradebook
from levelcrossing.model import Board, CaseFile, Finding, Net, Part, Pin, Settings
from levelcrossing.review import open_case
from levelcrossing.rulebook import load_rules, run_rules

BOOK = tradebook.load()
RULES = load_rules()


def board_of(text: str) -> Board:
    """Build a board from lines of text."""
    parts: list[Part] = []
    nets: dict[str, list[tuple[str, str]]] = defaultdict(list)
    for line in text.strip().splitlines():
        line = line.strip()
        if not line or line.startswith("#"):
            continue
        head, *pin_texts = [piece.strip() for piece in line.split("|")]
        reference, value, symbol, *fields = head.split()
        library, _, name = symbol.partition(":")
        pins = []
        for pin_text in pin_texts:
            number, pin_name, kind, *net = pin_text.split()
            net_name = " ".join(net)
            pins.append(
                Pin(
                    part=reference,
                    number=number,
                    name="" if pin_name == "-" else pin_name,
                    kind="" if kind == "-" else kind,
                    net=net_name,
                )
            )
            if net_name:
                nets[net_name].append((reference, number))
        pairs = tuple((field.split("=", 1)[0], field.split("=", 1)[1]) for field in fields if "=" in field)
        part = Part(reference=reference, value=value, library=library, symbol=name, fields=pairs, pins=tuple(pins))
        parts.append(replace(part, fitted="DNP" not in fields))
    return Board(
        path="small.net",
        form="netlist",
        parts=tuple(sorted(parts, key=lambda part: part.reference)),
        nets=tuple(Net(name=net, pins=tuple(sorted(pins))) for net, pins in sorted(nets.items())),
    )


def case_of(text: str, settings: Settings | None = None) -> CaseFile:
    """Trace, model and solve a small board."""
    return open_case(board_of(text), settings or Settings(), BOOK)


def findings_of(text: str, settings: Settings | None = None) -> tuple[Finding, ...]:
    """Run all rules on a small board."""
    return run_rules(RULES, case_of(text, settings))


def named(findings: tuple[Finding, ...], rule: str) -> list[Finding]:
    """Return the findings of one rule."""
    return [finding for finding in findings if finding.rule == rule]
