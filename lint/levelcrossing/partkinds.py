"""What kind of simple part something is, and which of its pins are one element or galvanically one.

Netlists say nothing of this. The symbol's library and name, the footprint, the value, the names and number of the pins
tell; the letters of the reference come last, because references need not be letters and digits (``5.0V/3.3V1``).
The lists of words are naming habits of symbol libraries (common practice).
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable
from functools import lru_cache

from levelcrossing.model import Part, Pin
from levelcrossing.units import natural_key, parse_inductance, parse_resistance

LINK_KINDS = frozenset({"link", "jumper", "net-tie", "fuse", "ferrite", "inductor"})
"""Kinds whose joined pins carry the same voltage at DC."""

ELEMENT_KINDS = frozenset(
    {
        "resistor", "resistor-pack", "shunt", "capacitor", "inductor", "ferrite", "fuse", "jumper", "net-tie", "link",
        "diode", "zener", "led", "suppressor", "transistor", "switch", "crystal", "battery", "mounting-hole",
        "power-flag", "transformer", "transducer", "relay", "antenna", "source",
    }
)  # fmt: skip
"""Kinds that neither read nor drive a logic level of their own."""

# Patterns on the symbol's name: kind, least and most pins, alternatives.
_SYMBOLS: tuple[tuple[str, int, int, str], ...] = (
    ("power-flag", 0, 1, r"PWR_?FLAG"),
    (
        "mounting-hole",
        0,
        8,
        r"MOUNTING.?HOLE|FIDUCIAL|SPACER|STANDOFF|LOGO|SCREW(?!.?TERM)|^HOLE|_HOLE\d|HEATSINK|SHIELD_?CAN",
    ),
    ("test-point", 0, 2, r"^TEST.?P(OINT|AD)|^TP(_|\d|$)|TESTPOINT|^SMD_PAD"),
    ("net-tie", 2, 8, r"NET.?TIE"),
    ("jumper", 2, 8, r"^(SOLDER)?JUMPER|SOLDER_?JUMPER|^SJ(\d|_|$)|^SJ\dW|^JP\d|^JMP"),
    ("fuse", 2, 3, r"^(POLY)?FUSE|^FUSR|^F_\d|^POLYSWITCH|^PTC_?(FUSE|RESET)|^RESETTABLE|^F$"),
    ("ferrite", 2, 2, r"FERRITE|^FB(_|\d|$)|^BEAD|BLM\d\d|MPZ\d{4}|^EMI_?BEAD"),
    ("crystal", 2, 4, r"^CRYSTAL|^RESONATOR|^XTAL|^Y_|^CERAMIC_?RESONATOR"),
    ("battery", 2, 4, r"^BATTERY|^BAT_?(HOLDER|CELL)|^COIN_?CELL|^CR\d{4}|^BT_"),
    ("shunt", 4, 4, r"SHUNT|^R_?SENSE|KELVIN"),
    (
        "resistor-pack",
        3,
        40,
        r"^R_?(NETWORK|PACK|ARRAY)|^RESISTOR_?(PACK|NETWORK|ARRAY)|^RA\d|^RN(_|\d|$)|"
        r"^RES_?(ARRAY|NET|PACK)|^R_?MATRIX|^CAY16|^EXB|^RR\d+$",
    ),
    (
        "suppressor",
        2,
        20,
        r"TVS|^ESD|ESD\d?[A-Z]?\d|_ESD|^PESD|^SM[AB]J\d|^P[46]KE|^SM712|VARISTOR|^MOV|^USBLC|^PRTR\d|"
        r"^TPD\d|^SP05|^RCLAMP|^IP4\d{3}|SUPPRESS|^D_TVS|ESDA|^GDT|SURGE|TRANSIL",
    ),
    ("led", 2, 4, r"(^|_)LED($|[_ ])|^LED[_-]?[A-Z0-9]{0,4}$|^LED_"),
    ("zener", 2, 3, r"ZENER|^BZ[XTV]\d|^MMSZ|^MM3Z|^1N47[2-6]\d|^1N52[2-7]\d"),
    (
        "diode",
        2,
        6,
        r"^D(_|$)|^D-|DIODE|SCHOTTKY|^1N\d{4}|^BA[STRVW]\d\d|^SB\d{3}|^SS\d\d$|^B\d40|^MBR\w*\d|^RB\d{3}|"
        r"^STPS\d|^PMEG\d|^BAS\d|^DFLS|^CDB",
    ),
    (
        "transistor",
        3,
        8,
        r"^Q_|[NP]-?MOS|MOSFET|(^|_)(NPN|PNP)|^BSS\d|^2N[37]\d{3}|^BC[58]\d\d|^MMBT|^FDV\d|^AO3\d{3}|"
        r"^SI2\d{3}|^DMG\d|^DMP\d|^IRLML|^MOS_|^BJT",
    ),
    ("transformer", 4, 40, r"^TRANSFORMER|^XFMR|^TRAFO|^PULSE_?TRANS"),
    ("relay", 4, 16, r"^RELAY|_RELAY"),
    ("transducer", 2, 4, r"^BUZZER|^SPEAKER|^MICROPHONE|^MOTOR|^PIEZO|^LAMP"),
    # Sources of a simulation stand for nothing that is fitted.
    ("source", 2, 4, r"^[VI]SOURCE|^[VI](DC|AC|SIN|PULSE|PWL|EXP|SFFM|AM|TRNOISE|TRRANDOM)$"),
    ("antenna", 1, 4, r"^ANTENNA|^ANT(_|\d|$)"),
    (
        "switch",
        2,
        20,
        r"^SW_|^SWITCH_|PUSH.?BUTTON|^PB_|TACT|^BUTTON|^KEY_?SW|^DIP_?SWITCH",
    ),
    ("inductor", 2, 4, r"^L(_|$)|^IND(UCTOR)?(_|\d|$)|^CHOKE|INDUCTOR|COMMON_?MODE|^CMC|^EMI_?FILTER|^L_"),
    (
        "capacitor",
        2,
        3,
        r"^C(_|$)|^CP(_|\d|$)|^CAP(ACITOR)?(_|\d|$)|CAPACITOR|^CC\d{4}_|^CAE[A-Z]?\w*_|^C\d{4}_|^POL_?CAP",
    ),
    (
        "resistor",
        2,
        3,
        r"^R(_|$)|^RES(ISTOR)?(_|\d|$)|RESISTOR|^R\d{4}_|^RV(_|$)|POTENTIOMETER|^POT(_|\d|$)|THERMISTOR|^NTC|^TRIM",
    ),
    (
        "connector",
        1,
        2000,
        r"^CONN?(_|\d|$)|^USB[_-]?([ABC]|MINI|MICRO|OTG|2|3)|^SCREW.?TERM|RECEPTACLE|^RJ\d\d|"
        r"^(BARREL|AUDIO|POWER|PWR|DC).?JACK|JACK|^HDMI-[AD]|HEADER|^BUS_(ISA|PCI|M\.?2|DDR)|SOCKET|"
        r"^D[BE]\d\d|^BNC|^SMA(_|$)|U\.FL|EDGE.?CONN|CARTRIDGE|^MICRO_?SD|SD_?CARD|TERMINAL|PMOD|^BH\d\d|"
        r"CONN$|TC2030|TAG-?CONNECT|^SIM_?CARD|^CON\d|^DISPLAYPORT|^JST|^MOLEX|^HIROSE|^SAMTEC|^HARTING|"
        r"^TYCO|-CART$|DIN_?\d",
    ),
)
_COMPILED = tuple((kind, re.compile(pattern, re.IGNORECASE), least, most) for kind, least, most, pattern in _SYMBOLS)

_LIBRARIES: tuple[tuple[str, str, int, int], ...] = (
    ("jumper", r"jumper", 2, 8),
    (
        "connector",
        r"connector|conn($|[_-])|terminal.?block|molex|harting|samtec|hirose|tyco|harwin|headers?$|jack|sockets?$",
        1,
        2000,
    ),
    ("switch", r"^switch|button|switches$", 2, 20),
    ("fuse", r"fuse", 2, 3),
    ("capacitor", r"capacitor", 2, 3),
    ("resistor", r"resistor", 2, 2),
    ("inductor", r"inductor|ferrite", 2, 4),
    ("transistor", r"transistor|mosfet", 3, 8),
    ("led", r"\bled", 2, 4),
    ("suppressor", r"tvs|protection|esd", 2, 20),
    ("diode", r"diode", 2, 6),
    ("crystal", r"crystal", 2, 4),
    ("test-point", r"testpoint|test_?point", 0, 2),
    ("battery", r"batter", 2, 4),
    ("regulator", r"regulator|dcdc|dc-dc|converter_dc|voltage_?reg", 3, 80),
)
_COMPILED_LIBRARIES = tuple(
    (kind, re.compile(pattern, re.IGNORECASE), least, most) for kind, pattern, least, most in _LIBRARIES
)
_REGULATOR_LIBRARY = _COMPILED_LIBRARIES[-1][1]

_FOOTPRINTS = re.compile(
    r"^(?P<connector>Connector|TerminalBlock)|^(?P<jumper>Jumper|[^:]*:SolderJumper)|^(?P<test>TestPoint)|"
    r"^(?P<hole>MountingHole|Fiducial)|"
    r"^(?P<switch>Button_Switch)|^(?P<crystal>Crystal)|^(?P<fuse>Fuse)|^(?P<battery>Battery)",
    re.IGNORECASE,
)
_FOOTPRINT_KINDS = {"test": "test-point", "hole": "mounting-hole"}

_LETTERS: dict[str, tuple[str, int, int]] = {
    "R": ("resistor", 2, 3), "RN": ("resistor-pack", 3, 40),
    "RR": ("resistor-pack", 3, 40), "POT": ("resistor", 2, 3),
    "RP": ("resistor-pack", 4, 40), "RM": ("resistor-pack", 3, 40),
    "RA": ("resistor-pack", 3, 40), "RV": ("resistor", 2, 3),
    "C": ("capacitor", 2, 3), "CP": ("capacitor", 2, 3),
    "L": ("inductor", 2, 4), "FB": ("ferrite", 2, 2),
    "D": ("diode", 2, 3), "ZD": ("zener", 2, 3),
    "LED": ("led", 2, 4), "LD": ("led", 2, 4),
    "TVS": ("suppressor", 2, 20), "F": ("fuse", 2, 2),
    "J": ("connector", 1, 2000), "P": ("connector", 1, 2000),
    "CN": ("connector", 1, 2000), "CON": ("connector", 1, 2000),
    "CONN": ("connector", 1, 2000), "TP": ("test-point", 0, 2),
    "JP": ("jumper", 2, 8), "SJ": ("jumper", 2, 3),
    "Y": ("crystal", 2, 4), "Q": ("transistor", 3, 3),
    "SW": ("switch", 2, 20), "BT": ("battery", 2, 4),
    "H": ("mounting-hole", 0, 1), "MH": ("mounting-hole", 0, 1),
    "MK": ("mounting-hole", 0, 1), "FID": ("mounting-hole", 0, 1),
    "TR": ("transformer", 4, 20), "BZ": ("transducer", 2, 3),
    "LS": ("transducer", 2, 3), "K": ("relay", 4, 16),
    "AE": ("antenna", 1, 4), "ANT": ("antenna", 1, 4),
    "NT": ("net-tie", 2, 4),
}  # fmt: skip

_BEAD_VALUE = re.compile(
    r"@\s*\d+\s*[MG]HZ|^\d+R\s*/\s*\d+(\.\d+)?\s*M?A|BLM\d\d|MPZ\d{4}|UPZ\d{4}|FERRITE|^FB[_-]?\d", re.IGNORECASE
)
_ZENER_VALUE = re.compile(r"^(BZ[XTV]\d|MMSZ|MM3Z|ZENER)", re.IGNORECASE)
_SUPPRESSOR_VALUE = re.compile(
    r"^(P?ESD|SM[ABC]J\d|P[46]KE|SM712|USBLC|PRTR|TPD\d[A-Z]|SP05|RCLAMP|TVS|SMF\d)", re.IGNORECASE
)
# A voltage detector or an oscillator may have VIN, OUT and GND too; VI and VO are what regulators' symbols say.
_REGULATOR_PINS = (
    frozenset({"VI", "VIN", "IN"}),
    frozenset({"VO", "VOUT", "OUT"}),
    frozenset({"GND", "ADJ", "FB", "GND/ADJ"}),
)
_MOSFET_PINS, _BIPOLAR_PINS = frozenset("GSD"), frozenset("BCE")
_LONG_TERMINALS = {"GATE": "G", "SOURCE": "S", "DRAIN": "D", "BASE": "B", "COLLECTOR": "C", "EMITTER": "E"}
_NAMED_PINS = 24
"""Pin names of larger parts are not looked at: nothing here has so many terminals."""

# How a value or a symbol tells the state of a jumper.
_OPEN = re.compile(r"OPEN(ED)?|(^|_)NO(_|$)|NOT.?(FITTED|BRIDGED)", re.IGNORECASE)
_CLOSED = re.compile(r"CLOSED?|BRIDGED?|SOLDERED|SHORT(ED)?|TIED|(^|_)NC(_|$)", re.IGNORECASE)
_STATES = r"(?P<state>CLOSED?|BRIDGED?|SOLDERED|SHORT(?:ED)?|OPEN(?:ED)?)"
_PAIR_STATES = (
    re.compile(rf"{_STATES}\s*[:=]?\s*\(?\s*(?P<a>\d+)\s*[-+&]\s*(?P<b>\d+)", re.IGNORECASE),
    re.compile(rf"(?<!\d)(?P<a>\d{{1,2}})\s*[-+&]\s*(?P<b>\d{{1,2}})\s*[:=]?\s*\(?{_STATES}", re.IGNORECASE),
)
_BRIDGED_SYMBOL = re.compile(r"BRIDGED(?P<pins>\d{2,4})", re.IGNORECASE)


def letters_of(reference: str) -> str:
    """Return the letters that a reference begins with, in capitals: ``RN`` of ``RN3``."""
    match = re.match(r"[A-Za-z]+", reference)
    return match.group(0).upper() if match else ""


def kind_of(part: Part) -> str:
    """Tell what kind of part this is.

    Parameters
    ----------
    part : Part

    Returns
    -------
    str
        One of ``resistor``, ``resistor-pack``, ``shunt`` (four terminals), ``link`` (0 ohm), ``capacitor``,
        ``inductor``, ``ferrite``, ``fuse``, ``jumper``, ``net-tie``, ``diode``, ``zener``, ``led``, ``suppressor``,
        ``transistor``, ``connector``, ``test-point``, ``mounting-hole``, ``switch``, ``crystal``, ``battery``,
        ``power-flag``, ``transformer``, ``relay``, ``transducer``, ``antenna``, ``source`` (of a simulation), ``regulator``, ``ic``.
    """
    names = tuple(pin.name for pin in part.pins) if len(part.pins) <= _NAMED_PINS else ()
    return _kind(part.reference, part.value, part.library, part.symbol, part.footprint, len(part.pins), names)


@lru_cache(maxsize=20_000)
def _kind(
    reference: str, value: str, library: str, symbol: str, footprint: str, pins: int, names: tuple[str, ...]
) -> str:
    letters = letters_of(reference)
    if reference.startswith("#"):
        return "power-flag"
    if pins == 0:
        return "mounting-hole"
    if pins == 1 and letters == "TP":
        return "test-point"
    words = {re.sub(r"[~{}]", "", name).strip().upper() for name in names if name}
    powered = any(re.match(r"\+?V(CC|DD|S|IN|BUS)?$|^[AD]?V(CC|DD)|^VBAT$", word) for word in words) and pins > 3
    symbol = symbol.removesuffix("-Device")
    kind = _by_symbol(symbol, pins)
    if kind in ("suppressor", "connector", "jumper", "mounting-hole"):
        powered = False
    if not kind or powered:
        kind = _by_pins(words, pins)
    if not kind and not powered:
        kind = _by_library(library, symbol, pins) or _by_footprint(footprint)
    if not kind and not powered:
        found = _LETTERS.get(letters)
        kind = found[0] if found and found[1] <= pins <= found[2] else ""
    if not kind and letters in ("J", "P", "CN", "CON", "CONN") and pins > 8 and not re.search(r"\d[A-Z]{2,}\d", value):
        kind = "connector"
    kind = _refined(kind, letters, value, symbol, pins)
    return kind or ("regulator" if _REGULATOR_LIBRARY.search(library) else "ic")


def _by_symbol(symbol: str, pins: int) -> str:
    fitting = (kind for kind, pattern, least, most in _COMPILED if least <= pins <= most and pattern.search(symbol))
    return next(fitting, "")


def _by_library(library: str, symbol: str, pins: int) -> str:
    for kind, pattern, least, most in _COMPILED_LIBRARIES:
        if least <= pins <= most and pattern.search(library):
            return kind
    return "test-point" if pins == 1 and re.search(r"pad", symbol, re.IGNORECASE) else ""


def _by_pins(words: set[str], pins: int) -> str:
    """Tell a transistor or a regulator by the names of its pins."""
    terminals = {re.sub(r"\d", "", _LONG_TERMINALS.get(word, word)) for word in words}
    if 3 <= pins <= 8 and len(terminals) <= 4 and (terminals >= _MOSFET_PINS or terminals >= _BIPOLAR_PINS):
        return "transistor"
    named = {"VI", "VO"} <= words or words & {"ADJ", "FB"}
    return "regulator" if 3 <= pins <= 10 and named and all(words & group for group in _REGULATOR_PINS) else ""


def _by_footprint(footprint: str) -> str:
    match = _FOOTPRINTS.match(footprint)
    if match is None:
        return ""
    name = next(name for name, text in match.groupdict().items() if text)
    return _FOOTPRINT_KINDS.get(name, name)


def _refined(kind: str, letters: str, value: str, symbol: str, pins: int) -> str:
    """Correct the kind by the value: 0 ohm is a link, an inductor given in ohms a ferrite, ``(1-2:Closed)`` jumper."""
    text = value.strip()
    if kind in ("connector", "switch") and pins <= 16 and any(pattern.search(text) for pattern in _PAIR_STATES):
        return "jumper"
    stated = letters in ("JP", "SJ") or re.search(r"\((CLOSED|OPEN)", text, re.IGNORECASE) is not None
    if kind in ("connector", "jumper") and 2 <= pins <= 3 and stated:
        return "jumper"
    if kind == "connector" and pins == 1 and letters in ("H", "MH"):
        return "mounting-hole"
    if kind == "resistor":
        if pins == 2 and (parse_resistance(text) == 0.0 or re.search(r"(^|_)0R(_|$)|0R_JUMPER", text, re.IGNORECASE)):
            return "link"
        if _BEAD_VALUE.search(text) and pins == 2:
            return "ferrite"
    if kind == "inductor" and pins == 2 and parse_inductance(text) is None and _BEAD_VALUE.search(f"{text} {symbol}"):
        return "ferrite"
    if kind in ("diode", "led"):
        if _SUPPRESSOR_VALUE.search(text) or letters == "TVS":
            return "suppressor"
        if _ZENER_VALUE.search(text):
            return "zener"
        if (kind == "diode" and letters in ("LED", "LD")) or re.match(r"LED\b", text, re.IGNORECASE):
            return "led"
    return kind


def is_connector(part: Part) -> bool:
    """Tell whether a part leads off the board."""
    return kind_of(part) == "connector"


def is_integrated_circuit(part: Part) -> bool:
    """Tell whether a part is none of the simple kinds: an integrated circuit, a module, a regulator."""
    return kind_of(part) in ("ic", "regulator")


# ------------------------------------------------------------------------------------------------------------ elements


def element_pairs(part: Part) -> tuple[tuple[Pin, Pin], ...]:
    """Return the pins between which each element of a part lies.

    Parameters
    ----------
    part : Part
        A two-terminal part, a resistor pack, a four-terminal shunt, a potentiometer, a coupled choke, a switch or a
        jumper of two or three pads.

    Returns
    -------
    tuple of (Pin, Pin)
        One pair for each element; empty when the pins do not tell.
    """
    kind, pins = kind_of(part), tuple(part.pins)
    if kind in (
        "ic",
        "regulator",
        "connector",
        "transistor",
        "mounting-hole",
        "test-point",
        "power-flag",
        "antenna",
        "source",
    ):
        return ()
    if kind == "resistor-pack" or (kind in ("capacitor", "inductor") and len(pins) > 3):
        return _pack_pairs(pins)
    if kind == "shunt" and len(pins) == 4:
        first, second = shunt_ends(part)
        return ((first[0], second[0]),) if first and second else ()
    if len(pins) == 2:
        return ((pins[0], pins[1]),)
    if len(pins) == 3 and kind in ("resistor", "jumper", "switch"):
        return ((pins[0], pins[1]), (pins[1], pins[2]))
    if len(pins) == 3 and kind == "capacitor":
        return ((pins[0], pins[1]), (pins[2], pins[1]))  # feed-through: the middle pin is the plate to ground
    if kind == "jumper" and len(pins) % 2 == 0:
        return tuple(zip(pins[::2], pins[1::2], strict=True))
    return ()


def _pack_pairs(pins: tuple[Pin, ...]) -> tuple[tuple[Pin, Pin], ...]:
    common = [pin for pin in pins if re.fullmatch(r"COM(MON)?|C", pin.name.strip(), re.IGNORECASE)]
    if len(common) == 1:
        return tuple((common[0], pin) for pin in pins if pin is not common[0])
    for texts in ([pin.name for pin in pins], [pin.number for pin in pins]):
        groups: dict[str, list[Pin]] = defaultdict(list)
        for pin, text in zip(pins, texts, strict=True):
            match = re.fullmatch(r"(R?\d+|[A-Z])([._-]?)([12AB])", text.strip().upper())
            told = match is not None and (match[2] or match[3] in "AB")
            groups[match[1] if match is not None and told else f"?{pin.number}"].append(pin)
        if all(len(group) == 2 for group in groups.values()):
            ordered = sorted(groups.items(), key=lambda item: natural_key(item[0]))
            return tuple((group[0], group[1]) for _, group in ordered)
    if len(pins) % 2:  # single in line, star: pin 1 is common
        return tuple((pins[0], pin) for pin in pins[1:])
    return tuple((pins[index], pins[-1 - index]) for index in range(len(pins) // 2))


def shunt_ends(part: Part) -> tuple[tuple[Pin, ...], tuple[Pin, ...]]:
    """Return the pins of both ends of a four-terminal shunt, the current terminal of each first.

    Notes
    -----
    Names like ``I+`` and ``V+`` tell first, then pins that lie on one net. Otherwise pins 1 and 2 are one end and 3 and
    4 the other, with 1 and 4 carrying the current (the numbering of KiCad's symbol).
    """
    pins = list(part.pins)
    if len(pins) != 4:
        return (), ()
    plus = [pin for pin in pins if "+" in pin.name]
    minus = [pin for pin in pins if "-" in pin.name]
    if len(plus) == 2 and len(minus) == 2:
        return tuple(sorted(plus, key=_sense_last)), tuple(sorted(minus, key=_sense_last))
    for a, b, c, d in ((0, 1, 2, 3), (0, 2, 1, 3), (0, 3, 1, 2)):
        if pins[a].net and pins[a].net == pins[b].net and pins[c].net == pins[d].net:
            return (pins[a], pins[b]), (pins[c], pins[d])
    return (pins[0], pins[1]), (pins[3], pins[2])


def _sense_last(pin: Pin) -> bool:
    return re.match(r"[VUS]", pin.name.strip(), re.IGNORECASE) is not None


def joined_pins(part: Part) -> tuple[tuple[Pin, Pin], ...]:
    """Return the pairs of pins that are galvanically one.

    Parameters
    ----------
    part : Part

    Returns
    -------
    tuple of (Pin, Pin)
        For 0-ohm links, closed jumpers (all or some of their pads), net ties, fuses, ferrites, inductors, and the two
        ends of a shunt; empty for everything else and for open jumpers.
    """
    kind, pins = kind_of(part), part.pins
    if kind == "jumper":
        return _closed_pairs(part)
    if kind == "net-tie":
        return tuple((pins[0], pin) for pin in pins[1:])
    if kind in LINK_KINDS:
        return element_pairs(part)
    if kind == "shunt":
        return tuple((end[0], pin) for end in shunt_ends(part) for pin in end[1:])
    return ()


def jumper_state(part: Part) -> str:
    """Tell whether a jumper is ``closed`` (also in part), ``open`` or ``unknown`` as drawn."""
    if _closed_pairs(part):
        return "closed"
    text = f"{part.value} {part.symbol} {part.footprint.rpartition(':')[2]}"
    return "open" if _OPEN.search(text) else "unknown"


def _closed_pairs(part: Part) -> tuple[tuple[Pin, Pin], ...]:
    """Return the pads that are bridged: by the value, else by the symbol, else by the footprint."""
    by_number = {pin.number: pin for pin in part.pins}
    for text in (part.value, part.symbol, part.footprint.rpartition(":")[2]):
        stated = [match for pattern in _PAIR_STATES for match in pattern.finditer(text)]
        if stated:
            return tuple(_stated(stated, by_number))
        bridged = _BRIDGED_SYMBOL.search(text)
        if bridged:
            pads = [by_number[number] for number in bridged["pins"] if number in by_number]
            return tuple((pads[0], pad) for pad in pads[1:])
        if _OPEN.search(text):
            return ()
        if _CLOSED.search(text) and len(part.pins) == 2:
            return ((part.pins[0], part.pins[1]),)
    if len(part.pins) == 2 and parse_resistance(part.value) == 0.0:
        return ((part.pins[0], part.pins[1]),)
    return ()


def _stated(matches: Iterable[re.Match[str]], by_number: dict[str, Pin]) -> Iterable[tuple[Pin, Pin]]:
    done: set[tuple[str, str]] = set()
    for match in matches:
        key = (match["a"], match["b"])
        known = key[0] in by_number and key[1] in by_number
        if known and key not in done and not match["state"].upper().startswith("OPEN"):
            done.add(key)
            yield by_number[key[0]], by_number[key[1]]
