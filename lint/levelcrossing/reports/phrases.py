"""Words and figures that every report for people shares."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable

from levelcrossing.model import Finding, Outcome, Review, Speed, Spread
from levelcrossing.units import natural_key

NOTICE = "This is a review of logic levels, not a safety approval: what it did not judge is yours to judge."

MEANING = {
    Outcome.DAMAGE: "a rating is exceeded",
    Outcome.MALFUNCTION: "a level is not guaranteed",
    Outcome.MARGINAL: "holds nominally, with too little to spare",
    Outcome.UNKNOWN: "could not be judged",
    Outcome.SOUND: "holds at every corner",
}

BASIS = {
    "declared": "every figure declared by you",
    "library": "weakest figure: from the trade library",
    "traced": "weakest figure: traced on the board",
    "assumed": "weakest figure: assumed, a family default",
}

FASTEST_STATED = 100e6

_PREFIXES = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"), (1e-12, "p"))


def plain_number(value: float, decimals: int = 2) -> str:
    """Return a number without needless zeros."""
    text = f"{value:.{decimals}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def quantity(value: float, unit: str, digits: int = 3) -> str:
    """Return a quantity with an SI prefix: ``quantity(4.7e3, "Ω")`` is ``4.7 kΩ``."""
    if not math.isfinite(value):
        return "?"
    if value == 0:
        return f"0 {unit}"
    fitting = (pair for pair in _PREFIXES if abs(value) >= pair[0] * 0.9995)
    scale, prefix = next(fitting, _PREFIXES[-1])
    shown = f"{value / scale:.{digits}g}"
    if "e" in shown:
        shown = f"{value / scale:.0f}"
    return f"{shown} {prefix}{unit}"


def volts(value: float) -> str:
    """Return a voltage to 10 mV, without unit."""
    return plain_number(value)


def span(spread: Spread, unit: str = "V") -> str:
    """Return a range of voltages: ``4.75 to 5.25 V``, or one figure when it has no width to speak of."""
    low, high = volts(spread.low), volts(spread.high)
    return f"{low} {unit}" if low == high else f"{low} to {high} {unit}"


def good_for(speed: Speed, *, brief: bool = False) -> str:
    """Return the highest rate of a crossing at its load, what limits it, and what it must carry, in one line.

    The ``brief`` form, for tables, leaves out how far the models bear the rate and why it is needed.
    """
    load = f"into {quantity(speed.load_farads, 'F', 2)}"
    if speed.usable_bit_s > FASTEST_STATED:
        # Beyond this, lines are no lumped loads any more and the driver's own edge decides.
        text = f"good for more than {quantity(FASTEST_STATED, 'bit/s', 2)} {load}"
    else:
        text = f"good for {quantity(speed.usable_bit_s, 'bit/s', 2)} {load}"
        inside = [f"{quantity(speed.nominal_bit_s, 'bit/s', 2)} at the usual values"]
        if speed.loaded_bit_s is not None:
            inside.append(f"{quantity(speed.loaded_bit_s, 'bit/s', 2)} with 10 pF more")
        text += f" ({', '.join(inside)})"
        text += f", limited by {speed.limit}" if speed.limit else ""
        text += f"; {speed.accuracy}" if speed.accuracy and not brief else ""
    if speed.line is not None and speed.line.needed_bit_s is not None:
        text += f"; must carry {quantity(speed.line.needed_bit_s, 'bit/s', 2)}" + (
            f": {speed.line.why}" if speed.line.why and not brief else ""
        )
    return text


def count(number: int, word: str, words: str = "") -> str:
    """Return ``1 net``, ``2 nets``."""
    return f"{number} {word if number == 1 else words or word + 's'}"


def places(names: Iterable[str], most: int = 12) -> str:
    """Return places in few words: pins of one part together, runs of three numbers and more as a range.

    ``places(["J1.1", "J1.2", "J1.3", "U2.7"])`` is ``J1 pins 1 to 3, U2.7``; what is beyond ``most`` items is counted.
    """
    pins: dict[str, list[str]] = {}
    for name in dict.fromkeys(names):
        part, dot, pin = name.rpartition(".")
        pins.setdefault(part if dot else name, []).extend([pin] if dot else [])
    words: list[tuple[str, int]] = []
    for part, numbers in pins.items():
        runs = _runs(sorted(numbers, key=natural_key))
        for index, (text, size) in enumerate(runs):
            if len(numbers) < 2:
                words.append((f"{part}.{text}", 1))
            else:
                words.append((text if index else f"{part} pins {text}", size))
        if not numbers:
            words.append((part, 1))
    shown = ", ".join(word for word, _ in words[:most])
    rest = sum(size for _, size in words[most:])
    return shown + (f" and {rest} more" if rest else "")


def _runs(numbers: list[str]) -> list[tuple[str, int]]:
    """Return pin numbers with runs of three and more as ``1 to 3``, each with how many pins it stands for."""
    runs: list[list[str]] = []
    for number in numbers:
        if runs and _follows(runs[-1][-1], number):
            runs[-1].append(number)
        else:
            runs.append([number])
    texts: list[tuple[str, int]] = []
    for run in runs:
        texts += [(f"{run[0]} to {run[-1]}", len(run))] if len(run) > 2 else [(number, 1) for number in run]
    return texts


_COUNTING = re.compile(r"([A-Za-z]{0,3})(0|[1-9][0-9]{0,4})")


def _follows(previous: str, number: str) -> bool:
    """Tell whether one pin number comes right after another: ``A4`` after ``A3``."""
    one, two = _COUNTING.fullmatch(previous), _COUNTING.fullmatch(number)
    return one is not None and two is not None and one[1] == two[1] and int(two[2]) == int(one[2]) + 1


def settling(settle: str) -> str:
    """Return what would settle a supply's voltage, without the settings line that stands ready to paste elsewhere."""
    head, _, rest = settle.partition("; ")
    return rest if rest and head.startswith("State its volts") else settle


def grounds_known(finding: Finding) -> bool:
    """Tell whether a finding rests on figures at all; that something is not known rests on none."""
    return not (finding.outcome is Outcome.UNKNOWN and finding.crossing is None and not finding.sources)


def spot(finding: Finding) -> str:
    """Name where a finding bites: ``U3.4``, ``R7`` or the net; empty for the whole board."""
    if finding.part:
        return finding.part + (f".{finding.pin}" if finding.pin else "")
    return finding.net


def open_findings(review: Review) -> list[Finding]:
    """Return the findings that no waiver accepts, in the review's order."""
    return [finding for finding in review.findings if finding.waived is None]


def outcome_counts(review: Review) -> list[tuple[Outcome, int]]:
    """Return how many open findings each outcome has, worst first, without ``sound``."""
    return [(outcome, review.count(outcome)) for outcome in Outcome if outcome is not Outcome.SOUND]


def verdict_counts(review: Review) -> list[tuple[Outcome, int]]:
    """Return how many crossings each verdict has, worst first."""
    return [(outcome, sum(1 for one in review.crossings if one.verdict is outcome)) for outcome in Outcome]


def headline(review: Review) -> str:
    """Return the counts of findings in one line, worst first."""
    parts = [f"{number} {outcome.value}" for outcome, number in outcome_counts(review) if number]
    accepted = sum(1 for finding in review.findings if finding.waived is not None)
    text = ", ".join(parts) if parts else "nothing found"
    return text + (f" ({accepted} accepted by waiver)" if accepted else "")


def size_of(review: Review) -> str:
    """Return the size of the board in one line."""
    board = review.board
    return ", ".join(
        [
            count(len(board.parts), "part"),
            count(len(board.nets), "net"),
            count(sum(1 for rail in review.rails.by_net.values() if not rail.ground), "supply rail"),
            count(len(review.crossings), "crossing"),
        ]
    )


def reasons(review: Review) -> list[tuple[str, list[str]]]:
    """Group the pins that were not judged by reason, the most frequent first."""
    groups: dict[str, list[str]] = {}
    for pin in review.coverage.not_judged:
        groups.setdefault(pin.why, []).append(f"{pin.part}.{pin.pin}")
    return sorted(groups.items(), key=lambda item: (-len(item[1]), item[0]))
