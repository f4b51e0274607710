"""What a regulator asks of its input: no more than it bears, and enough above its output."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from levelcrossing import units
from levelcrossing.model import Basis, Rail, RailRemark, Spread
from levelcrossing.rail_scene import Scene
from levelcrossing.rail_sources import Conversion


def regulator_remarks(
    scene: Scene, conversions: Iterable[Conversion], by_net: Mapping[str, Rail]
) -> Iterator[RailRemark]:
    """Yield what is wrong with the input voltage of regulators.

    Parameters
    ----------
    scene : Scene
    conversions : iterable of Conversion
    by_net : mapping from net name to Rail

    Yields
    ------
    RailRemark
        ``input-range`` above the most that the regulator bears, ``dropout`` below its output plus its dropout, both at
        the usual voltage of the input.
    """
    for one in conversions:
        if one.part not in scene.regulators:
            continue
        source, made = by_net.get(one.source), by_net.get(one.output)
        if source is None or source.volts is None or source.volts.nominal <= 0:
            continue
        yield from _input_remark(scene, one, source, source.volts)
        if made is not None and made.volts is not None and made.volts.nominal > 0:
            yield from _dropout_remark(scene, one, source.volts, made, made.volts)


def _input_remark(scene: Scene, one: Conversion, source: Rail, volts: Spread) -> Iterator[RailRemark]:
    most = scene.regulators[one.part].input_max_volts
    if most is None or not units.exceeds(volts.nominal, most):
        return
    gets, bears = units.format_volts_apart(volts.nominal, most)
    yield RailRemark(
        kind="input-range",
        net=source.net,
        part=one.part,
        text=f"{scene.title(one.part)} bears {bears} at its input; {source.net} gives it {gets}.",
        remedy=f"Take a regulator rated for {units.format_volts(volts.high)} or more.",
        basis=Basis.weakest(source.basis, Basis.LIBRARY),
    )


def _dropout_remark(scene: Scene, one: Conversion, volts: Spread, made: Rail, output: Spread) -> Iterator[RailRemark]:
    facts = scene.regulators[one.part]
    switching = facts.through_inductor or any(scene.switching(pin.net) for pin in scene.parts[one.part].pins if pin.net)
    room = volts.nominal - output.nominal
    if facts.dropout_volts is None or facts.isolated or switching or units.at_least(room, facts.dropout_volts):
        return
    needs = units.format_volts(facts.dropout_volts)
    source = f"{one.source} at {units.format_volts(volts.nominal)}"
    leaves = f"{units.format_volts(room)} above {units.format_volts(output.nominal)}"
    yield RailRemark(
        kind="dropout",
        net=made.net,
        part=one.part,
        text=f"{scene.title(one.part)} needs {needs} between input and output at full load; {source} leaves {leaves}.",
        remedy="Check the load against the dropout curve, feed it from a higher rail, or take one with less dropout.",
        basis=Basis.weakest(made.basis, Basis.LIBRARY),
    )
