"""Paths of the lognormal short-rate model."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

__all__ = ["BlackKarasinskiWalk"]

FloatArray = NDArray[np.float64]


class BlackKarasinskiWalk:
    """Paths of a lognormal model moved forward together; see `desk.rates.short_rate.Walk`.

    ``ln r`` is drawn from its exact law at every step of the grid, one normal number each; the integral is
    taken by the rule with which the model was fitted, so that the mean of ``1/R`` is the curve's without
    bias. What the rule misses of the variance of ``ln R_t`` is the part h²/(4t²) of it: with 12 steps a year
    2e-3 after one year, 2e-5 after ten.

    Parameters
    ----------
    half : ndarray, shape (k,)
        ``½ h e^α`` of every step of the grid.
    level : ndarray, shape (k + 1,)
        α at every node.
    decay, shift, noise : float
        Over a step ``x → decay·x + shift + noise·z``.
    parts : int
        Steps of the grid in a step of the walk.
    size : int
    rng : Generator

    Attributes
    ----------
    state : ndarray, shape (1, size)
        The short rate [1/year].
    integral : ndarray, shape (size,)
        ``ln R_t``.
    """

    def __init__(
        self,
        half: FloatArray,
        level: FloatArray,
        *,
        decay: float,
        shift: float,
        noise: float,
        parts: int,
        size: int,
        rng: np.random.Generator,
    ) -> None:
        self._half, self._scale = half.tolist(), np.exp(level).tolist()
        self._decay, self._shift, self._noise = decay, shift, noise
        self._parts = parts
        self._rng = rng
        self._done = 0
        self._x = np.zeros(size)
        self._growth = np.ones(size)
        self.state = np.full((1, size), math.exp(float(level[0])))
        self.integral = np.zeros(size)

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` times, yielding after each.

        Raises
        ------
        ValueError
            If the paths would go beyond the model's horizon.
        """
        if self._done + steps * self._parts > len(self._half):
            raise ValueError(
                f"the paths go beyond the model's horizon of {len(self._half)} steps: "
                f"{self._done} are made, {steps * self._parts} more are wanted"
            )
        normal = np.empty_like(self._x)
        for _ in range(steps):
            for half in self._half[self._done : self._done + self._parts]:
                self._rng.standard_normal(out=normal)
                normal *= self._noise
                self._x *= self._decay
                self._x += normal
                if self._shift != 0.0:
                    self._x += self._shift
                np.exp(self._x, out=normal)
                self._growth += normal
                self._growth *= half
                self.integral += self._growth
                self._growth[:] = normal
            self._done += self._parts
            np.multiply(self._growth, self._scale[self._done], out=self.state[0])
            yield
