"""What each pin drives, reads and bears, on which supply, and how that is known."""

from __future__ import annotations

import pytest
from gauge_cells import CONTROLLER, INVERTER_5V, SUPPLIES
from small_boards import case_of

from levelcrossing.model import Basis, OutputPoint, Pin, PinModel, PinSetting, Settings
from levelcrossing.pinnames import looks_like_supply, pin_words
from levelcrossing.pins import bipolar_output, level_text


def pin(text: str, part: str, number: str, settings: Settings | None = None) -> PinModel:
    return case_of(text, settings).pins[part, number]


def test_a_family_is_taken_from_the_value_and_not_from_the_symbol() -> None:
    """A 74LVC245 on a 74LS245 symbol tolerates 5 V at 3.3 V (traps of real schematics)."""
    text = SUPPLIES + (
        "U2 74LVC245 74xx:74LS245 | 20 VCC power_in +3V3 | 10 GND power_in GND | 1 A->B input GND | 19 CE input GND"
        " | 2 A0 tri_state /A | 18 B0 tri_state /B\n"
    )
    model = pin(text, "U2", "18")
    assert model.receive is not None
    assert model.receive.vmax.at(3.3) >= 5.5 and not model.receive.clamp_high
    assert model.basis is not Basis.ASSUMED


def test_5_volt_tolerance_is_judged_pin_by_pin() -> None:
    """ST STM32F030: PA9 is FT, PA0 is not."""
    tolerant, plain = pin(SUPPLIES + CONTROLLER, "U1", "17"), pin(SUPPLIES + CONTROLLER, "U1", "6")
    assert tolerant.receive is not None and plain.receive is not None
    assert tolerant.receive.vmax.at(3.3) >= 5.25
    assert plain.receive.vmax.at(3.3) < 4.0 + 0.01


def test_the_io_supply_is_not_any_power_pin() -> None:
    """FT232R: VCC at 5 V, VCCIO at 3.3 V: the signals are on VCCIO."""
    text = SUPPLIES + (
        "U5 FT232RL Interface_USB:FT232RL | 20 VCC power_in +5V | 4 VCCIO power_in +3V3 | 7 GND power_in GND"
        " | 1 TXD output /TX | 5 RXD input /RX\nR1 1k Device:R | 1 - passive /TX | 2 - passive /RX\n"
    )
    assert pin(text, "U5", "1").supply == "+3V3"


def test_a_bank_mark_in_the_names_finds_the_supply() -> None:
    text = SUPPLIES + (
        "U5 XYZ9000 Local:GATES | 1 VDD_WA power_in +3V3 | 2 VDD_WB power_in +5V | 3 GND power_in GND"
        " | 4 IO_WA_1 bidirectional /A | 5 IO_WB_1 bidirectional /B | 6 IO_9 bidirectional /C\n"
        "R1 1k Device:R | 1 - passive /A | 2 - passive /B\nR2 1k Device:R | 1 - passive /C | 2 - passive GND\n"
    )
    case = case_of(text)
    assert case.pins["U5", "4"].supply == "+3V3" and case.pins["U5", "5"].supply == "+5V"
    undecided = case.pins["U5", "6"]
    assert undecided.supply_volts is None and "several supplies" in undecided.why


def test_a_part_without_data_is_an_ordinary_cmos_part_and_marked_assumed() -> None:
    text = (
        SUPPLIES
        + "U5 XYZ9000 Local:THING | 1 VDD power_in +3V3 | 2 GND power_in GND | 3 DIN input /A | 4 X bidirectional /A\n"
    )
    model = pin(text, "U5", "3")
    assert model.receive is not None and model.receive.basis is Basis.ASSUMED
    assert model.receive.vih.at(3.3) == pytest.approx(0.7 * 3.3)
    assert model.receive.vmax.at(3.3) == pytest.approx(3.6)


def test_an_open_drain_output_bears_the_line_without_reading_it() -> None:
    text = (
        SUPPLIES
        + "U4 74LVC1G07 74xGxx:74LVC1G07 | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /A | 4 - output /Y\n"
    )
    model = pin(text + INVERTER_5V.format(out="/A"), "U4", "4")
    assert model.drive is not None and model.drive.style == "open-drain"
    assert model.receive is not None and not model.receive.reads


def test_settings_come_first() -> None:
    settings = Settings(pins={"U1.6": PinSetting(tolerates_volts=5.5, drives=False)})
    model = pin(SUPPLIES + CONTROLLER, "U1", "6", settings)
    assert model.drive is None and model.receive is not None
    assert model.receive.vmax.at(3.3) == 5.5 and model.receive.basis is Basis.DECLARED


def test_output_resistance_comes_from_the_rated_point() -> None:
    """74HC at 4.5 V: 0.33 V at 4 mA is 82.5 ohm at worst (CD74HC tables)."""
    model = pin(SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A"), "U2", "2")
    assert model.drive is not None
    assert model.drive.low_ohms.high == pytest.approx(0.33 / 4e-3, rel=0.01)


def test_a_ttl_output_does_not_reach_its_supply() -> None:
    """LS at 4.75 V: 2.7 V at 0.4 mA; HC at 4.5 V: 3.84 V at 4 mA."""
    assert bipolar_output((OutputPoint(supply_volts=4.75, voh=level_text("2.7"), ioh_amps=0.4e-3),))
    assert not bipolar_output((OutputPoint(supply_volts=4.5, voh=level_text("3.84"), ioh_amps=4e-3),))


@pytest.mark.parametrize(
    ("name", "words"),
    [("~{RESET}/PC6", ("RESET", "PC6")), ("GPIO1/U0TXD", ("GPIO1", "U0TXD")), ("A", ("A",)), ("", ())],
)
def test_pin_names_split_into_their_alternates(name: str, words: tuple[str, ...]) -> None:
    assert pin_words(name) == words


@pytest.mark.parametrize(
    ("name", "kind", "supply"),
    [("VDD", "passive", True), ("EN", "power_in", False), ("SDA", "bidirectional", False), ("VCCIO", "input", True)],
)
def test_supply_pins_are_told_by_name_where_types_lie(name: str, kind: str, supply: bool) -> None:
    assert looks_like_supply(Pin(part="U1", number="1", name=name, kind=kind, net="X")) is supply
