"""Logic families against the published standards that they follow."""

import pytest

from levelcrossing.trade_pins import level_pair

FOLLOWS = {
    "CMOS5_HC": ("HC", "HC4050"),
    "CMOS_4000B": ("4000B", "4050"),
    "TTL5": ("HCT", "AHCT", "ACT", "LS", "ALS", "F", "ABT", "TTL"),
    "LVTTL33": ("LVC", "LVC1G", "LVC1T", "LCX", "LCXH", "ALVC", "VCX", "LVT", "AVC"),
    "LVCMOS25": ("LVC1G", "LCX", "ALVC"),
    "LVCMOS18": ("LVC1G", "ALVC", "AUP", "AVC"),
}


@pytest.mark.parametrize(("standard", "family"), [(key, name) for key, names in FOLLOWS.items() for name in names])
def test_a_family_keeps_the_input_levels_of_its_standard(book, standard, family):
    rule = next(row for row in book.table("standard") if row.id == standard)
    row = next(row for row in book.table("family") if row.id == family)
    low = max(rule.get("supply_volts")[0], row.get("supply_volts")[0])
    high = min(rule.get("supply_volts")[1], row.get("supply_volts")[1])
    assert low <= high
    for supply in (low, (low + high) / 2, high):
        for published, ours in zip(level_pair(rule.data), level_pair(row.data), strict=True):
            assert ours.at(supply) == pytest.approx(published.at(supply)), supply


def test_the_tabulated_points_of_a_standard_are_on_its_own_expressions(book):
    checked = 0
    for row in book.table("standard"):
        vih, vil = level_pair(row.data)
        for point in row.get("points", ()):
            assert vih.at(point["supply_volts"]) == pytest.approx(point["vih_volts"], abs=0.02), row.id
            assert vil.at(point["supply_volts"]) == pytest.approx(point["vil_volts"], abs=0.02), row.id
            checked += 1
    assert checked == 6  # three of HC, three of the 4000 series


def test_the_ultra_low_power_family_allows_a_higher_low_than_the_standard(book):
    # TI SN74AUP1G08 SCES502Q table 5.3: VIL 0.9 V at 3.0-3.6 V, against 0.8 V of JESD8C.01
    row = next(row for row in book.table("family") if row.id == "AUP")
    assert level_pair(row.data)[1].at(3.3) == 0.9
