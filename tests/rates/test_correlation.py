"""Correlation matrices: told from others, mended, split and joined."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from desk.rates.correlation import (
    MendingMethod,
    correlation_problem,
    is_correlation,
    joined_correlation,
    mended_correlation,
    nearest_correlation,
    spectral_correlation,
    split_covariance,
    volatility_matrix,
)


def random_symmetric(rng: np.random.Generator, count: int) -> np.ndarray:
    """Entries between -1 and 1, 1 on the diagonal: with more than a few rows hardly ever a correlation."""
    upper = np.triu(rng.uniform(-1.0, 1.0, (count, count)), 1)
    return np.asarray(upper + upper.T + np.eye(count))


def random_correlation(rng: np.random.Generator, count: int, rank: int | None = None) -> np.ndarray:
    root = rng.standard_normal((count, rank or count))
    root /= np.linalg.norm(root, axis=1)[:, None]
    matrix = root @ root.T
    np.fill_diagonal(matrix, 1.0)
    return np.asarray(0.5 * (matrix + matrix.T))


@pytest.mark.parametrize(
    ("matrix", "problem"),
    [
        ([[1.0, 0.5]], "not a square"),
        (np.zeros((0, 0)), "not a square"),
        ([[1.0, np.nan], [np.nan, 1.0]], "not a number"),
        ([[1.0, 0.5], [0.4, 1.0]], "not symmetric: 0.5 in row 1, column 2, but 0.4 in row 2, column 1"),
        ([[1.0, 0.0], [0.0, 0.9]], "diagonal is not 1: 0.9 in row 2"),
        ([[1.0, 1.2], [1.2, 1.0]], "beyond ±1: 1.2 in row 1, column 2"),
        ([[1.0, 0.9, 0.7], [0.9, 1.0, 0.3], [0.7, 0.3, 1.0]], "negative eigenvalue"),
    ],
)
def test_what_is_wrong_is_named(matrix: object, problem: str) -> None:
    found = correlation_problem(np.array(matrix))
    assert found is not None
    assert problem in found


def test_singular_matrices_are_correlation_matrices() -> None:
    assert is_correlation([[1.0, -1.0], [-1.0, 1.0]])
    assert is_correlation(np.ones((5, 5)))
    assert is_correlation(random_correlation(np.random.default_rng(1), 12, rank=3))


@pytest.mark.parametrize("method", list(MendingMethod))
def test_what_is_one_stays_as_it_is(method: MendingMethod) -> None:
    matrix = random_correlation(np.random.default_rng(2), 6)
    mended = mended_correlation(matrix, method=method)
    np.testing.assert_array_equal(mended.matrix, matrix)
    assert (mended.distance, mended.largest_change, mended.iterations) == (0.0, 0.0, 0)


@given(st.integers(2, 12), st.integers(0, 10_000))
def test_mended_matrices_are_correlation_matrices_and_nearest_is_nearer(count: int, seed: int) -> None:
    matrix = random_symmetric(np.random.default_rng(seed), count)
    nearest, spectral = nearest_correlation(matrix), spectral_correlation(matrix)
    for mended in (nearest, spectral):
        assert is_correlation(mended.matrix)
        assert np.array_equal(mended.matrix, mended.matrix.T)
        assert (np.diag(mended.matrix) == 1.0).all()
        assert mended.distance == pytest.approx(float(np.linalg.norm(mended.matrix - matrix)), abs=1e-14)
        change = np.abs(mended.matrix - matrix)
        assert mended.largest_change == change.max() == change[mended.largest_at]
    assert nearest.distance <= spectral.distance + 1e-9


def test_nothing_nearer_is_found_by_moving_towards_other_correlation_matrices() -> None:
    """The set is convex, so the nearest point is the one with ``<A - X, Z - X> <= 0`` for all Z in it."""
    rng = np.random.default_rng(3)
    for count in (3, 6, 15):
        matrix = random_symmetric(rng, count)
        nearest = nearest_correlation(matrix).matrix
        for _ in range(200):
            other = random_correlation(rng, count, rank=int(rng.integers(1, count + 1)))
            assert float(np.sum((matrix - nearest) * (other - nearest))) <= 1e-9


def test_entries_beyond_one_and_a_wrong_diagonal_are_mended() -> None:
    mended = nearest_correlation([[2.0, 1.5], [1.5, 1.0]])
    np.testing.assert_allclose(mended.matrix, np.ones((2, 2)), atol=1e-11)
    assert mended.largest_at == (0, 0)


def test_failure_to_converge_is_said() -> None:
    matrix = random_symmetric(np.random.default_rng(4), 8)
    with pytest.raises(ValueError, match="was not reached in 3 projections"):
        nearest_correlation(matrix, most_iterations=3)


@pytest.mark.parametrize("mend", [nearest_correlation, spectral_correlation])
def test_what_cannot_be_mended_is_refused(mend: object) -> None:
    assert callable(mend)
    with pytest.raises(ValueError, match="square"):
        mend([[1.0, 0.5]])
    with pytest.raises(ValueError, match="not symmetric"):
        mend([[1.0, 0.5], [0.2, 1.0]])
    with pytest.raises(ValueError, match="not a number"):
        mend([[1.0, np.inf], [np.inf, 1.0]])


def test_a_row_of_which_nothing_is_left() -> None:
    with pytest.raises(ValueError, match="nothing is left of row 1"):
        spectral_correlation([[-1.0, 0.0], [0.0, 1.0]])


@given(st.integers(1, 8), st.integers(1, 8), st.integers(0, 10_000))
def test_volatility_matrices_of_any_rank(count: int, rank: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    volatility = np.exp(rng.uniform(-8.0, 2.0, count))
    covariance = random_correlation(rng, count, rank=min(rank, count)) * np.outer(volatility, volatility)
    sigma = volatility_matrix(covariance)
    assert sigma.shape == (count, min(rank, count))
    assert np.array_equal(sigma, np.tril(sigma))
    scale = np.outer(volatility, volatility)
    np.testing.assert_allclose(sigma @ sigma.T / scale, covariance / scale, atol=1e-13)


def test_volatility_matrix_of_what_does_not_vary() -> None:
    np.testing.assert_array_equal(volatility_matrix(np.zeros((3, 3))), np.zeros((3, 1)))
    sigma = volatility_matrix([[0.04, 0.0], [0.0, 0.0]])
    np.testing.assert_allclose(sigma @ sigma.T, [[0.04, 0.0], [0.0, 0.0]], atol=1e-17)


def test_volatility_matrix_refuses_what_is_no_covariance() -> None:
    with pytest.raises(ValueError, match="negative eigenvalue"):
        volatility_matrix([[1.0, 2.0], [2.0, 1.0]])


def test_volatilities_and_correlations_of_a_covariance() -> None:
    sigma = np.array([[0.2, 0.0], [0.1, 0.1], [0.0, 0.0]])
    volatility, correlation = split_covariance(sigma @ sigma.T)
    np.testing.assert_allclose(volatility, [0.2, np.hypot(0.1, 0.1), 0.0])
    np.testing.assert_allclose(correlation[0, 1], np.sqrt(0.5))
    np.testing.assert_array_equal(correlation[2], [0.0, 0.0, 1.0])
    with pytest.raises(ValueError, match="negative entry"):
        split_covariance([[-1.0, 0.0], [0.0, 1.0]])


@given(st.integers(1, 4), st.integers(0, 5), st.integers(0, 10_000))
def test_joined_groups_are_a_correlation_matrix(count: int, others: int, seed: int) -> None:
    """Their precision matrix has no link but through the leader: what the largest determinant means."""
    rng = np.random.default_rng(seed)
    first, rest = random_correlation(rng, count), random_correlation(rng, 1 + others)
    joined = joined_correlation(first, rest[1:, 1:], rest[0, 1:])
    assert is_correlation(joined, tolerance=1e-11)
    np.testing.assert_array_equal(joined[:count, :count], first)
    np.testing.assert_array_equal(joined[0, count:], rest[0, 1:])
    if np.linalg.eigvalsh(joined)[0] > 1e-3:
        precision = np.linalg.inv(joined)
        np.testing.assert_allclose(precision[1:count, count:], 0.0, atol=1e-8)


def test_joined_groups_of_a_wrong_shape() -> None:
    with pytest.raises(ValueError, match="one row for each"):
        joined_correlation(np.eye(2), np.eye(3), [0.1, 0.2])
    with pytest.raises(ValueError, match="square"):
        joined_correlation([[1.0, 0.0]], np.eye(1), [0.1])
