"""Sheets read without KiCad: the same board as KiCad's own export."""

from __future__ import annotations

import contextlib
import gzip
import importlib.util
import json
import os
import random
import re
import shutil
import sys
from collections import Counter
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
from kiutils.schematic import Schematic

from levelcrossing.errors import InputError
from levelcrossing.model import Board
from levelcrossing.read import read_board, sheet_files
from levelcrossing.read.places import Places
from levelcrossing.read.sheet_files import read_sheet_file
from levelcrossing.read.sheet_names import Bus, as_net_name, bus_of, resolve, unit_letters
from levelcrossing.read.sheet_project import find_root
from levelcrossing.read.sheets import read_sheets

HERE = Path(__file__).parent
SMALL = HERE / "small_sheets"
DEMOS = Path(os.environ.get("KICAD_DEMOS", "/usr/share/kicad/demos"))
DEMO_FACTS = HERE / "reference" / "kicad_demos_6.0.11.json.gz"


def _module(path: Path) -> ModuleType:
    spec = importlib.util.spec_from_file_location(path.stem, path)
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[path.stem] = module
    spec.loader.exec_module(module)
    return module


Drawing = _module(SMALL / "draw.py").Drawing
CASES = _module(SMALL / "cases.py").CASES
facts_of = _module(HERE / "reference" / "condense.py").facts_of
EXPECTED: dict[str, Any] = json.loads((SMALL / "expected.json").read_text(encoding="utf-8"))


def differences(found: dict[str, Any], expected: dict[str, Any]) -> list[str]:
    """Return what differs between two boards' facts, one line each."""
    lines = []
    for kind in ("nets", "parts"):
        for name in sorted({*found[kind], *expected[kind]}):
            one, other = found[kind].get(name), expected[kind].get(name)
            if one != other:
                lines.append(f"{kind} {name}: {one} instead of {other}")
    return lines


# ------------------------------------------------------------------------------------- one rule of connectivity each


def test_every_small_project_has_an_expected_board() -> None:
    assert sorted(CASES) == sorted(EXPECTED)
    assert len(CASES) >= 30


@pytest.mark.parametrize("name", CASES)
def test_small_project_reads_as_kicad_exports_it(name: str) -> None:
    board = read_board(SMALL / f"{name}.kicad_sch")
    found = json.loads(json.dumps(facts_of(board)))
    assert differences(found, EXPECTED[name]) == []
    assert found["sheets"] == EXPECTED[name]["sheets"]


def test_small_projects_are_as_drawn() -> None:
    drawn = {drawing.name: drawing.text() for name, draw in CASES.items() for drawing in draw(name)}
    assert {file.stem: file.read_text(encoding="utf-8") for file in SMALL.glob("*.kicad_sch")} == drawn


# ------------------------------------------------------------------------------------------------------ real projects


def _demo_names() -> list[str]:
    return sorted(json.loads(gzip.decompress(DEMO_FACTS.read_bytes())))


@pytest.mark.skipif(not DEMOS.is_dir(), reason="Debian's package kicad-demos is not installed")
@pytest.mark.parametrize("name", _demo_names())
def test_demo_project_reads_as_kicad_exports_it(name: str) -> None:
    expected = json.loads(gzip.decompress(DEMO_FACTS.read_bytes()))[name]
    found = json.loads(json.dumps(facts_of(read_board(DEMOS / name))))
    for part in found["parts"].values():
        part["fields"] = [item for item in part["fields"] if not item[0].startswith("Sim.")]
    for reference, known in KICAD_REWRITES.get(name, {}).items():
        for key in known:
            found["parts"][reference][key] = expected["parts"][reference][key]
    assert differences(found, expected) == []


# What KiCad 9 changes of its own accord when it opens these sheets of KiCad 6 (see reference/README.md).
KICAD_REWRITES = {
    "simulation/v_i_sources/v_i_sources.kicad_sch": {"I2": ("value",), "V2": ("value",)},
}


@pytest.mark.skipif(not DEMOS.is_dir(), reason="Debian's package kicad-demos is not installed")
def test_kiutils_counts_the_same_things_on_real_sheets() -> None:
    """A second reader: kiutils' own objects, on every sheet of the demos."""
    count = 0
    for file in sorted(DEMOS.rglob("*.kicad_sch")):
        ours = read_sheet_file(file, file.name)
        theirs = Schematic.from_file(str(file), encoding="utf-8")
        lines = Counter(
            item.type for item in theirs.graphicalItems if hasattr(item, "points") and hasattr(item, "type")
        )
        assert len(ours.symbols) == len(theirs.schematicSymbols), file
        assert len(ours.library) == len(theirs.libSymbols), file
        assert len(ours.boxes) == len(theirs.sheets), file
        assert len(ours.crosses) == len(theirs.noConnects), file
        assert sum(line.kind == "wire" for line in ours.lines) == lines["wire"], file
        assert sum(line.kind == "bus" for line in ours.lines) == lines["bus"], file
        kinds = Counter(label.kind for label in ours.labels)
        assert kinds["local"] == len(theirs.labels) and kinds["global"] == len(theirs.globalLabels), file
        assert kinds["hierarchical"] == len(theirs.hierarchicalLabels), file
        pins = {symbol.libId: sum(len(unit.pins) for unit in symbol.units) for symbol in theirs.libSymbols}
        assert {name: len(symbol.pins) for name, symbol in ours.library.items()} == pins, file
        count += 1
    assert count >= 30


# ----------------------------------------------------------------------------------------------------- finding the root


@pytest.fixture
def project(tmp_path: Path) -> Path:
    for file in SMALL.glob("three_levels*.kicad_sch"):
        shutil.copy(file, tmp_path)
    return tmp_path


def _nets(board: Board) -> tuple[object, ...]:
    return board.parts, board.nets


def test_root_folder_project_file_and_sub_sheet_are_one_board(project: Path) -> None:
    root = project / "three_levels.kicad_sch"
    expected = _nets(read_sheets(root))
    below = read_sheets(project / "three_levels_deep.kicad_sch")
    assert _nets(below) == expected
    assert below.remarks == (
        "three_levels_deep.kicad_sch is a sub-sheet: the whole board was read from three_levels.kicad_sch",
    )
    assert _nets(read_sheets(project)) == expected
    (project / "three_levels.kicad_pro").write_text("{}", encoding="utf-8")
    assert _nets(read_sheets(project / "three_levels.kicad_pro")) == expected
    assert _nets(read_sheets(project)) == expected
    assert find_root(project / "three_levels_below.kicad_sch") == root


def test_a_sub_sheet_in_a_folder_below_leads_to_its_project(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "sheets"
    folder.mkdir()
    root, below = Drawing("root").tp(("TP1", 0, 0)), Drawing("below", number=2)
    root.sheet("in", below, 20, 0, [], file="sheets/below.kicad_sch")
    below.tp(("TP2", 0, 0)).label("NAMED", 0, 0)
    root.save(tmp_path)
    below.save(folder)
    assert find_root(folder / "below.kicad_sch") == folder / "below.kicad_sch"  # no project in sight
    (tmp_path / "root.kicad_pro").write_text("{}", encoding="utf-8")
    assert find_root(folder / "below.kicad_sch") == tmp_path / "root.kicad_sch"
    monkeypatch.chdir(folder)
    board = read_sheets("below.kicad_sch")
    assert [part.reference for part in board.parts] == ["TP1", "TP2"]
    place = Places(board).place_of_net("/in/NAMED")
    assert place is not None
    assert Path(place.file).resolve() == (folder / "below.kicad_sch").resolve()


def test_a_sheet_with_a_project_of_its_own_is_a_root(project: Path) -> None:
    (project / "three_levels_below.kicad_pro").write_text("{}", encoding="utf-8")
    assert find_root(project / "three_levels_below.kicad_sch").stem == "three_levels_below"
    # and it reads alone, its references taken from the symbols themselves
    assert {part.reference for part in read_sheets(project / "three_levels_below.kicad_sch").parts} == {
        "TP1", "TP2", "TP3", "TP4", "TP9",
    }  # fmt: skip


def _refusal(path: Path) -> str:
    with pytest.raises(InputError) as caught:
        read_sheets(path)
    text = str(caught.value)
    assert "\n" not in text
    return text


def test_a_folder_must_leave_no_choice(project: Path) -> None:
    for name in ("three_levels", "three_levels_below"):
        (project / f"{name}.kicad_pro").write_text("{}", encoding="utf-8")
    assert "holds 2 projects: three_levels.kicad_pro, three_levels_below.kicad_pro" in _refusal(project)
    for file in project.glob("*.kicad_pro"):
        file.unlink()
    shutil.copy(SMALL / "net_tie.kicad_sch", project)
    assert "several sheets and no project file: net_tie.kicad_sch, three_levels.kicad_sch" in _refusal(project)


def test_empty_and_old_folders_are_told_apart(tmp_path: Path) -> None:
    assert "holds no KiCad sheet" in _refusal(tmp_path)
    (tmp_path / "old.sch").write_text("EESchema Schematic File Version 4\n", encoding="utf-8")
    assert "holds sheets of KiCad 5 or older (old.sch)" in _refusal(tmp_path)
    assert "is a sheet of KiCad 5 or older" in _refusal(tmp_path / "old.sch")
    (tmp_path / "lone.kicad_pro").write_text("{}", encoding="utf-8")
    assert "has no sheet of the same name beside it" in _refusal(tmp_path / "lone.kicad_pro")


# ------------------------------------------------------------------------------------------------------------ bad input


def _write(folder: Path, *drawings: Any) -> Path:
    for drawing in drawings:
        drawing.save(folder)
    return folder / f"{drawings[0].name}.kicad_sch"


def test_a_missing_sub_sheet_is_named_with_its_line(project: Path) -> None:
    (project / "three_levels_deep.kicad_sch").unlink()
    text = _refusal(project / "three_levels.kicad_sch")
    assert "names the sub-sheet three_levels_deep.kicad_sch, which does not exist" in text
    line = int(text.split(":")[1])
    assert (
        "three_levels_deep.kicad_sch" in (project / "three_levels_below.kicad_sch").read_text().splitlines()[line - 1]
    )


def test_a_loop_of_sheets_is_refused(tmp_path: Path) -> None:
    one, two = Drawing("one"), Drawing("two", number=2)
    one.tp(("TP1", 0, 0)).sheet("down", two, 20, 0, [])
    two.sheet("up", one, 20, 0, [])
    assert "is a sub-sheet of itself" in _refusal(_write(tmp_path, one, two))
    selfish = Drawing("selfish").tp(("TP1", 0, 0))
    selfish.sheet("again", selfish, 20, 0, [])
    assert "is a sub-sheet of itself" in _refusal(_write(tmp_path, selfish))


def test_a_sheet_outside_the_folder_is_read_with_a_remark(tmp_path: Path) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    root, shared = Drawing("root").tp(("TP1", 0, 0)), Drawing("shared", number=2)
    root.sheet("out", shared, 20, 0, [], file="../shared.kicad_sch")
    shared.tp(("TP2", 0, 0))
    root.save(inner)
    shared.save(tmp_path)
    board = read_sheets(inner / "root.kicad_sch")
    assert [part.reference for part in board.parts] == ["TP1", "TP2"]
    assert board.remarks == ("../shared.kicad_sch: the sheet lies outside the project's folder",)
    assert board.sheet_files == ("root.kicad_sch", "../shared.kicad_sch")


def test_a_file_that_changes_while_it_is_read_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = _write(tmp_path, Drawing("moving").tp(("TP1", 0, 0)))
    read_bytes = Path.read_bytes

    def meddle(self: Path) -> bytes:
        data = read_bytes(self)
        self.write_bytes(data + b"\n")
        return data

    monkeypatch.setattr(Path, "read_bytes", meddle)
    assert "changed while it was being read (run the review again)" in _refusal(path)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "is empty"),
        ("(kicad_sch (version 20250114)\n (wire (pts (xy 1 2)", ":2: is cut off"),
        ("(kicad_sch (version 20250114)\n))))", ":2: closes a bracket that nothing opened"),
        ("(kicad_sch (version 20250114)", ":1: is cut off"),
        ('(kicad_sch (version 20250114)\n\n (label "A', ":3: ends within a quoted text"),
        ("(kicad_pcb (version 20250114))", "is no KiCad sheet"),
        ("(kicad_sch (version 20190101))", "older than KiCad 6"),
        ("(kicad_sch (version 20250114))", "holds no parts"),
        ("(kicad_sch (version twelve))", "something that no KiCad sheet has"),
        ("(kicad_sch (version 20250114) (wire (pts (xy 1) (xy 2 3))))", "something that no KiCad sheet has"),
        ("(kicad_sch (version 20250114) (label))", "something that no KiCad sheet has"),
        ("(kicad_sch" + "(" * 100_000 + ")" * 100_001, "is nested too deep"),
        ("(kicad_sch " + "( " * 100_000 + ")" * 100_001, ""),
        ("EESchema Schematic File Version 4\n", "KiCad 5 or older"),
    ],
)
def test_bad_text_gets_one_clear_line(tmp_path: Path, text: str, says: str) -> None:
    path = tmp_path / "bad.kicad_sch"
    path.write_text(text, encoding="utf-8")
    assert says in _refusal(path)


def test_other_encodings_folders_and_sizes_get_one_clear_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "latin.kicad_sch"
    path.write_bytes(b'(kicad_sch (version 20250114)\n (label "\xb5C"))')
    assert "latin.kicad_sch:2: is not UTF-8 text" in _refusal(path)
    folder = tmp_path / "folder.kicad_sch"
    folder.mkdir()
    assert "holds no KiCad sheet" in _refusal(folder)
    assert "cannot be read: No such file" in _refusal(tmp_path / "none.kicad_sch")
    monkeypatch.setattr(sheet_files, "LARGEST_FILE_BYTES", 10)
    assert "more than the" in _refusal(path)


def test_every_truncation_is_refused_or_read(tmp_path: Path) -> None:
    """Cut anywhere, a sheet gives an InputError, never another one."""
    text = (SMALL / "hidden_supply.kicad_sch").read_text(encoding="utf-8")
    shutil.copy(SMALL / "hidden_supply_below.kicad_sch", tmp_path)
    path = tmp_path / "hidden_supply.kicad_sch"
    for end in range(0, len(text) - 2, 37):
        path.write_text(text[:end], encoding="utf-8")
        _refusal(path)


@pytest.mark.parametrize("name", ["hidden_supply", "bus_groups", "sheets_of_kicad_6", "fields_and_flags"])
def test_meddled_text_is_refused_or_read(tmp_path: Path, name: str) -> None:
    """Words lost, doubled and swapped give a board or an InputError, never another one."""
    for file in SMALL.glob(f"{name}*.kicad_sch"):
        shutil.copy(file, tmp_path)
    path = tmp_path / f"{name}.kicad_sch"
    words = re.findall(r'"(?:[^"\\\\]|\\\\.)*"|[()]|[^\s()"]+', path.read_text(encoding="utf-8"))
    chance = random.Random(3)
    for _ in range(150):
        meddled = list(words)
        for _ in range(chance.choice((1, 1, 3, 8))):
            at = chance.randrange(len(meddled))
            other = chance.choice([*words, "nan", "1e999", "-1", '"${X}"', '""', "hide"])
            meddled[at : at + 1] = chance.choice(([], [other], [meddled[at], other], [meddled[at]] * 2))
        path.write_text(" ".join(meddled), encoding="utf-8")
        with contextlib.suppress(InputError):
            read_board(path)


def test_a_newer_version_is_read_with_a_remark(tmp_path: Path) -> None:
    path = _write(tmp_path, Drawing("newer", version=20991231).tp(("TP1", 0, 0)))
    (remark,) = read_sheets(path).remarks
    assert "file version 20991231 is newer than those known" in remark


def test_one_reference_for_different_parts_is_refused(tmp_path: Path) -> None:
    root, below = Drawing("root"), Drawing("below", number=2)
    root.part("own:R", "R1", 0, 0, value="1k").sheet("below", below, 20, 0, [])
    below.part("own:R", "R1", 0, 0, value="2k")
    assert "has different parts of the same reference: R1 (annotate the schematic)" in _refusal(
        _write(tmp_path, root, below)
    )


# ---------------------------------------------------------------------------- what KiCad 9 cannot be asked to export


def test_local_power_symbols_name_nets_of_their_sheet(tmp_path: Path) -> None:
    """KiCad 10 knows power symbols that hold for one sheet: like a local label, but before it."""
    root, below = Drawing("root"), Drawing("below", number=2)
    for drawing, number in ((root, 1), (below, 2)):
        drawing.wire((0, 0), (5, 0)).part("own:LOC", f"#PWR0{number}", 0, 0, value="VA").label("ALSO", 5, 0)
        drawing.tp((f"TP{number}", 5, 0))
    root.sheet("below", below, 20, 0, [])
    nets = {net.name: net.pins for net in read_sheets(_write(tmp_path, root, below)).nets}
    assert nets == {"/VA": (("TP1", "1"),), "/below/VA": (("TP2", "1"),)}


def test_derived_symbols_have_the_pins_of_their_parent(tmp_path: Path) -> None:
    sheet = Drawing("derived").part("own:DERIVED", "Q1", 0, 0).label("BASE", 0, 0).label("EMITTER", 3, 0)
    board = read_sheets(_write(tmp_path, sheet))
    assert [(pin.number, pin.name, pin.net) for pin in board.parts[0].pins] == [
        ("1", "B", "/BASE"),
        ("2", "E", "/EMITTER"),
    ]


def test_project_variables_and_aliases_are_taken_from_the_project_file(tmp_path: Path) -> None:
    sheet = Drawing("root").label("${RAIL}_IN", 0, 0).tp(("TP1", 0, 0)).label("S1", 5, 0).tp(("TP2", 5, 0))
    sheet.bus((0, 5), (9, 5)).label("{PAIR}", 1, 5)
    path = _write(tmp_path, sheet)
    path.with_suffix(".kicad_pro").write_text('{"text_variables": {"RAIL": "3V3"}}', encoding="utf-8")
    assert [net.name for net in read_sheets(path).nets] == ["/3V3_IN", "/S1"]
    tops = '{"schematic": {"top_level_sheets": [{}, {}], "bus_aliases": {"PAIR": ["S1", "S2"]}}}'
    path.with_suffix(".kicad_pro").write_text(tops, encoding="utf-8")
    assert "the project has 2 top-level sheets; only root.kicad_sch" in read_sheets(path).remarks[0]
    path.with_suffix(".kicad_pro").write_text("{broken", encoding="utf-8")
    assert [net.name for net in read_sheets(path).nets] == ["/${RAIL}_IN", "/S1"]


# --------------------------------------------------------------------------------------------------------- names alone


@pytest.mark.parametrize(
    ("text", "vector", "members"),
    [
        ("D[0..2]", True, "D0 D1 D2"),
        ("D[2..0]", True, "D0 D1 D2"),
        ("~{D[0..1]}", True, "~{D0} ~{D1}"),
        ("M{D[0..1] CK}", False, "M.D0 M.D1 M.CK"),
        ("{A B}", False, "A B"),
        ("{IIC}", False, "SDA SCL"),
        ("USB{IIC}", False, "USB.SDA USB.SCL"),
        ("{OUTER}", False, "Q0 Q1 SDA SCL"),
        ("X{A/B}", False, "X.A{slash}B"),
    ],
)
def test_bus_texts_are_taken_apart(text: str, vector: bool, members: str) -> None:
    found = bus_of(text, {"IIC": ("SDA", "SCL"), "OUTER": ("Q[0..1]", "IIC")})
    assert isinstance(found, Bus)
    assert (found.vector, " ".join(member.name for member in found.members)) == (vector, members)


@pytest.mark.parametrize("text", ["D0", "~{CS}", "A{slash}B", "D[0]", "D [0..1]", "{", "X{}", "_{A} B", "D[1.2]"])
def test_other_texts_are_no_bus(text: str) -> None:
    assert bus_of(text, {}) is None


def test_an_alias_of_itself_ends() -> None:
    found = bus_of("{A}", {"A": ("A", "B")})
    assert found is not None and {member.name for member in found.members} == {"A", "B"}


def test_variables_resolve_in_each_other_and_end() -> None:
    known = {"A": "a${B}", "B": "b", "LOOP": "${LOOP}!"}
    assert resolve("${A}-${NONE}", known.get) == "ab-${NONE}"
    assert resolve("${LOOP}", known.get).startswith("${LOOP}!")


def test_small_spellings() -> None:
    assert as_net_name("a/b\nc") == "a{slash}bc"
    assert [unit_letters(unit) for unit in (1, 26, 27, 52, 53)] == ["A", "Z", "AA", "AZ", "BA"]
