"""What gives a net its voltage by itself: regulators with their dividers, connectors, modules, cells."""

from __future__ import annotations

import pytest
from small_boards import BOOK, board_of

from levelcrossing.model import Evidence, Settings, Spread
from levelcrossing.rail_links import Joints
from levelcrossing.rail_scene import Scene
from levelcrossing.rail_sources import Sources

BUCK = "U1 TPS62125DSG Regulator:TPS62125 | 1 VIN power_in +12V | 2 GND power_in GND | 3 SW output SWN | 4 FB input FBN"
COIL = "L1 4u7 Device:L | 1 - passive SWN | 2 - passive VOUT1"
LDO = "U1 LM317_TO220 Regulator_Linear:LM317 | 1 ADJ input {adj} | 2 VO power_out VOUT1 | 3 VI power_in +12V"
TOP = "R1 {top} Device:R | 1 - passive VOUT1 | 2 - passive FBN"
BOTTOM = "R2 {bottom} Device:R | 1 - passive FBN | 2 - passive GND"
TANK = "C1 22u Device:C | 1 - passive VOUT1 | 2 - passive GND"


def sources(*lines: str, settings: Settings | None = None) -> Sources:
    scene = Scene(board_of("\n".join(lines)), BOOK, settings or Settings())
    return Sources(scene, Joints(scene))


def evidence(net: str, *lines: str) -> list[Evidence]:
    return sources(*lines).evidence.get(net, [])


def nominal(net: str, *lines: str) -> list[tuple[str, float]]:
    return [(item.kind, round(item.volts.nominal, 3)) for item in evidence(net, *lines) if item.volts is not None]


# ---------------------------------------------------------------------------------------------------- regulators


def test_adjustable_step_down_regulates_beyond_its_coil() -> None:
    found = nominal("VOUT1", BUCK, COIL, TANK, TOP.format(top="31k6"), BOTTOM.format(bottom="10k"))
    assert found == [("feedback", pytest.approx(0.8 * 4.16))]


def test_feed_forward_capacitor_does_not_count() -> None:
    cap = "C9 22p Device:C | 1 - passive VOUT1 | 2 - passive FBN"
    lines = (BUCK, COIL, TANK, TOP.format(top="31k6"), BOTTOM.format(bottom="10k"))
    assert nominal("VOUT1", *lines, cap) == nominal("VOUT1", *lines)


def test_resistors_in_series_and_in_parallel_are_combined() -> None:
    upper = (
        "R1 20k Device:R | 1 - passive VOUT1 | 2 - passive MID",
        "R3 11k6 Device:R | 1 - passive MID | 2 - passive FBN",
    )
    lower = (BOTTOM.format(bottom="20k"), "R4 20k Device:R | 1 - passive GND | 2 - passive FBN")
    ((kind, volts),) = nominal("VOUT1", BUCK, COIL, TANK, *upper, *lower)
    assert (kind, volts) == ("feedback", pytest.approx(0.8 * 4.16))


def test_divider_behind_a_closed_jumper_is_read() -> None:
    jumper = "JP1 Closed(1-2)/Opened(2-3) Pads:SJ | 1 - passive LOWR | 2 - passive FBN | 3 - passive OTHER"
    lower = "R2 10k Device:R | 1 - passive LOWR | 2 - passive GND"
    other = "R3 4k7 Device:R | 1 - passive OTHER | 2 - passive GND"
    assert nominal("VOUT1", BUCK, COIL, TANK, TOP.format(top="31k6"), jumper, lower, other)[0][1] == pytest.approx(
        3.328
    )


def test_margining_resistor_is_left_out() -> None:
    trim = "R9 100k Device:R | 1 - passive FBN | 2 - passive DAC1"
    dac = "U9 MCU Local:MCU | 1 VDD power_in VOUT1 | 2 GND power_in GND | 3 PA4 bidirectional DAC1"
    found = nominal("VOUT1", BUCK, COIL, TANK, TOP.format(top="31k6"), BOTTOM.format(bottom="10k"), trim, dac)
    assert ("feedback", pytest.approx(3.328)) in found


def test_unreadable_divider_gives_no_voltage_but_says_who_makes_it() -> None:
    found = sources(BUCK, COIL, TANK, TOP.format(top="?"), BOTTOM.format(bottom="10k"))
    assert not found.evidence.get("VOUT1")
    assert "U1" in found.made_by["VOUT1"]


def test_feedback_pin_on_the_output_regulates_to_the_reference() -> None:
    direct = BUCK.replace("FBN", "VOUT1")
    assert nominal("VOUT1", direct, COIL, TANK) == [("feedback", 0.8)]


def test_floating_regulator_from_its_two_resistors() -> None:
    lines = (LDO.format(adj="FBN"), TANK, TOP.format(top="240R"), BOTTOM.format(bottom="720R"))
    ((kind, volts),) = nominal("VOUT1", *lines)
    assert kind == "feedback"
    assert volts == pytest.approx(5.036, abs=0.01)


def test_floating_regulator_with_a_grounded_adjust_pin_gives_its_reference() -> None:
    assert nominal("VOUT1", LDO.format(adj="GND"), TANK) == [("feedback", 1.25)]


def test_step_up_regulates_beyond_its_diode() -> None:
    boost = (
        "U1 MT3608 Regulator:MT3608 | 1 SW output SWN | 2 GND power_in GND | 3 FB input FBN | "
        "4 EN input PRE1 | 5 IN power_in PRE1"
    )
    coil = "L1 22u Device:L | 1 - passive PRE1 | 2 - passive SWN"
    diode = "D1 SS34 Device:D_Schottky | 1 K passive VOUT1 | 2 A passive SWN"
    found = sources(boost, coil, diode, TANK, TOP.format(top="75k"), BOTTOM.format(bottom="10k"))
    assert [item.kind for item in found.evidence["VOUT1"]] == ["feedback"]
    assert not found.evidence.get("PRE1")
    assert [(one.source, one.output, one.switched) for one in found.conversions] == [("PRE1", "VOUT1", False)]


def test_fixed_step_down_makes_the_rail_beyond_its_coil_not_its_switch_node() -> None:
    buck = (
        "U1 LM2596S-5 Regulator:LM2596 | 1 VIN power_in +12V | 2 OUT output SWN | 3 GND power_in GND | 4 FB input VOUT1"
    )
    found = sources(buck, COIL, TANK)
    assert [(item.kind, item.volts.nominal) for item in found.evidence["VOUT1"] if item.volts] == [("regulator", 5.0)]
    assert not found.evidence.get("SWN")


def test_negative_regulator_gives_a_negative_rail() -> None:
    line = "U1 L7905 Regulator_Linear:L7905 | 1 GND power_in GND | 2 VI power_in -12V | 3 VO power_out VNEG"
    (item,) = evidence("VNEG", line)
    assert item.volts is not None
    assert item.volts.low < item.volts.nominal == -5.0 < item.volts.high


# ------------------------------------------------------------------------------------------------ connectors, modules


def test_usb_connector_gives_the_range_of_its_bus_power() -> None:
    usb = "J1 USB Connector:USB_C_Receptacle | A4 VBUS power_out VIN1 | B9 VBUS power_out VIN1 | A1 GND power_out GND"
    (item,) = evidence("VIN1", usb)
    assert item.volts == Spread(low=4.4, nominal=5.0, high=5.25)
    assert "A4, B9" in item.text


@pytest.mark.parametrize(("name", "volts"), [("+5V", 5.0), ("3V3", 3.3), ("-12V", -12.0)])
def test_pin_of_a_connector_named_with_a_voltage(name: str, volts: float) -> None:
    edge = f"P1 bus Connector:Bus | 1 {name} passive NX | 2 GND passive GND"
    assert nominal("NX", edge) == [("connector", volts)]


@pytest.mark.parametrize("name", ["3V3_EN", "D5", "GPIO3"])
def test_pin_of_a_connector_that_is_a_signal_gives_nothing(name: str) -> None:
    assert not evidence("NX", f"P1 bus Connector:Bus | 1 {name} passive NX | 2 GND passive GND")


def test_output_of_a_known_module_is_believed() -> None:
    bridge = "U1 FT232RL Interface_USB:FT232RL | 17 3V3OUT power_out NX | 7 GND power_in GND | 20 VCC power_in +5V"
    ((kind, volts),) = nominal("NX", bridge)
    assert (kind, volts) == ("connector", 3.3)


def test_charger_keeps_a_lithium_cell_on_its_battery_pin() -> None:
    charger = "U1 TP4054 Battery:TP4054 | 2 GND power_in GND | 3 BAT power_out NX | 4 VCC power_in +5V"
    (item,) = evidence("NX", charger)
    assert item.volts == Spread(low=3.0, nominal=3.7, high=4.2)


def test_supply_pins_that_name_one_voltage_are_the_last_resort() -> None:
    pins = "U1 ASIC Local:ASIC | 1 VDD33 power_in NX | 2 VDD33 power_in NX | 3 GND power_in GND"
    item = sources(pins).from_use(("NX",))
    assert item is not None
    assert item.volts is not None
    assert (item.kind, item.basis.value, item.volts.nominal) == ("use", "assumed", 3.3)


def test_supply_pins_that_name_two_voltages_tell_nothing() -> None:
    pins = "U1 ASIC Local:ASIC | 1 VDD33 power_in NX | 2 VDD18 power_in NX | 3 GND power_in GND"
    assert sources(pins).from_use(("NX",)) is None
