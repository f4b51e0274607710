"""junction-rating: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread

STAGE = (
    "U9 AMS1117-3.3 Regulator_Linear:x | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in +5V\n"
    "C1 10u Device:C | 1 - passive +3V3 | 2 - passive GND\nC2 10u Device:C | 1 - passive VHI | 2 - passive GND\n"
    "U4 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /LO | 4 - output /Y\n"
    "U6 XYZ40 Local:GATE | 1 VDD power_in VHI | 8 GND power_in GND | 16 OUT output /HI\n"
    "Q1 FDV301N Transistor_FET:FDV301N | 1 G passive /HI | 2 S passive GND | 3 D passive /LO\n"
    "R1 10k Device:R | 1 - passive +3V3 | 2 - passive /LO\n"
)


@pytest.mark.parametrize(("volts", "outcome"), [(7.9, None), (8.1, Outcome.DAMAGE)])
def test_a_gate_bears_8_v(volts: float, outcome: Outcome | None) -> None:
    """VGS of an FDV301N is 8 V at most (onsemi)."""
    settings = Settings(rails={"VHI": Spread.exactly(volts)}, rail_tolerance=0.0)
    findings = [finding for finding in named(findings_of(STAGE, settings), "junction-rating") if "VGS" in finding.text]
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])
