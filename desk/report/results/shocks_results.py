"""The sheet of what each shock does to both sides, with verdicts, estimates and sources."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from desk.report.results.charts import Column, bars, money_axis
from desk.report.results.checks import Checks
from desk.report.results.look import QUIET, SURPLUS
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan
from desk.report.results.shocks_moves import flush_left
from desk.valuation.shock_records import ShockResult, ShockTable, band_name

__all__ = ["FIRST_RESULT", "SHOCKS_SHEET", "last_row", "names_of", "plan_results"]

SHOCKS_SHEET = "Shocks"
CHART_CAP = 30
"""Shocks that a picture shows; more would be too narrow to read."""
FIRST_RESULT = FIRST_ROW + 1
"""Row of the first shock; the one before holds where the book stands."""
_FIGURES = (
    "assets",
    "liabilities",
    "surplus",
    "funding_ratio",
    "change_in_assets",
    "change_in_liabilities",
    "change_in_surplus",
    "change_in_funding_ratio",
)


def last_row(found: ShockTable) -> int:
    """Row of the last shock."""
    return FIRST_RESULT + len(found.results) - 1


def names_of(plan: SheetPlan, found: ShockTable) -> dict[str, str]:
    """Names that the workbook defines for the sheet of results."""
    names = {
        "shock_base_assets": plan.address(FIRST_ROW, 4),
        "shock_base_liabilities": plan.address(FIRST_ROW, 5),
    }
    if found.thresholds:
        first = last_row(found) + 3
        names["shock_thresholds"] = plan.area(3, first, first + len(found.thresholds) - 1)
        names["shock_words"] = plan.area(5, first, first + len(found.thresholds))
    return names


def plan_results(found: ShockTable, *, reason: str, recomputed: dict[str, str], checks: Checks) -> SheetPlan:
    """The sheet of results."""
    unit = f"[{found.currency}]"
    note = (
        "Every shock is a full revaluation of both sides from where the book stands. The estimate below is "
        "by duration and convexity."
    )
    plan = SheetPlan(
        SHOCKS_SHEET,
        "Shocks: both sides after each",
        f"{note} {reason}" if reason else note,
        title_rows="1:3",
    )
    plan.widths = {1: 8.0, 2: 34.0, 3: 24.0} | dict.fromkeys(range(4, 17), 15.0)
    plan.widths |= {7: 10.0, 11: 10.0, 12: 11.0, 13: 9.0, 16: 11.0, 17: 8.0}
    plan.headings(
        [
            "Shock number",
            "Shock",
            "Set",
            f"Assets {unit}",
            f"Liabilities {unit}",
            f"Surplus {unit}",
            "Funding ratio",
            f"Change in assets {unit}",
            f"Change in liabilities {unit}",
            f"Change in surplus {unit}",
            "Change in funding ratio",
            "Verdict, reported",
            "Verdict",
            f"Surplus, recomputed {unit}",
            f"Change in surplus, recomputed {unit}",
            f"Difference {unit}",
            "Check",
        ],
        left=0,
    )
    flush_left(plan, HEADING_ROW, (2, 3, 12, 13))
    base = found.base
    figures = ((base.assets, "money"), (base.liabilities, "money"), (base.surplus, "money"))
    plan.table_row(
        FIRST_ROW,
        1,
        [
            ("", "text", "text"),
            ("As it stands", "unit", "text"),
            ("", "text", "text"),
            *((figure, "reported", form) for figure, form in figures),
            (base.funding_ratio, "reported", "share"),
        ],
    )
    if found.thresholds and math.isfinite(base.funding_ratio):
        plan.put(FIRST_ROW, 13, Formula(_verdict(FIRST_ROW)), "live", "text")
    plan.put(FIRST_ROW, 14, Formula(f"=D{FIRST_ROW}-E{FIRST_ROW}"), "live", "money")
    for number, result in enumerate(found.results, start=1):
        _result_row(plan, FIRST_RESULT + number - 1, number, result, found)
    last = last_row(found)
    checks.add_column("Shocks whose figures differ", plan, plan.mark_checks(17, FIRST_RESULT, last))
    for name, column in (("assets", 4), ("liabilities", 5)):
        address = recomputed.get(f"{name}_present_value", "")
        if address:
            checks.add(
                f"{name.capitalize()} before shocks are those of the standing",
                sheet=plan.name,
                unit=found.currency,
                form="money2",
                reported=getattr(base, name),
                formula=f"={address}",
                scale=f"SUMPRODUCT(ABS({name}_value))",
            )
        checks.add(
            f"{name.capitalize()} before shocks, as the sheet shows them",
            sheet=plan.name,
            unit=found.currency,
            form="money2",
            reported=getattr(base, name),
            formula=f"={plan.address(FIRST_ROW, column)}",
        )
    below = _thresholds(plan, last + 2, found)
    estimates = below + 2
    below = _estimates(plan, below, found, checks)
    below = _sources(plan, below, found)
    _chart(plan, below, estimates, found)
    return plan


def _verdict(row: int) -> str:
    """Formula of the word for a funding ratio."""
    return f"=INDEX(shock_words,1+SUMPRODUCT((G{row}<shock_thresholds)*1))"


def _result_row(plan: SheetPlan, row: int, number: int, result: ShockResult, found: ShockTable) -> None:
    """One shock."""
    has_ratio = math.isfinite(result.funding_ratio) and math.isfinite(found.base.funding_ratio)
    base = f"${FIRST_ROW}"
    forms = ["share" if "ratio" in name else "money" for name in _FIGURES]
    away = f"=ABS(F{row}-N{row})+ABS(J{row}-O{row})+ABS(H{row}-(D{row}-D{base}))+ABS(I{row}-(E{row}-E{base}))"
    agree = [f"P{row}<=check_tolerance*MAX(1,ABS(D{row})+ABS(E{row}),ABS(D{base})+ABS(E{base}))"]
    if has_ratio:
        ratios = f"ABS(G{row}-D{row}/E{row})+ABS(K{row}-G{row}+G{base})"
        agree.append(f"{ratios}<=check_tolerance*MAX(1,ABS(G{row}))")
    verdict: list[tuple[Any, str, str]] = [("", "text", "text"), ("", "text", "text")]
    if found.thresholds and has_ratio:
        word = band_name(result.band, found.thresholds)
        verdict = [(word, "unit", "text"), (Formula(_verdict(row)), "live", "text")]
        agree.append(f"L{row}=M{row}")
    plan.table_row(
        row,
        1,
        [
            (number, "text", "whole"),
            (result.name, "unit", "text"),
            (result.set_name or "Own", "unit", "text"),
            *((getattr(result, name), "reported", form) for name, form in zip(_FIGURES, forms, strict=True)),
            *verdict,
            (Formula(f"=D{row}-E{row}"), "live", "money"),
            (Formula(f"=N{row}-N{base}"), "live", "money"),
            (Formula(away), "live", "tiny"),
            (Formula(f'=IF(AND({",".join(agree)}),"OK","CHECK")'), "check", "text"),
        ],
    )


def _thresholds(plan: SheetPlan, row: int, found: ShockTable) -> int:
    """Thresholds as cells that may be changed; returns the row after them."""
    if not found.thresholds:
        plan.put(row, 2, "The book states no thresholds: there is no verdict.", "note")
        return row + 2
    plan.headings(["Thresholds", "Funding ratio, at least", "Shocks below it", "Verdict"], row=row, column=2)
    flush_left(plan, row, (2, 5))
    area = f"G{FIRST_RESULT}:G{last_row(found)}"
    count = len(found.thresholds)
    for offset, threshold in enumerate(found.thresholds, start=1):
        at = row + offset
        plan.put(at, 2, f"Threshold {offset}", "unit")
        plan.put(at, 3, threshold, "input", "share")
        if all(math.isfinite(result.funding_ratio) for result in found.results):
            plan.put(at, 4, Formula(f"=SUMPRODUCT(({area}<C{at})*1)"), "live", "whole")
        plan.put(at, 5, band_name(offset - 1, found.thresholds), "unit")
    plan.put(row + count + 1, 2, "Below the last", "unit")
    plan.put(row + count + 1, 3, "", "text")
    plan.put(row + count + 1, 4, "", "text")
    plan.put(row + count + 1, 5, band_name(count, found.thresholds), "unit")
    return row + count + 3


def _estimates(plan: SheetPlan, row: int, found: ShockTable, checks: Checks) -> int:
    """What duration and convexity tell of each shock, beside its full change; returns the row after."""
    unit = f"[{found.currency}]"
    plan.put(row, 1, "Estimates by duration and convexity, beside full revaluation", "title")
    row += 1
    plan.headings(
        [
            "Shock number",
            "Shock",
            "Set",
            f"Estimated change in assets {unit}",
            f"Estimated change in liabilities {unit}",
            f"Estimated change in surplus {unit}",
            "",
            f"Assets: full less estimated {unit}",
            f"Liabilities: full less estimated {unit}",
            f"Surplus: full less estimated {unit}",
            "Check",
        ],
        row=row,
        left=0,
    )
    flush_left(plan, row, (2, 3))
    first = row + 1
    for number, result in enumerate(found.results, start=1):
        at, full = row + number, FIRST_RESULT + number - 1
        limit = f"check_tolerance*MAX(1,ABS(D{at})+ABS(E{at}))"
        plan.table_row(
            at,
            1,
            [
                (number, "text", "whole"),
                (result.name, "unit", "text"),
                (result.set_name or "Own", "unit", "text"),
                (result.estimated_change_in_assets, "reported", "money"),
                (result.estimated_change_in_liabilities, "reported", "money"),
                (result.estimated_change_in_surplus, "reported", "money"),
                ("", "text", "text"),
                (Formula(f"=H{full}-D{at}"), "live", "money"),
                (Formula(f"=I{full}-E{at}"), "live", "money"),
                (Formula(f"=J{full}-F{at}"), "live", "money"),
                (Formula(f'=IF(ABS(F{at}-(D{at}-E{at}))<={limit},"OK","CHECK")'), "check", "text"),
            ],
        )
    last = first + len(found.results) - 1
    checks.add_column("Estimates that do not add up", plan, plan.mark_checks(11, first, last))
    plan.page_breaks.append(row - 2)
    return last + 2


def _sources(plan: SheetPlan, row: int, found: ShockTable) -> int:
    """Where each set, or shock of the book's own, comes from; returns the row after them."""
    plan.headings(["Set or own shock", "", "Source"], row=row, column=2)
    flush_left(plan, row, (2, 4))
    sources = dict.fromkeys(
        (result.set_name or result.name, result.source or "The book's own") for result in found.results
    )
    for at, (name, source) in enumerate(sources, start=row + 1):
        plan.table_row(at, 2, [(name, "unit", "text"), ("", "text", "text"), (source, "unit", "text")])
    return row + len(sources) + 2


def _chart(plan: SheetPlan, row: int, first: int, found: ShockTable) -> None:
    """Change in surplus by shock, full and estimated, at a row; the first estimate stands in row `first`."""
    shown = min(len(found.results), CHART_CAP)
    last = FIRST_RESULT + shown - 1
    changes = [
        (result.change_in_surplus, result.estimated_change_in_surplus) for result in found.results[:shown]
    ]
    number_format, unit = money_axis(float(np.nanmax(np.abs(changes))), found.currency)
    title = "Change in surplus by shock"
    if shown < len(found.results):
        title += f", the first {shown}"
    chart = bars(
        [
            Column("Fully revalued", plan.area(10, FIRST_RESULT, last), SURPLUS),
            Column("Estimated by duration and convexity", plan.area(6, first, first + shown - 1), QUIET),
        ],
        plan.area(2, FIRST_RESULT, last),
        title=title,
        across="Shock",
        upward=f"Change in surplus [{unit}]",
        number_format=number_format,
    )
    chart.type = "bar"
    # The first shock stands at the top, and the scale of amounts stays at the foot.
    chart.x_axis.scaling.orientation = "maxMin"
    chart.y_axis.crosses = "max"
    chart.width, chart.height = 24, min(26, 5 + round(0.75 * shown))
    plan.charts.append((chart, f"B{row}"))
    plan.page_breaks.append(row - 1)
