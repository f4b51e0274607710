"""The facts of levelcrossing.toml as fields of schematic symbols.

Names are read without regard to case. ``N`` is a pin number.

=====================  =====================================================================================
Field                  Value
=====================  =====================================================================================
``Rail volts``         ``24`` on a part with a single net besides ground; else ``VMOT = 24; VIN = 9..14``
``Tolerates``          volts that every signal pin of the part bears, ``5.5``
``Pin N tolerates``    the same for one pin
``Pin N drives``       ``yes`` or ``no``; likewise ``Pin N reads``, ``Pin N open drain``
``Pin N VIH``          volts; likewise ``Pin N VIL``
``Pin N rail``         net name or volts of the supply of the pin
``Pin N levels``       ``ttl`` or ``cmos``
``Pin N rate``         bit rate on the net of the pin, ``8M``
``Far end``            what lies beyond a connector: ``5; ttl; drives only``; the items are volts or a net name, ``ttl``
                       or ``cmos``, ``drives only`` or ``reads only``, ``open drain``, ``tolerates 5.5``
``Pin N far end``      the same for one pin of the connector
=====================  =====================================================================================

The settings file wins over a field. A field of one of these names with a value that cannot be read is an error.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from levelcrossing.declared import inherited, pin_setting, read_rate, read_volts, shown
from levelcrossing.errors import SettingsError
from levelcrossing.model import Board, Part, PinSetting, Settings, Spread

_PIN_FIELD = re.compile(r"pin\s+(\S+)\s+(\S.*)", re.IGNORECASE)
_GROUND = re.compile(r"(?:.*/)?(?:[AD]?GND[AD]?|[DP]?GND|VSS[AD]?|0V|EARTH|CHASSIS)", re.IGNORECASE)
_ITEMS = re.compile(r"\s*[;,]\s*")

_PIN_WORDS = {
    "tolerates": "tolerates",
    "drives": "drives",
    "reads": "reads",
    "open drain": "open_drain",
    "vih": "vih",
    "vil": "vil",
    "rail": "rail",
    "levels": "levels",
}
_FAR_END_WORDS: dict[str, dict[str, Any]] = {
    "ttl": {"levels": "ttl"},
    "cmos": {"levels": "cmos"},
    "drives": {"drives": True},
    "reads": {"reads": True},
    "drives only": {"drives": True, "reads": False},
    "reads only": {"drives": False, "reads": True},
    "open drain": {"open_drain": True},
}
_YES_NO = {"yes": True, "true": True, "1": True, "no": False, "false": False, "0": False}


@dataclass(slots=True)
class _Found:
    """What the fields of a board declare, keyed like the settings."""

    rails: dict[str, Spread] = field(default_factory=dict)
    pins: dict[str, dict[str, Any]] = field(default_factory=dict)
    far_ends: dict[str, dict[str, Any]] = field(default_factory=dict)
    rates: list[tuple[str, float]] = field(default_factory=list)


def settings_from_fields(board: Board, settings: Settings) -> Settings:
    """Return the settings with what the fields of the board's symbols declare laid beneath them.

    Parameters
    ----------
    board : Board
    settings : Settings
        From the file; they win.

    Raises
    ------
    SettingsError
        When a field of a known name holds what cannot be read, or names a pin that the part lacks.
    """
    found = _Found()
    for part in board.parts:
        for name, text in part.fields:
            if text.strip():
                try:
                    _read_field(part, name.strip(), text.strip(), settings, found)
                except SettingsError as error:
                    what = f"field {shown(name)} of {shown(part.reference)}: {error.what}"
                    raise SettingsError(what, remedy=error.remedy, file=board.path) from None
    if found == _Found():
        return settings
    known = {net for net, _ in settings.rates}
    return replace(
        settings,
        rails={**found.rails, **settings.rails},
        pins=_laid_beneath(settings.pins, found.pins, settings.rail_tolerance),
        far_ends=_laid_beneath(settings.far_ends, found.far_ends, settings.rail_tolerance),
        rates=settings.rates + tuple((net, rate) for net, rate in found.rates if net not in known),
    )


def _laid_beneath(
    declared: Mapping[str, PinSetting], fields_of: Mapping[str, Mapping[str, Any]], tolerance: float
) -> dict[str, PinSetting]:
    from_fields = {place: pin_setting(table, tolerance) for place, table in fields_of.items()}
    merged: dict[str, PinSetting] = {}
    for place in [*declared, *(place for place in from_fields if place not in declared)]:
        whole = place.partition(".")[0]
        setting = declared.get(place, PinSetting())
        for weaker in (declared.get(whole), from_fields.get(place), from_fields.get(whole)):
            setting = inherited(setting, weaker)
        merged[place] = setting
    return merged


def _read_field(part: Part, name: str, text: str, settings: Settings, found: _Found) -> None:
    plain = name.casefold()
    if plain == "rail volts":
        found.rails.update(_rails(part, text, settings.rail_tolerance))
    elif plain == "far end":
        found.far_ends.setdefault(part.reference, {}).update(_far_end(text, settings.rail_tolerance))
    elif plain == "tolerates":
        table = {"tolerates": text}
        pin_setting(table, 0.0)  # refuses what it cannot read
        _table_for(part, part.reference, found).update(table)
    elif match := _PIN_FIELD.fullmatch(name):
        _read_pin_field(part, match[1], " ".join(match[2].casefold().split()), text, settings, found)


def _read_pin_field(part: Part, number: str, word: str, text: str, settings: Settings, found: _Found) -> None:
    words = (*_PIN_WORDS, "rate", "far end")
    if word not in words:
        # An unrelated field may well begin with "Pin 1"; one that is all but right is a typing error.
        if close := difflib.get_close_matches(word[:60], words, n=1, cutoff=0.8):
            raise SettingsError("is not a known name", remedy=f"did you mean 'Pin {number} {close[0]}'?")
        return
    pin = next((pin for pin in part.pins if pin.number == number), None)
    if pin is None:
        numbers = ", ".join(pin.number for pin in part.pins[:20])
        raise SettingsError(f"the part has no pin {shown(number)}", remedy=f"its pins are {numbers}")
    place = f"{part.reference}.{number}"
    if word == "rate":
        rate = read_rate(text)
        if rate is None:
            raise SettingsError(f"{shown(text)} is not a bit rate", remedy='write "8M" or "400k" or 115200')
        if pin.net:
            found.rates.append((pin.net, rate))
    elif word == "far end":
        found.far_ends.setdefault(place, {}).update(_far_end(text, settings.rail_tolerance))
    else:
        value: object = text
        if word in ("drives", "reads", "open drain"):
            if text.casefold() not in _YES_NO:
                raise SettingsError(f"{shown(text)} is neither yes nor no")
            value = _YES_NO[text.casefold()]
        table = {_PIN_WORDS[word]: value}
        pin_setting(table, settings.rail_tolerance)
        _table_for(part, place, found).update(table)


def _table_for(part: Part, place: str, found: _Found) -> dict[str, Any]:
    """Return the table that a pin's field belongs to: that of the far ends when the part declares one."""
    names = [name.casefold().strip() for name, text in part.fields if text.strip()]
    beyond = any(name == "far end" or (name.startswith("pin ") and name.endswith(" far end")) for name in names)
    return (found.far_ends if beyond else found.pins).setdefault(place, {})


def _rails(part: Part, text: str, tolerance: float) -> Iterator[tuple[str, Spread]]:
    nets = sorted({pin.net for pin in part.pins if pin.net})
    wishes = "write volts, or NET = volts for each net, separated by semicolons"
    for item in _ITEMS.split(text.strip(" ;,")):
        net, equals, value = (piece.strip() for piece in item.rpartition("="))
        volts = read_volts(value, tolerance)
        if volts is None:
            raise SettingsError(f"{shown(item)} is not a voltage", remedy=wishes)
        if equals:
            here = [known for known in nets if known == net or known.rpartition("/")[2] == net]
            if not here:
                raise SettingsError(f"no pin of the part is on net {shown(net)}", remedy=wishes)
            yield here[0], volts
        else:
            live = [known for known in nets if not _GROUND.fullmatch(known)]
            if len(live) != 1:
                raise SettingsError(f"the part has {len(live)} nets besides ground", remedy=wishes)
            yield live[0], volts


def _far_end(text: str, tolerance: float) -> dict[str, Any]:
    table: dict[str, Any] = {}
    for item in _ITEMS.split(text.strip(" ;,")):
        plain = " ".join(item.casefold().split())
        if plain in _FAR_END_WORDS:
            table.update(_FAR_END_WORDS[plain])
        elif match := re.fullmatch(r"(tolerates|vih|vil|rail)[\s=:]+(\S.*)", item, re.IGNORECASE):
            table[match[1].casefold()] = match[2]
        elif "rail" not in table:
            table["rail"] = item
        else:
            known = ", ".join(_FAR_END_WORDS)
            raise SettingsError(f"{shown(item)} is not understood", remedy=f"items are volts or a net, {known}")
    if "rail" not in table:
        raise SettingsError("tells no rail", remedy='begin with volts or the name of a net: "5; ttl"')
    pin_setting(table, tolerance)
    return table
