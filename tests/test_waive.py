"""``waive`` writes what it says and leaves the rest of the file alone."""

from __future__ import annotations

import os
import tomllib
from pathlib import Path

import pytest

from levelcrossing.errors import CommandError, SettingsError
from levelcrossing.model import Board, Coverage, Finding, Net, Outcome, Part, Pin, Rails, Review
from levelcrossing.settings import parse_settings
from levelcrossing.waive import append_waivers, check_words, findings_at, settings_file, toml_text, waiver_text
from levelcrossing.waivers import apply_waivers

TODAY = "2026-06-15"


def _finding(pin: str, rule: str = "too-slow", waived: str | None = None) -> Finding:
    return Finding(rule=rule, outcome=Outcome.MALFUNCTION, text="", part="U1", pin=pin, net=f"/N{pin}", waived=waived)


def _review(*findings: Finding) -> Review:
    pins = tuple(Pin(part="U1", number=number, name="", kind="", net=f"/N{number}") for number in "123")
    nets = tuple(Net(name=pin.net, pins=(("U1", pin.number),)) for pin in pins)
    board = Board(path="vault.net", form="netlist", parts=(Part(reference="U1", value="x", pins=pins),), nets=nets)
    return Review(
        board=board,
        rails=Rails(by_net={}),
        crossings=(),
        findings=findings,
        coverage=Coverage(signal_pins=3, judged=3),
    )


REVIEW = _review(_finding("1"), _finding("2"), _finding("3", "margin-thin"), _finding("3", "low-not-reached", "known"))


def test_what_is_written_accepts_the_finding(tmp_path: Path) -> None:
    target = tmp_path / "levelcrossing.toml"
    append_waivers(target, findings_at(REVIEW, "too-slow", "U1.2"), "100 kHz only", "2027-01-31")
    settings = parse_settings(target.read_text(encoding="utf-8"))
    waiver = settings.waivers[0]
    assert (waiver.rule, waiver.at, waiver.reason, waiver.until) == ("too-slow", "U1.2", "100 kHz only", "2027-01-31")
    found = findings_at(REVIEW, "too-slow", "U1")
    marked, remarks = apply_waivers(found, settings, TODAY)
    assert [finding.waived for finding in marked] == [None, "100 kHz only"]
    assert remarks == ()


def test_a_part_with_several_findings_gets_a_waiver_for_each(tmp_path: Path) -> None:
    target = tmp_path / "levelcrossing.toml"
    append_waivers(target, findings_at(REVIEW, "too-slow", "U1"), "both", "")
    settings = parse_settings(target.read_text(encoding="utf-8"))
    assert [waiver.at for waiver in settings.waivers] == ["U1.1", "U1.2"]
    assert len({waiver.fingerprint for waiver in settings.waivers}) == 2


@pytest.mark.parametrize(
    "before",
    [
        b"",
        b'[rails]\n"A" = "5"',
        b'# mine\r\n[rails]\r\n"A" = "5"\r\n',
        b'\xef\xbb\xbf[rails]\n"A"    =   "5" # spaces\n\n\n',
        b'[[waivers]]\nrule = "a"\nat = "b"\nreason = "c"\n',
    ],
)
def test_the_rest_of_the_file_stays_byte_for_byte(tmp_path: Path, before: bytes) -> None:
    target = tmp_path / "levelcrossing.toml"
    target.write_bytes(before)
    os.chmod(target, 0o640)
    append_waivers(target, findings_at(REVIEW, "too-slow", "U1.1"), "why", "")
    after = target.read_bytes()
    assert after.startswith(before)
    added = after[len(before) :]
    assert (b"\r\n" in added) == (b"\r\n" in before)
    assert added.count(b"\n") == added.count(b"\r\n") or b"\r\n" not in before
    assert parse_settings(after.decode("utf-8-sig")).waivers[-1].reason == "why"
    assert os.stat(target).st_mode & 0o777 == 0o640
    assert os.listdir(tmp_path) == ["levelcrossing.toml"], "no temporary file is left"


def test_a_list_that_cannot_be_continued_is_left_as_it_was(tmp_path: Path) -> None:
    target = tmp_path / "levelcrossing.toml"
    before = 'waivers = [{rule = "a", at = "b", reason = "c"}]\n'
    target.write_text(before, encoding="utf-8")
    with pytest.raises(SettingsError, match="no waiver can be appended"):
        append_waivers(target, findings_at(REVIEW, "too-slow", "U1.1"), "why", "")
    assert target.read_text(encoding="utf-8") == before


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "shared.toml").write_text("", encoding="utf-8")
    target = tmp_path / "levelcrossing.toml"
    target.symlink_to("shared.toml")
    append_waivers(target, findings_at(REVIEW, "too-slow", "U1.1"), "why", "")
    assert target.is_symlink()
    assert "why" in (tmp_path / "shared.toml").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    "text",
    [
        "plain",
        'quo"te',
        "back\\slash",
        "new\nline",
        "tab\t",
        "\x1b[31m",
        "\u202eright",
        "\U000e0041",
        "",
        "ünï",
        '"""',
        "'''",
        "\x7f",
    ],
)
def test_any_text_survives_toml(text: str) -> None:
    written = toml_text(text)
    assert written.isprintable()
    assert tomllib.loads(f"k = {written}")["k"] == text


def test_half_a_character_is_replaced() -> None:
    assert tomllib.loads(f"k = {toml_text(chr(0xD800))}")["k"] == "?"


def test_hostile_places_and_reasons_stay_one_waiver() -> None:
    nasty = '"\n[[waivers]]\nrule = "too-slow"\nat = "U9"\nreason = "x'
    text = waiver_text(Finding(rule="rail-unknown", outcome=Outcome.UNKNOWN, text="", net=nasty), nasty, "")
    waivers = parse_settings(text).waivers
    assert len(waivers) == 1
    assert waivers[0].at == nasty


@pytest.mark.parametrize(
    ("rule", "at", "word"),
    [
        ("to-slow", "U1", "did you mean 'too-slow'?"),
        ("too-slow", "U2", "there is one at 'U1.1', 'U1.2'"),
        ("low-not-reached", "U1.3", "accepted already (because: 'known')"),
    ],
)
def test_what_cannot_be_waived_is_told(rule: str, at: str, word: str) -> None:
    with pytest.raises(CommandError) as caught:
        findings_at(REVIEW, rule, at)
    assert word in str(caught.value)


def test_a_review_without_findings_has_nothing_to_waive() -> None:
    with pytest.raises(CommandError, match="no findings at all"):
        findings_at(_review(), "too-slow", "U1")


def test_reasons_and_days() -> None:
    assert check_words("  two\n words ", None, TODAY) == ("two words", "")
    assert check_words("x", TODAY, TODAY) == ("x", TODAY)
    for reason, until in (("", None), (" \n", None), ("x", "tomorrow"), ("x", "2026-02-30"), ("x", "2026-06-14")):
        with pytest.raises(CommandError):
            check_words(reason, until, TODAY)


def test_the_file_in_force_is_written_else_a_new_one_beside_the_board(tmp_path: Path) -> None:
    (tmp_path / ".git").mkdir()
    folder = tmp_path / "vault"
    folder.mkdir()
    board = folder / "vault.net"
    board.write_text("", encoding="utf-8")
    assert settings_file(str(board), None) == folder / "levelcrossing.toml"
    (tmp_path / "levelcrossing.toml").write_text("", encoding="utf-8")
    assert settings_file(str(board), None) == tmp_path / "levelcrossing.toml"
    assert settings_file(str(folder), "mine.toml") == Path("mine.toml")
