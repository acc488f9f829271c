"""What a curve is made from, where that is not one rate a term: bonds, or the parameters of a formula."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from desk.book.arrays import FloatArray, IntArray, owned_dates, owned_floats, owned_integers, same_fields

__all__ = ["BondFit", "CurveBonds", "CurveParameters"]


class BondFit(StrEnum):
    """How a curve is drawn through bonds."""

    EXACT = "exact"
    """Every bond is repriced: a bootstrap, so each has a maturity of its own."""
    NELSON_SIEGEL = "nelson-siegel"
    """The smooth curve nearest to all of them, each weighted by the inverse of its duration."""
    SVENSSON = "svensson"
    """Likewise, with a second hump."""


@dataclass(frozen=True, eq=False)
class CurveBonds:
    """Bonds that a curve is drawn through, each array shape (m,), in the order of the source.

    Attributes
    ----------
    names : tuple of str
    maturity : ndarray of datetime64[D]
    coupon : ndarray
        Coupon rate; 0 for a bond without coupons [1/year].
    frequency : ndarray of int
        Coupons a year: 1, 2, 4 or 12; for a bond without coupons, the compounding of its yield.
    price : ndarray
        Per 100 of nominal; NaN where the yield is given.
    bond_yield : ndarray
        Compounded `frequency` times a year [1/year]; NaN where the price is given.
    is_clean : ndarray of bool
        Whether the price is without accrued interest.
    """

    names: tuple[str, ...]
    maturity: NDArray[np.datetime64]
    coupon: FloatArray
    frequency: IntArray
    price: FloatArray
    bond_yield: FloatArray
    is_clean: NDArray[np.bool_]

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "names", tuple(self.names))
        object.__setattr__(self, "maturity", owned_dates(self.maturity))
        object.__setattr__(self, "frequency", owned_integers(self.frequency))
        for name in ("coupon", "price", "bond_yield"):
            object.__setattr__(self, name, owned_floats(getattr(self, name)))
        flags = np.array(self.is_clean, dtype=np.bool_)
        flags.flags.writeable = False
        object.__setattr__(self, "is_clean", flags)
        shape = (len(self.names),)
        columns = (self.maturity, self.coupon, self.frequency, self.price, self.bond_yield, self.is_clean)
        if any(column.shape != shape for column in columns):
            raise ValueError("`names` and the columns beside it must be of one length")

    def __len__(self) -> int:
        """Number of bonds."""
        return len(self.names)

    def __eq__(self, other: object) -> bool:
        """Equal when every column is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]


@dataclass(frozen=True)
class CurveParameters:
    """Parameters of the curve of Nelson and Siegel (1987), or of Svensson (1994) with all six.

    Attributes
    ----------
    beta_0, beta_1, beta_2 : float
        Level, slope and curvature, in the compounding of the basis [1/year].
    tau_1 : float
        Decay [years].
    beta_3 : float or None
        Second curvature [1/year].
    tau_2 : float or None
        Its decay [years].
    """

    beta_0: float
    beta_1: float
    beta_2: float
    tau_1: float
    beta_3: float | None = None
    tau_2: float | None = None
