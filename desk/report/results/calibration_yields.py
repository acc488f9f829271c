"""The sheet of a model fitted to a history of yields: residuals by date and term recomputed."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from desk.book.market import YieldHistory
from desk.rates.kalman_fit import PanelFit
from desk.report.results.charts import Column, bars
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS
from desk.report.results.plan import Block, Formula, SheetPlan, column_letter
from desk.scenarios.calibration_records import Calibration

__all__ = ["plan_yields"]

_CHART_ROWS = 20


def plan_yields(plan: SheetPlan, found: Calibration, rows: dict[str, int], row: int, checks: Checks) -> None:
    """Fill a sheet from `row` on; `rows` says where the figures stand."""
    data, fit = found.data, found.fit
    assert isinstance(data, YieldHistory)
    assert isinstance(fit, PanelFit)
    count = data.terms.size
    # One table of terms, then the chart over it, then the history.
    plan.headings(
        ["Residuals by term", "Term [years]", "Yields", "Root mean square [bp]", "Reported [bp]"], row=row
    )
    chart_row = row + count + 2
    plan.page_breaks.append(row - 1)
    start = chart_row + _CHART_ROWS
    first, last = start + 1, start + data.date.size
    for place in range(count):
        r = row + 1 + place
        letter = column_letter(2 + 2 * count + place)
        area = f"{letter}{first}:{letter}{last}"
        term = float(data.terms[place])
        plan.put(r, 1, f"Term {term:g}", "text")
        plan.put(r, 2, term, "input", "years2")
        plan.put(r, 3, int(np.isfinite(data.rates[:, place]).sum()), "reported", "whole")
        plan.put(r, 4, Formula(f"=SQRT(SUMPRODUCT({area},{area})/C{r})"), "live", "ratio")
        plan.put(r, 5, float(fit.rmse_bp[place]), "reported", "ratio")
        checks.add(
            f"Yields at {term:g} years: residual, root mean square",
            sheet=plan.name,
            unit="bp",
            form="ratio",
            reported=float(fit.rmse_bp[place]),
            formula=f"='{plan.name}'!D{r}",
        )
    chart = bars(
        [Column("Root mean square", plan.area(4, row + 1, row + count), ASSETS)],
        plan.area(2, row + 1, row + count),
        title="Residuals by term",
        across="Term [years]",
        upward="Basis points",
        number_format="0.0",
    )
    plan.charts.append((chart, f"A{chart_row}"))
    terms = [f"{term:g} y" for term in data.terms.tolist()]
    plan.headings(
        [
            "Date",
            *(f"Observed, {term}" for term in terms),
            *(f"Fitted, {term}" for term in terms),
            *(f"Residual, {term} [bp]" for term in terms),
        ],
        row=start,
    )
    for column in range(20, 2 + 3 * count):
        plan.widths[column] = 14.0
    plan.block = _block(data, fit, first)
    del rows


def _block(data: YieldHistory, fit: PanelFit, first: int) -> Block:
    """One row a date: observed, fitted, and the residual of each term that was quoted."""
    count = data.terms.size
    observed, fitted = data.rates, fit.fitted
    letters = [(column_letter(2 + place), column_letter(2 + count + place)) for place in range(count)]

    def values() -> Iterator[list[Any]]:
        for place, date in enumerate(data.date.tolist()):
            r = first + place
            yield [
                date,
                *(value if np.isfinite(value) else None for value in observed[place].tolist()),
                *fitted[place].tolist(),
                *(
                    Formula(f"=({own}{r}-{seen}{r})*10000") if np.isfinite(observed[place, at]) else None
                    for at, (seen, own) in enumerate(letters)
                ),
            ]

    roles = ("input", *["input"] * count, *["reported"] * count, *["live"] * count)
    forms = ("date", *["rate"] * (2 * count), *["ratio"] * count)
    return Block(first, data.date.size, roles, forms, values)
