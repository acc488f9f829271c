"""Invented markets beside the curve: corporate bonds, a history of yields, option volatilities."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from demo_parts import TODAY, VALUATION_DATE, issuers
from numpy.typing import NDArray

from desk.book import Basis, CurveBonds, History, Instrument, Volatilities, VolatilityKind, YieldHistory
from desk.book.bond_curve import bond_quotes
from desk.rates.day_count import DayCount
from desk.rates.gaussian import hull_white
from desk.rates.option_instruments import OptionQuotes, option_quotes
from desk.rates.option_models import gaussian_option_prices
from desk.rates.parametric import Svensson
from desk.rates.quoted_flows import flow_yields

__all__ = ["corporate_bonds", "volatilities", "yield_history"]

FloatArray = NDArray[np.float64]

_SWAPTIONS = tuple((expiry, length) for expiry in (1, 2, 5, 10, 20) for length in (5, 10, 20))
_STRIKES = ((5, 0.03), (5, 0.05), (10, 0.03), (10, 0.05))
"""Expiry [years] and strike [1/year] of caps away from the money."""


def corporate_bonds(rng: np.random.Generator, curve: Svensson, count: int, *, noise: float) -> CurveBonds:
    """High-quality bonds of one to thirty years, clean prices on a smooth curve.

    `noise` is the standard deviation of their yields about it [1/year].
    """
    years = np.geomspace(1.2, 30.2, count) * rng.uniform(0.97, 1.03, count)
    # On a few days of a month, as most bonds are: each its own.
    day = np.tile([3, 11, 17, 24], count)[:count].astype("timedelta64[D]")
    months = (TODAY + np.round(365.25 * years).astype("timedelta64[D]")).astype("M8[M]")
    maturity = months.astype("M8[D]") + day
    coupon: FloatArray = np.maximum(
        np.round(400.0 * (curve.zero(years) + rng.normal(0.0, 0.006, count))) / 400.0, 0.005
    )
    frequency = rng.choice([1, 1, 2], count)
    names = [
        f"{issuer} {100 * rate:.4g}% {day.item().year}"
        for issuer, rate, day in zip(issuers(rng, count), coupon.tolist(), maturity, strict=True)
    ]
    at_par = CurveBonds(
        names=tuple(names),
        maturity=maturity,
        coupon=np.round(coupon, 4),
        frequency=frequency,
        price=np.full(count, 100.0),
        bond_yield=np.full(count, np.nan),
        is_clean=np.ones(count, dtype=np.bool_),
    )
    flows = bond_quotes(at_par, valuation_date=VALUATION_DATE, day_count=DayCount.ACT_365F)
    accrued = flows.target - 100.0
    rate = flow_yields(flows, target=flows.values(curve)) + rng.normal(0.0, noise, count)
    worth = flows.sums(flows.amount * np.exp(-rate[flows.instrument] * flows.time))
    return replace(at_par, price=np.round(worth - accrued, 3))


def yield_history(basis: Basis, short_rates: History, terms: list[float], *, seed: int) -> YieldHistory:
    """A history of zero rates beside one of short rates, ending on the curve of the basis.

    The short rate's part in a zero rate fades as ``(1 - exp(-a T)) / (a T)``; to it come a slope that is
    drawn back to nothing, and a basis point of noise a quote.
    """
    times = np.array(terms, dtype=np.float64)
    today = np.asarray(basis.curve.zero(times), dtype=np.float64)
    rng = np.random.default_rng(seed)
    count = short_rates.rate.size
    slope = np.zeros(count)
    for place in range(count - 1, 0, -1):
        slope[place - 1] = (1.0 - 0.35 / 12.0) * slope[place] + rng.normal(0.0, 0.006) / np.sqrt(12.0)
    level = short_rates.rate - short_rates.rate[-1]
    # dimensions: month, term
    rates = today + np.outer(level, _fading(0.04, times)) + np.outer(slope, 1.0 - _fading(0.3, times))
    rates[:-1] += rng.normal(0.0, 1e-4, (count - 1, times.size))
    return YieldHistory(short_rates.date, times, np.round(rates, 5))


def _fading(speed: float, times: FloatArray) -> FloatArray:
    return np.asarray(-np.expm1(-speed * times) / (speed * times))


def volatilities(
    rng: np.random.Generator, basis: Basis, *, mean_reversion: float, volatility: float
) -> Volatilities:
    """Quotes near those of a Hull-White model, which allows no arbitrage; a hundredth off by chance.

    Swaptions and caps at the money with normal volatilities, caps away from the money, and floors with
    lognormal volatilities of shifted rates.
    """
    swaptions, caps, floors = len(_SWAPTIONS), 7, 3
    instrument = (
        *[Instrument.PAYER_SWAPTION] * swaptions,
        *[Instrument.CAP] * (caps + len(_STRIKES)),
        *[Instrument.FLOOR] * floors,
    )
    count = len(instrument)
    expiry = [expiry for expiry, _ in _SWAPTIONS] + [2, 3, 5, 7, 10, 15, 20]
    expiry += [expiry for expiry, _ in _STRIKES] + [3, 7, 15]
    length = [float(length) for _, length in _SWAPTIONS] + [np.nan] * (count - swaptions)
    strike = [np.nan] * (swaptions + caps) + [strike for _, strike in _STRIKES] + [0.025] * floors
    kind = (*[VolatilityKind.NORMAL] * (count - floors), *[VolatilityKind.LOGNORMAL] * floors)
    quoted = Volatilities(
        instrument=instrument,
        expiry=np.array(expiry, dtype=np.float64),
        length=np.array(length),
        strike=np.array(strike),
        volatility=np.where([each is VolatilityKind.NORMAL for each in kind], 0.008, 0.12),
        kind=kind,
        shift=np.array([0.0] * (count - floors) + [0.02] * floors),
        frequency=np.array([2.0] * swaptions + [4.0] * (count - swaptions)),
    )
    laid_out = _laid_out(basis, quoted)
    model = hull_white(basis.curve, mean_reversion=mean_reversion, volatility=volatility)
    found = laid_out.volatilities(gaussian_option_prices(model, laid_out))
    found = np.round(found * (1.0 + rng.normal(0.0, 0.01, count)), 5)
    quoted = replace(quoted, volatility=found)
    _laid_out(basis, quoted)  # refuses what lets money be made of nothing
    return quoted


def _laid_out(basis: Basis, quoted: Volatilities) -> OptionQuotes:
    return option_quotes(
        basis.curve,
        instrument=quoted.instrument,
        expiry=quoted.expiry,
        length=quoted.length,
        strike=quoted.strike,
        volatility=quoted.volatility,
        kind=quoted.kind,
        shift=quoted.shift,
        frequency=quoted.frequency,
    )
