"""Makes the demo books: invented funds with invented holdings, shaped like the real ones.

Run as ``python demo_books/make_demo_books.py``; it rewrites the workbooks beside it. Everything is drawn
from seeded generators, so the books come out the same each time.

The promised payments decay with the survivors of a Gompertz law, whose force of mortality at age x is
``exp((x - m) / b) / b`` with modal age m and spread b: of those aged x the part
``exp(-exp((x - m) / b) · (exp(t / b) - 1))`` is alive t years later (Gompertz, B., "On the nature of the
function expressive of the law of human mortality", Philosophical Transactions 115, 1825, in the
parametrisation by the mode that is common practice). Pensions in payment fall with the survivors,
deferred ones start at a later date, and each group spreads over many ages.

The curves, volatilities and spreads are of the size that markets showed in the middle of the 2020s;
none is a quotation. Names of issuers and states are made up.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from datetime import date
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
sys.path.insert(1, str(Path(__file__).resolve().parent))

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
from desk.report.book_workbook import write_book
from desk.valuation.standing import stand

__all__ = ["BOOKS", "main"]


def pension_fund() -> Book:
    """A pension fund: four groups over 70 years, 45 holdings, a funding ratio near 92 %."""
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
    )
    pensioners, spouses = month_starts(1, 480), month_starts(1, 200, 3)
    deferred, active = month_starts(97, 660), month_starts(181, 660)
    parts = [
        Flows(
            "Pensioners",
            pensioners,
            pension(pensioners, ages=(65, 90, 1), yearly=62e6, per_year=12, increase=0.018),
        ),
        Flows(
            "Deferred members",
            deferred,
            pension(deferred, ages=(48, 62, 1), yearly=34e6, per_year=12, increase=0.018),
        ),
        Flows(
            "Active, past service",
            active,
            pension(active, ages=(32, 55, 1), yearly=38e6, per_year=12, increase=0.020),
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
            history=history(11, start=-0.004, long_run=0.022, end=0.0205, volatility=0.0075),
        )

    return scaled(make, 0.92)


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
                *(0.0385, 0.0379, 0.0374, 0.0377, 0.0389, 0.0405, 0.0431, 0.0463),
                *(0.0480, 0.0484, 0.0481, 0.0465, 0.0448),
            ]
        ),
        compounding=Compounding.SEMI_ANNUAL,
        interpolation=Interpolation.MONOTONE_CONVEX,
        liability_spread=0.003,
        market_risk_premium=0.03,
    )
    months = month_starts(1, 600)
    years = years_to(months)
    parts = []
    # line, first age and last age of each cohort, payments a year [million], increase, beta
    annuities: tuple[tuple[str, tuple[tuple[float, float], ...], float, float, float], ...] = (
        ("Annuities in payment, level", ((62, 68), (68, 75), (75, 90)), 260, 0.0, 0.0),
        ("Annuities in payment, rising", ((62, 68), (68, 75), (75, 90)), 120, 0.025, 0.0),
        ("Joint-life annuities", ((60, 70), (70, 85)), 70, 0.01, 0.0),
        ("Bulk annuities", ((60, 67), (67, 74), (74, 88)), 190, 0.02, 0.0),
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
                months, ages=(low, high, 1), yearly=yearly * 1e6 / 2, per_year=12, increase=0.02
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
        Holding(name="Property portfolio", kind=HoldingKind.FUND, market_value=240e6),
    ]

    def make(scale: float) -> Book:
        return Book(
            basis=basis,
            liabilities=flow_table(parts, scale),
            holdings=own_names([*bonds, *others]),
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
            history=history(12, start=0.004, long_run=0.03, end=0.0378, volatility=0.009),
        )

    return scaled(make, 1.07)


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
                rates_correlation=owned_floats([0.05]),
            ),
            run=Run(paths=10_000, horizon_years=30, steps_per_year=12, seed=1693, measure=Measure.REAL_WORLD),
            history=history(13, start=0.003, long_run=0.03, end=0.0385, volatility=0.0085),
        )

    return scaled(make, 1.04)


BOOKS: dict[str, Callable[[], Book]] = {
    "pension_fund.xlsx": pension_fund,
    "life_insurer.xlsx": life_insurer,
    "small_endowment.xlsx": small_endowment,
}


def main() -> None:
    """Rewrite the workbooks."""
    folder = Path(__file__).resolve().parent
    for name, make in BOOKS.items():
        book = make()

        write_book(book, folder / name)
        standing = stand(book)
        print(
            f"{name}: {len(book.liabilities):,} flows, {len(book.holdings)} holdings, "
            f"funding ratio {standing.funding_ratio:.2%}, duration of assets "
            f"{standing.assets.effective_duration:.2f} and of liabilities "
            f"{standing.liabilities.effective_duration:.2f} years"
        )


if __name__ == "__main__":
    main()
