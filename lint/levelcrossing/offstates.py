"""Power-down: what flows when one end of a crossing has lost its supply."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from levelcrossing.circuits import MOST_NODES, Builder
from levelcrossing.corners import all_corners, one_at_a_time
from levelcrossing.model import (
    Crossing,
    Drive,
    Island,
    Level,
    Margin,
    OffState,
    PinModel,
    Rails,
    Receive,
    SolvedCrossing,
    Spread,
)
from levelcrossing.network import Network
from levelcrossing.solutions import FULL_VARIABLES, neighbourhood, spread_of, with_end
from levelcrossing.solve import solve_dc

# What hangs on a floating dead rail while the parts on it sleep [ohm]: 10 kilohm stands for leakage and small loads
# (assumption, said with every figure that rests on it).
DEAD_RAIL_OHMS = 10_000.0
DEAD = Spread(low=0.0, nominal=0.0, high=0.0)


def independent(rails: Rails, first: str, second: str) -> bool:
    """Tell whether one of two rails can be up while the other is down.

    Rails of one domain, and a rail made from the other by a regulator that nothing switches, come and go together.
    """
    if not first or not second or first == second:
        return False
    return _root(rails, first) != _root(rails, second)


def _root(rails: Rails, net: str) -> str:
    seen: set[str] = set()
    while net not in seen:
        seen.add(net)
        rail = rails.by_net.get(net)
        if rail is None:
            return net
        above = rail.fed_by or rail.domain
        if not above or above == net:
            return net
        net = above
    return net


def power_down(solved: SolvedCrossing, islands: Sequence[Island], rails: Rails) -> tuple[OffState, ...]:
    """Solve the power-down cases of a crossing.

    Parameters
    ----------
    solved : SolvedCrossing
    islands : sequence of Island
    rails : Rails

    Returns
    -------
    tuple of OffState
        Receiver's rail held at 0 V and floating, with the driver high; driver's rail at 0 V while the receiver's side
        is up. Empty when both supplies are one, or one is made from the other.
    """
    crossing = solved.crossing
    receiver, driver = crossing.receiver, crossing.stage_driver or crossing.driver
    dead, live = crossing.receiver_rail, crossing.driver_rail
    if crossing.island < 0 or not solved.states or not independent(rails, dead, live):
        return ()
    island = with_end(islands[crossing.island], crossing)
    if len(island.nets) > MOST_NODES:
        island = neighbourhood(island, crossing)
    found: list[OffState] = []
    drives_high = driver is not None and driver.drive is not None and driver.drive.style != "open-drain"
    state = "high" if drives_high else "released"
    if receiver.receive is not None and dead in rails.by_net:
        for case, override in (("receiver-off-grounded", DEAD), ("receiver-off-floating", None)):
            off = _receiver_off(case, crossing, island, rails, driver, state, dead, override)
            if off is not None:
                found.append(off)
    if driver is not None and driver.drive is not None and live in rails.by_net:
        off = _driver_off(crossing, island, rails, driver, live)
        if off is not None:
            found.append(off)
    return tuple(found)


def _solve(builder: Builder, extra: Network | None = None) -> tuple[Network, object, int]:
    del extra
    variables = builder.plan.variables
    codes = all_corners(len(variables)) if len(variables) <= FULL_VARIABLES else one_at_a_time(len(variables))
    network = builder.plan.network(codes)
    return network, codes, codes.shape[1]


def _receiver_off(
    case: str,
    crossing: Crossing,
    island: Island,
    rails: Rails,
    driver: PinModel | None,
    state: str,
    dead: str,
    override: Spread | None,
) -> OffState | None:
    from levelcrossing import devices

    builder = Builder(island, rails, driver, state, rail_overrides={dead: override})
    if builder.plan.missing:
        return None
    network, _, members = _solve(builder)
    if override is None:
        load = devices.resistor("load of the dead rail", dead, "0", DEAD_RAIL_OHMS)
        network = Network(branches=(*network.branches, load), fixed=network.fixed)
    receiver = crossing.receiver
    if receiver.net not in network.nodes:
        return None
    solution = solve_dc(network)
    if not solution.solved.all():
        return None
    pin_volts = np.broadcast_to(solution.volts[receiver.net], (members,))
    lifted: Spread | None = None
    if override is None:
        rail_volts = np.broadcast_to(solution.volts.get(dead, np.zeros(1)), (members,))
        lifted = spread_of(rail_volts)
        amps = rail_volts / DEAD_RAIL_OHMS
    else:
        amps = -np.broadcast_to(solution.amps_from(dead), (members,)) if dead in network.fixed else np.zeros(members)
    receive = receiver.receive
    assert receive is not None
    limit = (receive.vmax_off or receive.vmax).at(0.0)
    return OffState(
        case=case,
        dead_rail=dead,
        into_rail_amps=spread_of(amps),
        lifted_volts=lifted,
        pin_volts=spread_of(pin_volts),
        path=f"{crossing.source} into {receiver.label}",
        rating_margin=Margin(spread=spread_of(limit - pin_volts), at=float(pin_volts.max()), limit=limit),
    )


def _driver_off(crossing: Crossing, island: Island, rails: Rails, driver: PinModel, dead: str) -> OffState | None:
    """The driver's supply is gone: its output stage still has a diode to that supply, unless it is rated otherwise."""
    known = driver.facts
    off_rated = (driver.receive is not None and driver.receive.off_tolerant) or (known is not None and known.vmax_off is not None)
    assert driver.drive is not None
    if off_rated or driver.drive.style == "open-drain" or driver.role == "far-end":
        return None
    passive = replace(driver, receive=driver.receive or _bare_receive(driver.drive), drive=None)
    quiet = replace(island, pins=tuple(passive if (pin.part, pin.number) == (driver.part, driver.number) else pin for pin in island.pins))
    builder = Builder(quiet, rails, None, "released", rail_overrides={dead: DEAD})
    if builder.plan.missing:
        return None
    network, _, members = _solve(builder)
    if driver.net not in network.nodes or dead not in network.fixed:
        return None
    solution = solve_dc(network)
    if not solution.solved.all():
        return None
    amps = -np.broadcast_to(solution.amps_from(dead), (members,))
    return OffState(
        case="driver-off",
        dead_rail=dead,
        into_rail_amps=spread_of(amps),
        lifted_volts=None,
        pin_volts=spread_of(np.broadcast_to(solution.volts[driver.net], (members,))),
        path=f"{crossing.receiver_rail or crossing.receiver.part} into {driver.label}",
    )


def _bare_receive(drive: Drive) -> Receive:
    """Return an output stage seen from outside: it has the diodes of its transistors."""

    def fixed(text: str, value: float) -> Level:
        return Level(text=text, pieces=((0.0, 99.0, lambda _: value),))

    return Receive(
        vih=fixed("0", 0.0),
        vil=fixed("0", 0.0),
        vmax=Level(text="V+0.5", pieces=((0.0, 99.0, lambda volts: volts + 0.5),)),
        vmin=fixed("-0.5", -0.5),
        vmax_off=None,
        clamp_high=True,
        clamp_low=True,
        injection_amps=None,
        capacitance_farads=Spread.exactly(5e-12),
        leakage_amps=1e-6,
        off_tolerant=False,
        basis=drive.basis,
        source=drive.source,
    )
