"""Drawn scenarios against published values and a general-purpose library."""

from __future__ import annotations

import math
from dataclasses import replace
from datetime import date

import numpy as np
import pytest
import QuantLib as ql

from desk.book import (
    Basis,
    Book,
    FlowTable,
    Indexation,
    IndexationKind,
    Inflation,
    ModelName,
    PricedFlows,
    RatesModel,
    RiskyAssets,
    Run,
    Side,
)
from desk.rates.compounding import Compounding
from desk.rates.risky import total_return_index
from desk.scenarios.draws import Block, Crew, Paths
from desk.scenarios.plans import planned_run
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate

NOTHING = PricedFlows(
    Side.ASSETS, (), np.zeros(0, int), np.zeros(0), np.zeros(0), np.zeros(0), np.zeros(0, bool)
)


def flat_book(rate: float, model: RatesModel, *, paths: int, years: int, steps_per_year: int = 1) -> Book:
    """A book on a flat continuous curve."""
    basis = Basis(
        date(2026, 1, 1),
        "EUR",
        np.array([1.0, 30.0]),
        np.full(2, rate),
        compounding=Compounding.CONTINUOUS,
    )
    run = Run(paths=paths, horizon_years=years, steps_per_year=steps_per_year, seed=17)
    return Book(basis, FlowTable.empty(), rates_model=model, run=run)


def scores(found: np.ndarray, expected: np.ndarray, error: np.ndarray) -> np.ndarray:
    """How many standard errors samples are off, but for today."""
    return np.asarray(np.abs((found - expected)[1:] / error[1:]))


def drawn(model: RatesModel, *, rate: float = 0.05, paths: int = 40_000) -> Simulation:
    return simulate(flat_book(rate, model, paths=paths, years=10), NOTHING, NOTHING)


def test_moments_of_the_square_root_rate() -> None:
    """Cox, J.C., Ingersoll, J.E. and Ross, S.A. (1985), Econometrica 53, conditional moments; parameters of a
    problem in Hull's Options, Futures, and Other Derivatives. Mean 0.1 and variance 0.00172932943 in ten
    years, computed."""
    result = drawn(
        RatesModel(
            ModelName.CIR,
            mean_reversion=0.1,
            volatility=0.06324555320336758,
            long_run_rate=0.1,
            starting_rate=0.1,
        )
    )
    law = result.diagnostics
    assert law is not None
    assert law.rate_mean[10] == pytest.approx(0.1, abs=1e-12)
    assert law.rate_sd[10] ** 2 == pytest.approx(0.00172932943, abs=1e-10)
    assert scores(result.short_rate.mean, law.rate_mean, result.short_rate.mean_se).max() < 4.5
    assert scores(result.short_rate.sd, law.rate_sd, result.short_rate.sd_se).max() < 4.5
    assert result.repricing.curve_discount[10] == pytest.approx(0.37986, abs=5e-6)
    check = result.repricing
    assert scores(check.mean_discount, check.curve_discount, check.mean_discount_se).max() < 4.5


def test_variance_of_the_two_factor_savings_account() -> None:
    """Brigo, D. and Mercurio, F. (2006), Interest Rate Models: Theory and Practice, section 4.2.5, parameters
    of the calibration of 13 February 2001; variances computed by closed form and quadrature."""
    result = drawn(
        RatesModel(
            ModelName.GAUSSIAN_2,
            mean_reversion=0.773511777,
            volatility=0.022284644,
            second_mean_reversion=0.082013014,
            second_volatility=0.010382461,
            factor_correlation=-0.701985206,
        )
    )
    law = result.closed_form
    assert law is not None
    assert law.log_variance[[1, 5, 10]] == pytest.approx(
        [5.022337474e-05, 0.00190456232493, 0.01136561870097], abs=1e-12
    )
    # For a model fitted to a curve the mean of R times P(0, t) is the exponential of the variance.
    grown = result.savings_account.mean * result.repricing.curve_discount
    error = result.savings_account.mean_se * result.repricing.curve_discount
    assert scores(grown, np.exp(law.log_variance), error).max() < 4.5


@pytest.mark.parametrize(
    ("correlation", "volatility"),
    [
        (-0.75, 0.217064577),
        (-0.25, 0.243995801),
        (0.0, 0.25640283),
        (0.25, 0.268236596),
        (0.75, 0.290461343),
    ],
)
def test_equity_drawn_with_hull_white_rates(correlation: float, volatility: float) -> None:
    """QuantLib test suite, hybrid of equity and Hull-White: implied volatility of a forward of 20.0137 years.

    The law of the drawn asset has it, and so have the paths."""
    years = 20
    model = RatesModel(ModelName.HULL_WHITE, mean_reversion=0.00883, volatility=0.00526)
    settings = replace(
        flat_book(0.03, model, paths=40_000, years=years),
        risky_assets=RiskyAssets(
            ("Equity",),
            np.array([100.0]),
            np.array([0.0]),
            np.array([0.25]),
            np.array([0.0]),
            np.eye(1),
            np.array([correlation]),
        ),
    )
    market = planned_run(settings).plan.market
    assert market is not None
    assert market.forward_volatility(20.013698630136986)[0] == pytest.approx(volatility, abs=1e-9)
    found = simulate(settings, NOTHING, NOTHING).risky
    assert found is not None
    (asset,) = found.assets
    assert asset.closed_form is not None
    # At 20 years the variance of the total return is that of the forward.
    wanted = float(market.forward_volatility(float(years))[0]) ** 2 * years
    assert asset.closed_form.log_variance[years] == pytest.approx(wanted, rel=1e-12)
    law, sample = asset.closed_form, asset.total_return
    assert scores(sample.mean, law.mean, sample.mean_se).max() < 4.5
    # Percentiles of a lognormal sample tell more of its variance than its own standard deviation does.
    assert scores(sample.percentile, law.percentile, sample.percentile_se).max() < 4.5


def test_reinvested_dividends_are_what_is_drawn() -> None:
    """The identity that units grow by (P + d)/P at each payment: the drawn index is that of dividends
    reinvested, whatever the dividend yield."""
    model = RatesModel(ModelName.HO_LEE, volatility=0.005)
    results = []
    for dividend in (0.0, 0.03):
        beside = RiskyAssets(
            ("Equity",),
            np.array([100.0]),
            np.array([0.04]),
            np.array([0.2]),
            np.array([dividend]),
            np.eye(1),
            np.zeros(1),
        )
        settings = replace(flat_book(0.03, model, paths=500, years=3), risky_assets=beside)
        found = simulate(settings, NOTHING, NOTHING).risky
        assert found is not None
        results.append(found.assets[0].total_return.percentile)
    assert np.array_equal(results[0], results[1])
    assert total_return_index([100.0, 110.0, 99.0], [2.0, 3.0]) == pytest.approx(
        [1.0, 1.12, 1.0385454545454547], abs=1e-12
    )


@pytest.mark.parametrize("strike", [0.01, 0.03, 0.05])
def test_caplets_along_the_paths_against_the_library(strike: float) -> None:
    """A caplet of Hull-White rates from drawn states, with the price of the library's analytic engine."""
    speed, volatility, level = 0.08, 0.011, 0.03
    model = RatesModel(ModelName.HULL_WHITE, mean_reversion=speed, volatility=volatility)
    settings = flat_book(level, model, paths=50_000, years=3)
    plan = planned_run(settings).plan
    payoff = np.empty(plan.paths)
    nothing = np.empty((0, 0))
    bond_level, exposure = plan.model.bond_terms(3.0, 4.0)  # type: ignore[attr-defined]  # of an affine model

    def visit(step: int, paths: Paths) -> None:
        if step == 3:
            bond = np.exp(float(bond_level) - float(exposure[0]) * paths.state[0])
            paid = np.maximum(1.0 / bond - 1.0 - strike, 0.0) * bond
            payoff[paths.columns] = paid * np.exp(-paths.integral - plan.account_offset[3])

    with Crew(1, 1.0) as crew:
        for index in range(plan.blocks):
            Block(plan, index).advance((), nothing, nothing, visit=visit, crew=crew, until=3)
    # The caplet on the simple rate of a year is so many puts on the bond.
    today = ql.Date(1, 1, 2026)
    ql.Settings.instance().evaluationDate = today
    curve = ql.YieldTermStructureHandle(ql.FlatForward(today, level, ql.Actual365Fixed()))
    library = ql.HullWhite(curve, speed, volatility)
    put = library.discountBondOption(ql.Option.Put, 1.0 / (1.0 + strike), 3.0, 4.0) * (1.0 + strike)
    error = payoff.std(ddof=1) / math.sqrt(payoff.size)
    assert abs(payoff.mean() - put) / error < 4.5
    assert error / put < 0.02


@pytest.mark.parametrize("volatility", [0.005, 0.02])
def test_linked_flows_of_two_economies(volatility: float) -> None:
    """Jarrow, R. and Yildirim, Y. (2003), Pricing treasury inflation protected securities, Journal of
    Financial and Quantitative Analysis 38 (from memory): a linked flow is a bond in real terms."""
    inflation = Inflation(np.array([1.0, 30.0]), np.array([0.02, 0.03]))
    model = RatesModel(
        ModelName.HULL_WHITE,
        mean_reversion=0.1,
        volatility=0.01,
        inflation_mean_reversion=0.2,
        inflation_volatility=volatility,
        inflation_rate_correlation=0.7,
    )
    settings = flat_book(0.04, model, paths=40_000, years=15)
    settings = replace(settings, basis=replace(settings.basis, inflation=inflation))
    time = np.arange(1.0, 31.0)
    growth = 1.0 / inflation.curve.discount(time)
    flows = PricedFlows(
        side=Side.LIABILITIES,
        line_names=("linked",),
        line=np.zeros(30, int),
        time=time,
        amount=growth,
        spread=np.zeros(30),
        is_flow=np.ones(30, bool),
        real_amount=np.ones(30),
        index_class=np.zeros(30, int),
        indexations=(Indexation(IndexationKind.LINKED),),
    )
    result = simulate(settings, NOTHING, flows)
    value = result.present_value[1]
    real = float(np.sum(growth * np.exp(-0.04 * time)))
    assert value.curve == pytest.approx(real, rel=1e-12)
    assert abs(value.mean - real) / value.se < 4.5
