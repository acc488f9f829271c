"""What is held and promised, and the basis it is valued on: plain immutable data."""

from desk.book.basis import Basis, CurveKind, LiabilityMethod
from desk.book.book import Book, Notes
from desk.book.curve_source import BondFit, CurveBonds, CurveParameters
from desk.book.fault import Fault, Severity
from desk.book.flows import FlowTable, PricedFlows, Side
from desk.book.holding import Amortisation, Holding, HoldingKind, PriceKind
from desk.book.inflation import Indexation, IndexationKind, Inflation, LineTerms
from desk.book.market import Instrument, ScenarioSet, Volatilities, VolatilityKind, YieldHistory
from desk.book.model import History, ModelName, RatesModel, RiskyAssets
from desk.book.provenance import Provenance
from desk.book.run import Bridge, Measure, Run, Sampling
from desk.book.shock import Move, MoveKind, Shock, ShockSettings

__all__ = [
    "Amortisation",
    "Basis",
    "BondFit",
    "Book",
    "Bridge",
    "CurveBonds",
    "CurveKind",
    "CurveParameters",
    "Fault",
    "FlowTable",
    "History",
    "Holding",
    "HoldingKind",
    "Indexation",
    "IndexationKind",
    "Inflation",
    "Instrument",
    "LiabilityMethod",
    "LineTerms",
    "Measure",
    "ModelName",
    "Move",
    "MoveKind",
    "Notes",
    "PriceKind",
    "PricedFlows",
    "Provenance",
    "RatesModel",
    "RiskyAssets",
    "Run",
    "Sampling",
    "ScenarioSet",
    "Severity",
    "Shock",
    "ShockSettings",
    "Side",
    "Volatilities",
    "VolatilityKind",
    "YieldHistory",
]
