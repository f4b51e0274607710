"""Every error that levelcrossing raises on purpose.

::

    LevelcrossingError            one line for the user, exit status 2
    ├── InputError                a file to review cannot be used (says file, line, what, what to do)
    ├── SettingsError             levelcrossing.toml or a schematic field is wrong (says file, line, nearest right key)
    ├── TradeDataError            a row of trade data is malformed (says file, line, row)
    ├── RuleFileError             a rule file is malformed (says file, line)
    └── CommandError              the command line asks for something impossible

Anything else that escapes is a bug and keeps its traceback.
"""

from __future__ import annotations


class LevelcrossingError(Exception):
    """Base of all deliberate errors.

    Parameters
    ----------
    what : str
        What is wrong, in one line.
    remedy : str
        What the user can do about it, in one line; may be empty.
    file : str
        The file at fault; may be empty.
    line : int
        Line within the file, counted from 1; 0 when no line applies.
    """

    def __init__(self, what: str, *, remedy: str = "", file: str = "", line: int = 0) -> None:
        self.what = what
        self.remedy = remedy
        self.file = file
        self.line = line
        super().__init__(str(self))

    def __str__(self) -> str:
        where = f"{self.file}:{self.line}: " if self.file and self.line else f"{self.file}: " if self.file else ""
        return f"{where}{self.what}" + (f" ({self.remedy})" if self.remedy else "")


class InputError(LevelcrossingError):
    """A file to review cannot be read as what it claims to be."""


class SettingsError(LevelcrossingError):
    """A setting is unknown, malformed or contradicts another."""


class TradeDataError(LevelcrossingError):
    """A row of trade data is malformed, has no source or contradicts itself."""


class RuleFileError(LevelcrossingError):
    """A rule file lacks a part that every rule must have."""


class CommandError(LevelcrossingError):
    """The command line asks for something that cannot be done."""
