"""The sheet of present values along the paths. Its figures are values, but for what adds up."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from desk.report.results.charts import Column, histogram, money_axis
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS, INK, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan, column_letter
from desk.report.results.runs_tables import histogram_table
from desk.report.scenario_wording import measure_use, run_label
from desk.scenarios.records import Distribution, Simulation

__all__ = ["VALUES_SHEET", "plan_present_values"]

VALUES_SHEET = "Present values"
_SIDE_COLOURS = {"assets": ASSETS, "liabilities": LIABILITIES, "surplus": SURPLUS}

_Row = tuple[str, str, str, list[tuple[Any, Any, Any]]]


def plan_present_values(simulation: Simulation, *, currency: str, checks: Checks) -> SheetPlan:
    """The pathwise present values of both sides and of the surplus."""
    sides = simulation.present_value
    plan = SheetPlan(
        VALUES_SHEET,
        "Present values along the paths",
        f"Simulated values, not recalculable here: {run_label(simulation)}. {measure_use(simulation)}",
    )
    plan.widths = {1: 34.0, 2: 12.0} | dict.fromkeys(range(3, 16), 18.0)
    headings = ["Figure", "Unit"]
    for side in sides:
        name = side.name.capitalize()
        headings += [name, f"{name}: interval from", f"{name}: interval to"]
    plan.headings(headings, left=2)
    row = FIRST_ROW
    places: dict[str, int] = {}
    for label, unit, form, values in _rows(sides, currency):
        places[label] = row
        plan.put(row, 1, label, "text")
        plan.put(row, 2, unit, "text")
        for number, triple in enumerate(values):
            plan.table_row(row, 3 + 3 * number, [(value, "reported", form) for value in triple])
        row += 1
    plan.put(row, 1, "Mean less value on the curve", "text")
    plan.put(row, 2, "standard errors", "text")
    for number, side in enumerate(sides):
        letter = column_letter(3 + 3 * number)
        if side.se > 0.0 and np.isfinite((side.mean, side.curve, side.se)).all():
            formula = f"=({letter}{FIRST_ROW}-{letter}{places[_ON_CURVE]})/{letter}{FIRST_ROW + 1}"
            plan.put(row, 3 + 3 * number, Formula(formula), "live", "ratio")
    _check_sums(plan, sides, places, currency, checks)
    start = row + 3
    bins = start + 22
    for number, side in enumerate(sides):
        column = 1 + 4 * number
        first, last = histogram_table(
            plan, side.histogram, row=bins, column=column, unit=currency, form="money"
        )
        checks.add(
            f"Present values: paths in the histogram of the {side.name}",
            sheet=plan.name,
            unit="paths",
            form="whole",
            reported=float(simulation.paths),
            formula=f"=SUM({plan.area(column + 2, first, last)})",
        )
        number_format, unit = money_axis(float(np.abs(side.histogram.edges).max()), currency)
        chart = histogram(
            Column(
                side.name.capitalize(), plan.area(column + 2, first, last), _SIDE_COLOURS.get(side.name, INK)
            ),
            None,
            plan.area(column, first, last),
            title=f"Present value of the {side.name}",
            across=f"Present value, middle of the bin [{unit}]",
            number_format=number_format,
            skip=max(1, math.ceil((last - first + 1) / 8)),
        )
        chart.width = 16
        plan.charts.append((chart, f"{'AEI'[number] if number < 3 else 'M'}{start}"))
    return plan


_ON_CURVE = "On the model's curve"


def _rows(sides: Sequence[Distribution], currency: str) -> list[_Row]:
    """Label, unit, format and (value, low, high) of each side, by row."""

    def plain(name: str) -> list[tuple[Any, Any, Any]]:
        return [(float(getattr(side, name)), None, None) for side in sides]

    def by_level(name: str, index: int) -> list[tuple[Any, Any, Any]]:
        return [(float(getattr(side, name)[index]), None, None) for side in sides]

    rows: list[_Row] = [
        ("Mean", currency, "money", plain("mean")),
        ("Standard error of the mean", currency, "money", plain("se")),
        ("Standard deviation", currency, "money", plain("sd")),
    ]
    levels = sides[0].levels if sides else ()
    for index, level in enumerate(levels):
        triples: list[tuple[Any, Any, Any]] = [
            (
                float(side.percentile[index]),
                float(side.percentile_low[index]),
                float(side.percentile_high[index]),
            )
            for side in sides
        ]
        rows.append((f"Percentile {level:g} %", currency, "money", triples))
        rows.append(("   its standard error", currency, "money", by_level("percentile_se", index)))
    for index, level in enumerate(levels):
        where = "below" if level < 50.0 else "above"
        rows.append((f"Mean at and {where} {level:g} %", currency, "money", by_level("tail_mean", index)))
        rows.append(("   its standard error", currency, "money", by_level("tail_mean_se", index)))
    return [
        *rows,
        (_ON_CURVE, currency, "money", plain("curve")),
        ("Share of paths below 0", "share", "share", plain("below_zero")),
        ("Standard error of that share", "share", "share", plain("below_zero_se")),
    ]


def _check_sums(
    plan: SheetPlan, sides: Sequence[Distribution], places: dict[str, int], currency: str, checks: Checks
) -> None:
    """The surplus is the assets less the liabilities, in the mean and on the curve."""
    if [side.name for side in sides] != ["assets", "liabilities", "surplus"]:
        return
    assets, liabilities, surplus = sides
    for label, name in (("Mean", "mean"), (_ON_CURVE, "curve")):
        figures = [getattr(side, name) for side in (assets, liabilities, surplus)]
        if not np.isfinite(figures).all():
            continue
        own, other = (plan.address(places[label], column) for column in (3, 6))
        checks.add(
            f"Present values: surplus, {label[0].lower()}{label[1:]}",
            sheet=plan.name,
            unit=currency,
            form="money2",
            reported=float(surplus.mean if name == "mean" else surplus.curve),
            formula=f"={own}-{other}",
            scale=f"{own}+{other}",
        )
