"""translator-enable: speaks and stays quiet."""

from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES, resistor
from small_boards import findings_of, named

from levelcrossing.model import Outcome, Settings, Spread

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


@pytest.mark.parametrize(
    ("rail", "outcome"),
    [("+3V3", None), ("VLOW", Outcome.MALFUNCTION), ("+5V", None), ("V7", Outcome.DAMAGE)],
)
def test_the_rail_that_an_enable_is_tied_to_must_reach_its_high_and_keep_to_its_rating(
    rail: str, outcome: Outcome | None
) -> None:
    """TXS0104E: OE belongs to VCCA, VIH 0.65 VCCA, 5.5 V at most (TI TXS0102-Q1 SCES854A); 2.1 V is below 0.65 of 3.3 V."""
    text = (
        SUPPLIES
        + ENDS
        + "J3 Supply Connector:Conn | 1 1 passive VLOW | 2 2 passive V7 | 3 3 passive GND\n"
        + TXB.replace("TXB0104D", "TXS0104E").format(oe=rail)
    )
    settings = Settings(rails={"VLOW": Spread.exactly(2.1), "V7": Spread.exactly(7.0)})
    findings = named(findings_of(text, settings), "translator-enable")
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])


@pytest.mark.parametrize(("volts", "speaks"), [(2.14, True), (2.15, False)])
def test_the_limit_of_an_enable_is_0_65_of_its_own_supply(volts: float, speaks: bool) -> None:
    """0.65 x 3.3 V = 2.145 V (JESD8-7A's 0.65 VDD)."""
    text = SUPPLIES + ENDS + "J3 Supply Connector:Conn | 1 1 passive VX | 3 3 passive GND\n" + TXB.format(oe="VX")
    settings = Settings(rails={"VX": Spread.exactly(volts)})
    assert bool(named(findings_of(text, settings), "translator-enable")) is speaks


@pytest.mark.parametrize(
    ("upper", "gate", "ohms", "outcome"),
    [
        ("/VR2", "/VR2", "200k", None),
        ("/VR2", "/VR2", "51k", None),
        ("/VR2", "/VR2", "47k", Outcome.MARGINAL),
        ("/VR2", "/VR2", "1M", None),
        ("/VR2", "/VR2", "1.2M", Outcome.MARGINAL),
        ("+5V", "+5V", "200k", Outcome.MALFUNCTION),
        ("+5V", "/VR2", "200k", Outcome.MALFUNCTION),
    ],
)
def test_how_the_gate_of_a_pass_translator_is_fed(upper: str, gate: str, ohms: str, outcome: Outcome | None) -> None:
    """TI PCA9306 SCPS113M shows 200 kohm; 50 kohm to 1 Mohm about it is common practice; straight on the supply the
    bias transistor conducts into the lower one.
    """
    text = SUPPLIES + PASS.replace("/VR2", upper).format(en=gate) + resistor("R1", ohms, "+5V", "/VR2")
    findings = named(findings_of(text), "translator-enable")
    assert [finding.outcome for finding in findings] == ([outcome] if outcome else [])
