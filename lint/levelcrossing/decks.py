"""A solved circuit as a SPICE deck, so that anyone can check it with a circuit simulator.

The deck holds the same element equations with the same parameters as the solver; node names are made safe and a comment
says which net each one is. Text from a board is never trusted: comments keep printable characters only.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from levelcrossing.network import GROUND, Branch, Network

# A MOSFET model's own junctions must not conduct: the body diode is an element of its own.
_NO_JUNCTION_AMPS = 1e-28


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """A step of fixed nodes, for the transient analysis of a deck.

    Parameters
    ----------
    before, after : mapping from node to volts
        Fixed nodes that move, with their voltages before and after [V].
    until_s : float
        Length of the analysis [s].
    edge_s : float
        Length of the linear ramp [s].
    points : mapping from node to pairs of time and volts
        Fixed nodes that follow a waveform of their own, linear between its points [s, V].
    longest_s : float
        Longest step that the simulator may take [s]; 0 leaves it the choice.
    """

    before: Mapping[str, float]
    after: Mapping[str, float]
    until_s: float
    edge_s: float = 1e-9
    points: Mapping[str, tuple[tuple[float, float], ...]] = field(default_factory=dict)
    longest_s: float = 0.0


class _Lookup(Protocol):
    def __call__(self, name: str, default: float = 0.0) -> float: ...


@dataclass(frozen=True, slots=True, kw_only=True)
class Names:
    """Safe names for nodes and labels; ``nodes`` maps the network's names to the deck's."""

    nodes: Mapping[str, str]
    labels: Mapping[str, str]


def safe_names(network: Network) -> Names:
    """Return the deck's names, unique without regard to case (simulators ignore it)."""

    def unique(originals: Iterable[str], prefix: str) -> dict[str, str]:
        taken: set[str] = set()
        out = {}
        for original in originals:
            stem = (prefix + re.sub(r"[^a-z0-9]+", "_", original.lower()).strip("_"))[:40] or prefix
            name, count = stem, 1
            while name in taken:
                count += 1
                name = f"{stem}_{count}"
            taken.add(name)
            out[original] = name
        return out

    nodes = unique([node for node in (*network.nodes, *sorted(network.fixed)) if node != GROUND], "n_")
    nodes[GROUND] = "0"
    return Names(nodes=nodes, labels=unique([branch.label for branch in network.branches], ""))


def _plain(text: str) -> str:
    """Return text fit for a comment line."""
    return "".join(character if " " <= character <= "~" else "?" for character in text)


def _number(value: float) -> str:
    return f"{value:.12g}"


def _lines(branch: Branch, names: Names) -> list[str]:
    at = [names.nodes[node] for node in branch.nodes]
    label = names.labels[branch.label]

    def value(name: str, default: float = 0.0) -> float:
        return float(branch.value(name, default))

    if branch.kind == "resistor":
        return [f"R{label} {at[0]} {at[1]} {_number(max(value('ohms'), 1e-6))}"]
    if branch.kind == "capacitor":
        return [f"C{label} {at[0]} {at[1]} {_number(value('farads'))}"] if value("farads") > 0 else []
    if branch.kind == "current":
        return [f"I{label} {at[0]} {at[1]} DC {_number(value('amps'))}"]
    if branch.kind == "diode":
        return _diode_lines(label, at, value, zener="zener_amps" in branch.values)
    if branch.kind == "bipolar":
        kind = "NPN" if value("polarity") > 0 else "PNP"
        return [
            f"Q{label} {at[0]} {at[1]} {at[2]} m_{label}",
            f".model m_{label} {kind}(IS={_number(value('saturation_amps'))} BF={_number(value('beta_forward'))}"
            f" BR={_number(value('beta_reverse'))} RB={_number(value('base_ohms'))}",
            f"+ CJE={_number(value('cbe_farads'))} MJE=0 CJC={_number(value('cbc_farads'))} MJC=0"
            f" TF={_number(value('transit_s'))} TR={_number(value('reverse_transit_s'))})",
        ]
    return _mosfet_lines(label, at, value, body="body_amps" in branch.values)


def _diode_lines(label: str, at: list[str], value: _Lookup, *, zener: bool) -> list[str]:
    isat, ideality = _number(value("saturation_amps")), _number(value("ideality"))
    inside, ohms = at[0], value("series_ohms")
    lines = []
    if ohms > 0:
        inside = f"{label}_j"
        lines.append(f"R{label}_s {at[0]} {inside} {_number(ohms)}")
    lines += [
        f"D{label} {inside} {at[1]} m_{label}",
        f".model m_{label} D(IS={isat} N={ideality} TT={_number(value('transit_s'))})",
    ]
    if value("junction_farads") > 0:
        lines.append(f"C{label}_j {inside} {at[1]} {_number(value('junction_farads'))}")
    if zener:
        anode, offset = at[1], value("zener_offset_volts")
        if offset:
            anode = f"{label}_z"
            lines.append(f"V{label}_z {at[1]} {anode} DC {_number(offset)}")
        lines += [
            f"D{label}_z {anode} {inside} z_{label}",
            f".model z_{label} D(IS={_number(value('zener_amps'))} N={_number(value('zener_ideality', 1.0))})",
        ]
    return lines


def _mosfet_lines(label: str, at: list[str], value: _Lookup, *, body: bool) -> list[str]:
    n_channel = value("polarity") > 0
    drain, gate, source = at
    threshold = value("threshold_volts") * (1 if n_channel else -1)
    bulk, lines = source, []
    if not body:
        # A pass transistor without a body diode: its bulk lies where no junction can ever conduct, yet not so far that
        # the simulator's leakage across those junctions (1e-12 S) shows.
        bulk = f"{label}_bulk"
        lines.append(f"V{label}_bulk {bulk} 0 DC {-30 if n_channel else 30}")
    lines += [
        f"M{label} {drain} {gate} {source} {bulk} m_{label} L=100u W=100u",
        f".model m_{label} {'N' if n_channel else 'P'}MOS(LEVEL=1 VTO={_number(threshold)} KP={_number(value('gain'))}"
        f" IS={_NO_JUNCTION_AMPS})",
    ]
    if body:
        ends = f"{source} {drain}" if n_channel else f"{drain} {source}"
        lines += [
            f"D{label}_b {ends} b_{label}",
            f".model b_{label} D(IS={_number(value('body_amps'))} N={_number(value('body_ideality', 1.0))})",
        ]
    for name, a, b in (("gs", gate, source), ("gd", gate, drain), ("ds", drain, source)):
        if value(f"c{name}_farads") > 0 and a != b:
            lines.append(f"C{label}_{name} {a} {b} {_number(value(f'c{name}_farads'))}")
    return lines


def deck(
    network: Network,
    title: str,
    *,
    member: int = 0,
    step: Step | None = None,
    watch: Sequence[str] = (),
    remarks: Sequence[str] = (),
    measures: Sequence[str] = (),
    tolerance: float = 1e-4,
) -> str:
    """Write one member of a network as a deck that a SPICE simulator runs as it is.

    Parameters
    ----------
    network : Network
    title : str
        First line of the deck.
    member : int
        Which member of the batch.
    step : Step, optional
        Adds a transient analysis in which fixed nodes ramp from one voltage to another.
    watch : sequence of str
        Nodes whose edges the transient measures; their voltages are printed.
    remarks : sequence of str
        Comment lines under the title.
    measures : sequence of str
        ``.meas`` lines; ``{watch}`` in them stands for the voltage of the first watched node.
    tolerance : float
        Relative tolerance asked of the simulator [1].

    Returns
    -------
    str
    """
    one = network.member(member)
    names = safe_names(one)
    lines = [f"* {_plain(title)}", *(f"* {_plain(remark)}" for remark in remarks), "*", "* nodes:"]
    lines += [f"*   {safe:<24} {_plain(node)}" for node, safe in names.nodes.items() if node != GROUND]
    lines += ["*", f".options temp=27 tnom=27 gmin=1e-12 abstol=1e-13 vntol=1e-8 chgtol=1e-18 reltol={tolerance:g}"]
    if step:
        # A seventh of the usual allowance for the error of a step: the edges are what we are after.
        lines.append(".options method=trap trtol=1")
    lines.append("* supplies and drivers")
    for node, volts in sorted(one.fixed.items()):
        if node == GROUND:
            continue
        safe = names.nodes[node]
        before = float(step.before.get(node, volts)) if step else float(volts)
        after = float(step.after.get(node, volts)) if step else float(volts)
        wave = ""
        if step and node in step.points:
            wave = f" PWL({' '.join(f'{_number(t)} {_number(v)}' for t, v in step.points[node])})"
        elif step and before != after:
            wave = f" PWL(0 {_number(before)} {_number(step.edge_s)} {_number(after)})"
        lines.append(f"V{safe} {safe} 0 DC {_number(before)}{wave}")
    for branch in one.branches:
        lines.append(f"* {_plain(branch.label)}: {branch.kind} between {', '.join(map(_plain, branch.nodes))}")
        lines += _lines(branch, names)
    lines += _leaks(one, names)
    lines.append(".op")
    if step:
        longest = f" 0 {_number(step.longest_s)}" if step.longest_s else ""
        lines.append(f".tran {_number(step.until_s / 500)} {_number(step.until_s)}{longest}")
        if watch:
            lines.append(".print tran " + " ".join(f"v({names.nodes[node]})" for node in watch))
            lines += [line.replace("{watch}", f"v({names.nodes[watch[0]]})") for line in measures]
    lines += [".end", ""]
    return "\n".join(lines)


def _leaks(network: Network, names: Names) -> list[str]:
    """Return leakage to ground for nodes that nothing conducting reaches; a simulator stops without it."""
    from levelcrossing.arrays import lay_out

    loose = lay_out(network)[1]
    nodes = sorted(node for group in loose for node in group if node in names.nodes)
    if not nodes:
        return []
    lines = ["* these nodes hang on nothing that conducts; a leakage of 1e12 ohm stands in"]
    return lines + [f"Rleak_{names.nodes[node]} {names.nodes[node]} 0 1e12" for node in nodes]
