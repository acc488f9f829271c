"""Books with inflation and risky assets for tests of scenarios, and paths written down as they are drawn."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from desk.book import (
    Book,
    Indexation,
    Inflation,
    Measure,
    ModelName,
    PricedFlows,
    RatesModel,
    RiskyAssets,
    Run,
    Side,
)
from desk.book.flows import FlowTable
from desk.scenarios.draws import Block, Crew, Paths, Plan
from desk.scenarios.pathwise import PathValues
from desk.scenarios.plans import planned_run
from desk.valuation.indexing import index_factors
from tests.scenarios.books import ALL_MODELS, BASIS

__all__ = ["ASSETS", "INFLATION", "Drawn", "drawn", "following", "inflating"]

INFLATION = Inflation(
    np.array([1.0, 5.0, 30.0]), np.array([0.02, 0.022, 0.025]), volatility=0.01, recent=0.03
)

ASSETS = RiskyAssets(
    names=("Equity", "Property"),
    value=np.array([500.0, 300.0]),
    premium=np.array([0.04, 0.03]),
    volatility=np.array([0.16, 0.12]),
    dividend_yield=np.array([0.02, 0.0]),
    correlation=np.array([[1.0, 0.5], [0.5, 1.0]]),
    rates_correlation=np.array([0.3, -0.2]),
)


def inflating(
    model: ModelName | RatesModel = ModelName.HULL_WHITE,
    *,
    paths: int = 2_000,
    horizon_years: int = 10,
    steps_per_year: int = 4,
    measure: Measure = Measure.PRICING,
    correlation: float = 0.4,
    volatility: float = 0.01,
    assets: RiskyAssets | None = None,
    seed: int = 3,
) -> Book:
    """A book without flows of its own whose inflation is drawn."""
    stated = ALL_MODELS[model] if isinstance(model, ModelName) else model
    return Book(
        replace(BASIS, inflation=INFLATION),
        FlowTable.empty(),
        rates_model=replace(
            stated,
            inflation_mean_reversion=0.3,
            inflation_volatility=volatility,
            inflation_rate_correlation=correlation,
            inflation_risk_price=0.1,
        ),
        risky_assets=assets,
        run=Run(
            paths=paths,
            horizon_years=horizon_years,
            steps_per_year=steps_per_year,
            seed=seed,
            measure=measure,
        ),
    )


def following(
    time: list[float] | np.ndarray,
    real: list[float] | np.ndarray,
    indexation: Indexation,
    *,
    spread: float = 0.0,
    side: Side = Side.LIABILITIES,
) -> PricedFlows:
    """Flows of one line that follow the index, with the amounts expected today."""
    times, amounts = np.asarray(time, dtype=float), np.asarray(real, dtype=float)
    return PricedFlows(
        side=side,
        line_names=("line",),
        line=np.zeros(times.size, int),
        time=times,
        amount=amounts * index_factors(indexation, times, inflation=INFLATION),
        spread=np.full(times.size, spread),
        is_flow=np.ones(times.size, bool),
        real_amount=amounts,
        index_class=np.zeros(times.size, int),
        indexations=(indexation,),
    )


@dataclass(frozen=True)
class Drawn:
    """Paths of a run, each shape (steps + 1, paths), and what the flows are worth along them, (paths,)."""

    plan: Plan
    log_account: np.ndarray
    log_index: np.ndarray
    factors: np.ndarray
    value: np.ndarray
    values: PathValues


def drawn(book: Book, flows: PricedFlows) -> Drawn:
    """Draw a run of a book and write everything down."""
    plan = planned_run(book, flows).plan
    values = PathValues(plan, (flows,), book.basis.inflation)
    shape = (plan.steps + 1, plan.paths)
    log_account, log_index = np.zeros(shape), np.zeros(shape)
    count = plan.model.factor_count + 1
    factors = np.zeros((plan.steps + 1, count, plan.paths))
    nothing = np.empty((0, 0))

    def visit(step: int, paths: Paths) -> None:
        values.visit(step, paths)
        log_account[step, paths.columns] = paths.integral + plan.account_offset[step]
        if paths.index_integral.size:
            log_index[step, paths.columns] = paths.index_integral + plan.index_offset[step]
        factors[step, : len(paths.factors), paths.columns] = paths.factors

    with Crew(1, 1.0) as crew:
        for index in range(plan.blocks):
            Block(plan, index).advance((), nothing, nothing, visit=visit, crew=crew, until=plan.steps)
    return Drawn(plan, log_account, log_index, factors, values.value[0], values)
