"""Two outputs drive one line against each other.

Why: when one is high and the other low, both carry their short-circuit current and the level is undefined.

What to do: take one off, make both open-drain, or separate them with a series resistor or a buffer with an enable.

Speaks when two push-pull outputs of different parts that never let go are on one net, or joined by less than 100 Ω.

Stays quiet when either can let go (tri-state, open drain, a two-way pin), when resistance separates them, and for outputs
of one part that are wired in parallel.
"""

from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Island, Outcome, PinModel

NAME = "driver-conflict"
OUTCOME = Outcome.DAMAGE
SOURCES = ("absolute maximum output currents of logic data sheets; that outputs must not fight is common practice",)
SEPARATED_OHMS = 100.0


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per pair of outputs."""
    for island in case.islands:
        outputs = [pin for pin in island.pins if _always_drives(pin)]
        for position, first in enumerate(outputs):
            for second in outputs[position + 1 :]:
                if first.part == second.part or not _joined(island, first.net, second.net):
                    continue
                sure = first.basis is not Basis.ASSUMED or second.basis is not Basis.ASSUMED
                yield Finding(
                    rule=NAME,
                    outcome=Outcome.DAMAGE if sure else Outcome.MARGINAL,
                    text=f"{first.label} and {second.label} both drive {first.net}, and neither lets go.",
                    remedy="Take one of the outputs off the line, or put 1 kΩ between them and drive from one side.",
                    part=second.part,
                    pin=second.number,
                    net=second.net,
                    basis=Basis.weakest(first.basis, second.basis),
                    also=(f"{first.part}.{first.number}",),
                    cause=f"conflict {first.net}",
                )


def _always_drives(pin: PinModel) -> bool:
    return (
        pin.role == "signal"
        and pin.drive is not None
        and pin.drive.style == "push-pull"
        and not pin.drive.tristate
        and not pin.when
        and pin.receive is None
    )


def _joined(island: Island, a: str, b: str) -> bool:
    """Tell whether two nets are one, or tied by links and resistors under the limit."""
    seen, frontier = {a}, [a]
    while frontier:
        here = frontier.pop()
        if here == b:
            return True
        for element in island.elements:
            small = element.kind == "link" or (
                element.kind == "resistor" and element.ohms is not None and element.ohms.nominal < SEPARATED_OHMS
            )
            if small and here in element.nets:
                frontier.extend(net for net in element.nets if net not in seen)
                seen.update(element.nets)
    return False
