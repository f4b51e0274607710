"""shifter-reference: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

from gauge_cells import BIPOLAR_CELL, BUS, MOSFET_PAIR, PULL_UPS
from small_boards import findings_of, named


def test_a_gate_on_the_high_supply_speaks() -> None:
    (finding,) = findings_of(
        BUS
        + PULL_UPS
        + MOSFET_PAIR.replace("1 G passive +3V3 | 2 S passive /SDA ", "1 G passive +5V | 2 S passive /SDA ")
    )
    assert (finding.rule, finding.part) == ("shifter-reference", "Q1") and "+3V3" in finding.remedy


def test_a_base_on_the_high_supply_speaks() -> None:
    assert [finding.rule for finding in findings_of(BUS + PULL_UPS + BIPOLAR_CELL.format(base="+5V"))] == [
        "shifter-reference"
    ]


def test_stays_quiet_on_the_low_supply() -> None:
    assert not named(findings_of(BUS + PULL_UPS + MOSFET_PAIR), "shifter-reference")
    assert not named(findings_of(BUS + PULL_UPS + BIPOLAR_CELL.format(base="+3V3")), "shifter-reference")


def test_stays_quiet_when_the_gate_is_driven_by_a_signal() -> None:
    text = BUS + PULL_UPS + MOSFET_PAIR.replace("1 G passive +3V3", "1 G passive /A")
    assert not named(findings_of(text), "shifter-reference")
