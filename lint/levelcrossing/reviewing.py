"""The command ``review``: boards in, one report out, exit status from the worst open finding."""

from __future__ import annotations

import argparse
import datetime
import os
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from levelcrossing.errors import CommandError, InputError
from levelcrossing.model import Outcome, Review, Settings
from levelcrossing.read import read_board
from levelcrossing.reports.clean import terminal
from levelcrossing.reports.jsonform import json_report
from levelcrossing.reports.junit import junit_report
from levelcrossing.reports.markdown import markdown_report
from levelcrossing.reports.page import page_report
from levelcrossing.reports.quality import quality_report
from levelcrossing.reports.sarif import sarif_report
from levelcrossing.reports.screen import Screen
from levelcrossing.reports.terminal import coloured_report, plain_report
from levelcrossing.reports.workflow import workflow_report
from levelcrossing.review import extra_rows, open_case, review
from levelcrossing.rulebook import RuleFile, load_rules
from levelcrossing.settings import load_settings
from levelcrossing.symbolfields import settings_from_fields


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Review the boards that the command names.

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
        When the only board cannot be used, or the settings, the rules or the trade data.
    """
    screen: Screen = args.screen
    paths = list(dict.fromkeys(args.paths))
    if args.changed:
        from levelcrossing.roots import boards_of

        boards = boards_of(paths)
        for remark in boards.remarks:
            screen.tell(remark)
        paths = list(boards.paths)
    rules_folders = [Path(folder) for folder in args.rules]
    facts_files = [Path(file) for file in args.facts]
    if args.to is not None:
        _check_target(args.to, paths)
    reviews: list[Review] = []
    stops: list[Outcome | None] = []
    failed = 0
    for number, path in enumerate(paths, 1):
        screen.progress(f"{number} of {len(paths)}: {path}" if len(paths) > 1 else "")
        try:
            settings = _settings(path, args.settings)
            done = review(path, settings, rules_folders=rules_folders, facts_files=facts_files)
        except InputError as error:
            # One board that cannot be read must not hide the others; it still decides the exit status.
            if len(paths) == 1:
                raise
            screen.tell(str(error))
            failed += 1
            continue
        reviews.append(done)
        stops.append(stop_level(args.stop_at, settings))
    screen.progress("")
    if args.decks is not None:
        _write_decks(Path(args.decks), paths, args)
    text = report(reviews, stops, args) if reviews else ""
    status = 2 if failed else int(any(reaches(one, stop) for one, stop in zip(reviews, stops, strict=True)))
    if args.form == "workflow":
        _step_summary(reviews)
    if args.to is not None:
        Path(args.to).write_text(text, encoding="utf-8", newline="\n")
        return "", status
    return text, status


def stop_level(asked: str | None, settings: Settings) -> Outcome | None:
    """Return the outcome from which on the exit status is 1; None for never."""
    if asked == "never":
        return None
    if asked is not None:
        return Outcome(asked)
    if settings.stop_at is Outcome.SOUND:  # how the reader of settings says "never"
        return None
    return settings.stop_at or Outcome.MALFUNCTION


def reaches(done: Review, stop: Outcome | None) -> bool:
    """Tell whether a review holds something at or above the stop level; waived findings do not count."""
    if stop is None:
        return False
    if any(finding.outcome.rank <= stop.rank for finding in done.findings if finding.waived is None):
        return True
    return stop is Outcome.UNKNOWN and any(one.verdict is Outcome.UNKNOWN for one in done.crossings)


def report(reviews: Sequence[Review], stops: Sequence[Outcome | None], args: argparse.Namespace) -> str:
    """Return the report in the form asked for."""
    base = os.getcwd()
    if args.form == "text":
        return _text(reviews, args)
    if args.form == "json":
        return json_report(reviews)
    if args.form == "junit":
        return junit_report(reviews, stops=stops)
    if args.form == "sarif":
        return sarif_report(reviews, _rules(args), base=base)
    if args.form == "page":
        return page_report(reviews, _rules(args))
    plain = {"markdown": markdown_report, "workflow": workflow_report, "quality": quality_report}
    return plain[args.form](reviews, base=base)


def _rules(args: argparse.Namespace) -> tuple[RuleFile, ...]:
    return load_rules([Path(folder) for folder in args.rules])


def _text(reviews: Sequence[Review], args: argparse.Namespace) -> str:
    screen: Screen = args.screen
    if args.to is not None:
        return plain_report(reviews, everything=args.everything)
    make = coloured_report if screen.colour else plain_report
    return make(reviews, width=screen.width, everything=args.everything, ascii_only=screen.ascii_only)


def _settings(path: str, explicit: str | None) -> Settings:
    # The core has no clock: the day on which waivers end is told to it here.
    return replace(load_settings(path, explicit), today=datetime.date.today().isoformat())


def _check_target(target: str, paths: Sequence[str]) -> None:
    """Refuse a report file that cannot be written before minutes are spent, and never overwrite what is reviewed."""
    file = Path(target)
    if file.is_dir():
        raise CommandError(f"--to {terminal(target)} is a folder", remedy="name a file")
    if not file.parent.is_dir():
        raise CommandError(
            f"--to {terminal(target)}: there is no folder {terminal(str(file.parent))}", remedy="create it first"
        )
    if any(os.path.realpath(path) == os.path.realpath(target) for path in paths):
        raise CommandError(f"--to {terminal(target)} would overwrite the reviewed board", remedy="name another file")


def _write_decks(folder: Path, paths: Sequence[str], args: argparse.Namespace) -> None:
    from levelcrossing import tradebook
    from levelcrossing.deckfiles import deck_files

    folder.mkdir(parents=True, exist_ok=True)
    facts_files = [Path(file) for file in args.facts]
    for number, path in enumerate(paths, 1):
        try:
            board = read_board(path)
        except InputError:
            continue  # the review has told
        settings = _settings(path, args.settings)
        book = tradebook.load(extra=extra_rows(facts_files, settings))
        case = open_case(board, settings_from_fields(board, settings), book)
        prefix = f"{number}_" if len(paths) > 1 else ""
        for name, text in deck_files(case).items():
            (folder / (prefix + name)).write_text(text, encoding="utf-8", newline="\n")


def _step_summary(reviews: Sequence[Review]) -> None:
    """Append the Markdown summary to the file that a build host names for it."""
    target = os.environ.get("GITHUB_STEP_SUMMARY")
    if target and reviews:
        with open(target, "a", encoding="utf-8", newline="\n") as file:
            file.write(markdown_report(reviews, base=os.getcwd()) + "\n")
