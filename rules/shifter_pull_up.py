"""A line that is only ever pulled low has no pull-up, or one far from what it needs.

Why: an open drain, and either side of a MOSFET or bipolar pass cell, cannot make a high by itself. Without a pull-up the
line floats; with one under a few hundred ohms the low cannot be pulled down.

What to do: fit a pull-up to the side's own supply, usually 1 kΩ to 10 kΩ.

Speaks when a receiver behind an open drain or a pass cell floats while the driver lets go.

Stays quiet when a pull-up (also one inside a part) or a connector's other side can hold the line.
"""

from collections.abc import Iterator

from levelcrossing.model import CaseFile, Finding, Outcome

NAME = "shifter-pull-up"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("UM10204 section 7.1; NXP AN10441 (pull-ups on both sides)", "the 1 kΩ to 10 kΩ window is common practice")
EXPLAINS = ("high-not-reached", "margin-thin", "input-floating")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per line that nothing pulls up."""
    done: set[tuple[str, str]] = set()
    for index, solved in enumerate(case.crossings):
        crossing = solved.crossing
        pass_cell = crossing.shifter.kind in ("mosfet-pass", "bipolar-pass")
        open_drain = (
            crossing.driver is not None
            and crossing.driver.drive is not None
            and crossing.driver.drive.style == "open-drain"
        )
        if not (pass_cell or open_drain):
            continue
        key = (crossing.receiver.part, crossing.receiver.number)
        if key in done or _far_end_on(case, crossing.island, crossing.receiver.net):
            continue
        for state in solved.states.values():
            wanted_high = (state.state == "released" or state.state == "high") and not crossing.inverting
            if not state.solved or not wanted_high or not state.floating:
                continue
            done.add(key)
            side = crossing.receiver_rail or "its supply"
            text = f"Nothing pulls {crossing.target} up while {crossing.source} lets go: the line has no defined high."
            yield solved.finding(
                index,
                NAME,
                Outcome.MALFUNCTION,
                text,
                remedy=f"Fit a pull-up of 4.7 kΩ from {crossing.receiver.net} to {side}.",
                cause=f"pull-up {crossing.receiver.net}",
            )
            break


def _far_end_on(case: CaseFile, island: int, net: str) -> bool:
    return any(
        pin.role == "far-end" and pin.net == net and not pin.declared_far_end for pin in case.islands[island].pins
    )
