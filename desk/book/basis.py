"""The basis: the date, the curve and the premiums a book is valued on."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from enum import StrEnum
from functools import cached_property

from desk.book.arrays import FloatArray, owned_floats, same_fields
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve, Interpolation
from desk.rates.day_count import DayCount

__all__ = ["Basis", "CurveKind"]


class CurveKind(StrEnum):
    """What the quotes of the curve are."""

    ZERO = "zero"
    PAR = "par"
    SWAP = "swap"


@dataclass(frozen=True, eq=False)
class Basis:
    """What a book is valued on.

    Attributes
    ----------
    valuation_date : datetime.date
    currency : str
        ISO 4217 code.
    terms : ndarray, shape (q,)
        Terms of the quotes [years], rising and positive.
    rates : ndarray, shape (q,)
        The quotes as stated, in `compounding` [1/year].
    curve_kind : CurveKind
    compounding : Compounding
        Of the quotes.
    interpolation : Interpolation
    liability_spread : float
        Added to the continuous zero rates for liabilities [1/year].
    market_risk_premium : float
        Reward for one unit of beta [1/year].
    day_count : DayCount
        Turns dates into years.
    title : str
    """

    valuation_date: date
    currency: str
    terms: FloatArray
    rates: FloatArray
    curve_kind: CurveKind = CurveKind.ZERO
    compounding: Compounding = Compounding.ANNUAL
    interpolation: Interpolation = Interpolation.LOG_LINEAR
    liability_spread: float = 0.0
    market_risk_premium: float = 0.0
    day_count: DayCount = DayCount.ACT_365F
    title: str = ""

    def __post_init__(self) -> None:
        """Own the quotes."""
        object.__setattr__(self, "terms", owned_floats(self.terms))
        object.__setattr__(self, "rates", owned_floats(self.rates))

    def __eq__(self, other: object) -> bool:
        """Equal when every item is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]

    @cached_property
    def curve(self) -> Curve:
        """The curve the quotes give.

        Raises
        ------
        ValueError
            If the quotes give no curve: the message says which and why.
        """
        if self.curve_kind is not CurveKind.ZERO:
            raise ValueError(f"`curve_kind` must be zero, not {self.curve_kind}")
        return Curve(self.terms, to_continuous(self.rates, self.compounding), self.interpolation)
