"""A translator's supplies are outside their ranges or in the wrong order.

Why: many translators demand that one side's supply is not above the other's, or that it lies some tenths of a volt below;
otherwise they pass no level, conduct from supply to supply, or are damaged.

What to do: exchange the sides, or take a type whose supplies may come in any order.

Speaks when a side has no supply (its pin on ground, open, or not drawn), when a side's supply lies outside its operating
range, or when the two supplies break the order that the maker demands.

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
        missing = [_unsupplied(case, reference, side) for side in "ab"]
        if any(missing):
            yield from (one for one in missing if one is not None)
            continue
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


def _unsupplied(case: CaseFile, reference: str, side: str) -> Finding | None:
    """Speak of a side in use whose supply pin lies on ground, hangs on nothing, or is not drawn at all."""
    facts = case.facts[reference]
    translator = facts.translator
    used = [pin for pin in case.pins_of(reference) if pin.facts is not None and pin.facts.side == side and pin.net]
    if translator is None or not used or translator.kind == "fet-switch":
        return None
    wanted = translator.a_supply if side == "a" else translator.b_supply
    pins = [pin for pin in case.pins_of(reference) if re.fullmatch(wanted, _plain(pin.name), re.IGNORECASE)]
    sizes = {net.name: len(net.pins) for net in case.board.nets}
    if not pins:
        known = f"{translator.a_supply}|{translator.b_supply}"
        if any(
            pin.role in ("supply", "supply-out") and not re.fullmatch(known, _plain(pin.name), re.IGNORECASE)
            for pin in case.pins_of(reference)
        ):
            return None  # a supply pin under a name of its own may well be the one
        what, pin = "its symbol has no such pin", used[0]
    elif case.rails.is_ground(pins[0].net):
        what, pin = f"{pins[0].label} lies on {pins[0].net}", pins[0]
    elif not pins[0].net or sizes.get(pins[0].net, 0) <= 1:
        what, pin = f"{pins[0].label} hangs on nothing", pins[0]
    else:
        return None
    return _finding(
        case,
        reference,
        pin,
        Outcome.MALFUNCTION,
        f"Side {side.upper()} of {reference} ({facts.title}) has no supply: {what}; {', '.join(one.label for one in used[:4])} cannot drive or read.",
        "Connect that supply pin to the rail of the signals on its side.",
        f"no supply {side}",
    )


def _plain(name: str) -> str:
    return re.sub(r"[~{}]", "", name.replace("_{", "").replace("_(", "("))


def _supply(case: CaseFile, reference: str, pattern: str) -> PinModel | None:
    wanted = re.compile(pattern, re.IGNORECASE)
    for pin in case.pins_of(reference):
        if pin.role in ("supply", "supply-out") and (wanted.fullmatch(_plain(pin.name)) or wanted.fullmatch(pin.name)):
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
        basis=Basis.weakest(Basis.LIBRARY, rail.basis if rail is not None else Basis.TRACED),
        crossing=_spoiled(case, reference, what[-1].lower()),
        sources=(case.facts[reference].provenance.source,),
        cause=f"translator {reference} {what}",
    )


def _spoiled(case: CaseFile, reference: str, side: str) -> int | None:
    """Return a crossing through a part, at the side in question if there is one: levels fail there because of it."""
    found: list[int] = []
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        ends = [end for end in (crossing.driver, crossing.stage_driver, crossing.receiver) if end is not None]
        own = [end for end in ends if end.part == reference]
        if any(end.facts is not None and end.facts.side == side for end in own):
            return index
        if own or reference in crossing.through:
            found.append(index)
    return found[0] if found else None
