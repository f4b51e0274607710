"""input-overvoltage: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings

WIRE = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A")


def test_speaks_when_5_v_meets_a_3_3_v_pin() -> None:
    (finding,) = named(findings_of(WIRE), "input-overvoltage")
    assert finding.outcome is Outcome.DAMAGE and (finding.part, finding.pin) == ("U1", "6")


def test_stays_quiet_on_a_tolerant_input() -> None:
    text = (
        SUPPLIES
        + INVERTER_5V.format(out="/Y")
        + "U4 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /Y | 4 - output /Z\n"
    )
    assert not named(findings_of(text), "input-overvoltage")


@pytest.mark.parametrize(
    ("tolerates", "outcome"), [(5.25, None), (5.24, Outcome.MARGINAL), (5.0, Outcome.MARGINAL), (4.99, Outcome.DAMAGE)]
)
def test_the_limit_is_the_rating_at_the_greatest_and_at_the_usual_supply(
    tolerates: float, outcome: Outcome | None
) -> None:
    """+5V from USB reaches 5.25 V and is usually 5.0 V (USB 2.0 section 7.2.2)."""
    findings = named(
        findings_of(WIRE, Settings(pins={"U1.6": PinSetting(tolerates_volts=tolerates)})), "input-overvoltage"
    )
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])


def test_an_input_tied_to_a_higher_rail_is_told() -> None:
    text = (
        SUPPLIES
        + "U4 74HC1G125 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 1 - input +5V | 2 - input GND | 4 - tri_state /Z\n"
    )
    (finding,) = named(findings_of(text), "input-overvoltage")
    assert "Tie U4.1 to +3V3" in finding.remedy
