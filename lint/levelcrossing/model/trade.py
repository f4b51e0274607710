"""What the trade data knows: parts, their pins, translators, transistors, diodes, regulators, buses."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from levelcrossing.model.board import Pin
from levelcrossing.model.quantities import Level, Spread


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
