"""Places: the line that a finding names lies in the symbol, label or pin that it speaks of."""

from __future__ import annotations

import os
import random
import shutil
from pathlib import Path
from typing import Any

import pytest
from kiutils.utils.sexpr import parse_sexp

from levelcrossing.model import Board, Net, Part, Pin, Place
from levelcrossing.read import read_board
from levelcrossing.read.places import Places
from levelcrossing.read.sheet_names import as_net_name

HERE = Path(__file__).parent
SMALL = HERE / "small_sheets"
DEMOS = Path(os.environ.get("KICAD_DEMOS", "/usr/share/kicad/demos"))


def block_at(place: Place) -> tuple[list[Any], int]:
    """Return the bracket that opens at a place, as a tree, and its offset."""
    text = Path(place.file).read_text(encoding="utf-8")
    start = sum(len(line) for line in text.splitlines(keepends=True)[: place.line - 1]) + place.column - 1
    assert text[start] == "(", (place, text[start : start + 20])
    depth, quoted = 0, False
    for end in range(start, len(text)):
        letter = text[end]
        if letter == '"' and text[end - 1] != "\\":
            quoted = not quoted
        elif not quoted and letter in "()":
            depth += 1 if letter == "(" else -1
            if depth == 0:
                break
    return parse_sexp(text[start : end + 1]), start


def _items(block: list[Any], head: str) -> list[list[Any]]:
    return [item for item in block if isinstance(item, list) and item and item[0] == head]


def _property(block: list[Any], name: str) -> str:
    return next((str(item[2]) for item in _items(block, "property") if item[1] == name), "")


def check_part(place: Place | None, part: Part) -> None:
    assert place is not None, part.reference
    block, _ = block_at(place)
    assert block[0] == "symbol" and _items(block, "lib_id")
    assert _items(block, "uuid")[0][1] in part.uuids


def check_pin(place: Place | None, part: Part, number: str) -> None:
    assert place is not None
    block, start = block_at(place)
    assert block[0] == "pin" and str(block[1]) == number
    text = Path(place.file).read_text(encoding="utf-8")
    symbol_start = max(text.rfind("(symbol (lib", 0, start), text.rfind("(symbol\n\t\t(lib", 0, start))
    line = text.count("\n", 0, symbol_start) + 1
    column = symbol_start - text.rfind("\n", 0, symbol_start)
    symbol, _ = block_at(Place(file=place.file, line=line, column=column))
    known = {_property(symbol, "Reference"), *(str(item) for item in _references(symbol))}
    assert part.reference in known or _items(symbol, "uuid")[0][1] in part.uuids


def _references(block: Any) -> list[str]:
    found = []
    if isinstance(block, list):
        if block and block[0] == "reference":
            found.append(block[1])
        for item in block:
            found.extend(_references(item))
    return found


def check_net(place: Place | None, board: Board, net: Net) -> None:
    assert place is not None, net.name
    block, _ = block_at(place)
    if block[0] in ("label", "global_label", "hierarchical_label"):
        assert as_net_name(block[1]) == net.name.rpartition("/")[2]
    elif block[0] == "symbol":
        on_it = {reference for reference, _ in net.pins}
        uuids = {uuid for part in board.parts if part.reference in on_it for uuid in part.uuids}
        assert as_net_name(_property(block, "Value")) == net.name or _items(block, "uuid")[0][1] in uuids
    else:
        assert block[0] == "pin" and str(block[1]) in {number for _, number in net.pins}


def spot_check(board: Board, parts: int, nets: int) -> int:
    chance = random.Random(7)
    places = Places(board)
    count = 0
    known = {part.reference: part for part in board.parts}
    for part in chance.sample(board.parts, min(parts, len(board.parts))):
        check_part(places.place_of_part(part.reference), part)
        count += 1
        connected = [pin for pin in part.pins if pin.net]
        for pin in connected[:1]:
            check_pin(places.place_of_pin(part.reference, pin.number), known[part.reference], pin.number)
            count += 1
    for net in chance.sample(board.nets, min(nets, len(board.nets))):
        check_net(places.place_of_net(net.name), board, net)
        count += 1
    return count


@pytest.mark.parametrize(
    "name", ["three_levels", "reused_sheet", "hidden_supply", "fields_and_flags", "sheets_of_kicad_6"]
)
def test_places_on_small_sheets(name: str) -> None:
    assert spot_check(read_board(SMALL / f"{name}.kicad_sch"), 20, 20) >= 10


@pytest.mark.skipif(not DEMOS.is_dir(), reason="Debian's package kicad-demos is not installed")
@pytest.mark.parametrize(
    "name", ["video/video", "complex_hierarchy/complex_hierarchy", "flat_hierarchy/flat_hierarchy", "stickhub/StickHub"]
)
def test_fifty_places_on_real_sheets(name: str) -> None:
    assert spot_check(read_board(DEMOS / f"{name}.kicad_sch"), 20, 20) >= 50


def test_labels_and_power_symbols_are_preferred_to_pins() -> None:
    places = Places(read_board(SMALL / "three_levels.kicad_sch"))
    for name, kind, file in (
        ("/TOP", "label", "three_levels"),
        ("+9V", "symbol", "three_levels"),
        ("/one/MIDDLE", "label", "three_levels_below"),
        ("/one/in/LOW", "label", "three_levels_deep"),
    ):
        place = places.place_of_net(name)
        assert place is not None
        assert (block_at(place)[0][0], Path(place.file).stem) == (kind, file)


def test_the_unit_that_holds_the_pin_is_named() -> None:
    places = Places(read_board(SMALL / "names_of_pins.kicad_sch"))
    part = next(part for part in places.board.parts if part.reference == "U3")
    found = []
    for number in ("1", "4"):
        place = places.place_of_pin("U3", number)
        check_pin(place, part, number)
        assert place is not None
        found.append(place.line)
    assert found[0] != found[1]


def test_unknown_things_have_no_place() -> None:
    places = Places(read_board(SMALL / "net_tie.kicad_sch"))
    assert places.place_of_part("U99") is None
    assert places.place_of_pin("U99", "1") is None
    assert places.place_of_net("NOWHERE") is None


# --------------------------------------------------------------------------------------------------- netlists alone

NETLIST = """\
(export (version "E")
  (design (source "reused_sheet.kicad_sch")
    (sheet (number "1") (name "/") (title_block (source "reused_sheet.kicad_sch")))
    (sheet (number "2") (name "/left/") (title_block (source "reused_sheet_below.kicad_sch"))))
  (components
    (comp (ref "TP1") (value "TP") (libsource (lib "own") (part "TP")) (tstamps "{uuid}"))
    (comp (ref "X'1") (value "odd") (tstamps "11111111-0000-0000-0000-000000000000")))
  (nets
    (net (code "1") (name "/FEED")
      (node (ref "TP1") (pin "1") (pintype "passive"))
      (node (ref "X'1") (pin "2") (pintype "passive")))))
"""


def _uuid_of(reference: str) -> str:
    return next(
        part.uuids[0] for part in read_board(SMALL / "reused_sheet.kicad_sch").parts if part.reference == reference
    )


def test_a_netlist_beside_its_sheets_points_into_the_sheets(tmp_path: Path) -> None:
    for file in SMALL.glob("reused_sheet*.kicad_sch"):
        shutil.copy(file, tmp_path)
    path = tmp_path / "board.net"
    path.write_text(NETLIST.replace("{uuid}", _uuid_of("TP1")), encoding="utf-8")
    board = read_board(path)
    places = Places(board)
    check_part(places.place_of_part("TP1"), next(part for part in board.parts if part.reference == "TP1"))
    net = places.place_of_net("/FEED")
    assert net is not None and net.file.endswith("/reused_sheet.kicad_sch")
    assert block_at(net)[0][:2] == ["label", "FEED"]
    # what is not on the sheets stands in the netlist
    assert places.place_of_part("X'1") == Place(file=str(path), line=7, column=5)


def test_a_netlist_alone_points_into_itself(tmp_path: Path) -> None:
    path = tmp_path / "board.net"
    path.write_text(NETLIST, encoding="utf-8")
    places = Places(read_board(path))
    assert places.place_of_part("TP1") == Place(file=str(path), line=6, column=5)
    assert places.place_of_pin("X'1", "2") == Place(file=str(path), line=11, column=7)
    assert places.place_of_net("/FEED") == Place(file=str(path), line=9, column=5)
    assert places.place_of_pin("TP1", "9") == Place(file=str(path), line=6, column=5)


def test_sheets_of_another_project_beside_a_netlist_are_left_alone(tmp_path: Path) -> None:
    shutil.copy(SMALL / "net_tie.kicad_sch", tmp_path / "reused_sheet.kicad_sch")
    path = tmp_path / "board.net"
    path.write_text(NETLIST.replace("{uuid}", "22222222-0000-0000-0000-000000000000"), encoding="utf-8")
    assert Places(read_board(path)).place_of_part("TP1") == Place(file=str(path), line=6, column=5)


def test_old_and_xml_netlists_point_into_themselves(tmp_path: Path) -> None:
    old = tmp_path / "old.net"
    old.write_text(
        "(export (version D)\n  (components\n    (comp (ref R1)\n      (value 1k)))\n  (nets\n"
        "    (net (code 1) (name GND)\n      (node (ref R1) (pin 2)))))\n",
        encoding="utf-8",
    )
    places = Places(read_board(old))
    assert places.place_of_part("R1") == Place(file=str(old), line=3, column=5)
    assert places.place_of_net("GND") == Place(file=str(old), line=6, column=5)
    assert places.place_of_pin("R1", "2") == Place(file=str(old), line=7, column=7)
    xml = tmp_path / "board.xml"
    xml.write_text(
        '<?xml version="1.0"?>\n<export version="E">\n <components>\n  <comp ref="R&amp;1"><value>1k</value></comp>\n'
        ' </components>\n <nets>\n  <net code="1" name="A&lt;B">\n   <node ref="R&amp;1" pin="2"/>\n  </net>\n'
        " </nets>\n"
        "</export>\n",
        encoding="utf-8",
    )
    places = Places(read_board(xml))
    assert places.place_of_part("R&1") == Place(file=str(xml), line=4, column=3)
    assert places.place_of_net("A<B") == Place(file=str(xml), line=7, column=3)
    assert places.place_of_pin("R&1", "2") == Place(file=str(xml), line=8, column=4)


def test_nothing_is_read_before_a_place_is_asked_for(tmp_path: Path) -> None:
    pin = Pin(part="R1", number="1", name="", kind="passive", net="N")
    part = Part(reference="R1", value="1k", pins=(pin,))
    board = Board(path=str(tmp_path / "gone.net"), form="netlist", parts=(part,), nets=(Net(name="N", pins=()),))
    places = Places(board)  # the file does not exist
    assert places.place_of_part("R1") is None
    assert places.place_of_net("N") is None
