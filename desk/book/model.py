"""How rates and risky assets move, as the source states it."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from desk.book.arrays import FloatArray, owned_dates, owned_floats, same_fields

__all__ = ["History", "ModelName", "RatesModel", "RiskyAssets"]


class ModelName(StrEnum):
    """Short-rate models by the names they are published under."""

    VASICEK = "vasicek"
    HO_LEE = "ho-lee"
    HULL_WHITE = "hull-white"
    GAUSSIAN_2 = "gaussian-2"
    CIR = "cir"
    CIR_SHIFTED = "cir-shifted"
    BLACK_KARASINSKI = "black-karasinski"
    OUTSIDE = "outside"
    """No model: the book's own set of scenarios."""


@dataclass(frozen=True)
class RatesModel:
    """A short-rate model and its parameters; None where the source states none.

    Attributes
    ----------
    name : ModelName
    mean_reversion, second_mean_reversion : float or None
        Speeds of reversion [1/year].
    volatility, second_volatility : float or None
        Absolute for Gaussian models [1/year per root year]; for square-root models the coefficient of √r; for
        black-karasinski of ln r [1/root year].
    long_run_rate, starting_rate : float or None
        Continuously compounded [1/year]; needed by vasicek and cir, which make their own curve.
    factor_correlation : float or None
        Between the two factors of gaussian-2.
    risk_price : float
        Price of risk λ of the first factor: under the real-world measure its drift gains σλ.
    second_risk_price : float
        Of the second factor of gaussian-2.
    inflation_mean_reversion : float or None
        Speed of reversion of the inflation factor [1/year].
    inflation_volatility : float or None
        Of the inflation factor [1/year per root year]; None where inflation is not drawn.
    inflation_rate_correlation : float or None
        Of the inflation factor with the first rate factor; None counts as 0.
    inflation_risk_price : float
        Price of risk of the inflation factor.
    mend_correlation : bool
        Whether correlations of the risky assets that contradict one another are to be replaced by the
        nearest ones that do not.
    """

    name: ModelName
    mean_reversion: float | None = None
    volatility: float | None = None
    long_run_rate: float | None = None
    starting_rate: float | None = None
    second_mean_reversion: float | None = None
    second_volatility: float | None = None
    factor_correlation: float | None = None
    risk_price: float = 0.0
    second_risk_price: float = 0.0
    inflation_mean_reversion: float | None = None
    inflation_volatility: float | None = None
    inflation_rate_correlation: float | None = None
    inflation_risk_price: float = 0.0
    mend_correlation: bool = False


@dataclass(frozen=True, eq=False)
class RiskyAssets:
    """Risky assets held with dividends reinvested.

    Attributes
    ----------
    names : tuple of str, length k
    value, premium, volatility, dividend_yield : ndarray, shape (k,)
        Value today [currency]; excess return, volatility and dividend yield [1/year].
    correlation : ndarray, shape (k, k)
    rates_correlation : ndarray, shape (k,)
        With the first rate factor.
    """

    names: tuple[str, ...]
    value: FloatArray
    premium: FloatArray
    volatility: FloatArray
    dividend_yield: FloatArray
    correlation: FloatArray
    rates_correlation: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check their shapes."""
        object.__setattr__(self, "names", tuple(self.names))
        count = len(self.names)
        for name in ("value", "premium", "volatility", "dividend_yield", "rates_correlation"):
            array = owned_floats(getattr(self, name))
            if array.shape != (count,):
                raise ValueError(f"`{name}` must hold one number for each of the {count} assets")
            object.__setattr__(self, name, array)
        object.__setattr__(self, "correlation", owned_floats(self.correlation))
        if self.correlation.shape != (count, count):
            raise ValueError(f"`correlation` must be {count} by {count}")

    def __eq__(self, other: object) -> bool:
        """Equal when every column is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]


@dataclass(frozen=True, eq=False)
class History:
    """A history of short rates.

    Attributes
    ----------
    date : ndarray of datetime64[D], shape (n,)
    rate : ndarray, shape (n,)
        Continuously compounded [1/year].
    """

    date: NDArray[np.datetime64]
    rate: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "date", owned_dates(self.date))
        object.__setattr__(self, "rate", owned_floats(self.rate))
        if self.date.shape != self.rate.shape or self.rate.ndim != 1:
            raise ValueError("`date` and `rate` must be of one length")

    def __eq__(self, other: object) -> bool:
        """Equal when both columns are."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]
