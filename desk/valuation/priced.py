"""The future flows of one side, each with the spread it is discounted at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.book import Book, Fault, FlowTable, Holding, HoldingKind, PricedFlows, Severity, Side
from desk.book.arrays import FloatArray
from desk.book.schedule import holding_flows
from desk.valuation.spread import solve_spreads

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
    """

    flows: PricedFlows
    date: NDArray[np.datetime64]
    faults: tuple[Fault, ...]


def priced_flows(book: Book, side: Side) -> PricedSide:
    """The future flows of one side of a book with their spreads.

    Parameters
    ----------
    book : Book
    side : Side

    Returns
    -------
    PricedSide
        Liabilities: the lines of the book's table, each row at the liability spread plus its beta times
        the market risk premium. Assets: each holding is a line, in order and by position, so that
        holdings of one name stay apart; then the lines of ready-made flows, at no spread. A bond or zero
        with a market value is discounted at the spread that gives that value, else at no spread. A
        deposit is a flow today of its market value if it has one, else of its nominal. A fund is one row
        at its stated duration, 0 by default, worth its market value. Rows on or before the valuation date
        are left out.

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
    flows = PricedFlows(
        side=Side.LIABILITIES,
        line_names=table.line_names,
        line=table.line[kept],
        time=table.time[kept],
        amount=table.amount[kept],
        spread=basis.liability_spread + table.beta[kept] * basis.market_risk_premium,
        is_flow=np.ones(int(np.count_nonzero(kept)), dtype=np.bool_),
    )
    return PricedSide(flows, table.date[kept], _past_rows(table, "Liabilities"))


def _assets(book: Book) -> PricedSide:
    """Holdings, then ready-made flows."""
    holdings, table, curve = book.holdings, book.asset_flows, book.basis.curve
    own = holding_flows(holdings, valuation_date=book.basis.valuation_date, day_count=book.basis.day_count)
    is_solved = np.array([_takes_spread(holding) for holding in holdings], dtype=np.bool_)
    market = np.array(
        [0.0 if holding.market_value is None else holding.market_value for holding in holdings],
        dtype=np.float64,
    )
    stated = np.array([holding.market_value is not None for holding in holdings], dtype=np.bool_)
    is_deposit = np.array([holding.kind is HoldingKind.DEPOSIT for holding in holdings], dtype=np.bool_)
    amount = np.where((is_deposit & stated)[own.holding], market[own.holding], own.amount)

    spread = np.zeros(len(holdings))
    rows = is_solved[own.holding]
    if rows.any():
        solved = solve_spreads(
            own.holding[rows], own.time[rows], amount[rows], market_value=market, curve=curve
        )
        spread = np.where(is_solved, solved, 0.0)
    has_rows = np.bincount(own.holding, minlength=len(holdings)) > 0
    faults = _holding_faults(holdings, spread, has_rows)
    spread = np.where(np.isfinite(spread), spread, 0.0)

    funds = np.flatnonzero([holding.kind is HoldingKind.FUND for holding in holdings])
    fund_time = np.array([holdings[number].duration or 0.0 for number in funds], dtype=np.float64)
    fund_amount = market[funds] / curve.discount(fund_time)
    kept = table.future
    no_date = np.full(funds.size, np.datetime64("NaT", "D"))
    own_line = np.concatenate((own.holding, funds))
    order = np.argsort(own_line, kind="stable")

    def joined(of_bonds: FloatArray, of_funds: FloatArray, ready_made: FloatArray) -> FloatArray:
        return np.concatenate((np.concatenate((of_bonds, of_funds))[order], ready_made))

    flows = PricedFlows(
        side=Side.ASSETS,
        line_names=(*(holding.name for holding in holdings), *table.line_names),
        line=np.concatenate((own_line[order], table.line[kept] + len(holdings))),
        time=joined(own.time, fund_time, table.time[kept]),
        amount=joined(amount, fund_amount, table.amount[kept]),
        spread=joined(spread[own.holding], np.zeros(funds.size), np.zeros(int(np.count_nonzero(kept)))),
        is_flow=np.concatenate(
            (np.arange(order.size)[order] < own.holding.size, np.ones(int(np.count_nonzero(kept)), np.bool_))
        ),
    )
    dates = np.concatenate((np.concatenate((own.date, no_date))[order], table.date[kept]))
    return PricedSide(flows, dates, (*faults, *_past_rows(table, "Asset flows")))


def _takes_spread(holding: Holding) -> bool:
    """Whether a spread is to be solved from the holding's market value."""
    return holding.kind in (HoldingKind.BOND, HoldingKind.ZERO) and holding.market_value is not None


def _holding_faults(
    holdings: tuple[Holding, ...], spread: FloatArray, has_rows: NDArray[np.bool_]
) -> tuple[Fault, ...]:
    """What could not be done for each holding."""
    faults = []
    for holding, solved, pays in zip(holdings, spread, has_rows, strict=True):
        if holding.kind is HoldingKind.FUND:
            if holding.market_value is None:
                found, expected = "no market value", "the market value of a fund"
                mend = "It counts as 0; state its market value."
                faults.append(_holding_fault(holding, found, expected, mend))
        elif not pays:
            found, expected = f"maturity {holding.maturity}", "a maturity after the valuation date"
            mend = "It counts as 0; remove it or state what it has become."
            faults.append(_holding_fault(holding, found, expected, mend))
        elif not np.isfinite(solved):
            found = f"a market value of {holding.market_value:g} that no spread gives"
            expected = "a market value of the whole holding that its flows can be worth"
            mend = "It is valued on the curve without a spread; check market value, nominal and coupon."
            faults.append(_holding_fault(holding, found, expected, mend))
    return tuple(faults)


def _holding_fault(holding: Holding, found: str, expected: str, mend: str) -> Fault:
    """A mild fault that names the holding."""
    return Fault(
        found=f"holding {holding.name!r} has {found}",
        expected=expected,
        mend=mend,
        sheet="Holdings",
        severity=Severity.MILD,
    )
