"""The small sheets: each function draws one project that shows one rule of connectivity.

The first drawing is the root. What KiCad 9.0.2 exports for each stands in expected.json, net by net;
``python cases.py`` draws the sheets anew into this folder.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent))
from draw import Drawing

CASES: dict[str, Callable[[str], list[Drawing]]] = {}


def case(draw: Callable[[str], list[Drawing]]) -> Callable[[str], list[Drawing]]:
    CASES[draw.__name__] = draw
    return draw


def _pair(name: str, **more: int) -> tuple[Drawing, Drawing]:
    return Drawing(name, **more), Drawing(f"{name}_below", number=2, **more)


@case
def tee_without_dot(name: str) -> list[Drawing]:
    """A wire that ends on another's middle without a dot does not join it; with the wires split at a dot it does."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).wire((5, 0), (5, 5)).tp(("TP1", 0, 0), ("TP2", 10, 0), ("TP3", 5, 5))
    sheet.wire((0, 10), (5, 10), (10, 10)).wire((5, 10), (5, 15)).dot(5, 10)
    return [sheet.tp(("TP4", 0, 10), ("TP5", 10, 10), ("TP6", 5, 15))]


@case
def dot_on_whole_wires(name: str) -> list[Drawing]:
    """A dot joins nothing by itself where the wires under it are not split."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).wire((5, -5), (5, 5)).dot(5, 0)
    return [sheet.tp(("TP1", 0, 0), ("TP2", 5, 5))]


@case
def label_on_middle(name: str) -> list[Drawing]:
    """A label on a wire's middle names it, also on a slanted one and without a dot."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).label("MID", 5, 0).tp(("TP1", 0, 0))
    sheet.wire((0, 5), (5, 5)).label("MID", 0, 5).tp(("TP2", 5, 5))
    return [sheet.wire((0, 8), (4, 12)).label("SLANT", 2, 10).tp(("TP3", 4, 12))]


@case
def label_in_company(name: str) -> list[Drawing]:
    """A label on a wire's middle does not reach it when a pin, a cross or another label stands at its point."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).label("PIN", 5, 0).tp(("TP1", 0, 0), ("TP2", 5, 0))
    sheet.wire((0, 5), (10, 5)).label("ONE", 5, 5).glob("TWO", 5, 5).tp(("TP3", 0, 5))
    sheet.wire((0, 10), (10, 10)).label("NOT", 5, 10).cross(5, 10).tp(("TP4", 0, 10))
    return [sheet.wire((0, 15), (10, 15)).label("DOT", 5, 15).dot(5, 15).tp(("TP5", 0, 15))]


@case
def pin_on_end_and_middle(name: str) -> list[Drawing]:
    """A pin connects at a wire's end, not on its middle; pins on one point connect with each other."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).tp(("TP1", 0, 0), ("TP2", 5, 0), ("TP3", 10, 0))
    return [sheet.tp(("TP4", 0, 5), ("TP5", 0, 5))]


@case
def crossing_wires(name: str) -> list[Drawing]:
    """Wires that cross or overlap do not connect, wires that meet at their ends do."""
    sheet = Drawing(name).wire((0, 0), (10, 0)).wire((5, -5), (5, 5)).tp(("TP1", 0, 0), ("TP2", 5, 5))
    sheet.wire((20, 0), (30, 0)).wire((25, 0), (35, 0)).tp(("TP3", 20, 0), ("TP4", 35, 0))
    return [sheet.wire((20, 5), (25, 5), (25, 10)).tp(("TP5", 20, 5), ("TP6", 25, 10))]


@case
def power_symbols(name: str) -> list[Drawing]:
    """A power symbol names its net by its value, on all sheets; it does not connect on a wire's middle."""
    sheet, below = _pair(name)
    sheet.wire((0, 0), (5, 0)).part("own:VCC", "#PWR01", 0, 0, value="+5V").tp(("TP1", 5, 0))
    sheet.wire((0, 5), (10, 5)).part("own:VCC", "#PWR02", 5, 5, value="+3V3").tp(("TP2", 0, 5))
    sheet.wire((0, 8), (5, 8)).label("+5V", 0, 8).tp(("TP3", 5, 8)).sheet("below", below, 20, 0, [])
    below.wire((0, 0), (5, 0)).part("own:VCC", "#PWR03", 0, 0, value="+5V").tp(("TP4", 5, 0))
    below.label("+5V", 0, 5).tp(("TP5", 0, 5)).part("own:VCC", "#PWR04", 0, 8, value="A/B").tp(("TP6", 0, 8))
    return [sheet, below]


@case
def power_symbol_of_kicad_6(name: str) -> list[Drawing]:
    """Until KiCad 7 a power symbol names its net by its pin, whatever its value says."""
    sheet = Drawing(name, version=20211123)
    return [sheet.part("own:VCC", "#PWR01", 0, 0, value="+5V").tp(("TP1", 0, 0))]


@case
def power_flag(name: str) -> list[Drawing]:
    """A power flag names nothing, but its net is no lone pin."""
    sheet = Drawing(name).part("own:FLAG", "#FLG01", 0, 0).tp(("TP1", 0, 0)).part("own:NP", "NP1", 5, 5)
    return [sheet.part("own:FLAG", "#FLG02", 5, 5)]


@case
def hidden_supply(name: str) -> list[Drawing]:
    """Hidden supply pins are on the nets of their names, which are global and beat local labels on their wires."""
    sheet, below = _pair(name)
    sheet.part("own:IC", "U1", 0, 0).part("own:IC", "U1", 0, 5, unit=2).wire((1, 1), (4, 1)).label("LOCAL", 4, 1)
    sheet.tp(("TP1", 4, 1)).part("own:VCC", "#PWR01", 10, 0, value="VCC").tp(("TP2", 10, 0))
    sheet.label("VCC", 10, 5).tp(("TP3", 10, 5)).sheet("below", below, 20, 0, [])
    below.part("own:IC", "U2", 0, 0).label("VCC", 10, 5).tp(("TP4", 10, 5))
    return [sheet, below]


@case
def strongest_name(name: str) -> list[Drawing]:
    """Of several names a global label wins over power, power over local, local over hierarchical; else the alphabet."""
    sheet = Drawing(name)
    rows = [("label ZED", "label ABC"), ("label AAA", "global_label ZZZ"), ("label ABB", "hierarchical_label AAB")]
    for row, (one, other) in enumerate(rows):
        sheet.wire((0, row * 3), (5, row * 3)).tp((f"TP{row + 1}", 0, row * 3))
        for x, (kind, text) in ((2, one.split()), (4, other.split())):
            sheet.label(text, x, row * 3, kind)
    sheet.wire((0, 12), (5, 12)).glob("VBUS", 3, 12).part("own:VCC", "#PWR01", 5, 12, value="+5V").tp(("TP5", 0, 12))
    sheet.wire((0, 15), (5, 15)).part("own:VCC", "#PWR02", 0, 15, value="+3V3")
    return [sheet.part("own:VCC", "#PWR03", 5, 15, value="+1V8").tp(("TP6", 5, 15))]


@case
def all_names_join(name: str) -> list[Drawing]:
    """Every name on a net joins it to the nets of that name on its sheet; second global names do so on all sheets."""
    sheet, below = _pair(name)
    sheet.wire((0, 0), (5, 0)).label("ONE", 2, 0).label("TWO", 4, 0).tp(("TP1", 0, 0))
    sheet.label("ONE", 0, 2).tp(("TP2", 0, 2)).label("TWO", 0, 4).tp(("TP3", 0, 4))
    sheet.wire((0, 8), (5, 8)).glob("GA", 2, 8).glob("GB", 4, 8).tp(("TP4", 0, 8)).sheet("below", below, 20, 0, [])
    below.glob("GB", 0, 0).tp(("TP5", 0, 0)).label("ONE", 0, 2).tp(("TP6", 0, 2))
    return [sheet, below]


@case
def names_of_pins(name: str) -> list[Drawing]:
    """Nets without a label are named after a pin: its name, its number where that is no name or not the only one."""
    sheet = Drawing(name).part("own:NP", "U1", 0, 0).part("own:R", "R1", 0, 1).part("own:TWIN", "U2", 10, 0)
    sheet.wire((10, 0), (10, 3)).tp(("TP1", 10, 3)).wire((13, 0), (13, 3)).tp(("TP2", 13, 3))
    sheet.part("own:IC", "U3", 10, 8).part("own:IC", "U3", 10, 12, unit=2).part("own:NP", "U4", 20, 0)
    return [sheet.wire((10, 8), (10, 12)).wire((13, 8), (16, 8)).part("own:R", "R2", 16, 9)]


@case
def no_connects(name: str) -> list[Drawing]:
    """A cross marks a lone pin as unused; a pin of type no_connect connects to nothing."""
    sheet = Drawing(name).tp(("TP1", 0, 0)).cross(0, 0).part("own:NCP", "U1", 5, 0)
    sheet.part("own:NCP", "U2", 10, 0).wire((10, 0), (12, 0)).tp(("TP2", 12, 0))
    sheet.wire((0, 5), (5, 5)).cross(5, 5).label("NAMED", 2, 5).tp(("TP3", 0, 5))
    return [sheet.tp(("TP4", 0, 10), ("TP5", 0, 10)).cross(0, 10)]


@case
def stacked_pins(name: str) -> list[Drawing]:
    """Pins of one number or at one point: the number may be on two nets, the point is one net."""
    return [Drawing(name).part("own:STACK", "U1", 0, 0).part("own:R", "R1", 3, 1)]


@case
def turned_and_mirrored(name: str) -> list[Drawing]:
    """Where the pins of a lopsided symbol land in each of its twelve positions."""
    sheet = Drawing(name)
    spots = [(0, 1), (0, -1), (1, 0), (-1, 0)]
    spots += [(a, b) for a in (-2, -1, 1, 2) for b in (-2, -1, 1, 2) if abs(a) != abs(b)]
    count = 0
    for row, mirror in enumerate(("", "x", "y")):
        for column, angle in enumerate((0, 90, 180, 270)):
            x, y = column * 8, row * 8
            count += 1
            sheet.part("own:L", f"L{count}", x, y, angle=angle, mirror=mirror)
            for dx, dy in spots:
                sheet.label(f"{mirror or 'o'}{angle}_{dx}_{dy}", x + dx, y + dy)
    return [sheet]


@case
def body_styles(name: str) -> list[Drawing]:
    """The pins of the chosen body style count, not those of the other."""
    sheet = Drawing(name).part("own:TWICE", "K1", 0, 0).part("own:TWICE", "K2", 0, 10, more="(convert 2)")
    for reference, y in (("K1", 0), ("K2", 10)):
        sheet.label(f"{reference}_LOW", 0, y).label(f"{reference}_HIGH", 0, y - 1)
    return [sheet]


@case
def pin_alternates(name: str) -> list[Drawing]:
    """A chosen alternate gives the pin another name and type."""
    sheet = Drawing(name).part("own:ALT", "U1", 0, 0, more='(pin "1" (alternate "TX")) (pin "2")')
    return [sheet.part("own:ALT", "U2", 0, 5).wire((0, 0), (0, 5)).wire((3, 0), (3, 5))]


@case
def own_versions_of_symbols(name: str) -> list[Drawing]:
    """A sheet may have its own version of a library symbol (lib_name), drawn otherwise."""
    return [Drawing(name).part("own:TP", "TP1", 0, 0, lib_name="TP_1").label("MOVED", 2, 0).label("AT", 0, 0)]


@case
def net_tie(name: str) -> list[Drawing]:
    """A net tie keeps its nets apart."""
    sheet = Drawing(name).part("own:TIE", "NT1", 1, 0).label("GND", 0, 0).label("AGND", 2, 0)
    return [sheet.tp(("TP1", 0, 0), ("TP2", 2, 0))]


@case
def not_on_board(name: str) -> list[Drawing]:
    """Parts kept off the board are in no net and name none; not fitted ones stay."""
    sheet = Drawing(name).part("own:TP", "TP1", 0, 0, flags="(in_bom yes) (on_board no) (dnp no)")
    sheet.part("own:TP", "TP2", 0, 0, flags="(in_bom no) (on_board yes) (dnp yes)")
    return [sheet.tp(("TP3", 0, 0))]


@case
def fields_and_flags(name: str) -> list[Drawing]:
    """Values, fields with variables, flags, units that tell different fields, and a sheet box with a field."""
    sheet, below = _pair(name)
    sheet.part("own:R", "R1", 0, 0, value="4k7", fields={"MPN": "RC-${VALUE}", "Empty": "", "Dash": "~"})
    sheet.part("own:R", "R2", 5, 0, value="${MPN}", fields={"MPN": "R-1", "Fit": "${R1:VALUE} beside ${REFERENCE}"})
    sheet.part("own:R", "R3", 10, 0, value="0R", flags="(in_bom yes) (on_board yes) (dnp yes)")
    sheet.part("own:IC", "U1", 0, 8, unit=2, value="74HC00", fields={"B": "from two", "C": "two"})
    sheet.part("own:IC", "U1", 0, 12, value="74HC00", fields={"A": "from one", "C": ""}).sheet(
        "below", below, 20, 0, []
    )
    below.part("own:R", "R4", 0, 0, value="${SHEETNAME}", fields={"Description": "pulls ${SHEETPATH} up"})
    return [sheet, below]


@case
def names_with_marks(name: str) -> list[Drawing]:
    """Slashes are written {slash}; bars, blanks, quotes, backslashes and unknown variables stay."""
    sheet = Drawing(name)
    for row, text in enumerate(("A/B", "A{slash}B", "C d ~{E}", "${NOPE}", 'quote\\"d', "back\\\\slash", "tail\\\\")):
        sheet.label(text, 0, row * 2).tp((f"TP{row + 1}", 0, row * 2))
    return [sheet.glob("G/H", 0, 20).tp(("TP20", 0, 20))]


@case
def escaped_letters(name: str) -> list[Drawing]:
    """Letters that KiCad keeps out of its files are written in braces; in net names only the slash stays so."""
    sheet = Drawing(name)
    texts = (
        "a{lt}b{gt}",
        "{dblquote}{space}{colon}",
        "{brace}",
        "x{y",
        "a{tilde}b",
        "{slash}x{backslash}",
        "[x]",
        "^{a b}",
    )
    for row, text in enumerate((*texts, " lead", "trail ", "two\\nlines", "@{1+1}", "é Ω")):
        sheet.label(text, 0, row * 2).tp((f"TP{row + 1}", 0, row * 2))
    sheet.bus((20, 0), (24, 0)).label("D{slash}[0..1]", 21, 0).label("D{slash}0", 21, 4).tp(("TP97", 21, 4))
    return [sheet.part("own:VCC", "#PWR01", 10, 5, value="v{lt}w").tp(("TP98", 10, 5))]


@case
def flags_of_sheets(name: str) -> list[Drawing]:
    """A sheet that is not fitted or not on the board makes its parts so; a sheet may lack a name."""
    sheet = Drawing(name)
    drawings = [sheet]
    for row, (box, flag) in enumerate((("bare", "(dnp no)"), ("off", "(on_board yes)"), ("", ""))):
        below = Drawing(f"{name}_below{row}", number=row + 2)
        y = row * 12
        sheet.sheet(box, below, 20, y, [("A", "input", 20, y + 2)]).wire((15, y + 2), (20, y + 2))
        sheet.tp((f"TP{row + 1}", 15, y + 2))
        if flag:
            other = flag.replace("no", "yes") if "no" in flag else flag.replace("yes", "no")
            sheet.items = [item.replace(flag, other) if f'"{box}"' in item else item for item in sheet.items]
        below.hier("A", 0, 0).tp((f"TP{row + 11}", 0, 0)).label("LOCAL", 0, 3).tp((f"TP{row + 21}", 0, 3))
        drawings.append(below)
    return drawings


@case
def odd_references(name: str) -> list[Drawing]:
    """A part whose reference starts with # is in no net, yet may name one; a part without a number names none."""
    sheet = Drawing(name).wire((0, 0), (5, 0)).part("own:TP", "#TP9", 0, 0).tp(("TP10", 5, 0))
    return [sheet.wire((0, 5), (5, 5)).part("own:R", "R?", 0, 6).part("own:R", "R1", 5, 6)]


@case
def text_variables(name: str) -> list[Drawing]:
    """Labels may hold variables: of the sheet and of the project."""
    sheet, below = _pair(name)
    sheet.label("R_${SHEETNAME}", 0, 0).tp(("TP1", 0, 0)).sheet("below", below, 20, 0, [])
    below.label("S_${SHEETNAME}", 0, 0).tp(("TP2", 0, 0)).label("${SHEETPATH}", 0, 5).tp(("TP3", 0, 5))
    return [sheet, below]


@case
def sheet_pins(name: str) -> list[Drawing]:
    """A sheet pin meets the hierarchical label of its text below; the letters' case counts."""
    sheet, below = _pair(name)
    sheet.sheet(
        "below",
        below,
        20,
        0,
        [("A", "input", 20, 1), ("B", "output", 20, 4), ("NONE", "input", 20, 7), ("x", "input", 20, 10)],
    )
    sheet.wire((15, 1), (20, 1)).tp(("TP1", 15, 1)).wire((15, 4), (20, 4)).label("TOP", 17, 4)
    sheet.tp(("TP2", 15, 4), ("TP3", 20, 7), ("TP4", 20, 10)).label("NONE", 0, 0).tp(("TP5", 0, 0))
    for row, text in enumerate(("A", "B", "X")):
        below.hier(text, 0, row * 3).wire((0, row * 3), (5, row * 3)).tp((f"TP{row + 11}", 5, row * 3))
    return [sheet, below]


@case
def sheet_pin_on_middle(name: str) -> list[Drawing]:
    """A sheet pin connects on a wire's middle like a label, and two pins of a sheet may be wired to each other."""
    sheet, below = _pair(name)
    sheet.sheet("below", below, 20, 0, [("A", "input", 20, 2), ("B", "input", 20, 6), ("C", "output", 20, 8)])
    sheet.wire((20, 1), (20, 3)).tp(("TP1", 20, 1)).wire((20, 6), (18, 6), (18, 8), (20, 8)).tp(("TP2", 18, 6))
    for row, text in enumerate("ABC"):
        below.hier(text, 0, row * 3).tp((f"TP{row + 11}", 0, row * 3))
    return [sheet, below]


@case
def reused_sheet(name: str) -> list[Drawing]:
    """A sheet used twice has other references and other local nets each time."""
    sheet, below = _pair(name)
    for row, box in enumerate(("left", "right")):
        sheet.sheet(box, below, 20, row * 12, [("IN", "input", 20, row * 12 + 2)])
        sheet.wire((15, row * 12 + 2), (20, row * 12 + 2)).tp((f"TP{row + 1}", 15, row * 12 + 2))
    sheet.label("FEED", 16, 2)
    below.hier("IN", 0, 0).tp((["TP11", "TP21"], 0, 0)).label("INNER", 0, 5).tp((["TP12", "TP22"], 0, 5))
    below.part("own:VCC", ["#PWR01", "#PWR02"], 0, 10, value="VCC").tp((["TP13", "TP23"], 0, 10))
    return [sheet, below.part("own:IC", ["U1", "U2"], 10, 5)]


@case
def units_over_uses(name: str) -> list[Drawing]:
    """The uses of a sheet may hold different units of one part."""
    sheet, below = _pair(name)
    sheet.sheet("left", below, 20, 0, []).sheet("right", below, 20, 12, [])
    below.part("own:IC", ["U1", "U1"], 0, 0, units=[1, 2]).label("IN", 0, 0)
    return [sheet, below]


@case
def three_levels(name: str) -> list[Drawing]:
    """Across sheets the name nearest the root wins, but a local label over a hierarchical one, and anything global."""
    sheet, below = _pair(name)
    deep = Drawing(f"{name}_deep", number=3)
    texts = ("A", "B", "C", "P")
    pins = [(text, "input", 20.0, row * 3.0 + 1) for row, text in enumerate(texts)]
    sheet.sheet("one", below, 20, 0, pins).wire((15, 1), (20, 1)).label("TOP", 16, 1)
    sheet.wire((15, 10), (20, 10)).part("own:VCC", "#PWR01", 15, 10, value="+9V").wire((15, 4), (20, 4))
    below.sheet("in", deep, 20, 0, pins).label("MIDDLE", 16, 7)
    for row, text in enumerate(texts):
        y = row * 3 + 1
        below.wire((10, y), (20, y)).hier(text, 10, y)
        deep.wire((0, y), (5, y)).hier(text, 0, y).tp((f"TP{row + 1}", 5, y))
    deep.label("LOW", 3, 4).part("own:VCC", "#PWR02", 5, 10, value="+7V")
    return [sheet, below, deep.part("own:VCC", "#PWR03", 0, 20, value="+7V").tp(("TP9", 0, 20))]


def _bus_pair(
    name: str, above: str, pin: str, wires: tuple[str, ...], inner: tuple[str, ...], label: str = ""
) -> tuple[Drawing, Drawing]:
    sheet, below = _pair(name)
    sheet.sheet("below", below, 20, 0, [(pin, "input", 20, 5)]).bus((0, 5), (20, 5))
    if above:
        sheet.label(above, 1, 5)
    below.bus((0, 5), (20, 5)).hier(pin, 20, 5)
    if label:
        below.label(label, 1, 5)
    for drawing, texts, first in ((sheet, wires, 1), (below, inner, 11)):
        for index, text in enumerate(texts):
            x = 4 + index * 2
            drawing.entry(x, 5).wire((x + 1, 6), (x + 1, 9)).label(text, x + 1, 7).tp((f"TP{first + index}", x + 1, 9))
    return sheet, below


@case
def bus_renamed_through_sheet_pin(name: str) -> list[Drawing]:
    """Members of a vector meet by position, whatever their names and the order of the bounds."""
    return list(_bus_pair(name, "D[5..4]", "A[0..1]", ("D4", "D5"), ("A0", "A1")))


@case
def bus_groups(name: str) -> list[Drawing]:
    """Members of a group meet by name, whatever the group is called; nested vectors take part."""
    return list(_bus_pair(name, "MEM{D[0..1] CK}", "M{D[0..1] CK}", ("MEM.D1", "MEM.CK"), ("M.D1", "M.CK")))


@case
def bus_groups_that_differ(name: str) -> list[Drawing]:
    """Groups without common members do not meet."""
    return list(_bus_pair(name, "BUS{DA CL}", "I2C{SDA SCL}", ("BUS.DA", "BUS.CL"), ("I2C.SDA", "I2C.SCL")))


@case
def bus_alias(name: str) -> list[Drawing]:
    """An alias in braces stands for its members."""
    sheet, below = _bus_pair(name, "{IIC}", "{IIC}", ("SDA", "SCL"), ("SDA", "SCL"))
    return [sheet.alias("IIC", "SDA", "SCL"), below]


@case
def bus_without_label(name: str) -> list[Drawing]:
    """A bus that only a sheet pin names takes the nets of its members' names along."""
    sheet, below = _bus_pair(name, "", "A[0..1]", (), ("A0", "A1"))
    return [sheet.label("A0", 0, 12).tp(("TP1", 0, 12)), below]


@case
def bus_of_two_names(name: str) -> list[Drawing]:
    """Two names of a bus are one bus, member by member; a wire of another name is no member."""
    sheet, below = _bus_pair(name, "X[0..1]", "A[0..1]", ("X0", "Y1", "OTHER"), ("B0", "A1"), label="B[0..1]")
    return [sheet.label("Y[0..1]", 14, 5), below]


@case
def global_bus(name: str) -> list[Drawing]:
    """The members of a global bus are global, and a local label on its sheet is one of them."""
    sheet, below = _bus_pair(name, "", "A[0..1]", ("G0", "G1"), ("A0", "A1"))
    sheet.label("G[0..1]", 1, 5, "global_label").label("G0", 0, 12).tp(("TP5", 0, 12))
    return [sheet, below.glob("G1", 0, 15).tp(("TP15", 0, 15))]


@case
def global_names_below_a_bus(name: str) -> list[Drawing]:
    """A global name below a bus stays with its sheet, but the topmost net of the member takes it as well."""
    sheet, below = _bus_pair(name, "M{X Y}", "M{X Y}", ("M.X",), ("M.X", "M.Y"))
    other = Drawing(f"{name}_below2", number=3)
    sheet.sheet("other", other, 20, 20, [("M{X Y}", "input", 20, 25)]).bus((20, 5), (15, 5)).bus((0, 5), (0, 25))
    sheet.bus((0, 25), (20, 25))
    below.part("own:VCC", "#PWR01", 5, 9, value="VCC")
    other.hier("M{X Y}", 20, 5).bus((0, 5), (20, 5)).wire((5, 6), (5, 9)).label("M.X", 5, 7).tp(("TP21", 5, 9))
    return [sheet, below, other.wire((9, 6), (9, 9)).label("M.Y", 9, 7).tp(("TP22", 9, 9))]


@case
def bus_entries(name: str) -> list[Drawing]:
    """A bus entry is a wire, except at the bus; a wire behind it needs a label of its own."""
    sheet = Drawing(name).bus((0, 0), (10, 0)).label("D[0..1]", 1, 0)
    sheet.entry(3, 0).wire((4, 1), (4, 4)).tp(("TP1", 4, 4))
    sheet.entry(6, 0).wire((7, 1), (7, 4)).label("D1", 7, 3).tp(("TP2", 7, 4)).wire((6, 0), (6, -3)).tp(("TP3", 6, -3))
    return [sheet.wire((0, 10), (3, 10)).entry(3, 10).wire((4, 11), (8, 11)).tp(("TP4", 0, 10), ("TP5", 8, 11))]


@case
def sheets_of_kicad_6(name: str) -> list[Drawing]:
    """KiCad 6 keeps the references of a reused sheet in the root sheet and hides pins with a bare word."""
    sheet, below = _pair(name, version=20211123)
    for row, box in enumerate(("left", "right")):
        sheet.sheet(box, below, 20, row * 12, [("IN", "input", 20, row * 12 + 2)])
        sheet.wire((15, row * 12 + 2), (20, row * 12 + 2)).tp((f"TP{row + 1}", 15, row * 12 + 2))
    below.hier("IN", 0, 0).tp((["TP11", "TP21"], 0, 0)).part("own:IC", ["U1", "U2"], 10, 5)
    return [sheet, below]


def draw_all(folder: Path) -> None:
    """Draw every case into a folder."""
    for name, draw in CASES.items():
        for drawing in draw(name):
            drawing.save(folder)


if __name__ == "__main__":
    draw_all(Path(__file__).parent)
