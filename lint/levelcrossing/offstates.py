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


def can_be_off(rails: Rails, dead: str, live: str) -> bool:
    """Tell whether the board itself shows that one rail can be down while another is up.

    Parameters
    ----------
    rails : Rails
    dead, live : str
        Nets of the two rails.

    Returns
    -------
    bool
        False when everything that feeds ``live`` also feeds ``dead``, and when nothing tells where ``dead`` comes from: a
        rail that only has a name proves no switch.
    """
    rail = rails.by_net.get(dead)
    if rail is None or not live or dead == live:
        return False
    if _above(rails, dead) & _above(rails, live):
        return False
    source = rails.by_net.get(rail.domain, rail)
    switched = any(item.kind in ("regulator", "feedback") for item in source.evidence) and not source.fed_by
    return switched or any(item.kind in ("connector", "battery", "settings") for item in source.evidence)


def _above(rails: Rails, net: str) -> set[str]:
    """Return a rail with all that feeds it, also one of several through diodes."""
    found: set[str] = set()
    queue = [net]
    while queue:
        here = queue.pop()
        if not here or here in found:
            continue
        found.add(here)
        rail = rails.by_net.get(here)
        if rail is None:
            continue
        queue += [rail.fed_by, rail.domain]
        for item in rail.evidence:
            if item.kind in ("diode", "upstream"):
                queue += [word for word in item.text.replace(",", " ").split() if word in rails.by_net]
    return found


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
    if crossing.island < 0 or not solved.states:
        return ()
    receiver_dies, driver_dies = can_be_off(rails, dead, live), can_be_off(rails, live, dead)
    if not (receiver_dies or driver_dies):
        return ()
    island = with_end(islands[crossing.island], crossing)
    if len(island.nets) > MOST_NODES:
        island = neighbourhood(island, crossing)
    found: list[OffState] = []
    drives_high = driver is not None and driver.drive is not None and driver.drive.style != "open-drain"
    state = "high" if drives_high else "released"
    if receiver_dies and receiver.receive is not None:
        for case, override in (("receiver-off-grounded", DEAD), ("receiver-off-floating", None)):
            off = _receiver_off(case, crossing, island, rails, driver, state, dead, override)
            if off is not None:
                found.append(off)
    if driver_dies and driver is not None and driver.drive is not None:
        off = _driver_off(crossing, island, rails, driver, live)
        if off is not None:
            found.append(off)
    return tuple(found)


def _solve(builder: Builder) -> tuple[Network, object, int]:
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
    """Solve with the driver's supply gone: its output stage still has a diode to that supply, unless it is rated otherwise."""
    known = driver.facts
    off_rated = (driver.receive is not None and driver.receive.off_tolerant) or (
        known is not None and known.vmax_off is not None
    )
    assert driver.drive is not None
    if off_rated or driver.drive.style == "open-drain" or driver.role == "far-end":
        return None
    passive = replace(driver, receive=driver.receive or _bare_receive(driver.drive), drive=None)
    quiet = replace(
        island,
        pins=tuple(passive if (pin.part, pin.number) == (driver.part, driver.number) else pin for pin in island.pins),
    )
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
