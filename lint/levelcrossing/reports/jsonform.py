"""The JSON form of a review: stable, versioned, the same bytes for the same input.

All voltages are volts, currents amperes, times seconds, rates bit/s; floats carry six significant digits; what is not known
is null. ``form`` counts up when a key changes its meaning or disappears; new keys alone leave it.
"""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import Any

from levelcrossing import __version__
from levelcrossing.model import Finding, PinModel, Rail, Review, ReviewedCrossing, Speed, Spread, StateResult
from levelcrossing.reports.phrases import NOTICE

FORM = 1


def number(value: float | None) -> float | int | None:
    """Return a float with six significant digits; None for what JSON cannot hold."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value:.6g}") + 0.0  # the sum turns a negative zero into zero


def json_report(reviews: Sequence[Review]) -> str:
    """Return one review as the object of the form; several as an object that holds them under ``reviews``."""
    if len(reviews) == 1:
        content = form(reviews[0])
    else:
        content = {"form": FORM, "tool": _tool(), "reviews": [form(review) for review in reviews]}
    # Escaping all but ASCII keeps control codes of a stranger's net names away from whoever shows the file.
    return json.dumps(content, indent=1, ensure_ascii=True, allow_nan=False) + "\n"


def form(review: Review) -> dict[str, Any]:
    """Return a review as plain dictionaries and lists."""
    board = review.board
    return {
        "form": FORM,
        "tool": _tool(),
        "board": {
            "path": board.path,
            "parts": len(board.parts),
            "nets": len(board.nets),
            "pins": sum(len(part.pins) for part in board.parts),
            "read_as": board.form,
            "made_by": board.maker,
        },
        "rails": [_rail(rail) for _, rail in sorted(review.rails.by_net.items())],
        "crossings": [_crossing(one) for one in review.crossings],
        "findings": [_finding(finding) for finding in review.findings],
        "coverage": {
            "signal_pins": review.coverage.signal_pins,
            "judged": review.coverage.judged,
            "not_judged": [
                {"part": pin.part, "pin": pin.pin, "why": pin.why, "name": pin.name, "net": pin.net}
                for pin in review.coverage.not_judged
            ],
        },
        "unknown_rails": [{"net": net, "settle": settle} for net, settle in review.rails.unknown],
        "suggestions": list(review.suggestions),
        "rows_to_fill": list(review.rows_to_fill),
        "assumptions": list(review.assumptions),
        "out_of_scope": list(review.out_of_scope),
        "remarks": [*board.remarks, *review.remarks],
        "notice": NOTICE,
    }


def _tool() -> dict[str, str]:
    return {"name": "levelcrossing", "version": __version__}


def _spread(spread: Spread | None) -> dict[str, Any]:
    if spread is None:
        return {"min": None, "typ": None, "max": None}
    return {"min": number(spread.low), "typ": number(spread.nominal), "max": number(spread.high)}


def _rail(rail: Rail) -> dict[str, Any]:
    volts = rail.volts
    return {
        "net": rail.net,
        "low": number(volts.low) if volts else None,
        "nominal": number(volts.nominal) if volts else None,
        "high": number(volts.high) if volts else None,
        "basis": rail.basis.value,
        "evidence": rail.evidence[0].text if rail.evidence else "",
        "further_evidence": [evidence.text for evidence in rail.evidence[1:]],
        "fed_from": rail.domain,
        "ground": rail.ground,
    }


def _end(pin: PinModel | None, rail: str) -> dict[str, Any]:
    if pin is None:
        return {"part": None, "pin": None, "name": None, "net": rail or None, "rail": rail or None}
    return {"part": pin.part, "pin": pin.number, "name": pin.name, "net": pin.net, "rail": rail or None}


def _state(state: StateResult) -> dict[str, Any]:
    return {
        "solved": state.solved,
        "why": state.why,
        "floating": state.floating,
        "receiver_volts": _spread(state.receiver_volts),
        "open_volts": _spread(state.open_volts),
        "clamp_amps": _spread(state.clamp_amps),
        "driver_amps": _spread(state.driver_amps),
        "driver_volts": _spread(state.driver_volts),
    }


def _speed(speed: Speed | None) -> dict[str, Any] | None:
    if speed is None:
        return None
    return {
        # The single figures are the guaranteed ones: the slowest edge and the lowest rate over all corners.
        "rise_s": number(speed.rise_s.high),
        "fall_s": number(speed.fall_s.high),
        "usable_bit_s": number(speed.usable_bit_s),
        "needed_bit_s": number(speed.needed_bit_s),
        "nominal_bit_s": number(speed.nominal_bit_s),
        "rise_range_s": _spread(speed.rise_s),
        "fall_range_s": _spread(speed.fall_s),
        "delay_high_s": number(speed.delay_high_s.high),
        "delay_low_s": number(speed.delay_low_s.high),
        "load_farads": number(speed.load_farads),
        "loaded_bit_s": number(speed.loaded_bit_s),
        "limit": speed.limit,
        "accuracy": speed.accuracy,
        "usual_bit_s": number(speed.line.usual_bit_s) if speed.line is not None else None,
        "needed_why": speed.line.why if speed.line is not None else "",
    }


def _crossing(one: ReviewedCrossing) -> dict[str, Any]:
    solved = one.solved
    crossing = solved.crossing
    return {
        "from": _end(crossing.driver, crossing.driver_rail),
        "to": _end(crossing.receiver, crossing.receiver_rail),
        "link": list(crossing.link),
        "shifter": {
            "kind": crossing.shifter.kind,
            "parts": list(crossing.shifter.parts),
            "title": crossing.shifter.title,
        },
        "verdict": one.verdict.value,
        "condition": one.condition,
        "basis": crossing.basis.value,
        "levels": {
            "high": _spread(solved.high),
            "low": _spread(solved.low),
            "vih": number(solved.vih.nominal) if solved.vih else None,
            "vil": number(solved.vil.nominal) if solved.vil else None,
            "vmax": number(solved.vmax.nominal) if solved.vmax else None,
            "vih_range": _spread(solved.vih),
            "vil_range": _spread(solved.vil),
            "vmax_range": _spread(solved.vmax),
        },
        "speed": _speed(solved.speed),
        "states": {name: _state(state) for name, state in sorted(solved.states.items())},
        "off_states": [
            {
                "case": off.case,
                "dead_rail": off.dead_rail,
                "into_rail_amps": _spread(off.into_rail_amps),
                "lifted_volts": _spread(off.lifted_volts),
                "pin_volts": _spread(off.pin_volts),
                "path": off.path,
            }
            for off in solved.off_states
        ],
        "two_way": crossing.two_way,
        "inverting": crossing.inverting,
        "first_half": crossing.segment,
        "inferred": crossing.inferred,
        "why": solved.why,
        "findings": list(one.findings),
    }


def _finding(finding: Finding) -> dict[str, Any]:
    return {
        "rule": finding.rule,
        "outcome": finding.outcome.value,
        "condition": finding.condition,
        "basis": finding.basis.value,
        "part": finding.part or None,
        "pin": finding.pin or None,
        "net": finding.net or None,
        "text": finding.text,
        "remedy": finding.remedy,
        "at": {"file": finding.at.file, "line": finding.at.line} if finding.at else None,
        "waived": finding.waived,
        "also": list(finding.also),
        "sources": list(finding.sources),
        "crossing": finding.crossing,
        "fingerprint": finding.fingerprint,
    }
