"""A curve on a grid and at its terms."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.curve import Curve, Interpolation
from desk.rates.sampling import quote_details, sample_curve

TERMS, RATES = [1.0, 2.0, 5.0], [0.02, 0.025, 0.03]


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
