"""rail-conflict: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread


@pytest.mark.parametrize(
    ("value", "outcome"),
    [("AMS1117-3.3", None), ("AMS1117-2.5", Outcome.MALFUNCTION), ("AMS1117-1.8", Outcome.MALFUNCTION)],
)
def test_a_regulator_against_the_name_of_its_net(value: str, outcome: Outcome | None) -> None:
    text = SUPPLIES.replace("U9 AMS1117-3.3", f"U9 {value}") + CONTROLLER
    findings = [finding for finding in named(findings_of(text), "rail-conflict") if finding.net == "+3V3"]
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])


def test_a_tenth_apart_is_marginal() -> None:
    """3.0 V against 3.3 V: the same logic works from both, but somebody is mistaken."""
    text = SUPPLIES.replace(
        "U9 AMS1117-3.3 Regulator_Linear:AMS1117-3.3 | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in +5V",
        "U9 AP2112K-3.0 Regulator_Linear:x | 1 VIN power_in +5V | 2 GND power_in GND | 3 EN input +5V | 5 VOUT power_out +3V3",
    )
    assert [finding.outcome for finding in named(findings_of(text + CONTROLLER), "rail-conflict")] == [Outcome.MARGINAL]


@pytest.mark.parametrize(
    ("value", "volts", "outcome"),
    [
        ("MCP1703A-3302", 12.0, None),
        ("MCP1703A-3302", 16.5, Outcome.DAMAGE),
        ("MCP1702-3302E", 12.0, None),
        ("MCP1702-3302E", 13.5, Outcome.DAMAGE),
        ("MCP1700-3302E", 5.0, None),
        ("MCP1700-3302E", 6.5, Outcome.DAMAGE),
    ],
)
def test_a_regulator_s_own_input_limit(value: str, volts: float, outcome: Outcome | None) -> None:
    """16.0, 13.2 and 6.0 V: input operating voltage in Microchip DS22049F, the MCP1702 and the MCP1700 data sheets."""
    text = (
        f"U9 {value} Regulator_Linear:x | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in VX\n"
        "C1 1u Device:C | 1 - passive +3V3 | 2 - passive GND\nC2 1u Device:C | 1 - passive VX | 2 - passive GND\n"
        + CONTROLLER
    )
    settings = Settings(rails={"VX": Spread.exactly(volts)}, rail_tolerance=0.0)
    found = [finding.outcome for finding in named(findings_of(text, settings), "rail-conflict")]
    assert found == ([outcome] if outcome else [])
