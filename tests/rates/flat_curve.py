"""A flat curve for tests of models."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.short_rate import FormulaCurve

__all__ = ["flat_curve", "humped_curve"]

FloatArray = NDArray[np.float64]


def flat_curve(rate: float) -> FormulaCurve:
    """A flat continuously compounded rate."""
    return FormulaCurve(lambda time: -rate * time, lambda time: np.full(np.shape(time), rate))


def humped_curve() -> FormulaCurve:
    """Zero rates ``0.03 - 0.01 e^{-t/5} + 0.002 t e^{-t/5}``: a curve with a shape."""

    def log_discount(time: FloatArray) -> FloatArray:
        decay = np.exp(-time / 5.0)
        return np.asarray(-time * (0.03 - 0.01 * decay + 0.002 * time * decay))

    def instantaneous(time: ArrayLike) -> FloatArray:
        years = np.asarray(time, dtype=np.float64)
        decay = np.exp(-years / 5.0)
        zero = 0.03 - 0.01 * decay + 0.002 * years * decay
        return np.asarray(zero + years * decay * (0.002 + 0.002 - 0.0004 * years))

    return FormulaCurve(log_discount, instantaneous)
