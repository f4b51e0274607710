"""How a speed is told: at its load, as an interval, with what limits it."""

from __future__ import annotations

from dataclasses import replace

from levelcrossing.model import LineRate, Speed, Spread
from levelcrossing.reports.phrases import good_for

SPEED = Speed(
    rise_s=Spread.exactly(1e-7),
    fall_s=Spread.exactly(1e-8),
    delay_high_s=Spread.exactly(1e-7),
    delay_low_s=Spread.exactly(1e-8),
    usable_bit_s=1.93e6,
    nominal_bit_s=2.48e6,
    load_farads=15e-12,
    limit="the rise through R4 (10 kΩ)",
    loaded_bit_s=1.31e6,
    accuracy="to about 10 %",
    line=LineRate(needed_bit_s=400e3, why="the settings ask /SCL for it"),
)


def test_the_rate_is_stated_at_its_load_with_its_interval_and_its_sensitivity() -> None:
    assert good_for(SPEED) == (
        "good for 1.9 Mbit/s into 15 pF (2.5 Mbit/s at the usual values, 1.3 Mbit/s with 10 pF more), limited by the "
        "rise through R4 (10 kΩ); to about 10 %; must carry 400 kbit/s: the settings ask /SCL for it"
    )


def test_a_table_has_it_shorter() -> None:
    text = good_for(SPEED, brief=True)
    assert "must carry 400 kbit/s" in text and "settings" not in text and "10 %" not in text


def test_beyond_100_megabits_no_figure_is_claimed() -> None:
    """There the driver's own edge and the line decide, which the models leave out."""
    text = good_for(replace(SPEED, usable_bit_s=3.1e8, line=None))
    assert text == "good for more than 100 Mbit/s into 15 pF"
