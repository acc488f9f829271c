"""Legs: what holdings pay, as columns, one row a leg."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book.accrual import day_count_codes
from desk.book.arrays import FloatArray, IntArray
from desk.book.holding import Amortisation, Holding, HoldingKind
from desk.rates.day_count import DateArray, DayCount

__all__ = ["Legs", "holding_legs"]

_KINDS = tuple(HoldingKind)
_KIND_NUMBER = {kind: number for number, kind in enumerate(_KINDS)}
_AMORTISATION_NUMBER = {kind: number for number, kind in enumerate(Amortisation)}
_STEP_ONCE = 12
"""Months of the periods in which the time to a single payment is counted."""


@dataclass(frozen=True, eq=False)
class Legs:
    """Legs of holdings: one for each that pays, two for some; each array shape (k,), by holding.

    A swap has a fixed and a floating leg; a linked bond whose principal has a floor has its coupons in one
    and the principal in another, since the two grow in different ways.

    Attributes
    ----------
    holding : ndarray of int
        Index into the list of holdings.
    is_floating : ndarray of bool
    is_swap, is_deposit : ndarray of bool
        Whether the leg is of a swap; whether it is money had today.
    pays_coupons : ndarray of bool
        False where there is one payment only.
    months : ndarray of int
        Length of a regular period.
    end : ndarray of datetime64[D]
        The last payment.
    start, first : ndarray of datetime64[D]
        Where interest begins, and the first payment; NaT where not stated.
    nominal : ndarray
        Outstanding today, with the sign of the leg [currency].
    rate : ndarray
        Fixed rate, or the margin of a floating leg [1/year].
    current_rate : ndarray
        Of the running period of a floating leg; NaN where not stated [1/year].
    count : ndarray of int
        Day count of the interest, as `desk.book.accrual.day_count_codes` gives it.
    amortisation : ndarray of int
        As numbered in `Amortisation`.
    ex_days : ndarray of int
        Days before a coupon from which a buyer does not get it.
    bought_ex : ndarray of bool
    repays : ndarray of bool
        Whether the nominal is repaid.
    """

    holding: IntArray
    is_floating: NDArray[np.bool_]
    is_swap: NDArray[np.bool_]
    is_deposit: NDArray[np.bool_]
    pays_coupons: NDArray[np.bool_]
    months: IntArray
    end: DateArray
    start: DateArray
    first: DateArray
    nominal: FloatArray
    rate: FloatArray
    current_rate: FloatArray
    count: IntArray
    amortisation: IntArray
    ex_days: IntArray
    bought_ex: NDArray[np.bool_]
    repays: NDArray[np.bool_]

    def __len__(self) -> int:
        """Number of legs."""
        return int(self.holding.size)

    def taken(self, index: NDArray[np.int64]) -> Legs:
        """The legs of an index, in its order."""
        return Legs(**{field.name: getattr(self, field.name)[index] for field in fields(self)})


def _dates(days: Sequence[date | None]) -> DateArray:
    """Dates as an array; NaT for none."""
    return np.array(days, dtype="M8[D]")


def _floats(values: Sequence[float | None]) -> FloatArray:
    """Numbers as an array; NaN for none."""
    return np.array(values, dtype=np.float64)


def holding_legs(holdings: Sequence[Holding], *, valuation_date: date) -> Legs:
    """The legs of holdings, in their order, the fixed leg of a swap before the floating one.

    Parameters
    ----------
    holdings : sequence of Holding
    valuation_date : datetime.date
        The day on which a deposit is had.

    Returns
    -------
    Legs
    """
    kind = np.array([_KIND_NUMBER[holding.kind] for holding in holdings], dtype=np.int64)

    def is_kind(*kinds: HoldingKind) -> NDArray[np.bool_]:
        return np.isin(kind, [_KIND_NUMBER[own] for own in kinds])

    is_payer = is_kind(HoldingKind.PAYER_SWAP)
    is_swap = is_payer | is_kind(HoldingKind.RECEIVER_SWAP)
    is_floater = is_kind(HoldingKind.FLOATER)
    is_bond = is_kind(HoldingKind.BOND, HoldingKind.LINKED_BOND)
    is_deposit = is_kind(HoldingKind.DEPOSIT)
    is_money = is_kind(HoldingKind.BILL, HoldingKind.TERM_DEPOSIT)
    has_rate = is_bond | is_swap | is_kind(HoldingKind.TERM_DEPOSIT)

    nominal = _floats([holding.nominal for holding in holdings])
    coupon = np.where(has_rate, _floats([holding.coupon for holding in holdings]), 0.0)
    frequency = np.array([holding.frequency for holding in holdings], dtype=np.int64)
    amortisation = np.array(
        [_AMORTISATION_NUMBER[holding.amortisation] for holding in holdings], dtype=np.int64
    )
    count = day_count_codes([holding.day_count for holding in holdings])
    unstated = np.array([holding.day_count is None for holding in holdings], dtype=np.bool_)
    count = np.where(is_money & unstated, day_count_codes([DayCount.ACT_360]), count)
    end = np.where(
        is_deposit, np.datetime64(valuation_date, "D"), _dates([holding.maturity for holding in holdings])
    )
    usual = np.isin(frequency, (1, 2, 4, 12))
    fixed = Legs(
        holding=np.arange(len(holdings)),
        is_floating=np.zeros(len(holdings), dtype=np.bool_),
        is_swap=is_swap,
        is_deposit=is_deposit,
        # A bond without coupons pays once, unless it repays in parts.
        pays_coupons=is_floater | is_swap | (is_bond & ((coupon != 0.0) | (amortisation > 0))),
        months=np.where(usual, 12 // np.where(usual, frequency, 1), _STEP_ONCE),
        end=end,
        start=_dates([holding.start_date for holding in holdings]),
        first=_dates([holding.first_coupon for holding in holdings]),
        nominal=np.where(is_payer, -nominal, nominal),
        rate=coupon,
        current_rate=np.full(len(holdings), np.nan),
        count=count,
        amortisation=amortisation,
        ex_days=np.where(
            is_bond | is_floater,
            np.array([holding.ex_dividend_days for holding in holdings], dtype=np.int64),
            0,
        ),
        bought_ex=np.array([holding.bought_ex_dividend for holding in holdings], dtype=np.bool_),
        repays=~is_swap,
    )
    floating = np.flatnonzero(is_floater | is_swap)
    pays = np.flatnonzero(~is_floater & ~is_kind(HoldingKind.FUND, HoldingKind.PROPERTY))
    legs = fixed.taken(pays)
    if floating.size:
        legs = _with_floating(fixed, pays, floating, holdings, is_swap, nominal)
    is_floored = np.array([holding.has_principal_floor for holding in holdings], dtype=np.bool_)
    return _with_floored(legs, np.flatnonzero(is_floored[legs.holding] & legs.pays_coupons))


def _with_floored(legs: Legs, split: IntArray) -> Legs:
    """The legs with the principal of those at `split` in a leg of its own, after that of the coupons."""
    if not split.size:
        return legs
    of_leg = legs.taken(split)
    principal = replace(
        of_leg,
        pays_coupons=np.zeros(split.size, dtype=np.bool_),
        rate=np.zeros(split.size),
    )
    repays = legs.repays.copy()
    repays[split] = False
    return _joined([replace(legs, repays=repays), principal])


def _joined(legs: list[Legs]) -> Legs:
    """Legs in the order of their holdings."""
    together = Legs(
        **{field.name: np.concatenate([getattr(leg, field.name) for leg in legs]) for field in fields(Legs)}
    )
    return together.taken(np.argsort(together.holding, kind="stable"))


def _with_floating(
    fixed: Legs,
    pays: IntArray,
    floating: IntArray,
    holdings: Sequence[Holding],
    is_swap: NDArray[np.bool_],
    nominal: FloatArray,
) -> Legs:
    """The legs `pays` of `fixed`, and a floating leg for each of the holdings `floating`."""
    own = [holdings[number] for number in floating.tolist()]
    base = fixed.taken(floating)
    swap = is_swap[floating]
    stated = np.array([holding.floating_frequency or holding.frequency for holding in own], dtype=np.int64)
    counts = day_count_codes([holding.floating_day_count for holding in own])
    no_count = np.array([holding.floating_day_count is None for holding in own], dtype=np.bool_)
    legs = [fixed.taken(pays)]
    legs.append(
        Legs(
            holding=floating,
            is_floating=np.ones(floating.size, dtype=np.bool_),
            is_swap=swap,
            is_deposit=base.is_deposit,
            pays_coupons=base.pays_coupons,
            months=np.where(swap, 12 // stated, base.months),
            end=base.end,
            start=base.start,
            first=base.first,
            nominal=np.where(swap, -base.nominal, nominal[floating]),
            rate=_floats([holding.margin for holding in own]),
            current_rate=_floats([holding.current_rate for holding in own]),
            count=np.where(~swap | no_count, base.count, counts),
            amortisation=base.amortisation,
            ex_days=base.ex_days,
            bought_ex=base.bought_ex,
            repays=base.repays,
        )
    )
    return _joined(legs)
