"""Curves: one suite for every interpolation, then what is particular to each."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import QuantLib as ql
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from desk.rates.curve import Curve, Interpolation

TERMS = np.array([0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 30.0, 50.0])
RATES = np.array(
    [0.0391, 0.0377, 0.0352, 0.0338, 0.0334, 0.0341, 0.0352, 0.0366, 0.0392, 0.0401, 0.0388, 0.0357]
)
NEGATIVE = np.array(
    [-0.006, -0.0061, -0.0065, -0.0068, -0.006, -0.004, -0.002, 0.0005, 0.004, 0.005, 0.0045, 0.004]
)
EVERY = pytest.mark.parametrize("interpolation", list(Interpolation))

Floats = NDArray[np.float64]


def _curve(interpolation: Interpolation, rates: Floats = RATES) -> Curve:
    return Curve(TERMS, rates, interpolation)


@EVERY
@pytest.mark.parametrize("rates", [RATES, NEGATIVE], ids=["positive", "negative"])
class TestEveryInterpolation:
    """What holds for each interpolation."""

    def test_gives_back_the_rates_it_was_made_of(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        np.testing.assert_allclose(curve.zero(TERMS), rates, rtol=1e-13)
        np.testing.assert_allclose(curve.discount(TERMS), np.exp(-rates * TERMS), rtol=1e-14)

    def test_starts_at_one(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        assert curve.discount(0.0) == 1.0
        assert curve.zero(0.0) == curve.instantaneous_forward(0.0)
        np.testing.assert_allclose(curve.zero(1e-9), curve.zero(0.0), atol=1e-9)

    def test_discount_is_continuous(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        before = curve.discount(np.nextafter(TERMS, 0.0))
        np.testing.assert_allclose(before, curve.discount(TERMS), rtol=1e-13)

    def test_forward_is_the_slope_of_the_logarithm(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        time = np.linspace(0.01, 70.0, 997)  # no point within the step of a term
        step = 1e-5
        slope = -(np.log(curve.discount(time + step)) - np.log(curve.discount(time - step))) / (2 * step)
        np.testing.assert_allclose(curve.instantaneous_forward(time), slope, atol=2e-9)

    def test_close_forwards_lose_no_digits(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        time = np.linspace(0.01, 70.0, 997)
        close = curve.forward(time, time + 1e-10)
        np.testing.assert_allclose(close, curve.instantaneous_forward(time), atol=1e-10)
        same = curve.forward(time, time)
        np.testing.assert_allclose(same, curve.instantaneous_forward(time), rtol=1e-14, atol=1e-17)

    def test_last_forward_goes_on(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        beyond = np.array([50.0, 50.5, 70.0, 120.0])
        last = curve.instantaneous_forward(50.0)
        np.testing.assert_allclose(curve.instantaneous_forward(beyond), last, rtol=1e-15)
        expected = curve.discount(50.0) * np.exp(-last * (beyond - 50.0))
        np.testing.assert_allclose(curve.discount(beyond), expected, rtol=1e-13)
        # The last forward is the limit from the left: nothing jumps at the last term.
        np.testing.assert_allclose(curve.instantaneous_forward(50.0 - 1e-9), last, atol=1e-10)

    def test_any_shape(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        grid = np.linspace(0.0, 60.0, 24).reshape(2, 3, 4)
        for method in (curve.discount, curve.zero, curve.instantaneous_forward):
            whole = method(grid)
            assert whole.shape == grid.shape
            np.testing.assert_allclose(whole.ravel(), [method(t) for t in grid.ravel()], rtol=1e-14)
            assert method([]).shape == (0,)
            assert method(3).shape == ()
        assert curve.forward(grid[0], 70.0).shape == (3, 4)

    def test_many_times_are_as_few(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)
        times = np.concatenate((np.linspace(0.0, 70.0, 1500), TERMS, np.nextafter(TERMS, 0.0)))
        for method in (curve.discount, curve.zero, curve.instantaneous_forward):
            np.testing.assert_allclose(method(times), [method(time) for time in times], rtol=1e-14)

    def test_forwards_chain(self, interpolation: Interpolation, rates: Floats) -> None:
        curve = _curve(interpolation, rates)

        @settings(max_examples=60, deadline=None)
        @given(st.floats(0.0, 80.0), st.floats(0.0, 80.0))
        def chain(start: float, end: float) -> None:
            growth = np.exp(-curve.forward(start, end) * (end - start))
            np.testing.assert_allclose(curve.discount(start) * growth, curve.discount(end), rtol=1e-12)
            np.testing.assert_allclose(curve.forward(start, end), curve.forward(end, start), rtol=1e-9)
            np.testing.assert_allclose(np.exp(-curve.zero(end) * end), curve.discount(end), rtol=1e-13)

        chain()

    def test_a_parallel_move_moves_every_zero_rate(self, interpolation: Interpolation, rates: Floats) -> None:
        before, after = _curve(interpolation, rates), _curve(interpolation, rates + 0.0001)
        time = np.linspace(0.0, 70.0, 500)
        moved = after.zero(time) - before.zero(time)
        np.testing.assert_allclose(moved, 0.0001, atol=1e-12)


@EVERY
class TestFewTerms:
    """One term makes a flat curve; two make each interpolation's simplest case."""

    def test_one_term_is_flat(self, interpolation: Interpolation) -> None:
        curve = Curve([5.0], [-0.01], interpolation)
        time = np.array([0.0, 1.0, 5.0, 40.0])
        np.testing.assert_allclose(curve.zero(time), -0.01, rtol=1e-14)
        np.testing.assert_allclose(curve.instantaneous_forward(time), -0.01, rtol=1e-14)

    def test_two_terms(self, interpolation: Interpolation) -> None:
        curve = Curve([1.0, 2.0], [0.02, 0.03], interpolation)
        np.testing.assert_allclose(curve.zero([1.0, 2.0]), [0.02, 0.03], rtol=1e-14)
        np.testing.assert_allclose(curve.forward(1.0, 2.0), 0.04, rtol=1e-14)

    def test_equal_rates_are_flat(self, interpolation: Interpolation) -> None:
        curve = Curve(TERMS, np.full(TERMS.size, 0.03), interpolation)
        np.testing.assert_allclose(curve.zero(np.linspace(0.0, 90.0, 200)), 0.03, rtol=1e-12)

    def test_keeps_what_it_was_made_of(self, interpolation: Interpolation) -> None:
        terms, rates = TERMS.copy(), RATES.copy()
        curve = Curve(terms, rates, interpolation)
        terms[0] = rates[0] = 99.0
        np.testing.assert_array_equal(curve.terms, TERMS)
        np.testing.assert_array_equal(curve.zero_rates, RATES)
        assert (curve.interpolation, curve.last_term) == (interpolation, 50.0)
        for owned in (curve.terms, curve.zero_rates):
            with pytest.raises(ValueError, match="read-only"):
                owned[0] = 1.0


@pytest.mark.parametrize(
    "interpolation", [kind for kind in Interpolation if kind is not Interpolation.MONOTONE_CONVEX]
)
def test_flat_before_the_first_term(interpolation: Interpolation) -> None:
    curve = _curve(interpolation)
    np.testing.assert_allclose(curve.zero([0.0, 0.01, 0.2, 0.25]), RATES[0], rtol=1e-15)


def test_log_linear_is_linear_in_the_logarithm() -> None:
    time = np.linspace(0.25, 50.0, 333)
    expected = np.exp(np.interp(time, TERMS, -RATES * TERMS))
    np.testing.assert_allclose(_curve(Interpolation.LOG_LINEAR).discount(time), expected, rtol=1e-13)


def test_linear_zero_is_linear_in_the_rate() -> None:
    time = np.linspace(0.0, 50.0, 333)
    expected = np.interp(time, TERMS, RATES)
    np.testing.assert_allclose(_curve(Interpolation.LINEAR_ZERO).zero(time), expected, rtol=1e-12)


def test_cubic_zero_is_the_natural_spline() -> None:
    time = np.linspace(0.25, 50.0, 333)
    spline = CubicSpline(TERMS, RATES, bc_type="natural")
    curve = _curve(Interpolation.CUBIC_ZERO)
    np.testing.assert_allclose(curve.zero(time), spline(time), rtol=1e-12)
    expected = spline(time) + time * spline(time, 1)
    np.testing.assert_allclose(curve.instantaneous_forward(time[:-1]), expected[:-1], rtol=1e-12)


def _excess(left: float, right: float, x: float) -> float:
    """g(x) of Hagan and West 2006, section 6, region by region as printed."""
    if left == 0.0 and right == 0.0:
        return 0.0
    if (left < 0.0 and -0.5 * left <= right <= -2.0 * left) or (
        left > 0.0 and -0.5 * left >= right >= -2.0 * left
    ):
        return left * (1 - 4 * x + 3 * x**2) + right * (-2 * x + 3 * x**2)
    if (left < 0.0 and right > -2.0 * left) or (left > 0.0 and right < -2.0 * left):
        turn = (right + 2.0 * left) / (right - left)
        return left if x <= turn else left + (right - left) * ((x - turn) / (1 - turn)) ** 2
    if (left > 0.0 and 0.0 > right > -0.5 * left) or (left < 0.0 and 0.0 < right < -0.5 * left):
        turn = 3.0 * right / (right - left)
        return right + (left - right) * ((turn - x) / turn) ** 2 if x < turn else right
    turn = right / (right + left)
    low = -left * right / (left + right)
    if x < turn:
        return low + (left - low) * ((turn - x) / turn) ** 2
    return low + (right - low) * ((x - turn) / (1 - turn)) ** 2 if turn < 1.0 else low


def _integral(left: float, right: float, part: float) -> float:
    """The integral of g from 0 to `part`: Simpson's rule, exact between the turns of every region."""
    turns = {0.0, part}
    for above, below in (
        (right + 2.0 * left, right - left),
        (3.0 * right, right - left),
        (right, right + left),
    ):
        if abs(below) > abs(above) > 0.0 and 0.0 < above / below < part:
            turns.add(above / below)
    ends = sorted(turns)
    return sum(
        (end - start)
        / 6.0
        * (
            _excess(left, right, start)
            + 4.0 * _excess(left, right, 0.5 * (start + end))
            + _excess(left, right, end)
        )
        for start, end in pairwise(ends)
    )


@settings(max_examples=150, deadline=None)
@given(st.lists(st.floats(-0.02, 0.1), min_size=2, max_size=6), st.floats(0.0, 1.0))
def test_monotone_convex_follows_the_paper(forwards: list[float], part: float) -> None:
    discrete = np.array(forwards)
    terms = np.cumsum([0.5, 1.0, 2.0, 1.5, 5.0, 10.0][: len(forwards)])
    width = np.diff(terms, prepend=0.0)
    curve = Curve(terms, np.cumsum(discrete * width) / terms, Interpolation.MONOTONE_CONVEX)
    # The discrete forwards as the curve sees them, after a trip through zero rates.
    discrete = np.diff(curve.zero_rates * terms, prepend=0.0) / width
    node = np.empty(discrete.size + 1)
    for number in range(1, discrete.size):
        share = width[number - 1] / (width[number - 1] + width[number])
        node[number] = share * discrete[number] + (1.0 - share) * discrete[number - 1]
    node[0] = discrete[0] - 0.5 * (node[1] - discrete[0])
    node[-1] = discrete[-1] - 0.5 * (node[-2] - discrete[-1])
    if discrete.min() > 0.0:
        node[0] = min(max(node[0], 0.0), 2.0 * discrete[0])
        node[-1] = min(max(node[-1], 0.0), 2.0 * discrete[-1])
        for number in range(1, discrete.size):
            bound = 2.0 * min(discrete[number - 1], discrete[number])
            node[number] = min(max(node[number], 0.0), bound)
    for number, mean in enumerate(discrete):
        left, right = node[number] - mean, node[number + 1] - mean
        start = terms[number] - width[number]
        whole = _integral(left, right, part)
        grown = np.log(curve.discount(start) / curve.discount(start + part * width[number]))
        assert abs(grown - width[number] * (mean * part + whole)) < 1e-9
        if discrete.min() > 0.0:
            assert curve.instantaneous_forward(start + part * width[number]) >= -1e-15


@pytest.mark.parametrize("kind", ["log-linear", "linear-zero"])
def test_agrees_with_quantlib(kind: str) -> None:
    today = ql.Date(30, 6, 2026)
    ql.Settings.instance().evaluationDate = today
    days = [91, 182, 365, 731, 1096, 1826, 2557, 3652, 5479, 7305, 10957, 18262]
    terms = np.array(days) / 365.0
    dates = [today, *(today + day for day in days)]
    count = ql.Actual365Fixed()
    if kind == "log-linear":
        theirs = ql.DiscountCurve(dates, [1.0, *np.exp(-RATES * terms).tolist()], count)
    else:
        theirs = ql.ZeroCurve(dates, [RATES[0], *RATES.tolist()], count)
    theirs.enableExtrapolation()
    ours = Curve(terms, RATES, Interpolation(kind))
    times = np.random.default_rng(5).uniform(0.01, 80.0, 400)
    discounts = [theirs.discount(time) for time in times]
    np.testing.assert_allclose(ours.discount(times), discounts, rtol=1e-12)
    later = times + 0.75
    forwards = [
        theirs.forwardRate(one, two, ql.Continuous).rate() for one, two in zip(times, later, strict=True)
    ]
    np.testing.assert_allclose(ours.forward(times, later), forwards, rtol=1e-9)


@pytest.mark.parametrize(
    ("terms", "rates", "message"),
    [
        ([], [], "`terms` must hold at least one term"),
        ([[1.0, 2.0]], [[0.01, 0.02]], "`terms` must hold at least one term, in one dimension"),
        ([1.0, 2.0], [0.01], "`zero_rates` must hold one rate for each of the 2 terms"),
        ([0.0, 1.0], [0.01, 0.02], "`terms` must be finite and positive"),
        ([-1.0, 1.0], [0.01, 0.02], "`terms` must be finite and positive"),
        ([1.0, np.nan], [0.01, 0.02], "`terms` must be finite and positive"),
        ([1.0, np.inf], [0.01, 0.02], "`terms` must be finite and positive"),
        ([1.0, 3.0, 2.0], [0.01, 0.02, 0.03], "`terms` must rise strictly, but 2 comes after 3"),
        ([1.0, 1.0], [0.01, 0.02], "`terms` must rise strictly, but 1 comes after 1"),
        ([1.0, 2.0], [0.01, np.nan], "`zero_rates` must be finite"),
        ([1.0, 2.0], [0.01, -np.inf], "`zero_rates` must be finite"),
    ],
)
def test_refuses_what_makes_no_curve(terms: list[float], rates: list[float], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Curve(terms, rates)


def test_refuses_an_unknown_interpolation() -> None:
    with pytest.raises(ValueError, match="is not a valid Interpolation"):
        Curve([1.0], [0.02], "stepwise")  # type: ignore[arg-type]  # what a careless caller may do


@EVERY
@pytest.mark.parametrize("time", [-1e-12, np.nan, np.inf, [1.0, -2.0]])
def test_refuses_times_before_today(interpolation: Interpolation, time: float) -> None:
    curve = _curve(interpolation)
    for method in (curve.discount, curve.zero, curve.instantaneous_forward):
        with pytest.raises(ValueError, match="`time` must be finite and at least 0"):
            method(time)
    with pytest.raises(ValueError, match="`end` must be finite and at least 0"):
        curve.forward(1.0, time)
