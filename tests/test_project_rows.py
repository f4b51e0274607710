"""Trade rows of the project's own: data beside the settings, found as they are, before the shipped ones."""

from __future__ import annotations

import json
import os
import subprocess
from pathlib import Path

import pytest
from written_boards import HEADER, netlist

from levelcrossing import cli
from levelcrossing.errors import SettingsError
from levelcrossing.settings import PARTS_NAME, load_settings

# A gate of the house's own making that bears 5 V on 3.3 V; the shipped row of the 74HC clamps.
TOLERANT = """
[[part]]
id = "house gate"
match = ['74HC1G04']
examples = ["74HC1G04"]
group = "logic"
supplies = [ { pins = 'VCC', volts = [2.0, 6.0], role = "io" } ]
io_supply = 'VCC'
vih_volts = "0.7*V"
vil_volts = "0.3*V"
input_max_volts = "7.0"
tolerant = "always"
source = "the house's own measurement"
certainty = "practice"
"""
WIRE = HEADER + "R1 10R Device:R | 1 - passive ECHO_5V | 2 - passive ECHO_3V\n"


@pytest.fixture
def project(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / ".git").mkdir()
    (tmp_path / "gauge").mkdir()
    (tmp_path / "gauge" / "gauge.net").write_text(netlist(WIRE), encoding="utf-8")
    (tmp_path / "levelcrossing.toml").write_text('[rails]\n"+5V" = "5"\n"+3V3" = "3.3"\n', encoding="utf-8")
    return tmp_path


def over(capsys: pytest.CaptureFixture[str], *words: str) -> list[str]:
    cli.main(["review", "gauge/gauge.net", "--as", "json", *words])
    found = json.loads(capsys.readouterr().out)["findings"]
    return [one["part"] for one in found if one["rule"] == "input-overvoltage"]


@pytest.mark.parametrize("folder", ["", "gauge"])
def test_rows_beside_the_project_or_above_it_come_first(
    project: Path, capsys: pytest.CaptureFixture[str], folder: str
) -> None:
    assert over(capsys) == ["U2"]
    (project / folder / PARTS_NAME).write_text(TOLERANT, encoding="utf-8")
    assert over(capsys) == []


def test_rows_of_the_command_line_come_before_the_project_s(project: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (project / PARTS_NAME).write_text(TOLERANT, encoding="utf-8")
    (project / "mine.toml").write_text(
        TOLERANT.replace("house gate", "clamping gate").replace('"7.0"', '"V+0.3"').replace("always", "never"),
        encoding="utf-8",
    )
    assert over(capsys, "--facts", "mine.toml") == ["U2"]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[[part]]\nid = 'x'\nmatch = ['X1']\ngroup = 'other'\n", "source"),
        (TOLERANT.replace("vih_volts", "vhi_volts"), "vhi_volts"),
        ("[[part]\n", PARTS_NAME),
    ],
)
def test_a_wrong_row_is_one_line_with_its_file_and_exit_2(
    project: Path, capsys: pytest.CaptureFixture[str], text: str, words: str
) -> None:
    (project / PARTS_NAME).write_text(text, encoding="utf-8")
    assert cli.main(["review", "gauge/gauge.net"]) == 2
    told = capsys.readouterr().err
    assert PARTS_NAME in told and words in told and len(told.strip().splitlines()) <= 2


def test_a_link_out_of_the_repository_is_refused(project: Path, tmp_path_factory: pytest.TempPathFactory) -> None:
    outside = tmp_path_factory.mktemp("elsewhere") / "rows.toml"
    outside.write_text(TOLERANT, encoding="utf-8")
    os.symlink(outside, project / PARTS_NAME)
    with pytest.raises(SettingsError, match="leads out of the repository"):
        load_settings("gauge/gauge.net")


def test_compare_tells_that_a_change_brings_rows_of_its_own(project: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A pull request that makes its own fault vanish by a row must show it."""
    (project / ".git").rmdir()
    for words in (
        ["init", "-q"],
        ["add", "-A"],
        ["-c", "user.name=a", "-c", "user.email=a@b", "commit", "-qm", "gauge"],
    ):
        subprocess.run(["git", *words], cwd=project, check=True, capture_output=True)
    (project / PARTS_NAME).write_text(TOLERANT, encoding="utf-8")
    cli.main(["compare", "gauge/gauge.net", "--against", "HEAD"])
    told = " ".join(capsys.readouterr().out.split())
    assert "trade row part house gate" in told
