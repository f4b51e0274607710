"""Which nets are rails, at which voltage, on what evidence, and what contradicts it."""

from __future__ import annotations

from dataclasses import replace

import pytest
from small_boards import BOOK, board_of

from levelcrossing.model import Basis, Rail, Rails, Settings, Spread
from levelcrossing.rails import trace_rails

# A sensor node: a gate on each supply makes a net a supply net.
GATE = (
    "U{n} 74LVC1G04 74xGxx:74LVC1G04 | 2 A input IN{n} | 3 GND power_in GND | 4 Y output OUT{n} | 5 VCC power_in {net}"
)
CAP = "C{n} {value} Device:C | 1 - passive {net} | 2 - passive GND"
LDO = "U8 AP2112K-{volts} Regulator_Linear:AP2112K | 1 VIN power_in {source} | 2 GND - GND | 5 VOUT power_out {net}"


def gate(net: str, n: int = 1) -> str:
    return GATE.format(n=n, net=net)


def cap(net: str, value: str = "100n", n: int = 1) -> str:
    return CAP.format(n=n, net=net, value=value)


def ldo(source: str, net: str, volts: str = "3.3") -> str:
    return LDO.format(source=source, net=net, volts=volts)


def trace(*lines: str, settings: Settings | None = None) -> Rails:
    return trace_rails(board_of("\n".join(lines)), BOOK, settings or Settings())


def rail(net: str, *lines: str, settings: Settings | None = None) -> Rail:
    return trace(*lines, settings=settings).by_net[net]


def span(found: Rail) -> tuple[float, ...]:
    assert found.volts is not None
    return tuple(round(volts, 3) for volts in (found.volts.low, found.volts.nominal, found.volts.high))


# -------------------------------------------------------------------------------------------------- names and signals


def test_a_named_rail_takes_the_tolerance_of_the_settings() -> None:
    assert span(rail("+3V3", gate("+3V3"))) == (3.135, 3.3, 3.465)
    assert span(rail("+3V3", gate("+3V3"), settings=Settings(rail_tolerance=0.1))) == (2.97, 3.3, 3.63)


@pytest.mark.parametrize("net", ["3V3_PG", "5V_EN", "VDD_SENSE", "3V3_5V_SEL", "SDA_3V3"])
def test_signals_with_a_voltage_in_their_name_are_no_rails(net: str) -> None:
    lines = (gate("+5V"), f"U2 74LVC1G04 74xGxx:74LVC1G04 | 2 A input {net} | 3 GND power_in GND | 5 VCC power_in +5V")
    assert net not in trace(*lines, cap(net)).by_net


def test_a_name_needs_the_company_of_a_rail() -> None:
    driven = gate("+5V").replace("OUT1", "5V_LED") + "\nR1 1k Device:R | 1 - passive 5V_LED | 2 - passive LAMP"
    assert "5V_LED" not in trace(driven).by_net
    fed = "J1 lamp Connector:Conn_01x02 | 1 - passive 5V_LED | 2 - passive GND"
    assert "5V_LED" in trace(fed, cap("5V_LED")).by_net


def test_a_clock_supply_named_like_a_signal_is_a_rail_when_it_supplies_parts() -> None:
    supplied = (gate("P3V3_CLK", 1), gate("P3V3_CLK", 2), cap("P3V3_CLK"))
    assert span(rail("P3V3_CLK", *supplied))[1] == 3.3
    signal = gate("+5V").replace("OUT1", "P3V3_CLK")
    assert "P3V3_CLK" not in trace(signal).by_net


@pytest.mark.parametrize("net", ["VCC", "VDD", "VIN"])
def test_bare_supply_names_carry_no_voltage(net: str) -> None:
    rails = trace(gate(net, 1), gate(net, 2), f"J1 in Connector:Conn_01x02 | 1 - passive {net} | 2 - passive GND")
    assert rails.by_net[net].volts is None
    (unknown,) = rails.unknown
    assert unknown[0] == net
    assert f'"{net}" = ' in unknown[1]
    assert "U1 (VCC)" in unknown[1]


def test_the_input_of_a_3v3_regulator_is_not_3v3() -> None:
    rails = trace(ldo("3V3_VIN", "+3V3"), gate("+3V3"), cap("3V3_VIN"))
    assert rails.by_net["3V3_VIN"].volts is None
    assert not rails.remarks


def test_an_underscore_is_a_point_only_on_a_net_that_reaches_further_than_one_part() -> None:
    own = "U1 ASIC Local:ASIC | 1 VDD1_0 power_in VDD1_0 | 2 GND power_in GND"
    assert trace(own, cap("VDD1_0")).by_net["VDD1_0"].volts is None
    assert span(rail("VCC_3_3", gate("VCC_3_3", 1), gate("VCC_3_3", 2)))[1] == 3.3


# ----------------------------------------------------------------------------------------------------------- settings


def test_settings_win_and_silence_a_contradiction() -> None:
    settings = Settings(rails={"+5V": Spread.exactly(6.0)})
    found = trace(gate("+5V"), settings=settings)
    assert span(found.by_net["+5V"]) == (5.7, 6.0, 6.3)
    assert found.by_net["+5V"].basis is Basis.DECLARED
    assert [item.kind for item in found.by_net["+5V"].evidence] == ["settings", "name"]
    assert not found.remarks


def test_settings_may_name_a_pattern() -> None:
    settings = Settings(rails={"/PUMP*/VM": Spread(low=9.0, nominal=12.0, high=14.0)})
    found = trace(gate("/PUMP1/VM", 1), gate("/PUMP2/VM", 2), gate("/FAN/VM", 3), settings=settings)
    assert span(found.by_net["/PUMP1/VM"]) == (9.0, 12.0, 14.0)
    assert span(found.by_net["/PUMP2/VM"]) == (9.0, 12.0, 14.0)
    assert "/FAN/VM" not in found.by_net


def test_a_field_on_the_schematic_declares_a_rail() -> None:
    board = board_of("J1 in Connector:Conn_01x02 | 1 - passive VMOT | 2 - passive GND\n" + gate("VMOT"))
    parts = [replace(part, fields=(("Rail volts", "24"),)) if part.reference == "J1" else part for part in board.parts]
    found = trace_rails(replace(board, parts=tuple(parts)), BOOK, Settings()).by_net["VMOT"]
    assert found.evidence[0].kind == "field"
    assert span(found) == (22.8, 24.0, 25.2)


# --------------------------------------------------------------------------------------------------------- regulators


def test_a_regulator_decides_over_the_name_it_agrees_with() -> None:
    found = rail("+3V3", ldo("+5V", "+3V3"), gate("+3V3"))
    assert [item.kind for item in found.evidence] == ["regulator", "name"]
    assert found.basis is Basis.LIBRARY
    assert found.fed_by == "+5V"
    assert not found.disagreement


def test_regulator_and_name_that_disagree_are_remarked_and_the_regulator_wins() -> None:
    rails = trace(ldo("+5V", "+3V3", "2.5"), gate("+3V3"), gate("+5V", 2))
    found = rails.by_net["+3V3"]
    assert span(found)[1] == 2.5
    assert "2.5 V" in found.disagreement
    assert "3.3 V" in found.disagreement
    (remark,) = rails.remarks
    assert (remark.kind, remark.net, remark.part) == ("conflict", "+3V3", "U8")


@pytest.mark.parametrize(("volts", "conflicts"), [("3.3", 0), ("3.0", 1), ("2.8", 1)])
def test_a_disagreement_begins_at_six_percent(volts: str, conflicts: int) -> None:
    assert len(trace(ldo("+5V", "+3V3", volts), gate("+3V3")).remarks) == conflicts


def test_a_dropout_and_an_input_over_its_maximum_are_remarked() -> None:
    low = trace(ldo("+3V3", "+3V0", "3.0"), gate("+3V3", 1), gate("+3V0", 2))
    assert [(remark.kind, remark.net, remark.part) for remark in low.remarks] == [("dropout", "+3V0", "U8")]
    high = trace(ldo("+12V", "+3V3"), gate("+12V", 1), gate("+3V3", 2))
    assert [(remark.kind, remark.net, remark.part) for remark in high.remarks] == [("input-range", "+12V", "U8")]
    assert not trace(ldo("+5V", "+3V3"), gate("+5V", 1), gate("+3V3", 2)).remarks


@pytest.mark.parametrize(
    ("name", "tolerance", "conflicts"),
    [
        ("+5.1V", 0.001, 0),  # 2 % apart: names are rounded
        ("+5.25V", 0.02, 0),  # 5 % apart, ranges touch
        ("+5.25V", 0.01, 1),  # 5 % apart, ranges do not touch
        ("+5.4V", 0.05, 1),  # 7 % apart, although ranges touch
        ("+5.4V", 0.1, 0),  # the wide range holds the other's usual value
    ],
)
def test_how_far_apart_contradicts(name: str, tolerance: float, conflicts: int) -> None:
    """The regulator makes 5 V +-3 %, that is 4.85 to 5.15 V."""
    settings = Settings(rail_tolerance=tolerance)
    remarks = trace(ldo("+5.8V", name, "5.0"), gate(name), settings=settings).remarks
    assert [remark.kind for remark in remarks] == ["conflict"] * conflicts


def test_a_switched_regulator_may_be_off_while_its_input_is_up() -> None:
    enabled = ldo("+5V", "+3V3") + " | 3 EN input {}"
    assert rail("+3V3", enabled.format("+5V"), gate("+3V3")).fed_by == "+5V"
    switched = gate("+5V", 2).replace("OUT2", "RUN")
    assert rail("+3V3", enabled.format("RUN"), switched, gate("+3V3")).fed_by == ""


# --------------------------------------------------------------------------------------------------- joints and feeds


@pytest.mark.parametrize(
    "part",
    [
        "L1 120R@100MHz Device:FerriteBead",
        "F1 500mA Device:Fuse",
        "R1 0R Device:R",
        "JP1 ~ Jumper:SolderJumper_2_Bridged",
        "NT1 ~ Device:NetTie_2",
    ],
)
def test_a_rail_goes_on_through_links_and_shares_its_domain(part: str) -> None:
    found = rail(
        "Net-(U2-VCC)", f"{part} | 1 - passive +5V | 2 - passive Net-(U2-VCC)", gate("+5V", 1), gate("Net-(U2-VCC)", 2)
    )
    assert span(found)[1] == 5.0
    assert found.domain == "+5V"
    assert found.evidence[0].kind == "upstream"
    assert part.split()[0] in found.evidence[0].text


def test_an_open_jumper_joins_nothing() -> None:
    found = trace(
        "JP1 ~ Jumper:SolderJumper_2_Open | 1 - passive +5V | 2 - passive +3V3", gate("+5V", 1), gate("+3V3", 2)
    )
    assert not found.remarks
    assert found.by_net["+3V3"].domain == "+3V3"


def test_two_names_joined_by_zero_ohm_disagree() -> None:
    (remark,) = trace("R1 0R Device:R | 1 - passive +5V | 2 - passive +3V3", gate("+5V", 1), gate("+3V3", 2)).remarks
    assert remark.kind == "conflict"
    assert "R1" in remark.text


def test_a_shunt_of_four_terminals_joins() -> None:
    shunt = "RS1 10m Device:R_Shunt | 1 - passive +5V | 2 - passive +5V | 3 - passive VLOAD | 4 - passive VLOAD"
    assert span(rail("VLOAD", shunt, gate("+5V", 1), gate("VLOAD", 2)))[1] == 5.0


def test_a_mode_pin_strapped_by_zero_ohm_is_no_rail() -> None:
    strap = "R1 0R Device:R | 1 - passive +3V3 | 2 - passive IN2"
    rails = trace(strap, gate("+3V3", 1), gate("+3V3", 2))
    assert "IN2" not in rails.by_net


@pytest.mark.parametrize(
    ("ohms", "extra", "nominal"),
    [
        ("10R", "", 3.3),
        ("549R", "C1 1u Device:C | 1 - passive VRTC | 2 - passive GND", 3.3),
        ("10k", "", 3.3),
        ("22k", "", None),  # a pull-up, no filter
        ("549R", "R9 1k Device:R | 1 - passive VRTC | 2 - passive IN1", 3.3),
    ],
)
def test_a_series_resistor_feeds_supply_pins(ohms: str, extra: str, nominal: float | None) -> None:
    clock = "U7 RTC Local:RTC | 1 VDD power_in VRTC | 2 GND power_in GND"
    rails = trace(
        f"R1 {ohms} Device:R | 1 - passive +3V3 | 2 - passive VRTC", clock, gate("+3V3"), *([extra] if extra else [])
    )
    found = rails.by_net.get("VRTC")
    assert (found.volts.nominal if found and found.volts else None) == nominal


def test_behind_a_larger_resistor_a_signal_pin_forbids_a_rail() -> None:
    reset = "R1 1k Device:R | 1 - passive +3V3 | 2 - passive IN1"
    assert "IN1" not in trace(reset, gate("+3V3"), cap("IN1")).by_net


@pytest.mark.parametrize(("ohms", "fed"), [("10R", True), ("11R", False)])
def test_beyond_ten_ohm_a_signal_pin_forbids_a_rail_even_with_a_supply_pin(ohms: str, fed: bool) -> None:
    clock = "U7 RTC Local:RTC | 1 VDD power_in N1 | 2 GND power_in GND"
    reads = "U6 74LVC1G04 74xGxx:74LVC1G04 | 2 A input N1 | 3 GND power_in GND | 5 VCC power_in +3V3"
    found = rail("N1", f"R1 {ohms} Device:R | 1 - passive +3V3 | 2 - passive N1", clock, reads)
    assert (found.volts is not None) is fed


def test_a_diode_takes_its_drop() -> None:
    schottky = rail(
        "VS", "D1 1N5819 Device:D_Schottky | 1 K passive VS | 2 A passive +5V", gate("VS", 1), gate("+5V", 2)
    )
    assert span(schottky) == (4.25, 4.7, 5.05)  # 4.75 - 0.5, 5 - 0.3, 5.25 - 0.2
    assert schottky.evidence[0].kind == "diode"
    silicon = rail("VS", "D1 1N4148 Device:D | 1 K passive VS | 2 A passive +5V", gate("VS", 1), gate("+5V", 2))
    assert span(silicon) == (3.75, 4.3, 4.65)  # 4.75 - 1, 5 - 0.7, 5.25 - 0.6


def test_two_diodes_make_a_range_over_both_sources() -> None:
    pair = "D1 BAT54C Diode:BAT54C | 1 - passive +5V | 2 - passive +3V3 | 3 - passive VS"
    found = rail("VS", pair, gate("VS", 1), gate("+5V", 2), gate("+3V3", 3))
    assert span(found) == (2.635, 4.7, 5.05)  # 3.135 - 0.5 up to 5.25 - 0.2
    assert "or from" in found.evidence[0].text
    assert found.fed_by == ""


def test_a_diode_blocks_backwards_and_a_led_feeds_nothing() -> None:
    back = "D1 1N5819 Device:D_Schottky | 1 K passive +5V | 2 A passive VX"
    assert rail("VX", back, gate("VX", 1), gate("+5V", 2)).volts is None
    led = "D1 GREEN Device:LED | 1 K passive VX | 2 A passive +5V"
    assert rail("VX", led, gate("VX", 1), gate("+5V", 2), "J1 x Connector:Conn_01x01 | 1 - passive VX").volts is None


def test_a_p_channel_switch_and_a_load_switch_pass_their_supply() -> None:
    fet = "Q1 AO3401A Device:Q_PMOS_GSD | 1 G input IN1 | 2 S passive +5V | 3 D passive VSW1"
    assert span(rail("VSW1", fet, gate("+5V", 1), gate("VSW1", 2)))[1] == 5.0
    switch = "U6 TPS22918 Local:TPS22918 | 1 VIN power_in +3V3 | 2 GND - GND | 3 ON input IN1 | 6 VOUT power_out VRADIO"
    found = rail("VRADIO", switch, gate("+3V3", 1), gate("VRADIO", 2))
    assert span(found)[1] == 3.3
    assert found.domain == "VRADIO"  # it can be off while its source is up


def test_an_n_channel_transistor_feeds_nothing() -> None:
    fet = "Q1 BSS138 Device:Q_NMOS_GSD | 1 G input IN1 | 2 S passive +5V | 3 D passive VX"
    assert rail("VX", fet, gate("+5V", 1), gate("VX", 2)).volts is None


def test_a_selector_that_says_its_position_gives_one_voltage() -> None:
    pads = "| 1 - passive +5V | 2 - passive VIO1 | 3 - passive +3V3"
    lines = (gate("+5V", 1), gate("+3V3", 2), gate("VIO1", 3))
    told = rail("VIO1", f"SEL Closed(2-3)/Opened(1-2) Pads:SJ2W {pads}", *lines)
    assert span(told)[1] == 3.3
    assert told.domain == "+3V3"


def test_a_selector_that_does_not_say_spans_both() -> None:
    pads = "| 1 - passive +5V | 2 - passive VIO1 | 3 - passive +3V3"
    found = rail("VIO1", f"JP1 ~ Jumper:SolderJumper_3_Open {pads}", gate("+5V", 1), gate("+3V3", 2), gate("VIO1", 3))
    assert span(found) == (3.135, 5.0, 5.25)
    assert found.basis is Basis.ASSUMED
    assert "+3V3" in found.evidence[0].text
    assert "+5V" in found.evidence[0].text


def test_a_header_to_the_outside_is_no_selector() -> None:
    header = "J1 out Connector:Conn_01x03 | 1 - passive +5V | 2 - passive VEXT | 3 - passive GND"
    assert rail("VEXT", header, gate("+5V", 1), gate("VEXT", 2)).volts is None


def test_a_chain_of_feeds_is_followed() -> None:
    chain = (
        "F1 1A Device:Fuse | 1 - passive VBUS | 2 - passive N1",
        "D1 1N5819 Device:D_Schottky | 1 K passive N2 | 2 A passive N1",
        ldo("N2", "N3"),
        "L1 600R/2A Device:L | 1 - passive N3 | 2 - passive N4",
    )
    usb = "J1 USB Connector:USB_B_Micro | 1 VBUS power_out VBUS | 5 GND power_out GND"
    rails = trace(*chain, usb, gate("N4", 1), cap("N2"))
    assert span(rails.by_net["N1"]) == (4.4, 5.0, 5.25)
    assert span(rails.by_net["N2"]) == (3.9, 4.7, 5.05)
    assert span(rails.by_net["N4"])[1] == 3.3
    assert rails.by_net["N4"].domain == "N3"
    assert rails.by_net["N4"].fed_by == "N2"


def test_a_part_that_is_not_fitted_feeds_nothing() -> None:
    absent = "R1 0R Device:R DNP | 1 - passive +5V | 2 - passive VX"
    assert rail("VX", absent, gate("+5V", 1), gate("VX", 2), "J1 x Connector:Conn_01x01 | 1 - passive VX").volts is None


# --------------------------------------------------------------------------------------------------- grounds, unknown


def test_grounds_joined_by_a_net_tie_are_one_domain_and_isolated_ones_are_told() -> None:
    rails = trace(
        gate("+3V3"),
        "NT1 ~ Device:NetTie_2 | 1 - passive GND | 2 - passive AGND",
        "U5 OPTO Isolator:PC817 | 1 - passive A | 2 - passive K | 3 E passive GND_ISO | 4 C passive OUT5",
    )
    assert rails.is_ground("GND")
    assert rails.is_ground("AGND")
    assert rails.by_net["AGND"].domain == rails.by_net["GND"].domain
    assert rails.is_ground("GND_ISO")
    assert rails.by_net["GND_ISO"].domain == "GND_ISO"
    assert "nothing joins it to GND" in rails.by_net["GND_ISO"].evidence[0].text


def test_a_supply_that_a_part_makes_for_itself_is_not_asked_for() -> None:
    inner = "U7 MCU Local:MCU | 1 VDD power_in +3V3 | 2 GND power_in GND | 3 VDDCORE power_in CORE"
    assert not trace(inner, gate("+3V3"), cap("CORE")).unknown


def test_an_unknown_supply_names_the_converter_that_makes_it() -> None:
    buck = "U5 XYZ9 Local:BUCK | 1 VIN power_in +12V | 2 GND power_in GND | 3 SW output SWN | 4 FB input FBN"
    coil = "L1 4u7 Device:L | 1 - passive SWN | 2 - passive VLOGIC"
    rails = trace(buck, coil, cap("VLOGIC", "22u"), gate("VLOGIC"), cap("+12V", "10u", 2))
    assert "SWN" not in rails.by_net
    ((net, settle),) = rails.unknown
    assert net == "VLOGIC"
    assert "U5" in settle


def test_nets_of_other_sheets_are_other_rails() -> None:
    rails = trace(
        gate("/A/VCC", 1), gate("/B/VCC", 2), "R1 0R Device:R | 1 - passive +5V | 2 - passive /A/VCC", cap("+5V")
    )
    assert span(rails.by_net["/A/VCC"])[1] == 5.0
    assert "/B/VCC" not in rails.by_net or rails.by_net["/B/VCC"].volts is None


def test_a_coin_cell_is_stronger_than_the_name_of_its_net() -> None:
    found = rail("VBAT", "BT1 CR2032 Device:Battery_Cell | 1 + passive VBAT | 2 - passive GND", gate("VBAT"))
    assert span(found) == (2.0, 3.0, 3.3)


def test_the_same_board_gives_the_same_rails() -> None:
    lines = (
        gate("+5V", 1),
        gate("VS", 2),
        "D1 1N5819 Device:D_Schottky | 1 K passive VS | 2 A passive +5V",
        ldo("VS", "+3V3"),
    )
    assert repr(trace(*lines)) == repr(trace(*lines))


# ----------------------------------------------------------------------------------------------------------- corners


def test_sides_of_a_shifter_board_without_integrated_circuits_are_asked_for() -> None:
    cell = (
        "Q1 BSS138 Device:Q_NMOS_GSD | 1 G input LV | 2 S passive A1 | 3 D passive B1",
        "R1 10k Device:R | 1 - passive LV | 2 - passive A1",
        "R2 10k Device:R | 1 - passive HV | 2 - passive B1",
        "J1 in Connector:Conn_01x03 | 1 - passive LV | 2 - passive A1 | 3 - passive GND",
        "J2 out Connector:Conn_01x03 | 1 - passive HV | 2 - passive B1 | 3 - passive GND",
    )
    rails = trace(*cell)
    assert [net for net, _ in rails.unknown] == ["HV", "LV"]
    assert {"A1", "B1"}.isdisjoint(rails.by_net)
    assert "R2" in dict(rails.unknown)["HV"]


def test_small_resistor_between_two_names_of_one_voltage_makes_one_domain() -> None:
    lines = (gate("+3V3", 1), gate("+3V3", 2), gate("3V3A", 3), "R1 10R Device:R | 1 - passive +3V3 | 2 - passive 3V3A")
    rails = trace(*lines)
    assert rails.by_net["3V3A"].domain == "+3V3"
    assert rails.by_net["+3V3"].domain == "+3V3"


def test_own_name_comes_first_where_it_says_the_same() -> None:
    rails = trace("L1 2u2 Device:L | 1 - passive +5V | 2 - passive +5F", gate("+5V", 1), gate("+5F", 2))
    assert rails.by_net["+5V"].evidence[0].text == "its name says 5 V"
    assert rails.by_net["+5F"].evidence[0].text == "its name says 5 V"


def test_what_feeds_a_named_rail_is_told_beside_its_name() -> None:
    found = rail("+5V", "D1 1N5819 Device:D_Schottky | 1 K passive +5V | 2 A passive VBUS", gate("+5V"), cap("VBUS"))
    assert [item.kind for item in found.evidence] == ["name", "diode"]
    assert "VBUS" in found.evidence[1].text
    assert not found.disagreement


def test_a_converter_without_data_still_tells_what_it_feeds_on() -> None:
    buck = "U5 XYZ9 Local:BUCK | 1 VIN power_in +12V | 2 GND power_in GND | 3 SW output SWN | 4 EN input {}"
    coil = "L1 4u7 Device:L | 1 - passive SWN | 2 - passive +3V3"
    lines = (coil, cap("+3V3", "22u"), gate("+3V3"))
    assert rail("+3V3", buck.format("+12V"), *lines).fed_by == "+12V"
    driven = gate("+12V", 2).replace("OUT2", "RUN")
    assert rail("+3V3", buck.format("RUN"), driven, *lines).fed_by == ""


def test_a_module_makes_its_output_from_its_supply() -> None:
    bridge = "U7 FT232RL Local:FT232RL | 17 3V3OUT power_out V33 | 7 GND power_in GND | 20 VCC power_in +5V"
    assert rail("V33", bridge, gate("+5V", 2), cap("V33")).fed_by == "+5V"


def test_diodes_in_both_directions_settle() -> None:
    pair = (
        "D1 1N5819 Device:D_Schottky | 1 K passive VA1 | 2 A passive VB1",
        "D2 1N5819 Device:D_Schottky | 1 K passive VB1 | 2 A passive VA1",
        "D3 1N5819 Device:D_Schottky | 1 K passive VA1 | 2 A passive +5V",
    )
    rails = trace(*pair, gate("VA1", 1), gate("VB1", 2), gate("+5V", 3))
    assert span(rails.by_net["VA1"]) == (4.25, 4.7, 5.05)
    assert span(rails.by_net["VB1"]) == (3.75, 4.4, 4.85)


def test_a_usb_power_delivery_controller_is_pointed_out() -> None:
    usb = "J1 USB Connector:USB_C_Receptacle | A4 VBUS power_out VIN1 | A1 GND power_out GND"
    asks = "U3 CH224K Local:CH224K | 1 VDD power_in VIN1 | 2 GND power_in GND"
    assert "CH224K" in rail("VIN1", usb, asks, gate("VIN1")).evidence[0].text
    assert "CH224K" not in rail("VIN1", usb, gate("VIN1")).evidence[0].text


def test_every_domain_and_every_unknown_net_is_a_rail() -> None:
    """Also where nets that are no rails (a strapped mode pin with more pins than the supply) stand in the group."""
    strap = "R1 0R Device:R | 1 - passive N1 | 2 - passive MODE"
    modes = [
        f"U{n} 74LVC1G04 74xGxx:74LVC1G04 | 2 A input MODE | 3 GND power_in GND | 5 VCC power_in +5V"
        for n in range(2, 7)
    ]
    feed = "R2 1R Device:R | 1 - passive +5V | 2 - passive N1"
    rails = trace(strap, *modes, feed, gate("N1"))
    assert "MODE" not in rails.by_net
    assert rails.by_net["N1"].domain in rails.by_net
    assert all(net in rails.by_net for net, _ in rails.unknown)
