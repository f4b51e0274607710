"""levelcrossing.toml is read strictly, found where it belongs, and never leads out of the repository."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from levelcrossing.declared import read_day, read_fraction, read_number, read_rate, read_volts
from levelcrossing.errors import SettingsError
from levelcrossing.model import Board, Net, Outcome, Part, Pin, Settings, Spread
from levelcrossing.settings import find_settings, load_settings, parse_settings, settings_from_fields, unmatched

WHOLE = """\
stop_at = "marginal"

[rails]
"VMOT" = "24"
"VBUS" = "4.4..5.25"
"+1V8" = "1.8 +-2%"

[pins]
"U3.4" = {tolerates = 5.5, drives = false, reads = true, open_drain = false, vih = 2.0, vil = "0.8 V", rail = "+3V3"}

[far_ends]
"J3" = {rail = "5", levels = "ttl"}
"J3.4" = {drives = false}

[rates]
"/SPI_*" = "8M"

[tolerances]
rails = "3%"
resistors = "5 %"

[margins]
thin = "0.2 V"

[loads]
stray = "15p"

[[waivers]]
rule = "input-overvoltage"
at = "U3.4"
reason = "the host is never fitted"
until = 2027-01-31

[[waivers]]
rule = "too-slow"
at = "/SDA"
reason = "100 kHz only"
until = "2027-02-28"
fingerprint = "1:0123456789abcdef"
"""


def test_every_key_arrives() -> None:
    settings = parse_settings(WHOLE, "levelcrossing.toml")
    assert settings.stop_at is Outcome.MARGINAL
    assert settings.rail_tolerance == 0.03
    assert settings.resistor_tolerance == 0.05
    assert settings.thin_margin_volts == 0.2
    assert settings.stray_farads == 15e-12
    assert settings.rails["VMOT"] == Spread.around(24, 0.03), "a single voltage takes the rails' tolerance"
    assert settings.rails["VBUS"] == Spread(low=4.4, nominal=4.825, high=5.25)
    assert settings.rails["+1V8"] == Spread.around(1.8, 0.02)
    pin = settings.pins["U3.4"]
    assert (pin.tolerates_volts, pin.drives, pin.reads, pin.open_drain) == (5.5, False, True, False)
    assert (pin.vih_volts, pin.vil_volts, pin.rail, pin.volts, pin.line) == (2.0, 0.8, "+3V3", None, 9)
    assert settings.rates == (("/SPI_*", 8e6),)
    assert [waiver.until for waiver in settings.waivers] == ["2027-01-31", "2027-02-28"]
    assert [waiver.line for waiver in settings.waivers] == [28, 34]
    assert settings.waivers[1].fingerprint == "1:0123456789abcdef"


def test_a_pin_of_a_connector_takes_what_the_whole_connector_declares() -> None:
    """J3 is a 5 V TTL host; J3.4 only says that the host does not drive it."""
    far_ends = parse_settings(WHOLE).far_ends
    assert far_ends["J3"].drives is None
    assert far_ends["J3.4"].drives is False
    for place in ("J3", "J3.4"):
        assert far_ends[place].volts == Spread.around(5, 0.03)
        # JEDEC JESD8C.01, LVTTL: VIH 2.0 V, VIL 0.8 V
        assert (far_ends[place].vih_volts, far_ends[place].vil_volts) == (2.0, 0.8)


def test_never_is_a_stop_level_of_its_own() -> None:
    assert parse_settings('stop_at = "never"').stop_at is Outcome.SOUND
    assert parse_settings("").stop_at is None


@pytest.mark.parametrize(
    ("text", "line", "word"),
    [
        ('[rials]\n"X" = "5"\n', 1, "did you mean 'rails'"),
        ('stop_et = "damage"\n', 1, "did you mean 'stop_at'"),
        ('stop_at = "malfunctoin"\n', 1, "did you mean 'malfunction'"),
        ("stop_at = 3\n", 1, "stop_at is 3"),
        ('\n[pins]\n\n"U3.4" = {tolerate = 5.5}\n', 4, "did you mean 'tolerates'"),
        ('[pins]\n"U3.4" = {tolerates = "a lot"}\n', 2, "tolerates is 'a lot'"),
        ('[pins]\n"U3.4" = {tolerates = "3..5"}\n', 2, "not one voltage"),
        ('[pins]\n"U3.4" = {drives = "yes"}\n', 2, "write true or false"),
        ('[pins]\n"U3.4" = {drives = 1}\n', 2, "drives is 1"),
        ('[pins]\n"U3.4" = 5.5\n', 2, "must be a table, not 5.5"),
        ('[pins]\n"U 3" = {}\n', 2, "neither a pin nor a part"),
        ('[pins]\n"U3.4" = {vih = 0.8, vil = 2.0}\n', 2, "vil (2 V) is not below vih (0.8 V)"),
        ('[pins]\n"U3.4" = {rail = true}\n', 2, "rail is true"),
        ('[far_ends]\n"J3" = {drives = true}\n', 2, "has no rail"),
        ('[far_ends]\n"J3" = {rail = "5", levels = "tll"}\n', 2, "did you mean 'ttl'"),
        ('[rails]\n"A" = "5"\n"B" = "five"\n', 3, "'B' is 'five', not a voltage"),
        ('[rails]\n"A" = "5..3"\n', 2, "not a voltage"),
        ('[rails]\n"A" = nan\n', 2, "not a voltage"),
        ('[rails]\n"A" = true\n', 2, "is true, not a voltage"),
        ('[rails]\n"A" = ["5"]\n', 2, "is a list, not a voltage"),
        ('[rails]\n"A" = 1e300\n', 2, "not a voltage"),
        ('rails = "5"\n', 1, "rails must be a table"),
        ('[rates]\n"/SPI" = "fast"\n', 2, "not a bit rate"),
        ('[rates]\n"/SPI" = 0\n', 2, "not a bit rate"),
        ("[tolerances]\nrails = 5\n", 2, "tolerance from 0 to 50 %"),
        ('[tolerances]\nresistor = "1%"\n', 2, "did you mean 'resistors'"),
        ('[loads]\nstray = "10 V"\n', 2, "not a capacitance"),
        ('[loads]\nstray = "-10p"\n', 2, "not a capacitance"),
        ('[margins]\nthin = "thick"\n', 2, "not a voltage"),
        ('[[waivers]]\nrule = "too-slow"\nat = "U1"\n', 1, "waiver has no reason"),
        ('[[waivers]]\nrule = "too-slow"\nat = "U1"\nreason = "  "\n', 4, "not a text"),
        ('[[waivers]]\nrule = "*"\nat = "U1"\nreason = "x"\n', 2, "not the name of a rule"),
        ('[[waivers]]\nrule = "too-slow"\nat = "U1"\nreason = "x"\nuntil = "2027-02-30"\n', 5, "not a day"),
        ('[[waivers]]\nrule = "too-slow"\nat = "U1"\nreason = "x"\nuntil = 2027-01-31T10:00:00\n', 5, "not a day"),
        (
            '[[waivers]]\nrule = "too-slow"\nat = "U1"\nreason = "x"\n\n[[waivers]]\nrul = "y"\n',
            7,
            "did you mean 'rule'",
        ),
        ('[[waivers]]\nrule = "a"\nat = "b"\nreason = "c"\nfingerprint = 3\n', 5, "fingerprint of a waiver is 3"),
        ('waivers = "all"\n', 1, "list of tables"),
        ('[rails]\n"A" = \n', 2, "not valid TOML"),
        ('[rails]\n"A" = "5"\n"A" = "6"\n', 3, "not valid TOML"),
    ],
)
def test_what_is_wrong_is_told_with_its_line(text: str, line: int, word: str) -> None:
    with pytest.raises(SettingsError) as caught:
        parse_settings(text, "board/levelcrossing.toml")
    assert str(caught.value).startswith(f"board/levelcrossing.toml:{line}: ")
    assert word in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    "text",
    [
        "x = " + "[" * 100_000,
        "x = " + "{a=" * 5_000,
        "x = " + "9" * 10_000,
        '"\\u001b[31m" = 1',
        "[[[[",
        "\x00",
        "a.b.c.d = 1",
    ],
)
def test_hostile_text_is_one_harmless_line(text: str) -> None:
    with pytest.raises(SettingsError) as caught:
        parse_settings(text)
    assert str(caught.value).isprintable()
    assert len(str(caught.value)) < 400


def test_lines_are_found_behind_multi_line_strings_and_dotted_keys() -> None:
    text = '[[waivers]]\nrule = "a"\nat = "b"\nreason = """\n[rails]\nuntil = 1\n"""\nuntil = "x"\n'
    with pytest.raises(SettingsError) as caught:
        parse_settings(text)
    assert caught.value.line == 8
    with pytest.raises(SettingsError) as caught:
        parse_settings('\ntolerances.rails = "5%"\n\ntolerances."resistor" = "1%"\n')
    assert caught.value.line == 4


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        ("24", (24, 24, 24)),
        (24, (24, 24, 24)),
        ("3V3", (3.3, 3.3, 3.3)),
        ("3.3 V", (3.3, 3.3, 3.3)),
        ("800mV", (0.8, 0.8, 0.8)),
        ("-5", (-5, -5, -5)),
        ("4.4..5..5.25", (4.4, 5, 5.25)),
        ("10±1%", (9.9, 10, 10.1)),
        ("10 +/- 1 %", (9.9, 10, 10.1)),
        ("", None),
        ("5 A", None),
        ("..", None),
        ("1..2..3..4", None),
        ("5 +- lots", None),
        (None, None),
        (float("inf"), None),
        (10**400, None),
    ],
)
def test_voltages(value: object, expected: tuple[float, float, float] | None) -> None:
    volts = read_volts(value, 0.0)
    assert (volts is None) == (expected is None)
    if volts is not None and expected is not None:
        assert (volts.low, volts.nominal, volts.high) == pytest.approx(expected)


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        ("8M", 8e6),
        ("400k", 4e5),
        ("400 kbit/s", 4e5),
        ("9600 baud", 9600),
        ("1Mbps", 1e6),
        ("400 kHz", 4e5),
        (115200, 115200),
        ("0", None),
        ("-1", None),
        ("8 MV", None),
        ("fast", None),
    ],
)
def test_bit_rates(value: object, expected: float | None) -> None:
    assert read_rate(value) == (None if expected is None else pytest.approx(expected))


def test_numbers_fractions_and_days() -> None:
    assert read_number("10p", "F") == 1e-11
    assert read_number("10 pF", "F") == 1e-11
    assert read_number("10 pV", "F") is None
    assert read_fraction("5%") == 0.05
    assert read_fraction("60%") is None
    assert read_fraction(0.02) == 0.02
    assert read_day("2028-02-29") == "2028-02-29"
    assert read_day("2027-02-29") is None
    assert read_day("20270228") is None


# ----------------------------------------------------------------------------------------------------- finding the file


def _repository(root: Path, *folders: str) -> Path:
    (root / ".git").mkdir()
    board = root.joinpath(*folders)
    board.mkdir(parents=True, exist_ok=True)
    (board / "gauge.kicad_sch").write_text("(kicad_sch)", encoding="utf-8")
    return board / "gauge.kicad_sch"


def test_the_nearest_file_within_the_repository_is_found(tmp_path: Path) -> None:
    board = _repository(tmp_path, "hardware", "gauge")
    assert load_settings(str(board)) == Settings()
    (tmp_path / "levelcrossing.toml").write_text('[rails]\n"A" = "5"\n', encoding="utf-8")
    assert "A" in load_settings(str(board)).rails
    board.with_name("levelcrossing.toml").write_text('[rails]\n"B" = "5"\n', encoding="utf-8")
    assert set(load_settings(str(board)).rails) == {"B"}
    assert set(load_settings(str(board.parent)).rails) == {"B"}, "a project folder is looked into itself"


def test_nothing_above_the_repository_is_read(tmp_path: Path) -> None:
    (tmp_path / "levelcrossing.toml").write_text('[rails]\n"A" = "5"\n', encoding="utf-8")
    (tmp_path / "clone").mkdir()
    board = _repository(tmp_path / "clone", "hardware")
    assert find_settings(str(board)) is None


def test_without_a_repository_the_search_ends_five_folders_up(tmp_path: Path) -> None:
    (tmp_path / "levelcrossing.toml").write_text("", encoding="utf-8")
    deep = tmp_path.joinpath(*"abcde")
    deep.mkdir(parents=True)
    assert find_settings(str(deep / "x.net")) == tmp_path / "levelcrossing.toml"
    (deep / "f").mkdir()
    assert find_settings(str(deep / "f" / "x.net")) is None


def test_a_link_out_of_the_repository_is_refused(tmp_path: Path) -> None:
    secret = tmp_path / "secret.toml"
    secret.write_text('[rails]\n"A" = "5"\n', encoding="utf-8")
    (tmp_path / "clone").mkdir()
    board = _repository(tmp_path / "clone")
    os.symlink(secret, tmp_path / "clone" / "levelcrossing.toml")
    with pytest.raises(SettingsError, match="leads out of the repository"):
        load_settings(str(board))
    os.unlink(tmp_path / "clone" / "levelcrossing.toml")
    (tmp_path / "clone" / "shared.toml").write_text('[rails]\n"B" = "5"\n', encoding="utf-8")
    os.symlink("shared.toml", tmp_path / "clone" / "levelcrossing.toml")
    assert set(load_settings(str(board)).rails) == {"B"}, "a link that stays inside is fine"


def test_files_that_are_no_settings(tmp_path: Path) -> None:
    with pytest.raises(SettingsError, match="no such settings file"):
        load_settings("x.net", str(tmp_path / "absent.toml"))
    with pytest.raises(SettingsError, match="no such settings file"):
        load_settings("x.net", str(tmp_path))
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    with pytest.raises(SettingsError, match="no such settings file"):
        load_settings("x.net", str(pipe))
    latin = tmp_path / "latin.toml"
    latin.write_bytes(b'[rails]\n"A" = "5" # \xb5\n')
    with pytest.raises(SettingsError, match=r"latin.toml:2: is not UTF-8"):
        load_settings("x.net", str(latin))
    large = tmp_path / "large.toml"
    large.write_text("#" * 1_000_001, encoding="utf-8")
    with pytest.raises(SettingsError, match="larger than"):
        load_settings("x.net", str(large))
    marked = tmp_path / "marked.toml"
    marked.write_bytes(b'\xef\xbb\xbf[rails]\r\n"A" = "5"\r\n')
    assert set(load_settings("x.net", str(marked)).rails) == {"A"}


# ------------------------------------------------------------------------------------------------------ symbol fields


def _board(*parts: tuple[str, dict[str, str], dict[str, str]]) -> Board:
    """Return a board of (reference, {pin: net}, fields)."""
    made = tuple(
        Part(
            reference=reference,
            value="x",
            fields=tuple(fields.items()),
            pins=tuple(Pin(part=reference, number=number, name="", kind="", net=net) for number, net in pins.items()),
        )
        for reference, pins, fields in parts
    )
    names = sorted({pin.net for part in made for pin in part.pins if pin.net})
    nets = tuple(
        Net(name=name, pins=tuple((pin.part, pin.number) for part in made for pin in part.pins if pin.net == name))
        for name in names
    )
    return Board(path="gauge.net", form="netlist", parts=made, nets=nets)


def test_fields_declare_the_same_facts() -> None:
    board = _board(
        ("BT1", {"1": "VBAT", "2": "GND"}, {"Rail volts": "3.0..4.2"}),
        ("J1", {"1": "VMOT", "2": "VIN", "3": "GND"}, {"rail volts": "VMOT = 24; VIN=9..14"}),
        (
            "J3",
            {"1": "TX", "2": "RX"},
            {"Far end": "5; ttl", "Pin 1 far end": "5, drives only", "Pin 2 tolerates": "6"},
        ),
        (
            "U3",
            {"4": "SDA", "5": "SCL"},
            {"Tolerates": "5.5", "Pin 4 open drain": "yes", "PIN 5 VIH": "2", "Pin 5 rate": "400k"},
        ),
    )
    settings = settings_from_fields(board, Settings())
    assert settings.rails["VBAT"] == Spread(low=3.0, nominal=3.6, high=4.2)
    assert settings.rails["VMOT"] == Spread.around(24, 0.05)
    assert settings.rails["VIN"] == Spread(low=9, nominal=11.5, high=14)
    assert settings.far_ends["J3"].vih_volts == 2.0
    assert (settings.far_ends["J3.1"].drives, settings.far_ends["J3.1"].reads) == (True, False)
    assert settings.far_ends["J3.2"].tolerates_volts == 6
    assert settings.far_ends["J3.2"].volts == Spread.around(5, 0.05), "the rest as for the whole connector"
    assert settings.pins["U3"].tolerates_volts == 5.5
    assert (settings.pins["U3.4"].open_drain, settings.pins["U3.4"].tolerates_volts) == (True, 5.5)
    assert settings.pins["U3.5"].vih_volts == 2.0
    assert settings.rates == (("SCL", 4e5),)


def test_the_settings_file_wins_over_fields() -> None:
    board = _board(
        ("BT1", {"1": "VBAT", "2": "GND"}, {"Rail volts": "3"}),
        ("U3", {"4": "SDA"}, {"Pin 4 tolerates": "5.5", "Pin 4 drives": "no", "Pin 4 rate": "400k"}),
    )
    file = parse_settings('[rails]\n"VBAT" = "4"\n[pins]\n"U3" = {tolerates = 3.6}\n[rates]\n"SDA" = "100k"\n')
    settings = settings_from_fields(board, file)
    assert settings.rails["VBAT"].nominal == 4
    assert settings.pins["U3.4"].tolerates_volts == 3.6
    assert settings.pins["U3.4"].drives is False
    assert settings.rates == (("SDA", 1e5),)


def test_boards_without_such_fields_leave_the_settings_alone() -> None:
    file = parse_settings(WHOLE)
    board = _board(
        ("R1", {"1": "A", "2": "B"}, {"Tolerance": "1%", "Pin 1 orientation": "north", "Rail": "", "Far end": " "})
    )
    assert settings_from_fields(board, file) is file


@pytest.mark.parametrize(
    ("fields", "word"),
    [
        ({"Rail volts": "lots"}, "'lots' is not a voltage"),
        ({"Rail volts": "5"}, "2 nets besides ground"),
        ({"Rail volts": "VDD = 5"}, "no pin of the part is on net 'VDD'"),
        ({"Far end": "ttl"}, "tells no rail"),
        ({"Far end": "5; ttl; sideways"}, "'sideways' is not understood"),
        ({"Tolerates": "five"}, "not one voltage"),
        ({"Pin 9 tolerates": "5"}, "no pin '9' (its pins are 1, 2)"),
        ({"Pin 1 tolerate": "5"}, "did you mean 'Pin 1 tolerates'?"),
        ({"Pin 1 drives": "maybe"}, "neither yes nor no"),
        ({"Pin 1 rate": "slow"}, "not a bit rate"),
        ({"Pin 1 levels": "ecl"}, "known are cmos, ttl"),
    ],
)
def test_a_field_that_cannot_be_read_is_told(fields: dict[str, str], word: str) -> None:
    with pytest.raises(SettingsError) as caught:
        settings_from_fields(_board(("U1", {"1": "A", "2": "B"}, fields)), Settings())
    assert word in str(caught.value)
    assert str(caught.value).startswith("gauge.net: field ")


def test_names_that_the_board_lacks_are_remarked() -> None:
    board = _board(("U3", {"4": "/SDA", "5": "/SCL"}, {}), ("J1", {"1": "VMOT"}, {}))
    file = parse_settings(
        '[rails]\n"VMOTT" = "24"\n"VM*" = "24"\n[pins]\n"U3.4" = {}\n"U3.44" = {}\n"U33" = {}\n'
        '[far_ends]\n"J1" = {rail = "5"}\n[rates]\n"/S*" = "1M"\n"/sda" = "1M"\n',
        "levelcrossing.toml",
    )
    assert unmatched(board, file) == (
        "levelcrossing.toml:6: pins 'U3.44': no such pin of 'U3' (did you mean '4'?)",
        "levelcrossing.toml:7: pins 'U33': no such part on the board (did you mean 'U3'?)",
        "levelcrossing.toml: rails 'VMOTT': no such net on the board (did you mean 'VMOT'?)",
        "levelcrossing.toml: rates '/sda': no such net on the board",
    )
    assert unmatched(board, Settings()) == ()
