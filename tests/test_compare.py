"""``compare`` on whole boards: five edits of one board, saved reviews and git revisions."""

from __future__ import annotations

import argparse
import contextlib
import copy
import json
import random
import subprocess
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from kiln_logger import BAD, finding, row, side
from written_boards import box_path, netlist, renamed, sheet

from levelcrossing.compare import add_arguments, run, saved_form, stop_level
from levelcrossing.differences import Side, compare_sides
from levelcrossing.errors import InputError
from levelcrossing.model import Outcome, Settings
from levelcrossing.reports.changes import json_changes, text_changes
from levelcrossing.reports.jsonform import json_report
from levelcrossing.review import review


def test_a_change_cannot_lower_its_own_bar() -> None:
    strict, never = Settings(stop_at=Outcome.MARGINAL), Settings(stop_at=Outcome.SOUND)
    old, new = side("old", settings=strict), side("new", settings=never)
    assert stop_level(None, old, new) is Outcome.MARGINAL
    assert stop_level(None, side("old", settings=Settings()), new) is Outcome.MALFUNCTION
    assert stop_level("damage", old, new) is Outcome.DAMAGE
    assert stop_level("never", old, new) is None
    assert stop_level(None, side("saved"), new) is None, "a saved review has no settings of its own"


# -------------------------------------------------------------------------------------------------------- saved reviews


def test_saved_reviews_are_checked(tmp_path: Path) -> None:
    file = tmp_path / "saved.json"
    good = {**BAD.form}
    file.write_text(json.dumps(good), encoding="utf-8")
    assert saved_form(str(file)) == good
    file.write_text(json.dumps({"form": 1, "reviews": [good]}), encoding="utf-8")
    assert saved_form(str(file)) == good
    file.write_text(json.dumps({"form": 1, "reviews": [good, good]}), encoding="utf-8")
    with pytest.raises(InputError, match="several boards"):
        saved_form(str(file))


@pytest.mark.parametrize(
    "text",
    [
        "",
        "[]",
        "{}",
        '{"form": 2}',
        '{"form": 1}',
        "[" * 100_000,
        json.dumps({**BAD.form, "crossings": [{}]}),
        json.dumps({**BAD.form, "crossings": [row("superb")]}),
        json.dumps({**BAD.form, "crossings": [row(findings=(7,))]}),
        json.dumps({**BAD.form, "crossings": [row(link=(3,))]}),  # type: ignore[arg-type]
        json.dumps({**BAD.form, "findings": [finding(rule=3)]}),
        json.dumps({**BAD.form, "findings": [finding(fingerprint=[])]}),
        json.dumps({**BAD.form, "rails": [{"net": "A", "low": "x", "nominal": 1, "high": 1}]}),
        json.dumps({**BAD.form, "coverage": {}}),
    ],
)
def test_what_is_no_saved_review_is_one_line(tmp_path: Path, text: str) -> None:
    file = tmp_path / "saved.json"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        saved_form(str(file))
    assert "\n" not in str(caught.value)


def test_altered_saved_reviews_are_refused_or_compared(tmp_path: Path) -> None:
    """Anything may stand in a file that somebody saved; nothing of it may be more than one line of complaint."""
    rails = [{"net": "+5V", "low": 4.75, "nominal": 5.0, "high": 5.25}]
    whole = json.loads(json.dumps({**BAD.form, "rails": rails}))
    file = tmp_path / "saved.json"
    words: list[Any] = [
        None,
        3,
        -1,
        1e308,
        True,
        "",
        "damage",
        "\x1b[31m",
        [],
        [1],
        [None],
        {},
        {"a": 1},
        float("nan"),
        10**30,
    ]
    chance = random.Random(20260601)
    compared = refused = 0
    for _ in range(1500):
        altered = copy.deepcopy(whole)
        for _ in range(chance.randint(1, 3)):
            *way, last = chance.choice(list(_ways(whole)))
            with contextlib.suppress(KeyError, IndexError, TypeError):
                here: Any = altered
                for step in way:
                    here = here[step]
                if chance.random() < 0.2:
                    del here[last]
                else:
                    here[last] = chance.choice(words)
        file.write_text(json.dumps(altered), encoding="utf-8")
        try:
            form = saved_form(str(file))
        except InputError as error:
            refused += 1
            assert str(error).isprintable()
            continue
        compared += 1
        for one, other in ((Side(label="a", form=form), BAD), (BAD, Side(label="b", form=form))):
            comparison = compare_sides(one, other)
            assert all(line.isprintable() for line in text_changes([comparison], everything=True).split("\n"))
            json.loads(json_changes([comparison]))
    assert min(compared, refused) > 300, "both happen"


def _ways(value: Any, before: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    steps = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for step, inner in steps:
        yield (*before, step)
        yield from _ways(inner, (*before, step))


# ------------------------------------------------------------------------------------------------ five edits of a board

GAUGE = """
J1 Supply Connector:Conn_01x03 | 1 Pin_1 passive +5V | 2 Pin_2 passive +3V3 | 3 Pin_3 passive GND
U1 74HC1G04 74xGxx:74HC1G04 | 2 A input ECHO_IN | 3 GND power_in GND | 4 Y output ECHO_5V | 5 VCC power_in +5V
U2 74HC1G04 74xGxx:74HC1G04 | 2 A input ECHO_3V | 3 GND power_in GND | 4 Y output ECHO_OUT | 5 VCC power_in +3V3
R1 10k Device:R | 1 - passive ECHO_5V | 2 - passive ECHO_3V
R2 18k Device:R | 1 - passive ECHO_3V | 2 - passive GND
R9 10k Device:R | 1 - passive ECHO_IN | 2 - passive GND
U3 74LVC1G07 74xGxx:74LVC1G07 | 2 A input CLOCK | 3 GND power_in GND | 4 Y open_collector LINE_3V | 5 VCC power_in +3V3
U4 74HC1G04 74xGxx:74HC1G04 | 2 A input LINE_5V | 3 GND power_in GND | 4 Y output TIDE | 5 VCC power_in +5V
Q1 BSS138 Transistor_FET:BSS138 | 1 G input +3V3 | 2 S passive LINE_3V | 3 D passive LINE_5V
R3 10k Device:R | 1 - passive +3V3 | 2 - passive LINE_3V
R4 10k Device:R | 1 - passive +5V | 2 - passive LINE_5V
R8 10k Device:R | 1 - passive CLOCK | 2 - passive GND
"""
UNPROTECTED = GAUGE.replace("R1 10k", "R1 10R").replace("R2 18k", "R2 1M")


def _compared(tmp_path: Path, old: str, new: str, *words: str) -> tuple[dict[str, Any], int]:
    (tmp_path / "old.net").write_text(netlist(old), encoding="utf-8")
    (tmp_path / "new.net").write_text(netlist(new), encoding="utf-8")
    return _command(str(tmp_path / "old.net"), str(tmp_path / "new.net"), *words)


def _command(*words: str) -> tuple[dict[str, Any], int]:
    parser = argparse.ArgumentParser()
    add_arguments(parser)
    text, status = run(parser.parse_args([*words, "--as", "json"]))
    return json.loads(text), status


def _told(result: dict[str, Any]) -> list[tuple[str, str, str]]:
    return [(change["kind"], change["before"], change["after"]) for change in result["changes"]]


def _worse(result: dict[str, Any], place: str) -> dict[str, Any]:
    return next(
        change for change in result["changes"] if change["kind"] == "worse" and f"-> {place}" in change["title"]
    )


def test_the_gauge_is_sound_to_begin_with(tmp_path: Path) -> None:
    result, status = _compared(tmp_path, GAUGE, GAUGE)
    assert result["crossings"] == {"before": result["crossings"]["after"], "after": result["crossings"]["before"]}
    assert result["crossings"]["before"] >= 2
    assert (_told(result), status) == ([], 0)


def test_edit_1_a_rail_swapped(tmp_path: Path) -> None:
    """The lower resistor of the divider goes to 5 V instead of ground."""
    lower = "R2 18k Device:R | 1 - passive ECHO_3V | 2 - passive "
    assert lower + "GND" in GAUGE
    result, status = _compared(tmp_path, GAUGE, GAUGE.replace(lower + "GND", lower + "+5V"))
    change = _worse(result, "U2.2")
    assert (change["before"], change["counts"], status) == ("sound", True, 1)
    assert change["after"] in ("damage", "malfunction")
    top = next(figure for figure in change["figures"] if figure["name"] == "voltage, greatest")
    assert top["before"] < 3.6 < top["after"]


def test_edit_2_a_pull_up_removed(tmp_path: Path) -> None:
    result, status = _compared(
        tmp_path, GAUGE, GAUGE.replace("R4 10k Device:R | 1 - passive +5V | 2 - passive LINE_5V\n", "")
    )
    change = _worse(result, "U4.2")
    assert change["before"] == "sound"
    assert change["after"] in ("damage", "malfunction")
    assert status == 1


def test_edit_3_a_mosfet_turned_round(tmp_path: Path) -> None:
    result, status = _compared(
        tmp_path,
        GAUGE,
        GAUGE.replace("2 S passive LINE_3V | 3 D passive LINE_5V", "2 S passive LINE_5V | 3 D passive LINE_3V"),
    )
    assert status == 1
    assert any(change["kind"] in ("worse", "added") and change["counts"] for change in result["changes"])


def test_edit_4_a_part_swapped_for_a_tolerant_one(tmp_path: Path) -> None:
    tolerant = UNPROTECTED.replace("U2 74HC1G04 74xGxx:74HC1G04", "U2 74LVC1G04 74xGxx:74LVC1G04")
    result, status = _compared(tmp_path, UNPROTECTED, tolerant)
    assert ("better", "damage", "sound") in _told(result)
    assert status == 0
    back, status = _compared(tmp_path, tolerant, UNPROTECTED)
    assert ("worse", "sound", "damage") in _told(back)
    assert status == 1


def test_edit_5_renumbering_says_nothing(tmp_path: Path) -> None:
    references = {
        "U1": "U4",
        "U4": "U2",
        "U2": "U1",
        "R1": "R9",
        "R9": "R2",
        "R2": "R1",
        "R3": "R4",
        "R4": "R3",
        "Q1": "Q7",
    }
    nets = {"ECHO_5V": "Net-(R9-Pad1)", "LINE_3V": "Net-(Q7-S)", "ECHO_IN": "ECHO_OUT", "ECHO_OUT": "ECHO_IN"}
    for board in (GAUGE, UNPROTECTED):
        result, status = _compared(tmp_path, board, renamed(board, references, nets))
        assert (_told(result), result["rails"], result["coverage"], result["declared"], status) == ([], [], [], [], 0)


def test_a_saved_review_is_as_good_as_the_board(tmp_path: Path) -> None:
    for name, text in (("old", GAUGE), ("new", UNPROTECTED)):
        (tmp_path / f"{name}.net").write_text(netlist(text), encoding="utf-8")
        saved = json_report([review(str(tmp_path / f"{name}.net"), Settings())])
        (tmp_path / f"{name}.json").write_text(saved, encoding="utf-8")
    fresh, status = _command(str(tmp_path / "old.net"), str(tmp_path / "new.net"))
    saved_result, saved_status = _command(str(tmp_path / "old.json"), str(tmp_path / "new.json"))
    assert fresh["changes"] == saved_result["changes"]
    assert status == saved_status == 1


def _git(folder: Path, *words: str) -> None:
    command = ["git", "-c", "user.name=t", "-c", "user.email=t@example.org", *words]
    subprocess.run(command, cwd=folder, check=True, capture_output=True)


@pytest.fixture
def project(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a repository with a board on a sub-sheet, as committed."""
    (tmp_path / "gauge.kicad_sch").write_text(sheet("", children=["echo.kicad_sch"], number=1), encoding="utf-8")
    (tmp_path / "echo.kicad_sch").write_text(sheet(GAUGE, number=2, parent=box_path(1)), encoding="utf-8")
    _git(tmp_path, "init", "--quiet")
    _git(tmp_path, "add", "-A")
    _git(tmp_path, "commit", "-m", "as built")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_against_a_revision_judges_the_change_alone(project: Path) -> None:
    result, status = _command("gauge.kicad_sch", "--against", "HEAD")
    assert (result["old"], result["new"]) == ("gauge.kicad_sch at HEAD", "gauge.kicad_sch")
    assert (_told(result), status) == ([], 0)
    (project / "echo.kicad_sch").write_text(sheet(UNPROTECTED, number=2, parent=box_path(1)), encoding="utf-8")
    result, status = _command("gauge.kicad_sch", "--against", "HEAD")
    assert ("worse", "sound", "damage") in _told(result)
    assert status == 1
    _git(project, "commit", "-am", "save a resistor")
    assert _command("gauge.kicad_sch", "--against", "HEAD")[1] == 0, "an old fault is not of this change"
    assert _command("gauge.kicad_sch", "--against", "HEAD~1")[1] == 1


def test_a_stranger_cannot_waive_or_declare_a_fault_away_unseen(project: Path) -> None:
    (project / "echo.kicad_sch").write_text(sheet(UNPROTECTED, number=2, parent=box_path(1)), encoding="utf-8")
    waiver = '[[waivers]]\nrule = "{}"\nat = "{}"\nreason = "trust me"\n'
    findings = review("gauge.kicad_sch", Settings()).findings
    text = 'stop_at = "never"\n' + "".join(waiver.format(one.rule, one.part) for one in findings)
    (project / "levelcrossing.toml").write_text(text, encoding="utf-8")
    result, status = _command("gauge.kicad_sch", "--against", "HEAD")
    assert status == 1, "neither the new waivers nor the new stop level count"
    assert any("trust me" in line for line in result["new_waivers"])
    assert "stop level: not declared -> never" in result["declared"]
    assert _command("gauge.kicad_sch", "--against", "HEAD", "--accept-new-waivers")[1] == 0

    (project / "levelcrossing.toml").write_text(
        '[pins]\n"U2.2" = {tolerates = 60, vih = 2, vil = 1}\n', encoding="utf-8"
    )
    result, _ = _command("gauge.kicad_sch", "--against", "HEAD")
    assert any(line.startswith("pin U2.2: not declared -> tolerates 60") for line in result["declared"])


def test_a_new_board_is_judged_whole(project: Path) -> None:
    (project / "second.net").write_text(netlist(UNPROTECTED), encoding="utf-8")
    result, status = _command("second.net", "--against", "HEAD")
    assert ("added", None, "damage") in _told(result)
    assert "not in HEAD" in result["old"]
    assert status == 1


def test_a_broken_old_file_does_not_stop_the_one_that_mends_it(project: Path) -> None:
    good = (project / "echo.kicad_sch").read_text(encoding="utf-8")
    (project / "echo.kicad_sch").write_text(good[: len(good) // 2], encoding="utf-8")
    _git(project, "commit", "-am", "cut off")
    (project / "echo.kicad_sch").write_text(good, encoding="utf-8")
    result, status = _command("gauge.kicad_sch", "--against", "HEAD")
    assert "could not be read at HEAD" in result["old"]
    assert str(project) not in result["old"]
    assert status == 0
