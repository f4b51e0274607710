"""The ways that ``size`` looks at: small boards between two supplies, solved by the whole pipeline.

A candidate stands between the nets IN (the driver's side, on VFROM) and OUT (the receiver's side, on VTO).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from levelcrossing.dividers import divider
from levelcrossing.model import Board, Net, Part, Pin, Settings, SolvedCrossing, Spread
from levelcrossing.review import open_case
from levelcrossing.tradebook import Tradebook
from levelcrossing.units import format_si

# What a receiver's own pin adds, with the driver taken as an ordinary CMOS part [F] (as in the review).
PIN_FARADS = 10e-12
# Values that are tried, weakest currents first [ohm]; without a rate, those from the usual value on (common practice).
PULL_UPS = (10_000.0, 4_700.0, 2_200.0, 1_000.0, 470.0)
USUAL_PULL_UP = 4_700.0
CELL_PULL_UPS = (10_000.0, 4_700.0, 2_200.0, 1_000.0)
SERIES_RANGES = ((10_000.0, 33_000.0), (2_700.0, 10_000.0), (1_000.0, 4_700.0), (330.0, 1_000.0), (150.0, 330.0))
USUAL_SERIES = 2
# Below this supply the gate of a BSS138 does not open it for sure; a type with a lower threshold is taken [V].
LOW_GATE_VOLTS = 2.7


@dataclass(frozen=True, slots=True, kw_only=True)
class Task:
    """What is asked: supplies [V], load [F], rate [bit/s], greatest current into a low driver [A], ways, values."""

    source: Spread
    target: Spread
    load_farads: float = 20e-12
    needed_bit_s: float | None = None
    sink_amps: float | None = None
    two_way: bool = False
    open_drain: bool = False
    series: str = "E24"

    @property
    def down(self) -> bool:
        """The driver's supply is the higher one."""
        return self.source.nominal > self.target.nominal * 1.04


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """One way to shift: its name, its parts in words, the parts themselves, whether it works both ways.

    ``joined`` means that driver and receiver share one net, OUT. ``stated_bit_s`` is the rate that the maker states at these supplies; ``by_maker`` says that only the maker knows it
    (edge accelerators). ``remarks`` are conditions of the part that the circuit does not show.
    """

    name: str
    made_of: str
    parts: tuple[Part, ...]
    two_way: bool
    joined: bool = False
    by_maker: bool = False
    stated_bit_s: float | None = None
    remarks: tuple[str, ...] = ()


def candidates(task: Task, book: Tradebook) -> list[list[Candidate]]:
    """Return the ways that come into question, each as a family of values with the weakest currents first."""
    families: list[list[Candidate]] = []
    if task.down and not task.two_way:
        if not task.open_drain:
            families.append(_dividers(task))
        else:
            families.append(_pull_up_alone(task))
    if not task.two_way and not task.open_drain:
        if task.down and 1.65 <= task.target.nominal <= 3.6 and task.source.high <= 5.5:
            families.append([_buffer("tolerant buffer", "74LVC1G17", "74LVC1G17 on the lower supply")])
        if not task.down and 4.5 <= task.target.nominal <= 5.5 and task.source.low >= 2.0:
            families.append([_buffer("TTL-level buffer", "74AHCT1G125", "74AHCT1G125 on the upper supply")])
    families += [_mosfet_pairs(task), _bipolar_cells(task)]
    families += [[one] for one in _translators(task, book)]
    return [family for family in families if family]


def solve(candidate: Candidate, task: Task, book: Tradebook, *, back: bool = False) -> SolvedCrossing | None:
    """Solve a candidate between two ordinary CMOS parts; None when it makes no crossing.

    Parameters
    ----------
    candidate : Candidate
    task : Task
    book : Tradebook
    back : bool
        Drive from the other end.

    Returns
    -------
    SolvedCrossing or None
        The load counts on each side, the pin of the receiver included.
    """
    start, end = (("OUT", "VTO"), ("IN", "VFROM")) if back else (("IN", "VFROM"), ("OUT", "VTO"))
    if candidate.joined:
        start = ("OUT", start[1])
    style = "open_collector" if task.open_drain else "output"
    driver = _part(
        "U1", "driver", ("1", "VDD", "power_in", start[1]), ("2", "GND", "power_in", "GND"), ("3", "Q", style, start[0])
    )
    receiver = _part(
        "U2",
        "receiver",
        ("1", "VDD", "power_in", end[1]),
        ("2", "GND", "power_in", "GND"),
        ("3", "DIN", "input", end[0]),
    )
    parts = (driver, receiver, *candidate.parts)
    pins: dict[str, list[tuple[str, str]]] = {}
    for part in parts:
        for pin in part.pins:
            pins.setdefault(pin.net, []).append((part.reference, pin.number))
    nets = tuple(Net(name=net, pins=tuple(sorted(members))) for net, members in sorted(pins.items()))
    board = Board(path="", form="netlist", parts=parts, nets=nets)
    settings = Settings(
        rails={"VFROM": task.source, "VTO": task.target}, stray_farads=max(task.load_farads - PIN_FARADS, 1e-15)
    )
    case = open_case(board, settings, book)
    ends = [one for one in case.crossings if one.crossing.driver is not None]
    through = [
        one
        for one in ends
        if one.crossing.driver and one.crossing.driver.part == "U1" and one.crossing.receiver.part == "U2"
    ]
    best = through or [one for one in ends if one.crossing.driver and one.crossing.driver.part == "U1"]
    return best[0] if best else None


def _dividers(task: Task) -> list[Candidate]:
    ranges = SERIES_RANGES if task.needed_bit_s else SERIES_RANGES[USUAL_SERIES:]
    found: list[Candidate] = []
    for tops in ranges:
        values = divider(task.source, 0.7 * task.target.high, task.target.low + 0.3, tops=tops, series=task.series)
        if values is not None:
            top, bottom, _ = values
            found.append(
                Candidate(
                    name="resistor divider",
                    made_of=f"{format_si(top, 'Ω')} in series, {format_si(bottom, 'Ω')} to ground",
                    parts=(_resistor("R1", top, "IN", "OUT"), _resistor("R2", bottom, "OUT", "GND")),
                    two_way=False,
                )
            )
    return found


def _pull_up_alone(task: Task) -> list[Candidate]:
    return [
        Candidate(
            name="pull-up to the lower supply",
            made_of=f"{format_si(ohms, 'Ω')} from the line to the receiver's supply",
            parts=(_resistor("R1", ohms, "VTO", "OUT"),),
            two_way=False,
            joined=True,
            remarks=("the driver must be a true open drain, with no pull-up of its own",),
        )
        for ohms in _values(PULL_UPS, task)
    ]


def _values(steps: Sequence[float], task: Task) -> Sequence[float]:
    return steps if task.needed_bit_s or task.sink_amps else [ohms for ohms in steps if ohms <= USUAL_PULL_UP]


def _sides(task: Task) -> tuple[str, str, str, str]:
    """Return the lower and the upper supply's net and the line's net on each."""
    return ("VTO", "VFROM", "OUT", "IN") if task.down else ("VFROM", "VTO", "IN", "OUT")


def _mosfet_pairs(task: Task) -> list[Candidate]:
    lower, upper, near, far = _sides(task)
    value = "BSS138" if min(task.source.low, task.target.low) >= LOW_GATE_VOLTS else "DMG1012T"
    return [
        Candidate(
            name="MOSFET pair",
            made_of=f"{value}, gate and source on the lower side, {format_si(ohms, 'Ω')} on each side",
            parts=(
                _three("Q1", value, ("1", "G", lower), ("2", "S", near), ("3", "D", far)),
                _resistor("R1", ohms, lower, near),
                _resistor("R2", ohms, upper, far),
            ),
            two_way=True,
        )
        for ohms in _values(PULL_UPS, task)
    ]


def _bipolar_cells(task: Task) -> list[Candidate]:
    lower, upper, near, far = _sides(task)
    found = []
    for ohms in CELL_PULL_UPS:
        base = ohms / 10
        parts = (
            _three("Q1", "MMBT3904", ("1", "B", "BASE"), ("2", "E", near), ("3", "C", far)),
            _resistor("R1", ohms, lower, near),
            _resistor("R2", ohms, upper, far),
            _resistor("R3", base, lower, "BASE"),
        )
        made_of = (
            f"MMBT3904, base through {format_si(base, 'Ω')} to the lower supply, {format_si(ohms, 'Ω')} on each side"
        )
        found.append(Candidate(name="bipolar cell", made_of=made_of, parts=parts, two_way=True))
    return found


def _translators(task: Task, book: Tradebook) -> list[Candidate]:
    low, high = sorted((task.source.nominal, task.target.nominal))
    lower, upper, near, far = _sides(task)
    found: list[Candidate] = []
    if not task.two_way and not task.open_drain and low >= 1.65 and high <= 5.5:
        part = _part(
            "U3", "SN74LVC1T45",
            ("1", "VCCA", "power_in", "VFROM"), ("6", "VCCB", "power_in", "VTO"), ("2", "GND", "power_in", "GND"),
            ("5", "DIR", "input", "VFROM"), ("3", "A", "bidirectional", "IN"), ("4", "B", "bidirectional", "OUT"),
        )  # fmt: skip
        found.append(
            Candidate(
                name="dual-supply translator",
                made_of="SN74LVC1T45, direction tied A to B",
                parts=(part,),
                two_way=False,
            )
        )
    autos = (
        ("auto-direction buffer", "TXB0102", 1.2, 1.65, not task.open_drain,
         ("no pull-up or pull-down below 50 kΩ on either side, and no open drain", "its outputs hold a level through about 4 kΩ: no cables, no LEDs")),
        ("auto-direction pass type", "TXS0102", 1.65, 2.3, True,
         ("has 10 kΩ pull-ups inside; an input low must be 0.15 V or less",)),
    )  # fmt: skip
    for name, value, least_a, least_b, fits, remarks in autos:
        if not fits or not least_a <= low <= 3.6 or not least_b <= high <= 5.5:
            continue
        part = _part(
            "U3", value,
            ("3", "VCCA", "power_in", lower), ("7", "VCCB", "power_in", upper), ("2", "GND", "power_in", "GND"),
            ("6", "OE", "input", lower), ("5", "A1", "bidirectional", near), ("8", "B1", "bidirectional", far),
        )  # fmt: skip
        facts = book.part(part)
        stated = None
        if facts is not None and facts.translator is not None:
            stated = facts.translator.rate_at(low, high, open_drain=task.open_drain)
        found.append(
            Candidate(
                name=name,
                made_of=f"{value}, side A on the lower supply, OE to it",
                parts=(part,),
                two_way=True,
                by_maker=True,
                stated_bit_s=stated,
                remarks=remarks,
            )
        )
    return found


def _part(reference: str, value: str, *pins: tuple[str, str, str, str], symbol: str = "part") -> Part:
    made = tuple(Pin(part=reference, number=number, name=name, kind=kind, net=net) for number, name, kind, net in pins)
    return Part(reference=reference, value=value, library="Size", symbol=symbol, pins=made)


def _resistor(reference: str, ohms: float, a: str, b: str) -> Part:
    made = tuple(
        Pin(part=reference, number=str(number), name="", kind="passive", net=net) for number, net in ((1, a), (2, b))
    )
    return Part(reference=reference, value=f"{ohms:g}R", library="Device", symbol="R", pins=made)


def _three(reference: str, value: str, *pins: tuple[str, str, str]) -> Part:
    return _part(reference, value, *((number, name, "passive", net) for number, name, net in pins), symbol=value)


def _buffer(name: str, value: str, made_of: str) -> Candidate:
    enable: Sequence[tuple[str, str, str, str]] = (("1", "", "input", "GND"),) if "125" in value else ()
    pins = (
        ("5", "VCC", "power_in", "VTO"),
        ("3", "GND", "power_in", "GND"),
        *enable,
        ("2", "", "input", "IN"),
        ("4", "", "output", "OUT"),
    )
    return Candidate(name=name, made_of=made_of, parts=(_part("U3", value, *pins),), two_way=False)
