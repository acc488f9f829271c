"""Options on rates: published values, and QuantLib on random cases."""

from __future__ import annotations

import math

import numpy as np
import pytest
import QuantLib as ql

from desk.rates.compounding import Compounding, to_continuous
from desk.rates.gaussian import GaussianRates, gaussian_2, hull_white
from desk.rates.option_formulas import forward_option, implied_volatility
from desk.rates.option_instruments import OptionQuotes, option_quotes
from desk.rates.option_models import gaussian_option_prices
from desk.rates.option_square_root import square_root_option_prices
from desk.rates.square_root import SquareRootRates
from tests.rates.flat_curve import flat_curve

TODAY = ql.Date(30, 6, 2026)
CASES = 200


def _one(curve_rate: float, **parts: float | str) -> OptionQuotes:
    columns: dict[str, float | str] = {"length": math.nan, "shift": 0.0, "kind": "normal", "frequency": 1.0}
    columns |= parts
    rows = {name: [value] for name, value in columns.items()}
    return option_quotes(flat_curve(curve_rate), **rows)  # type: ignore[arg-type]  # columns of one row


def test_black_caplet() -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, interest-rate cap example (memory): 10,000 over a
    quarter in a year, forward 7 %, strike 8 %, volatility 20 %; 5.162 as printed. Discounted at 7 %
    compounded quarterly: 6.9394 % continuous, a factor of 0.9169."""
    value = float(forward_option(0.07, 0.08, 0.2, 1.0))
    continuous = float(to_continuous(0.07, Compounding.QUARTERLY))
    assert continuous == pytest.approx(0.069394, abs=6e-7)
    discount = float(flat_curve(continuous).discount(1.25))
    assert discount == pytest.approx(0.9169, abs=5e-5)
    assert 10_000.0 * 0.25 * discount * value == pytest.approx(5.162, abs=6e-4)


@pytest.mark.parametrize(("strike", "printed"), [(1000.0, 9.49), (1008.33, 7.97)])
def test_black_option_on_a_bond(strike: float, printed: float) -> None:
    """The same book, European bond option example (memory): forward price from cash price 960 less coupons of
    50 at 9 % and 9.5 %, ten months at 10 %, forward volatility 9 %; quoted strike adds 8.33 accrued."""
    coupons = 50.0 * math.exp(-0.25 * 0.09) + 50.0 * math.exp(-0.75 * 0.095)
    assert coupons == pytest.approx(95.45, abs=0.0051)
    years = 10.0 / 12.0
    forward = (960.0 - coupons) * math.exp(0.1 * years)
    assert forward == pytest.approx(939.68, abs=0.0051)
    value = float(forward_option(forward, strike, 0.09, years)) * math.exp(-0.1 * years)
    assert value == pytest.approx(printed, abs=0.0051)


@pytest.mark.parametrize(("expiry", "end", "price"), [(1.0, 5.0, 0.02817777), (2.0, 4.0, 0.02042677)])
def test_hull_white_caplets_are_options_on_bonds(expiry: float, end: float, price: float) -> None:
    """TF Quant Finance test suite, Hull-White: at-the-money-forward calls on zero bonds, flat 1 % curve. A
    receiver swaption of one payment at strike K is ``1 + Kδ`` calls on the zero bond at ``1/(1 + Kδ)``."""
    length = end - expiry
    strike = math.expm1(0.01 * length) / length
    # One payment: a swap of one period, as long as the frequency allows.
    quotes = _one(
        0.01, instrument="receiver swaption", expiry=expiry, length=1.0, strike=0.01, volatility=0.01
    )
    single = OptionQuotes(
        **{
            **vars(quotes),
            "time": np.array([[end]]),
            "start": np.array([[expiry]]),
            "accrual": np.array([[length]]),
            "strike": np.array([strike]),
        }
    )
    model = hull_white(single.curve, mean_reversion=0.03, volatility=0.02)
    found = float(gaussian_option_prices(model, single)[0]) / (1.0 + strike * length)
    assert found == pytest.approx(price, abs=5e-9)


def test_closed_forms_against_quantlib() -> None:
    """QuantLib 1.44, blackFormula and bachelierBlackFormula, 200 random cases each: 1e-13; and the implied
    volatilities come back."""
    random = np.random.default_rng(8)
    forward, strike = random.uniform(0.001, 0.08, CASES), random.uniform(0.001, 0.08, CASES)
    years, black, normal = (
        random.uniform(low, high, CASES) for low, high in ((0.1, 30), (0.05, 1), (1e-3, 0.02))
    )
    shift, call = random.choice([0.0, 0.01, 0.03], CASES), random.random(CASES) < 0.5
    ours = forward_option(forward, strike, black, years, call=call, shift=shift)
    bachelier = forward_option(forward, strike, normal, years, call=call, normal=True)
    for row in range(CASES):
        kind = ql.Option.Call if call[row] else ql.Option.Put
        root = math.sqrt(years[row])
        theirs = ql.blackFormula(kind, strike[row], forward[row], black[row] * root, 1.0, shift[row])
        assert ours[row] == pytest.approx(theirs, abs=1e-13)
        theirs = ql.bachelierBlackFormula(kind, strike[row], forward[row], normal[row] * root)
        assert bachelier[row] == pytest.approx(theirs, abs=1e-13)
    back = implied_volatility(
        bachelier,
        forward[:, None],
        strike[:, None],
        years[:, None],
        weight=np.ones((CASES, 1)),
        call=call,
        normal=True,
    )
    clear = bachelier - np.maximum(np.where(call, 1.0, -1.0) * (forward - strike), 0.0) > 1e-6
    assert np.count_nonzero(clear) > 150
    assert back[clear] == pytest.approx(normal[clear], rel=1e-6)


def _flat(rate: float) -> ql.YieldTermStructureHandle:
    ql.Settings.instance().evaluationDate = TODAY
    return ql.YieldTermStructureHandle(ql.FlatForward(TODAY, rate, ql.Thirty360(ql.Thirty360.BondBasis)))


def _swaption(rate: float, expiry: int, length: int, strike: float, payer: bool) -> ql.Swaption:
    """Yearly payments on a 30/360 calendar without holidays: whole years."""
    handle = _flat(rate)
    calendar, months = ql.NullCalendar(), ql.Thirty360(ql.Thirty360.BondBasis)
    index = ql.IborIndex(
        "flat", ql.Period(1, ql.Years), 0, ql.EURCurrency(), calendar, ql.Unadjusted, False, months, handle
    )
    start = TODAY + ql.Period(expiry, ql.Years)
    dates = ql.Schedule(
        start,
        start + ql.Period(length, ql.Years),
        ql.Period(1, ql.Years),
        calendar,
        ql.Unadjusted,
        ql.Unadjusted,
        ql.DateGeneration.Forward,
        False,
    )
    kind = ql.VanillaSwap.Payer if payer else ql.VanillaSwap.Receiver
    swap = ql.VanillaSwap(kind, 1.0, dates, strike, months, dates, index, 0.0, months)
    return ql.Swaption(swap, ql.EuropeanExercise(start))


def test_swaptions_of_one_factor_against_quantlib() -> None:
    """QuantLib 1.44, HullWhite with JamshidianSwaptionEngine, 200 random cases: 5e-8. Its root
    search is the looser: with two factors, where it has none, the agreement is 1e-11."""
    random = np.random.default_rng(9)
    for _ in range(CASES):
        rate, strike = random.uniform(0.005, 0.06), random.uniform(0.002, 0.07)
        expiry, length = int(random.integers(1, 12)), int(random.integers(1, 15))
        speed, volatility = random.uniform(0.001, 0.5), random.uniform(0.001, 0.02)
        payer = bool(random.random() < 0.5)
        theirs = _swaption(rate, expiry, length, strike, payer)
        model = ql.HullWhite(_flat(rate), speed, volatility)
        theirs.setPricingEngine(ql.JamshidianSwaptionEngine(model))
        quotes = _one(
            rate,
            instrument="payer swaption" if payer else "receiver swaption",
            expiry=float(expiry),
            length=float(length),
            strike=strike,
            volatility=0.01,
        )
        ours = gaussian_option_prices(
            hull_white(quotes.curve, mean_reversion=speed, volatility=volatility), quotes
        )
        assert float(ours[0]) == pytest.approx(theirs.NPV(), abs=5e-8)


def test_swaptions_of_two_factors_against_quantlib() -> None:
    """QuantLib 1.44, G2 with its own engine (128 points within 8 deviations), 200 random cases: 1e-11."""
    random = np.random.default_rng(10)
    worst = 0.0
    for _ in range(CASES):
        rate, strike = random.uniform(0.01, 0.05), random.uniform(0.01, 0.05)
        expiry, length = int(random.integers(1, 10)), int(random.integers(1, 10))
        first, second = random.uniform(0.2, 1.0), random.uniform(0.01, 0.2)
        one, two = random.uniform(0.005, 0.02), random.uniform(0.003, 0.012)
        tied = random.uniform(-0.9, 0.5)
        payer = bool(random.random() < 0.5)
        theirs = _swaption(rate, expiry, length, strike, payer)
        model = ql.G2(_flat(rate), first, one, second, two, tied)
        theirs.setPricingEngine(ql.G2SwaptionEngine(model, 8.0, 128))
        quotes = _one(
            rate,
            instrument="payer swaption" if payer else "receiver swaption",
            expiry=float(expiry),
            length=float(length),
            strike=strike,
            volatility=0.01,
        )
        ours = gaussian_option_prices(_two(quotes, first, one, second, two, tied), quotes)
        worst = max(worst, abs(float(ours[0]) - theirs.NPV()))
    assert worst < 1e-11


def _two(
    quotes: OptionQuotes, first: float, one: float, second: float, two: float, tied: float
) -> GaussianRates:
    return gaussian_2(
        quotes.curve,
        mean_reversion=first,
        volatility=one,
        second_mean_reversion=second,
        second_volatility=two,
        factor_correlation=tied,
    )


@pytest.mark.parametrize("kind", ["one factor", "two factors", "square root"])
def test_caps_against_quantlibs_options_on_bonds(kind: str) -> None:
    """QuantLib 1.44, discountBondOption of HullWhite, G2 and CoxIngersollRoss: a caplet from t to T at
    strike K is ``1 + Kδ`` puts on the bond to T at ``1/(1 + Kδ)``. 200 random caps of two to six years:
    1e-10, and for the square root 1e-8 with yearly payments: where little time or volatility makes the
    noncentrality exceed about a thousand, that library's chi-square goes astray (negative prices)."""
    random = np.random.default_rng(11)
    for _ in range(CASES):
        rate, strike = random.uniform(0.005, 0.06), random.uniform(0.005, 0.06)
        last, count = int(random.integers(2, 7)), float(random.choice([1, 2, 4]))
        speed, volatility = random.uniform(0.01, 0.5), random.uniform(0.002, 0.02)
        call = bool(random.random() < 0.5)
        if kind == "one factor":
            quotes = _cap(flat_curve(rate), call, last, strike, count)
            theirs = ql.HullWhite(_flat(rate), speed, volatility)
            ours = gaussian_option_prices(
                hull_white(quotes.curve, mean_reversion=speed, volatility=volatility), quotes
            )
        elif kind == "two factors":
            quotes = _cap(flat_curve(rate), call, last, strike, count)
            theirs = ql.G2(_flat(rate), speed, volatility, 0.05, 0.008, -0.6)
            ours = gaussian_option_prices(_two(quotes, speed, volatility, 0.05, 0.008, -0.6), quotes)
        else:
            # Their class wants the condition of Feller.
            speed, count = max(speed, 0.1), 1.0
            sigma = random.uniform(0.4, 0.95) * math.sqrt(0.1 * speed)
            own = SquareRootRates(
                mean_reversion=speed, long_run_rate=0.05, volatility=sigma, starting_rate=rate
            )
            quotes = _cap(own.curve, call, last, strike, count)
            theirs = ql.CoxIngersollRoss(rate, 0.05, speed, sigma)
            ours = square_root_option_prices(own, quotes)
        growth = 1.0 + strike / count
        option = ql.Option.Put if call else ql.Option.Call
        expected = sum(
            growth * theirs.discountBondOption(option, 1.0 / growth, period / count, (period + 1) / count)
            for period in range(1, int(last * count))
        )
        assert float(ours[0]) == pytest.approx(expected, abs=1e-10 if kind != "square root" else 1e-8)


def _cap(curve: object, call: bool, last: int, strike: float, count: float) -> OptionQuotes:
    return option_quotes(
        curve,  # type: ignore[arg-type]  # either kind of curve
        instrument=["cap" if call else "floor"],
        expiry=[float(last)],
        length=[math.nan],
        strike=[strike],
        volatility=[0.01],
        kind=["normal"],
        shift=[0.0],
        frequency=[count],
    )


def test_square_root_swaptions_against_sampling() -> None:
    """The definition: the discounted payoff under the law of the model, by 400,000 of its exact paths; within
    four standard errors. QuantLib carries no swaption engine that is exact for this model."""
    model = SquareRootRates(
        mean_reversion=0.3, long_run_rate=0.04, volatility=0.12, starting_rate=0.03, curve=flat_curve(0.03)
    )
    quotes = _one(0.03, instrument="payer swaption", expiry=3.0, length=5.0, strike=0.032, volatility=0.01)
    walk = model.walk(0.25, 400_000, np.random.default_rng(12))
    for _ in walk.run(12):
        pass
    level, exposure = model.bond_terms(3.0, np.arange(4.0, 9.0))
    bonds = np.exp(level[:, None] - exposure * walk.state[0])
    payoff = np.maximum(1.0 - bonds[-1] - 0.032 * bonds.sum(axis=0), 0.0)
    values = payoff * np.exp(-walk.integral - float(model.account_offset(3.0)))
    error = float(values.std()) / math.sqrt(values.size)
    assert float(square_root_option_prices(model, quotes)[0]) == pytest.approx(values.mean(), abs=4.0 * error)
