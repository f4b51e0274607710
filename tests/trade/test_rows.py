"""Rows that must be refused, each with its file, its line and one clear sentence."""

import pytest

from levelcrossing import tradebook
from levelcrossing.errors import TradeDataError

GOOD = """
[[part]]
id = "kiln probe"
match = ['KP17']
group = "sensor"
supplies = [ { pins = 'VCC', volts = [3.0, 5.5], role = "io" } ]
io_supply = 'VCC'
vih_volts = "0.7*V"
vil_volts = "0.3*V"
source = "own measurement"
certainty = "practice"
"""


def refused(tmp_path, text):
    house = tmp_path / "house.toml"
    house.write_text(text, encoding="utf-8")
    with pytest.raises(TradeDataError) as caught:
        tradebook.load(extra=[house])
    assert caught.value.file == str(house)
    assert "\n" not in str(caught.value)
    return caught.value


def test_the_good_row_is_taken(tmp_path):
    house = tmp_path / "house.toml"
    house.write_text(GOOD, encoding="utf-8")
    tradebook.load(extra=[house])


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('source = "own measurement"\n', "", "has no source"),
        ('source = "own measurement"', 'source = " "', "text"),
        ('certainty = "practice"\n', "", "has no certainty"),
        ('certainty = "practice"', 'certainty = "sure"', "datasheet, secondary, memory, practice"),
        ('vil_volts = "0.3*V"', 'vil_volts = "0.7*V"', "VIL 2.1 V not below VIH 2.1 V at 3 V"),
        ('vil_volts = "0.3*V"', 'vil_volts = "V-1.0"', "not below"),
        ('vih_volts = "0.7*V"', 'vih_volts = "0.7V"', "wrong 'vih_volts'"),
        ('vih_volts = "0.7*V"', 'vih_volts = "__import__(1)"', "wrong 'vih_volts'"),
        ('vih_volts = "0.7*V"', "vih_volts = 2.0", "expression of V in quotes"),
        ('vih_volts = "0.7*V"', 'vih_volts = "1/(V-V)"', "divides by zero"),
        ("volts = [3.0, 5.5]", "volts = [5.5, 3.0]", "ascending"),
        ("volts = [3.0, 5.5]", "volts = [3.0]", "2 numbers"),
        ("['KP17']", "['KP17(']", "wrong pattern"),
        ("['KP17']", "['KP17|KP18']", "alternatives outside parentheses"),
        ("['KP17']", "['(KP17)?']", "matches nothing at all"),
        ("['KP17']", "[]", "pattern"),
        ("match = ['KP17']\n", "", "lacks 'match'"),
        ("vih_volts", "vih_vlts", "did you mean 'vih_volts'"),
        ('group = "sensor"', 'group = "sensors"', "one of"),
        ('role = "io"', 'rolle = "io"', "unknown key 'rolle'"),
        ('id = "kiln probe"\n', "", "has no id"),
        ("[[part]]", "[[prat]]", "no kind of row"),
    ],
)
def test_a_wrong_row_is_refused_with_its_line(tmp_path, old, new, said):
    assert old in GOOD
    fault = refused(
        tmp_path, GOOD + GOOD.replace("kiln probe", "second probe").replace(old.replace("kiln", "second"), new)
    )
    assert said in str(fault)
    assert fault.line == 13


def test_two_rows_of_one_id_are_refused(tmp_path):
    assert "same id as the row in line 2" in str(refused(tmp_path, GOOD + GOOD))


def test_broken_toml_is_refused_at_its_line(tmp_path):
    fault = refused(tmp_path, GOOD + '\n[[part]]\nid = "x\n')
    assert "not TOML" in str(fault)
    assert fault.line in (14, 15)


def test_a_value_outside_any_row_is_refused(tmp_path):
    assert "outside any [[table]]" in str(refused(tmp_path, "schema = 1\n" + GOOD))


def test_an_output_high_above_its_supply_is_refused(tmp_path):
    point = 'outputs = [ { supply_volts = 3.0, voh_volts = "V+0.5", vol_volts = "0.4" } ]\nsource'
    assert "above its supply" in str(refused(tmp_path, GOOD.replace("source", point, 1)))


def test_a_file_that_is_missing_or_no_text_is_refused(tmp_path):
    with pytest.raises(TradeDataError):
        tradebook.load(extra=[tmp_path / "nowhere.toml"])
    (tmp_path / "binary.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(TradeDataError):
        tradebook.load(extra=[tmp_path / "binary.toml"])
    with pytest.raises(TradeDataError):
        tradebook.load(tmp_path / "empty")
