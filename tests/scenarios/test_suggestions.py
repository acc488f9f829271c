"""Parameters to begin with."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable, ModelName, RatesModel
from desk.rates.compounding import Compounding
from desk.scenarios.models import rate_model
from desk.scenarios.suggestions import MODEL_ITEMS, suggested_model


def a_basis(short: float = 0.02, long: float = 0.03) -> Basis:
    return Basis(
        date(2031, 3, 31),
        "EUR",
        np.array([1.0, 30.0]),
        np.array([short, long]),
        compounding=Compounding.CONTINUOUS,
    )


DRAWN = [name for name in ModelName if name is not ModelName.OUTSIDE]


@pytest.mark.parametrize("name", DRAWN)
@pytest.mark.parametrize("short", [0.02, -0.005])
def test_every_model_can_be_drawn_as_suggested(name: ModelName, short: float) -> None:
    # The lognormal model needs forward rates above 0.
    basis = a_basis(abs(short) if name is ModelName.BLACK_KARASINSKI else short)
    book = Book(basis, FlowTable.empty(), rates_model=suggested_model(name, basis))
    assert float(rate_model(book).curve.discount(0.0)) == 1.0


@pytest.mark.parametrize("name", list(ModelName))
def test_nothing_is_suggested_that_the_model_does_not_use(name: ModelName) -> None:
    model = suggested_model(name, a_basis())
    usual = RatesModel(name)
    stated = {item for item in vars(model) if getattr(model, item) != getattr(usual, item)}
    assert stated == set(MODEL_ITEMS[name])


def test_what_is_stated_is_kept() -> None:
    former = RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.02, risk_price=-0.3)
    model = suggested_model(ModelName.VASICEK, a_basis(), former)
    assert (model.mean_reversion, model.volatility, model.risk_price) == (0.1, 0.02, -0.3)
    assert (model.starting_rate, model.long_run_rate) == (0.02, 0.03)
    assert suggested_model(ModelName.HULL_WHITE, a_basis(), model).long_run_rate == 0.03


def test_a_volatility_that_means_something_else_is_not_kept() -> None:
    former = RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.02)
    model = suggested_model(ModelName.CIR, a_basis(), former)
    assert model.volatility == 0.05
    assert suggested_model(ModelName.HULL_WHITE, a_basis(), model).volatility == 0.009
    relative = suggested_model(ModelName.BLACK_KARASINSKI, a_basis(), former)
    assert (relative.volatility, relative.mean_reversion) == (0.2, 0.1)
    assert suggested_model(ModelName.CIR, a_basis(), relative).volatility == 0.05
    outside = suggested_model(ModelName.OUTSIDE, a_basis(), former)
    assert outside.volatility == 0.02
    assert suggested_model(ModelName.CIR, a_basis(), outside).volatility == 0.05
