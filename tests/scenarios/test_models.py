"""The model a book asks for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import ModelName, RatesModel
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.gaussian import GaussianRates
from desk.scenarios.models import rate_model
from tests.scenarios.books import ALL_MODELS, BASIS, book


@pytest.mark.parametrize("name", ALL_MODELS)
def test_every_model_stands(name: ModelName) -> None:
    model = rate_model(book(ALL_MODELS[name]))
    times = np.array([0.0, 1.0, 5.0, 10.0])
    own = name in (ModelName.VASICEK, ModelName.CIR)
    curve = model.curve.discount(times)
    assert (curve[1] != pytest.approx(float(BASIS.curve.discount(1.0)), abs=1e-9)) is own
    assert model.mean_discount(times) == pytest.approx(curve, rel=1e-13)
    assert model.factor_count == (2 if name is ModelName.GAUSSIAN_2 else 1)


@pytest.mark.parametrize(
    ("name", "changes", "message"),
    [
        (ModelName.HULL_WHITE, {"volatility": -0.01}, "Volatility must be at least 0, not -0.01"),
        (ModelName.HULL_WHITE, {"mean_reversion": None}, "Mean reversion is missing: the hull-white model"),
        (ModelName.HULL_WHITE, {"mean_reversion": -0.1}, "Mean reversion must be at least 0"),
        (ModelName.HO_LEE, {"volatility": None}, "Volatility is missing"),
        (ModelName.HO_LEE, {"risk_price": float("nan")}, "Risk price must be a number"),
        (ModelName.VASICEK, {"long_run_rate": None}, "Long-run rate is missing"),
        (ModelName.VASICEK, {"starting_rate": None}, "Starting rate is missing"),
        (ModelName.CIR, {"starting_rate": -0.01}, "Starting rate must be at least 0"),
        (ModelName.CIR_SHIFTED, {"long_run_rate": None}, "Long-run rate is missing"),
        (ModelName.GAUSSIAN_2, {"second_volatility": None}, "Second volatility is missing"),
        (ModelName.GAUSSIAN_2, {"second_mean_reversion": -1.0}, "Second mean reversion must be"),
        (ModelName.GAUSSIAN_2, {"second_risk_price": float("inf")}, "Second risk price must be a number"),
        (ModelName.BLACK_KARASINSKI, {"volatility": None}, "Volatility is missing: the black-karasinski"),
        (ModelName.BLACK_KARASINSKI, {"mean_reversion": -1.0}, "Mean reversion must be at least 0"),
        (ModelName.BLACK_KARASINSKI, {"volatility": 9.0}, "a smaller volatility"),
        (ModelName.GAUSSIAN_2, {"factor_correlation": 1.2}, "Factor correlation must be between -1 and 1"),
    ],
)
def test_an_item_that_will_not_do_is_named(
    name: ModelName, changes: dict[str, float | None], message: str
) -> None:
    stated: RatesModel = replace(ALL_MODELS[name], **changes)  # type: ignore[arg-type]  # floats by name
    with pytest.raises(ValueError, match=message):
        rate_model(book(stated))


def test_no_model() -> None:
    with pytest.raises(ValueError, match="the book has no rates model"):
        rate_model(book(None))


def test_a_lognormal_model_needs_forward_rates_above_nought() -> None:
    basis = replace(BASIS, rates=np.array([0.02, 0.01, 0.001, -0.01, 0.01, 0.02]))
    negative = replace(book(ALL_MODELS[ModelName.BLACK_KARASINSKI]), basis=basis)
    with pytest.raises(ValueError, match=r"needs forward rates above 0, but from 2 to .* the curve's is"):
        rate_model(negative)


def test_a_lognormal_model_reaches_to_the_last_flow() -> None:
    settings = book(ALL_MODELS[ModelName.BLACK_KARASINSKI], horizon_years=10, steps_per_year=5)
    for last, horizon in ((3.0, 10.0), (47.3, 47.4)):
        model = rate_model(settings, last_flow=last)
        assert isinstance(model, BlackKarasinskiRates)
        # Every step of the run is three of the model's, so that there are at least twelve a year.
        assert model.steps_per_year == 15
        assert model.horizon == pytest.approx(horizon, abs=0.07)


def test_both_factors_may_have_a_price_of_risk() -> None:
    stated = replace(ALL_MODELS[ModelName.GAUSSIAN_2], second_risk_price=-0.3)
    model = rate_model(book(stated))
    assert isinstance(model, GaussianRates)
    assert [factor.risk_price for factor in model.factors] == [0.2, -0.3]


def test_an_outside_model_needs_its_set() -> None:
    with pytest.raises(ValueError, match="Scenario set is missing"):
        rate_model(book(RatesModel(ModelName.OUTSIDE)))
