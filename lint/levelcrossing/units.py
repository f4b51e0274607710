"""Component values and voltages in text, to SI numbers and back.

A text that can be read in two ways is not read at all: every ``parse_`` function answers None rather than guess.

References
----------
IEC 60062 (letter and digit codes such as ``4k7``, ``4R7``, ``104``; tolerance letters) and IEC 60063 (E series), both
quoted from memory; ``10E``, a lower-case ``k`` and the decimal comma are habits of the trade.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable

from levelcrossing.model import Spread

# ------------------------------------------------------------------------------------------------- preferred numbers

E12 = (1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2)
# E24 is a list, not a formula: eight of its members are not the rounded power (2.7 ... 4.7 and 8.2).
E24 = tuple(sorted((*E12, 1.1, 1.3, 1.6, 2.0, 2.4, 3.0, 3.6, 4.3, 5.1, 6.2, 7.5, 9.1)))
E96 = tuple(round(10 ** (n / 96), 2) for n in range(96))
# The one member of E192 that departs from the rounded power is 9.20 (for 9.19).
E192 = tuple(9.20 if n == 185 else round(10 ** (n / 192), 2) for n in range(192))

SERIES = {"E12": E12, "E24": E24, "E96": E96, "E192": E192}


def nearest_preferred(ohms: float, series: str = "E24") -> float:
    """Return the preferred number nearest by ratio.

    Parameters
    ----------
    ohms : float
        Wanted value, above zero [ohm, or any unit].
    series : str
        ``E12``, ``E24``, ``E96`` or ``E192``.

    Returns
    -------
    float
        Preferred value [same unit].

    Raises
    ------
    ValueError
        For a value that is not a positive finite number, or an unknown series.

    Examples
    --------
    >>> nearest_preferred(5000), nearest_preferred(1950, "E96")
    (5100.0, 1960.0)
    """
    if series not in SERIES:
        raise ValueError(f"no series {series!r}; there are {', '.join(SERIES)}")
    if not (math.isfinite(ohms) and ohms > 0):
        raise ValueError(f"{ohms} has no preferred number near it")
    decade = math.floor(math.log10(ohms))
    # Through decimal text, so that 4.7 in the third decade is exactly 4700.
    choices = [float(f"{digits}e{decade + step}") for step in (-1, 0, 1) for digits in SERIES[series]]
    return min(choices, key=lambda choice: (abs(math.log(choice / ohms)), choice))


def _is_preferred(value: float) -> bool:
    """Tell whether a value is a member of E24 or E192."""
    if value <= 0:
        return False
    return any(math.isclose(value, nearest_preferred(value, series), rel_tol=1e-9) for series in ("E24", "E192"))


# ---------------------------------------------------------------------------------------------------- taking text apart

_FOREIGN_DIGIT = re.compile(r"(?![0-9])\d")
_LONGEST = 200  # longer texts are descriptions, not values
_NUMBER = r"(?:\d{1,9}(?:\.\d{0,9})?|\.\d{1,9})"
_PREFIX = {"": 0, "f": -15, "p": -12, "n": -9, "u": -6, "m": -3, "k": 3, "M": 6, "G": 9}

# Greek omega and the ohm sign, the micro sign and Greek mu.
_SAME = str.maketrans({"\u03a9": "R", "\u2126": "R", "\u00b5": "u", "\u03bc": "u", "×": "x", "±": " "})
_OHM = re.compile(r"(?<=[\d\skKMmGR])ohms?\b", re.IGNORECASE)
_WATTS_AS_FRACTION = re.compile(r"\b1/\d{1,2}\s*W\b", re.IGNORECASE)
_THOUSANDS = re.compile(r"(?<![\d.,])\d{1,3},\d{3}(?![\d])")
_DECIMAL_COMMA = re.compile(r"(?<=\d),(?=\d)")
_GAP_BEFORE_UNIT = re.compile(r"(?<=\d)\s+(?=(?:[kKMGmunpUNP]?[RFH]|[kKMunpUNP]|Meg|MEG)(?:[\s/_;,()\[\]|]|$))")
_SPLIT = re.compile(r"[\s/_;,()\[\]|]+")
_TIMES = re.compile(r"^\d{1,2}[xX](?=\d)|(?<=[\dkKMR])[xX]\d{1,2}$")  # an array: 4x10k, 10kx4
_PACKAGE = re.compile(r"[RCL]?(?:01005|0201|0402|0603|0805|1206|1210|1218|1806|1808|1812|1825|2010|2220|2512|2728)")
# What stands beside a value and is none: tolerance, power, voltage, current, temperature, dielectric, frequency.
_BESIDE = re.compile(
    rf"[+-]*{_NUMBER}(?:%|[mu]?[WAV]|[kMG]?Hz|ppm(?:/?[CK])?|°C|C)|{_NUMBER}V\d|[XYZ]\d[A-Z]|C0G|COG|NP0|NPO|x\d{{1,2}}",
    re.IGNORECASE,
)
_PLAIN = re.compile(_NUMBER)


def _read(text: str, strong: Callable[[str], float | None], plain: Callable[[str], float | None]) -> float | None:
    """Return the only value in a text.

    Parameters
    ----------
    text : str
        Value as the schematic has it.
    strong, plain : callable
        Read one word that shows its unit, and one bare number that stands alone; None for neither.
    """
    if len(text) > _LONGEST or _FOREIGN_DIGIT.search(text):
        return None
    if "@" in text or "MHz" in text:  # 600R@100MHz is an impedance, no resistance
        return None
    text = _WATTS_AS_FRACTION.sub(" ", _OHM.sub("R", text.translate(_SAME)))
    if not _THOUSANDS.search(text):  # 1,000 is a thousand here and one there
        text = _DECIMAL_COMMA.sub(".", text)
    text = _GAP_BEFORE_UNIT.sub("", text)
    values: list[float] = []
    bare: list[str] = []
    strange = False
    for word in _SPLIT.split(text):
        word = _TIMES.sub("", word.strip("*~\"'"))
        if not any(character.isdigit() for character in word) or _PACKAGE.fullmatch(word):
            continue
        value = strong(word)
        if value is not None:
            values.append(value)
        elif _PLAIN.fullmatch(word):
            bare.append(word)
        elif not _BESIDE.fullmatch(word):
            strange = True
    if values:
        alike = all(math.isclose(value, values[0], rel_tol=1e-9) for value in values)
        return values[0] if alike and not bare else None
    return plain(bare[0]) if len(bare) == 1 and not strange else None


def _scaled(number: str, prefix: str) -> float:
    """Return a decimal text times a prefix, correctly rounded."""
    return float(f"{number}e{_PREFIX[prefix]}")


# ---------------------------------------------------------------------------------------------------------- resistance

_OHMS_LETTER_LAST = re.compile(rf"({_NUMBER})(k|K|M|Meg|MEG|meg|m|G|R|E|kR|KR|MR|MegR|mR|GR)([BCDFGJ])?")
_OHMS_LETTER_INSIDE = re.compile(r"(\d{1,4})([kKMRE])(\d{1,3})([BCDFGJKM])?")
_OHMS_LETTER_FIRST = re.compile(r"R(\d{1,4})([BCDFGJKM])?")
_TOLERANCE_LETTER = {"B": 0.001, "C": 0.0025, "D": 0.005, "F": 0.01, "G": 0.02, "J": 0.05, "K": 0.1, "M": 0.2}
_PERCENT = re.compile(r"(\d{1,3}(?:[.,]\d{1,3})?)\s*%")


def _strong_ohms(word: str) -> float | None:
    """Read ``4k7``, ``49.9R``, ``R47``."""
    if match := _OHMS_LETTER_LAST.fullmatch(word):
        number, letters = match.group(1), match.group(2)
        letters = "M" if letters.lower().startswith("meg") else letters
        return _scaled(number, {"K": "k", "R": "", "E": ""}.get(letters[0], letters[0]))
    if match := _OHMS_LETTER_INSIDE.fullmatch(word):
        whole, letter, part = match.group(1), match.group(2), match.group(3)
        if letter == "E":
            # 4E7 is 4.7 by habit, 1E3 may be 1.3 or a thousand: read it when one of both is a preferred number.
            as_point, as_power = float(f"{whole}.{part}"), float(f"{whole}e{part}") if len(part) < 3 else 0.0
            return as_point if _is_preferred(as_point) and not _is_preferred(as_power) else None
        return _scaled(f"{whole}.{part}", {"K": "k", "R": ""}.get(letter, letter))
    if match := _OHMS_LETTER_FIRST.fullmatch(word):
        return float(f"0.{match.group(1)}")
    return None


def _plain_ohms(word: str) -> float | None:
    """Read a bare number as ohms, unless it looks like the marking on a part (``103``, ``4702``)."""
    value = float(word)
    if word.isdigit() and len(word) > 1 and word[0] == "0" and value:
        return None  # 0402 and the like
    if word.isdigit() and len(word) in (3, 4) and not _is_preferred(value):
        marked = float(f"{word[:-1]}e{word[-1]}")
        if _is_preferred(marked):
            return None
    return value


def parse_resistance(text: str) -> float | None:
    """Return the resistance that a value names.

    Parameters
    ----------
    text : str
        Value as the schematic has it: ``10k``, ``4R7``, ``R_10k_0402``, ``49.9R/1%/R0402``, ``22``.

    Returns
    -------
    float or None
        Resistance [ohm]; None when the text names none, or can be read in two ways (``103``, ``1,000``, ``10k/20k``).

    Examples
    --------
    >>> parse_resistance("4k7"), parse_resistance("R0402_10K_1%_0.0625W_100PPM"), parse_resistance("0R15")
    (4700.0, 10000.0, 0.15)
    >>> parse_resistance("103") is None
    True
    """
    return _read(text, _strong_ohms, _plain_ohms)


def resistor_tolerance(text: str) -> float | None:
    """Return the tolerance that a resistor's value names.

    Parameters
    ----------
    text : str
        ``49.9R/1%/R0402``, ``10k ±5%``, ``4K7J``.

    Returns
    -------
    float or None
        Fraction [1]; None when the text names none, or several.
    """
    named = {float(match.replace(",", ".")) / 100 for match in _PERCENT.findall(text[:_LONGEST])}
    if not named:
        for word in _SPLIT.split(text.translate(_SAME)[:_LONGEST]):
            for pattern in (_OHMS_LETTER_LAST, _OHMS_LETTER_INSIDE, _OHMS_LETTER_FIRST):
                match = pattern.fullmatch(word)
                letter = match.group(match.re.groups) if match else None
                if letter and not _PACKAGE.fullmatch(word):
                    named.add(_TOLERANCE_LETTER[letter])
    return named.pop() if len(named) == 1 else None


# -------------------------------------------------------------------------------------------- capacitance, inductance

_FARADS_LETTER_LAST = re.compile(rf"({_NUMBER})(?:([pPnNuU])[fF]?|(m)F|(F))")
_FARADS_LETTER_INSIDE = re.compile(r"(\d{1,4})([pPnNuU])(\d{1,2})[fF]?")
_FARADS_LETTER_FIRST = re.compile(r"([pnu])(\d{1,2})")
_FARADS_CODE = re.compile(r"(\d\d)([0-7])([JKM])?")


def _strong_farads(word: str) -> float | None:
    """Read ``100n``, ``4n7``, ``0.1uF``, ``104K``."""
    if match := _FARADS_LETTER_LAST.fullmatch(word):
        return _scaled(match.group(1), (match.group(2) or match.group(3) or "").lower())
    if match := _FARADS_LETTER_INSIDE.fullmatch(word):
        return _scaled(f"{match.group(1)}.{match.group(3)}", match.group(2).lower())
    if match := _FARADS_LETTER_FIRST.fullmatch(word):
        return _scaled(f"0.{match.group(2)}", match.group(1))
    return _coded_farads(word) if word[-1:] in "JKM" else None


def _coded_farads(word: str) -> float | None:
    """Read the three-digit code in picofarads (``104`` is 100 nF), unless it is a plausible plain value (``220``)."""
    match = _FARADS_CODE.fullmatch(word)
    if not match or int(match.group(1)) < 10 or int(match.group(1)) / 10 not in E24:
        return None
    if not match.group(3) and float(word) / 100 in E24:
        return None
    return float(f"{match.group(1)}e{int(match.group(2)) - 12}")


def parse_capacitance(text: str) -> float | None:
    """Return the capacitance that a value names.

    Parameters
    ----------
    text : str
        ``100nF``, ``4u7``, ``CC0402_100NF_16V_10%_X7R``, ``104``.

    Returns
    -------
    float or None
        Capacitance [F]; None when the text names none, or can be read in two ways (``220``, ``0.1``, ``1MF``).

    Examples
    --------
    >>> parse_capacitance("4n7"), parse_capacitance("2.2uF/6.3V/20%/X5R/C0402")
    (4.7e-09, 2.2e-06)
    """
    return _read(text, _strong_farads, _coded_farads)


_HENRIES_LETTER_LAST = re.compile(rf"({_NUMBER})(?:([nNuU])[hH]?|(m)H|(H))")
_HENRIES_LETTER_INSIDE = re.compile(r"(\d{1,4})([nNuU])(\d{1,2})[hH]?")


def _strong_henries(word: str) -> float | None:
    """Read ``10uH``, ``4u7``."""
    if match := _HENRIES_LETTER_LAST.fullmatch(word):
        return _scaled(match.group(1), (match.group(2) or match.group(3) or "").lower())
    if match := _HENRIES_LETTER_INSIDE.fullmatch(word):
        return _scaled(f"{match.group(1)}.{match.group(3)}", match.group(2).lower())
    return None


def parse_inductance(text: str) -> float | None:
    """Return the inductance that a value names.

    Parameters
    ----------
    text : str
        ``10uH``, ``4u7``, ``2.2UH/2A``.

    Returns
    -------
    float or None
        Inductance [H]; None when the text names none; a bare number never does.
    """
    return _read(text, _strong_henries, lambda _: None)


# ------------------------------------------------------------------------------------------------------------ voltages

_SIGNED = rf"[+-]?{_NUMBER}"
_VOLTS_RANGE = re.compile(
    rf"({_SIGNED})\s*V?\s*(?:\.\.\.?|…|–|-|\bto\b)\s*({_SIGNED})\s*V?(?:\s*\.\.\s*({_SIGNED})\s*V?)?"
)
_VOLTS_POINT = re.compile(
    rf"(?:([+-]?\d{{1,3}})[Vv](\d{{1,3}})|({_SIGNED})\s*(mV|V|v)?)"
    rf"(?:\s*(?:\+\s*/?\s*-|±)?\s*(?:({_NUMBER})\s*%|(?<=[-±\s])({_NUMBER})\s*(mV|V)))?"
)


def parse_volts(text: str, tolerance: float = 0.0) -> Spread | None:
    """Return the voltage that a setting or a field states.

    Parameters
    ----------
    text : str
        A point ``24``, ``5V``, ``3V3``, ``-12``; with tolerance ``3.3 5%``, ``3.3V ±0.1V``; a range ``4.4..5.25``; or
        least, usual and greatest ``4.4..5..5.25``.
    tolerance : float
        Fraction [1] for a point that states no tolerance.

    Returns
    -------
    Spread or None
        Voltage [V]; the nominal value of a range is its middle. None when the text is none of these.

    Examples
    --------
    >>> parse_volts("4.4..5.25")
    Spread(low=4.4, nominal=4.825, high=5.25)
    >>> parse_volts("3V3") == parse_volts("3.3 V")
    True
    """
    text = text.strip()
    if not text or len(text) > 60 or _FOREIGN_DIGIT.search(text):
        return None
    if not _THOUSANDS.search(text):
        text = _DECIMAL_COMMA.sub(".", text)
    if match := _VOLTS_RANGE.fullmatch(text):
        numbers = [float(number) for number in match.groups() if number is not None]
        if numbers != sorted(numbers):
            return None
        low, high = numbers[0], numbers[-1]
        return Spread(low=low, nominal=numbers[1] if len(numbers) == 3 else round((low + high) / 2, 9), high=high)
    match = _VOLTS_POINT.fullmatch(text)
    if not match:
        return None
    whole, part, number, unit, percent, reach, reach_unit = match.groups()
    volts = float(f"{whole}.{part}") if whole is not None else float(number) * (1e-3 if unit == "mV" else 1.0)
    if reach is not None:
        reach_volts = float(reach) * (1e-3 if reach_unit == "mV" else 1.0)
        return Spread(low=volts - reach_volts, nominal=volts, high=volts + reach_volts)
    return Spread.around(volts, float(percent) / 100 if percent is not None else tolerance)


# ----------------------------------------------------------------------------------------------------- numbers to text

_SYMBOLS = (
    (1e9, "G"),
    (1e6, "M"),
    (1e3, "k"),
    (1.0, ""),
    (1e-3, "m"),
    (1e-6, "µ"),
    (1e-9, "n"),
    (1e-12, "p"),
    (1e-15, "f"),
)


def format_si(value: float, unit: str, digits: int = 3) -> str:
    """Return a quantity with a prefix, rounded to some significant digits, without idle zeros.

    Parameters
    ----------
    value : float
        Quantity [unit].
    unit : str
        Unit without prefix (``Ω``, ``s``, ``bit/s``).
    digits : int
        Significant digits.

    Returns
    -------
    str
        For instance ``4.7 kΩ``, ``220 ns``, ``1.9 Mbit/s``.

    Examples
    --------
    >>> format_si(4700, "Ω"), format_si(2.2e-7, "s"), format_si(1.9e6, "bit/s"), format_si(0, "A")
    ('4.7 kΩ', '220 ns', '1.9 Mbit/s', '0 A')
    """
    if math.isnan(value):
        return f"? {unit}"
    if math.isinf(value):
        return f"{'-' if value < 0 else ''}∞ {unit}"
    # Rounded first, so that 999.96 becomes 1 k and not 1000.
    value = float(f"{value:.{digits - 1}e}")
    if abs(value) < 1e-15:
        return f"0 {unit}"
    scale, symbol = next((pair for pair in _SYMBOLS if abs(value) >= pair[0] * (1 - 1e-12)), _SYMBOLS[-1])
    shown = value / scale
    decimals = max(digits - 1 - math.floor(math.log10(abs(shown)) + 1e-12), 0)
    return f"{_trimmed(f'{shown:.{decimals}f}')} {symbol}{unit}"


def format_amps(amps: float) -> str:
    """Return a small current in words of the trade: ``1.1 mA``, ``90 µA``, ``less than 1 µA``.

    Parameters
    ----------
    amps : float
        Current [A].

    Returns
    -------
    str
    """
    if amps < 1e-6:
        return "less than 1 µA"
    return f"{amps * 1e3:.2g} mA" if amps >= 1e-4 else f"{amps * 1e6:.2g} µA"


def format_volts(volts: float, decimals: int = 2) -> str:
    """Return a voltage for reading: to 10 mV, without idle zeros.

    Parameters
    ----------
    volts : float
        Voltage [V].
    decimals : int
        Digits after the point.

    Returns
    -------
    str
        For instance ``3.3 V``, ``0.45 V``, ``-12 V``.
    """
    if not math.isfinite(volts):
        return format_si(volts, "V")
    return f"{_trimmed(f'{volts:.{decimals}f}')} V"


def format_volts_apart(first_volts: float, second_volts: float) -> tuple[str, str]:
    """Return two voltages with as many digits as tell them apart, at least to 10 mV and at most to 1 mV.

    A finding that says "3.6 V exceeds 3.6 V" helps nobody.
    """
    shortest = format_volts(first_volts), format_volts(second_volts)
    return shortest if shortest[0] != shortest[1] else (format_volts(first_volts, 3), format_volts(second_volts, 3))


def _trimmed(text: str) -> str:
    """Drop idle zeros after the point, and the sign of nothing."""
    text = text.rstrip("0").rstrip(".") if "." in text else text
    return "0" if text == "-0" else text


# ------------------------------------------------------------------------------------------------- comparing, sorting

# One part in a million is far above rounding and the solver's residue and far below the three digits of a data sheet.
RELATIVE_TOLERANCE = 1e-6
ABSOLUTE_TOLERANCE = 1e-9


def exceeds(value: float, limit: float) -> bool:
    """Tell whether a value is above a limit by more than rounding; 3.3 + 0.3 does not exceed 3.6, nor the reverse.

    Parameters
    ----------
    value, limit : float
        Quantities of one unit [V, A, s ...].
    """
    return value - limit > RELATIVE_TOLERANCE * max(abs(value), abs(limit)) + ABSOLUTE_TOLERANCE


def at_least(value: float, limit: float) -> bool:
    """Tell whether a value reaches a limit, rounding forgiven.

    Parameters
    ----------
    value, limit : float
        Quantities of one unit [V, A, s ...].
    """
    return not (math.isnan(value) or math.isnan(limit)) and not exceeds(limit, value)


_DIGITS = re.compile(r"([0-9]+)")


def natural_key(text: str) -> tuple[tuple[int, int, str], ...]:
    """Return a sort key that puts ``R2`` before ``R10``; equal only for equal texts.

    Parameters
    ----------
    text : str
        A reference, a pin number or a net name.
    """
    key: list[tuple[int, int, str]] = []
    for piece in _DIGITS.split(text):
        if piece and piece[0] in "0123456789":
            plain = piece.lstrip("0")
            key.append((0, len(plain), plain))  # length, then digits: no limit on how long a number may be
        elif piece:
            key.append((1, 0, piece.casefold()))
    return (*key, (-1, 0, text))
