"""What the command line knows of its output; commands get it as ``args.screen``."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass


def _silent(text: str) -> None:
    """Show nothing."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Screen:
    """Width and abilities of standard output, and how to show something while a command runs.

    Parameters
    ----------
    width : int
        Columns.
    colour, ascii_only : bool
    progress : callable
        Shows one line that the next one replaces; an empty text clears it.
    tell : callable
        Writes one line of complaint.
    """

    width: int = 100
    colour: bool = False
    ascii_only: bool = False
    progress: Callable[[str], None] = _silent
    tell: Callable[[str], None] = _silent
