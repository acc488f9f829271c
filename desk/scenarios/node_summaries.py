"""Samples by year, and the lognormal law beside them, as records."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from desk.book.arrays import FloatArray, owned_floats
from desk.scenarios.records import ClosedForm, NodeSummary
from desk.scenarios.replicates import Sample

__all__ = ["lognormal_form", "node_summary"]


def node_summary(year: FloatArray, samples: Sequence[Sample], levels: tuple[float, ...]) -> NodeSummary:
    """One sample a reported year as a record."""
    intervals = np.array([sample.interval for sample in samples])
    return NodeSummary(
        year=owned_floats(year),
        mean=owned_floats([sample.moments.mean for sample in samples]),
        mean_se=owned_floats([sample.moments.mean_se for sample in samples]),
        sd=owned_floats([sample.moments.sd for sample in samples]),
        sd_se=owned_floats([sample.moments.sd_se for sample in samples]),
        levels=levels,
        percentile=owned_floats([sample.percentile for sample in samples]),
        percentile_low=owned_floats(intervals[:, :, 0]),
        percentile_high=owned_floats(intervals[:, :, 1]),
        histograms=tuple(sample.histogram for sample in samples),
        percentile_se=owned_floats([sample.percentile_se for sample in samples]),
        tail_mean=owned_floats([sample.tail_mean for sample in samples]),
        tail_mean_se=owned_floats([sample.tail_mean_se for sample in samples]),
    )


def lognormal_form(mean: FloatArray, variance: FloatArray, levels: tuple[float, ...]) -> ClosedForm:
    """The lognormal law with the mean and the variance of its logarithm, shape (n,) each."""
    from scipy.special import ndtr, ndtri

    level = mean + 0.5 * variance
    share = np.asarray(levels) / 100.0
    normal = np.asarray(ndtri(share), dtype=np.float64)
    deviation = np.sqrt(variance)[:, None]
    # E[R; R <= q] = E[R] Φ(z - s) for the quantile q with normal z: below a percentile, or above it.
    upper = share >= 0.5
    part = ndtr(np.where(upper, deviation - normal, normal - deviation)) / np.where(upper, 1.0 - share, share)
    return ClosedForm(
        log_mean=owned_floats(mean),
        log_variance=owned_floats(variance),
        mean=owned_floats(np.exp(level)),
        sd=owned_floats(np.exp(level) * np.sqrt(np.expm1(variance))),
        percentile=owned_floats(np.exp(mean[:, None] + deviation * normal)),
        tail_mean=owned_floats(np.exp(level)[:, None] * part),
    )
