"""The demo book of a pension fund."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
from demo_market import corporate_bonds, yield_history
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
)

from desk.book import (
    Basis,
    BondFit,
    Book,
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
from desk.rates.parametric import Svensson

__all__ = ["pension_fund"]

_CORPORATE = Svensson(
    level=0.0385, slope=-0.0125, curvature=-0.011, second_curvature=0.004, decay=1.9, second_decay=9.0
)
"""Where the corporate bonds lie: some 90 basis points over the curve in the middle."""


def pension_fund() -> Book:
    """A pension fund: four groups over 70 years, 47 holdings, a funding ratio near 92 %.

    Of the groups one is collared, one rises by a fixed rate, one follows prices and one is fixed: the
    amounts of the first three are in today's money.
    """
    rng = np.random.default_rng(1825)
    basis = Basis(
        title="Harrowmere Staff Pension Fund (invented)",
        valuation_date=VALUATION_DATE,
        currency="EUR",
        terms=owned_floats([1, 2, 3, 4, 5, 7, 10, 12, 15, 20, 25, 30, 40, 50]),
        rates=owned_floats(
            [
                *(0.0209, 0.0216, 0.0225, 0.0234, 0.0243, 0.0258, 0.0277, 0.0287),
                *(0.0297, 0.0303, 0.0301, 0.0296, 0.0287, 0.0281),
            ]
        ),
        liability_spread=0.006,
        inflation=Inflation(
            terms=owned_floats([1, 2, 3, 5, 7, 10, 15, 20, 30, 50]),
            rates=owned_floats(
                [0.0192, 0.0188, 0.0189, 0.0194, 0.0199, 0.0205, 0.0213, 0.0219, 0.0225, 0.0225]
            ),
            volatility=0.011,
            recent=0.0215,
        ),
    )
    accounting = replace(
        basis,
        title="Accounting: high-quality corporate bonds",
        liability_spread=0.0,
        liability_method=LiabilityMethod.CORPORATE_BONDS,
        liability_bonds=corporate_bonds(np.random.default_rng(1970), _CORPORATE, 32, noise=3e-4),
        liability_fit=BondFit.SVENSSON,
    )
    pensioners, spouses = month_starts(1, 480), month_starts(1, 200, 3)
    deferred, active = month_starts(97, 660), month_starts(181, 660)
    parts = [
        Flows(
            "Pensioners",
            pensioners,
            pension(pensioners, ages=(65, 90, 1), yearly=62e6, per_year=12, increase=0.0),
        ),
        Flows(
            "Deferred members",
            deferred,
            pension(deferred, ages=(48, 62, 1), yearly=34e6, per_year=12, increase=0.0),
        ),
        Flows(
            "Active, past service",
            active,
            pension(active, ages=(32, 55, 1), yearly=38e6, per_year=12, increase=0.0),
        ),
        Flows(
            "Spouses", spouses, pension(spouses, ages=(58, 85, 1), yearly=11e6, per_year=4, increase=0.018)
        ),
    ]
    holdings = [
        bond(
            rng, basis, "Republic of Aldermark", years=years, nominal=nominal * 1e6, spread=None, frequency=1
        )
        for years, nominal in (
            *((2.1, 60), (4.4, 60), (6.8, 70), (9.5, 80), (12.9, 70), (16.2, 70), (20.4, 80), (25.7, 80)),
            *((29.5, 60), (33.8, 40)),
        )
    ]
    spreads = np.round(rng.uniform(0.005, 0.02, 18), 4)
    terms = np.round(np.linspace(1.3, 21.0, 18) + rng.uniform(-0.4, 0.4, 18), 2)
    holdings += [
        bond(
            rng, basis, issuer, years=years, nominal=nominal, spread=spread, frequency=int(rng.choice([1, 2]))
        )
        for issuer, years, nominal, spread in zip(
            issuers(rng, 18),
            terms.tolist(),
            (1e6 * rng.integers(10, 36, 18)).tolist(),
            spreads.tolist(),
            strict=True,
        )
    ]
    holdings += [
        Holding(
            name=f"Republic of Aldermark strip {2026 + years}",
            kind=HoldingKind.ZERO,
            nominal=nominal * 1e6,
            maturity=date(2026 + years, 7, 4),
        )
        for years, nominal in ((18, 40), (24, 50), (28, 50), (36, 60))
    ]
    holdings += [
        Holding(
            name="Republic of Aldermark linked 0.5% 2036",
            kind=HoldingKind.LINKED_BOND,
            nominal=70e6,
            coupon=0.005,
            frequency=1,
            maturity=date(2036, 4, 15),
            index_ratio=1.2174,
            has_principal_floor=True,
        ),
        Holding(
            name="Corvale Water linked 1.25% 2048",
            kind=HoldingKind.LINKED_BOND,
            nominal=45e6,
            coupon=0.0125,
            frequency=2,
            maturity=date(2048, 11, 20),
            price=93.4,
            index_ratio=1.0862,
        ),
    ]
    holdings += [
        Holding(name=name, kind=HoldingKind.DEPOSIT, nominal=nominal * 1e6)
        for name, nominal in (("Current account", 12), ("Call money Corvale", 25), ("Collateral account", 18))
    ]
    holdings += [
        Holding(
            name=name, kind=HoldingKind.FUND, market_value=worth * 1e6, units=float(units), duration=duration
        )
        for name, worth, units, duration in (
            ("World equity index fund", 210, 1_750_000, None),
            ("Regional equity index fund", 85, 640_000, None),
            ("Small companies fund", 35, 190_000, None),
            ("Emerging markets fund", 45, 410_000, None),
            ("Property fund", 120, 96_000, None),
            ("Infrastructure fund", 70, 52_000, None),
            ("Private loans fund", 60, 60_000, 3.2),
            ("Mortgage fund", 75, 71_000, 6.4),
            ("Long government bond fund", 110, 1_020_000, 19.5),
            ("Index-linked bond fund", 40, 350_000, 11.0),
        )
    ]

    short_rates = history(11, start=-0.004, long_run=0.022, end=0.0205, volatility=0.0075)

    def make(scale: float) -> Book:
        return Book(
            basis=basis,
            liabilities=flow_table(parts, scale),
            holdings=own_names(holdings),
            rates_model=RatesModel(
                ModelName.HULL_WHITE, mean_reversion=0.04, volatility=0.0085, risk_price=-0.15
            ),
            risky_assets=RiskyAssets(
                names=("Equities", "Property", "Infrastructure"),
                value=owned_floats([375e6, 120e6, 70e6]),
                premium=owned_floats([0.042, 0.028, 0.034]),
                volatility=owned_floats([0.165, 0.11, 0.13]),
                dividend_yield=owned_floats([0.022, 0.035, 0.04]),
                correlation=owned_floats([[1.0, 0.55, 0.5], [0.55, 1.0, 0.45], [0.5, 0.45, 1.0]]),
                rates_correlation=owned_floats([0.1, -0.1, -0.05]),
            ),
            run=Run(paths=10_000, horizon_years=40, steps_per_year=12, seed=1825),
            line_terms=(
                LineTerms(
                    Side.LIABILITIES,
                    "Pensioners",
                    Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.05),
                ),
                LineTerms(Side.LIABILITIES, "Deferred members", Indexation(IndexationKind.RISING, rise=0.02)),
                LineTerms(Side.LIABILITIES, "Active, past service", Indexation(IndexationKind.LINKED)),
            ),
            second_basis=accounting,
            shock_settings=ShockSettings(thresholds=(1.0, 0.9)),
            yield_history=yield_history(basis, short_rates, [1, 2, 5, 10, 20, 30], seed=17),
            history=short_rates,
        )

    return scaled(make, 0.92)
