"""Holdings: what is held, as the source states it."""

from __future__ import annotations

import math
from calendar import monthrange
from dataclasses import dataclass
from datetime import date
from enum import StrEnum

from desk.rates.day_count import DayCount

__all__ = [
    "COUPON_FREQUENCIES",
    "SWAP_KINDS",
    "Amortisation",
    "Holding",
    "HoldingKind",
    "PriceKind",
]

COUPON_FREQUENCIES = (1, 2, 4, 12)
"""Coupons a year that fall on whole months."""


class HoldingKind(StrEnum):
    """Kinds of holding."""

    BOND = "bond"
    ZERO = "zero"
    DEPOSIT = "deposit"
    """Money that can be had today."""
    FUND = "fund"
    FLOATER = "floater"
    """A floating-rate note."""
    BILL = "bill"
    """A short zero, quoted by price or by bank discount rate."""
    TERM_DEPOSIT = "term deposit"
    """Money tied until a date, repaid then with simple interest."""
    PAYER_SWAP = "payer swap"
    """Pays the fixed rate and receives the floating one."""
    RECEIVER_SWAP = "receiver swap"
    """Receives the fixed rate and pays the floating one."""
    PROPERTY = "property"
    """Like a fund: a market value and a stated duration."""
    LINKED_BOND = "linked bond"
    """A bond whose coupons and nominal follow a price index, with a lag."""


class Amortisation(StrEnum):
    """How the nominal is repaid."""

    BULLET = "bullet"
    """All of it at maturity."""
    LEVEL = "level"
    """In equal parts, one with each coupon."""
    ANNUITY = "annuity"
    """So that coupon and repayment together stay the same."""


class PriceKind(StrEnum):
    """What a price holds."""

    CLEAN = "clean"
    """Without accrued interest."""
    DIRTY = "dirty"
    """With accrued interest."""


SWAP_KINDS = (HoldingKind.PAYER_SWAP, HoldingKind.RECEIVER_SWAP)
"""Interest-rate swaps."""

_WITH_MATURITY = frozenset(
    {
        HoldingKind.BOND,
        HoldingKind.ZERO,
        HoldingKind.FLOATER,
        HoldingKind.BILL,
        HoldingKind.TERM_DEPOSIT,
        HoldingKind.LINKED_BOND,
        *SWAP_KINDS,
    }
)
_WITH_COUPONS = frozenset({HoldingKind.BOND, HoldingKind.LINKED_BOND, HoldingKind.FLOATER, *SWAP_KINDS})
_WITH_FIRST_COUPON = _WITH_COUPONS - {*SWAP_KINDS}
_WITH_PRICE = frozenset(
    {
        HoldingKind.BOND,
        HoldingKind.ZERO,
        HoldingKind.FLOATER,
        HoldingKind.BILL,
        HoldingKind.LINKED_BOND,
    }
)
_WITH_DEFAULT = _WITH_PRICE | {HoldingKind.TERM_DEPOSIT}
_AMORTISATIONS = {
    HoldingKind.BOND: frozenset(Amortisation),
    **{
        kind: frozenset({Amortisation.BULLET, Amortisation.LEVEL})
        for kind in (HoldingKind.FLOATER, *SWAP_KINDS)
    },
}
_BULLET_ONLY = frozenset({Amortisation.BULLET})
_FINITE = (
    "nominal",
    "coupon",
    "market_value",
    "duration",
    "price",
    "discount_rate",
    "current_rate",
    "margin",
)


@dataclass(frozen=True)
class Holding:
    """One holding.

    Attributes
    ----------
    name : str
    kind : HoldingKind
    nominal : float
        What is still to be repaid of a bond, zero, bill, floater or term deposit; the amount on which a swap
        pays; balance of a deposit; 0 for a fund or property. Of an amortising holding it is what is
        outstanding on the valuation date. Of a linked bond it is before indexation: the bond repays it times
        its index ratio, and that times the growth of the index until then.
    coupon : float
        Coupon rate of a bond, the real one of a linked bond; fixed rate of a swap; interest rate of a term
        deposit [1/year]; else 0.
    frequency : int
        Coupons a year: 1, 2, 4 or 12; of the fixed leg of a swap. For a zero, the compounding of its yield.
    maturity : datetime.date or None
        None for a deposit, a fund or property.
    day_count : DayCount or None
        Of the interest; None stands for Act/Act ICMA, in which every regular period is an equal part of the
        year, and for Act/360 with a bill or a term deposit. Regular coupons of a bond do not depend on it;
        accrued interest and an odd first coupon do, and so does every period of a floater or swap.
    market_value : float or None
        Of the whole holding, with accrued interest. It goes before `price`. Swaps are valued on the curve,
        whatever it says.
    units : float or None
        Number held, for information: nominal and market value are of the whole holding.
    duration : float or None
        Stated duration of a fund or property [years].
    start_date : datetime.date or None
        The day from which interest runs: the issue of a bond, the start of a swap or of a term deposit. It
        may lie after the valuation date. Without it the coupons run back without end.
    first_coupon : datetime.date or None
        Of a bond or floater whose first period is longer than the others: the first of the regular dates on
        which it pays. Without it the first regular date after `start_date` pays.
    ex_dividend_days : int
        Calendar days before a coupon from which a buyer does not get it. Who holds the bond gets it.
    bought_ex_dividend : bool
        The holding was bought within those days before the next coupon, which therefore is not received.
    amortisation : Amortisation
        Annuity is for bonds alone.
    price : float or None
        Per 100 of nominal; of a bond, zero, bill, floater or linked bond. That of a linked bond is in real
        terms: times its index ratio it is money.
    price_kind : PriceKind
    discount_rate : float or None
        Bank discount rate of a bill [1/year]: ``price = 100 · (1 - discount_rate · time to maturity)`` in
        its day count.
    current_rate : float or None
        What a floater, or the floating leg of a swap, pays in the running period, margin included [1/year].
        Where it is not stated, the curve gives it.
    margin : float
        Added to the floating rate [1/year].
    floating_frequency : int or None
        Payments a year of a swap's floating leg; None for those of the fixed leg.
    floating_day_count : DayCount or None
        Of a swap's floating leg; None for that of the fixed leg.
    default_rate : float
        Probability of default within a year, from 0 to below 1.
    recovery_rate : float
        Part of the outstanding nominal received after a default, from 0 to 1.
    index_lag_months : int
        Of a linked bond: its payments follow the index as it stood so many months before, from 0 to 60.
    index_ratio : float
        Of a linked bond: the reference index today over that of its base date.
    has_principal_floor : bool
        A linked bond repays no less than its nominal, whatever the index has done. Its coupons have no floor.
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
    start_date: date | None = None
    first_coupon: date | None = None
    ex_dividend_days: int = 0
    bought_ex_dividend: bool = False
    amortisation: Amortisation = Amortisation.BULLET
    price: float | None = None
    price_kind: PriceKind = PriceKind.CLEAN
    discount_rate: float | None = None
    current_rate: float | None = None
    margin: float = 0.0
    floating_frequency: int | None = None
    floating_day_count: DayCount | None = None
    default_rate: float = 0.0
    recovery_rate: float = 0.0
    index_lag_months: int = 3
    index_ratio: float = 1.0
    has_principal_floor: bool = False

    def __post_init__(self) -> None:
        """Check that the holding has what its kind needs."""
        if self.kind in _WITH_MATURITY and self.maturity is None:
            raise ValueError(f"`maturity` must be given for the {self.kind} {self.name!r}")
        if self.kind in _WITH_COUPONS and self.frequency not in COUPON_FREQUENCIES:
            raise ValueError(f"`frequency` must be 1, 2, 4 or 12 for the {self.kind} {self.name!r}")
        for name in _FINITE:
            number = getattr(self, name)
            if number is not None and not math.isfinite(number):
                raise ValueError(f"`{name}` must be finite for {self.name!r}")
        if self.duration is not None and self.duration < 0.0:
            raise ValueError(f"`duration` must be at least 0 for {self.name!r}")
        self._check_dates()
        self._check_terms()
        self._check_price()
        if not 0.0 <= self.default_rate < 1.0:
            raise ValueError(f"`default_rate` must be at least 0 and below 1 for {self.name!r}")
        if not 0.0 <= self.recovery_rate <= 1.0:
            raise ValueError(f"`recovery_rate` must be from 0 to 1 for {self.name!r}")
        if self.default_rate and self.kind not in _WITH_DEFAULT:
            raise ValueError(f"`default_rate` must be 0 for the {self.kind} {self.name!r}")

    def _check_dates(self) -> None:
        """Check start, first coupon and ex-dividend days."""
        start, first, maturity = self.start_date, self.first_coupon, self.maturity
        if start is not None and maturity is not None and start >= maturity:
            raise ValueError(f"`start_date` must be before the maturity of {self.name!r}")
        if self.kind is HoldingKind.TERM_DEPOSIT and self.coupon and start is None:
            raise ValueError(f"`start_date` must be given for the term deposit {self.name!r}")
        if first is not None:
            if self.kind not in _WITH_FIRST_COUPON:
                raise ValueError(f"`first_coupon` must not be given for the {self.kind} {self.name!r}")
            if start is None or maturity is None:
                raise ValueError(f"`start_date` must be given beside the first coupon of {self.name!r}")
            if not start < first <= maturity:
                raise ValueError(
                    f"`first_coupon` must be after the start and by the maturity of {self.name!r}"
                )
            if not _is_coupon_date(first, maturity, 12 // self.frequency):
                raise ValueError(
                    f"`first_coupon` must be a coupon date of {self.name!r}, counted back from its maturity"
                )
        longest = 300 // self.frequency if self.frequency in COUPON_FREQUENCIES else 300
        if not 0 <= self.ex_dividend_days <= longest:
            raise ValueError(f"`ex_dividend_days` must be from 0 to {longest} for {self.name!r}")
        if self.bought_ex_dividend and not self.ex_dividend_days:
            raise ValueError(f"`ex_dividend_days` must be given for {self.name!r}, bought ex-dividend")

    def _check_terms(self) -> None:
        """Check amortisation, indexation and the floating leg."""
        allowed = _AMORTISATIONS.get(self.kind, _BULLET_ONLY)
        if self.amortisation not in allowed:
            names = " or ".join(kind.value for kind in Amortisation if kind in allowed)
            raise ValueError(f"`amortisation` must be {names} for the {self.kind} {self.name!r}")
        if self.amortisation is Amortisation.ANNUITY and self.coupon <= -self.frequency:
            raise ValueError(f"`coupon` must be above {-self.frequency} for the annuity {self.name!r}")
        if not 0 <= self.index_lag_months <= 60:
            raise ValueError(f"`index_lag_months` must be from 0 to 60 for {self.name!r}")
        if not 0.0 < self.index_ratio < math.inf:
            raise ValueError(f"`index_ratio` must be finite and above 0 for {self.name!r}")
        if self.has_principal_floor and self.kind is not HoldingKind.LINKED_BOND:
            raise ValueError(f"`has_principal_floor` must not be given for the {self.kind} {self.name!r}")
        if self.floating_frequency is not None and self.floating_frequency not in COUPON_FREQUENCIES:
            raise ValueError(f"`floating_frequency` must be 1, 2, 4 or 12 for {self.name!r}")

    def _check_price(self) -> None:
        """Check price and discount rate."""
        if self.price is not None:
            if self.kind not in _WITH_PRICE:
                raise ValueError(f"`price` must not be given for the {self.kind} {self.name!r}")
            if self.price <= 0.0:
                raise ValueError(f"`price` must be above 0 for {self.name!r}")
            if self.discount_rate is not None:
                raise ValueError(f"`price` must not be given beside a discount rate for {self.name!r}")
        if self.discount_rate is not None and self.kind is not HoldingKind.BILL:
            raise ValueError(f"`discount_rate` must not be given for the {self.kind} {self.name!r}")


def _is_coupon_date(day: date, maturity: date, months: int) -> bool:
    """Whether a date lies a whole number of periods before the maturity, month ends clipped."""
    apart = (maturity.year - day.year) * 12 + maturity.month - day.month
    if apart % months:
        return False
    return day.day == min(maturity.day, monthrange(day.year, day.month)[1])
