"""The whole way of a review on one screen. Nothing here prints, reads a clock or a network."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path

from levelcrossing import (
    busrates,
    directions,
    offstates,
    remedies,
    rulebook,
    scope,
    solutions,
    speeds,
    tradebook,
    waivers,
)
from levelcrossing import crossings as crossing_survey
from levelcrossing import islands as island_survey
from levelcrossing import pins as pin_models
from levelcrossing import rails as rail_tracing
from levelcrossing.houserows import house_rows
from levelcrossing.model import (
    Basis,
    Board,
    CaseFile,
    Coverage,
    Finding,
    NotJudged,
    Outcome,
    PinModel,
    Place,
    Review,
    ReviewedCrossing,
    Settings,
)
from levelcrossing.read import read_board
from levelcrossing.read.places import Places
from levelcrossing.settings import settings_from_fields, unmatched


def review(
    path: str,
    settings: Settings | None = None,
    *,
    rules_folders: Sequence[Path] = (),
    facts_files: Sequence[Path] = (),
) -> Review:
    """Review one board.

    Parameters
    ----------
    path : str
        Netlist, XML netlist, sheet or project folder.
    settings : Settings, optional
        What the user declared; nothing when omitted.
    rules_folders, facts_files : sequence of Path
        House rules and house rows of trade data.

    Returns
    -------
    Review

    Raises
    ------
    LevelcrossingError
        When the board, the settings, the rules or the trade data cannot be used.
    """
    board = read_board(path)
    return review_board(board, settings or Settings(), rules_folders=rules_folders, facts_files=facts_files)


def open_case(board: Board, settings: Settings, book: tradebook.Tradebook) -> CaseFile:
    """Trace, model, cut, pair and solve: everything that the rules judge."""
    rails = rail_tracing.trace_rails(board, book, settings)
    pins, facts = pin_models.model_pins(board, rails, book, settings)
    pins = directions.settle_hosts(directions.settle_directions(pins, facts, rails), facts)
    pins = directions.settle_serial_lines(pins)
    elements = island_survey.find_elements(board, book, facts, settings)
    rates = busrates.line_rates(board, pins, book.buses, settings)
    pins = directions.settle_open_drains(pins, rates, directions.pulled_up(elements, pins, rails))
    islands = island_survey.find_islands(board, rails, pins, elements)
    survey = crossing_survey.find_crossings(board, rails, pins, facts, islands)
    solved = solutions.solve_crossings(survey.crossings, islands, rails, settings)
    # A diode may keep a pin from having any say in what switches a load.
    solved = tuple(one for one in solved if not (one.crossing.to_switch and one.without_effect))
    solved = speeds.with_speeds(solved, islands, rails, rates, settings)
    solved = tuple(
        replace(
            one,
            proposal=remedies.propose(one, speeds.line_of(one.crossing, rates), settings.stray_farads),
            off_states=offstates.power_down(one, islands, rails),
        )
        for one in solved
    )
    return CaseFile(
        board=board,
        rails=rails,
        pins=pins,
        facts=facts,
        islands=islands,
        crossings=solved,
        settings=settings,
        line_rates=rates,
        left_out=island_survey.left_out(board, elements, islands, book),
        not_judged=tuple((pins[entry.part, entry.pin], entry.why) for entry in survey.not_judged)
        + tuple(
            (pins[part, number], "the level on the other side is not known") for part, number, _ in survey.far_ends
        ),
    )


def review_board(
    board: Board, settings: Settings, *, rules_folders: Sequence[Path] = (), facts_files: Sequence[Path] = ()
) -> Review:
    """Review a board that has been read."""
    remarks = unmatched(board, settings)
    settings = settings_from_fields(board, settings)
    book = tradebook.load(extra=extra_rows(facts_files, settings))
    case = open_case(board, settings, book)
    rules = rulebook.load_rules(rules_folders)
    findings = waivers.fingerprinted(rulebook.run_rules(rules, case), case)
    findings, waiver_remarks = waivers.apply_waivers(findings, settings, rules=[rule.name for rule in rules])
    findings = placed(board, findings)
    return Review(
        board=board,
        rails=case.rails,
        crossings=reviewed_crossings(case, findings),
        findings=findings,
        coverage=coverage(case),
        assumptions=assumptions(settings),
        out_of_scope=scope.out_of_scope(case),
        remarks=(*remarks, *waiver_remarks),
        suggestions=unknown_parts(case),
        rows_to_fill=house_rows(case),
    )


def extra_rows(facts_files: Sequence[Path], settings: Settings) -> tuple[Path, ...]:
    """Return the files of further trade rows: those of the command line come before the project's own."""
    return (*facts_files, *([Path(settings.parts_file)] if settings.parts_file else []))


def placed(board: Board, findings: Sequence[Finding]) -> tuple[Finding, ...]:
    """Give each finding the line where its pin, its part or its net stands."""
    places = Places(board)

    def place_of(finding: Finding) -> Place | None:
        found = places.place_of_pin(finding.part, finding.pin) if finding.part and finding.pin else None
        found = found or (places.place_of_part(finding.part) if finding.part else None)
        return found or (places.place_of_net(finding.net) if finding.net else None)

    return tuple(replace(finding, at=finding.at or place_of(finding)) for finding in findings)


def reviewed_crossings(case: CaseFile, findings: Sequence[Finding]) -> tuple[ReviewedCrossing, ...]:
    """Give each crossing its verdict: the worst of its findings, unknown when it was not solved, else sound."""
    by_crossing: dict[int, list[int]] = {}
    for number, finding in enumerate(findings):
        if finding.crossing is not None:
            by_crossing.setdefault(finding.crossing, []).append(number)
    explained = _explained(case, findings)
    result = []
    for index, solved in enumerate(case.crossings):
        numbers = tuple(dict.fromkeys([*by_crossing.get(index, ()), *explained.get(index, ())]))
        outcomes = [findings[number].outcome for number in numbers]
        if not solved.states or solved.why:
            outcomes.append(Outcome.UNKNOWN)
        verdict = Outcome.worst(*outcomes)
        deciding = next((findings[number] for number in numbers if findings[number].outcome is verdict), None)
        condition = (
            deciding.condition
            if deciding is not None
            else " and ".join(text for text in (solved.crossing.condition, solved.crossing.inferred) if text)
        )
        result.append(ReviewedCrossing(solved=solved, verdict=verdict, condition=condition, findings=numbers))
    return tuple(result)


def _explained(case: CaseFile, findings: Sequence[Finding]) -> dict[int, list[int]]:
    """Return, by crossing, the findings that stand for it although they were written at another place."""
    places: dict[str, list[int]] = {}
    for index, solved in enumerate(case.crossings):
        places.setdefault(f"{solved.crossing.receiver.part}.{solved.crossing.receiver.number}", []).append(index)
    found: dict[int, list[int]] = {}
    for number, finding in enumerate(findings):
        if finding.crossing is None:
            continue
        head = case.crossings[finding.crossing].crossing
        for place in finding.also:
            for index in places.get(place, ()):
                here = case.crossings[index].crossing
                if (
                    here.island == head.island
                    or (here.inferred and here.inferred == head.inferred)
                    or (here.inferred and finding.cause.startswith("guess"))
                ):
                    found.setdefault(index, []).append(number)
    return found


def unknown_parts(case: CaseFile) -> tuple[str, ...]:
    """Name the parts of which no row is known although signals were judged on them, each with what teaches them."""
    values = {part.reference: part.value for part in case.board.parts}
    by_value: dict[str, list[str]] = {}
    for pin in case.pins.values():
        if pin.role == "signal" and pin.part not in case.facts and pin.part not in by_value.get(values[pin.part], ()):
            by_value.setdefault(values[pin.part], []).append(pin.part)
    return tuple(
        f"{', '.join(parts)} ({value}): no trade data, taken as ordinary CMOS"
        for value, parts in sorted(by_value.items())
    )


def coverage(case: CaseFile) -> Coverage:
    """Count the signal pins and those that were judged."""
    unjudged = {(pin.part, pin.number): why for pin, why in case.not_judged}
    for solved in case.crossings:
        if not solved.states or solved.why:
            receiver = solved.crossing.receiver
            unjudged.setdefault((receiver.part, receiver.number), solved.why or "the circuit could not be solved")
    signal = [
        pin
        for pin in case.pins.values()
        if pin.role == "signal" or (pin.role == "far-end" and (pin.part, pin.number) in unjudged)
    ]
    return Coverage(
        signal_pins=len(signal),
        judged=sum(1 for pin in signal if (pin.part, pin.number) not in unjudged),
        not_judged=tuple(_not_judged(signal, unjudged)),
        better_than_assumed=sum(1 for pin in signal if pin.role == "signal" and pin.basis is not Basis.ASSUMED),
    )


def _not_judged(pins: Iterable[PinModel], why: Mapping[tuple[str, str], str]) -> Iterable[NotJudged]:
    for pin in pins:
        reason = why.get((pin.part, pin.number))
        if reason is not None:
            yield NotJudged(part=pin.part, pin=pin.number, why=reason, name=pin.name, net=pin.net)


def assumptions(settings: Settings) -> tuple[str, ...]:
    """Say what the whole review took for granted."""
    return (
        f"rails ±{settings.rail_tolerance * 100:g} % unless their source says otherwise",
        f"resistors ±{settings.resistor_tolerance * 100:g} % unless their value says otherwise",
        f"{settings.stray_farads * 1e12:g} pF of stray capacitance per net",
        "parts without data are ordinary CMOS: inputs at 0.7 and 0.3 of their supply, rated 0.3 V beyond it",
        "every supply is up and settled",
        "the models: levels within 20 mV of parts that have these parameters; rates within about 10 % where resistors and loads "
        "decide, twice where the capacitance of a MOSFET does, ten times where a bipolar transistor saturates",
    )
