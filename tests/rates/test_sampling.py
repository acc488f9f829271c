"""A curve on a grid and at its terms."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.curve import Curve, DiscountCurve, Interpolation
from desk.rates.flat import flat_curve
from desk.rates.parametric import Svensson
from desk.rates.quotes import par_flows
from desk.rates.sampling import compare_curves, quote_details, sample_curve
from desk.rates.smith_wilson import smith_wilson

TERMS, RATES = [1.0, 2.0, 5.0], [0.02, 0.025, 0.03]
FORMULA = Svensson(0.036, -0.015, -0.036, 0.08, 0.48, 10.4)
EVERY = pytest.mark.parametrize(
    "curve",
    [
        Curve(TERMS, RATES, Interpolation.MONOTONE_CONVEX),
        FORMULA,
        flat_curve(0.03),
        smith_wilson(par_flows(TERMS, RATES), ultimate_forward_rate=0.0345),
    ],
    ids=["terms", "formula", "flat", "Smith-Wilson"],
)


def test_the_sample_is_the_curve_itself() -> None:
    curve = Curve(TERMS, RATES, Interpolation.LINEAR_ZERO)
    sample = sample_curve(curve, until=8.0, points=17)
    assert sample.time[0] == 0.0
    assert sample.time[-1] == 8.0
    assert np.all(np.diff(sample.time) > 0)
    assert set(TERMS) <= set(sample.time)
    assert np.array_equal(sample.zero, curve.zero(sample.time))
    assert np.array_equal(sample.discount, curve.discount(sample.time))
    assert np.array_equal(sample.forward, curve.instantaneous_forward(sample.time))


def test_a_jump_of_the_forward_has_both_its_sides() -> None:
    # Flat forwards between the terms: 2 %, then (2 · 2.5 - 2) % = 3 %.
    sample = sample_curve(Curve(TERMS, RATES), until=5.0, points=2)
    at = int(np.searchsorted(sample.time, 1.0))
    assert sample.forward[at - 1] == pytest.approx(0.02, rel=1e-12)
    assert sample.forward[at] == pytest.approx(0.03, rel=1e-12)


def test_terms_beyond_the_end_are_left_out() -> None:
    sample = sample_curve(Curve(TERMS, RATES), until=1.5, points=3)
    assert sample.time.max() == 1.5


@pytest.mark.parametrize("until", [0.0, -1.0, np.inf, np.nan])
def test_an_end_that_is_none_is_refused(until: float) -> None:
    with pytest.raises(ValueError, match="`until`"):
        sample_curve(Curve(TERMS, RATES), until=until)


def test_too_few_points_are_refused() -> None:
    with pytest.raises(ValueError, match="`points`"):
        sample_curve(Curve(TERMS, RATES), until=5.0, points=1)


@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_forwards_to_the_next_term_chain_the_discount_factors(interpolation: Interpolation) -> None:
    detail = quote_details(Curve(TERMS, RATES, interpolation))
    assert detail.discount == pytest.approx(np.exp(-np.array(TERMS) * RATES), rel=1e-12)
    steps = np.exp(-detail.forward_to_next[:-1] * np.diff(TERMS))
    assert detail.discount[1:] == pytest.approx(detail.discount[:-1] * steps, rel=1e-12)


def test_at_the_last_term_stands_the_forward_that_goes_on() -> None:
    curve = Curve(TERMS, RATES)
    goes_on = curve.forward(10.0, 20.0)
    assert quote_details(curve).forward_to_next[-1] == pytest.approx(goes_on, rel=1e-12)
    assert quote_details(Curve([3.0], [0.04])).forward_to_next == pytest.approx([0.04], rel=1e-12)


@EVERY
def test_any_curve_is_sampled(curve: DiscountCurve) -> None:
    sample = sample_curve(curve, until=30.0, points=301)
    assert sample.time[0] == 0.0
    np.testing.assert_array_equal(sample.zero, curve.zero(sample.time))
    np.testing.assert_array_equal(sample.discount, curve.discount(sample.time))
    step = 1e-6
    ahead = curve.forward(sample.time, sample.time + step)
    # Away from the jump that a flat curve and a formula do not have.
    np.testing.assert_allclose(sample.forward, ahead, atol=1e-6)


def test_a_formula_has_no_terms_of_its_own() -> None:
    assert sample_curve(FORMULA, until=30.0, points=61).time.size == 61
    with pytest.raises(ValueError, match="`terms`"):
        quote_details(FORMULA)


@EVERY
def test_details_at_terms_in_any_order(curve: DiscountCurve) -> None:
    shuffled = np.array([7.0, 0.5, 30.0, 2.0, 7.0])
    detail = quote_details(curve, terms=shuffled)
    np.testing.assert_array_equal(detail.term, shuffled)
    np.testing.assert_allclose(detail.zero, curve.zero(shuffled))
    after = [30.0, 2.0, 30.0, 7.0, 30.0]
    np.testing.assert_allclose(detail.forward_to_next, curve.forward(shuffled, after))
    none = quote_details(curve, terms=[])
    assert none.zero.shape == none.discount.shape == none.forward_to_next.shape == (0,)


class TestComparison:
    """Two curves side by side."""

    @EVERY
    def test_a_curve_does_not_differ_from_itself(self, curve: DiscountCurve) -> None:
        found = compare_curves(curve, curve, until=40.0)
        assert np.all(found.zero_difference == 0.0)
        assert np.all(found.forward_difference == 0.0)
        assert np.all(found.discount_ratio == 1.0)

    def test_the_second_less_the_first(self) -> None:
        first, second = Curve(TERMS, RATES), Curve([1.0, 3.0], [0.02, 0.035])
        found = compare_curves(first, second, until=10.0, points=21)
        assert {1.0, 2.0, 3.0, 5.0} <= set(found.time)
        np.testing.assert_allclose(found.zero_difference, second.zero(found.time) - first.zero(found.time))
        ratio = second.discount(found.time) / first.discount(found.time)
        np.testing.assert_allclose(found.discount_ratio, ratio, rtol=1e-13)
        # 3 % to 2 years and then 10/3 %; beyond the jump of the second at 1 year, 4.25 %.
        at = int(np.searchsorted(found.time, 1.5))
        assert found.forward_difference[at] == pytest.approx(0.0425 - 0.03, rel=1e-12)

    def test_factors_that_have_become_nothing(self) -> None:
        found = compare_curves(flat_curve(5e3), flat_curve(5.01e3), until=100.0)
        assert np.isfinite(found.discount_ratio).all()

    @pytest.mark.parametrize(("until", "points"), [(0.0, 10), (np.nan, 10), (5.0, 1)])
    def test_a_grid_that_is_none_is_refused(self, until: float, points: int) -> None:
        with pytest.raises(ValueError, match=r"`until`|`points`"):
            compare_curves(FORMULA, FORMULA, until=until, points=points)
