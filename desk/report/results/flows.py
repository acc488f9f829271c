"""The sheets of flows: each row of both sides with the formulas that give its present value.

Above `ROW_CAP` rows a side is shown by line and year; what a row is worth is then a value, not a formula,
and the sheet says so.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import PricedFlows, Side
from desk.book.arrays import FloatArray
from desk.rates.curve import DiscountCurve
from desk.report.results.further_columns import FurtherColumns
from desk.report.results.naming import FIRST, Naming
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan, column_letter

__all__ = ["COLUMNS", "PAID", "ROW_CAP", "FlowSheet", "further_columns", "plan_flows"]

ROW_CAP = 20_000
SHEET_NAMES = {Side.ASSETS: "Asset flows", Side.LIABILITIES: "Liabilities"}
COLUMNS = (
    "line_name",
    "line",
    "date",
    "time",
    "year",
    "payment",
    "amount",
    "zero",
    "spread",
    "discount",
    "value",
    "timed",
    "timed_twice",
    "reported",
    "difference",
)
PAID = "paid"
"""A further column where what is paid is not what is discounted: floating interest."""
_YEAR_SLACK = 1e-9  # year k ends with time k, whatever rounding left of it


@dataclass(frozen=True)
class FlowSheet:
    """A planned sheet of flows.

    Attributes
    ----------
    plan : SheetPlan
    prefix : str
        How the names of its columns begin.
    names : dict of str to str
        Names that the workbook defines, each with the area it stands for.
    is_by_row : bool
        False where the rows are sums by line and year.
    rows_before : int
        Rows of the side before they were summed up.
    reported_value : float
        Sum of the present values of the rows as the program computed them.
    line_size : ndarray, shape (k,)
        Of each line, the sum of its rows' present values without their signs [currency].
    has_paid : bool
        Whether the column of what is paid stands there; else it is the amount.
    follows_inflation : bool
        Whether the columns of growth with expected inflation stand there.
    """

    plan: SheetPlan
    prefix: str
    names: dict[str, str]
    is_by_row: bool
    rows_before: int
    reported_value: float
    line_size: FloatArray
    has_paid: bool
    follows_inflation: bool = False


def further_columns(flows: PricedFlows) -> FurtherColumns:
    """The place of further columns, none yet."""
    return FurtherColumns(len(COLUMNS) + 1 + (flows.payment is not None))


def plan_flows(
    flows: PricedFlows,
    dates: NDArray[np.datetime64],
    curve: DiscountCurve,
    *,
    currency: str,
    further: FurtherColumns | None = None,
    naming: Naming = FIRST,
) -> FlowSheet:
    """Plan the sheet of one side.

    Parameters
    ----------
    flows : PricedFlows
    dates : ndarray of datetime64[D], shape (n,)
    curve : DiscountCurve
    currency : str
    further : FurtherColumns, optional
        Left out where rows are summed up.
    naming : Naming

    Returns
    -------
    FlowSheet
    """
    by_row = len(flows) <= ROW_CAP
    zero = curve.zero(flows.time)
    value = flows.amount * np.exp(-(zero + flows.spread) * flows.time)
    year = np.maximum(np.ceil(flows.time - _YEAR_SLACK), 1.0)
    own = further if further is not None and by_row else further_columns(flows)
    if by_row:
        block = _row_block(flows, dates, zero=zero, value=value, year=year, further=own)
    else:
        block = _summed_block(flows, value=value, year=year)
    plan = _plan(flows, block, currency=currency, by_row=by_row, further=own, naming=naming)
    last = FIRST_ROW + max(block.count, 1) - 1
    prefix = naming.prefix(flows.side)
    names = {
        f"{prefix}_{name}": plan.area(number, FIRST_ROW, last)
        for number, name in enumerate(COLUMNS, start=1)
        if name not in ("line_name", "date", "zero", "spread", "reported")
    }
    has_paid = flows.payment is not None
    names[f"{prefix}_{PAID}"] = (
        plan.area(len(COLUMNS) + 1, FIRST_ROW, last) if has_paid else names[f"{prefix}_amount"]
    )
    names |= {
        f"{prefix}_{column.name}": plan.area(number, FIRST_ROW, last)
        for number, column in enumerate(own.columns, start=own.first)
        if column.name
    }
    size = np.bincount(flows.line, weights=np.abs(value), minlength=len(flows.line_names))
    return FlowSheet(
        plan,
        prefix,
        names,
        by_row,
        len(flows),
        float(value.sum()),
        line_size=size.astype(np.float64),
        has_paid=has_paid,
        follows_inflation=any(column.name == "inflation_rise" for column in own.columns),
    )


def _plan(
    flows: PricedFlows,
    block: Block,
    *,
    currency: str,
    by_row: bool,
    further: FurtherColumns,
    naming: Naming,
) -> SheetPlan:
    """Title, headings and the row of sums."""
    what = "Payments promised" if flows.side is Side.LIABILITIES else "Payments of the assets"
    if by_row:
        note = (
            "Present value = amount × EXP(−(zero rate + spread) × time), recomputed in each row. Zero rates "
            "are continuously compounded."
        )
    else:
        note = (
            f"{len(flows):,} flows, more than the {ROW_CAP:,} that are shown one by one: summed by line and "
            "year. The present values of the rows are values, not formulas."
        )
    has_paid = flows.payment is not None
    if has_paid:
        note += " Floating interest counts at the fixed amounts that are worth it on any curve."
    if further.amount is not None:
        note += " Amounts that grow are those in today's money times their growth."
    name, title = SHEET_NAMES[flows.side], f"{what} after the valuation date"
    plan = SheetPlan(naming.sheet(name), naming.title(title), note, block=block)
    plan.widths = dict(
        enumerate(
            (26.0, 7.0, 12.0, 11.0, 7.0, 9.0, 17.0, 11.0, 11.0, 13.0, 17.0, 19.0, 20.0, 17.0, 13.0, 17.0),
            start=1,
        )
    )
    computed = "recomputed" if by_row else "summed"
    plan.headings(
        [
            "Line",
            "Line number",
            "Date",
            "Time [years]" if by_row else "Mean time [years]",
            "Year",
            "Payment [1 = yes]",
            f"Amount [{currency}]",
            "Zero rate [a year]",
            "Spread [a year]",
            f"Discount factor, {computed}" if by_row else "Mean discount factor",
            f"Present value, {computed} [{currency}]",
            f"Time × present value [{currency} × years]",
            f"Time² × present value [{currency} × years²]",
            f"Present value, reported [{currency}]",
            f"Difference [{currency}]",
            *([f"Paid, as projected [{currency}]"] if has_paid else []),
            *(column.heading for column in further.columns),
        ]
    )
    plan.widths |= {
        number: column.width for number, column in enumerate(further.columns, start=further.first)
    }
    last = FIRST_ROW + max(block.count, 1) - 1
    plan.put(HEADING_ROW - 1, 6, "Sum", "text")
    summed = ("amount", "value", "timed", "timed_twice", "reported", "difference", PAID)
    for number, name in enumerate((*COLUMNS, *([PAID] if has_paid else [])), start=1):
        if name in summed:
            letter = column_letter(number)
            form = "tiny" if name == "difference" else "money"
            total = Formula(f"=SUM({letter}{FIRST_ROW}:{letter}{last})")
            plan.put(HEADING_ROW - 1, number, total, "live", form)
    for number, column in enumerate(further.columns, start=further.first):
        if column.is_summed:
            letter = column_letter(number)
            total = Formula(f"=SUM({letter}{FIRST_ROW}:{letter}{last})")
            plan.put(HEADING_ROW - 1, number, total, "live", column.form)
    if not block.count:
        plan.put(FIRST_ROW, 1, "This side has no flows.", "note")
    return plan


_FORMS = (
    "text",
    "whole",
    "date",
    "years",
    "whole",
    "whole",
    "money2",
    "rate",
    "rate",
    "factor",
    "money2",
    "money2",
    "money2",
    "money2",
    "tiny",
    "money2",
)


def _row_block(
    flows: PricedFlows,
    dates: NDArray[np.datetime64],
    *,
    zero: FloatArray,
    value: FloatArray,
    year: FloatArray,
    further: FurtherColumns,
) -> Block:
    """One row a flow, with formulas."""
    has_paid = flows.payment is not None

    def rows() -> Iterator[Sequence[Any]]:
        names = flows.line_names
        columns = (
            (flows.line + 1).tolist(),
            dates.astype(object).tolist(),
            flows.time.tolist(),
            year.tolist(),
            flows.is_flow.astype(np.int64).tolist(),
            flows.amount.tolist(),
            zero.tolist(),
            flows.spread.tolist(),
            value.tolist(),
            flows.paid.tolist(),
        )
        for number, cells in enumerate(zip(*columns, strict=True)):
            row = FIRST_ROW + number
            line, date, time, year_number, payment, amount, rate, spread, worth, paid = cells
            if further.amount is not None:
                amount = further.amount(row, number)
            if further.spread is not None:
                spread = further.spread(row, number)
            if further.paid is not None:
                paid = further.paid(row, number)
            yield (
                names[line - 1],
                line,
                date,
                time,
                year_number,
                payment,
                amount,
                rate,
                spread,
                Formula(f"=EXP(-(H{row}+I{row})*D{row})"),
                Formula(f"=G{row}*J{row}"),
                Formula(f"=D{row}*K{row}"),
                Formula(f"=D{row}*L{row}"),
                worth,
                Formula(f"=K{row}-N{row}"),
                *([paid] if has_paid else []),
                *(column.cells(row, number) for column in further.columns),
            )

    inputs, live = "input", "live"
    roles = (
        *("text", "text", inputs, inputs, "reported", "reported"),
        *(inputs if further.amount is None else live, inputs, inputs if further.spread is None else live),
        *(live, live, live, live, "reported", live),
        *(("reported",) if has_paid else ()),
    )
    forms = (*_FORMS[: len(roles)], *(column.form for column in further.columns))
    roles = (*roles, *(column.role for column in further.columns))
    return Block(FIRST_ROW, len(flows), roles, forms, rows)


def _summed_block(flows: PricedFlows, *, value: FloatArray, year: FloatArray) -> Block:
    """One row a line, year and kind of row, with sums as values."""
    keys = np.stack((flows.line.astype(np.float64), year, flows.is_flow.astype(np.float64)), axis=1)
    groups, place = np.unique(keys, axis=0, return_inverse=True)
    place = place.reshape(-1)
    count = len(groups)

    def sums(weights: FloatArray) -> FloatArray:
        return np.bincount(place, weights=weights, minlength=count).astype(np.float64)

    worth, amount, paid = sums(value), sums(flows.amount), sums(flows.paid)
    has_paid = flows.payment is not None
    timed, timed_twice = sums(flows.time * value), sums(flows.time**2 * value)
    size = sums(np.abs(value))
    with np.errstate(divide="ignore", invalid="ignore"):
        mean_time = sums(flows.time * np.abs(value)) / size
        mean_discount = worth / amount

    def rows() -> Iterator[Sequence[Any]]:
        columns = (groups, mean_time, amount, mean_discount, worth, timed, timed_twice, paid)
        for row, cells in enumerate(
            zip(*(column.tolist() for column in columns), strict=True), start=FIRST_ROW
        ):
            (line, year_number, payment), time, total, discount, present, first, second, projected = cells
            yield (
                flows.line_names[int(line)],
                line + 1,
                None,
                time,
                year_number,
                payment,
                total,
                None,
                None,
                discount,
                present,
                first,
                second,
                present,
                Formula(f"=K{row}-N{row}"),
                *([projected] if has_paid else []),
            )

    roles = ("text", *("text",) * 5, *("reported",) * 8, "live", *(("reported",) if has_paid else ()))
    return Block(FIRST_ROW, count, roles, _FORMS[: len(roles)], rows)
