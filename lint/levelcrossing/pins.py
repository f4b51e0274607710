"""From a board, its rails and the trade data to a model of every pin: what drives, what reads, on which supply."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from functools import lru_cache

from levelcrossing import levels, partkinds
from levelcrossing.model import (
    Basis,
    Board,
    Drive,
    Level,
    OutputPoint,
    Part,
    PartFacts,
    Pin,
    PinFacts,
    PinModel,
    PinSetting,
    Provenance,
    Rails,
    Receive,
    Settings,
    Spread,
)
from levelcrossing.pinnames import SERIAL_IN, SERIAL_OUT, looks_like_supply, pin_words
from levelcrossing.trade_pins import matches
from levelcrossing.tradebook import Tradebook
from levelcrossing.units import format_volts

# Output resistance taken for a CMOS output of which nothing is known [ohm]: 4 mA at 0.4 V gives 100 ohm at worst
# (the LVCMOS test point of JESD8C.01 is 2 mA; common practice puts small drivers at 25 to 100 ohm).
UNKNOWN_OUTPUT_OHMS = Spread(low=15.0, nominal=40.0, high=120.0)
# Input capacitance and leakage of an input of which nothing is known (common practice; JESD7-A lists 10 pF, 1 uA).
UNKNOWN_INPUT_FARADS = Spread(low=3e-12, nominal=10e-12, high=15e-12)
UNKNOWN_LEAKAGE_AMPS = 1e-6

# Supply pins that set the logic levels, tried in this order (naming habits across makers; common practice).
IO_SUPPLY_NAMES = (
    re.compile(
        r"(VCC|VDD|V)_?\(?I/?O\)?\d*([_ ].*)?|IO_?(VDD|VCC).*|OVDD.*|VLOGIC|VDDPST|NVCC.*|VDDQ.*|VCCO([_ ].*)?|VL(CC)?|VDDI",
        re.I,
    ),
    re.compile(r"3V3.*|3\.3V.*|\+3V3.*|VDD33.*|VCC33.*|1V8|VDD18", re.I),
    re.compile(r"D?(VCC|VDD)\d?|DVCC|DVDD|VDDD|VS|V\+|VCC\w?|VDD\w?|VDD/.*|VCC/.*|VBAT|VDDIN", re.I),
    re.compile(r"A(VCC|VDD)\d?|VDDA|VDDANA|VCCA|VPP|VIN|\+?5V.*|VBUS|VSYS|VREGIN|EXT_5V", re.I),
)
NOT_IO_SUPPLY = re.compile(
    r".*(CORE|INT|PLL|USB|AUX|_?RTC|REG|VCAP|REF|MOT|VPP|VEE|GT|XTAL|OSC|ADC).*|VM|VMOT|VBB|VO|VNEG|VREF.*|AREF|VCP|BOOT|BST|VOUT|VGH|VGL",
    re.I,
)
ANALOG_NAME = re.compile(
    r"(V_?OUT\w*$|AIN|AN\d+$|ADC|DAC|VREF|AREF|XTAL|XIN|XOUT|OSC|XO$|XI$|ANT|RF|LNA|CANH|CANL|D\+|D-|DP$|DM$|USB_?D[PMN+-]|TX[PN+-]$|RX[PN+-]$|"
    r"FB$|COMP$|ISET|RSET|SW$|BST$|BOOT$|LX|SS$|VSENSE|CAP|C1[+-]|C2[+-]|CP\d?|CN\d?|MIC|SPK|LINE|HP[LR]|OUT[LRAB]?[+-]|IN[+-]|CC[12]$|SBU|REXT|RBIAS|"
    r".*\w[+-]$|IREF|VCP|SDP|SDM|MDI|TD[+-]|RD[+-]|TDP|TDN|RDP|RDN|.*_[PN]$|.*DIFF.*|I(SEN|LIM|MON)|PROG$|TS$|NTC|VC$|RT$|RT/)",
    re.I,
)
OPEN_DRAIN_NAME = re.compile(
    r".*(PGOOD|PWRGD|POK|PG$|^PG|ALERT|ALERTB|INT[B#N]?\d?$|IRQ|FAULT|FLT|nINT|OVCUR|OC$|CHRG|STDBY|STAT\d?$|STATUS|RDY/BSY).*",
    re.I,
)
PLUGGED_IN_GROUPS = frozenset({"memory", "sensor", "display", "module", "transceiver"})
# Connectors of more pins are for boards of their own, of which one row does not tell all (SODIMM modules and the like).
MOST_MODULE_PINS = 48
STRICT_SUPPLY = re.compile(r"[AD]?V(DD|CC|PP|EE|TT)[A-Z0-9_]*", re.I)
TWO_WAY_NAME = re.compile(r"(SDA|SCL|SMB|DQ|1W|IO|GPIO|P[A-Z]?\d|D\d|SDIO|ALERT|BUSY)", re.I)
READ_NAME = re.compile(
    r"(SDI|DIN|SI|MOSI|SCK|SCLK|CLK|CS|CSN|CSB|NCS|SS|EN|ENA|ENABLE|OE|CE|WE|RD|WR|RST|RESET|NRST|MR|SHDN|WP|HOLD|DIR|SEL|STBY|MCLK|LRCK|BCK|BCLK)",
    re.I,
)
DRIVE_NAME = re.compile(r"(SDO|DOUT|SO|MISO|RO|DRDY|BUSY|CLKOUT|Q\d*|RXD_OUT)", re.I)


@lru_cache(maxsize=256)
def level_text(text: str) -> Level:
    """Return the level that an expression of the supply stands for, e.g. ``0.7*V``."""
    return levels.parse(text)


def cmos_receive(supply_known: bool = True) -> Receive:
    """Return the input of an ordinary CMOS part of which nothing is known, marked assumed.

    Notes
    -----
    Levels 0.7 and 0.3 of the supply as in JESD7-A; maximum 0.3 V beyond the supply, the more cautious of the two usual
    figures (0.3 V and 0.5 V); common practice.
    """
    del supply_known
    return Receive(
        vih=level_text("0.7*V"),
        vil=level_text("0.3*V"),
        vmax=level_text("V+0.3"),
        vmin=level_text("-0.3"),
        vmax_off=None,
        clamp_high=True,
        clamp_low=True,
        injection_amps=None,
        capacitance_farads=UNKNOWN_INPUT_FARADS,
        leakage_amps=UNKNOWN_LEAKAGE_AMPS,
        off_tolerant=False,
        basis=Basis.ASSUMED,
        source="an ordinary CMOS input is assumed: 0.7 and 0.3 of the supply, at most 0.3 V beyond it",
    )


def receive_from(facts: PinFacts, part: PartFacts) -> Receive:
    """Return an input as the trade data describes it, gaps filled with the CMOS default.

    Parameters
    ----------
    facts : PinFacts
    part : PartFacts

    Returns
    -------
    Receive
        Basis ``library`` when levels and maximum are known, ``assumed`` when a limit had to be filled in.
    """
    default = cmos_receive()
    basis = Basis.LIBRARY if facts.vih is not None and facts.vil is not None else Basis.ASSUMED
    if facts.vmax is None:
        basis = Basis.ASSUMED
    clamp_high = facts.clamp_high if facts.clamp_high is not None else "V" in (facts.vmax.text if facts.vmax else "V")
    farads = facts.capacitance_farads
    return replace(
        default,
        vih=facts.vih or default.vih,
        vil=facts.vil or default.vil,
        vmax=facts.vmax or default.vmax,
        vmin=facts.vmin or level_text("-0.5"),
        vmax_off=facts.vmax_off,
        clamp_high=clamp_high,
        clamp_low=True if facts.clamp_low is None else facts.clamp_low,
        injection_amps=facts.injection_amps,
        capacitance_farads=Spread(low=farads * 0.6, nominal=farads, high=farads * 1.5)
        if farads
        else default.capacitance_farads,
        off_tolerant=bool(part.partial_power_down) or facts.vmax_off is not None,
        basis=basis,
        source=describe(part.provenance, part.title, "levels", "maxima"),
    )


def describe(provenance: Provenance, title: str, *groups: str) -> str:
    """Return one line that names a row of trade data, its source and how sure these groups of its figures are."""
    sure = {"datasheet": "", "secondary": ", second hand", "memory": ", from memory", "practice": ", common practice"}
    return f"{title}: {provenance.source}{sure.get(provenance.certainty_of(*groups), '')}"


def drive_from(facts: PinFacts, style: str, part: PartFacts | None, supply_volts: float | None = None) -> Drive:
    """Return an output from its rated points: the worst resistance is the one the maker guarantees.

    The points nearest to the supply [V] count, those at a milliampere or more before those at microamperes.

    Notes
    -----
    An unloaded CMOS output reaches its supply, others what their row says; at a rated point it may drop ``V - VOH`` at ``IOH``. The ratio is the
    worst output resistance. Real parts have about two fifths of it (common practice), at least a sixth.
    """
    high_worst, low_worst = UNKNOWN_OUTPUT_OHMS.high, UNKNOWN_OUTPUT_OHMS.high
    basis = Basis.ASSUMED if part is None else Basis.LIBRARY
    rated_low: float | None = None
    high, low = facts.open_high or level_text("V"), facts.open_low or level_text("0")
    points = sorted(facts.outputs, key=lambda point: abs(point.supply_volts - (supply_volts or point.supply_volts)))
    known = bool(points)
    highs = [point for point in points if point.voh is not None and point.ioh_amps > 0]
    lows = [point for point in points if point.vol is not None and point.iol_amps > 0]
    high_point = next((point for point in highs if point.ioh_amps >= 1e-3), highs[0] if highs else None)
    low_point = next((point for point in lows if point.iol_amps >= 1e-3), lows[0] if lows else None)
    if high_point is not None and high_point.voh is not None:
        drop = high.at(high_point.supply_volts) - high_point.voh.at(high_point.supply_volts)
        high_worst = drop / high_point.ioh_amps if drop > 0 else high_worst
    if low_point is not None and low_point.vol is not None:
        rise = low_point.vol.at(low_point.supply_volts) - low.at(low_point.supply_volts)
        low_worst = rise / low_point.iol_amps if rise > 0 else low_worst
        rated_low = low_point.iol_amps
    if part is not None and not known:
        basis = Basis.ASSUMED
    weak = part.translator.output_ohms if part is not None and part.translator is not None else None
    if weak is not None and weak >= 500:
        # A weak static driver behind an edge accelerator: its resistance is the maker's own design figure.
        spread = Spread(low=weak * 0.7, nominal=weak, high=weak * 1.3)
        return Drive(
            style=style, high=high, low=level_text("0"), high_ohms=spread, low_ohms=spread, limit_amps=facts.output_amps,
            rated_low_amps=None, basis=Basis.LIBRARY, source=describe(part.provenance, part.title, "outputs") if part else "",
        )  # fmt: skip
    if bipolar_output(facts.outputs):
        high = level_text("max(V-1.6, 0)")
    return Drive(
        style=style,
        high=high,
        low=low,
        high_ohms=_worst_resistance(high_worst, known),
        low_ohms=_worst_resistance(low_worst, known),
        limit_amps=facts.output_amps,
        rated_low_amps=rated_low,
        basis=basis,
        source=describe(part.provenance, part.title, "outputs") if part else "an ordinary CMOS output is assumed",
    )


def _worst_resistance(worst_ohms: float, known: bool) -> Spread:
    if not known:
        return UNKNOWN_OUTPUT_OHMS
    worst_ohms = min(max(worst_ohms, 2.0), 2000.0)
    return Spread(low=worst_ohms / 6, nominal=worst_ohms * 0.4, high=worst_ohms)


def bipolar_output(outputs: Sequence[OutputPoint]) -> bool:
    """Tell a TTL output stage: at 5 V it guarantees no more than 2.4 to 2.7 V even at half a milliampere."""
    return any(
        point.voh is not None
        and 4.4 < point.supply_volts < 5.6
        and point.voh.at(point.supply_volts) <= 2.75
        and point.ioh_amps <= 0.0011
        for point in outputs
    )


def model_pins(
    board: Board, rails: Rails, book: Tradebook, settings: Settings
) -> tuple[dict[tuple[str, str], PinModel], dict[str, PartFacts]]:
    """Model every pin of every fitted part.

    Parameters
    ----------
    board : Board
    rails : Rails
    book : Tradebook
    settings : Settings

    Returns
    -------
    pins : dict
        (reference, pin number) to PinModel.
    facts : dict
        Reference to the part's row of trade data, for parts that have one.
    """
    pins: dict[tuple[str, str], PinModel] = {}
    facts: dict[str, PartFacts] = {}
    for part in board.parts:
        if not part.fitted or not part.pins:
            continue
        kind = partkinds.kind_of(part)
        # Arrays of transistors that are sold as drivers have inputs and outputs.
        if kind in partkinds.ELEMENT_KINDS and not (kind == "transistor" and book.part(part) is not None):
            for pin in part.pins:
                pins[part.reference, pin.number] = _plain(pin, "element")
            continue
        if kind == "connector" and part.reference not in settings.far_ends:
            module = _plugged_in(part, rails, book)
            if module is not None:
                kind, facts[part.reference] = "module", module
        if kind in ("connector", "test-point"):
            for pin in part.pins:
                pins[part.reference, pin.number] = (
                    _far_end(pin, rails, settings) if kind == "connector" else _plain(pin, "element")
                )
            continue
        known = facts.get(part.reference) or book.part(part)
        if known is not None:
            facts[part.reference] = known
        modeller = _PartModeller(
            part, known, rails, settings, regulator=kind == "regulator" or book.regulator(part) is not None
        )
        for pin in part.pins:
            pins[part.reference, pin.number] = modeller.model(pin)
    return pins, facts


def _plugged_in(part: Part, rails: Rails, book: Tradebook) -> PartFacts | None:
    """Return what is known of the card or module that a connector is for: its value names it, its pins have its names.

    A socket for an SD card or a header called HC-SR04 is no connector of which nothing tells the other side.
    """
    known = book.part(part) if len(part.pins) <= MOST_MODULE_PINS else None
    if known is None or known.translator is not None or known.group not in PLUGGED_IN_GROUPS:
        return None
    supplied = [pin for pin in part.pins if known.pin(pin).direction == "supply" and rails.volts(pin.net) is not None]
    if any(_out_of_range(pin, known, rails) for pin in supplied):
        # The bare part would not work from it: there is a carrier board with a regulator of its own, and nothing tells more.
        return None
    return known if supplied else None


def _out_of_range(pin: Pin, known: PartFacts, rails: Rails) -> bool:
    volts = rails.volts(pin.net)
    ranges = [one for one in known.supplies if matches(one.pins, pin.name) and one.low_volts is not None]
    if volts is None or not ranges:
        return False
    return not any(
        (one.low_volts or 0.0) * 0.95 <= volts.nominal <= (one.high_volts or volts.nominal) * 1.05 for one in ranges
    )


def _plain(pin: Pin, role: str, why: str = "") -> PinModel:
    return PinModel(part=pin.part, number=pin.number, name=pin.name, net=pin.net, role=role, why=why)


def setting_for(table: Mapping[str, PinSetting], part: str, number: str) -> PinSetting | None:
    """Return the setting of a pin, or else of its whole part."""
    return table.get(f"{part}.{number}") or table.get(part)


def _far_end(pin: Pin, rails: Rails, settings: Settings) -> PinModel:
    if not pin.net or pin.unused:
        return _plain(pin, "unused")
    if rails.is_ground(pin.net):
        return _plain(pin, "ground")
    if pin.net in rails.by_net:
        return _plain(pin, "supply")
    model = _plain(pin, "far-end")
    declared = setting_for(settings.far_ends, pin.part, pin.number)
    return declared_far_end(model, declared, rails) if declared else model


def declared_far_end(model: PinModel, declared: PinSetting, rails: Rails) -> PinModel:
    """Return a connector pin whose other side the user declared."""
    volts = declared.volts or (rails.volts(declared.rail) if declared.rail else None)
    if volts is None:
        return model
    drives = declared.drives is not False
    reads = declared.reads is not False
    return replace(
        model,
        supply=declared.rail if declared.rail in rails.by_net else "",
        supply_volts=volts,
        drive=far_end_drive(open_drain=bool(declared.open_drain), basis=Basis.DECLARED) if drives else None,
        receive=_overridden(replace(cmos_receive(), basis=Basis.DECLARED, source="declared far end"), declared)
        if reads
        else None,
        basis=Basis.DECLARED,
        declared_far_end=True,
        why="declared in the settings",
    )


def far_end_drive(*, open_drain: bool, basis: Basis) -> Drive:
    """Return the driver beyond a connector: a CMOS output of unknown strength, or an open drain."""
    return Drive(
        style="open-drain" if open_drain else "push-pull",
        high=level_text("V"),
        low=level_text("0"),
        high_ohms=UNKNOWN_OUTPUT_OHMS,
        low_ohms=UNKNOWN_OUTPUT_OHMS,
        limit_amps=None,
        rated_low_amps=None,
        basis=basis,
        source="an ordinary CMOS output is assumed beyond the connector",
    )


def _overridden(receive: Receive, setting: PinSetting) -> Receive:
    if setting.tolerates_volts is not None:
        limit = level_text(f"{setting.tolerates_volts:g}")
        receive = replace(
            receive, vmax=limit, clamp_high=False, basis=Basis.DECLARED, source="declared in the settings"
        )
    if setting.vih_volts is not None:
        receive = replace(receive, vih=level_text(f"{setting.vih_volts:g}"))
    if setting.vil_volts is not None:
        receive = replace(receive, vil=level_text(f"{setting.vil_volts:g}"))
    return receive


class _PartModeller:
    """Models the pins of one integrated circuit or module."""

    def __init__(
        self, part: Part, facts: PartFacts | None, rails: Rails, settings: Settings, *, regulator: bool
    ) -> None:
        self.part = part
        self.facts = facts
        self.rails = rails
        self.settings = settings
        self.regulator = regulator
        self.supply_pins = [
            pin for pin in part.pins if self._is_supply(pin) and not rails.is_ground(pin.net) and pin.net
        ]

    def _is_supply(self, pin: Pin) -> bool:
        if self.facts is not None:
            direction = self.facts.pin(pin).direction
            if direction in ("supply", "supply-out", "ground"):
                return True
            if direction is not None and not (pin.net in self.rails.by_net and STRICT_SUPPLY.fullmatch(pin.name)):
                return False
        return looks_like_supply(pin) and (pin.net in self.rails.by_net or pin.kind in ("power_in", "power_out"))

    def model(self, pin: Pin) -> PinModel:
        """Return the model of one pin."""
        if not pin.net or pin.unused or pin.kind == "no_connect":
            return _plain(pin, "unused")
        facts = self.facts.pin(pin) if self.facts else PinFacts()
        setting = setting_for(self.settings.pins, pin.part, pin.number)
        if facts.direction == "ground" or (
            self.rails.is_ground(pin.net) and facts.direction is None and self._is_supply(pin)
        ):
            return _plain(pin, "ground")
        if facts.direction in ("supply", "supply-out") or (
            self._is_supply(pin) and (facts.direction is None or STRICT_SUPPLY.fullmatch(pin.name))
        ):
            return _plain(pin, "supply-out" if facts.direction == "supply-out" or pin.kind == "power_out" else "supply")
        if facts.direction in ("analog", "passive"):
            return replace(_plain(pin, "analog", facts.note), facts=facts)
        words = pin_words(pin.name)
        on_rail = pin.net in self.rails.by_net
        if facts.direction is None and setting is None:
            if words and any(ANALOG_NAME.fullmatch(word) or ANALOG_NAME.match(word) for word in words[:1]):
                return _plain(pin, "analog")
            if self.regulator and not OPEN_DRAIN_NAME.match(words[0] if words else ""):
                return _plain(pin, "analog", "a pin of a regulator: its thresholds are not judged")
            if on_rail and pin.kind not in ("input",):
                return _plain(pin, "analog", "tied to a rail")
        supply, volts, why = self._supply(pin, facts, setting)
        direction, certain, basis = self._direction(pin, facts, setting, words)
        receive: Receive | None = None
        drive: Drive | None = None
        if direction in ("in", "inout", "open-drain"):
            receive = receive_from(facts, self.facts) if self.facts and (facts.vih or facts.vmax) else cmos_receive()
            if setting:
                receive = _overridden(receive, setting)
            if (
                direction == "open-drain"
                and pin.kind != "bidirectional"
                and not any(TWO_WAY_NAME.match(word) for word in words)
            ):
                receive = replace(receive, reads=False)
        if direction in ("out", "inout", "open-drain", "open-source"):
            style = {"open-drain": "open-drain", "open-source": "open-source"}.get(direction, "push-pull")
            drive = replace(
                drive_from(facts, style, self.facts, volts.nominal if volts is not None else None),
                tristate=pin.kind == "tri_state",
            )
        if direction == "out" and pin.kind != "tri_state":
            receive = None
        when = ""
        if direction == "inout" and not certain:
            when = f"{pin.part}.{pin.number}{_in_brackets(words)} is configured as an output"
        parts = [basis] + [side.basis for side in (receive, drive) if side is not None]
        return PinModel(
            part=pin.part,
            number=pin.number,
            name=pin.name,
            net=pin.net,
            role="signal",
            supply=supply,
            supply_volts=volts,
            drive=drive,
            receive=receive,
            when=when,
            basis=Basis.LIBRARY if self._passes(facts) else Basis.weakest(*parts),
            why=why,
            facts=facts if self.facts else None,
            pull_up_ohms=facts.pull_up_ohms,
        )

    def _passes(self, facts: PinFacts) -> bool:
        """Tell a channel of a switch: it reads and drives nothing, so that nothing had to be assumed of its levels."""
        translator = self.facts.translator if self.facts is not None else None
        return translator is not None and translator.kind in ("fet-switch", "bus-switch") and bool(facts.side)

    # -- direction ---------------------------------------------------------------------------------------------------

    def _direction(
        self, pin: Pin, facts: PinFacts, setting: PinSetting | None, words: Sequence[str]
    ) -> tuple[str, bool, Basis]:
        if setting is not None and (
            setting.drives is not None or setting.reads is not None or setting.open_drain is not None
        ):
            if setting.open_drain:
                return "open-drain", True, Basis.DECLARED
            if setting.drives and setting.reads is not True:
                return "out", True, Basis.DECLARED
            if setting.drives is False:
                return "in", True, Basis.DECLARED
            return "inout", True, Basis.DECLARED
        if facts.direction in (None, "inout") and not facts.side and len(words) > 1 and pin.kind == "bidirectional":
            # The first name of a configurable pin is what it does from reset on (``TXD0/IO1``).
            if SERIAL_OUT.fullmatch(words[0]):
                return "out", True, Basis.TRACED
            if SERIAL_IN.fullmatch(words[0]):
                return "in", True, Basis.TRACED
        if facts.direction is not None:
            group = self.facts.group if self.facts else ""
            return facts.direction, facts.direction != "inout" or group in ("memory",), Basis.LIBRARY
        first = words[0] if words else ""
        match pin.kind:
            case "open_collector":
                return "open-drain", True, Basis.TRACED
            case "open_emitter":
                return "open-source", True, Basis.TRACED
            case "input" if (
                self.facts is not None
                and self.facts.group == "fpga"
                and not any(READ_NAME.fullmatch(word) for word in words)
            ):
                # Symbols of gate arrays are often drawn with every ball an input.
                return "inout", False, Basis.LIBRARY
            case "input":
                return (
                    ("open-drain", True, Basis.ASSUMED)
                    if re.fullmatch(r"SDA\w?|PGD|PGOOD", first, re.I)
                    else ("in", True, Basis.TRACED)
                )
            case "output" | "tri_state":
                if OPEN_DRAIN_NAME.match(first):
                    return "open-drain", True, Basis.ASSUMED
                return "out", True, Basis.TRACED
            case _:
                pass
        if OPEN_DRAIN_NAME.fullmatch(first):
            return "open-drain", True, Basis.ASSUMED
        if self.facts is None or self.facts.group not in ("mcu", "fpga", "module"):
            if READ_NAME.fullmatch(first):
                return "in", True, Basis.ASSUMED
            if DRIVE_NAME.fullmatch(first):
                return "out", True, Basis.ASSUMED
        # Of a general-purpose pin the library knows that it may be either; of an unknown part nothing is known.
        general = self.facts is not None and self.facts.group in ("mcu", "fpga", "module")
        return "inout", False, Basis.LIBRARY if general else Basis.ASSUMED

    # -- supply ------------------------------------------------------------------------------------------------------

    def _supply(self, pin: Pin, facts: PinFacts, setting: PinSetting | None) -> tuple[str, Spread | None, str]:
        """Return the rail net, its voltage and, when neither can be told, why."""
        if setting is not None and (setting.volts is not None or setting.rail):
            return setting.rail, setting.volts or self.rails.volts(setting.rail), ""
        if facts.supply:
            wanted = re.compile(facts.supply, re.I)
            matching = [candidate for candidate in self.supply_pins if _named(wanted, candidate)]
            chosen = self._one_of(pin, matching)
            if chosen is not None:
                return chosen[0], chosen[1], chosen[2]
        if facts.supply_volts is not None:
            return "", Spread.around(facts.supply_volts, 0.05), ""
        if facts.supply:
            rail, volts, why = self._usual_supply(pin)
            if volts is not None and not self._fits_io(volts):
                # A board of its own is fed with more than its pins work from; its regulator's output is not connected.
                return "", None, f"the I/O supply of {self.part.reference} is on no rail with a known voltage"
            return rail, volts, why
        return self._usual_supply(pin)

    def _fits_io(self, volts: Spread) -> bool:
        """Tell whether a voltage is not above what the trade data gives for the part's I/O supply."""
        if self.facts is None or self.facts.translator is not None:
            return True
        most = [one.high_volts for one in self.facts.supplies if one.role == "io" and one.high_volts is not None]
        return not most or volts.nominal <= 1.1 * max(most)

    def _usual_supply(self, pin: Pin) -> tuple[str, Spread | None, str]:
        """Return what the names of supply pins suggest, as :meth:`_supply`."""
        for pattern in IO_SUPPLY_NAMES:
            matching = [
                candidate
                for candidate in self.supply_pins
                if _named(pattern, candidate)
                and not (pattern is not IO_SUPPLY_NAMES[0] and _named(NOT_IO_SUPPLY, candidate))
            ]
            banked = [candidate for candidate in matching if _same_bank(candidate, pin)]
            chosen = self._one_of(pin, banked or matching)
            if chosen is not None:
                return chosen
        chosen = self._one_of(
            pin, [candidate for candidate in self.supply_pins if not _named(NOT_IO_SUPPLY, candidate)]
        )
        if chosen is not None:
            return chosen
        if not self.supply_pins:
            ground = next((one.net for one in self.part.pins if self.rails.is_ground(one.net)), "")
            if ground and self._stands_alone(pin):
                # Nothing but ground feeds its inputs: their levels stand alone.
                return ground, Spread.exactly(0.0), ""
            return "", None, f"{self.part.reference} has no supply pin that could be told"
        return "", None, f"no rail with a known voltage supplies {self.part.reference}"

    def _stands_alone(self, pin: Pin) -> bool:
        """Tell whether the trade data gives a pin levels that follow no supply."""
        facts = self.facts.pin(pin) if self.facts is not None else PinFacts()
        return all(one is not None and "V" not in one.text for one in (facts.vih, facts.vil, facts.vmax))

    def _one_of(self, pin: Pin, candidates: Sequence[Pin]) -> tuple[str, Spread | None, str] | None:
        """Choose among supply pins: those of the pin's own bank, else all when they agree on the voltage."""
        if not candidates:
            return None
        banked = [candidate for candidate in candidates if _same_bank(candidate, pin)]
        nets = sorted({candidate.net for candidate in banked or candidates})
        known = [(net, self.rails.volts(net)) for net in nets]
        with_volts = [(net, volts) for net, volts in known if volts is not None and volts.nominal > 0]
        if not with_volts:
            return (nets[0], None, f"the voltage of {nets[0]} is not known") if len(nets) == 1 else None
        first = with_volts[0][1]
        if all(abs(volts.nominal - first.nominal) <= 0.04 * first.nominal for _, volts in with_volts):
            return with_volts[0][0], first, ""
        listing = ", ".join(f"{net} {format_volts(volts.nominal)}" for net, volts in with_volts)
        return (
            "",
            None,
            f"{self.part.reference} has several supplies ({listing}) and nothing says which one this pin is on",
        )


def _named(pattern: re.Pattern[str], pin: Pin) -> bool:
    plain = pin.name.replace("_{", "").replace("{", "").replace("}", "").replace("~", "")
    return pattern.fullmatch(plain) is not None or any(pattern.fullmatch(word) for word in pin_words(pin.name))


def _same_bank(supply: Pin, signal: Pin) -> bool:
    """Tell whether a bank mark of a supply pin's name (``VCCO_66``, ``VDD_WB``) also stands in a signal pin's name."""
    marks = re.split(r"[_\s/().]+", re.sub(r"(?<=IO|CO)(?=\d)", "_", supply.name))[1:]
    tokens = set(re.split(r"[_\s/().]+", signal.name))
    return any(mark and mark in tokens for mark in marks)


def _in_brackets(words: Sequence[str]) -> str:
    return f" ({words[0]})" if words else ""
