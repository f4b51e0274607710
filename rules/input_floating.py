"""An input hangs on nothing.

Why: a CMOS input without a defined level picks up charge, switches at random and draws supply current.

What to do: tie it to a supply or ground (directly or through a resistor), or connect the driver that was meant.

Speaks when an input of a logic part or translator is alone on its net, or when several inputs that the trade data knows
share a net, and nothing drives or pulls it.

Stays quiet when anything drives or pulls the net, when a connector or test point leads off the board, when the part has a
pull-up of its own, for a lone input of a controller or interface part (they often pull unused inputs), and when the pin is marked as not connected.
"""

from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome

NAME = "input-floating"
OUTCOME = Outcome.MARGINAL
SOURCES = ("unused-input notes of logic data sheets (e.g. TI SCBA004, Implications of slow or floating CMOS inputs)",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per net of inputs alone."""
    names = {part.reference: part for part in case.board.parts}
    for island in case.islands:
        inputs = [pin for pin in island.pins if pin.role == "signal" and pin.receive is not None and pin.drive is None]
        if not inputs or len(inputs) != len(island.pins) or island.elements:
            continue
        if any(pin.pull_up_ohms for pin in inputs) or any(_other_pins(case, net, inputs) for net in island.nets):
            continue
        first = inputs[0]
        group = case.facts[first.part].group if first.part in case.facts else ""
        alone = len(inputs) == 1
        # Controllers and interface parts often pull their unused inputs themselves; plain logic never does.
        if alone and group not in ("logic", "translator"):
            continue
        if any(pin.facts is None or pin.facts.direction is None for pin in inputs):
            continue
        if first.basis is Basis.ASSUMED or (first.facts is not None and "pull" in first.facts.note):
            continue
        value = names[first.part].value
        yield Finding(
            rule=NAME,
            outcome=Outcome.MARGINAL,
            text=f"{first.label} of {value} is an input with nothing on {first.net} that drives or pulls it.",
            remedy=f"Tie {first.part}.{first.number} to {first.supply or 'its supply'} or ground, or mark the pin as not connected if the part pulls it itself.",
            part=first.part,
            pin=first.number,
            net=first.net,
            basis=first.basis,
            also=tuple(f"{pin.part}.{pin.number}" for pin in inputs[1:]),
            cause=f"floating {first.net}",
        )


def _other_pins(case: CaseFile, net: str, inputs: list) -> bool:  # type: ignore[type-arg]
    """Tell whether pins of other kinds (test points, switches, crystals, analogue pins) are on the net."""
    known = {(pin.part, pin.number) for pin in inputs}
    board_net = next((candidate for candidate in case.board.nets if candidate.name == net), None)
    return board_net is not None and any(pin not in known for pin in board_net.pins)
