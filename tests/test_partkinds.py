"""What kind a part is does not hang on its reference, and joined pins are told from elements."""

from __future__ import annotations

import pytest
from small_boards import board_of

from levelcrossing.model import Part
from levelcrossing.partkinds import (
    element_pairs,
    is_connector,
    is_integrated_circuit,
    joined_pins,
    jumper_state,
    kind_of,
    shunt_ends,
)


def part_of(line: str) -> Part:
    return board_of(line).parts[0]


def numbers(pairs: tuple[tuple[object, object], ...]) -> list[str]:
    return [f"{a.number}-{b.number}" for a, b in pairs]  # type: ignore[attr-defined]


TWO = "| 1 - passive A | 2 - passive B"
KINDS = {
    f"R1 4k7 Device:R {TWO}": "resistor",
    f"HEATER 4k7 Device:R_US {TWO}": "resistor",
    f"R1 0R Device:R {TWO}": "link",
    f"R1 R0402_0R_JUMPER Resistors:R0402_0R_JUMPER {TWO}": "link",
    f"R1 0R05 Device:R {TWO}": "resistor",
    f"X9 100n Device:C_Polarized {TWO}": "capacitor",
    f"C5 CC0402_100NF_16V_10%_X7R Capacitors:CC0402_100NF_16V_10%_X7R {TWO}": "capacitor",
    f"L1 2u2 Device:L {TWO}": "inductor",
    f"L1 600R/2A Some:L {TWO}": "ferrite",
    f"L2 BLM18PG121SN1 Some:IND0603_BLM18PG121SN1 {TWO}": "ferrite",
    f"FB1 120R@100MHz Device:FerriteBead {TWO}": "ferrite",
    f"F1 500mA Device:Polyfuse {TWO}": "fuse",
    f"D3 0 Some:Jumper_NC_Small-Device {TWO}": "jumper",
    f"JP1 link Connector_Generic:Conn_01x02 {TWO}": "jumper",
    f"5.0V/3.3V1 Closed(1-2)/Opened(2-3) Pads:SJ2W {TWO} | 3 - passive C": "jumper",
    f"SEL1 HDR-2x02(1-2:Closed) Headers:HDR_2x02 {TWO} | 3 - passive C | 4 - passive B": "jumper",
    f"T1 net-tie Local:net-tie {TWO}": "net-tie",
    f"RS1 10m Device:R_Shunt {TWO} | 3 - passive B | 4 - passive B": "shunt",
    f"D1 1N4148 Device:D {TWO}": "diode",
    "U9 BAT54C(SOT23-3) Diodes:BAT54C | 1 - passive A | 2 - passive B | 3 - passive C": "diode",
    f"D2 BZX84C3V3 Device:D {TWO}": "zener",
    f"D2 3.6V Device:D_Zener_Small {TWO}": "zener",
    f"D4 GREEN Device:LED {TWO}": "led",
    f"D5 SMBJ6.0A Device:D {TWO}": "suppressor",
    f"TVS3 odd Device:D_Schottky {TWO}": "suppressor",
    "U3 USBLC6-2SC6 Power_Protection:USBLC6-2SC6 | 1 I/O1 passive A | 2 GND passive G | 5 VBUS passive V": "suppressor",
    "J1 USB Connector:USB_C_Receptacle | A4 VBUS passive V | A1 GND passive G": "connector",
    "AUDIO1 jack Some:AUDIO_JACK | 1 - passive A | 2 - passive B | 3 - passive C": "connector",
    "P1 edge Local:EDGE | " + " | ".join(f"{n} D{n} bidirectional N{n}" for n in range(12)): "connector",
    "TP4 pad Local:PAD | 1 - passive A": "test-point",
    "H1 hole Mechanical:MountingHole_Pad | 1 - passive GND": "mounting-hole",
    "LOGO1 logo Graphic:logo": "mounting-hole",
    "Q1 BSS138 Transistor_FET:BSS138 | 1 G input A | 2 S passive B | 3 D passive C": "transistor",
    "IC7 PMBT3904YS Local:PAIR | 1 E1 - A | 2 B1 - B | 3 C2 - C | 4 E2 - A | 5 B2 - B | 6 C1 - C": "transistor",
    f"SW1 reset Switch:SW_Push {TWO}": "switch",
    f"Y1 8MHz Device:Crystal {TWO}": "crystal",
    "Q3 Q12MHz Devices:Crystal_GND | 1 - passive A | 2 - passive B | 3 - passive GND": "crystal",
    "RN1 10k Device:R_Network02 | 1 common passive V | 2 R1 passive A | 3 R2 passive B": "resistor-pack",
    "RR3 8x10K Local:RR8 | 1 COM passive V | 2 2 passive A | 3 3 passive B | 4 4 passive C": "resistor-pack",
    "POT1 100K Local:POT | 1 1 passive A | 2 2 passive B | 3 3 passive C": "resistor",
    f"V2 DC12 Local:VSOURCE {TWO}": "source",
    f"I1 1m Simulation_SPICE:IDC {TWO}": "source",
    f"BT1 CR2032 Device:Battery_Cell {TWO}": "battery",
    "FLG01 PWR_FLAG power:PWR_FLAG | 1 pwr power_out +5V": "power-flag",
    "U1 AMS1117-3.3 Regulator_Linear:AMS1117-3.3 | 1 GND power_in G | 2 VO power_out B | 3 VI power_in A": "regulator",
    "U1 odd Local:LDO | 1 ADJ input G | 2 VO power_out B | 3 VI power_in A": "regulator",
    # A voltage detector has VIN and VOUT, and an oscillator VDD and OUT: no regulators for that.
    "U2 RST27 Local:DETECT | 1 VOut output R | 2 Vss power_in G | 3 VIn input A": "ic",
    "X1 25MHz Local:oscillator | 1 EN input A | 2 GND power_in G | 3 OUT output B | 4 VDD power_in V": "ic",
    # Five pins and a supply pin: an addressable LED reads and drives.
    "D7 WS2812B LED:WS2812B | 1 VDD power_in V | 2 DOUT output A | 3 VSS power_in G | 4 DIN input B": "ic",
    "U4 74LVC1G00 74xGxx:74LVC1G00 | 1 - input A | 3 GND power_in G | 4 - output C | 5 VCC power_in V": "ic",
}


@pytest.mark.parametrize(("line", "kind"), KINDS.items())
def test_kind_of_a_part(line: str, kind: str) -> None:
    assert kind_of(part_of(line)) == kind


def test_connectors_and_integrated_circuits_are_told_apart() -> None:
    gate = part_of("U4 74LVC1G00 74xGxx:74LVC1G00 | 1 - input A | 3 GND power_in G | 5 VCC power_in V")
    header = part_of("J4 HDR Connector_Generic:Conn_01x04 | 1 - passive A | 2 - passive B | 3 - passive C")
    assert is_integrated_circuit(gate)
    assert not is_connector(gate)
    assert is_connector(header)
    assert not is_integrated_circuit(header)


@pytest.mark.parametrize(
    ("line", "pairs"),
    [
        (f"R1 4k7 Device:R {TWO}", ["1-2"]),
        ("RV1 10k Device:R_Potentiometer | 1 - passive A | 2 - passive B | 3 - passive C", ["1-2", "2-3"]),
        # pins of a DIP pack face each other when neither names nor numbers tell
        ("RN1 10k Device:R_Pack02 | 1 - passive A | 2 - passive B | 3 - passive C | 4 - passive D", ["1-4", "2-3"]),
        (
            "RN1 10k Device:R_Pack02_SIP | 1 R1.1 passive A | 2 R1.2 passive B | 3 R2.1 passive C | 4 R2.2 passive D",
            ["1-2", "3-4"],
        ),
        (
            "RM1 RA_4B8_10k RCL:RA1206 | 1.1 - passive A | 1.2 - passive V | 2.1 - passive B | 2.2 - passive V",
            ["1.1-1.2", "2.1-2.2"],
        ),
        (
            "RN2 10k Device:R_Network03 | 1 common passive V | 2 R1 passive A | 3 R2 passive B | 4 R3 passive C",
            ["1-2", "1-3", "1-4"],
        ),
        ("RN3 10k Device:R_Pack_SIP3 | 1 - passive V | 2 - passive A | 3 - passive B", ["1-2", "1-3"]),
        ("RS1 10m Device:R_Shunt | 1 - passive A | 2 - passive S | 3 - passive T | 4 - passive B", ["1-4"]),
        ("U4 74LVC1G00 74xGxx:74LVC1G00 | 1 - input A | 3 GND power_in G | 5 VCC power_in V", []),
    ],
)
def test_pins_between_which_the_elements_lie(line: str, pairs: list[str]) -> None:
    assert numbers(element_pairs(part_of(line))) == pairs


PADS = "| 1 - passive A | 2 - passive B | 3 - passive C"


@pytest.mark.parametrize(
    ("line", "pairs", "state"),
    [
        (f"JP1 ~ Jumper:SolderJumper_2_Bridged {TWO}", ["1-2"], "closed"),
        (f"JP1 ~ Jumper:SolderJumper_2_Open {TWO}", [], "open"),
        (f"JP1 Opened Jumper:SolderJumper_2_Bridged {TWO}", [], "open"),
        (f"JP1 Closed Pads:SJ {TWO}", ["1-2"], "closed"),
        (f"JP1 ~ Jumper:Jumper_2 {TWO}", [], "unknown"),
        (f"JP1 ~ Jumper:SolderJumper_3_Bridged12 {PADS}", ["1-2"], "closed"),
        (f"JP1 ~ Jumper:SolderJumper_3_Bridged123 {PADS}", ["1-2", "1-3"], "closed"),
        (f"JP1 ~ Jumper:SolderJumper_3_Open {PADS}", [], "open"),
        (f"SEL Closed(1-2)/Opened(2-3) Pads:SJ2W {PADS}", ["1-2"], "closed"),
        (f"SEL Opened(2-3)/Soldered(1-2) Pads:SJ2W {PADS}", ["1-2"], "closed"),
        (f"SEL HDR(1-2:Open/2-3:Closed) Pads:SJ2W {PADS}", ["2-3"], "closed"),
        # the value wins over the symbol: the drawing was changed there
        (f"SEL 2-3 Jumper:SolderJumper_3_Bridged12 {PADS}", ["1-2"], "closed"),
        (f"SEL Closed(2-3) Jumper:SolderJumper_3_Bridged12 {PADS}", ["2-3"], "closed"),
    ],
)
def test_which_pads_of_a_jumper_are_joined(line: str, pairs: list[str], state: str) -> None:
    part = part_of(line)
    assert numbers(joined_pins(part)) == pairs
    assert jumper_state(part) == state


@pytest.mark.parametrize(
    ("line", "pairs"),
    [
        (f"R1 0R Device:R {TWO}", ["1-2"]),
        (f"F1 1A Device:Fuse {TWO}", ["1-2"]),
        (f"L1 2u2 Device:L {TWO}", ["1-2"]),
        ("NT1 ~ Device:NetTie_3 | 1 - passive A | 2 - passive B | 3 - passive C", ["1-2", "1-3"]),
        ("RS1 10m Device:R_Shunt | 1 - passive A | 2 - passive S | 3 - passive T | 4 - passive B", ["1-2", "4-3"]),
        (f"R1 4k7 Device:R {TWO}", []),
        (f"C1 100n Device:C {TWO}", []),
        (f"D1 1N4148 Device:D {TWO}", []),
    ],
)
def test_pins_that_are_galvanically_one(line: str, pairs: list[str]) -> None:
    assert numbers(joined_pins(part_of(line))) == pairs


def test_ends_of_a_shunt_by_names_and_by_nets() -> None:
    named = part_of("RS1 5m Local:SHUNT4 | 1 I+ passive A | 2 I- passive B | 3 V+ passive S | 4 V- passive T")
    assert [[pin.number for pin in end] for end in shunt_ends(named)] == [["1", "3"], ["2", "4"]]
    wired = part_of("RS1 5m Local:SHUNT4 | 1 - passive A | 2 - passive B | 3 - passive A | 4 - passive B")
    assert [[pin.number for pin in end] for end in shunt_ends(wired)] == [["1", "3"], ["2", "4"]]
