"""The command ``compare``: two revisions in, what changed out, exit status from what became worse.

A revision is a board file or project folder, a saved JSON review, or with ``--against`` the same path in an older
commit.
The stop level is that of the command, else of the *old* revision's settings: a change cannot lower the bar for itself.
A waiver that comes with the change is reported and silences nothing until ``--accept-new-waivers`` says that a
reviewer agrees.
"""

from __future__ import annotations

import argparse
import contextlib
import datetime
import json
import os
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from levelcrossing.differences import Comparison, Side, compare_sides, empty_form
from levelcrossing.errors import CommandError, InputError, LevelcrossingError
from levelcrossing.model import Outcome, Settings
from levelcrossing.revisions import OldFiles, files_of

STOP_WORDS = ("damage", "malfunction", "marginal", "unknown", "never")
_MOST_SAVED_BYTES = 200_000_000


@dataclass(frozen=True, slots=True, kw_only=True)
class _How:
    """What the command line says for both sides."""

    settings: str | None
    today: str
    rules_folders: Sequence[Path]
    facts_files: Sequence[Path]


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the arguments of ``compare``."""
    paths = "two boards or saved JSON reviews; with --against the new ones alone"
    parser.add_argument("paths", metavar="OLD NEW", nargs="+", help=paths)
    parser.add_argument("--against", metavar="REVISION", help="take the old boards from this git revision")
    parser.add_argument("--as", dest="form", metavar="FORM", choices=("text", "json", "markdown"), default="text")
    parser.add_argument("--to", metavar="FILE", help="write the report there instead of to standard output")
    parser.add_argument("--stop-at", metavar="OUTCOME", choices=STOP_WORDS, help="exit with 1 when something became so")
    parser.add_argument(
        "--accept-new-waivers", action="store_true", help="waivers that come with the change count like the old ones"
    )
    parser.add_argument("--all", dest="everything", action="store_true", help="show figures that moved, too")
    parser.add_argument("--settings", metavar="FILE", help="settings of both revisions")
    parser.add_argument("--facts", metavar="FILE", action="append", default=[], help="further trade data of your own")
    parser.add_argument("--rules", metavar="DIR", action="append", default=[], help="a folder of house rules")


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Compare what the command names.

    Parameters
    ----------
    args : argparse.Namespace

    Returns
    -------
    tuple of (str, int)
        Text for standard output and exit status.

    Raises
    ------
    LevelcrossingError
        When a board, the settings or the revision cannot be used.
    """
    from levelcrossing.reports.changes import json_changes, markdown_changes, text_changes

    how = _How(
        settings=args.settings,
        today=datetime.date.today().isoformat(),
        rules_folders=[Path(folder) for folder in getattr(args, "rules", ())],
        facts_files=[Path(file) for file in getattr(args, "facts", ())],
    )
    stop_word = args.stop_at
    accept = bool(getattr(args, "accept_new_waivers", False))
    comparisons = [
        compare_sides(old, new, stop_at=stop_level(stop_word, old, new), accept_new_waivers=accept)
        for old, new in _sides(args.paths, args.against, how)
    ]
    everything = bool(getattr(args, "everything", False))
    if args.form == "json":
        text = json_changes(comparisons)
    elif args.form == "markdown":
        text = markdown_changes(comparisons, everything=everything)
    else:
        text = text_changes(comparisons, everything=everything)
    status = int(any(comparison.fails for comparison in comparisons))
    if getattr(args, "to", None):
        Path(args.to).write_text(text, encoding="utf-8", newline="\n")
        return "", status
    return text, status


def stop_level(word: str | None, old: Side, new: Side) -> Outcome | None:
    """Return the outcome from which on a change counts: from the command, else from the old revision's settings."""
    if word is not None:
        return None if word == "never" else Outcome(word)
    settings = old.settings if old.settings is not None else new.settings
    chosen = settings.stop_at if settings is not None else None
    return None if chosen is Outcome.SOUND else chosen or Outcome.MALFUNCTION


def _sides(paths: Sequence[str], against: str | None, how: _How) -> list[tuple[Side, Side]]:
    if against is None:
        if len(paths) != 2:
            remedy = "name two boards, or one and --against REVISION"
            raise CommandError(f"compare takes an old and a new board, not {len(paths)}", remedy=remedy)
        return [(open_side(paths[0], how), open_side(paths[1], how))]
    pairs = []
    with files_of(paths, against) as old_files:
        for path in dict.fromkeys(paths):
            pairs.append((_old_side(path, against, old_files, how), open_side(path, how)))
    return pairs


def _old_side(path: str, against: str, files: OldFiles, how: _How) -> Side:
    from levelcrossing.settings import load_settings

    settings = files.old(how.settings) if how.settings is not None else None
    there = files.there(path)
    why = f"not in {against}"
    if there.exists():
        try:
            return open_side(str(there), replace(how, settings=settings), label=f"{path} at {against}")
        except LevelcrossingError as error:
            # A change that puts a broken file right must be able to pass; then all of it is new.
            why = f"could not be read at {against}: {error.what}"
    declared = Settings()
    with contextlib.suppress(LevelcrossingError):
        declared = load_settings(str(there), settings)
    return Side(label=f"{path} ({why})", form=empty_form(path), settings=declared)


def open_side(path: str, how: _How, label: str = "") -> Side:
    """Return one revision: a saved review as it is, anything else reviewed now."""
    if path.casefold().endswith(".json") and os.path.isfile(path):
        return Side(label=label or path, form=saved_form(path))
    from levelcrossing.read import read_board
    from levelcrossing.reports.jsonform import form
    from levelcrossing.review import review_board
    from levelcrossing.settings import load_settings, settings_from_fields

    settings = replace(load_settings(path, how.settings), today=how.today)
    board = read_board(path)
    done = review_board(board, settings, rules_folders=how.rules_folders, facts_files=how.facts_files)
    declared = settings_from_fields(board, settings)
    return Side(label=label or path, form=form(done), board=board, settings=declared)


def saved_form(path: str) -> dict[str, Any]:
    """Read a review that was saved as JSON.

    Raises
    ------
    InputError
        When the file is not one, or holds several boards.
    """
    try:
        if os.path.getsize(path) > _MOST_SAVED_BYTES:
            raise InputError("is too large for a saved review", file=path)
        with open(path, encoding="utf-8-sig") as stream:
            content = json.load(stream, parse_constant=_refused)
    except OSError as error:
        raise InputError(f"cannot be read: {error.strerror or error}", file=path) from None
    except (ValueError, RecursionError):
        raise InputError("is not JSON", file=path, remedy="save a review with --as json") from None
    if isinstance(content, dict) and isinstance(content.get("reviews"), list):
        if len(content["reviews"]) != 1:
            raise InputError("holds the reviews of several boards", file=path, remedy="save one review to a file")
        content = content["reviews"][0]
    fault = _fault(content)
    if fault:
        raise InputError(f"is not a saved review: {fault}", file=path, remedy="save a review with --as json")
    return dict(content)


def _refused(word: str) -> Any:
    raise ValueError(word)


def _fault(content: Any) -> str:
    """Return what a saved review lacks; empty when it has all that a comparison reads."""
    if not isinstance(content, dict):
        return "it is not an object"
    if content.get("form") != 1:
        return "it is not of form 1"
    with contextlib.suppress(KeyError, TypeError, AttributeError, ValueError):
        for row in content["crossings"]:
            for end in (row["from"], row["to"]):
                _texts(end, ("part", "pin", "name", "net", "rail"))
            _lists_text(row["link"])
            _texts(row["shifter"], ("kind",), none=False)
            Outcome(row["verdict"])
            numbers = range(len(content["findings"]))
            if not all(type(index) is int and index in numbers for index in row.get("findings", ())):
                return "a crossing names a finding that is not there"
        for finding in content["findings"]:
            _texts(finding, ("part", "pin", "net", "waived"))
            _texts(finding, ("rule", "text"), none=False)
            optional = {"fingerprint": "", "condition": "", "remedy": ""}
            _texts(optional | finding, tuple(optional))
            _lists_text(finding.get("also", []))
            if type(finding.get("crossing")) not in (int, type(None)):
                return "a finding names a crossing by something else than its number"
            Outcome(finding["outcome"])
        for rail in content["rails"]:
            _texts(rail, ("net",), none=False)
            volts = [rail[key] for key in ("low", "nominal", "high")]
            if volts != [None] * 3 and not all(type(value) in (int, float) for value in volts):
                return "a rail has no proper voltage"
        for pin in content["coverage"]["not_judged"]:
            _texts(pin, ("part", "pin", "why"), none=False)
        int(content["coverage"]["judged"] + content["coverage"]["signal_pins"])
        return ""
    return "a key is missing or of the wrong kind"


def _texts(table: dict[str, Any], keys: Sequence[str], *, none: bool = True) -> None:
    if not all(isinstance(table[key], str) or (none and table[key] is None) for key in keys):
        raise TypeError


def _lists_text(items: Any) -> None:
    if not isinstance(items, list) or not all(isinstance(item, str) for item in items):
        raise TypeError


__all__ = ["Comparison", "add_arguments", "open_side", "run", "saved_form", "stop_level"]
