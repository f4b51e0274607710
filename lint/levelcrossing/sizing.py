"""The command ``size``: ways from one supply to another, each solved as a circuit of its own."""

from __future__ import annotations

import argparse
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

from levelcrossing import tradebook
from levelcrossing.errors import CommandError
from levelcrossing.model import Board, Net, Part, Pin, Settings, SolvedCrossing, Spread
from levelcrossing.remedies import divider
from levelcrossing.review import open_case
from levelcrossing.units import format_si, format_volts, parse_capacitance, parse_volts

# What a receiver's own pin adds, with the driver taken as an ordinary CMOS part [F] (as in the review).
PIN_FARADS = 10e-12
DEFAULT_LOAD = "20p"
DEFAULT_TOLERANCE = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """One way to shift: its name, its parts in words, the parts themselves, whether it works both ways."""

    name: str
    made_of: str
    parts: tuple[Part, ...]
    two_way: bool
    into: str = "IN"


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Return the proposals for two supplies, and 0."""
    high, low = _volts(args.from_volts, "--from"), _volts(args.to_volts, "--to")
    load = _number(args.load or DEFAULT_LOAD, "--load", "F")
    rate = _number(args.rate, "--rate", "bit/s") if args.rate else None
    return propose(high, low, load, rate), 0


def _volts(text: str, option: str) -> Spread:
    volts = parse_volts(text, DEFAULT_TOLERANCE)
    if volts is None or not 0.7 <= volts.nominal <= 24:
        raise CommandError(f"{option} cannot be {text!r}", remedy="give a supply between 0.7 and 24 V, such as 3.3")
    return volts


def _number(text: str, option: str, unit: str) -> float:
    scale = {"k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9, "p": 1e-12, "n": 1e-9, "f": 1e-15}
    value: float | None
    try:
        value = float(text[:-1]) * scale[text[-1]] if text[-1] in scale else float(text)
    except (ValueError, IndexError):
        value = parse_capacitance(text) if unit == "F" else None
    if value is None or not value > 0:
        raise CommandError(f"{option} cannot be {text!r}", remedy="write 15p" if unit == "F" else "write 400k or 8M")
    return value


def propose(source: Spread, target: Spread, load_farads: float, needed_bit_s: float | None) -> str:
    """Return the text of all proposals.

    Parameters
    ----------
    source, target : Spread
        Supplies of driver and receiver [V].
    load_farads : float
        At the receiver [F].
    needed_bit_s : float or None
        Bit rate to reach [bit/s].

    Returns
    -------
    str
    """
    head = (
        f"From {format_volts(source.nominal)} to {format_volts(target.nominal)} into {format_si(load_farads, 'F', 2)}"
    )
    head += f" at {format_si(needed_bit_s, 'bit/s', 2)}" if needed_bit_s else ""
    lines = [head + ", driver and receiver ordinary CMOS parts, supplies over their tolerance, resistors 1 %."]
    book = tradebook.load()
    for candidate in candidates(source, target):
        solved = solve(candidate, source, target, load_farads, book)
        lines.append("")
        lines += _described(candidate, solved, needed_bit_s)
    lines += [
        "",
        "Values hold for the models' parameters. A buffer's own delay (some nanoseconds) is not in them; delays of saturating",
        "transistors may be off several times.",
    ]
    return "\n".join(lines) + "\n"


def candidates(source: Spread, target: Spread) -> list[Candidate]:
    """Return the ways that come into question between two supplies."""
    found: list[Candidate] = []
    down = source.nominal > target.nominal * 1.04
    lower, upper = ("VTO", "VFROM") if down else ("VFROM", "VTO")
    near, far = ("OUT", "IN") if down else ("IN", "OUT")
    if down:
        values = divider(source, max(0.7 * target.low, 0.7 * target.high), target.low + 0.3)
        if values is not None:
            top, bottom, _ = values
            found.append(
                Candidate(
                    name="resistor divider",
                    made_of=f"{format_si(top, 'Ω')} in series, {format_si(bottom, 'Ω')} to ground",
                    parts=(_resistor("R1", top, "IN", "OUT"), _resistor("R2", bottom, "OUT", "GND")),
                    two_way=False,
                )
            )
        if 1.65 <= target.nominal <= 3.6 and source.high <= 5.5:
            found.append(_buffer("tolerant buffer", "74LVC1G17", "74LVC1G17 on the lower supply", "VTO"))
    elif 4.5 <= target.nominal <= 5.5 and source.low >= 2.0:
        found.append(_buffer("TTL-level buffer", "74AHCT1G125", "74AHCT1G125 on the upper supply", "VTO"))
    for ohms in (4_700.0, 1_000.0):
        pulls = (_resistor("R1", ohms, lower, near), _resistor("R2", ohms, upper, far))
        fet = _three("Q1", "BSS138", ("1", "G", lower), ("2", "S", near), ("3", "D", far))
        made_of = f"BSS138, gate and source on the lower side, {format_si(ohms, 'Ω')} on each side"
        found.append(Candidate(name="MOSFET pair", made_of=made_of, parts=(fet, *pulls), two_way=True))
    npn = _three("Q1", "MMBT3904", ("1", "B", "BASE"), ("2", "E", near), ("3", "C", far))
    cell = (
        npn,
        _resistor("R1", 10e3, lower, near),
        _resistor("R2", 10e3, upper, far),
        _resistor("R3", 1e3, lower, "BASE"),
    )
    made_of = "MMBT3904, base through 1 kΩ to the lower supply, 10 kΩ on each side"
    found.append(Candidate(name="bipolar cell", made_of=made_of, parts=cell, two_way=True))
    if 1.65 <= source.nominal <= 5.5 and 1.65 <= target.nominal <= 5.5:
        found.append(_translator())
    return found


def solve(
    candidate: Candidate, source: Spread, target: Spread, load_farads: float, book: tradebook.Tradebook
) -> SolvedCrossing | None:
    """Solve a candidate between two ordinary CMOS parts; None when it makes no crossing.

    The driver is push-pull; the load counts at the receiver's net, its pin included.
    """
    driver = _part(
        "U1", "driver", ("1", "VDD", "power_in", "VFROM"), ("2", "GND", "power_in", "GND"), ("3", "Q", "output", "IN")
    )
    receiver = _part(
        "U2", "receiver", ("1", "VDD", "power_in", "VTO"), ("2", "GND", "power_in", "GND"), ("3", "DIN", "input", "OUT")
    )
    parts = (driver, receiver, *candidate.parts)
    pins: dict[str, list[tuple[str, str]]] = {}
    for part in parts:
        for pin in part.pins:
            pins.setdefault(pin.net, []).append((part.reference, pin.number))
    nets = tuple(Net(name=net, pins=tuple(sorted(members))) for net, members in sorted(pins.items()))
    board = Board(path="", form="netlist", parts=parts, nets=nets)
    settings = Settings(rails={"VFROM": source, "VTO": target}, stray_farads=max(load_farads - PIN_FARADS, 1e-15))
    case = open_case(board, settings, book)
    ends = [one for one in case.crossings if one.crossing.driver is not None]
    through = [
        one
        for one in ends
        if one.crossing.driver and one.crossing.driver.part == "U1" and one.crossing.receiver.part == "U2"
    ]
    best = through or ends
    return best[0] if best else None


def _described(candidate: Candidate, solved: SolvedCrossing | None, needed_bit_s: float | None) -> list[str]:
    lines = [
        f"{candidate.name}: {candidate.made_of}; {'both ways' if candidate.two_way else 'one way'}, {len(candidate.parts)} part{'s' * (len(candidate.parts) > 1)}"
    ]
    if solved is None or solved.high is None or solved.low is None:
        return [*lines, "  not solved" + (f": {solved.why}" if solved is not None and solved.why else "")]
    levels = f"high {format_volts(solved.high.low)} to {format_volts(solved.high.high)}, low {format_volts(solved.low.low)} to {format_volts(solved.low.high)}"
    at_buffer = " at its input" if solved.crossing.receiver.part == "U3" else ""
    lines.append(f"  levels    {levels}{at_buffer}")
    sunk = max((abs(state.driver_amps.high) for state in solved.states.values()), default=0.0)
    drawn = max((abs(state.driver_amps.low) for state in solved.states.values()), default=0.0)
    lines.append(f"  current   {format_si(max(sunk, drawn), 'A', 2)} at most through the driver")
    complaints = _complaints(solved)
    if solved.speed is not None:
        speed = solved.speed
        lines.append(
            f"  speed     {format_si(speed.usable_bit_s, 'bit/s', 2)} guaranteed, {format_si(speed.nominal_bit_s, 'bit/s', 2)} usual, limited by {speed.limit}"
        )
        if needed_bit_s is not None and speed.usable_bit_s < needed_bit_s:
            complaints.append("too slow")
    lines.append(f"  suited    {'no: ' + ', '.join(complaints) if complaints else 'yes'}")
    return [textwrap.fill(line, 100, subsequent_indent=" " * 12) for line in lines]


def _complaints(solved: SolvedCrossing) -> list[str]:
    found: list[str] = []
    for state in solved.states.values():
        for margin, words in (
            (state.high_margin, "high not reached"),
            (state.low_margin, "low not reached"),
            (state.rating_margin, "input over its rating"),
        ):
            if (
                margin is not None
                and margin.spread.low < 0
                and not (words.startswith("input") and state.clamp_amps.high < 10e-6)
            ):
                found.append(words + ("" if margin.spread.nominal < 0 else " at a corner"))
    return list(dict.fromkeys(found))


def _part(reference: str, value: str, *pins: tuple[str, str, str, str], symbol: str = "part") -> Part:
    made = tuple(Pin(part=reference, number=number, name=name, kind=kind, net=net) for number, name, kind, net in pins)
    return Part(reference=reference, value=value, library="Size", symbol=symbol, pins=made)


def _resistor(reference: str, ohms: float, a: str, b: str) -> Part:
    made = tuple(
        Pin(part=reference, number=str(number), name="", kind="passive", net=net) for number, net in ((1, a), (2, b))
    )
    return Part(reference=reference, value=f"{ohms:g}R", library="Device", symbol="R", pins=made)


def _three(reference: str, value: str, *pins: tuple[str, str, str]) -> Part:
    return _part(reference, value, *((number, name, "passive", net) for number, name, net in pins), symbol=value)


def _buffer(name: str, value: str, made_of: str, rail: str) -> Candidate:
    enable: Sequence[tuple[str, str, str, str]] = (("1", "", "input", "GND"),) if "125" in value else ()
    pins = (
        ("5", "VCC", "power_in", rail),
        ("3", "GND", "power_in", "GND"),
        *enable,
        ("2", "", "input", "IN"),
        ("4", "", "output", "OUT"),
    )
    return Candidate(name=name, made_of=made_of, parts=(_part("U3", value, *pins),), two_way=False)


def _translator() -> Candidate:
    pins = (
        ("1", "VCCA", "power_in", "VFROM"), ("6", "VCCB", "power_in", "VTO"), ("2", "GND", "power_in", "GND"),
        ("5", "DIR", "input", "VFROM"), ("3", "A", "bidirectional", "IN"), ("4", "B", "bidirectional", "OUT"),
    )  # fmt: skip
    return Candidate(
        name="dual-supply translator",
        made_of="SN74LVC1T45, direction tied A to B",
        parts=(_part("U3", "SN74LVC1T45", *pins),),
        two_way=False,
    )
