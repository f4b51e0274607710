"""rail-conflict: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES
from small_boards import findings_of, named

from levelcrossing.model import Outcome


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
