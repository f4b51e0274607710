"""Condenses netlists that KiCad exported into facts to compare with: ``condense.py FOLDER NETLISTS FACTS.json.gz``.

FOLDER holds projects (``*.kicad_pro``), NETLISTS one exported ``STEM.net`` for each of them, as
``kicad-cli sch export netlist`` writes it.
"""

from __future__ import annotations

import gzip
import json
import sys
from pathlib import Path
from typing import Any

from levelcrossing.model import Board
from levelcrossing.read.netlist import read_netlist


def facts_of(board: Board) -> dict[str, Any]:
    """Return what a board says, but for its path and makers.

    Fields for simulation are left out: KiCad 9 rewrites those of KiCad 6 when it opens a sheet.
    """
    return {
        "nets": {net.name: [list(pin) for pin in net.pins] for net in board.nets},
        "parts": {
            part.reference: {
                "value": part.value,
                "footprint": part.footprint,
                "symbol": f"{part.library}:{part.symbol}",
                "description": part.description,
                "keywords": part.keywords,
                "fields": [list(item) for item in part.fields if not item[0].startswith("Sim.")],
                "fitted": part.fitted,
                "sheet": part.sheet,
                "uuids": list(part.uuids),
                "pins": [[pin.number, pin.name, pin.kind, pin.net, pin.unused] for pin in part.pins],
            }
            for part in board.parts
        },
        "sheets": list(board.sheet_files),
    }


def main(folder: Path, netlists: Path, out: Path) -> None:
    """Write the facts of all projects of a folder."""
    facts = {}
    for project in sorted(folder.rglob("*.kicad_pro")):
        netlist = netlists / f"{project.stem}.net"
        if netlist.is_file():
            root = project.with_suffix(".kicad_sch").relative_to(folder).as_posix()
            facts[root] = facts_of(read_netlist(netlist))
    text = json.dumps(facts, ensure_ascii=False, separators=(",", ":"), sort_keys=True)
    out.write_bytes(gzip.compress(text.encode(), mtime=0))


if __name__ == "__main__":
    main(*(Path(word) for word in sys.argv[1:4]))
