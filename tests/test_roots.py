"""Changed files lead to the boards they belong to, and each board is reviewed once."""

from __future__ import annotations

from pathlib import Path

import pytest

from levelcrossing.roots import boards_of


def _sheet(*children: str) -> str:
    boxes = "".join(
        f'\n  (sheet (at 0 0)\n    (property "Sheetname" "s")\n    (property "Sheetfile" "{name}"))'
        for name in children
    )
    return f"(kicad_sch (version 20230121){boxes}\n)\n"


@pytest.fixture
def project(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a repository with two boards that share a sheet, one of them with sheets in sheets."""
    (tmp_path / ".git").mkdir()
    for name, text in {
        "gauge/gauge.kicad_sch": _sheet("radio.kicad_sch", "../common/power.kicad_sch"),
        "gauge/gauge.kicad_pro": "{}",
        "gauge/radio.kicad_sch": _sheet("parts/filter.kicad_sch"),
        "gauge/parts/filter.kicad_sch": _sheet(),
        "logger/logger.kicad_sch": _sheet("../common/power.kicad_sch").replace("Sheetfile", "Sheet file"),
        "common/power.kicad_sch": _sheet(),
        "common/unused.kicad_sch": _sheet(),
        "gauge/gauge.net": '(export (version "E")\n  (design\n    (source "/home/x/gauge/gauge.kicad_sch")))',
        "gauge/out/export.net": '(export (version "E")\n  (design\n    (source "C:\\\\x\\\\gauge.kicad_sch")))',
        "other/simulation.net": "* RC low pass\nR1 a b 1k\n.end\n",
        "other/lone.net": '(export (version "E"))',
    }.items():
        (tmp_path / name).parent.mkdir(exist_ok=True, parents=True)
        (tmp_path / name).write_text(text, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize(
    ("changed", "boards"),
    [
        (["gauge/gauge.kicad_sch"], ["gauge/gauge.kicad_sch"]),
        (["gauge/radio.kicad_sch"], ["gauge/gauge.kicad_sch"]),
        (["gauge/parts/filter.kicad_sch"], ["gauge/gauge.kicad_sch"]),
        (["gauge/gauge.kicad_sch", "gauge/radio.kicad_sch", "gauge/gauge.kicad_pro"], ["gauge/gauge.kicad_sch"]),
        (["common/power.kicad_sch"], ["gauge/gauge.kicad_sch", "logger/logger.kicad_sch"]),
        (["common/unused.kicad_sch"], ["common/unused.kicad_sch"]),
        (["other/lone.net"], ["other/lone.net"]),
        (["gauge/gauge.net"], ["gauge/gauge.net"]),
        (["gauge/gauge.net", "gauge/radio.kicad_sch"], ["gauge/gauge.kicad_sch"]),
        (["gauge/out/export.net", "gauge/radio.kicad_sch"], ["gauge/gauge.kicad_sch"]),
        (["logger/logger.kicad_sch", "gauge/gauge.net"], ["gauge/gauge.net", "logger/logger.kicad_sch"]),
        (["other/simulation.net"], []),
        (["gauge"], ["gauge"]),
        (["absent.net"], ["absent.net"]),
    ],
)
def test_changed_files_lead_to_their_boards(project: Path, changed: list[str], boards: list[str]) -> None:
    assert list(boards_of(changed).paths) == boards
    assert list(boards_of([*reversed(changed), *changed]).paths) == boards, "whatever the order, and once each"


def test_what_is_left_out_is_said(project: Path) -> None:
    assert boards_of(["other/simulation.net"]).remarks == (
        "other/simulation.net: left out, it is not a netlist of a board",
    )
    assert boards_of(["gauge/gauge.net", "gauge/radio.kicad_sch"]).remarks == (
        "gauge/gauge.net: reviewed as gauge/gauge.kicad_sch",
    )


def test_settings_lead_to_the_boards_they_apply_to(project: Path) -> None:
    (project / "levelcrossing.toml").write_text("", encoding="utf-8")
    assert boards_of(["levelcrossing.toml"]).paths == (
        "common/unused.kicad_sch",
        "gauge/gauge.kicad_sch",
        "logger/logger.kicad_sch",
    )
    (project / "gauge" / "levelcrossing.toml").write_text("", encoding="utf-8")
    assert boards_of(["gauge/levelcrossing.toml"]).paths == ("gauge/gauge.kicad_sch",)
    assert "gauge/gauge.kicad_sch" not in boards_of(["levelcrossing.toml"]).paths


def test_a_project_of_its_own_stays_a_board_within_another(project: Path) -> None:
    (project / "gauge" / "radio.kicad_pro").write_text("{}", encoding="utf-8")
    assert boards_of(["gauge/parts/filter.kicad_sch"]).paths == ("gauge/gauge.kicad_sch", "gauge/radio.kicad_sch")


def test_sheets_in_a_ring_end(project: Path) -> None:
    for one, other in (("a", "b"), ("b", "a")):
        (project / f"{one}.kicad_sch").write_text(_sheet(f"{other}.kicad_sch"), encoding="utf-8")
    assert boards_of(["a.kicad_sch"]).paths == ("a.kicad_sch",)


def test_sheets_outside_of_the_repository_are_not_looked_at(
    project: Path, tmp_path_factory: pytest.TempPathFactory
) -> None:
    outside = tmp_path_factory.mktemp("outside")
    (outside / "x.kicad_sch").write_text(_sheet(), encoding="utf-8")
    (project / "gauge" / "gauge.kicad_sch").write_text(
        _sheet(str(outside / "x.kicad_sch"), "../../../../etc/passwd"), encoding="utf-8"
    )
    assert boards_of(["gauge/gauge.kicad_sch"]).paths == ("gauge/gauge.kicad_sch",)
    (project / "linked").symlink_to(outside, target_is_directory=True)
    assert boards_of(["common/unused.kicad_sch"]).paths == ("common/unused.kicad_sch",)
