"""Correlation matrices: whether one is one, the nearest one where it is not, and roots of covariances.

References
----------
Higham, N.J. (2002), Computing the nearest correlation matrix: a problem from finance, IMA Journal of
Numerical Analysis 22. Rebonato, R. and Jäckel, P. (1999), The most general methodology to create a valid
correlation matrix for risk management and option pricing purposes, Journal of Risk 2. Golub, G.H. and Van
Loan, C.F. (2013), Matrix Computations, section 4.2 (Cholesky). The section numbers are from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "MendedCorrelation",
    "MendingMethod",
    "correlation_problem",
    "is_correlation",
    "joined_correlation",
    "mended_correlation",
    "nearest_correlation",
    "spectral_correlation",
    "split_covariance",
    "volatility_matrix",
]

FloatArray = NDArray[np.float64]

# Negative eigenvalues down to this are rounding.
_ROUNDING = 1e-12


class MendingMethod(StrEnum):
    """How a matrix that is no correlation matrix is made one."""

    NEAREST = "nearest"
    """The correlation matrix at the least Frobenius distance (Higham 2002)."""
    SPECTRAL = "spectral"
    """Negative eigenvalues set to 0, rows scaled back (Rebonato and Jäckel 1999): quick, not nearest."""


@dataclass(frozen=True, eq=False)
class MendedCorrelation:
    """A correlation matrix made from one that was not.

    Attributes
    ----------
    matrix : ndarray, shape (n, n), read-only
        Symmetric, 1 on the diagonal, no eigenvalue below -1e-12.
    distance : float
        Frobenius norm of the change.
    largest_change : float
        Largest change of an entry, without its sign.
    largest_at : tuple of int
        Row and column, from 0, of that entry.
    least_eigenvalue : float
        Of the matrix as it was given.
    method : MendingMethod
    iterations : int
        Projections made; 0 where nothing had to change, 1 for the spectral method.
    """

    matrix: FloatArray
    distance: float
    largest_change: float
    largest_at: tuple[int, int]
    least_eigenvalue: float
    method: MendingMethod
    iterations: int


def correlation_problem(matrix: ArrayLike, *, tolerance: float = _ROUNDING) -> str | None:
    """What keeps a matrix from being a correlation matrix, as one clause; None if nothing does.

    Parameters
    ----------
    matrix : array_like
    tolerance : float
        Taken as rounding: in symmetry, on the diagonal, beyond ±1, and in the least eigenvalue.
    """
    values = np.asarray(matrix, dtype=np.float64)
    if values.ndim != 2 or values.shape[0] != values.shape[1] or values.size == 0:
        return "it is not a square of numbers"
    if not np.isfinite(values).all():
        return "it holds something that is not a number"
    asymmetry = np.abs(values - values.T)
    if asymmetry.max() > tolerance:
        row, column = _place(asymmetry)
        return (
            f"it is not symmetric: {values[row, column]:g} in row {row + 1}, column {column + 1}, "
            f"but {values[column, row]:g} in row {column + 1}, column {row + 1}"
        )
    off_one = np.abs(np.diag(values) - 1.0)
    if off_one.max() > tolerance:
        row = int(np.argmax(off_one))
        return f"its diagonal is not 1: {values[row, row]:g} in row {row + 1}"
    if np.abs(values).max() > 1.0 + tolerance:
        row, column = _place(np.abs(values))
        return f"an entry is beyond ±1: {values[row, column]:g} in row {row + 1}, column {column + 1}"
    least = float(np.linalg.eigvalsh(values)[0])
    if least < -tolerance:
        return f"it has a negative eigenvalue, {least:.6g}: its entries contradict one another"
    return None


def is_correlation(matrix: ArrayLike, *, tolerance: float = _ROUNDING) -> bool:
    """Whether a matrix is a correlation matrix; see `correlation_problem`."""
    return correlation_problem(matrix, tolerance=tolerance) is None


def mended_correlation(
    matrix: ArrayLike, *, method: MendingMethod = MendingMethod.NEAREST
) -> MendedCorrelation:
    """A correlation matrix in place of `matrix`, by the method asked for."""
    if MendingMethod(method) is MendingMethod.NEAREST:
        return nearest_correlation(matrix)
    return spectral_correlation(matrix)


def nearest_correlation(
    matrix: ArrayLike, *, tolerance: float = 1e-12, most_iterations: int = 20_000
) -> MendedCorrelation:
    """The correlation matrix nearest to `matrix` in the Frobenius norm.

    Alternating projections onto the matrices without negative eigenvalues and those with 1 on the diagonal,
    the first with Dykstra's correction: Higham (2002), algorithm 3.3 and the test of convergence 4.1 (numbers
    from memory). They converge at a linear rate. What is left of negative eigenvalues at the end, at most
    about `tolerance`, is taken away by one spectral step.

    Parameters
    ----------
    matrix : array_like, shape (n, n)
        Symmetric; its diagonal is set to 1 and its entries may lie beyond ±1.
    tolerance : float
        Relative change between iterations at which they end.
    most_iterations : int

    Raises
    ------
    ValueError
        If `matrix` is not a symmetric square of numbers, or the projections have not converged after
        `most_iterations`.
    """
    given = _symmetric(matrix)
    if is_correlation(given):
        return _mended(given, given, MendingMethod.NEAREST, 0)
    upper, lower, correction = given, given, np.zeros_like(given)
    for iteration in range(1, most_iterations + 1):
        # Higham's R, X, ΔS and Y.
        start = lower - correction
        projected = _without_negative(start)
        correction = projected - start
        following = projected.copy()
        np.fill_diagonal(following, 1.0)
        size = float(np.linalg.norm(following))
        moves = (projected - upper, following - lower, following - projected)
        upper, lower = projected, following
        if max(float(np.linalg.norm(move)) for move in moves) <= tolerance * size:
            return _mended(given, _scaled_to_one(upper), MendingMethod.NEAREST, iteration)
    raise ValueError(
        f"the nearest correlation matrix was not reached in {most_iterations} projections "
        f"(the last one still moved by {max(float(np.linalg.norm(move)) for move in moves):.2g}); "
        "allow more of them, a larger tolerance, or take the spectral method"
    )


def spectral_correlation(matrix: ArrayLike) -> MendedCorrelation:
    """Negative eigenvalues set to 0, then each row of the root scaled to length 1.

    Rebonato and Jäckel (1999), section 3 (spectral decomposition; section number from memory).

    Parameters
    ----------
    matrix : array_like, shape (n, n)
        Symmetric.

    Raises
    ------
    ValueError
        If `matrix` is not a symmetric square of numbers, or nothing is left of a row.
    """
    given = _symmetric(matrix)
    if is_correlation(given):
        return _mended(given, given, MendingMethod.SPECTRAL, 0)
    return _mended(given, _scaled_to_one(_without_negative(given)), MendingMethod.SPECTRAL, 1)


def volatility_matrix(
    covariance: ArrayLike, *, scale: ArrayLike | None = None, tolerance: float = _ROUNDING
) -> FloatArray:
    """Lower triangular σ with σσᵀ = `covariance`, its diagonal not negative.

    Where the covariance is singular there are fewer Brownian motions than quantities, and σ has as many
    columns as it takes.

    Parameters
    ----------
    covariance : array_like, shape (n, n)
    scale : array_like, shape (n,), optional
        Size against which each quantity is measured when it is decided what is rounding; the roots of the
        diagonal when left out.
    tolerance : float
        Eigenvalues of the scaled covariance down to minus this are taken for 0.

    Returns
    -------
    ndarray, shape (n, k)
        k is at least 1.

    Raises
    ------
    ValueError
        If `covariance` is not symmetric or has a negative eigenvalue.

    Notes
    -----
    A covariance of full rank takes Cholesky's root. Else the root from the eigenvectors is turned into
    triangular form by a QR factorisation, which loses no digits: leaving out small pivots would lose half of
    them.
    """
    values = _symmetric(covariance)
    deviation = np.sqrt(np.maximum(np.diag(values), 0.0)) if scale is None else np.array(scale, np.float64)
    safe = np.where(deviation > 0.0, deviation, 1.0)
    scaled = values / np.outer(safe, safe)
    size, vectors = np.linalg.eigh(scaled)
    if size[0] < -tolerance:
        raise ValueError(f"`covariance` has a negative eigenvalue: {size[0]:.3g} in units of its diagonal")
    used = size > len(values) * 1e-15 * max(1.0, float(size[-1]))
    if used.all():
        root = np.linalg.cholesky(scaled)
    elif not used.any():
        root = np.zeros((len(values), 1))
    else:
        root = np.asarray(np.linalg.qr((vectors[:, used] * np.sqrt(size[used])).T, mode="r")).T
        # What stands above the diagonal is 0; each column takes the sign that makes its first entry positive.
        leading = root[np.argmax(np.abs(root) > 1e-9, axis=0), np.arange(root.shape[1])]
        root = np.tril(root * np.where(leading < 0.0, -1.0, 1.0)) + 0.0
    return np.asarray(safe[:, None] * root)


def split_covariance(covariance: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Volatilities, shape (n,), and correlations, shape (n, n), of a covariance such as σσᵀ.

    What does not vary has volatility 0 and is uncorrelated.
    """
    values = _symmetric(covariance)
    if np.diag(values).min() < 0.0:
        raise ValueError("`covariance` has a negative entry on its diagonal")
    volatility = np.sqrt(np.diag(values))
    product = np.outer(volatility, volatility)
    correlation = np.divide(values, product, out=np.zeros_like(values), where=product > 0.0)
    np.fill_diagonal(correlation, 1.0)
    return volatility, correlation


def joined_correlation(first: ArrayLike, second: ArrayLike, with_leader: ArrayLike) -> FloatArray:
    """One matrix of two groups whose only known link is through the first member of the first group.

    Entry (i, j) between the groups is ``first[i, 0] · with_leader[j]``: given the leader, the other members
    of the first group are uncorrelated with the second. Of all completions this is the one of largest
    determinant (Grone, R., Johnson, C.R., Sá, E.M. and Wolkowicz, H. 1984, Positive definite completions of
    partial Hermitian matrices, Linear Algebra and its Applications 58), and it is a correlation matrix
    whenever `first`, and `second` together with the leader, are.

    Parameters
    ----------
    first : array_like, shape (n, n)
        For example of the rate factors.
    second : array_like, shape (m, m)
        For example of the risky assets.
    with_leader : array_like, shape (m,)
        Correlations of the second group with the first member of the first group.

    Returns
    -------
    ndarray, shape (n + m, n + m)
        Not checked: see `correlation_problem`.
    """
    one, two = np.array(first, dtype=np.float64), np.array(second, dtype=np.float64)
    links = np.array(with_leader, dtype=np.float64)
    if one.ndim != 2 or one.shape[0] != one.shape[1] or one.size == 0:
        raise ValueError("`first` must be a square of numbers")
    if links.ndim != 1 or two.size != links.size**2:
        raise ValueError("`second` must be a square with one row for each entry of `with_leader`")
    cross = np.outer(one[:, 0], links)
    return np.block([[one, cross], [cross.T, two.reshape(links.size, links.size)]])


def _symmetric(matrix: ArrayLike) -> FloatArray:
    values = np.array(matrix, dtype=np.float64)
    if values.ndim != 2 or values.shape[0] != values.shape[1] or values.size == 0:
        raise ValueError("the matrix must be a square of numbers")
    if not np.isfinite(values).all():
        raise ValueError("the matrix holds something that is not a number")
    asymmetry = np.abs(values - values.T)
    if asymmetry.max() > _ROUNDING * max(1.0, float(np.abs(values).max())):
        row, column = _place(asymmetry)
        raise ValueError(
            f"the matrix is not symmetric: row {row + 1}, column {column + 1} "
            f"and row {column + 1}, column {row + 1} differ"
        )
    return np.asarray(0.5 * (values + values.T))


def _without_negative(matrix: FloatArray) -> FloatArray:
    """The nearest matrix without negative eigenvalues."""
    size, vectors = np.linalg.eigh(matrix)
    kept = size > 0.0
    part = vectors[:, kept]
    result = (part * size[kept]) @ part.T
    return np.asarray(0.5 * (result + result.T))


def _scaled_to_one(matrix: FloatArray) -> FloatArray:
    """A matrix without negative eigenvalues, scaled to 1 on the diagonal; symmetric to the last bit."""
    diagonal = np.diag(matrix)
    if diagonal.min() <= 0.0:
        row = int(np.argmin(diagonal))
        raise ValueError(f"nothing is left of row {row + 1} once negative eigenvalues are taken out")
    root = np.sqrt(diagonal)
    scaled = np.clip(matrix / np.outer(root, root), -1.0, 1.0)
    scaled = 0.5 * (scaled + scaled.T)
    np.fill_diagonal(scaled, 1.0)
    return np.asarray(scaled)


def _mended(
    given: FloatArray, matrix: FloatArray, method: MendingMethod, iterations: int
) -> MendedCorrelation:
    result = np.array(matrix)
    result.flags.writeable = False
    change = np.abs(result - given)
    row, column = _place(change)
    return MendedCorrelation(
        matrix=result,
        distance=float(math.sqrt(float(np.sum(change**2)))),
        largest_change=float(change[row, column]),
        largest_at=(min(row, column), max(row, column)),
        least_eigenvalue=float(np.linalg.eigvalsh(given)[0]),
        method=method,
        iterations=iterations,
    )


def _place(values: FloatArray) -> tuple[int, int]:
    """Row and column of the largest entry."""
    row, column = np.unravel_index(int(np.argmax(values)), values.shape)
    return int(row), int(column)
