"""The vocabulary: what every step of a review takes and gives.

Everything here is frozen. Voltages are volts against ground, currents amperes, resistances ohms, capacitances farads,
times seconds. A name that ends in a unit holds a bare float in that unit.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from enum import StrEnum
from typing import Any

# --------------------------------------------------------------------------------------------------- small quantities


class Basis(StrEnum):
    """Where a figure came from; the order of definition is from strongest to weakest."""

    DECLARED = "declared"
    LIBRARY = "library"
    TRACED = "traced"
    ASSUMED = "assumed"

    @property
    def rank(self) -> int:
        """Position from strongest (0) to weakest (3)."""
        return list(Basis).index(self)

    @staticmethod
    def weakest(*bases: Basis) -> Basis:
        """Return the weakest of several; ``DECLARED`` when there are none."""
        return max(bases, key=lambda basis: basis.rank, default=Basis.DECLARED)


class Outcome(StrEnum):
    """A verdict, from worst to best."""

    DAMAGE = "damage"
    MALFUNCTION = "malfunction"
    MARGINAL = "marginal"
    UNKNOWN = "unknown"
    SOUND = "sound"

    @property
    def rank(self) -> int:
        """Position from worst (0) to best (4)."""
        return list(Outcome).index(self)

    @staticmethod
    def worst(*outcomes: Outcome) -> Outcome:
        """Return the worst of several; ``SOUND`` when there are none."""
        return min(outcomes, key=lambda outcome: outcome.rank, default=Outcome.SOUND)


@dataclass(frozen=True, slots=True, kw_only=True)
class Spread:
    """A quantity with its extremes.

    Parameters
    ----------
    low, nominal, high : float
        Least, usual and greatest value, in the unit that the owner of the spread states.
    """

    low: float
    nominal: float
    high: float

    @staticmethod
    def exactly(value: float) -> Spread:
        """Return a spread without width."""
        return Spread(low=value, nominal=value, high=value)

    @staticmethod
    def around(value: float, tolerance: float) -> Spread:
        """Return ``value`` plus and minus the fraction ``tolerance`` [1]."""
        reach = abs(value) * tolerance
        return Spread(low=value - reach, nominal=value, high=value + reach)

    def shifted(self, offset: float) -> Spread:
        """Return the spread moved by ``offset`` [same unit]."""
        return Spread(low=self.low + offset, nominal=self.nominal + offset, high=self.high + offset)

    def scaled(self, factor: float) -> Spread:
        """Return the spread times a positive ``factor`` [1]."""
        return Spread(low=self.low * factor, nominal=self.nominal * factor, high=self.high * factor)


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """A voltage as a function of the supply of its pin, e.g. ``0.7*V``.

    Parameters
    ----------
    text : str
        The expression as written in the trade data (several, by supply range, joined with `` | ``).
    pieces : tuple of (float, float, callable)
        Supply range [V] (both ends included) and the function from supply [V] to level [V] valid in it. The callables
        take floats or numpy arrays.
    """

    text: str
    pieces: tuple[tuple[float, float, Callable[[Any], Any]], ...] = field(compare=False)

    def at(self, supply_volts: float) -> float:
        """Return the level at one supply voltage.

        Parameters
        ----------
        supply_volts : float
            Supply of the pin [V].

        Returns
        -------
        float
            Level [V]. Outside all ranges the nearest range's expression is used.
        """
        best: tuple[float, float] | None = None
        for low, high, function in self.pieces:
            distance = max(low - supply_volts, supply_volts - high, 0.0)
            if best is None or distance < best[0]:
                best = (distance, float(function(supply_volts)))
        assert best is not None
        return best[1]


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """A line in a file of the reviewed project; lines and columns count from 1, 0 means unknown."""

    file: str
    line: int
    column: int = 0


# ----------------------------------------------------------------------------------------------------------- the board


@dataclass(frozen=True, slots=True, kw_only=True)
class Pin:
    """One pin of a part, as the netlist has it.

    Parameters
    ----------
    part : str
        Reference of the part.
    number : str
        Pin number, text.
    name : str
        Pin name as written (may hold ``~{...}``, ``/``); empty when the symbol gives none.
    kind : str
        Electrical type in one spelling whatever the file's age: ``input``, ``output``, ``bidirectional``,
        ``tri_state``, ``passive``, ``free``, ``unspecified``, ``power_in``, ``power_out``, ``open_collector``,
        ``open_emitter``, ``no_connect``; empty when the netlist does not say.
    net : str
        Name of the net it is on; empty when on none.
    unused : bool
        Marked as deliberately not connected.
    """

    part: str
    number: str
    name: str
    kind: str
    net: str
    unused: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """One part of a board.

    Parameters
    ----------
    reference, value, footprint, description : str
        As written.
    library, symbol : str
        Library and name of the schematic symbol (``74xx``, ``74LS245``).
    fields : tuple of (str, str)
        User fields in file order, without reference, value, footprint and datasheet.
    fitted : bool
        False when a not-fitted property or a not-fitted value (``NA(...)``, ``DNP``) says so.
    not_fitted_why : str
        The evidence for ``fitted == False``.
    sheet : str
        Path of the sheet (``/power/``).
    uuids : tuple of str
        Identifiers of the symbol's units in the sheets; order carries no meaning.
    pins : tuple of Pin
        All pins that the symbol or the nets name, in natural order of their numbers.
    """

    reference: str
    value: str
    library: str = ""
    symbol: str = ""
    description: str = ""
    keywords: str = ""
    footprint: str = ""
    fields: tuple[tuple[str, str], ...] = ()
    fitted: bool = True
    not_fitted_why: str = ""
    sheet: str = "/"
    uuids: tuple[str, ...] = ()
    pins: tuple[Pin, ...] = ()

    def field(self, *names: str) -> str:
        """Return the first non-empty field of one of these names (case ignored), or an empty text."""
        wanted = [name.casefold() for name in names]
        for wish in wanted:
            for name, text in self.fields:
                if name.casefold() == wish and text:
                    return text
        return ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Net:
    """One net: its name and its pins as (reference, pin number), sorted."""

    name: str
    pins: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Board:
    """A whole board as read.

    Parameters
    ----------
    path : str
        The reviewed file as the user named it.
    form : str
        ``netlist``, ``xml`` or ``sheets``.
    maker : str
        What wrote the file (``Eeschema 9.0.2``).
    parts : tuple of Part
        Sorted by reference, natural order.
    nets : tuple of Net
        Sorted by name.
    remarks : tuple of str
        What the reader had to put right or leave out, one line each.
    sheet_files : tuple of str
        Sheets that the board was drawn on, where the file names them (relative to ``path``).
    """

    path: str
    form: str
    maker: str = ""
    parts: tuple[Part, ...]
    nets: tuple[Net, ...]
    remarks: tuple[str, ...] = ()
    sheet_files: tuple[str, ...] = ()


# ----------------------------------------------------------------------------------- what the trade data knows (facts)


@dataclass(frozen=True, slots=True, kw_only=True)
class Provenance:
    """Where a row of trade data comes from.

    Parameters
    ----------
    row : str
        Identifier of the row.
    source : str
        Document, with table or page where known.
    certainty : str
        ``datasheet``, ``secondary``, ``memory`` or ``practice``.
    file, line
        Where the row stands.
    groups : tuple of (str, str)
        Groups of figures (``levels``, ``outputs``, ``maxima``, ``rates``, ``reverse_gain``) of another certainty.
    """

    row: str
    source: str
    certainty: str
    file: str = ""
    line: int = 0
    groups: tuple[tuple[str, str], ...] = ()

    def certainty_of(self, *groups: str) -> str:
        """Return how sure the least sure of some groups of figures is."""
        order = ("datasheet", "secondary", "practice", "memory")
        known = dict(self.groups)
        found = [known.get(group, self.certainty) for group in groups] or [self.certainty]
        return max(found, key=lambda one: order.index(one) if one in order else 0)


@dataclass(frozen=True, slots=True, kw_only=True)
class OutputPoint:
    """One guaranteed point of an output: at this supply, this level at this current.

    Parameters
    ----------
    supply_volts : float
        Supply at which the point is specified [V].
    voh, vol : Level or None
        Least high and greatest low level [V].
    ioh_amps, iol_amps : float
        Current at which each holds, positive [A].
    """

    supply_volts: float
    voh: Level | None = None
    ioh_amps: float = 0.0
    vol: Level | None = None
    iol_amps: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PinFacts:
    """What the trade data says of one pin; None means that it says nothing.

    Parameters
    ----------
    direction : str or None
        ``in``, ``out``, ``inout``, ``open-drain`` (drives low only; may also be read), ``open-source``, ``analog``,
        ``supply``, ``supply-out``, ``ground``, ``passive``.
    supply : str or None
        Regular expression (full match, case ignored) on the names of the pins that may supply this one; the I/O supply.
    supply_volts : float or None
        A fixed internal I/O voltage [V] (a module powered by 5 V that talks 3.3 V).
    vih, vil : Level or None
        Guaranteed input levels [V].
    vmax, vmax_off : Level or None
        Absolute maximum input voltage [V] with the supply up, and with it off.
    vmin : Level or None
        Least permitted input voltage [V].
    clamp_high, clamp_low : bool or None
        A diode to the supply, to ground.
    injection_amps : float or None
        Continuous input clamp current that the maker allows [A].
    outputs : tuple of OutputPoint
        Rated output points.
    open_high, open_low : Level or None
        High and low of the unloaded output [V], where those are not the supply and ground.
    output_amps : float or None
        Absolute maximum output current [A].
    capacitance_farads : float or None
        Input capacitance [F].
    side : str
        ``a`` or ``b`` on a two-sided part, else empty.
    channel : str
        Pins of equal channel belong together (``A3`` with ``B3``), empty when none.
    schmitt, pull_up_ohms
        Schmitt input; built-in pull-up [ohm].
    note : str
        A remark for the user.
    """

    direction: str | None = None
    supply: str | None = None
    supply_volts: float | None = None
    vih: Level | None = None
    vil: Level | None = None
    vmax: Level | None = None
    vmax_off: Level | None = None
    vmin: Level | None = None
    clamp_high: bool | None = None
    clamp_low: bool | None = None
    injection_amps: float | None = None
    outputs: tuple[OutputPoint, ...] = ()
    open_high: Level | None = None
    open_low: Level | None = None
    output_amps: float | None = None
    capacitance_farads: float | None = None
    side: str = ""
    channel: str = ""
    pull_up_ohms: float | None = None
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SupplyFacts:
    """A supply pin of a part: which names, which operating range [V], which role.

    ``role`` is ``io``, ``core``, ``analog``, ``motor``, ``usb``, ``backup``, ``in`` or ``out``.
    """

    pins: str
    low_volts: float | None
    high_volts: float | None
    role: str


@dataclass(frozen=True, slots=True, kw_only=True)
class TranslatorFacts:
    """What is special about a two-sided part.

    Parameters
    ----------
    kind : str
        ``auto-buffer``, ``auto-pass``, ``fet-switch``, ``dual-dir``, ``dual-fixed``, ``single``, ``bus-switch``,
        ``i2c-buffer``, ``isolator``.
    a_supply, b_supply : str
        Regular expressions on the supply pins' names of each side; empty for one-supply parts.
    a_range, b_range : tuple of float
        Supply ranges [V].
    order : str
        ``a<=b``, ``b<=a``, ``a+0.8<=b`` ... or ``any``.
    direction : str
        ``dir-pin``, ``a-to-b``, ``b-to-a``, ``auto``, ``by-channel``.
    controls : tuple of ControlFacts
        Enable, direction and reference pins.
    pull_least_ohms : float or None
        Smallest external pull-up or pull-down that still works [ohm].
    output_ohms : float or None
        Static output resistance [ohm] of a weak driver.
    pull_up_ohms : float or None
        Built-in pull-ups [ohm].
    pull_up_needed : bool
        External pull-ups are required.
    open_drain_ok, push_pull_ok : bool
        Fit for open-drain lines, for push-pull drivers.
    switch_ohms, switch_threshold_volts : float or None
        On-resistance [ohm] and threshold [V] of a pass switch.
    pass_level : Level or None
        Highest level that a switch passes [V], as an expression of its supply.
    rates : tuple of RatePoint
        Data rates that the maker states.
    load_most_farads : float or None
        Largest load [F].
    partial_power_down : bool
        I/O pins are off when a supply is off.
    inverting : bool
    """

    kind: str
    a_supply: str = ""
    b_supply: str = ""
    a_range: tuple[float, float] | None = None
    b_range: tuple[float, float] | None = None
    order: str = "any"
    direction: str = "auto"
    controls: tuple[ControlFacts, ...] = ()
    pull_least_ohms: float | None = None
    output_ohms: float | None = None
    pull_up_ohms: float | None = None
    pull_up_needed: bool = False
    open_drain_ok: bool = True
    push_pull_ok: bool = True
    switch_ohms: float | None = None
    switch_threshold_volts: float | None = None
    pass_level: Level | None = None
    rates: tuple[RatePoint, ...] = ()
    load_most_farads: float | None = None
    partial_power_down: bool = False
    inverting: bool = False
    notes: tuple[str, ...] = ()

    def rate_at(self, a_volts: float | None, b_volts: float | None, *, open_drain: bool) -> float | None:
        """Return the data rate that the maker states at these supplies [bit/s], None when it states none.

        A point holds from its supplies upwards (5 % below them still counts), of several that hold the fastest. Below
        all of them the part is slower than the slowest point, which is then the answer.
        """
        drains = [point for point in self.rates if point.open_drain]
        points = drains if open_drain and drains else [point for point in self.rates if not point.open_drain]
        holding = [
            point
            for point in points
            if all(
                need is None or have is None or have >= 0.95 * need
                for need, have in ((point.a_volts, a_volts), (point.b_volts, b_volts))
            )
        ]
        if holding:
            return max(point.bits_per_second for point in holding)
        return min((point.bits_per_second for point in points), default=None)


@dataclass(frozen=True, slots=True, kw_only=True)
class RatePoint:
    """A data rate that a translator's maker states [bit/s], the supplies it holds at [V], and whether for open drains."""

    bits_per_second: float
    a_volts: float | None = None
    b_volts: float | None = None
    open_drain: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class ControlFacts:
    """A control pin of a translator: its name pattern, use, the supply that its threshold belongs to, active level.

    ``use`` is ``enable``, ``direction``, ``reference``; ``active`` is ``H`` or ``L``; ``meaning`` says what the active
    level does (``a-to-b`` for a direction pin). ``supply`` is a regular expression on supply pin names.
    """

    pins: str
    use: str
    supply: str
    active: str = "H"
    meaning: str = ""
    most_volts: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PartFacts:
    """All that the trade data knows of one part.

    Parameters
    ----------
    title : str
        Name of the row for people (``74LVC``, ``ATmega328P``).
    group : str
        ``logic``, ``mcu``, ``fpga``, ``module``, ``memory``, ``sensor``, ``display``, ``transceiver``, ``driver``,
        ``translator``, ``analog``, ``passive``, ``connector``, ``other``.
    provenance : Provenance
    supplies : tuple of SupplyFacts
    pin : callable
        ``pin(Pin) -> PinFacts``: the part's defaults with the first matching exception laid over them.
    translator : TranslatorFacts or None
    partial_power_down : bool or None
        Inputs tolerate a voltage while the part is off.
    matched : str
        Which text of the part matched (``value``, ``field MPN``, ``symbol``).
    doubtful : str
        Why the row is doubtful; empty when it is not.
    """

    title: str
    group: str
    provenance: Provenance
    supplies: tuple[SupplyFacts, ...] = ()
    pin: Callable[[Pin], PinFacts] = field(compare=False)
    translator: TranslatorFacts | None = None
    partial_power_down: bool | None = None
    matched: str = "value"
    doubtful: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class MosfetFacts:
    """A MOSFET: polarity ``n`` or ``p``, threshold [V], gain [A/V²], capacitances [F], limits [V, A].

    For a P channel all voltages are given as magnitudes.
    """

    polarity: str
    threshold_volts: Spread
    gain: Spread
    ciss_farads: float
    coss_farads: float
    crss_farads: float
    body_drop_volts: float
    vgs_max_volts: float
    vds_max_volts: float
    gate_least_volts: float
    id_max_amps: float
    provenance: Provenance
    generic: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class BipolarFacts:
    """A bipolar transistor: polarity ``npn`` or ``pnp``, current gains [1], capacitances [F], times [s], limits [V, A].

    ``base_ohms`` and ``base_emitter_ohms`` are the built-in resistors of a digital transistor, 0 and None without.
    """

    polarity: str
    beta_forward: Spread
    beta_reverse: Spread
    vbe_volts: float
    vbe_at_amps: float
    vce_sat_volts: float
    cbe_farads: float
    cbc_farads: float
    transit_s: float
    storage_s: Spread
    vebo_volts: float
    vceo_volts: float
    ic_max_amps: float
    base_ohms: float
    base_emitter_ohms: float | None
    provenance: Provenance
    generic: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class DiodeFacts:
    """A diode or Zener: forward points (amperes, typical volts, greatest volts), breakdown [V] at a current [A].

    ``kind`` is ``signal``, ``schottky``, ``rectifier``, ``led``, ``zener``, ``suppressor``.
    ``zener_ohms`` is the differential resistance at ``zener_amps``; ``knee_ohms`` the one at ``knee_amps``.
    """

    kind: str
    forward: tuple[tuple[float, float, float], ...]
    capacitance_farads: float
    reverse_max_volts: float
    zener_volts: Spread | None
    zener_amps: float
    zener_ohms: float
    knee_ohms: float
    knee_amps: float
    forward_max_amps: float
    provenance: Provenance
    generic: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class RegulatorFacts:
    """A voltage regulator.

    Parameters
    ----------
    output : Spread or None
        Fixed output [V], negative for a negative regulator; None when adjustable.
    reference : Spread or None
        Feedback voltage of an adjustable part [V].
    formula : str
        ``ground-referred`` (vout = vref (1 + top/bottom)), ``floating`` (LM317: vref between OUT and ADJ), ``none``.
    adjust_amps : float
        Current out of the ADJ pin [A].
    input_pins, output_pins, feedback_pins, enable_pins, switch_pins : str
        Regular expressions on pin names (full match, case ignored); may be empty.
    through_inductor : bool
        The rail is the far side of an inductor on the switch pin.
    input_max_volts, dropout_volts : float or None
    isolated : bool
    """

    output: Spread | None
    reference: Spread | None
    formula: str
    adjust_amps: float
    input_pins: str
    output_pins: str
    ground_pins: str
    feedback_pins: str
    enable_pins: str
    switch_pins: str
    through_inductor: bool
    input_max_volts: float | None
    dropout_volts: float | None
    isolated: bool
    provenance: Provenance


@dataclass(frozen=True, slots=True, kw_only=True)
class BusMode:
    """One speed class of a bus: bit rate [bit/s], edge limits [s], largest load [F], required sink current [A] at a low [V]."""

    name: str
    bits_per_second: float
    rise_max_s: float | None = None
    fall_max_s: float | None = None
    load_max_farads: float | None = None
    sink_amps: float | None = None
    sink_volts: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class BusFacts:
    """What the trade data says of a kind of bus.

    Parameters
    ----------
    name, title : str
        ``i2c``, ``spi``, ``uart`` ..., and how people write it.
    nets, pins : tuple of (str, str)
        Role (``scl``) and regular expression on net names (last component) and on pin names.
    bits_per_second : float or None
        Usual rate [bit/s]; None where no rate can be said.
    least_bits_per_second : float or None
        Slowest rate that the bus is used at, or the rate that its standard fixes [bit/s]; ``least_why`` says which.
    together : tuple of tuple of str
        Roles that must be there together before names tell the bus; empty when one name is enough.
    parts : str
        Regular expression on values and symbols of parts whose pins tell the bus.
    rise_max_s : float or None
        Longest 10-90 % rise that the bus allows [s] (30-70 % for I2C).
    rise_fraction : float or None
        The same as a fraction of the bit time [1].
    open_drain, both_directions : bool
    modes : tuple of BusMode
    notes : tuple of str
    provenance : Provenance
    """

    name: str
    nets: tuple[tuple[str, str], ...]
    pins: tuple[tuple[str, str], ...]
    bits_per_second: float | None
    rise_max_s: float | None
    rise_fraction: float | None
    open_drain: bool
    both_directions: bool
    modes: tuple[BusMode, ...]
    notes: tuple[str, ...]
    provenance: Provenance
    title: str = ""
    least_bits_per_second: float | None = None
    least_why: str = ""
    together: tuple[tuple[str, ...], ...] = ()
    parts: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class LineRate:
    """What a net must carry.

    Parameters
    ----------
    needed_bit_s : float or None
        Rate that it is judged against [bit/s]: stated, or the least of its bus.
    why : str
        Where that rate comes from.
    usual_bit_s : float or None
        Rate that its bus usually runs at, when nothing states one [bit/s]; ``usual_why`` says so in words.
    rise_30_70_max_s : float or None
        Longest 30-70 % rise that its bus allows [s].
    bus, group : str
        The bus that names or parts gave away, and what its lines have in common.
    open_drain : bool
        Every driver of that bus only pulls low.
    sink_amps, sink_volts : float or None
        Current that every driver of that bus sinks, and the low level it then holds [A, V].
    """

    needed_bit_s: float | None
    why: str
    usual_bit_s: float | None = None
    usual_why: str = ""
    rise_30_70_max_s: float | None = None
    bus: str = ""
    group: str = ""
    open_drain: bool = False
    sink_amps: float | None = None
    sink_volts: float | None = None


# --------------------------------------------------------------------------------------------------------------- rails


@dataclass(frozen=True, slots=True, kw_only=True)
class Evidence:
    """One reason to believe that a rail has a voltage.

    ``kind``: ``settings``, ``field``, ``regulator``, ``feedback``, ``name``, ``connector``, ``upstream``, ``diode``,
    ``battery``, ``ground``, ``use``. ``text`` is a sentence for the user, naming parts and nets.
    """

    kind: str
    volts: Spread | None
    basis: Basis
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Rail:
    """A net held at a steady voltage.

    Parameters
    ----------
    net : str
        Name of the net.
    volts : Spread or None
        Its voltage [V]; None when nothing tells.
    basis : Basis
    evidence : tuple of Evidence
        Strongest first; the first one decided.
    domain : str
        The net this rail is fed from, all the way up through ferrites, links and fuses (itself for a source). Rails of
        one domain come up and go down together.
    ground : bool
    disagreement : str
        A sentence when two pieces of evidence contradict each other; empty otherwise.
    load_farads : float
        Decoupling capacitance found on the net [F].
    fed_by : str
        Net that a regulator or converter makes this rail from; empty when it comes from elsewhere or nothing tells.
    """

    net: str
    volts: Spread | None
    basis: Basis
    evidence: tuple[Evidence, ...]
    domain: str
    ground: bool = False
    disagreement: str = ""
    load_farads: float = 0.0
    fed_by: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Rails:
    """All rails of a board.

    Parameters
    ----------
    by_net : mapping from net name to Rail
    unknown : tuple of (str, str)
        Supply nets without a voltage: net, and what would settle it.
    limits : tuple of Finding-like remarks
        (rail net, text) for rails that cannot be reached (input below output plus dropout) and the like.
    """

    by_net: Mapping[str, Rail]
    unknown: tuple[tuple[str, str], ...] = ()
    remarks: tuple[RailRemark, ...] = ()

    def volts(self, net: str) -> Spread | None:
        """Return the voltage of a net if it is a rail that has one, else None."""
        rail = self.by_net.get(net)
        return rail.volts if rail else None

    def is_ground(self, net: str) -> bool:
        """Tell whether a net is a ground."""
        rail = self.by_net.get(net)
        return bool(rail and rail.ground)


@dataclass(frozen=True, slots=True, kw_only=True)
class RailRemark:
    """Something wrong with a rail: ``kind`` is ``conflict``, ``dropout`` or ``input-range``."""

    kind: str
    net: str
    part: str
    text: str
    remedy: str = ""
    basis: Basis = Basis.TRACED


# ---------------------------------------------------------------------------------------------------------------- pins


@dataclass(frozen=True, slots=True, kw_only=True)
class Drive:
    """How a pin drives.

    Parameters
    ----------
    style : str
        ``push-pull``, ``open-drain`` (low only), ``open-source`` (high only).
    high, low : Level
        Unloaded levels [V] as functions of the supply.
    high_ohms, low_ohms : Spread
        Output resistances [ohm]; the greatest comes from the rated points.
    limit_amps : float or None
        Absolute maximum output current [A].
    rated_low_amps : float or None
        Current that the pin is guaranteed to sink at its rated low level [A].
    basis, source
    """

    style: str
    high: Level
    low: Level
    high_ohms: Spread
    low_ohms: Spread
    limit_amps: float | None
    rated_low_amps: float | None
    basis: Basis
    source: str
    tristate: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Receive:
    """How a pin reads, and what it bears.

    Parameters
    ----------
    vih, vil, vmax, vmin : Level
        Input levels and absolute maximum and minimum [V], functions of the supply.
    vmax_off : Level or None
        Absolute maximum with the supply at 0 V [V]; None when ``vmax`` at 0 V is meant.
    clamp_high, clamp_low : bool
        Diode to the supply, to ground.
    injection_amps : float or None
        Continuous clamp current the maker allows [A]; None when no such rating is known.
    capacitance_farads : Spread
    leakage_amps : float
    off_tolerant : bool
        Specified to bear a signal while unpowered.
    reads : bool
        False for a pin that bears the line's voltage without reading it (an open-drain output).
    basis, source
    """

    vih: Level
    vil: Level
    vmax: Level
    vmin: Level
    vmax_off: Level | None
    clamp_high: bool
    clamp_low: bool
    injection_amps: float | None
    capacitance_farads: Spread
    leakage_amps: float
    off_tolerant: bool
    basis: Basis
    source: str
    reads: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class PinModel:
    """One pin as the review understands it.

    Parameters
    ----------
    part, number, name, net : str
    role : str
        ``signal``, ``supply``, ``supply-out``, ``ground``, ``analog``, ``control``, ``far-end``, ``element`` (a pin of
        a resistor, transistor ...), ``unused``.
    supply : str
        Net of the rail that supplies the pin; empty when unknown or when ``supply_volts`` is fixed.
    supply_volts : Spread or None
        The supply's voltage [V], from the rail or fixed inside the part.
    drive, receive : Drive, Receive or None
    when : str
        What must be true for the pin to drive ("U1.PC4 is configured as an output"); empty when nothing need be.
    basis : Basis
        Of direction and levels together.
    why : str
        Why the pin could not be modelled, when it could not; else the evidence in a few words.
    declared_far_end, inferred_far_end : bool
        A connector pin whose other side the user declared, or whose level was inferred.
    facts : PinFacts or None
    """

    part: str
    number: str
    name: str
    net: str
    role: str
    supply: str = ""
    supply_volts: Spread | None = None
    drive: Drive | None = None
    receive: Receive | None = None
    when: str = ""
    basis: Basis = Basis.ASSUMED
    why: str = ""
    declared_far_end: bool = False
    inferred_far_end: bool = False
    facts: PinFacts | None = None
    pull_up_ohms: float | None = None

    @property
    def label(self) -> str:
        """``U3.12 (SDA)``, or ``U3.12`` for a pin without a name of its own."""
        plain = self.name.replace("~", "").replace("{slash}", "/").strip("{}").split("/")[0].strip("{}")
        return f"{self.part}.{self.number}" + (f" ({plain})" if plain and plain != self.number else "")


# ----------------------------------------------------------------------------------------------- islands and crossings


@dataclass(frozen=True, slots=True, kw_only=True)
class Element:
    """A two- or three-terminal element of a link.

    Parameters
    ----------
    kind : str
        ``resistor``, ``link`` (0 ohm, ferrite, closed jumper), ``capacitor``, ``diode``, ``zener``, ``bipolar``,
        ``mosfet``, ``switch`` (pass FET inside a translator).
    part : str
        Reference of the part it belongs to.
    nets : tuple of str
        Nets by terminal: resistor (1, 2); diode (anode, cathode); bipolar (collector, base, emitter); mosfet (drain,
        gate, source); switch (side a, side b).
    ohms, farads : Spread or None
    facts : MosfetFacts, BipolarFacts, DiodeFacts, TranslatorFacts or None
    basis : Basis
    terminals : tuple of str
        Pin numbers in the order of ``nets``.
    note : str
    """

    kind: str
    part: str
    nets: tuple[str, ...]
    terminals: tuple[str, ...] = ()
    ohms: Spread | None = None
    farads: Spread | None = None
    facts: Any = None
    basis: Basis = Basis.TRACED
    value: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Island:
    """The nets that stay connected once the board is cut at its rails, with all that touches them.

    Parameters
    ----------
    index : int
    nets : tuple of str
        Sorted names of the nets that are not rails.
    elements : tuple of Element
    pins : tuple of PinModel
        Pins of integrated circuits and connectors on these nets.
    rails : tuple of str
        Nets of the rails that elements of the island touch.
    """

    index: int
    nets: tuple[str, ...]
    elements: tuple[Element, ...]
    pins: tuple[PinModel, ...]
    rails: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Shifter:
    """The part or parts of a link that change the level.

    ``kind`` is one of ``wire``, ``series-resistor``, ``divider``, ``clamp``, ``diode``, ``bipolar-pass``,
    ``mosfet-pass``, ``inverting-stage``, ``open-drain``, ``buffer``, ``translator``, ``isolator``, ``unnamed``.
    """

    kind: str
    parts: tuple[str, ...] = ()
    title: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Crossing:
    """One driver and one receiver on different supplies.

    Parameters
    ----------
    driver : PinModel or None
        None when a rail drives through a resistor; then ``driver_rail`` names it.
    driver_rail : str
        Net of the rail that supplies the driver (or is the driver).
    receiver : PinModel
    receiver_rail : str
    link : tuple of str
        References of the parts in between, from driver to receiver.
    shifter : Shifter
    island : int
        Index of the island of the receiver.
    two_way : bool
        The same pair also crosses the other way.
    inverting : bool
    condition : str
        What must be true for the crossing to carry a signal at all.
    level_if : str
        What must be true for the receiver's levels to matter; empty when they do.
    basis : Basis
    stage_driver : PinModel or None
        The pin that drives the receiver's island when the signal comes through a translator: its output on that side.
    segment : bool
        The first half of a way through a translator (driver to the translator's input); shown only when it is not sound.
    inferred : str
        How the level of a far end was inferred; empty when nothing was inferred. An inferred level proves nothing.
    """

    driver: PinModel | None
    driver_rail: str
    receiver: PinModel
    receiver_rail: str
    link: tuple[str, ...] = ()
    shifter: Shifter = Shifter(kind="wire")
    island: int = 0
    two_way: bool = False
    inverting: bool = False
    through: tuple[str, ...] = ()
    condition: str = ""
    level_if: str = ""
    basis: Basis = Basis.ASSUMED
    stage_driver: PinModel | None = None
    segment: bool = False
    inferred: str = ""

    @property
    def to_switch(self) -> bool:
        """Tell whether the receiver is the gate or base of a transistor that switches a load."""
        return self.receiver.role == "gate"

    @property
    def source(self) -> str:
        """Name the driver for people: ``U1.5 (TX) on +5V``, or ``+5V through R3``."""
        if self.driver is None:
            return f"{self.driver_rail} through {self.link[0]}" if self.link else self.driver_rail
        through = f" through {' and '.join(self.through)}" if self.through else ""
        return self.driver.label + (f" on {self.driver_rail}" if self.driver_rail else "") + through

    @property
    def target(self) -> str:
        """Name the receiver for people: ``U2.7 (RX) on +3V3``."""
        return self.receiver.label + (f" on {self.receiver_rail}" if self.receiver_rail else "")


@dataclass(frozen=True, slots=True, kw_only=True)
class Margin:
    """How far a quantity stays on the good side of its limit, over all corners; negative means it is exceeded.

    Parameters
    ----------
    spread : Spread
        Least, nominal and greatest margin.
    worst_corner : str
        The corner of the least margin in words ("R1 +1 %, +5V at 5.25 V").
    at, limit : float
        Value and limit at that corner.
    break_even : str
        The value of a transistor's parameter up to which it holds, where one parameter decides.
    """

    spread: Spread
    worst_corner: str = ""
    at: float = 0.0
    limit: float = 0.0
    break_even: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class StateResult:
    """The solved circuit with the driver in one state.

    Parameters
    ----------
    state : str
        ``high``, ``low`` or ``released``: what the driver does (not what the receiver sees).
    receiver_volts : Spread
        At the receiver's pin, clamps conducting [V].
    open_volts : Spread
        The same with the receiver's own clamps removed; ratings are judged on it [V].
    clamp_amps : Spread
        Current into the receiver's supply through its clamp diode [A].
    driver_amps : Spread
        Current into the driver's pin, positive when it sinks [A].
    driver_volts : Spread
        At the driver's pin [V].
    high_margin : Margin or None
        Receiver voltage minus VIH; None when this state should not be read as high.
    low_margin : Margin or None
        VIL minus receiver voltage; None when this state should not be read as low.
    rating_margin : Margin
        Absolute maximum minus open voltage.
    low_rating_margin : Margin
        Open voltage minus least permitted voltage.
    solved : bool
    why : str
        In circuit words, when it could not be solved ("net X hangs on nothing").
    floating : bool
        The receiver has no path that sets its voltage in this state.
    stresses : tuple of Stress
    """

    state: str
    receiver_volts: Spread
    open_volts: Spread
    clamp_amps: Spread
    driver_amps: Spread
    driver_volts: Spread
    high_margin: Margin | None
    low_margin: Margin | None
    rating_margin: Margin | None
    low_rating_margin: Margin | None
    solved: bool = True
    why: str = ""
    floating: bool = False
    stresses: tuple[Stress, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Stress:
    """A junction or channel voltage against its limit: e.g. part Q1, what ``VGS``, volts, limit [V]."""

    part: str
    what: str
    volts: Spread
    limit_volts: float
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Speed:
    """How fast a crossing is good for.

    Times in seconds, rates in bit/s, load in farads. ``limit`` says what limits ("the rise through R4").
    Each spread runs over the corners; ``usable_bit_s`` is the guaranteed one.
    """

    rise_s: Spread
    fall_s: Spread
    delay_high_s: Spread
    delay_low_s: Spread
    usable_bit_s: float
    nominal_bit_s: float
    load_farads: float
    limit: str = ""
    rise_30_70_s: Spread | None = None
    loaded_bit_s: float | None = None
    accuracy: str = ""
    line: LineRate | None = None

    @property
    def needed_bit_s(self) -> float | None:
        """Rate that the line is judged against [bit/s]."""
        return self.line.needed_bit_s if self.line is not None else None


@dataclass(frozen=True, slots=True, kw_only=True)
class OffState:
    """A power-down case: which rail is off, and what flows.

    ``case`` is ``receiver-off-grounded``, ``receiver-off-floating`` or ``driver-off``. ``into_rail_amps`` flows into
    the dead rail, ``lifted_volts`` is what a floating dead rail rises to.
    """

    case: str
    dead_rail: str
    into_rail_amps: Spread
    lifted_volts: Spread | None
    pin_volts: Spread
    path: str
    rating_margin: Margin | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class SolvedCrossing:
    """A crossing with its solution: what the rules judge.

    Parameters
    ----------
    crossing : Crossing
    states : mapping from state to StateResult
        Empty when nothing could be solved; then ``why`` says why.
    vih, vil, vmax : Spread or None
        The receiver's limits over the corners [V].
    high, low : Spread or None
        Levels that the receiver sees [V]: the state read as high, as low.
    why : str
    speed : Speed or None
    off_states : tuple of OffState
    elements : tuple of Element
        Elements of the island that took part.
    assumptions : tuple of str
        What was taken for granted ("resistors 1 %").
    """

    crossing: Crossing
    states: Mapping[str, StateResult]
    vih: Spread | None = None
    vil: Spread | None = None
    vmax: Spread | None = None
    high: Spread | None = None
    low: Spread | None = None
    why: str = ""
    speed: Speed | None = None
    off_states: tuple[OffState, ...] = ()
    elements: tuple[Element, ...] = ()
    assumptions: tuple[str, ...] = ()
    proposal: str = ""

    @property
    def without_effect(self) -> bool:
        """Tell whether the receiver sees the same voltage whatever the driver does: within 10 mV at the usual values."""
        volts = [state.receiver_volts.nominal for state in self.states.values() if state.solved]
        return len(volts) > 1 and max(volts) - min(volts) < 0.01

    def finding(
        self,
        index: int,
        rule: str,
        outcome: Outcome,
        text: str,
        *,
        remedy: str = "",
        cause: str = "",
        condition: str = "",
        part: str = "",
        level: bool = False,
    ) -> Finding:
        """Return a finding at the receiver of this crossing.

        A level that was only inferred proves nothing: the outcome becomes ``unknown`` and the condition says on what it
        depends. A receiver of which nothing is known adds that to the condition.

        Parameters
        ----------
        index : int
            Place of this crossing among the case's crossings.
        rule, outcome, text, remedy, cause
            As of :class:`Finding`.
        condition : str
            A further condition.
        part : str
            The part at fault when that is not the receiver's (its pin and net stay the receiver's otherwise).
        level : bool
            The finding is about a level that the receiver reads, not about what it bears.
        """
        crossing = self.crossing
        conditions = [crossing.condition, condition]
        if level and crossing.level_if:
            conditions.append(crossing.level_if)
            outcome = Outcome.UNKNOWN
        receive = crossing.receiver.receive
        if receive is not None and receive.basis is Basis.ASSUMED and not crossing.receiver.inferred_far_end:
            conditions.append(f"{crossing.receiver.part} is an ordinary CMOS part (no data on it)")
        drive = crossing.driver.drive if crossing.driver is not None else None
        if (
            drive is not None
            and drive.basis is Basis.ASSUMED
            and crossing.driver is not None
            and crossing.driver.role == "signal"
            and crossing.driver.facts is None
        ):
            conditions.append(f"{crossing.driver.part} drives like an ordinary CMOS part (no data on it)")
        if crossing.inferred:
            conditions.append(crossing.inferred)
            outcome = Outcome.UNKNOWN
            # One guess about one connector is one matter, however many of its lines it concerns.
            far = crossing.receiver if crossing.receiver.inferred_far_end else crossing.driver
            near = crossing.driver if far is crossing.receiver else crossing.receiver
            cause = f"guess {rule} {far.part if far else ''}"
            volts = near.supply_volts.nominal if near is not None and near.supply_volts is not None else 5.0
            remedy = f'Declare what is plugged in: under [far_ends] in levelcrossing.toml, "{far.part if far else ""}" = {{rail = "{volts:.3g}"}}.'
        sources = [
            pin.source for pin in (receive, (crossing.driver.drive if crossing.driver else None)) if pin is not None
        ]
        return Finding(
            rule=rule,
            outcome=outcome,
            text=text,
            remedy=remedy or self.proposal,
            part=part or crossing.receiver.part,
            pin="" if part else crossing.receiver.number,
            net=crossing.receiver.net,
            condition=" and ".join(dict.fromkeys(condition for condition in conditions if condition)),
            basis=crossing.basis,
            crossing=index,
            sources=tuple(dict.fromkeys(sources)),
            cause=cause,
        )


# ---------------------------------------------------------------------------------------------------- findings, review


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing that the user should know.

    Parameters
    ----------
    rule : str
        Name of the rule.
    outcome : Outcome
    text : str
        What is wrong, with figures, in one or two sentences.
    remedy : str
        What to change, with computed values where possible.
    part, pin, net : str
        Where it bites; pin is the pin number.
    condition : str
        What must be true for it to bite; empty when nothing need be.
    basis : Basis
        Of the weakest figure.
    crossing : int or None
        Index into ``Review.crossings``.
    also : tuple of str
        Other places with the same cause, as ``U1.7``.
    sources : tuple of str
        Documents behind the figures.
    at : Place or None
    waived : str or None
        Reason of the waiver that accepts it.
    cause : str
        Findings of equal cause are one; the rule of most insight explains it.
    fingerprint : str
        Stays equal while the circuit does.
    """

    rule: str
    outcome: Outcome
    text: str
    remedy: str = ""
    part: str = ""
    pin: str = ""
    net: str = ""
    condition: str = ""
    basis: Basis = Basis.ASSUMED
    crossing: int | None = None
    also: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()
    at: Place | None = None
    waived: str | None = None
    cause: str = ""
    fingerprint: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class NotJudged:
    """A signal pin that could not be judged, and why."""

    part: str
    pin: str
    why: str
    name: str = ""
    net: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Coverage:
    """How much of the board was judged: counts of signal pins, and each one that was not."""

    signal_pins: int
    judged: int
    not_judged: tuple[NotJudged, ...] = ()
    better_than_assumed: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class CaseFile:
    """All that a rule may look at."""

    board: Board
    rails: Rails
    pins: Mapping[tuple[str, str], PinModel]
    facts: Mapping[str, PartFacts]
    islands: tuple[Island, ...]
    crossings: tuple[SolvedCrossing, ...]
    settings: Settings
    not_judged: tuple[tuple[PinModel, str], ...] = ()
    line_rates: Mapping[str, LineRate] = field(default_factory=dict)
    left_out: tuple[tuple[str, str], ...] = ()
    """Transistors that no circuit holds, with their values: nothing tells what they are."""

    def pins_of(self, part: str) -> Iterator[PinModel]:
        """Yield the pins of one part."""
        for (reference, _), pin in self.pins.items():
            if reference == part:
                yield pin


@dataclass(frozen=True, slots=True, kw_only=True)
class ReviewedCrossing:
    """A crossing with its verdict."""

    solved: SolvedCrossing
    verdict: Outcome
    condition: str
    findings: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Review:
    """The whole result for one board.

    Parameters
    ----------
    board : Board
    rails : Rails
    crossings : tuple of ReviewedCrossing
    findings : tuple of Finding
        Worst first.
    coverage : Coverage
    assumptions : tuple of str
        What the whole review took for granted.
    out_of_scope : tuple of str
        What came in sight and was not judged (mains, isolation, batteries, medical use).
    remarks : tuple of str
        From the reader, the settings and the waivers.
    suggestions : tuple of str
        Parts that were judged without trade data.
    rows_to_fill : tuple of str
        A row of trade data for each of them, to fill in and pass with ``--facts``.
    """

    board: Board
    rails: Rails
    crossings: tuple[ReviewedCrossing, ...]
    findings: tuple[Finding, ...]
    coverage: Coverage
    assumptions: tuple[str, ...] = ()
    out_of_scope: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()
    suggestions: tuple[str, ...] = ()
    rows_to_fill: tuple[str, ...] = ()

    def count(self, outcome: Outcome) -> int:
        """Return how many findings that no waiver accepts have this outcome."""
        return sum(1 for finding in self.findings if finding.outcome is outcome and finding.waived is None)


# ------------------------------------------------------------------------------------------------------------ settings


@dataclass(frozen=True, slots=True, kw_only=True)
class PinSetting:
    """What the user declared of a pin: tolerated volts, direction, levels, rail (net name or volts).

    ``levels`` is ``ttl``, ``cmos`` or empty. ``volts`` is set when ``rail`` was given as a voltage.
    """

    tolerates_volts: float | None = None
    drives: bool | None = None
    reads: bool | None = None
    open_drain: bool | None = None
    vih_volts: float | None = None
    vil_volts: float | None = None
    rail: str = ""
    volts: Spread | None = None
    line: int = 0
    levels: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Waiver:
    """An accepted finding.

    ``at`` is a part, a pin ``U1.3`` or a net; ``until`` the last day as ``YYYY-MM-DD``; ``fingerprint`` narrows it to
    one circuit.
    """

    rule: str
    at: str
    reason: str
    until: str = ""
    fingerprint: str = ""
    line: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """What the user declared for a board.

    Parameters
    ----------
    file : str
        Where it was read from; empty for none.
    rails : mapping from net name or pattern to Spread
    pins : mapping from ``U3.4`` to PinSetting
    far_ends : mapping from ``J2.3`` or ``J2`` to PinSetting
    rates : tuple of (pattern, float)
        Bit rate [bit/s] by net name pattern.
    waivers : tuple of Waiver
    rail_tolerance, resistor_tolerance : float
        Fractions [1].
    stray_farads : float
        Per net [F].
    thin_margin_volts : float
        Below this a margin is called thin [V].
    stop_at : Outcome or None
        None when the settings do not say, ``SOUND`` for never.
    today : str
        Day on which waivers are judged, ``YYYY-MM-DD``; empty when unknown.
    parts_file : str
        File of the project's own trade rows; empty when there is none.
    parts_rows : tuple of (str, str)
        Their names, each with a digest of the row, for comparing revisions.
    """

    file: str = ""
    rails: Mapping[str, Spread] = field(default_factory=dict)
    pins: Mapping[str, PinSetting] = field(default_factory=dict)
    far_ends: Mapping[str, PinSetting] = field(default_factory=dict)
    rates: tuple[tuple[str, float], ...] = ()
    waivers: tuple[Waiver, ...] = ()
    rail_tolerance: float = 0.05
    resistor_tolerance: float = 0.01
    stray_farads: float = 10e-12
    thin_margin_volts: float = 0.05
    stop_at: Outcome | None = None
    parts_file: str = ""
    parts_rows: tuple[tuple[str, str], ...] = ()
    today: str = ""
