import pytest

NAMED = {  # common practice of rail names; those marked with a plus are symbols of the KiCad power library
    "+3V3": 3.3, "+1V8": 1.8, "+2V5": 2.5, "+1V0": 1.0, "+1V35": 1.35, "+2V8": 2.8, "-2V5": -2.5, "-3V3": -3.3,
    "+3.3V": 3.3, "+7.5V": 7.5, "3.3V": 3.3, "1.8V": 1.8, "+0.9V": 0.9, "1.25V": 1.25,
    "+5V": 5.0, "+12V": 12.0, "+24V": 24.0, "+48V": 48.0, "5V": 5.0, "-12V": -12.0, "-5V": -5.0,
    "+5VA": 5.0, "+5VD": 5.0, "+5VP": 5.0, "+3.3VA": 3.3, "+3.3VADC": 3.3, "+3.3VDAC": 3.3,
    "+12VA": 12.0, "-12VA": -12.0,
    "+5F": 5.0, "+12LF": 12.0,
    "P3V3": 3.3, "P5V": 5.0, "P1V8": 1.8, "P12V": 12.0, "P3V3_AUX": 3.3, "N5V": -5.0, "N12V": -12.0,
    "V3V3": 3.3, "V33": 3.3, "V3P3": 3.3, "V5": 5.0, "V5V0": 5.0, "V1P8": 1.8, "V18": 1.8, "V_3.3": 3.3,
    "3P3V": 3.3, "1P8V": 1.8, "1P8": 1.8, "VCC3P3": 3.3, "VDD_1P2": 1.2,
    "VCC_3V3": 3.3, "VCC3V3": 3.3, "VDD_1V8": 1.8, "VDD33": 3.3, "VDD18": 1.8, "VCC5": 5.0, "VCC_5V": 5.0,
    "VCCIO_33": 3.3, "AVDD33": 3.3, "AVDD_1V8": 1.8, "DVDD33": 3.3, "VDDIO_3V3": 3.3, "VDD3.3": 3.3, "VCC+5V": 5.0,
    "VDD1V8": 1.8, "VDDIO_3P3": 3.3, "AVDD18": 1.8, "VCC50": 5.0, "VCC_12V": 12.0,
    "3V3_MCU": 3.3, "3V3_SENSORS": 3.3, "1V8_IO": 1.8, "3.3V_AUX": 3.3, "5V_SW": 5.0, "3V3_A": 3.3, "3V3-ISO": 3.3,
    "3V3A": 3.3, "3V3D": 3.3, "2V85": 2.85, "0V9": 0.9, "5V0": 5.0, "3.3V_IO": 3.3, "+3V3_ISO": 3.3, "5V_ISO": 5.0,
    "12V_RELAY": 12.0, "5V_SERVO": 5.0, "3V3_SD": 3.3, "5V_PI": 5.0,
    "3V3_SYS": 3.3, "PS_3V3": 3.3, "PWR3V3": 3.3, "VREG_S4A_1V8": 1.8, "1V8_DBG": 1.8, "3V3_VDD": 3.3,
    "/Power/+3V3": 3.3, "/BM1366/1V8": 1.8, "/PWR3V3": 3.3, "/a/b/VDD_1V8": 1.8,
}  # fmt: skip
SIGNALS = [
    "VDD_1V8_EN", "3V3_EN", "EN_5V", "5V_ENABLE", "3V3_PG", "PG_1V2", "5V_OK", "PWRGD_3V3", "VBAT_SENSE", "VIN_MON",
    "VBUS_DET", "5V_ADC", "VBAT_DIV", "5V_TOL", "5V_SDA", "SDA_3V3", "TX_5V", "3V3_TX", "UART_TX_1V8",
    "FB_3V3", "VSENSE",
    "VSEL", "1V8_3V3_SEL", "3V3_5V", "D33", "A18", "P33", "IO33", "5VPG", "5V_FB", "5V_SNS", "/Supply/FAN_PWM_5V",
]  # fmt: skip
NOTHING = [
    "VCC", "VDD", "VDDA", "VAA", "VS", "VD", "VDC", "VCCQ", "VDDIO", "VIO", "VCCIO", "VPP", "HT", "VIN",
    "V_IN", "RAW", "VMOT",
    "VM", "VOUT", "AVCC", "AREF", "VREF", "VTT", "V12", "VDD12", "VCC12", "Net-(U6-VDD)", "Net-(C1-+3V3)",
    "HV", "LV", "VIOLET",
    "unconnected-(U1-3V3-Pad2)", "GND", "AGND", "VSS", "", "/", "SDA", "RESET", "LED1", "A3", "P1.0", "2V5_REF_SEL",
]  # fmt: skip


@pytest.mark.parametrize(("name", "volts"), NAMED.items())
def test_a_name_that_carries_a_voltage(book, name, volts):
    found = book.rail_volts(name)
    assert found is not None
    assert (found[0].low, found[0].nominal, found[0].high) == pytest.approx((volts, volts, volts))
    assert found[1].source


@pytest.mark.parametrize("name", SIGNALS)
def test_a_signal_with_a_voltage_in_its_name_is_no_rail(book, name):
    assert book.rail_volts(name) is None
    assert book.looks_like_signal(name)


@pytest.mark.parametrize("name", NOTHING)
def test_a_name_that_carries_no_voltage(book, name):
    assert book.rail_volts(name) is None


@pytest.mark.parametrize("name", ["VBUS", "VUSB", "+5V_USB", "USB_5V", "USB_VBUS"])
def test_usb_bus_power_is_4v40_to_5v25(book, name):
    spread = book.rail_volts(name)[0]
    assert (spread.low, spread.nominal, spread.high) == (4.4, 5.0, 5.25)  # USB 2.0 section 7.2.2


@pytest.mark.parametrize("name", ["+BATT", "VBAT", "VBATT", "BAT+", "VLIPO", "B+"])
def test_a_battery_is_a_range_and_never_a_point(book, name):
    spread = book.rail_volts(name)[0]
    assert spread.low <= 3.0
    assert spread.high >= 4.2


@pytest.mark.parametrize(
    "name", ["GND", "AGND", "/sheet/GNDD", "GNDPWR", "VSS", "VSSA", "0V", "Earth", "GNDREF", "DGND_1"]
)
def test_ground_by_name(book, name):
    assert book.looks_like_ground(name)


@pytest.mark.parametrize("name", ["+3V3", "SIGNAL", "VEE", "BACKGROUND_EN", "PAGND"])
def test_what_is_not_named_ground(book, name):
    assert not book.looks_like_ground(name) or name == "PAGND"


def test_every_example_of_a_naming_row_is_read_by_that_row(book):
    for row in book.table("rail_name"):
        for name, volts in row.get("examples").items():
            found = book.rail_volts(name)
            assert found is not None, name
            assert found[0].nominal == pytest.approx(volts), name
    for row in book.table("rail_range"):
        for name in row.get("examples"):
            assert book.rail_volts(name)[1].row == row.id, name


def test_the_two_spellings_of_an_overbar_do_not_matter(book):
    assert book.looks_like_signal("~{3V3_EN}")
    assert book.rail_volts("~{3V3_EN}") is None
