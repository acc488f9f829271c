"""Expected inflation as a Gaussian factor, and the law of a price index beside Gaussian rates.

The index grows by ``dI/I = y(t) dt`` with ``y(t) = φ(t) + x(t)``, ``dx = -a x dt + σ dW`` and ``x(0) = 0``.
Under the pricing measure a unit linked to the index and paid at T is worth ``E[e^{-∫r} I(T)/I(0)]``, and φ is
such that this is ``P(0,T) e^{i(T) T}`` with i the curve of expected inflation: with ``X = ∫₀ᵀ Σxᵢ`` of the
rates and ``Y = ∫₀ᵀ x`` both normal,

``∫₀ᵀ φ = i(T) T - ½ Var Y + Cov(X, Y)``.

The rate less the inflation is then a Gaussian short rate in real terms.

References
----------
Jarrow, R. and Yildirim, Y. (2003), Pricing treasury inflation protected securities and related derivatives
using an HJM model, Journal of Financial and Quantitative Analysis 38: nominal and real rates Gaussian, here
with an index that has no volatility of its own. Brigo, D. and Mercurio, F. (2006), Interest Rate Models:
Theory and Practice, part on inflation, chapter on the model of Jarrow and Yildirim. Both named from memory;
the formulas here are derived from the normal law above and checked by simulation and quadrature.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.gaussian import RateFactor
from desk.rates.limits import first_integral, mixed_integral, product_integral, second_integral

__all__ = ["IndexLaw", "InflationFactor"]

FloatArray = NDArray[np.float64]

_REACH = 9.0


@dataclass(frozen=True, eq=False)
class InflationFactor:
    """How expected inflation moves.

    Attributes
    ----------
    curve : DiscountCurve
        Today's: the index expected at t, over today's, is ``1/curve.discount(t)``, so that its continuous
        zero rate at t is the inflation expected until t.
    mean_reversion : float
        a [1/year], at least 0.
    volatility : float
        σ [1/year per root year], at least 0.
    risk_price : float
        λ: the drift gains σλ under the real-world measure [1/root year].
    """

    curve: DiscountCurve
    mean_reversion: float
    volatility: float
    risk_price: float = 0.0

    def __post_init__(self) -> None:
        """Check the parameters, which are those of a rate factor."""
        RateFactor(self.mean_reversion, self.volatility, self.risk_price)


class IndexLaw:
    """The index of an inflation factor, given the rates' factors it moves with.

    Parameters
    ----------
    inflation : InflationFactor
    links : sequence of (float, float)
        For each rate factor ``ρᵢ σᵢ σ`` and its speed of reversion aᵢ: nothing where the two are independent.
    """

    def __init__(self, inflation: InflationFactor, links: tuple[tuple[float, float], ...] = ()) -> None:
        self.inflation = inflation
        self._speed = inflation.mean_reversion
        self._variance = inflation.volatility**2
        self._links = tuple((weight, speed) for weight, speed in links if weight != 0.0)

    def variance(self, time: ArrayLike) -> FloatArray:
        """Variance of ``ln I(t)`` under either measure."""
        return np.asarray(self._variance * product_integral(self._speed, self._speed, time))

    def covariance(self, time: ArrayLike, lag: ArrayLike = 0.0) -> FloatArray:
        """Covariance of ``∫ Σxᵢ`` over a time and `lag` years more with ``∫ x`` over that time.

        ``Σ ρᵢσᵢσ ∫₀ˢ B(aᵢ, u + lag) B(a, u) du``, with ``B(aᵢ, u + lag) = B(aᵢ, lag) + e^{-aᵢ lag} B(aᵢ,
        u)``.
        """
        later = np.asarray(lag, dtype=np.float64)
        total = np.zeros(np.broadcast_shapes(np.shape(time), later.shape))
        for weight, speed in self._links:
            fresh = first_integral(speed, later) * second_integral(self._speed, time)
            total = total + weight * (
                fresh + np.exp(-speed * later) * product_integral(speed, self._speed, time)
            )
        return np.asarray(total)

    def offset(self, time: ArrayLike) -> FloatArray:
        """``∫₀ᵗ φ``: what is added to the integral of the factor to give ``ln I(t)/I(0)``."""
        years = np.asarray(time, dtype=np.float64)
        expected = self.inflation.curve.zero(years) * years
        return np.asarray(expected - 0.5 * self.variance(years) + self.covariance(years))

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """``φ(t)``: what is added to the factor to give the inflation of the moment [1/year]."""
        length = first_integral(self._speed, time)
        offset = self.inflation.curve.forward(time, time) - 0.5 * self._variance * length**2
        for weight, speed in self._links:
            offset = offset + weight * first_integral(speed, time) * length
        return np.asarray(offset)

    def law(self, time: ArrayLike, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Mean and variance of ``ln I(t)/I(0)``, which is normal.

        Under the pricing measure the mean of the index is that of the curve times ``exp Cov(X, Y)``: it is
        paid with money discounted at rates that move with it, and only the two together meet the curve.
        """
        drift = self.inflation.volatility * self.inflation.risk_price if real_world else 0.0
        mean = self.offset(time) + drift * second_integral(self._speed, time)
        return np.asarray(mean), self.variance(time)

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[float, float]:
        """Nine standard deviations either side of the mean of the factor."""
        drift = self.inflation.volatility * self.inflation.risk_price if real_world else 0.0
        mean = drift * float(first_integral(self._speed, time))
        reach = _REACH * math.sqrt(self._variance * float(first_integral(2.0 * self._speed, time)))
        return mean - reach, mean + reach

    def growth_terms(
        self, time: ArrayLike, maturity: ArrayLike, observed: ArrayLike, *, past: bool = False
    ) -> tuple[FloatArray, FloatArray]:
        """What linking does to a bond seen from `time`: a factor ``exp(level - exposure · x)``.

        Parameters
        ----------
        time, maturity, observed : array_like, shapes that broadcast
            When it is valued, when it pays, and the time, between the two, of the index that it pays [years].
        past : bool
            Let times in the wrong order pass; what they give means nothing and must be given no weight.

        Returns
        -------
        level, exposure : ndarray, the broadcast shape
            Of ``I(observed)/I(time)``; the exposure is not positive.

        Raises
        ------
        ValueError
            If the times do not rise in the order time, observed, maturity, and `past` is false.
        """
        start, end, seen = (np.asarray(given, dtype=np.float64) for given in (time, maturity, observed))
        if not past and (np.any(seen < start) or np.any(end < seen)):
            raise ValueError("`observed` must be between `time` and `maturity`")
        remaining, lag = np.maximum(seen - start, 0.0), np.maximum(end - seen, 0.0)
        level = self.offset(seen) - self.offset(start)
        level = level + 0.5 * self.variance(remaining) - self.covariance(remaining, lag)
        shape = level.shape
        return np.asarray(level), np.broadcast_to(-first_integral(self._speed, remaining), shape).copy()

    def increase_law(
        self, time: ArrayLike, start: ArrayLike, end: ArrayLike, maturity: ArrayLike
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """The increase of the index between two later times, paid later still, as seen from `time`.

        ``I(end)/I(start)`` is lognormal. Its mean under the measure of the bond that pays at `maturity` is
        ``exp(level - exposure · x)``, so that times that bond it is what the increase is worth, and with the
        variance of its logarithm it values a floor or a cap on the increase by Black's formula.

        Parameters
        ----------
        time, start, end, maturity : array_like, shapes that broadcast
            Rising [years].

        Returns
        -------
        level, exposure, variance : ndarray, the broadcast shape
            The exposure is to the inflation factor and not positive.

        Raises
        ------
        ValueError
            If the times do not rise.
        """
        now, first, last, paid = np.broadcast_arrays(
            *(np.asarray(given, dtype=np.float64) for given in (time, start, end, maturity))
        )
        if np.any(first < now) or np.any(last < first) or np.any(paid < last):
            raise ValueError("`time`, `start`, `end` and `maturity` must rise")
        ahead, length = first - now, last - first
        # With s to go until `start` the loading of the increase is e^{-a s} B(a, length), from then on B(a,
        # s).
        grown = first_integral(self._speed, length)
        variance = self._variance * grown**2 * first_integral(2.0 * self._speed, ahead) + self.variance(
            length
        )
        covariance = self.covariance(length, paid - last)
        for weight, speed in self._links:
            wait = paid - first
            known = first_integral(speed, wait) * first_integral(self._speed, ahead)
            known = known + np.exp(-speed * wait) * mixed_integral(self._speed, speed, ahead)
            covariance = covariance + weight * grown * known
        level = self.offset(last) - self.offset(first) + 0.5 * variance - covariance
        exposure = -np.exp(-self._speed * ahead) * grown
        return np.asarray(level), np.asarray(exposure), np.asarray(variance)
