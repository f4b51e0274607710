"""The board as the tracing of rails sees it: kinds of parts, what stands on each net, grounds, supply pins."""

from __future__ import annotations

import re
from collections import defaultdict, deque
from collections.abc import Iterator
from functools import cached_property

from levelcrossing import partkinds, units
from levelcrossing.model import Board, ControlFacts, Part, PartFacts, Pin, RegulatorFacts, Settings, Spread
from levelcrossing.pinnames import looks_like_supply, pin_words
from levelcrossing.tradebook import Tradebook

DECOUPLED_FARADS = 90e-9
"""From here on a capacitor to ground counts as decoupling [F]: 100 nF less its tolerance (common practice)."""

_GROUND_PIN = re.compile(r"[A-Z0-9]{0,5}_?GND(_?[A-Z0-9.]+)?|VSS[A-Z0-9_.]*|GNDPAD|GROUND|[ADP]VSS|0V", re.IGNORECASE)
_PAD_PIN = re.compile(r"EP(AD)?|PAD|EXP(OSED)?.?PAD|THERMAL.*|TAB|MP\d*|SH\d*|SHIELD|SHELL", re.IGNORECASE)
# Pins that look like supply pins and are none: references, pumps, sense, switch nodes, thresholds (naming habits).
_NO_SUPPLY = re.compile(
    r".*[AV]REF.*|REF\w*|V?CAP.*|V?BST\d?|V?BOOT\d?|.*SENSE?.*|.*SNS.*|V?FB\d?|VCOMP?|VCP|VPUMP|"
    r"(.*_)?(SW|LX|PH|PHASE)\d?|"
    r"(.*_)?EN\d?|PG.*|.*GOOD|V(OS|O?SET|TH|ADJ|TT?REF|SEL|OTP|COM)|BYP.*|NR|SS|(.*_)?(DET|MON|OK|VALID)|R?ZQ\d?|"
    r"R?BIAS|REXT|[RI]SET|NC\d*|N/?C|DNU|RFU|V[PN]",
    re.IGNORECASE,
)
_OUTPUT_PIN = re.compile(r"V?_?OUT\d?|VO(_\w+)?|.*_?OUT|V?REG_?OUT.*|VREG\d?", re.IGNORECASE)
_SWITCH_PIN = re.compile(r"(.*_)?(SW|LX|PH|PHASE|SWN|VSW|SWITCH)\d?[A-Z]?|L[12]?", re.IGNORECASE)
_GROUND_WORD = re.compile(r"[A-Z]?GND\d?|VSS[AD]?", re.IGNORECASE)
# Nets called so are supplies even where only pull-ups and transistors hang on them (naming habits); HV and LV are the
# two sides of a level-shifter board.
_SUPPLY_NET = re.compile(
    r"[+]?([AD]?V(CC|DD)[A-Z0-9]{0,3}|V_?(IN|IO|MOT|M|SYS|LOGIC|EXT|HIGH|LOW|TARGET|REF[AB])\d?|HV|LV)", re.IGNORECASE
)
ACTIVE = ("ic", "regulator")


class Scene:
    """What stands where.

    Parameters
    ----------
    board : Board
    book : Tradebook
    settings : Settings

    Attributes
    ----------
    parts : dict
        Fitted parts by reference.
    kinds : dict
        Their kinds.
    pins_on : dict
        Pins of fitted parts by net.
    grounds : dict
        Ground nets with the reason to believe it.
    farads : dict
        Capacitance from each net to ground [F].
    """

    def __init__(self, board: Board, book: Tradebook, settings: Settings) -> None:
        self.board = board
        self.book = book
        self.settings = settings
        self.parts = {part.reference: part for part in board.parts if part.fitted}
        self.kinds = {reference: partkinds.kind_of(part) for reference, part in self.parts.items()}
        self.pins_on: dict[str, list[Pin]] = defaultdict(list)
        for part in self.parts.values():
            for pin in part.pins:
                if pin.net:
                    self.pins_on[pin.net].append(pin)
        self._roles: dict[tuple[str, str], str] = {}
        self._companies: dict[str, bool] = {}
        self._converters: dict[str, bool] = {}
        self._facts: dict[str, PartFacts | None] = {}
        self._signals: dict[str, bool] = {}
        self.grounds = self._find_grounds()
        self.farads, self._unread = self._decoupling()

    # ------------------------------------------------------------------------------------------------------ parts, pins

    def active(self, reference: str) -> bool:
        """Tell whether a part is an integrated circuit, a module or a regulator."""
        return self.kinds[reference] in ACTIVE

    def facts(self, reference: str) -> PartFacts | None:
        """Return what the trade library knows of a part, looked up once."""
        if reference not in self._facts:
            self._facts[reference] = self.book.part(self.parts[reference])
        return self._facts[reference]

    @cached_property
    def regulators(self) -> dict[str, RegulatorFacts]:
        """Regulators that the trade library knows, by reference."""
        found = {}
        for reference, part in self.parts.items():
            if self.active(reference) and 3 <= len(part.pins) <= 120:
                facts = self.book.regulator(part)
                if facts is not None:
                    found[reference] = facts
        return found

    def role(self, pin: Pin) -> str:
        """Tell what a pin is to its supply.

        Returns
        -------
        str
            ``in`` (the part is powered through it), ``out`` (the part powers others through it), ``ground``, or empty.
        """
        key = (pin.part, pin.number)
        if key not in self._roles:
            self._roles[key] = self._find_role(pin)
        return self._roles[key]

    def _find_role(self, pin: Pin) -> str:
        if not self.active(pin.part):
            return ""
        facts = self.facts(pin.part)
        if facts is not None:
            if facts.translator is not None and self._reference_pin(pin, facts.translator.controls):
                return ""
            direction = facts.pin(pin).direction
            if direction is not None:
                return {"supply": "in", "supply-out": "out", "ground": "ground"}.get(direction, "")
        words = plain_words(pin)
        first = words[0] if words else ""
        if _GROUND_PIN.fullmatch(first) or (_PAD_PIN.fullmatch(first) and pin.kind != "output"):
            return "ground"
        if _NO_SUPPLY.fullmatch(first):
            return ""
        if re.fullmatch(r"V_?IN_[A-Z].*", first, re.IGNORECASE) and pin.kind != "power_in":
            return ""  # a picture or sound input
        if pin.kind == "power_out":
            return "out"
        if not looks_like_supply(pin):
            return ""
        if pin.kind == "output" or _OUTPUT_PIN.fullmatch(first):
            return "out"
        return "in"

    @staticmethod
    def _reference_pin(pin: Pin, controls: tuple[ControlFacts, ...]) -> bool:
        """Tell the bias pin of a pass translator; a resistor of 200 kilohm feeds it, which makes no rail."""
        return any(
            control.use == "reference" and control.pins and re.fullmatch(control.pins, word, re.IGNORECASE)
            for control in controls
            for word in (pin.name, *plain_words(pin))
        )

    def converter(self, reference: str) -> bool:
        """Tell whether a part makes supplies: a regulator known or named so, or one with a switch node."""
        if reference in self.regulators or self.kinds[reference] == "regulator":
            return True
        if reference not in self._converters:
            part = self.parts[reference]
            small = self.active(reference) and len(part.pins) <= 60
            self._converters[reference] = small and any(
                pin.net and self._switch_pin(pin) and not self.decoupled(pin.net) for pin in part.pins
            )
        return self._converters[reference]

    def named_pins(self, part: Part, pattern: str) -> list[Pin]:
        """Return the connected pins of a part whose name, or one of its alternates, matches a pattern as a whole."""
        if not pattern:
            return []
        wanted = re.compile(pattern, re.IGNORECASE)
        return [
            pin
            for pin in part.pins
            if pin.net and (wanted.fullmatch(pin.name) or any(wanted.fullmatch(word) for word in plain_words(pin)))
        ]

    # ------------------------------------------------------------------------------------------------------------- nets

    def supplies(self, net: str, role: str = "in") -> list[Pin]:
        """Return the pins on a net that have a role for the supply of their part."""
        return [pin for pin in self.pins_on.get(net, ()) if self.role(pin) == role]

    def signal_pins(self, net: str) -> Iterator[Pin]:
        """Yield the pins of integrated circuits on a net that are no supply pins."""
        for pin in self.pins_on.get(net, ()):
            if self.active(pin.part) and not self.role(pin) and pin.part not in self.regulators:
                yield pin

    def signal_named(self, net: str) -> bool:
        """Tell whether a net's name is a signal's, although it may hold a voltage."""
        if net not in self._signals:
            self._signals[net] = self.book.looks_like_signal(net)
        return self._signals[net]

    def pulled_supply(self, net: str) -> bool:
        """Tell a supply by its name that feeds no integrated circuit: two parts at least hang on it, and no signal."""
        if not _SUPPLY_NET.fullmatch(net.rpartition("/")[2]) or next(self.signal_pins(net), None) is not None:
            return False
        hanging = ("resistor", "resistor-pack", "transistor", "capacitor", "connector")
        parts = {pin.part for pin in self.pins_on.get(net, ()) if self.kinds[pin.part] in hanging}
        return len(parts) >= 2 and any(self.kinds[part].startswith(("resistor", "transistor")) for part in parts)

    def decoupled(self, net: str) -> bool:
        """Tell whether a net has a capacitor of 100 nF or more to ground, or one whose value cannot be read."""
        return self.farads.get(net, 0.0) >= DECOUPLED_FARADS or net in self._unread

    def keeps_company(self, net: str) -> bool:
        """Tell whether a net has the company of a rail: a supply pin or a decoupling capacitor."""
        if net not in self._companies:
            supplied = any(self.role(pin) in ("in", "out") for pin in self.pins_on.get(net, ()))
            self._companies[net] = supplied or self.decoupled(net)
        return self._companies[net]

    def switching(self, net: str) -> bool:
        """Tell whether a net is the switch node of a converter: no rail, although coils lead to it."""
        if self.decoupled(net):
            return False
        return any(self.active(pin.part) and self._switch_pin(pin) for pin in self.pins_on.get(net, ()))

    def _switch_pin(self, pin: Pin) -> bool:
        facts = self.regulators.get(pin.part)
        pattern = facts.switch_pins if facts is not None else ""
        words = (pin.name, *plain_words(pin))
        return any(
            _SWITCH_PIN.fullmatch(word) or (pattern and re.fullmatch(pattern, word, re.IGNORECASE)) for word in words
        )

    def _decoupling(self) -> tuple[dict[str, float], set[str]]:
        farads: dict[str, float] = defaultdict(float)
        unread: set[str] = set()
        for reference, part in self.parts.items():
            if self.kinds[reference] != "capacitor":
                continue
            value = units.parse_capacitance(part.value)
            for a, b in partkinds.element_pairs(part):
                for net, other in ((a.net, b.net), (b.net, a.net)):
                    if net and other in self.grounds and net not in self.grounds:
                        if value is None:
                            unread.add(net)
                        else:
                            farads[net] += value
        return farads, unread

    # ---------------------------------------------------------------------------------------------------------- grounds

    def _find_grounds(self) -> dict[str, str]:
        declared = {net for net, volts in self.settings.rails.items() if abs(volts.nominal) > 0.5}
        grounds: dict[str, str] = {}
        for net in sorted(self.pins_on):
            if net in declared:
                continue
            if self._named_ground(net):
                grounds[net] = "it is named like ground"
            elif self._grounded_pins(net):
                grounds[net] = "ground pins stand on it"
        queue = deque(grounds)
        while queue:
            net = queue.popleft()
            for pin in self.pins_on[net]:
                for a, b in partkinds.joined_pins(self.parts[pin.part]):
                    other = b.net if a.net == net else a.net if b.net == net else ""
                    if other and other not in grounds and other not in declared and self._like_ground(other):
                        grounds[other] = f"joined to {net} through {pin.part}"
                        queue.append(other)
        return grounds

    def _named_ground(self, net: str) -> bool:
        """Tell a ground by its name; ``GND_SENSE`` is none, ``PSADC_AGND`` is one when ground pins stand on it.

        ``VSS`` is the negative supply where amplifiers have their ``V-`` on it and the board has another ground.
        """
        if self.signal_named(net):
            return False
        if self.book.looks_like_ground(net):
            below = any(re.fullmatch(r"V-|VEE|VS-|-VS", pin.name, re.IGNORECASE) for pin in self.pins_on[net])
            own = re.fullmatch(r"VSS[AD]?", net.rpartition("/")[2], re.IGNORECASE) is not None
            return not (own and below and any(other.rpartition("/")[2].upper() == "GND" for other in self.pins_on))
        words = re.split(r"[_\-. ]", net.rpartition("/")[2])
        named = any(_GROUND_WORD.fullmatch(word) for word in words) and not net.startswith(("Net-(", "unconnected-("))
        return named and self._like_ground(net)

    def _grounded_pins(self, net: str) -> bool:
        """Tell a ground by its pins: those of two parts at least stand on it, and nothing there is fed or drives."""
        grounded: set[str] = set()
        for pin in self.pins_on[net]:
            if not self.active(pin.part):
                continue
            role = self.role(pin)
            if role == "ground" and any(_GROUND_PIN.fullmatch(word) for word in plain_words(pin)):
                grounded.add(pin.part)
            elif role in ("in", "out") or pin.kind in ("output", "power_out"):
                return False
        return len(grounded) >= 2 and self.book.rail_volts(net) is None

    def _like_ground(self, net: str) -> bool:
        roles = {self.role(pin) for pin in self.pins_on[net] if self.active(pin.part)}
        return "ground" in roles and not roles & {"in", "out"} and self.book.rail_volts(net) is None

    # ----------------------------------------------------------------------------------------------------------- more

    def tolerant(self, volts: Spread) -> Spread:
        """Give a voltage that states no tolerance the one of the settings."""
        return volts if volts.low < volts.high else Spread.around(volts.nominal, self.settings.rail_tolerance)

    def title(self, reference: str) -> str:
        """Return a part for the user: ``U3 (AP2112K-3.3)``."""
        value = self.parts[reference].value.strip()
        return f"{reference} ({value})" if value and value not in ("~", reference) else reference


def plain_words(pin: Pin) -> tuple[str, ...]:
    """Split a pin name into its alternates, without subscript and overbar marks."""
    return pin_words(pin.name.replace("_{", "").replace("^{", "").replace("}", "").replace("~{", "").replace("~", ""))
