"""A hand-made review of an invented tide gauge, in which every text that a board supplies can be replaced."""

from __future__ import annotations

from dataclasses import replace

from levelcrossing.model import (
    Basis,
    Board,
    Coverage,
    Crossing,
    Drive,
    Evidence,
    Finding,
    Level,
    Margin,
    Net,
    NotJudged,
    OffState,
    Outcome,
    Part,
    Pin,
    PinModel,
    Place,
    Rail,
    Rails,
    Receive,
    Review,
    ReviewedCrossing,
    Shifter,
    SolvedCrossing,
    Speed,
    Spread,
    StateResult,
)

FIVE = Spread(low=4.75, nominal=5.0, high=5.25)
THREE = Spread(low=3.135, nominal=3.3, high=3.465)
ZERO = Spread.exactly(0.0)
LOW = Spread(low=0.0, nominal=0.02, high=0.05)


def level(text: str, factor: float, offset: float = 0.0) -> Level:
    return Level(text=text, pieces=((0.0, 10.0, lambda volts: factor * volts + offset),))


def margin(low: float, corner: str = "") -> Margin:
    return Margin(spread=Spread(low=low, nominal=low + 0.1, high=low + 0.2), worst_corner=corner)


def state(name: str, volts: Spread, **margins: Margin | None) -> StateResult:
    given = {"high_margin": None, "low_margin": None, "rating_margin": None, "low_rating_margin": None} | margins
    return StateResult(
        state=name,
        receiver_volts=volts,
        open_volts=volts,
        clamp_amps=ZERO,
        driver_amps=ZERO,
        driver_volts=volts,
        **given,
    )


def sample_review(text: str | None = None, path: str | None = None) -> Review:
    """Return the review; ``text`` replaces whatever comes from a board, ``path`` the names of files."""

    def t(own: str) -> str:
        return own if text is None else text

    def f(own: str) -> str:
        return own if path is None else path

    five, three, lost = t("+5V"), t("+3V3") + ("" if text is None else "3"), t("VMOT") + ("" if text is None else "m")
    driver = PinModel(
        part=t("U1"),
        number=t("5"),
        name=t("TX"),
        net=t("/ECHO"),
        role="signal",
        supply=five,
        supply_volts=FIVE,
        drive=Drive(
            style="push-pull",
            high=level("V", 1.0),
            low=level("0", 0.0),
            high_ohms=Spread(low=20, nominal=30, high=50),
            low_ohms=Spread(low=20, nominal=30, high=50),
            limit_amps=0.025,
            rated_low_amps=0.004,
            basis=Basis.LIBRARY,
            source=t("74HC family, JEDEC JESD7A"),
        ),
        when=t("U1.5 is configured as an output"),
        basis=Basis.LIBRARY,
    )
    receiver = PinModel(
        part=t("U2"),
        number=t("7"),
        name=t("~{RX}"),
        net=t("/ECHO"),
        role="signal",
        supply=three,
        supply_volts=THREE,
        receive=Receive(
            vih=level("0.7*V", 0.7),
            vil=level("0.3*V", 0.3),
            vmax=level("V+0.3", 1.0, 0.3),
            vmin=level("-0.3", 0.0, -0.3),
            vmax_off=None,
            clamp_high=False,
            clamp_low=True,
            injection_amps=None,
            capacitance_farads=Spread.exactly(10e-12),
            leakage_amps=1e-6,
            off_tolerant=False,
            basis=Basis.ASSUMED,
            source=t("an ordinary CMOS input"),
        ),
    )
    limits = {
        "vih": THREE.scaled(0.7),
        "vil": THREE.scaled(0.3),
        "vmax": THREE.shifted(0.3),
    }
    wire = SolvedCrossing(
        crossing=Crossing(
            driver=driver,
            driver_rail=five,
            receiver=receiver,
            receiver_rail=three,
            link=(t("R1"),),
            shifter=Shifter(kind="series-resistor", parts=(t("R1"),), title=t("series resistor")),
            condition=t("U1.5 is configured as an output"),
        ),
        states={
            "high": state("high", FIVE, high_margin=margin(2.3), rating_margin=margin(-1.815, t("+5V at 5.25 V"))),
            "low": state("low", LOW, low_margin=margin(0.89), rating_margin=margin(3.3)),
        },
        high=FIVE,
        low=LOW,
        speed=Speed(
            rise_s=Spread(low=8e-9, nominal=10e-9, high=13e-9),
            fall_s=Spread(low=7e-9, nominal=9e-9, high=12e-9),
            delay_high_s=Spread.exactly(5e-9),
            delay_low_s=Spread.exactly(5e-9),
            usable_bit_s=23_456_789.0,
            nominal_bit_s=3e7,
            load_farads=20e-12,
            limit=t("the rise through R1"),
        ),
        off_states=(
            OffState(
                case="receiver-off-grounded",
                dead_rail=three,
                into_rail_amps=Spread.exactly(1e-3),
                lifted_volts=None,
                pin_volts=Spread.exactly(0.7),
                path=t("U1.5 to U2.7"),
            ),
        ),
        **limits,
    )
    pull_up = SolvedCrossing(
        crossing=Crossing(
            driver=None,
            driver_rail=five,
            receiver=replace(receiver, number=t("8"), name=t("SDA"), net=t("/SDA")),
            receiver_rail=three,
            link=(t("R4"),),
            shifter=Shifter(kind="open-drain"),
        ),
        states={"released": state("released", FIVE, rating_margin=margin(-1.5), high_margin=margin(2.2))},
        high=FIVE,
        **limits,
    )
    sound = SolvedCrossing(
        crossing=replace(wire.crossing, driver=receiver, driver_rail=three, receiver=driver, receiver_rail=five),
        states={
            "high": state("high", THREE, high_margin=margin(0.7), rating_margin=margin(1.9)),
            "low": state("low", LOW, low_margin=margin(0.5), rating_margin=margin(5)),
        },
        high=THREE,
        low=LOW,
        vih=Spread.exactly(2.0),
        vil=Spread.exactly(0.8),
        vmax=FIVE.shifted(0.5),
    )
    puzzle = SolvedCrossing(
        crossing=replace(wire.crossing, link=(), shifter=Shifter(kind="unnamed")),
        states={},
        why=t("net /X hangs on nothing"),
    )
    findings = (
        Finding(
            rule="input-overvoltage",
            outcome=Outcome.DAMAGE,
            text=t("U2.7 (RX) on +3V3 gets 5.25 V from U1.5 (TX) and bears at most 3.44 V."),
            remedy=t("Put 2 k in series and 3 k to ground: 3.0 V."),
            part=t("U2"),
            pin=t("7"),
            net=t("/ECHO"),
            condition=t("U1.5 is configured as an output"),
            basis=Basis.ASSUMED,
            crossing=0,
            also=(t("U2.9"), t("U2.10")),
            sources=(t("JEDEC JESD7A"),),
            at=Place(file=f("gauge/echo.kicad_sch"), line=212, column=3),
            fingerprint="1:00112233445566aa",
        ),
        Finding(
            rule="pull-up-rail",
            outcome=Outcome.MALFUNCTION,
            text=t("R4 pulls /SDA to +5V."),
            part=t("U2"),
            pin=t("8"),
            net=t("/SDA"),
            crossing=1,
            at=Place(file=f("gauge/gauge.kicad_sch"), line=77),
            fingerprint="1:00112233445566bb",
        ),
        Finding(
            rule="margin-thin",
            outcome=Outcome.MARGINAL,
            text=t("Only 50 mV remain."),
            net=t("/TIDE"),
            fingerprint="1:00112233445566cc",
            basis=Basis.TRACED,
        ),
        Finding(rule="rail-unknown", outcome=Outcome.UNKNOWN, text=t("Nothing tells the voltage of VMOT."), net=lost),
        Finding(
            rule="sink-current",
            outcome=Outcome.DAMAGE,
            text=t("U1.5 sinks 30 mA."),
            part=t("U1"),
            pin=t("5"),
            waived=t("a bench set-up only"),
            at=Place(file=f("gauge/gauge.kicad_sch"), line=30),
            fingerprint="1:00112233445566dd",
        ),
    )

    def rail(net: str, volts: Spread | None, ground: bool = False) -> Rail:
        evidence = (
            Evidence(kind="name", volts=volts, basis=Basis.TRACED, text=t(f"its name says {net}")),
            Evidence(kind="use", volts=volts, basis=Basis.TRACED, text=t("feeds U1")),
        )
        return Rail(net=net, volts=volts, basis=Basis.TRACED, evidence=evidence, domain=net, ground=ground)

    ground = t("GND") + ("" if text is None else "g")
    rails = Rails(
        by_net={
            five: rail(five, FIVE),
            three: rail(three, THREE),
            lost: rail(lost, None),
            ground: rail(ground, ZERO, True),
        },
        unknown=((lost, t('[rails] "VMOT" = "24"')),),
    )
    pins = tuple(
        Pin(part=t("U2"), number=number, name=name, kind="input", net=t("/ECHO"))
        for number, name in ((t("7"), t("RX")), (t("8"), t("SDA")))
    )
    board = Board(
        path=f("gauge/gauge.net"),
        form="netlist",
        maker=t("Eeschema 9.0.2"),
        parts=(Part(reference=t("U1"), value=t("74HC04")), Part(reference=t("U2"), value=t("part"), pins=pins)),
        nets=(Net(name=t("/ECHO"), pins=((t("U1"), t("5")), (t("U2"), t("7")))),),
        remarks=(t("a part without a symbol was left out"),),
    )
    return Review(
        board=board,
        rails=rails,
        crossings=(
            ReviewedCrossing(solved=wire, verdict=Outcome.DAMAGE, condition=findings[0].condition, findings=(0,)),
            ReviewedCrossing(solved=pull_up, verdict=Outcome.MALFUNCTION, condition="", findings=(1,)),
            ReviewedCrossing(solved=sound, verdict=Outcome.SOUND, condition=t("U2 talks"), findings=()),
            ReviewedCrossing(solved=puzzle, verdict=Outcome.UNKNOWN, condition="", findings=()),
        ),
        findings=findings,
        coverage=Coverage(
            signal_pins=20,
            judged=17,
            not_judged=(
                NotJudged(part=t("J1"), pin=t("1"), why=t("the level on the other side is not known"), name=t("A")),
                NotJudged(part=t("J1"), pin=t("2"), why=t("the level on the other side is not known")),
                NotJudged(part=t("U9"), pin=t("3"), why=t("the part is not known") + " so far"),
            ),
            better_than_assumed=11,
        ),
        assumptions=("resistors ±1 %",),
        out_of_scope=(t("BT1: batteries"),),
        remarks=("waivers: " + t("2 matches nothing"),),
        suggestions=(t("name the supply of J1"),),
    )
