"""Published and computed figures about shifters, each found again by solving the circuit; the source stands beside it."""

from __future__ import annotations

import numpy as np
import pytest
from gauge_cells import SUPPLIES, resistor
from small_boards import BOOK, board_of, case_of, findings_of, named

from levelcrossing import devices as d
from levelcrossing.network import Network
from levelcrossing.solve import solve_dc


@pytest.mark.parametrize(("volts", "ohms"), [(5.0, 310.0), (3.3, 197.0), (2.5, 143.0), (1.8, 97.0)])
def test_pull_ups_of_a_pass_transistor_for_15_milliamperes(volts: float, ohms: float) -> None:
    """TI PCA9306-Q1 SCPS178C table 10-2: (VDPU - 0.35 V) / 15 mA, the low side at 0.35 V less the switch's drop."""
    facts = BOOK.part(board_of("U7 PCA9306D x:y | 1 GND power_in GND").parts[0])
    assert facts is not None and facts.translator is not None and facts.translator.switch_ohms is not None
    inside = facts.translator.switch_ohms
    network = Network(
        branches=(
            d.resistor("pull-up", "supply", "line", ohms),
            d.resistor("switch", "line", "low side", inside),
            d.resistor("driver", "low side", "0", 0.35 / 15e-3 - inside),
        ),
        fixed={"supply": volts},
    )
    solution = solve_dc(network)
    assert solution.volts["line"][0] == pytest.approx(0.35, abs=2e-3)
    assert (volts - solution.volts["line"][0]) / ohms == pytest.approx(15e-3, rel=5e-3)


def test_a_low_side_driver_sinks_both_pull_ups() -> None:
    """NXP AN10441 circuit, computed: 10 k at 3.3 V and 10 k at 5 V over a low of 0.4 V are 0.29 + 0.46 = 0.75 mA."""
    network = Network(
        branches=(
            d.resistor("R1", "3V3", "low side", 10e3),
            d.resistor("R2", "5V", "high side", 10e3),
            d.mosfet(
                "Q1", "high side", "3V3", "low side",
                {"threshold_volts": 1.3, "gain": 0.3, "polarity": 1.0, "cgs_farads": 0.0, "cgd_farads": 0.0, "cds_farads": 0.0},
            ),
            d.resistor("driver", "low side", "low", 1e-3),
        ),
        fixed={"3V3": 3.3, "5V": 5.0, "low": 0.4},
    )  # fmt: skip
    solution = solve_dc(network)
    assert abs(solution.branch_amps("driver")[0][0]) == pytest.approx(0.75e-3, rel=5e-3)


def test_a_pull_down_divides_the_pull_up_inside_a_txs0102() -> None:
    """TI TXS0102 SCES640: VOH = VCC RPD / (RPD + 10 k); 100 k at 3.3 V leave 3.00 V (computed)."""
    text = (
        SUPPLIES
        + "U8 AP2112K-1.8 Regulator_Linear:x | 1 VIN power_in +5V | 2 GND power_in GND | 5 VOUT power_out +1V8\n"
        "U7 TXS0102 Logic_LevelTranslator:x | 3 VCCA power_in +1V8 | 7 VCCB power_in +3V3 | 2 GND power_in GND"
        " | 6 OE input +1V8 | 5 A1 bidirectional /A | 8 B1 bidirectional /B\n"
        "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +1V8 | 3 GND power_in GND | 2 - input GND | 4 - output /A\n"
        "U2 74LVC1G17 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input /B | 4 - output /Y\n"
        + resistor("R1", "100k", "/B", "GND")
    )
    (found,) = [one for one in case_of(text).crossings if one.crossing.receiver.part == "U2" and one.crossing.driver]
    assert found.states["released"].receiver_volts.nominal == pytest.approx(3.0, abs=5e-3)


@pytest.mark.parametrize(("diode", "speaks"), [("BAT54", False), ("1N4148", True)])
def test_a_low_through_a_diode(diode: str, speaks: bool) -> None:
    """Over an output's 0.4 V a BAT54 leaves 0.72 V (passes 0.8 V), a 1N4148 1.1 V (fails); data sheets, computed."""
    text = (
        SUPPLIES + "U4 74LVC1G07 74xGxx:x | 5 VCC power_in +3V3 | 3 GND power_in GND | 2 - input GND | 4 - output /Z\n"
        "U2 74AHCT1G125 74xGxx:x | 5 VCC power_in +5V | 3 GND power_in GND | 1 - input GND | 2 - input /Q | 4 - output /Y\n"
        f"D1 {diode} Diode:{diode} | 1 K passive /K | 2 A passive /Q\n"
        + resistor("R2", "330", "/K", "/Z")  # 0.4 V at about 1 mA, as a rated output
        + resistor("R1", "4.7k", "+5V", "/Q")
    )
    assert bool(named(findings_of(text), "low-not-reached")) is speaks


def test_a_divider_s_greatest_level_at_5_percent() -> None:
    """1 k over 2 k at 5.25 V with 5 % parts: 3.615 V at most, above the 3.6 V that many parts bear (computed)."""
    corners = np.array([(a, b) for a in (0.95, 1.05) for b in (0.95, 1.05)]).T
    network = Network(
        branches=(d.resistor("R1", "5V", "x", 1e3 * corners[0]), d.resistor("R2", "x", "0", 2e3 * corners[1])),
        fixed={"5V": 5.25},
    )
    assert float(solve_dc(network).volts["x"].max()) == pytest.approx(3.615, abs=5e-4)
