"""Cutting the board at its rails, and what becomes an element."""

from __future__ import annotations

import pytest
from gauge_cells import BUS, CONTROLLER, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import board_of, case_of, findings_of

from levelcrossing.diodepins import diode_pairs
from levelcrossing.islands import MOSFET_TERMINALS, SOT23_MOSFET, transistor_devices


def test_rails_cut_islands_apart_and_transistors_join_them() -> None:
    case = case_of(BUS + PULL_UPS + MOSFET_PAIR)
    nets = [set(island.nets) for island in case.islands]
    assert {"/SDA", "/SDA5"} in nets and {"/SCL", "/SCL5"} in nets
    assert all("+5V" not in island for island in nets)


def test_a_resistor_pack_is_as_many_resistors() -> None:
    pack = "RN1 10k Device:R_Pack02 | 1 R1.1 passive /A | 4 R1.2 passive /B | 2 R2.1 passive /C | 3 R2.2 passive /D\n"
    text = (
        SUPPLIES
        + pack
        + "U1 74HC04 74xx:74HC04 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /A | 2 - output /C\n"
    )
    nets = [set(island.nets) for island in case_of(text).islands]
    assert {"/A", "/B"} in nets and {"/C", "/D"} in nets


def test_a_0_ohm_resistor_is_a_link() -> None:
    text = BUS + resistor("R1", "0R", "/A", "/B")
    elements = [element for island in case_of(text).islands for element in island.elements if element.part == "R1"]
    assert [element.kind for element in elements] == ["link"]


@pytest.mark.parametrize(
    ("pins", "expected"),
    [
        ("1 G input /G | 2 S passive /S | 3 D passive /D", [("/D", "/G", "/S")]),
        ("1 S1 passive /S | 2 G1 input /G | 6 D1 passive /D | 4 S2 passive /S2 | 5 G2 input /G2 | 3 D2 passive /D2", [("/D", "/G", "/S"), ("/D2", "/G2", "/S2")]),
        ("1 - passive /G | 2 - passive /S | 3 - passive /D", [("/D", "/G", "/S")]),
    ],
)  # fmt: skip
def test_transistor_pins_are_found_by_name_and_by_habit(pins: str, expected: list[tuple[str, str, str]]) -> None:
    part = board_of(f"Q1 BSS138 Local:BSS138 | {pins}").parts[0]
    found = [
        tuple(terminals[letter].net for letter in "DGS")
        for terminals, _ in transistor_devices(part, MOSFET_TERMINALS, SOT23_MOSFET)
    ]
    assert found == expected


@pytest.mark.parametrize(
    ("value", "pins", "expected"),
    [
        ("1N4148", "1 K passive /K | 2 A passive /A", [("/A", "/K")]),
        ("1N5819", "1 - passive /K | 2 - passive /A", [("/A", "/K")]),
        ("BAT54S", "1 - passive /A | 2 - passive /K | 3 - passive /M", [("/A", "/M"), ("/M", "/K")]),
        ("BAT54C", "1 - passive /A | 2 - passive /B | 3 - passive /K", [("/A", "/K"), ("/B", "/K")]),
        ("BAT54A", "1 - passive /A | 2 - passive /B | 3 - passive /K", [("/K", "/A"), ("/K", "/B")]),
    ],
)
def test_diode_pins(value: str, pins: str, expected: list[tuple[str, str]]) -> None:
    """Pin order of KiCad's symbols and of the makers' packages."""
    part = board_of(f"D1 {value} Device:D | {pins}").parts[0]
    assert [(anode.net, cathode.net) for anode, cathode in diode_pairs(part)] == expected


def test_a_transistor_of_unknown_kind_is_named_where_it_touches_a_signal() -> None:
    """It holds no circuit together, and a report without it would look clean."""
    text = (
        SUPPLIES
        + CONTROLLER
        + "Q5 {value} Transistor_FET:{value} | 1 G input {net} | 3 S passive GND | 2 D passive /LOAD\n"
    )
    unknown = findings_of(text.format(value="XQ9", net="/A"))
    assert [(one.rule, one.outcome.value, one.part) for one in unknown] == [("pin-unknown", "unknown", "Q5")]
    assert "neither its number nor its symbol" in unknown[0].text
    assert not findings_of(text.format(value="BSS138", net="/A"))
    assert not findings_of(text.format(value="XQ9", net="/ALONE"))
