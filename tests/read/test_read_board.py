"""Whatever a path names gets a board or one line: kind, damage, encoding, size."""

import gzip
import io
import os
import random
import zipfile
from pathlib import Path

import pytest

from levelcrossing.errors import LevelcrossingError
from levelcrossing.model import Board
from levelcrossing.read import opening, read_board

HERE = Path(__file__).parent
ROOT = HERE.parents[1]
DOOR = HERE / "good_input/door_sensor.net"
EXPORT = "export a netlist from KiCad's schematic editor, or name the .kicad_sch"
PARTS = "(components (comp (ref R1) (value 1k)))"


def zipped():
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("board.net", DOOR.read_bytes())
    return packed.getvalue()


def cut(share):
    text = DOOR.read_bytes()
    return text[: int(len(text) * share)]


# name of the file, content, the whole answer after the file's name
BAD = {
    "empty": ("a.net", b"", ": is empty (export the netlist again)"),
    "blank": ("a.net", b" \r\n\t\n", ": is empty (export the netlist again)"),
    "old pcbnew form": (
        "a.net",
        b"# EESchema Netlist Version 1.1 created  Fri 12 Dec 2014\n(\n ( /53 $noname R1 1k)\n)\n*\n",
        ":1: is a netlist of the old pcbnew form (export it from KiCad 5 or newer in KiCad's own form)",
    ),
    "older pcbnew form": (
        "a.net",
        b"( { EESchema Netlist Version 1.1 created  Fri 12 Dec 2008 }\n)\n",
        ":1: is a netlist of the old pcbnew form (export it from KiCad 5 or newer in KiCad's own form)",
    ),
    "old sheet": (
        "a.sch",
        b"EESchema Schematic File Version 4\nEELAYER 30 0\n",
        ":1: is a sheet of KiCad 5 or older (open it in KiCad 6 or newer and save it, or export its netlist)",
    ),
    "old library": (
        "a.lib",
        b"EESchema-LIBRARY Version 2.4\n",
        f":1: is a symbol library of KiCad 5 or older ({EXPORT})",
    ),
    "layout": (
        "a.kicad_pcb",
        b"(kicad_pcb (version 20240108)\n)",
        f":1: is a board layout, which holds no pin types ({EXPORT})",
    ),
    "layout called netlist": (
        "a.net",
        b"\n(kicad_pcb (version 20240108))",
        f":1: is a board layout, which holds no pin types ({EXPORT})",
    ),
    "symbols": ("a.kicad_sym", b"(kicad_symbol_lib (version 20231120))", f":1: is a symbol library ({EXPORT})"),
    "footprint": ("a.kicad_mod", b'(footprint "R_0402")', f":1: is a footprint ({EXPORT})"),
    "frame": ("a.kicad_wks", b"(kicad_wks (version 20220228))", f":1: is a drawing frame ({EXPORT})"),
    "library table": ("sym-lib-table", b"(sym_lib_table\n)", f":1: is a table of libraries ({EXPORT})"),
    "EDIF": ("a.edn", b"(edif board (edifVersion 2 0 0))", f":1: is a netlist in EDIF form ({EXPORT})"),
    "router": ("a.dsn", b'(pcb "a.dsn" (parser))', f":1: is a layout for a router ({EXPORT})"),
    "SPICE": ("a.cir", b".title KiCad schematic\nR1 a b 1k\n.end\n", f":1: is a SPICE deck ({EXPORT})"),
    "foreign netlist 1": (
        "a.net",
        b"$PACKAGES\n! R0402 ; R1\n",
        f":1: is a netlist, but not in KiCad's form ({EXPORT})",
    ),
    "foreign netlist 2": ("a.net", b"[\nR1\nR0402\n]\n", f":1: is a netlist, but not in KiCad's form ({EXPORT})"),
    "Gerber": ("a.gbr", b"%FSLAX46Y46*%\n%MOMM*%\n", f":1: is a Gerber layer ({EXPORT})"),
    "Gerber comment": ("a.gtl", b"G04 #@! TF.FileFunction*\n", f":1: is a Gerber layer ({EXPORT})"),
    "drill": ("a.drl", b"M48\nMETRIC\n", f":1: is a drill file ({EXPORT})"),
    "PDF": ("a.pdf", b"%PDF-1.5\n%\xb5\xed", f":1: is a PDF document ({EXPORT})"),
    "zip": ("a.zip", zipped(), ":1: is a zip archive (unpack it and name the netlist within)"),
    "gzip": (
        "a.net.gz",
        gzip.compress(b"x", mtime=0),
        ":1: is a packed archive (unpack it and name the netlist within)",
    ),
    "picture": ("a.png", b"\x89PNG\r\n\x1a\n\0\0", f":1: is a picture ({EXPORT})"),
    "web page": (
        "a.net",
        b"<!DOCTYPE html>\n<html><body>board.net</body></html>",
        ":1: is a web page (download the file itself, not the page that shows it)",
    ),
    "JSON": ("a.json", b'{"form": 1}', f":1: is JSON data ({EXPORT})"),
    "pointer": (
        "a.net",
        b"version https://git-lfs.github.com/spec/v1\noid sha256:00\nsize 1\n",
        ":1: is a pointer to a large file that was not fetched (fetch it with git lfs pull)",
    ),
    "merge": (
        "a.net",
        b"<<<<<<< HEAD\n(export (version E)\n=======\n",
        ":1: holds the marks of an unsettled merge (settle the merge and export again)",
    ),
    "prose": ("readme.txt", b"Dear reader,\n", f":1: is no KiCad netlist and no sheet ({EXPORT})"),
    "noise": ("a.bin", bytes(range(1, 256)) + b"\0x", f": is no text (it holds zero bytes) ({EXPORT})"),
    "UTF-16": (
        "a.net",
        "(export (version E))".encode("utf-16"),
        ":1: is UTF-16 text (save it as UTF-8, or export it again)",
    ),
    "UTF-16 without a mark": (
        "a.net",
        "(export (version E))".encode("utf-16-le"),
        ":1: is UTF-16 text (save it as UTF-8, or export it again)",
    ),
    "truncated": (
        "a.net",
        b"(export (version E)\n (components\n  (comp (ref R1)\n   (value 1k",
        ":4: is cut off: the bracket '(value 1k' of this line is never closed (export it again)",
    ),
    "truncated within a text": (
        "a.net",
        b'(export (version E)\n (components\n  (comp (ref "R1',
        ":3: ends within a quoted text that begins here (export it again)",
    ),
    "bracket too many": (
        "a.net",
        f"(export (version E)\n {PARTS}))\n".encode(),
        ":2: closes a bracket that nothing opened (export it again)",
    ),
    "two netlists": (
        "a.net",
        f"(export (version E) {PARTS})\n(export)".encode(),
        ":2: goes on after the bracket that ends the netlist (export it again)",
    ),
    "other words": (
        "a.net",
        b"(netlist (components))",
        ":1: is no KiCad netlist: it starts with 'netlist' instead of 'export' (export it again)",
    ),
    "nested": (
        "a.net",
        b"(export\n" + b"(" * 100_000,
        ":2: nests brackets more than 100 deep (no netlist does; export it again)",
    ),
    "no parts": (
        "a.net",
        b"(export (version E) (components) (nets))",
        ": holds no parts (export it from a schematic that has symbols on it)",
    ),
    "no list of parts": (
        "a.net",
        b"(export (version E))",
        ": holds no list of parts (export it from a schematic that has symbols on it)",
    ),
    "unannotated": (
        "a.net",
        b"(export (components (comp (ref R?) (value 1k)) (comp (ref R?) (value 2k))))",
        ": has different parts of the same reference: 1 reference (R?) (annotate the schematic and export it again)",
    ),
    "XML with a document type": (
        "a.xml",
        b'<?xml version="1.0"?>\n<!DOCTYPE export SYSTEM "x.dtd">\n<export/>',
        ":2: declares a document type, which no KiCad netlist does"
        " (export it again; document types are refused because they can reach outside the file)",
    ),
    "truncated XML": (
        "a.xml",
        b'<?xml version="1.0"?>\n<export>\n<components>',
        ":3: is no sound XML: no element found (export it again)",
    ),
    "XML of something else": (
        "a.xml",
        b'<?xml version="1.0"?>\n<drawing/>',
        ":1: is no KiCad netlist: it starts with 'drawing' instead of 'export' (export it again)",
    ),
}


def answer(path):
    """Return what a path is answered with, without the path; the test fails when it is answered with a board."""
    with pytest.raises(LevelcrossingError) as caught:
        read_board(path)
    text = str(caught.value)
    assert text.startswith(str(path)) and "\n" not in text
    return text.removeprefix(str(path))


@pytest.mark.parametrize("name", BAD)
def test_a_bad_file_gets_its_one_line(name, tmp_path):
    file, content, expected = BAD[name]
    path = tmp_path / file
    path.write_bytes(content)
    assert answer(path) == expected


def test_the_table_is_long_enough():
    assert len(BAD) >= 30


@pytest.mark.parametrize("share", [0.01, 0.2, 0.5, 0.8, 0.99])
def test_a_netlist_cut_anywhere_names_a_line_of_the_file(share, tmp_path):
    path = tmp_path / "cut.net"
    path.write_bytes(cut(share))
    text = answer(path)
    line = int(text.split(":")[1])
    assert 1 <= line <= path.read_bytes().count(b"\n") + 1
    assert "is cut off" in text or "ends within a quoted text" in text


# ----------------------------------------------------------------------------------------------- what is no file at all


def test_a_missing_file(tmp_path):
    assert answer(tmp_path / "none.net") == ": does not exist (check the path)"


def test_a_folder_without_a_project(tmp_path):
    assert answer(tmp_path) == ": is a folder without a KiCad project (name a project, a sheet or a netlist)"


def test_a_folder_that_holds_a_netlist_names_it(tmp_path):
    (tmp_path / "board.net").write_bytes(DOOR.read_bytes())
    expected = f": is a folder without a KiCad project (name the netlist itself: {tmp_path / 'board.net'})"
    assert answer(tmp_path) == expected


def test_a_pipe_is_not_waited_for(tmp_path):
    pipe = tmp_path / "pipe.net"
    os.mkfifo(pipe)
    assert answer(pipe) == ": is a pipe or a device, not a file (write the netlist to a file and name that)"


def test_a_device_is_not_read():
    assert answer("/dev/zero") == ": is a pipe or a device, not a file (write the netlist to a file and name that)"


def test_a_file_that_may_not_be_read(tmp_path, monkeypatch):
    path = tmp_path / "board.net"
    path.write_bytes(DOOR.read_bytes())

    def refuse(*_, **__):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    assert answer(path) == ": may not be read (check its permissions)"


def test_links_that_lead_round_in_a_circle(tmp_path):
    (tmp_path / "a.net").symlink_to(tmp_path / "b.net")
    (tmp_path / "b.net").symlink_to(tmp_path / "a.net")
    assert answer(tmp_path / "a.net").startswith(": cannot be read: ")


@pytest.mark.parametrize("path", ["a\0b.net", "x" * 5000])
def test_paths_that_cannot_be(path):
    assert answer(path).startswith(": cannot be read: ")


def test_a_gigabyte_of_brackets_is_refused_unread(tmp_path, monkeypatch):
    path = tmp_path / "huge.net"
    with path.open("wb") as stream:
        stream.write(b"(export" + b"(" * 1000)
        stream.truncate(1_000_000_000)  # a sparse file
    monkeypatch.setattr(Path, "open", None)  # must not be called
    assert (
        answer(path) == ": has 1,000 MB, more than the 100 MB that are read (no netlist is that large; check the path)"
    )


def test_a_file_that_grows_while_it_is_read(tmp_path, monkeypatch):
    path = tmp_path / "board.net"
    path.write_bytes(DOOR.read_bytes())
    monkeypatch.setattr(opening, "LARGEST_BYTES", path.stat().st_size)
    assert isinstance(read_board(path), Board)
    monkeypatch.setattr(opening, "LARGEST_BYTES", path.stat().st_size - 1)
    assert ", more than the " in answer(path)


# ------------------------------------------------------------------------------------------- what is read all the same


@pytest.mark.parametrize("name", ["board.net", "board.txt", "board", "board.xml"])
def test_the_content_decides_and_not_the_name(name, tmp_path):
    for source, form in ((DOOR, "netlist"), (DOOR.with_suffix(".xml"), "xml")):
        path = tmp_path / name
        path.write_bytes(source.read_bytes())
        assert read_board(path).form == form


@pytest.mark.parametrize("path", [DOOR, str(DOOR)])
def test_the_board_carries_the_path_as_given(path):
    assert read_board(path).path == str(DOOR)


def test_a_byte_order_mark_and_foreign_line_ends_change_nothing(tmp_path):
    path = tmp_path / "board.net"
    path.write_bytes(b"\xef\xbb\xbf" + DOOR.read_bytes().replace(b"\n", b"\r\n") + b"\r\n\x1a")
    board, usual = read_board(path), read_board(DOOR)
    assert (board.parts, board.nets, board.remarks) == (usual.parts, usual.nets, usual.remarks)


def test_latin_1_is_read_with_a_remark(tmp_path):
    path = tmp_path / "board.net"
    path.write_bytes("(export (version D)\n (components (comp (ref R1) (value Tür))))".encode("latin-1"))
    board = read_board(path)
    assert board.parts[0].value == "Tür"
    assert board.remarks[0] == "line 2 is not UTF-8: the file was read as Latin-1, some letters may be wrong"


def test_a_sheet_is_read_as_the_netlist_made_from_it():
    from_sheet, from_netlist = read_board(DOOR.with_suffix(".kicad_sch")), read_board(DOOR)
    assert from_sheet.form == "sheets"
    assert from_sheet.nets == from_netlist.nets
    told = [
        {(part.reference, part.value, part.fitted, part.not_fitted_why) for part in board.parts}
        for board in (from_sheet, from_netlist)
    ]
    assert told[0] == told[1]


# ------------------------------------------------------------------------------------------------------------ by chance

WORDS = [
    b"(",
    b")",
    b'"',
    b"\\",
    b"\0",
    b"\xff",
    b"(comp",
    b"(nets",
    b"(net (name",
    b"<",
    b"&",
    b"\n",
    b"]]>",
    b"<!--",
    b"export",
]


def damaged(content, chance):
    """Return content with a few bytes changed, lost, doubled or moved."""
    content = bytearray(content)
    for _ in range(chance.randint(1, 6)):
        at = chance.randrange(len(content) + 1)
        end = min(len(content), at + chance.randint(1, 60))
        what = chance.randrange(5)
        if what == 0 and at < len(content):
            content[at] = chance.randrange(256)
        elif what == 1:
            del content[at:end]
        elif what == 2:
            content[at:at] = content[at:end]
        elif what == 3:
            content[at:at] = chance.choice(WORDS)
        else:
            del content[at:]
    return bytes(content)


@pytest.mark.parametrize("source", [DOOR, DOOR.with_suffix(".xml")], ids=["brackets", "xml"])
def test_damage_by_chance_gives_a_board_or_one_line(source, tmp_path):
    chance = random.Random(20_000_101)
    content = source.read_bytes()
    path = tmp_path / "board.net"
    boards = refusals = 0
    for _ in range(500):
        path.write_bytes(damaged(content, chance))
        try:
            board = read_board(path)
        except LevelcrossingError as error:
            assert "\n" not in str(error)
            refusals += 1
        else:
            known = {(pin.part, pin.number) for part in board.parts for pin in part.pins}
            assert all(pin in known for net in board.nets for pin in net.pins)
            boards += 1
    assert boards > 10 and refusals > 10  # both ways were walked


# ------------------------------------------------------------------------------------------------- a collection beside

NETLISTS = sorted([DOOR, *(ROOT / "sample_boards").rglob("*.net"), *(ROOT.parent / "shared/boards").glob("*/*.net")])


def counted(text):
    """Count parts, nets and nodes by their opening words alone: a second way to the same figures."""
    body = text[text.index("(nets") :] if "(nets" in text else ""
    return text.count("(comp (ref"), body.count("(net (code"), body.count("(node (ref")


@pytest.mark.parametrize("path", NETLISTS, ids=lambda path: path.stem)
def test_nothing_of_a_netlist_is_lost(path):
    board = read_board(path)
    on_nets = sum(len(net.pins) for net in board.nets)
    assert (len(board.parts), len(board.nets), on_nets) == counted(path.read_text(encoding="utf-8"))
    placed = {(pin.part, pin.number): pin.net for part in board.parts for pin in part.pins}
    assert all(placed[pin] == net.name for net in board.nets for pin in net.pins)
    assert all(pin.kind for part in board.parts for pin in part.pins)
