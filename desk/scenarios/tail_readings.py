"""Shares and means below a value: from the bins of a histogram, and in closed form where a law is known.

A run keeps no samples. At the edge of a bin the share is exact; between edges, and for the means, every bin
counts as evenly filled.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import Enum, auto

import numpy as np
from numpy.typing import ArrayLike

from desk.book import ModelName
from desk.book.arrays import FloatArray
from desk.scenarios.records import ClosedForm, Histogram, Simulation

__all__ = ["Law", "LawKind", "TailReading", "histogram_reading", "law_of_account", "law_of_rate"]

_GAUSSIAN = (ModelName.VASICEK, ModelName.HO_LEE, ModelName.HULL_WHITE, ModelName.GAUSSIAN_2)


@dataclass(frozen=True)
class TailReading:
    """What lies at and below a value.

    Attributes
    ----------
    share : float
        P(X ≤ x), from 0 to 1.
    share_se : float
        Standard error of the share for independent paths; 0 in closed form.
    mean : float
        E[X | X ≤ x]; NaN where nothing lies below.
    """

    share: float
    share_se: float
    mean: float


def histogram_reading(histogram: Histogram, value: float) -> TailReading:
    """Share of a sample at and below a value, and its mean, from its bins."""
    edges, counts = histogram.edges, histogram.counts.astype(np.float64)
    total = float(counts.sum())
    if total <= 0.0 or value < edges[0]:
        return TailReading(0.0, 0.0, math.nan)
    # How much of each bin is below: the same part of its paths is.
    part = np.clip((value - edges[:-1]) / np.diff(edges), 0.0, 1.0)
    weight = counts * part
    below = float(weight.sum())
    if below <= 0.0:
        return TailReading(0.0, 0.0, math.nan)
    middle = edges[:-1] + 0.5 * part * np.diff(edges)
    share = below / total
    return TailReading(
        share, math.sqrt(max(share * (1.0 - share), 0.0) / total), float(np.sum(weight * middle)) / below
    )


class LawKind(Enum):
    """Laws with a closed form."""

    NORMAL = auto()
    LOGNORMAL = auto()


@dataclass(frozen=True)
class Law:
    """A normal or lognormal law.

    Attributes
    ----------
    kind : LawKind
    mean, deviation : float
        Of the value, or of its logarithm; `deviation` is above 0.
    """

    kind: LawKind
    mean: float
    deviation: float

    def density(self, value: ArrayLike) -> FloatArray:
        """Density at values; 0 where the law does not reach."""
        values = np.asarray(value, dtype=np.float64)
        inside = values > 0.0 if self.kind is LawKind.LOGNORMAL else np.ones(values.shape, bool)
        usable = np.where(inside, values, 1.0)
        place = np.log(usable) if self.kind is LawKind.LOGNORMAL else usable
        unit = (place - self.mean) / self.deviation
        density = np.exp(-0.5 * unit**2) / (self.deviation * math.sqrt(2.0 * math.pi))
        if self.kind is LawKind.LOGNORMAL:
            density = density / usable
        return np.asarray(np.where(inside, density, 0.0))

    def reading(self, value: float) -> TailReading:
        """Share and mean below a value.

        Normal: ``m - s φ(d)/Φ(d)``; lognormal: ``e^{m + s²/2} Φ(d - s)/Φ(d)``. Johnson, N.L., Kotz, S. and
        Balakrishnan, N. (1994), Continuous Univariate Distributions 1, chapters 13 and 14.
        """
        from scipy.special import log_ndtr, ndtr

        if self.kind is LawKind.LOGNORMAL and value <= 0.0:
            return TailReading(0.0, 0.0, math.nan)
        place = math.log(value) if self.kind is LawKind.LOGNORMAL else value
        unit = (place - self.mean) / self.deviation
        share = float(ndtr(unit))
        if share <= 0.0:
            return TailReading(0.0, 0.0, math.nan)
        if self.kind is LawKind.NORMAL:
            slope = math.exp(-0.5 * unit**2 - float(log_ndtr(unit))) / math.sqrt(2.0 * math.pi)
            return TailReading(share, 0.0, self.mean - self.deviation * slope)
        # By logarithms: far out both shares vanish, their ratio does not.
        part = float(log_ndtr(unit - self.deviation)) - float(log_ndtr(unit))
        return TailReading(share, 0.0, math.exp(self.mean + 0.5 * self.deviation**2 + part))


def law_of_account(closed: ClosedForm | None, row: int) -> Law | None:
    """The law at one reported year of what has a lognormal closed form; None where it is certain."""
    if closed is None or not closed.log_variance[row] > 0.0:
        return None
    return Law(LawKind.LOGNORMAL, float(closed.log_mean[row]), math.sqrt(float(closed.log_variance[row])))


def law_of_rate(simulation: Simulation, row: int) -> Law | None:
    """The law of the short rate at one reported year, where it is normal or lognormal; None elsewhere."""
    found = simulation.diagnostics
    if found is None:
        return None
    mean, deviation = float(found.rate_mean[row]), float(found.rate_sd[row])
    if not (math.isfinite(mean) and deviation > 0.0):
        return None
    if simulation.model in _GAUSSIAN:
        return Law(LawKind.NORMAL, mean, deviation)
    if simulation.model == ModelName.BLACK_KARASINSKI and mean > 0.0:
        variance = math.log1p((deviation / mean) ** 2)
        return Law(LawKind.LOGNORMAL, math.log(mean) - 0.5 * variance, math.sqrt(variance))
    return None
