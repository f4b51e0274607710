"""Every cell is solved; checks are closed forms or common practice, named beside each."""

from __future__ import annotations

import pytest
from gauge_cells import BIPOLAR_CELL, BUS, CONTROLLER, INVERTER_5V, MOSFET_PAIR, PULL_UPS, SUPPLIES, resistor
from small_boards import case_of

from levelcrossing.model import SolvedCrossing


def crossing(text: str, receiver: str, driver: str | None = None) -> SolvedCrossing:
    """Return the one solved crossing between two pins."""
    found = [
        solved
        for solved in case_of(text).crossings
        if f"{solved.crossing.receiver.part}.{solved.crossing.receiver.number}" == receiver
        and (
            driver is None
            or (solved.crossing.driver and f"{solved.crossing.driver.part}.{solved.crossing.driver.number}" == driver)
        )
    ]
    assert len(found) == 1, [solved.crossing.target for solved in found]
    return found[0]


def test_a_divider_gives_its_ratio_of_the_driver_s_level() -> None:
    """2 kΩ over 3 kΩ turns 5 V into 3.0 V (common practice; ratio of resistances)."""
    text = (
        SUPPLIES
        + CONTROLLER
        + INVERTER_5V.format(out="/Y")
        + resistor("R1", "2k", "/Y", "/A")
        + resistor("R2", "3k", "/A", "GND")
    )
    solved = crossing(text, "U1.6")
    assert solved.high is not None and solved.low is not None
    output = solved.crossing.driver.drive.high_ohms.nominal  # type: ignore[union-attr]
    assert solved.high.nominal == pytest.approx(5.0 * 3000 / (5000 + output), abs=1e-3)
    assert solved.high.nominal == pytest.approx(3.0, abs=0.05)
    assert solved.low.nominal == pytest.approx(0.0, abs=1e-6)
    assert solved.crossing.shifter.kind == "divider"


def test_a_divider_s_extremes_take_supply_and_both_resistors_to_their_ends() -> None:
    """Closed form: the greatest level is at the greatest supply, least series and greatest ground resistor."""
    text = (
        SUPPLIES
        + CONTROLLER
        + INVERTER_5V.format(out="/Y")
        + resistor("R1", "2k", "/Y", "/A")
        + resistor("R2", "3k", "/A", "GND")
    )
    solved = crossing(text, "U1.6")
    drive = solved.crossing.driver.drive  # type: ignore[union-attr]
    assert solved.high is not None and drive is not None
    greatest = 5.25 * 3030 / (3030 + 1980 + drive.high_ohms.low)
    assert solved.high.high == pytest.approx(greatest, abs=2e-3)


@pytest.mark.parametrize(("driver", "receiver", "rail"), [("U3.5", "U1.18", 3.3), ("U1.18", "U3.5", 5.0)])
def test_the_mosfet_pair_passes_levels_both_ways(driver: str, receiver: str, rail: float) -> None:
    """N channel, gate and source side at 3.3 V, 10 kΩ pull-ups (NXP AN10441; common practice)."""
    solved = crossing(BUS + PULL_UPS + MOSFET_PAIR, receiver, driver)
    assert solved.high is not None and solved.low is not None
    assert solved.high.nominal == pytest.approx(rail, rel=0.01)
    assert solved.low.high < 0.4
    assert solved.crossing.shifter.kind == "mosfet-pass" and solved.crossing.two_way


@pytest.mark.parametrize(("driver", "receiver", "rail"), [("U3.5", "U1.18", 3.3), ("U1.18", "U3.5", 5.0)])
def test_the_bipolar_cell_passes_levels_both_ways(driver: str, receiver: str, rail: float) -> None:
    """Base through 1 kΩ to 3.3 V, 10 kΩ pull-ups (common practice)."""
    solved = crossing(BUS + PULL_UPS + BIPOLAR_CELL.format(base="+3V3"), receiver, driver)
    assert solved.high is not None and solved.low is not None
    assert solved.high.nominal == pytest.approx(rail, rel=0.01)
    assert solved.low.high < 0.8


def test_a_reversed_mosfet_lifts_the_low_side_through_its_body_diode() -> None:
    reversed_pair = MOSFET_PAIR.replace("2 S passive /SDA |", "2 S passive /SDA5 |").replace(
        "3 D passive /SDA5\n", "3 D passive /SDA\n"
    )
    solved = crossing(BUS + PULL_UPS + reversed_pair, "U1.18", "U3.5")
    assert solved.high is not None
    # Two 10 kΩ from 5 V and 3.3 V with a diode between: about (5 - 0.6 + 3.3) / 2 (closed form).
    assert solved.high.nominal == pytest.approx((5 - 0.6 + 3.3) / 2, abs=0.1)


def test_without_a_pull_up_the_low_side_floats_and_no_high_is_claimed() -> None:
    without = "\n".join(line for line in PULL_UPS.splitlines() if not line.startswith("R5")) + "\n"
    solved = crossing(BUS + without + MOSFET_PAIR, "U1.18", "U3.5")
    assert solved.states["released"].floating
    assert solved.states["released"].high_margin is None


def test_an_open_level_is_judged_without_the_receiver_s_own_clamp() -> None:
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", "10k", "/Y", "/A")
    state = crossing(text, "U1.6").states["high"]
    assert state.open_volts.nominal == pytest.approx(5.0, abs=0.01)
    assert state.receiver_volts.nominal < 4.1
    # Current by the clamp: (5 - 3.3 - about 0.65) / 10 kΩ (closed form).
    assert state.clamp_amps.nominal == pytest.approx((5 - state.receiver_volts.nominal) / 10e3, rel=0.02)


def test_margins_name_their_corner() -> None:
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/A")
    margin = crossing(text, "U1.6").states["high"].rating_margin
    assert margin is not None and margin.spread.nominal < 0
    assert "+5V at 5.25 V" in margin.worst_corner and "+3V3 at 3.23 V" in margin.worst_corner


def test_a_missing_value_is_said_and_not_guessed() -> None:
    text = SUPPLIES + CONTROLLER + INVERTER_5V.format(out="/Y") + resistor("R1", "see_note", "/Y", "/A")
    solved = crossing(text, "U1.6")
    assert "R1" in solved.why
    assert not any(state.solved for state in solved.states.values())


def test_two_signals_that_meet_in_a_transistor_are_taken_in_every_combination() -> None:
    """The usual reset circuit of a serial adapter: each output alone would look like a bad driver (common practice)."""
    adapter = "U5 CH340G Interface_USB:CH340G | 16 VCC power_in +5V | 1 GND power_in GND | 13 ~{DTR} output /DTR | 14 ~{RTS} output /RTS\n"
    gate = "Q1 MMBT3904 Transistor_BJT:MMBT3904 | 1 B input /QB | 2 E passive /RTS | 3 C passive /RST\n"
    logic = (
        "U4 74LVC1G17 74xGxx:74LVC1G17 | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /RST | 4 - output /Z\n"
    )
    text = (
        SUPPLIES + adapter + gate + logic + resistor("R1", "10k", "/DTR", "/QB") + resistor("R2", "10k", "+3V3", "/RST")
    )
    solved = crossing(text, "U4.2", "U5.13")
    assert len(solved.states) == 4
    for state in solved.states.values():
        margins = [margin for margin in (state.high_margin, state.low_margin) if margin is not None]
        assert len(margins) == 1 and margins[0].spread.nominal > 0, state.state


@pytest.mark.parametrize("net", ["/0", "/Q"])
@pytest.mark.parametrize("value", ["TXS0104E", "LSF0204", "PCA9306"])
def test_a_pass_translator_passes_its_lower_supply_and_no_more(value: str, net: str) -> None:
    """TI TXS0104E SCES651, LSF0204 SLVSCP5: the gate is biased from the low side; the high side's 5 V stay there."""
    names = {
        "TXS0104E": ("VCCA", "VCCB", "A1", "B1", "8 OE input +3V3"),
        "LSF0204": ("Vref_A", "Vref_B", "A1", "B1", "8 EN input +3V3"),
        "PCA9306": ("VREF1", "VREF2", "SDA1", "SDA2", "8 EN input +5V"),
    }[value]
    case = case_of(
        SUPPLIES
        + INVERTER_5V.format(out=net)
        + f"U7 {value} Logic_LevelTranslator:x | 1 {names[0]} power_in +3V3 | 14 {names[1]} power_in +5V"
        f" | 7 GND power_in GND | {names[4]} | 2 {names[2]} bidirectional /A | 13 {names[3]} bidirectional {net}\n"
        + CONTROLLER
        + resistor("R1", "10k", "+3V3", "/A")
    )
    (found,) = [
        solved
        for solved in case.crossings
        if solved.crossing.receiver.part == "U1" and solved.crossing.driver and solved.crossing.driver.part == "U2"
    ]
    high = found.states["high"].receiver_volts
    assert high.nominal == pytest.approx(3.3, abs=0.02)
    assert high.low > 3.2 and high.high < 3.4
