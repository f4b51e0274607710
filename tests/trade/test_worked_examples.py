"""Published figures on levels and regulators, each with its source; computed ones say so."""

import pytest


def test_i2c_thresholds_on_a_lower_bus(pin):
    # UM10204 table 10: 0.7 VDD; a 5 V device on a 3.3 V bus lacks 0.2 V (computed)
    assert 3.3 - pin("24LC256", "SDA").vih.at(5.0) == pytest.approx(-0.2)
    # PCF8523 at 4.28 V on a 3.0 V bus: margin 4 mV (Electronics StackExchange 675199 quoting the data sheet)
    assert 3.0 - pin("PCF8523T", "SDA").vih.at(4.28) == pytest.approx(0.004, abs=5e-4)


def test_i2c_sink_currents_and_rise_times(book):
    # UM10204 rev. 7 tables 10 and 11
    bus = next(bus for bus in book.buses if bus.name == "i2c")
    modes = {mode.name: mode for mode in bus.modes}
    assert bus.open_drain and bus.both_directions
    assert [modes[name].rise_max_s for name in ("standard", "fast", "fast-plus")] == pytest.approx(
        [1000e-9, 300e-9, 120e-9]
    )
    assert [modes[name].sink_amps for name in ("standard", "fast", "fast-plus")] == pytest.approx([3e-3, 3e-3, 20e-3])
    assert [modes[name].load_max_farads for name in ("standard", "fast", "fast-plus")] == pytest.approx(
        [400e-12, 400e-12, 550e-12]
    )
    # pull-up limits: (VDD - VOL)/IOL and tr/(0.8473 Cb); TI SLVA689 section 4 prints 966.667 ohm and 1.77 k
    assert (3.3 - 0.4) / modes["fast"].sink_amps == pytest.approx(966.667, abs=5e-4)
    assert modes["fast"].rise_max_s / (0.8473 * 200e-12) == pytest.approx(1770, abs=5)
    assert modes["standard"].rise_max_s / (0.8473 * 400e-12) == pytest.approx(2950.5, abs=0.5)
    assert modes["fast-plus"].rise_max_s / (0.8473 * 550e-12) == pytest.approx(257.5, abs=0.5)


def test_a_txb_with_pull_resistors(book, part):
    # TI TXB0104 "Detailed Design Procedure": divider with 4.5 k (computed); 50 k is the permitted limit
    row = next(row for row in book.rows if row.table == "translator" and row.id == "TXB010x")
    inside = row.get("output_ohms_in_formula")
    assert 3.3 * 10e3 / (10e3 + inside) == pytest.approx(2.276, abs=5e-4)
    assert 3.3 * inside / (10e3 + inside) == pytest.approx(1.024, abs=5e-4)
    assert 3.3 * inside / (row.get("pull_least_ohms") + inside) == pytest.approx(0.272, abs=5e-4)
    low = next(row for row in book.rows if row.id == "TXB0304").get("output_ohms_in_formula")
    assert 3.3 * low / (20e3 + low) == pytest.approx(0.230, abs=5e-4)  # TI SCES831D p. 7


def test_a_txs_against_both_pull_ups(book, part, pin):
    # TI TXS0102-Q1: VIL 0.15 V against 10 k on both sides: about 300 ohm between 1.8 and 3.3 V (computed)
    pull = book.part(part("TXS0102")).translator.pull_up_ohms
    limit = pin("TXS0102", "A1").vil.at(1.8)
    assert limit == 0.15
    assert limit / ((1.8 - limit) / pull + (3.3 - limit) / pull) == pytest.approx(312.5, abs=0.5)
    assert pytest.approx(294, abs=0.5) == 0.15 / 0.51e-3


def test_data_rates_of_a_direction_controlled_translator(book, part):
    # TI SCES515, Nexperia 74LVC1T45: 420 Mbit/s 3.3 to 5 V; 210 to 3.3; 140 to 2.5; 75 to 1.8 V
    rates = book.part(part("SN74LVC1T45")).translator.rates
    assert [(point.b_volts, point.bits_per_second) for point in rates][:4] == [
        (5.0, 420e6),
        (3.3, 210e6),
        (2.5, 140e6),
        (1.8, 75e6),
    ]


def test_bss138_rows(book, part):
    # onsemi BSS138: 0.8 / 1.3 / 1.5 V; 27, 13, 6 pF; 50 V, 20 V
    facts = book.mosfet(part("BSS138", reference="Q1", pins=("1:G", "2:S", "3:D")))
    assert (facts.threshold_volts.low, facts.threshold_volts.nominal, facts.threshold_volts.high) == (0.8, 1.3, 1.5)
    assert (facts.ciss_farads, facts.coss_farads, facts.crss_farads) == pytest.approx((27e-12, 13e-12, 6e-12))
    # 1/Rds = K (VGS - Vth) at 2.9 V: about 2.0 ohm typical, 12.8 ohm worst (computed)
    assert 1 / (facts.gain.nominal * (2.9 - 1.3)) == pytest.approx(2.0, abs=0.05)
    assert 1 / (facts.gain.low * (2.9 - 1.5)) == pytest.approx(12.8, abs=0.1)


def test_noise_margins_of_lvttl_into_ttl_level_inputs(book, pin):
    # JESD8C.01 and Actel ProASIC3 handbook: 2.4 > 2.0 and 0.4 < 0.8
    standard = {row.id: row for row in book.table("standard")}
    lvttl = standard["LVTTL33"].get("outputs")[0]
    for name in ("74HCT04", "74AHCT04", "74ACT244"):
        facts = pin(name, "1A")
        assert float(lvttl["voh_volts"]) - facts.vih.at(5.0) == pytest.approx(0.4)
        assert facts.vil.at(5.0) - float(lvttl["vol_volts"]) == pytest.approx(0.4)


def test_atmega328p_levels_and_outputs(pin):
    # Atmel 8271 table 29-1: 0.6/0.3 above 2.4 V, 0.7/0.2 below; RESET 0.9, XTAL1 0.7
    facts = pin("ATmega328P", "PD2")
    assert (facts.vih.at(5.0), facts.vil.at(5.0)) == pytest.approx((3.0, 1.5))
    assert (facts.vih.at(2.0), facts.vil.at(2.0)) == pytest.approx((1.4, 0.4))
    assert pin("ATmega328P", "PB6/XTAL1").vih.at(5.0) == pytest.approx(3.5)


def test_esp32_levels(pin):
    # Espressif ESP32 data sheet table 13
    facts = pin("ESP32-WROOM-32E", "IO4")
    point = facts.outputs[0]
    assert (facts.vih.at(3.3), facts.vil.at(3.3)) == pytest.approx((2.475, 0.825))
    assert (point.voh.at(3.3), point.vol.at(3.3)) == pytest.approx((2.64, 0.33))
    # into an ATmega328P at 5 V: -0.36 V at full load (computed)
    assert point.voh.at(3.3) - pin("ATmega328P", "PD2").vih.at(5.0) == pytest.approx(-0.36)


def test_rp2040_outputs(pin):
    # RP2040 data sheet 5.2.3.4: VOH 2.62, VOL 0.5 at 3.3 V; 1.24 and 0.3 at 1.8 V; VIL 0.8
    facts = pin("RP2040", "GPIO3")
    points = {point.supply_volts: point for point in facts.outputs}
    assert (points[3.3].voh.at(3.3), points[3.3].vol.at(3.3)) == (2.62, 0.5)
    assert (points[1.8].voh.at(1.8), points[1.8].vol.at(1.8)) == (1.24, 0.3)
    assert facts.vil.at(3.3) == 0.8
    assert points[3.3].voh.at(3.3) - pin("ATmega328P", "PD2").vih.at(5.0) == pytest.approx(-0.38)  # computed


def test_stm32f103_and_f0_levels(pin):
    # ST STM32F103x8 table 35: tested 0.65 / 0.35; ST STM32F030 table 46: 0.7 / 0.3; at 3.3 V 2.145 and 1.155 V
    facts = pin("STM32F103C8T6", "PA1")
    assert (facts.vih.at(3.3), facts.vil.at(3.3)) == pytest.approx((2.145, 1.155))
    assert pin("STM32F030F4P6", "PA9").vih.at(3.3) == pytest.approx(2.31)


def test_stm32g0_tolerant_limit(pin):
    # operating min(VDD + 3.6, 5.5) V: 5.5 V at 3.3 V, 5.4 V at 1.8 V (ST community quoting the data sheet)
    facts = pin("STM32G031K8", "PA9")
    assert facts.vmax.at(3.3) == pytest.approx(5.5)
    assert facts.vmax.at(1.8) == pytest.approx(5.4)


def test_mcp23017_address_pins_differ(pin):
    # Microchip DS20001952C table 1-1: 4.0 / 1.0 V at 5 V, 2.64 V at 3.3 V; A0, A1: 2.05 V at 5 V
    facts = pin("MCP23017", "GPA0")
    assert (facts.vih.at(5.0), facts.vil.at(5.0), facts.vih.at(3.3)) == pytest.approx((4.0, 1.0, 2.64))
    assert pin("MCP23017", "A0").vih.at(5.0) == pytest.approx(2.05)


def test_bme280_follows_vddio(pin):
    # Bosch BST-BME280-DS002 table 32
    facts = pin("BME280", "SDI")
    assert facts.supply == "VDDIO"
    assert (facts.vih.at(3.3), facts.vil.at(3.3)) == pytest.approx((2.64, 0.66))


def test_vhc1gt_reads_1v8_logic_at_3v3(pin):
    # onsemi MC74VHC1GT125: VIH 1.4, VIL 0.45 V at 3.0-3.6 V
    facts = pin("MC74VHC1GT125", "A")
    assert (facts.vih.at(3.3), facts.vil.at(3.3)) == (1.4, 0.45)


def test_lv1t_reads_2v03_at_5_v_within_its_band(pin):
    # TI SCEA047B and SN74LV1T08 table 5.5: 2.03 V to 5.0 V, 2.11 V at the top of the band
    assert 2.03 <= pin("SN74LV1T34", "A").vih.at(5.0) <= 2.11


def test_can_and_rs485_transceivers(pin):
    # TI SLOS346K: R output 2.4 V at 8 mA, D input VCC + 0.5 V; Sipex SP485: RO 2.4 V at 4 mA class
    facts = pin("SN65HVD230", "R")
    assert facts.direction == "out"
    assert facts.outputs[0].voh.at(3.3) == 2.4
    assert pin("SN65HVD230", "D").vmax.at(3.3) == pytest.approx(3.8)


def test_feedback_regulators(book, part):
    # MPS MP2307: 0.900 / 0.925 / 0.950 V; 26.1 k and 10 k give 3.339 V (computed)
    vref = book.regulator(part("MP2307DN")).reference
    assert (vref.low, vref.nominal, vref.high) == (0.900, 0.925, 0.950)
    assert vref.nominal * (1 + 26.1 / 10) == pytest.approx(3.339, abs=5e-4)
    # TI TPS5430: 1.221 V, 10 k and 3.24 k give 4.990 V; MT3608: 0.6 V, 75 k and 10.2 k give 5.01 V (from memory)
    assert book.regulator(part("TPS5430DDA")).reference.nominal * (1 + 10 / 3.24) == pytest.approx(4.990, abs=5e-4)
    assert book.regulator(part("MT3608")).reference.nominal * (1 + 75 / 10.2) == pytest.approx(5.01, abs=5e-3)
    assert book.regulator(part("LM2596S-ADJ")).reference.nominal * (1 + 3.1 / 1) == pytest.approx(5.04, abs=5e-3)


def test_a_floating_regulator_has_its_adjust_current(book, part):
    # TI LM317: 1.25 V and 50 uA; 240 and 390 ohm give 3.301 V, 240 and 720 ohm 5.036 V (from memory)
    facts = book.regulator(part("LM317T"))
    assert facts.formula == "floating"
    for lower, volts in ((390, 3.301), (720, 5.036)):
        assert facts.reference.nominal * (1 + lower / 240) + facts.adjust_amps * lower == pytest.approx(volts, abs=5e-4)


def test_dropout_of_a_1117(book, part):
    # AMS1117 sheet: 1.40 V at most; from 4.5 V no more than 3.1 V is guaranteed
    facts = book.regulator(part("AMS1117-3.3"))
    assert facts.dropout_volts == 1.4
    assert 4.5 - facts.dropout_volts < facts.output.low


def test_schottky_and_silicon_drops(book, part):
    # BAT54 (five makers): 0.32 V at most at 1 mA; 0.4 V + 0.32 V passes a TTL low of 0.8 V, 0.4 V + 0.7 V does not
    schottky = {
        amps: most for amps, _, most in book.diode(part("BAT54", "D_Schottky", "D1", pins=("1:K", "2:A"))).forward
    }
    assert 0.4 + schottky[1e-3] == pytest.approx(0.72)
    silicon = {amps: typical for amps, typical, _ in book.diode(part("1N4148", "D", "D1", pins=("1:K", "2:A"))).forward}
    assert 0.4 + silicon[5e-3] == pytest.approx(1.1)
