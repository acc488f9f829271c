"""Small invented books for tests of scenarios."""

from __future__ import annotations

from datetime import date

import numpy as np

from desk.book import Basis, Book, FlowTable, Measure, ModelName, PricedFlows, RatesModel, Run, Side
from desk.rates.short_rate import ShortRateModel
from desk.scenarios.drawn_model import affine
from desk.scenarios.models import rate_model

__all__ = ["AFFINE", "ALL_MODELS", "NO_FLOWS", "affine_model", "assets", "book", "liabilities", "priced"]

BASIS = Basis(
    date(2026, 1, 1),
    "EUR",
    np.array([1.0, 2.0, 5.0, 10.0, 20.0, 30.0]),
    np.array([0.02, 0.022, 0.025, 0.03, 0.032, 0.031]),
)

ALL_MODELS: dict[ModelName, RatesModel] = {
    ModelName.VASICEK: RatesModel(
        ModelName.VASICEK,
        mean_reversion=0.1,
        volatility=0.01,
        long_run_rate=0.03,
        starting_rate=0.02,
        risk_price=0.2,
    ),
    ModelName.HO_LEE: RatesModel(ModelName.HO_LEE, volatility=0.007, risk_price=0.1),
    ModelName.HULL_WHITE: RatesModel(
        ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.009, risk_price=-0.15
    ),
    ModelName.GAUSSIAN_2: RatesModel(
        ModelName.GAUSSIAN_2,
        mean_reversion=0.4,
        volatility=0.012,
        second_mean_reversion=0.04,
        second_volatility=0.008,
        factor_correlation=-0.6,
        risk_price=0.2,
    ),
    ModelName.CIR: RatesModel(
        ModelName.CIR,
        mean_reversion=0.15,
        volatility=0.07,
        long_run_rate=0.03,
        starting_rate=0.02,
        risk_price=0.4,
    ),
    ModelName.CIR_SHIFTED: RatesModel(
        ModelName.CIR_SHIFTED,
        mean_reversion=0.15,
        volatility=0.12,
        long_run_rate=0.03,
        starting_rate=0.02,
        risk_price=0.4,
    ),
    ModelName.BLACK_KARASINSKI: RatesModel(
        ModelName.BLACK_KARASINSKI, mean_reversion=0.08, volatility=0.22, risk_price=0.2
    ),
}


AFFINE = tuple(name for name in ALL_MODELS if name is not ModelName.BLACK_KARASINSKI)


def affine_model(settings: Book) -> ShortRateModel:
    """The model of a book that has bonds in closed form."""
    model = affine(rate_model(settings))
    assert model is not None
    return model


def book(
    model: RatesModel | None,
    *,
    paths: int = 2_000,
    horizon_years: int = 10,
    steps_per_year: int = 4,
    seed: int = 3,
    measure: Measure = Measure.PRICING,
) -> Book:
    """A book without flows of its own."""
    run = Run(
        paths=paths, horizon_years=horizon_years, steps_per_year=steps_per_year, seed=seed, measure=measure
    )
    return Book(BASIS, FlowTable.empty(), rates_model=model, run=run)


def priced(
    side: Side, time: list[float] | np.ndarray, amount: list[float] | np.ndarray, spread: float = 0.0
) -> PricedFlows:
    """Flows of one line at one spread."""
    count = len(time)
    return PricedFlows(
        side=side,
        line_names=("line",) if count else (),
        line=np.zeros(count, int),
        time=np.asarray(time, dtype=float),
        amount=np.asarray(amount, dtype=float),
        spread=np.full(count, spread),
        is_flow=np.ones(count, bool),
    )


NO_FLOWS = priced(Side.ASSETS, [], [])


def assets() -> PricedFlows:
    """Coupons and redemptions over fifteen years, a deposit, a spread."""
    time = np.concatenate([[0.0], np.arange(1, 31) / 2.0 - 0.13, np.arange(1, 16) - 0.4])
    return priced(Side.ASSETS, time, np.where(time == 0.0, 50.0, 8.0 + time), 0.006)


def liabilities() -> PricedFlows:
    """Monthly benefits over sixty years."""
    time = np.arange(1, 721) / 12.0
    return priced(Side.LIABILITIES, time, 1.5 * np.exp(-time / 25.0), 0.0)
