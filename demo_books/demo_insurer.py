"""The demo book of a life insurer."""

from __future__ import annotations

from datetime import date

import numpy as np
from demo_market import volatilities
from demo_parts import (
    VALUATION_DATE,
    Flows,
    bond,
    flow_table,
    history,
    issuers,
    month_starts,
    own_names,
    pension,
    scaled,
    survivors,
    years_to,
)
from demo_shocks import insurer_shocks

from desk.book import (
    Basis,
    Book,
    CurveKind,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    LiabilityMethod,
    LineTerms,
    ModelName,
    RatesModel,
    RiskyAssets,
    Run,
    ShockSettings,
    Side,
)
from desk.book.arrays import owned_floats
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation

__all__ = ["life_insurer"]


def life_insurer() -> Book:
    """A life insurer: twelve product lines over 50 years, 400 bonds, liabilities longer than assets."""
    rng = np.random.default_rng(1762)
    basis = Basis(
        title="Larkmoor Mutual Life (invented)",
        valuation_date=VALUATION_DATE,
        currency="GBP",
        terms=owned_floats([0.5, 1, 2, 3, 5, 7, 10, 15, 20, 25, 30, 40, 50]),
        rates=owned_floats(
            [
                *(0.0385, 0.0379, 0.0374, 0.0377, 0.0387, 0.0400, 0.0419, 0.0440),
                *(0.0449, 0.0451, 0.0450, 0.0445, 0.0441),
            ]
        ),
        curve_kind=CurveKind.SWAP,
        compounding=Compounding.SEMI_ANNUAL,
        interpolation=Interpolation.MONOTONE_CONVEX,
        liability_method=LiabilityMethod.TERM_SPREADS,
        liability_terms=owned_floats([1, 5, 10, 20, 30, 50]),
        liability_spreads=owned_floats([0.0022, 0.0031, 0.0037, 0.0034, 0.0026, 0.0015]),
        market_risk_premium=0.03,
        inflation=Inflation(
            terms=owned_floats([1, 2, 3, 5, 7, 10, 15, 20, 30, 50]),
            rates=owned_floats(
                [0.0352, 0.0341, 0.0335, 0.0329, 0.0325, 0.0322, 0.0319, 0.0316, 0.0308, 0.0302]
            ),
            volatility=0.013,
            recent=0.0385,
        ),
    )
    months = month_starts(1, 600)
    years = years_to(months)
    parts = []
    # line, first age and last age of each cohort, payments a year [million], increase, beta
    annuities: tuple[tuple[str, tuple[tuple[float, float], ...], float, float, float], ...] = (
        ("Annuities in payment, level", ((62, 68), (68, 75), (75, 90)), 260, 0.0, 0.0),
        ("Annuities in payment, rising", ((62, 68), (68, 75), (75, 90)), 120, 0.0, 0.0),
        ("Joint-life annuities", ((60, 70), (70, 85)), 70, 0.01, 0.0),
        ("Bulk annuities", ((60, 67), (67, 74), (74, 88)), 165, 0.0, 0.0),
        ("Disability income", ((40, 50), (50, 60)), 45, 0.02, 0.0),
    )
    for line, cohorts, yearly, increase, beta in annuities:
        for low, high in cohorts:
            amounts = pension(
                months,
                ages=(low, high, 1),
                yearly=yearly * 1e6 / len(cohorts),
                per_year=12,
                increase=increase,
            )
            parts.append(Flows(line, months, amounts, beta))
    deferred = (
        ("Deferred annuities", ((45, 52), (52, 60)), 110),
        ("Long-term care", ((55, 65), (65, 75)), 40),
    )
    for line, cohorts_later, yearly in deferred:
        for low, high in cohorts_later:
            start = 65.0 - (low + high) / 2.0 if line == "Deferred annuities" else 12.0
            paid = 1.0 / (1.0 + np.exp(-(years - start) / 1.5))
            amounts = paid * pension(
                months,
                ages=(low, high, 1),
                yearly=yearly * 1e6 / 2,
                per_year=12,
                increase=0.02 if line == "Deferred annuities" else 0.0,
            )
            parts.append(Flows(line, months, amounts))
    deaths = (("Whole life", ((40, 55), (55, 70)), 3.2e9), ("Funeral plans", ((60, 70), (70, 82)), 0.6e9))
    for line, cohorts_dying, insured in deaths:
        for low, high in cohorts_dying:
            alive = np.mean([survivors(age, np.append(0.0, years)) for age in range(low, high)], axis=0)
            parts.append(Flows(line, months, insured / 2 * -np.diff(alive)))
    alive = survivors(45.0, np.append(0.0, years))
    in_force = np.exp(-np.append(0.0, years) / 14.0)
    parts.append(Flows("Term insurance", months, 9e9 * -np.diff(alive) * in_force[1:]))
    savings = np.exp(-years / 9.0) * (years < 50.0)
    parts.append(Flows("With-profits savings", months, 19e6 * savings, 0.2))
    parts.append(Flows("Unit-linked guarantees", months, 2.4e6 * np.exp(-years / 12.0), 0.35))
    parts.append(Flows("Unit-linked guarantees", months, 1.1e6 * np.exp(-years / 20.0), 0.35))

    states = ("Kingdom of Estermere", "Free State of Wold")
    bonds = []
    for number in range(60):
        years_left = float(np.round(rng.gamma(3.0, 4.2) + 0.4, 2))
        bonds.append(
            bond(
                rng,
                basis,
                states[number % 3 // 2],
                years=min(years_left, 44.0),
                nominal=1e6 * float(rng.integers(10, 60)),
                spread=None,
                frequency=2,
            )
        )
    bonds += [
        bond(
            rng,
            basis,
            issuer,
            years=float(np.round(min(rng.gamma(2.4, 3.8) + 0.3, 38.0), 2)),
            nominal=1e6 * float(rng.integers(4, 32)),
            spread=float(np.round(rng.uniform(0.005, 0.02), 4)),
            frequency=int(rng.choice([1, 2, 2, 4])),
        )
        for issuer in issuers(rng, 340)
    ]
    linked = [
        Holding(
            name=f"Kingdom of Estermere linked {100 * coupon:.4g}% {maturity.year}",
            kind=HoldingKind.LINKED_BOND,
            nominal=nominal,
            coupon=coupon,
            frequency=2,
            maturity=maturity,
            index_lag_months=lag,
            index_ratio=ratio,
        )
        for coupon, maturity, nominal, lag, ratio in (
            (0.0125, date(2035, 11, 22), 120e6, 3, 1.9142),
            (0.00625, date(2045, 3, 22), 140e6, 3, 1.4877),
            (0.02, date(2052, 7, 26), 60e6, 8, 2.2316),
        )
    ]
    others = [
        Holding(
            name="Estermere strip 2051", kind=HoldingKind.ZERO, nominal=180e6, maturity=date(2051, 12, 7)
        ),
        Holding(
            name="Estermere strip 2061", kind=HoldingKind.ZERO, nominal=220e6, maturity=date(2061, 12, 7)
        ),
        Holding(name="Operating account", kind=HoldingKind.DEPOSIT, nominal=95e6),
        Holding(name="Overnight deposits", kind=HoldingKind.DEPOSIT, nominal=160e6),
        Holding(name="Commercial mortgages", kind=HoldingKind.FUND, market_value=410e6, duration=5.8),
        Holding(name="With-profits equity portfolio", kind=HoldingKind.FUND, market_value=390e6),
        Holding(name="Property portfolio", kind=HoldingKind.PROPERTY, market_value=240e6),
    ]

    def make(scale: float) -> Book:
        return Book(
            basis=basis,
            liabilities=flow_table(parts, scale),
            holdings=own_names([*bonds, *linked, *others]),
            rates_model=RatesModel(
                ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.0095, risk_price=-0.1
            ),
            risky_assets=RiskyAssets(
                names=("Equities", "Property"),
                value=owned_floats([390e6, 240e6]),
                premium=owned_floats([0.04, 0.025]),
                volatility=owned_floats([0.16, 0.12]),
                dividend_yield=owned_floats([0.032, 0.045]),
                correlation=owned_floats([[1.0, 0.5], [0.5, 1.0]]),
                rates_correlation=owned_floats([0.05, -0.1]),
            ),
            run=Run(paths=10_000, horizon_years=50, steps_per_year=12, seed=1762),
            line_terms=(
                LineTerms(
                    Side.LIABILITIES,
                    "Annuities in payment, rising",
                    Indexation(IndexationKind.RISING, rise=0.025),
                ),
                LineTerms(
                    Side.LIABILITIES,
                    "Bulk annuities",
                    Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.05),
                ),
                LineTerms(Side.LIABILITIES, "Long-term care", Indexation(IndexationKind.LINKED)),
            ),
            shocks=insurer_shocks(),
            shock_settings=ShockSettings(
                sets=("Basel 2016", "Sensitivities in accounts", "Parallel moves"), thresholds=(1.05, 1.0)
            ),
            volatilities=volatilities(
                np.random.default_rng(1973), basis, mean_reversion=0.05, volatility=0.0095
            ),
            history=history(12, start=0.004, long_run=0.03, end=0.0378, volatility=0.009),
        )

    return scaled(make, 1.07)
