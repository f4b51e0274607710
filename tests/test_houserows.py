"""Rows to fill in: they load as they stand, hold what the board shows, and teach the review the part."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES, resistor
from hostile import HOSTILE
from small_boards import board_of

from levelcrossing import tradebook
from levelcrossing.houserows import house_row, house_rows
from levelcrossing.model import Settings
from levelcrossing.review import open_case, review_board

SENSOR = (
    "U5 QX77B Tide:QX77 | 1 VDDIO power_in +3V3 | 2 GND power_in GND | 3 ~{ALERT} open_collector /B | 4 DIN input /A"
    " | 5 DOUT output /Q\n"
)
BOARD = SUPPLIES + CONTROLLER + SENSOR + INVERTER_5V.format(out="/Y") + resistor("R1", "1k", "/Y", "/Q")


def test_a_row_holds_the_supply_and_the_directions_that_the_board_shows() -> None:
    case = open_case(board_of(BOARD), Settings(), tradebook.load())
    (text,) = house_rows(case)
    (row,) = tomllib.loads(text)["part"]
    assert row["match"] == ["QX77B"] and row["io_supply"] == "VDDIO"
    low, high = row["supplies"][0]["volts"]
    assert low < 3.3 < high
    directions = {name: pin["direction"] for pin in row["pins"] for name in pin["names"].split("|")}
    assert directions == {"ALERT": "open-drain", "DIN": "in", "DOUT": "out"}
    # Nobody has looked the figures up, and the row says so.
    assert row["certainty"] == "practice" and "not looked up" in row["source"]


def test_the_row_pasted_into_a_file_teaches_the_review_the_part(tmp_path: Path) -> None:
    before = review_board(board_of(BOARD), Settings())
    assert len(before.rows_to_fill) == 1 and "QX77B" in before.suggestions[0]
    path = tmp_path / "house.toml"
    path.write_text(before.rows_to_fill[0], encoding="utf-8")
    after = review_board(board_of(BOARD), Settings(), facts_files=[path])
    assert not after.rows_to_fill and not after.suggestions
    assert after.coverage.better_than_assumed > before.coverage.better_than_assumed


@pytest.mark.parametrize(
    "value", ["", "~", "'", '"', "\\", "a'b\"c\\d", "]]\n[[part]]", "SN74[LVC](245)", "10k µ", *HOSTILE]
)
def test_a_row_loads_whatever_the_value_says(value: str, tmp_path: Path) -> None:
    (row,) = tomllib.loads(house_row(value))["part"]
    assert set(row) >= {"id", "match", "source", "certainty"}
    path = tmp_path / "house.toml"
    path.write_text(house_row(value), encoding="utf-8")
    tradebook.load(extra=(path,))
