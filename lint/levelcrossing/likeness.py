"""Whether two circuits are the same one under other names.

A circuit is seen as a graph: parts with their values, nets without their names, and the pins as the lines between them.
Each node's label is refined round by round with the labels of its neighbours (colour refinement, Weisfeiler and Leman
1968), so that after a few rounds a label tells what a node is and what it is connected to. Names of nets and numbers of
references never enter: renumbering changes no label, any change of the circuit changes those around it.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Hashable, Iterable, Mapping, Sequence
from typing import TypeVar

from levelcrossing.model import Board, Part
from levelcrossing.units import parse_capacitance, parse_inductance, parse_resistance

Node = TypeVar("Node", bound=Hashable)

_SYMMETRIC = ("R", "C", "L", "FB", "F", "JP", "NT")
"""Reference letters of two-pin parts that may be turned round without changing the circuit."""

_LETTERS = re.compile(r"#?[^\W\d_]*")


def digest(*things: object) -> str:
    """Return a short hash of texts, numbers and tuples of them."""
    return hashlib.sha256(repr(things).encode("utf-8", "backslashreplace")).hexdigest()[:16]


def letters_of(reference: str) -> str:
    """Return the letters a reference begins with: ``R`` of ``R12``."""
    match = _LETTERS.match(reference)
    return match[0] if match else ""


def plain_value(part: Part) -> str:
    """Return a part's value in one spelling: ``4k7``, ``4.7k`` and ``4.7 kOhm`` of a resistor are the same."""
    readers = {"R": parse_resistance, "RN": parse_resistance, "C": parse_capacitance, "L": parse_inductance}
    reader = readers.get(letters_of(part.reference))
    number = reader(part.value) if reader else None
    return "".join(part.value.split()).casefold() if number is None else f"{number:.6g}"


def part_label(part: Part) -> str:
    """Return what a part is, without its number: letters, value and order number."""
    order_number = part.field("MPN", "Manufacturer Part Number").casefold()
    return digest(letters_of(part.reference), plain_value(part), order_number)


def pin_label(part: Part, number: str) -> str:
    """Return the name of a pin as a line of the graph; a resistor's ends are alike."""
    alike = len(part.pins) <= 2 and letters_of(part.reference) in _SYMMETRIC
    return "" if alike else number


def refined(
    labels: Mapping[Node, str], lines: Mapping[Node, Sequence[tuple[str, Node]]], rounds: int
) -> list[Mapping[Node, str]]:
    """Refine labels with those of the neighbours.

    Parameters
    ----------
    labels : mapping
        Label of each node at the start.
    lines : mapping
        For each node its lines as (label of the line, neighbour).
    rounds : int

    Returns
    -------
    list of mapping
        The labels at the start and after each round; ``rounds + 1`` of them.
    """
    history = [labels]
    for _ in range(rounds):
        now = history[-1]
        history.append(
            {
                node: digest(label, sorted((line, now[other]) for line, other in lines.get(node, ())))
                for node, label in now.items()
            }
        )
    return history


def board_labels(board: Board, rounds: int = 4) -> list[Mapping[tuple[str, str], str]]:
    """Return labels of all parts (``("part", reference)``), fitted or not, and nets (``("net", name)``) by round."""
    return graph_labels(board.parts, {net.name: "net" for net in board.nets}, rounds)


def graph_labels(
    parts: Iterable[Part], nets: Mapping[str, str], rounds: int, marks: Mapping[str, str] | None = None
) -> list[Mapping[tuple[str, str], str]]:
    """Return labels of some parts and nets, round by round.

    Parameters
    ----------
    parts : iterable of Part
    nets : mapping
        Names of the nets taken part, each with its label at the start; pins on other nets are left out.
    rounds : int
    marks : mapping, optional
        Text to tell parts apart beyond their values, by reference.
    """
    labels: dict[tuple[str, str], str] = {("net", name): label for name, label in nets.items()}
    lines: dict[tuple[str, str], list[tuple[str, tuple[str, str]]]] = {}
    for part in parts:
        node = ("part", part.reference)
        labels[node] = digest(part_label(part), (marks or {}).get(part.reference, ""))
        for pin in part.pins:
            if pin.net in nets:
                line = pin_label(part, pin.number)
                lines.setdefault(node, []).append((line, ("net", pin.net)))
                lines.setdefault(("net", pin.net), []).append((line, node))
    return refined(labels, lines, rounds)
