"""The sheet of diagnostics: means that are known beforehand, and the short rate against its law."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from desk.report.known_means import distances
from desk.report.results.checks import Checks
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan
from desk.report.results.runs_checks import PlannedCheck, plan_distances
from desk.report.results.runs_tables import plan_notes, plan_table
from desk.report.scenario_wording import checks_words, far_chance, is_outside, run_label
from desk.scenarios.node_checks import FAR
from desk.scenarios.records import Simulation

__all__ = ["plan_diagnostics"]

_GROUP = 5
"""Columns of a figure: itself, its error, what is expected, the distance, the distance recomputed."""


def plan_diagnostics(simulation: Simulation, planned: Sequence[PlannedCheck], checks: Checks) -> SheetPlan:
    """The sheet.

    Parameters
    ----------
    simulation : Simulation
    planned : sequence of PlannedCheck
        The checks by year that stand on other sheets.
    checks : Checks
    """
    plan = SheetPlan(
        "Scenario diagnostics",
        "Diagnostics of the paths",
        f"{run_label(simulation)}. {checks_words(simulation)}",
    )
    plan.widths = {1: 34.0} | dict.fromkeys(range(2, 18), 13.0)
    plan.headings(
        [
            "Mean over the paths",
            "Sheet",
            "Years compared",
            f"Beyond {FAR:g} standard errors",
            "The same, recomputed",
            "Check",
            "Furthest off, in standard errors",
            "In year",
        ],
        left=2,
    )
    row = FIRST_ROW
    for check in planned:
        result = check.result
        far = Formula(f'=COUNTIF({check.area},"no")')
        plan.table_row(
            row,
            1,
            [
                (check.title, "text", "text"),
                (check.sheet, "text", "text"),
                (result.nodes, "reported", "whole"),
                (result.far, "reported", "whole"),
                (far, "live", "whole"),
                (Formula(f'=IF(D{row}=E{row},"OK","CHECK")'), "check", "text"),
                (result.worst if result.nodes else None, "reported", "ratio"),
                (result.worst_year if result.nodes else None, "reported", "term"),
            ],
        )
        row += 1
    area = plan.mark_checks(6, FIRST_ROW, row - 1)
    checks.add_column("Means far off, counted", plan, area)
    notes = [
        f"A mean lies further than {FAR:g} standard errors off {far_chance(simulation)}; years next to one "
        "another share their paths, and go wrong together."
    ]
    if is_outside(simulation):
        notes.append(
            "A set from outside need not reprice the book's curve: what is far off here tells what its "
            "makers assumed of the curve, not that anything was drawn wrongly."
        )
    for note in notes:
        row = plan_notes(plan, row, note)
    if simulation.diagnostics is None:
        plan.put(row + 1, 1, "The law of the short rate is not known.", "note")
        return plan
    _plan_rate(plan, simulation, row + 1, checks)
    return plan


def _plan_rate(plan: SheetPlan, simulation: Simulation, row: int, checks: Checks) -> None:
    """Mean, standard deviation and autoregression of the short rate beside their closed forms."""
    found, rate = simulation.diagnostics, simulation.short_rate
    assert found is not None
    log = " of its logarithm" if simulation.model == "black-karasinski" else ""
    groups = [
        ("Mean", rate.mean, rate.mean_se, found.rate_mean, "rate"),
        ("Standard deviation", rate.sd, rate.sd_se, found.rate_sd, "rate"),
        (
            f"Slope{log} on a step before",
            found.autoregression,
            found.autoregression_se,
            found.expected_autoregression,
            "years",
        ),
    ]
    plan.put(row, 1, "Short rate against its law, under the measure of the run [a year]", "title")
    labels = ["Year"]
    columns: list[tuple[Any, str]] = [(found.year, "term")]
    nothing = np.full(found.year.size, np.nan)
    placed = []
    for title, value, error, expected, form in groups:
        placed.append((len(labels) + 1, distances(value, error, expected)))
        labels += [title, f"{title}, standard error", f"{title}, closed form"]
        labels += ["Difference, in standard errors", "The same, recomputed"]
        columns += [(value, form), (error, "tiny"), (expected, form), (nothing, "ratio"), (nothing, "ratio")]
    check = len(labels) + 1
    last = plan_table(plan, row + 1, [*labels, "Check"], columns)
    first = row + 2
    for at in range(first, last + 1):
        for column, _ in placed:
            # Where nothing can be said the cells stay empty.
            for empty in (column + _GROUP - 2, column + _GROUP - 1):
                del plan.cells[at][empty]
    total = plan_distances(plan, first, placed, check=check)
    area = plan.mark_checks(check, first, last)
    checks.add(
        "Short rate against its law: years that agree",
        sheet=plan.name,
        unit="rows",
        form="whole",
        reported=float(total),
        formula=f'=COUNTIF({area},"OK")',
    )
    if not np.isfinite(found.rate_mean).any():
        plan.put(last + 2, 1, "The law of these rates is not known: nothing can be compared.", "note")
