"""The sheets of risky assets and of the price index, drawn beside the rates."""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Mapping

import numpy as np

from desk.book import Measure, RiskyAssets
from desk.report.results.checks import Checks
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan, column_letter
from desk.report.results.runs_checks import PlannedCheck, plan_node_check, rows_of_check
from desk.report.results.runs_law import plan_law
from desk.report.results.runs_tables import (
    NOTE_WIDTH,
    begin_quantity,
    further_tables,
    plan_notes,
    plan_table,
    row_after_chart,
    run_sheet,
)
from desk.report.safe_cells import clean_text
from desk.scenarios.market_records import AssetSummary, IndexSummary, RiskySummary
from desk.scenarios.node_checks import NodeCheck
from desk.scenarios.records import Simulation

__all__ = ["ASSETS_SHOWN", "RISKY_SHEET", "plan_price_index", "plan_risky_assets"]

ASSETS_SHOWN = 40
"""Risky assets that have a sheet of their own."""

RISKY_SHEET = "Risky assets"
_FIRST_ASSET_ROW = FIRST_ROW


def plan_risky_assets(
    simulation: Simulation,
    risky: RiskySummary,
    stated: RiskyAssets | None,
    checked: Mapping[str, NodeCheck],
    *,
    currency: str,
    checks: Checks,
) -> tuple[list[SheetPlan], list[PlannedCheck]]:
    """The sheet of all risky assets, and one for each.

    Parameters
    ----------
    simulation : Simulation
    risky : RiskySummary
    stated : RiskyAssets or None
        As the book states them, where they are at hand.
    checked : mapping
        The checks of the run by key.
    currency : str
    checks : Checks
    """
    plans = [_plan_together(simulation, risky, stated, currency, checks)]
    found = []
    for number, asset in enumerate(risky.assets[:ASSETS_SHOWN]):
        premium = ""
        if stated is not None:
            premium = f"'{RISKY_SHEET}'!$C${_FIRST_ASSET_ROW + number}"
        plan, planned = _plan_asset(
            simulation, asset, number + 1, checked[f"asset {number}"], premium, currency, checks
        )
        plans.append(plan)
        found.append(planned)
    return plans, found


def _plan_together(
    simulation: Simulation,
    risky: RiskySummary,
    stated: RiskyAssets | None,
    currency: str,
    checks: Checks,
) -> SheetPlan:
    """What all assets are, how they move together, and what they are worth together by year."""
    count = len(risky.assets)
    plan = run_sheet(RISKY_SHEET, "Risky assets, dividends reinvested", simulation)
    plan.widths[1] = 24.0
    plan.headings(
        [
            "Name",
            f"Value today [{currency}]",
            "Premium [a year]",
            "Dividend yield [a year]",
            "Volatility, stated [a year]",
            "Volatility, as drawn [a year]",
            "Check",
            "Correlation with the first rate factor, stated",
            "The same, as drawn",
            "Sheet",
            "Mean of 1 at the horizon",
        ]
    )
    matrix = FIRST_ROW + count + 2
    total = 0
    for number, asset in enumerate(risky.assets):
        row = FIRST_ROW + number
        plan.put(row, 1, asset.name, "text")
        plan.put(row, 2, asset.value, "reported" if stated is None else "input", "money")
        live = f"=SQRT({column_letter(2 + number)}{matrix + number})"
        plan.put(row, 6, Formula(live), "live", "rate")
        plan.put(row, 9, float(risky.rates_correlation[number]), "reported", "years")
        if number < ASSETS_SHOWN:
            plan.put(row, 10, _sheet_name(number + 1), "text")
            last = FIRST_ROW + asset.total_return.year.size - 1
            plan.put(row, 11, Formula(f"='{_sheet_name(number + 1)}'!B{last}"), "live", "ratio")
        if stated is None:
            continue
        total += 1
        for column, values, form in (
            (3, stated.premium, "rate"),
            (4, stated.dividend_yield, "rate"),
            (5, stated.volatility, "rate"),
            (8, stated.rates_correlation, "years"),
        ):
            plan.put(row, column, float(values[number]), "input", form)
        plan.put(row, 7, Formula(f'=IF(ABS(E{row}-F{row})<=check_tolerance,"OK","CHECK")'), "check")
    if total:
        area = plan.mark_checks(7, FIRST_ROW, FIRST_ROW + count - 1)
        checks.add_column("Risky assets whose volatility differs", plan, area)
    row = plan_notes(plan, _plan_matrices(plan, risky, matrix), risky.counted) + 1
    if risky.mended is not None:
        told = risky.mended
        names = ("the rates", *(asset.name for asset in risky.assets))
        one, two = (names[place] for place in told.largest_at)
        row = plan_notes(
            plan,
            row,
            "The correlations stated contradicted one another (least eigenvalue "
            f"{told.least_eigenvalue:.3g}) and were mended; the largest change is {told.largest_change:.3g}, "
            f"between {one} and {two}.",
        )
        row += 1
    if count > ASSETS_SHOWN:
        plan.put(row, 1, f"The first {ASSETS_SHOWN} of {count:,} assets have a sheet of their own.", "note")
        row += 2
    return _plan_total(plan, risky, row, currency, checks)


def _plan_matrices(plan: SheetPlan, risky: RiskySummary, first: int) -> int:
    """Covariance as drawn and the correlations in it; `first` is the first row of figures."""
    count = len(risky.assets)
    names = [asset.name for asset in risky.assets]
    plan.headings(["Covariance σσᵀ, as drawn [a year]", *names], row=first - 1)
    for number, name in enumerate(names):
        plan.put(first + number, 1, name, "text")
        for other in range(count):
            plan.put(first + number, 2 + other, float(risky.covariance[number, other]), "reported", "factor")
    row = first + count + 1
    plan.headings(["Correlation in it", *names], row=row)
    deviation = np.sqrt(np.diag(risky.covariance))
    for number, name in enumerate(names):
        plan.put(row + 1 + number, 1, name, "text")
        for other in range(count):
            if deviation[number] > 0.0 and deviation[other] > 0.0:
                letter = column_letter(2 + other)
                text = f"={letter}{first + number}/($F${FIRST_ROW + number}*$F${FIRST_ROW + other})"
                plan.put(row + 1 + number, 2 + other, Formula(text), "live", "years")
    return row + count + 2


def _plan_total(plan: SheetPlan, risky: RiskySummary, row: int, currency: str, checks: Checks) -> SheetPlan:
    """What all assets together are worth, by year."""
    total = risky.total
    plan.put(row, 1, "What all of them together are worth", "title")
    unit = f" [{currency}]"
    labels = ["Year", f"Mean{unit}", "Mean, standard error", f"Standard deviation{unit}"]
    columns = [(total.year, "term"), (total.mean, "money"), (total.mean_se, "money"), (total.sd, "money")]
    for index, level in enumerate(total.levels):
        labels += [f"{level:g} %{unit}"]
        columns += [(total.percentile[:, index], "money")]
    last = plan_table(plan, row + 1, labels, columns)
    further_tables(plan, total, last + 2, form="money")
    plan.page_breaks.append(row - 1)
    count = len(risky.assets)
    values = plan.area(2, FIRST_ROW, FIRST_ROW + count - 1)
    checks.add(
        "Risky assets: value today",
        sheet=plan.name,
        unit=currency,
        form="money2",
        reported=float(total.mean[0]),
        formula=f"=SUM({values})",
    )
    if count <= ASSETS_SHOWN:
        grown = plan.area(11, FIRST_ROW, FIRST_ROW + count - 1)
        checks.add(
            "Risky assets: mean value at the horizon",
            sheet=plan.name,
            unit=currency,
            form="money2",
            reported=float(total.mean[-1]),
            formula=f"=SUMPRODUCT({values},{grown})",
        )
    return plan


def _plan_asset(
    simulation: Simulation,
    asset: AssetSummary,
    number: int,
    check: NodeCheck,
    premium: str,
    currency: str,
    checks: Checks,
) -> tuple[SheetPlan, PlannedCheck]:
    """One asset by year: what one unit of it becomes."""
    name = _sheet_name(number)
    plan = run_sheet(name, f"{asset.name}: what 1 becomes, dividends reinvested", simulation)
    row = begin_quantity(
        plan,
        asset.total_return,
        form="ratio",
        title=clean_text(asset.name),
        upward="Value of 1 invested today",
        number_format="0.0",
        after_chart=rows_of_check(asset.total_return.year.size),
    )
    at = row_after_chart(asset.total_return)

    def expected(year: int) -> str:
        if simulation.measure is Measure.PRICING:
            return "=1"
        return f"=EXP({premium}*A{at + 2 + year})"

    planned = plan_node_check(
        plan,
        at,
        check,
        checks,
        expected=expected if premium or simulation.measure is Measure.PRICING else None,
    )
    if asset.closed_form is not None:
        plan_law(
            plan, row, asset.closed_form, asset.total_return, checks, figure=name, symbol="S", form="ratio"
        )
    else:
        plan.put(row, 1, "There is no closed form beside rates that are not Gaussian.", "note")
    return plan, planned


def plan_price_index(
    simulation: Simulation,
    index: IndexSummary,
    check: NodeCheck,
    *,
    discount: Callable[[int], str] | None,
    checks: Checks,
) -> tuple[SheetPlan, PlannedCheck]:
    """The price index by year.

    Parameters
    ----------
    simulation : Simulation
    index : IndexSummary
    check : NodeCheck
        Of the discounted index.
    discount : callable, optional
        Gives the address of the mean of 1/R that is expected in a year, by its number from 0, where the
        discounted index should be that times the expected index.
    checks : Checks
    """
    plan = run_sheet("Price index", "Price index, today's is 1", simulation)
    # Those of the note below the check, with a gap.
    note_rows = len(textwrap.wrap(index.revalued, NOTE_WIDTH)) + 1
    row = begin_quantity(
        plan,
        index.index,
        form="ratio",
        title="Price index",
        upward="Today's is 1",
        number_format="0.0",
        after_chart=rows_of_check(index.index.year.size) + note_rows,
    )
    at = row_after_chart(index.index)

    def expected(year: int) -> str:
        return "" if discount is None else f"={discount(year)}*J{at + 2 + year}"

    planned = plan_node_check(
        plan,
        at,
        check,
        checks,
        expected=None if discount is None else expected,
        further=[("Index expected today", index.expected_index)],
    )
    plan_notes(plan, at + rows_of_check(index.index.year.size), index.revalued)
    plan_law(
        plan, row, index.closed_form, index.index, checks, figure="Price index", symbol="I", form="ratio"
    )
    return plan, planned


def _sheet_name(number: int) -> str:
    """Name of the sheet of an asset, by its number from 1: names of a source may not do for a sheet."""
    return f"Risky asset {number}"
