"""Bootstrapped curves: what holds for every interpolation, and quotes that give no curve."""

from __future__ import annotations

import pickle
from datetime import date

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from desk.rates.bootstrap import bootstrap
from desk.rates.compounding import Compounding
from desk.rates.curve import Curve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.day_count import DayCount
from desk.rates.flat import flat_curve
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.rates.quotes import bond_flows, par_flows, swap_flows, zero_flows
from desk.rates.sensitivity import exponents

EVERY = pytest.mark.parametrize("interpolation", list(Interpolation))
TERMS = np.array([0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 30.0, 50.0])
HUMPED = np.array([39.1, 37.7, 35.2, 33.8, 33.4, 34.1, 35.2, 36.6, 39.2, 40.1, 38.8, 35.7]) / 1000.0
STEEP = np.array([0.7, 1.3, 4.9, 12.1, 18.2, 25.7, 31.3, 35.2, 38.7, 41.2, 42.3, 41.9]) / 1000.0
BELOW_ZERO = HUMPED - 0.042
ROUGH = np.array([0.01, 0.05, 0.02, 0.03, 0.025, 0.03, 0.028, 0.031, 0.03, 0.032, 0.03, 0.029])
SHAPES = pytest.mark.parametrize(
    "rates", [HUMPED, STEEP, BELOW_ZERO, ROUGH], ids=["humped", "steep", "below zero", "rough"]
)

Floats = NDArray[np.float64]


def _outcome(flows: QuotedFlows, interpolation: Interpolation) -> Curve | CurveError:
    try:
        return bootstrap(flows, interpolation=interpolation)
    except CurveError as error:
        return error


@EVERY
@SHAPES
class TestEveryInterpolation:
    """What holds for each."""

    def test_par_yields_are_given_back(self, interpolation: Interpolation, rates: Floats) -> None:
        for per_year in (1, 2, 4, 12):
            flows = par_flows(TERMS, rates, payments_per_year=per_year)
            curve = bootstrap(flows, interpolation=interpolation)
            np.testing.assert_allclose(flows.values(curve), 1.0, rtol=1e-12)
            np.testing.assert_array_equal(curve.terms, TERMS)
            assert curve.interpolation is interpolation

    def test_bonds_of_odd_terms_are_given_back(self, interpolation: Interpolation, rates: Floats) -> None:
        terms = TERMS + np.linspace(0.01, 0.11, TERMS.size)
        flows = bond_flows(terms, rates + 0.01, frequency=[1, 2, 4, 12] * 3, yields=rates)
        curve = bootstrap(flows, interpolation=interpolation)
        np.testing.assert_allclose(flows.values(curve), flows.target, rtol=1e-12)

    def test_zero_rates_are_given_back(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = bootstrap(zero_flows(TERMS, rates), interpolation=interpolation)
        np.testing.assert_allclose(curve.zero_rates, rates, atol=1e-14)

    def test_quotes_read_off_a_curve_give_back_the_curve(
        self, interpolation: Interpolation, rates: Floats
    ) -> None:
        curve = Curve(TERMS, rates, interpolation)
        blank = bond_flows(TERMS, np.full(TERMS.size, 0.03), prices=np.full(TERMS.size, 100.0))
        flows = QuotedFlows(blank.instrument, blank.time, blank.amount, blank.values(curve))
        found = bootstrap(flows, interpolation=interpolation)
        time = np.linspace(0.0, 60.0, 400)
        # The last zero rate is told by a payment of the order of its discount factor.
        np.testing.assert_allclose(found.zero(time), curve.zero(time), atol=1e-12)

    def test_sensitivities_are_slopes(self, interpolation: Interpolation, rates: Floats) -> None:
        times = np.array([0.1, 0.25, 0.3, 0.75, 1.2, 2.0, 2.9, 4.0, 6.5, 8.0, 13.3, 16.0, 27.0, 44.4, 50.0])
        found = exponents(TERMS, times, interpolation)(rates)
        curve = Curve(TERMS, rates, interpolation)
        np.testing.assert_allclose(found.value, -np.log(curve.discount(times)), atol=1e-14)
        by_rate = np.sum(found.factor[:, :, None] * found.by_rate[found.place], axis=0)
        step = 1e-9  # small against the forwards, whose ratios the regions go by
        for column in range(TERMS.size):
            bump = np.zeros(TERMS.size)
            bump[column] = step
            up, down = (Curve(TERMS, rates + sign * bump, interpolation) for sign in (1.0, -1.0))
            slope = -np.log(up.discount(times) / down.discount(times)) / (2.0 * step)
            np.testing.assert_allclose(by_rate[:, column], slope, atol=2e-5)


@EVERY
def test_a_single_quote_gives_a_flat_curve(interpolation: Interpolation) -> None:
    curve = bootstrap(par_flows([7.0], [0.03], payments_per_year=2), interpolation=interpolation)
    np.testing.assert_allclose(curve.zero([0.5, 7.0, 30.0]), 2.0 * np.log1p(0.015), rtol=1e-13)


@settings(max_examples=150, deadline=None)
@given(
    st.sampled_from(list(Interpolation)),
    st.sampled_from([1, 2, 4, 12]),
    st.lists(st.integers(1, 40), min_size=1, max_size=15, unique=True),
    st.sampled_from([0.0, 0.25, 0.5, 0.75]),
    st.floats(-0.01, 0.08),
    st.floats(-0.02, 0.02),
    st.integers(0, 2**32 - 1),
)
def test_any_reasonable_par_yields_are_given_back(
    interpolation: Interpolation,
    per_year: int,
    years: list[int],
    earlier: float,
    level: float,
    rise: float,
    seed: int,
) -> None:
    # Quotes at least a year apart: nearer ones turn a little roughness into forward rates of any size.
    terms = np.sort(np.array(years)) - earlier
    rough = 0.0005 * np.random.default_rng(seed).standard_normal(terms.size)
    rates = level + rise * -np.expm1(-terms / 6.0) + rough
    flows = par_flows(terms, rates, payments_per_year=per_year)
    found = _outcome(flows, interpolation)
    if isinstance(found, CurveError):
        # Little is left for late payments at high rates: a little roughness may ask for less than nothing.
        assert len(found.rows) == 1
        assert terms[found.rows[0]] * max(rates) > 1.0
    else:
        np.testing.assert_allclose(flows.values(found), 1.0, rtol=1e-12)


def test_swap_rates_of_dates_and_of_years_agree_where_days_are_even() -> None:
    dates = np.array(["2027-06-30", "2029-06-30", "2036-06-30"], dtype="M8[D]")
    by_date = swap_flows(
        dates,
        [0.02, 0.022, 0.03],
        payments_per_year=2,
        day_count=DayCount.THIRTY_E_360,
        valuation_date=date(2026, 6, 30),
        time_count=DayCount.THIRTY_E_360,
    )
    by_year = swap_flows([1.0, 3.0, 10.0], [0.02, 0.022, 0.03], payments_per_year=2)
    np.testing.assert_allclose(by_date.time, by_year.time, atol=1e-14)
    np.testing.assert_allclose(by_date.amount, by_year.amount, atol=1e-14)


def test_a_clean_price_and_its_accrued_interest() -> None:
    """Act/Act ICMA: 61 of 184 days of a semi-annual coupon; Act/360: 61 days of the year's coupon."""
    maturity = np.array(["2031-10-31"], dtype="M8[D]")
    today = date(2026, 6, 30)
    by_period = bond_flows(maturity, [0.05], prices=[100.0], is_clean=True, valuation_date=today)
    assert by_period.target[0] == pytest.approx(100.0 + 2.5 * 61.0 / 184.0, rel=1e-14)
    by_days = bond_flows(
        maturity, [0.05], prices=[100.0], is_clean=True, valuation_date=today, day_count=DayCount.ACT_360
    )
    assert by_days.target[0] == pytest.approx(100.0 + 5.0 * 61.0 / 360.0, rel=1e-14)


def test_each_price_is_clean_or_not() -> None:
    today, maturity = date(2026, 3, 1), np.array(["2030-08-15", "2031-11-15"], dtype="datetime64[D]")
    both = {
        clean: bond_flows(maturity, [0.05, 0.03], prices=[99.0, 98.0], is_clean=clean, valuation_date=today)
        for clean in (False, True)
    }
    mixed = bond_flows(
        maturity, [0.05, 0.03], prices=[99.0, 98.0], is_clean=[True, False], valuation_date=today
    )
    np.testing.assert_array_equal(mixed.target, [both[True].target[0], both[False].target[1]])
    assert both[True].target[0] > 99.0 == both[False].target[0]


def test_some_of_the_instruments_in_another_order() -> None:
    flows = par_flows([1.0, 2.0, 5.0, 10.0], [0.02, 0.03, 0.04, 0.05])
    taken = flows.taken([3, 0, 2])
    np.testing.assert_array_equal(taken.term, [10.0, 1.0, 5.0])
    curve = flat_curve(0.03)
    np.testing.assert_array_equal(taken.values(curve), flows.values(curve)[[3, 0, 2]])
    np.testing.assert_array_equal(flows.taken([0, 1]).amount, flows.leading(2).amount)


def test_terms_within_a_period_have_a_first_payment_in_proportion() -> None:
    flows = par_flows([0.25, 1.75], [0.04, 0.05], payments_per_year=1)
    np.testing.assert_allclose(flows.time, [0.25, 0.75, 1.75])
    np.testing.assert_allclose(flows.amount, [1.01, 0.0375, 1.05])


def test_yields_of_flows() -> None:
    flows = QuotedFlows(
        np.array([0, 1, 1, 2]), np.array([2.0, 1, 2, 1]), np.array([1.0, -1, 2, 1]), np.ones(3)
    )
    found = flow_yields(flows, target=[np.exp(-0.06), 1.0, -1.0])
    assert found[0] == pytest.approx(0.03, rel=1e-12)
    assert np.isnan(found[1:]).all()


def test_a_flat_curve_is_flat() -> None:
    curve = flat_curve(0.04, Compounding.ANNUAL)
    np.testing.assert_allclose(curve.discount([0.0, 1.0, 30.0]), 1.04 ** -np.array([0.0, 1.0, 30.0]))
    with pytest.raises(ValueError, match="must be above"):
        flat_curve(-1.5)


class TestFaults:
    """Quotes that give no curve: the error names them and says what would mend it."""

    def test_out_of_order(self) -> None:
        with pytest.raises(CurveError, match="stands after the one at 7 years") as caught:
            bootstrap(par_flows([1.0, 7.0, 5.0, 10.0], [0.02] * 4))
        assert caught.value.rows == (2,)
        assert "order" in caught.value.mend

    def test_twice_the_same_term(self) -> None:
        with pytest.raises(CurveError, match="two quotes stand at 7 years") as caught:
            bootstrap(par_flows([1.0, 7.0, 7.0, 10.0], [0.02] * 4))
        assert caught.value.rows == (1, 2)

    @EVERY
    def test_coupons_worth_more_than_the_quote(self, interpolation: Interpolation) -> None:
        prices = [98.0, 97.0, 20.0, 95.0]
        flows = bond_flows([1.0, 2.0, 10.0, 20.0], [0.02, 0.02, 0.05, 0.05], prices=prices)
        earlier = bootstrap(flows.leading(2), interpolation=interpolation)
        assert np.isfinite(earlier.zero_rates).all()
        flows = par_flows([1.0, 2.0, 30.0, 31.0, 40.0], [0.02, 0.02, 0.02, 0.9, 0.02])
        with pytest.raises(CurveError, match="already worth as much") as caught:
            bootstrap(flows, interpolation=interpolation)
        assert caught.value.rows == (3,)

    def test_bonds_past_maturity(self) -> None:
        maturity = np.array(["2030-01-01", "2026-06-30", "2020-01-01"], dtype="M8[D]")
        with pytest.raises(CurveError, match="matured") as caught:
            bond_flows(maturity, [0.0] * 3, prices=[100.0] * 3, valuation_date=date(2026, 6, 30))
        assert caught.value.rows == (1, 2)
        with pytest.raises(CurveError, match="not above 0 years") as caught:
            bond_flows([1.0, -1.0], [0.0] * 2, prices=[100.0] * 2)
        assert caught.value.rows == (1,)

    @pytest.mark.parametrize(
        ("prices", "yields", "words", "rows"),
        [
            ([100.0, np.nan], None, "neither a price nor a yield", (1,)),
            ([100.0, np.nan], [0.02, 0.02], "both a price and a yield", (0,)),
            ([100.0, -5.0], None, "not above 0", (1,)),
            ([np.inf, 5.0], None, "neither", (0,)),
            (None, [0.02, -3.0], "leaves nothing", (1,)),
        ],
    )
    def test_prices_and_yields(
        self, prices: list[float] | None, yields: list[float] | None, words: str, rows: tuple[int, ...]
    ) -> None:
        with pytest.raises(CurveError, match=words) as caught:
            bond_flows([1.0, 2.0], [0.03, 0.03], prices=prices, yields=yields)
        assert caught.value.rows == rows

    @pytest.mark.parametrize(
        ("terms", "rates", "rows"),
        [
            ([1.0, np.nan], [0.02, 0.02], (1,)),
            ([1.0, np.inf], [0.02, 0.02], (1,)),
            ([1.0, 1e9], [0.02, 0.02], (1,)),
            ([1.0, 2.0], [np.nan, 0.02], (0,)),
            ([], [], ()),
        ],
    )
    def test_numbers_that_are_none(
        self, terms: list[float], rates: list[float], rows: tuple[int, ...]
    ) -> None:
        for make in (par_flows, swap_flows, zero_flows):
            with pytest.raises(CurveError) as caught:
                make(terms, rates)
            assert caught.value.rows == rows

    def test_frequencies(self) -> None:
        with pytest.raises(CurveError, match="payments a year") as caught:
            bond_flows([1.0, 2.0], [0.03, 0.03], frequency=[2, 7], prices=[100.0, 100.0])
        assert caught.value.rows == (1,)

    def test_the_error_crosses_processes(self) -> None:
        error = CurveError("what was found", "What would mend it.", rows=[3])
        again = pickle.loads(pickle.dumps(error))
        assert (again.found, again.mend, again.rows, str(again)) == (
            error.found,
            error.mend,
            (3,),
            "what was found. What would mend it.",
        )

    def test_absurd_quotes_end_in_an_error_or_a_curve(self) -> None:
        random = np.random.default_rng(2)
        for _ in range(50):
            count = int(random.integers(1, 12))
            terms = np.sort(random.uniform(0.01, 60.0, count))
            rates = random.choice([-0.9, -0.5, 0.0, 0.3, 2.0, 1e3, 1e8, 1e300], count)
            for interpolation in Interpolation:
                flows = par_flows(terms, rates, payments_per_year=int(random.choice([1, 2, 12])))
                found = _outcome(flows, interpolation)
                if isinstance(found, CurveError):
                    assert found.rows
                else:
                    worth = flows.sums(np.abs(flows.amount) * found.discount(flows.time))
                    assert np.all(np.abs(flows.values(found) - 1.0) <= 1e-12 * np.maximum(worth, 1.0))


def _many(count: int, curve: Curve) -> QuotedFlows:
    random = np.random.default_rng(count)
    terms = np.sort(random.uniform(0.1, 40.0, count))
    blank = bond_flows(terms, random.uniform(0.0, 0.06, count), yields=np.full(count, 0.03))
    return QuotedFlows(blank.instrument, blank.time, blank.amount, blank.values(curve))


class TestManyQuotes:
    """Sheets of thousands of bonds."""

    @pytest.mark.parametrize("interpolation", [Interpolation.LOG_LINEAR, Interpolation.LINEAR_ZERO])
    def test_thousands_are_given_back(self, interpolation: Interpolation) -> None:
        flows = _many(5000, Curve(TERMS, HUMPED, interpolation))
        curve = bootstrap(flows, interpolation=interpolation)
        np.testing.assert_allclose(flows.values(curve), flows.target, rtol=1e-12)

    def test_the_first_that_does_not_fit_is_named(self) -> None:
        flows = _many(5000, Curve(TERMS, HUMPED))
        target = flows.target.copy()
        target[3100] *= 0.2
        with pytest.raises(CurveError, match="already worth as much") as caught:
            bootstrap(QuotedFlows(flows.instrument, flows.time, flows.amount, target))
        assert caught.value.rows == (3100,)

    @pytest.mark.parametrize("interpolation", [Interpolation.CUBIC_ZERO, Interpolation.MONOTONE_CONVEX])
    def test_too_many_are_refused_where_all_move_together(self, interpolation: Interpolation) -> None:
        with pytest.raises(CurveError, match=r"1,001 quotes.* log-linear or linear-zero\.$"):
            bootstrap(_many(1001, Curve(TERMS, HUMPED)), interpolation=interpolation)

    def test_what_does_not_fit_any_curve_is_found_without_trying_them_all(self) -> None:
        flows = _many(150, Curve(TERMS, HUMPED))
        target = flows.target.copy()
        target[90] *= 0.2
        for interpolation in (Interpolation.CUBIC_ZERO, Interpolation.MONOTONE_CONVEX):
            with pytest.raises(CurveError, match="already worth as much") as caught:
                bootstrap(
                    QuotedFlows(flows.instrument, flows.time, flows.amount, target),
                    interpolation=interpolation,
                )
            assert caught.value.rows == (90,)
