"""The law of the savings account against closed forms, and samples of it against the law."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable, ModelName, PricedFlows, RatesModel, Run, Side
from desk.rates.compounding import Compounding
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate

LEVELS = (0.5, 5.0, 50.0, 95.0, 99.5)
NOTHING = PricedFlows(
    Side.ASSETS, (), np.zeros(0, int), np.zeros(0), np.zeros(0), np.zeros(0), np.zeros(0, bool)
)


def _run(model: RatesModel, *, paths: int = 50_000) -> Simulation:
    basis = Basis(
        date(2026, 1, 1),
        "EUR",
        np.array([1.0, 10.0, 30.0]),
        np.full(3, 0.05),
        compounding=Compounding.CONTINUOUS,
    )
    run = Run(paths=paths, horizon_years=10, steps_per_year=4, seed=11, percentiles=LEVELS)
    book = Book(basis, FlowTable.empty(), rates_model=model, run=run)
    return simulate(book, NOTHING, NOTHING)


@pytest.fixture(scope="module")
def vasicek_run() -> Simulation:
    return _run(
        RatesModel(
            ModelName.VASICEK, mean_reversion=0.1, volatility=0.02, long_run_rate=0.1, starting_rate=0.1
        )
    )


@pytest.fixture(scope="module")
def fitted_run() -> Simulation:
    return _run(RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.01))


def test_vasicek_over_ten_years(vasicek_run: Simulation) -> None:
    """Glasserman, P. (2003), Monte Carlo Methods in Financial Engineering, section 3.3: the integral of the
    rate is normal; values computed from its mean and variance. The discount factor agrees with the 0.38046
    printed in Hull's problem on the same parameters."""
    law = vasicek_run.closed_form
    assert law is not None
    assert law.log_mean[10] == pytest.approx(1.0, abs=1e-12)
    assert law.log_variance[10] == pytest.approx(0.0672365, abs=6e-8)
    assert law.mean[10] == pytest.approx(2.8112191, abs=6e-8)
    assert law.sd[10] == pytest.approx(0.7413755, abs=6e-8)
    assert law.percentile[10] == pytest.approx(
        [1.3938747, 1.7744481, 2.7182818, 4.1641433, 5.3010906], abs=6e-8
    )
    assert vasicek_run.repricing.curve_discount[10] == pytest.approx(0.3804571, abs=6e-8)
    assert vasicek_run.repricing.expected_discount[10] == pytest.approx(0.3804571, abs=6e-8)


def test_fitted_to_a_flat_curve_over_ten_years(fitted_run: Simulation) -> None:
    """Closed form under the pricing measure, ``mean = -ln P(0,T) + V/2``; Hull and White (1990) on a flat 5 %
    curve, values computed."""
    law = fitted_run.closed_form
    assert law is not None
    assert law.log_variance[10] == pytest.approx(0.0168091241, abs=2e-10)
    assert law.log_mean[10] == pytest.approx(0.508404562, abs=2e-10)
    assert law.mean[10] == pytest.approx(1.676669062, abs=2e-9)
    assert law.percentile[10] == pytest.approx(
        [1.1905891602, 1.3433268747, 1.6626364445, 2.0578460825, 2.3218420248], abs=2e-9
    )


@pytest.mark.parametrize("name", ["vasicek_run", "fitted_run"])
def test_the_sample_has_that_law(name: str, request: pytest.FixtureRequest) -> None:
    run: Simulation = request.getfixturevalue(name)
    law, sample = run.closed_form, run.savings_account
    assert law is not None
    years = slice(1, None)
    assert np.abs((sample.mean - law.mean)[years] / sample.mean_se[years]).max() < 4.5
    assert np.abs((sample.sd - law.sd)[years] / sample.sd_se[years]).max() < 4.5
    inside = (sample.percentile_low <= law.percentile) & (law.percentile <= sample.percentile_high)
    # Fifty intervals at 95 %, of ten dependent years: far fewer than this would be a wrong law.
    assert inside[years].mean() > 0.75


def test_tail_mean_of_the_law(vasicek_run: Simulation) -> None:
    """Closed form of the lognormal law, ``exp(μ + s²/2) Φ(s - z)/(1 - p)``, checked by quadrature: the 95 %
    quantile is 4.16414331 and the mean beyond it 4.66334169 (computed). Here the tail mean is the mean of the
    upper percentiles of the law we report, by the midpoint rule."""
    from scipy.special import ndtri

    law = vasicek_run.closed_form
    assert law is not None
    assert law.percentile[10][3] == pytest.approx(4.16414331, abs=6e-9)
    upper = 0.95 + 0.05 * (np.arange(200_000) + 0.5) / 200_000
    tail = np.exp(law.log_mean[10] + np.sqrt(law.log_variance[10]) * ndtri(upper)).mean()
    assert float(tail) == pytest.approx(4.66334169, abs=1e-5)
