import math

import numpy as np
import pytest

from levelcrossing import levels


@pytest.mark.parametrize(
    ("text", "supply", "volts"),
    [
        ("2.0", 5.0, 2.0),
        ("0.7*V", 5.0, 3.5),
        ("V-0.45", 1.8, 1.35),
        ("V + 0.5", 3.3, 3.8),
        ("0.42*(V-2)+1.0", 3.3, 1.546),
        ("min(V+3.6, 5.5)", 3.3, 5.5),
        ("min(V+3.6, 5.5)", 0.0, 3.6),
        ("max(0.2*V, 0.4)", 1.0, 0.4),
        ("-V/2", 5.0, -2.5),
        ("2*-V", 1.0, -2.0),
        ("1-2-3", 0.0, -4.0),
        ("8/4/2", 0.0, 1.0),
        ("(((V)))", 1.5, 1.5),
        (".5*V", 3.0, 1.5),
    ],
)
def test_an_expression_gives_its_voltage(text, supply, volts):
    assert math.isclose(levels.parse(text).at(supply), volts, abs_tol=1e-12)


def test_an_array_of_supplies_gives_an_array_of_levels():
    supplies = np.array([1.8, 3.3, 5.0])
    function = levels.parse("min(0.7*V, 2.0)").pieces[0][2]
    assert np.allclose(function(supplies), [1.26, 2.0, 2.0])
    assert levels.parse("2.0").pieces[0][2](supplies).shape == supplies.shape


@pytest.mark.parametrize(
    "text",
    [
        "",
        " ",
        "V V",
        "0.7V",
        "0.7*",
        "*V",
        "(V",
        "V)",
        "W",
        "v",
        "min(V)",
        "min V, 2",
        "__import__('os')",
        "V**2",
        "V.real",
        "1e400",
        "0.7*V; 2",
        "lambda: 1",
        "V" * 300,
        "(" * 150 + "V",
    ],
)
def test_what_is_no_expression_is_refused(text):
    with pytest.raises(levels.LevelError):
        levels.parse(text)


def test_pieces_are_chosen_by_supply_and_the_nearest_one_outside_all():
    level = levels.by_supply([((1.65, 1.95), "0.65*V"), ((2.7, 3.6), "2.0"), ((4.5, 5.5), "0.7*V")])
    assert level.at(1.8) == pytest.approx(1.17)
    assert level.at(3.3) == 2.0
    assert level.at(5.0) == pytest.approx(3.5)
    assert level.at(4.0) == 2.0  # 0.4 V above the second range, 0.5 V below the third
    assert "0.65*V (1.65..1.95 V)" in level.text


def test_what_is_left_when_the_supply_is_off():
    assert levels.at_zero(levels.parse("V+0.5")).at(3.3) == 0.5
    assert levels.at_zero(levels.parse("min(V+4.0, 5.5)")).at(5.0) == 4.0


def test_only_expressions_of_the_supply_depend_on_it():
    assert levels.depends_on_supply(levels.parse("V+0.3"))
    assert not levels.depends_on_supply(levels.parse("5.5"))
    assert not levels.depends_on_supply(levels.by_supply([((1.0, 2.0), "1.0"), ((2.0, 3.0), "2.0")]))
