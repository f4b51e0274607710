"""Traps that a designer falls into, as the library must know them; each with its source or marked common practice."""

import pytest

from levelcrossing.trade_match import unwrapped


def test_3v3_does_not_reach_an_hc_input_at_5_v_but_an_hct_one(pin):
    # TI SN74HC240 SCLS128H: VIH 3.15 V at 4.5 V, 0.7 of the supply; TI CD74HCT14, Fairchild MM74HCT00: VIH 2.0 V
    assert pin("74HC04", "1A").vih.at(5.0) == pytest.approx(3.5)
    assert pin("74HCT04", "1A").vih.at(5.0) == 2.0


def test_an_addressable_led_needs_0v7_of_its_supply(pin):
    # Worldsemi WS2812B: VIH 0.7 VDD
    facts = pin("WS2812B", "DIN")
    assert facts.vih.at(5.0) == pytest.approx(3.50)
    assert facts.vih.at(5.3) == pytest.approx(3.71)
    assert facts.vih.at(3.7) == pytest.approx(2.59)


def test_the_family_comes_from_the_value_and_not_from_the_symbol(pin, book, part):
    # common practice: symbols are drawn from another family
    assert book.part(part("74LVC245", "74LS245")).provenance.row == "LVC"
    facts = pin("74LVC245", "A0", symbol="74LS245")
    assert facts.vmax.at(3.3) == 6.5
    assert facts.clamp_high is False


def test_hc4050_takes_15_v_inputs_and_hc125_clamps(pin):
    # Nexperia 74HC4050 Rev.4 table 4: 16 V absolute, diode to ground only; Nexperia 74HC125: clamp both ways
    assert pin("74HC4050", "1A").vmax.at(3.3) == 16.0
    assert pin("74HC4050", "1A").clamp_high is False
    assert pin("74HC125", "1A").vmax.at(3.3) == pytest.approx(3.8)
    assert pin("74HC125", "1A").clamp_high is True


@pytest.mark.parametrize(
    ("name", "tolerant"),
    [
        ("PA9", True),
        ("PB6", True),
        ("PB12", True),
        ("PA15", True),
        ("PA0", False),
        ("PA7", False),
        ("PB0", False),
        ("PB5", False),
    ],
)
def test_which_pins_of_an_f103_take_5_v(pin, name, tolerant):
    # ST STM32F103x8 DS5319 table 5 (FT column) and tables 6, 9
    facts = pin("STM32F103C8T6", name)
    assert facts.vmax.at(3.3) == pytest.approx(5.5 if tolerant else 3.6)
    assert facts.clamp_high is (not tolerant)


def test_a_5_v_clock_chip_reads_a_3v3_bus(pin):
    # Maxim DS1307: VIH 2.2 V at 4.5-5.5 V; DS3231: 0.7 VCC
    assert pin("DS1307Z", "SDA").vih.at(5.0) == 2.2
    assert pin("DS3231", "SDA").vih.at(5.0) == pytest.approx(3.5)


def test_gate_margins_of_the_usual_mosfets(book, part):
    # margin = low rail - 0.4 V - greatest threshold; onsemi 2N7000, BSS138, FDV301N data sheets
    pins = ("1:G", "2:S", "3:D")
    greatest = {
        name: book.mosfet(part(name, reference="Q1", pins=pins)).threshold_volts.high
        for name in ("BSS138", "2N7002", "2N7000", "FDV301N")
    }
    assert 2.9 - greatest["2N7000"] == pytest.approx(-0.1)
    assert 2.9 - greatest["BSS138"] == pytest.approx(1.4)
    assert 2.9 - greatest["2N7002"] == pytest.approx(0.4)
    assert 1.4 - greatest["BSS138"] == pytest.approx(-0.1)
    assert 1.4 - greatest["FDV301N"] == pytest.approx(0.34)


def test_a_txb_must_not_sit_on_i2c(book, part):
    # TI TXB0104 SCES650: no pull-up under 50 k, not for open drain, about 4 k static
    facts = book.part(part("TXB0104")).translator
    assert (facts.open_drain_ok, facts.pull_least_ohms, facts.output_ohms) == (False, 50000, 4000)
    assert book.part(part("TXS0102")).translator.open_drain_ok is True


def test_vcca_must_not_exceed_vccb(book, part):
    # TI TXB0104, TXS0102: VCCA <= VCCB, VCCA 3.6 V at most; TI SN74LVC1T45: any order
    for name in ("TXB0108", "TXS0102", "TXS0108E"):
        facts = book.part(part(name)).translator
        assert facts.order == "a<=b"
        assert facts.a_range[1] == 3.6
    assert book.part(part("SN74LVC1T45")).translator.order == "any"
    assert book.part(part("SN74LVC4245A")).translator.order == "b<=a"  # side A is the 5 V side: TI SCAS375D
    assert book.part(part("SN74LVC4245A")).translator.a_range[0] == 4.5


def test_the_logic_side_of_a_can_transceiver_follows_vio(pin):
    # NXP TJA1051 table 7: 0.7 VIO; without that pin 0.7 VCC, so 3.3 V does not reach 3.5 V; NXP TJA1050: 2.0 V
    facts = pin("TJA1051T/3", "TXD")
    assert facts.supply == "(VIO|Vio)"
    assert facts.vih.at(3.3) == pytest.approx(2.31)
    assert pin("TJA1051T", "TXD").vih.at(5.0) == pytest.approx(3.5)
    assert pin("TJA1050T", "TXD").vih.at(5.0) == 2.0


def test_a_module_powered_by_5_v_that_talks_3v3(pin):
    # Plantower PMS5003, Winsen MH-Z19 (from memory): 5 V supply, 3.3 V signals
    for name in ("PMS5003", "MH-Z19B"):
        facts = pin(name, "TXD")
        assert facts.supply_volts == 3.3
        assert facts.vmax.at(3.3) == 3.6


def test_which_inputs_bear_a_voltage_while_unpowered(pin, book, part):
    # Philips 74LVC245A (Ioff row), TI SN74LVC1T45; HC has diodes; ST DS5319: FT pins VDD + 4.0 V
    assert pin("74LVC245", "A0").vmax_off.at(0.0) == 6.5
    assert pin("74HC04", "1A").vmax_off is None  # its diodes: the limit follows the supply down
    assert pin("74AHC04", "1A").vmax_off.at(0.0) == 7.0
    assert pin("74AHC125", "1Y").vmax_off is None
    assert pin("STM32F103C8T6", "PA9").vmax_off.at(0.0) == 4.0
    assert pin("STM32F103C8T6", "PA0").vmax_off is None
    assert book.part(part("74LVC245")).partial_power_down is True
    assert book.part(part("74HC245")).partial_power_down is False
    assert book.part(part("SN74LVC1T45")).translator.partial_power_down is True
    assert book.part(part("SN74LVC4245A")).translator.partial_power_down is False


def test_atmega_levels_differ_by_generation(pin):
    # Atmel 8271 table 29-1: 0.6; Microchip ATmega4809: 0.7; Atmel 7766J (32U4): 0.2 V + 0.9
    assert pin("ATmega328P-PU", "PB0").vih.at(5.0) == pytest.approx(3.0)
    assert pin("ATmega328P-PU", "~{RESET}/PC6").vih.at(5.0) == pytest.approx(4.5)
    assert pin("ATmega4809-A", "PA0").vih.at(5.0) == pytest.approx(3.5)
    assert pin("ATmega32U4-AU", "PB0").vih.at(5.0) == pytest.approx(1.9)


def test_mcp1703a_3302_is_3v3(book, part):
    # Microchip DS20005122: two digits of voltage, two of tolerance
    assert book.regulator(part("MCP1703A-3302")).output.nominal == pytest.approx(3.3)


def test_na_in_brackets_is_taken_off_a_value(book, part):
    # common practice: not fitted, written as NA(...)
    assert unwrapped("NA(BSS138(SOT23-3))") == "BSS138(SOT23-3)"
    assert unwrapped("DNP-4k7") == "4k7"
    assert unwrapped("NC7SZ125") == "NC7SZ125"
    assert book.mosfet(part("NA(BSS138)", reference="Q1", pins=("1:G", "2:S", "3:D"))).provenance.row == "BSS138"


def test_2n7001t_is_a_buffer(book, part):
    # TI 2N7001T: a buffer with two supplies
    assert book.part(part("2N7001TDCKR")).translator.kind == "dual-fixed"
    assert book.mosfet(part("2N7001TDCKR", pins=("1:A", "2:GND", "3:B"))) is None


def test_an_open_drain_buffer_only_pulls_low_whatever_the_symbol_says(pin):
    # Nexperia 74LVC1G07 rev.12: open drain
    assert pin("74LVC1G07", "Y", "4", "output").direction == "open-drain"
    assert pin("74LVC1G07", "~", "4", "output", pins=["2:~:input"]).direction == "open-drain"
    assert pin("74LS07", "1Y", "2", "output").direction == "open-drain"
    assert pin("74LVC1G34", "Y", "4", "output").direction == "out"


def test_plain_lv_clamps_and_lv_a_does_not(pin):
    # Philips 74LV245 p.5 against TI SN74LV245A SCLS382D p.3
    assert pin("74LV14", "1A").clamp_high is True
    assert pin("SN74LV14A", "1A").clamp_high is False


def test_vih_of_3v5_4v0_and_more_that_3v3_misses(pin):
    # Maxim 19-4452, Microchip DS20001952C, TI SLIS032, TI SLVS515
    assert pin("MAX7219", "DIN").vih.at(5.0) == 3.5
    assert pin("MCP23017", "SDA").vih.at(5.0) == pytest.approx(4.0)
    assert pin("TPIC6B595", "SER").vih.at(5.0) == pytest.approx(4.25)
    assert pin("TLC5940", "SIN").vih.at(5.0) == pytest.approx(4.0)


def test_ft232r_at_3v3_guarantees_only_2v2(pin):
    # FTDI FT232R tables: VOH 2.2 V at 1 mA with VCCIO 3.3 V
    facts = pin("FT232RL", "TXD")
    assert facts.direction == "out"
    assert facts.outputs[0].voh.at(3.3) == 2.2
    assert facts.supply == "VCCIO"


def test_rp2350_bears_5_v_only_while_powered_and_not_on_its_analogue_pins(pin):
    # RP2350 data sheet table 1433: 5.5 V at 3.3 V, 4.2 V at 2.5 V, 3.63 V unpowered
    facts = pin("RP2350A", "GPIO2")
    assert facts.vmax.at(3.3) == 5.5
    assert facts.vmax.at(2.5) == 4.2
    assert facts.vmax_off.at(0.0) == pytest.approx(3.63)
    assert pin("RP2350A", "GPIO27/ADC1").vmax.at(3.3) == pytest.approx(3.6)
    assert pin("RP2040", "GPIO2").vmax.at(3.3) == pytest.approx(3.8)


def test_l298_vss_is_a_supply_and_hd44780_vss_is_ground(pin):
    # ST L298: VSS logic supply 4.5-7 V; Hitachi HD44780U: VSS ground
    assert pin("L298N", "Vss", kind="power_in").direction == "supply"
    assert pin("HD44780", "VSS", kind="power_in").direction == "ground"


def test_a_1v8_flash_is_not_a_3v3_flash(book, part):
    # Winbond W25Q128JW 1.7-1.95 V, W25Q128JV 2.7-3.6 V
    assert book.part(part("W25Q128JWSIQ")).supplies[0].high_volts == 1.95
    assert book.part(part("W25Q128JVSIQ")).supplies[0].low_volts == 2.7


def test_octal_lvc_stops_at_3v6_and_single_gates_at_5v5(book, part):
    # TI SN74LVC244A SCAS414L against SN74LVC1G125
    assert book.part(part("74LVC244")).supplies[0].high_volts == 3.6
    assert book.part(part("74LVC1G125")).supplies[0].high_volts == 5.5


def test_a_reverse_gain_is_a_range(book, part):
    # published models of the 2N3904: 0.737, 4 and 20.6
    facts = book.bipolar(part("2N3904", reference="Q1", pins=("1:E", "2:B", "3:C")))
    assert facts.beta_reverse.low == pytest.approx(0.74)
    assert facts.beta_reverse.high >= 20


def test_a_3v3_zener_has_a_soft_knee(book, part):
    # Fairchild BZX84C table: 2.3-2.9 V at 1 mA
    facts = book.diode(part("BZX84C3V3", "D_Zener", "D1", pins=("1:K", "2:A")))
    assert facts.knee_ohms == 600
    typical = facts.zener_volts.nominal - facts.zener_ohms * 0 - (facts.zener_amps - facts.knee_amps) * 100
    assert 2.3 <= typical <= 2.9
