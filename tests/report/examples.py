"""Invented books and readings for the tests of the report."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from functools import cache
from pathlib import Path

import numpy as np

from desk import tasks
from desk.book import (
    Basis,
    Book,
    Fault,
    FlowTable,
    Holding,
    HoldingKind,
    ModelName,
    RatesModel,
    Run,
    Severity,
)  # fmt: skip
from desk.intake.records import Reading
from desk.rates.compounding import Compounding
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing

__all__ = ["HOSTILE", "book", "reading", "simulation", "standing"]

HOSTILE = "=HYPERLINK(0)"
"""A name that a spreadsheet would take for a formula."""


@cache
def book() -> Book:
    """Flows on and between the key rates, every kind of holding, betas, and names that look like formulas."""
    generator = np.random.default_rng(20)
    count = 90
    time = np.concatenate(([0.25, 1.0, 5.0, 50.0, 61.5], generator.uniform(0.02, 58.0, count - 5)))
    names = [("Pensions", HOSTILE, "Deferred *?", "")[number % 4] for number in range(count)]
    liabilities = FlowTable.build(
        names,
        time,
        1e6 * np.exp(-time / 30.0) * generator.uniform(0.5, 1.5, count),
        beta=np.where(np.arange(count) % 3 == 0, 0.25, 0.0),
    )
    bond = Holding(
        "Bond", HoldingKind.BOND, nominal=2e7, coupon=0.03, frequency=2, maturity=date(2041, 5, 31),
        market_value=1.9e7,
    )  # fmt: skip
    holdings = (
        bond,
        replace(bond, name="+Bond", coupon=0.015, frequency=4, maturity=date(2033, 9, 1), market_value=None),
        Holding("@Zero", HoldingKind.ZERO, nominal=5e6, maturity=date(2051, 1, 1), market_value=2.2e6),
        Holding("Deposit", HoldingKind.DEPOSIT, nominal=1.5e6),
        Holding("Fund", HoldingKind.FUND, market_value=4e6, duration=6.5),
    )
    basis = Basis(
        date(2026, 3, 31),
        "EUR",
        np.array([0.5, 1.0, 3.0, 7.0, 15.0, 30.0]),
        np.array([0.021, 0.022, 0.024, 0.027, 0.030, 0.029]),
        compounding=Compounding.SEMI_ANNUAL,
        liability_spread=0.002,
        market_risk_premium=0.03,
        title="=Invented fund",
    )
    return Book(
        basis,
        liabilities,
        holdings,
        asset_flows=FlowTable.build(["Lease", "Lease"], [2.0, 3.0], [4e5, 4e5]),
        rates_model=RatesModel(ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.008),
        run=Run(paths=400, horizon_years=12, steps_per_year=2, seed=7),
    )


def reading(of: Book | None = None) -> Reading:
    """A reading of a book with one mild fault."""
    fault = Fault(
        f"{HOSTILE} is no number", "a number", "Type a number.", "Liabilities", "C14", Severity.MILD
    )
    return Reading(Path("invented.xlsx"), "ab" * 32, book() if of is None else of, (fault,), ())


@cache
def standing() -> Standing:
    """The standing of `book`."""
    return tasks.value(book())


@cache
def simulation() -> Simulation:
    """A run of `book`."""
    return tasks.simulate(book())
