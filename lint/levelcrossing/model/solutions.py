"""A crossing with its solution: states, margins, stresses, speeds, what happens with a supply off."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from levelcrossing.model.circuits import Crossing, Element
from levelcrossing.model.findings import Finding
from levelcrossing.model.quantities import Basis, Outcome, Spread
from levelcrossing.model.trade import LineRate


@dataclass(frozen=True, slots=True, kw_only=True)
class Margin:
    """How far a quantity stays on the good side of its limit, over all corners; negative means it is exceeded.

    Parameters
    ----------
    spread : Spread
        Least, nominal and greatest margin.
    worst_corner : str
        The corner of the least margin in words ("R1 +1 %, +5V at 5.25 V").
    at, limit : float
        Value and limit at that corner.
    break_even : str
        The value of a transistor's parameter up to which it holds, where one parameter decides.
    """

    spread: Spread
    worst_corner: str = ""
    at: float = 0.0
    limit: float = 0.0
    break_even: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class StateResult:
    """The solved circuit with the driver in one state.

    Parameters
    ----------
    state : str
        ``high``, ``low`` or ``released``: what the driver does (not what the receiver sees).
    receiver_volts : Spread
        At the receiver's pin, clamps conducting [V].
    open_volts : Spread
        The same with the receiver's own clamps removed; ratings are judged on it [V].
    clamp_amps : Spread
        Current into the receiver's supply through its clamp diode [A].
    driver_amps : Spread
        Current into the driver's pin, positive when it sinks [A].
    driver_volts : Spread
        At the driver's pin [V].
    high_margin : Margin or None
        Receiver voltage minus VIH; None when this state should not be read as high.
    low_margin : Margin or None
        VIL minus receiver voltage; None when this state should not be read as low.
    rating_margin : Margin
        Absolute maximum minus open voltage.
    low_rating_margin : Margin
        Open voltage minus least permitted voltage.
    solved : bool
    why : str
        In circuit words, when it could not be solved ("net X hangs on nothing").
    floating : bool
        The receiver has no path that sets its voltage in this state.
    stresses : tuple of Stress
    """

    state: str
    receiver_volts: Spread
    open_volts: Spread
    clamp_amps: Spread
    driver_amps: Spread
    driver_volts: Spread
    high_margin: Margin | None
    low_margin: Margin | None
    rating_margin: Margin | None
    low_rating_margin: Margin | None
    solved: bool = True
    why: str = ""
    floating: bool = False
    stresses: tuple[Stress, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Stress:
    """A junction or channel voltage against its limit: e.g. part Q1, what ``VGS``, volts, limit [V]."""

    part: str
    what: str
    volts: Spread
    limit_volts: float
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Speed:
    """How fast a crossing is good for.

    Times in seconds, rates in bit/s, load in farads. ``limit`` says what limits ("the rise through R4").
    Each spread runs over the corners; ``usable_bit_s`` is the guaranteed one.
    """

    rise_s: Spread
    fall_s: Spread
    delay_high_s: Spread
    delay_low_s: Spread
    usable_bit_s: float
    nominal_bit_s: float
    load_farads: float
    limit: str = ""
    rise_30_70_s: Spread | None = None
    loaded_bit_s: float | None = None
    accuracy: str = ""
    line: LineRate | None = None

    @property
    def needed_bit_s(self) -> float | None:
        """Rate that the line is judged against [bit/s]."""
        return self.line.needed_bit_s if self.line is not None else None


@dataclass(frozen=True, slots=True, kw_only=True)
class OffState:
    """A power-down case: which rail is off, and what flows.

    ``case`` is ``receiver-off-grounded``, ``receiver-off-floating`` or ``driver-off``. ``into_rail_amps`` flows into
    the dead rail, ``lifted_volts`` is what a floating dead rail rises to.
    """

    case: str
    dead_rail: str
    into_rail_amps: Spread
    lifted_volts: Spread | None
    pin_volts: Spread
    path: str
    rating_margin: Margin | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class SolvedCrossing:
    """A crossing with its solution: what the rules judge.

    Parameters
    ----------
    crossing : Crossing
    states : mapping from state to StateResult
        Empty when nothing could be solved; then ``why`` says why.
    vih, vil, vmax : Spread or None
        The receiver's limits over the corners [V].
    high, low : Spread or None
        Levels that the receiver sees [V]: the state read as high, as low.
    why : str
    speed : Speed or None
    off_states : tuple of OffState
    elements : tuple of Element
        Elements of the island that took part.
    assumptions : tuple of str
        What was taken for granted ("resistors 1 %").
    """

    crossing: Crossing
    states: Mapping[str, StateResult]
    vih: Spread | None = None
    vil: Spread | None = None
    vmax: Spread | None = None
    high: Spread | None = None
    low: Spread | None = None
    why: str = ""
    speed: Speed | None = None
    off_states: tuple[OffState, ...] = ()
    elements: tuple[Element, ...] = ()
    assumptions: tuple[str, ...] = ()
    proposal: str = ""

    @property
    def without_effect(self) -> bool:
        """Tell whether the receiver sees the same voltage whatever the driver does: within 10 mV at the usual values."""
        volts = [state.receiver_volts.nominal for state in self.states.values() if state.solved]
        return len(volts) > 1 and max(volts) - min(volts) < 0.01

    def finding(
        self,
        index: int,
        rule: str,
        outcome: Outcome,
        text: str,
        *,
        remedy: str = "",
        cause: str = "",
        condition: str = "",
        part: str = "",
        level: bool = False,
    ) -> Finding:
        """Return a finding at the receiver of this crossing.

        A level that was only inferred proves nothing: the outcome becomes ``unknown`` and the condition says on what it
        depends. A receiver of which nothing is known adds that to the condition.

        Parameters
        ----------
        index : int
            Place of this crossing among the case's crossings.
        rule, outcome, text, remedy, cause
            As of :class:`Finding`.
        condition : str
            A further condition.
        part : str
            The part at fault when that is not the receiver's (its pin and net stay the receiver's otherwise).
        level : bool
            The finding is about a level that the receiver reads, not about what it bears.
        """
        crossing = self.crossing
        conditions = [crossing.condition, condition]
        if level and crossing.level_if:
            conditions.append(crossing.level_if)
            outcome = Outcome.UNKNOWN
        receive = crossing.receiver.receive
        if receive is not None and receive.basis is Basis.ASSUMED and not crossing.receiver.inferred_far_end:
            conditions.append(f"{crossing.receiver.part} is an ordinary CMOS part (no data on it)")
        drive = crossing.driver.drive if crossing.driver is not None else None
        if (
            drive is not None
            and drive.basis is Basis.ASSUMED
            and crossing.driver is not None
            and crossing.driver.role == "signal"
            and crossing.driver.facts is None
        ):
            conditions.append(f"{crossing.driver.part} drives like an ordinary CMOS part (no data on it)")
        if crossing.inferred:
            conditions.append(crossing.inferred)
            outcome = Outcome.UNKNOWN
            # One guess about one connector is one matter, however many of its lines it concerns.
            far = crossing.receiver if crossing.receiver.inferred_far_end else crossing.driver
            near = crossing.driver if far is crossing.receiver else crossing.receiver
            cause = f"guess {rule} {far.part if far else ''}"
            volts = near.supply_volts.nominal if near is not None and near.supply_volts is not None else 5.0
            remedy = f'Declare what is plugged in: under [far_ends] in levelcrossing.toml, "{far.part if far else ""}" = {{rail = "{volts:.3g}"}}.'
        sources = [
            pin.source for pin in (receive, (crossing.driver.drive if crossing.driver else None)) if pin is not None
        ]
        return Finding(
            rule=rule,
            outcome=outcome,
            text=text,
            remedy=remedy or self.proposal,
            part=part or crossing.receiver.part,
            pin="" if part else crossing.receiver.number,
            net=crossing.receiver.net,
            condition=" and ".join(dict.fromkeys(condition for condition in conditions if condition)),
            basis=crossing.basis,
            crossing=index,
            sources=tuple(dict.fromkeys(sources)),
            cause=cause,
        )
