"""The command line: what it answers, with which exit status, and that it answers in one line."""

from __future__ import annotations

import json
import os
import pty
import re
import subprocess
import sys
import time
from pathlib import Path

import pytest
from sample_review import sample_review
from written_boards import FAULTY, SOUND, netlist

from levelcrossing import __version__, cli, reviewing
from levelcrossing.model import Outcome, Settings

CHECKOUT = Path(__file__).resolve().parents[1]
ENVIRONMENT = {
    name: value
    for name, value in os.environ.items()
    if name not in ("NO_COLOR", "GITHUB_STEP_SUMMARY", "TERM", "COLUMNS")
} | {"PYTHONPATH": str(CHECKOUT / "lint"), "PYTHONIOENCODING": "utf-8", "TERM": "xterm"}


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    (tmp_path / "good").mkdir()
    (tmp_path / "bad").mkdir()
    (tmp_path / "good" / "good.net").write_text(netlist(SOUND), encoding="utf-8")
    (tmp_path / "bad" / "bad.net").write_text(netlist(FAULTY), encoding="utf-8")
    (tmp_path / "text.net").write_text("hello\n", encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("GITHUB_STEP_SUMMARY", raising=False)
    return tmp_path


def run(*words: str, **more: object) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "levelcrossing", *words],
        capture_output=True,
        text=True,
        env=ENVIRONMENT,
        check=False,
        **more,
    )  # type: ignore[call-overload, no-any-return]


# ------------------------------------------------------------------------------------------------------ wrong commands

WRONG = [
    ([], "no command given"),
    (["revew", "x.net"], "did you mean review?"),
    (["rail", "x.net"], "did you mean rails?"),
    (["good/good.net"], "`levelcrossing review good/good.net` reviews it"),
    (["frobnicate"], "one of review, rails"),
    (["--as", "json"], "the command comes first"),
    (["--versoin"], "did you mean --version?"),
    (["review"], "required: PATH"),
    (["review", "good/good.net", "--as", "jsno"], "did you mean json?"),
    (["review", "good/good.net", "--as", "html5"], "one of text, json"),
    (["review", "good/good.net", "--as"], "expected one argument"),
    (["review", "good/good.net", "--stop-at", "damages"], "did you mean damage?"),
    (["review", "good/good.net", "--stop-at=maginal"], "did you mean marginal?"),
    (["review", "good/good.net", "--stopat", "damage"], "did you mean --stop-at?"),
    (["review", "good/good.net", "--format=json"], "unknown option --format"),
    (["review", "good/good.net", "--setting", "x"], "did you mean --settings?"),
    (["review", "good/good.net", "-q"], "unknown option -q"),
    (["review", "absent.net"], "absent.net"),
    (["review", "text.net"], "text.net"),
    (["review", "good/good.net", "--settings", "absent.toml"], "absent.toml"),
    (["review", "good/good.net", "--rules", "absent"], "absent"),
    (["review", "good/good.net", "--facts", "absent.toml"], "absent.toml"),
    (["review", "good/good.net", "--to", "absent/report.txt"], "there is no folder absent"),
    (["review", "good/good.net", "--to", "good"], "is a folder"),
    (["review", "good/good.net", "--to", "good/good.net"], "would overwrite the reviewed board"),
    (["rails"], "required: PATH"),
    (["rails", "absent.net"], "absent.net"),
    (["rails", "good/good.net", "bad/bad.net"], "one argument too many"),
    (["rules", "shifter-revers"], "did you mean shifter-reversed?"),
    (["rules", "zzz"], "`levelcrossing rules` lists them"),
    (["rules", "a", "b"], "one argument too many"),
    (["compare", "good/good.net", "bad/bad.net", "--as", "xml"], "--as cannot be 'xml'"),
    (["waive", "good/good.net", "--rule", "x"], "required: --at, --reason"),
    (["review", "\x1b[31mred.net"], "<U+001B>[31mred.net"),
]


@pytest.mark.parametrize(
    ("words", "answer"), WRONG, ids=[" ".join(words)[:40].replace("\x1b", "ESC") for words, _ in WRONG]
)
def test_a_wrong_command_gets_one_line_and_2(
    words: list[str], answer: str, folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert cli.main(words) == 2
    output = capsys.readouterr()
    assert output.out == ""
    assert output.err.startswith("levelcrossing: ")
    assert output.err.count("\n") == 1 and output.err.endswith("\n")
    assert answer in output.err
    assert "Traceback" not in output.err and "\x1b" not in output.err


# ------------------------------------------------------------------------------------------------------- right ones


def test_version_and_help(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["--version"]) == 0
    assert capsys.readouterr().out == f"levelcrossing {__version__}\n"
    assert cli.main(["--help"]) == 0
    text = capsys.readouterr().out
    assert all(f"  {name} " in text for name in cli.available())
    assert max(map(len, text.splitlines())) <= 120


@pytest.mark.parametrize("name", cli.available())
def test_every_command_explains_itself(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as end:
        cli.main([name, "--help"])
    assert end.value.code == 0
    assert capsys.readouterr().out.startswith(f"usage: levelcrossing {name}")


def test_help_comes_at_once() -> None:
    """Less than 0.15 s on an idle machine; the best of five, as others may be at work."""
    best = 9.0
    for _ in range(5):
        start = time.perf_counter()
        assert run("--help").returncode == 0
        best = min(best, time.perf_counter() - start)
    assert best < 0.3


def test_exit_status_follows_the_findings(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["review", "good/good.net"]) == 0
    assert cli.main(["review", "bad/bad.net"]) == 1
    assert cli.main(["review", "bad/bad.net", "--stop-at", "never"]) == 0
    assert cli.main(["review", "good/good.net", "bad/bad.net"]) == 1
    assert "2 boards" in capsys.readouterr().out


def test_one_unreadable_board_does_not_hide_the_others(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["review", "text.net", "bad/bad.net", "--stop-at", "never"]) == 2
    output = capsys.readouterr()
    assert "text.net" in output.err and output.err.count("\n") == 1
    assert "input-overvoltage" in output.out


@pytest.mark.parametrize(
    ("asked", "declared", "level"),
    [
        (None, None, Outcome.MALFUNCTION),
        (None, Outcome.DAMAGE, Outcome.DAMAGE),
        (None, Outcome.SOUND, None),  # how settings say "never"
        ("marginal", Outcome.DAMAGE, Outcome.MARGINAL),
        ("never", Outcome.DAMAGE, None),
    ],
)
def test_stop_level_of_command_before_settings(
    asked: str | None, declared: Outcome | None, level: Outcome | None
) -> None:
    assert reviewing.stop_level(asked, Settings(stop_at=declared)) is level


def test_waived_findings_do_not_stop() -> None:
    review = sample_review()
    assert reviewing.reaches(review, Outcome.DAMAGE)
    assert not reviewing.reaches(review, None)
    from dataclasses import replace

    waived = tuple(replace(finding, waived="accepted") for finding in review.findings)
    assert not reviewing.reaches(replace(review, findings=waived), Outcome.MARGINAL)
    # What is unknown is unknown whether or not a finding says so.
    assert reviewing.reaches(replace(review, findings=()), Outcome.UNKNOWN)


@pytest.mark.parametrize("form", cli.FORMS)
def test_every_form_goes_to_a_file_and_twice_the_same(
    form: str, folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert cli.main(["review", "bad/bad.net", "--as", form]) == 1
    shown = capsys.readouterr().out
    for name in ("one", "two"):
        assert cli.main(["review", "bad/bad.net", "--as", form, "--to", name]) == 1
        assert capsys.readouterr().out == ""
    assert Path("one").read_bytes() == Path("two").read_bytes() == shown.encode()


def test_json_of_a_real_run(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    cli.main(["review", "bad/bad.net", "--as", "json"])
    form = json.loads(capsys.readouterr().out)
    found = next(finding for finding in form["findings"] if finding["rule"] == "input-overvoltage")
    assert (found["part"], found["pin"], found["outcome"]) == ("U2", "2", "damage")


def test_the_summary_file_of_a_build_is_appended_to(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    summary = folder / "summary.md"
    summary.write_text("before\n", encoding="utf-8")
    monkeypatch.setenv("GITHUB_STEP_SUMMARY", str(summary))
    cli.main(["review", "bad/bad.net", "--as", "workflow"])
    text = summary.read_text(encoding="utf-8")
    assert text.startswith("before\n# Level crossings\n")
    cli.main(["review", "bad/bad.net", "--as", "json"])
    assert summary.read_text(encoding="utf-8") == text


def test_decks_of_a_run(folder: Path) -> None:
    cli.main(["review", "bad/bad.net", "--decks", "decks"])
    decks = sorted(path.name for path in Path("decks").iterdir())
    assert decks == [f"000_U1.4_to_U2.2_{what}.cir" for what in ("edges", "high", "low")]
    assert ".meas tran rise" in Path("decks", decks[0]).read_text(encoding="utf-8")
    assert ".op" in Path("decks", decks[1]).read_text(encoding="utf-8")


def test_rails_shows_voltage_and_evidence(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["rails", "good/good.net"]) == 0
    text = capsys.readouterr().out
    assert re.search(r"^\+3V3 3\.1[34] to 3\.4[67] V", text, re.MULTILINE), text
    assert "ground: GND" in text


def test_rules_lists_and_explains(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["rules"]) == 0
    assert "shifter-reversed" in capsys.readouterr().out
    assert cli.main(["rules", "shifter-reversed"]) == 0
    text = capsys.readouterr().out
    assert "Speaks when" in text and "Stays quiet when" in text and "Sources:" in text


# ----------------------------------------------------------------------------------------------------- the surroundings


def test_a_reader_that_leaves_early_is_no_error(folder: Path) -> None:
    words = [sys.executable, "-m", "levelcrossing", "review", "bad/bad.net", "--as", "page"]
    read, write = os.pipe()
    os.close(read)
    done = subprocess.run(words, stdout=write, stderr=subprocess.PIPE, text=True, env=ENVIRONMENT, check=False)
    os.close(write)
    assert done.stderr == ""
    assert done.returncode == 0


def test_an_interrupt_ends_quietly(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    def interrupted(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(cli, "run", interrupted)
    assert cli.main(["rules"]) == 130
    assert capsys.readouterr().err == ""


def at_a_terminal(*words: str, **environment: str) -> tuple[str, int]:
    """Run the program on a pseudo terminal and return what it showed and its exit status."""
    main, other = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-m", "levelcrossing", *words],
        stdout=other,
        stderr=other,
        stdin=other,
        env=ENVIRONMENT | environment,
    )
    os.close(other)
    shown = b""
    try:
        while chunk := os.read(main, 65536):
            shown += chunk
    except OSError:  # how Linux ends reading when the other side is closed
        pass
    os.close(main)
    return shown.decode(), process.wait()


def test_colours_for_a_person_none_for_a_pipe(folder: Path) -> None:
    shown, status = at_a_terminal("review", "bad/bad.net", COLUMNS="80")
    assert status == 1
    assert "\x1b[1;31mdamage" in shown
    bare = re.sub(r"\x1b\[[0-9;]*[mK]", "", shown)
    assert max(len(line) for line in bare.replace("\r", "").splitlines()) <= 80
    assert "\x1b" not in run("review", "bad/bad.net").stdout


@pytest.mark.parametrize("environment", [{"NO_COLOR": "1"}, {"TERM": "dumb"}])
def test_colours_can_be_declined(folder: Path, environment: dict[str, str]) -> None:
    shown, _ = at_a_terminal("review", "bad/bad.net", **environment)
    assert "\x1b" not in shown


def test_progress_only_with_several_boards_and_a_person(folder: Path) -> None:
    shown, _ = at_a_terminal("review", "bad/bad.net", "good/good.net")
    assert "1 of 2: bad/bad.net" in shown
    assert " of " not in run("review", "bad/bad.net", "good/good.net").stderr


def test_an_output_that_cannot_show_everything_gets_plain_characters(folder: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "levelcrossing", "review", "bad/bad.net"],
        capture_output=True,
        env=ENVIRONMENT | {"PYTHONIOENCODING": "ascii"},
        check=False,
    )
    assert done.returncode == 1
    assert done.stdout.isascii() and b"takes" in done.stdout
