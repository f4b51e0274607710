"""The XML form gives the board of the bracketed form, and never reaches outside its file."""

from dataclasses import replace
from pathlib import Path

import pytest

from levelcrossing.errors import InputError
from levelcrossing.read.netlist import read_netlist
from levelcrossing.read.xml import read_xml

HERE = Path(__file__).parent
ROOT = HERE.parents[1]
PAIRS = sorted(
    path
    for folder in (HERE / "good_input", ROOT / "sample_boards")
    for path in folder.rglob("*.xml")
    if path.with_suffix(".net").exists()
)


def xml(text):
    return read_xml("board.xml", text.encode())


@pytest.mark.parametrize("path", PAIRS, ids=lambda path: path.stem)
def test_both_forms_give_the_same_board(path):
    # Both files are exports of one schematic. KiCad unescapes net names in XML, and only there.
    def plain(name):
        return name.replace("{slash}", "/")

    bracketed = read_netlist(path.with_suffix(".net"))
    parts = tuple(
        replace(part, pins=tuple(replace(pin, net=plain(pin.net)) for pin in part.pins)) for part in bracketed.parts
    )
    nets = tuple(sorted((replace(net, name=plain(net.name)) for net in bracketed.nets), key=lambda net: net.name))
    assert read_xml(path) == replace(bracketed, path=str(path), form="xml", parts=parts, nets=nets)


def test_two_nets_that_lost_their_difference_stay_apart():
    board = xml(
        "<export><components><comp ref='R1'/></components><nets>"
        "<net code='1' name='/a/b'><node ref='R1' pin='1' pintype='passive'/></net>"
        "<net code='2' name='/a/b'><node ref='R1' pin='2' pintype='passive'/></net></nets></export>"
    )
    assert [(net.name, net.pins) for net in board.nets] == [("/a/b", (("R1", "1"),)), ("/a/b (net 2)", (("R1", "2"),))]
    assert board.remarks == ("two nets are called '/a/b': the second is called '/a/b (net 2)'",)


def test_the_form_and_the_maker_are_told():
    board = read_xml(HERE / "good_input/door_sensor.xml")
    assert (board.form, board.maker) == ("xml", "Eeschema 9.0.2+dfsg-1")


def test_layout_is_dropped_and_text_is_kept():
    board = xml(
        "<export>\n <components>\n  <comp ref='R 1'>\n   <value> 10k\n</value>\n  </comp>\n </components>\n</export>\n"
    )
    assert (board.parts[0].reference, board.parts[0].value) == ("R 1", " 10k\n")


def test_pin_types_of_older_files():
    board = xml(
        "<export version='D'><components><comp ref='U1'><value>x</value>"
        "<libsource lib='l' part='S'/></comp></components>"
        "<libparts><libpart lib='l' part='T'><aliases><alias>S</alias></aliases>"
        "<pins><pin num='01' name='~' type='BiDi'/></pins></libpart></libparts><nets/></export>"
    )
    assert [(pin.number, pin.name, pin.kind) for pin in board.parts[0].pins] == [("01", "", "bidirectional")]


def test_a_declared_encoding_is_followed():
    head = "<?xml version='1.0' encoding='ISO-8859-1'?>"
    text = head + "<export><components><comp ref='R1'><value>Tür</value></comp></components></export>"
    assert read_xml("board.xml", text.encode("latin-1")).parts[0].value == "Tür"


@pytest.mark.parametrize(
    ("text", "line", "what"),
    [
        (
            "<?xml version='1.0'?>\n<!DOCTYPE export [<!ENTITY a 'b'>]>\n<export>&a;</export>",
            2,
            "declares a document type, which no KiCad netlist does",
        ),
        (
            "<!DOCTYPE export SYSTEM 'file:///etc/hostname'>\n<export/>",
            1,
            "declares a document type, which no KiCad netlist does",
        ),
        ("<export>\n<components>\n", 2, "is no sound XML: no element found"),
        ("<export>\n<components></export>", 2, "is no sound XML: mismatched tag"),
        ("<export>\n&nbsp;</export>", 2, "is no sound XML: undefined entity"),
        ("<export/>\n<export/>", 2, "is no sound XML: junk after document element"),
        ("<export>" + "<a>" * 100_000, 1, "nests elements more than 100 deep"),
        ("<board/>", 1, "is no KiCad netlist: it starts with 'board' instead of 'export'"),
        ("<export><components/></export>", 0, "holds no parts"),
        ("<export/>", 0, "holds no list of parts"),
        (
            "<?xml version='1.0' encoding='klingon'?><export/>",
            1,
            "is XML in an unknown encoding (unknown encoding: klingon)",
        ),
    ],
)
def test_bad_xml_gets_one_line(text, line, what):
    with pytest.raises(InputError) as caught:
        xml(text)
    assert (caught.value.what, caught.value.line) == (what, line)
    assert "\n" not in str(caught.value) and caught.value.remedy


def test_no_file_is_opened_for_an_external_entity(tmp_path):
    secret = tmp_path / "secret"
    secret.write_text("do not read")
    entity = f"<!DOCTYPE export [<!ENTITY x SYSTEM 'file://{secret}'>]>\n"
    text = entity + "<export><components><comp ref='&x;'/></components></export>"
    with pytest.raises(InputError) as caught:
        xml(text)
    assert "do not read" not in str(caught.value)
