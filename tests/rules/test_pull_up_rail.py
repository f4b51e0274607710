"""pull-up-rail: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings


def pulled(ohms: str, rail: str = "+5V", settings: Settings | None = None) -> list[Outcome]:
    text = SUPPLIES + CONTROLLER + resistor("R1", ohms, rail, "/A")
    return [finding.outcome for finding in named(findings_of(text, settings), "pull-up-rail")]


@pytest.mark.parametrize(
    ("ohms", "outcome"), [("10k", Outcome.MARGINAL), ("1.2k", Outcome.MARGINAL), ("910", Outcome.DAMAGE)]
)
def test_speaks_by_the_current_into_the_clamp(ohms: str, outcome: Outcome) -> None:
    """1 mA where the maker rates none: common practice."""
    assert pulled(ohms) == [outcome]


def test_stays_quiet_on_the_receiver_s_own_supply_and_on_tolerant_pins() -> None:
    assert pulled("10k", "+3V3") == []
    assert pulled("10k", settings=Settings(pins={"U1.6": PinSetting(tolerates_volts=5.5)})) == []


def test_it_stands_for_the_symptoms_and_names_the_better_rail() -> None:
    findings = findings_of(SUPPLIES + CONTROLLER + resistor("R1", "10k", "+5V", "/A"))
    assert [finding.rule for finding in findings] == ["pull-up-rail"]
    assert findings[0].remedy == "Tie R1 to +3V3 instead of +5V."


def test_a_pull_up_too_low_for_the_receiver_is_a_malfunction() -> None:
    """MCP23017 at 5 V reads a high from 4.0 V (Microchip DS20001952C table 1-1)."""
    text = (
        SUPPLIES
        + "U6 MCP23017_SO Interface_Expansion:x | 9 VDD power_in +5V | 10 VSS power_in GND | 13 SDA bidirectional /SDA\n"
        + resistor("R1", "4.7k", "+3V3", "/SDA")
    )
    (finding,) = named(findings_of(text), "pull-up-rail")
    assert finding.outcome is Outcome.MALFUNCTION and "4 V" in finding.text
