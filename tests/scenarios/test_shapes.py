"""Densities for pictures, and how far a check is off."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book.arrays import owned_floats, owned_integers
from desk.scenarios.records import ClosedForm, Histogram, Repricing
from desk.scenarios.shapes import account_density, histogram_density, middle_range, repricing_error
from desk.scenarios.summaries import histogram


def a_law(log_mean: float, log_variance: float) -> ClosedForm:
    empty = owned_floats([0.0])
    return ClosedForm(
        owned_floats([log_mean]), owned_floats([log_variance]), empty, empty, *[empty[:, None]] * 2
    )


def test_a_histograms_area_is_one_whatever_its_widths() -> None:
    shape = Histogram(owned_floats([0.0, 1.0, 1.5, 4.0]), owned_integers([2, 5, 3]))
    density = histogram_density(shape)
    assert density == pytest.approx([0.2, 1.0, 0.12])
    assert float((density * np.diff(shape.edges)).sum()) == pytest.approx(1.0)


def test_an_empty_histogram_has_no_area() -> None:
    shape = Histogram(owned_floats([0.0, 1.0]), owned_integers([0]))
    assert histogram_density(shape).tolist() == [0.0]


def test_the_middle_leaves_out_the_wide_bins_of_the_tails() -> None:
    sample = np.sort(np.random.default_rng(3).lognormal(0.0, 0.5, 20_000))
    shape = histogram(sample)
    low, high = middle_range(shape)
    assert low == shape.edges[1] > sample[0]
    assert high == shape.edges[-2] < sample[-1]


def test_a_histogram_of_one_bin_is_its_own_middle() -> None:
    shape = Histogram(owned_floats([1.0, 2.0]), owned_integers([7]))
    assert middle_range(shape) == (1.0, 2.0)


def test_the_accounts_density_has_area_one_and_the_mean_of_the_law() -> None:
    # exp(m + v/2) is the mean of a lognormal law: Johnson, Kotz and Balakrishnan (1994), equation 14.8a.
    mean, variance = 0.6, 0.09
    place = np.linspace(1e-9, 20.0, 200_001)
    density = account_density(a_law(mean, variance), 0, place)
    assert np.trapezoid(density, place) == pytest.approx(1.0, abs=1e-6)
    assert np.trapezoid(place * density, place) == pytest.approx(np.exp(mean + variance / 2), rel=1e-6)


def test_the_density_is_that_of_the_statistics_library() -> None:
    from scipy.stats import lognorm

    place = np.array([0.5, 1.0, 1.7, 3.0])
    expected = lognorm.pdf(place, s=0.3, scale=np.exp(0.6))
    assert account_density(a_law(0.6, 0.09), 0, place) == pytest.approx(expected, rel=1e-12)


def test_nothing_lies_at_or_below_zero() -> None:
    assert account_density(a_law(0.6, 0.09), 0, [-1.0, 0.0]).tolist() == [0.0, 0.0]


def test_what_is_certain_has_no_density() -> None:
    assert np.isnan(account_density(a_law(0.0, 0.0), 0, [1.0, 2.0])).all()


def test_repricing_is_off_by_the_difference_over_its_error() -> None:
    found = repricing_error(
        Repricing(
            year=owned_floats([0.0, 1.0, 2.0]),
            mean_discount=owned_floats([1.0, 0.98, 0.95]),
            mean_discount_se=owned_floats([0.0, 0.002, 0.004]),
            curve_discount=owned_floats([1.0, 0.97, 0.96]),
            expected_discount=owned_floats([1.0, 0.97, np.nan]),
        )
    )
    assert found.difference == pytest.approx([0.0, 0.01, np.nan], nan_ok=True)
    assert found.in_standard_errors == pytest.approx([np.nan, 5.0, np.nan], nan_ok=True)
