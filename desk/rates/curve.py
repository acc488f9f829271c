"""Discount curves."""

from __future__ import annotations

from enum import StrEnum
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["Curve", "DiscountCurve", "Interpolation"]

FloatArray = NDArray[np.float64]


class Interpolation(StrEnum):
    """What is drawn between the terms of a curve."""

    LOG_LINEAR = "log-linear"
    LINEAR_ZERO = "linear-zero"
    CUBIC_ZERO = "cubic-zero"
    MONOTONE_CONVEX = "monotone-convex"


class DiscountCurve(Protocol):
    """Anything that discounts: a book's curve or the curve a model makes for itself."""

    def discount(self, time: ArrayLike) -> FloatArray:
        """``P(0, time)``; times in years, any shape; ``P(0, 0) = 1``."""
        ...

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year]; at time 0 their limit."""
        ...

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year].

        Where the two are equal, the instantaneous forward rate.
        """
        ...


class Curve:
    """To be replaced by the real one (see contract)."""

    def __init__(
        self, terms: ArrayLike, zero_rates: ArrayLike, interpolation: Interpolation = Interpolation.LOG_LINEAR
    ) -> None:
        raise NotImplementedError
