"""Means over the paths beside what they should be, year by year, with the distance recomputed in the sheet.

Whether a mean lies within three standard errors is a matter of chance, once in 370 times by chance alone, and
no check of the workbook: it is counted in the sheet of diagnostics.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.book.arrays import FloatArray
from desk.report.known_means import Distances, distances, judged
from desk.report.results.checks import Checks
from desk.report.results.plan import Formula, SheetPlan, column_letter
from desk.report.results.runs_tables import plan_table
from desk.scenarios.node_checks import FAR, CheckResult, NodeCheck

__all__ = ["PlannedCheck", "plan_distances", "plan_node_check", "rows_of_check"]


@dataclass(frozen=True)
class PlannedCheck:
    """Where the verdicts of a check stand.

    Attributes
    ----------
    title, sheet : str
    area : str
        Address of the words ``yes`` and ``no``.
    result : CheckResult
    """

    title: str
    sheet: str
    area: str
    result: CheckResult


def rows_of_check(years: int) -> int:
    """Rows that `plan_node_check` takes, with the gap."""
    return years + 3


def plan_node_check(
    plan: SheetPlan,
    row: int,
    check: NodeCheck,
    checks: Checks,
    *,
    expected: Callable[[int], str] | None = None,
    further: Sequence[tuple[str, FloatArray]] = (),
) -> PlannedCheck:
    """Plan a check by year below a title.

    Parameters
    ----------
    plan : SheetPlan
    row : int
        Of the title.
    check : NodeCheck
    checks : Checks
        Gains the check of the rows.
    expected : callable, optional
        Gives the formula of what is expected in a year, by its number from 0.
    further : sequence of (str, ndarray)
        Columns beside, with their headings.
    """
    found = distances(check.mean, check.se, check.expected)
    plan.put(row, 1, f"{check.title}, against what it should be", "title")
    labels = ["Year", "Mean", "Mean, standard error", "Expected", "Expected, recomputed"]
    labels += ["Mean less expected, in standard errors", "The same, recomputed", "Check"]
    labels += [f"Within {FAR:g} standard errors", *(heading for heading, _ in further)]
    columns: list[tuple[Any, str]] = [
        (check.year, "term"),
        (check.mean, "factor"),
        (check.se, "tiny"),
        (check.expected, "factor"),
    ]
    last = plan_table(plan, row + 1, labels, columns)
    first = row + 2
    for number, (_, values) in enumerate(further):
        for offset, value in enumerate(values.tolist()):
            plan.put(first + offset, 10 + number, value, "reported", "factor")
    total = 0
    for offset in range(check.year.size):
        at = first + offset
        live = ""
        if expected is not None and np.isfinite(check.expected[offset]):
            plan.put(at, 5, Formula(expected(offset)), "live", "factor")
            live = f"ABS(D{at}-E{at})"
        if np.isfinite(found.distance[offset]):
            _plan_distance(plan, at, 6, found.distance[offset], ("B", "C", "D"))
            plan.put(at, 9, Formula(f'=IF(ABS(G{at})<={FAR:g},"yes","no")'), "check")
            live = "+".join(part for part in (f"ABS(F{at}-G{at})*C{at}", live) if part)
        if live:
            total += 1
            words = f'=IF({live}<=check_tolerance*MAX(1,ABS(D{at})),"OK","CHECK")'
            plan.put(at, 8, Formula(words), "check")
    area = plan.mark_checks(8, first, last)
    checks.add(
        f"{check.title}: years that agree",
        sheet=plan.name,
        unit="rows",
        form="whole",
        reported=float(total),
        formula=f'=COUNTIF({area},"OK")',
    )
    return PlannedCheck(check.title, plan.name, plan.area(9, first, last), judged(check))


def plan_distances(
    plan: SheetPlan, first: int, groups: Sequence[tuple[int, Distances]], *, check: int
) -> int:
    """Plan distances beside figures that stand already, and one check a row; returns the rows checked.

    Parameters
    ----------
    plan : SheetPlan
    first : int
        First row.
    groups : sequence of (int, Distances)
        With the column of the values; errors and expectations stand right of it, then the distances.
    check : int
        Column of the checks.
    """
    total = 0
    for offset in range(groups[0][1].value.size):
        at = first + offset
        parts = []
        for column, found in groups:
            if np.isfinite(found.distance[offset]):
                own, error, expected, told, live = (column_letter(column + number) for number in range(5))
                _plan_distance(plan, at, column + 3, found.distance[offset], (own, error, expected))
                parts.append(f"ABS({told}{at}-{live}{at})*{error}{at}")
        if parts:
            total += 1
            words = f'=IF({"+".join(parts)}<=check_tolerance,"OK","CHECK")'
            plan.put(at, check, Formula(words), "check")
    return total


def _plan_distance(
    plan: SheetPlan, row: int, column: int, distance: float, letters: tuple[str, str, str]
) -> None:
    """A distance as reported, and the formula beside it."""
    value, error, expected = letters
    plan.put(row, column, float(distance), "reported", "ratio")
    text = f"=({value}{row}-{expected}{row})/{error}{row}"
    plan.put(row, column + 1, Formula(text), "live", "ratio")
