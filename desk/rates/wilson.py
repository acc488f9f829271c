"""Wilson functions: sums and products of the kernel of Smith-Wilson curves.

``H(t, u) = α min(t, u) - e^{-α max(t, u)} sinh(α min(t, u))``; the Wilson function proper is
``W(t, u) = e^{-ω(t + u)} H(t, u)``. Sources as in `desk.rates.smith_wilson`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.rates.small_products import small_product

__all__ = ["WilsonProducts", "WilsonSums"]

FloatArray = NDArray[np.float64]

_STRETCH = 200.0  # in the exponent: far from the largest float


class WilsonProducts:
    """``Σᵢⱼ q_ki H(u_i, u_j) q_lj`` for every two instruments k and l, as a function of alpha.

    Parameters
    ----------
    time : ndarray, shape (p,)
        The u, rising and positive [years].
    amounts : ndarray, shape (m, p)
        The q.

    Notes
    -----
    ``H(t, u) = α min(t, u) - ½ e^{-α|t - u|} + ½ e^{-α(t + u)}``. The products of the first part are those of
    running sums and do not depend on α but for the factor; those of the second are sums of what has gone
    before, faded; the third is a product of two numbers. So the work grows with p and not with its square.
    """

    def __init__(self, time: FloatArray, amounts: FloatArray) -> None:
        self._time = time
        # dimensions: time, instrument; so that sums over what has gone before run along memory
        self._amounts = np.ascontiguousarray(amounts.T)
        # Most bonds pay on few of the days: products are summed over those.
        own, self._place = np.nonzero(amounts)
        self._paid = amounts[own, self._place][:, None]
        self._first = np.flatnonzero(np.diff(own, prepend=-1))
        self._is_sparse = self._first.size == len(amounts) and 4 * own.size <= amounts.size
        # Room that every alpha uses again: to ask the system for it takes as long as the sums.
        self._taken = np.empty((own.size if self._is_sparse else 0, len(amounts)))
        self._room, self._grown = np.empty_like(self._amounts), np.empty_like(self._amounts)
        still_ahead = np.cumsum(self._amounts[::-1], axis=0)[::-1]
        self._of_lesser = self._product(np.cumsum(still_ahead * np.diff(time, prepend=0.0)[:, None], axis=0))
        self._of_same = self._product(self._amounts)

    def _product(self, by_time: FloatArray) -> FloatArray:
        """Amounts of every instrument times columns by time, shape (p, m) into (m, m)."""
        if self._is_sparse:
            np.take(by_time, self._place, axis=0, out=self._taken)
            np.multiply(self._taken, self._paid, out=self._taken)
            return np.asarray(np.add.reduceat(self._taken, self._first, axis=0))
        return small_product(self._amounts.T, by_time)

    def at(self, alpha: float) -> FloatArray:
        """The products, shape (m, m)."""
        with np.errstate(under="ignore"):
            from_today = np.exp(-alpha * self._time) @ self._amounts
            earlier = self._product(self._faded(alpha))
        of_distance = earlier + earlier.T - self._of_same
        return np.asarray(alpha * self._of_lesser + 0.5 * (np.outer(from_today, from_today) - of_distance))

    def _faded(self, alpha: float) -> FloatArray:
        """``Σ_{u_j ≤ u_i} q_j e^{-α(u_i - u_j)}``, dimensions: time, instrument.

        Sums of grown amounts, faded again, over stretches in which nothing can overflow.
        """
        grown = alpha * self._time
        faded = self._room
        carried = np.zeros(self._amounts.shape[1])
        start = 0
        while start < grown.size:
            before = grown[start - 1] if start else grown[start]
            end = max(start + 1, int(np.searchsorted(grown, before + _STRETCH)))
            exponent = (grown[start:end] - before)[:, None]
            part = self._grown[start:end]
            np.multiply(self._amounts[start:end], np.exp(np.minimum(exponent, _STRETCH)), out=part)
            part[0] += carried * np.exp(-np.maximum(exponent[0] - _STRETCH, 0.0))
            np.cumsum(part, axis=0, out=faded[start:end])
            faded[start:end] *= np.exp(-np.minimum(exponent, _STRETCH))
            carried = faded[end - 1].copy()
            start = end
        return faded


@dataclass(frozen=True, eq=False)
class WilsonSums:
    """``Σ c_j H(t, u_j)`` as a function of t, in time that does not grow with the number of terms.

    Between two neighbouring u the sum is ``A + α t B - S e^{-α(t - u_k)} - R e^{-α(u_{k+1} - t)} (1 -
    e^{-2αt})/2``: sums over the u already passed and over those ahead, each carried on from its neighbour, so
    that no exponential grows.

    Attributes
    ----------
    alpha : float
    time : ndarray, shape (p,)
        The u, rising [years].
    passed, passed_sinh : ndarray, shape (p + 1,)
        A and S with the first k of them passed.
    ahead, ahead_exp : ndarray, shape (p + 1,)
        B and R likewise.
    """

    alpha: float
    time: FloatArray
    passed: FloatArray
    passed_sinh: FloatArray
    ahead: FloatArray
    ahead_exp: FloatArray

    @classmethod
    def build(cls, time: FloatArray, weight: FloatArray, alpha: float) -> WilsonSums:
        """From the u, rising and positive, and their weights c, each shape (p,)."""
        with np.errstate(under="ignore"):
            decay = np.exp(-alpha * np.diff(time, prepend=time[0]))
            half = -0.5 * np.expm1(-2.0 * alpha * time)  # e^{-αu} sinh(αu)
        count = time.size
        sinh, ahead = np.zeros(count + 1), np.zeros(count + 1)
        for k in range(count):
            sinh[k + 1] = sinh[k] * decay[k] + weight[k] * half[k]
        for k in range(count - 1, -1, -1):
            ahead[k] = weight[k] + (ahead[k + 1] * decay[k + 1] if k + 1 < count else 0.0)
        passed = np.concatenate(([0.0], np.cumsum(alpha * weight * time)))
        left = np.concatenate((np.cumsum(weight[::-1])[::-1], [0.0]))
        return cls(alpha, time, passed, sinh, left, ahead)

    @property
    def limit(self) -> float:
        """The sum as t goes to infinity."""
        return float(self.passed[-1])

    def _at(self, time: FloatArray) -> tuple[NDArray[np.intp], FloatArray, FloatArray, FloatArray]:
        """The number of u passed, and the exponentials of the piece."""
        place = np.searchsorted(self.time, time, side="right")
        before = self.time[np.maximum(place - 1, 0)]
        after = self.time[np.minimum(place, self.time.size - 1)]
        since = np.exp(-self.alpha * np.maximum(time - before, 0.0))
        until = np.exp(-self.alpha * np.maximum(after - time, 0.0))
        return place, since * self.passed_sinh[place], until * self.ahead_exp[place], -2.0 * self.alpha * time

    def value(self, time: FloatArray) -> FloatArray:
        """The sum, the shape of `time`."""
        with np.errstate(under="ignore"):
            place, behind, ahead, twice = self._at(time)
            total = self.passed[place] + self.alpha * time * self.ahead[place]
            return np.asarray(total - behind + 0.5 * ahead * np.expm1(twice))

    def slope(self, time: FloatArray) -> FloatArray:
        """Its derivative, the shape of `time`."""
        with np.errstate(under="ignore"):
            place, behind, ahead, twice = self._at(time)
            return np.asarray(self.alpha * (self.ahead[place] + behind - 0.5 * ahead * (1.0 + np.exp(twice))))
