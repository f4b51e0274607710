"""A line that is used both ways passes a shifter that works one way.

Why: dividers, diodes, inverters and plain buffers carry a signal from one side only. On a two-way line (I2C data, a
clock that may be stretched, 1-Wire, bidirectional data) the answer never arrives or meets the wrong level.

What to do: a MOSFET pair, a two-way translator, or separate lines for each direction.

Speaks when both ends may drive, the shifter between them is a divider, diode, clamp or inverting stage, and one direction
fails while the other works.

Stays quiet when only one end drives, and when both directions hold their levels.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome, SolvedCrossing

NAME = "one-way-shifter"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("UM10204 section 3.1 (both lines of the bus are bidirectional)", "common practice for the shifters")
EXPLAINS = ("low-not-reached", "high-not-reached", "margin-thin")
ONE_WAY = ("divider", "diode", "clamp", "inverting-stage", "buffer")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per two-way line behind a one-way shifter."""
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        if not crossing.two_way or crossing.shifter.kind not in ONE_WAY or crossing.driver is None:
            continue
        if not _open_drain(solved) or not _fails(solved):
            continue
        text = f"{crossing.source} and {crossing.target} both drive this line, but the {crossing.shifter.title or crossing.shifter.kind} between them ({', '.join(crossing.shifter.parts)}) carries levels only one way."
        yield solved.finding(
            index,
            NAME,
            Outcome.MALFUNCTION,
            text,
            remedy="Replace it with a MOSFET pair or a two-way translator.",
            cause=f"one-way {' '.join(crossing.shifter.parts)}",
        )


def _open_drain(solved: SolvedCrossing) -> bool:
    ends = (solved.crossing.driver, solved.crossing.receiver)
    return any(
        pin is not None and pin.drive is not None and (pin.drive.style == "open-drain" or not pin.when) for pin in ends
    )


def _fails(solved: SolvedCrossing) -> bool:
    return any(
        margin is not None and margin.spread.nominal < 0
        for state in solved.states.values()
        if state.solved
        for margin in (state.high_margin, state.low_margin)
    )
