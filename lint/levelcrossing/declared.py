"""Values as people declare them, in the settings file or in a field of a symbol.

References
----------
Levels of ``levels = "ttl"``: JEDEC JESD8C.01, LVTTL (VIH 2.0 V, VIL 0.8 V), the same figures as for 5 V TTL.
"""

from __future__ import annotations

import datetime
import difflib
import math
import re
from collections.abc import Iterable, Mapping
from dataclasses import fields, replace
from typing import Any

from levelcrossing.errors import SettingsError
from levelcrossing.model import PinSetting, Spread
from levelcrossing.units import parse_volts

TTL_VIH_VOLTS = 2.0
TTL_VIL_VOLTS = 0.8

MOST_VOLTS = 100_000.0
"""Larger numbers are typing errors; what lies above 60 V is out of scope anyway and the review says so."""

PIN_KEYS = ("tolerates", "drives", "reads", "open_drain", "vih", "vil", "rail", "levels")

_PREFIXES = {
    "": 1.0, "p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9,
}  # fmt: skip
_NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?"
_SCALED = re.compile(rf"({_NUMBER})\s*([pnuµμmkKMG]?)\s*([A-Za-z/]*)")
_RATE_UNIT = re.compile(r"(?<=[\dkKMG\s])(?:bits?/s|b/s|bps|bd|baud|hz)$", re.IGNORECASE)


def shown(value: object, most: int = 60) -> str:
    """Return a value of the settings for an error line: quoted, control characters escaped, cut to ``most``."""
    if isinstance(value, str):
        cut = value if len(value) <= most else value[: most - 1] + "…"
        return repr(cut)
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, list):
        return "a list"
    text = str(value) if not isinstance(value, int) or abs(value) < 10**most else "a huge number"
    return text[:most]


def nearest(word: str, known: Iterable[str]) -> str:
    """Return a hint like ``did you mean 'rails'?``, or the list of what is known when nothing is near."""
    choices = sorted(known)
    close = difflib.get_close_matches(word[:100].casefold(), choices, n=1, cutoff=0.5)
    return f"did you mean '{close[0]}'?" if close else "known are " + ", ".join(choices)


def inherited(setting: PinSetting, whole: PinSetting | None) -> PinSetting:
    """Return a pin's setting with what it leaves open taken from the setting of its whole part."""
    if whole is None:
        return setting
    empty = PinSetting()
    names = [name.name for name in fields(PinSetting) if name.name not in ("line", "rail", "volts", "levels")]
    taken = {name: getattr(whole, name) for name in names if getattr(setting, name) == getattr(empty, name)}
    if not setting.rail:
        taken |= {"rail": whole.rail, "volts": whole.volts}
    if not setting.levels:
        taken["levels"] = whole.levels
    return replace(setting, **taken)


def pin_setting(table: Mapping[str, Any], tolerance: float) -> PinSetting:
    """Return what a table declares of a pin.

    Parameters
    ----------
    table : mapping
        Keys of ``PIN_KEYS``; others must have been refused before.
    tolerance : float
        Of a rail given by one voltage [1].

    Raises
    ------
    SettingsError
        Without file and line, which the caller knows.
    """
    found: dict[str, Any] = {}
    for key, name in (("tolerates", "tolerates_volts"), ("vih", "vih_volts"), ("vil", "vil_volts")):
        if key in table:
            volts = read_volts(table[key], 0.0)
            if volts is None or volts.low != volts.high or volts.nominal < 0:
                raise SettingsError(f"{key} is {shown(table[key])}, not one voltage", remedy="write a number of volts")
            found[name] = volts.nominal
    for key in ("drives", "reads", "open_drain"):
        if key in table:
            if not isinstance(table[key], bool):
                raise SettingsError(f"{key} is {shown(table[key])}", remedy="write true or false")
            found[key] = table[key]
    if "rail" in table:
        rail = table["rail"]
        text = rail.strip() if isinstance(rail, str) else shown(rail)
        volts = read_volts(rail, tolerance)
        if volts is None and (not isinstance(rail, str) or not text):
            raise SettingsError(f"rail is {shown(rail)}", remedy='write volts ("5") or the name of a net ("+5V")')
        # "+5V" is the name of a net, which may carry something else; "5", "5 V" and "4.4..5.25" are volts.
        found["rail"] = text
        found["volts"] = volts if text[:1].isdigit() or text[:1] in ".-" else None
    if "levels" in table:
        levels = table["levels"]
        if levels not in ("ttl", "cmos"):
            raise SettingsError(f"levels is {shown(levels)}", remedy=nearest(str(levels), ("ttl", "cmos")))
        found["levels"] = levels
        if levels == "ttl":
            found.setdefault("vih_volts", TTL_VIH_VOLTS)
            found.setdefault("vil_volts", TTL_VIL_VOLTS)
    vih, vil = found.get("vih_volts"), found.get("vil_volts")
    if vih is not None and vil is not None and vil >= vih:
        what = f"vil ({vil:g} V) is not below vih ({vih:g} V)"
        raise SettingsError(what, remedy="vih is the least voltage read as high, vil the greatest read as low")
    return PinSetting(**found)


def _float(value: object) -> float | None:
    """Return a TOML number as float; None for anything else and for what is not finite."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None


def read_number(value: object, unit: str) -> float | None:
    """Return a number with an SI prefix and optionally its unit; None when it is none.

    Examples
    --------
    >>> read_number("10p", "F"), read_number("0.1 V", "V"), read_number("10q", "F")
    (1e-11, 0.1, None)
    """
    if not isinstance(value, str):
        return _float(value)
    match = _SCALED.fullmatch(value.strip()[:60])
    if not match or (match[3] and match[3].casefold() != unit.casefold()):
        return None
    # division by the inverse keeps 10p at exactly 1e-11
    factor = _PREFIXES[match[2]]
    number = float(match[1])
    scaled = number * factor if factor >= 1 else number / round(1 / factor)
    return scaled if math.isfinite(scaled) else None


def read_rate(value: object) -> float | None:
    """Return a bit rate [bit/s] above zero; ``8M``, ``400 kbit/s``, ``9600 baud``; ``Hz`` counts one bit each cycle."""
    if isinstance(value, str):
        value = _RATE_UNIT.sub("", value.strip())
    rate = read_number(value, "")
    return rate if rate is not None and 0 < rate <= 1e12 else None


def read_fraction(value: object) -> float | None:
    """Return a tolerance [1] from 0 to below 0.5, given as ``"5%"``, ``"5 %"`` or 0.05; None when it is none."""
    if isinstance(value, str):
        match = re.fullmatch(rf"({_NUMBER})\s*%", value.strip()[:60])
        fraction = float(match[1]) / 100 if match else None
    else:
        fraction = _float(value)
    return fraction if fraction is not None and 0 <= fraction < 0.5 else None


def read_volts(value: object, tolerance: float) -> Spread | None:
    """Return a voltage [V]; None when it is none.

    Parameters
    ----------
    value : object
        A number, or text: ``"24"``, ``"3.3 V"``, ``"3V3"``, ``"4.4..5.25"``, ``"4.4..5..5.25"``, ``"1.8 +-2%"``.
    tolerance : float
        Spread of a single voltage that gives none of its own [1].

    Examples
    --------
    >>> read_volts("4..6", 0.05)
    Spread(low=4.0, nominal=5.0, high=6.0)
    >>> read_volts("10 +-2%", 0.05)
    Spread(low=9.8, nominal=10.0, high=10.2)
    """
    if isinstance(value, str):
        volts = parse_volts(value.strip().replace("+/-", "±").replace("+-", "±"), tolerance)
    else:
        number = _float(value)
        volts = None if number is None else Spread.around(number, tolerance)
    return volts if volts is not None and max(abs(volts.low), abs(volts.high)) <= MOST_VOLTS else None


def read_day(value: object) -> str | None:
    """Return a day as ``YYYY-MM-DD`` from a TOML date or such a text; None when it is none."""
    if isinstance(value, datetime.datetime):
        return None
    if isinstance(value, datetime.date):
        return value.isoformat()
    if isinstance(value, str) and re.fullmatch(r"\d{4}-\d{2}-\d{2}", value.strip(), re.ASCII):
        try:
            return datetime.date.fromisoformat(value.strip()).isoformat()
        except ValueError:
            return None
    return None
