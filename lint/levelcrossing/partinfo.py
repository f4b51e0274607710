"""The command ``part``: what the trade library knows of a part number, and from where."""

from __future__ import annotations

import argparse
import difflib
import re
import textwrap
from pathlib import Path

from levelcrossing import tradebook
from levelcrossing.houserows import house_row
from levelcrossing.model import (
    BipolarFacts,
    DiodeFacts,
    Level,
    MosfetFacts,
    Part,
    PartFacts,
    Pin,
    PinFacts,
    Provenance,
    RatePoint,
    RegulatorFacts,
)
from levelcrossing.trade_logic import Functions
from levelcrossing.trade_match import normal
from levelcrossing.trade_rows import Row
from levelcrossing.units import format_si, format_volts

SUPPLIES = (1.2, 1.8, 2.5, 3.3, 5.0, 12.0)
# Names of pins that rows without names of their own answer to; of two-sided parts, one of each side.
_TRIED = ("A1", "1A", "IO", "B1", "SDA1", "SDA2")
_TOLERANT = {
    "always": "powered or not",
    "powered": "while its supply is up",
    "never": "with a diode to its supply",
}
_SURE = {
    "datasheet": "seen in the data sheet",
    "secondary": "second hand",
    "memory": "from memory",
    "practice": "common practice",
}


def run(args: argparse.Namespace) -> tuple[str, int]:
    """Return what is known of a part, and 0; or the nearest known numbers and 1."""
    book = tradebook.load(extra=tuple(Path(file) for file in args.facts or ()))
    lines = describe(book, args.name)
    if lines:
        return "\n".join(textwrap.fill(line, 100, subsequent_indent=" " * 12) for line in lines) + "\n", 0
    near = nearest(book, args.name)
    hint = f" Nearest: {', '.join(near)}." if near else ""
    return (
        f"The library knows nothing of {args.name}.{hint}\n{_assumed()}\n\nTo teach it, fill in and pass the file with --facts:\n\n{house_row(args.name)}",
        1,
    )


def describe(book: tradebook.Tradebook, number: str) -> list[str]:
    """Return the lines on a part number; empty when no row matches.

    Parameters
    ----------
    book : Tradebook
    number : str
        Value of a part.

    Returns
    -------
    list of str
    """
    # A part with pins of both kinds of name, so that neither transistors nor gates are ruled out by a missing pin.
    part = Part(reference="U1", value=number, pins=tuple(_pin(name) for name in ("A1", "B1", "1A", "1Y", "VCC", "GND")))
    lines: list[str] = []
    known = book.part(part)
    if known is not None:
        lines += _part(known, _row_of(book, known))
        if known.group == "logic" and not _function_known(book, number):
            lines.insert(
                1, "  number    no function of this number is known: the family's figures, directions from the symbol"
            )
    for reference, symbol, pins in (("Q1", "", ("G", "S", "D")), ("Q1", "", ("B", "C", "E")), ("D1", "", ("A", "K"))):
        device = Part(reference=reference, value=number, symbol=symbol, pins=tuple(_pin(name) for name in pins))
        for facts in (book.mosfet(device), book.bipolar(device), book.diode(device)):
            if facts is not None and not facts.generic and known is None:
                lines += _device(facts)
        if lines:
            break
    regulator = book.regulator(
        Part(
            reference="U1",
            value=number,
            library="Regulator_Linear",
            symbol=number,
            pins=tuple(_pin(name) for name in ("VI", "VO", "GND")),
        )
    )
    if regulator is not None and not lines:
        lines += _regulator(regulator)
    return lines


def _pin(name: str) -> Pin:
    return Pin(part="U1", number=name, name=name, kind="", net="")


def _source(provenance: Provenance) -> list[str]:
    where = f"{Path(provenance.file).name}:{provenance.line}" if provenance.file else ""
    sure = [_SURE.get(provenance.certainty, provenance.certainty)]
    sure += [
        f"{group.replace('_', ' ')} {_SURE.get(certainty, certainty)}"
        for group, certainty in provenance.groups
        if certainty != provenance.certainty
    ]
    return [
        f"  from      {provenance.source} ({'; '.join(sure)})",
        f"  row       {provenance.row}" + (f", {where}" if where else ""),
    ]


def _row_of(book: tradebook.Tradebook, known: PartFacts) -> Row | None:
    """Return the row behind what is known, for what only the row itself tells."""
    where = (known.provenance.row, known.provenance.line)
    return next((row for row in book.rows if (row.id, row.line) == where), None)


def _function_known(book: tradebook.Tradebook, number: str) -> bool:
    return Functions(book.table("function")).of(normal(number)) is not None


def _part(known: PartFacts, row: Row | None) -> list[str]:
    lines = [f"{known.title}  ({known.group})"]
    provenance = known.provenance
    lines += _source(provenance)
    if row is not None and row.get("checked"):
        lines.append(f"  checked   {row.get('checked')}")
    if known.doubtful:
        lines.append(f"  doubtful  {known.doubtful}")
    for supply in known.supplies:
        if supply.low_volts is not None and supply.high_volts is not None:
            lines.append(
                f"  supply    {_names(supply.pins)}: {format_volts(supply.low_volts)} to {format_volts(supply.high_volts)} ({supply.role})"
            )
    described: list[PinFacts] = []
    sides = {known.pin(_pin(name)).supply for name in _TRIED if known.pin(_pin(name)).side}
    for name in _TRIED:
        facts = known.pin(_pin(name))
        if (facts.vih is None and facts.vmax is None) or any(_alike(facts, other) for other in described):
            continue
        described.append(facts)
        lines += _levels(facts, known, f"side {facts.side.upper()}" if facts.side and len(sides) > 1 else "")
    lines += _exceptions(row)
    if known.translator is not None:
        translator = known.translator
        single = translator.kind == "single"
        if not single:
            lines.append(
                f"  kind      {translator.kind}, direction {translator.direction}, supplies in order {translator.order}"
            )
        for point in translator.rates:
            lines.append(f"  rate      {_rate(point, single=single)}")
        for note in translator.notes:
            lines.append(f"  note      {note}")
    if known.note and (known.translator is None or not known.translator.notes):
        lines.append(f"  note      {known.note}")
    lines.append(f"  assumed   {_assumed()}")
    return lines


def _alike(one: PinFacts, other: PinFacts) -> bool:
    """Tell whether two pins have the same figures: one description does for both."""
    keys = ("vih", "vil", "vmax", "vmax_off", "outputs", "supply")
    return all(getattr(one, key) == getattr(other, key) for key in keys)


def _names(pattern: str) -> str:
    """Return a pattern of pin names as people write a list; # stands for a digit, … for more of the name."""
    text = re.sub(r"\(\?![^)]*\)", "", pattern)
    text = re.sub(r"\\d[?+*]?", "#", text).replace(".*", "…").replace("\\w*", "…").replace("\\", "").replace("?", "")
    text = text[1:-1] if text.startswith("(") and text.endswith(")") and text.count("(") == 1 else text
    return ", ".join(dict.fromkeys(text.split("|"))) if "(" not in text else text.replace("|", ", ")


def _rate(point: RatePoint, *, single: bool) -> str:
    text = format_si(point.bits_per_second, "bit/s", 3)
    ends = (("A", point.a_volts), ("supply" if single else "B", point.b_volts))
    supplies = [f"{side} from {format_volts(volts)} up" for side, volts in ends if volts]
    text += f" ({', '.join(supplies)})" if supplies else ""
    return text + (", with open drains" if point.open_drain else "")


def _exceptions(row: Row | None) -> list[str]:
    """Return what the row says of single pins, first match first."""
    lines = []
    for item in (row.get("pins", ()) if row is not None else ()) or ():
        words = [str(item["direction"])] if "direction" in item else []
        if "supply" in item:
            words.append(f"on {_names(item['supply'])}")
        if "vih_volts" in item:
            words.append(f"high from {item['vih_volts']}")
        if "vil_volts" in item:
            words.append(f"low up to {item['vil_volts']}")
        if "input_max_volts" in item:
            words.append(f"bears {item['input_max_volts']}")
        if "tolerant" in item:
            words.append(_TOLERANT.get(item["tolerant"], item["tolerant"]))
        if "pull_up_ohms" in item:
            words.append(f"pulled up with {format_si(float(item['pull_up_ohms']), 'Ω')}")
        only = f" of {item['parts']}" if "parts" in item else ""
        if words:
            lines.append(f"  pins      {_names(item['names'])}{only}: {', '.join(words)}")
    return lines


def _levels(facts: PinFacts, known: PartFacts, side: str) -> list[str]:
    supplies = _supplies(facts, known)

    def at(level: Level | None) -> str:
        if level is None:
            return "not known"
        if "V" not in level.text and "(" not in level.text:
            return format_volts(level.at(supplies[0]))
        return f"{level.text}   " + ", ".join(f"{format_volts(level.at(volts))} at {volts:g} V" for volts in supplies)

    lines = [f"  {side}"] if side else []
    if facts.vih is not None or facts.vil is not None:
        lines += [f"  reads     high from {at(facts.vih)}", f"            low up to {at(facts.vil)}"]
    lines.append(f"  bears     {at(facts.vmax)}")
    if facts.vmax_off is not None:
        lines.append(f"            unpowered {format_volts(facts.vmax_off.at(0.0))}")
    if facts.injection_amps is not None:
        lines.append(f"            clamp current {format_si(facts.injection_amps, 'A')}")
    for point in facts.outputs:
        words = []
        if point.voh is not None and point.ioh_amps > 0:
            words.append(
                f"{format_volts(point.voh.at(point.supply_volts))} or more at {format_si(point.ioh_amps, 'A')}"
            )
        if point.vol is not None and point.iol_amps > 0:
            words.append(
                f"{format_volts(point.vol.at(point.supply_volts))} or less at {format_si(point.iol_amps, 'A')}"
            )
        if words:
            lines.append(f"  drives    at {point.supply_volts:g} V: {', '.join(words)}")
    return lines


def _supplies(facts: PinFacts, known: PartFacts) -> tuple[float, ...]:
    """Return the usual supplies that lie within the part's own range for these pins [V]."""
    named = [one for one in known.supplies if one.low_volts is not None and one.high_volts is not None]
    own = [one for one in named if facts.supply and one.pins == facts.supply] or [
        one for one in named if one.role == "io"
    ]
    ranges = [(one.low_volts or 0.0, one.high_volts or 0.0) for one in own or named]
    within = tuple(volts for volts in SUPPLIES if any(low <= volts <= high for low, high in ranges))
    return within or (tuple((low + high) / 2 for low, high in ranges[:1]) if ranges else (1.8, 3.3, 5.0))


def _device(facts: MosfetFacts | BipolarFacts | DiodeFacts) -> list[str]:
    provenance = facts.provenance
    lines: list[str]
    if isinstance(facts, MosfetFacts):
        threshold = facts.threshold_volts
        lines = [
            f"{provenance.row}  ({facts.polarity.upper()}-channel MOSFET)",
            f"  threshold {format_volts(threshold.low)} to {format_volts(threshold.high)}, usually {format_volts(threshold.nominal)}",
            f"  bears     VGS {format_volts(facts.vgs_max_volts)}, VDS {format_volts(facts.vds_max_volts)}",
            f"  has       {format_si(facts.ciss_farads, 'F')} at the gate, {format_si(facts.coss_farads, 'F')} at the drain",
        ]
    elif isinstance(facts, BipolarFacts):
        lines = [
            f"{provenance.row}  ({facts.polarity.upper()} transistor)",
            f"  gain      {facts.beta_forward.low:g} to {facts.beta_forward.high:g}; in reverse {facts.beta_reverse.low:g} to {facts.beta_reverse.high:g}",
            f"  bears     VEB {format_volts(facts.vebo_volts)}, VCE {format_volts(facts.vceo_volts)}",
        ]
    else:
        points = ", ".join(
            f"{format_volts(typical or greatest)} at {format_si(amps, 'A')}"
            for amps, typical, greatest in facts.forward
        )
        lines = [f"{provenance.row}  ({facts.kind} diode)", f"  drop      {points or 'of its kind'}"]
        if facts.zener_volts is not None:
            lines.append(
                f"  breaks    at {format_volts(facts.zener_volts.low)} to {format_volts(facts.zener_volts.high)} at {format_si(facts.zener_amps, 'A')}"
            )
    return lines + _source(provenance)


def _regulator(facts: RegulatorFacts) -> list[str]:
    provenance = facts.provenance
    lines = [f"{provenance.row}  (voltage regulator)"]
    if facts.output is not None:
        lines.append(
            f"  makes     {format_volts(facts.output.nominal)} ({format_volts(facts.output.low)} to {format_volts(facts.output.high)})"
        )
    if facts.reference is not None:
        lines.append(
            f"  reference {format_volts(facts.reference.nominal, 3)} at its feedback pin, formula {facts.formula}"
        )
    if facts.input_max_volts is not None:
        lines.append(f"  bears     {format_volts(facts.input_max_volts)} at its input")
    if facts.dropout_volts is not None:
        lines.append(f"  dropout   {format_volts(facts.dropout_volts)} at full load")
    return lines + _source(provenance)


def _assumed() -> str:
    return (
        "what no row says is taken as ordinary CMOS: inputs at 0.7 and 0.3 of the supply, rated 0.3 V beyond it, 10 pF"
    )


def nearest(book: tradebook.Tradebook, number: str) -> list[str]:
    """Return up to four example numbers of rows that look like this one."""
    known = sorted({str(example) for row in book.rows for example in (row.get("examples") or ())})
    folded = {example.upper(): example for example in known}
    return [folded[match] for match in difflib.get_close_matches(number.upper(), list(folded), n=4, cutoff=0.6)]
