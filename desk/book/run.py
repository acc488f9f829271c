"""The settings of a simulation run."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

__all__ = ["DEFAULT_PERCENTILES", "MOST_PATHS", "Measure", "Run"]

DEFAULT_PERCENTILES = (1.0, 5.0, 25.0, 50.0, 75.0, 95.0, 99.0)

MOST_PATHS = 20_000_000
"""More would not fit into the memory of an office machine."""


class Measure(StrEnum):
    """The probabilities a run draws under."""

    PRICING = "pricing"
    """For values: discounted prices are martingales."""
    REAL_WORLD = "real-world"
    """For forecasts of what may happen: factors earn their price of risk."""


@dataclass(frozen=True)
class Run:
    """Settings of a simulation run.

    Attributes
    ----------
    paths : int
    horizon_years : int
        Length of every path [years].
    steps_per_year : int
    seed : int
    measure : Measure
    percentiles : tuple of float
        Percentiles reported, rising, between 0 and 100.
    """

    paths: int = 10_000
    horizon_years: int = 40
    steps_per_year: int = 12
    seed: int = 1
    measure: Measure = Measure.PRICING
    percentiles: tuple[float, ...] = DEFAULT_PERCENTILES

    def __post_init__(self) -> None:
        """Check each setting."""
        for name in ("paths", "horizon_years", "steps_per_year"):
            if getattr(self, name) < 1:
                raise ValueError(f"`{name}` must be at least 1")
        if self.seed < 0:
            raise ValueError("`seed` must be at least 0")
        levels = self.percentiles
        rising = all(low < high for low, high in pairwise(levels))
        if not levels or not rising or levels[0] <= 0 or levels[-1] >= 100:
            raise ValueError("`percentiles` must rise and lie between 0 and 100")
