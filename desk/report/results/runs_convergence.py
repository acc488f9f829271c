"""The sheets of how headline figures settle with the number of paths, and of what the sampling gains."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from desk.report.results.charts import Column, lines, money_axis
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS, QUIET
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan
from desk.report.results.runs_values import VALUES_SHEET
from desk.report.scenario_wording import run_label
from desk.scenarios.records import Simulation
from desk.scenarios.sampling_records import Convergence

if TYPE_CHECKING:
    from openpyxl.chart import ScatterChart

__all__ = ["plan_convergence", "plan_gains"]

_CHART_ROWS = 19
_CHARTS_ABREAST = 2
_CHARTS_A_PAGE = 2
"""Rows of charts that a printed page holds."""


def plan_convergence(simulation: Simulation, *, currency: str, checks: Checks) -> SheetPlan:
    """The headline figures after part of the paths, as a table and as a picture each."""
    plan = SheetPlan(
        "Convergence",
        "Convergence: headline figures after part of the paths",
        f"{run_label(simulation)}. With 95 % intervals; of independent paths the first are taken.",
    )
    plan.widths = {1: 44.0, 2: 10.0} | dict.fromkeys(range(3, 10), 17.0)
    plan.headings(
        [
            *("Figure", "Unit", "Paths", "Value", "Standard error", "95 % from", "95 % to"),
            "Standard error × √paths",
        ],
        left=2,
    )
    row = FIRST_ROW
    spans: list[tuple[Convergence, int, int]] = []
    for found in simulation.convergence:
        is_share = "chance" in found.figure
        form = "money" if found.is_money else "share" if is_share else "factor"
        unit = currency if found.is_money else "share" if is_share else "1"
        first = row
        for number, paths in enumerate(found.paths.tolist()):
            figures = [float(column[number]) for column in (found.value, found.se, found.low, found.high)]
            plan.put(row, 1, found.figure[:1].upper() + found.figure[1:], "text")
            plan.put(row, 2, unit, "text")
            plan.put(row, 3, paths, "reported", "whole")
            for column, value in enumerate(figures, start=4):
                plan.put(row, column, value, "reported", form)
            if math.isfinite(figures[1]):
                plan.put(row, 8, Formula(f"=E{row}*SQRT(C{row})"), "live", form)
            row += 1
        spans.append((found, first, row - 1))
    row += 1
    plan.page_breaks.append(row - 1)
    for number, (found, first, last) in enumerate(spans):
        beside, below = number % _CHARTS_ABREAST, number // _CHARTS_ABREAST
        chart = _chart(plan, found, first, last, currency)
        plan.charts.append((chart, f"{'AE'[beside]}{row + _CHART_ROWS * below}"))
    plan.page_breaks += [
        row + _CHART_ROWS * below - 1
        for below in range(_CHARTS_A_PAGE, len(spans) // _CHARTS_ABREAST + 1, _CHARTS_A_PAGE)
        if _CHARTS_ABREAST * below < len(spans)
    ]
    _check_last(plan, simulation, spans, currency, checks)
    return plan


def _chart(plan: SheetPlan, found: Convergence, first: int, last: int, currency: str) -> ScatterChart:
    """A figure with its interval over the number of paths."""
    number_format, unit = "0.0000", "Value of 1 rolled over"
    if found.is_money:
        sizes = [abs(value) for value in (*found.low.tolist(), *found.high.tolist()) if math.isfinite(value)]
        # One more digit than an axis of the whole amounts: what changes is small.
        number_format, unit = money_axis(max(sizes, default=0.0), currency)
        number_format = number_format.replace("#,##0.0", "#,##0").replace("#,##0", "#,##0.00")
    elif "chance" in found.figure:
        number_format, unit = "0.0%", "share"
    title = found.figure[:1].upper() + found.figure[1:]
    bounds: list[Column] = []
    # Few paths may have no interval of a quantile, and a text in a chart is drawn as 0.
    known = np.flatnonzero(np.isfinite(found.low) & np.isfinite(found.high))
    if known.size:
        start = first + int(known[0])
        bounds = [
            Column("95 % from", plan.area(6, start, last), QUIET, dash="dash"),
            Column("95 % to", plan.area(7, start, last), QUIET, dash="dash"),
        ]
        first = start
    chart = lines(
        [Column("Value", plan.area(4, first, last), ASSETS), *bounds],
        plan.area(3, first, last),
        title=title,
        across="Paths",
        upward=unit,
        number_format=number_format,
    )
    chart.x_axis.number_format = "#,##0"
    chart.width = 16
    return chart


def _check_last(
    plan: SheetPlan,
    simulation: Simulation,
    spans: list[tuple[Convergence, int, int]],
    currency: str,
    checks: Checks,
) -> None:
    """After all paths the means are those on the other sheets."""
    horizon = FIRST_ROW + simulation.savings_account.year.size - 1
    places = {"mean of the savings account at the horizon": f"'Savings account'!$B${horizon}"}
    for number, side in enumerate(simulation.present_value):
        letter = "CFI"[number]
        places[f"mean present value of {side.name}"] = f"'{VALUES_SHEET}'!${letter}${FIRST_ROW}"
    for found, _, last in spans:
        if found.figure in places:
            own = places[found.figure]
            checks.add(
                f"Convergence: {found.figure}, less the one on its sheet",
                sheet=plan.name,
                unit=currency if found.is_money else "1",
                form="money2" if found.is_money else "factor",
                reported=0.0 if math.isfinite(found.value[-1]) else math.nan,
                formula=f"={plan.address(last, 4)}-{own}",
                # A surplus near 0 is the difference of large figures.
                scale=f"'{VALUES_SHEET}'!$C${FIRST_ROW}" if found.is_money else own,
            )


def plan_gains(simulation: Simulation, checks: Checks) -> SheetPlan:
    """How much less variance the sampling of a run leaves than plain sampling."""
    plan = SheetPlan(
        "Sampling gains",
        "What the sampling gains over plain sampling",
        f"{run_label(simulation)}. The paths are shared among {simulation.replicates} independent "
        "replicates, whose spread gives the standard errors.",
    )
    plan.widths = {1: 44.0} | dict.fromkeys(range(2, 9), 17.0)
    plan.headings(
        [
            "Figure",
            "Standard error, plain sampling",
            "Standard error, this run",
            "Gain, times",
            "The same, recomputed",
            "Check",
            "95 % from, times",
            "95 % to, times",
        ]
    )
    total = 0
    for row, gain in enumerate(simulation.gains, start=FIRST_ROW):
        plan.put(row, 1, gain.figure[:1].upper() + gain.figure[1:], "text")
        plan.put(row, 2, gain.plain_se, "reported", "tiny")
        plan.put(row, 3, gain.se, "reported", "tiny")
        if not math.isfinite(gain.gain):
            plan.put(row, 4, "no error left", "note")
            continue
        total += 1
        plan.put(row, 4, gain.gain, "reported", "ratio")
        plan.put(row, 5, Formula(f"=(B{row}/C{row})*(B{row}/C{row})"), "live", "ratio")
        plan.put(
            row,
            6,
            Formula(f'=IF(ABS(D{row}-E{row})<=check_tolerance*MAX(1,ABS(D{row})),"OK","CHECK")'),
            "check",
        )
        plan.put(row, 7, gain.low, "reported", "ratio")
        plan.put(row, 8, gain.high, "reported", "ratio")
    last = HEADING_ROW + len(simulation.gains)
    area = plan.mark_checks(6, FIRST_ROW, last)
    checks.add(
        "Sampling gains: figures that agree",
        sheet=plan.name,
        unit="rows",
        form="whole",
        reported=float(total),
        formula=f'=COUNTIF({area},"OK")',
    )
    plan.put(
        last + 2,
        1,
        "A gain is the ratio of variances: plain sampling would need as many times more paths for the same "
        "error.",
        "note",
    )
    return plan
