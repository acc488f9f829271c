"""What is held and promised, and the basis it is valued on: plain immutable data."""

from desk.book.basis import Basis, CurveKind
from desk.book.book import Book, Notes
from desk.book.fault import Fault, Severity
from desk.book.flows import FlowTable, PricedFlows, Side
from desk.book.holding import Amortisation, Holding, HoldingKind, PriceKind
from desk.book.model import History, ModelName, RatesModel, RiskyAssets
from desk.book.provenance import Provenance
from desk.book.run import Measure, Run

__all__ = [
    "Amortisation",
    "Basis",
    "Book",
    "CurveKind",
    "Fault",
    "FlowTable",
    "History",
    "Holding",
    "HoldingKind",
    "Measure",
    "ModelName",
    "Notes",
    "PriceKind",
    "PricedFlows",
    "Provenance",
    "RatesModel",
    "RiskyAssets",
    "Run",
    "Severity",
    "Side",
]
