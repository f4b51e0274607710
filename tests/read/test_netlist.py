"""Netlists in brackets, old and new: parts, pins, nets, and what the reader puts right."""

from pathlib import Path

import pytest

from levelcrossing.errors import InputError
from levelcrossing.read.netlist import read_netlist

HERE = Path(__file__).parent
DOOR = HERE / "good_input/door_sensor.net"

# Written as KiCad 5 writes: unquoted where possible, pins only in the symbols, an alias, a symbol that is missing.
OLD = """\
(export (version D)
  (design
    (source kiln.sch)
    (date "22.09.2020 17:29:19")
    (tool "Eeschema (5.1.5)")
    (sheet (number 1) (name /) (tstamps /)
      (title_block (title "Kiln logger") (company) (rev 01) (date) (source kiln.sch)))
    (sheet (number 2) (name /power/) (tstamps /5F2A889B/)
      (title_block (title) (source power.sch))))
  (components
    (comp (ref U1)
      (value 74LVC86)
      (footprint Package_SO:TSSOP-14)
      (datasheet http://example.org/a;b)
      (fields
        (field (name MPN) 74LVC86APW,118)
        (field (name Note) "first word"))
      (libsource (lib 74xx) (part 74HC86) (description "Quad XOR"))
      (sheetpath (names /power/) (tstamps /5F2A889B/))
      (tstamp 58103E50))
    (comp (ref R1) (value NA/R0402) (libsource (lib Device) (part R) (description Resistor))
      (sheetpath (names /) (tstamps /))
      (tstamp 5F2A0001))
    (comp (ref X-1) (value 01) (tstamp 5F2A0002)))
  (libparts
    (libpart (lib 74xx) (part 74LS86)
      (aliases
        (alias 74HC86))
      (pins
        (pin (num 1) (name ~) (type input))
        (pin (num 2) (name A[1]) (type BiDi))
        (pin (num 3) (name Q') (type 3state))
        (pin (num 4) (name OC) (type openCol))
        (pin (num 5) (name OE) (type openEm))
        (pin (num 6) (name X) (type unspc))
        (pin (num 7) (name NC) (type NotConnected))
        (pin (num 8) (name ODD) (type wired))
        (pin (num 10) (name VCC) (type power_in))))
    (libpart (lib Device) (part R)
      (pins
        (pin (num 1) (name ~) (type passive))
        (pin (num 2) (name ~) (type passive)))))
  (libraries)
  (nets
    (net (code 1) (name /D#;0)
      (node (ref U1) (pin 1))
      (node (ref R1) (pin 2)))
    (net (code 2) (name "Net-(R1-Pad1)")
      (node (ref U1) (pin 2))
      (node (ref X-1) (pin 2_124))
      (node (ref R1) (pin 1)))))
"""


def read(text, name="board.net"):
    return read_netlist(name, text)


def small(components="", nets="", libparts=""):
    return read(f"(export (version E) (components {components}) (libparts {libparts}) (nets {nets}))")


def part_of(board, reference):
    return next(part for part in board.parts if part.reference == reference)


def pin_of(board, reference, number):
    return next(pin for pin in part_of(board, reference).pins if pin.number == number)


@pytest.fixture(scope="module")
def old():
    return read(OLD)


@pytest.fixture(scope="module")
def door():
    return read_netlist(DOOR)


# --------------------------------------------------------------------------------------------------- the older form


def test_old_form_says_where_it_comes_from(old):
    assert (old.path, old.form, old.maker) == ("board.net", "netlist", "Eeschema (5.1.5)")
    assert old.sheet_files == ("kiln.sch", "power.sch")


def test_old_form_keeps_every_token_as_text(old):
    part = part_of(old, "U1")
    assert part.uuids == ("58103E50",)
    assert part_of(old, "X-1").value == "01"
    assert part.fields == (("MPN", "74LVC86APW,118"), ("Note", "first word"))
    assert [net.name for net in old.nets] == ["/D#;0", "Net-(R1-Pad1)"]


def test_old_form_finds_pins_through_an_alias(old):
    part = part_of(old, "U1")
    assert (part.library, part.symbol, part.sheet, part.description) == ("74xx", "74HC86", "/power/", "Quad XOR")
    assert [(pin.number, pin.name, pin.kind) for pin in part.pins] == [
        ("1", "", "input"),
        ("2", "A[1]", "bidirectional"),
        ("3", "Q'", "tri_state"),
        ("4", "OC", "open_collector"),
        ("5", "OE", "open_emitter"),
        ("6", "X", "unspecified"),
        ("7", "NC", "no_connect"),
        ("8", "ODD", ""),
        ("10", "VCC", "power_in"),
    ]
    assert [pin.net for pin in part.pins] == ["/D#;0", "Net-(R1-Pad1)", "", "", "", "", "", "", ""]


def test_old_form_part_without_a_symbol_has_the_pins_of_its_nets(old):
    assert [(pin.number, pin.name, pin.kind, pin.net) for pin in part_of(old, "X-1").pins] == [
        ("2_124", "", "", "Net-(R1-Pad1)")
    ]


def test_old_form_says_what_it_lacks(old):
    assert old.remarks == (
        "1 part (X-1) without a symbol in the file: only the pins that the nets name are known",
        "the pin type 'wired' of 1 pin is unknown and was taken as no type",
    )


def test_old_form_unfitted_part_keeps_its_value_and_pins(old):
    part = part_of(old, "R1")
    assert (part.value, part.fitted, part.not_fitted_why) == ("NA/R0402", False, "its value is 'NA/R0402'")
    assert [pin.kind for pin in part.pins] == ["passive", "passive"]


# --------------------------------------------------------------------------------------------------- the newer form


def test_new_form_parts_in_natural_order(door):
    assert [part.reference for part in door.parts] == ["J_DOOR_1", "R1", "R2", "R3", "R10", "U1"]
    assert [part.value for part in door.parts] == [
        "nil",
        "4k7 'x' #1; [0]",
        "58103E50",
        "1e5",
        "NA(10k/R0402)",
        "74LVC2G125",
    ]


def test_new_form_units_are_one_part(door):
    part = part_of(door, "U1")
    assert [(pin.number, pin.name, pin.kind, pin.net) for pin in part.pins] == [
        ("01", "GND", "power_in", "GND"),
        ("1", "A{slash}B", "input", "/~{OPEN}{slash}SHUT #2"),
        ("2", "~{Y}", "tri_state", "Net-(J_DOOR_1-Pin_1)"),
        ("3", "A", "input", "GND"),
        ("4", "Y", "tri_state", "unconnected-(U1B-Y-Pad4)"),
        ("8", "VCC", "power_in", "+3V3"),
    ]
    assert len(part.uuids) == 3
    assert part.keywords == "small test"


def test_new_form_fields_in_order_without_what_has_its_own_place(door):
    assert part_of(door, "U1").fields == (
        ("MPN", "74LVC2G125DP,125"),
        ("Note", 'say "open" & <wait> \\ Tür µΩ'),
        ("Description", ""),
    )


def test_new_form_no_connect_marks_are_read_and_cut_off(door):
    assert [(pin.part, pin.number, pin.kind) for part in door.parts for pin in part.pins if pin.unused] == [
        ("U1", "4", "tri_state")
    ]


def test_new_form_fitted_by_flag_and_value_but_not_by_the_shopping_list(door):
    assert {part.reference: part.not_fitted_why for part in door.parts if not part.fitted} == {
        "R2": "the symbol is marked 'do not populate'",
        "R10": "its value is 'NA(10k/R0402)'",
    }
    assert part_of(door, "R3").fitted  # excluded from the bill of materials, an empty field "dnp note"


def test_new_form_nets_by_name_with_sorted_pins(door):
    assert [net.name for net in door.nets] == sorted(net.name for net in door.nets)
    assert {net.name: net.pins for net in door.nets}["GND"] == (
        ("R10", "2"),
        ("R3", "1"),
        ("R3", "2"),
        ("U1", "01"),
        ("U1", "3"),
    )


def test_new_form_leaves_nothing_to_remark(door):
    assert door.remarks == ()


def test_unknown_sections_are_passed_over():
    board = small(
        "(comp (ref R1) (value 1k) (units (unit (name A) (pins (pin (num 1))))) (component_classes (class hot))"
        " (variants (variant (name lab) (property (name dnp)))) (property (name odd)))",
        "(net (code 1) (name N) (class Default) (colour red) (node (ref R1) (pin 1) (pintype passive) (angle 90)))",
    )
    part = part_of(board, "R1")
    assert part.fitted and len(part.pins) == 1 and board.remarks == ()


@pytest.mark.parametrize(
    ("inside", "fitted"),
    [
        ("(property (name dnp))", False),
        ('(property (name "dnp") (value "1"))', False),
        ('(property (name "dnp") (value ""))', True),
        ('(property (name "dnp") (value "no"))', True),
        ("(property (name exclude_from_bom))", True),
        ("(fields (field (name DNP) yes))", False),
        ("(fields (field (name DNP)))", True),
    ],
)
def test_flags_and_fields_of_fitting(inside, fitted):
    assert part_of(small(f"(comp (ref R1) (value 1k) {inside})"), "R1").fitted is fitted


# --------------------------------------------------------------------------------------------------------- put right


def test_nested_lists_of_script_written_files():
    board = small(
        "((comp (ref A1) (value x)) (comp (ref A2) (value y)))", "((net (code 1) (name N) (node (ref A1) (pin 1))))"
    )
    assert [part.reference for part in board.parts] == ["A1", "A2"]
    assert [net.pins for net in board.nets] == [(("A1", "1"),)]


def test_a_renamed_library_still_leads_to_an_unmistakable_symbol():
    symbol = "(libpart (lib new) (part S) (pins (pin (num 1) (name A) (type input))))"
    comp = "(comp (ref U1) (value x) (libsource (lib old) (part S)))"
    assert pin_of(small(comp, libparts=symbol), "U1", "1").kind == "input"
    doubtful = small(comp, libparts=symbol + symbol.replace("new", "newer").replace("input", "output"))
    assert part_of(doubtful, "U1").pins == ()


def test_what_the_net_says_of_a_pin_outranks_the_symbol():
    board = small(
        "(comp (ref U1) (value x) (libsource (lib l) (part S)))",
        "(net (name N) (node (ref U1) (pin 1) (pinfunction TX) (pintype output+no_connect)))",
        "(libpart (lib l) (part S) (pins (pin (num 1) (name PA0) (type bidirectional))"
        " (pin (num 2) (name PA1) (type input))))",
    )
    first, second = part_of(board, "U1").pins
    assert (first.name, first.kind, first.unused, first.net) == ("TX", "output", True, "N")
    assert (second.name, second.kind, second.unused, second.net) == ("PA1", "input", False, "")


def test_a_node_of_an_unlisted_part_brings_the_part_in():
    board = small("(comp (ref R1) (value 1k))", "(net (name N) (node (ref R1) (pin 1)) (node (ref U9) (pin 3)))")
    assert [(part.reference, part.value, len(part.pins)) for part in board.parts] == [("R1", "1k", 1), ("U9", "", 1)]
    assert "1 part (U9) on nets but not among the parts: value and symbol are unknown" in board.remarks


def test_a_net_given_twice_is_one_net():
    board = small(
        "(comp (ref R1) (value 1k))", "(net (name N) (node (ref R1) (pin 1))) (net (name N) (node (ref R1) (pin 2)))"
    )
    assert [net.pins for net in board.nets] == [(("R1", "1"), ("R1", "2"))]
    assert "1 net name (N) given more than once: taken as one net each" in board.remarks


def test_a_pin_on_two_nets_stays_on_the_first():
    board = small(
        "(comp (ref R1) (value 1k))", "(net (name N) (node (ref R1) (pin 1))) (net (name M) (node (ref R1) (pin 1)))"
    )
    assert pin_of(board, "R1", "1").net == "N"
    assert {net.name: net.pins for net in board.nets} == {"M": (), "N": (("R1", "1"),)}
    assert "1 pin (R1.1) on several nets: taken as on the first" in board.remarks


def test_a_node_given_twice_counts_once():
    board = small("(comp (ref R1) (value 1k))", "(net (name N) (node (ref R1) (pin 1)) (node (ref R1) (pin 1)))")
    assert board.nets[0].pins == (("R1", "1"),)


def test_nets_without_a_name_stay_apart():
    board = small(
        "(comp (ref R1) (value 1k))",
        "(net (code 7) (node (ref R1) (pin 1))) (net (code 8) (name) (node (ref R1) (pin 2)))",
    )
    assert [net.name for net in board.nets] == ["(net 7 without a name)", "(net 8 without a name)"]
    assert "a net without a name is called '(net 7 without a name)'" in board.remarks


def test_incomplete_nodes_and_parts_are_left_out_and_counted():
    board = small(
        "(comp (value 1k)) (comp (ref R1) (value 1k))",
        "(net (name N) (node (ref R1)) (node (pin 2)) (node (ref R1) (pin 1)))",
    )
    assert board.nets[0].pins == (("R1", "1"),)
    assert board.remarks[0] == "1 part without a reference left out"
    assert board.remarks.count("a node of the net 'N' names no part or no pin and was left out") == 2


def test_like_parts_of_one_reference_are_one_part():
    unit = "(comp (ref U1) (value x) (libsource (lib l) (part S)))"
    board = small(unit + unit, "(net (name N) (node (ref U1) (pin 1)))")
    assert len(board.parts) == 1
    assert "1 reference (U1) listed more than once, alike each time: taken as one part each" in board.remarks


@pytest.mark.parametrize(
    ("components", "nets", "what"),
    [
        (
            "(comp (ref R?) (value 1k)) (comp (ref R?) (value 2k))",
            "",
            "has different parts of the same reference: 1 reference (R?)",
        ),
        (
            "(comp (ref R?) (value 1k)) (comp (ref R?) (value 1k))",
            "(net (name N) (node (ref R?) (pin 1))) (net (name M) (node (ref R?) (pin 1)))",
            "has several parts called R?: pin 1 is on 'N' and on 'M'",
        ),
        ("", "", "holds no parts"),
    ],
)
def test_what_cannot_be_told_apart_is_refused(components, nets, what):
    with pytest.raises(InputError) as caught:
        small(components, nets)
    assert caught.value.what == what
    assert caught.value.remedy


def test_a_board_without_nets_says_so():
    assert "no net joins any pins" in small("(comp (ref R1) (value 1k))").remarks


def test_the_same_file_gives_the_same_board():
    assert read(OLD) == read(OLD)
    assert repr(read_netlist(DOOR)) == repr(read_netlist(DOOR))
