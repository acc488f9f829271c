"""The settings of a simulation run."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

__all__ = [
    "DEFAULT_PERCENTILES",
    "DEFAULT_REPLICATES",
    "MOST_PATHS",
    "MOST_REPLICATES",
    "Bridge",
    "Measure",
    "Run",
    "Sampling",
]

DEFAULT_PERCENTILES = (1.0, 5.0, 25.0, 50.0, 75.0, 95.0, 99.0)

MOST_PATHS = 20_000_000
"""More would not fit into the memory of an office machine."""

DEFAULT_REPLICATES = 16

MOST_REPLICATES = 1_000


class Measure(StrEnum):
    """The probabilities a run draws under."""

    PRICING = "pricing"
    """For values: discounted prices are martingales."""
    REAL_WORLD = "real-world"
    """For forecasts of what may happen: factors earn their price of risk."""


class Sampling(StrEnum):
    """How the normal numbers of a run are drawn."""

    PLAIN = "plain"
    """Independent of each other."""
    ANTITHETIC = "antithetic"
    """In pairs of a path and its mirror image."""
    SOBOL = "sobol"
    """The most important directions from scrambled Sobol points, what is left of them independently."""


class Bridge(StrEnum):
    """Which directions of a path through time the Sobol points move first."""

    BROWNIAN = "brownian bridge"
    """The end of the path, then its middle, then the middles of the halves."""
    COMPONENTS = "principal components"
    """The principal components of Brownian motion, the greatest first."""


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
    sampling : Sampling
    bridge : Bridge
        Of Sobol points.
    matching : bool
        Whether the normals of every step are moved and stretched to mean 0 and variance 1.
    replicates : int
        Independent repetitions that the paths of a variance-reduced run are shared among, at least 2: the
        spread of their results gives the sampling errors. A plain run has none.
    """

    paths: int = 10_000
    horizon_years: int = 40
    steps_per_year: int = 12
    seed: int = 1
    measure: Measure = Measure.PRICING
    percentiles: tuple[float, ...] = DEFAULT_PERCENTILES
    sampling: Sampling = Sampling.PLAIN
    bridge: Bridge = Bridge.COMPONENTS
    matching: bool = False
    replicates: int = DEFAULT_REPLICATES

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
        if not 2 <= self.replicates <= MOST_REPLICATES:
            raise ValueError(f"`replicates` must be from 2 to {MOST_REPLICATES}")

    @property
    def is_reduced(self) -> bool:
        """Whether the paths are not drawn independently of each other, so as to lessen sampling errors."""
        return self.matching or self.sampling is not Sampling.PLAIN

    @property
    def replicate_paths(self) -> int:
        """Paths of each replicate: an equal share of `paths`, rounded up to an even number.

        All paths of a plain run.
        """
        return self.paths if not self.is_reduced else 2 * -(-self.paths // (2 * self.replicates))

    @property
    def drawn_paths(self) -> int:
        """Paths that are drawn: `paths`, rounded up to what the replicates hold."""
        return self.replicate_paths * self.replicates if self.is_reduced else self.paths
