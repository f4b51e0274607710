"""Compares the time per solution with that of ngspice on the same circuits, side by side in one run.

    python tests/benchmarks/solver_speed.py [--batch 256]

For each cell, a batch of members drawn from the spread of its parts:

* ``ours``: one batch, time divided by its members; for the transient, a rise and a fall count as one;
* ``process``: ngspice started once per deck, as a script would do it;
* ``loop``: one ngspice process that reads deck after deck;
* ``internal``: the bare analysis, repeated within one process, reading and starting not counted.

ngspice runs with its default tolerances here, which is to its advantage: ours are tighter.
"""

from __future__ import annotations

import argparse
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

ROOT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(ROOT / "lint"), str(ROOT / "tests")]

from cells import MAKERS, Cell, all_cells  # noqa: E402  (the paths above make it importable)

from levelcrossing.decks import Step, deck  # noqa: E402
from levelcrossing.network import Network, stack  # noqa: E402
from levelcrossing.solve import solve_dc  # noqa: E402
from levelcrossing.transient import step_response  # noqa: E402

CHOSEN = [
    "divider",
    "divider into clamped input",
    "zener 3v3 clamp",
    "bipolar cell upwards",
    "inverting npn stage",
    "two inverting npn stages",
    "mosfet cell upwards",
    "mosfet cell reversed",
    "pmos load switch",
    "bus switch with pull up",
]


def drawn(cell: Cell, batch: int) -> Network:
    """Return a batch drawn from the spread of the cell's parts."""
    rng = np.random.default_rng(1)
    resistors, rails, devices = rng.uniform(-1, 1, (3, batch))
    branches, fixed, *_ = MAKERS[cell.name](1 + 0.05 * resistors, 1 + 0.05 * rails, devices)
    return Network(branches=tuple(branches), fixed=fixed)


def best_of(action, times: int = 5) -> float:
    spent = []
    for _ in range(times):
        begun = time.perf_counter()
        action()
        spent.append(time.perf_counter() - begun)
    return min(spent)


def ngspice(folder: Path, name: str) -> None:
    subprocess.run(["ngspice", "-b", "-n", name], cwd=folder, capture_output=True, check=True, timeout=120)


def simulator_seconds(texts: list[str], analysis: str, repeats: int) -> tuple[float, float, float]:
    """Return seconds per deck as process, in a loop and as bare analysis."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for number, text in enumerate(texts):
            (folder / f"d{number}.cir").write_text(text)
            (folder / f"p{number}.cir").write_text(text)
        process = best_of(lambda: [ngspice(folder, f"p{k}.cir") for k in range(4)], 3) / 4
        loop = ["* loop", ".control"]
        for number in range(len(texts)):
            loop += [f"source d{number}.cir", analysis, f"write o{number}.raw", "destroy all", "remcirc"]
        (folder / "loop.cir").write_text("\n".join([*loop, "quit", ".endc", ".end", ""]))
        whole = best_of(lambda: ngspice(folder, "loop.cir"), 3)
        seconds = []
        for count in (1, repeats):
            lines = ["* bare", ".control", "source d0.cir", f"repeat {count}", analysis, "destroy all", "end"]
            (folder / "bare.cir").write_text("\n".join([*lines, "quit", ".endc", ".end", ""]))
            seconds.append(best_of(lambda: ngspice(folder, "bare.cir"), 3))
        bare = (seconds[1] - seconds[0]) / (repeats - 1)
        return process, whole / len(texts), bare


def relaxed(text: str) -> str:
    """Return the deck with the simulator's default tolerances."""
    lines = [line for line in text.splitlines() if not line.startswith(".options")]
    return "\n".join([lines[0], ".options temp=27 tnom=27", *lines[1:], ""])


def row(name: str, ours: float, others: tuple[float, float, float]) -> tuple[float, ...]:
    ratios = tuple(other / ours for other in others)
    print(
        f"{name:30s} {ours * 1e6:9.1f} us"
        + "".join(f"{other * 1e6:11.0f} us {ratio:7.1f}x" for other, ratio in zip(others, ratios, strict=True))
    )
    return ratios


def summary(ratios: list[tuple[float, ...]]) -> None:
    middle = np.median(np.array(ratios), axis=0)
    least = np.min(np.array(ratios), axis=0)
    for k, name in enumerate(("process", "loop", "internal")):
        print(f"    faster than {name:9s} {middle[k]:8.1f} times in the median, {least[k]:8.1f} at least")


def main() -> None:
    arguments = argparse.ArgumentParser()
    arguments.add_argument("--batch", type=int, default=256)
    batch = arguments.parse_args().batch
    cells = [cell for cell in all_cells() if cell.name in CHOSEN]
    header = f"{'':30s} {'ours':>12s}" + "".join(f"{name:>23s}" for name in ("process", "loop", "internal"))
    print(f"operating point, batch of {batch}\n{header}")
    ratios = []
    for cell in cells:
        network = drawn(cell, batch).holding({cell.drive: np.where(np.arange(batch) % 2, cell.high, cell.low)})
        ours = best_of(lambda n=network: solve_dc(n)) / batch
        texts = [relaxed(deck(network, cell.name, member=k)) for k in range(40)]
        ratios.append(row(cell.name, ours, simulator_seconds(texts, "op", 400)))
    summary(ratios)
    print(f"\nrise and fall, batch of {batch}\n{header}")
    ratios = []
    for cell in cells:
        network = drawn(cell, batch)
        both = stack([network, network])
        before = np.repeat([cell.low, cell.high], batch)
        after = np.repeat([cell.high, cell.low], batch)

        def run(n=both, c=cell, b=before, a=after):
            return step_response(n, {c.drive: b}, {c.drive: a}, [c.out])

        ours = best_of(run, 3) / batch
        until = np.array(run().waves.times[-1])
        texts, least = [], []
        for k in (*range(10), *range(batch, batch + 10)):
            step = Step(before={cell.drive: before[k]}, after={cell.drive: after[k]}, until_s=float(until[k]))
            texts.append(relaxed(deck(both, cell.name, member=k, step=step, watch=[cell.out])))
            least.append(float(until[k]))
        # Two runs make a rise and a fall; each as long as ours took to settle.
        up = simulator_seconds(texts[:10], f"tran {least[0] / 50:g} {least[0]:g}", 30)
        down = simulator_seconds(texts[10:], f"tran {least[10] / 50:g} {least[10]:g}", 30)
        ratios.append(row(cell.name, ours, tuple(x + y for x, y in zip(up, down, strict=True))))
    summary(ratios)
    alone = drawn(cells[3], 1)
    one = best_of(lambda: solve_dc(alone))
    response = best_of(lambda: step_response(alone, {"drv": 0.0}, {"drv": 3.3}, [cells[3].out]), 3)
    print(f"\n{cells[3].name} alone: {one * 1e3:.1f} ms for an operating point, {response * 1e3:.0f} ms for a rise")


if __name__ == "__main__":
    main()
