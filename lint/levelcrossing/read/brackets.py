"""Text in brackets, to nested lists of text: the form of KiCad's netlists, old and new.

A small reader of our own, because a Lisp reader takes ``58103E50`` for a number, ``'1k`` for a quotation, ``SIO[2]`` (a
pin on published boards) for two lists, ``;`` for a comment and ``5"`` for an unfinished text, and falls over its own
recursion on hostile input. This one keeps every token as text, does not recurse and knows where each bracket opened.
"""

from __future__ import annotations

import re
from typing import TypeAlias

from levelcrossing.errors import InputError

Tree: TypeAlias = "list[str | Tree]"

DEEPEST = 100  # KiCad's own netlists nest eight deep
MOST_TOKENS = 6_000_000  # keeps memory below a gigabyte; the largest real netlist seen has 1.5 million

# A quoted text may hold escaped quotes and line ends; an unquoted token ends at white space or a bracket only. White
# space is what KiCad takes for it: a no-break space belongs to its token. The repetitions give nothing back, so that an
# unfinished text of a hundred megabytes costs no more time and memory than a finished one.
_TOKEN = re.compile(
    r'[ \t\r\n]*(?:(\()|(\))|"([^"\\]*+(?:\\.[^"\\]*+)*+)"|([^ \t\r\n()"][^ \t\r\n()]*)|(.))', re.DOTALL
)
_ESCAPED = re.compile(r"\\(.)", re.DOTALL)
_GOES_ON = "goes on after the bracket that ends the netlist"
_ESCAPES = {"n": "\n", "r": "\r", "t": "\t"}


def read_brackets(text: str, file: str) -> Tree:
    """Read one bracketed expression.

    Parameters
    ----------
    text : str
        The whole file.
    file : str
        Its name, for errors.

    Returns
    -------
    Tree
        Nested lists of text.

    Raises
    ------
    InputError
        When brackets or quotes do not match, nest too deep or are too many; with the line at fault.
    """
    text = text.rstrip("\0\x1a \t\r\n")  # some copies end in zeros or Ctrl-Z
    root: Tree = []
    current = root
    above: list[Tree] = []
    opened: list[int] = []
    for count, match in enumerate(_TOKEN.finditer(text)):
        kind = match.lastindex
        if count > MOST_TOKENS:
            what = f"holds more than {MOST_TOKENS:,} words and brackets"
            raise _error(text, match.start(), file, what, "no netlist does; export it again")
        if kind == 3:
            token = match[3]
            current.append(_ESCAPED.sub(_unescaped, token) if "\\" in token else token)
        elif kind == 1:
            if not above and root:
                raise _error(text, match.start(1), file, _GOES_ON, "export it again")
            below: Tree = []
            current.append(below)
            above.append(current)
            opened.append(match.start(1))
            current = below
            if len(above) > DEEPEST:
                what = f"nests brackets more than {DEEPEST} deep"
                raise _error(text, match.start(1), file, what, "no netlist does; export it again")
        elif kind == 2:
            if not above:
                raise _error(text, match.start(2), file, "closes a bracket that nothing opened", "export it again")
            current = above.pop()
            opened.pop()
        elif not above:
            what = _GOES_ON if root else "does not start with a bracket"
            raise _error(text, match.start(kind or 0), file, what, "export it again")
        elif kind == 4:
            current.append(match[4])
        else:
            raise _error(text, match.start(5), file, "ends within a quoted text that begins here", "export it again")
    if above:
        # The innermost bracket tells where the file breaks off; the words after it tell which thing is incomplete.
        begins = opened[-1]
        head = re.sub(r"\s+", " ", text[begins : begins + 24].split("\n")[0]).strip()
        what = f"is cut off: the bracket {head!r} of this line is never closed"
        raise _error(text, begins, file, what, "export it again")
    if not root:
        raise InputError("is empty", remedy="export the netlist again", file=file)
    tree = root[0]
    assert isinstance(tree, list)
    return tree


def _unescaped(match: re.Match[str]) -> str:
    return _ESCAPES.get(match[1], match[1])


def _error(text: str, offset: int, file: str, what: str, remedy: str) -> InputError:
    return InputError(what, remedy=remedy, file=file, line=text.count("\n", 0, offset) + 1)


def children(node: Tree, head: str) -> list[Tree]:
    """Return the children of a node that begin with a word, through idle brackets too: ``((comp ...)(comp ...))``.

    Parameters
    ----------
    node : Tree
        A list.
    head : str
        The word.
    """
    found: list[Tree] = []
    for child in node:
        if isinstance(child, list) and child:
            if child[0] == head:
                found.append(child)
            elif isinstance(child[0], list):
                found.extend(children(child, head))
    return found


def child(node: Tree, head: str) -> Tree:
    """Return the first child that begins with a word; an empty list when there is none."""
    found = children(node, head)
    return found[0] if found else []


def words(node: Tree) -> list[str]:
    """Return the texts that stand directly in a node, after its first word."""
    return [item for item in node[1:] if isinstance(item, str)]


def text_of(node: Tree, head: str) -> str:
    """Return the text of the first child that begins with a word; empty when there is none."""
    return " ".join(words(child(node, head)))
