"""A kiln logger as boards and as saved reviews, for tests of what a revision changed."""

from __future__ import annotations

from typing import Any

from levelcrossing.differences import Comparison, Side, empty_form
from levelcrossing.model import Board, Net, Part, Pin, Settings

# A kiln logger: U1 on 5 V talks to U2 on 3.3 V on four equal channels, each through a divider of its own.
CHANNELS = range(1, 5)


def kiln() -> dict[str, tuple[str, dict[str, str]]]:
    parts = {
        "U1": ("74HC244", {str(channel): f"/OUT{channel}" for channel in CHANNELS} | {"20": "+5V", "10": "GND"}),
        "U2": ("LOGGER-3", {str(channel): f"/IN{channel}" for channel in CHANNELS} | {"20": "+3V3", "10": "GND"}),
        "C1": ("100n", {"1": "+5V", "2": "GND"}),
        "C2": ("100n", {"1": "+3V3", "2": "GND"}),
    }
    for channel in CHANNELS:
        parts[f"R{channel}"] = ("10k", {"1": f"/OUT{channel}", "2": f"/IN{channel}"})
        parts[f"R{channel + 10}"] = ("20k", {"1": f"/IN{channel}", "2": "GND"})
    return parts


def board(
    parts: dict[str, tuple[str, dict[str, str]]],
    references: dict[str, str] | None = None,
    nets: dict[str, str] | None = None,
    uuids: dict[str, str] | None = None,
) -> Board:
    """Return a board, its parts and nets called otherwise where asked."""
    made = []
    for old, (value, pins) in parts.items():
        reference = (references or {}).get(old, old)
        made.append(
            Part(
                reference=reference,
                value=value,
                uuids=((uuids or {}).get(old, ""),) if uuids else (),
                pins=tuple(
                    Pin(part=reference, number=number, name="", kind="", net=(nets or {}).get(net, net))
                    for number, net in pins.items()
                ),
            )
        )
    made.sort(key=lambda part: part.reference)
    pins_of: dict[str, list[tuple[str, str]]] = {}
    for part in made:
        for pin in part.pins:
            pins_of.setdefault(pin.net, []).append((pin.part, pin.number))
    return Board(
        path="kiln.net",
        form="netlist",
        parts=tuple(made),
        nets=tuple(Net(name=name, pins=tuple(sorted(pins))) for name, pins in sorted(pins_of.items())),
    )


def spread(low: float, high: float) -> dict[str, float]:
    return {"min": low, "typ": (low + high) / 2, "max": high}


def row(
    verdict: str = "sound",
    start: tuple[str, str] = ("U1", "1"),
    end: tuple[str, str] = ("U2", "1"),
    link: tuple[str, ...] = ("R1",),
    top: float = 3.4,
    rails: tuple[str, str] = ("+5V", "+3V3"),
    findings: tuple[int, ...] = (),
) -> dict[str, Any]:
    return {
        "from": {"part": start[0], "pin": start[1], "name": "Y", "net": "/OUT1", "rail": rails[0]},
        "to": {"part": end[0], "pin": end[1], "name": "A", "net": "/IN1", "rail": rails[1]},
        "link": list(link),
        "shifter": {"kind": "divider", "parts": list(link)},
        "verdict": verdict,
        "condition": "",
        "basis": "library",
        "levels": {
            "high": spread(top - 0.3, top),
            "low": spread(0.0, 0.1),
            "vih": 2.31,
            "vil": 0.99,
            "vmax": 3.6,
        },
        "speed": None,
        "findings": list(findings),
    }


def finding(outcome: str = "damage", **keys: Any) -> dict[str, Any]:
    plain = {
        "rule": "input-overvoltage",
        "outcome": outcome,
        "condition": "",
        "basis": "library",
        "part": "U2",
        "pin": "1",
        "net": "/IN1",
        "text": "U2.1 sees 5.25 V",
        "remedy": "fit a divider",
        "at": None,
        "waived": None,
        "crossing": 0,
        "fingerprint": "1:aa",
    }
    return plain | keys


def side(
    label: str,
    rows: list[dict[str, Any]] | None = None,
    findings: list[dict[str, Any]] | None = None,
    board: Board | None = None,
    settings: Settings | None = None,
    **tables: Any,
) -> Side:
    form = empty_form("kiln.net") | {"crossings": rows or [], "findings": findings or []} | tables
    return Side(label=label, form=form, board=board, settings=settings)


def kinds(comparison: Comparison) -> list[tuple[str, bool]]:
    return [(change.kind, change.counts) for change in comparison.changes]


SOUND = side("old", [row()])
BAD = side("new", [row("damage", top=5.25, findings=(0,))], [finding()])
