"""Regulators that get too much or too little at their input are told, at the limit itself and beyond."""

from __future__ import annotations

import pytest
from small_boards import BOOK, board_of

from levelcrossing.model import RailRemark, Settings, Spread
from levelcrossing.rails import trace_rails

# 3.3 V from a part that bears 6 V and drops 0.4 V at most.
LDO = "U8 AP2112K-3.3 Regulator_Linear:AP2112K | 1 VIN power_in VX | 2 GND power_in GND | 5 VOUT power_out +3V3"


def remarks(volts: float, line: str = LDO) -> tuple[RailRemark, ...]:
    settings = Settings(rails={"VX": Spread.around(volts, 0.01)})
    return trace_rails(board_of(line), BOOK, settings).remarks


@pytest.mark.parametrize(("volts", "kinds"), [(5.0, []), (6.0, []), (6.01, ["input-range"]), (12.0, ["input-range"])])
def test_more_than_the_input_bears(volts: float, kinds: list[str]) -> None:
    assert [remark.kind for remark in remarks(volts)] == kinds


@pytest.mark.parametrize(("volts", "kinds"), [(3.7, []), (3.69, ["dropout"]), (3.0, ["dropout"])])
def test_less_than_output_and_dropout(volts: float, kinds: list[str]) -> None:
    found = remarks(volts)
    assert [remark.kind for remark in found] == kinds
    assert all(remark.part == "U8" and remark.net == "+3V3" for remark in found)


def test_a_step_down_has_no_dropout_of_a_linear_regulator() -> None:
    buck = (
        "U1 LM3671MF-3.3 Local:LM3671 | 1 VIN power_in VX | 2 GND power_in GND | 4 FB input +3V3 | 5 SW output SWN\n"
        "L1 2u2 Device:L | 1 - passive SWN | 2 - passive +3V3\nC1 10u Device:C | 1 - passive +3V3 | 2 - passive GND"
    )
    assert not remarks(3.6, buck)


def test_a_step_up_needs_no_room() -> None:
    boost = (
        "U1 MT3608 Regulator:MT3608 | 1 SW output SWN | 2 GND power_in GND | 3 FB input FBN | 5 IN power_in VX\n"
        "L1 22u Device:L | 1 - passive VX | 2 - passive SWN\n"
        "D1 SS34 Device:D_Schottky | 1 K passive VOUT1 | 2 A passive SWN\n"
        "R1 75k Device:R | 1 - passive VOUT1 | 2 - passive FBN\n"
        "R2 10k Device:R | 1 - passive FBN | 2 - passive GND\n"
        "C1 22u Device:C | 1 - passive VOUT1 | 2 - passive GND"
    )
    assert not remarks(3.7, boost)


@pytest.mark.parametrize(
    ("part", "volts", "kinds"),
    [
        # one row, members with limits of their own: Micrel data sheets, 16 V and 5.5 V; TPS715 24 V, TPS7A05 5.5 V
        ("MIC5205-3.3YM5", 12.0, []),
        ("MIC5504-3.3YM5", 12.0, ["input-range"]),
        ("TPS71533DCK", 12.0, []),
        ("TPS7A0533PDBV", 12.0, ["input-range"]),
        # a member whose limit is not known has none
        ("AP2138N-3.3", 12.0, []),
    ],
)
def test_the_members_of_a_row_have_limits_of_their_own(part: str, volts: float, kinds: list[str]) -> None:
    pins = {"MIC": ("IN", "OUT"), "TPS": ("IN", "OUT"), "AP2": ("VIN", "VOUT")}[part[:3]]
    line = f"U8 {part} Local:LDO | 1 {pins[0]} power_in VX | 2 GND power_in GND | 5 {pins[1]} power_out +3V3"
    assert [remark.kind for remark in remarks(volts, line)] == kinds
