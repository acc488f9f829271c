"""The demo book of an endowment."""

from __future__ import annotations

import numpy as np
from demo_parts import VALUATION_DATE, bond, history, issuers, scaled
from demo_shocks import endowment_shocks

from desk.book import (
    Basis,
    Book,
    FlowTable,
    Holding,
    HoldingKind,
    Measure,
    ModelName,
    RatesModel,
    RiskyAssets,
    Run,
)
from desk.book.arrays import owned_floats
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation

__all__ = ["small_endowment"]


def small_endowment() -> Book:
    """An endowment: thirty years of spending, six bonds, a fund, a deposit, gifts that were promised."""
    rng = np.random.default_rng(1693)
    basis = Basis(
        title="Pellbrook School Endowment (invented)",
        valuation_date=VALUATION_DATE,
        currency="USD",
        terms=owned_floats([0.25, 1, 2, 3, 5, 7, 10, 20, 30]),
        rates=owned_floats([0.0395, 0.0372, 0.0360, 0.0361, 0.0372, 0.0389, 0.0413, 0.0468, 0.0465]),
        compounding=Compounding.CONTINUOUS,
        interpolation=Interpolation.LINEAR_ZERO,
    )
    quarters = np.arange(1, 121) / 4.0
    yearly = np.arange(1.0, 31.0)
    promises = (
        ("Scholarships", quarters, 0.11e6 * 1.025**quarters),
        ("Two chairs", quarters, 0.085e6 * 1.03**quarters),
        ("Upkeep of buildings", yearly, 0.24e6 * 1.025**yearly),
    )
    bonds = [
        bond(rng, basis, "Commonwealth of Tamarin", years=years, nominal=nominal, spread=None, frequency=2)
        for years, nominal in ((1.9, 1.5e6), (6.9, 2.0e6), (18.4, 2.5e6))
    ] + [
        bond(rng, basis, issuer, years=years, nominal=1.2e6, spread=spread, frequency=2)
        for issuer, years, spread in zip(
            issuers(rng, 3), (3.6, 9.2, 14.7), (0.008, 0.0105, 0.014), strict=True
        )
    ]
    gifts = np.arange(1.0, 7.0)

    def make(scale: float) -> Book:
        return Book(
            basis=basis,
            liabilities=FlowTable.build(
                [line for line, times, _ in promises for _ in times],
                np.concatenate([times for _, times, _ in promises]),
                np.round(scale * np.concatenate([amounts for *_, amounts in promises]), 2),
            ),
            holdings=(
                *bonds,
                Holding(
                    name="Balanced fund",
                    kind=HoldingKind.FUND,
                    market_value=5.6e6,
                    units=41_000.0,
                    duration=1.5,
                ),
                Holding(name="Savings account", kind=HoldingKind.DEPOSIT, nominal=0.45e6),
            ),
            asset_flows=FlowTable.build(
                ["Promised gifts"] * gifts.size, gifts, np.full(gifts.size, 90_000.0)
            ),
            rates_model=RatesModel(
                ModelName.CIR,
                mean_reversion=0.06,
                volatility=0.05,
                long_run_rate=0.061,
                starting_rate=0.037,
                risk_price=-0.1,
            ),
            risky_assets=RiskyAssets(
                names=("Balanced fund",),
                value=owned_floats([5.6e6]),
                premium=owned_floats([0.03]),
                volatility=owned_floats([0.10]),
                dividend_yield=owned_floats([0.02]),
                correlation=owned_floats([[1.0]]),
                rates_correlation=owned_floats([0.0]),
            ),
            run=Run(paths=10_000, horizon_years=30, steps_per_year=12, seed=1693, measure=Measure.REAL_WORLD),
            shocks=endowment_shocks(),
            history=history(13, start=0.003, long_run=0.03, end=0.0385, volatility=0.0085),
        )

    return scaled(make, 1.04)
