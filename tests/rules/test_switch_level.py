"""switch-level: speaks, stays quiet, and the limits themselves."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, SUPPLIES, resistor
from small_boards import case_of, findings_of, named

from levelcrossing.model import Outcome

HIGH_SIDE = "Q5 {part} Transistor_FET:x | 1 G input /A | 2 S passive {rail} | 3 D passive /HEATER\n"
LOW_SIDE = "Q5 {part} Transistor_FET:x | 1 G input /A | 2 S passive GND | 3 D passive /HEATER\n"
PNP = "Q5 BC857 Transistor_BJT:x | 1 B input {base} | 2 E passive {rail} | 3 C passive /HEATER\n"
LAST = "C8 10u Device:C | 1 - passive {rail} | 2 - passive GND\n"
INVERTER = "Q6 MMBT3904 Transistor_BJT:x | 1 B input /B1 | 2 E passive GND | 3 C passive {collector}\n"


def outcomes(text: str, rule: str = "switch-level") -> list[Outcome]:
    return [finding.outcome for finding in named(findings_of(text), rule)]


@pytest.mark.parametrize(
    ("rail", "expected"),
    [("+3V3", []), ("+3V5", []), ("+4V0", [Outcome.MARGINAL]), ("+5V", [Outcome.MALFUNCTION])],
)
def test_a_high_side_switch_is_off_only_near_its_source(rail: str, expected: list[Outcome]) -> None:
    """AOS AO3401A rev. 3: threshold 0.5, 0.9, 1.3 V; the gate gets 3.3 V."""
    assert (
        outcomes(SUPPLIES + CONTROLLER + LAST.format(rail=rail) + HIGH_SIDE.format(part="AO3401A", rail=rail))
        == expected
    )


def test_the_pull_up_at_the_gate_does_not_help_a_push_pull_output() -> None:
    text = SUPPLIES + CONTROLLER + HIGH_SIDE.format(part="AO3401A", rail="+5V") + resistor("R1", "10k", "+5V", "/A")
    found = named(findings_of(text), "switch-level")
    assert [finding.part for finding in found] == ["Q5"]
    assert "1.7 V from its source" in found[0].text and "inverts" in found[0].remedy


def test_through_an_inverter_it_is_sound() -> None:
    text = SUPPLIES + CONTROLLER + HIGH_SIDE.format(part="AO3401A", rail="+5V").replace("/A", "/GATE")
    text += resistor("R1", "10k", "+5V", "/GATE") + resistor("R2", "4.7k", "/A", "/B1")
    text += INVERTER.format(collector="/GATE")
    case = case_of(text)
    assert not findings_of(text)
    assert [(one.crossing.source, one.crossing.target) for one in case.crossings] == [
        ("U1.6 (PA0) on +3V3", "Q5.1 (G) on +5V")
    ]


def test_the_gate_of_a_switch_on_24_v_is_held_against_its_rating() -> None:
    """AOS AO3401A: 12 V between gate and source; a second resistor of 15 kilohm divides the 24 V to 9.6 V."""
    text = SUPPLIES + CONTROLLER + LAST.format(rail="+24V") + resistor("R2", "4.7k", "/A", "/B1")
    text += HIGH_SIDE.format(part="AO3401A", rail="+24V").replace("/A", "/GATE") + resistor(
        "R1", "10k", "+24V", "/GATE"
    )
    assert outcomes(text + INVERTER.format(collector="/GATE"), "junction-rating") == [Outcome.DAMAGE]
    divided = text + INVERTER.format(collector="/C") + resistor("R3", "15k", "/C", "/GATE")
    assert not outcomes(divided, "junction-rating") and not outcomes(divided)


@pytest.mark.parametrize(("ohms", "expected"), [("1k", [Outcome.MALFUNCTION]), (None, [])])
def test_a_pnp_transistor_on_5_v_stays_on_behind_3_3_v_logic(ohms: str | None, expected: list[Outcome]) -> None:
    """Without a way to the base the transistor switches nothing that the logic could leave on."""
    text = SUPPLIES + CONTROLLER + PNP.format(base="/BASE", rail="+5V") + resistor("R1", "10k", "+5V", "/BASE")
    text += resistor("R2", ohms, "/A", "/BASE") if ohms else ""
    assert outcomes(text) == expected


def test_a_diode_that_blocks_leaves_the_pin_without_a_say() -> None:
    text = SUPPLIES + CONTROLLER + PNP.format(base="/BASE", rail="+5V") + resistor("R1", "10k", "+5V", "/BASE")
    text += "D1 1N4148 Diode:1N4148 | 1 K passive /BASE | 2 A passive /A\n"
    assert not [one for one in case_of(text).crossings if one.crossing.to_switch]


@pytest.mark.parametrize(
    ("part", "expected"),
    [
        ("AO3400A", []),
        ("2N7002", []),
        ("BSS138", []),
        ("2N7000", []),
        ("IRLZ44N", []),
        ("IRF540N", [Outcome.MALFUNCTION]),
    ],
)
def test_a_low_side_switch_needs_its_greatest_threshold_and_something_over(part: str, expected: list[Outcome]) -> None:
    """Greatest thresholds 1.5, 2.5, 1.5, 3.0, 2.0, 4.0 V (makers' sheets) against 3.23 V and 2.94 V less 0.2 V."""
    text = SUPPLIES + CONTROLLER + LOW_SIDE.format(part=part)
    assert outcomes(text) == expected
    assert all(one.crossing.segment for one in case_of(text).crossings)
    lower = text.replace("+3V3", "+3V0").replace("AMS1117-3.3", "AMS1117-3.0")
    assert outcomes(lower) == ([Outcome.MARGINAL] if part == "2N7000" else expected)


def test_a_transistor_that_carries_a_signal_is_judged_with_its_receiver() -> None:
    text = SUPPLIES + CONTROLLER + LOW_SIDE.format(part="2N7000").replace("/HEATER", "/OUT")
    text += resistor("R1", "10k", "+5V", "/OUT")
    text += "U3 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input /OUT | 2 - output /Z\n"
    assert not [one for one in case_of(text).crossings if one.crossing.to_switch]
