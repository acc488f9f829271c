"""Curves given by a few published parameters: Nelson-Siegel and Svensson.

References
----------
Nelson, C.R. and Siegel, A.F. (1987), Parsimonious modeling of yield curves, J. Business 60(4), pp. 473-489.
Svensson, L.E.O. (1994), Estimating and interpreting forward interest rates: Sweden 1992-1994, NBER Working
Paper 4871.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.compounding import Compounding, to_continuous

__all__ = ["NelsonSiegel", "Svensson", "loadings"]

FloatArray = NDArray[np.float64]

# Years: closer times have one instantaneous forward but for the square of their distance.
_CLOSE = 1e-5


def loadings(time: ArrayLike, decay: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """What the slope and the curvature add to the zero rate, per unit.

    Parameters
    ----------
    time, decay : array_like, shapes that broadcast
        t, at least 0, and τ, above 0 [years].

    Returns
    -------
    slope, curvature : ndarray, the broadcast shape
        ``(1 - e^{-x})/x`` and that less ``e^{-x}``, with ``x = t/τ``; 1 and 0 at time 0.
    """
    ratio = np.asarray(time, dtype=np.float64) / np.asarray(decay, dtype=np.float64)
    with np.errstate(under="ignore"):
        still = ratio == 0.0
        slope = np.where(still, 1.0, -np.expm1(-ratio) / np.where(still, 1.0, ratio))
        return slope, np.asarray(slope - np.exp(-ratio))


class _Formula(ABC):
    """What both formulas share: the exponent from the zero rate and its slope."""

    compounding: Compounding

    @abstractmethod
    def _stated(self, time: FloatArray) -> tuple[FloatArray, FloatArray]:
        """``z`` and ``z + t dz/dt`` in the compounding of the parameters [1/year]."""

    def discount(self, time: ArrayLike) -> FloatArray:
        """Discount factors ``P(0, time)``.

        Parameters
        ----------
        time : array_like, any shape
            Years from the valuation date, at least 0.

        Returns
        -------
        ndarray, the shape of `time`

        Raises
        ------
        ValueError
            If a time is negative or not finite, or the parameters give a rate there that leaves nothing of
            the principal.
        """
        times = _times("time", time)
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(np.exp(-self.zero(times) * times))

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year], the limit at time 0; see `discount`."""
        return to_continuous(self._stated(_times("time", time))[0], self.compounding)

    def instantaneous_forward(self, time: ArrayLike) -> FloatArray:
        """Instantaneous forward rates ``-d ln P(0, t)/dt`` [1/year]; see `discount`."""
        rate, forward = self._stated(_times("time", time))
        periods = self.compounding.per_year
        if periods == 0:
            return forward
        # The derivative of t · m ln(1 + z/m).
        return np.asarray(to_continuous(rate, self.compounding) + (forward - rate) / (1.0 + rate / periods))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year].

        Where the two are equal, the instantaneous forward rate. See `discount`.
        """
        first, last = np.broadcast_arrays(_times("start", start), _times("end", end))
        close = np.abs(last - first) < _CLOSE
        gap = np.where(close, 1.0, last - first)
        over = (self.zero(last) * last - self.zero(first) * first) / gap
        return np.asarray(np.where(close, self.instantaneous_forward(0.5 * (first + last)), over))

    def _check(self) -> None:
        for field in fields(self):  # type: ignore[arg-type]  # every formula is a dataclass
            value = getattr(self, field.name)
            if field.name == "compounding":
                continue
            if not math.isfinite(value):
                raise ValueError(f"`{field.name}` must be finite")
            if field.name.endswith("decay") and value <= 0.0:
                raise ValueError(f"`{field.name}` must be above 0 years")


@dataclass(frozen=True)
class NelsonSiegel(_Formula):
    """The curve of Nelson and Siegel (1987).

    Attributes
    ----------
    level, slope, curvature : float
        β₀, β₁ and β₂ [1/year]. The forward rate is ``β₀ + β₁ e^{-x} + β₂ x e^{-x}`` with ``x = t/τ``.
    decay : float
        τ [years], above 0.
    compounding : Compounding
        Of the zero rates that the formula gives; published parameters are most often continuous.
    """

    level: float
    slope: float
    curvature: float
    decay: float
    compounding: Compounding = Compounding.CONTINUOUS

    def __post_init__(self) -> None:
        """Check the parameters."""
        self._check()

    def _stated(self, time: FloatArray) -> tuple[FloatArray, FloatArray]:
        tilt, hump = loadings(time, self.decay)
        decay, fading = _fading(time, self.decay)
        zero = self.level + self.slope * tilt + self.curvature * hump
        return np.asarray(zero), np.asarray(self.level + self.slope * decay + self.curvature * fading)


@dataclass(frozen=True)
class Svensson(_Formula):
    """The curve of Svensson (1994): that of Nelson and Siegel with a second curvature.

    Attributes
    ----------
    level, slope, curvature, second_curvature : float
        β₀ to β₃ [1/year]. The forward rate is ``β₀ + β₁ e^{-x} + β₂ x e^{-x} + β₃ y e^{-y}`` with
        ``x = t/τ₁`` and ``y = t/τ₂``.
    decay, second_decay : float
        τ₁ and τ₂ [years], above 0.
    compounding : Compounding
        Of the zero rates that the formula gives; published parameters are most often continuous.
    """

    level: float
    slope: float
    curvature: float
    second_curvature: float
    decay: float
    second_decay: float
    compounding: Compounding = Compounding.CONTINUOUS

    def __post_init__(self) -> None:
        """Check the parameters."""
        self._check()

    def _stated(self, time: FloatArray) -> tuple[FloatArray, FloatArray]:
        tilt, hump = loadings(time, self.decay)
        _, second_hump = loadings(time, self.second_decay)
        decay, fading = _fading(time, self.decay)
        _, second_fading = _fading(time, self.second_decay)
        zero = self.level + self.slope * tilt + self.curvature * hump + self.second_curvature * second_hump
        forward = self.level + self.slope * decay + self.curvature * fading
        return np.asarray(zero), np.asarray(forward + self.second_curvature * second_fading)


def _fading(time: FloatArray, decay: float) -> tuple[FloatArray, FloatArray]:
    """``e^{-x}`` and ``x e^{-x}`` with ``x = time/decay``."""
    ratio = time / decay
    with np.errstate(under="ignore"):
        left = np.exp(-ratio)
        return left, np.asarray(ratio * left)


def _times(name: str, time: ArrayLike) -> FloatArray:
    times = np.asarray(time, dtype=np.float64)
    # Written so that a NaN fails too.
    if times.size and not (times.min() >= 0.0 and times.max() < np.inf):
        raise ValueError(f"`{name}` must be finite and at least 0")
    return times
