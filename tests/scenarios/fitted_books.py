"""Books with data that models can be fitted to, invented from known models."""

from __future__ import annotations

import math
from dataclasses import replace
from datetime import date

import numpy as np

from desk.book import Basis, Book, FlowTable, Run
from desk.book.market import Instrument, Volatilities, VolatilityKind, YieldHistory
from desk.book.model import History
from desk.rates.gaussian import hull_white
from desk.rates.option_instruments import option_quotes
from desk.rates.option_models import gaussian_option_prices

__all__ = ["bare_book", "history", "quoted", "with_all", "yields"]

SPEED, LEVEL, SIGMA = 0.8, 0.03, 0.01


def bare_book() -> Book:
    """A curve and one line of payments."""
    basis = Basis(date(2031, 3, 31), "EUR", np.array([1.0, 5.0, 30.0]), np.array([0.02, 0.026, 0.03]))
    return Book(
        basis,
        FlowTable.build(["Pensions"] * 3, [1.0, 5.0, 10.0], [100.0, 200.0, 300.0]),
        run=Run(paths=50, horizon_years=3, steps_per_year=1, seed=1),
    )


def history(*, weeks: int = 1600, step_days: int = 7, seed: int = 5) -> History:
    """A Vasicek path in equal steps, ending at the valuation date."""
    generator = np.random.default_rng(seed)
    step = step_days / 365.0
    decay = math.exp(-SPEED * step)
    spread = SIGMA * math.sqrt((1.0 - decay**2) / (2.0 * SPEED))
    rate = np.empty(weeks)
    rate[0] = LEVEL
    for row in range(1, weeks):
        rate[row] = LEVEL + (rate[row - 1] - LEVEL) * decay + spread * generator.standard_normal()
    dates = np.datetime64("2031-03-31") - step_days * np.arange(weeks)[::-1]
    return History(dates, np.round(rate, 8))


def quoted(book: Book, *, noise: float = 0.0) -> Volatilities:
    """Normal and lognormal quotes at which a Hull-White model of 0.1 and 0.9 % prices, about."""
    names = [*["payer swaption"] * 4, *["receiver swaption"] * 2, *["cap"] * 3, "floor"]
    kinds = [*["normal"] * 7, *["lognormal"] * 3]
    columns = {
        "expiry": np.array([1.0, 2.0, 5.0, 10.0, 1.0, 5.0, 2.0, 5.0, 10.0, 7.0]),
        "length": np.array([5.0, 5.0, 10.0, 10.0, 10.0, 5.0, np.nan, np.nan, np.nan, np.nan]),
        "strike": np.array([np.nan, np.nan, np.nan, 0.04, 0.02, np.nan, np.nan, np.nan, np.nan, 0.02]),
        "shift": np.where(np.array(kinds) == "lognormal", 0.03, 0.0),
        "frequency": np.array([1.0, 2.0, 1.0, 1.0, 2.0, 1.0, 4.0, 2.0, 1.0, 2.0]),
    }
    guess = np.where(np.array(kinds) == "lognormal", 0.15, 0.009)
    laid = option_quotes(book.basis.curve, instrument=names, kind=kinds, volatility=guess, **columns)
    model = hull_white(book.basis.curve, mean_reversion=0.1, volatility=0.009)
    exact = laid.volatilities(gaussian_option_prices(model, laid))
    wave = 1.0 + noise * np.cos(3.0 * np.arange(exact.size))
    return Volatilities(
        tuple(Instrument(name) for name in names),
        volatility=exact * wave,
        kind=tuple(VolatilityKind(kind) for kind in kinds),
        **columns,
    )


def yields(*, dates: int = 90, seed: int = 3) -> YieldHistory:
    """A one-factor panel by month with some quotes missing."""
    generator = np.random.default_rng(seed)
    terms = np.array([1.0, 5.0, 10.0])
    short = history(weeks=dates, step_days=30, seed=seed).rate
    fading = (1.0 - np.exp(-0.3 * terms)) / (0.3 * terms)
    rates = 0.03 + (short[:, None] - 0.03) * fading + 2e-4 * generator.standard_normal((dates, 3))
    rates[4, 1] = rates[10, 2] = np.nan
    day = np.datetime64("2031-03-31") - 30 * np.arange(dates)[::-1]
    return YieldHistory(day, terms, rates)


def with_all() -> Book:
    """A book with data of every source."""
    book = bare_book()
    return replace(
        book, history=history(weeks=400), volatilities=quoted(book, noise=0.004), yield_history=yields()
    )
