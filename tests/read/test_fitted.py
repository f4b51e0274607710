"""Which values, fields and flags mean "not fitted", and which only look like it."""

import pytest

from levelcrossing.read.fitted import fitting


def why(value="", symbol="Device:R", footprint="", description="", fields=(), flagged=False):
    return fitting(value, symbol, footprint, description, tuple(fields), flagged)[0]


@pytest.mark.parametrize(
    "value",
    [
        "NA",
        "NA(BSS138(SOT23-3))",
        "NA(10k/R0402)",
        "NA/R0402",
        "N/A",
        "DNP",
        "dnp",
        "DNP-10k",
        "DNP_0402",
        "10k DNP",
        "10k (DNP)",
        "10k/DNF",
        "R_DNP_0402",
        "DNF",
        "DNI",
        "NM",
        "NF",
        "NP",
        "NC",
        "100n (NF)",
        "no fit",
        "NoFit",
        "no-pop",
        "not fitted",
        "Not populated",
        "do not populate",
        "unpopulated",
    ],
)
def test_values_that_say_not_fitted(value):
    assert why(value) == f"its value is {value!r}"


@pytest.mark.parametrize(
    "value",
    [
        "10k",
        "~",
        "",
        "NAND",
        "NC7SZ125",
        "NF-123",
        "NP0",
        "100 NF",
        "22 nm",
        "NA-555",
        "TDNP1",
        "MC33269DT-3.3",
        "74LVC1G125",
        "NCP303LSN27T1G",
        "Closed(1-2)/Opened(2-3)",
        "dnpx",
    ],
)
def test_values_that_only_look_like_it(value):
    assert why(value) == ""


def test_normally_closed_is_not_unfitted():
    assert why("NC", symbol="Jumper:Jumper_2_Open") == ""
    assert why("NC", symbol="Switch:SW_Push") == ""
    assert why("DNP", symbol="Jumper:Jumper_2_Open") != ""


def test_the_flag_of_the_symbol_decides():
    assert why("10k", flagged=True) == "the symbol is marked 'do not populate'"
    assert why("DNF", symbol="Connector:Cartridge_Edge", flagged=True) != ""


def test_an_edge_connector_is_fitted_whatever_its_value_says():
    found = fitting("DNF", "own:Cartridge", "own:PCBEdge_1x32", "cartridge edge connector", (), False)
    assert found == ("", "has the value 'DNF' and was taken as fitted, being an edge connector")


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("DNP", "yes"),
        ("DNP", "DNP"),
        ("dnp", "1"),
        ("Do not populate", "x"),
        ("Fitted", "No"),
        ("Mounted", "false"),
        ("Populate", "DNP"),
        ("Config", "DNF"),
    ],
)
def test_fields_that_say_not_fitted(name, text):
    assert why("10k", fields=[(name, text)]) == f"its field {name} is {text!r}"


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("DNP", ""),
        ("DNP", "no"),
        ("DNP", "0"),
        ("Mounted", "Yes"),
        ("Mounted", ""),
        ("Config", "+debug"),
        ("Note", "DNP later?"),
    ],
)
def test_fields_that_do_not(name, text):
    assert why("10k", fields=[(name, text)]) == ""
