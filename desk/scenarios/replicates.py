"""Samples of one run summed up, with errors that are right whether or not the paths are independent.

Paths of a variance-reduced run depend on each other within a replicate, and the replicates are independent.
Every figure is that of all paths together. Each is a mean over the paths, or moves as one does, and the means
of the replicates tell its error:

* a standard deviation as the mean of the squares about the mean does;
* the quantile at p as the share of paths at or under it does: from the error of that share to either side of
  p the quantile is read again. Woodruff, R.S. (1952), Confidence intervals for medians and other position
  measures, J. American Statistical Association 47;
* a tail mean m at the quantile q as ``q + mean (x - q)⁺/p`` does, which q does not move to first order.
  Rockafellar, R.T. and Uryasev, S. (2000), Optimization of conditional value-at-risk, J. Risk 2(3).

Intervals are those of Student's law with one degree of freedom less than there are replicates. Asmussen, S.
and Glynn, P.W. (2007), Stochastic Simulation, section III.5.
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

__all__ = [
    "Sample",
    "Summing",
    "replicate_error",
    "replicate_quantile",
    "replicate_tail_error",
    "student_reach",
]


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


def replicate_error(means: FloatArray) -> FloatArray:
    """Standard error of the mean of replicates.

    Parameters
    ----------
    means : ndarray, shape (r, ...)
        Of each of r replicates.
    """
    return np.asarray(means.std(axis=0, ddof=1) / math.sqrt(len(means)))


def replicate_quantile(
    apart: FloatArray, ordered: FloatArray, share: float
) -> tuple[float, float, float, float]:
    """A quantile of all paths, its standard error and its 95 % interval.

    Parameters
    ----------
    apart : ndarray, shape (r, n)
        The values of each replicate.
    ordered : ndarray, shape (r n,)
        All of them, sorted.
    share : float
        Between 0 and 1.
    """
    value = float(sorted_quantile(ordered, share))
    under = np.count_nonzero(apart <= value, axis=1) / apart.shape[1]
    # Shares that are all alike leave the quantile free between two neighbours.
    error = max(float(replicate_error(under)), 1.0 / ordered.size)
    reach = student_reach(len(apart)) * error
    places = np.clip(share + np.array([-error, error, -reach, reach]), 0.0, 1.0)
    first, last, low, high = sorted_quantile(ordered, places).tolist()
    return value, 0.5 * (last - first), low, high


def replicate_tail_error(apart: FloatArray, value: float, share: float) -> float:
    """Standard error of the mean of the values at and beyond the quantile `value` at `share`."""
    lower = share < 0.5
    beyond = np.minimum(apart - value, 0.0) if lower else np.maximum(apart - value, 0.0)
    return float(replicate_error(beyond.mean(axis=1))) / (share if lower else 1.0 - share)


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

    def moments(self, row: FloatArray) -> Moments:
        """Mean and standard deviation of a sample, shape (paths,), in the order of the paths."""
        whole = moments(row)
        if self.replicates == 1:
            return whole
        apart = row.reshape(self.replicates, -1)
        error = float(replicate_error(apart.mean(axis=1)))
        parts = apart - whole.mean
        reach = max(float(parts.max()), -float(parts.min()))
        if not (math.isfinite(reach) and whole.sd > 0.0):
            return Moments(whole.mean, error, whole.sd, whole.sd_se)
        # In units of the largest part squares of any sample fit a float.
        parts /= reach
        parts *= parts
        spread = reach * float(replicate_error(parts.mean(axis=1)))
        return Moments(whole.mean, error, whole.sd, 0.5 * spread / (whole.sd / reach))

    def sample(self, row: FloatArray) -> Sample:
        """Sum up a sample, shape (paths,), in the order of the paths, in which it is not left."""
        found = self.moments(row)
        apart = row.copy().reshape(self.replicates, -1) if self.replicates > 1 else None
        row.sort()
        percentile = sorted_quantile(row, self._shares)
        tail = np.array([float(tail_mean(row, share)) for share in self._shares])
        below = float(np.searchsorted(row, 0.0, side="left")) / row.size
        if apart is None:
            error = quantile_error(row, self._shares)
            interval = tuple(quantile_interval(row, pair) for pair in self._ranks)
            tail_error = [tail_mean_error(row, share) for share in self._shares]
            below_error = math.sqrt(below * (1.0 - below) / row.size) if row.size > 1 else math.nan
        else:
            quantiles = [replicate_quantile(apart, row, share) for share in self._shares]
            error = np.array([one[1] for one in quantiles])
            interval = tuple((low, high) for _, _, low, high in quantiles)
            tail_error = [
                replicate_tail_error(apart, value, share)
                for value, share in zip(percentile.tolist(), self._shares.tolist(), strict=True)
            ]
            below_error = float(replicate_error(np.count_nonzero(apart < 0.0, axis=1) / apart.shape[1]))
        return Sample(
            moments=found,
            percentile=percentile,
            percentile_se=error,
            interval=interval,
            tail_mean=tail,
            tail_mean_se=np.array(tail_error),
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
