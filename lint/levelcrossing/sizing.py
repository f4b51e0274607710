"""The command ``size``: ways from one supply to another, each solved as a circuit of its own."""

from __future__ import annotations

import argparse
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

from levelcrossing import tradebook
from levelcrossing.errors import CommandError
from levelcrossing.model import SolvedCrossing, Spread
from levelcrossing.sizing_cells import Candidate, Task, candidates, solve
from levelcrossing.units import format_si, format_volts, parse_capacitance, parse_volts

DEFAULT_LOAD = "20p"
DEFAULT_TOLERANCE = 0.05
WIDTH = 100
# Beyond this rate the driver's own edge and the line decide, not the circuit [bit/s].
FASTEST_STATED = 100e6


@dataclass(frozen=True, slots=True, kw_only=True)
class Proposal:
    """A candidate with its solutions (there, and back when it must work both ways) and what speaks against it."""

    candidate: Candidate
    solutions: tuple[SolvedCrossing | None, ...]
    complaints: tuple[str, ...]


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Return the proposals for two supplies, and 0."""
    task = Task(
        source=_volts(args.from_volts, "--from"),
        target=_volts(args.to_volts, "--to"),
        load_farads=_number(args.load or DEFAULT_LOAD, "--load", "F"),
        needed_bit_s=_number(args.rate, "--rate", "bit/s") if args.rate else None,
        sink_amps=_number(args.sink, "--sink", "A") if args.sink else None,
        two_way=args.two_way,
        open_drain=args.open_drain,
        series=args.series,
    )
    return propose(task), 0


def _volts(text: str, option: str) -> Spread:
    volts = parse_volts(text, DEFAULT_TOLERANCE)
    if volts is None or not 0.7 <= volts.nominal <= 24:
        raise CommandError(f"{option} cannot be {text!r}", remedy="give a supply between 0.7 and 24 V, such as 3.3")
    return volts


_EXAMPLES = {"F": "write 15p", "bit/s": "write 400k or 8M", "A": "write 3m"}


def _number(text: str, option: str, unit: str) -> float:
    scale = {"k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "p": 1e-12, "n": 1e-9, "f": 1e-15}
    plain = text.removesuffix(unit) if unit == "A" else text
    value: float | None
    try:
        value = float(plain[:-1]) * scale[plain[-1]] if plain[-1] in scale else float(plain)
    except (ValueError, IndexError):
        value = parse_capacitance(text) if unit == "F" else None
    if value is None or not value > 0:
        raise CommandError(f"{option} cannot be {text!r}", remedy=_EXAMPLES[unit])
    return value


def propose(task: Task) -> str:
    """Return the text of all proposals, suited ones first.

    Parameters
    ----------
    task : Task

    Returns
    -------
    str
    """
    book = tradebook.load()
    families = [_best(family, task, book) for family in candidates(task, book)]
    found = sorted(families, key=lambda one: (bool(one.complaints), len(one.candidate.parts)))
    lines = textwrap.wrap(_head(task), WIDTH)
    for one in found:
        lines.append("")
        lines += _described(one)
    lines += [
        "",
        "Values hold for the models' parameters. A buffer's own delay (some nanoseconds) is not in them; the rate of a",
        "MOSFET may be off twice and that of a saturating transistor several times, with its maker.",
    ]
    return "\n".join(lines) + "\n"


def _head(task: Task) -> str:
    text = f"From {format_volts(task.source.nominal)} to {format_volts(task.target.nominal)}"
    text += " and back" if task.two_way else ""
    text += f" into {format_si(task.load_farads, 'F', 2)}"
    text += f" at {format_si(task.needed_bit_s, 'bit/s', 2)}" if task.needed_bit_s else ""
    text += f", no driver sinking more than {format_si(task.sink_amps, 'A', 2)}" if task.sink_amps else ""
    ends = "drivers are open drains, receivers" if task.open_drain else "drivers and receivers are"
    return f"{text}: {ends} ordinary CMOS parts, supplies over their tolerance, resistors 1 %."


def _best(family: Sequence[Candidate], task: Task, book: tradebook.Tradebook) -> Proposal:
    """Return the first of a family that nothing speaks against; else, of those with the fewest faults, the fastest."""
    tried: list[tuple[int, float, Proposal]] = []
    for candidate in family:
        solutions = [solve(candidate, task, book, back=back) for back in ((False, True) if task.two_way else (False,))]
        complaints = list(dict.fromkeys(text for one in solutions for text in _complaints(one, task)))
        rates = [rate for one in solutions if one is not None and (rate := _rate(candidate, one)) is not None]
        slowest = min(rates, default=0.0)
        if task.needed_bit_s is not None and rates and slowest < task.needed_bit_s:
            complaints.append("too slow")
        proposal = Proposal(candidate=candidate, solutions=tuple(solutions), complaints=tuple(complaints))
        if not complaints:
            return proposal
        tried.append((len(complaints), -slowest, proposal))
    return min(tried, key=lambda one: one[:2])[2]


def _described(one: Proposal) -> list[str]:
    candidate = one.candidate
    ways = "both ways" if candidate.two_way else "one way"
    count = len(candidate.parts)
    lines = [f"{candidate.name}: {candidate.made_of}; {ways}, {count} part{'s' * (count > 1)}"]
    for number, solved in enumerate(one.solutions):
        way = "" if len(one.solutions) == 1 else "back: " if number else "there: "
        if solved is None or solved.high is None or solved.low is None:
            lines.append(f"  solved    {way}no" + (f", {solved.why}" if solved is not None and solved.why else ""))
            continue
        at_buffer = " at its input" if solved.crossing.receiver.part == "U3" else ""
        lines.append(
            f"  levels    {way}high {format_volts(solved.high.low)} to {format_volts(solved.high.high)}, "
            f"low {format_volts(solved.low.low)} to {format_volts(solved.low.high)}{at_buffer}"
        )
        amps = _current(solved)
        shown = format_si(amps, "A", 2) + " at most" if amps >= 1e-6 else "under 1 µA"
        lines.append(f"  current   {way}{shown} through the driver")
        speed = _speed(candidate, solved)
        lines += [f"  speed     {way}{speed}"] if speed else []
    lines.append(f"  suited    {'no: ' + ', '.join(one.complaints) if one.complaints else 'yes'}")
    lines += [f"  mind      {text}" for text in candidate.remarks]
    return [part for line in lines for part in textwrap.wrap(line, WIDTH, subsequent_indent=" " * 12)]


def _current(solved: SolvedCrossing) -> float:
    return max(
        (max(abs(state.driver_amps.high), abs(state.driver_amps.low)) for state in solved.states.values()), default=0.0
    )


def _rate(candidate: Candidate, solved: SolvedCrossing) -> float | None:
    """Return the guaranteed bit rate [bit/s]: solved, or the maker's where edge accelerators decide."""
    if candidate.by_maker:
        return candidate.stated_bit_s
    return None if solved.speed is None else solved.speed.usable_bit_s


def _speed(candidate: Candidate, solved: SolvedCrossing) -> str:
    if candidate.by_maker:
        stated = candidate.stated_bit_s
        return "" if stated is None else f"{format_si(stated, 'bit/s', 2)} by its data sheet"
    if solved.speed is None:
        return ""
    speed = solved.speed
    if speed.usable_bit_s > FASTEST_STATED:
        return f"more than {format_si(FASTEST_STATED, 'bit/s', 2)} at its pins"
    more = f" ({format_si(speed.loaded_bit_s, 'bit/s', 2)} with 10 pF more)" if speed.loaded_bit_s is not None else ""
    return (
        f"{format_si(speed.usable_bit_s, 'bit/s', 2)} guaranteed{more}, {format_si(speed.nominal_bit_s, 'bit/s', 2)} "
        f"usual, limited by {speed.limit}"
    )


def _complaints(solved: SolvedCrossing | None, task: Task) -> list[str]:
    if solved is None or solved.high is None or solved.low is None:
        return ["not solved"]
    found: list[str] = []
    for state in solved.states.values():
        for margin, words in (
            (state.high_margin, "high not reached"),
            (state.low_margin, "low not reached"),
            (state.rating_margin, "input over its rating"),
        ):
            held = words.startswith("input") and state.clamp_amps.high < 10e-6
            if margin is not None and margin.spread.low < 0 and not held:
                found.append(words + ("" if margin.spread.nominal < 0 else " at a corner"))
    if task.sink_amps is not None and "low" in solved.states:
        sunk = abs(solved.states["low"].driver_amps.high)
        if sunk > task.sink_amps * (1 + 1e-9):
            found.append(f"its driver sinks {format_si(sunk, 'A', 2)}")
    return list(dict.fromkeys(found))
