"""Gaussian short rates: Vasicek, Ho-Lee, Hull-White and the two-factor Gaussian model as one class.

The short rate is ``r(t) = φ(t) + Σ xᵢ(t)`` with ``dxᵢ = -aᵢ xᵢ dt + σᵢ dWᵢ``, ``xᵢ(0) = 0`` and φ such that
today's curve is repriced exactly. Under the real-world measure factor i has the extra drift ``σᵢ λᵢ``.

References
----------
Vasicek, O. (1977), An equilibrium characterization of the term structure, J. Financial Economics 5.
Ho, T.S.Y. and Lee, S.B. (1986), Term structure movements and pricing interest rate contingent claims,
J. Finance 41. Hull, J. and White, A. (1990), Pricing interest-rate-derivative securities, Review of
Financial Studies 3. Brigo, D. and Mercurio, F. (2006), Interest Rate Models: Theory and Practice, chapters
3 and 4. Glasserman, P. (2003), Monte Carlo Methods in Financial Engineering, section 3.3.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.limits import first_integral, mixed_integral, product_integral, second_integral
from desk.rates.short_rate import FormulaCurve

__all__ = ["GaussianRates", "GaussianWalk", "RateFactor", "gaussian_2", "ho_lee", "hull_white", "vasicek"]

FloatArray = NDArray[np.float64]

# Standard deviations from the mean that a path never leaves: the chance is 2e-19 each way.
_REACH = 9.0
# Numbers of one batch of normals: it should stay in a core's own cache.
_BATCH_NUMBERS = 40000


@dataclass(frozen=True)
class RateFactor:
    """One factor of a Gaussian model.

    Attributes
    ----------
    mean_reversion : float
        Speed of reversion a [1/year], at least 0.
    volatility : float
        Absolute volatility σ [1/year per root year], at least 0.
    risk_price : float
        λ: the drift gains σλ under the real-world measure [1/root year].
    """

    mean_reversion: float
    volatility: float
    risk_price: float = 0.0

    def __post_init__(self) -> None:
        """Check the parameters."""
        for name in ("mean_reversion", "volatility"):
            value = getattr(self, name)
            if not (math.isfinite(value) and value >= 0.0):
                raise ValueError(f"`{name}` must be a number of at least 0, not {value}")
        if not math.isfinite(self.risk_price):
            raise ValueError(f"`risk_price` must be a number, not {self.risk_price}")


class GaussianRates:
    """A Gaussian short-rate model with any number of factors.

    Parameters
    ----------
    curve : DiscountCurve
        Today's curve. Only its discount factors enter prices; its instantaneous forward rate enters the
        short rate that is reported.
    factors : sequence of RateFactor, length n
    correlation : array_like, shape (n, n), optional
        Of the factors' Brownian motions; the identity when left out.

    Raises
    ------
    ValueError
        If there is no factor or `correlation` is not a correlation matrix.
    """

    def __init__(
        self,
        curve: DiscountCurve,
        factors: tuple[RateFactor, ...] | list[RateFactor],
        correlation: ArrayLike | None = None,
    ) -> None:
        self._curve = curve
        self.factors = tuple(factors)
        count = len(self.factors)
        if count == 0:
            raise ValueError("`factors` must hold at least one factor")
        matrix = np.eye(count) if correlation is None else np.array(correlation, dtype=np.float64)
        if matrix.shape != (count, count):
            raise ValueError(f"`correlation` must be {count} by {count}")
        if not np.isfinite(matrix).all() or not np.array_equal(matrix, matrix.T):
            raise ValueError("`correlation` must be symmetric")
        if np.any(np.diag(matrix) != 1.0) or np.any(np.abs(matrix) > 1.0):
            raise ValueError("`correlation` must lie between -1 and 1, with 1 on the diagonal")
        if np.linalg.eigvalsh(matrix)[0] < -1e-12:
            raise ValueError("`correlation` must be a correlation matrix: it has a negative eigenvalue")
        matrix.flags.writeable = False
        self.correlation = matrix

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve."""
        return self._curve

    @property
    def factor_count(self) -> int:
        """Number n of factors."""
        return len(self.factors)

    def _pairs(self) -> Iterator[tuple[float, float, float]]:
        """``ρᵢⱼ σᵢ σⱼ``, aᵢ and aⱼ of every ordered pair of factors."""
        for row, first in enumerate(self.factors):
            for column, second in enumerate(self.factors):
                weight = self.correlation[row, column] * first.volatility * second.volatility
                if weight != 0.0:
                    yield float(weight), first.mean_reversion, second.mean_reversion

    def account_variance(self, time: ArrayLike) -> FloatArray:
        """``V(t)``, the variance of ``ln R_t`` under either measure.

        ``V(t) = Σᵢⱼ ρᵢⱼ σᵢσⱼ/(aᵢaⱼ) [t - B(aᵢ,t) - B(aⱼ,t) + B(aᵢ+aⱼ,t)]``, with its limits as a → 0.
        Brigo and Mercurio (2006), equation 4.10.
        """
        total = np.zeros(np.shape(time))
        for weight, first, second in self._pairs():
            total = total + weight * product_integral(first, second, time)
        return np.asarray(np.maximum(total, 0.0))

    def rate_variance(self, time: ArrayLike) -> FloatArray:
        """Variance of ``r(t)`` under either measure [1/year²]."""
        total = np.zeros(np.shape(time))
        for weight, first, second in self._pairs():
            total = total + weight * first_integral(first + second, time)
        return np.maximum(total, 0.0)

    def factor_mean(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """Means of the factors, shape (n, ...): 0 under the pricing measure, else ``σᵢλᵢ B(aᵢ, t)``."""
        return np.stack(
            [
                (factor.volatility * factor.risk_price if real_world else 0.0)
                * first_integral(factor.mean_reversion, time)
                for factor in self.factors
            ]
        )

    def integral_mean(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """Mean of ``∫₀ᵗ Σ xᵢ ds``: 0 under the pricing measure, else ``Σ σᵢλᵢ (t - B(aᵢ, t))/aᵢ``."""
        total = np.zeros(np.shape(time))
        if real_world:
            for factor in self.factors:
                drift = factor.volatility * factor.risk_price
                total = total + drift * second_integral(factor.mean_reversion, time)
        return total

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """``φ(t) = f(0, t) + ½ V'(t)`` [1/year], where ``V'(t) = Σᵢⱼ ρᵢⱼσᵢσⱼ B(aᵢ,t) B(aⱼ,t)``."""
        offset = self.curve.forward(time, time)
        for weight, first, second in self._pairs():
            offset = offset + 0.5 * weight * first_integral(first, time) * first_integral(second, time)
        return np.asarray(offset)

    def account_offset(self, time: ArrayLike) -> FloatArray:
        """``∫₀ᵗ φ ds = -ln P(0, t) + ½ V(t)``."""
        return np.asarray(_minus_log_discount(self.curve, time) + 0.5 * self.account_variance(time))

    def account_law(self, time: ArrayLike, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Mean and variance of ``ln R_t``, which is normal."""
        mean = self.account_offset(time) + self.integral_mean(time, real_world=real_world)
        return np.asarray(mean), self.account_variance(time)

    def mean_discount(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``E[1/R_t]``: ``P(0,t)`` under the pricing measure, ``P(0,t) exp(-E∫Σx)`` under the other."""
        discount = self.curve.discount(time)
        return np.asarray(discount * np.exp(-self.integral_mean(time, real_world=real_world)))

    def bond_terms(
        self, time: ArrayLike, maturity: ArrayLike, *, past: bool = False
    ) -> tuple[FloatArray, FloatArray]:
        """Zero bonds as seen from `time`: ``P(t,T|x) = exp(level - exposure · x)``.

        ``level = ln P(0,T)/P(0,t) + ½[V(T-t) - V(T) + V(t)]``, ``exposureᵢ = B(aᵢ, T-t)``.
        Brigo and Mercurio (2006), theorem 4.2.1. See `desk.rates.short_rate.ShortRateModel` for shapes.
        """
        start, end = np.asarray(time, dtype=np.float64), np.asarray(maturity, dtype=np.float64)
        remaining = np.asarray(end - start)
        if not past and np.any(remaining < 0.0):
            raise ValueError("`maturity` must not be before `time`")
        remaining = np.maximum(remaining, 0.0)
        level = self.account_offset(start) - self.account_offset(end) + 0.5 * self.account_variance(remaining)
        exposure = np.stack([first_integral(f.mean_reversion, remaining) for f in self.factors], axis=-1)
        return np.asarray(level), exposure

    def bond_price(self, time: float, maturity: float, state: ArrayLike) -> FloatArray:
        """Price at `time` of a zero bond paying 1 at `maturity`, given the factors, shape (n, ...)."""
        level, exposure = self.bond_terms(time, maturity)
        factors = np.asarray(state, dtype=np.float64)
        return np.asarray(np.exp(level - np.tensordot(exposure, factors, axes=1)))

    def bond_option(self, expiry: float, maturity: float, strike: float, *, call: bool = True) -> float:
        """Price today of a European option on a zero bond.

        Parameters
        ----------
        expiry, maturity : float
            Of the option and of the bond [years]; ``0 < expiry <= maturity``.
        strike : float
            Above 0, per unit of the bond's principal.
        call : bool
            False for a put.

        References
        ----------
        Jamshidian, F. (1989), An exact bond option formula, J. Finance 44; with several factors Brigo and
        Mercurio (2006), theorem 4.2.2.
        """
        from scipy.special import ndtr

        if not 0.0 < expiry <= maturity:
            raise ValueError("`expiry` must be above 0 and at most `maturity`")
        if strike <= 0.0:
            raise ValueError("`strike` must be above 0")
        bond = float(self.curve.discount(maturity))
        cash = strike * float(self.curve.discount(expiry))
        variance = 0.0
        for weight, first, second in self._pairs():
            exposures = first_integral(first, maturity - expiry) * first_integral(second, maturity - expiry)
            variance += float(weight * exposures * first_integral(first + second, expiry))
        sign = 1.0 if call else -1.0
        if variance <= 0.0:
            return max(sign * (bond - cash), 0.0)
        deviation = math.sqrt(variance)
        upper = math.log(bond / cash) / deviation + 0.5 * deviation
        return sign * float(bond * ndtr(sign * upper) - cash * ndtr(sign * (upper - deviation)))

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Nine standard deviations either side of the mean of each factor, shape (n,) each."""
        mean = self.factor_mean(time, real_world=real_world)
        deviation = np.array(
            [
                factor.volatility * math.sqrt(float(first_integral(2.0 * factor.mean_reversion, time)))
                for factor in self.factors
            ]
        )
        return mean - _REACH * deviation, mean + _REACH * deviation

    def step_law(self, step: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Shift and covariance over a step of the factors and the integral of their sum.

        Given the factors at its start, the factors at the end of a step are ``e^{-aᵢΔ} xᵢ`` and the integral
        is ``Σ B(aᵢ,Δ) xᵢ``, each plus a normal number with this mean and covariance: a step of a year is as
        right as a step of a day. Glasserman (2003), section 3.3.

        Returns
        -------
        shift : ndarray, shape (n + 1,)
            The integral comes last.
        covariance : ndarray, shape (n + 1, n + 1)
        """
        count = self.factor_count
        covariance = np.zeros((count + 1, count + 1))
        for row, one in enumerate(self.factors):
            for column, two in enumerate(self.factors):
                weight = self.correlation[row, column] * one.volatility * two.volatility
                a, b = one.mean_reversion, two.mean_reversion
                covariance[row, column] = weight * first_integral(a + b, step)
                covariance[row, count] += weight * mixed_integral(a, b, step)
                covariance[count, count] += weight * product_integral(a, b, step)
        covariance[count, :count] = covariance[:count, count]
        shift = np.append(
            self.factor_mean(step, real_world=real_world), self.integral_mean(step, real_world=real_world)
        )
        return shift, covariance

    def walk(
        self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False
    ) -> GaussianWalk:
        """`size` paths from time 0 in exact steps of `step` years."""
        return GaussianWalk(self, step, size, rng, real_world=real_world)


class GaussianWalk:
    """Paths of a Gaussian model moved forward together; see `desk.rates.short_rate.Walk`.

    The normals are drawn step by step, within a step first for the factors, then for the integral.
    """

    def __init__(
        self, model: GaussianRates, step: float, size: int, rng: np.random.Generator, *, real_world: bool
    ) -> None:
        shift, covariance = model.step_law(step, real_world=real_world)
        self._shift = [float(value) for value in shift]
        self._root = _triangular_root(covariance)
        self._decay = [math.exp(-factor.mean_reversion * step) for factor in model.factors]
        self._length = [float(first_integral(factor.mean_reversion, step)) for factor in model.factors]
        self._rng = rng
        self.state = np.zeros((model.factor_count, size))
        self.integral = np.zeros(size)

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` times, yielding after each."""
        count, size = self.state.shape
        batch = max(1, min(steps, _BATCH_NUMBERS // ((count + 1) * size)))
        normals = np.empty((batch, count + 1, size))
        scratch = np.empty((batch, size))
        moved = scratch[0]
        for start in range(0, steps, batch):
            wanted = min(batch, steps - start)
            self._draw(normals[:wanted], scratch[:wanted])
            for noise in normals[:wanted]:
                for factor in range(count):
                    state = self.state[factor]
                    np.multiply(state, self._length[factor], out=moved)
                    self.integral += moved
                    state *= self._decay[factor]
                    state += noise[factor]
                self.integral += noise[count]
                yield

    def _draw(self, normals: FloatArray, scratch: FloatArray) -> None:
        """Fill `normals`, shape (steps, n + 1, m), with the noise of the next steps."""
        self._rng.standard_normal(out=normals)
        for row in range(normals.shape[1] - 1, -1, -1):
            normals[:, row] *= self._root[row][row]
            for column in range(row):
                np.multiply(normals[:, column], self._root[row][column], out=scratch)
                normals[:, row] += scratch
            if self._shift[row] != 0.0:
                normals[:, row] += self._shift[row]


def _triangular_root(covariance: FloatArray) -> list[list[float]]:
    """Lower triangular root of a covariance matrix, which may be singular."""
    count = len(covariance)
    scale = [math.sqrt(max(float(covariance[index, index]), 0.0)) for index in range(count)]
    safe = np.array([value if value > 0.0 else 1.0 for value in scale])
    matrix = covariance / np.outer(safe, safe)
    root = [[0.0] * count for _ in range(count)]
    for row in range(count):
        for column in range(row + 1):
            rest = float(matrix[row, column]) - sum(root[row][k] * root[column][k] for k in range(column))
            if row == column:
                # What rounding leaves where correlation is ±1 is no variance of its own.
                root[row][row] = math.sqrt(rest) if rest > 1e-14 else 0.0
            elif root[column][column] > 0.0:
                root[row][column] = rest / root[column][column]
    return [[scale[row] * value for value in root[row]] for row in range(count)]


def _minus_log_discount(curve: DiscountCurve, time: ArrayLike) -> FloatArray:
    """``-ln P(0, t)``; through the zero rate, so that it stays finite where P is too small for a float."""
    years = np.asarray(time, dtype=np.float64)
    return np.asarray(curve.zero(years) * years)


def vasicek(
    *,
    mean_reversion: float,
    long_run_rate: float,
    volatility: float,
    starting_rate: float,
    risk_price: float = 0.0,
) -> GaussianRates:
    """``dr = a(θ - r) dt + σ dW`` from ``r(0)``, on the curve the model makes for itself.

    ``-ln P(0,t) = r₀ t + a(θ - r₀) ∫₀ᵗB - ½V(t)``; rates are continuously compounded [1/year].
    Vasicek (1977), equation 27. As the mean reversion goes to 0 this is Merton's model.
    """
    factor = RateFactor(mean_reversion, volatility, risk_price)
    pull = mean_reversion * (long_run_rate - starting_rate)
    variance = volatility**2

    def log_discount(time: FloatArray) -> FloatArray:
        drift = starting_rate * time + pull * second_integral(mean_reversion, time)
        return np.asarray(0.5 * variance * product_integral(mean_reversion, mean_reversion, time) - drift)

    def instantaneous(time: FloatArray) -> FloatArray:
        length = first_integral(mean_reversion, time)
        return np.asarray(starting_rate + pull * length - 0.5 * variance * length**2)

    return GaussianRates(FormulaCurve(log_discount, instantaneous), (factor,))


def ho_lee(curve: DiscountCurve, *, volatility: float, risk_price: float = 0.0) -> GaussianRates:
    """The model of Ho and Lee (1986) in continuous time, fitted to a curve: no mean reversion."""
    return GaussianRates(curve, (RateFactor(0.0, volatility, risk_price),))


def hull_white(
    curve: DiscountCurve, *, mean_reversion: float, volatility: float, risk_price: float = 0.0
) -> GaussianRates:
    """The model of Hull and White (1990) with constant parameters, fitted to a curve."""
    return GaussianRates(curve, (RateFactor(mean_reversion, volatility, risk_price),))


def gaussian_2(
    curve: DiscountCurve,
    *,
    mean_reversion: float,
    volatility: float,
    second_mean_reversion: float,
    second_volatility: float,
    factor_correlation: float,
    risk_price: float = 0.0,
) -> GaussianRates:
    """The two-factor Gaussian model of Brigo and Mercurio (2006), section 4.2, fitted to a curve."""
    factors = (
        RateFactor(mean_reversion, volatility, risk_price),
        RateFactor(second_mean_reversion, second_volatility),
    )
    return GaussianRates(curve, factors, [[1.0, factor_correlation], [factor_correlation, 1.0]])
