"""The model a book asks for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import ModelName, RatesModel
from desk.scenarios.models import rate_model
from tests.scenarios.books import ALL_MODELS, BASIS, book


@pytest.mark.parametrize("name", ALL_MODELS)
def test_every_model_stands(name: ModelName) -> None:
    model = rate_model(book(ALL_MODELS[name]))
    times = np.array([0.0, 1.0, 10.0, 45.0])
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
