"""Quantiles and order statistics against published values."""

from __future__ import annotations

import numpy as np
import pytest

from desk.scenarios.summaries import rank_confidence, rank_interval, sorted_quantile


def test_the_continuous_rules_of_hyndman_and_fan() -> None:
    """Hyndman, R.J. and Fan, Y. (1996), Sample quantiles in statistical packages, American Statistician 50;
    the numbers are those of the numpy test suite."""
    sample = np.array([15.0, 20.0, 35.0, 40.0, 50.0])
    found = [float(sorted_quantile(sample, 0.4, rule=rule)) for rule in range(4, 10)]
    assert found == pytest.approx([20.0, 27.5, 26.0, 29.0, 27.0, 27.125], abs=1e-12)


def test_ninetieth_percentile_by_the_rule_of_the_handbook() -> None:
    """NIST/SEMATECH e-Handbook of Statistical Methods, section 7.2.6.2: the (n + 1)p rule gives 95.1981."""
    sample = np.sort(
        [
            *(95.1772, 95.1567, 95.1937, 95.1959, 95.1442, 95.0610),
            *(95.1591, 95.1195, 95.1065, 95.0925, 95.1990, 95.1682),
        ]
    )
    assert float(sorted_quantile(sample, 0.9, rule=6)) == pytest.approx(95.1981, abs=5e-5)


def test_reported_rule_is_numpys_linear() -> None:
    """Rule 7 of Hyndman and Fan is what numpy calls linear (numpy.quantile, reference)."""
    sample = np.sort(np.random.default_rng(1).standard_normal(1001))
    shares = np.linspace(0.0, 1.0, 37)
    assert sorted_quantile(sample, shares) == pytest.approx(np.quantile(sample, shares), rel=1e-13)


@pytest.mark.parametrize(
    ("content", "confidence", "order", "size"),
    [
        (0.95, 0.95, 1, 59),
        (0.95, 0.95, 2, 93),
        (0.95, 0.95, 3, 124),
        (0.99, 0.95, 1, 299),
        (0.99, 0.99, 1, 459),
    ],
)
def test_smallest_samples_for_a_bound(content: float, confidence: float, order: int, size: int) -> None:
    """Wilks, S.S. (1941), Determination of sample sizes for setting tolerance limits, Annals of Mathematical
    Statistics 12; sizes from memory, as used in safety analysis."""
    assert rank_confidence(size, content, 0, size + 1 - order) >= confidence
    assert rank_confidence(size - 1, content, 0, size - order) < confidence


def test_interval_of_the_median_of_a_hundred() -> None:
    """Hahn, G.J. and Meeker, W.Q. (1991), Statistical Intervals: ranks 40 and 61 hold the median with the
    binomial chance 0.9648 (computed)."""
    assert rank_confidence(100, 0.5, 40, 61) == pytest.approx(0.9648, abs=5e-5)
    assert rank_interval(100, 0.5) == (40, 61)
