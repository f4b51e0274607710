"""The command line: arguments in, report out, exit status. The only module that prints.

Exit status: 0 nothing at or above the stop level, 1 something is, 2 the input or the command is at fault, 130 interrupted.
"""

from __future__ import annotations

import argparse
import difflib
import importlib
import importlib.util
import os
import re
import shutil
import sys
from collections.abc import Callable, Iterable, Sequence
from typing import TYPE_CHECKING, NoReturn

from levelcrossing import __version__
from levelcrossing.errors import CommandError, LevelcrossingError

if TYPE_CHECKING:
    from levelcrossing.reports.screen import Screen

PIPE_WIDTH = 100
FORMS = ("text", "json", "sarif", "markdown", "workflow", "page", "junit", "quality")
STOPS = ("damage", "malfunction", "marginal", "unknown", "never")

ABOUT = """\
Reads the netlist of a board, finds every signal that goes from one supply voltage to another, solves the circuit in
between and says where an input is overstressed, where a logic level is not reached, and what to change."""

AFTERWARDS = """\
Exit status: 0 nothing at or above the stop level, 1 something is, 2 the input or the command is at fault.
`levelcrossing COMMAND --help` explains one command."""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return ``did you mean X?`` for the most similar known word, or an empty text."""
    close = difflib.get_close_matches(word.casefold(), [*known], n=1, cutoff=0.5)
    return f"did you mean {close[0]}?" if close else ""


def show(text: str, most: int = 80) -> str:
    """Return a text of the user's command line or of a file for an error line: one line, harmless."""
    from levelcrossing.reports.clean import terminal

    return terminal(text if len(text) <= most else text[: most - 1] + "…")


class Parser(argparse.ArgumentParser):
    """A parser whose complaints are one line, with the nearest right word."""

    def error(self, message: str) -> NoReturn:
        """Raise instead of printing usage."""
        text = " ".join(message.split())
        wrong = re.match(r"argument (\S+): invalid choice: '(.*)' \(choose from (.*)\)", text)
        if wrong:
            words = [word.strip("' ") for word in wrong[3].split(",")]
            hint = nearest(wrong[2], words) or f"one of {', '.join(words)}"
            raise CommandError(f"{wrong[1]} cannot be {show(wrong[2])!r}", remedy=hint)
        raise CommandError(text.removeprefix("argument "), remedy=f"`{self.prog} --help` shows what is possible")

    def strict(self, arguments: Sequence[str]) -> argparse.Namespace:
        """Parse, refusing what is not known with the nearest right option."""
        parsed, unknown = self.parse_known_args(list(arguments))
        if unknown:
            word = unknown[0]
            if word.startswith("-") and word != "-":
                options = [option for action in self._actions for option in action.option_strings]
                name = word.split("=", 1)[0]
                remedy = nearest(name, options) or f"`{self.prog} --help` lists the options"
                raise CommandError(f"unknown option {show(name)}", remedy=remedy)
            raise CommandError(
                f"{show(word)} is one argument too many", remedy=f"`{self.prog} --help` shows what is possible"
            )
        return parsed


def one_of(what: str, words: Sequence[str]) -> Callable[[str], str]:
    """Return a converter that accepts the words and names the nearest one for anything else."""

    def convert(text: str) -> str:
        if text in words:
            return text
        hint = nearest(text, words) or f"one of {', '.join(words)}"
        raise CommandError(f"there is no {what} {show(text)!r}", remedy=hint)

    return convert


# ------------------------------------------------------------------------------------------------------- the commands


def _shared(parser: Parser) -> None:
    parser.add_argument(
        "--settings", metavar="FILE", help="settings of the board (default: levelcrossing.toml beside it)"
    )
    parser.add_argument(
        "--facts", metavar="FILE", action="append", default=[], help="further trade data of your own (may be repeated)"
    )


def _review_arguments(parser: Parser) -> None:
    parser.add_argument(
        "paths", metavar="PATH", nargs="+", help="netlist (.net, .xml), top sheet (.kicad_sch) or project folder"
    )
    parser.add_argument(
        "--as",
        dest="form",
        metavar="FORM",
        type=one_of("form", FORMS),
        default="text",
        help=f"{', '.join(FORMS)} (default text)",
    )
    parser.add_argument("--to", metavar="FILE", help="write the report there instead of to standard output")
    parser.add_argument(
        "--stop-at",
        metavar="OUTCOME",
        type=one_of("stop level", STOPS),
        help=f"exit with 1 from this outcome on: {', '.join(STOPS)} (default malfunction, or what the settings say)",
    )
    _shared(parser)
    parser.add_argument(
        "--rules",
        metavar="DIR",
        action="append",
        default=[],
        help="a folder of house rules; they are programs, name only your own",
    )
    parser.add_argument(
        "--all", dest="everything", action="store_true", help="show sound crossings and every supply too"
    )
    parser.add_argument(
        "--changed",
        action="store_true",
        help="PATHs are files that changed: review the boards they belong to, each once",
    )
    parser.add_argument("--decks", metavar="DIR", help="write each solved crossing there as a SPICE deck")


def _rails_arguments(parser: Parser) -> None:
    parser.add_argument("path", metavar="PATH", help="netlist, sheet or project folder")
    _shared(parser)


def _rules_arguments(parser: Parser) -> None:
    parser.add_argument("name", metavar="NAME", nargs="?", help="explain this rule; without it, list all")
    parser.add_argument("--rules", metavar="DIR", action="append", default=[], help="a folder of house rules")


def _size_arguments(parser: Parser) -> None:
    parser.add_argument("--from", dest="from_volts", metavar="VOLTS", required=True, help="supply of the driver")
    parser.add_argument("--to", dest="to_volts", metavar="VOLTS", required=True, help="supply of the receiver")
    parser.add_argument("--rate", metavar="BIT/S", help="bit rate to reach, such as 400k or 8M")
    parser.add_argument("--load", metavar="FARADS", help="load on each side, such as 15p (20p when not given)")
    parser.add_argument("--sink", metavar="AMPERES", help="greatest current that a low driver may sink, such as 3m")
    parser.add_argument("--two-way", action="store_true", help="signals go both ways on the line")
    parser.add_argument("--open-drain", action="store_true", help="drivers only pull low, as on I2C")
    parser.add_argument(
        "--series", choices=("E24", "E96"), default="E24", help="preferred values of dividers (E24 when not given)"
    )


def _part_arguments(parser: Parser) -> None:
    parser.add_argument("name", metavar="PART-NUMBER", help="as a schematic would name it, such as 74LVC245APW")
    parser.add_argument(
        "--facts", metavar="FILE", action="append", default=[], help="further trade data of your own (may be repeated)"
    )


COMMANDS: dict[str, tuple[str, str, str, Callable[[Parser], None] | None]] = {
    # name: (module whose run(args) does it, line in the list of commands, longer text, arguments)
    "review": (
        "reviewing",
        "review one or several boards",
        "Reviews boards and reports every crossing that is not sound, worst first. Nothing is judged silently: pins that "
        "could not be judged are counted and named.",
        _review_arguments,
    ),
    "rails": (
        "railtree",
        "show the supply tree with its evidence",
        "Shows every supply, its voltage and the reason to believe it.",
        _rails_arguments,
    ),
    "compare": (
        "compare",
        "say what a revision changed",
        "Compares two states of a board: crossings added, removed, better, worse.",
        None,
    ),
    "size": (
        "sizing",
        "work out level shifters for two supplies",
        "Proposes ways from one supply to another, with computed values, levels, speed and current.",
        _size_arguments,
    ),
    "rules": (
        "rulelist",
        "list the rules, or explain one",
        "Lists the rules; with a name, says when the rule speaks, when it stays quiet and on whose authority.",
        _rules_arguments,
    ),
    "part": (
        "partinfo",
        "show what the trade library knows of a part",
        "Shows the row of the trade library that a part number leads to, and its source.",
        _part_arguments,
    ),
    "settings": (
        "settings_draft",
        "write a starting settings file",
        "Writes a commented levelcrossing.toml from what a review of the board could not know.",
        None,
    ),
    "waive": (
        "waive",
        "accept a finding, with a reason",
        "Adds a waiver for one finding to levelcrossing.toml.",
        None,
    ),
}


def available() -> dict[str, str]:
    """Return the commands whose modules are there, each with its line for the list."""
    return {
        name: line
        for name, (module, line, _, _) in COMMANDS.items()
        if importlib.util.find_spec(f"levelcrossing.{module}") is not None
    }


def overview() -> str:
    """Return the text of ``levelcrossing --help``."""
    commands = available()
    width = max(len(name) for name in commands)
    lines = [f"  {name.ljust(width)}  {line}" for name, line in commands.items()]
    return "\n".join(
        [
            "usage: levelcrossing COMMAND ...",
            "",
            ABOUT,
            "",
            "Commands:",
            *lines,
            "",
            "  --version, --help",
            "",
            AFTERWARDS,
            "",
        ]
    )


def parse(arguments: Sequence[str]) -> tuple[str, argparse.Namespace]:
    """Return the command and its arguments.

    Raises
    ------
    CommandError
        For anything that is not understood, with the nearest right word.
    """
    if not arguments:
        raise CommandError(
            "no command given",
            remedy="`levelcrossing review PATH` reviews a board, `levelcrossing --help` lists the commands",
        )
    name = arguments[0]
    known = available()
    if name not in known:
        if name.startswith("-"):
            raise CommandError(
                f"unknown option {show(name)}",
                remedy=nearest(name, ["--help", "--version"])
                or "the command comes first, such as `levelcrossing review PATH`",
            )
        remedy = nearest(name, known)
        if not remedy and os.path.exists(name):
            remedy = f"`levelcrossing review {show(name)}` reviews it"
        raise CommandError(f"there is no command {show(name)!r}", remedy=remedy or f"one of {', '.join(known)}")
    module, _, text, fill = COMMANDS[name]
    parser = Parser(prog=f"levelcrossing {name}", description=text, allow_abbrev=False, add_help=True)
    if fill is None:
        importlib.import_module(f"levelcrossing.{module}").add_arguments(parser)
    else:
        fill(parser)
    return name, parser.strict(arguments[1:])


def run(name: str, parsed: argparse.Namespace) -> tuple[str, int]:
    """Run one command: its module is imported only now."""
    parsed.screen = screen()
    module = importlib.import_module(f"levelcrossing.{COMMANDS[name][0]}")
    text, status = module.run(parsed)
    return str(text), int(status)


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line.

    Parameters
    ----------
    arguments : sequence of str, optional
        Without the program's name; those of the process when omitted.

    Returns
    -------
    int
        Exit status.
    """
    given = list(sys.argv[1:] if arguments is None else arguments)
    try:
        if given and given[0] in ("--help", "-h", "help"):
            _print(overview())
            return 0
        if given and given[0] in ("--version", "-V"):
            _print(f"levelcrossing {__version__}\n")
            return 0
        name, parsed = parse(given)
        text, status = run(name, parsed)
        _print(text)
        return status
    except LevelcrossingError as error:
        return _complain(str(error))
    except BrokenPipeError:
        # The reader of the pipe has seen enough. What is still buffered must not raise again when Python closes.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except KeyboardInterrupt:
        return 130
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        return _complain(f"{where}{error.strerror or error}")


def screen() -> Screen:
    """Describe standard output: a terminal has its width and colours, a pipe a fixed width and none."""
    from levelcrossing.reports.screen import Screen

    encoding = (getattr(sys.stdout, "encoding", None) or "ascii").lower().replace("-", "")
    looks = sys.stdout.isatty()
    return Screen(
        width=shutil.get_terminal_size((PIPE_WIDTH, 24)).columns if looks else PIPE_WIDTH,
        colour=looks and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb",
        ascii_only=not encoding.startswith("utf"),
        progress=_progress,
        tell=_tell,
    )


def _print(text: str) -> None:
    """Write text to standard output; characters that its encoding lacks appear as escapes."""
    if not text:
        return
    encoding = getattr(sys.stdout, "encoding", None) or "utf-8"
    sys.stdout.write(text.encode(encoding, "backslashreplace").decode(encoding))
    sys.stdout.flush()


class Progress:
    """A line on standard error that the next one replaces; nothing when nobody looks."""

    def __init__(self) -> None:
        self._shown = False

    def __call__(self, text: str) -> None:
        """Show a line; an empty text clears it."""
        if (not text and not self._shown) or not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
            return
        width = shutil.get_terminal_size((80, 24)).columns - 1
        sys.stderr.write("\r\x1b[K" + show(text, width))
        sys.stderr.flush()
        self._shown = bool(text)


_progress = Progress()


def _tell(text: str) -> None:
    """Write one line of complaint to standard error."""
    _progress("")
    encoding = getattr(sys.stderr, "encoding", None) or "utf-8"
    line = "levelcrossing: " + show(" ".join(text.split()), 1000)
    sys.stderr.write(line.encode(encoding, "backslashreplace").decode(encoding) + "\n")


def _complain(text: str) -> int:
    _tell(text)
    return 2
