"""The command ``rails``: every supply of a board, what feeds it, and the reason to believe its voltage."""

from __future__ import annotations

import argparse
from pathlib import Path

from levelcrossing import tradebook
from levelcrossing.model import Rail, Rails
from levelcrossing.rails import trace_rails
from levelcrossing.read import read_board
from levelcrossing.reports.phrases import count, span
from levelcrossing.reports.sheet import Sheet
from levelcrossing.review import extra_rows
from levelcrossing.settings import load_settings


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Return the text of the command and its exit status."""
    board = read_board(args.path)
    settings = load_settings(args.path, args.settings)
    book = tradebook.load(extra=extra_rows([Path(file) for file in args.facts], settings))
    return rail_tree(board.path, trace_rails(board, book, settings)), 0


def rail_tree(path: str, rails: Rails, width: int = 100) -> str:
    """Return the supplies as a tree: each under what feeds it.

    Parameters
    ----------
    path : str
        The board, for the first line.
    rails : Rails
    width : int
        Columns.

    Returns
    -------
    str
        Text with a newline at the end.
    """
    sheet = Sheet(width=width)
    every = [rail for _, rail in sorted(rails.by_net.items())]
    supplies = [rail for rail in every if not rail.ground]
    grounds = [rail.net for rail in every if rail.ground]
    sheet.text(path)
    sheet.text(
        f"{count(len(supplies), 'supply', 'supplies')}, {len(rails.unknown)} without a voltage; ground: {', '.join(grounds) or 'none found'}"
    )
    children: dict[str, list[Rail]] = {}
    for rail in supplies:
        if rail.domain and rail.domain != rail.net:
            children.setdefault(rail.domain, []).append(rail)
    known = {rail.net for rail in supplies}
    roots = [rail for rail in supplies if rail.domain == rail.net or rail.domain not in known]
    for root in sorted(
        roots, key=lambda rail: (rail.volts is None, -(rail.volts.nominal if rail.volts else 0.0), rail.net)
    ):
        _rail(sheet, root, 0)
        for child in children.get(root.net, []):
            _rail(sheet, child, 4)
    if rails.unknown:
        sheet.blank()
        sheet.text("Without a voltage:")
        sheet.rows([(net, settle) for net, settle in rails.unknown])
    for remark in rails.remarks:
        sheet.blank()
        sheet.text(f"{remark.net}: {remark.text}" + (f" {remark.remedy}" if remark.remedy else ""))
    return sheet.plain()


def _rail(sheet: Sheet, rail: Rail, indent: int) -> None:
    sheet.blank()
    voltage = span(rail.volts) if rail.volts is not None else "unknown voltage"
    sheet.text(f"{rail.net}  {voltage}  ({rail.basis.value})", indent=indent)
    for number, evidence in enumerate(rail.evidence[:4]):
        sheet.text(evidence.text, indent=indent + 4, label=" " * indent + ("  = " if number == 0 else "  & "))
    if len(rail.evidence) > 4:
        sheet.text(f"and {count(len(rail.evidence) - 4, 'further reason')}", indent=indent + 4)
    if rail.disagreement:
        sheet.text(rail.disagreement, indent=indent + 4, label=" " * indent + "  ! ")
