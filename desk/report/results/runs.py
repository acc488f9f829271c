"""The sheets of a simulation: savings account, short rate, present values. Their figures are values."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise
from typing import Any

import numpy as np

from desk.report.results.charts import Column, band_colours, fan, histogram, money_axis
from desk.report.results.look import ASSETS, INK, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan, column_letter
from desk.report.wording import QUANTILE_METHOD
from desk.scenarios.records import Distribution, Histogram, NodeSummary, Simulation

__all__ = ["plan_present_values", "plan_savings_account", "plan_short_rate", "run_label"]

CHART_ROWS = 21
SIDE_COLOURS = {"assets": ASSETS, "liabilities": LIABILITIES, "surplus": SURPLUS}


def run_label(simulation: Simulation) -> str:
    """What was drawn, in one sentence."""
    return (
        f"{simulation.paths:,} paths of {simulation.model}, {simulation.steps_per_year} steps a year, "
        f"{simulation.measure} measure, seed {simulation.seed}"
    )


def plan_savings_account(simulation: Simulation) -> SheetPlan:
    """The savings account by year, with the closed form and the check against the curve."""
    account, closed, check = simulation.savings_account, simulation.closed_form, simulation.repricing
    plan = _sheet("Savings account", "Savings account: one unit rolled over", simulation)
    labels, columns = _summary_columns(account, form="ratio")
    at = len(labels) + 1
    labels += [
        "Mean of 1/R",
        "Mean of 1/R, standard error",
        "Mean of 1/R, expected",
        "Discount factor of the curve",
        "Mean of 1/R less expected [standard errors]",
    ]
    columns += [
        (check.mean_discount, "factor"),
        (check.mean_discount_se, "tiny"),
        (check.expected_discount, "factor"),
        (check.curve_discount, "factor"),
    ]
    plan.widths[at + 4] = 17.0
    last = _table(plan, HEADING_ROW, labels, columns)
    mean, error, expected = (column_letter(at + offset) for offset in range(3))
    for offset in range(account.year.size):
        if np.isfinite(check.expected_discount[offset]) and check.mean_discount_se[offset] > 0.0:
            row = FIRST_ROW + offset
            plan.put(row, at + 4, Formula(f"=({mean}{row}-{expected}{row})/{error}{row}"), "live", "ratio")
    charts = last + 2
    plan.page_breaks.append(charts - 1)
    row = _intervals(plan, account, charts + CHART_ROWS, form="ratio")
    if closed is not None:
        labels = ["Year", "Mean", "Standard deviation", "Mean of ln R", "Variance of ln R"]
        labels += [f"{level:g} %" for level in account.levels]
        columns = [(account.year, "term"), (closed.mean, "ratio"), (closed.sd, "ratio")]
        columns += [(closed.log_mean, "factor"), (closed.log_variance, "factor")]
        columns += [(closed.percentile[:, index], "ratio") for index in range(len(account.levels))]
        plan.put(row, 1, "Closed form, under the measure of the run", "title")
        row = _table(plan, row + 1, labels, columns) + 2
    fan_chart, row = _fan(
        plan, account, row, last=last, title="Savings account", upward="Value of 1 rolled over",
        number_format="0.0", form="ratio",
    )  # fmt: skip
    plan.charts.append((fan_chart, f"A{charts}"))
    plan.charts.append((_horizon_histogram(plan, simulation, row), f"J{charts}"))
    return plan


def plan_short_rate(simulation: Simulation) -> SheetPlan:
    """The short rate by year."""
    rate = simulation.short_rate
    plan = _sheet("Short rate", "Short rate, continuously compounded [a year]", simulation)
    labels, columns = _summary_columns(rate, form="rate")
    last = _table(plan, HEADING_ROW, labels, columns)
    charts = last + 2
    plan.page_breaks.append(charts - 1)
    row = _intervals(plan, rate, charts + CHART_ROWS, form="rate")
    chart, _ = _fan(
        plan, rate, row, last=last, title="Short rate", upward="Continuously compounded [a year]",
        number_format='0.0%;"−"0.0%', form="rate",
    )  # fmt: skip
    plan.charts.append((chart, f"A{charts}"))
    return plan


def _sheet(name: str, title: str, simulation: Simulation) -> SheetPlan:
    """A sheet of one quantity by year."""
    plan = SheetPlan(
        name, title, f"Simulated values, not recalculable here: {run_label(simulation)}. {QUANTILE_METHOD}"
    )
    plan.widths = dict.fromkeys(range(1, 20), 11.5)
    plan.title_rows = "1:3"
    plan.frozen = f"B{FIRST_ROW}"
    return plan


def plan_present_values(simulation: Simulation, *, currency: str) -> SheetPlan:
    """The pathwise present values of both sides and of the surplus."""
    sides = simulation.present_value
    plan = SheetPlan(
        "Present values",
        "Present values along the paths",
        f"Simulated values, not recalculable here: {run_label(simulation)}. {QUANTILE_METHOD}",
    )
    plan.widths = {1: 30.0, 2: 12.0} | dict.fromkeys(range(3, 16), 18.0)
    headings = ["Figure", "Unit"]
    for side in sides:
        name = side.name.capitalize()
        headings += [name, f"{name}: interval from", f"{name}: interval to"]
    plan.headings(headings, left=2)
    row = FIRST_ROW
    for label, unit, form, values in _distribution_rows(sides, currency):
        plan.put(row, 1, label, "text")
        plan.put(row, 2, unit, "text")
        for number, triple in enumerate(values):
            plan.table_row(row, 3 + 3 * number, [(value, "reported", form) for value in triple])
        row += 1
    plan.put(row, 1, "Mean less value on the curve", "text")
    plan.put(row, 2, "standard errors", "text")
    for number, side in enumerate(sides):
        letter = column_letter(3 + 3 * number)
        if side.se > 0.0:
            curve_row = row - 3
            formula = Formula(f"=({letter}{FIRST_ROW}-{letter}{curve_row})/{letter}{FIRST_ROW + 1}")
            plan.put(row, 3 + 3 * number, formula, "live", "ratio")
    start = row + 3
    bins = start + 22
    for number, side in enumerate(sides):
        column = 1 + 4 * number
        first, last = _histogram_table(
            plan, side.histogram, row=bins, column=column, unit=currency, form="money"
        )
        number_format, unit = money_axis(float(np.abs(side.histogram.edges).max()), currency)
        chart = histogram(
            Column(
                side.name.capitalize(), plan.area(column + 2, first, last), SIDE_COLOURS.get(side.name, INK)
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


def _distribution_rows(
    sides: Sequence[Distribution], currency: str
) -> list[tuple[str, str, str, list[tuple[Any, Any, Any]]]]:
    """Label, unit, format and (value, low, high) of each side, by row."""

    def plain(name: str) -> list[tuple[Any, Any, Any]]:
        return [(float(getattr(side, name)), None, None) for side in sides]

    rows = [
        ("Mean", currency, "money", plain("mean")),
        ("Standard error of the mean", currency, "money", plain("se")),
        ("Standard deviation", currency, "money", plain("sd")),
    ]
    for index, level in enumerate(sides[0].levels if sides else ()):
        triples: list[tuple[Any, Any, Any]] = [
            (
                float(side.percentile[index]),
                float(side.percentile_low[index]),
                float(side.percentile_high[index]),
            )
            for side in sides
        ]
        rows.append((f"Percentile {level:g} %", currency, "money", triples))
    return [
        *rows,
        ("On the model's curve", currency, "money", plain("curve")),
        ("Share of paths below 0", "share", "share", plain("below_zero")),
        ("Standard error of that share", "share", "share", plain("below_zero_se")),
    ]


def _summary_columns(summary: NodeSummary, *, form: str) -> tuple[list[str], list[tuple[Any, str]]]:
    """Headings and columns of a quantity by year."""
    labels = [
        "Year",
        "Mean",
        "Mean, standard error",
        "Standard deviation",
        "Standard deviation, standard error",
    ]
    labels += [f"{level:g} %" for level in summary.levels]
    columns: list[tuple[Any, str]] = [
        (summary.year, "term"),
        (summary.mean, form),
        (summary.mean_se, "tiny"),
        (summary.sd, form),
        (summary.sd_se, "tiny"),
    ]
    columns += [(summary.percentile[:, index], form) for index in range(len(summary.levels))]
    return labels, columns


def _table(plan: SheetPlan, row: int, labels: Sequence[str], columns: Sequence[tuple[Any, str]]) -> int:
    """Plan a table below a row of headings; returns its last row."""
    plan.headings(labels, row=row, left=0)
    for number, (array, form) in enumerate(columns, start=1):
        for offset, value in enumerate(array.tolist(), start=1):
            plan.put(row + offset, number, value, "reported", form)
    return row + len(columns[0][0])


def _intervals(plan: SheetPlan, summary: NodeSummary, row: int, *, form: str) -> int:
    """The intervals of the percentiles; returns the row after a gap."""
    labels: list[str] = ["Year"]
    columns: list[tuple[Any, str]] = [(summary.year, "term")]
    for index, level in enumerate(summary.levels):
        labels += [f"{level:g} %, from", f"{level:g} %, to"]
        columns += [(summary.percentile_low[:, index], form), (summary.percentile_high[:, index], form)]
    plan.put(row, 1, "95 % intervals of the percentiles", "title")
    return _table(plan, row + 1, labels, columns) + 2


def _fan(
    plan: SheetPlan,
    summary: NodeSummary,
    row: int,
    *,
    last: int,
    title: str,
    upward: str,
    number_format: str,
    form: str,
) -> tuple[Any, int]:
    """The fan and the table of steps between percentiles that it is drawn from; and the row after a gap."""
    levels = summary.levels
    count, years = len(levels), summary.year.size
    plan.put(row, 1, "Steps between the percentiles, for the chart", "title")
    labels = ["Year", f"Below {levels[0]:g} %"]
    labels += [f"{low:g} to {high:g} %" for low, high in pairwise(levels)]
    plan.headings(labels, row=row + 1, left=0)
    first, end = row + 2, row + 1 + years
    for offset in range(years):
        source = FIRST_ROW + offset
        plan.put(first + offset, 1, float(summary.year[offset]), "reported", "term")
        for index in range(count):
            own, before = (column_letter(6 + number) for number in (index, index - 1))
            step = f"={own}{source}" if index == 0 else f"={own}{source}-{before}{source}"
            plan.put(first + offset, 2 + index, Formula(step), "live", form)
    colours = band_colours(count - 1)
    bands = [
        Column(labels[index + 2], plan.area(index + 3, first, end), colours[index])
        for index in range(count - 1)
    ]
    middle = min(range(count), key=lambda index: abs(levels[index] - 50.0))
    chart = fan(
        Column(labels[1], plan.area(2, first, end), "FFFFFF"),
        bands,
        Column(f"{levels[middle]:g} %", plan.area(6 + middle, FIRST_ROW, last), INK),
        plan.area(1, FIRST_ROW, last),
        title=title,
        across="Years from the valuation date",
        upward=upward,
        number_format=number_format,
        skip=max(1, math.ceil(years / 12)),
    )
    return chart, end + 2


def _histogram_table(
    plan: SheetPlan, bins: Histogram, *, row: int, column: int, unit: str, form: str
) -> tuple[int, int]:
    """Bins with their counts; returns the first and last row."""
    middle = 0.5 * bins.edges[:-1] + 0.5 * bins.edges[1:]
    plan.headings(
        [f"Middle of the bin [{unit}]", f"Bin from [{unit}]", "Paths"], row=row, column=column, left=0
    )
    for offset in range(bins.counts.size):
        plan.table_row(
            row + 1 + offset,
            column,
            [
                (float(middle[offset]), "reported", form),
                (float(bins.edges[offset]), "reported", form),
                (int(bins.counts[offset]), "reported", "whole"),
            ],
        )
    return row + 1, row + int(bins.counts.size)


def _horizon_histogram(plan: SheetPlan, simulation: Simulation, row: int) -> Any:
    """The histogram of the savings account at the end of the paths, with the closed form over it."""
    account, closed = simulation.savings_account, simulation.closed_form
    bins = account.histograms[-1]
    year = float(account.year[-1])
    plan.put(row, 1, f"Histogram of the savings account at year {year:g}", "title")
    first, end = _histogram_table(plan, bins, row=row + 1, column=1, unit="1", form="ratio")
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
