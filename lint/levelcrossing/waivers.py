"""Accepted findings: which circuit a waiver stands for, and what becomes of it.

A waiver names a rule and a place. When it also carries a fingerprint it stands for one circuit: the finding's rule, the
parts of its crossing with their values, how their pins are connected, and the nominal volts of the rails they touch.
Names of nets and numbers of references do not enter, so that renumbering keeps a waiver; another value, another part,
another rail, a part turned round, added or removed in that circuit ends it.

Where two circuits are equal (two channels of the same kind) the place tells them apart. When the place no longer holds
the circuit and exactly one other place does, the parts were renumbered: the waiver follows, and a remark asks to put
the new place into the file.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import replace

from levelcrossing.declared import nearest, shown
from levelcrossing.likeness import digest, graph_labels, letters_of, part_label
from levelcrossing.model import CaseFile, Crossing, Finding, Part, Rails, Review, Settings, SolvedCrossing, Waiver

FORM = "1"
"""First part of every fingerprint; another number means that the way of computing it has changed."""

_ROUNDS = 4
_MOST_NETS = 300
_THROUGH = ("R", "C", "L", "D", "Q", "T", "FB", "F", "JP", "NT")
"""Reference letters of parts through which a circuit goes on to its next net."""


# -------------------------------------------------------------------------------------------------------- fingerprints


def fingerprint(finding: Finding, review: Review | CaseFile) -> str:
    """Return a text that stays equal while the circuit of a finding does.

    Parameters
    ----------
    finding : Finding
    review : Review or CaseFile
        What the finding was made of.

    Returns
    -------
    str
        ``1:`` and 16 hexadecimal digits.
    """
    return _Fingerprints(review).of(finding)


def fingerprinted(findings: Iterable[Finding], review: Review | CaseFile) -> tuple[Finding, ...]:
    """Return the findings with their fingerprints set."""
    prints = _Fingerprints(review)
    return tuple(replace(finding, fingerprint=prints.of(finding)) for finding in findings)


class _Fingerprints:
    """Fingerprints of one review; what is common to all is worked out once."""

    def __init__(self, review: Review | CaseFile) -> None:
        self._rails = review.rails
        self._crossings: tuple[SolvedCrossing, ...] = tuple(
            crossing if isinstance(crossing, SolvedCrossing) else crossing.solved for crossing in review.crossings
        )
        self._parts: dict[str, Part] = {part.reference: part for part in review.board.parts if part.fitted}
        self._on_net: dict[str, list[str]] = {}
        for part in self._parts.values():
            for net in sorted({pin.net for pin in part.pins if pin.net}):
                self._on_net.setdefault(net, []).append(part.reference)

    def of(self, finding: Finding) -> str:
        """Return the fingerprint of one finding.

        Which of the places of one cause stands first goes by their numbers, so that all of them are taken alike.
        """
        places = sorted({(finding.part, finding.pin), *(_place(text) for text in finding.also)})
        crossings = self._crossings_of(finding, set(places))
        nets = self._circuit(self._seeds(finding, places, crossings))
        parts = sorted({reference for net in nets for reference in self._on_net.get(net, ())})
        marks = {reference: self._beyond(self._parts[reference], nets) for reference in parts}
        labels = graph_labels(
            [self._parts[reference] for reference in parts], dict.fromkeys(sorted(nets), "net"), _ROUNDS, marks
        )[-1]

        def pin(part: str, number: str) -> tuple[str, str]:
            known = self._parts.get(part)
            return labels.get(("part", part), part_label(known) if known else part), number

        def ends(crossing: Crossing) -> tuple[object, ...]:
            driver = crossing.driver
            return (
                pin(driver.part, driver.number) if driver else (),
                pin(crossing.receiver.part, crossing.receiver.number),
                rail_label(self._rails, crossing.driver_rail),
                rail_label(self._rails, crossing.receiver_rail),
            )

        return f"{FORM}:" + digest(
            finding.rule,
            sorted(pin(part, number) for part, number in places if part),
            sorted({self._net_label(net, labels) for net in self._nets_at(finding, places)}),
            sorted({ends(solved.crossing) for solved in crossings}),
            sorted(labels.values()),
        )

    def _crossings_of(self, finding: Finding, places: set[tuple[str, str]]) -> list[SolvedCrossing]:
        """Return the crossing of a finding; with several places, all crossings of its circuit that end there."""
        head = self._crossing(finding)
        if head is None or not finding.also:
            return [head] if head is not None else []
        return [
            solved
            for solved in self._crossings
            if solved.crossing.island == head.crossing.island
            and (solved.crossing.receiver.part, solved.crossing.receiver.number) in places
        ]

    def _nets_at(self, finding: Finding, places: list[tuple[str, str]]) -> set[str]:
        at_pins = {
            pin.net
            for part, number in places
            if part in self._parts
            for pin in self._parts[part].pins
            if pin.number == number
        }
        return at_pins if finding.also and at_pins else {finding.net}

    def _crossing(self, finding: Finding) -> SolvedCrossing | None:
        index = finding.crossing
        return self._crossings[index] if index is not None and 0 <= index < len(self._crossings) else None

    def _seeds(self, finding: Finding, places: list[tuple[str, str]], crossings: list[SolvedCrossing]) -> Iterator[str]:
        yield finding.net
        yield from self._nets_at(finding, places)
        for solved in crossings:
            crossing = solved.crossing
            yield from (pin.net for pin in (crossing.driver, crossing.receiver, crossing.stage_driver) if pin)
            for element in solved.elements:
                if element.part in crossing.link:
                    yield from element.nets

    def _circuit(self, seeds: Iterable[str]) -> set[str]:
        """Return the nets reached from some through small parts without passing a rail."""
        first = {net for net in seeds if net in self._on_net and net not in self._rails.by_net}
        nets: set[str] = set()
        waiting = sorted(first)
        while waiting:
            net = waiting.pop()
            if not net or net in nets or net in self._rails.by_net or net not in self._on_net:
                continue
            nets.add(net)
            if len(nets) > _MOST_NETS:
                return first  # the seeds do not depend on the order in which nets are visited
            for reference in self._on_net[net]:
                part = self._parts[reference]
                if len(part.pins) <= 3 and letters_of(reference) in _THROUGH:
                    waiting.extend(pin.net for pin in part.pins)
        return nets

    def _beyond(self, part: Part, nets: set[str]) -> str:
        """Return what the pins of a small part outside the circuit are connected to."""
        if len(part.pins) > 8:
            return ""
        symmetric = len(part.pins) <= 2
        return digest(
            sorted(
                ("" if symmetric else pin.number, rail_label(self._rails, pin.net))
                for pin in part.pins
                if pin.net not in nets
            )
        )

    def _net_label(self, net: str, labels: Mapping[tuple[str, str], str]) -> str:
        if ("net", net) in labels:
            return labels["net", net]
        # A rail is what it is by its name; an automatic name is only the pins it was made of.
        if net.startswith(("Net-(", "N$")) or net not in self._rails.by_net:
            return digest(sorted(part_label(self._parts[reference]) for reference in self._on_net.get(net, ())))
        return net


def rail_label(rails: Rails, net: str) -> str:
    """Return what a net is as a rail: ``ground``, ``3.30 V``, ``unknown``, or empty when it is no rail."""
    rail = rails.by_net.get(net)
    if rail is None:
        return ""
    if rail.ground:
        return "ground"
    return f"{rail.volts.nominal:.2f} V" if rail.volts else "unknown"


# ------------------------------------------------------------------------------------------------------------ applying


def apply_waivers(
    findings: Sequence[Finding], settings: Settings, today: str = "", rules: Iterable[str] = ()
) -> tuple[tuple[Finding, ...], tuple[str, ...]]:
    """Mark the findings that waivers accept.

    Parameters
    ----------
    findings : sequence of Finding
        With their fingerprints.
    settings : Settings
        Their waivers are applied.
    today : str
        The day on which last days are judged, ``YYYY-MM-DD``; when empty, that of the settings.
    rules : iterable of str
        Names of all rules, so that a misspelt one is told; empty when unknown.

    Returns
    -------
    findings : tuple of Finding
        In the same order, ``waived`` holding the reason of the waiver.
    remarks : tuple of str
        Waivers that are expired, unused, no longer matching or misspelt, one line each.
    """
    marked = list(findings)
    remarks: list[str] = []
    day = today or settings.today
    known = sorted(set(rules))
    for waiver in settings.waivers:
        name = _name(waiver, settings)
        if known and waiver.rule not in known:
            remarks.append(f"{name}: there is no such rule, {nearest(waiver.rule, known)}")
            continue
        if waiver.until and not day:
            remarks.append(f"{name}: its last day {waiver.until} could not be checked, no date is known")
        if waiver.until and day and waiver.until < day:
            covered, _ = _covered(waiver, marked)
            after = "its finding counts again" if covered else "its finding is gone as well, remove it"
            remarks.append(f"{name}: expired after {waiver.until}, {after}")
            continue
        covered, remark = _covered(waiver, marked)
        if remark:
            remarks.append(f"{name}: {remark}")
        for index in covered:
            if marked[index].waived is None:
                marked[index] = replace(marked[index], waived=waiver.reason)
    return tuple(marked), tuple(remarks)


def _name(waiver: Waiver, settings: Settings) -> str:
    where = f" ({settings.file}:{waiver.line})" if settings.file and waiver.line else ""
    return f"waiver of {waiver.rule} at {shown(waiver.at)}{where}"


def _covered(waiver: Waiver, findings: Sequence[Finding]) -> tuple[list[int], str]:
    """Return the indices of the findings that a waiver accepts, and a remark when something about it is odd."""
    same_rule = [index for index, finding in enumerate(findings) if finding.rule == waiver.rule]
    at_place = [index for index in same_rule if stands_at(findings[index], waiver.at)]
    if not waiver.fingerprint:
        together = next((findings[index] for index in same_rule if waiver.at in findings[index].also), None)
        if together is not None and not at_place:
            return [], f"the finding there is told at {shown(place_of(together))}, name that"
        return at_place, "" if at_place else "matches no finding, remove it"
    if not waiver.fingerprint.startswith(f"{FORM}:"):
        return [], "its fingerprint is of another form, renew it with levelcrossing waive"
    same = [index for index in same_rule if findings[index].fingerprint == waiver.fingerprint]
    if both := [index for index in same if index in at_place or waiver.at in findings[index].also]:
        return both, ""
    if len(same) == 1 and not at_place:
        finding = findings[same[0]]
        return same, f"the circuit is now at {shown(place_of(finding))}, put that in"
    if same and not at_place:
        places = ", ".join(shown(place_of(findings[index])) for index in same[:4])
        return [], f"its circuit is no longer there but at {places}; name the one that is meant"
    if at_place:
        return [], "no longer matches: the circuit has changed since it was accepted; look again and renew it"
    return [], "matches no finding, remove it"


def stands_at(finding: Finding, at: str) -> bool:
    """Tell whether a finding stands at a place: its pin, its part or its net."""
    if not at:
        return False
    pin = f"{finding.part}.{finding.pin}" if finding.part and finding.pin else ""
    return at in (pin, finding.part, finding.net)


def _place(text: str) -> tuple[str, str]:
    """Return part and pin of ``U1.3``; no pin for a part."""
    part, _, number = text.partition(".")
    return part, number


def place_of(finding: Finding) -> str:
    """Return the narrowest place of a finding: pin, else part, else net."""
    if finding.part:
        return f"{finding.part}.{finding.pin}" if finding.pin else finding.part
    return finding.net
