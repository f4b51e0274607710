"""Traps that designers fall into, each as a small board through the whole review: the wrong part speaks, the right one is quiet.

What the library knows of each is in ``tests/trade/test_traps.py``; the source or "common practice" stands with each trap.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from gauge_cells import BUS, CONTROLLER, INVERTER_5V, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import BOOK, case_of, findings_of
from written_boards import netlist

from levelcrossing.model import Settings
from levelcrossing.read import read_board
from levelcrossing.review import open_case

LOW_RAIL = (
    "U8 AP2112K-{volts} Regulator_Linear:x | 1 VIN power_in +5V | 2 GND power_in GND | 5 VOUT power_out VLOW\n"
    "C8 10u Device:C | 1 - passive VLOW | 2 - passive GND\n"
)
FROM_3V3 = (
    SUPPLIES + "U4 74LVC1G34 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /X\n"
)
FROM_5V = SUPPLIES + INVERTER_5V.format(out="/X")
ONE_LINE = BUS.replace("/SDA5", "/SDA").replace("/SCL5", "/SCL")
TO_3V3 = resistor("R5", "4.7k", "+3V3", "/SDA") + resistor("R7", "4.7k", "+3V3", "/SCL")
TXB = (
    "U7 TXB0104D Logic_LevelTranslator:x | 1 VCCA power_in {a} | 14 VCCB power_in {b} | 7 GND power_in GND"
    " | 8 OE input {a} | 2 A1 bidirectional {near} | 13 B1 bidirectional {far}\n"
)


def gate(value: str, rail: str = "+5V", symbol: str = "74xx:74HC04") -> str:
    return f"U3 {value} {symbol} | 14 VCC power_in {rail} | 7 GND power_in GND | 1 - input /X | 2 - output /Y\n"


def controller(value: str, pin: str, rail: str, supply: str) -> str:
    return f"U3 {value} MCU:{value} | 4 {supply} power_in {rail} | 3 GND power_in GND | 10 {pin} bidirectional /X\n"


def spoke(text: str) -> set[tuple[str, str, str]]:
    return {(finding.rule, finding.outcome.value, finding.part) for finding in findings_of(text)}


HIGH, OVER = "high-not-reached", "input-overvoltage"

TRAPS = {
    # 0.7 of 5 V against 2.0 V (TI SN74HC240 SCLS128H, TI CD74HCT14)
    "3.3 V into 74HC at 5 V": (FROM_3V3 + gate("74HC04"), {(HIGH, "malfunction", "U3")}),
    "3.3 V into 74HCT at 5 V": (FROM_3V3 + gate("74HCT04"), set()),
    # Worldsemi WS2812B: 0.7 VDD
    "3.3 V into an addressable LED at 5 V": (
        FROM_3V3
        + "D1 WS2812B LED:WS2812B | 1 VDD power_in +5V | 3 VSS power_in GND | 4 DIN input /X | 2 DOUT output /M\n",
        {(HIGH, "malfunction", "D1")},
    ),
    # the value is a 5 V tolerant 74LVC, the symbol a 74LS (common practice: symbols carry another family)
    "74LVC245 on a 74LS245 symbol takes 5 V": (
        FROM_5V
        + "U3 74LVC245 74xx:74LS245 | 20 VCC power_in +3V3 | 10 GND power_in GND | 1 A->B input +3V3 | 19 CE input GND"
        " | 2 A0 tri_state /X | 18 B0 tri_state /Y\n",
        set(),
    ),
    # Nexperia 74HC4050: 16 V, diode to ground only; 74HC125: clamps both ways
    "74HC4050 as a down-shifter": (
        FROM_5V + "U3 74HC4050 4xxx:4050 | 1 VDD power_in +3V3 | 8 VSS power_in GND | 3 - input /X | 2 - output /Y\n",
        set(),
    ),
    "74HC125 as a down-shifter": (
        FROM_5V
        + "U3 74HC125 74xx:74HC125 | 14 VCC power_in +3V3 | 7 GND power_in GND | 1 - input GND | 2 - input /X | 3 - tri_state /Y\n",
        {(OVER, "damage", "U3")},
    ),
    # ST DS5319 table 5: PA9 is FT, PA0 is not
    "5 V into a tolerant pin of an F103": (FROM_5V + controller("STM32F103C8T6", "PA9", "+3V3", "VDD"), set()),
    "5 V into another pin of an F103": (
        FROM_5V + controller("STM32F103C8T6", "PA0", "+3V3", "VDD"),
        {(OVER, "damage", "U3")},
    ),
    # Maxim DS1307: VIH 2.2 V whatever the supply; DS3231: 0.7 VCC
    "a DS1307 at 5 V on a 3.3 V bus": (ONE_LINE + TO_3V3, set()),
    "a DS3231 at 5 V on a 3.3 V bus": (
        ONE_LINE.replace("DS1307Z+", "DS3231M") + TO_3V3,
        {("pull-up-rail", "malfunction", "U3")},
    ),
    # onsemi: 3.0 V at most against 1.5 V at most
    "a 2N7000 with a 3.3 V gate": (
        BUS + PULL_UPS + MOSFET_PAIR.replace("BSS138", "2N7000"),
        {("gate-threshold", "marginal", "Q1"), ("gate-threshold", "marginal", "Q2")},
    ),
    "a BSS138 with a 3.3 V gate": (BUS + PULL_UPS + MOSFET_PAIR, set()),
    # 1.8 V less a driver's 0.4 V leaves less than the 1.5 V that a BSS138 may need (NXP AN10441 circuit, computed);
    # 1 kohm in the driver's line stands for a weak low
    "a BSS138 with a 1.5 V gate": (
        SUPPLIES
        + LOW_RAIL.format(volts="1.5")
        + "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input GND | 4 - output /HI\n"
        "U3 74LVC1G17 74xGxx:x | 5 VCC power_in VLOW | 3 GND power_in GND | 2 - input /X | 4 - output /Y\n"
        "Q1 BSS138 Transistor_FET:BSS138 | 1 G passive VLOW | 2 S passive /X | 3 D passive /HI\n"
        + resistor("R1", "10k", "VLOW", "/X")
        + resistor("R2", "10k", "+5V", "/HI"),
        {("gate-threshold", "marginal", "Q1"), ("supply-range", "malfunction", "U3")},
    ),
    # TI TXB0104 SCES650: not for open drains, 50 kohm at least, VCCA at most VCCB
    "a TXB on an I2C bus": (
        BUS
        + TXB.format(a="+3V3", b="+5V", near="/SDA", far="/SDA5")
        + resistor("R1", "4.7k", "+5V", "/SDA5")
        + resistor("R2", "4.7k", "+3V3", "/SDA"),
        {("translator-load", "malfunction", "U7")},
    ),
    "VCCA above VCCB": (
        FROM_3V3 + LOW_RAIL.format(volts="1.8") + TXB.format(a="+3V3", b="VLOW", near="/X", far="/Q"),
        {("translator-supplies", "malfunction", "U7")},
    ),
    "VCCA below VCCB": (
        FROM_3V3 + LOW_RAIL.format(volts="2.5") + TXB.format(a="VLOW", b="+3V3", near="/Q", far="/X"),
        set(),
    ),
    # NXP TJA1051 rev. 7 table 7: TXD and RXD follow VIO, which is VCC where there is no such pin
    "a CAN transceiver with VIO": (
        SUPPLIES + "U3 TJA1051T/3 Interface_CAN_LIN:x | 3 VCC power_in +5V | 5 VIO power_in +3V3 | 2 GND power_in GND"
        " | 1 TXD input /A | 4 RXD output /B\n" + CONTROLLER,
        set(),
    ),
    "a CAN transceiver without VIO": (
        SUPPLIES
        + "U3 TJA1051T Interface_CAN_LIN:x | 3 VCC power_in +5V | 2 GND power_in GND | 1 TXD input /A | 4 RXD output /B\n"
        + CONTROLLER,
        {(OVER, "damage", "U1"), (HIGH, "malfunction", "U3")},
    ),
    # Plantower PMS5003, from memory: fed with 5 V, its pins live on 3.3 V
    "a module fed with 5 V that talks 3.3 V": (
        SUPPLIES
        + "U3 PMS5003 Sensor:x | 1 VCC power_in +5V | 2 GND power_in GND | 4 RXD input /A | 5 TXD output /B\n"
        + CONTROLLER,
        set(),
    ),
    "5 V into such a module": (
        FROM_5V + "U3 PMS5003 Sensor:x | 1 VCC power_in +5V | 2 GND power_in GND | 4 RXD input /X | 5 TXD output /B\n",
        {(OVER, "damage", "U3")},
    ),
    # Atmel 8271 table 29-1: 0.6 VCC; Microchip ATmega4809: 0.7 VDD
    "3.3 V into an ATmega328P at 5 V": (FROM_3V3 + controller("ATmega328P-AU", "PD2", "+5V", "VCC"), set()),
    "3.3 V into an ATmega4809 at 5 V": (
        FROM_3V3 + controller("ATmega4809-AU", "PD2", "+5V", "VDD"),
        {(HIGH, "malfunction", "U3")},
    ),
    # TI SN74LV04A SCLS388K takes 5.5 V at any supply, plain LV clamps (Philips 74LV245)
    "5 V into plain LV": (FROM_5V + gate("74LV04", "+3V3"), {(OVER, "damage", "U3")}),
    "5 V into LV-A": (FROM_5V + gate("SN74LV04A", "+3V3"), set()),
    # Raspberry Pi RP2350 data sheet table 1433: 5.5 V while IOVDD is up, not on the pins that are analogue too
    "5 V into an RP2350": (FROM_5V + controller("RP2350A", "GPIO4", "+3V3", "IOVDD"), set()),
    "5 V into an analogue pin of an RP2350": (
        FROM_5V + controller("RP2350A", "GPIO26_ADC0", "+3V3", "IOVDD"),
        {(OVER, "damage", "U3")},
    ),
    # the value says 1.8 V (Winbond W25Q128JW), whatever the symbol
    "a 1.8 V flash on 3.3 V": (
        SUPPLIES
        + "U3 W25Q128JWSIQ Memory_Flash:W25Q128JVS | 8 VCC power_in +3V3 | 4 GND power_in GND | 6 CLK input /A\n"
        + CONTROLLER,
        {("supply-range", "damage", "U3")},
    ),
    # an open drain whatever the symbol says: pulled up to 5 V it reaches 5 V (TI SN74LVC1G07)
    "an open-drain buffer drawn as an output": (
        FROM_3V3.replace("74LVC1G34", "74LVC1G07") + resistor("R1", "4.7k", "+5V", "/X") + gate("74HC04"),
        set(),
    ),
    # TI 2N7001T: a translator of one bit, no MOSFET
    "a 2N7001T is a translator": (
        SUPPLIES
        + LOW_RAIL.format(volts="1.8")
        + "U4 74LVC1G34 74xGxx:x | 5 VCC power_in VLOW | 3 GND power_in GND | 2 - input GND | 4 - output /Q\n"
        "U7 2N7001T Logic:x | 1 VCCA power_in VLOW | 5 VCCB power_in +3V3 | 2 GND power_in GND | 3 A input /Q | 4 B output /X\n"
        + gate("74LVC04", "+3V3"),
        set(),
    ),
}


@pytest.mark.parametrize("name", TRAPS)
def test_the_trap_and_its_way_out(name: str) -> None:
    text, expected = TRAPS[name]
    assert spoke(text) == expected


def test_every_trap_meets_a_crossing() -> None:
    """A quiet board must have been judged, not overlooked."""
    for name, (text, _) in TRAPS.items():
        if name in ("VCCA above VCCB", "VCCA below VCCB", "a 1.8 V flash on 3.3 V"):
            continue  # there the part itself is judged
        if name in ("a module fed with 5 V that talks 3.3 V", "a CAN transceiver with VIO"):
            continue  # that there is no crossing is the very point
        assert case_of(text).crossings, name


def test_a_part_in_brackets_after_na_is_not_fitted(tmp_path: Path) -> None:
    """``NA(BSS138)``: a way of writing "not assembled" on real boards (common practice)."""
    for value, fitted in (("BSS138", True), ("NA(BSS138)", False)):
        path = tmp_path / f"{fitted}.net"
        path.write_text(netlist(BUS + PULL_UPS + MOSFET_PAIR.replace("BSS138", value, 1)), encoding="utf-8")
        case = open_case(read_board(str(path)), Settings(), BOOK)
        assert any("Q1" in one.crossing.link for one in case.crossings) is fitted


def test_mcp1703a_3302_makes_3v3() -> None:
    """Microchip DS25122A: the first two digits are the voltage, the next the tolerance."""
    text = (
        "J9 USB Connector:USB_B_Micro | 1 VBUS power_out +5V | 5 GND power_in GND\n"
        "U9 MCP1703A-3302 Regulator_Linear:x | 1 VI power_in +5V | 2 GND power_in GND | 3 VO power_out VX\n"
        + INVERTER_5V.format(out="/X")
        + gate("74HC04", "VX")
    )
    volts = case_of(text).rails.volts("VX")
    assert volts is not None and volts.nominal == pytest.approx(3.3)
    assert (OVER, "damage", "U3") in spoke(text)


@pytest.mark.parametrize(("value", "speaks"), [("74HC1G125", True), ("74LVC1G125", False)])
def test_a_part_with_partial_power_down_passes_nothing_on(value: str, speaks: bool) -> None:
    """74HC has diodes to its supply, 74LVC has Ioff (Nexperia 74HC00, TI SN74LVC1G125)."""
    apart = SUPPLIES.replace(
        "U9 AMS1117-3.3 Regulator_Linear:AMS1117-3.3 | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in +5V",
        "J8 Host Connector_Generic:Conn_01x02 | 1 3V3 passive +3V3 | 2 GND passive GND",
    )
    text = (
        apart
        + INVERTER_5V.format(out="/X")
        + resistor("R1", "1k", "/X", "/Z")
        + f"U3 {value} 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 1 - input GND | 2 - input /Z | 4 - output /Y\n"
    )
    assert ("unpowered-path" in {finding.rule for finding in findings_of(text)}) is speaks


def test_an_ft232r_guarantees_only_2v2_under_load() -> None:
    """FTDI: VOH 2.2 V at 1 mA from VCCIO 3.3 V; a 5 V input of 0.6 VCC with a pull-down of 2.2 kohm misses its high."""
    bridge = (
        "U3 FT232RL Interface_USB:x | 20 VCC power_in +5V | 4 VCCIO power_in +3V3 | 7 GND power_in GND | 1 TXD output /X\n"
        "U5 ATmega328P-AU MCU:x | 4 VCC power_in +5V | 3 GND power_in GND | 30 PD0 bidirectional /X\n"
    )
    assert not [one for one in findings_of(SUPPLIES + bridge) if one.rule == HIGH]
    loaded = findings_of(SUPPLIES + bridge + resistor("R1", "2.2k", "/X", "GND"))
    assert [one.part for one in loaded if one.rule == HIGH] == ["U5"]
