"""Whether a part is fitted: flags, fields and the many ways in which a value says no.

The conventions are common practice of the trade, gathered from published boards; no standard names them.
"""

from __future__ import annotations

import re

# Flags and fields whose presence (with any text but a "no") means: not fitted.
_NO_FIELDS = frozenset(
    {"dnp", "dnf", "dni", "dnm", "donotpopulate", "donotfit", "donotmount", "donotplace", "notfitted", "nofit", "nopop"}
)
# Fields whose "no" means: not fitted.
_YES_FIELDS = frozenset({"fitted", "fit", "populate", "populated", "mount", "mounted", "assemble", "assembled"})
# Fields that hold a mark among other things.
_MARK_FIELDS = frozenset({"config", "assembly", "population", "variant", "status"})
_NO = frozenset({"", "0", "no", "n", "false", "-", "~", "off"})

# Long marks are no words of anything else: they count wherever they stand as a word of their own.
_LONG = (
    r"dnp|dnf|dni|dnm|no[ _-]?fit|no[ _-]?pop|no[ _-]?mount|unpopulated"
    r"|not[ _-](?:fitted|populated|mounted|placed|installed)"
    r"|do[ _]not[ _](?:populate|fit|mount|place|install|assemble|stuff)"
)
_LONG_MARK = re.compile(rf"(?<![a-z0-9])(?:{_LONG})(?![a-z0-9])", re.IGNORECASE)
# Short ones may begin a part number or be a unit (100 nF), so they count alone, or before a bracket or slash.
_SHORT_MARK = re.compile(r"(?:n/?a|nm|nf|np|n\.?c\.?)\s*(?:$|[(/])|.*\((?:na|nm|nf|np)\)$", re.IGNORECASE)
# "NC" also means "normally closed".
_SWITCHING = re.compile(r"jumper|switch|relay|button|\bsw_|\bjp", re.IGNORECASE)
_EDGE = re.compile(r"edge|fingers?\b", re.IGNORECASE)


def fitting(
    value: str, symbol: str, footprint: str, description: str, fields: tuple[tuple[str, str], ...], flagged: bool
) -> tuple[str, str]:
    """Tell why a part is not fitted.

    Parameters
    ----------
    value, symbol, footprint, description : str
        As the netlist has them.
    fields : tuple of (str, str)
        User fields.
    flagged : bool
        The symbol carries KiCad's own "do not populate" flag.

    Returns
    -------
    str
        The evidence; empty for a fitted part.
    str
        A remark when a mark was seen and not followed; usually empty.
    """
    if flagged:
        return "the symbol is marked 'do not populate'", ""
    for name, text in fields:
        plain = re.sub(r"[^a-z]", "", name.casefold())
        answer = text.strip().casefold()
        if plain in _NO_FIELDS and answer not in _NO:
            return f"its field {name} is {text!r}", ""
        if plain in _YES_FIELDS and answer and (answer in _NO - {"~", "-"} or _marked(text, symbol)):
            return f"its field {name} is {text!r}", ""
        if plain in _MARK_FIELDS and _LONG_MARK.fullmatch(text.strip()):
            return f"its field {name} is {text!r}", ""
    if not _marked(value, f"{symbol} {description}"):
        return "", ""
    if _EDGE.search(f"{symbol} {footprint} {description}"):
        # An edge connector is copper of the board itself: "DNF" only keeps it off the shopping list.
        return "", f"has the value {value!r} and was taken as fitted, being an edge connector"
    return f"its value is {value!r}", ""


def _marked(value: str, symbol: str) -> bool:
    """Tell whether a value holds a not-fitted mark."""
    value = value.strip()
    if _LONG_MARK.search(value):
        return True
    if not _SHORT_MARK.match(value):
        return False
    return not (value.casefold().startswith(("nc", "n.c")) and _SWITCHING.search(symbol))
