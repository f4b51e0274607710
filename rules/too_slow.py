"""A crossing is too slow for what it must carry.

Why: edges through kilohms and picofarads take their time; a bit that is over before the level is reached never arrives.

What to do: smaller resistors, a stronger pull-up, less capacitance, or another shifter (a buffer or a translator).

Speaks when the rate that the settings ask for, or the least rate of the bus, exceeds what the solved circuit is good for:
malfunction at the usual values, marginal when only the slow corner fails; when the 30-70 % rise of an I2C line exceeds the
limit of its mode; when a translator is rated for less; and, as unknown, when the bus usually runs faster than the circuit
is good for and nothing states its rate.

Stays quiet when nothing tells a rate, when the slow corner still carries the usual one, and when a corner does not reach
its level however long it takes (high-not-reached and low-not-reached speak of that).
"""

from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, LineRate, Outcome, PinModel, SolvedCrossing, TranslatorFacts
from levelcrossing.units import format_si, format_volts

NAME = "too-slow"
OUTCOME = Outcome.MALFUNCTION
SOURCES = (
    "UM10204 table 11 (rise times, rates)",
    "the rate that the settings state",
    "usual and least rates of other buses: common practice, standards, data sheets",
    "data rates in the translator's data sheet",
)
NEARLY = 1e-9
# 30 to 70 % of an RC rise takes ln(7/3) RC (UM10204 section 7.1 writes 0.8473).
LN_7_3 = 0.8473


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per crossing, and per translator, that cannot carry its rate."""
    for index, solved in enumerate(case.crossings):
        speed = solved.speed
        if speed is None or speed.line is None:
            continue
        if speed.usable_bit_s <= 0 and speed.nominal_bit_s >= (speed.line.needed_bit_s or 0.0):
            # A corner never reaches its level at all: that is not a matter of speed, and said elsewhere.
            continue
        found = _rise(index, solved, speed.line) or _rate(index, solved, speed.line)
        if found is not None:
            yield found
    yield from _rated(case)


def _rise(index: int, solved: SolvedCrossing, line: LineRate) -> Finding | None:
    speed = solved.speed
    rise, most = (speed.rise_30_70_s if speed is not None else None), line.rise_30_70_max_s
    if speed is None or rise is None or most is None or rise.high <= most * (1 + NEARLY):
        return None
    text = (
        f"The line from {solved.crossing.source} to {solved.crossing.target} rises from 30 % to 70 % in {format_si(rise.nominal, 's', 2)}, "
        f"{format_si(rise.high, 's', 2)} at worst, into {format_si(speed.load_farads, 'F', 2)}; its bus allows {format_si(most, 's', 2)} ({line.why})."
    )
    outcome = Outcome.MALFUNCTION if rise.nominal > most else Outcome.MARGINAL
    return solved.finding(index, NAME, outcome, text, remedy=_window(solved, line, most))


def _window(solved: SolvedCrossing, line: LineRate, most_s: float) -> str:
    """State both ends of the pull-up window: the rise asks for at most, the current that a driver sinks for at least."""
    speed, receiver = solved.speed, solved.crossing.receiver
    assert speed is not None
    greatest = most_s / (LN_7_3 * speed.load_farads)
    text = f"Pull {receiver.net} up with {format_si(greatest, 'Ω', 2)} at most"
    if line.sink_amps and line.sink_volts is not None and receiver.supply_volts is not None:
        least = (receiver.supply_volts.high - line.sink_volts) / line.sink_amps
        text += f" (all pull-ups of the line together: {format_si(least, 'Ω', 2)} at least, for {format_si(line.sink_amps, 'A', 2)})"
    return text + ", or shorten the line."


def _rate(index: int, solved: SolvedCrossing, line: LineRate) -> Finding | None:
    speed = solved.speed
    assert speed is not None
    good = (
        f"{solved.crossing.source} to {solved.crossing.target} is good for {format_si(speed.usable_bit_s, 'bit/s', 2)} into "
        f"{format_si(speed.load_farads, 'F', 2)} ({format_si(speed.nominal_bit_s, 'bit/s', 2)} at the usual values), limited by {speed.limit}"
    )
    remedy = f"Shorten {speed.limit.removeprefix('the ')}: smaller resistors or a buffer; `levelcrossing size` works one out."
    if line.needed_bit_s is not None and speed.usable_bit_s < line.needed_bit_s * (1 - NEARLY):
        usual = speed.nominal_bit_s < line.needed_bit_s * (1 - NEARLY)
        return solved.finding(
            index,
            NAME,
            Outcome.MALFUNCTION if usual else Outcome.MARGINAL,
            f"{good}; it must carry {format_si(line.needed_bit_s, 'bit/s', 2)}: {line.why}.",
            remedy=remedy,
        )
    if line.usual_bit_s is not None and speed.usable_bit_s < line.usual_bit_s * (1 - NEARLY):
        return solved.finding(
            index,
            NAME,
            Outcome.UNKNOWN,
            f"{good}; {line.usual_why}, and nothing states its rate here.",
            remedy=f"{_stated(solved)}, or make it faster: smaller resistors or a buffer; `levelcrossing size` works one out.",
            cause=f"rate {line.bus} {line.group}",
        )
    return None


def _stated(solved: SolvedCrossing) -> str:
    assert solved.speed is not None
    return f'State the rate ([rates] "{solved.crossing.receiver.net}" = "{_written(solved.speed.usable_bit_s)}" if that is enough)'


def _written(bits_per_second: float) -> str:
    """Write a rate as the settings read it, rounded down to two figures: ``1.4M``."""
    scale, unit = (1e6, "M") if bits_per_second >= 1e6 else (1e3, "k") if bits_per_second >= 1e3 else (1.0, "")
    value = bits_per_second / scale
    step = 10 if value >= 100 else 1 if value >= 10 else 0.1
    return f"{value // step * step:.3g}{unit}"


def _rated(case: CaseFile) -> Iterator[Finding]:
    """Hold translators against the data rate that their makers state at these supplies."""
    for reference, facts in sorted(case.facts.items()):
        translator = facts.translator
        if translator is None or not translator.rates:
            continue
        supplies = {
            pin.facts.side: pin.supply_volts.nominal
            for pin in case.pins_of(reference)
            if pin.facts is not None and pin.facts.side and pin.supply_volts is not None
        }
        slow: dict[str, tuple[PinModel, float, LineRate]] = {}
        for pin in case.pins_of(reference):
            line = case.line_rates.get(pin.net)
            if pin.facts is None or not pin.facts.side or line is None or line.needed_bit_s is None:
                continue
            drains = _drains(case, pin)
            rate = translator.rate_at(supplies.get("a"), supplies.get("b"), open_drain=drains)
            if rate is not None and rate < line.needed_bit_s * (1 - NEARLY):
                slow.setdefault(pin.facts.channel or pin.number, (pin, rate, line))
        for pin, rate, line in slow.values():
            yield Finding(
                rule=NAME,
                outcome=Outcome.MALFUNCTION,
                text=f"{reference} ({facts.title}) is rated for {format_si(rate, 'bit/s', 2)} {_between(supplies, translator)}; "
                f"{pin.net} at {pin.label} must carry {format_si(line.needed_bit_s or 0.0, 'bit/s', 2)}: {line.why}.",
                remedy="Take a faster translator, raise its supplies where that makes it faster, or run the line slower.",
                part=reference,
                pin=pin.number,
                net=pin.net,
                basis=Basis.LIBRARY,
                sources=(facts.provenance.source,),
                cause=f"rated {reference}",
            )


def _between(supplies: dict[str, float], translator: TranslatorFacts) -> str:
    if not translator.rates or not supplies:
        return "at most"
    return "at " + " and ".join(format_volts(volts) for _, volts in sorted(supplies.items()))


def _drains(case: CaseFile, pin: PinModel) -> bool:
    """Tell whether the lines on both ends of a translator's channel are driven by open drains alone."""
    channel = pin.facts.channel if pin.facts is not None else ""
    nets = {pin.net} | {
        other.net
        for other in case.pins_of(pin.part)
        if channel and other.facts is not None and other.facts.side and other.facts.channel == channel
    }
    others = [
        other
        for island in case.islands
        for other in island.pins
        if other.net in nets and other.part != pin.part and other.drive is not None and other.role == "signal"
    ]
    return bool(others) and all(other.drive is not None and other.drive.style == "open-drain" for other in others)
