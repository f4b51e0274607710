"""Signals that could not be judged, and why.

Why: a clean report must mean "judged and sound", never "not understood".

What to do: declare the far end of the connector, the rail, or the pin in levelcrossing.toml; the finding names the line.

Speaks when a signal leaves the board at a connector whose level nothing tells, when the supply of a part's signal pins
cannot be told, and when a transistor on a signal is of unknown kind; one finding per part.

Stays quiet when every signal pin of the part was judged, and for analogue and differential lines.
"""

from collections import defaultdict
from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome

NAME = "pin-unknown"
OUTCOME = Outcome.UNKNOWN
SOURCES = ("none needed: what is not known is said",)


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per part with pins that could not be judged."""
    by_part: dict[tuple[str, str], list[str]] = defaultdict(list)
    for pin, why in case.not_judged:
        by_part[pin.part, why].append(pin.number)
    nets = {(pin.part, pin.number): pin.net for pin in case.pins.values()}
    for part, value in case.left_out:
        name = f"{part} ({value})" if value else part
        yield Finding(
            rule=NAME,
            outcome=Outcome.UNKNOWN,
            text=f"{name} is left out of every circuit: neither its number nor its symbol tells what transistor it is.",
            remedy="Give its type as value, take a symbol that shows its polarity, or add a [[mosfet]] or [[bipolar]] row to levelcrossing-parts.toml.",
            part=part,
            basis=Basis.ASSUMED,
            cause=f"unknown transistor {part}",
        )
    for (part, why), numbers in sorted(by_part.items()):
        far = case.pins[part, numbers[0]].role == "far-end"
        if far:
            text = f"{len(numbers)} signal{'s' * (len(numbers) > 1)} leave{'s' * (len(numbers) == 1)} the board at {part} ({_listed(numbers)}), and nothing tells the level on the other side."
            remedy = f'State the supply of what is plugged in there, under [far_ends] in levelcrossing.toml: "{part}" = {{rail = "?"}}.'
        else:
            text = f"{len(numbers)} signal pin{'s' * (len(numbers) > 1)} of {part} ({_listed(numbers)}) could not be judged: {why}."
            remedy = (
                f'State the supply that sets its levels, under [pins] in levelcrossing.toml: "{part}" = {{rail = "?"}}.'
            )
        yield Finding(
            rule=NAME,
            outcome=Outcome.UNKNOWN,
            text=text,
            remedy=remedy,
            part=part,
            pin=numbers[0],
            net=nets[part, numbers[0]],
            basis=Basis.ASSUMED,
            also=tuple(f"{part}.{number}" for number in numbers[1:]),
            cause=f"unknown {part} {why}",
        )


def _listed(numbers: list[str]) -> str:
    return ", ".join(numbers[:8]) + (f" and {len(numbers) - 8} more" if len(numbers) > 8 else "")
