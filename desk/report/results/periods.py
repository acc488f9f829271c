"""The sheets of periods: undiscounted flows of both sides by year, in money and in today's money."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.report.results.charts import Column, bars_with_line, money_axis
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP
from desk.report.results.look import ASSETS, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan
from desk.valuation.records import Periods, Standing

__all__ = ["flow_chart", "plan_periods"]


def plan_periods(standing: Standing, checks: Checks, *, is_real: bool = False) -> SheetPlan:
    """Undiscounted flows of both sides by year.

    Parameters
    ----------
    standing : Standing
    checks : Checks
        Gains the check of this sheet.
    is_real : bool
        Whether they are in today's money; the standing then follows expected inflation, and every flow has a
        row of its own.
    """
    periods = standing.periods
    if is_real:
        assert standing.inflation is not None
        periods = standing.inflation.real_periods
    unit, paid = f"[{standing.currency}]", "real_paid" if is_real else "paid"
    count = min(periods.year.size, ROW_CAP)
    plan = SheetPlan(
        "Real periods" if is_real else "Periods",
        "Real periods: undiscounted flows in today's money by year"
        if is_real
        else "Periods: undiscounted flows by year",
        ("Each flow over the index expected when it is paid. " if is_real else "")
        + "Year k holds the flows after k − 1 and up to k years from the valuation date; a flow today is in "
        "year 1.",
    )
    plan.widths = {1: 8.0} | dict.fromkeys(range(2, 13), 15.0) | {11: 9.0, 10: 11.0}
    plan.headings(
        [
            "Year",
            f"Assets {unit}",
            f"Liabilities {unit}",
            f"Net {unit}",
            f"Cumulative net {unit}",
            f"Assets, recomputed {unit}",
            f"Liabilities, recomputed {unit}",
            f"Net, recomputed {unit}",
            f"Cumulative net, recomputed {unit}",
            f"Difference {unit}",
            "Check",
            f"Liabilities, downward, for the chart {unit}",
        ],
        left=0,
    )
    for offset in range(count):
        row = FIRST_ROW + offset
        before = f"I{row - 1}+" if offset else ""
        scale = f"MAX(1,ABS(B{row})+ABS(C{row})+ABS(E{row}))"
        plan.table_row(
            row,
            1,
            [
                (int(periods.year[offset]), "reported", "whole"),
                (float(periods.assets[offset]), "reported", "money"),
                (float(periods.liabilities[offset]), "reported", "money"),
                (float(periods.net[offset]), "reported", "money"),
                (float(periods.cumulative[offset]), "reported", "money"),
                (Formula(f"=SUMIFS(assets_{paid},assets_year,A{row},assets_payment,1)"), "live", "money"),
                (
                    Formula(f"=SUMIFS(liabilities_{paid},liabilities_year,A{row},liabilities_payment,1)"),
                    "live",
                    "money",
                ),
                (Formula(f"=F{row}-G{row}"), "live", "money"),
                (Formula(f"={before}H{row}"), "live", "money"),
                (
                    Formula(f"=ABS(B{row}-F{row})+ABS(C{row}-G{row})+ABS(D{row}-H{row})+ABS(E{row}-I{row})"),
                    "live",
                    "tiny",
                ),
                (Formula(f'=IF(J{row}<=check_tolerance*{scale},"OK","CHECK")'), "check", "text"),
                (Formula(f"=-C{row}"), "live", "money"),
            ],
        )
    if not count:
        plan.put(FIRST_ROW, 1, "The book has no flows.", "note")
        return plan
    last = FIRST_ROW + count - 1
    figure = "Years whose flows in today's money differ" if is_real else "Years whose flows differ"
    checks.add_column(figure, plan, plan.mark_checks(11, FIRST_ROW, last))
    plan.charts.append((flow_chart(plan, periods, standing.currency, is_real=is_real), f"A{last + 3}"))
    plan.page_breaks.append(last + 1)
    return plan


def flow_chart(plan: SheetPlan, periods: Periods, currency: str, *, is_real: bool = False) -> Any:
    """Flows of both sides about the axis with the cumulative net, drawn from a sheet of periods."""
    count = min(periods.year.size, ROW_CAP)
    first, last = FIRST_ROW, FIRST_ROW + count - 1
    largest = float(np.abs([periods.assets, periods.liabilities]).max(initial=0.0))
    number_format, unit = money_axis(largest, currency)
    line_format, line_unit = money_axis(float(np.abs(periods.cumulative).max(initial=0.0)), currency)
    return bars_with_line(
        [
            Column("Assets", plan.area(2, first, last), ASSETS),
            Column("Liabilities, downward", plan.area(12, first, last), LIABILITIES),
        ],
        Column("Cumulative net (right axis)", plan.area(5, first, last), SURPLUS),
        plan.area(1, first, last),
        title="Flows in today's money by year" if is_real else "Flows of both sides by year",
        across="Years from the valuation date",
        upward=f"Flows in the year [{unit}]",
        line_upward=f"Cumulative net [{line_unit}]",
        number_format=number_format,
        line_format=line_format,
        skip=max(1, int(np.ceil(count / 15))),
    )
