"""``compare`` says what a revision changed, and nothing when only names did."""

from __future__ import annotations

import json
import subprocess
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from levelcrossing.compare import saved_form, stop_level
from levelcrossing.differences import Comparison, Side, compare_sides, empty_form
from levelcrossing.errors import CommandError, InputError
from levelcrossing.matching import match_nets, match_parts
from levelcrossing.model import Board, Net, Outcome, Part, Pin, PinSetting, Settings, Spread, Waiver
from levelcrossing.reports.changes import json_changes, markdown_changes, text_changes
from levelcrossing.revisions import files_of

# ------------------------------------------------------------------------------------------- boards and saved reviews

# A kiln logger: U1 on 5 V talks to U2 on 3.3 V on four equal channels, each through a divider of its own.
CHANNELS = range(1, 5)


def _kiln() -> dict[str, tuple[str, dict[str, str]]]:
    parts = {
        "U1": ("74HC244", {str(channel): f"/OUT{channel}" for channel in CHANNELS} | {"20": "+5V", "10": "GND"}),
        "U2": ("LOGGER-3", {str(channel): f"/IN{channel}" for channel in CHANNELS} | {"20": "+3V3", "10": "GND"}),
        "C1": ("100n", {"1": "+5V", "2": "GND"}),
        "C2": ("100n", {"1": "+3V3", "2": "GND"}),
    }
    for channel in CHANNELS:
        parts[f"R{channel}"] = ("10k", {"1": f"/OUT{channel}", "2": f"/IN{channel}"})
        parts[f"R{channel + 10}"] = ("20k", {"1": f"/IN{channel}", "2": "GND"})
    return parts


def _board(
    parts: dict[str, tuple[str, dict[str, str]]],
    references: dict[str, str] | None = None,
    nets: dict[str, str] | None = None,
    uuids: dict[str, str] | None = None,
) -> Board:
    """Return a board, its parts and nets called otherwise where asked."""
    made = []
    for old, (value, pins) in parts.items():
        reference = (references or {}).get(old, old)
        made.append(
            Part(
                reference=reference,
                value=value,
                uuids=((uuids or {}).get(old, ""),) if uuids else (),
                pins=tuple(
                    Pin(part=reference, number=number, name="", kind="", net=(nets or {}).get(net, net))
                    for number, net in pins.items()
                ),
            )
        )
    made.sort(key=lambda part: part.reference)
    pins_of: dict[str, list[tuple[str, str]]] = {}
    for part in made:
        for pin in part.pins:
            pins_of.setdefault(pin.net, []).append((pin.part, pin.number))
    return Board(
        path="kiln.net",
        form="netlist",
        parts=tuple(made),
        nets=tuple(Net(name=name, pins=tuple(sorted(pins))) for name, pins in sorted(pins_of.items())),
    )


def _spread(low: float, high: float) -> dict[str, float]:
    return {"min": low, "typ": (low + high) / 2, "max": high}


def _row(
    verdict: str = "sound",
    start: tuple[str, str] = ("U1", "1"),
    end: tuple[str, str] = ("U2", "1"),
    link: tuple[str, ...] = ("R1",),
    top: float = 3.4,
    rails: tuple[str, str] = ("+5V", "+3V3"),
    findings: tuple[int, ...] = (),
) -> dict[str, Any]:
    return {
        "from": {"part": start[0], "pin": start[1], "name": "Y", "net": "/OUT1", "rail": rails[0]},
        "to": {"part": end[0], "pin": end[1], "name": "A", "net": "/IN1", "rail": rails[1]},
        "link": list(link),
        "shifter": {"kind": "divider", "parts": list(link)},
        "verdict": verdict,
        "condition": "",
        "basis": "library",
        "levels": {
            "high": _spread(top - 0.3, top),
            "low": _spread(0.0, 0.1),
            "vih": 2.31,
            "vil": 0.99,
            "vmax": 3.6,
        },
        "speed": None,
        "findings": list(findings),
    }


def _finding(outcome: str = "damage", **keys: Any) -> dict[str, Any]:
    plain = {
        "rule": "input-overvoltage",
        "outcome": outcome,
        "condition": "",
        "basis": "library",
        "part": "U2",
        "pin": "1",
        "net": "/IN1",
        "text": "U2.1 sees 5.25 V",
        "remedy": "fit a divider",
        "at": None,
        "waived": None,
        "crossing": 0,
        "fingerprint": "1:aa",
    }
    return plain | keys


def _side(
    label: str,
    rows: list[dict[str, Any]] | None = None,
    findings: list[dict[str, Any]] | None = None,
    board: Board | None = None,
    settings: Settings | None = None,
    **tables: Any,
) -> Side:
    form = empty_form("kiln.net") | {"crossings": rows or [], "findings": findings or []} | tables
    return Side(label=label, form=form, board=board, settings=settings)


def _kinds(comparison: Comparison) -> list[tuple[str, bool]]:
    return [(change.kind, change.counts) for change in comparison.changes]


SOUND = _side("old", [_row()])
BAD = _side("new", [_row("damage", top=5.25, findings=(0,))], [_finding()])


# ------------------------------------------------------------------------------------------------------------- matching


def test_equal_channels_are_matched_as_wholes() -> None:
    """Everything renumbered and renamed: R1 of one channel must not be paired with the R11 of another."""
    names = {"U1": "U7", "U2": "U1", "C1": "C9", "C2": "C1"}
    names |= {f"R{channel}": f"R{9 - channel}" for channel in CHANNELS}
    names |= {f"R{channel + 10}": f"R{channel + (channel % 2)}{channel}" for channel in CHANNELS}
    renamed = {f"/OUT{channel}": f"Net-({channel})" for channel in CHANNELS} | {"+5V": "VCC", "/IN1": "/OUT1"}
    old, new = _board(_kiln()), _board(_kiln(), names, renamed)
    assert match_parts(old, new) == names
    nets = match_nets(old, new, names)
    assert nets["/OUT1"] == "Net-(1)"
    assert nets["/IN1"] == "/OUT1"
    assert nets["+5V"] == "VCC"


def test_parts_that_kept_their_names_keep_them() -> None:
    old = _board(_kiln())
    assert match_parts(old, old) == {part.reference: part.reference for part in old.parts}


def test_a_swapped_value_is_still_the_same_part() -> None:
    changed = _kiln() | {"R1": ("22k", {"1": "/OUT1", "2": "/IN1"}), "U2": ("LOGGER-5", _kiln()["U2"][1])}
    found = match_parts(_board(_kiln()), _board(changed))
    assert found["R1"] == "R1"
    assert found["U2"] == "U2"


def test_symbol_identifiers_outweigh_likeness() -> None:
    """R1 and R2 exchanged their numbers and one of them its value; the identifiers of their symbols tell."""
    marks = {name: f"uuid-{name}" for name in _kiln()}
    changed = _kiln() | {"R1": ("22k", {"1": "/OUT1", "2": "/IN1"})}
    new = _board(changed, {"R1": "R2", "R2": "R1"}, uuids=marks)
    found = match_parts(_board(_kiln(), uuids=marks), new)
    assert (found["R1"], found["R2"]) == ("R2", "R1")


def test_a_removed_part_matches_nothing() -> None:
    less = {name: part for name, part in _kiln().items() if name != "R14"}
    found = match_parts(_board(_kiln()), _board(less))
    assert "R14" not in found
    assert len(found) == len(less)


# ---------------------------------------------------------------------------------------------------------- differences


def test_equal_reviews_say_nothing() -> None:
    for side in (SOUND, BAD):
        comparison = compare_sides(side, replace(side, label="new"))
        assert comparison.empty
        assert not comparison.fails


def test_renumbering_alone_says_nothing() -> None:
    names, nets = {"U1": "U5", "R1": "R9", "U2": "U3"}, {"/IN1": "/X", "+3V3": "VDD", "/OUT1": "/Y"}
    old = _side("old", [_row("damage", top=5.25, findings=(0,))], [_finding()], _board(_kiln()))
    row = _row("damage", ("U5", "1"), ("U3", "1"), ("R9",), 5.25, ("+5V", "VDD"), (0,))
    new = _side("new", [row], [_finding(part="U3", net="/X", fingerprint="1:other")], _board(_kiln(), names, nets))
    rails = {"rails": [{"net": "+3V3", "low": 3.1, "nominal": 3.3, "high": 3.5}]}
    renamed = {"rails": [{"net": "VDD", "low": 3.1, "nominal": 3.3, "high": 3.5}]}
    comparison = compare_sides(
        replace(old, form={**old.form, **rails}, settings=Settings(pins={"U2.1": PinSetting(tolerates_volts=5)})),
        replace(
            new, form={**new.form, **renamed}, settings=Settings(pins={"U3.1": PinSetting(tolerates_volts=5, line=9)})
        ),
    )
    assert comparison.empty, comparison


def test_worse_is_told_with_figures_and_fails() -> None:
    comparison = compare_sides(SOUND, BAD)
    assert _kinds(comparison) == [("worse", True)]
    assert comparison.fails
    change = comparison.changes[0]
    assert (change.before, change.after) == ("sound", "damage")
    figure = next(figure for figure in change.figures if figure.name == "voltage, greatest")
    assert (figure.before, figure.after, figure.limit) == (3.4, 5.25, 3.6)
    text = text_changes([comparison])
    assert "worse: U1.1 (Y) on +5V -> U2.1 (A) on +3V3 through R1: sound -> damage" in text
    assert "voltage, greatest: 3.40 V -> 5.25 V (rated for 3.60 V)" in text
    assert "damage input-overvoltage: U2.1 sees 5.25 V" in text
    assert "what to do: fit a divider" in text


def test_better_does_not_fail() -> None:
    comparison = compare_sides(BAD, SOUND)
    assert _kinds(comparison) == [("better", False)]
    assert not comparison.fails


def test_more_of_the_same_fault_is_worse_and_less_is_better() -> None:
    more = _side("new", [_row("damage", top=5.6, findings=(0,))], [_finding()])
    assert _kinds(compare_sides(BAD, more)) == [("worse", True)]
    assert _kinds(compare_sides(more, BAD)) == [("better", False)]
    rounding = _side("new", [_row("damage", top=5.2501, findings=(0,))], [_finding()])
    assert compare_sides(BAD, rounding).empty


def test_figures_of_sound_crossings_are_shown_on_demand_only() -> None:
    comparison = compare_sides(SOUND, _side("new", [_row(top=3.3)]))
    assert _kinds(comparison) == [("moved", False)]
    assert "3.40 V -> 3.30 V" not in text_changes([comparison])
    assert "3.40 V -> 3.30 V" in text_changes([comparison], everything=True)


def test_added_and_removed_crossings() -> None:
    other = _row("damage", ("U1", "2"), ("U2", "2"), ("R2",), 5.25, findings=(0,))
    wider = _side("new", [_row(), other], [_finding(pin="2", crossing=1)])
    added = compare_sides(SOUND, wider)
    assert _kinds(added) == [("added", True)]
    assert _kinds(compare_sides(wider, SOUND)) == [("removed", False)]
    assert _kinds(compare_sides(SOUND, _side("new", [_row(), _row("sound", ("U1", "2"), ("U2", "2"))]))) == [
        ("added", False)
    ]


def test_what_can_no_longer_be_judged_is_never_called_better() -> None:
    lost = _side("new", [_row("unknown", findings=(0,))], [_finding("unknown", rule="pin-unknown")])
    assert _kinds(compare_sides(BAD, lost)) == [("unclear", False)]
    assert _kinds(compare_sides(BAD, lost, stop_at=Outcome.UNKNOWN)) == [("unclear", True)]
    assert _kinds(compare_sides(lost, BAD)) == [("worse", True)]


def test_a_part_swapped_for_another_keeps_its_crossing() -> None:
    """The receiver has another reference and value; the driver's pin and the link tell that it is the same wire."""
    new = _side("new", [_row("sound", end=("U9", "7"))])
    comparison = compare_sides(BAD, new)
    assert _kinds(comparison) == [("better", False)]


def test_the_stop_level_decides_what_counts() -> None:
    marginal = _side("new", [_row("marginal", top=3.55, findings=(0,))], [_finding("marginal", rule="margin-thin")])
    assert not compare_sides(SOUND, marginal).fails
    assert compare_sides(SOUND, marginal, stop_at=Outcome.MARGINAL).fails
    assert not compare_sides(SOUND, BAD, stop_at=None).fails


def test_findings_without_a_crossing_are_compared_too() -> None:
    finding = _finding(rule="supply-range", pin=None, crossing=None, fingerprint="1:bb")
    old, new = _side("old", [_row()]), _side("new", [_row()], [finding])
    assert _kinds(compare_sides(old, new)) == [("added", True)]
    assert _kinds(compare_sides(new, old)) == [("removed", False)]
    milder = _side("new", [_row()], [finding | {"outcome": "marginal"}])
    assert _kinds(compare_sides(new, milder)) == [("better", False)]


def test_a_waiver_of_the_same_change_is_reported_and_silences_nothing() -> None:
    waived = _side("new", [_row("damage", top=5.25, findings=(0,))], [_finding(waived="trust me")], settings=Settings())
    comparison = compare_sides(replace(SOUND, settings=Settings()), waived)
    assert comparison.fails
    assert comparison.new_waivers == (
        "damage input-overvoltage at U2.1 is accepted by a waiver added in this change: trust me",
    )
    agreed = compare_sides(replace(SOUND, settings=Settings()), waived, accept_new_waivers=True)
    assert not agreed.fails
    assert agreed.new_waivers, "it is still told"


def test_a_waiver_of_an_old_fault_is_reported_without_failing() -> None:
    """The fault is not of this change; that it goes quiet is."""
    waived = _side("new", [_row("damage", top=5.25, findings=(0,))], [_finding(waived="trust me")], settings=Settings())
    comparison = compare_sides(replace(BAD, settings=Settings()), waived)
    assert not comparison.fails
    assert comparison.new_waivers
    assert not comparison.empty


def test_a_waiver_of_the_old_revision_holds() -> None:
    agreed = Settings(waivers=(Waiver(rule="input-overvoltage", at="U2.1", reason="never fitted", fingerprint="1:aa"),))
    waived = _side("new", [_row("damage", top=5.25, findings=(0,))], [_finding(waived="never fitted")], settings=agreed)
    comparison = compare_sides(replace(SOUND, settings=agreed), waived)
    assert not comparison.fails
    assert comparison.new_waivers == ()


def test_a_waiver_taken_away_counts_again() -> None:
    old = _side("old", [_row("damage", top=5.25, findings=(0,))], [_finding(waived="never fitted")])
    comparison = compare_sides(old, BAD)
    assert _kinds(comparison) == [("worse", True)]
    assert "the waiver that accepted it is gone" in text_changes([comparison])


def test_what_is_declared_otherwise_is_told() -> None:
    """A change that declares its own fault away shows what it declared."""
    old = replace(BAD, label="old", settings=Settings(rails={"+5V": Spread.around(5, 0.05)}))
    new = replace(
        SOUND,
        label="new",
        settings=Settings(pins={"U2.1": PinSetting(tolerates_volts=60.0)}, stop_at=Outcome.SOUND, stray_farads=1e-12),
    )
    declared = compare_sides(old, new).declared
    assert declared == (
        "pin U2.1: not declared -> tolerates 60",
        "rail +5V: 5 V (4.75 to 5.25 V) -> not declared",
        "stop level: not declared -> never",
        "stray farads: not declared -> 1e-12",
    )


def test_a_change_cannot_lower_its_own_bar() -> None:
    strict, never = Settings(stop_at=Outcome.MARGINAL), Settings(stop_at=Outcome.SOUND)
    old, new = _side("old", settings=strict), _side("new", settings=never)
    assert stop_level(None, old, new) is Outcome.MARGINAL
    assert stop_level(None, _side("old", settings=Settings()), new) is Outcome.MALFUNCTION
    assert stop_level("damage", old, new) is Outcome.DAMAGE
    assert stop_level("never", old, new) is None
    assert stop_level(None, _side("saved"), new) is None, "a saved review has no settings of its own"


def test_coverage_and_rails() -> None:
    pin = {"part": "U2", "pin": "3", "why": "no data", "name": "", "net": ""}
    old = _side("old", [_row()], rails=[{"net": "+5V", "low": 4.75, "nominal": 5.0, "high": 5.25}])
    new = _side(
        "new",
        [_row()],
        rails=[
            {"net": "+5V", "low": None, "nominal": None, "high": None},
            {"net": "V", "low": 1, "nominal": 1, "high": 1},
        ],
        coverage={"signal_pins": 4, "judged": 3, "not_judged": [pin]},
    )
    comparison = compare_sides(old, new)
    assert comparison.rails == ("+5V: 5 V (4.75 to 5.25 V) -> voltage unknown", "V: new rail, 1 V")
    assert "U2.3 (no data)" in comparison.coverage[0]
    assert compare_sides(new, replace(new, label="again")).empty


# -------------------------------------------------------------------------------------------------------------- reports


def test_reports_are_harmless_and_the_same_twice() -> None:
    nasty = "\x1b[31m](http://x.example)<b>|`::error::\u202e@all #1"
    row = _row("damage", ("U1" + nasty, "1"), top=5.25, findings=(0,))
    new = _side(nasty, [row], [_finding(text=nasty, remedy=nasty, waived=nasty)], settings=Settings())
    comparison = compare_sides(replace(SOUND, settings=Settings()), new)
    for make in (text_changes, markdown_changes):
        report = make([comparison])
        assert report == make([compare_sides(replace(SOUND, settings=Settings()), new)])
        assert all(line.isprintable() for line in report.splitlines())
        assert "::error" not in report or make is markdown_changes
    plain = json.loads(json_changes([comparison]))
    assert plain["fails"] is True
    assert plain["changes"][0]["findings"][0]["text"] == nasty
    assert json_changes([comparison]).isascii()
    assert len(json.loads(json_changes([comparison, comparison]))["comparisons"]) == 2


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
        json.dumps({**BAD.form, "crossings": [_row("superb")]}),
        json.dumps({**BAD.form, "crossings": [_row(findings=(7,))]}),
        json.dumps({**BAD.form, "crossings": [_row(link=(3,))]}),  # type: ignore[arg-type]
        json.dumps({**BAD.form, "findings": [_finding(rule=3)]}),
        json.dumps({**BAD.form, "findings": [_finding(fingerprint=[])]}),
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


# ------------------------------------------------------------------------------------------------------------------ git


def _git(folder: Path, *words: str) -> str:
    done = subprocess.run(
        ["git", "-c", "user.name=t", "-c", "user.email=t@example.org", "-c", "init.defaultBranch=main", *words],
        cwd=folder,
        check=True,
        capture_output=True,
        text=True,
    )
    return done.stdout


@pytest.fixture
def repository(tmp_path: Path) -> Path:
    """Return a clone-like work tree: a root sheet with a sub-sheet elsewhere, settings at the top, one commit."""
    top = tmp_path / "work"
    (top / "kiln").mkdir(parents=True)
    (top / "common").mkdir()
    (top / "kiln" / "kiln.kicad_sch").write_bytes(b"old root\r\n")
    (top / "common" / "power.kicad_sch").write_text("old sub", encoding="utf-8")
    (top / "levelcrossing.toml").write_text('[rails]\n"A" = "5"\n', encoding="utf-8")
    (top / "secret.txt").write_text("not a sheet", encoding="utf-8")
    (top / ".gitattributes").write_text("*.kicad_sch filter=evil -text\n", encoding="utf-8")
    (top / "common" / "link.kicad_sch").symlink_to("/etc/hostname")
    _git(tmp_path, "init", "work")
    _git(top, "add", "-A")
    _git(top, "commit", "-m", "old")
    return top


def test_old_files_come_from_git_and_nothing_is_touched(repository: Path, tmp_path: Path) -> None:
    board = repository / "kiln" / "kiln.kicad_sch"
    board.write_text("new root", encoding="utf-8")
    mark = tmp_path / "filter-ran"
    for key in ("filter.evil.smudge", "filter.evil.clean", "core.fsmonitor"):
        _git(repository, "config", key, f"touch {mark}; cat")
    (repository / ".git" / "index").touch()
    before = {file: (file.stat().st_mtime_ns, file.stat().st_size) for file in repository.rglob("*") if file.is_file()}
    with files_of([str(board)], "HEAD") as old:
        path = old.old(str(board))
        assert path is not None
        assert Path(path).read_bytes() == b"old root\r\n", "as committed, no filter and no change of line ends"
        assert (Path(path).parents[1] / "common" / "power.kicad_sch").read_text(encoding="utf-8") == "old sub"
        assert not (Path(path).parents[1] / "common" / "link.kicad_sch").exists(), "links are left out"
        assert not (Path(path).parents[1] / "secret.txt").exists(), "only what a review needs"
        from levelcrossing.settings import load_settings

        assert set(load_settings(path).rails) == {"A"}
        assert old.old(str(repository / "kiln")) == str(Path(path).parent)
        assert old.old(str(repository / "kiln" / "absent.net")) is None
    assert not Path(path).exists()
    after = {file: (file.stat().st_mtime_ns, file.stat().st_size) for file in repository.rglob("*") if file.is_file()}
    assert after == before
    assert not mark.exists()


def test_several_boards_may_be_old_at_once(repository: Path) -> None:
    paths = [str(repository / "kiln" / "kiln.kicad_sch"), str(repository / "common" / "power.kicad_sch")]
    with files_of(paths, "main") as old:
        assert all(old.old(path) is not None for path in paths)


@pytest.mark.parametrize(
    "revision", ["", "no-such", "--upload-pack=x", "-x", "HEAD~99", "HEAD\nHEAD", "HEAD:levelcrossing.toml"]
)
def test_revisions_that_are_none(repository: Path, revision: str) -> None:
    with pytest.raises(CommandError) as caught, files_of([str(repository / "levelcrossing.toml")], revision):
        pass
    assert "\n" not in str(caught.value)


def test_no_repository_and_paths_outside(repository: Path, tmp_path: Path) -> None:
    outside = tmp_path / "outside.net"
    outside.write_text("x", encoding="utf-8")
    with pytest.raises(CommandError, match="git failed"), files_of([str(outside)], "HEAD"):
        pass
    with (
        pytest.raises(CommandError, match="outside"),
        files_of([str(repository / "levelcrossing.toml"), str(outside)], "HEAD"),
    ):
        pass
    with pytest.raises(CommandError, match="existing folder"), files_of([str(tmp_path / "no" / "x.net")], "HEAD"):
        pass


def test_a_hook_environment_does_not_mislead(repository: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """While a hook runs, git names its own repository in the environment."""
    monkeypatch.setenv("GIT_DIR", str(tmp_path / "elsewhere"))
    monkeypatch.setenv("GIT_INDEX_FILE", str(tmp_path / "index"))
    with files_of([str(repository / "kiln" / "kiln.kicad_sch")], "HEAD") as old:
        assert old.old(str(repository / "kiln" / "kiln.kicad_sch")) is not None
