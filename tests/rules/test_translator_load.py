"""translator-load: speaks, stays quiet, and the limit itself."""

from __future__ import annotations

import pytest
from gauge_cells import CLOCK_5V, CONTROLLER, SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Outcome

TXB = (
    "U7 {value} Logic_LevelTranslator:x | 1 VCCA power_in +3V3 | 14 VCCB power_in +5V | 7 GND power_in GND | 8 OE input +3V3"
    " | 2 A1 bidirectional /SDA | 13 B1 bidirectional /SDA5\n"
)
GATE = "U3 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input /SDA5 | 4 - output /Z\n"


@pytest.mark.parametrize(
    ("ohms", "outcome"), [("51k", None), ("50k", None), ("47k", Outcome.MARGINAL), ("2.2k", Outcome.MALFUNCTION)]
)
def test_the_limit_is_the_maker_s_50_kilohm(ohms: str, outcome: Outcome | None) -> None:
    """TI TXB0104 SCES650: no pull-up or pull-down below 50 kilohm; at 2.2 kilohm the low is no low any more."""
    text = SUPPLIES + CONTROLLER + TXB.format(value="TXB0104D") + GATE + resistor("R1", ohms, "+5V", "/SDA5")
    text = text.replace("/SDA", "/LATCH")  # no name of an open-drain bus
    assert [finding.outcome for finding in named(findings_of(text), "translator-load")] == (
        [outcome] if outcome else []
    )


def test_it_stands_for_the_low_that_it_spoils() -> None:
    text = (
        SUPPLIES
        + CONTROLLER
        + CLOCK_5V
        + TXB.format(value="TXB0104D")
        + resistor("R1", "4.7k", "+5V", "/SDA5")
        + resistor("R2", "4.7k", "+3V3", "/SDA")
    )
    rules = [finding.rule for finding in findings_of(text)]
    assert set(rules) == {"translator-load"} and len(rules) == 2


def test_an_open_drain_type_stays_quiet() -> None:
    text = SUPPLIES + CONTROLLER + CLOCK_5V + TXB.format(value="TXS0104E") + resistor("R1", "4.7k", "+5V", "/SDA5")
    assert not named(findings_of(text), "translator-load")


@pytest.mark.parametrize("pull", ["", resistor("R1", "100k", "+5V", "/SDA5")])
def test_an_open_drain_on_an_auto_direction_buffer_speaks_whatever_the_pull(pull: str) -> None:
    """Not for open-drain lines (TI TXB0104 SCES650, application information)."""
    text = SUPPLIES + CONTROLLER + CLOCK_5V + TXB.format(value="TXB0104D") + pull
    assert [finding.outcome for finding in named(findings_of(text), "translator-load")] == [Outcome.MALFUNCTION]


@pytest.mark.parametrize(("farads", "speaks"), [("", False), ("47p", False), ("56p", False), ("68p", True)])
def test_the_capacitance_on_a_channel_keeps_to_what_the_maker_allows(farads: str, speaks: bool) -> None:
    """TI TXB0104 SCES650: 70 pF; here 10 pF of stray and the gate's 10 pF at most beside the capacitor."""
    text = SUPPLIES + CONTROLLER.replace("/SDA", "/N").replace("/A ", "/SDA ") + TXB.format(value="TXB0104D") + GATE
    text += f"C9 {farads} Device:C | 1 - passive /SDA5 | 2 - passive GND\n" if farads else ""
    findings = [one for one in named(findings_of(text), "translator-load") if "charges" in one.text]
    assert [finding.pin for finding in findings] == (["13"] if speaks else [])
    assert all("C9 the most of it" in finding.text for finding in findings)
