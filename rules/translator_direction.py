"""A translator's direction does not fit the signal, or its direction pin is open or on the wrong supply.

Why: a channel set one way carries nothing the other way, and two outputs may fight. A floating direction pin turns the
channel round at random.

What to do: tie the direction pin to the level that fits the signal, on the supply its threshold belongs to.

Speaks when a direction pin hangs on nothing, or is tied to a rail below the high level of its supply; and when a
channel's output side meets another sure output.

Stays quiet when the direction pin is driven by a signal, and when direction and driver fit.
"""

import re
from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome, PinModel
from levelcrossing.units import format_volts

NAME = "translator-direction"
OUTCOME = Outcome.DAMAGE
SOURCES = ("function table of the translator's data sheet, as named with the finding",)
EXPLAINS = ("input-floating", "driver-conflict")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per direction pin or channel in trouble."""
    for reference, facts in sorted(case.facts.items()):
        translator = facts.translator
        if translator is None:
            continue
        for control in translator.controls:
            if control.use == "direction":
                for pin in case.pins_of(reference):
                    if (
                        re.fullmatch(control.pins, re.sub(r"[~{}]", "", pin.name), re.IGNORECASE)
                        and pin.role != "unused"
                    ):
                        yield from _pin(case, reference, facts.title, control.supply, pin)
        for pin in case.pins_of(reference):
            if (
                pin.facts is not None
                and pin.facts.side
                and pin.drive is not None
                and pin.receive is None
                and not pin.when
            ):
                yield from _channel(case, reference, facts.title, pin)


def _pin(case: CaseFile, reference: str, title: str, supply: str, pin: PinModel) -> Iterator[Finding]:
    rail = case.rails.by_net.get(pin.net)
    if rail is None:
        net = next((net for net in case.board.nets if net.name == pin.net), None)
        if net is not None and len(net.pins) == 1:
            yield _finding(
                case,
                reference,
                pin,
                Outcome.MALFUNCTION,
                f"{pin.label} sets the direction of {reference} ({title}) and hangs on nothing.",
                "Tie it to the supply of its side or to ground, as the signal's direction asks.",
            )
        return
    own = [
        other
        for other in case.pins_of(reference)
        if other.role == "supply" and re.fullmatch(supply, re.sub(r"[~{}]", "", other.name), re.IGNORECASE)
    ]
    volts = case.rails.volts(own[0].net) if own else None
    if volts is not None and rail.volts is not None and not rail.ground and rail.volts.nominal < 0.65 * volts.nominal:
        yield _finding(
            case,
            reference,
            pin,
            Outcome.MALFUNCTION,
            f"{pin.label} belongs to {own[0].net} ({format_volts(volts.nominal)}) and is tied to {pin.net}, {format_volts(rail.volts.nominal)}: too low to be sure of a high.",
            f"Tie it to {own[0].net}.",
        )


def _channel(case: CaseFile, reference: str, title: str, pin: PinModel) -> Iterator[Finding]:
    """Speak of an output side that meets another sure output."""
    for island in case.islands:
        if pin.net not in island.nets:
            continue
        for other in island.pins:
            sure = (
                other.role == "signal"
                and other.part != reference
                and other.drive is not None
                and other.drive.style == "push-pull"
            )
            if (
                sure
                and other.net == pin.net
                and not other.when
                and other.receive is None
                and other.drive is not None
                and not other.drive.tristate
            ):
                yield _finding(
                    case,
                    reference,
                    pin,
                    Outcome.DAMAGE,
                    f"{reference} ({title}) is set to drive {pin.label}, and {other.label} drives the same net.",
                    "Turn the direction round, or exchange the two sides of the channel.",
                )


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
        sources=(case.facts[reference].provenance.source,),
        cause=f"direction {reference}.{pin.number}",
    )
