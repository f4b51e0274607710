"""levelcrossing.toml: what the user declares of a board, read strictly.

The file stands beside the project. Everything in it is optional::

    stop_at = "malfunction"                 # damage, malfunction, marginal, unknown, never

    [rails]                                 # volts by net name or pattern
    "VMOT" = "24"                           # with the rails' tolerance
    "VBUS" = "4.4..5.25"                    # low..high, or low..nominal..high
    "+1V8" = "1.8 +-2%"

    [pins]                                  # one pin, or a whole part ("U3")
    "U3.4" = {tolerates = 5.5, drives = false, reads = true, open_drain = false, vih = 2.0, vil = 0.8, rail = "+3V3"}

    [far_ends]                              # what lies beyond a connector: one pin, or the whole connector
    "J3"   = {rail = "5", levels = "ttl"}
    "J3.4" = {drives = false}               # the rest as for J3

    [rates]                                 # bits per second by net name or pattern
    "/SPI_*" = "8M"

    [tolerances]
    rails = "5%"
    resistors = "1%"

    [margins]
    thin = "0.1 V"

    [loads]
    stray = "10p"

    [[waivers]]
    rule = "input-overvoltage"
    at = "U3.4"                             # a pin, a part or a net
    reason = "the host is never fitted in this product"
    until = "2027-01-31"                    # the last day; optional
    fingerprint = "1:0123456789abcdef"      # optional; `levelcrossing waive` writes it

A key that is not known, a value of the wrong kind, a date or a number that cannot be read is an error that names the
file, the line and the nearest right key. What the same facts look like as fields of a schematic symbol is told in
``symbolfields``.
"""

from __future__ import annotations

import difflib
import fnmatch
import hashlib
import os
import re
import tomllib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any, NoReturn

from levelcrossing.declared import (
    PIN_KEYS,
    inherited,
    nearest,
    pin_setting,
    read_day,
    read_fraction,
    read_number,
    read_rate,
    read_volts,
    shown,
)
from levelcrossing.errors import SettingsError
from levelcrossing.model import Board, Outcome, PinSetting, Settings, Spread, Waiver
from levelcrossing.symbolfields import settings_from_fields

__all__ = [
    "FILE_NAME",
    "PARTS_NAME",
    "find_settings",
    "load_settings",
    "parse_settings",
    "repository_root",
    "settings_from_fields",
    "unmatched",
]

FILE_NAME = "levelcrossing.toml"
PARTS_NAME = "levelcrossing-parts.toml"
"""Trade rows of the project's own: data only, found as the settings file is."""

MOST_LEVELS_UP = 5
"""How many folders above the board's own are looked into when no repository root ends the search."""

MOST_BYTES = 1_000_000
"""A settings file beyond this is a mistake or an attack."""

TOP_KEYS = ("rails", "pins", "far_ends", "rates", "tolerances", "margins", "loads", "stop_at", "waivers")
WAIVER_KEYS = ("rule", "at", "reason", "until", "fingerprint")
STOP_WORDS = ("damage", "malfunction", "marginal", "unknown", "never")

_PLACE_KEY = re.compile(r"[^\s.]+(?:\.\S+)?")
_RULE_NAME = re.compile(r"[a-z][a-z0-9]*(?:-[a-z0-9]+)*")
_TOML_LINE = re.compile(r"line (\d+)")


# ------------------------------------------------------------------------------------------------------------- reading


def load_settings(board_path: str, explicit: str | None = None) -> Settings:
    """Read the settings that belong to a board.

    Parameters
    ----------
    board_path : str
        The reviewed file or project folder.
    explicit : str or None
        A settings file named by the user; then nothing is searched.

    Returns
    -------
    Settings
        Empty settings when there is no file.

    Raises
    ------
    SettingsError
        When the file cannot be read or holds something that is not understood.
    """
    found = Path(explicit) if explicit is not None else find_settings(board_path)
    settings = Settings() if found is None else parse_settings(_read_text(found), _shown_path(found))
    parts = find_settings(board_path, PARTS_NAME)
    if parts is None:
        return settings
    text = _read_text(parts)
    return replace(settings, parts_file=_shown_path(parts), parts_rows=_row_digests(text))


def _row_digests(text: str) -> tuple[tuple[str, str], ...]:
    """Return the rows of a file of trade rows by name, each with a digest; whether they are sound is judged at load."""
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        return ()
    found = [
        (f"{table} {row.get('id', '?')}", hashlib.sha256(repr(sorted(row.items(), key=str)).encode()).hexdigest()[:12])
        for table, rows in document.items()
        if isinstance(rows, list)
        for row in rows
        if isinstance(row, dict)
    ]
    return tuple(found)


def find_settings(board_path: str, name: str = FILE_NAME) -> Path | None:
    """Return the settings file of a board: in its folder, or the nearest one above within the repository.

    Parameters
    ----------
    board_path : str
        The reviewed file or project folder.
    name : str
        Which file: the settings, or the project's own trade rows.

    Returns
    -------
    Path or None
        The search ends at a folder that holds ``.git``, or five folders up.

    Raises
    ------
    SettingsError
        When the file found is a link that leads out of the repository: a project's files must not make the tool read
        others.
    """
    start = Path(os.path.abspath(board_path))
    if not start.is_dir():
        start = start.parent
    root = repository_root(start)
    for levels_up, folder in enumerate((start, *start.parents)):
        if levels_up > MOST_LEVELS_UP and root is None:
            break
        candidate = folder / name
        if candidate.is_symlink() and not candidate.resolve().is_relative_to((root or folder).resolve()):
            raise SettingsError("is a link that leads out of the repository", file=_shown_path(candidate))
        if candidate.exists():
            return candidate
        if folder == root:
            break
    return None


def repository_root(folder: Path) -> Path | None:
    """Return the nearest folder at or above an absolute one that holds ``.git``; None when there is none."""
    for candidate in (folder, *folder.parents):
        if (candidate / ".git").exists():
            return candidate
    return None


def _read_text(path: Path) -> str:
    shown = _shown_path(path)
    try:
        if not path.is_file():  # a pipe or a device would block or never end
            raise SettingsError("there is no such settings file", file=shown, remedy="name a TOML file")
        with path.open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
    except OSError as error:
        raise SettingsError(f"cannot be read: {error.strerror or error}", file=shown) from None
    if len(data) > MOST_BYTES:
        raise SettingsError(f"is larger than {MOST_BYTES // 1000} kB", file=shown, remedy="settings are short")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise SettingsError("is not UTF-8 text", file=shown, line=line, remedy="save it as UTF-8") from None


def _shown_path(path: Path) -> str:
    """Return a path as people write it: relative to the working folder where that is possible."""
    try:
        return Path(os.path.relpath(path)).as_posix()
    except ValueError:  # another drive
        return path.as_posix()


# --------------------------------------------------------------------------------------------------- lines of the keys

_KEY = r"""(?:"(?:[^"\\]|\\.)*"|'[^']*'|[A-Za-z0-9_-]+)"""
_KEY_PATH = rf"{_KEY}(?:\s*\.\s*{_KEY})*"
_HEADER = re.compile(rf"\s*(\[\[?)\s*({_KEY_PATH})\s*\]")
_ASSIGNMENT = re.compile(rf"\s*({_KEY_PATH})\s*=")


def _key_lines(text: str) -> dict[tuple[str, ...], int]:
    """Return the line on which each table and key first stands.

    tomllib tells no lines. This scan knows headers, plain, quoted and dotted keys and skips the inside of multi-line
    strings; keys within an inline table share the line of the table.
    """
    lines: dict[tuple[str, ...], int] = {}
    counts: dict[tuple[str, ...], int] = {}
    table: tuple[str, ...] = ()
    inside = ""
    for number, line in enumerate(text.splitlines(), 1):
        if inside:
            if line.count(inside) % 2:
                inside = ""
            continue
        if header := _HEADER.match(line):
            table = _key_parts(header[2])
            for length in range(1, len(table) + 1):
                lines.setdefault(table[:length], number)
            if header[1] == "[[":
                counts[table] = counts.get(table, -1) + 1
                table = (*table, str(counts[table]))
                lines.setdefault(table, number)
        elif assignment := _ASSIGNMENT.match(line):
            path = (*table, *_key_parts(assignment[1]))
            for length in range(len(table) + 1, len(path) + 1):
                lines.setdefault(path[:length], number)
        inside = next((quotes for quotes in ('"""', "'''") if line.count(quotes) % 2), "")
    return lines


def _key_parts(path: str) -> tuple[str, ...]:
    parts = []
    for piece in re.findall(_KEY, path):
        try:
            parts.append(tomllib.loads(f"k = {piece}")["k"] if piece[0] in "\"'" else piece)
        except tomllib.TOMLDecodeError:  # not TOML after all; then tomllib itself has refused the file
            parts.append(piece)
    return tuple(parts)


# ------------------------------------------------------------------------------------------------------ what it means


def parse_settings(text: str, file: str = FILE_NAME) -> Settings:
    """Read settings from text.

    Parameters
    ----------
    text : str
        The TOML document.
    file : str
        Name for errors.

    Returns
    -------
    Settings

    Raises
    ------
    SettingsError
        With file, line and the nearest right key.
    """
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        message = str(error)
        at = _TOML_LINE.search(message)
        line = int(at[1]) if at else max(len(text.splitlines()), 1)
        what = shown(re.sub(r"\s*\(at [^)]*\)$", "", message), 120).strip("'\"")
        raise SettingsError(f"is not valid TOML: {what}", file=file, line=line) from None
    except (RecursionError, ValueError) as error:
        what = "is nested too deeply" if isinstance(error, RecursionError) else "holds a number that is too long"
        raise SettingsError(what, file=file, remedy="settings are flat") from None
    return _Document(document, _key_lines(text), file).settings()


class _Document:
    """A parsed settings file together with the lines of its keys."""

    def __init__(self, document: Mapping[str, Any], lines: Mapping[tuple[str, ...], int], file: str) -> None:
        self._document = document
        self._lines = lines
        self._file = file

    def settings(self) -> Settings:
        """Return what the document declares."""
        self._check_keys(self._document, TOP_KEYS, ())
        tolerances = self._table("tolerances", ("rails", "resistors"))
        defaults = Settings()
        rail_tolerance = self._fraction(tolerances, "rails", defaults.rail_tolerance)
        margins = self._table("margins", ("thin",))
        loads = self._table("loads", ("stray",))
        pins = self._pin_table("pins", rail_tolerance)
        far_ends = self._pin_table("far_ends", rail_tolerance)
        for place, setting in far_ends.items():
            if not setting.rail:
                self._fail(("far_ends", place), f"far end {shown(place)} has no rail", 'add rail = "5" or a net name')
        return Settings(
            file=self._file,
            rails={
                net: self._volts(("rails", net), value, rail_tolerance) for net, value in self._table("rails").items()
            },
            pins=pins,
            far_ends=far_ends,
            rates=tuple((net, self._rate(("rates", net), value)) for net, value in self._table("rates").items()),
            waivers=self._waivers(),
            rail_tolerance=rail_tolerance,
            resistor_tolerance=self._fraction(tolerances, "resistors", defaults.resistor_tolerance),
            stray_farads=self._number(
                ("loads", "stray"), loads.get("stray", defaults.stray_farads), "F", 'capacitance such as "10p"'
            ),
            thin_margin_volts=self._number(
                ("margins", "thin"), margins.get("thin", defaults.thin_margin_volts), "V", 'voltage such as "0.1 V"'
            ),
            stop_at=self._stop(),
        )

    # -- errors ------------------------------------------------------------------------------------------------------

    def _line(self, path: tuple[str, ...]) -> int:
        for length in range(len(path), 0, -1):
            if path[:length] in self._lines:
                return self._lines[path[:length]]
        return 0

    def _fail(self, path: tuple[str, ...], what: str, remedy: str = "") -> NoReturn:
        raise SettingsError(what, remedy=remedy, file=self._file, line=self._line(path))

    def _check_keys(self, table: Mapping[str, Any], known: tuple[str, ...], path: tuple[str, ...]) -> None:
        for key in table:
            if key not in known:
                where = f" in {_joined(path)}" if path else ""
                self._fail((*path, key), f"unknown key {shown(key)}{where}", nearest(key, known))

    def _table(self, name: str, known: tuple[str, ...] | None = None) -> Mapping[str, Any]:
        table = self._document.get(name, {})
        if not isinstance(table, dict):
            self._fail((name,), f"{name} must be a table, not {shown(table)}", f"write [{name}] and its keys below it")
        if known is not None:
            self._check_keys(table, known, (name,))
        for key in table:
            if not key.strip():
                self._fail((name, key), f"empty key in {name}")
        return table

    # -- values ------------------------------------------------------------------------------------------------------

    def _number(self, path: tuple[str, ...], value: object, unit: str, wanted: str) -> float:
        number = read_number(value, unit)
        if number is None or number < 0:
            self._fail(path, f"{_joined(path)} is {shown(value)}, not a {wanted}")
        return number

    def _fraction(self, table: Mapping[str, Any], key: str, default: float) -> float:
        if key not in table:
            return default
        fraction = read_fraction(table[key])
        if fraction is None:
            path = ("tolerances", key)
            self._fail(path, f"{_joined(path)} is {shown(table[key])}, not a tolerance from 0 to 50 %", 'write "5%"')
        return fraction

    def _volts(self, path: tuple[str, ...], value: object, tolerance: float) -> Spread:
        volts = read_volts(value, tolerance)
        if volts is None:
            remedy = 'write "5", "4.4..5.25" or "1.8 +-2%"'
            self._fail(path, f"{_joined(path)} is {shown(value)}, not a voltage", remedy)
        return volts

    def _rate(self, path: tuple[str, ...], value: object) -> float:
        rate = read_rate(value)
        if rate is None:
            self._fail(path, f"{_joined(path)} is {shown(value)}, not a bit rate", 'write "8M" or "400k" or 115200')
        return rate

    def _stop(self) -> Outcome | None:
        if "stop_at" not in self._document:
            return None
        word = self._document["stop_at"]
        if not isinstance(word, str) or word not in STOP_WORDS:
            self._fail(("stop_at",), f"stop_at is {shown(word)}", nearest(str(word), STOP_WORDS))
        return Outcome.SOUND if word == "never" else Outcome(word)

    # -- pins and far ends -------------------------------------------------------------------------------------------

    def _pin_table(self, name: str, tolerance: float) -> dict[str, PinSetting]:
        found: dict[str, PinSetting] = {}
        for place, value in self._table(name).items():
            path = (name, place)
            if not _PLACE_KEY.fullmatch(place):
                self._fail(path, f"{shown(place)} is neither a pin nor a part", 'write "U3.4" or "U3"')
            if not isinstance(value, dict):
                self._fail(path, f"{_joined(path)} must be a table, not {shown(value)}", 'write {rail = "5"}')
            self._check_keys(value, PIN_KEYS, path)
            try:
                setting = pin_setting(value, tolerance)
            except SettingsError as error:
                self._fail(path, f"{_joined(path)}: {error.what}", error.remedy)
            found[place] = replace(setting, line=self._line(path))
        return {place: inherited(setting, found.get(place.partition(".")[0])) for place, setting in found.items()}

    # -- waivers -----------------------------------------------------------------------------------------------------

    def _waivers(self) -> tuple[Waiver, ...]:
        entries = self._document.get("waivers", [])
        if not isinstance(entries, list) or not all(isinstance(entry, dict) for entry in entries):
            self._fail(("waivers",), "waivers must be a list of tables", "write [[waivers]] above each one")
        return tuple(self._waiver(entry, ("waivers", str(index))) for index, entry in enumerate(entries))

    def _waiver(self, entry: Mapping[str, Any], path: tuple[str, ...]) -> Waiver:
        self._check_keys(entry, WAIVER_KEYS, path)
        texts: dict[str, str] = {}
        for key in ("rule", "at", "reason"):
            value = entry.get(key)
            if value is None:
                self._fail(path, f"waiver has no {key}", f'add {key} = "..."')
            if not isinstance(value, str) or not value.strip():
                self._fail((*path, key), f"{key} of a waiver is {shown(value)}, not a text")
            texts[key] = value.strip()
        if not _RULE_NAME.fullmatch(texts["rule"]):
            self._fail((*path, "rule"), f"{shown(texts['rule'])} is not the name of a rule", "one rule for each waiver")
        fingerprint = entry.get("fingerprint", "")
        if not isinstance(fingerprint, str):
            self._fail((*path, "fingerprint"), f"fingerprint of a waiver is {shown(fingerprint)}, not a text")
        until = read_day(entry["until"]) if "until" in entry else ""
        if until is None:
            remedy = "write the last day as 2027-01-31"
            self._fail((*path, "until"), f"until of a waiver is {shown(entry['until'])}, not a day", remedy)
        return Waiver(**texts, until=until, fingerprint=fingerprint.strip(), line=self._line(path))


def _joined(path: tuple[str, ...]) -> str:
    """Return a key path for people: ``rails 'VMOT'``, ``waiver 2``."""
    if path[:1] == ("waivers",) and len(path) > 1:
        number = f"waiver {int(path[1]) + 1}"
        return number if len(path) == 2 else f"{path[2]} of {number}"
    if path[0] in ("rails", "rates", "pins", "far_ends"):
        return " ".join([path[0], *(shown(part) for part in path[1:])])
    return ".".join(path)


# --------------------------------------------------------------------------------------------------- against the board


def unmatched(board: Board, settings: Settings) -> tuple[str, ...]:
    """Return a remark for each setting that names what the board does not have.

    Parameters
    ----------
    board : Board
    settings : Settings
        From the file. One file may serve several boards, so that a name of another board is no error.

    Returns
    -------
    tuple of str
        One line each, with the nearest name that the board has.
    """
    pins = {part.reference: [pin.number for pin in part.pins] for part in board.parts}
    nets = [net.name for net in board.nets]
    remarks = []
    for title, table in (("pins", settings.pins), ("far_ends", settings.far_ends)):
        for place, setting in table.items():
            part, dot, number = place.partition(".")
            if part not in pins:
                remarks.append((setting.line, f"{title} {shown(place)}: no such part on the board", part, [*pins]))
            elif dot and number not in pins[part]:
                remarks.append(
                    (setting.line, f"{title} {shown(place)}: no such pin of {shown(part)}", number, pins[part])
                )
    for title, names in (("rails", [*settings.rails]), ("rates", [net for net, _ in settings.rates])):
        for name in names:
            if name not in nets and not any(fnmatch.fnmatchcase(net, name) for net in nets):
                remarks.append((0, f"{title} {shown(name)}: no such net on the board", name, nets))
    return tuple(_remark(settings.file, *remark) for remark in remarks)


def _remark(file: str, line: int, what: str, word: str, known: list[str]) -> str:
    where = f"{file}:{line}: " if file and line else f"{file}: " if file else ""
    close = difflib.get_close_matches(word[:100], known, n=1, cutoff=0.6)
    return f"{where}{what}" + (f" (did you mean {shown(close[0])}?)" if close else "")
