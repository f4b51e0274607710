"""shifter-reversed: speaks, stays quiet, and stands for what it causes."""

from __future__ import annotations

from gauge_cells import BUS, MOSFET_PAIR, PULL_UPS
from small_boards import findings_of

from levelcrossing.model import PinSetting, Settings

REVERSED = MOSFET_PAIR.replace("2 S passive /SDA |", "2 S passive /SDA5 |").replace(
    "3 D passive /SDA5\n", "3 D passive /SDA\n"
)


def test_a_reversed_mosfet_is_explained_once() -> None:
    findings = findings_of(BUS + PULL_UPS + REVERSED)
    assert [(finding.rule, finding.part) for finding in findings] == [("shifter-reversed", "Q1")]
    assert "source to /SDA, drain to /SDA5" in findings[0].remedy


def test_it_is_one_finding_also_where_the_low_side_suffers() -> None:
    intolerant = Settings(pins={"U1.18": PinSetting(tolerates_volts=3.6)})
    findings = findings_of(BUS + PULL_UPS + REVERSED, intolerant)
    assert [finding.rule for finding in findings] == ["shifter-reversed"]
    assert findings[0].outcome.value == "damage"


def test_stays_quiet_the_right_way_round() -> None:
    assert findings_of(BUS + PULL_UPS + MOSFET_PAIR) == ()
