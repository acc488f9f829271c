"""Expected increases and growth."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.curve import Curve
from desk.rates.inflation import (
    MOST_YEARS,
    collared_growth,
    expected_increase,
    expected_increase_slope,
    floored_growth,
    floored_growth_slope,
    growth_factors,
    log_growth,
    unknown_years,
)


def test_no_floor_and_no_cap_leave_the_mean() -> None:
    mean = np.array([-0.4, -0.01, 0.0, 0.025, 3.0, 1e9])
    np.testing.assert_array_equal(expected_increase(mean, sd=0.02), mean)
    np.testing.assert_array_equal(expected_increase_slope(mean, sd=0.02), 1.0)


def test_without_deviation_the_mean_is_held() -> None:
    mean = np.array([-1.0, 0.0, 0.02, 0.05, 0.4])
    np.testing.assert_array_equal(
        expected_increase(mean, sd=0.0, floor=0.0, cap=0.05), [0.0, 0.0, 0.02, 0.05, 0.05]
    )
    np.testing.assert_array_equal(
        expected_increase_slope(mean, sd=0.0, floor=0.0, cap=0.05), [0.0, 0.5, 1.0, 0.5, 0.0]
    )
    tiny = expected_increase(mean, sd=1e-12, floor=0.0, cap=0.05)
    np.testing.assert_allclose(tiny, [0.0, 0.0, 0.02, 0.05, 0.05], atol=1e-12)


def test_a_floor_that_is_the_cap_leaves_no_choice() -> None:
    mean = np.array([-0.5, 0.03, 0.9])
    np.testing.assert_array_equal(expected_increase(mean, sd=0.3, floor=0.03, cap=0.03), 0.03)
    np.testing.assert_array_equal(expected_increase_slope(mean, sd=0.3, floor=0.03, cap=0.03), 0.0)


def test_far_from_floor_and_cap_no_digits_are_lost() -> None:
    """A mean a million times the cap, and below the floor: the result is exact."""
    np.testing.assert_array_equal(
        expected_increase([5e4, -5e4, 1e300], sd=0.015, floor=0.01, cap=0.05), [0.05, 0.01, 0.05]
    )


def test_floor_and_cap_mirror_each_other() -> None:
    random = np.random.default_rng(1)
    mean, floor = random.normal(0.02, 0.03, 200), random.normal(0.0, 0.02, 200)
    sd, cap = random.uniform(0.0, 0.05, 200), floor + random.uniform(0.0, 0.1, 200)
    np.testing.assert_allclose(
        expected_increase(mean, sd=sd, floor=floor, cap=cap),
        -expected_increase(-mean, sd=sd, floor=-cap, cap=-floor),
        rtol=1e-12,
        atol=1e-16,
    )


def test_slope_is_the_derivative() -> None:
    random = np.random.default_rng(2)
    mean, floor = random.normal(0.02, 0.02, 300), random.normal(0.0, 0.01, 300)
    sd, cap = random.uniform(0.005, 0.05, 300), floor + random.uniform(0.0, 0.1, 300)
    step = 1e-5
    up, down = (expected_increase(mean + way, sd=sd, floor=floor, cap=cap) for way in (step, -step))
    slope = expected_increase_slope(mean, sd=sd, floor=floor, cap=cap)
    np.testing.assert_allclose(slope, (up - down) / (2.0 * step), atol=2e-6)


@pytest.mark.parametrize(
    ("terms", "match"),
    [
        ({"sd": -0.01}, "`sd` must be at least 0"),
        ({"sd": np.nan}, "`sd` must be at least 0"),
        ({"sd": 0.01, "floor": 0.05, "cap": 0.04}, "`cap` must be at least `floor`"),
    ],
)
def test_terms_that_make_no_sense(terms: dict[str, float], match: str) -> None:
    for function in (expected_increase, expected_increase_slope):
        with pytest.raises(ValueError, match=match):
            function(0.02, **terms)


def test_lagged_growth_begins_with_what_is_known() -> None:
    curve = Curve([1.0, 5.0], [0.02, 0.03])
    time, lag = np.array([0.0, 0.1, 0.25, 1.25, 5.25]), 0.25
    np.testing.assert_allclose(unknown_years(time, lag=lag), [0.0, 0.0, 0.0, 1.0, 5.0])
    expected = np.array([0.0, 0.005, 0.0125, 0.0125 + 0.02, 0.0125 + 0.15])
    np.testing.assert_allclose(log_growth(time, curve=curve, recent_rate=0.05, lag=lag), expected, atol=1e-16)


def test_growth_stays_finite() -> None:
    assert np.isfinite(growth_factors(np.array([-1e300, 1e9, 1e300]))).all()


def test_floored_growth() -> None:
    """Between the greater of the two and their sum; at no deviation the greater."""
    growth = np.array([0.5, 0.9, 1.0, 1.1, 3.0])
    np.testing.assert_array_equal(floored_growth(growth, log_sd=0.0, least=1.0), np.maximum(growth, 1.0))
    for deviation in (0.01, 0.3, 5.0, 1e3):
        floored = floored_growth(growth, log_sd=deviation, least=1.0)
        assert (floored >= np.maximum(growth, 1.0)).all()
        assert (floored <= growth + 1.0).all()
        step = 1e-6
        up, down = (floored_growth(growth + way, log_sd=deviation, least=1.0) for way in (step, -step))
        slope = floored_growth_slope(growth, log_sd=deviation, least=1.0)
        np.testing.assert_allclose(slope, (up - down) / (2.0 * step), atol=1e-6)
    np.testing.assert_array_equal(floored_growth(growth, log_sd=0.2, least=0.0), growth)


def test_collared_growth_year_by_year() -> None:
    log_index = np.log(np.array([1.0, 1.02, 1.02 * 1.10, 1.02 * 1.10 * 0.97]))
    found = collared_growth(log_index, sd=0.0, floor=0.0, cap=0.05)
    np.testing.assert_allclose(np.exp(found.log_factor), [1.0, 1.02, 1.02 * 1.05, 1.02 * 1.05])
    np.testing.assert_allclose(found.log_slope, [1.0, 0.0, 0.0])
    free = collared_growth(log_index, sd=0.02, floor=-np.inf, cap=np.inf)
    np.testing.assert_allclose(free.log_factor, log_index, atol=1e-15)
    np.testing.assert_allclose(free.log_slope, 1.0)


def test_no_year_takes_more_than_everything() -> None:
    found = collared_growth(np.array([0.0, -2.0, -4.0]), sd=5.0, floor=-np.inf, cap=-0.5)
    assert np.isfinite(found.log_factor).all()
    assert (np.exp(found.log_factor) >= 0.0).all()
    nothing = collared_growth(np.array([0.0, 0.02]), sd=0.01, floor=-3.0, cap=-2.0)
    assert np.exp(nothing.log_factor[-1]) == pytest.approx(0.0, abs=1e-200)
    assert nothing.log_slope.tolist() == [0.0]
    assert MOST_YEARS >= 200
