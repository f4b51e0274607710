"""Grounds, supply pins, decoupling and switch nodes as the tracing of rails sees them."""

from __future__ import annotations

import pytest
from small_boards import BOOK, board_of

from levelcrossing.model import Settings, Spread
from levelcrossing.rail_scene import Scene


def scene_of(*lines: str, settings: Settings | None = None) -> Scene:
    return Scene(board_of("\n".join(lines)), BOOK, settings or Settings())


@pytest.mark.parametrize(
    ("name", "kind", "role"),
    [
        ("VCC", "power_in", "in"),
        ("VDDIO", "passive", "in"),  # types lie
        ("3V3", "power_in", "in"),
        ("GND", "power_in", "ground"),
        ("VSS", "passive", "ground"),
        ("EP", "passive", "ground"),
        ("VOUT", "power_in", "out"),
        ("VO_LDO", "power_in", "out"),
        ("VREF", "power_in", ""),
        ("VCAP", "power_in", ""),
        ("BOOT", "power_in", ""),
        ("3V3_EN", "input", ""),
        ("VBUS_DET", "input", ""),
        ("ZQ", "power_in", ""),
        ("PA0", "bidirectional", ""),
    ],
)
def test_role_of_a_pin(name: str, kind: str, role: str) -> None:
    scene = scene_of(f"U1 ASIC Local:ASIC | 1 {name} {kind} N1 | 2 PA1 bidirectional N2 | 3 PA2 input N3")
    assert scene.role(scene.parts["U1"].pins[0]) == role


@pytest.mark.parametrize("net", ["GND", "/AGND", "GND_ISO", "VSS", "/Power/PGND"])
def test_ground_by_name(net: str) -> None:
    assert net in scene_of(f"U1 ASIC Local:ASIC | 1 GND power_in {net} | 2 VDD power_in VX").grounds


@pytest.mark.parametrize("net", ["GND_SENSE", "+3V3", "VSSOP"])
def test_not_ground_by_name(net: str) -> None:
    assert net not in scene_of(f"J1 x Connector:Conn_01x02 | 1 - passive {net} | 2 - passive GND").grounds


def test_ground_by_its_pins_when_its_name_says_nothing() -> None:
    lines = [f"U{n} ASIC Local:ASIC | 1 VSS power_in COMMON | 2 VDD power_in VX" for n in (1, 2)]
    assert "COMMON" in scene_of(*lines).grounds
    assert "COMMON" not in scene_of(lines[0]).grounds


def test_logic_supply_called_vss_is_no_ground() -> None:
    """The L298 has its logic supply at a pin called VSS: other parts take their supply from that net."""
    driver = "U1 XDRV Local:XDRV | 1 VSS power_in VLOG | 2 GND power_in GND"
    gates = [f"U{n} ASIC Local:ASIC | 1 VDD power_in VLOG | 2 GND power_in GND" for n in (2, 3)]
    assert "VLOG" not in scene_of(driver, driver.replace("U1", "U4"), *gates).grounds


def test_ground_declared_as_a_rail_is_none() -> None:
    settings = Settings(rails={"GNDA": Spread.around(2.5, 0.05)})
    assert "GNDA" not in scene_of("J1 x Connector:Conn_01x01 | 1 - passive GNDA", settings=settings).grounds


@pytest.mark.parametrize(
    ("value", "decoupled"), [("100n", True), ("90n", True), ("10n", False), ("0.1", True), ("C", True)]
)
def test_decoupling_begins_at_100_nf_or_where_the_value_cannot_be_read(value: str, decoupled: bool) -> None:
    assert scene_of(f"C1 {value} Device:C | 1 - passive A | 2 - passive GND").decoupled("A") is decoupled


def test_capacitors_add_up_and_those_between_signals_do_not_count() -> None:
    cap = "C{n} 47n Device:C | 1 - passive A | 2 - passive {other}"
    assert scene_of(cap.format(n=1, other="GND"), cap.format(n=2, other="GND")).decoupled("A")
    assert not scene_of(cap.format(n=1, other="GND"), cap.format(n=2, other="B")).decoupled("A")


def test_switch_node_is_told_by_its_pin_unless_it_is_decoupled() -> None:
    buck = "U1 XYZ Local:BUCK | 1 VIN power_in A | 2 GND power_in GND | 3 VREG_LX power_out N1"
    assert scene_of(buck).switching("N1")
    assert scene_of(buck).converter("U1")
    assert not scene_of(buck, "C1 10u Device:C | 1 - passive N1 | 2 - passive GND").switching("N1")


def test_negative_supply_of_amplifiers_called_vss_is_no_ground_beside_another_one() -> None:
    amplifier = "U1 OPA Amplifier:OPA | 2 V- power_in VSS | 5 V+ power_in VDD"
    assert "VSS" not in scene_of(amplifier, "R1 1k Device:R | 1 - passive GND | 2 - passive X").grounds
    assert "VSS" in scene_of(amplifier).grounds
