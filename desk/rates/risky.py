"""Risky assets and inflation beside a rate model, in one exact joint law.

A vector of assets held with dividends reinvested follows ``dS/S = (r + π) dt + σ dB`` with covariance ``σσᵀ
dt``; π, the premium, counts under the real-world measure only. The excess ``ln(S_t/(S_0 R_t))`` is a Brownian
motion with drift whatever the rates do, and with Gaussian rates it is jointly normal with the factors and
their integral: a step of a year is as right as a step of a day, and ``S_t/R_t`` has the mean S₀ under the
pricing measure at every node.

References
----------
Glasserman, P. (2003), Monte Carlo Methods in Financial Engineering, sections 3.2.3 (several assets) and 3.3
(Gaussian rates). Brigo, D. and Mercurio, F. (2006), Interest Rate Models: Theory and Practice, appendix on
equity with stochastic rates (place from memory).
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.correlation import correlation_problem
from desk.rates.curve import DiscountCurve
from desk.rates.gaussian import GaussianRates
from desk.rates.limits import first_integral, mixed_integral, product_integral, second_integral
from desk.rates.risky_inflation import IndexLaw, InflationFactor
from desk.rates.risky_walk import (
    Companions,
    DrawnRates,
    GaussianMarketWalk,
    IndependentMarketWalk,
    companions,
)

__all__ = ["RiskyMarket", "total_return_index"]

FloatArray = NDArray[np.float64]


class RiskyMarket:
    """A rate model with risky assets, inflation, or both beside it.

    Parameters
    ----------
    rates : DrawnRates
        `GaussianRates` may be correlated with what stands beside it. Every other model must not be: its joint
        law over a step is not known in closed form.
    volatility : array_like, shape (m,)
        Of each asset [1/root year], at least 0; empty for inflation alone.
    premium : array_like, shape (m,), optional
        π, the excess return under the real-world measure [1/year]; 0 when left out.
    inflation : InflationFactor, optional
    correlation : array_like, optional
        Of all Brownian motions, in the order rate factors, inflation (where there is one), assets; the rates'
        own block must be that of the model. Everything is independent of everything, but the rates among
        themselves, when left out. See `desk.rates.correlation.joined_correlation`.

    Raises
    ------
    ValueError
        If a volatility is negative, a shape is wrong, `correlation` is no correlation matrix or contradicts
        the rates, or rates that are not Gaussian are to be correlated with something.
    """

    def __init__(
        self,
        rates: DrawnRates,
        *,
        volatility: ArrayLike = (),
        premium: ArrayLike | None = None,
        inflation: InflationFactor | None = None,
        correlation: ArrayLike | None = None,
    ) -> None:
        self.rates = rates
        self.inflation = inflation
        self.volatility = _per_asset("volatility", volatility)
        if self.volatility.size and self.volatility.min() < 0.0:
            raise ValueError("`volatility` must be at least 0")
        count = self.volatility.size
        self.premium = np.zeros(count) if premium is None else _per_asset("premium", premium)
        if self.premium.size != count:
            raise ValueError(f"`premium` must hold one number for each of the {count} assets")
        self.correlation = self._checked(correlation)
        self.index: IndexLaw | None = None
        if inflation is not None:
            row = self.correlation[rates.factor_count]
            self.index = IndexLaw(
                inflation,
                tuple(
                    (float(row[place]) * deviation * inflation.volatility, speed)
                    for place, (speed, deviation) in enumerate(self._factors())
                ),
            )

    def _checked(self, correlation: ArrayLike | None) -> FloatArray:
        """The whole correlation matrix, read-only."""
        leading = self.rates.factor_count
        count = leading + (self.inflation is not None) + self.asset_count
        own = self.rates.correlation if isinstance(self.rates, GaussianRates) else np.eye(leading)
        if correlation is None:
            matrix = np.eye(count)
            matrix[:leading, :leading] = own
        else:
            matrix = np.array(correlation, dtype=np.float64)
            if matrix.shape != (count, count):
                raise ValueError(
                    f"`correlation` must be {count} by {count}: {leading} rate factor(s), "
                    f"{int(self.inflation is not None)} inflation factor(s), {self.asset_count} asset(s)"
                )
            problem = correlation_problem(matrix)
            if problem is not None:
                raise ValueError(f"`correlation` must be a correlation matrix, but {problem}")
            if np.abs(matrix[:leading, :leading] - own).max() > 1e-12:
                raise ValueError(
                    "`correlation` must repeat the rate model's own correlations in its first rows"
                )
            if not isinstance(self.rates, GaussianRates) and matrix[:leading, leading:].any():
                raise ValueError(
                    "`correlation` with the rates must be 0 for this rate model: only Gaussian rates have a "
                    "joint law with assets or inflation that can be drawn exactly"
                )
        matrix.flags.writeable = False
        return matrix

    @property
    def asset_count(self) -> int:
        """Number m of assets."""
        return int(self.volatility.size)

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve of the rates."""
        return self.rates.curve

    @property
    def covariance(self) -> FloatArray:
        """σσᵀ of the assets a year, shape (m, m)."""
        first = len(self.correlation) - self.asset_count
        return np.asarray(self.correlation[first:, first:] * np.outer(self.volatility, self.volatility))

    def _factors(self) -> list[tuple[float, float]]:
        """Speed and volatility of every Gaussian rate factor."""
        if not isinstance(self.rates, GaussianRates):
            return []
        return [(factor.mean_reversion, factor.volatility) for factor in self.rates.factors]

    def step_law(self, step: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Shift and covariance over a step, for Gaussian rates of everything that is drawn.

        The order is rate factors, ``∫Σxᵢ``, the inflation factor and its integral (where there is one), then
        ``ln(S/(S₀R))`` of every asset. See `desk.rates.gaussian.GaussianRates.step_law` for what a step does
        to factors and integrals themselves.

        Returns
        -------
        shift : ndarray, shape (n + 1 + 2 + m,)
        covariance : ndarray, that shape squared
            For other rates their rows are 0: they are drawn by themselves.
        """
        leading = self.rates.factor_count
        first = leading + 1
        shift, covariance = self._beside(step, real_world=real_world)
        count = first + shift.size
        whole_shift, whole = np.zeros(count), np.zeros((count, count))
        whole_shift[first:], whole[first:, first:] = shift, covariance
        if isinstance(self.rates, GaussianRates):
            whole_shift[:first], whole[:first, :first] = self.rates.step_law(step, real_world=real_world)
            cross = self._across(step)
            whole[:first, first:], whole[first:, :first] = cross, cross.T
        return whole_shift, whole

    def _beside(self, step: float, *, real_world: bool) -> tuple[FloatArray, FloatArray]:
        """Shift and covariance of what stands beside the rates."""
        leading, assets = self.rates.factor_count, self.asset_count
        excess = -0.5 * self.volatility**2 * step
        if real_world:
            excess = excess + self.premium * step
        if self.inflation is None:
            return excess, self.covariance * step
        speed, deviation = self.inflation.mean_reversion, self.inflation.volatility
        lengths = [float(first_integral(speed, step)), float(second_integral(speed, step))]
        drift = deviation * self.inflation.risk_price if real_world else 0.0
        covariance = np.zeros((2 + assets, 2 + assets))
        covariance[0, 0] = deviation**2 * float(first_integral(2.0 * speed, step))
        covariance[0, 1] = covariance[1, 0] = deviation**2 * float(mixed_integral(speed, speed, step))
        covariance[1, 1] = deviation**2 * float(product_integral(speed, speed, step))
        # Cov(∫e^{-a s} dW, B) over the step is ρ B(a, Δ), and that of the integral ρ ∫B(a, s) ds.
        links = deviation * self.volatility * self.correlation[leading, leading + 1 :]
        covariance[:2, 2:] = np.outer(lengths, links)
        covariance[2:, :2] = covariance[:2, 2:].T
        covariance[2:, 2:] = self.covariance * step
        return np.concatenate([[drift * length for length in lengths], excess]), covariance

    def _across(self, step: float) -> FloatArray:
        """Covariance of the rates' noise, rows, with what stands beside them, columns."""
        factors, assets = self._factors(), self.asset_count
        leading = len(factors)
        has_inflation = int(self.inflation is not None)
        cross = np.zeros((leading + 1, 2 * has_inflation + assets))
        for row, (speed, deviation) in enumerate(factors):
            links = deviation * self.volatility * self.correlation[row, leading + has_inflation :]
            cross[row, 2 * has_inflation :] = links * first_integral(speed, step)
            cross[leading, 2 * has_inflation :] += links * second_integral(speed, step)
            if self.inflation is not None:
                other = self.inflation.mean_reversion
                weight = self.correlation[row, leading] * deviation * self.inflation.volatility
                cross[row, 0] = weight * first_integral(speed + other, step)
                # ∫e^{-aᵢs} B(a, s) ds with the factor, ∫e^{-as} B(aᵢ, s) ds with the other integral.
                cross[row, 1] = weight * mixed_integral(speed, other, step)
                cross[leading, 0] += weight * mixed_integral(other, speed, step)
                cross[leading, 1] += weight * product_integral(speed, other, step)
        return cross

    def walk(
        self,
        step: float,
        size: int,
        rng: np.random.Generator,
        *,
        real_world: bool = False,
        others: Sequence[np.random.Generator] | None = None,
    ) -> GaussianMarketWalk | IndependentMarketWalk:
        """`size` paths from time 0 in exact steps of `step` years.

        The rates draw from `rng` as they do alone: their paths are the same bits whatever stands beside them,
        and so, to rounding, are those of an asset when others are put after it.

        Parameters
        ----------
        step : float
            [years]
        size : int
        rng : Generator
        real_world : bool
        others : sequence of Generator, length 1 + m, optional
            For inflation and for each asset; spawned from `rng` when left out, which leaves its stream as it
            is.
        """
        generators = rng.spawn(1 + self.asset_count) if others is None else list(others)
        if len(generators) != 1 + self.asset_count:
            raise ValueError(f"`others` must hold {1 + self.asset_count} generators")
        beside = self._companions(step, size, generators, real_world=real_world)
        if isinstance(self.rates, GaussianRates):
            return GaussianMarketWalk(self.rates, step, size, rng, real_world=real_world, beside=beside)
        return IndependentMarketWalk(
            self.rates.walk(step, size, rng, real_world=real_world), self.rates.factor_count, beside
        )

    def _companions(
        self, step: float, size: int, generators: list[np.random.Generator], *, real_world: bool
    ) -> Companions:
        first = self.rates.factor_count + 1
        shift, covariance = self.step_law(step, real_world=real_world)
        used = generators[1:]
        if self.inflation is not None:
            # The factor and its integral take one generator, one after the other.
            used = [generators[0], generators[0], *used]
        return companions(
            shift,
            covariance,
            leading=first,
            speed=None if self.inflation is None else self.inflation.mean_reversion,
            step=step,
            size=size,
            generators=used,
        )

    def excess_law(self, time: ArrayLike, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Mean and variance of ``ln(S_t/(S_0 R_t))``, which is normal; shape (m, ...) each."""
        years = np.asarray(time, dtype=np.float64)
        drift = -0.5 * self.volatility**2 + (self.premium if real_world else 0.0)
        return np.multiply.outer(drift, years), np.multiply.outer(self.volatility**2, years)

    def mean_excess(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``E[S_t/R_t]/S_0``, shape (m, ...): 1 under the pricing measure, else ``e^{πt}``."""
        years = np.asarray(time, dtype=np.float64)
        return np.exp(np.multiply.outer(self.premium if real_world else 0.0 * self.premium, years))

    def asset_law(self, time: ArrayLike, *, real_world: bool = False) -> tuple[FloatArray, FloatArray] | None:
        """Mean and variance of ``ln(S_t/S_0)``, shape (m, ...) each, where it is normal, else None.

        The variance is ``σ²t + 2 Σᵢ ρᵢσᵢσ ∫B(aᵢ, s) ds + V(t)``.
        """
        if not isinstance(self.rates, GaussianRates):
            return None
        mean, variance = self.excess_law(time, real_world=real_world)
        account = self.rates.account_law(time, real_world=real_world)
        variance = variance + account[1]
        first = len(self.correlation) - self.asset_count
        for row, (speed, deviation) in enumerate(self._factors()):
            links = deviation * self.volatility * self.correlation[row, first:]
            variance = variance + 2.0 * np.multiply.outer(links, second_integral(speed, time))
        return mean + account[0], np.maximum(variance, 0.0)

    def forward_volatility(self, time: ArrayLike) -> FloatArray:
        """Volatility at which an option on each asset is valued by Black's formula, shape (m, ...).

        The forward ``S_t/P(t, T)`` is lognormal under the measure of the bond, and at T its variance is that
        of ``ln S_T``: Brigo and Mercurio (2006), appendix on equity with stochastic rates (from memory).
        Times must be above 0.

        Raises
        ------
        ValueError
            If the rates are not Gaussian or a time is not above 0.
        """
        years = np.asarray(time, dtype=np.float64)
        law = self.asset_law(years)
        if law is None:
            raise ValueError("the assets are lognormal with Gaussian rates only")
        if years.size and years.min() <= 0.0:
            raise ValueError("`time` must be above 0")
        return np.asarray(np.sqrt(law[1] / years))

    def linked_terms(
        self,
        time: ArrayLike,
        maturity: ArrayLike,
        *,
        observed: ArrayLike | None = None,
        past: bool = False,
    ) -> tuple[FloatArray, FloatArray]:
        """Index-linked zero bonds as seen from `time`: ``I(observed)/I(time)`` paid at `maturity`.

        They are worth ``exp(level - exposure · x)`` per unit at today's index of `time`, where x holds the
        rate factors and, last, the inflation factor: the rows of `desk.rates.risky_walk` walks' ``factors``.

        Parameters
        ----------
        time, maturity : array_like, shapes that broadcast
            [years]
        observed : array_like, optional
            Time of the index that is paid, between the two; `maturity` when left out. An index observed
            before `time` is known there: it multiplies a bond that is not linked.
        past : bool
            As in `desk.rates.short_rate.ShortRateModel.bond_terms`.

        Returns
        -------
        level : ndarray, the broadcast shape
        exposure : ndarray, the broadcast shape and n + 1
            [years]

        Raises
        ------
        ValueError
            If there is no inflation, the times do not go together, or the rates have no such form.

        Notes
        -----
        Seen from today this is ``P(0,T) e^{i(T) T}`` to rounding. With an index observed earlier
        it is ``P(0,T) e^{i(S) S}`` times a convexity that a curve alone does not know: 1 for independent
        rates, and for correlated ones with a lag of some months within a few parts in ten thousand of 1.
        """
        if self.index is None:
            raise ValueError("there is no inflation beside these rates")
        terms = getattr(self.rates, "bond_terms", None)
        if terms is None:
            raise ValueError("bonds of this rate model have no exponential form; link its own bond prices")
        seen = maturity if observed is None else observed
        level, exposure = terms(time, maturity, past=past)
        growth, own = self.index.growth_terms(time, maturity, seen, past=past)
        shape = np.broadcast_shapes(level.shape, growth.shape)
        count = self.rates.factor_count
        joined = np.empty((*shape, count + 1))
        joined[..., :count] = np.broadcast_to(exposure, (*shape, count))
        joined[..., count] = own
        return np.asarray(level + growth), joined


def _per_asset(name: str, values: ArrayLike) -> FloatArray:
    """One finite number an asset, read-only."""
    array = np.array(values, dtype=np.float64)
    if array.ndim != 1 or not np.isfinite(array).all():
        raise ValueError(f"`{name}` must hold one number an asset")
    array.flags.writeable = False
    return array


def total_return_index(price: ArrayLike, dividend: ArrayLike) -> FloatArray:
    """Value of one unit of money held with dividends reinvested.

    Units grow by ``(price + dividend)/price`` at each payment. A continuous yield q multiplies them by
    ``e^{qt}``, so that a price without dividends is ``S_t e^{-qt}``.

    Parameters
    ----------
    price : array_like, shape (k + 1,)
        After the dividend of its date, above 0.
    dividend : array_like, shape (k,)
        Paid at the end of each step per unit.

    Returns
    -------
    ndarray, shape (k + 1,)
        1 at first.
    """
    prices, paid = np.asarray(price, dtype=np.float64), np.asarray(dividend, dtype=np.float64)
    if prices.ndim != 1 or prices.size == 0 or paid.shape != (prices.size - 1,):
        raise ValueError("`dividend` must hold one amount for each step between two of `price`")
    if not (prices > 0.0).all():
        raise ValueError("`price` must be above 0")
    return np.concatenate([[1.0], np.cumprod((prices[1:] + paid) / prices[:-1])])
