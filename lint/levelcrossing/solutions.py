"""Solve every crossing at every state and corner, and hold the answer against the receiver's limits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import product

import numpy as np
import numpy.typing as npt

from levelcrossing.breakeven import break_even
from levelcrossing.circuits import MOST_NODES, Builder, level_at
from levelcrossing.corners import Codes, Variable, all_corners, chosen_corners, in_words, one_at_a_time
from levelcrossing.model import (
    Basis,
    BipolarFacts,
    Crossing,
    Element,
    Island,
    Level,
    Margin,
    MosfetFacts,
    PinModel,
    Rails,
    Settings,
    SolvedCrossing,
    Spread,
    StateResult,
    Stress,
)
from levelcrossing.network import GROUND, Network
from levelcrossing.solve import DcSolution, solve_dc

Vector = npt.NDArray[np.float64]
# More variables than this are not combined in full.
FULL_VARIABLES = 8


def solve_crossings(
    crossings: Sequence[Crossing], islands: Sequence[Island], rails: Rails, settings: Settings
) -> tuple[SolvedCrossing, ...]:
    """Solve the DC states of every crossing.

    Parameters
    ----------
    crossings : sequence of Crossing
    islands : sequence of Island
        As cut from the board; ``Crossing.island`` indexes them.
    rails : Rails
    settings : Settings

    Returns
    -------
    tuple of SolvedCrossing
        In the order given.
    """
    del settings
    solver = _Solver(islands, rails)
    return tuple(solver.solve(crossing) for crossing in crossings)


def planned_states(crossing: Crossing) -> tuple[str, ...]:
    """Return the states in which the electrical driver of a crossing can leave the net."""
    pin = crossing.stage_driver or crossing.driver
    if pin is None or pin.drive is None:
        return ("released",)
    return {"open-drain": ("released", "low"), "open-source": ("high", "released")}.get(
        pin.drive.style, ("high", "low")
    )


class _Solver:
    def __init__(self, islands: Sequence[Island], rails: Rails) -> None:
        self.islands = islands
        self.rails = rails
        self._memory: dict[tuple[object, ...], tuple[_Answer, ...]] = {}

    def solve(self, crossing: Crossing) -> SolvedCrossing:
        """Return one crossing with its states; ``why`` tells when it could not be solved."""
        if crossing.island < 0:
            return self._tied(crossing)
        island = self.islands[crossing.island]
        island = with_end(island, crossing)
        if len(island.nets) > MOST_NODES:
            island = neighbourhood(island, crossing)
            if len(island.nets) > MOST_NODES:
                return SolvedCrossing(
                    crossing=crossing,
                    states={},
                    why=f"{len(island.nets)} nets hang together here: too large to be a level shifter",
                )
        states: dict[str, StateResult] = {}
        limits: _Limits | None = None
        partners = combined_drivers(crossing, island)
        for state in planned_states(crossing):
            for name, others in _combinations(state, partners):
                result, limits = self._state(crossing, island, state, others)
                states[name] = replace(result, state=name)
        return _collected(crossing, island, states, limits)

    def _tied(self, crossing: Crossing) -> SolvedCrossing:
        """Judge an input tied straight to a rail: the voltage is the rail's, nothing need be solved."""
        net = crossing.receiver.net
        volts = self.rails.volts(net)
        assert volts is not None
        variables = [Variable(key=net, spread=volts, unit="V")]
        supply = crossing.receiver.supply_volts
        assert supply is not None
        variables.append(
            Variable(key=crossing.receiver_rail or f"supply inside {crossing.receiver.part}", spread=supply, unit="V")
        )
        codes = all_corners(2)
        at = np.array([volts.low, volts.nominal, volts.high])[codes[0]]
        supplies = np.array([supply.low, supply.nominal, supply.high])[codes[1]]
        limits = _Limits.of(crossing.receiver, supplies)
        nothing = np.zeros_like(at)
        answer = _Answer(
            receiver=at,
            open=at,
            clamp=nothing,
            driver_amps=nothing,
            driver=at,
            solved=np.ones(at.shape, bool),
            floating=False,
            why="",
            stresses=(),
        )
        result = _judged("released", answer, limits, codes, variables, reads_high=True, reads_low=False)
        return SolvedCrossing(
            crossing=crossing,
            states={"released": result},
            vih=limits.spread(limits.vih),
            vil=limits.spread(limits.vil),
            vmax=limits.spread(limits.vmax),
            high=result.receiver_volts,
        )

    def _state(
        self, crossing: Crossing, island: Island, state: str, others: Sequence[tuple[PinModel, str]] = ()
    ) -> tuple[StateResult, _Limits]:
        pin = crossing.stage_driver or crossing.driver
        builder = Builder(island, self.rails, pin, state, others=others)
        receiver = crossing.receiver
        supply_key = builder.supply_key(receiver)
        plan = builder.plan
        variables = plan.variables
        if plan.missing:
            why = f"the value of {', '.join(dict.fromkeys(plan.missing))} is not known"
            codes = one_at_a_time(0) if not variables else all_corners(0)
            del codes
            return _unsolved(state, why), _Limits.of(receiver, _nominal_supply(receiver))
        probe = _Probe(crossing, island, state, builder)
        influence: list[float] = [0.0] * len(variables)
        if len(variables) > FULL_VARIABLES:
            single = one_at_a_time(len(variables))
            answer = probe.answer(single)
            count = len(variables)
            up = answer.receiver[1 + count :]
            down = answer.receiver[1 : 1 + count]
            influence = [float(value) for value in up - down]
            codes = chosen_corners(count, influence)
        else:
            codes = all_corners(len(variables))
        answer = probe.answer(codes)
        if len(variables) <= FULL_VARIABLES:
            influence = _influence(answer.receiver, codes)
        supplies = plan.values(supply_key, codes) if supply_key is not None else _nominal_supply(receiver)
        limits = _Limits.of(receiver, supplies)
        reads = receiver.receive is not None and receiver.receive.reads
        drives_high = state in ("high", "released") and not (
            state == "released" and pin is not None and pin.drive is not None and pin.drive.style == "open-source"
        )
        seen_high = drives_high != crossing.inverting
        if others:
            # Several signals meet in one circuit, a gate: which level is meant follows from the level that is there.
            seen_high = bool(answer.receiver[0] >= (limits.vih[0] + limits.vil[0]) / 2)
        result = _judged(
            state,
            answer,
            limits,
            codes,
            variables,
            reads_high=seen_high and reads,
            reads_low=not seen_high and reads,
            influence=influence,
        )
        result = self._with_break_evens(result, probe, receiver, supply_key, codes, answer, limits)
        if receiver.inferred_far_end and receiver.drive is not None and receiver.drive.basis is Basis.TRACED:
            # What is plugged in there works at the level of the pull-up; what it bears is its own affair.
            result = replace(result, rating_margin=None, low_rating_margin=None)
        return result, limits

    @staticmethod
    def _with_break_evens(
        result: StateResult,
        probe: _Probe,
        receiver: PinModel,
        supply_key: str | None,
        codes: Codes,
        answer: _Answer,
        limits: _Limits,
    ) -> StateResult:
        """Add, to each level that fails in a corner, the parameter's value up to which it holds."""
        plan = probe.builder.plan

        def found(margin: Margin | None, limit: str, sign: float, at_corners: Vector) -> Margin | None:
            if margin is None or not result.solved or margin.spread.low >= -1e-6:
                return margin
            worst = codes[:, int(np.argmin(sign * (answer.receiver - at_corners)))]

            def margin_of(swept: Codes) -> Vector:
                volts = plan.values(supply_key, swept) if supply_key is not None else _nominal_supply(receiver)
                level = getattr(_Limits.of(receiver, volts), limit)
                return np.asarray(sign * (probe.answer(swept).receiver - level))

            return replace(margin, break_even=break_even(margin_of, plan.variables, worst))

        return replace(
            result,
            high_margin=found(result.high_margin, "vih", 1.0, limits.vih),
            low_margin=found(result.low_margin, "vil", -1.0, limits.vil),
        )


def combined_drivers(crossing: Crossing, island: Island) -> tuple[PinModel, ...]:
    """Return the other outputs that meet the crossing's driver in one transistor: together they make a gate.

    Parameters
    ----------
    crossing : Crossing
    island : Island

    Returns
    -------
    tuple of PinModel
        Sure push-pull outputs on the terminals of a transistor of the link, directly or through resistors; two at most.
    """
    driver = crossing.stage_driver or crossing.driver
    if driver is None:
        return ()
    terminals = {
        net
        for element in island.elements
        if element.part in crossing.link and element.kind in ("mosfet", "bipolar")
        for net in element.nets
    }
    if not terminals:
        return ()
    reach = set(terminals)
    for element in island.elements:
        if element.kind in ("resistor", "link") and terminals & set(element.nets):
            reach.update(element.nets)
    found = [
        pin
        for pin in island.pins
        if pin.net in reach
        and pin.drive is not None
        and pin.drive.style == "push-pull"
        and not pin.when
        and pin.role == "signal"
        and (pin.part, pin.number) != (driver.part, driver.number)
        and pin.net not in (driver.net, crossing.receiver.net)
        and pin.supply_volts is not None
    ]
    return tuple(found[:2])


def _combinations(state: str, partners: Sequence[PinModel]) -> list[tuple[str, tuple[tuple[PinModel, str], ...]]]:
    """Return every combination of the partners' states with a name for it."""
    if not partners:
        return [(state, ())]
    combinations = []
    for choice in product(("high", "low"), repeat=len(partners)):
        others = tuple(zip(partners, choice, strict=True))
        words = ", ".join(f"{pin.part}.{pin.number} {level}" for pin, level in others)
        combinations.append((f"{state} with {words}", others))
    return combinations


class _Answer:
    """Arrays over the corners of one state."""

    __slots__ = ("clamp", "driver", "driver_amps", "floating", "open", "receiver", "solved", "stresses", "why")

    def __init__(
        self,
        *,
        receiver: Vector,
        open: Vector,
        clamp: Vector,
        driver_amps: Vector,
        driver: Vector,
        solved: npt.NDArray[np.bool_],
        floating: bool,
        why: str,
        stresses: tuple[Stress, ...],
    ) -> None:
        self.receiver = receiver
        self.open = open
        self.clamp = clamp
        self.driver_amps = driver_amps
        self.driver = driver
        self.solved = solved
        self.floating = floating
        self.why = why
        self.stresses = stresses


class _Probe:
    """Solves one state of one crossing for any set of corners."""

    def __init__(self, crossing: Crossing, island: Island, state: str, builder: Builder) -> None:
        self.crossing = crossing
        self.island = island
        self.state = state
        self.builder = builder

    def answer(self, codes: Codes) -> _Answer:
        """Solve with the receiver's clamp and without it."""
        receiver, pin = self.crossing.receiver, self.crossing.stage_driver or self.crossing.driver
        network = self.builder.plan.network(codes)
        clamp = f"clamp of {receiver.part}.{receiver.number}"
        has_clamp = any(branch.label == clamp for branch in network.branches)
        members = codes.shape[1]
        nodes = network.nodes
        if receiver.net not in nodes:
            nothing = np.zeros(members)
            return _Answer(
                receiver=nothing, open=nothing, clamp=nothing, driver_amps=nothing, driver=nothing,
                solved=np.ones(members, bool), floating=True, why=f"{receiver.net} hangs on nothing", stresses=(),
            )  # fmt: skip
        solution = solve_dc(network)
        volts = _wide(solution.volts[receiver.net], members)
        bare = solution
        if has_clamp:
            bare = solve_dc(network.without(clamp), start=solution)
        opened = _wide(bare.volts[receiver.net], members) if receiver.net in bare.network.nodes else volts
        amps = _wide(solution.branch_amps(clamp)[0], members) if has_clamp else np.zeros(members)
        driver_amps, driver_volts = np.zeros(members), np.zeros(members)
        if pin is not None:
            driver_volts = _wide(solution.volts.get(pin.net, np.zeros(1)), members)
            if self.state != "released" and pin.drive is not None:
                driver_amps = _wide(solution.branch_amps(f"output of {pin.part}.{pin.number}")[1], members)
        loose = bare.floats.get(receiver.net)
        # Once its own clamp is left aside, a pin that nothing else touches hangs in the air.
        alone = receiver.net not in bare.network.nodes
        floating = alone or bool(loose is not None and bool(_wide_flag(loose, members)[0]))
        return _Answer(
            receiver=volts,
            open=opened,
            clamp=amps,
            driver_amps=driver_amps,
            driver=driver_volts,
            solved=_wide_flag(solution.solved, members) & _wide_flag(bare.solved, members),
            floating=floating,
            why=solution.why if not solution.solved.all() else "",
            stresses=_stresses(self.island, solution, self.builder, members),
        )


class _Limits:
    """The receiver's limits at each corner."""

    def __init__(self, vih: Vector, vil: Vector, vmax: Vector, vmin: Vector) -> None:
        self.vih, self.vil, self.vmax, self.vmin = vih, vil, vmax, vmin

    @staticmethod
    def of(pin: PinModel, supplies: Vector) -> _Limits:
        """Evaluate the limits of a pin at an array of supply voltages [V]."""
        receive = pin.receive
        assert receive is not None

        def at(level: Level) -> Vector:
            return level_at(level, supplies)

        return _Limits(at(receive.vih), at(receive.vil), at(receive.vmax), at(receive.vmin))

    @staticmethod
    def spread(values: Vector) -> Spread:
        """Return the spread of an array whose first member is the nominal one."""
        return spread_of(values)


def spread_of(values: Vector) -> Spread:
    """Return least, nominal (member 0) and greatest of an array over corners."""
    return Spread(low=float(values.min()), nominal=float(values[0]), high=float(values.max()))


def _nominal_supply(pin: PinModel) -> Vector:
    assert pin.supply_volts is not None
    return np.array([pin.supply_volts.nominal])


def _wide(values: Vector, members: int) -> Vector:
    return np.broadcast_to(np.asarray(values, dtype=float), (members,))


def _wide_flag(values: npt.NDArray[np.bool_], members: int) -> npt.NDArray[np.bool_]:
    return np.broadcast_to(values, (members,))


def _influence(values: Vector, codes: Codes) -> list[float]:
    """Return how the result moves with each variable: mean over its high corners minus mean over its low ones."""
    out = []
    for row in codes:
        high, low = values[row == 2], values[row == 0]
        out.append(float(high.mean() - low.mean()) if high.size and low.size else 0.0)
    return out


def _margin(
    value: Vector,
    limit: Vector,
    sign: float,
    codes: Codes,
    variables: Sequence[Variable],
    influence: Sequence[float] | None,
) -> Margin:
    margins = sign * (value - limit)
    worst = int(np.argmin(margins))
    return Margin(
        spread=spread_of(margins),
        worst_corner=in_words(variables, [int(code) for code in codes[:, worst]], influence),
        at=float(value[worst]),
        limit=float(np.broadcast_to(limit, value.shape)[worst]),
    )


def _judged(
    state: str,
    answer: _Answer,
    limits: _Limits,
    codes: Codes,
    variables: Sequence[Variable],
    *,
    reads_high: bool,
    reads_low: bool,
    influence: Sequence[float] | None = None,
) -> StateResult:
    def margin(value: Vector, limit: Vector, sign: float) -> Margin:
        return _margin(value, limit, sign, codes, variables, influence)

    return StateResult(
        state=state,
        receiver_volts=spread_of(answer.receiver),
        open_volts=spread_of(answer.open),
        clamp_amps=spread_of(answer.clamp),
        driver_amps=spread_of(answer.driver_amps),
        driver_volts=spread_of(answer.driver),
        high_margin=margin(answer.receiver, limits.vih, 1.0) if reads_high and not answer.floating else None,
        low_margin=margin(answer.receiver, limits.vil, -1.0) if reads_low and not answer.floating else None,
        rating_margin=margin(answer.open, limits.vmax, -1.0) if not answer.floating else None,
        low_rating_margin=margin(answer.open, limits.vmin, 1.0) if not answer.floating else None,
        solved=bool(answer.solved.all()),
        why=answer.why,
        floating=answer.floating,
        stresses=answer.stresses,
    )


def _unsolved(state: str, why: str) -> StateResult:
    zero = Spread.exactly(0.0)
    return StateResult(
        state=state, receiver_volts=zero, open_volts=zero, clamp_amps=zero, driver_amps=zero, driver_volts=zero,
        high_margin=None, low_margin=None, rating_margin=None, low_rating_margin=None, solved=False, why=why,
    )  # fmt: skip


def _collected(
    crossing: Crossing, island: Island, states: Mapping[str, StateResult], limits: _Limits | None
) -> SolvedCrossing:
    high = next((result.receiver_volts for result in states.values() if result.high_margin is not None), None)
    low = next((result.receiver_volts for result in states.values() if result.low_margin is not None), None)
    bad = [result.why for result in states.values() if not result.solved]
    return SolvedCrossing(
        crossing=crossing,
        states=states,
        vih=spread_of(limits.vih) if limits else None,
        vil=spread_of(limits.vil) if limits else None,
        vmax=spread_of(limits.vmax) if limits else None,
        high=high,
        low=low,
        why="; ".join(dict.fromkeys(bad)),
        elements=island.elements,
    )


def _stresses(island: Island, solution: DcSolution, builder: Builder, members: int) -> tuple[Stress, ...]:
    """Return the junction and channel voltages that have a limit."""

    def at(net: str) -> Vector:
        return _wide(solution.volts[builder.node(net)], members)

    found: list[Stress] = []
    for element in island.elements:
        facts = element.facts
        if isinstance(facts, MosfetFacts):
            drain, gate, source = (at(net) for net in element.nets)
            across = np.maximum(np.abs(gate - source), np.abs(gate - drain))
            found.append(_stress(element, "VGS", across, facts.vgs_max_volts, facts.provenance.source))
            found.append(_stress(element, "VDS", np.abs(drain - source), facts.vds_max_volts, facts.provenance.source))
        elif isinstance(facts, BipolarFacts):
            collector, base, emitter = (at(net) for net in element.nets)
            sign = 1.0 if facts.polarity == "npn" else -1.0
            found.append(_stress(element, "VEB", sign * (emitter - base), facts.vebo_volts, facts.provenance.source))
            found.append(
                _stress(element, "VCE", sign * (collector - emitter), facts.vceo_volts, facts.provenance.source)
            )
    return tuple(found)


def _stress(element: Element, what: str, values: Vector, limit: float, source: str) -> Stress:
    return Stress(part=element.part, what=what, volts=spread_of(values), limit_volts=limit, source=source)


def with_end(island: Island, crossing: Crossing) -> Island:
    """Return the island with the crossing's own receiver and driver in place of the pins as first modelled.

    The survey may have given a far end its level or a driver its certainty; the circuit must use those.
    """
    replaced = {
        (pin.part, pin.number): pin
        for pin in (crossing.receiver, crossing.driver, crossing.stage_driver)
        if pin is not None
    }
    return replace(island, pins=tuple(replaced.get((pin.part, pin.number), pin) for pin in island.pins))


def neighbourhood(island: Island, crossing: Crossing) -> Island:
    """Return the part of a large island that matters to a crossing: the link, its ends and what touches them."""
    pin = crossing.stage_driver or crossing.driver
    on_way = {crossing.receiver.net} | ({pin.net} if pin is not None else set())
    on_way |= {
        net
        for element in island.elements
        if element.part in crossing.link
        for net in element.nets
        if net in island.nets
    }
    kept = [element for element in island.elements if any(net in on_way for net in element.nets)]
    nets = sorted(on_way | {net for element in kept for net in element.nets if net in island.nets})
    return replace(
        island,
        nets=tuple(nets),
        elements=tuple(kept),
        pins=tuple(pin for pin in island.pins if pin.net in on_way or pin.net in nets),
    )


def network_of(crossing: Crossing, islands: Sequence[Island], rails: Rails, state: str) -> Network:
    """Return the nominal circuit of a crossing in one state, for decks and for people who check."""
    island = with_end(islands[crossing.island], crossing)
    if len(island.nets) > MOST_NODES:
        island = neighbourhood(island, crossing)
    builder = Builder(island, rails, crossing.stage_driver or crossing.driver, state)
    return builder.plan.network(
        all_corners(0) if not builder.plan.variables else one_at_a_time(len(builder.plan.variables))[:, :1]
    )


__all__ = ["GROUND", "neighbourhood", "network_of", "planned_states", "solve_crossings", "spread_of", "with_end"]
