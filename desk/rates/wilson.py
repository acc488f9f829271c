"""Wilson functions: sums and products of the kernel of Smith-Wilson curves.

``H(t, u) = α min(t, u) - e^{-α max(t, u)} sinh(α min(t, u))``; the Wilson function proper is
``W(t, u) = e^{-ω(t + u)} H(t, u)``. Sources as in `desk.rates.smith_wilson`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["WilsonProducts", "WilsonSums"]

FloatArray = NDArray[np.float64]


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
    running sums and do not depend on α but for the factor; those of the second are carried on from one time
    to the next; the third is a product of two numbers. So the work grows with p and not with its square.
    """

    def __init__(self, time: FloatArray, amounts: FloatArray) -> None:
        self._time, self._amounts = time, amounts
        self._width = np.diff(time, prepend=0.0)
        still_ahead = np.cumsum(amounts[:, ::-1], axis=1)[:, ::-1]
        self._of_lesser = (still_ahead * self._width) @ still_ahead.T
        self._of_same = amounts @ amounts.T

    def at(self, alpha: float) -> FloatArray:
        """The products, shape (m, m)."""
        with np.errstate(under="ignore"):
            decay = np.exp(-alpha * self._width)
            from_today = self._amounts @ np.exp(-alpha * self._time)
            faded = np.empty_like(self._amounts.T)
            running = np.zeros(len(self._amounts))
            for k, amount in enumerate(self._amounts.T):
                running = running * decay[k] + amount
                faded[k] = running
            earlier = self._amounts @ faded
        of_distance = earlier + earlier.T - self._of_same
        return np.asarray(alpha * self._of_lesser + 0.5 * (np.outer(from_today, from_today) - of_distance))


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
