"""Parts and nets are found again whatever they are called now."""

from __future__ import annotations

from kiln_logger import CHANNELS, board, kiln

from levelcrossing.matching import match_nets, match_parts, match_rows


def test_equal_channels_are_matched_as_wholes() -> None:
    """Everything renumbered and renamed: R1 of one channel must not be paired with the R11 of another."""
    names = {"U1": "U7", "U2": "U1", "C1": "C9", "C2": "C1"}
    names |= {f"R{channel}": f"R{9 - channel}" for channel in CHANNELS}
    names |= {f"R{channel + 10}": f"R{channel + (channel % 2)}{channel}" for channel in CHANNELS}
    renamed = {f"/OUT{channel}": f"Net-({channel})" for channel in CHANNELS} | {"+5V": "VCC", "/IN1": "/OUT1"}
    old, new = board(kiln()), board(kiln(), names, renamed)
    assert match_parts(old, new) == names
    nets = match_nets(old, new, names)
    assert nets["/OUT1"] == "Net-(1)"
    assert nets["/IN1"] == "/OUT1"
    assert nets["+5V"] == "VCC"


def test_parts_that_kept_their_names_keep_them() -> None:
    old = board(kiln())
    assert match_parts(old, old) == {part.reference: part.reference for part in old.parts}


def test_a_swapped_value_is_still_the_same_part() -> None:
    changed = kiln() | {"R1": ("22k", {"1": "/OUT1", "2": "/IN1"}), "U2": ("LOGGER-5", kiln()["U2"][1])}
    found = match_parts(board(kiln()), board(changed))
    assert found["R1"] == "R1"
    assert found["U2"] == "U2"


def test_symbol_identifiers_outweigh_likeness() -> None:
    """R1 and R2 exchanged their numbers and one of them its value; the identifiers of their symbols tell."""
    marks = {name: f"uuid-{name}" for name in kiln()}
    changed = kiln() | {"R1": ("22k", {"1": "/OUT1", "2": "/IN1"})}
    new = board(changed, {"R1": "R2", "R2": "R1"}, uuids=marks)
    found = match_parts(board(kiln(), uuids=marks), new)
    assert (found["R1"], found["R2"]) == ("R2", "R1")


def test_a_removed_part_matches_nothing() -> None:
    less = {name: part for name, part in kiln().items() if name != "R14"}
    found = match_parts(board(kiln()), board(less))
    assert "R14" not in found
    assert len(found) == len(less)


def test_rows_are_paired_from_strict_to_loose() -> None:
    def whole(row: str) -> str:
        return row

    def head(row: str) -> str | None:
        return row[0] if row[0] != "?" else None

    old, new = ["ab", "ac", "bd", "?x"], ["ac", "az", "be", "?x", "?y"]
    assert match_rows(old, new, [(whole, whole, False)]) == [(1, 0), (3, 3)]
    assert match_rows(old, new, [(whole, whole, False), (head, head, False)]) == [(0, 1), (1, 0), (2, 2), (3, 3)]
    twice = match_rows(["ab", "ac"], ["ad"], [(head, head, True)])
    assert twice == [], "a key that must single out one row singles out none"
