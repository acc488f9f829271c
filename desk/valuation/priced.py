"""The future flows of one side, each with the spread it is discounted at."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from desk.book import Book, Fault, FlowTable, PricedFlows, Severity, Side
from desk.book.arrays import FloatArray, IntArray
from desk.valuation.holdings import STATED_KINDS, PricedHoldings, price_holdings
from desk.valuation.indexing import grown
from desk.valuation.linked import TermsOfRows, terms_of_rows

__all__ = ["PricedSide", "priced_flows"]


@dataclass(frozen=True, eq=False)
class PricedSide:
    """One side, ready to be valued.

    Attributes
    ----------
    flows : PricedFlows
    date : ndarray of datetime64[D], shape (n,)
        Of each row of `flows`; NaT where there is none.
    faults : tuple of Fault
        What could not be done as asked, all of the mild kind.
    stated_value, credit_loss : ndarray, shape (k,)
        Of each line: what the source says it is worth, and what expected default takes off its value
        [currency]; NaN where there is no such figure.
    """

    flows: PricedFlows
    date: NDArray[np.datetime64]
    faults: tuple[Fault, ...]
    stated_value: FloatArray
    credit_loss: FloatArray


def priced_flows(book: Book, side: Side) -> PricedSide:
    """The future flows of one side of a book with their spreads.

    Parameters
    ----------
    book : Book
    side : Side

    Returns
    -------
    PricedSide
        Liabilities: the lines of the book's table, each row at the liability spread at its time plus its beta
        times the market risk premium. Assets: each holding is a line, in order and by position, so that
        holdings of one name stay apart; then the lines of ready-made flows, at no spread. How holdings are
        priced stands with `desk.valuation.holdings.price_holdings`. A deposit is a flow today of its market
        value if it has one, else of its nominal. A fund or property is one row at its stated duration, 0 by
        default, worth its market value. Rows on or before the valuation date are left out.

        Terms of a line of flows stand in the place of what the basis adds to the curve there, beta counting
        on top; a flat rate is the spread that leads to it from today's curve, so that it moves with the
        curve like any spread that stays. Amounts that follow an index are those expected on the basis.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    return _liabilities(book) if side is Side.LIABILITIES else _assets(book)


def _past_rows(table: FlowTable, sheet: str) -> tuple[Fault, ...]:
    """A fault for the rows that are left out, if there are any."""
    count = int(np.count_nonzero(~table.future))
    if not count:
        return ()
    rows = "1 flow falls" if count == 1 else f"{count:,} flows fall"
    return (
        Fault(
            found=f"{rows} on or before the valuation date",
            expected="flows after the valuation date",
            mend="They are left out; remove them or change the valuation date.",
            sheet=sheet,
            severity=Severity.MILD,
        ),
    )


def _liabilities(book: Book) -> PricedSide:
    """The liabilities at their spreads."""
    table, basis = book.liabilities, book.basis
    kept = table.future
    terms = terms_of_rows(book, Side.LIABILITIES)
    amount, time = table.amount[kept], table.time[kept]
    spread = basis.liability_spread_at(time)
    if terms.spread is not None:
        spread = np.where(np.isnan(terms.spread), spread, terms.spread)
    flows = PricedFlows(
        side=Side.LIABILITIES,
        line_names=table.line_names,
        line=table.line[kept],
        time=time,
        amount=amount if terms.factor is None else grown(amount, terms.factor),
        spread=spread + table.beta[kept] * basis.market_risk_premium,
        is_flow=np.ones(int(np.count_nonzero(kept)), dtype=np.bool_),
        real_amount=None if terms.index_class is None else amount,
        index_class=terms.index_class,
        indexations=terms.indexations,
    )
    no_figure = np.full(len(table.line_names), np.nan)
    faults = (*_past_rows(table, "Liabilities"), *terms.faults)
    return PricedSide(flows, table.date[kept], faults, no_figure, no_figure)


def _assets(book: Book) -> PricedSide:
    """Holdings, then ready-made flows."""
    holdings, table = book.holdings, book.asset_flows
    priced = price_holdings(holdings, book.basis)
    terms = terms_of_rows(book, Side.ASSETS)
    own = priced.flows
    funds = np.flatnonzero([holding.kind in STATED_KINDS for holding in holdings])
    fund_time = np.array([holdings[number].duration or 0.0 for number in funds], dtype=np.float64)
    market = np.where(np.isnan(priced.stated_value[funds]), 0.0, priced.stated_value[funds])
    # At absurd rates nothing is left of a discount factor; the figures then say that they are none.
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        fund_amount = market / book.basis.curve.discount(fund_time)
    kept = table.future
    no_date = np.full(funds.size, np.datetime64("NaT", "D"))
    own_line = np.concatenate((own.holding, funds))
    order = np.argsort(own_line, kind="stable")

    def joined(of_bonds: FloatArray, of_funds: FloatArray, ready_made: FloatArray) -> FloatArray:
        return np.concatenate((np.concatenate((of_bonds, of_funds))[order], ready_made))

    real = table.amount[kept]
    ready_made = real if terms.factor is None else grown(real, terms.factor)
    spread = np.zeros(ready_made.size)
    if terms.spread is not None:
        spread = np.where(np.isnan(terms.spread), 0.0, terms.spread)
    is_flow = np.concatenate((~own.is_start, np.zeros(funds.size, dtype=np.bool_)))
    flows = PricedFlows(
        side=Side.ASSETS,
        line_names=(*(holding.name for holding in holdings), *table.line_names),
        line=np.concatenate((own_line[order], table.line[kept] + len(holdings))),
        time=joined(own.time, fund_time, table.time[kept]),
        amount=joined(priced.amount, fund_amount, ready_made),
        spread=joined(priced.spread[own.holding], np.zeros(funds.size), spread),
        is_flow=np.concatenate((is_flow[order], np.ones(ready_made.size, dtype=np.bool_))),
        payment=None if (own.period_row < 0).all() else joined(priced.payment, fund_amount, ready_made),
    )
    if priced.index_class is not None or terms.index_class is not None:
        classes = _classes(priced, terms, order, funds.size, ready_made.size)
        flows = replace(
            flows,
            real_amount=joined(priced.amount / priced.index_factor, fund_amount, real),
            index_class=classes,
            indexations=(*priced.indexations, *terms.indexations),
        )
    dates = np.concatenate((np.concatenate((own.date, no_date))[order], table.date[kept]))
    return PricedSide(
        flows,
        dates,
        (*priced.faults, *_past_rows(table, "Asset flows"), *terms.faults),
        stated_value=np.concatenate((priced.stated_value, np.full(len(table.line_names), np.nan))),
        credit_loss=np.concatenate((priced.credit_loss, np.full(len(table.line_names), np.nan))),
    )


def _classes(
    priced: PricedHoldings, terms: TermsOfRows, order: IntArray, funds: int, ready_made: int
) -> IntArray:
    """How each row of the assets grows: classes of holdings, then those of ready-made flows."""
    of_holdings = priced.index_class
    if of_holdings is None:
        of_holdings = np.full(priced.amount.size, -1)
    of_flows = np.full(ready_made, -1) if terms.index_class is None else terms.index_class
    after = np.where(of_flows >= 0, of_flows + len(priced.indexations), -1)
    return np.concatenate((np.concatenate((of_holdings, np.full(funds, -1)))[order], after))
