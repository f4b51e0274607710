"""The vocabulary: what every step of a review takes and gives.

Everything here is frozen. Voltages are volts against ground, currents amperes, resistances ohms, capacitances farads,
times seconds. A name that ends in a unit holds a bare float in that unit.
"""

from levelcrossing.model.board import Board, Net, Part, Pin
from levelcrossing.model.circuits import Crossing, Element, Island, Shifter
from levelcrossing.model.findings import Coverage, Finding, NotJudged
from levelcrossing.model.pins import Drive, PinModel, Receive
from levelcrossing.model.quantities import Basis, Level, Outcome, Place, Spread
from levelcrossing.model.rails import Evidence, Rail, RailRemark, Rails
from levelcrossing.model.review import CaseFile, Review, ReviewedCrossing
from levelcrossing.model.settings import PinSetting, Settings, Waiver
from levelcrossing.model.solutions import Margin, OffState, SolvedCrossing, Speed, StateResult, Stress
from levelcrossing.model.trade import (
    BipolarFacts,
    BusFacts,
    BusMode,
    ControlFacts,
    DiodeFacts,
    LineRate,
    MosfetFacts,
    OutputPoint,
    PartFacts,
    PinFacts,
    Provenance,
    RatePoint,
    RegulatorFacts,
    SupplyFacts,
    TranslatorFacts,
)

__all__ = [
    "Basis",
    "BipolarFacts",
    "Board",
    "BusFacts",
    "BusMode",
    "CaseFile",
    "ControlFacts",
    "Coverage",
    "Crossing",
    "DiodeFacts",
    "Drive",
    "Element",
    "Evidence",
    "Finding",
    "Island",
    "Level",
    "LineRate",
    "Margin",
    "MosfetFacts",
    "Net",
    "NotJudged",
    "OffState",
    "Outcome",
    "OutputPoint",
    "Part",
    "PartFacts",
    "Pin",
    "PinFacts",
    "PinModel",
    "PinSetting",
    "Place",
    "Provenance",
    "Rail",
    "RailRemark",
    "Rails",
    "RatePoint",
    "Receive",
    "RegulatorFacts",
    "Review",
    "ReviewedCrossing",
    "Settings",
    "Shifter",
    "SolvedCrossing",
    "Speed",
    "Spread",
    "StateResult",
    "Stress",
    "SupplyFacts",
    "TranslatorFacts",
    "Waiver",
]
