"""Invented books with every kind of curve, liability basis and indexation, and two bases."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np

from desk.book import (
    Basis,
    BondFit,
    Book,
    CurveBonds,
    CurveKind,
    CurveParameters,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    LiabilityMethod,
    LineTerms,
    Side,
)
from desk.rates.compounding import Compounding
from tests.report import examples

__all__ = ["bonds", "curve_bases", "full_book", "inflation"]

FACTORS = CurveParameters(0.034, -0.012, 0.008, 2.1, beta_3=-0.006, tau_2=9.0)


def inflation(*, volatility: float = 0.011, recent: float | None = 0.031) -> Inflation:
    """A rising curve of expected inflation."""
    return Inflation(
        np.array([1.0, 2.0, 5.0, 10.0, 30.0]),
        np.array([0.026, 0.024, 0.022, 0.0215, 0.0205]),
        volatility=volatility,
        recent=recent,
    )


def bonds(count: int = 9) -> CurveBonds:
    """Bonds near one another's yields, some quoted by yield, some clean and some dirty."""
    years = np.arange(count)
    by_price = years % 3 != 0
    coupon = np.where(years == 4, 0.0, 0.02 + 0.0017 * years)
    level = 0.0235 + 0.0011 * years
    clean = 100.0 + 60.0 * (coupon - level) * np.minimum(years + 1.5, 9.0) / 0.6
    discount = 100.0 * np.exp(-0.028 * (years * 3 + 1.5))
    return CurveBonds(
        tuple("=Bond" if number == 1 else f"Bond {number}" for number in years.tolist()),
        np.array(
            [f"{2027 + 3 * number}-0{1 + number % 9}-15" for number in years.tolist()], dtype="datetime64[D]"
        ),
        coupon,
        np.where(years % 2 == 0, 2, 1),
        np.where(by_price, np.where(years == 4, discount, clean), np.nan),
        np.where(by_price, np.nan, level),
        np.where(years % 2 == 0, True, False),
    )


def curve_bases() -> dict[str, Basis]:
    """The basis of the example with each kind of curve that has no quotes by term."""
    plain = examples.book().basis
    none = np.zeros(0)
    bare = replace(plain, terms=none, rates=none)
    return {
        "svensson": replace(bare, curve_kind=CurveKind.SVENSSON, parameters=FACTORS),
        "nelson-siegel": replace(
            bare,
            curve_kind=CurveKind.NELSON_SIEGEL,
            parameters=FACTORS,
            compounding=Compounding.CONTINUOUS,
        ),
        "flat": replace(bare, curve_kind=CurveKind.FLAT, flat_rate=0.0265),
        "bonds, exact": replace(bare, curve_kind=CurveKind.BONDS, bonds=bonds(), bond_fit=BondFit.EXACT),
        "bonds, svensson": replace(
            bare, curve_kind=CurveKind.BONDS, bonds=bonds(12), bond_fit=BondFit.SVENSSON
        ),
        "bonds, nelson-siegel": replace(
            bare,
            curve_kind=CurveKind.BONDS,
            bonds=bonds(12),
            bond_fit=BondFit.NELSON_SIEGEL,
            last_liquid_point=25.0,
        ),
    }


def full_book() -> Book:
    """Everything at once: indexation of every kind, spreads by term, terms of lines, linkers, two bases."""
    book = examples.book()
    generator = np.random.default_rng(8)
    names = (
        "Pensions",
        examples.HOSTILE,
        "Collared",
        "Rising",
        "Floored",
        "Own spread",
        "Own rate",
        "Lagged",
    )
    count = 48
    time = np.concatenate(([0.25, 1.0, 2.0, 50.0, 61.5], generator.uniform(0.02, 58.0, count - 5)))
    lines = [names[number % len(names)] for number in range(count)]
    liabilities = FlowTable.build(
        lines,
        time,
        1e6 * np.exp(-time / 30.0) * generator.uniform(0.5, 1.5, count),
        beta=np.where(np.arange(count) % 3 == 0, 0.25, 0.0),
    )
    linked, collared, rising = IndexationKind.LINKED, IndexationKind.COLLARED, IndexationKind.RISING
    owed = Side.LIABILITIES
    terms = (
        LineTerms(owed, "Pensions", Indexation(linked)),
        LineTerms(owed, "Collared", Indexation(collared, floor=0.0, cap=0.025)),
        LineTerms(owed, "Rising", Indexation(rising, rise=0.015)),
        LineTerms(owed, "Floored", Indexation(collared, floor=0.01, lag=0.5)),
        LineTerms(owed, "Own spread", Indexation(linked), spread=0.0075),
        LineTerms(owed, "Own rate", rate=0.031),
        LineTerms(owed, "Lagged", Indexation(linked, lag=0.25, least=1.0)),
        LineTerms(owed, "No such line", Indexation(linked)),
        LineTerms(Side.ASSETS, "Lease", Indexation(collared, cap=0.03), spread=0.01),
    )
    bond = Holding(
        "Linked", HoldingKind.LINKED_BOND, 6e6, 0.0125, 2, date(2044, 3, 22), price=97.5, index_ratio=1.21
    )
    holdings = (
        *book.holdings,
        bond,
        replace(bond, name="Floored bond", has_principal_floor=True, index_ratio=1.02, index_lag_months=8),
        Holding(
            "Floater", HoldingKind.FLOATER, 5e6, 0.0, 4, date(2036, 5, 31), current_rate=0.023, price=99.0
        ),
    )
    basis = replace(
        book.basis,
        liability_method=LiabilityMethod.TERM_SPREADS,
        liability_terms=np.array([1.0, 5.0, 20.0]),
        liability_spreads=np.array([0.002, 0.0045, 0.006]),
        inflation=inflation(),
    )
    second = replace(
        curve_bases()["svensson"],
        liability_method=LiabilityMethod.CORPORATE_BONDS,
        liability_bonds=bonds(10),
        liability_fit=BondFit.NELSON_SIEGEL,
        inflation=inflation(volatility=0.0, recent=None),
        liability_spread=-0.0005,
    )
    return replace(
        book,
        basis=basis,
        liabilities=liabilities,
        holdings=holdings,
        asset_flows=FlowTable.build(["Lease"] * 12, np.arange(1.0, 13.0), np.full(12, 4e5)),
        line_terms=terms,
        second_basis=second,
    )
