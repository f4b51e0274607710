"""What settles the direction of pins that could go both ways: a direction pin, a bus of open drains, a net's name."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Mapping, Set
from dataclasses import replace

from levelcrossing.model import Element, LineRate, PartFacts, PinModel, Rails
from levelcrossing.pinnames import SERIAL_IN, SERIAL_OUT, pin_words

# Direction pins of plain transceivers (74xx245 and kin): high is A to B (data sheets of the family).
# Series resistors in bus lines are a few hundred ohms at most (UM10204 section 7.1.2); pull-ups are a kilohm and more.
SERIES_OHMS = 500.0
HOST_GROUPS = frozenset({"mcu", "fpga"})
# Names of lines of the serial peripheral interface that say who drives: host in, host out, and its clock.
HOST_READS = re.compile(r"(.*[_.-])?(MISO|CIPO|POCI|SOMI)\d?([_.-].*)?", re.IGNORECASE)
HOST_DRIVES = re.compile(r"(.*[_.-])?(MOSI|COPI|PICO|SIMO|SCK|SCLK)\d?([_.-].*)?", re.IGNORECASE)
# Names of nets that carry an asynchronous serial line.
SERIAL_NET = re.compile(r"(.*[_.\-])?(U?S?ART\d?|SERIAL\d?|(RX|TX)[DOI]?\d?)([_.\-].*)?", re.IGNORECASE)
PLAIN_DIRECTION = re.compile(r"(\d?)(?:DIR|T/?~?R|A->B)(\d?)", re.IGNORECASE)


def settle_directions(
    pins: Mapping[tuple[str, str], PinModel], facts: Mapping[str, PartFacts], rails: Rails
) -> dict[tuple[str, str], PinModel]:
    """Return the pins with the sides of transceivers settled where their direction pin is tied to a rail.

    Parameters
    ----------
    pins : mapping
        (reference, number) to PinModel.
    facts : mapping
        Reference to the part's row.
    rails : Rails

    Returns
    -------
    dict
        All pins; those of a settled side without the drive or the receiver that the direction rules out.
    """
    settled = dict(pins)
    by_part: dict[str, list[PinModel]] = defaultdict(list)
    for pin in pins.values():
        if pin.part in facts:
            by_part[pin.part].append(pin)
    for reference, members in by_part.items():
        sided = [pin for pin in members if pin.facts is not None and pin.facts.side and pin.facts.direction == "inout"]
        if not sided:
            continue
        for control in members:
            found = _direction_of(control, facts[reference], rails)
            if found is None:
                continue
            mark, a_to_b = found
            for pin in sided:
                if mark and not _belongs(pin, mark):
                    continue
                assert pin.facts is not None
                reads = (pin.facts.side == "a") == a_to_b
                settled[reference, pin.number] = (
                    replace(pin, drive=None, when="") if reads else replace(pin, receive=None, when="")
                )
    return settled


def pulled_up(elements: Iterable[Element], pins: Mapping[tuple[str, str], PinModel], rails: Rails) -> frozenset[str]:
    """Return the nets with a pull-up: a resistor to a supply, one inside a part, or one behind a small series resistor."""
    pulled = {pin.net for pin in pins.values() if pin.pull_up_ohms and pin.net}
    near: list[tuple[str, str]] = []
    for element in elements:
        if element.kind not in ("resistor", "link") or len(element.nets) != 2:
            continue
        for net, other in (element.nets, element.nets[::-1]):
            if other in rails.by_net and not rails.is_ground(other) and net not in rails.by_net:
                pulled.add(net)
        small = element.kind == "link" or (element.ohms is not None and element.ohms.nominal <= SERIES_OHMS)
        if small and not any(net in rails.by_net for net in element.nets):
            near.append((element.nets[0], element.nets[1]))
    pulled |= {a for a, b in near if b in pulled} | {b for a, b in near if a in pulled}
    return frozenset(pulled)


def settle_open_drains(
    pins: Mapping[tuple[str, str], PinModel], line_rates: Mapping[str, LineRate], pulled: Set[str]
) -> dict[tuple[str, str], PinModel]:
    """Make configurable pins on a bus of open drains open drains: there they only pull low.

    Parameters
    ----------
    pins : mapping
        (reference, number) to PinModel.
    line_rates : mapping from net to LineRate
        Names the buses.
    pulled : set of str
        Nets with a pull-up; without one a bus of open drains has no high, and nothing is settled.

    Returns
    -------
    dict
        All pins.
    """
    settled = dict(pins)
    for key, pin in pins.items():
        line = line_rates.get(pin.net)
        if (
            line is not None
            and line.open_drain
            and pin.net in pulled
            and pin.when
            and pin.drive is not None
            and pin.drive.style == "push-pull"
        ):
            settled[key] = replace(pin, drive=replace(pin.drive, style="open-drain"), when="")
    return settled


def settle_hosts(
    pins: Mapping[tuple[str, str], PinModel], facts: Mapping[str, PartFacts]
) -> dict[tuple[str, str], PinModel]:
    """Let the names MISO and MOSI say what a controller's configurable pin does.

    Parameters
    ----------
    pins : mapping
        (reference, number) to PinModel.
    facts : mapping
        Reference to PartFacts.

    Returns
    -------
    dict
        All pins. Settled are those of memories and of the only controller on a net with another part that drives or reads it and no
        connector: a programmer plugged in there would make the controller the device.
    """
    on_net: dict[str, list[tuple[str, str]]] = defaultdict(list)
    for key, pin in pins.items():
        if pin.net and pin.role in ("signal", "far-end"):
            on_net[pin.net].append(key)
    settled = dict(pins)
    for net, keys in on_net.items():
        name = net.rpartition("/")[2]
        reads, drives = HOST_READS.fullmatch(name), HOST_DRIVES.fullmatch(name)
        hosts = [key for key in keys if key[0] in facts and facts[key[0]].group in HOST_GROUPS]
        others = [pins[key] for key in keys if key not in hosts]
        if not (reads or drives) or len(hosts) != 1 or not others or any(pin.role == "far-end" for pin in others):
            continue
        for key in keys:
            pin = pins[key]
            # Of a memory with several data pins the name says which way this one is used.
            if (
                key[0] in facts
                and facts[key[0]].group == "memory"
                and pin.drive is not None
                and pin.receive is not None
            ):
                settled[key] = replace(pin, drive=None) if drives else replace(pin, when="")
        host = pins[hosts[0]]
        if not host.when or host.drive is None or host.receive is None or host.drive.style != "push-pull":
            continue
        if reads and any(pin.drive is not None for pin in others):
            settled[hosts[0]] = replace(host, drive=None, when="", why=f"the controller reads {name}")
        elif drives and any(pin.receive is not None for pin in others):
            settled[hosts[0]] = replace(host, when="", why=f"the controller drives {name}")
    return settled


def settle_serial_lines(pins: Mapping[tuple[str, str], PinModel]) -> dict[tuple[str, str], PinModel]:
    """Let TXD and RXD among a configurable pin's names say what it does on a net that is called after a serial line.

    Parameters
    ----------
    pins : mapping
        (reference, number) to PinModel.

    Returns
    -------
    dict
        All pins.
    """
    settled = dict(pins)
    for key, pin in pins.items():
        if not pin.when or pin.drive is None or pin.receive is None or pin.drive.style != "push-pull":
            continue
        if not SERIAL_NET.fullmatch(pin.net.rpartition("/")[2]):
            continue
        words = pin_words(pin.name)
        out, into = (any(pattern.fullmatch(word) for word in words) for pattern in (SERIAL_OUT, SERIAL_IN))
        if out and not into:
            settled[key] = replace(pin, when="", why=f"{pin.net} is a serial line, and the pin can be its output")
        elif into and not out:
            settled[key] = replace(
                pin, drive=None, when="", why=f"{pin.net} is a serial line, and the pin can be its input"
            )
    return settled


def _direction_of(pin: PinModel, known: PartFacts, rails: Rails) -> tuple[str, bool] | None:
    """Return (channel mark, direction is A to B) of a direction pin that is tied to a rail, None for any other pin."""
    if pin.net not in rails.by_net:
        return None
    plain = re.sub(r"[~{}]", "", pin.name)
    match = PLAIN_DIRECTION.fullmatch(plain)
    active_high, meaning = True, "a-to-b"
    control = next(
        (
            control
            for control in (known.translator.controls if known.translator is not None else ())
            if control.use == "direction" and re.fullmatch(control.pins, plain, re.IGNORECASE)
        ),
        None,
    )
    if control is not None:
        active_high, meaning = control.active == "H", control.meaning or "a-to-b"
    elif match is None:
        return None
    high = not rails.is_ground(pin.net)
    digits = re.findall(r"\d+", plain)
    return (digits[0] if digits else ""), (high == active_high) == (meaning == "a-to-b")


def _belongs(pin: PinModel, mark: str) -> bool:
    """Tell whether a pin is of the channel or bank that a numbered direction pin steers: ``DIR2`` A2, ``1DIR`` 1A4."""
    plain = re.sub(r"[~{}]", "", pin.name)
    return plain.startswith(mark) or (pin.facts is not None and pin.facts.channel == mark)
