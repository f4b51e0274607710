"""Make text from a board harmless for the medium it is shown in.

Net names, values, fields, file names and settings of a reviewed project are a stranger's text. Each function here takes
such text (alone or inside a sentence of ours) and returns a form that the medium shows and never obeys. What is taken out
of play stays visible as ``<U+202E>``, so that nothing disappears from a report.
"""

from __future__ import annotations

import html
import posixpath
import re
import unicodedata
from urllib.parse import quote

LONGEST = 400
"""Characters of one text that a report for people shows; the JSON form keeps all."""

# Control, format (bidirectional overrides, zero width, tags), lone surrogates, private use, line and paragraph separators.
_OBEYED = frozenset({"Cc", "Cf", "Cs", "Co", "Zl", "Zp"})
_NONCHARACTERS = frozenset(range(0xFDD0, 0xFDF0))
_MOST_MARKS = 2  # combining marks in a row; more of them climb over the neighbouring lines


def _code(character: str) -> str:
    return f"<U+{ord(character):04X}>"


def visible(text: str, longest: int = LONGEST) -> str:
    """Replace what a display would obey instead of show; clip what is endless.

    Parameters
    ----------
    text : str
        Any text.
    longest : int
        Greatest length [characters]; 0 for no limit.

    Returns
    -------
    str
        One line without control, format, private or separator characters.
    """
    if longest and len(text) > longest:
        text = text[: longest - 1] + "…"
    if text.isascii() and text.isprintable():
        return text
    shown: list[str] = []
    marks = 0
    for character in text:
        category = unicodedata.category(character)
        marks = marks + 1 if category in ("Mn", "Me") else 0
        code = ord(character)
        if category in _OBEYED or code in _NONCHARACTERS or code & 0xFFFE == 0xFFFE or marks > _MOST_MARKS:
            shown.append(_code(character))
        else:
            shown.append(character)
    return "".join(shown)


def terminal(text: str) -> str:
    """Return text for a terminal or a build log.

    Build logs are read by hosts that obey lines starting with ``::`` or holding ``##[``; wrapping may bring any character
    to the start of a line, so both pairs are taken apart wherever they stand.
    """
    return visible(text).replace("::", ":<U+003A>").replace("##", "#<U+0023>")


def markup(text: str) -> str:
    """Return text for HTML, as content or inside a quoted attribute."""
    return html.escape(visible(text), quote=True)


def xml(text: str) -> str:
    """Return text for an XML document; the writer of the document still escapes ``<`` and ``&``."""
    return visible(text)


def sarif(text: str) -> str:
    """Return text for a SARIF plain text message, where ``[text](target)`` would become a link."""
    return visible(text).replace("](", "]<U+0028>")


def annotation(text: str) -> str:
    """Return text for the message part of a workflow command (``%``, carriage return and line feed escaped)."""
    return text.replace("%", "%25").replace("\r", "%0D").replace("\n", "%0A")


def annotation_property(text: str) -> str:
    """Return text for a property of a workflow command (``:`` and ``,`` escaped besides)."""
    return annotation(text).replace(":", "%3A").replace(",", "%2C")


_PLAIN_WORD = re.compile(r"[A-Za-z]+(?:['’-][A-Za-z]+)*|[+-]?[0-9]+(?:\.[0-9]+)?|[%±≤≥=×·…Ωµ°-]|[–—]")
_EDGES = re.compile(r"^([(\"']*)(.*?)([)\"',;:.!?]*)$", re.DOTALL)
# What Markdown may act on within a line; brackets that open nothing, full stops and the like stay readable.
_ACTIVE = re.compile(r"([\\`*_{}\[\]<>#+!|~&$@:^])")


def code_span(text: str) -> str:
    """Return text as a Markdown code span, in which nothing is a link, a tag, a mention or a table cell."""
    shown = visible(text).replace("|", "¦")
    if not shown.strip():
        return "` `" if shown else ""
    longest = max((len(run) for run in re.findall("`+", shown)), default=0)
    fence = "`" * (longest + 1)
    pad = " " if shown[0] in "` " or shown[-1] in "` " else ""
    return f"{fence}{pad}{shown}{pad}{fence}"


def markdown(text: str) -> str:
    """Return a sentence for Markdown: plain words stay, every other word becomes a code span.

    A code span is the one form that no dialect turns into a link, a mention, an issue number or HTML; escaped characters
    alone still become links where a host looks for bare addresses after parsing.
    """
    words: list[str] = []
    for word in visible(text).strip().split(" "):
        match = _EDGES.match(word)
        assert match is not None
        before, core, after = match.groups()
        if not core or _PLAIN_WORD.fullmatch(core):
            words.append(_ACTIVE.sub(r"\\\1", word))
        else:
            words.append(_ACTIVE.sub(r"\\\1", before) + code_span(core) + _ACTIVE.sub(r"\\\1", after))
    text = " ".join(words)
    # At the start of a block these would begin a list or underline a heading.
    return re.sub(r"^(\s*)(?:([-=])|(\d{1,9})([.)]))(?=\W|$)", _inactive, text)


def _inactive(match: re.Match[str]) -> str:
    space, dash, number, mark = match.groups()
    return f"{space}\\{dash}" if dash else f"{space}{number}\\{mark}"


def place_path(file: str, base: str = "") -> str | None:
    """Return a path inside the repository, or None when there is none.

    Parameters
    ----------
    file : str
        Path as the review knows it, relative to the working folder or absolute.
    base : str
        The working folder, absolute; empty when unknown.

    Returns
    -------
    str or None
        Relative path with forward slashes that does not leave ``base``.
    """
    path = file.replace("\\", "/")
    if not path.strip() or "\x00" in path:
        return None
    if re.match(r"[A-Za-z]:", path):
        path = _below(path, base.replace("\\", "/")) or ""
    elif path.startswith("/"):
        path = _below(posixpath.normpath(path), base.replace("\\", "/")) or ""
    if not path:
        return None
    path = posixpath.normpath(path)
    if path in (".", "..") or path.startswith(("../", "/", "~")):
        return None
    return path


def _below(path: str, base: str) -> str | None:
    stem = base.rstrip("/") + "/"
    return path[len(stem) :] if base and path.startswith(stem) else None


def place_uri(file: str, base: str = "") -> str | None:
    """Return ``place_path`` as a relative URI reference, or None when there is none."""
    path = place_path(file, base)
    return None if path is None else quote(path.encode("utf-8", "replace"), safe="/")
