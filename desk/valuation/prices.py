"""Holdings as the trade quotes them: clean and dirty price, accrued interest, yield, spread, durations."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from desk.book import Book, HoldingKind
from desk.book.accrual import accrual_fraction, period_around
from desk.book.arrays import FloatArray
from desk.book.holding import SWAP_KINDS
from desk.book.legs import Legs, holding_legs
from desk.valuation.holdings import STATED_KINDS, PricedHoldings, price_holdings
from desk.valuation.yields import StreetYields, street_yields

__all__ = ["HoldingPrice", "holding_prices"]

_MONEY_MARKET = frozenset({HoldingKind.BILL, HoldingKind.TERM_DEPOSIT})
_SECURITIES = (
    frozenset({HoldingKind.BOND, HoldingKind.ZERO, HoldingKind.FLOATER, HoldingKind.LINKED_BOND})
    | _MONEY_MARKET
)
_QUOTED = _SECURITIES | frozenset(SWAP_KINDS)


@dataclass(frozen=True, slots=True)
class HoldingPrice:
    """One holding as the trade quotes it; NaN where a figure has no meaning.

    Attributes
    ----------
    holding : str
        Its name.
    present_value : float
        Of the whole holding on the basis, with its spread [currency].
    accrued_interest : float
        Of the whole holding; negative while a buyer no longer gets the next coupon [currency].
    clean_price, dirty_price : float
        Per 100 of nominal, without and with accrued interest, for a buyer on the valuation date; of a linked
        bond in real terms.
    is_ex_dividend : bool
        Whether a buyer no longer gets the next coupon.
    street_yield : float
        At which the promised payments give the dirty price, compounded as often as the holding pays; simple,
        in its day count, for a bill or term deposit [1/year].
    effective_yield : float
        The same compounded once a year [1/year].
    macaulay_duration, modified_duration : float
        At the street yield y: the weighted mean of the times, and ``-(1/P) dP/dy`` [years].
    convexity : float
        ``(1/P) d²P/dy²`` [years²].
    spread : float
        Continuously compounded spread over the curve [1/year].
    spread_duration : float
        ``-(1/PV) dPV/ds`` [years].
    expected_credit_loss : float
        What expected default takes off the present value [currency].
    real_yield : float
        Of a linked bond: at which its payments in today's money give its price, compounded as often as it
        pays [1/year].
    real_modified_duration : float
        ``-(1/P) dP/dy`` for that yield [years].
    """

    holding: str
    present_value: float
    accrued_interest: float
    clean_price: float
    dirty_price: float
    is_ex_dividend: bool
    street_yield: float
    effective_yield: float
    macaulay_duration: float
    modified_duration: float
    convexity: float
    spread: float
    spread_duration: float
    expected_credit_loss: float
    real_yield: float = math.nan
    real_modified_duration: float = math.nan


def holding_prices(book: Book) -> tuple[HoldingPrice, ...]:
    """The holdings of a book as the trade quotes them, settled on the valuation date.

    Parameters
    ----------
    book : Book

    Returns
    -------
    tuple of HoldingPrice, in the order of the holdings
        Prices are the present value per 100 of nominal, less the coupon a buyer no longer gets; where the
        source states a price or market value that a spread gives, they are that figure. The yield is that of
        the promised payments, floating interest and the index as projected. A fund, property or deposit has a
        present value alone, a swap no yield and no spread.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    holdings, basis = book.holdings, book.basis
    count = len(holdings)
    priced = price_holdings(holdings, basis)
    flows = priced.flows
    curve = basis.curve
    kinds = [holding.kind for holding in holdings]
    nominal = priced.index_ratio * np.array([holding.nominal for holding in holdings], dtype=np.float64)

    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        worth = curve.discount(flows.time) * np.exp(-priced.spread[flows.holding] * flows.time)
        present = np.bincount(flows.holding, weights=priced.payment * worth, minlength=count)
        first = np.bincount(flows.holding, weights=priced.payment * worth * flows.time, minlength=count)
        to_buyer = np.bincount(flows.holding, weights=priced.payment_to_buyer * worth, minlength=count)
        price = np.asarray(to_buyer, dtype=np.float64)
        dirty = 100.0 * price / nominal
        clean = dirty - 100.0 * priced.accrued / nominal
        spread_duration = first / present

    yields = _yields(book, priced, price)
    linked = frozenset({HoldingKind.LINKED_BOND})
    real = yields
    if not linked.isdisjoint(kinds):
        real = _yields(book, priced, price, real_terms=True)
    is_stated = np.array([kind in STATED_KINDS for kind in kinds], dtype=np.bool_)
    stated = np.where(np.isnan(priced.stated_value), 0.0, priced.stated_value)
    columns = {
        "present": np.where(is_stated, stated, present),
        "accrued": priced.accrued,
        "clean": _only(clean, kinds, _QUOTED),
        "dirty": _only(dirty, kinds, _QUOTED),
        "is_ex": priced.is_ex,
        "street": _only(yields.street, kinds, _SECURITIES),
        "effective": _only(yields.effective, kinds, _SECURITIES),
        "macaulay": _only(yields.macaulay, kinds, _SECURITIES),
        "modified": _only(yields.modified, kinds, _SECURITIES),
        "convexity": _only(yields.convexity, kinds, _SECURITIES),
        "spread": _only(priced.spread, kinds, _SECURITIES),
        "spread_duration": _only(spread_duration, kinds, _SECURITIES),
        "loss": priced.credit_loss,
        "real_yield": _only(real.street, kinds, linked),
        "real_modified": _only(real.modified, kinds, linked),
    }
    names = (holding.name for holding in holdings)
    rows = zip(names, *(column.tolist() for column in columns.values()), strict=True)
    return tuple(HoldingPrice(*row) for row in rows)


def _only(column: FloatArray, kinds: list[HoldingKind], meant: frozenset[HoldingKind]) -> FloatArray:
    """A column with NaN for the kinds for which it is not meant."""
    return np.where(np.array([kind in meant for kind in kinds], dtype=np.bool_), column, np.nan)


def _yields(
    book: Book, priced: PricedHoldings, price: FloatArray, *, real_terms: bool = False
) -> StreetYields:
    """Yields of the holdings that are securities; the figures of the others mean nothing."""
    flows, holdings = priced.flows, book.holdings
    today = np.datetime64(book.basis.valuation_date, "D")
    is_security = np.array([holding.kind in _SECURITIES for holding in holdings], dtype=np.bool_)
    legs = holding_legs(holdings, valuation_date=book.basis.valuation_date)
    own = legs.taken(np.flatnonzero(is_security[legs.holding]))
    to_maturity, frequency = np.zeros(len(holdings)), np.ones(len(holdings))
    to_maturity[own.holding] = _periods_to_maturity(own, today)
    frequency[own.holding] = 12.0 / own.months
    kept = np.flatnonzero(is_security[flows.holding] & ~flows.is_start)
    holding = flows.holding[kept]
    promised = priced.promised_to_buyer[kept]
    yields = street_yields(
        holding,
        np.maximum(to_maturity[holding] - flows.periods_after[kept], 0.0),
        promised / priced.index_factor[kept] if real_terms else promised,
        price=price,
        frequency=frequency,
    )
    return _with_simple_yields(book, priced, own, yields, price, today)


def _periods_to_maturity(legs: Legs, today: np.datetime64) -> FloatArray:
    """Regular periods from today to the maturity of each leg.

    The part of the period that has gone is counted as interest accrues, and the rest is what it leaves of a
    whole one, so that clean price and yield go together on every day count.
    """
    day = np.full(len(legs), today)
    number, begin, _ = period_around(day, maturity=legs.end, months=legs.months)
    years = accrual_fraction(begin, day, code=legs.count, maturity=legs.end, months=legs.months)
    return np.asarray(number - years * 12.0 / legs.months)


def _with_simple_yields(
    book: Book,
    priced: PricedHoldings,
    legs: Legs,
    yields: StreetYields,
    price: FloatArray,
    today: np.datetime64,
) -> StreetYields:
    """The yields with simple ones for bills and term deposits."""
    kinds = np.array([holding.kind in _MONEY_MARKET for holding in book.holdings], dtype=np.bool_)
    own = legs.taken(np.flatnonzero(kinds[legs.holding]))
    if not len(own):
        return yields
    at, flows = own.holding, priced.flows
    years = accrual_fraction(
        np.full(len(own), today), own.end, code=own.count, maturity=own.end, months=own.months
    )
    paid = np.bincount(flows.holding, weights=priced.promised, minlength=price.size)[at]
    actual = np.bincount(flows.holding, weights=flows.time, minlength=price.size)[at]
    columns = [column.copy() for column in (yields.street, yields.effective)]
    with np.errstate(invalid="ignore", divide="ignore"):
        street = (paid / price[at] - 1.0) / years
        columns[0][at] = street
        columns[1][at] = np.expm1(np.log(paid / price[at]) / actual)
        growth = 1.0 + street * years
        durations = [yields.macaulay.copy(), yields.modified.copy(), yields.convexity.copy()]
        durations[0][at] = years
        durations[1][at] = years / growth
        durations[2][at] = 2.0 * years**2 / growth**2
    return StreetYields(*columns, *durations)
