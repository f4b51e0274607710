"""supply-range: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread

GATE = (
    "U1 {value} 74xx:74HC14 | 14 VCC power_in VX | 7 GND power_in GND | 1 - input GND | 2 - output /Y\n"
    "C1 100n Device:C | 1 - passive VX | 2 - passive GND\n"
)


@pytest.mark.parametrize(
    ("value", "volts", "outcome"),
    [
        ("74HCT14", 5.0, None),
        ("74HCT14", 3.3, Outcome.MALFUNCTION),
        ("74LVC14", 3.3, None),
        ("74LVC14", 5.0, Outcome.DAMAGE),
        ("74HC14", 6.1, None),
        ("74HC14", 6.2, Outcome.MARGINAL),
        ("74HC14", 6.7, Outcome.DAMAGE),
    ],
)  # fmt: skip
def test_by_the_family_s_operating_range(value: str, volts: float, outcome: Outcome | None) -> None:
    """HCT 4.5 to 5.5 V, LVC to 3.6 V, HC 2 to 6 V; 2 % beyond is a round figure missed, a tenth beyond destroys."""
    settings = Settings(rails={"VX": Spread.exactly(volts)}, rail_tolerance=0.0)
    assert [finding.outcome for finding in named(findings_of(GATE.format(value=value), settings), "supply-range")] == (
        [outcome] if outcome else []
    )
