"""Holdings priced: what each is expected to pay, and the spread it is discounted at."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.book import Basis, Fault, Holding, HoldingKind, Indexation, PriceKind, Severity
from desk.book.arrays import FloatArray, IntArray
from desk.book.schedule import HoldingFlows, holding_flows
from desk.rates.curve import DiscountCurve
from desk.rates.day_count import DayCount, year_fraction
from desk.valuation.credit import expected_rows
from desk.valuation.floating import floating_interest, implied_current_rates, replicating_amounts
from desk.valuation.indexing import grown
from desk.valuation.linked import is_linked, linked_rows, no_inflation
from desk.valuation.spread import solve_spreads

__all__ = ["STATED_KINDS", "PricedHoldings", "price_holdings"]

STATED_KINDS = (HoldingKind.FUND, HoldingKind.PROPERTY)
"""Kinds without flows: they count at their market value, with a stated duration."""

_SPREAD_KINDS = frozenset(
    {
        HoldingKind.BOND,
        HoldingKind.ZERO,
        HoldingKind.FLOATER,
        HoldingKind.BILL,
        HoldingKind.TERM_DEPOSIT,
        HoldingKind.LINKED_BOND,
    }
)
_MOST_APART = 0.01  # part of the market value by which the price may miss it


@dataclass(frozen=True, eq=False)
class PricedHoldings:
    """Holdings with their flows and spreads: n rows of m holdings.

    Attributes
    ----------
    flows : HoldingFlows
        As the holdings state them; a floating rate that is not stated is filled in from the curve.
    promised : ndarray, shape (n,)
        What each row pays without default, floating interest as projected [currency].
    payment : ndarray, shape (n,)
        What it is expected to pay [currency].
    amount : ndarray, shape (n,)
        Fixed amounts worth the same as `payment` on any curve (see `desk.valuation.floating`) [currency].
    spread : ndarray, shape (m,)
        Over the curve, at which the expected payments give the value stated; 0 where none is [1/year].
    accrued : ndarray, shape (m,)
        Accrued interest; negative while a buyer no longer gets the next coupon [currency].
    promised_to_buyer, payment_to_buyer : ndarray, shape (n,)
        The same for a buyer on the valuation date, who no longer gets the next coupon while the holding
        trades ex-dividend [currency].
    is_ex : ndarray of bool, shape (m,)
        Whether a buyer no longer gets the next coupon.
    stated_value : ndarray, shape (m,)
        What the source says the whole holding is worth: the market value, or what the price comes to
        [currency]; NaN where it says neither.
    credit_loss : ndarray, shape (m,)
        Present value of the promised less the expected payments, both at `spread` [currency]; NaN where no
        default is expected.
    faults : tuple of Fault
        What could not be done as asked, all of the mild kind.
    index_ratio : ndarray, shape (m,)
        Of linked bonds, 1 for the others: by it nominal and price are money of today.
    index_factor : ndarray, shape (n,)
        Growth from today that is expected of each row; all amounts above hold it.
    index_class : ndarray of int, shape (n,), or None
        Into `indexations`; -1 where a row follows no index. None where none does.
    indexations : tuple of Indexation
    """

    flows: HoldingFlows
    promised: FloatArray
    payment: FloatArray
    amount: FloatArray
    spread: FloatArray
    accrued: FloatArray
    promised_to_buyer: FloatArray
    payment_to_buyer: FloatArray
    is_ex: NDArray[np.bool_]
    stated_value: FloatArray
    credit_loss: FloatArray
    faults: tuple[Fault, ...]
    index_ratio: FloatArray
    index_factor: FloatArray
    index_class: IntArray | None = None
    indexations: tuple[Indexation, ...] = ()


@dataclass(frozen=True, eq=False)
class _Stated:
    """What the source says holdings are worth, each array shape (m,); NaN where it does not."""

    market: FloatArray
    of_price: FloatArray
    by_price: NDArray[np.bool_]

    @property
    def value(self) -> FloatArray:
        """The value that counts."""
        return np.where(self.by_price, self.of_price, self.market)


def price_holdings(holdings: Sequence[Holding], basis: Basis) -> PricedHoldings:
    """Price holdings on a basis.

    Parameters
    ----------
    holdings : sequence of Holding, length m
    basis : Basis

    Returns
    -------
    PricedHoldings
        A bond, zero, floater, bill or term deposit with a market value, else with a price, has the spread at
        which its expected payments are worth that, else none. A price is that of the outstanding nominal for
        a buyer: accrued interest is added to a clean one, and the next coupon is left out of it while it
        trades ex-dividend, though the holder gets it. Swaps have no spread. A deposit is worth its market
        value if it has one, else its nominal.

        Payments of a linked bond are those of a bond, times its index ratio, times the growth of the index
        that is expected until they are paid: ``I(t - lag) / I(-lag)``, by `desk.rates.inflation`. Its price
        in real terms, and its accrued interest, are money once multiplied by the index ratio. The spread is
        over the nominal curve. A principal with a floor is worth the expected value of the greater of the
        two, by the lognormal model.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    curve, count = basis.curve, len(holdings)
    flows = holding_flows(holdings, valuation_date=basis.valuation_date, day_count=basis.day_count)
    rates = implied_current_rates(flows, curve)
    known, missed = _with_current_rates(flows, rates)
    accrued, is_ex = _accrued(flows, rates, count)
    linked = linked_rows(holdings, flows, basis.inflation)
    ratio, growth = linked.ratio, linked.factor
    uplift = ratio[flows.holding] * growth
    if linked.is_any:
        known, missed, accrued = grown(known, uplift), grown(missed, uplift), accrued * ratio
    stated = _stated(holdings, basis, accrued, ratio)
    is_deposit = np.array([holding.kind is HoldingKind.DEPOSIT for holding in holdings], dtype=np.bool_)
    quoted = is_deposit & ~np.isnan(stated.market)
    if quoted.any():
        known = np.where(quoted[flows.holding], stated.market[flows.holding], known)

    projected = floating_interest(flows, curve)
    promised = known + projected
    promised_to_buyer = promised - missed if missed.any() else promised
    payment, to_buyer, floating = promised, promised_to_buyer, flows.floating
    expected = expected_rows(
        flows,
        default_rate=np.array([holding.default_rate for holding in holdings], dtype=np.float64),
        recovery_rate=np.array([holding.recovery_rate for holding in holdings], dtype=np.float64),
    )
    if expected is not None:
        recovered = grown(expected.recovered, uplift) if linked.is_any else expected.recovered
        payment = promised * expected.survival + recovered
        to_buyer = promised_to_buyer * expected.survival + recovered
        known = known * expected.survival + recovered
        floating = floating * expected.survival
    if to_buyer is not payment:
        to_buyer = np.where(missed != 0.0, to_buyer, payment)

    solved = _solved(holdings, stated, flows, payment, to_buyer, curve)
    unstated = flows.running.holding[np.isnan(flows.running.rate)]
    faults = _faults(holdings, stated, solved, flows, np.unique(unstated), payment - to_buyer)
    if linked.is_any and basis.inflation is None:
        faults = (
            *faults,
            *no_inflation([holding.name for holding in holdings if is_linked(holding)], sheet="Holdings"),
        )
    spread = np.where(np.isfinite(solved), solved, 0.0)
    return PricedHoldings(
        flows=flows,
        promised=promised,
        payment=payment,
        amount=replicating_amounts(flows, known=known, floating=floating, spread=spread),
        spread=spread,
        accrued=accrued,
        promised_to_buyer=promised_to_buyer,
        payment_to_buyer=to_buyer,
        is_ex=is_ex,
        stated_value=_whole_value(stated, flows, payment - to_buyer, spread, curve),
        credit_loss=_credit_loss(holdings, flows, promised - payment, spread, curve),
        faults=faults,
        index_ratio=ratio,
        index_factor=growth,
        index_class=linked.index_class,
        indexations=linked.indexations,
    )


def _with_current_rates(flows: HoldingFlows, rates: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Known amounts with rates filled in, and what of each row the holder gets and a buyer does not."""
    running = flows.running
    known, missed = flows.amount, np.zeros(flows.amount.size)
    filled = np.flatnonzero(np.isnan(running.rate) & running.is_received)
    if filled.size:
        known = known.copy()
        # The two legs of a swap end their periods in rows of their own.
        known[running.row[filled]] += (running.nominal * rates * running.fraction)[filled]
    kept = running.is_ex & running.is_received
    missed[running.row[kept]] = (running.nominal * rates * running.fraction)[kept]
    return known, missed


def _accrued(flows: HoldingFlows, rates: FloatArray, count: int) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Accrued interest of each holding, and whether it trades ex-dividend."""
    running = flows.running
    years = running.accrued_fraction - np.where(running.is_ex, running.fraction, 0.0)
    accrued = np.bincount(running.holding, weights=running.nominal * rates * years, minlength=count).astype(
        np.float64
    )
    is_ex = np.zeros(count, dtype=np.bool_)
    is_ex[running.holding[running.is_ex]] = True
    return accrued, is_ex


def _numbers(values: Sequence[float | None]) -> FloatArray:
    """Numbers as an array; NaN for none."""
    return np.array(values, dtype=np.float64)


def _stated(
    holdings: Sequence[Holding], basis: Basis, accrued: FloatArray, index_ratio: FloatArray
) -> _Stated:
    """What the source says the holdings are worth."""
    market = _numbers([holding.market_value for holding in holdings])
    price = _numbers([holding.price for holding in holdings])
    today = np.datetime64(basis.valuation_date, "D")
    for number, holding in enumerate(holdings):
        if holding.discount_rate is not None and holding.maturity is not None:
            day_count = holding.day_count or DayCount.ACT_360
            years = float(year_fraction(today, np.datetime64(holding.maturity, "D"), day_count))
            price[number] = 100.0 * (1.0 - holding.discount_rate * years)
    nominal = index_ratio * np.array([holding.nominal for holding in holdings], dtype=np.float64)
    is_clean = np.array([holding.price_kind is PriceKind.CLEAN for holding in holdings], dtype=np.bool_)
    of_price = nominal * price / 100.0 + np.where(is_clean, accrued, 0.0)
    return _Stated(market, of_price, np.isnan(market) & ~np.isnan(price))


def _solved(
    holdings: Sequence[Holding],
    stated: _Stated,
    flows: HoldingFlows,
    payment: FloatArray,
    to_buyer: FloatArray,
    curve: DiscountCurve,
) -> FloatArray:
    """Spreads that give the stated values; 0 where none is stated, NaN where none gives it."""
    has_kind = np.array([holding.kind in _SPREAD_KINDS for holding in holdings], dtype=np.bool_)
    value = stated.value
    is_solved = has_kind & ~np.isnan(value)
    rows = is_solved[flows.holding]
    if not rows.any():
        return np.zeros(len(holdings))
    wanted = np.where(stated.by_price[flows.holding[rows]], to_buyer[rows], payment[rows])
    spread = solve_spreads(
        flows.holding[rows],
        flows.time[rows],
        wanted,
        market_value=np.where(is_solved, value, 0.0),
        curve=curve,
    )
    return np.where(is_solved, spread, 0.0)


def _whole_value(
    stated: _Stated, flows: HoldingFlows, missed: FloatArray, spread: FloatArray, curve: DiscountCurve
) -> FloatArray:
    """What the source says the whole holding is worth, the coupon that a buyer does not get included."""
    value = stated.value
    rows = np.flatnonzero((missed != 0.0) & stated.by_price[flows.holding])
    if rows.size:
        own, time = flows.holding[rows], flows.time[rows]
        value[own] += missed[rows] * curve.discount(time) * np.exp(-spread[own] * time)
    return value


def _credit_loss(
    holdings: Sequence[Holding],
    flows: HoldingFlows,
    missing: FloatArray,
    spread: FloatArray,
    curve: DiscountCurve,
) -> FloatArray:
    """Present value of what default is expected to take, shape (m,)."""
    may_default = np.array([holding.default_rate > 0.0 for holding in holdings], dtype=np.bool_)
    loss = np.full(len(holdings), np.nan)
    rows = np.flatnonzero(may_default[flows.holding])
    if may_default.any():
        own, time = flows.holding[rows], flows.time[rows]
        with np.errstate(over="ignore", under="ignore", invalid="ignore"):
            worth = missing[rows] * curve.discount(time) * np.exp(-spread[own] * time)
        loss = np.where(may_default, np.bincount(own, weights=worth, minlength=len(holdings)), np.nan)
    return loss


def _faults(
    holdings: Sequence[Holding],
    stated: _Stated,
    solved: FloatArray,
    flows: HoldingFlows,
    no_current_rate: NDArray[np.int64],
    missed: FloatArray,
) -> tuple[Fault, ...]:
    """What could not be done for each holding."""
    pays = np.zeros(len(holdings), dtype=np.bool_)
    pays[flows.holding] = True
    unset = np.zeros(len(holdings), dtype=np.bool_)
    unset[no_current_rate] = True
    of_price = stated.of_price + np.bincount(flows.holding, weights=missed, minlength=len(holdings))
    with np.errstate(invalid="ignore"):
        apart = np.abs(of_price - stated.market) > _MOST_APART * np.abs(stated.market)
    is_stated = np.array([holding.kind in STATED_KINDS for holding in holdings], dtype=np.bool_)
    odd = (is_stated & np.isnan(stated.market)) | (~is_stated & ~pays) | ~np.isfinite(solved) | apart | unset
    faults = []
    for number in np.flatnonzero(odd).tolist():
        holding = holdings[number]
        if is_stated[number]:
            if holding.market_value is None:
                faults.append(
                    _fault(
                        holding,
                        "no market value",
                        f"the market value of a {holding.kind}",
                        "It counts as 0; state its market value.",
                    )
                )
            continue
        if not pays[number]:
            faults.append(
                _fault(
                    holding,
                    f"maturity {holding.maturity}",
                    "a maturity after the valuation date",
                    "It counts as 0; remove it or state what it has become.",
                )
            )
            continue
        if unset[number]:
            faults.append(
                _fault(
                    holding,
                    "no current rate",
                    "the floating rate of the running period",
                    "It is estimated from the curve; state it.",
                )
            )
        if not np.isfinite(solved[number]):
            faults.append(
                _fault(
                    holding,
                    f"{_worth_in_words(holding)} that no spread gives",
                    "a market value of the whole holding that its flows can be worth"
                    if holding.market_value is not None
                    else "a price that its flows can be worth",
                    "It is valued on the curve without a spread; check market value, nominal and coupon."
                    if holding.market_value is not None
                    else "It is valued on the curve without a spread; check price, nominal and coupon.",
                )
            )
        elif apart[number]:
            faults.append(
                _fault(
                    holding,
                    f"a market value of {holding.market_value:,.2f} and a price that comes to "
                    f"{of_price[number]:,.2f}",
                    "figures that agree",
                    "The market value counts; correct or remove one of them.",
                )
            )
    return tuple(faults)


def _worth_in_words(holding: Holding) -> str:
    """The figure from which a spread was to be found."""
    if holding.market_value is not None:
        return f"a market value of {holding.market_value:g}"
    if holding.price is not None:
        return f"a {holding.price_kind} price of {holding.price:g}"
    return f"a discount rate of {holding.discount_rate:g}"


def _fault(holding: Holding, found: str, expected: str, mend: str) -> Fault:
    """A mild fault that names the holding."""
    return Fault(
        found=f"holding {holding.name!r} has {found}",
        expected=expected,
        mend=mend,
        sheet="Holdings",
        severity=Severity.MILD,
    )
