"""Says what a review spends its time on: the share of solving, of trade data and of the rest, board by board.

    python tests/benchmarks/review_share.py [BOARD ...]

Without arguments the sample boards. Shares of one run in one process; the machine's noise cancels.
"""

from __future__ import annotations

import sys
import time
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "lint"))

from levelcrossing import offstates, remedies, review, rulebook, solutions, speeds, tradebook  # noqa: E402

SPENT: Counter[str] = Counter()
# What counts under which head; each function is called from the pipeline only, none from another of these.
TIMED = (
    ("levels", solutions, "solve_crossings"),
    ("speed", speeds, "with_speeds"),
    ("power-down", offstates, "power_down"),
    ("proposals", remedies, "propose"),
    ("trade data", tradebook, "load"),
    ("reading", review, "read_board"),
    ("rules", rulebook, "run_rules"),
)


def timed(head: str, action: Callable[..., Any]) -> Callable[..., Any]:
    """Return the action with its time added to a head."""

    def run(*args: Any, **named: Any) -> Any:
        start = time.perf_counter()
        try:
            return action(*args, **named)
        finally:
            SPENT[head] += time.perf_counter() - start

    return run


def main(paths: list[str]) -> None:
    for head, module, name in TIMED:
        setattr(module, name, timed(head, getattr(module, name)))
    heads = [head for head, *_ in TIMED]
    print(f"{'board':<28}{'s':>7}" + "".join(f"{head:>12}" for head in heads) + f"{'the rest':>12}{'solving':>10}")
    for path in paths or sorted(str(path) for path in (ROOT / "sample_boards").glob("*/*.net")):
        SPENT.clear()
        start = time.perf_counter()
        review.review(path)
        total = time.perf_counter() - start
        shares = {head: SPENT[head] / total for head in heads}
        solving = sum(shares[head] for head in ("levels", "speed", "power-down", "proposals"))
        row = f"{Path(path).stem[:27]:<28}{total:>7.2f}" + "".join(f"{shares[head]:>12.1%}" for head in heads)
        print(row + f"{1 - sum(shares.values()):>12.1%}{solving:>10.1%}")


if __name__ == "__main__":
    main(sys.argv[1:])
