"""What joins two nets outright, and what feeds one from another."""

from __future__ import annotations

import pytest
from small_boards import BOOK, board_of

from levelcrossing.diodepins import diode_pairs
from levelcrossing.model import Settings
from levelcrossing.rail_links import Feed, Joints, across_coil, find_feeds
from levelcrossing.rail_scene import Scene

BUCK = "U1 XYZ Local:BUCK | 1 VIN power_in A | 2 GND power_in GND | 3 SW output SWN"


def scene_of(*lines: str) -> Scene:
    return Scene(board_of("\n".join(lines)), BOOK, Settings())


def feeds_of(*lines: str) -> tuple[Feed, ...]:
    scene = scene_of(*lines)
    return find_feeds(scene, Joints(scene))


def two(head: str, a: str = "A", b: str = "B") -> str:
    return f"{head} | 1 - passive {a} | 2 - passive {b}"


def test_joined_nets_are_one_group_and_the_way_between_them_is_told() -> None:
    joints = Joints(
        scene_of(two("F1 1A Device:Fuse"), two("L1 600R/2A Device:L", "B", "C"), two("R1 4k7 Device:R", "C", "D"))
    )
    assert joints.nets(joints.group("C")) == ("A", "B", "C")
    assert joints.group("D") == "D"
    assert joints.path("A", "C") == ("F1", "L1")
    assert joints.words("A", "C") == "through F1 (fuse) and L1 (ferrite)"


def test_ground_never_joins_a_supply() -> None:
    joints = Joints(scene_of(two("R1 0R Device:R", "A", "GND"), two("R2 0R Device:R", "A", "B")))
    assert joints.group("A") == joints.group("B") != joints.group("GND")


def test_coil_on_a_switch_node_joins_nothing() -> None:
    scene = scene_of(BUCK, two("L1 4u7 Device:L", "SWN", "VOUT1"))
    assert Joints(scene).group("SWN") == "SWN"
    assert across_coil(scene, "SWN") == ("VOUT1",)


@pytest.mark.parametrize(
    ("head", "kinds"),
    [
        ("R1 4R7 Device:R", ["resistor", "resistor"]),
        ("R1 1k Device:R", ["filter", "filter"]),
        ("R1 100k Device:R", []),
        ("R1 0R Device:R", []),  # a joint, no feed
        ("JP1 ~ Jumper:SolderJumper_2_Open", ["choice", "choice"]),
        ("D1 GREEN Device:LED", []),
        ("D1 SMBJ5.0A Device:D_TVS", []),
    ],
)
def test_ways_through_two_terminals(head: str, kinds: list[str]) -> None:
    assert [feed.kind for feed in feeds_of(two(head), "J1 x Connector:Conn_01x01 | 1 - passive GND")] == kinds


def test_diode_feeds_one_way() -> None:
    (feed,) = feeds_of("D1 1N5819 Device:D_Schottky | 1 K passive B | 2 A passive A")
    assert (feed.source, feed.target, feed.drop.high) == ("A", "B", 0.5)


@pytest.mark.parametrize(
    ("value", "ways"),
    [("BAT54C", [("A", "C"), ("B", "C")]), ("BAT54A", [("C", "A"), ("C", "B")]), ("BAT54S", [("A", "C"), ("C", "B")])],
)
def test_pairs_of_diodes_without_pin_names_go_by_their_number(value: str, ways: list[tuple[str, str]]) -> None:
    part = board_of(f"D1 {value} Diodes:{value} | 1 - passive A | 2 - passive B | 3 - passive C").parts[0]
    assert [(anode.net, cathode.net) for anode, cathode in diode_pairs(part)] == ways


def test_power_multiplexer_feeds_from_both_inputs() -> None:
    mux = "U3 TPS2113A Local:TPS2113A | 1 IN1 power_in A | 2 IN2 power_in B | 3 GND - GND | 7 OUT power_out C"
    assert {(feed.source, feed.target) for feed in feeds_of(mux)} == {("A", "C"), ("B", "C")}


def test_gate_is_no_load_switch() -> None:
    gate = "U3 74LVC1G04 74xGxx:74LVC1G04 | 2 IN input A | 3 GND power_in GND | 4 OUT output B | 5 VCC power_in C"
    assert not feeds_of(gate)
