"""The sheets of models fitted to the book's data: estimates, data, residuals, and what can be recomputed."""

from __future__ import annotations

import math
from collections.abc import Sequence

from desk.book import Fault
from desk.book.market import CalibrationSource
from desk.report.calibration_wording import INTERVALS, figure_wording, fit_title
from desk.report.results.calibration_history import plan_history
from desk.report.results.calibration_quotes import plan_quotes
from desk.report.results.calibration_yields import plan_yields
from desk.report.results.checks import Checks
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, SheetPlan
from desk.scenarios.calibration_records import Calibration

__all__ = ["plan_calibrations"]

_NAMES = {
    CalibrationSource.HISTORY: "Model fit history",
    CalibrationSource.VOLATILITIES: "Model fit volatilities",
    CalibrationSource.YIELDS: "Model fit yields",
}
_FIGURES = ["Figure", "Unit", "Estimate", "Standard error", "95 % from", "95 % to", "Recomputed"]


def plan_calibrations(
    found: Sequence[Calibration], faults: Sequence[Fault], checks: Checks
) -> list[SheetPlan]:
    """A sheet for every fit, and one that says what could not be fitted and why.

    Parameters
    ----------
    found : sequence of Calibration
    faults : sequence of Fault
        Of the sources that no model could be fitted to.
    checks : Checks
        What is recomputed is checked there.
    """
    plans = [_plan(calibration, checks) for calibration in found]
    if faults:
        plan = SheetPlan("Model fit refused", "Model fit", "What no model could be fitted to, and why.")
        plan.widths = {1: 24.0, 2: 140.0}
        plan.headings(["Sheet", "Why"], left=2)
        for row, fault in enumerate(faults, start=FIRST_ROW):
            plan.put(row, 1, fault.sheet, "text")
            plan.put(row, 2, f"{fault.found}. {fault.mend}", "text")
        plans.append(plan)
    return plans


def _plan(found: Calibration, checks: Checks) -> SheetPlan:
    title = fit_title(found)
    plan = SheetPlan(_NAMES[found.source], f"{title[:1].upper()}{title[1:]}", found.verdict)
    plan.widths = {1: 27.0, 2: 13.0} | dict.fromkeys(range(3, 20), 14.0)
    plan.headings(_FIGURES, left=2)
    rows: dict[str, int] = {}
    row = FIRST_ROW
    for figure in found.figures:
        wording = figure_wording(figure, found.name)
        form = "rate" if wording.is_rate else "years"
        rows[figure.name] = row
        plan.put(row, 1, wording.title, "text")
        plan.put(row, 2, "a year" if wording.is_rate else wording.unit or "-", "text")
        for column, value in enumerate((figure.value, figure.error, figure.low, figure.high), start=3):
            plan.put(row, column, value if math.isfinite(value) else None, "reported", form)
        row += 1
    rows["log_likelihood"] = row
    plan.put(row, 1, "Log-likelihood", "text")
    plan.put(row, 2, "-", "text")
    plan.put(row, 3, found.log_likelihood, "reported", "years")
    plan.put(row + 1, 1, "Observations", "text")
    plan.put(row + 1, 2, "-", "text")
    plan.put(row + 1, 3, found.observations, "reported", "whole")
    row += 3
    for text in (*found.remarks, found.measure, found.obstacle, INTERVALS):
        if text:
            plan.put(row, 1, text, "note")
            row += 1
    plan.title_rows = f"1:{HEADING_ROW}"
    fill = {
        CalibrationSource.HISTORY: plan_history,
        CalibrationSource.VOLATILITIES: plan_quotes,
        CalibrationSource.YIELDS: plan_yields,
    }[found.source]
    fill(plan, found, rows, row + 1, checks)
    return plan
