"""Samples and laws as curves: densities for pictures, and how far a check is off."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray, owned_floats
from desk.scenarios.records import ClosedForm, Histogram, Repricing

__all__ = [
    "RepricingError",
    "account_density",
    "histogram_density",
    "middle_range",
    "repricing_error",
]


def histogram_density(histogram: Histogram) -> FloatArray:
    """Share of the sample in each bin divided by its width, shape (b,): the area under it is 1."""
    total = max(int(histogram.counts.sum()), 1)
    return np.asarray(histogram.counts / total / np.diff(histogram.edges))


def middle_range(histogram: Histogram) -> tuple[float, float]:
    """The range of the bins of equal width: without the wider ones that reach out to the extremes."""
    edges = histogram.edges
    width = np.diff(edges)
    usual = float(np.median(width))
    inner = np.flatnonzero(np.isclose(width, usual, rtol=1e-6, atol=0.0))
    return float(edges[inner[0]]), float(edges[inner[-1] + 1])


def account_density(closed_form: ClosedForm, row: int, value: ArrayLike) -> FloatArray:
    """Density of the savings account at one reported year.

    Parameters
    ----------
    closed_form : ClosedForm
    row : int
        Of the reported year.
    value : array_like, any shape
        Values of ``R_t``.

    Returns
    -------
    ndarray, the shape of `value`
        The lognormal density ``exp(-(ln x - m)²/(2v)) / (x √(2πv))``; 0 at or below 0. NaN where the value
        is certain (v = 0), which has no density.

    References
    ----------
    Johnson, N.L., Kotz, S. and Balakrishnan, N., Continuous Univariate Distributions 1, 1994, chapter 14.
    """
    values = np.asarray(value, dtype=np.float64)
    mean, variance = float(closed_form.log_mean[row]), float(closed_form.log_variance[row])
    if variance <= 0.0:
        return np.full(values.shape, np.nan)
    positive = values > 0.0
    inside = np.where(positive, values, 1.0)
    exponent = -((np.log(inside) - mean) ** 2) / (2.0 * variance)
    density = np.exp(exponent) / (inside * np.sqrt(2.0 * np.pi * variance))
    return np.asarray(np.where(positive, density, 0.0))


@dataclass(frozen=True, eq=False)
class RepricingError:
    """How far the mean of ``1/R_t`` is from what it should be, each shape (n,), by reported year.

    Attributes
    ----------
    difference : ndarray
        Mean over the paths less expected; NaN where no closed form is known.
    in_standard_errors : ndarray
        The same divided by the standard error; NaN where that is 0, as it is today.
    """

    difference: FloatArray
    in_standard_errors: FloatArray


def repricing_error(repricing: Repricing) -> RepricingError:
    """How far a run is from repricing its curve."""
    difference = repricing.mean_discount - repricing.expected_discount
    error = repricing.mean_discount_se
    known = error > 0.0
    in_errors = np.where(known, difference, np.nan) / np.where(known, error, 1.0)
    return RepricingError(owned_floats(difference), owned_floats(in_errors))
