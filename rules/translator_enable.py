"""A translator's enable pin is open, tied off, or referred to the wrong supply.

Why: a floating enable lets the outputs come and go; one tied to its inactive level keeps them off for ever; and the pin's
threshold and rating belong to one of the two supplies.

What to do: tie the pin to its active level of the right supply, or drive it from there with a pull to the inactive level.

Speaks when an enable pin is alone on its net, tied to the inactive level, tied to a rail that does not reach its high
level or exceeds its rating, and when a pass-transistor translator's enable and upper reference are not joined and fed
through about 200 kΩ (50 kΩ to 1 MΩ).

Stays quiet when the pin is tied right, or driven.
"""

import re
from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, ControlFacts, Finding, Outcome, PartFacts, PinModel
from levelcrossing.units import format_si, format_volts, parse_resistance

NAME = "translator-enable"
OUTCOME = Outcome.MALFUNCTION
SOURCES = (
    "enable rows of the translator's data sheet, as named with the finding",
    "TI PCA9306 SCPS113M: EN and VREF2 together through 200 kΩ to the upper supply",
)
# Resistance that feeds gate and upper reference [ohm]: the makers show 200 kΩ; the window about it is common practice.
FEED_OHMS = (50_000.0, 1_000_000.0)
EXPLAINS = ("input-floating", "input-overvoltage", "high-not-reached")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per enable pin in trouble."""
    for reference, facts in sorted(case.facts.items()):
        if facts.translator is None:
            continue
        for control in facts.translator.controls:
            pass_gate = facts.translator.kind == "fet-switch" and control.use == "reference"
            if control.use != "enable" and not pass_gate:
                continue
            for pin in case.pins_of(reference):
                if (
                    not re.fullmatch(control.pins, re.sub(r"[~{}]", "", pin.name), re.IGNORECASE)
                    or pin.role == "unused"
                ):
                    continue
                if pass_gate:
                    yield from _pass_gate(case, reference, facts, pin)
                else:
                    yield from _enable(case, reference, facts, control, pin)


def _enable(
    case: CaseFile, reference: str, facts: PartFacts, control: ControlFacts, pin: PinModel
) -> Iterator[Finding]:
    rail = case.rails.by_net.get(pin.net)
    if rail is None:
        net = next((net for net in case.board.nets if net.name == pin.net), None)
        if net is not None and len(net.pins) == 1:
            yield _finding(
                case,
                reference,
                pin,
                Outcome.MALFUNCTION,
                f"{pin.label} enables {reference} ({facts.title}) and hangs on nothing.",
                f"Tie it to its active level ({'high' if control.active == 'H' else 'low'}).",
            )
        return
    inactive = rail.ground == (control.active == "H")
    if inactive:
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MALFUNCTION,
            f"{pin.label} is tied to {pin.net}, which keeps {reference} ({facts.title}) switched off.",
            f"Tie it to its active level ({'high' if control.active == 'H' else 'low'}).",
        )
        return
    if rail.ground or rail.volts is None:
        return
    own = [
        other
        for other in case.pins_of(reference)
        if other.role == "supply"
        and re.fullmatch(control.supply, re.sub(r"[~{}]", "", other.name.replace("_", "")), re.IGNORECASE)
    ]
    volts = case.rails.volts(own[0].net) if own else None
    if control.most_volts is not None and rail.volts.nominal > control.most_volts * 1.001:
        yield _finding(
            case,
            reference,
            pin,
            Outcome.DAMAGE,
            f"{pin.label} bears {format_volts(control.most_volts)} and is tied to {pin.net}, {format_volts(rail.volts.nominal)}.",
            f"Tie it to {own[0].net if own else 'its own supply'}.",
        )
    elif volts is not None and rail.volts.nominal < 0.65 * volts.nominal:
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MALFUNCTION,
            f"{pin.label} belongs to {own[0].net} ({format_volts(volts.nominal)}) and is tied to {pin.net}, {format_volts(rail.volts.nominal)}: too low to be sure of a high.",
            f"Tie it to {own[0].net}.",
        )


def _pass_gate(case: CaseFile, reference: str, facts: PartFacts, pin: PinModel) -> Iterator[Finding]:
    """Judge the gate of a pass-transistor translator: joined to the upper reference, fed through about 200 kΩ."""
    if case.rails.is_ground(pin.net):
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MALFUNCTION,
            f"{pin.label} is tied to {pin.net}, which keeps {reference} ({facts.title}) switched off.",
            "Join it to the upper reference pin and feed both through 200 kΩ.",
        )
        return
    upper = next(
        (
            other
            for other in case.pins_of(reference)
            if re.search(r"REF_?2|REF_?B|VCC_?2|VREF_?B", other.name, re.IGNORECASE)
        ),
        None,
    )
    if upper is None:
        return
    stiff = case.rails.by_net.get(upper.net)
    if stiff is not None and stiff.volts is not None and _limits_bias(case, stiff.net):
        stiff = None
    if stiff is not None and stiff.volts is not None and not stiff.ground:
        joined = upper.net == pin.net
        lower = _lower_volts(case, reference)
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MALFUNCTION,
            f"{upper.label} of {reference} ({facts.title}) sits straight on {stiff.net} ({format_volts(stiff.volts.nominal)})"
            + (" together with " if joined else ", and not joined to ")
            + f"{pin.label}: "
            + (
                "its bias transistor then conducts from there into the lower reference"
                if joined
                else "nothing then holds the gate one threshold above the lower reference"
            )
            + (f", {format_volts(lower)}." if lower is not None else "."),
            f"Join {pin.name} to {upper.name} and feed both through 200 kΩ from {stiff.net}.",
        )
        return
    feed = _feed(case, upper.net)
    if upper.net == pin.net:
        if feed is not None and not FEED_OHMS[0] * 0.99 <= feed[1] <= FEED_OHMS[1] * 1.01:
            small = feed[1] < FEED_OHMS[0]
            yield _finding(
                case,
                reference,
                pin,
                Outcome.MARGINAL,
                f"{feed[0]} feeds {upper.label} and {pin.label} of {reference} ({facts.title}) through {format_si(feed[1], 'Ω')}: "
                + (
                    "the bias current that it lets into the lower supply may lift it when it has little load."
                    if small
                    else "so weak a bias is drawn away by leakage and coupling."
                ),
                "Use 200 kΩ, as the maker shows.",
            )
        return
    rail = case.rails.by_net.get(pin.net)
    if rail is not None and rail.volts is not None:
        fed = f" ({upper.name} is fed through {format_si(feed[1], 'Ω')})" if feed else ""
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MARGINAL,
            f"{pin.label} is tied stiffly to {pin.net} instead of to {upper.name}{fed}: the gate of {reference} ({facts.title}) then does not follow the lower supply, and the low side may rise.",
            f"Join {pin.name} to {upper.name} and feed both through 200 kΩ from the upper supply.",
        )


def _feed(case: CaseFile, net: str) -> tuple[str, float] | None:
    """Return the resistor between a net and a rail other than ground, with its resistance [ohm]."""
    for part in case.board.parts:
        nets = [pin.net for pin in part.pins]
        if not part.fitted or len(nets) != 2 or net not in nets:
            continue
        other = nets[1 - nets.index(net)]
        ohms = parse_resistance(part.value)
        if ohms is not None and other in case.rails.by_net and not case.rails.is_ground(other):
            return part.reference, ohms
    return None


def _limits_bias(case: CaseFile, net: str) -> bool:
    """Tell whether a net that counts as a rail is fed through a resistor only."""
    rail = case.rails.by_net[net]
    return rail.domain != net and _feed(case, net) is not None


def _lower_volts(case: CaseFile, reference: str) -> float | None:
    """Return the lower reference's voltage [V]."""
    volts = [
        found.nominal
        for pin in case.pins_of(reference)
        if pin.role == "supply" and (found := case.rails.volts(pin.net)) is not None
    ]
    return min(volts, default=None)


def _finding(case: CaseFile, reference: str, pin: PinModel, outcome: Outcome, text: str, remedy: str) -> Finding:
    return Finding(
        rule=NAME,
        outcome=outcome,
        text=text,
        remedy=remedy,
        part=reference,
        pin=pin.number,
        net=pin.net,
        basis=Basis.LIBRARY,
        also=tuple(
            f"{other.part}.{other.number}"
            for other in case.pins_of(reference)
            if other.facts is not None and other.facts.side
        ),
        sources=(case.facts[reference].provenance.source,),
        cause=f"enable {reference}",
    )
