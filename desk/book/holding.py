"""Holdings: what is held, as the source states it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from datetime import date
from enum import StrEnum

from desk.rates.day_count import DayCount

__all__ = ["COUPON_FREQUENCIES", "Holding", "HoldingKind"]

COUPON_FREQUENCIES = (1, 2, 4, 12)
"""Coupons a year that fall on whole months."""


class HoldingKind(StrEnum):
    """Kinds of holding."""

    BOND = "bond"
    ZERO = "zero"
    DEPOSIT = "deposit"
    FUND = "fund"


@dataclass(frozen=True)
class Holding:
    """One holding.

    Attributes
    ----------
    name : str
    kind : HoldingKind
    nominal : float
        Redemption amount of a bond or zero, balance of a deposit; 0 for a fund.
    coupon : float
        Coupon rate a year; 0 unless a bond.
    frequency : int
        Coupons a year: 1, 2, 4 or 12.
    maturity : datetime.date or None
        None for a deposit or a fund.
    day_count : DayCount or None
        Where the source states one.
    market_value : float or None
        Of the whole holding, with accrued interest.
    units : float or None
        Number held, for information: nominal and market value are of the whole holding.
    duration : float or None
        Stated duration of a fund [years].
    """

    name: str
    kind: HoldingKind
    nominal: float = 0.0
    coupon: float = 0.0
    frequency: int = 1
    maturity: date | None = None
    day_count: DayCount | None = None
    market_value: float | None = None
    units: float | None = None
    duration: float | None = None

    def __post_init__(self) -> None:
        """Check that the holding has what its kind needs."""
        if self.kind in (HoldingKind.BOND, HoldingKind.ZERO) and self.maturity is None:
            raise ValueError(f"`maturity` must be given for the {self.kind} {self.name!r}")
        if self.kind is HoldingKind.BOND and self.frequency not in COUPON_FREQUENCIES:
            raise ValueError(f"`frequency` must be 1, 2, 4 or 12 for the bond {self.name!r}")
        for name in ("nominal", "coupon", "market_value", "duration"):
            number = getattr(self, name)
            if number is not None and not math.isfinite(number):
                raise ValueError(f"`{name}` must be finite for {self.name!r}")
        if self.duration is not None and self.duration < 0.0:
            raise ValueError(f"`duration` must be at least 0 for {self.name!r}")
