"""Figures over the paths beside what they should be, in standard errors."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.scenarios.node_checks import FAR, CheckResult, NodeCheck

__all__ = ["Distances", "distances", "judged"]

_ROUNDING = 1e-12
"""A standard error below this part of the figure is what rounding leaves of a certain one."""


@dataclass(frozen=True, eq=False)
class Distances:
    """Figures beside what they should be, each array shape (n,).

    Attributes
    ----------
    value, error, expected : ndarray
    distance : ndarray
        In standard errors; NaN where it cannot be said.
    """

    value: FloatArray
    error: FloatArray
    expected: FloatArray
    distance: FloatArray


def distances(value: FloatArray, error: FloatArray, expected: FloatArray) -> Distances:
    """How far figures are from what they should be.

    Parameters
    ----------
    value, error, expected : ndarray, shape (n,)
    """
    finite = np.isfinite(value) & np.isfinite(error) & np.isfinite(expected)
    size = np.where(finite, np.maximum(np.abs(expected), np.abs(value)), 0.0)
    known = finite & (np.where(finite, error, 0.0) > _ROUNDING * size)
    distance = np.where(known, value - expected, np.nan) / np.where(known, error, 1.0)
    return Distances(value, error, expected, np.asarray(distance))


def judged(check: NodeCheck) -> CheckResult:
    """How a check turned out, the years left out that are certain but for rounding."""
    distance = np.abs(distances(check.mean, check.se, check.expected).distance)
    known = np.isfinite(distance)
    if not known.any():
        return CheckResult(0, 0, float("nan"), float("nan"))
    worst = int(np.argmax(np.where(known, distance, -1.0)))
    return CheckResult(
        nodes=int(known.sum()),
        far=int(np.count_nonzero(distance[known] > FAR)),
        worst=float(distance[worst]),
        worst_year=float(check.year[worst]),
    )
