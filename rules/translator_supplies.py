"""A translator's supplies are outside their ranges or in the wrong order.

Why: many translators demand that one side's supply is not above the other's, or that it lies some tenths of a volt below;
otherwise they pass no level, conduct from supply to supply, or are damaged.

What to do: exchange the sides, or take a type whose supplies may come in any order.

Speaks when a side's supply lies outside its operating range, or the two supplies break the order that the maker demands.

Stays quiet when ranges and order hold at the usual voltages, and when a supply's voltage is not known.
"""

import re
from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome, PinModel
from levelcrossing.units import format_volts

NAME = "translator-supplies"
OUTCOME = Outcome.DAMAGE
SOURCES = ("supply ranges and order in the translator's data sheet, as named with the finding",)
EXPLAINS = ("supply-range", "low-not-reached", "high-not-reached", "input-overvoltage", "clamp-current", "margin-thin")
NEARLY = 0.02


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per side out of range and per pair in the wrong order."""
    for reference, facts in sorted(case.facts.items()):
        translator = facts.translator
        if translator is None or not translator.a_supply or not translator.b_supply:
            continue
        a, b = _supply(case, reference, translator.a_supply), _supply(case, reference, translator.b_supply)
        for side, pin, limits in (("A", a, translator.a_range), ("B", b, translator.b_range)):
            volts = case.rails.volts(pin.net) if pin is not None else None
            if pin is None or volts is None or limits is None:
                continue
            if limits[0] <= volts.nominal * (1 + NEARLY) and volts.nominal <= limits[1] * (1 + NEARLY):
                continue
            above = volts.nominal > limits[1]
            yield _finding(
                case,
                reference,
                pin,
                Outcome.DAMAGE if above else Outcome.MALFUNCTION,
                f"Side {side} of {reference} ({facts.title}) works from {format_volts(limits[0])} to {format_volts(limits[1])}; its supply {pin.net} is {format_volts(volts.nominal)}.",
                f"Feed side {side} from a rail within that range, or take another translator.",
                f"range {side}",
            )
        first, second = (case.rails.volts(pin.net) if pin is not None else None for pin in (a, b))
        if a is None or b is None or first is None or second is None:
            continue
        room = _room(translator.order, first.nominal, second.nominal)
        if room is not None and room < -0.02 * max(first.nominal, second.nominal):
            yield _finding(
                case,
                reference,
                a,
                Outcome.MALFUNCTION,
                f"{reference} ({facts.title}) demands {_order_words(translator.order)}; A is on {a.net} ({format_volts(first.nominal)}), B on {b.net} ({format_volts(second.nominal)}).",
                "Exchange the two sides, or take a translator whose supplies may come in any order.",
                "order",
            )


def _supply(case: CaseFile, reference: str, pattern: str) -> PinModel | None:
    wanted = re.compile(pattern, re.IGNORECASE)
    for pin in case.pins_of(reference):
        plain = re.sub(r"[~{}]", "", pin.name.replace("_{", "").replace("_(", "("))
        if pin.role in ("supply", "supply-out") and (wanted.fullmatch(plain) or wanted.fullmatch(pin.name)):
            return pin
    return None


def _room(order: str, a: float, b: float) -> float | None:
    """Return how far an order such as ``a<=b`` or ``a+0.8<=b`` holds [V]; None for ``any``."""
    match = re.fullmatch(r"([ab])(?:\+([\d.]+))?<=([ab])", order.replace(" ", ""))
    if match is None or match.group(1) == match.group(3):
        return None
    volts = {"a": a, "b": b}
    return volts[match.group(3)] - volts[match.group(1)] - float(match.group(2) or 0)


def _order_words(order: str) -> str:
    words = order.replace(" ", "").replace("a", "VCC(A)").replace("b", "VCC(B)")
    return words.replace("<=", " at most ").replace("+", " plus ")


def _finding(
    case: CaseFile, reference: str, pin: PinModel, outcome: Outcome, text: str, remedy: str, what: str
) -> Finding:
    rail = case.rails.by_net.get(pin.net)
    return Finding(
        rule=NAME,
        outcome=outcome,
        text=text,
        remedy=remedy,
        part=reference,
        pin=pin.number,
        net=pin.net,
        basis=Basis.weakest(Basis.LIBRARY, rail.basis if rail is not None else Basis.ASSUMED),
        sources=(case.facts[reference].provenance.source,),
        cause=f"translator {reference} {what}",
    )
