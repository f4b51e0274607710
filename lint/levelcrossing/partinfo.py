"""The command ``part``: what the trade library knows of a part number, and from where."""

from __future__ import annotations

import argparse
import difflib
import textwrap
from pathlib import Path

from levelcrossing import tradebook
from levelcrossing.model import (
    BipolarFacts,
    DiodeFacts,
    Level,
    MosfetFacts,
    Part,
    PartFacts,
    Pin,
    PinFacts,
    RegulatorFacts,
)
from levelcrossing.units import format_si, format_volts

SUPPLIES = (1.8, 3.3, 5.0)
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
    return f"The library knows nothing of {args.name}.{hint}\n{_assumed()}\n\n{house_row(args.name)}", 1


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
        lines += _part(known)
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


def _source(row: str, source: str, certainty: str, file: str, line: int) -> list[str]:
    where = f"{Path(file).name}:{line}" if file else ""
    return [
        f"  from      {source} ({_SURE.get(certainty, certainty)})",
        f"  row       {row}" + (f", {where}" if where else ""),
    ]


def _part(known: PartFacts) -> list[str]:
    lines = [f"{known.title}  ({known.group})"]
    provenance = known.provenance
    lines += _source(provenance.row, provenance.source, provenance.certainty, provenance.file, provenance.line)
    if known.doubtful:
        lines.append(f"  doubtful  {known.doubtful}")
    for supply in known.supplies:
        if supply.low_volts is not None and supply.high_volts is not None:
            lines.append(
                f"  supply    {supply.pins}: {format_volts(supply.low_volts)} to {format_volts(supply.high_volts)} ({supply.role})"
            )
    pins = {name: known.pin(_pin(name)) for name in ("A1", "1A", "IO")}
    facts = next((pin for pin in pins.values() if pin.vih is not None or pin.vmax is not None), None)
    if facts is not None:
        lines += _levels(facts)
    if known.translator is not None:
        translator = known.translator
        lines.append(
            f"  kind      {translator.kind}, direction {translator.direction}, supplies in order {translator.order}"
        )
        for note in translator.notes:
            lines.append(f"  note      {note}")
    if known.note and (known.translator is None or not known.translator.notes):
        lines.append(f"  note      {known.note}")
    lines.append(f"  assumed   {_assumed()}")
    return lines


def _levels(facts: PinFacts) -> list[str]:
    def at(level: Level | None) -> str:
        if level is None:
            return "not known"
        return f"{level.text}   " + ", ".join(f"{format_volts(level.at(volts))} at {volts:g} V" for volts in SUPPLIES)

    lines = [
        f"  reads     high from {at(facts.vih)}",
        f"            low up to {at(facts.vil)}",
        f"  bears     {at(facts.vmax)}",
    ]
    if facts.vmax_off is not None:
        lines.append(f"            unpowered {format_volts(facts.vmax_off.at(0.0))}")
    if facts.injection_amps is not None:
        lines.append(f"            clamp current {format_si(facts.injection_amps, 'A')}")
    for point in facts.outputs:
        if point.voh is not None and point.ioh_amps > 0:
            lines.append(
                f"  drives    at {point.supply_volts:g} V: {format_volts(point.voh.at(point.supply_volts))} or more at {format_si(point.ioh_amps, 'A')}"
            )
        if point.vol is not None and point.iol_amps > 0:
            lines.append(
                f"            at {point.supply_volts:g} V: {format_volts(point.vol.at(point.supply_volts))} or less at {format_si(point.iol_amps, 'A')}"
            )
    return lines


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
    return lines + _source(provenance.row, provenance.source, provenance.certainty, provenance.file, provenance.line)


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
    return lines + _source(provenance.row, provenance.source, provenance.certainty, provenance.file, provenance.line)


def _assumed() -> str:
    return (
        "what no row says is taken as ordinary CMOS: inputs at 0.7 and 0.3 of the supply, rated 0.3 V beyond it, 10 pF"
    )


def nearest(book: tradebook.Tradebook, number: str) -> list[str]:
    """Return up to four example numbers of rows that look like this one."""
    known = sorted({str(example) for row in book.rows for example in (row.get("examples") or ())})
    folded = {example.upper(): example for example in known}
    return [folded[match] for match in difflib.get_close_matches(number.upper(), list(folded), n=4, cutoff=0.6)]


def house_row(number: str) -> str:
    """Return a row of trade data to fill in, for a file given with ``--facts``."""
    return (
        "To teach it, fill in and pass the file with --facts:\n\n"
        "[[part]]\n"
        f'id = "{number}"\nmatch = [\'{number}\']\nexamples = ["{number}"]\ngroup = "other"\n'
        "supplies = [ { pins = 'VDD|VCC', volts = [3.0, 3.6], role = \"io\" } ]\nio_supply = 'VDD|VCC'\n"
        'vih_volts = "0.7*V"\nvil_volts = "0.3*V"\ninput_max_volts = "V+0.3"\n'
        'source = "not looked up yet: name the data sheet and its table"\n'
        'certainty = "practice"   # datasheet, once the figures above come from one\n'
    )
