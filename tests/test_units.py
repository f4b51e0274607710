"""Values in text: what is read, what is refused, and the standards' own examples."""

import math

import pytest

from levelcrossing.model import Spread
from levelcrossing.units import (
    E12,
    E24,
    E96,
    at_least,
    exceeds,
    format_si,
    format_volts,
    format_volts_apart,
    natural_key,
    nearest_preferred,
    parse_capacitance,
    parse_inductance,
    parse_resistance,
    parse_volts,
    resistor_tolerance,
)

IEC_60062_OHMS = [  # IEC 60062 (R, K, M; "E" and the lower-case k are habits), quoted from memory
    ("4k7", 4700),
    ("4R7", 4.7),
    ("R47", 0.47),
    ("47R", 47),
    ("1M0", 1e6),
    ("2K2", 2200),
    ("0R22", 0.22),
    ("100R", 100),
    ("4E7", 4.7),
    ("10", 10),
    ("R100", 0.1),
]
ON_REAL_BOARDS = [  # values as 393 published netlists write them
    ("10k", 10e3),
    ("10K", 10e3),
    ("4.7K", 4700),
    ("0R15", 0.15),
    ("270R", 270),
    ("R_10k_0402", 10e3),
    ("10k/R0603", 10e3),
    ("49.9R/1%/R0402", 49.9),
    ("R0402_10K_1%_0.0625W_100PPM", 10e3),
    ("R0402_4R7_1%_0.0625W_200PPM", 4.7),
    ("R0402_39R2_1%_0.063W_100PPM", 39.2),
    ("R_0R_0402", 0),
    ("R1206_91R_1%_0.25W_100PPM", 91),
    ("33R/0603", 33),
    ("2.2K/0603", 2200),
    ("1k*", 1e3),
    ("22", 22),
    ("549", 549),
    ("0.01", 0.01),
    ("NA(10k/R0402)", 10e3),
    ("NA(200R/1%/R0402)", 200),
]
HABITS = [
    ("0", 0),
    ("0R", 0),
    ("000", 0),
    ("10 k", 10e3),
    ("10 kΩ", 10e3),
    ("10k\u2126", 10e3),
    ("4,7k", 4700),
    ("100 ohm", 100),
    ("1.5 MOhm", 1.5e6),
    ("2Meg", 2e6),
    ("10m", 0.01),
    ("5mΩ", 0.005),
    ("10E", 10),
    ("RES 10K OHM 1% 1/16W 0402 SMD", 10e3),
    ("10k 0.1W", 10e3),
    ("10k 1206", 10e3),
    ("4x10k", 10e3),
    ("10k x4", 10e3),
    ("4K7J", 4700),
    ("10k/10k", 10e3),
]
NO_RESISTANCE = [
    "",
    "~",
    "DNP",
    "NC",
    "R0402",
    "0402",
    "1206",
    "NA/R0402",
    "R",
    "BSS138",
    "2N7002",
    "74HC2G17GW,125",
    "100nF",
    "3.3V",
    "330W",
    "16MHz",
    "600R@100MHz",  # an impedance
    "103",  # 103 ohm is in no series, 10 k is: the marking on a part
    "4702",
    "01C",
    "1,000",  # one or a thousand
    "1,000k",
    "10k/20k",
    "100 10k",
    "1E3",  # 1.3 ohm and 1 k are both preferred numbers
    "k",
    "1e400k",
    "٣k",
    "9" * 5000,
]


@pytest.mark.parametrize(("text", "ohms"), IEC_60062_OHMS + ON_REAL_BOARDS + HABITS)
def test_a_resistance_is_read(text, ohms):
    assert parse_resistance(text) == ohms


@pytest.mark.parametrize("text", NO_RESISTANCE)
def test_no_resistance_is_guessed(text):
    assert parse_resistance(text) is None


@pytest.mark.parametrize(
    ("text", "fraction"),
    [
        ("49.9R/1%/R0402", 0.01),
        ("R0402_10K_1%_0.0625W_100PPM", 0.01),
        ("R0402_500R_0.1%_0.05W_25PPM", 0.001),
        ("10k ±5%", 0.05),
        ("10k 0,5 %", 0.005),
        # IEC 60062 letters F G J K M (1 2 5 10 20 %), quoted from memory
        ("4K7F", 0.01),
        ("4K7G", 0.02),
        ("4K7J", 0.05),
        ("4R7K", 0.1),
        ("4R7M", 0.2),
        ("10k", None),
        ("10k 1% 5%", None),
        ("", None),
    ],
)
def test_a_tolerance_is_read_when_one_is_named(text, fraction):
    assert resistor_tolerance(text) == (None if fraction is None else pytest.approx(fraction))


@pytest.mark.parametrize(
    ("text", "farads"),
    [
        # IEC 60062 codes, quoted from memory; 220 is 22 pF as a code and 220 pF as a plain value
        ("4n7", 4.7e-9),
        ("100n", 100e-9),
        ("2u2", 2.2e-6),
        ("0.1u", 0.1e-6),
        ("104", 100e-9),
        ("473", 47e-9),
        ("104K", 100e-9),
        ("220", None),
        # published netlists
        ("100nF", 100e-9),
        ("100nf 16v", 100e-9),
        ("CC0402_100NF_16V_10%_X7R", 100e-9),
        ("CC0402_4.7UF_6.3V_20%_X5R", 4.7e-6),
        ("1nF/50V/10%/X7R/C0402", 1e-9),
        ("100nF/10V/20%/X5R/0402", 100e-9),
        ("1nF/50V/5%/NPO(COG)/C0603", 1e-9),
        ("2.2uF/6.3V/20%/X5R/C0402", 2.2e-6),
        ("C_100n_0402", 100e-9),
        # habits
        ("10 µF", 10e-6),
        ("22p", 22e-12),
        ("n47", 0.47e-9),
        ("1mF", 1e-3),
        ("1F", 1.0),
        # not read
        ("1MF", None),
        ("0.1", None),
        ("22", None),
        ("2N7002", None),
        ("10k", None),
        ("16V X5R", None),
        ("100n/1u", None),
        ("~", None),
    ],
)
def test_a_capacitance_is_read_or_refused(text, farads):
    assert parse_capacitance(text) == (None if farads is None else pytest.approx(farads, rel=1e-12))


@pytest.mark.parametrize(
    ("text", "henries"),
    [
        ("10uH", 10e-6),
        ("4u7", 4.7e-6),
        ("2.2UH/2A", 2.2e-6),
        ("3.3 µH", 3.3e-6),
        ("1mH", 1e-3),
        ("10", None),
        ("600R@100MHz", None),
    ],
)
def test_an_inductance_is_read_or_refused(text, henries):
    assert parse_inductance(text) == (None if henries is None else pytest.approx(henries, rel=1e-12))


@pytest.mark.parametrize(
    ("text", "low", "nominal", "high"),
    [
        ("24", 24, 24, 24),
        ("5V", 5, 5, 5),
        ("+5 V", 5, 5, 5),
        ("3V3", 3.3, 3.3, 3.3),
        ("1v8", 1.8, 1.8, 1.8),
        ("3,3", 3.3, 3.3, 3.3),
        ("-12", -12, -12, -12),
        ("500mV", 0.5, 0.5, 0.5),
        ("4.4..5.25", 4.4, 4.825, 5.25),
        ("4.4 V .. 5.25 V", 4.4, 4.825, 5.25),
        ("3.0-3.6V", 3.0, 3.3, 3.6),
        ("-15..-12", -15, -13.5, -12),
        ("4.4..5..5.25", 4.4, 5, 5.25),
        ("3.3 5%", 3.135, 3.3, 3.465),
        ("3.3V ±5%", 3.135, 3.3, 3.465),
        ("3.3V+/-5%", 3.135, 3.3, 3.465),
        ("3.3V ±0.1V", 3.2, 3.3, 3.4),
    ],
)
def test_a_voltage_is_read(text, low, nominal, high):
    volts = parse_volts(text)
    assert volts is not None
    assert (volts.low, volts.nominal, volts.high) == pytest.approx((low, nominal, high))


@pytest.mark.parametrize("text", ["", "five", "5..3", "3.3 5", "5%", "3.3V5V", "1,000", "nan", "1e3", "5A", "5" * 100])
def test_no_voltage_is_guessed(text):
    assert parse_volts(text) is None


def test_a_point_takes_the_given_tolerance_and_a_range_does_not():
    assert parse_volts("10", 0.05) == Spread(low=9.5, nominal=10, high=10.5)
    assert parse_volts("9..11", 0.05) == Spread(low=9, nominal=10, high=11)


def test_series_of_iec_60063():
    # IEC 60063, quoted from memory
    assert E12 == (1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2)
    assert set(E24) - set(E12) == {1.1, 1.3, 1.6, 2.0, 2.4, 3.0, 3.6, 4.3, 5.1, 6.2, 7.5, 9.1}
    assert (E96[0], E96[1], E96[2], E96[95], len(E96)) == (1.00, 1.02, 1.05, 9.76, 96)


def test_e24_is_a_list_and_no_formula():
    formula = [round(10 ** (n / 24), 1) for n in range(24)]
    assert {listed for listed, computed in zip(E24, formula, strict=True) if listed != computed} == {
        2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 8.2,
    }  # fmt: skip


@pytest.mark.parametrize(
    ("ohms", "series", "nearest"),
    [
        (4700, "E24", 4700),
        (5000, "E24", 5100),
        (9.6, "E24", 10),
        (0.95, "E12", 1.0),
        (1e6, "E96", 1e6),
        (1950, "E96", 1960),
        (10_000 / 3, "E96", 3320),
    ],
)
def test_nearest_preferred_number(ohms, series, nearest):
    assert nearest_preferred(ohms, series) == nearest


@pytest.mark.parametrize("ohms", [0, -1, math.inf, math.nan])
def test_nothing_is_near_a_value_that_is_no_resistance(ohms):
    with pytest.raises(ValueError, match="no preferred number"):
        nearest_preferred(ohms)


def test_an_unknown_series_is_refused_with_the_known_ones():
    with pytest.raises(ValueError, match="E12, E24, E96, E192"):
        nearest_preferred(1, "E7")


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (4700, "Ω", "4.7 kΩ"),
        (1.9e6, "bit/s", "1.9 Mbit/s"),
        (220e-9, "s", "220 ns"),
        (999.96, "Ω", "1 kΩ"),
        (0, "A", "0 A"),
        (-3.3e-3, "A", "-3.3 mA"),
        (10e-12, "F", "10 pF"),
        (123456, "Ω", "123 kΩ"),
        (1e-20, "A", "0 A"),
        (math.inf, "s", "∞ s"),
        (math.nan, "s", "? s"),
        (1e12, "Ω", "1000 GΩ"),
    ],
)
def test_quantities_are_written_with_a_prefix(value, unit, text):
    assert format_si(value, unit) == text


@pytest.mark.parametrize(
    ("volts", "text"), [(3.3, "3.3 V"), (0.454, "0.45 V"), (-0.001, "0 V"), (5, "5 V"), (math.inf, "∞ V")]
)
def test_voltages_are_written_to_ten_millivolts(volts, text):
    assert format_volts(volts) == text


def test_two_voltages_are_told_apart():
    assert format_volts_apart(3.604, 3.6) == ("3.604 V", "3.6 V")
    assert format_volts_apart(5, 3.6) == ("5 V", "3.6 V")


def test_rounding_is_no_excess():
    assert 3.3 + 0.3 < 3.6  # in floats
    assert not exceeds(3.6, 3.3 + 0.3)
    assert at_least(3.3 + 0.3, 3.6)


def test_a_millivolt_is_an_excess_and_not_a_number_never_is():
    assert exceeds(3.601, 3.6)
    assert not at_least(3.599, 3.6)
    assert not exceeds(math.nan, 1) and not exceeds(1, math.nan)
    assert not at_least(math.nan, 1) and not at_least(1, math.nan)


def test_references_sort_as_people_count():
    references = ["R10", "R2", "r1", "J_SOM240_1", "J_SOM24_9", "USB-C1", "5.0V/3.3V1", "R010", "U" + "9" * 5000]
    assert sorted(references, key=natural_key) == [
        "5.0V/3.3V1", "J_SOM24_9", "J_SOM240_1", "r1", "R2", "R010", "R10", "U" + "9" * 5000, "USB-C1",
    ]  # fmt: skip


def test_sort_keys_differ_where_texts_do():
    assert len({natural_key(text) for text in ("R1", "r1", "R01", "R1 ", "")}) == 5
