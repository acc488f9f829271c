"""Paths of assets and inflation drawn beside paths of rates.

The rates are drawn first, from their own generator, exactly as they are alone. What stands beside them is
then its mean given the rates' noise of the step, plus a noise of its own: with Σ the covariance of a step in
blocks, ``K ε + L z`` with ``K = Σ₂₁ Σ₁₁⁺`` and ``L Lᵀ = Σ₂₂ - K Σ₁₂``. L is lower triangular and every row of
z has its own generator, so that an asset put after the others changes none of them but for rounding.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from desk.rates.correlation import volatility_matrix
from desk.rates.curve import DiscountCurve
from desk.rates.gaussian import GaussianRates, GaussianWalk
from desk.rates.limits import first_integral
from desk.rates.short_rate import Walk

__all__ = [
    "Companions",
    "DrawnRates",
    "GaussianMarketWalk",
    "IndependentMarketWalk",
    "MarketWalk",
    "companions",
]

FloatArray = NDArray[np.float64]

# Paths worked on at a time: the normals of a few assets stay in a core's own cache. Products of matrices are
# kept too small for a linear algebra library to start threads of its own.
_COLUMNS = 2500
_PRODUCT = 200_000


class DrawnRates(Protocol):
    """The part of a rate model that assets drawn beside it need; every model offers it."""

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve."""
        ...

    @property
    def factor_count(self) -> int:
        """Number n of factors."""
        ...

    def walk(self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False) -> Walk:
        """Paths of the rates alone."""
        ...


class MarketWalk(Walk, Protocol):
    """Paths of rates with assets, inflation or both.

    Attributes
    ----------
    factors : ndarray, shape (n + 1, size) or (n, size)
        The rate factors, and after them that of inflation where there is one; `state` is their first n rows
        [1/year].
    excess : ndarray, shape (m, size)
        ``ln(S_t/(S_0 R_t))`` of each asset; with the log of the savings account added it is ``ln(S_t/S_0)``.
    inflation_integral : ndarray, shape (size,)
        ``∫₀ᵗ x ds`` of the inflation factor, to which `desk.rates.risky_inflation.IndexLaw.offset` is added
        for ``ln I(t)/I(0)``; stays 0 where there is no inflation.
    """

    factors: FloatArray
    excess: FloatArray
    inflation_integral: FloatArray


class Companions:
    """What stands beside the rates, moved forward a step at a time.

    Parameters
    ----------
    shift : ndarray, shape (c,)
        Mean of the step's noise, that of the rates' shift already taken off.
    weight : ndarray, shape (c, l)
        K: on the rates' noise as it is drawn.
    root : ndarray, shape (c, k)
        L.
    decay, length : float or None
        ``e^{-aΔ}`` and ``B(a, Δ)`` of inflation, which takes the first two rows; None where there is none.
    size : int
    generators : sequence of Generator, length c
    """

    def __init__(
        self,
        shift: FloatArray,
        weight: FloatArray,
        root: FloatArray,
        *,
        decay: float | None,
        length: float | None,
        size: int,
        generators: Sequence[np.random.Generator],
    ) -> None:
        count = shift.size
        self._shift = shift[:, None]
        self._rates = bool(weight.any())
        # dimensions: what is drawn by the rates' noise and then the own normals
        self._matrix = np.ascontiguousarray(np.hstack([weight, root])) if self._rates else root.copy()
        self._decay, self._length = decay, length
        self._generators = list(generators)[: root.shape[1]]
        self._leading = weight.shape[1] if self._rates else 0
        self._size = size
        most = max(64, _PRODUCT // max(1, self._matrix.size))
        self._column = min(size, _COLUMNS, most)
        self._source = np.empty((self._leading + root.shape[1], self._column))
        self._noise = np.empty((count, self._column))
        self._first = 0 if decay is None else 2
        self.has_inflation = decay is not None
        self.excess = np.zeros((count - self._first, size))
        self.inflation = np.zeros(size)
        self.inflation_integral = np.zeros(size)

    def step(self, rates: FloatArray | None) -> None:
        """Move forward, given the rates' noise of the step, shape (l, size)."""
        for start in range(0, self._size, self._column):
            end = min(start + self._column, self._size)
            width = end - start
            source, noise = self._source[:, :width], self._noise[:, :width]
            if self._rates and rates is not None:
                source[: self._leading] = rates[:, start:end]
            for row, generator in zip(source[self._leading :], self._generators, strict=True):
                generator.standard_normal(out=row)
            np.matmul(self._matrix, source, out=noise)
            noise += self._shift
            self.excess[:, start:end] += noise[self._first :]
            if self._decay is not None and self._length is not None:
                factor, integral = self.inflation[start:end], self.inflation_integral[start:end]
                noise[1] += factor * self._length
                integral += noise[1]
                factor *= self._decay
                factor += noise[0]


def companions(
    shift: FloatArray,
    covariance: FloatArray,
    *,
    leading: int,
    speed: float | None,
    step: float,
    size: int,
    generators: Sequence[np.random.Generator],
) -> Companions:
    """What stands beside the rates, from the law of a whole step.

    Parameters
    ----------
    shift, covariance : ndarray, shapes (l + c,) and (l + c, l + c)
        The rates' noise first; its rows are 0 where it is not Gaussian.
    leading : int
        l.
    speed : float or None
        Of inflation's reversion to its mean, whose factor and integral come first; None where there is none.
    step : float
        [years]
    size : int
    generators : sequence of Generator, length c
    """
    given, cross = covariance[:leading, :leading], covariance[leading:, :leading]
    own = covariance[leading:, leading:]
    deviation = np.sqrt(np.maximum(np.diag(own), 0.0))
    weight = np.zeros_like(cross)
    if cross.any():
        scale = np.sqrt(np.maximum(np.diag(given), 0.0))
        scale[scale == 0.0] = 1.0
        inverse = np.linalg.pinv(given / np.outer(scale, scale), rcond=1e-14, hermitian=True)
        weight = (cross / scale) @ inverse / scale
        own = own - weight @ cross.T
        own = 0.5 * (own + own.T)
    # What is left where the rates explain everything is rounding, measured against what there was.
    root = volatility_matrix(own, scale=deviation, tolerance=1e-9) if own.size else np.zeros((0, 0))
    return Companions(
        shift[leading:] - weight @ shift[:leading],
        weight,
        root,
        decay=None if speed is None else math.exp(-speed * step),
        length=None if speed is None else float(first_integral(speed, step)),
        size=size,
        generators=generators,
    )


class GaussianMarketWalk(GaussianWalk):
    """Gaussian rates and what is drawn jointly with them; see `MarketWalk`."""

    def __init__(
        self,
        model: GaussianRates,
        step: float,
        size: int,
        rng: np.random.Generator,
        *,
        real_world: bool,
        beside: Companions,
    ) -> None:
        super().__init__(model, step, size, rng, real_world=real_world)
        self._beside = beside
        self._drawn: Iterator[FloatArray] = iter(())
        count = model.factor_count
        self.factors = np.zeros((count + beside.has_inflation, size))
        self.state = self.factors[:count]
        if beside.has_inflation:
            beside.inflation = self.factors[count]
        self.excess = beside.excess
        self.inflation_integral = beside.inflation_integral

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` times, yielding after each."""
        for _ in super().run(steps):
            self._beside.step(next(self._drawn))
            yield

    def _draw(self, normals: FloatArray, scratch: FloatArray) -> None:
        super()._draw(normals, scratch)
        self._drawn = iter(normals)


class IndependentMarketWalk:
    """Rates of any model and what is independent of them; see `MarketWalk`."""

    def __init__(self, rates: Walk, factor_count: int, beside: Companions) -> None:
        self._rates = rates
        self._beside = beside
        self.factors = rates.state
        if beside.has_inflation:
            self.factors = np.zeros((factor_count + 1, beside.excess.shape[1]))
            self.factors[:factor_count] = rates.state
            # The walk of the rates writes into the state that it holds: from now on rows of ours.
            rates.state = self.factors[:factor_count]
            beside.inflation = self.factors[factor_count]
        self.state = rates.state
        self.integral = rates.integral
        self.excess = beside.excess
        self.inflation_integral = beside.inflation_integral

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` times, yielding after each."""
        for _ in self._rates.run(steps):
            self._beside.step(None)
            yield
