from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES
from small_boards import case_of

TRANSCEIVER = (
    "U7 74LVC8T245PW Local:T245 | 1 VCCA power_in +3V3 | 23 VCCB power_in +5V | 11 GND power_in GND | 2 DIR input {dir}"
    " | 22 ~{{OE}} input GND | 3 A1 bidirectional /A | 21 B1 bidirectional /B\n"
)
ENDS = (
    "U1 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input {near_in} | 4 - output {near_out}\n"
    "U2 74HC1G14 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 2 - input {far_in} | 4 - output {far_out}\n"
)


@pytest.mark.parametrize(("tied", "driving", "reading"), [("+3V3", "21", "3"), ("GND", "3", "21")])
def test_a_tied_direction_pin_settles_both_sides(tied: str, driving: str, reading: str) -> None:
    """DIR high is A to B (SN74LVC8T245, function table)."""
    pins = case_of(
        SUPPLIES + TRANSCEIVER.format(dir=tied) + ENDS.format(near_in="GND", near_out="/A", far_in="/B", far_out="/Z")
    ).pins
    assert pins["U7", driving].drive is not None and pins["U7", driving].receive is None
    assert pins["U7", reading].drive is None and pins["U7", reading].receive is not None


@pytest.mark.parametrize("value", ["74LS245", "74HCT245", "74LVC245"])
@pytest.mark.parametrize(("tied", "driving", "reading"), [("+5V", "18", "2"), ("GND", "2", "18")])
def test_a_tied_direction_pin_settles_a_transceiver_of_any_family(
    value: str, tied: str, driving: str, reading: str
) -> None:
    """DIR high is A to B, and the enable beside it says nothing of direction (TI SN74HC245, function table)."""
    pins = case_of(
        SUPPLIES
        + f"U7 {value} 74xx:74LS245 | 20 VCC power_in +5V | 10 GND power_in GND | 1 A->B input {tied} | 19 CE input GND"
        " | 2 A0 tri_state /A | 18 B0 tri_state /B\n"
        + ENDS.format(near_in="/A", near_out="/A2", far_in="/B", far_out="/Z")
    ).pins
    assert pins["U7", driving].drive is not None and pins["U7", driving].receive is None
    assert pins["U7", reading].drive is None and pins["U7", reading].receive is not None


def test_a_driven_direction_pin_leaves_both_ways_open() -> None:
    pins = case_of(
        SUPPLIES + TRANSCEIVER.format(dir="/D") + ENDS.format(near_in="GND", near_out="/D", far_in="/B", far_out="/Z")
    ).pins
    assert pins["U7", "3"].drive is not None and pins["U7", "21"].drive is not None


def test_a_signal_through_a_translator_is_one_crossing_in_its_direction() -> None:
    text = (
        SUPPLIES + TRANSCEIVER.format(dir="+3V3") + ENDS.format(near_in="GND", near_out="/A", far_in="/B", far_out="/Z")
    )
    found = [solved.crossing for solved in case_of(text).crossings if solved.crossing.through]
    assert [
        (crossing.driver.part if crossing.driver else "", crossing.receiver.part, crossing.through)
        for crossing in found
    ] == [("U1", "U2", ("U7",))]
    assert found[0].condition == ""


def test_a_numbered_direction_pin_steers_its_own_channel_only() -> None:
    text = SUPPLIES + (
        "U9 SN74AVC4T774 Local:T774 | 1 VCCA power_in +3V3 | 2 VCCB power_in +3V3 | 8 GND power_in GND | 3 DIR1 input GND | 4 DIR2 input +3V3"
        " | 5 A1 bidirectional /A | 6 B1 bidirectional /B | 9 A2 bidirectional /C | 10 B2 bidirectional /D\n"
        "R1 10k Device:R | 1 - passive /A | 2 - passive /C\nR2 10k Device:R | 1 - passive /B | 2 - passive /D\n"
    )
    pins = case_of(text).pins
    assert pins["U9", "5"].receive is None and pins["U9", "9"].drive is None
