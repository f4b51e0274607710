"""Which pairs are crossings, and which are not."""

from __future__ import annotations

from dataclasses import replace

from gauge_cells import BUS, CONTROLLER, INVERTER_5V, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import case_of, findings_of, named

from levelcrossing.model import Outcome, PinSetting, Settings, Spread

LOGIC = (
    "U4 74LVC1G17 74xGxx:74LVC1G17 | 5 VCC power_in {rail} | 3 GND power_in GND | 2 - input {into} | 4 - output {out}\n"
)


def pairs(text: str, settings: Settings | None = None) -> set[tuple[str, str]]:
    found = set()
    for solved in case_of(text, settings).crossings:
        driver = solved.crossing.driver
        source = f"{driver.part}.{driver.number}" if driver else solved.crossing.driver_rail
        found.add((source, f"{solved.crossing.receiver.part}.{solved.crossing.receiver.number}"))
    return found


def test_parts_on_one_supply_do_not_cross() -> None:
    assert pairs(SUPPLIES + INVERTER_5V.format(out="/Y") + LOGIC.format(rail="+5V", into="/Y", out="/Z")) == set()


def test_a_driver_and_a_receiver_on_different_supplies_cross() -> None:
    assert pairs(SUPPLIES + INVERTER_5V.format(out="/Y") + LOGIC.format(rail="+3V3", into="/Y", out="/Z")) == {
        ("U2.2", "U4.2")
    }


def test_a_pull_up_to_another_supply_is_a_driver() -> None:
    text = SUPPLIES + CONTROLLER + resistor("R1", "10k", "+5V", "/A")
    assert ("+5V", "U1.6") in pairs(text)


def test_a_pull_up_does_not_count_where_an_output_always_holds_the_line() -> None:
    text = SUPPLIES + INVERTER_5V.format(out="/Y") + LOGIC.format(rail="+3V3", into="/Q", out="/Y2")
    text += "U6 74LVC1G04 74xGxx:74LVC1G04 | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /Y | 4 - output /Q\n"
    assert ("+5V", "U4.2") not in pairs(text + resistor("R1", "10k", "+5V", "/Q"))


def test_unfitted_parts_are_absent() -> None:
    text = BUS + PULL_UPS + MOSFET_PAIR.replace("Transistor_FET:BSS138 |", "Transistor_FET:BSS138 DNP |")
    assert pairs(text) == set()


def test_a_signal_goes_into_a_gate_but_not_out_of_it() -> None:
    """A driver on the drain sets nothing at the gate's pin."""
    inverter = "Q1 BSS138 Transistor_FET:BSS138 | 1 G passive /A | 2 S passive GND | 3 D passive /Y\n"
    text = (
        SUPPLIES
        + CONTROLLER
        + inverter
        + LOGIC.format(rail="+5V", into="/Y", out="/Z")
        + resistor("R1", "10k", "+5V", "/Y")
    )
    found = pairs(text)
    assert ("U1.6", "U4.2") in found
    assert not any(receiver == "U1.6" for _, receiver in found)


def test_the_only_pin_that_can_drive_an_input_is_its_driver_without_condition() -> None:
    text = SUPPLIES + CONTROLLER + LOGIC.format(rail="+5V", into="/A", out="/Z")
    crossing = next(solved.crossing for solved in case_of(text).crossings if solved.crossing.receiver.part == "U4")
    assert crossing.condition == ""


CONNECTOR = (
    "J1 Conn_01x03 Connector_Generic:Conn_01x03 | 1 Pin_1 passive {first} | 2 Pin_2 passive /A | 3 Pin_3 passive GND\n"
)


def test_a_connector_without_a_supply_is_named_as_not_judged() -> None:
    findings = findings_of(SUPPLIES + CONTROLLER + CONNECTOR.format(first="/B"))
    assert [finding.part for finding in named(findings, "pin-unknown")] == ["J1"]
    assert all(finding.outcome is Outcome.UNKNOWN for finding in findings)


def test_a_level_guessed_from_a_connector_s_supply_never_proves_damage() -> None:
    findings = findings_of(SUPPLIES + CONTROLLER + CONNECTOR.format(first="+5V"))
    over = named(findings, "input-overvoltage")
    assert over and all(finding.outcome is Outcome.UNKNOWN and "J1" in finding.condition for finding in over)


def test_a_declared_far_end_is_judged_in_full() -> None:
    settings = Settings(far_ends={"J1.2": PinSetting(volts=Spread.around(5.0, 0.05), drives=True)})
    over = named(findings_of(SUPPLIES + CONTROLLER + CONNECTOR.format(first="/B"), settings), "input-overvoltage")
    assert [finding.outcome for finding in over] == [Outcome.DAMAGE]
    declared = replace(settings, far_ends={"J1.2": PinSetting(volts=Spread.around(3.3, 0.05), drives=True)})
    assert not named(findings_of(SUPPLIES + CONTROLLER + CONNECTOR.format(first="/B"), declared), "input-overvoltage")


def test_a_jumper_of_unknown_state_between_supplies_is_not_judged_silently() -> None:
    jumper = "JP1 select Jumper:Jumper_2 | 1 A passive /Y | 2 B passive /A\n"
    findings = findings_of(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + jumper)
    assert any("JP1" in finding.text for finding in named(findings, "pin-unknown"))
