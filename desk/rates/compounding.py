"""Compounding conventions and the conversions between them.

Inside the program a rate is continuously compounded; it is converted here, at the edge.
"""

from __future__ import annotations

from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["Compounding", "from_continuous", "to_continuous"]


class Compounding(StrEnum):
    """How often a stated rate is added to its principal."""

    ANNUAL = "annual"
    SEMI_ANNUAL = "semi-annual"
    QUARTERLY = "quarterly"
    MONTHLY = "monthly"
    CONTINUOUS = "continuous"

    @property
    def per_year(self) -> int:
        """Number of compounding periods a year; 0 stands for continuous compounding."""
        return _PER_YEAR[self]


_PER_YEAR = {
    Compounding.ANNUAL: 1,
    Compounding.SEMI_ANNUAL: 2,
    Compounding.QUARTERLY: 4,
    Compounding.MONTHLY: 12,
    Compounding.CONTINUOUS: 0,
}


def to_continuous(rate: ArrayLike, compounding: Compounding) -> NDArray[np.float64]:
    """Restate rates with continuous compounding.

    Parameters
    ----------
    rate : array_like, any shape
        Rates as stated [1/year].
    compounding : Compounding
        How they are stated.

    Returns
    -------
    ndarray, the shape of `rate`
        ``m ln(1 + rate/m)`` [1/year], with m periods a year.

    Raises
    ------
    ValueError
        If a rate is at or below -m, where nothing would be left of the principal.

    References
    ----------
    Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, "Measuring interest rates".
    """
    stated = np.asarray(rate, dtype=np.float64)
    periods = compounding.per_year
    if periods == 0:
        return stated.copy()
    if np.any(stated <= -periods):
        raise ValueError(f"`rate` must be above -{periods * 100} % when compounded {compounding}")
    return np.asarray(periods * np.log1p(stated / periods))


def from_continuous(rate: ArrayLike, compounding: Compounding) -> NDArray[np.float64]:
    """Restate continuously compounded rates with another compounding.

    Parameters
    ----------
    rate : array_like, any shape
        Continuously compounded rates [1/year].
    compounding : Compounding
        How they are to be stated.

    Returns
    -------
    ndarray, the shape of `rate`
        ``m (exp(rate/m) - 1)`` [1/year], with m periods a year.

    References
    ----------
    Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, "Measuring interest rates".
    """
    continuous = np.asarray(rate, dtype=np.float64)
    periods = compounding.per_year
    if periods == 0:
        return continuous.copy()
    return np.asarray(periods * np.expm1(continuous / periods))
