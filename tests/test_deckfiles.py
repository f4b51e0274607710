"""The decks that ``review --decks`` writes, run by a circuit simulator."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path

import pytest

from levelcrossing import tradebook
from levelcrossing.cli import main
from levelcrossing.model import Settings
from levelcrossing.read import read_board
from levelcrossing.review import open_case

BOARD = Path(__file__).parent.parent / "sample_boards" / "tide_gauge_faulty" / "tide_gauge_faulty.net"


def test_every_deck_gives_the_receiver_s_voltage_within_a_tenth_of_a_millivolt(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """ngspice (Debian package), on the circuits of a whole board, one deck per crossing and state."""
    main(["review", str(BOARD), "--decks", str(tmp_path), "--stop-at", "never"])
    capsys.readouterr()
    case = open_case(read_board(str(BOARD)), Settings(), tradebook.load())
    decks = sorted(tmp_path.glob("*.cir"))
    compared = 0
    for index, solved in enumerate(case.crossings):
        for name, state in solved.states.items():
            deck = next(
                (path for path in decks if path.name.startswith(f"{index:03d}_") and path.stem.endswith(f"_{name}")),
                None,
            )
            if deck is None or not state.solved or state.floating:
                continue
            text = deck.read_text(encoding="utf-8")
            node = re.search(rf"^\*\s+(\S+)\s+{re.escape(solved.crossing.receiver.net)}$", text, re.MULTILINE)
            assert node is not None
            asked = text.replace("\n.end\n", f"\n.control\nop\nprint v({node.group(1)})\n.endc\n.end\n")
            path = tmp_path / f"ask_{deck.name}"
            path.write_text(asked, encoding="utf-8")
            out = subprocess.run(
                ["ngspice", "-b", str(path)], capture_output=True, text=True, timeout=60, check=False
            ).stdout
            found = re.search(r"v\([^)]*\) = ([-\d.e+]+)", out)
            assert found is not None, out
            assert float(found.group(1)) == pytest.approx(state.receiver_volts.nominal, abs=1e-4), deck.name
            compared += 1
    assert compared >= 25
