"""Invented books whose runs have all that a run may have, and runs that are odd."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np

from desk import tasks
from desk.book import Book, FlowTable, Measure, ModelName, RatesModel, RiskyAssets, Run, Sampling
from desk.book.market import ScenarioSet
from desk.scenarios.records import Simulation
from tests.report import examples
from tests.scenarios.books import ALL_MODELS
from tests.scenarios.inflating import INFLATION

__all__ = ["ASSETS", "ODD", "WHOLE", "book_of", "simulation_of"]

ASSETS = RiskyAssets(
    names=("=Equity", "Property"),
    value=np.array([500.0, 300.0]),
    premium=np.array([0.04, 0.03]),
    volatility=np.array([0.16, 0.12]),
    dividend_yield=np.array([0.02, 0.0]),
    correlation=np.array([[1.0, 0.5], [0.5, 1.0]]),
    rates_correlation=np.array([0.3, -0.2]),
)
"""The first has a name that a spreadsheet would take for a formula."""

_RUN = Run(paths=640, horizon_years=8, steps_per_year=1, seed=5)


def _model(name: ModelName, *, inflates: bool = True) -> RatesModel:
    if not inflates:
        return ALL_MODELS[name]
    return replace(
        ALL_MODELS[name],
        inflation_mean_reversion=0.3,
        inflation_volatility=0.01,
        inflation_rate_correlation=0.4 if name in (ModelName.HULL_WHITE, ModelName.GAUSSIAN_2) else None,
        inflation_risk_price=0.1,
    )


def _whole(model: RatesModel, assets: RiskyAssets | None = ASSETS, **settings: object) -> Book:
    book = examples.book()
    return replace(
        book,
        liabilities=FlowTable.build(["Pensions"] * 6, [0.25, 1.0, 4.5, 9.0, 20.0, 31.0], [6e6] * 6),
        holdings=book.holdings[:2],
        basis=replace(book.basis, inflation=INFLATION),
        rates_model=model,
        risky_assets=assets,
        run=replace(_RUN, **settings),  # type: ignore[arg-type]  # each has its own type
    )


def _contradicting() -> RiskyAssets:
    return replace(
        ASSETS,
        correlation=np.array([[1.0, 0.95], [0.95, 1.0]]),
        rates_correlation=np.array([0.9, -0.9]),
    )


def _set_of(node: np.ndarray, paths: int) -> ScenarioSet:
    generator = np.random.default_rng(4)
    return ScenarioSet(node, 0.02 + 0.004 * generator.standard_normal((paths, node.size)).cumsum(axis=1))


_HULL_WHITE = _model(ModelName.HULL_WHITE)

WHOLE: dict[str, Book] = {
    "pricing": _whole(_HULL_WHITE),
    "real-world": _whole(_HULL_WHITE, measure=Measure.REAL_WORLD),
    "two factors": _whole(_model(ModelName.GAUSSIAN_2), measure=Measure.REAL_WORLD),
    "lognormal": _whole(_model(ModelName.BLACK_KARASINSKI)),
    "square root": _whole(_model(ModelName.CIR, inflates=False)),
    "own curve": _whole(_model(ModelName.VASICEK, inflates=False), measure=Measure.REAL_WORLD),
    "no reversion": _whole(_model(ModelName.HO_LEE, inflates=False), None, measure=Measure.REAL_WORLD),
    "sobol": _whole(_HULL_WHITE, sampling=Sampling.SOBOL, matching=True),
    "outside": replace(_whole(RatesModel(ModelName.OUTSIDE)), scenario_set=_set_of(np.arange(1.0, 9.0), 200)),
}
"""Each with risky assets, but for one, and with a price index where it can be drawn."""

ODD: dict[str, Book] = {
    "certain": _whole(replace(_model(ModelName.HULL_WHITE, inflates=False), volatility=0.0), None),
    "all but certain": _whole(replace(_model(ModelName.HULL_WHITE, inflates=False), volatility=1e-7), None),
    "beyond measure": _whole(RatesModel(ModelName.HO_LEE, volatility=0.9), None, horizon_years=40, paths=64),
    "one path": _whole(_HULL_WHITE, paths=1),
    "two paths": _whole(_HULL_WHITE, paths=2),
    "other levels": _whole(_HULL_WHITE, percentiles=(0.5, 50.0, 99.9)),
    "one level": _whole(_HULL_WHITE, percentiles=(37.5,)),
    "mended": _whole(replace(_HULL_WHITE, mend_correlation=True), _contradicting()),
    "riskless asset": _whole(_HULL_WHITE, replace(ASSETS, volatility=np.array([0.0, 0.1]))),
    "one odd path from outside": replace(
        _whole(RatesModel(ModelName.OUTSIDE), None), scenario_set=_set_of(np.array([0.5, 1.7, 6.0]), 1)
    ),
}


def book_of(name: str) -> Book:
    """A book by its name."""
    return WHOLE[name] if name in WHOLE else ODD[name]


@cache
def simulation_of(name: str) -> Simulation:
    """The run of a book."""
    return tasks.simulate(book_of(name))
