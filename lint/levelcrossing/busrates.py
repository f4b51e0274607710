"""What each net must carry: the rate from the settings, else from the bus that names, pins and parts give away.

A bus is told by the last component of a net's name, freed of the suffixes of shifted copies (``_5V``, ``_LV``); by names
that only mean something together (a clock with a data line of the same group); by a pin of a part that speaks nothing
else (the DIN of an addressable LED); or by an open-drain pin of a bus of open drains.
"""

from __future__ import annotations

import fnmatch
import re
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

from levelcrossing.model import Board, BusFacts, LineRate, PinModel, Settings
from levelcrossing.pinnames import pin_words
from levelcrossing.units import format_si

# What names of shifted copies of a line add, and what names its owner: common practice in schematics.
_SUFFIX = re.compile(
    r"((?:[_-](?:3V3|3\.3V|5V0?|1V8|2V5|LV|HV|LOW|HIGH|BUF|LS|SHIFTED|ISO|A|B))+|5V|3V3|1V8)$", re.IGNORECASE
)
_OWNER = re.compile(r"^(MCU|ESP|ESP32|CPU|RPI|PI|ARD|ARDUINO|FPGA|EXT|AUX|MAIN)[_-]", re.IGNORECASE)


def line_rates(
    board: Board, pins: Mapping[tuple[str, str], PinModel], buses: Sequence[BusFacts], settings: Settings
) -> dict[str, LineRate]:
    """Return what each net must carry; nets of which nothing tells are absent.

    Parameters
    ----------
    board : Board
    pins : mapping from part and pin number to PinModel
    buses : sequence of BusFacts
        From the trade data; the first one that fits counts.
    settings : Settings
        Its rates by net come before any bus.

    Returns
    -------
    dict
        Net name to LineRate.
    """
    told: dict[str, tuple[BusFacts, str]] = {}
    for bus in (one for one in buses if one.bits_per_second is not None):
        for net, group in _lines_of(bus, board, pins):
            told.setdefault(net, (bus, group))
    rates: dict[str, LineRate] = {}
    for one in board.nets:
        stated = next(((name, rate) for name, rate in settings.rates if fnmatch.fnmatchcase(one.name, name)), None)
        bus_group = told.get(one.name)
        if stated is not None:
            known = bus_group[0] if bus_group is not None else None
            rates[one.name] = _line(known, stated[1], f"the settings ask {stated[0]} for it")
        elif bus_group is not None:
            bus, group = bus_group
            usual = bus.bits_per_second or 0.0
            line = _line(
                bus, bus.least_bits_per_second, f"{bus.title}: {bus.least_why}" if bus.least_why else "", at=usual
            )
            said = f"{bus.title} usually runs at {format_si(usual, 'bit/s', 2)}"
            rates[one.name] = replace(line, usual_bit_s=usual, usual_why=said, bus=bus.name, group=group)
    return rates


def _line(bus: BusFacts | None, needed_bit_s: float | None, why: str, at: float = 0.0) -> LineRate:
    """Return a line's rate with what its bus demands of an open drain in the slowest mode that runs at that rate."""
    mode = None
    if bus is not None and bus.open_drain:
        rate = needed_bit_s or at
        mode = next((mode for mode in bus.modes if mode.bits_per_second >= rate * (1 - 1e-9)), None)
    return LineRate(
        needed_bit_s=needed_bit_s,
        why=why,
        open_drain=bus is not None and bus.open_drain,
        rise_30_70_max_s=mode.rise_max_s if mode is not None else None,
        sink_amps=mode.sink_amps if mode is not None else None,
        sink_volts=mode.sink_volts if mode is not None else None,
    )


def _lines_of(bus: BusFacts, board: Board, pins: Mapping[tuple[str, str], PinModel]) -> Iterable[tuple[str, str]]:
    """Return the nets of one bus, each with the group that shares its clock."""
    groups: dict[str, dict[str, list[str]]] = defaultdict(lambda: defaultdict(list))
    for net in board.nets:
        name, path = _plain(net.name)
        for role, pattern in bus.nets:
            if re.fullmatch(pattern, name, re.IGNORECASE):
                groups[path + re.split(r"[_-](?=[^_-]*$)", name)[0] if re.search("[_-]", name) else path][role].append(
                    net.name
                )
                break
    for group, roles in groups.items():
        if not bus.together or any(all(role in roles for role in wanted) for wanted in bus.together):
            yield from ((net, group) for nets in roles.values() for net in nets)
    yield from _told_by_pins(bus, board, pins)


def _told_by_pins(bus: BusFacts, board: Board, pins: Mapping[tuple[str, str], PinModel]) -> Iterable[tuple[str, str]]:
    patterns = [re.compile(pattern, re.IGNORECASE) for _, pattern in bus.pins]
    speaks_it = {
        part.reference
        for part in board.parts
        if bus.parts and any(re.search(bus.parts, text, re.IGNORECASE) for text in (part.value, part.symbol))
    }
    for pin in pins.values():
        drains = bus.open_drain and not bus.parts and pin.drive is not None and pin.drive.style == "open-drain"
        if not (pin.net and (pin.part in speaks_it or drains)):
            continue
        if any(pattern.fullmatch(word) for pattern in patterns for word in (pin.name, *pin_words(pin.name))):
            yield pin.net, pin.part


def _plain(net: str) -> tuple[str, str]:
    """Return the last component of a net's name without overbars and the marks of copies, and what stands before it."""
    path, _, name = re.sub(r"~?\{|\}|~", "", net).rpartition("/")
    return _OWNER.sub("", _SUFFIX.sub("", name)), path
