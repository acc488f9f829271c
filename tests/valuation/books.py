"""Small books to value."""

from __future__ import annotations

from datetime import date

import numpy as np

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind

TODAY = date(2026, 6, 30)


def basis(*, spread: float = 0.004, premium: float = 0.03) -> Basis:
    """A rising curve with a turn."""
    return Basis(
        TODAY,
        "EUR",
        np.array([0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 30.0]),
        np.array([0.031, 0.03, 0.0285, 0.029, 0.032, 0.034, 0.031]),
        liability_spread=spread,
        market_risk_premium=premium,
    )


def flat_basis(rate: float = 0.05) -> Basis:
    """One annually compounded rate for all terms, no spreads."""
    return Basis(TODAY, "EUR", np.array([1.0]), np.array([rate]))


def small_book() -> Book:
    """Every kind of holding, ready-made flows, and liabilities with and without beta."""
    holdings = (
        Holding("Northern 2031", HoldingKind.BOND, 400.0, 0.035, 2, date(2031, 8, 31), market_value=396.5),
        Holding("Western 2044", HoldingKind.BOND, 300.0, 0.0275, 1, date(2044, 2, 28), market_value=251.0),
        Holding("Western 2044", HoldingKind.BOND, 200.0, 0.04, 4, date(2039, 11, 15)),
        Holding("Strip 2035", HoldingKind.ZERO, 150.0, maturity=date(2035, 1, 2), market_value=118.0),
        Holding("Monthly payer", HoldingKind.BOND, 90.0, 0.05, 12, date(2028, 3, 30), market_value=91.1),
        Holding("Cash", HoldingKind.DEPOSIT, 55.0),
        Holding("Property fund", HoldingKind.FUND, market_value=80.0, duration=6.5),
        Holding("Equity fund", HoldingKind.FUND, market_value=120.0),
    )
    years = np.arange(1, 56)
    pensions = 45.0 * np.exp(-0.045 * years)
    linked = 9.0 * np.exp(-0.03 * years)
    liabilities = FlowTable.build(
        ["In payment"] * 55 + ["With profits"] * 55 + ["In payment", "Mixed", "Mixed"],
        np.concatenate((years, years - 0.37, [0.0, 2.2, 17.0])),
        np.concatenate((pensions, linked, [13.0, 40.0, 25.0])),
        beta=np.concatenate((np.zeros(55), np.full(55, 0.4), [0.0, 0.0, 1.0])),
    )
    return Book(
        basis(),
        liabilities,
        holdings,
        FlowTable.build(["Contributions", "Contributions", "Rent"], [0.5, 1.5, 3.25], [30.0, 31.0, 12.0]),
    )
