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

BOARDS = Path(__file__).parent.parent / "sample_boards"
BOARD = BOARDS / "tide_gauge_faulty" / "tide_gauge_faulty.net"


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


def test_the_edges_in_the_decks_are_those_of_the_review(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """ngspice (Debian package): edges and delays of three boards; 1 % at the 95th percentile, 5 % at worst."""
    errors: list[float] = []
    for name in ("tide_gauge", "tide_gauge_faulty", "kiln_logger"):
        board = BOARDS / name / f"{name}.net"
        folder = tmp_path / name
        main(["review", str(board), "--decks", str(folder), "--stop-at", "never"])
        capsys.readouterr()
        case = open_case(read_board(str(board)), Settings(), tradebook.load())
        for index, solved in enumerate(case.crossings):
            (deck,) = list(folder.glob(f"{index:03d}_*_edges.cir")) or [None]
            assert (deck is None) is (solved.speed is None)
            if deck is None or solved.speed is None:
                continue
            out = subprocess.run(
                ["ngspice", "-b", str(deck)], capture_output=True, text=True, timeout=120, check=False
            ).stdout
            measured = {
                name: float(value) for name, value in re.findall(r"^(\w+)\s+=\s+([-\d.e+]+)", out, re.MULTILINE)
            }
            speed = solved.speed
            for key, ours in (
                ("rise", speed.rise_s),
                ("fall", speed.fall_s),
                ("delay_vih", speed.delay_high_s),
                ("delay_vil", speed.delay_low_s),
            ):
                errors.append(abs(measured[key] / ours.nominal - 1))
    assert len(errors) >= 60
    errors.sort()
    assert errors[int(0.95 * len(errors))] < 0.01
    assert errors[-1] < 0.05
