"""Samples of one run summed up, with errors that are right whether or not the paths are independent.

Paths of a variance-reduced run depend on each other within a replicate, and the replicates are independent.
Every figure is that of all paths together; its error comes from how far the same figure of each replicate is
from it, and its interval from Student's law with one degree of freedom less than there are replicates.
Asmussen, S. and Glynn, P.W. (2007), Stochastic Simulation, section III.5 (sectioning); Nakayama, M.K. (2014),
Confidence intervals for quantiles using sectioning when applying variance-reduction techniques, ACM
Transactions on Modeling and Computer Simulation 24(4).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.scenarios.records import Histogram
from desk.scenarios.summaries import (
    Moments,
    histogram,
    moments,
    quantile_error,
    quantile_interval,
    rank_interval,
    sorted_quantile,
    tail_mean,
    tail_mean_error,
)

__all__ = ["Sample", "Summing", "replicate_error", "student_reach"]


@dataclass(frozen=True)
class Sample:
    """One quantity summed up over the paths.

    Attributes
    ----------
    moments : Moments
    percentile, percentile_se : ndarray, shape (m,)
    interval : tuple of (float, float), length m
        The 95 % interval of each percentile.
    tail_mean, tail_mean_se : ndarray, shape (m,)
        Of the values at and beyond each percentile: see `desk.scenarios.summaries.tail_mean`.
    histogram : Histogram
    below_zero, below_zero_se : float
        Share of the paths.
    """

    moments: Moments
    percentile: FloatArray
    percentile_se: FloatArray
    interval: tuple[tuple[float, float], ...]
    tail_mean: FloatArray
    tail_mean_se: FloatArray
    histogram: Histogram
    below_zero: float
    below_zero_se: float


def student_reach(replicates: int) -> float:
    """Standard errors that a 95 % interval reaches to either side of a mean of `replicates` results."""
    from scipy.special import stdtrit

    return float(stdtrit(replicates - 1, 0.975))


def replicate_error(results: FloatArray, whole: FloatArray | float) -> FloatArray:
    """Standard error of a figure of all paths from the same figure of each replicate.

    Parameters
    ----------
    results : ndarray, shape (r, ...)
        Of each of r replicates.
    whole : ndarray, shape (...)
        Of all paths together.
    """
    count = len(results)
    return np.asarray(np.sqrt(np.sum((results - whole) ** 2, axis=0) / (count * (count - 1.0))))


class Summing:
    """How the samples of a run are summed up.

    Parameters
    ----------
    levels : sequence of float, length m
        Percentiles.
    paths : int
    replicates : int
        1 where the paths are independent of each other; otherwise the paths of each replicate stand side by
        side, and all have as many.
    """

    def __init__(self, levels: Sequence[float], paths: int, replicates: int = 1) -> None:
        if replicates > 1 and paths % replicates:
            raise ValueError("every replicate must have as many paths")
        self.levels = tuple(levels)
        self.paths = paths
        self.replicates = replicates
        self._shares = np.asarray(self.levels) / 100.0
        self._ranks = [rank_interval(paths, share) for share in self._shares] if replicates == 1 else []
        self._reach = student_reach(replicates) if replicates > 1 else math.nan

    def moments(self, row: FloatArray) -> Moments:
        """Mean and standard deviation of a sample, shape (paths,), in the order of the paths."""
        whole = moments(row)
        if self.replicates == 1:
            return whole
        apart = row.reshape(self.replicates, -1)
        deviation = apart.std(axis=1, ddof=1)
        return Moments(
            whole.mean,
            float(replicate_error(apart.mean(axis=1), whole.mean)),
            whole.sd,
            float(replicate_error(deviation, whole.sd)),
        )

    def sample(self, row: FloatArray) -> Sample:
        """Sum up a sample, shape (paths,), in the order of the paths; `row` is left sorted."""
        found = self.moments(row)
        apart = None
        if self.replicates > 1:
            apart = row.reshape(self.replicates, -1)
            apart.sort(axis=1)
            apart_percentile = sorted_quantile(apart, self._shares)
            apart_tail = np.stack([tail_mean(apart, share) for share in self._shares], axis=1)
            apart_below = np.count_nonzero(apart < 0.0, axis=1) / apart.shape[1]
        row.sort()
        percentile = sorted_quantile(row, self._shares)
        tail = np.array([float(tail_mean(row, share)) for share in self._shares])
        below = float(np.searchsorted(row, 0.0, side="left")) / row.size
        if apart is None:
            error = quantile_error(row, self._shares)
            interval = tuple(quantile_interval(row, pair) for pair in self._ranks)
            tail_error = np.array([tail_mean_error(row, share) for share in self._shares])
            below_error = math.sqrt(below * (1.0 - below) / row.size) if row.size > 1 else math.nan
        else:
            error = replicate_error(apart_percentile, percentile)
            reach = self._reach * error
            interval = tuple(zip((percentile - reach).tolist(), (percentile + reach).tolist(), strict=True))
            tail_error = replicate_error(apart_tail, tail)
            below_error = float(replicate_error(apart_below, below))
        return Sample(
            moments=found,
            percentile=percentile,
            percentile_se=error,
            interval=interval,
            tail_mean=tail,
            tail_mean_se=tail_error,
            histogram=histogram(row),
            below_zero=below,
            below_zero_se=below_error,
        )

    def account(self, row: FloatArray) -> tuple[Sample, Moments]:
        """Sum up ``R_t`` and ``1/R_t`` from ``ln R_t``, shape (paths,); `row` is overwritten."""
        discount = self.moments(np.exp(-row))
        np.exp(row, out=row)
        return self.sample(row), discount

    def certain(self, value: float) -> Sample:
        """The sample of a quantity that is known."""
        count = len(self.levels)
        return Sample(
            moments=Moments(value, 0.0, 0.0, 0.0),
            percentile=np.full(count, value),
            percentile_se=np.zeros(count),
            interval=((value, value),) * count,
            tail_mean=np.full(count, value),
            tail_mean_se=np.zeros(count),
            histogram=histogram(np.full(self.paths, value)),
            below_zero=float(value < 0.0),
            below_zero_se=0.0,
        )
