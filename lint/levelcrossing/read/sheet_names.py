"""Names on sheets: text variables, escapes, bus texts and the default names of nets.

A net name is one line of text in which ``/`` parts the sheets; a ``/`` of its own is written ``{slash}``.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass

_VARIABLE = re.compile(r"\$\{([^${}]*)\}")
_VECTOR = re.compile(r"([^\s\[\]]*)\[(\d+)\.\.(\d+)\]([^\s\[\]]*)")
_MARKS = "~^_"
_ESCAPED = {
    "slash": "/",
    "backslash": "\\",
    "brace": "{",
    "lt": "<",
    "gt": ">",
    "colon": ":",
    "comma": ",",
    "bar": "|",
    "dollar": "$",
    "space": " ",
    "tab": "\t",
    "return": "\n",
    "quote": "'",
    "dblquote": '"',
}
_ESCAPE = re.compile("[{](" + "|".join(_ESCAPED) + ")[}]")
_LONGEST_VECTOR = 4096
"""Members of one bus; a longer one is taken for a slip of the pen and read as its first members."""
_DEEPEST_ALIAS = 8


@dataclass(frozen=True, slots=True)
class Member:
    """A member of a bus: its name on the sheet (``I2C.SDA``), its name within the bus (``SDA``)."""

    name: str
    bare: str


@dataclass(frozen=True, slots=True)
class Bus:
    """A bus text taken apart; the members of a vector match others by position, those of a group by name."""

    vector: bool
    members: tuple[Member, ...]


def resolve(text: str, lookup: Callable[[str], str | None]) -> str:
    """Replace ``${...}``; what ``lookup`` does not know stays as it is."""
    for _ in range(10):
        if "${" not in text:
            return text
        changed = _VARIABLE.sub(lambda match: _kept(match, lookup), text)
        if changed == text:
            return text
        text = changed
    return text


def _kept(match: re.Match[str], lookup: Callable[[str], str | None]) -> str:
    found = lookup(match[1])
    return match[0] if found is None else found


def as_net_name(text: str) -> str:
    """Return text as it stands in a net name: only slashes stay escaped; nothing at all has a name, too."""
    return _escaped(text) or "<NO NET>"


def _escaped(text: str) -> str:
    return plain(text).replace("/", "{slash}").replace("\n", "").replace("\r", "")


def plain(text: str) -> str:
    """Undo the escapes of letters that KiCad keeps out of its files' texts (``{slash}``, ``{lt}``)."""
    return _ESCAPE.sub(lambda match: _ESCAPED[match[1]], text) if "{" in text else text


def bus_of(text: str, aliases: Mapping[str, tuple[str, ...]], depth: int = 0) -> Bus | None:
    """Take a bus text apart.

    Parameters
    ----------
    text : str
        ``D[0..7]``, ``MEM{D[0..7] CLK}``, ``{ALIAS}``.
    aliases : mapping from name to members

    Returns
    -------
    Bus or None
        None when the text names a single net.
    """
    text = plain(text)
    vector = _vector(text)
    if vector is not None:
        return Bus(True, tuple(Member(_escaped(name), _escaped(name)) for name in vector))
    group = _group(text)
    if group is None or depth > _DEEPEST_ALIAS:
        return None
    prefix, words = group
    start = f"{prefix}." if prefix else ""
    members: list[Member] = []
    for word in words:
        for part in aliases.get(word, (word,)):
            inner = bus_of(part, aliases, depth + 1) if part != word or "[" in part or "{" in part else None
            if inner is None and part in aliases and part != word:
                inner = bus_of("{" + part + "}", aliases, depth + 1)
            bares = [member.name for member in inner.members] if inner is not None else [_escaped(part)]
            members.extend(Member(_escaped(start) + bare, bare) for bare in bares)
    return Bus(False, tuple(members))


def _vector(text: str) -> list[str] | None:
    match = _VECTOR.fullmatch(text)
    if match is None:
        return None
    low, high = sorted((int(match[2]), int(match[3])))
    return [f"{match[1]}{number}{match[4]}" for number in range(low, min(high, low + _LONGEST_VECTOR) + 1)]


def _group(text: str) -> tuple[str, list[str]] | None:
    """Split ``PREFIX{A B}``; braces after ``~``, ``^`` or ``_`` are marks of drawing (overbar and the like)."""
    start = -1
    depth = 0
    for index, letter in enumerate(text):
        if letter == "{":
            if index and text[index - 1] in _MARKS:
                depth += 1
                continue
            if depth == 0:
                start = index
                break
        elif letter == "}" and depth:
            depth -= 1
        elif letter.isspace() and depth == 0:
            return None
    if start < 0 or not text.endswith("}"):
        return None
    words: list[str] = []
    word = ""
    depth = 0
    for letter in text[start + 1 : -1]:
        if letter == "{":
            depth += 1
        elif letter == "}":
            depth -= 1
            if depth < 0:
                return None
        if letter.isspace() and depth == 0:
            if word:
                words.append(word)
            word = ""
        else:
            word += letter
    if word:
        words.append(word)
    return (text[:start], words) if words else None


def unit_letters(unit: int) -> str:
    """Return how a unit is lettered: A ... Z, AA ..."""
    letters = ""
    while unit > 0:
        unit, rest = divmod(unit - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def pin_net_name(*, reference: str, unit: str, number: str, name: str, several: bool, unused: bool) -> str:
    """Return the name of a net that only pins name.

    Parameters
    ----------
    reference : str
    unit : str
        Letters of the unit, empty for a part of one unit.
    number, name : str
        Of the pin.
    several : bool
        The symbol has another pin of this name.
    unused : bool
        The net holds this pin alone or is marked as not connected.
    """
    if name and name != number:
        middle = f"{reference}{unit}-{_escaped(name)}"
        if unused or several:
            middle += f"-Pad{_escaped(number)}"
    else:
        middle = f"{reference}-Pad{_escaped(number)}"
    return f"{'unconnected' if unused else 'Net'}-({middle})"
