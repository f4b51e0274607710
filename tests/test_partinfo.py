from __future__ import annotations

import argparse
from pathlib import Path

import pytest

from levelcrossing.houserows import house_row
from levelcrossing.partinfo import run


def ask(number: str, *facts: str) -> tuple[str, int]:
    return run(argparse.Namespace(name=number, facts=list(facts)))


@pytest.mark.parametrize(
    ("number", "words"),
    [
        ("SN74LVC245APW", ["74LVC245", "logic_families.toml", "bears 6.5 V unpowered 6.5 V", "2 V at 3.3 V"]),
        ("BSS138", ["N-channel MOSFET", "0.8 V to 1.5 V", "transistors.toml"]),
        ("AMS1117-2.85", ["makes     2.85 V", "regulators.toml"]),
        ("2N3904", ["NPN transistor", "in reverse 0.74"]),
        ("BZX84C3V3", ["zener diode", "3.1 V to 3.5 V"]),
        ("TXB0104PWR", ["translator", "a<=b", "No pull-up or pull-down under 50 k"]),
        ("ATmega328P-AU", ["1.98 V at 3.3 V", "3 V at 5 V"]),
        # every group of pins, each side, the maker's rates
        ("STM32F103C8T6", ["PA[0-7]…: with a diode to its supply", "P[A-G]#…: bears 5.5, while its supply is up"]),
        ("TXB0108PWR", ["side A", "4.6 V", "side B", "6.5 V", "100 Mbit/s (A from 2.5 V up)"]),
        ("TXS0102DCT", ["2 Mbit/s, with open drains"]),
    ],
)
def test_a_known_number_shows_its_figures_its_row_and_its_source(number: str, words: list[str]) -> None:
    text, status = ask(number)
    assert status == 0
    flat = " ".join(text.split())
    for word in words:
        assert " ".join(word.split()) in flat
    assert "  from  " in text
    assert all(len(line) <= 100 for line in text.splitlines())


@pytest.mark.parametrize(
    ("number", "beyond"), [("STM32F103C8T6", "at 5 V"), ("74LVC245", "at 5 V"), ("74AHCT1G125", "at 3.3 V")]
)
def test_levels_are_given_at_supplies_within_the_part_s_range_only(number: str, beyond: str) -> None:
    text, _ = ask(number)
    assert "  reads     high from" in text and beyond not in " ".join(text.split())


def test_sides_that_are_alike_are_described_once() -> None:
    text, _ = ask("74LVC245")
    assert text.count("  reads  ") == 1 and "side A" not in text


def test_an_unknown_number_says_so_with_the_nearest_and_a_row_to_fill_in() -> None:
    text, status = ask("XYZ99")
    assert status == 1 and "knows nothing of XYZ99" in text and "[[part]]" in text
    # What nobody has looked up must not pass for a data sheet's figure.
    assert 'certainty = "practice"' in text and 'certainty = "datasheet"' not in text


def test_the_row_to_fill_in_is_a_valid_house_row(tmp_path: Path) -> None:
    row = house_row("XYZ99")
    path = tmp_path / "house.toml"
    path.write_text(row[row.index("[[part]]") :], encoding="utf-8")
    text, status = ask("XYZ99", str(path))
    assert status == 0 and "house.toml" in text
