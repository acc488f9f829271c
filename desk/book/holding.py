"""Holdings: what is held, as the source states it."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from enum import StrEnum

from desk.rates.day_count import DayCount

__all__ = ["Holding", "HoldingKind"]


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
