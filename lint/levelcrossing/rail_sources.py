"""What gives a net its voltage by itself: settings, fields, regulators, names, connectors, cells.

References
----------
Cells: CR2032 2.0-3.3 V (maker's discharge curves; common practice), Li-ion 3.0-4.2 V (charge and cut-off voltage,
common practice). USB bus power 4.40-5.25 V: USB 2.0, section 7.2.2, as in the trade data of rail names.
"""

from __future__ import annotations

import fnmatch
import re
from collections import defaultdict
from dataclasses import dataclass

from levelcrossing import units
from levelcrossing.diodepins import diode_pairs
from levelcrossing.model import Basis, Evidence, Part, Pin, Provenance, RegulatorFacts, Settings, Spread, SupplyFacts
from levelcrossing.rail_dividers import feedback_volts, read_divider
from levelcrossing.rail_links import Joints, across_coil
from levelcrossing.rail_scene import Scene, plain_words
from levelcrossing.symbolfields import settings_from_fields

COIN_CELL = Spread(low=2.0, nominal=3.0, high=3.3)
LITHIUM_CELL = Spread(low=3.0, nominal=3.7, high=4.2)
ALKALINE_CELL = Spread(low=0.9, nominal=1.5, high=1.65)

_COIN = re.compile(r"\b(CR|BR|ML|MS|VL)\d{3,4}|COIN|BUTTON.?CELL", re.IGNORECASE)
_LITHIUM = re.compile(r"LI-?(ION|PO|POLY)|LITHIUM|18650|14500|21700|16340|LIPO|LIFEPO", re.IGNORECASE)
_CHARGER = re.compile(
    r"^(TP405\d|TP5100|BL405\d|LTC405\d|MCP738\d\d|BQ2[1-5]\d{3}|IP530\d|CN3\d{3}|MAX15[15]\d|STC4054|ME4054)",
    re.IGNORECASE,
)
# Controllers that ask a USB source for 9 to 20 V (makers' data sheets, remembered).
_POWER_DELIVERY = re.compile(
    r"^(FUSB30[27]|CH224|IP2721|STUSB45\d\d|HUSB238|CYPD3\d{3}|AP33772|TPS2575\d|TPS6598\d)", re.IGNORECASE
)
_VOLTS_WORD = re.compile(r"\dV|V\d|VBUS|VUSB|\d\.\d", re.IGNORECASE)
_BARE_POINT = re.compile(r"(?<!\d)\d_\d(?!\d)")
_BATTERY_PIN = re.compile(r"V?_?BATT?[+]?|BATT?_?\+|B\+", re.IGNORECASE)
_GENERIC_SWITCH = r"SW\d?|LX\d?|PH(ASE)?|VSW"
_GENERIC_INPUT = r"P?V_?IN\d?|INP?\d?|VI|INPUT|AVIN"
_GENERIC_OUTPUT = r"V_?OUT\d?|OUT\d?|VO|OUTPUT"
_GENERIC_ENABLE = r"EN\d?|ENABLE|CE|RUN|n?SHDN|SHDN#?|ON|ON/OFF|EN/UVLO|STBY"


@dataclass(frozen=True, slots=True)
class Conversion:
    """What a regulator does: its parts, input and output net, whether something can switch it off."""

    part: str
    source: str
    output: str
    switched: bool


class Sources:
    """The voltage of each net as far as it stands by itself.

    Parameters
    ----------
    scene : Scene
    joints : Joints

    Attributes
    ----------
    evidence : dict
        Net to its own evidence, unsorted.
    conversions : list of Conversion
    made_by : dict
        Output net of a converter whose voltage cannot be told, to a sentence about it.
    """

    def __init__(self, scene: Scene, joints: Joints) -> None:
        self.scene = scene
        self.joints = joints
        self.evidence: dict[str, list[Evidence]] = defaultdict(list)
        self.ranged: set[tuple[str, str]] = set()
        self.conversions: list[Conversion] = []
        self.made_by: dict[str, str] = {}
        self._from_settings()
        for reference, facts in scene.regulators.items():
            self._from_regulator(scene.parts[reference], facts)
        for reference, part in scene.parts.items():
            if reference not in scene.regulators and scene.converter(reference):
                self._from_unknown_converter(part)
        self._from_names()
        for reference, part in scene.parts.items():
            kind = scene.kinds[reference]
            if kind == "connector" or scene.active(reference):
                self._from_pin_names(part)
            if kind in ("battery", "connector") or _CHARGER.match(part.value):
                self._from_battery(part)

    def add(self, net: str, kind: str, volts: Spread, basis: Basis, text: str, *, ranged: bool = False) -> None:
        """Note one piece of evidence; ``ranged`` when its range was stated and not assumed."""
        if not net or net in self.scene.grounds:
            return
        found = Evidence(kind=kind, volts=volts, basis=basis, text=text)
        if found not in self.evidence[net]:
            self.evidence[net].append(found)
            if ranged:
                self.ranged.add((net, text))

    # --------------------------------------------------------------------------------------------------------- declared

    def _from_settings(self) -> None:
        scene = self.scene
        bare = Settings(rail_tolerance=scene.settings.rail_tolerance)
        fields = settings_from_fields(scene.board, bare).rails
        for pattern, volts in scene.settings.rails.items():
            if fields.get(pattern) == volts:
                continue
            exact = pattern in scene.pins_on
            for net in [pattern] if exact else sorted(scene.pins_on):
                if exact or fnmatch.fnmatchcase(net, pattern):
                    text = f"the settings declare {units.format_volts(volts.nominal)}"
                    self.add(net, "settings", scene.tolerant(volts), Basis.DECLARED, text, ranged=True)
        for net, volts in fields.items():
            text = f"a field on the schematic declares {units.format_volts(volts.nominal)}"
            self.add(net, "field", scene.tolerant(volts), Basis.DECLARED, text, ranged=True)

    # ------------------------------------------------------------------------------------------------------- regulators

    def _from_regulator(self, part: Part, facts: RegulatorFacts) -> None:
        scene = self.scene
        inputs = [pin.net for pin in scene.named_pins(part, facts.input_pins) if pin.net not in scene.grounds]
        source = inputs[0] if inputs else ""
        feedback = scene.named_pins(part, facts.feedback_pins) if facts.output is None else []
        output = self._output(part, facts, set(inputs))
        divider = read_divider(scene, self.joints, feedback[0].net, output, set(inputs)) if feedback else None
        if divider is not None:
            output = output or divider.top_net
        if not output or output in inputs:
            return
        switched = self._switched(part, facts.enable_pins, inputs)
        self.conversions.append(Conversion(part.reference, source, output, switched))
        title = scene.title(part.reference)
        if facts.output is not None:
            text = f"{title} is a {units.format_volts(facts.output.nominal)} regulator"
            self.add(output, "regulator", scene.tolerant(facts.output), Basis.LIBRARY, text, ranged=True)
        elif facts.reference is not None and divider is not None:
            volts = feedback_volts(facts, divider.top, divider.bottom)
            text = (
                f"{title} regulates to {units.format_volts(volts.nominal)}: {divider.words}, "
                f"reference {units.format_volts(facts.reference.nominal, 3)}"
            )
            self.add(output, "feedback", volts, Basis.LIBRARY, text, ranged=True)
        elif facts.reference is not None and self._unity(part, facts, feedback, output):
            text = f"{title} regulates to its reference of {units.format_volts(facts.reference.nominal, 3)}"
            self.add(output, "feedback", facts.reference, Basis.LIBRARY, text, ranged=True)
        else:
            self.made_by.setdefault(output, f"{title} makes it; its feedback divider could not be read")

    def _from_unknown_converter(self, part: Part) -> None:
        """Note which net a converter without data makes from which, though not at what voltage."""
        scene = self.scene
        inputs = [pin.net for pin in scene.named_pins(part, _GENERIC_INPUT) if pin.net not in scene.grounds]
        if not inputs:
            return
        outputs: dict[str, None] = {}
        for pin in scene.named_pins(part, _GENERIC_OUTPUT):
            if pin.net not in scene.grounds and not scene.switching(pin.net):
                outputs[pin.net] = None
        for pin in part.pins:
            if pin.net and scene.switching(pin.net):
                outputs.update(dict.fromkeys(across_coil(scene, pin.net)))
        held = {self.joints.group(net) for net in inputs}
        made = [net for net in outputs if self.joints.group(net) not in held]
        if len({self.joints.group(net) for net in made}) == 1:
            switched = self._switched(part, _GENERIC_ENABLE, inputs)
            self.conversions.append(Conversion(part.reference, inputs[0], made[0], switched))
            title = scene.title(part.reference)
            self.made_by.setdefault(made[0], f"{title} makes it, whose output the trade data does not tell")

    def _output(self, part: Part, facts: RegulatorFacts, inputs: set[str]) -> str:
        """Return the net that a regulator makes, beyond its coil or at its output pin; empty when neither tells."""
        scene = self.scene
        switches = scene.named_pins(part, facts.switch_pins or _GENERIC_SWITCH)
        switch_nets = {pin.net for pin in switches}
        outputs = [
            pin.net
            for pin in scene.named_pins(part, facts.output_pins)
            if pin.net not in scene.grounds and pin.net not in switch_nets
        ]
        groups = {self.joints.group(net) for net in inputs}
        beyond: list[str] = []
        for net in sorted(switch_nets):
            coils = across_coil(scene, net)
            beyond += [other for other in coils if self.joints.group(other) not in groups]
            if coils and not beyond:  # the coil comes from the input: a step-up, the diode leads on
                beyond += _after_diode(scene, net)
        if facts.through_inductor and beyond:
            return beyond[0]
        return outputs[0] if outputs else beyond[0] if beyond else ""

    def _unity(self, part: Part, facts: RegulatorFacts, feedback: list[Pin], output: str) -> bool:
        """Tell a regulator whose feedback pin stands on its output, or whose adjust pin is grounded."""
        if facts.formula == "floating":
            pins = feedback or self.scene.named_pins(part, facts.ground_pins)
            return bool(pins) and all(pin.net in self.scene.grounds for pin in pins)
        return bool(feedback) and self.joints.group(feedback[0].net) == self.joints.group(output)

    def _switched(self, part: Part, enable_pins: str, inputs: list[str]) -> bool:
        """Tell whether anything but its own input holds the enable pin of a regulator."""
        own = {self.joints.group(net) for net in inputs}
        for pin in self.scene.named_pins(part, enable_pins):
            if self.joints.group(pin.net) in own:
                continue
            others = [other for other in self.scene.pins_on[pin.net] if other.part != part.reference]
            if any(
                self.scene.kinds[other.part] not in ("resistor", "capacitor", "link", "test-point") for other in others
            ):
                return True
        return False

    # ---------------------------------------------------------------------------------------------- names, connectors

    def _from_names(self) -> None:
        scene = self.scene
        for net in sorted(scene.pins_on):
            if net in scene.grounds:
                continue
            known = self._named_volts(net)
            if known is None or not self._rail_like(net):
                continue
            volts, source = known
            ranged = volts.low < volts.high
            text = f"its name says {units.format_volts(volts.nominal)}"
            if ranged:
                ends = f"{units.format_volts(volts.low)} to {units.format_volts(volts.high)}"
                text = f"it is named like {source.row}: {ends}"
            self.add(net, "name", scene.tolerant(volts), Basis.TRACED, text, ranged=ranged)

    def _named_volts(self, net: str) -> tuple[Spread, Provenance] | None:
        """Return the voltage that a net's name carries, doubtful names left out.

        Notes
        -----
        ``5V_VIN`` is the input of the 5 V regulator. The underscore of ``VDD1_0`` is a point only on a net that reaches
        further than one part. ``P3V3_CLK`` is a signal, unless several supply pins and a capacitor stand on it.
        """
        scene = self.scene
        last = net.rpartition("/")[2]
        if re.search(r"[_-]VIN$", last, re.IGNORECASE):
            return None
        if scene.signal_named(net):
            head = re.match(r"[+]?[A-Z]{0,4}\d{1,2}V\d{0,2}(?=_)", last, re.IGNORECASE)
            supplied = {pin.part for pin in scene.supplies(net)}
            clear = head is not None and len(supplied) >= 2 and scene.decoupled(net)
            return scene.book.rail_volts(head.group(0)) if head is not None and clear else None
        alone = len({pin.part for pin in scene.pins_on[net] if scene.active(pin.part)}) < 2
        return None if alone and _BARE_POINT.search(last) else scene.book.rail_volts(net)

    def _rail_like(self, net: str) -> bool:
        """Tell whether a net named like a rail also keeps the company of one; ``5V_LED`` on a port pin does not."""
        scene = self.scene
        pins = scene.pins_on[net]
        if net[0] in "+-" or scene.keeps_company(net) or any(scene.keeps_company(n) for n in self._beside(net)):
            return True
        if any(scene.kinds[pin.part] == "battery" for pin in pins):
            return True
        if next(scene.signal_pins(net), None) is not None:
            return False
        parts = {pin.part for pin in pins if scene.kinds[pin.part] not in ("test-point", "power-flag")}
        plain = re.fullmatch(
            r"[A-Z]?\d{1,2}V\d{0,2}|\d{1,2}\.\d{1,2}V?|V(BUS|SYS|BAT)\w*", net.rpartition("/")[2], re.IGNORECASE
        )
        return len(parts) > 3 or (plain is not None and len(parts) >= 1)

    def _beside(self, net: str) -> tuple[str, ...]:
        group = self.joints.group(net)
        return self.joints.nets(group) if group in self.joints.members else ()

    def _from_pin_names(self, part: Part) -> None:
        """Take the voltage that a connector's pin, or a module's output pin, is named with."""
        scene = self.scene
        connector = scene.kinds[part.reference] == "connector"
        facts = None if connector else scene.facts(part.reference)
        told: dict[tuple[str, str], list[Pin]] = defaultdict(list)
        for pin in part.pins:
            if not pin.net or pin.unused or pin.net in scene.grounds:
                continue
            if not connector and scene.role(pin) != "out":
                continue
            if facts is not None and self._from_facts(part, pin, facts.supplies):
                continue
            word = next((word for word in plain_words(pin) if _VOLTS_WORD.search(word)), "")
            if not word or scene.book.looks_like_signal(word) or re.match(r"[DAP]\d", word):
                continue
            signal = connector and pin.kind in ("input", "bidirectional") and not scene.keeps_company(pin.net)
            if not signal and scene.book.rail_volts(word) is not None:
                told[pin.net, word].append(pin)
        for (net, word), pins in told.items():
            known = scene.book.rail_volts(word)
            assert known is not None
            volts = known[0]
            numbers = units_listed([pin.number for pin in pins])
            text = f"pin{'s' if len(pins) > 1 else ''} {numbers} of {scene.title(part.reference)} "
            text += f"{'are' if len(pins) > 1 else 'is'} named {pins[0].name}"
            asking = [other for other in scene.pins_on[net] if _POWER_DELIVERY.match(scene.parts[other.part].value)]
            if asking:
                text += f"; {scene.title(asking[0].part)} may ask for more, which only the settings can tell"
            self.add(net, "connector", scene.tolerant(volts), Basis.TRACED, text, ranged=volts.low < volts.high)

    def _from_facts(self, part: Part, pin: Pin, supplies: tuple[SupplyFacts, ...]) -> bool:
        """Take the voltage that the trade data gives for an output pin of a module; tell whether it did."""
        for supply in supplies:
            low, high = supply.low_volts, supply.high_volts
            if supply.role != "out" or not low or not high or high > 1.35 * low:
                continue
            pattern = re.compile(supply.pins, re.IGNORECASE)
            if any(pattern.fullmatch(word) for word in (pin.name, *plain_words(pin))):
                volts = Spread(low=low, nominal=round((low + high) / 2, 3), high=high)
                title = self.scene.title(part.reference)
                text = f"{title} gives {units.format_volts(volts.nominal)} at its pin {pin.name or pin.number}"
                self.add(pin.net, "connector", volts, Basis.LIBRARY, text, ranged=True)
                self._module_conversion(part, pin, supplies)
                return True
        return False

    def _module_conversion(self, part: Part, made: Pin, supplies: tuple[SupplyFacts, ...]) -> None:
        """Note that a module makes its output from the one net that it is fed by."""
        scene = self.scene
        patterns = [supply.pins for supply in supplies if supply.role in ("in", "usb")]
        fed = {pin.net for pattern in patterns for pin in scene.named_pins(part, pattern)} - set(scene.grounds)
        if len({self.joints.group(net) for net in fed}) == 1:
            self.conversions.append(Conversion(part.reference, min(fed), made.net, switched=False))

    def _from_battery(self, part: Part) -> None:
        scene = self.scene
        title = scene.title(part.reference)
        live = [pin for pin in part.pins if pin.net and pin.net not in scene.grounds]
        if _CHARGER.match(part.value):
            for pin in live:
                if any(_BATTERY_PIN.fullmatch(word) for word in plain_words(pin)):
                    text = f"the charger {title} keeps a Li-ion cell on it, 3 to 4.2 V"
                    self.add(pin.net, "battery", LITHIUM_CELL, Basis.TRACED, text, ranged=True)
            return
        words = f"{part.value} {part.symbol} {part.footprint.rpartition(':')[2]}"
        cell = next(
            (cell for pattern, cell in ((_COIN, COIN_CELL), (_LITHIUM, LITHIUM_CELL)) if pattern.search(words)), None
        )
        positive = [
            pin
            for pin in live
            if pin.name.strip() in ("+", "Pos", "P", "PLUS", "") or "+" in pin.name or pin.number == "1"
        ]
        header = scene.kinds[part.reference] == "connector"
        if header and not re.match(r"B(AT|T)", part.reference, re.IGNORECASE):
            return
        if cell is not None and positive and len(live) <= 2:
            text = f"{title} is a cell of {cell.low:g} to {cell.high:g} V"
            self.add(positive[0].net, "battery", cell, Basis.TRACED, text, ranged=True)

    # ----------------------------------------------------------------------------------------------------------- use

    def from_use(self, nets: tuple[str, ...]) -> Evidence | None:
        """Return what the names of the supply pins on some joined nets agree on (``VDD33``), or None."""
        found: list[tuple[Spread, str]] = []
        for net in nets:
            for pin in self.scene.supplies(net):
                for word in plain_words(pin):
                    bus = re.fullmatch(r"V_?BUS|VUSB|USB_?VBUS", word, re.IGNORECASE)
                    plain = re.search(r"\d", word) and not _BARE_POINT.search(word) and not re.search(r"_\d+_\d", word)
                    if not (bus or plain) or self.scene.book.looks_like_signal(word):
                        continue
                    known = self.scene.book.rail_volts(word)
                    if known is not None and (bus or known[0].low == known[0].high):
                        title = self.scene.title(pin.part)
                        found.append((known[0], f"pin {pin.number} of {title} is named {pin.name}"))
        if not found or any(abs(volts.nominal - found[0][0].nominal) > 0.01 for volts, _ in found):
            return None
        volts = self.scene.tolerant(found[0][0])
        return Evidence(kind="use", volts=volts, basis=Basis.ASSUMED, text=f"{found[0][1]}, nothing else tells")


def units_listed(words: list[str], most: int = 6) -> str:
    """Return words as a list for the user, in natural order, cut after ``most``."""
    ordered = sorted(dict.fromkeys(words), key=units.natural_key)
    return ", ".join(ordered[:most]) + (f" and {len(ordered) - most} more" if len(ordered) > most else "")


def _after_diode(scene: Scene, net: str) -> list[str]:
    found = []
    for pin in scene.pins_on.get(net, ()):
        if scene.kinds[pin.part] == "diode":
            found += [cathode.net for anode, cathode in diode_pairs(scene.parts[pin.part]) if anode.net == net]
    return [other for other in found if other and other not in scene.grounds]
