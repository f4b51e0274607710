from __future__ import annotations

import pytest
from gauge_cells import SUPPLIES
from small_boards import case_of

from levelcrossing.scope import out_of_scope


@pytest.mark.parametrize(
    ("part", "word"),
    [
        ("PS1 HLK-PM01 Converter_ACDC:HLK-PM01 | 1 AC passive /AC_L | 2 AC passive /AC_N | 3 -Vo power_out GND | 4 +Vo power_out +5V", "mains"),
        ("U7 PC817 Isolator:PC817 | 1 - passive /A | 2 - passive GND | 3 - passive GND | 4 - passive /B", "isolation"),
        ("BT1 Battery_Cell Device:Battery_Cell | 1 + passive +BATT | 2 - passive GND", "batteries"),
    ],
)  # fmt: skip
def test_what_is_not_judged_is_said_with_its_sign(part: str, word: str) -> None:
    lines = out_of_scope(case_of(SUPPLIES + part + "\n"))
    assert any(line.split(": ", 1)[1].startswith(word) for line in lines)


def test_a_plain_logic_board_says_nothing_and_superspeed_lines_are_no_mains() -> None:
    text = SUPPLIES + "J2 USB_C Connector:USB_C | 1 SSRX+ passive /SSRXP1 | 2 SSRX- passive /SSRXN1\n"
    assert out_of_scope(case_of(text)) == ()
