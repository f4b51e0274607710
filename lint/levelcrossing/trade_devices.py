"""From a row of trade data to transistors, diodes and regulators, and the voltages coded in their part numbers."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence

from levelcrossing.model import BipolarFacts, DiodeFacts, MosfetFacts, Part, RegulatorFacts, Spread
from levelcrossing.trade_match import normal
from levelcrossing.trade_rows import Row


def spread(values: Sequence[float], factor: float = 1.0) -> Spread:
    """Return least, typical and greatest value times a factor."""
    low, nominal, high = values
    return Spread(low=low * factor, nominal=nominal * factor, high=high * factor)


def mosfet_facts(row: Row) -> MosfetFacts:
    """Return what a ``[[mosfet]]`` row says."""
    return MosfetFacts(
        polarity=row.get("polarity"),
        threshold_volts=spread(row.get("threshold_volts")),
        gain=spread(row.get("gain_amperes_per_volt2")),
        ciss_farads=row.get("input_picofarads", 50) * 1e-12,
        coss_farads=row.get("output_picofarads", 20) * 1e-12,
        crss_farads=row.get("transfer_picofarads", 5) * 1e-12,
        body_drop_volts=float(row.get("body_diode_volts", 0.8)),
        vgs_max_volts=float(row.get("gate_max_volts")),
        vds_max_volts=float(row.get("drain_max_volts")),
        gate_least_volts=float(row.get("gate_least_volts", 10)),
        id_max_amps=row.get("drain_max_milliamperes", 100) * 1e-3,
        provenance=row.provenance,
        generic=bool(row.get("generic", False)),
    )


def bipolar_facts(row: Row) -> BipolarFacts:
    """Return what a ``[[bipolar]]`` row says."""
    base = row.get("base_ohms")
    return BipolarFacts(
        polarity=row.get("polarity"),
        beta_forward=spread(row.get("gain")),
        beta_reverse=spread(row.get("reverse_gain")),
        vbe_volts=float(row.get("base_emitter_volts", 0.65)),
        vbe_at_amps=row.get("base_emitter_milliamperes", 1) * 1e-3,
        vce_sat_volts=float(row.get("saturation_volts", 0.3)),
        cbe_farads=row.get("base_emitter_picofarads", 10) * 1e-12,
        cbc_farads=row.get("base_collector_picofarads", 5) * 1e-12,
        transit_s=1 / (2 * math.pi * row.get("transition_megahertz", 200) * 1e6),
        storage_s=spread(row.get("storage_nanoseconds", [60, 200, 800]), 1e-9),
        vebo_volts=float(row.get("emitter_base_max_volts")),
        vceo_volts=float(row.get("collector_max_volts", 25)),
        ic_max_amps=row.get("collector_max_milliamperes", 100) * 1e-3,
        base_ohms=float(base) if base is not None else 0.0,
        base_emitter_ohms=row.get("base_emitter_ohms"),
        provenance=row.provenance,
        generic=bool(row.get("generic", False)),
    )


def diode_facts(row: Row, zener_volts: float | None = None) -> DiodeFacts:
    """Return what a ``[[diode]]`` row says; ``zener_volts`` [V] is the breakdown read from a value."""
    breakdown: Spread | None = None
    reverse = float(row.get("reverse_max_volts", 30))
    if "zener_volts" in row.data:
        breakdown = spread(row.get("zener_volts"))
    if zener_volts is not None:
        breakdown = Spread.around(zener_volts, row.get("zener_tolerance_percent", 6) / 100)
        reverse = zener_volts
    return DiodeFacts(
        kind=row.get("kind"),
        forward=tuple(
            (point["milliamperes"] * 1e-3, float(point["typical_volts"]), float(point["max_volts"]))
            for point in row.get("forward")
        ),
        capacitance_farads=row.get("capacitance_picofarads", 10) * 1e-12,
        reverse_max_volts=reverse,
        zener_volts=breakdown,
        zener_amps=row.get("zener_milliamperes", 5) * 1e-3,
        zener_ohms=float(row.get("zener_ohms", 0)),
        knee_ohms=float(row.get("knee_ohms", 0)),
        knee_amps=row.get("knee_milliamperes", 1) * 1e-3,
        forward_max_amps=row.get("forward_max_milliamperes", 100) * 1e-3,
        provenance=row.provenance,
        generic=bool(row.get("generic", False)),
    )


# --------------------------------------------------------------------------------------------- kinds of unnamed devices

_SYMBOLS: tuple[tuple[str, re.Pattern[str]], ...] = (
    ("nmos", re.compile(r"(^|_)N-?(CH)?-?(MOS|FET|CHANNEL)|NMOS|N-?MOSFET|^MOSFET_N|Q_?DUAL_?NMOS", re.IGNORECASE)),
    ("pmos", re.compile(r"(^|_)P-?(CH)?-?(MOS|FET|CHANNEL)|PMOS|P-?MOSFET|^MOSFET_P|Q_?DUAL_?PMOS", re.IGNORECASE)),
    ("npn", re.compile(r"(^|_)NPN|^Q_NPN|BJT_NPN|^Q_?DUAL_NPN", re.IGNORECASE)),
    ("pnp", re.compile(r"(^|_)PNP|^Q_PNP|BJT_PNP", re.IGNORECASE)),
    ("zener", re.compile(r"ZENER", re.IGNORECASE)),
    ("schottky", re.compile(r"SCHOTTKY", re.IGNORECASE)),
    ("led", re.compile(r"(^|[_: -])LED", re.IGNORECASE)),
    ("suppressor", re.compile(r"TVS|ESD|VARISTOR|SUPPRESSOR", re.IGNORECASE)),
    ("diode", re.compile(r"^D$|^D_|^DIODE|DIODE$|^D-", re.IGNORECASE)),
)


def kind_of(part: Part) -> str:
    """Tell what a part without a known number plainly is, by its symbol, value, and pin names; empty when not plain.

    One of ``nmos``, ``pmos``, ``npn``, ``pnp``, ``zener``, ``schottky``, ``led``, ``suppressor``, ``diode``.
    """
    names = {pin.name.strip("~").upper().rstrip("12") for pin in part.pins}
    words = f"{part.symbol} {part.value}"
    three = {"G", "S", "D"} <= names or {"GATE", "SOURCE", "DRAIN"} <= names
    bipolar = {"B", "C", "E"} <= names
    diode = {"A", "K"} <= names or (
        len(part.pins) in (2, 3) and re.match(r"(D|LED|ZD|TVS|CR)\d", part.reference) is not None
    )
    for kind, pattern in _SYMBOLS:
        if not (pattern.search(part.symbol) or pattern.search(part.value)):
            continue
        if kind in ("nmos", "pmos") and (three or part.symbol.upper().startswith(("Q_", "NMOS", "PMOS"))):
            return kind
        if kind in ("npn", "pnp") and (bipolar or part.symbol.upper().startswith("Q_")):
            return kind
        if kind in ("zener", "schottky", "led", "suppressor", "diode") and diode:
            return kind
    text = f"{words} {part.description} {part.keywords}"
    if three and re.search(r"\bP[- ]?(CHANNEL|CH|MOS)", text, re.IGNORECASE):
        return "pmos"
    if three and re.search(r"\bN[- ]?(CHANNEL|CH|MOS)", text, re.IGNORECASE):
        return "nmos"
    if bipolar and re.search(r"\bPNP\b", text, re.IGNORECASE):
        return "pnp"
    if bipolar and re.search(r"\bNPN\b", text, re.IGNORECASE):
        return "npn"
    return ""


GENERIC = {
    "nmos": ("mosfet", "unknown N-channel MOSFET"),
    "pmos": ("mosfet", "unknown P-channel MOSFET"),
    "npn": ("bipolar", "unknown NPN transistor"),
    "pnp": ("bipolar", "unknown PNP transistor"),
    "zener": ("diode", "unknown Zener"),
    "schottky": ("diode", "unknown Schottky diode"),
    "led": ("diode", "unknown LED"),
    "suppressor": ("diode", "unknown suppressor"),
    "diode": ("diode", "unknown silicon diode"),
}

_ZENER_SERIES = re.compile(
    r"(BZ[XTVGMW]\d{2,3}\w?|MM3Z|MMSZ|PDZ|DZ23|DDZ|TZM|UDZ\w?|EDZ\w?|SZM\w+|ZMM|ZPD|BZ)[-_ ]?(?:LS)?[BC]?[-_ ]?"
    r"(?P<whole>\d{1,2})V(?P<tenths>\d)?",
    re.IGNORECASE,
)
_VOLTS = re.compile(
    r"^(?:ZENER[-_ ]*)?(?P<a>\d{1,2})(?:V(?P<b>\d{1,2})|[.,](?P<c>\d{1,2})\s*V?|\s*V)(?!\w)", re.IGNORECASE
)


def zener_from_number(text: str) -> float | None:
    """Return the voltage in the part number of a Zener series [V]: ``BZX84C3V3`` gives 3.3; None when there is none."""
    found = _ZENER_SERIES.search(text)
    return float(f"{found['whole']}.{found['tenths'] or 0}") if found else None


def plain_volts(text: str) -> float | None:
    """Return a value that is nothing but a voltage [V]: ``3.6V``, ``3V6``, ``5V``; None when it is not one."""
    found = _VOLTS.match(text.strip())
    if found is None:
        return None
    return float(f"{found['a']}.{found['b'] or found['c'] or 0}")


# ---------------------------------------------------------------------------------------------------------- regulators


def regulator_facts(row: Row, found: re.Match[str] | None, text: str, defaults: Row | None) -> RegulatorFacts | None:
    """Return what a ``[[fixed]]`` or ``[[adjustable]]`` row says.

    Parameters
    ----------
    row : Row
    found : re.Match or None
        The match of the row's pattern; its group ``v`` holds the voltage code of a fixed one.
    text : str
        The normal text that matched.
    defaults : Row or None
        The usual pin names.

    Returns
    -------
    RegulatorFacts or None
        None when the code stands for no voltage.
    """
    output: Spread | None = None
    reference: Spread | None = None
    if row.table == "fixed":
        assert found is not None
        volts = decoded(found["v"], row.get("code"), row.get("table", {}))
        if volts is None:
            return None
        output = Spread.around(volts, row.get("tolerance_percent", 3) / 100)
        if row.get("negative"):
            output = Spread(low=-output.high, nominal=-output.nominal, high=-output.low)
    else:
        reference = _reference(row, text)
    return _regulator(row, output, reference, defaults, _by_part(row, "input_max_by_part", text))


def regulator_of_value(volts: float, row: Row) -> RegulatorFacts:
    """Return a fixed regulator of which only the voltage is known [V]; ``row`` names the usual pins."""
    return _regulator(row, Spread.around(volts, 0.03), None, row)


def _regulator(
    row: Row, output: Spread | None, reference: Spread | None, defaults: Row | None, input_max: float | None = None
) -> RegulatorFacts:
    def pins(key: str) -> str:
        return str(row.get(key) or (defaults.get(key) if defaults else "") or "")

    return RegulatorFacts(
        output=output,
        reference=reference,
        formula=row.get("formula", "none"),
        adjust_amps=row.get("adjust_microamperes", 0) * 1e-6,
        input_pins=pins("input_pins"),
        output_pins=pins("output_pins"),
        ground_pins=pins("ground_pins"),
        feedback_pins=pins("feedback_pins"),
        enable_pins=pins("enable_pins"),
        switch_pins=str(row.get("switch_pins", ""))
        or (pins("switch_pins") if row.get("through_inductor") or row.get("boost") else ""),
        through_inductor=bool(row.get("through_inductor", False)),
        input_max_volts=row.get("input_max_volts") if input_max is None else input_max,
        dropout_volts=row.get("dropout_volts"),
        isolated=bool(row.get("isolated", False)),
        provenance=row.provenance,
    )


def decoded(code: str, kind: str, table: dict[str, float]) -> float | None:
    """Return the voltage that a code in a part number stands for [V].

    A code in ``table`` comes first; a point, a dash or a V in the code always means volts; three digits under
    ``tenths`` mean hundredths.
    """
    code = code.upper().rstrip("V")
    if code in table:
        return float(table[code])
    written = re.fullmatch(r"(\d{1,2})[.VP-](\d{1,2})", code)
    if written is not None:
        return float(f"{written[1]}.{written[2]}")
    if not code.isdigit() or kind == "table":
        return None
    number = int(code)
    if kind == "decimal":
        # a whole number of volts; two digits without a point are no voltage of this coding unless the table has them
        return float(number) if 1 <= number <= 24 else None
    if kind == "tenths":
        return number / (100 if len(code) == 3 else 10)
    return number / 100 if kind == "hundredths" else float(number)


def _reference(row: Row, text: str) -> Spread:
    own = _by_part(row, "reference_by_part", text)
    nominal = float(row.get("reference_volts")) if own is None else own
    limits = row.get("reference_range_volts")
    if limits and own is None:
        return Spread(low=limits[0], nominal=nominal, high=limits[1])
    reach = abs(nominal) * row.get("tolerance_percent", 2) / 100
    return Spread(low=nominal - reach, nominal=nominal, high=nominal + reach)


def _by_part(row: Row, key: str, text: str) -> float | None:
    """Return what a row that stands for several parts says of this one: the longest name found in ``text`` counts."""
    own = row.get(key, {})
    named = [name for name in own if normal(name) in text]
    return float(own[max(named, key=len)]) if named else None
