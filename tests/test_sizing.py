"""The command ``size``: proposals that hold what they say."""

from __future__ import annotations

import argparse
import re
from dataclasses import replace

import pytest

from levelcrossing import tradebook
from levelcrossing.errors import CommandError
from levelcrossing.model import Spread
from levelcrossing.sizing import propose, run
from levelcrossing.sizing_cells import Candidate, Task, candidates, solve
from levelcrossing.units import SERIES

BOOK = tradebook.load()
FIVE, THREE, LOW = Spread.around(5.0, 0.05), Spread.around(3.3, 0.05), Spread.around(1.8, 0.05)
DOWN, UP = Task(source=FIVE, target=THREE), Task(source=THREE, target=FIVE)


def by_name(task: Task) -> dict[str, list[Candidate]]:
    return {family[0].name: family for family in candidates(task, BOOK)}


def section(text: str, name: str) -> str:
    """Return the lines of one proposal."""
    (found,) = [block for block in text.split("\n\n") if block.startswith(name)]
    return found


def test_down_and_up_ask_for_different_parts() -> None:
    assert {"resistor divider", "tolerant buffer", "MOSFET pair", "bipolar cell"} <= set(by_name(DOWN))
    up = set(by_name(UP))
    assert "TTL-level buffer" in up and "resistor divider" not in up


def test_both_ways_and_open_drains_leave_what_cannot_do_them() -> None:
    both = set(by_name(replace(DOWN, two_way=True)))
    assert both == {"MOSFET pair", "bipolar cell", "auto-direction buffer", "auto-direction pass type"}
    drains = set(by_name(replace(DOWN, open_drain=True)))
    assert "pull-up to the lower supply" in drains
    assert not {"resistor divider", "tolerant buffer", "auto-direction buffer"} & drains


def test_the_divider_s_level_is_the_ratio_of_its_values() -> None:
    """Closed form: V x R2 / (R1 + R2 + output)."""
    candidate = by_name(DOWN)["resistor divider"][0]
    solved = solve(candidate, DOWN, BOOK)
    assert solved is not None and solved.high is not None
    top, bottom = (float(part.value[:-1]) for part in candidate.parts)
    assert solved.crossing.driver is not None and solved.crossing.driver.drive is not None
    output = solved.crossing.driver.drive.high_ohms.nominal
    assert solved.high.nominal == pytest.approx(5.0 * bottom / (top + bottom + output), rel=1e-3)


@pytest.mark.parametrize("open_drain", [False, True])
@pytest.mark.parametrize("back", [False, True])
@pytest.mark.parametrize(("source", "target"), [(FIVE, THREE), (THREE, FIVE), (LOW, THREE), (THREE, LOW)])
def test_every_two_way_candidate_is_solved_from_both_ends(
    source: Spread, target: Spread, back: bool, open_drain: bool
) -> None:
    task = Task(source=source, target=target, two_way=True, open_drain=open_drain)
    for family in candidates(task, BOOK):
        solved = solve(family[-1], task, BOOK, back=back)
        assert solved is not None and solved.high is not None and solved.low is not None, family[0].name
        assert solved.crossing.receiver_rail == ("VFROM" if back else "VTO")


def test_the_weakest_values_that_reach_the_rate_are_taken() -> None:
    """A larger rate needs smaller resistors; the current grows with it."""
    ohms, amps = [], []
    for rate in (10e3, 5e6, 20e6):
        text = section(propose(replace(DOWN, needed_bit_s=rate)), "MOSFET pair")
        found = re.search(r"([\d.]+) (k?)Ω on each side", text)
        assert found is not None
        ohms.append(float(found[1]) * (1e3 if found[2] else 1))
        current = re.search(r"current +([\d.]+) (.)A", text)
        assert current is not None
        amps.append(float(current[1]) * {"m": 1e-3, "µ": 1e-6}[current[2]])
        assert "suited    yes" in text
    assert ohms[0] > ohms[1] > ohms[2] and amps[0] < amps[1] < amps[2]


def test_a_rate_that_a_pull_up_cannot_reach_is_told() -> None:
    text = section(propose(replace(UP, load_farads=50e-12, needed_bit_s=60e6)), "MOSFET pair")
    assert "suited    no: too slow" in text


@pytest.mark.parametrize(("sink", "suited"), [(3e-3, True), (0.2e-3, False)])
def test_the_sink_limit_chooses_the_pull_ups_or_is_told(sink: float, suited: bool) -> None:
    """Both pull-ups run through the driver that is low: 3.3 V / 4.7 k + 5 V / 4.7 k = 1.8 mA, 0.83 mA at 10 k."""
    task = Task(source=THREE, target=FIVE, two_way=True, open_drain=True, sink_amps=sink, needed_bit_s=100e3)
    text = section(propose(task), "MOSFET pair")
    assert ("suited    yes" in text) is suited
    assert ("its driver sinks" in text) is not suited


@pytest.mark.parametrize("series", ["E24", "E96"])
def test_dividers_are_made_of_the_series_asked_for(series: str) -> None:
    """IEC 60063."""
    for candidate in by_name(replace(DOWN, series=series, needed_bit_s=1e6))["resistor divider"]:
        for part in candidate.parts:
            ohms = float(part.value[:-1])
            assert any(ohms == pytest.approx(step * 10**power) for step in SERIES[series] for power in range(6))


def test_translators_have_their_maker_s_rate() -> None:
    """TI TXS0102: 24 Mbit/s push-pull, 2 Mbit/s with open drains at 3.3 and 5 V (product page)."""
    assert "24 Mbit/s by its data sheet" in section(propose(DOWN), "auto-direction pass type")
    drains = section(propose(replace(DOWN, open_drain=True)), "auto-direction pass type")
    assert "2 Mbit/s by its data sheet" in drains and "suited    yes" in drains


def test_suited_ones_come_first() -> None:
    text = propose(replace(UP, needed_bit_s=20e6))
    verdicts = re.findall(r"suited    (yes|no)", text)
    assert verdicts == sorted(verdicts, reverse=True) and {"yes", "no"} == set(verdicts)


WRONG = [
    ("from_volts", "lots"),
    ("to_volts", "0.1"),
    ("rate", "fast"),
    ("load", "-3p"),
    ("sink", "a lot"),
    ("sink", "0"),
]


@pytest.mark.parametrize(("option", "value"), WRONG)
def test_a_wrong_figure_gets_one_line(option: str, value: str) -> None:
    args = {
        "from_volts": "5",
        "to_volts": "3.3",
        "rate": None,
        "load": None,
        "sink": None,
        "two_way": False,
        "open_drain": False,
        "series": "E24",
        option: value,
    }
    with pytest.raises(CommandError, match="cannot be"):
        run(argparse.Namespace(**args))
