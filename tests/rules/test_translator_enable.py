"""translator-enable: speaks and stays quiet."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Outcome

TXB = "U7 TXB0104D Logic_LevelTranslator:x | 1 VCCA power_in +3V3 | 14 VCCB power_in +5V | 7 GND power_in GND | 8 OE input {oe} | 2 A1 bidirectional /A | 13 B1 bidirectional /B\n"
ENDS = "U1 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /A\n"


@pytest.mark.parametrize(("oe", "speaks"), [("+3V3", False), ("GND", True), ("/OE", True)])
def test_the_enable_of_a_txb(oe: str, speaks: bool) -> None:
    """OE high enables and belongs to VCCA (TI TXB0104 SCES650)."""
    findings = named(findings_of(SUPPLIES + ENDS + TXB.format(oe=oe)), "translator-enable")
    assert [finding.outcome for finding in findings] == ([Outcome.MALFUNCTION] if speaks else [])


def test_a_driven_enable_stays_quiet() -> None:
    driver = "U2 74LVC1G04 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /OE\n"
    assert not named(findings_of(SUPPLIES + ENDS + driver + TXB.format(oe="/OE")), "translator-enable")


PASS = (
    "U7 PCA9306D Logic_LevelTranslator:x | 2 VREF1 power_in +3V3 | 7 VREF2 power_in /VR2 | 1 GND power_in GND | 8 EN input {en}"
    " | 4 SDA1 bidirectional /SDA | 5 SDA2 bidirectional /SDA5\n"
)


@pytest.mark.parametrize(("en", "speaks"), [("/VR2", False), ("+3V3", True), ("GND", True)])
def test_the_gate_of_a_pass_translator_belongs_to_its_upper_reference(en: str, speaks: bool) -> None:
    """EN and VREF2 together through 200 kilohm (TI PCA9306 SCPS113M)."""
    text = SUPPLIES + PASS.format(en=en) + resistor("R1", "200k", "+5V", "/VR2")
    assert bool(named(findings_of(text), "translator-enable")) is speaks
