"""Samples summed up."""

from __future__ import annotations

import math

import numpy as np
import pytest

from desk.scenarios.summaries import (
    histogram,
    moments,
    quantile_interval,
    rank_confidence,
    rank_interval,
    sorted_quantile,
)


def test_moments_against_plain_sums() -> None:
    values = [1.0, 4.0, 4.5, 9.0, -2.0]
    mean = sum(values) / 5
    second = sum((value - mean) ** 2 for value in values) / 5
    fourth = sum((value - mean) ** 4 for value in values) / 5
    found = moments(np.array(values))
    assert found.mean == pytest.approx(mean)
    assert found.sd == pytest.approx(math.sqrt(second * 5 / 4))
    assert found.mean_se == pytest.approx(math.sqrt(second / 4))
    variance_of_variance = (fourth - second**2 * 2 / 4) / 5
    assert found.sd_se == pytest.approx(math.sqrt(variance_of_variance) / (2 * found.sd))


def test_standard_errors_are_the_spread_over_many_samples() -> None:
    """Two thousand samples of two hundred skewed numbers: the errors told are the errors made."""
    samples = np.exp(0.5 * np.random.default_rng(2).standard_normal((2000, 200)))
    found = [moments(row) for row in samples]
    assert np.std([one.mean for one in found]) == pytest.approx(
        np.mean([one.mean_se for one in found]), rel=0.08
    )
    assert np.std([one.sd for one in found]) == pytest.approx(np.mean([one.sd_se for one in found]), rel=0.15)


def test_intervals_hold_the_quantile_as_often_as_they_say() -> None:
    ordered = np.sort(np.random.default_rng(3).uniform(size=(2000, 199)), axis=1)
    for share in (0.05, 0.5, 0.9):
        ranks = rank_interval(199, share)
        told = rank_confidence(199, share, *ranks)
        held = np.mean([low <= share <= high for low, high in (quantile_interval(r, ranks) for r in ordered)])
        assert 0.95 <= told < 0.99
        assert abs(held - told) < 4.5 * math.sqrt(told * (1.0 - told) / 2000)


def test_too_few_for_a_bound() -> None:
    ordered = np.arange(10.0)
    low, high = quantile_interval(ordered, rank_interval(10, 0.99))
    assert math.isfinite(low)
    assert math.isnan(high)
    assert all(math.isnan(value) for value in quantile_interval(ordered[:1], rank_interval(1, 0.5)))


def test_a_sample_of_one() -> None:
    found = moments(np.array([3.0]))
    assert found.mean == 3.0
    assert all(math.isnan(value) for value in (found.mean_se, found.sd, found.sd_se))
    assert sorted_quantile(np.array([3.0]), [0.01, 0.5]).tolist() == [3.0, 3.0]
    assert histogram(np.array([3.0])).counts.tolist() == [1]


def test_an_empty_sample_is_refused() -> None:
    with pytest.raises(ValueError, match="empty"):
        moments(np.zeros(0))
    with pytest.raises(ValueError, match="empty"):
        sorted_quantile(np.zeros(0), 0.5)


@pytest.mark.parametrize(
    "values",
    [
        np.random.default_rng(4).standard_normal(10_000),
        np.exp(3.0 * np.random.default_rng(5).standard_normal(10_000)),
        np.zeros(50),
        np.repeat([1.0, 2.0], [99_999, 1]),
        np.array([0.0, 1.0]),
        np.array([1.0, 2.0, np.inf]),
        np.array([np.inf, np.inf]),
        np.full(20, -1e300),
    ],
)
def test_bins_hold_every_value(values: np.ndarray) -> None:
    ordered = np.sort(values)
    bins = histogram(ordered)
    assert bins.counts.sum() == values.size
    assert bins.counts.min() >= 0
    assert np.all(np.diff(bins.edges) > 0.0)
    if np.isfinite(values).all():
        assert bins.edges[0] <= ordered[0]
        assert bins.edges[-1] >= ordered[-1]


def test_bins_of_many_values_are_many() -> None:
    bins = histogram(np.sort(np.random.default_rng(6).standard_normal(100_000)))
    assert 60 <= bins.counts.size <= 100
    direct, _ = np.histogram(np.random.default_rng(6).standard_normal(100_000), bins.edges)
    assert np.abs(direct - bins.counts).max() <= 1
