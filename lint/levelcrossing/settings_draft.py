"""The command ``settings``: a commented levelcrossing.toml from what a review could not know.

Every line that declares something is commented out: a draft that is saved unread changes nothing.
"""

from __future__ import annotations

import argparse
import datetime
from collections.abc import Iterable, Iterator
from dataclasses import replace
from pathlib import Path

from levelcrossing.errors import CommandError
from levelcrossing.model import Basis, Part, PinModel, Review
from levelcrossing.partkinds import is_connector
from levelcrossing.reports.clean import visible
from levelcrossing.settings import load_settings
from levelcrossing.waive import toml_text

_MOST_PINS = 8


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the arguments of ``settings``."""
    parser.add_argument("path", metavar="PATH", help="netlist, sheet or project folder")
    parser.add_argument("--to", metavar="FILE", help="write the file there; an existing one is never overwritten")
    parser.add_argument("--settings", metavar="FILE", help="settings already made")
    parser.add_argument("--facts", metavar="FILE", action="append", default=[], help="further trade data of your own")


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Write a starting settings file.

    Parameters
    ----------
    args : argparse.Namespace

    Returns
    -------
    tuple of (str, int)
        The file's text, or where it was written, and 0.
    """
    from levelcrossing.review import review

    settings = replace(load_settings(args.path, args.settings), today=datetime.date.today().isoformat())
    done = review(args.path, settings, facts_files=[Path(file) for file in getattr(args, "facts", ())])
    text = draft(done)
    target = getattr(args, "to", None)
    if target is None:
        return text, 0
    try:
        with open(target, "x", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
    except FileExistsError:
        remedy = "name a new file, or copy what you need from the draft"
        raise CommandError(f"{target} exists already", remedy=remedy) from None
    return f"{target} written: {_size(text)}\n", 0


def draft(review: Review) -> str:
    """Return a commented settings file.

    Parameters
    ----------
    review : Review
        What it could not know becomes a line to fill in.

    Returns
    -------
    str
        TOML; it declares nothing as it stands.
    """
    lines = [
        "# levelcrossing.toml: what the board itself does not tell.",
        "# Fill in what you know, take the # away in front of it, and keep this file beside the project.",
        "",
        '# stop_at = "malfunction"        # damage, malfunction, marginal, unknown or never',
        "",
        "[rails]",
        *_rails(review),
        "",
        "[far_ends]",
        *_far_ends(review),
        "",
        "[pins]",
        *_pins(review),
        "",
        "[rates]",
        '# "/SPI_*" = "8M"               # bits per second, by net or pattern',
        "",
        "[tolerances]",
        '# rails = "5%"                  # what the review takes where nothing says otherwise',
        '# resistors = "1%"',
        "",
        "[loads]",
        '# stray = "10p"                 # capacitance of each net besides that of its pins',
        "",
    ]
    return "\n".join(lines)


def _rails(review: Review) -> Iterator[str]:
    if not review.rails.unknown:
        yield "# Every supply found has a voltage."
    for net, settle in review.rails.unknown:
        yield _entry(net, '"?"', settle or 'volts, such as "5" or "4.4..5.25"')


def _far_ends(review: Review) -> Iterator[str]:
    """Yield one entry for each connector with signals whose other side is not known, or was only inferred."""
    open_pins: dict[str, list[str]] = {}
    connectors = {part.reference for part in review.board.parts if is_connector(part)}
    for entry in review.coverage.not_judged:
        if entry.part in connectors:
            open_pins.setdefault(entry.part, []).append(_pin_words(entry.pin, entry.name or entry.net))
    for crossing in review.crossings:
        for pin in (crossing.solved.crossing.driver, crossing.solved.crossing.receiver):
            if pin is not None and pin.inferred_far_end:
                words = _pin_words(pin.number, pin.net) + f" inferred: {pin.why}"
                open_pins.setdefault(pin.part, []).append(words)
    if not open_pins:
        yield "# No connector carries a signal whose other side is not known."
        return
    yield '# {rail = "5"} for volts or {rail = "+5V"} for a net; levels = "ttl" or "cmos"; drives = false or'
    yield '# reads = false for one direction; open_drain = true. "J1.3" declares one pin, "J1" the whole connector.'
    parts = {part.reference: part for part in review.board.parts}
    for reference, pins in _sorted(open_pins, review):
        yield _entry(reference, '{rail = "?"}', _what(parts.get(reference)) + ": pin " + _some(pins))


def _pins(review: Review) -> Iterator[str]:
    """Yield one entry for each part whose levels were only assumed, or that could not be judged."""
    found: dict[str, list[str]] = {}
    connectors = {part.reference for part in review.board.parts if is_connector(part)}
    for crossing in review.crossings:
        for pin in (crossing.solved.crossing.driver, crossing.solved.crossing.receiver):
            if pin is not None and pin.role == "signal" and _assumed(pin):
                found.setdefault(pin.part, []).append(_pin_words(pin.number, pin.name))
    for entry in review.coverage.not_judged:
        if entry.part not in connectors:
            found.setdefault(entry.part, []).append(f"{_pin_words(entry.pin, entry.name)} not judged: {entry.why}")
    if not found:
        yield "# Every part that takes part in a crossing is known."
        return
    yield "# tolerates, vih and vil are volts from the data sheet; rail names the supply; drives, reads and open_drain"
    yield '# are true or false. "U1.3" declares one pin, "U1" the whole part.'
    parts = {part.reference: part for part in review.board.parts}
    for reference, pins in _sorted(found, review):
        remark = _what(parts.get(reference)) + ": pin " + _some(pins)
        yield _entry(reference, "{tolerates = ?, vih = ?, vil = ?}", remark)


def _assumed(pin: PinModel) -> bool:
    sides = [side.basis for side in (pin.drive, pin.receive) if side is not None]
    return not sides or Basis.weakest(*sides) is Basis.ASSUMED


def _entry(key: str, value: str, remark: str) -> str:
    """Return a line that is commented out; the key and the remark come from the board and stay on it."""
    return f"# {toml_text(key)} = {value}".ljust(32) + f"  # {visible(remark)}"


def _pin_words(number: str, name: str) -> str:
    plain = name.strip("~{}")
    return f"{number} ({plain})" if plain and plain != number else number


def _what(part: Part | None) -> str:
    return (part.value or part.symbol or "no value") if part is not None else "not on the board"


def _some(pins: Iterable[str]) -> str:
    every = list(dict.fromkeys(pins))
    more = f" and {len(every) - _MOST_PINS} more" if len(every) > _MOST_PINS else ""
    return ", ".join(every[:_MOST_PINS]) + more


def _sorted(found: dict[str, list[str]], review: Review) -> list[tuple[str, list[str]]]:
    """Return the entries in the board's order of parts."""
    order = {part.reference: index for index, part in enumerate(review.board.parts)}
    return sorted(found.items(), key=lambda item: (order.get(item[0], len(order)), item[0]))


def _size(text: str) -> str:
    entries = sum(1 for line in text.splitlines() if line.startswith('# "') and "?" in line)
    return f"{entries} line{'' if entries == 1 else 's'} to fill in"
