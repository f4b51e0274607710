"""Which row a part number belongs to: bring the text of a part into one form, and search the rows' patterns.

Patterns match at the start of a word. A pattern that ends in a digit does not match when another digit follows, so that
``2N7001`` never catches ``2N70017``. Patterns are compiled only when the first letters of a text make them possible.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence

from levelcrossing.model import Part
from levelcrossing.trade_rows import Row

_NOT_FITTED = re.compile(r"^\s*(?:N\.?A|DNP|DNF|DNI|DNM|NF|NP|NC)\s*(?:\((.*)\)|[/:_-]\s*(.+))\s*$", re.IGNORECASE)
_NUMBER_FIELD = re.compile(
    r"^(mpn\d*|m?pn|part[ _-]?(number|no|num|name|#)?\.?|p/n|mfr?[. _-]*(p/?n|part.*|no|number)|"
    r"manf#|manufacturer[ _-]*(p/?n|part.*|number|no)|maker[ _-]*(part|number).*|order(ing)?[ _-]?(code|number)|"
    r"device|type|comment|component|model|name)$",
    re.IGNORECASE,
)
_MAKER_PREFIX = re.compile(
    r"(?<![A-Z0-9])(?:SN|CD|MC|MM|M|NL|DM|HD|PI|IDT|IN|N|GD|CY|T|K|U|MN|UCY|KR|TI[-_]|NXP[-_])(?=(?:74|54)[A-Z]*\d)"
    r"|(?<![A-Z0-9])TC(?=74[A-Z]{2,}\d)"
)
_WORD = re.compile(r"(?<![A-Z0-9])[A-Z0-9]")
_NOTHING = {
    "",
    "~",
    "R",
    "C",
    "L",
    "D",
    "Q",
    "IC",
    "U",
    "NA",
    "N/A",
    "DNP",
    "DNF",
    "NC",
    "NP",
    "?",
    "-",
    "VALUE",
    "POWER",
    "GND",
}


def unwrapped(text: str) -> str:
    """Return a value without the sign that the part is not fitted: ``NA(BSS138(SOT23-3))`` gives its inside."""
    found = _NOT_FITTED.match(text)
    return (found[1] or found[2] or "").strip() if found else text


def normal(text: str) -> str:
    """Bring a part number into one form: capitals, no brackets at its end, no order suffix, no maker's prefix."""
    text = unwrapped(text.strip()).upper().replace("µ", "U")
    text = re.sub(r"\s*\(.*$", "", text) if not text.startswith("(") else text.strip("()")
    text = re.sub(r",\d{3}$", "", text)
    return _MAKER_PREFIX.sub("", text).strip()


def texts(part: Part) -> list[tuple[str, str]]:
    """Return the texts by which a part may be known, as (text, where from), the strongest first."""
    found = [(normal(part.value), "value")]
    found += [
        (normal(text), f"field {name}") for name, text in part.fields if text and _NUMBER_FIELD.match(name.strip())
    ]
    found.append((normal(part.symbol), "symbol"))
    return [(text, where) for text, where in found if text not in _NOTHING and len(text) > 1]


class Matcher:
    """Finds the first row whose pattern matches a text.

    Parameters
    ----------
    rows : sequence of Row
        In the order of preference.
    guarded : bool
        Whether a pattern that ends in a digit refuses a digit after it.
    """

    def __init__(self, rows: Sequence[Row], *, guarded: bool = True) -> None:
        self.guard = r"(?:(?<=\D)|(?!\d))" if guarded else ""
        self.rows = rows
        self.index: dict[str, list[tuple[int, str]]] = {}
        self.compiled: dict[str, re.Pattern[str]] = {}
        for place, row in enumerate(rows):
            for pattern in row.patterns:
                for start in starts(pattern):
                    self.index.setdefault(start[:2], []).append((place, pattern))

    def find(self, text: str) -> tuple[Row, re.Match[str]] | None:
        """Return the first row that matches a normal text, with its match; None when none does."""
        best: tuple[int, re.Match[str]] | None = None
        for word in _WORD.finditer(text):
            begin = word.start()
            for place, pattern in self._candidates(text[begin : begin + 2]):
                if best is not None and place >= best[0]:
                    continue
                found = self._at(pattern, text, begin)
                if found is not None:
                    best = (place, found)
        return None if best is None else (self.rows[best[0]], best[1])

    def find_all(self, text: str) -> list[Row]:
        """Return every row that matches, in order of preference."""
        hits = {
            place
            for word in _WORD.finditer(text)
            for place, pattern in self._candidates(text[word.start() : word.start() + 2])
            if self._at(pattern, text, word.start())
        }
        return [self.rows[place] for place in sorted(hits)]

    def _candidates(self, start: str) -> Iterator[tuple[int, str]]:
        yield from self.index.get(start, ())
        if len(start) > 1:
            yield from self.index.get(start[:1], ())
        yield from self.index.get("", ())

    def _at(self, pattern: str, text: str, begin: int) -> re.Match[str] | None:
        if pattern.startswith("^") and begin:
            return None
        compiled = self.compiled.get(pattern)
        if compiled is None:
            compiled = self.compiled[pattern] = re.compile(f"(?:{pattern})" + self.guard, re.IGNORECASE)
        found = compiled.match(text, begin)
        if found is None or found.end() == begin:
            return None
        return found


def starts(pattern: str) -> set[str]:
    """Return the letters with which a text must begin to match a pattern: a set of up to two letters each.

    An empty text in the set means that nothing is known. Only plain starts and one group of plain alternatives are
    looked into; that covers nearly all patterns.
    """
    pattern = pattern.lstrip("^")
    if pattern.startswith(("(?!", "(?=", "(?<", "(?P<")):
        return {""}
    if pattern.startswith("("):
        return _group_starts(pattern)
    return {_plain(pattern)}


def _plain(pattern: str) -> str:
    found = re.match(r"[A-Za-z0-9]{1,3}", pattern)
    if found is None:
        return ""
    letters = found[0]
    follows = pattern[len(letters) : len(letters) + 1]
    if follows in ("?", "*", "{"):
        letters = letters[:-1]
    return letters[:2].upper()


def _group_starts(pattern: str) -> set[str]:
    depth = 0
    alternatives = [""]
    for place, letter in enumerate(pattern):
        if letter == "(":
            depth += 1
            if depth == 1:
                continue
        if letter == ")":
            depth -= 1
            if depth == 0:
                rest = pattern[place + 1 :]
                break
        if letter == "|" and depth == 1:
            alternatives.append("")
        else:
            alternatives[-1] += letter
    else:
        return {""}
    optional = rest.startswith("?")
    rest = rest.lstrip("?")
    found: set[str] = set()
    for text in alternatives:
        text = text.removeprefix("?:")
        if re.fullmatch(r"[A-Za-z0-9]+", text):
            found.add((text + (_plain(rest) if len(text) == 1 else ""))[:2].upper())
        else:
            found.add(_plain(text))
    if optional:
        found |= starts(rest)
    return found


def natural(words: Iterable[str]) -> list[str]:
    """Return words without duplicates in their order."""
    return list(dict.fromkeys(words))
