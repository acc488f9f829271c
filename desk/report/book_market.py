"""The sheets of market data beside the curve."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from desk.book import Notes, ScenarioSet, Volatilities, VolatilityKind, YieldHistory
from desk.report.book_sheets import rows_sheet, unless_zero
from desk.report.plain_workbook import PlainSheet, Style, Value, date_serials

__all__ = ["scenario_sheet", "volatility_rows", "yield_history_sheet"]


def volatility_rows(volatilities: Volatilities | None) -> list[tuple[Value, ...]]:
    """One row an instrument; what is as usual is left empty."""
    if volatilities is None:
        return []
    columns: tuple[Iterable[Value], ...] = (
        map(str, volatilities.instrument),
        volatilities.expiry.tolist(),
        _or_none(volatilities.length),
        _or_none(volatilities.strike),
        volatilities.volatility.tolist(),
        [None if kind is VolatilityKind.NORMAL else str(kind) for kind in volatilities.kind],
        map(unless_zero, volatilities.shift.tolist()),
        volatilities.frequency.tolist(),
    )
    return list(zip(*columns, strict=True))


def yield_history_sheet(history: YieldHistory, notes: Notes | None) -> PlainSheet:
    """One row a date, one column a term; an empty cell where there is no quote.

    Raises
    ------
    ValueError
        If the terms do not rise from above 0.
    """
    if not (np.diff(history.terms, prepend=0.0) > 0.0).all():
        raise ValueError("the terms of the yield history must be above 0 and rise")
    headings = ["Date", *history.terms.tolist()]
    styles = [Style.DATE, *[Style.PERCENT] * history.terms.size]
    rows = (
        [day, *_or_none(rates)] for day, rates in zip(date_serials(history.date), history.rates, strict=True)
    )
    return rows_sheet("Yield history", headings, rows, notes, history.date.size, styles=styles)


def scenario_sheet(scenarios: ScenarioSet, notes: Notes | None) -> PlainSheet:
    """One row a path, one column a node."""
    headings = ["Path", *scenarios.node.tolist()]
    styles = [Style.WHOLE, *[Style.PERCENT] * scenarios.node.size]
    rows = ([path, *rates.tolist()] for path, rates in enumerate(scenarios.rate, start=1))
    return rows_sheet("Scenario set", headings, rows, notes, len(scenarios.rate), styles=styles)


def _or_none(values: np.ndarray) -> list[float | None]:
    return [None if value != value else value for value in values.tolist()]
