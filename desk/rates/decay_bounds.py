"""How far a fitted curve may run before the first bond and beyond the last, where no bond holds it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.quoted_flows import QuotedFlows

__all__ = ["SearchBounds"]

FloatArray = NDArray[np.float64]

_SHORTEST_DECAY = 0.05  # years, however short the bonds
_GRID = 80  # decays of a landscape
_LARGEST_RATE = 10.0  # 1000 % a year: no path of the search goes past it
_LEVEL_BEYOND = 0.1  # how far the forward rate at the far end may be from all the yields [1/year]
_SHORT_BEYOND = 0.05  # how far the rate at time 0 may be from all the yields [1/year]
# How far the zero rates before the first bond are from the one at its term, and the level from the zero rate
# at the last term: of that size unless the bonds say otherwise [1/year].
_USUAL_BEFORE, _USUAL_BEYOND = 0.01, 0.02


@dataclass(frozen=True, eq=False)
class SearchBounds:
    """Where a search may go, and the times about the bonds at which it is watched.

    Attributes
    ----------
    humps : int
    low, high : ndarray, shape (2 + 2 · humps,)
        Of the parameters.
    times : ndarray, shape (w,)
        Before the first bond and beyond the last [years].
    rows : ndarray, shape (w, r)
        Differences of the zero rates at those times, each divided by its usual size.
    """

    humps: int
    low: FloatArray
    high: FloatArray
    times: FloatArray
    rows: FloatArray

    @classmethod
    def of(cls, flows: QuotedFlows, yields: FloatArray, humps: int) -> SearchBounds:
        """Of a search among bonds.

        Parameters
        ----------
        flows : QuotedFlows
        yields : ndarray, shape (m,)
            Continuous [1/year].
        humps : int
            1 for Nelson-Siegel, 2 for Svensson.
        """
        first, last = float(flows.term.min()), float(flows.term.max())
        shortest = max(0.5 * first, _SHORTEST_DECAY)
        longest = max(last, 2.0 * shortest)
        low, high = (np.full(2 + 2 * humps, sign * _LARGEST_RATE) for sign in (-1.0, 1.0))
        for place, beyond in enumerate((_LEVEL_BEYOND, _SHORT_BEYOND)):
            low[place], high[place] = yields.min() - beyond, yields.max() + beyond
        low[2 + humps :], high[2 + humps :] = np.log(shortest), np.log(longest)
        # Time 0 as nearly as it can be divided by, and a time so late that only the level is left.
        times = np.array([1e-9, first / 3.0, 2.0 * first / 3.0, first, last, 1e6 * last])
        rows = np.zeros((times.size, 4))
        rows[:3, :3], rows[3, :3] = np.eye(3) / _USUAL_BEFORE, -1.0 / _USUAL_BEFORE
        rows[4:, 3] = -1.0 / _USUAL_BEYOND, 1.0 / _USUAL_BEYOND
        return cls(humps, low, high, times, rows)

    @property
    def decays(self) -> FloatArray:
        """A grid of them [years], shape (g,)."""
        return np.geomspace(np.exp(self.low[-1]), np.exp(self.high[-1]), _GRID)
