"""What the library says of single pins: directions, sides, channels, controls, unnamed pins."""

import pytest

from levelcrossing import pins
from levelcrossing.model import Pin


@pytest.mark.parametrize(
    ("value", "name", "number", "direction"),
    [
        ("74LVC244", "1A0", "2", "in"),
        ("74LVC244", "1Y0", "18", "out"),
        ("74LVC244", "~{1OE}", "1", "in"),
        ("74LVC125", "~", "3", "out"),
        ("74LVC125", "~", "2", "in"),
        ("74HC04", "~", "4", "out"),
        ("74HC04", "~", "3", "in"),
        ("74LVC1G125", "~", "4", "out"),
        ("74LVC1G125", "~", "2", "in"),
        ("74LVC1G125", "~{OE}", "1", "in"),
        ("74LVC2G34", "", "6", "out"),
        ("74LVC3G07", "", "7", "open-drain"),
        ("74HC00", "~", "11", "out"),
        ("74HC02", "~", "1", "out"),
        ("74HC02", "~", "2", "in"),
        ("74LS05", "~", "2", "open-drain"),
        ("74LS38", "~", "3", "open-drain"),
        ("74HC595", "QA", "15", "out"),
        ("74HC595", "QH'", "9", "out"),
        ("74HC595", "SER", "14", "in"),
        ("74HC595", "SRCLK", "11", "in"),
        ("74HC138", "~{Y0}", "15", "out"),
        ("74HC138", "A0", "1", "in"),
        ("74HC574", "Q0", "19", "out"),
        ("74HC574", "D0", "2", "in"),
        ("74HC574", "Cp", "11", "in"),
        ("74LVC245", "A0", "2", "inout"),
        ("74LVC245", "B7", "11", "inout"),
        ("74LVC245", "A->B", "1", "in"),
        ("74LVC245", "CE", "19", "in"),
        ("74HC165", "~{Q7}", "7", "out"),
        ("CD4011BE", "~", "3", "out"),
        ("CD4011BE", "~", "4", "out"),
        ("74HC4051", "A", "11", "in"),
        ("74HC4051", "X3", "12", "analog"),
        ("W25Q128JVS", "~{CS}", "1", "in"),
        ("W25Q128JVS", "CLK", "6", "in"),
        ("W25Q128JVS", "DO(IO1)", "2", "inout"),
        ("MT48LC16M16A2TG", "A3", "26", "in"),
        ("MT48LC16M16A2TG", "DQ3", "7", "inout"),
        ("MCP3008", "DOUT", "12", "out"),
        ("BME280", "SCK", "4", "in"),
        ("CH340G", "TXD", "2", "out"),
        ("CH340G", "RXD", "3", "in"),
        ("MAX485", "RO", "1", "out"),
        ("MAX485", "DI", "4", "in"),
        ("MAX485", "A", "6", "analog"),
    ],
)
def test_direction_of_a_pin(pin, value, name, number, direction):
    others = ["2:~:input", "4:~:output"] if name in ("", "~") else ["2:named:input"]
    assert pin(value, name, number, "passive", pins=others).direction == direction


def test_a_logic_symbol_with_unnamed_supply_pins(pin):
    assert pin("74HC04", "~", "14", "power_in", pins=["1:~:input"]).direction == "supply"
    assert pin("74HC04", "VCC", "14", "power_in").direction == "supply"
    assert pin("74HC04", "GND", "7", "power_in").direction == "ground"


def test_a_transceiver_pairs_its_channels(pin):
    assert pin("SN74LVC8T245", "A3").channel == pin("SN74LVC8T245", "B3").channel == "3"
    assert pin("SN74LVCH16T245", "2A4").channel == pin("SN74LVCH16T245", "2B4").channel
    assert pin("SN74LVCH16T245", "1A4").channel != pin("SN74LVCH16T245", "2A4").channel
    assert (pin("SN74LVC8T245", "A3").side, pin("SN74LVC8T245", "B3").side) == ("a", "b")
    assert pin("PCA9306D", "SDA1").channel == pin("PCA9306D", "SDA2").channel == "SDA"
    assert pin("TCA9406DC", "SCL_A").channel == pin("TCA9406DC", "SCL_B").channel == "SCL"
    assert pin("TXS0102", "A1").channel == pin("TXS0102", "B1").channel == "1"


def test_each_side_of_a_translator_has_its_own_supply_and_levels(pin):
    a, b = pin("SN74LVC1T45", "A"), pin("SN74LVC1T45", "B")
    assert (a.supply, b.supply) == ("VCCA|VCC\\(A\\)", "VCCB|VCC\\(B\\)")
    assert a.vih.at(3.3) == 2.0  # TI SCES515K table 7.3
    assert b.vih.at(1.8) == pytest.approx(1.17)
    assert a.vmax.at(1.8) == 6.5
    assert a.clamp_high is False
    assert a.direction == "inout"


def test_control_pins_belong_to_the_supply_that_sets_their_threshold(pin, book, part):
    facts = pin("TXB0104", "OE")
    assert (facts.direction, facts.supply) == ("in", "VCCA")
    assert facts.vmax.at(1.8) == 5.5  # TI: OE accepts up to 5.5 V
    enables = [control for control in book.part(part("SN74LVC8T245")).translator.controls if control.use == "enable"]
    assert [control.active for control in enables] == ["L"]
    directions = [
        control for control in book.part(part("SN74LVC8T245")).translator.controls if control.use == "direction"
    ]
    assert [control.meaning for control in directions] == ["a-to-b"]


def test_channel_directions_of_a_fixed_translator_go_by_the_part(pin):
    # TI TXU0104: four A to B; TXU0204: two and two; TXU0304: three and one
    assert [pin("TXU0104PWR", name).direction for name in ("A4", "B4Y")] == ["in", "out"]
    assert [pin("TXU0204PWR", name).direction for name in ("A1", "B1Y", "B3", "A3Y")] == ["in", "out", "in", "out"]
    assert [pin("TXU0304PWR", name).direction for name in ("A3", "B4", "A4Y")] == ["in", "in", "out"]
    assert pin("2N7001TDCKR", "A").direction == "in"
    assert pin("2N7001TDCKR", "B").direction == "out"


def test_a_pass_switch_neither_drives_nor_reads(pin, book, part):
    facts = pin("SN74CB3T3257", "1B1")
    assert (facts.vih, facts.outputs, facts.direction) == (None, (), "inout")
    whole = book.part(part("SN74CB3T3257")).translator
    assert whole.kind == "bus-switch"
    assert whole.pass_level.at(3.3) == pytest.approx(3.3)  # TI SCDS136: the passed level is limited to its own supply
    assert book.part(part("SN74CB3Q3245")).translator.pass_level.at(3.3) == 5.5  # SCDS124D: no limit
    assert pin("SN74CB3T3257", "1A").channel == pin("SN74CB3T3257", "1B2").channel


def test_the_outputs_of_ahc_clamp_although_its_inputs_do_not(pin):
    # onsemi MC74VHC125 p.2: inputs to 7 V, outputs V + 0.5
    assert pin("74AHC125", "1A").clamp_high is False
    out = pin("74AHC125", "1Y")
    assert out.clamp_high is True
    assert out.vmax.at(3.3) == pytest.approx(3.8)


def test_an_i2c_buffer_only_pulls_low(pin, book, part):
    facts = pin("PCA9517ADP", "SDAB")
    assert (facts.direction, facts.side, facts.channel) == ("open-drain", "b", "SDA")
    assert facts.vil.at(5.0) == 0.4  # the offset side takes over a low only below 0.4 V
    assert book.part(part("PCA9517ADP")).translator.pull_up_needed


def test_supply_and_ground_pins_are_told_apart_from_select_pins(pin):
    assert pin("MCP3008", "~{CS}/SHDN").direction == "in"
    assert pin("74HC595", "GND").direction == "ground"
    assert pin("STM32F103C8T6", "VSSA", kind="power_in").direction == "ground"
    assert pin("CH340G", "V3", kind="passive").direction == "supply-out"
    assert pin("SX1276", "SS").direction != "ground"


def test_pins_on_another_supply_of_the_same_part(pin):
    assert pin("ATmega328P", "PC3").supply == "AVCC"
    assert pin("ATSAMD21G18A", "PA04").supply == "VDDANA"
    assert pin("FT232RL", "RXD").supply == "VCCIO"


def test_a_row_says_how_sure_it_is_and_where_it_stands(book, part):
    facts = book.part(part("eZ80F91"))
    assert facts.provenance.certainty == "memory"
    assert facts.provenance.file == "rules/trade/parts.toml"
    assert facts.provenance.line > 1
    assert book.part(part("FXMA108BQX")).doubtful


def test_a_relative_of_the_part_that_was_read_is_from_memory(book, part):
    """The row holds two current monitors; the sheet of one of them was read."""
    read, relative = (book.part(part(name)).provenance for name in ("INA226", "INA219"))
    assert read.row == relative.row and read.certainty == "secondary"
    assert relative.certainty == "memory" and relative.source == f"{read.source}; taken for this part too"


def test_a_group_of_figures_may_be_less_sure_than_its_row(book, part):
    facts = book.part(part("STM32F303CB"))
    assert facts.provenance.certainty_of() == "datasheet"
    assert facts.provenance.certainty_of("levels") == "datasheet"
    assert facts.provenance.certainty_of("levels", "maxima") == "memory"
    assert pins.receive_from(facts.pin(Pin(part="U1", number="1", name="PA9", kind="", net="")), facts).source.endswith(
        ", from memory"
    )


def test_every_sure_member_belongs_to_its_row(book, part):
    """A member is a pattern; what its row says of it must be reachable."""
    rows = [row for row in book.table("part") if row.get("sure_members")]
    assert len(rows) >= 30
    for row in rows:
        for member in row.get("sure_members"):
            plain = member.replace("\\d+", "128").replace("[BD]", "B").replace("[A-Z]?", "C").replace("[8B]", "8")
            assert book.part(part(plain)).provenance.row == row.id, (row.id, member)
            assert book.part(part(plain)).provenance.certainty == row.get("certainty"), (row.id, member)
