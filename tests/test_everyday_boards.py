"""Small boards as hobbyists and engineers draw them every day: what must be said of each, and nothing else.

The circuits are common practice of the trade; what is right or wrong about each follows from the data sheets of its parts.
"""

from __future__ import annotations

import pytest
from gauge_cells import MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import case_of, findings_of

AVR_PINS = {"mosi": "15 PB3", "miso": "16 PB4", "sck": "17 PB5", "rx": "30 PD0", "tx": "31 PD1", "sda": "27 PC4"} | {
    "scl": "28 PC5",
    "io": "32 PD2",
}
ESP_PINS = {
    "tx": "35 TXD0/IO1",
    "rx": "34 RXD0/IO3",
    "sda": "33 IO21",
    "scl": "36 IO22",
    "io": "26 IO4",
    "adc": "6 IO34",
}
BARREL = "J5 12V Connector:Barrel_Jack | 1 - passive +12V | 2 - passive GND\n"
CARD = (
    "J2 Micro_SD_Card Connector:Micro_SD_Card | 4 VDD power_in +3V3 | 6 VSS power_in GND"
    " | 3 CMD input {cmd} | 5 CLK input {clk} | 7 DAT0 bidirectional {dat}\n"
)
SENSOR = (
    "U3 BME280 Sensor:BME280 | 8 VDD power_in +3V3 | 6 VDDIO power_in +3V3 | 1 GND power_in GND"
    " | 3 SDI bidirectional /SDA | 4 SCK input /SCL\n"
)
OPTO = "U5 PC817 Isolator:PC817 | 1 A passive /OA | 2 K passive GND | 3 E passive GND | 4 C passive /OC\n"
SONAR = (
    "J6 HC-SR04 Connector_Generic:Conn_01x04 | 1 VCC passive +5V | 2 Trig passive /TRG | 3 Echo passive /ECHO5"
    " | 4 GND passive GND\n"
)
RS485 = (
    "U7 MAX485E Interface_UART:MAX485E | 8 VCC power_in +5V | 5 GND power_in GND | 1 RO output /RO | 2 ~{RE} input /DE"
    " | 3 DE input /DE | 4 DI input /DI | 6 A bidirectional /A | 7 B bidirectional /BB\n"
)


def avr(**nets: str) -> str:
    """Return a 5 V controller with some pins on nets, the others on nets of their own."""
    pins = "".join(f" | {pin} bidirectional {nets.get(name, '/U1_' + name)}" for name, pin in AVR_PINS.items())
    return f"U1 ATmega328P-AU MCU:ATmega328P-A | 4 VCC power_in +5V | 3 GND power_in GND{pins}\n"


def esp(**nets: str) -> str:
    """Return a 3.3 V radio module with some pins on nets, the others on nets of their own."""
    pins = "".join(
        f" | {pin} {'input' if name == 'adc' else 'bidirectional'} {nets.get(name, '/U2_' + name)}"
        for name, pin in ESP_PINS.items()
    )
    return f"U2 ESP32-WROOM-32E RF_Module:ESP32-WROOM-32 | 2 VDD power_in +3V3 | 1 GND power_in GND{pins}\n"


def divider(first: int, top: str, bottom: str, net: str, tap: str) -> str:
    return resistor(f"R{first}", top, net, tap) + resistor(f"R{first + 1}", bottom, tap, "GND")


def said(text: str) -> list[tuple[str, str, str]]:
    """Return (outcome, rule, place) of every finding on a board with the usual supplies."""
    return [
        (finding.outcome.value, finding.rule, f"{finding.part}.{finding.pin}".rstrip("."))
        for finding in findings_of(SUPPLIES + text)
    ]


GOOD = {
    "card behind dividers": avr(mosi="/MOSI", miso="/MISO", sck="/SCK")
    + divider(1, "1k", "2k", "/MOSI", "/CMD")
    + divider(3, "1k", "2k", "/SCK", "/CLK")
    + CARD.format(cmd="/CMD", clk="/CLK", dat="/MISO"),
    "serial line behind a divider": avr(rx="/X", tx="/Y")
    + esp(tx="/X", rx="/Z")
    + divider(1, "2.2k", "3.3k", "/Y", "/Z"),
    "two-wire bus at 3.3 V": avr(sda="/SDA", scl="/SCL")
    + SENSOR
    + resistor("R1", "4.7k", "+3V3", "/SDA")
    + resistor("R2", "4.7k", "+3V3", "/SCL"),
    "character display that is only written": esp(io="/RS")
    + "DS1 HD44780 Display_Character:HY1602E | 2 VDD power_in +5V | 1 VSS power_in GND | 4 RS input /RS | 5 R/W input GND\n",
    "relay behind an NPN transistor": esp(io="/RLY")
    + resistor("R1", "1k", "/RLY", "/B")
    + "Q1 BC847 Transistor_BJT:BC847 | 1 B input /B | 2 E passive GND | 3 C passive /COIL\n"
    + "D1 1N4148 Diode:1N4148 | 1 K passive +5V | 2 A passive /COIL\n"
    + "K1 SRD-05VDC-SL-C Relay:SANYOU | A1 - passive +5V | A2 - passive /COIL | 11 - passive /R1 | 14 - passive /R3\n",
    "light-emitting diode to ground": esp(io="/L")
    + resistor("R1", "1k", "/L", "/LA")
    + "D1 LED Device:LED | 1 K passive GND | 2 A passive /LA\n",
    "optocoupler from 5 V to 3.3 V": avr(io="/O")
    + resistor("R1", "470", "/O", "/OA")
    + OPTO
    + resistor("R2", "10k", "+3V3", "/OC")
    + esp(io="/OC"),
    "Darlington array": esp(io="/IN1")
    + "U6 ULN2003A Transistor_Array:ULN2003A | 1 I1 input /IN1 | 8 GND power_in GND | 9 COM passive +5V"
    + " | 16 O1 open_collector /O1\n",
    "echo of a range finder behind a divider": esp(io="/ECHO") + SONAR + divider(1, "1k", "2k", "/ECHO5", "/ECHO"),
    "MOSFET pairs on a two-wire bus": avr(sda="/SDA5", scl="/SCL5")
    + esp(sda="/SDA", scl="/SCL")
    + MOSFET_PAIR
    + PULL_UPS,
    "voltage of the supply at a named converter input": BARREL
    + esp(adc="/ADC_12V")
    + divider(1, "100k", "22k", "+12V", "/ADC_12V"),
    "tolerant buffer": avr(io="/H")
    + "U10 CD4050BE 4xxx:4050 | 1 VDD power_in +3V3 | 8 VSS power_in GND | 3 - input /H | 2 - output /L\n"
    + esp(io="/L"),
    "high side through an NPN transistor": esp(io="/G")
    + resistor("R3", "1k", "/G", "/BB")
    + "Q6 MMBT3904 Transistor_BJT:MMBT3904 | 1 B input /BB | 2 E passive GND | 3 C passive /GP\n"
    + "Q5 AO3401A Transistor_FET:AO3401A | 1 G input /GP | 2 S passive +5V | 3 D passive /LOAD\n"
    + resistor("R1", "10k", "+5V", "/GP"),
}


@pytest.mark.parametrize("name", GOOD)
def test_a_sound_everyday_board_gets_no_finding(name: str) -> None:
    assert said(GOOD[name]) == []


FAULTY = {
    "card straight on 5 V": (
        avr(mosi="/MOSI", miso="/MISO", sck="/SCK") + CARD.format(cmd="/MOSI", clk="/SCK", dat="/MISO"),
        [("damage", "input-overvoltage", "J2.3"), ("damage", "input-overvoltage", "J2.5")],
    ),
    "serial line straight": (
        avr(rx="/X", tx="/Y") + esp(tx="/X", rx="/Y"),
        [("damage", "input-overvoltage", "U2.34")],
    ),
    "two-wire bus at 5 V with a 3.3 V sensor": (
        avr(sda="/SDA", scl="/SCL")
        + SENSOR
        + resistor("R1", "4.7k", "+5V", "/SDA")
        + resistor("R2", "4.7k", "+5V", "/SCL"),
        [("marginal", "pull-up-rail", "U3.3"), ("marginal", "pull-up-rail", "U3.4")],
    ),
    "optocoupler pulled to 5 V": (
        avr(io="/O") + resistor("R1", "470", "/O", "/OA") + OPTO + resistor("R2", "10k", "+5V", "/OC") + esp(io="/OC"),
        [("marginal", "pull-up-rail", "U2.26")],
    ),
    "transceiver of 5 V": (
        esp(tx="/DI", rx="/RO", io="/DE") + RS485,
        [("damage", "input-overvoltage", "U2.34")],
    ),
    "echo of a range finder straight": (
        esp(io="/ECHO5") + SONAR,
        [("damage", "input-overvoltage", "U2.26")],
    ),
    "MOSFET pairs the wrong way round": (
        avr(sda="/SDA5", scl="/SCL5")
        + esp(sda="/SDA", scl="/SCL")
        + "Q1 BSS138 Transistor_FET:BSS138 | 1 G passive +3V3 | 2 S passive /SDA5 | 3 D passive /SDA\n"
        + "Q2 BSS138 Transistor_FET:BSS138 | 1 G passive +3V3 | 2 S passive /SCL5 | 3 D passive /SCL\n"
        + PULL_UPS,
        [("malfunction", "shifter-reversed", "Q1"), ("malfunction", "shifter-reversed", "Q2")],
    ),
    "supply at an input that may be digital": (
        BARREL + esp(adc="/X12") + divider(1, "100k", "22k", "+12V", "/X12"),
        [("unknown", "pull-up-rail", "U2.6")],
    ),
    "high side straight": (
        esp(io="/G")
        + "Q5 AO3401A Transistor_FET:AO3401A | 1 G input /G | 2 S passive +5V | 3 D passive /LOAD\n"
        + resistor("R1", "10k", "+5V", "/G"),
        [("malfunction", "switch-level", "Q5"), ("marginal", "pull-up-rail", "U2.26")],
    ),
    "push-pull supervisor on 5 V": (
        esp(io="/RST")
        + "U11 MAX809L Power_Supervisor:MAX809 | 2 ~{RESET} output /RST | 3 VCC power_in +5V | 1 GND power_in GND\n",
        [("damage", "input-overvoltage", "U2.26")],
    ),
    "connector of 12 V of which nothing else is known": (
        BARREL
        + esp(io="/PWM", adc="/TACH")
        + resistor("R1", "10k", "+3V3", "/TACH")
        + "J7 Fan Connector:Conn_01x04 | 1 GND passive GND | 2 12V passive +12V | 3 TACH passive /TACH | 4 PWM passive /PWM\n",
        [("unknown", "pin-unknown", "J7.3")],
    ),
}


@pytest.mark.parametrize("name", FAULTY)
def test_a_faulty_everyday_board_gets_its_findings_and_no_others(name: str) -> None:
    text, expected = FAULTY[name]
    assert said(text) == expected


def test_the_names_of_the_serial_lines_say_what_the_controller_does() -> None:
    """Host in, device out: the controller's pin on MISO only reads; with a programming header there it may drive too."""
    text = SUPPLIES + FAULTY["card straight on 5 V"][0]
    pins = case_of(text).pins
    assert pins["U1", "16"].drive is None and not pins["U1", "15"].when
    with_header = case_of(
        text + "J3 ISP Connector_Generic:Conn_01x02 | 1 Pin_1 passive /MISO | 2 Pin_2 passive GND\n"
    ).pins
    assert with_header["U1", "16"].when
    damage = [one for one in findings_of(text.replace("/MISO", "/DATA")) if one.rule == "input-overvoltage"]
    assert [one.condition for one in damage] == ["", "", "U1.16 (PB4) is configured as an output"]


def test_a_bus_of_open_drains_without_a_pull_up_is_none() -> None:
    """Without a pull-up a pin called SDA drives both levels, or nothing makes the high."""
    with_pull = case_of(SUPPLIES + GOOD["two-wire bus at 3.3 V"])
    assert {with_pull.pins["U1", pin].drive.style for pin in ("27", "28")} == {"open-drain"}
    assert not any(with_pull.pins["U1", pin].when for pin in ("27", "28"))
    without = case_of(SUPPLIES + avr(sda="/SDA", scl="/SCL") + SENSOR)
    assert {without.pins["U1", pin].drive.style for pin in ("27", "28")} == {"push-pull"}


def test_a_pull_up_behind_a_small_series_resistor_counts() -> None:
    text = avr(sda="/MCU_SDA") + SENSOR + resistor("R1", "4.7k", "+3V3", "/SDA")
    text += resistor("R9", "100", "/SDA", "/MCU_SDA")
    assert case_of(SUPPLIES + text).pins["U1", "27"].drive.style == "open-drain"


def test_nothing_goes_up_through_a_divider() -> None:
    crossings = case_of(SUPPLIES + avr(io="/H") + divider(1, "2.2k", "3.3k", "/H", "/L") + esp(io="/L")).crossings
    assert [(one.crossing.driver.part, one.crossing.receiver.part) for one in crossings] == [("U1", "U2")]


@pytest.mark.parametrize(("name", "measured"), [("/VBAT_SENSE", True), ("/ADC3", True), ("/X12", False)])
def test_a_measured_voltage_has_no_levels_but_a_limit(name: str, measured: bool) -> None:
    text = BARREL + esp(adc=name) + divider(1, "100k", "22k", "+12V", name)
    (solved,) = case_of(SUPPLIES + text).crossings
    assert (solved.crossing.receiver.receive.reads is False) is measured
    assert bool(solved.crossing.level_if) is not measured
    high = BARREL + esp(adc=name) + divider(1, "1k", "1k", "+12V", name)
    assert ("damage", "pull-up-rail", "U2.6") in said(high)


UNO = "A1 {value} MCU_Module:x | 5 +5V power_out +5V | 29 GND power_in GND | 15 D0/RX bidirectional {rx} | 16 D1/TX bidirectional {tx}\n"
HEADER = "J4 {value} Connector_Generic:Conn_01x04 | 1 VCC passive {rail} | 2 GND passive GND | 3 TXD passive {tx} | 4 RXD passive {rx}\n"
BOARD = "U7 {value} Module:x | 1 VIN power_in +5V | 2 GND power_in GND | 3 {pin} bidirectional {net}\n"


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        ("Arduino_UNO_R3", [("damage", "input-overvoltage", "U2.34")]),
        ("Arduino_Nano_v3.x", [("damage", "input-overvoltage", "U2.34")]),
        # A later board reads a high from 0.7 of 5 V only.
        ("Arduino_UNO_R4", [("damage", "input-overvoltage", "U2.34"), ("malfunction", "high-not-reached", "A1.15")]),
    ],
)
def test_a_controller_board_talks_at_5_volts(value: str, expected: list[tuple[str, str, str]]) -> None:
    assert said(UNO.format(value=value, rx="/RX", tx="/TX") + esp(tx="/RX", rx="/TX")) == expected


def test_a_radio_board_fed_with_5_volts_keeps_its_3_3_volt_input() -> None:
    board = HEADER.format(value="HC-05", rail="+5V", tx="/RX", rx="/TX")
    found = said(avr(rx="/RX", tx="/TX") + board)
    assert ("damage", "input-overvoltage", "J4.4") in found
    assert {outcome for outcome, _, place in found if place != "J4.4"} == {"marginal"}
    assert not [one for one in found if one[1] == "supply-range"]


@pytest.mark.parametrize(
    ("value", "pin"),
    [
        ("NodeMCU_1.0_(ESP-12E)", "D2"),
        ("WeMos_D1_mini", "D2"),
        ("ESP32-DEVKITC-32D", "IO4"),
        ("Arduino_Nano_33_IoT", "D2"),
    ],
)
def test_a_board_on_5_volts_has_pins_of_3_3_volts(value: str, pin: str) -> None:
    """The regulator is on the board: its output need not be connected anywhere."""
    found = said(BOARD.format(value=value, pin=pin, net="/ECHO5") + SONAR)
    assert ("damage", "input-overvoltage", "U7.3") in found


def test_a_bare_part_on_a_header_out_of_its_range_is_a_board_of_its_own() -> None:
    """A display controller's panel supply is 7 V to 15 V; on a board with 3.3 V it has a pump, and nothing tells more."""
    oled = (
        "J4 OLED_SSD1306 Connector_Generic:Conn_01x04 | 1 GND passive GND | 2 VCC passive +3V3 | 3 SCL passive /SCL"
        " | 4 SDA passive /SDA\n"
    )
    (finding,) = findings_of(SUPPLIES + avr(sda="/SDA", scl="/SCL") + oled)
    assert (finding.rule, finding.outcome.value, finding.part) == ("input-overvoltage", "unknown", "J4")
    assert "the other side of J4.3 works from +3V3, the only supply on J4" in finding.condition


def test_lines_pulled_above_all_supplies_of_a_connector_are_a_question() -> None:
    sensor = (
        "J4 Thermometer Connector_Generic:Conn_01x04 | 1 VIN passive +3V3 | 2 GND passive GND | 3 SCL passive /SCL"
        " | 4 SDA passive /SDA\n"
    )
    pulls = resistor("R1", "4.7k", "+5V", "/SDA") + resistor("R2", "4.7k", "+5V", "/SCL")
    assert [one[:2] for one in said(avr(sda="/SDA", scl="/SCL") + sensor + pulls)] == [("unknown", "input-overvoltage")]
    assert said(avr(sda="/SDA", scl="/SCL") + sensor.replace("+3V3", "+5V") + pulls) == []


def test_an_interrupt_of_a_motion_sensor_drives_both_levels() -> None:
    """From reset on the INT pins of such sensors are push-pull: 1.8 V is no high for a 3.3 V controller."""
    low = "U12 AP2112K-1.8 Regulator_Linear:x | 1 VIN power_in +3V3 | 2 GND power_in GND | 3 EN input +3V3 | 5 VOUT power_out +1V8\n"
    sensor = "U4 LIS3DH Sensor_Motion:x | 1 Vdd_IO power_in +1V8 | 14 Vdd power_in +1V8 | 5 GND power_in GND | 11 INT1 output /INT\n"
    assert said(low + sensor + esp(io="/INT")) == [("malfunction", "high-not-reached", "U2.26")]


@pytest.mark.parametrize(("net", "settled"), [("/UART_TX", True), ("/TX", True), ("/GPIO", False)])
def test_a_serial_net_settles_pins_that_can_be_its_ends(net: str, settled: bool) -> None:
    header = (
        "J1 Raspberry_Pi_2_3 Connector:Raspberry_Pi_2_3 | 2 5V power_in +5V | 1 3V3 power_in +3V3 | 6 GND power_in GND"
    )
    pins = case_of(SUPPLIES + header + f" | 8 GPIO14/TXD bidirectional {net}\n" + avr(rx=net)).pins
    assert (not pins["J1", "8"].when) is settled


def test_a_pull_up_does_not_stand_for_what_an_output_does_on_its_line() -> None:
    """A 5 V output on the line of a 3.3 V pin is its own matter, whatever pulls the line up."""
    found = findings_of(SUPPLIES + avr(io="/RST") + esp(io="/RST") + resistor("R1", "10k", "+5V", "/RST"))
    assert [(one.outcome.value, one.rule, bool(one.condition)) for one in found] == [
        ("damage", "input-overvoltage", True),
        ("marginal", "pull-up-rail", False),
    ]


MUX = (
    "U4 TCA9548APWR Interface_Expansion:x | 24 VCC power_in {rail} | 12 GND power_in GND | 23 SDA bidirectional /SDA"
    " | 22 SCL input /SCL | 4 SD0 bidirectional /SD0 | 5 SC0 bidirectional /SC0\n"
    "U3 DS1307Z Timer_RTC:x | 8 VCC power_in +5V | 4 GND power_in GND | 5 SDA bidirectional /SD0 | 6 SCL input /SC0\n"
)
MUX_PULLS = "".join(
    resistor(f"R{n}", "4.7k", rail, net)
    for n, (rail, net) in enumerate((("+3V3", "/SDA"), ("+3V3", "/SCL"), ("+5V", "/SD0"), ("+5V", "/SC0")), 1)
)


@pytest.mark.parametrize(("rail", "expected"), [("+3V3", []), ("+5V", [("marginal", "clamp-current", "U2.33")])])
def test_a_multiplexer_passes_no_more_than_its_supply_lets_through(
    rail: str, expected: list[tuple[str, str, str]]
) -> None:
    """TI TCA9548A SCPS207: at 3.3 V it passes at most 2.8 V, at 5 V up to 4.5 V, which a 3.3 V controller does not bear."""
    text = MUX.format(rail=rail) + MUX_PULLS + esp(sda="/SDA", scl="/SCL")
    ends = {(one.crossing.driver.part, one.crossing.receiver.part) for one in case_of(SUPPLIES + text).crossings}
    assert ends == {("U3", "U2"), ("U2", "U3")}
    assert said(text) == expected


def test_a_stage_of_npn_transistors_ends_below_its_supply() -> None:
    """TI NE555 at 5 V: 3.3 V typical at 100 mA; unloaded about two junctions below the supply."""
    timer = (
        "U5 {value} Timer:x | 8 VCC power_in +5V | 1 GND power_in GND | 3 Q output /X | 4 R input +5V | 5 CV input /C\n"
    )
    bipolar, cmos = (findings_of(SUPPLIES + timer.format(value=value) + esp(io="/X")) for value in ("NE555P", "TLC555"))
    assert [(one.rule, one.outcome.value) for one in bipolar] == [("input-overvoltage", "marginal")]
    assert [(one.rule, one.outcome.value) for one in cmos] == [("input-overvoltage", "damage")]


def test_a_memory_on_lines_with_names_is_used_one_way() -> None:
    flash = (
        "U4 W25Q128JVS Memory_Flash:x | 8 VCC power_in +3V3 | 4 GND power_in GND | 6 CLK input /SCK"
        " | 5 DI(IO0) bidirectional /MOSI | 2 DO(IO1) bidirectional /MISO\n"
    )
    pins = case_of(SUPPLIES + flash + avr(mosi="/MOSI", miso="/MISO", sck="/SCK")).pins
    assert pins["U4", "5"].drive is None and pins["U1", "16"].drive is None and not pins["U4", "2"].when


ARRAY = "U6 ULN2003A Transistor_Array:ULN2003A | 1 I1 input /IN | 8 GND power_in GND | 9 COM passive +5V | 16 O1 open_collector /O\n"


@pytest.mark.parametrize(("volts", "expected"), [("3.3", []), ("1.8", [("malfunction", "high-not-reached", "U6.1")])])
def test_a_darlington_array_needs_2_4_volts(volts: str, expected: list[tuple[str, str, str]]) -> None:
    """TI ULN2003A SLRS027: 2.4 V at its input, whatever supplies the driver; the array itself has no supply."""
    gate = "U4 74LVC1G34 74xGxx:x | 5 VCC power_in VLOW | 3 GND power_in GND | 2 - input GND | 4 - output /IN\n"
    low = f"U12 AP2112K-{volts} Regulator_Linear:x | 1 VIN power_in +5V | 2 GND power_in GND | 3 EN input +5V | 5 VOUT power_out VLOW\n"
    assert said(low + gate + ARRAY) == expected


def test_a_darlington_transistor_pulls_no_lower_than_its_saturation() -> None:
    text = SUPPLIES + avr(io="/IN") + ARRAY + resistor("R1", "4.7k", "+3V3", "/O") + esp(io="/O")
    low = next(one.low for one in case_of(text).crossings if one.crossing.receiver.part == "U2")
    assert 0.7 < low.nominal < 0.8
