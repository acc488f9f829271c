"""What a run must reproduce at every node, and whether it does."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.scenarios.records import Simulation

__all__ = ["FAR", "CheckResult", "NodeCheck", "check_result", "node_checks"]

FAR = 3.0
"""A mean further off than this many standard errors is told: chance alone gives it once in 370 times."""


@dataclass(frozen=True, eq=False)
class NodeCheck:
    """A mean over the paths beside what it should be, each array shape (n,), by reported year.

    Attributes
    ----------
    key : str
        ``account``, ``index`` or ``asset 0`` and so on.
    title : str
        What is averaged, in words.
    year, mean, se : ndarray
    expected : ndarray
        NaN where no closed form is known.
    """

    key: str
    title: str
    year: FloatArray
    mean: FloatArray
    se: FloatArray
    expected: FloatArray

    @property
    def difference(self) -> FloatArray:
        """Mean less expected."""
        return np.asarray(self.mean - self.expected)

    @property
    def in_standard_errors(self) -> FloatArray:
        """The difference divided by the standard error; NaN where that is 0, as it is today."""
        known = self.se > 0.0
        return np.asarray(np.where(known, self.difference, np.nan) / np.where(known, self.se, 1.0))


@dataclass(frozen=True)
class CheckResult:
    """How a check turned out.

    Attributes
    ----------
    nodes : int
        Those that could be checked.
    far : int
        Those further off than `FAR` standard errors.
    worst, worst_year : float
        The largest distance in standard errors, and where; NaN where nothing could be checked.
    """

    nodes: int
    far: int
    worst: float
    worst_year: float


def node_checks(simulation: Simulation) -> tuple[NodeCheck, ...]:
    """The checks of a run: discount factors, discounted assets and the discounted price index."""
    check = simulation.repricing
    found = [
        NodeCheck(
            "account",
            "Mean of 1/R",
            check.year,
            check.mean_discount,
            check.mean_discount_se,
            check.expected_discount,
        )
    ]
    if simulation.risky is not None:
        found += [
            NodeCheck(
                f"asset {place}",
                f"Mean of {asset.name} over R",
                asset.total_return.year,
                asset.mean_excess,
                asset.mean_excess_se,
                asset.expected_excess,
            )
            for place, asset in enumerate(simulation.risky.assets)
        ]
    if simulation.index is not None:
        index = simulation.index
        found.append(
            NodeCheck(
                "index",
                "Mean of the price index over R",
                index.index.year,
                index.mean_discounted,
                index.mean_discounted_se,
                index.expected_discounted,
            )
        )
    return tuple(found)


def check_result(check: NodeCheck) -> CheckResult:
    """Whether the means are where they should be."""
    distance = np.abs(check.in_standard_errors)
    known = np.isfinite(distance)
    if not known.any():
        return CheckResult(0, 0, float("nan"), float("nan"))
    worst = int(np.nanargmax(np.where(known, distance, -1.0)))
    return CheckResult(
        int(known.sum()),
        int(np.count_nonzero(distance[known] > FAR)),
        float(distance[worst]),
        float(check.year[worst]),
    )
