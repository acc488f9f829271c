"""What every short-rate model offers, and the curve a model makes for itself.

A model is affine: the short rate is ``r(t) = φ(t) + Σ xᵢ(t)`` and a zero bond seen from a state x is worth
``exp(level - Σ exposureᵢ xᵢ)``.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve

__all__ = ["FormulaCurve", "ShortRateModel", "Walk"]

FloatArray = NDArray[np.float64]


class Walk(Protocol):
    """A number of paths of one model, all at the same time, moved forward step by step.

    Attributes
    ----------
    state : ndarray, shape (n, m)
        The n factors on m paths; overwritten by each step.
    integral : ndarray, shape (m,)
        ``∫₀ᵗ Σ xᵢ ds``; overwritten by each step.
    """

    state: FloatArray
    integral: FloatArray

    def run(self, steps: int) -> Iterator[None]:
        """Move forward `steps` times, yielding after each."""
        ...


class ShortRateModel(Protocol):
    """A short-rate model: today's curve and how it moves. Times are years, rates continuously compounded."""

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve, which the model reprices exactly."""
        ...

    @property
    def factor_count(self) -> int:
        """Number n of factors."""
        ...

    def walk(self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False) -> Walk:
        """`size` paths from time 0 in steps of `step` years, drawn from the exact law of the model."""
        ...

    def bond_terms(
        self, time: ArrayLike, maturity: ArrayLike, *, past: bool = False
    ) -> tuple[FloatArray, FloatArray]:
        """Zero bonds as seen from `time`: ``P = exp(level - exposure · x)``.

        Parameters
        ----------
        time, maturity : array_like, shapes that broadcast
            t and T [years].
        past : bool
            Let maturities before `time` pass. What they give means nothing and must be given no weight.

        Returns
        -------
        level : ndarray, the broadcast shape
        exposure : ndarray, the broadcast shape and n
            [years].

        Raises
        ------
        ValueError
            If a maturity is before `time` and `past` is false.
        """
        ...

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """``φ(t)``: what is added to the factors to give the short rate [1/year]."""
        ...

    def account_offset(self, time: ArrayLike) -> FloatArray:
        """``∫₀ᵗ φ ds``: what is added to the integral of the factors to give ``ln R_t``."""
        ...

    def account_law(
        self, time: ArrayLike, *, real_world: bool = False
    ) -> tuple[FloatArray, FloatArray] | None:
        """Mean and variance of ``ln R_t`` where it is normal, else None."""
        ...

    def mean_discount(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``E[1/R_t]`` under the measure asked for."""
        ...

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Lowest and highest factors that are at all likely (beyond: less than 1e-18), shape (n,) each."""
        ...


class FormulaCurve:
    """A discount curve given by formulas.

    Parameters
    ----------
    log_discount : callable
        ``ln P(0, t)`` for an array of times [years].
    instantaneous : callable
        The instantaneous forward rate at those times [1/year].
    """

    def __init__(
        self,
        log_discount: Callable[[FloatArray], FloatArray],
        instantaneous: Callable[[FloatArray], FloatArray],
    ) -> None:
        self._log_discount = log_discount
        self._instantaneous = instantaneous

    def discount(self, time: ArrayLike) -> FloatArray:
        """``P(0, time)``."""
        return np.asarray(np.exp(self._log_discount(np.asarray(time, dtype=np.float64))))

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year]; at time 0 the short rate."""
        years = np.asarray(time, dtype=np.float64)
        today = years == 0.0
        over = -self._log_discount(years) / np.where(today, 1.0, years)
        return np.asarray(np.where(today, self._instantaneous(np.zeros(1))[0], over))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year].

        Where the two are equal, the instantaneous forward rate.
        """
        first, last = np.broadcast_arrays(
            np.asarray(start, dtype=np.float64), np.asarray(end, dtype=np.float64)
        )
        same = first == last
        length = np.where(same, 1.0, last - first)
        over = (self._log_discount(first) - self._log_discount(last)) / length
        return np.asarray(np.where(same, self._instantaneous(first), over))
