from __future__ import annotations

import argparse
import re

import pytest

from levelcrossing import tradebook
from levelcrossing.errors import CommandError
from levelcrossing.model import Spread
from levelcrossing.sizing import candidates, propose, run, solve

BOOK = tradebook.load()
FIVE, THREE = Spread.around(5.0, 0.05), Spread.around(3.3, 0.05)


def by_name(source: Spread, target: Spread) -> dict[str, object]:
    return {candidate.name: candidate for candidate in reversed(candidates(source, target))}


def test_down_and_up_ask_for_different_parts() -> None:
    assert {"resistor divider", "tolerant buffer", "MOSFET pair", "bipolar cell"} <= set(by_name(FIVE, THREE))
    up = set(by_name(THREE, FIVE))
    assert "TTL-level buffer" in up and "resistor divider" not in up


def test_the_divider_s_level_is_the_ratio_of_its_values() -> None:
    """Closed form: V x R2 / (R1 + R2 + output)."""
    candidate = by_name(FIVE, THREE)["resistor divider"]
    solved = solve(candidate, FIVE, THREE, 20e-12, BOOK)  # type: ignore[arg-type]
    assert solved is not None and solved.high is not None
    top, bottom = (float(part.value[:-1]) for part in candidate.parts)  # type: ignore[attr-defined]
    output = solved.crossing.driver.drive.high_ohms.nominal  # type: ignore[union-attr]
    assert solved.high.nominal == pytest.approx(5.0 * bottom / (top + bottom + output), rel=1e-3)


@pytest.mark.parametrize(("source", "target"), [(FIVE, THREE), (THREE, FIVE)])
def test_every_candidate_is_solved(source: Spread, target: Spread) -> None:
    for candidate in candidates(source, target):
        solved = solve(candidate, source, target, 20e-12, BOOK)
        assert solved is not None and solved.high is not None and solved.low is not None, candidate.name


def test_a_rate_that_a_pull_up_cannot_reach_is_told() -> None:
    text = propose(THREE, FIVE, 50e-12, 20e6)
    pairs = text[text.index("MOSFET pair") :]
    assert re.search(r"suited    no: too slow", pairs[: pairs.index("bipolar")])


@pytest.mark.parametrize(
    ("option", "value"), [("from_volts", "lots"), ("to_volts", "0.1"), ("rate", "fast"), ("load", "-3p")]
)
def test_a_wrong_figure_gets_one_line(option: str, value: str) -> None:
    args = {"from_volts": "5", "to_volts": "3.3", "rate": None, "load": None, option: value}
    with pytest.raises(CommandError, match="cannot be"):
        run(argparse.Namespace(**args))
