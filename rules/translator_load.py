"""A translator meets pulls, drivers or lines that its kind cannot work with.

Why: an auto-direction buffer holds its level through some kilohms: a pull-up or pull-down within ten times that shifts it,
and on an open-drain line it fights the other side. A pass-transistor translator makes no high level without pull-ups.

What to do: leave the pull-ups off (or above the maker's least value), take a translator made for open drain on such lines,
or fit the pull-ups that a pass type needs.

Speaks when a pull on a channel is below the least that the maker allows (malfunction when a solved level fails, else
marginal), when such a part carries open-drain drivers, and when a channel has more capacitance than the maker allows.

Stays quiet when no pull is on the channel, or it is large enough, and for types with strong outputs.
"""

from collections.abc import Iterator

from levelcrossing.model import Basis, CaseFile, Finding, Outcome, PinModel
from levelcrossing.units import format_si

NAME = "translator-load"
OUTCOME = Outcome.MALFUNCTION
SOURCES = ("least pull-up values in the translator's data sheet (TI TXB0104: 50 kΩ), as named with the finding",)
EXPLAINS = ("low-not-reached", "high-not-reached", "margin-thin", "shifter-pull-up")


def check(case: CaseFile) -> Iterator[Finding]:
    """Yield one finding per channel pin with a pull that is too strong."""
    yield from _too_much_to_charge(case)
    for reference, facts in sorted(case.facts.items()):
        translator = facts.translator
        if translator is None or translator.pull_least_ohms is None:
            continue
        for pin in case.pins_of(reference):
            if pin.facts is None or not pin.facts.side:
                continue
            found = _pull(case, pin)
            drains = _open_drains(case, pin) if not translator.open_drain_ok else []
            strong = found is not None and found[1] < translator.pull_least_ohms * 0.999
            if not strong and not drains:
                continue
            if found is None or not strong:
                yield _on_open_drain(case, reference, pin, drains[0])
                continue
            resistor, ohms = found
            failing = [
                index
                for index, solved in enumerate(case.crossings)
                if reference in solved.crossing.through and solved.crossing.stage_driver is not None and (solved.crossing.stage_driver.part, solved.crossing.stage_driver.number) == (pin.part, pin.number)
                and any(
                    margin is not None and margin.spread.nominal < 0
                    for state in solved.states.values()
                    for margin in (state.low_margin, state.high_margin)
                )
            ]  # fmt: skip
            text = (
                f"{resistor} pulls {pin.label} ({facts.title}) with {format_si(ohms, 'Ω')}; "
                f"it works with {format_si(translator.pull_least_ohms, 'Ω')} or more."
            )
            if drains:
                text += f" {drains[0].label} is an open drain, which this kind of translator cannot carry."
            ends = [case.crossings[index].crossing.receiver for index in failing]
            yield Finding(
                rule=NAME,
                outcome=Outcome.MALFUNCTION if failing or drains else Outcome.MARGINAL,
                text=text,
                remedy=f"Take {resistor} off, or use a translator made for open-drain lines (MOSFET pair, pass-transistor type) there.",
                part=reference,
                pin=pin.number,
                net=pin.net,
                basis=Basis.LIBRARY,
                crossing=failing[0] if failing else None,
                also=tuple(dict.fromkeys(f"{end.part}.{end.number}" for end in ends)),
                sources=(facts.provenance.source,),
                cause=f"load {reference}.{pin.number}",
            )


def _too_much_to_charge(case: CaseFile) -> Iterator[Finding]:
    """Hold the capacitance on each channel against the load that the maker allows."""
    for reference, facts in sorted(case.facts.items()):
        most = facts.translator.load_most_farads if facts.translator is not None else None
        if most is None:
            continue
        for pin in case.pins_of(reference):
            if pin.facts is None or not pin.facts.side or not pin.net:
                continue
            farads, largest = _load(case, pin)
            if farads <= most * (1 + 1e-9):
                continue
            yield Finding(
                rule=NAME,
                outcome=Outcome.MARGINAL,
                text=f"{pin.label} of {reference} ({facts.title}) charges {format_si(farads, 'F', 2)}"
                + (f", {largest} the most of it" if largest else "")
                + f"; it is made for {format_si(most, 'F', 2)} at most.",
                remedy="Take the capacitor off that line, shorten it, or use a translator with strong outputs there.",
                part=reference,
                pin=pin.number,
                net=pin.net,
                basis=Basis.LIBRARY,
                sources=(facts.provenance.source,),
                cause=f"charge {reference}.{pin.number}",
            )


def _load(case: CaseFile, pin: PinModel) -> tuple[float, str]:
    """Return the capacitance on a pin's net [F], its own pin left out, and the capacitor that is the most of it."""
    farads = case.settings.stray_farads
    capacitors: list[tuple[float, str]] = []
    for island in case.islands:
        if pin.net not in island.nets:
            continue
        for other in island.pins:
            if other.net == pin.net and other.part != pin.part and other.receive is not None:
                farads += other.receive.capacitance_farads.nominal
        capacitors += [
            (element.farads.nominal, element.part)
            for element in island.elements
            if element.kind == "capacitor" and element.farads is not None and pin.net in element.nets
        ]
    whole = farads + sum(amount for amount, _ in capacitors)
    largest = max(capacitors, default=(0.0, ""))
    return whole, largest[1] if largest[0] > whole / 2 else ""


def _open_drains(case: CaseFile, pin: PinModel) -> list[PinModel]:
    """Return the open-drain outputs on the island of a pin."""
    return [
        other
        for island in case.islands
        if pin.net in island.nets
        for other in island.pins
        if other.drive is not None and other.drive.style == "open-drain" and other.role == "signal"
    ]


def _on_open_drain(case: CaseFile, reference: str, pin: PinModel, drain: PinModel) -> Finding:
    facts = case.facts[reference]
    return Finding(
        rule=NAME,
        outcome=Outcome.MALFUNCTION,
        text=f"{drain.label} is an open drain on {pin.label} ({facts.title}), which this kind of translator cannot carry: it needs a driver that makes both levels.",
        remedy="Use a translator made for open-drain lines there (MOSFET pair, pass-transistor type).",
        part=reference,
        pin=pin.number,
        net=pin.net,
        basis=Basis.weakest(Basis.LIBRARY, drain.basis),
        also=(f"{drain.part}.{drain.number}",),
        sources=(facts.provenance.source,),
        cause=f"load {reference}.{pin.number}",
    )


def _pull(case: CaseFile, pin: PinModel) -> tuple[str, float] | None:
    """Return the strongest resistor from a pin's net to a rail or ground."""
    pulls = [
        (element.ohms.nominal, element.part)
        for island in case.islands
        if pin.net in island.nets
        for element in island.elements
        if element.kind == "resistor" and element.ohms is not None and pin.net in element.nets and any(net in case.rails.by_net for net in element.nets)
    ]  # fmt: skip
    return (min(pulls)[1], min(pulls)[0]) if pulls else None
