"""A part is on a supply outside its range.

Why: below its range a part's levels are not specified, above it the part may be destroyed.

What to do: feed the part from a rail within its range or take a version made for this supply.

Speaks when the usual voltage of a supply pin's rail lies outside the operating range that the trade data gives, damage
when it is more than a tenth above.

Stays quiet when the rail lies within the range, and for parts of which nothing is known.
"""

import re
from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome
from levelcrossing.units import format_volts

NAME = "supply-range"
OUTCOME = Outcome.DAMAGE
SOURCES = ("recommended operating conditions of the part's data sheet",)

# A rail worked out from a divider may miss a round figure by this much without meaning anything [1].
NEARLY = 0.02


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per part and supply outside the range."""
    for reference, facts in sorted(case.facts.items()):
        done: set[str] = set()
        for pin in case.pins_of(reference):
            volts = case.rails.volts(pin.net)
            if pin.role != "supply" or volts is None or pin.net in done or volts.nominal <= 0.2:
                continue
            supply = next(
                (supply for supply in facts.supplies if re.fullmatch(supply.pins, _plain(pin.name), re.IGNORECASE)),
                None,
            )
            if supply is None or supply.low_volts is None or supply.high_volts is None:
                continue
            low, high = supply.low_volts, supply.high_volts
            if low <= volts.nominal * (1 + NEARLY) and volts.nominal <= high * (1 + NEARLY):
                continue
            done.add(pin.net)
            above = volts.nominal > high
            outcome = (
                Outcome.DAMAGE if volts.nominal > 1.1 * high else Outcome.MALFUNCTION if not above else Outcome.MARGINAL
            )
            rail = case.rails.by_net[pin.net]
            yield Finding(
                rule=NAME,
                outcome=outcome,
                text=f"{reference} ({facts.title}) works from {format_volts(low)} to {format_volts(high)} at {_plain(pin.name)}; it is on {pin.net}, {format_volts(volts.nominal)}.",
                remedy=f"Feed {reference} from a rail of {format_volts(low)} to {format_volts(high)}, or check the part number.",
                part=reference,
                pin=pin.number,
                net=pin.net,
                basis=rail.basis,
                sources=(facts.provenance.source,),
                cause=f"supply {reference} {pin.net}",
            )


def _plain(name: str) -> str:
    return re.sub(r"[~{}]", "", name).replace("_(", "(")
