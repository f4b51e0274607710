"""The command ``waive``: accepts a finding by adding a waiver with its fingerprint to levelcrossing.toml.

The block is appended; everything that stands in the file stays as it is, byte for byte.
"""

from __future__ import annotations

import argparse
import datetime
import os
import tempfile
from dataclasses import replace
from pathlib import Path

from levelcrossing.declared import nearest, read_day, shown
from levelcrossing.errors import CommandError, SettingsError
from levelcrossing.model import Finding, Review
from levelcrossing.settings import FILE_NAME, find_settings, load_settings, parse_settings
from levelcrossing.waivers import fingerprinted, place_of, stands_at


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the arguments of ``waive``."""
    parser.add_argument("path", metavar="PATH", help="netlist, sheet or project folder")
    parser.add_argument("--rule", metavar="NAME", required=True, help="rule of the finding to accept")
    parser.add_argument("--at", metavar="PLACE", required=True, help="part, pin (U1.3) or net of the finding")
    parser.add_argument("--reason", metavar="TEXT", required=True, help="why it is acceptable; shown in every report")
    parser.add_argument("--until", metavar="DAY", help="last day, YYYY-MM-DD")
    parser.add_argument("--settings", metavar="FILE", help="settings file to add it to")
    parser.add_argument("--facts", metavar="FILE", action="append", default=[], help="further trade data of your own")


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Add a waiver for each finding of a rule at a place.

    Parameters
    ----------
    args : argparse.Namespace

    Returns
    -------
    tuple of (str, int)
        What was written, and 0.

    Raises
    ------
    CommandError
        When there is no such finding, no reason, or the day is none or past.
    """
    from levelcrossing.review import review

    today = datetime.date.today().isoformat()
    reason, until = check_words(args.reason, args.until, today)
    settings = replace(load_settings(args.path, args.settings), today=today)
    done = review(args.path, settings, facts_files=[Path(file) for file in getattr(args, "facts", ())])
    findings = findings_at(done, args.rule, args.at)
    target = settings_file(args.path, args.settings)
    text = append_waivers(target, findings, reason, until)
    places = ", ".join(shown(place_of(finding)) for finding in findings)
    return f"{_shown_path(target)}: {args.rule} at {places} is accepted.\n{text}", 0


def check_words(reason: str, until: str | None, today: str) -> tuple[str, str]:
    """Return reason and last day as they will be written; refuse an empty reason and a day that is past or none."""
    plain = " ".join(reason.split())
    if not plain:
        raise CommandError("a waiver needs a reason", remedy='say why the finding is acceptable: --reason "..."')
    if until is None:
        return plain, ""
    day = read_day(until)
    if day is None:
        raise CommandError(f"--until {shown(until)} is not a day", remedy="write it as 2027-01-31")
    if day < today:
        raise CommandError(f"--until {day} is past", remedy="name the last day on which the waiver holds")
    return plain, day


def findings_at(review: Review, rule: str, at: str) -> tuple[Finding, ...]:
    """Return the open findings of a rule at a place, with their fingerprints.

    Raises
    ------
    CommandError
        When there are none; names what there is.
    """
    same_rule = [finding for finding in review.findings if finding.rule == rule]
    here = [finding for finding in same_rule if stands_at(finding, at)]
    if not same_rule:
        rules = {finding.rule for finding in review.findings}
        remedy = nearest(rule, rules) if rules else "it has no findings at all"
        raise CommandError(f"the review has no finding of {shown(rule)}", remedy=remedy)
    if not here:
        places = ", ".join(shown(place_of(finding)) for finding in same_rule[:8])
        raise CommandError(f"there is no {rule} at {shown(at)}", remedy=f"there is one at {places}")
    open_ones = [finding for finding in here if finding.waived is None]
    if not open_ones:
        why = shown(here[0].waived or "")
        raise CommandError(f"{rule} at {shown(at)} is accepted already", remedy=f"because: {why}")
    return fingerprinted(open_ones, review)


def settings_file(path: str, explicit: str | None) -> Path:
    """Return the settings file to write: the one in force, else a new one beside the board."""
    if explicit is not None:
        return Path(explicit)
    found = find_settings(path)
    if found is not None:
        return found
    board = Path(os.path.abspath(path))
    return (board if board.is_dir() else board.parent) / FILE_NAME


def append_waivers(target: Path, findings: tuple[Finding, ...], reason: str, until: str) -> str:
    """Append one waiver for each finding to a settings file, which is created when it does not exist.

    Returns
    -------
    str
        The text that was added.

    Raises
    ------
    SettingsError
        When the file would no longer be valid; it is then left as it was.
    """
    before = target.read_bytes() if target.exists() else b""
    line_end = "\r\n" if b"\r\n" in before else "\n"
    block = "\n".join(waiver_text(finding, reason, until) for finding in findings)
    gap = "" if not before else "\n" if before.endswith((b"\n", b"\r")) else "\n\n"
    after = before + (gap + block).replace("\n", line_end).encode("utf-8")
    name = _shown_path(target)
    wanted = len(parse_settings(before.decode("utf-8-sig"), name).waivers) + len(findings)
    try:
        valid = len(parse_settings(after.decode("utf-8-sig"), name).waivers) == wanted
    except SettingsError:
        valid = False
    if not valid:
        # A list written as waivers = [...] cannot be continued below.
        raise SettingsError("no waiver can be appended", remedy="write the waivers as [[waivers]] tables", file=name)
    _replace(target, after)
    return block


def waiver_text(finding: Finding, reason: str, until: str) -> str:
    """Return the TOML block of one waiver."""
    lines = [
        "[[waivers]]",
        f"rule = {toml_text(finding.rule)}",
        f"at = {toml_text(place_of(finding))}",
        f"reason = {toml_text(reason)}",
    ]
    if until:
        lines.append(f"until = {toml_text(until)}")
    if finding.fingerprint:
        lines.append(f"fingerprint = {toml_text(finding.fingerprint)}")
    return "\n".join(lines) + "\n"


def toml_text(text: str) -> str:
    """Return a text as a TOML basic string on one line; what a display would obey is written as an escape."""
    pieces = []
    for character in text:
        code = ord(character)
        if character in '"\\':
            pieces.append("\\" + character)
        elif 0xD800 <= code <= 0xDFFF:
            pieces.append("?")  # half a character: TOML has no way to write it
        elif character.isprintable():
            pieces.append(character)
        else:
            pieces.append(f"\\u{code:04X}" if code <= 0xFFFF else f"\\U{code:08X}")
    return '"' + "".join(pieces) + '"'


def _replace(target: Path, content: bytes) -> None:
    """Write a file as a whole or not at all; a link stays a link."""
    real = Path(os.path.realpath(target))
    handle, temporary = tempfile.mkstemp(dir=real.parent, prefix=f".{FILE_NAME}-")
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(content)
        os.chmod(temporary, real.stat().st_mode & 0o777 if real.exists() else 0o644)
        os.replace(temporary, real)
    except BaseException:
        os.unlink(temporary)
        raise


def _shown_path(path: Path) -> str:
    try:
        return Path(os.path.relpath(path)).as_posix()
    except ValueError:  # another drive
        return path.as_posix()


__all__ = ["add_arguments", "append_waivers", "run", "toml_text", "waiver_text"]
