"""The sheets of the savings account and of the short rate, and all sheets of a run in their order."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

from desk.book import Book, Measure
from desk.report.results.charts import Column, histogram
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS, INK
from desk.report.results.plan import Formula, SheetPlan
from desk.report.results.runs_checks import PlannedCheck, plan_node_check, rows_of_check
from desk.report.results.runs_convergence import plan_convergence, plan_gains
from desk.report.results.runs_diagnostics import plan_diagnostics
from desk.report.results.runs_law import FactorCells, law_first_row, plan_law
from desk.report.results.runs_market import plan_price_index, plan_risky_assets
from desk.report.results.runs_model import PlannedModel, plan_model
from desk.report.results.runs_tables import (
    CHART_ROWS,
    begin_quantity,
    histogram_table,
    row_after_chart,
    run_sheet,
)
from desk.report.results.runs_values import plan_present_values
from desk.scenarios.node_checks import NodeCheck, node_checks
from desk.scenarios.records import Simulation

__all__ = ["plan_run"]


def plan_run(book: Book | None, simulation: Simulation, *, currency: str, checks: Checks) -> list[SheetPlan]:
    """The sheets of a run.

    Parameters
    ----------
    book : Book or None
        That was drawn; where it is another one, or None, nothing is recomputed from its parameters.
    simulation : Simulation
    currency : str
    checks : Checks
        Gains the checks of these sheets.
    """
    if book is not None and book.digest != simulation.provenance.book_digest:
        book = None
    checked = {check.key: check for check in node_checks(simulation)}
    model = plan_model(book, simulation)
    account, of_account = _plan_savings_account(simulation, checked["account"], model, checks)
    rate = _plan_short_rate(simulation)
    values = plan_present_values(simulation, currency=currency, checks=checks)
    planned = [of_account]
    beside: list[SheetPlan] = []
    if simulation.risky is not None:
        sheets, found = plan_risky_assets(
            simulation,
            simulation.risky,
            None if book is None else book.risky_assets,
            checked,
            currency=currency,
            checks=checks,
        )
        beside += sheets
        planned += found
    if simulation.index is not None:
        # Under the pricing measure a linked bond is worth the plain one times the expected index.
        is_pricing = simulation.measure is Measure.PRICING
        discount = _expected_discount(simulation, account) if is_pricing else None
        sheet, of_index = plan_price_index(
            simulation, simulation.index, checked["index"], discount=discount, checks=checks
        )
        beside.append(sheet)
        planned.append(of_index)
    after = [plan_diagnostics(simulation, planned, checks)]
    if simulation.convergence:
        after.append(plan_convergence(simulation, currency=currency, checks=checks))
    if simulation.gains:
        after.append(plan_gains(simulation, checks))
    return [model.plan, account, rate, *beside, values, *after]


def _plan_savings_account(
    simulation: Simulation, check: NodeCheck, model: PlannedModel, checks: Checks
) -> tuple[SheetPlan, PlannedCheck]:
    """The savings account by year, with the closed form and the check against the curve."""
    account, closed = simulation.savings_account, simulation.closed_form
    years = account.year.size
    plan = run_sheet("Savings account", "Savings account: one unit rolled over", simulation)
    at = row_after_chart(account)
    row = begin_quantity(
        plan,
        account,
        form="ratio",
        title="Savings account",
        upward="Value of 1 rolled over",
        number_format="0.0",
        after_chart=rows_of_check(years),
    )
    law = law_first_row(row)

    def expected(year: int) -> str:
        return f"=EXP(C{law + year}/2-B{law + year})"

    planned = plan_node_check(
        plan,
        at,
        check,
        checks,
        expected=None if closed is None else expected,
        further=[("Discount factor of the curve", simulation.repricing.curve_discount)],
    )
    if closed is not None:
        factor = None
        if model.volatility:
            factor = FactorCells(model.mean_reversion, model.volatility, model.risk_price, ("J", at + 2))
        row = plan_law(
            plan, row, closed, account, checks, figure="Savings account", symbol="R", form="ratio",
            factor=factor, real_world=simulation.measure is Measure.REAL_WORLD,
        )  # fmt: skip
    plan.charts.append((_horizon_histogram(plan, simulation, row, checks), f"J{at - CHART_ROWS}"))
    return plan, planned


def _expected_discount(simulation: Simulation, account: SheetPlan) -> Callable[[int], str]:
    """Address of the mean of 1/R that is expected in a year, by its number from 0."""
    first = row_after_chart(simulation.savings_account) + 2
    return lambda year: account.address(first + year, 4)


def _plan_short_rate(simulation: Simulation) -> SheetPlan:
    """The short rate by year."""
    plan = run_sheet("Short rate", "Short rate, continuously compounded [a year]", simulation)
    begin_quantity(
        plan,
        simulation.short_rate,
        form="rate",
        title="Short rate",
        upward="Continuously compounded [a year]",
        number_format='0.0%;"−"0.0%',
    )
    return plan


def _horizon_histogram(plan: SheetPlan, simulation: Simulation, row: int, checks: Checks) -> Any:
    """The histogram of the savings account at the end of the paths, with the closed form over it."""
    account, closed = simulation.savings_account, simulation.closed_form
    bins = account.histograms[-1]
    year = float(account.year[-1])
    plan.put(row, 1, f"Histogram of the savings account at year {year:g}", "title")
    first, end = histogram_table(plan, bins, row=row + 1, column=1, unit="1", form="ratio")
    checks.add(
        "Savings account: paths in the histogram",
        sheet=plan.name,
        unit="paths",
        form="whole",
        reported=float(simulation.paths),
        formula=f"=SUM({plan.area(3, first, end)})",
    )
    expected = None
    if closed is not None and closed.log_variance[-1] > 0.0 and bins.edges[0] > 0.0:
        plan.headings(
            [
                "Bin to [1]",
                "Paths, closed form",
                "",
                "Mean of ln R",
                "Standard deviation of ln R",
                "Paths, all",
            ],
            row=row + 1,
            column=4,
            left=0,
        )
        settings = (
            float(closed.log_mean[-1]),
            math.sqrt(float(closed.log_variance[-1])),
            int(bins.counts.sum()),
        )
        for number, (value, form) in enumerate(zip(settings, ("factor", "factor", "whole"), strict=True)):
            plan.put(first, 7 + number, value, "reported", form)
        mean, deviation, paths = (f"${letter}${first}" for letter in "GHI")
        for offset in range(bins.counts.size):
            at = first + offset
            low, high = (f"NORMSDIST((LN({letter}{at})-{mean})/{deviation})" for letter in "BD")
            plan.put(at, 4, float(bins.edges[offset + 1]), "reported", "ratio")
            plan.put(at, 5, Formula(f"={paths}*({high}-{low})"), "live", "money2")
        expected = Column("Closed form", plan.area(5, first, end), INK)
    return histogram(
        Column("Simulated paths", plan.area(3, first, end), ASSETS),
        expected,
        plan.area(1, first, end),
        title=f"Savings account at year {year:g}",
        across="Value of 1 rolled over, middle of the bin",
        number_format="0.0",
        skip=max(1, math.ceil(bins.counts.size / 10)),
    )
