"""Tables and charts that the sheets of a simulation share. Their figures are values."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence
from itertools import pairwise
from typing import Any

import numpy as np

from desk.report.results.charts import Column, band_colours, fan
from desk.report.results.look import INK
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan, column_letter
from desk.report.scenario_wording import run_label
from desk.scenarios.records import Histogram, NodeSummary, Simulation

__all__ = [
    "CHART_ROWS",
    "NOTE_WIDTH",
    "SUMMARY_COLUMNS",
    "begin_quantity",
    "further_tables",
    "histogram_table",
    "plan_fan",
    "plan_notes",
    "plan_table",
    "row_after_chart",
    "run_sheet",
    "tail_words",
]

CHART_ROWS = 21
NOTE_WIDTH = 120
"""Characters of a note on a line."""

SUMMARY_COLUMNS = 5
"""Columns before the percentiles in the first table of a quantity by year."""


def run_sheet(name: str, title: str, simulation: Simulation) -> SheetPlan:
    """An empty sheet of a quantity by year."""
    plan = SheetPlan(name, title, f"Simulated values, not recalculable here: {run_label(simulation)}.")
    plan.widths = dict.fromkeys(range(1, 24), 11.5)
    plan.title_rows = "1:3"
    plan.frozen = f"B{FIRST_ROW}"
    return plan


def plan_notes(plan: SheetPlan, row: int, text: str) -> int:
    """Plan a text in lines that do not make the printed page wider; returns the row after."""
    for part in textwrap.wrap(text, NOTE_WIDTH):
        plan.put(row, 1, part, "note")
        row += 1
    return row


def plan_table(plan: SheetPlan, row: int, labels: Sequence[str], columns: Sequence[tuple[Any, str]]) -> int:
    """Plan a table below a row of headings; returns its last row.

    Parameters
    ----------
    plan : SheetPlan
    row : int
        Of the headings.
    labels : sequence of str
    columns : sequence of (ndarray, str)
        Values with their format.
    """
    plan.headings(labels, row=row, left=0)
    for number, (array, form) in enumerate(columns, start=1):
        for offset, value in enumerate(array.tolist(), start=1):
            plan.put(row + offset, number, value, "reported", form)
    return row + len(columns[0][0])


def begin_quantity(
    plan: SheetPlan,
    summary: NodeSummary,
    *,
    form: str,
    title: str,
    upward: str,
    number_format: str,
    after_chart: int = 0,
) -> int:
    """Plan the first table of a quantity by year, its fan and the tables below; returns the row after.

    Parameters
    ----------
    plan : SheetPlan
    summary : NodeSummary
    form : str
        Number format of the quantity.
    title, upward, number_format : str
        Of the chart.
    after_chart : int
        Rows left free between the chart and the further tables, from `row_after_chart` on.
    """
    labels = [
        "Year",
        "Mean",
        "Mean, standard error",
        "Standard deviation",
        "Standard deviation, standard error",
        *(f"{level:g} %" for level in summary.levels),
    ]
    columns: list[tuple[Any, str]] = [
        (summary.year, "term"),
        (summary.mean, form),
        (summary.mean_se, "tiny"),
        (summary.sd, form),
        (summary.sd_se, "tiny"),
    ]
    columns += [(summary.percentile[:, index], form) for index in range(len(summary.levels))]
    last = plan_table(plan, HEADING_ROW, labels, columns)
    charts = last + 2
    plan.page_breaks.append(charts - 1)
    row = further_tables(plan, summary, row_after_chart(summary) + after_chart, form=form)
    chart, row = plan_fan(
        plan, summary, row, last=last, title=title, upward=upward, number_format=number_format, form=form
    )
    plan.charts.append((chart, f"A{charts}"))
    return row


def row_after_chart(summary: NodeSummary) -> int:
    """The first row below the chart of a quantity by year."""
    return HEADING_ROW + summary.year.size + 2 + CHART_ROWS


def further_tables(plan: SheetPlan, summary: NodeSummary, row: int, *, form: str) -> int:
    """Plan what belongs to the percentiles: errors, intervals, means beyond; returns the row after a gap."""
    levels = summary.levels
    year: tuple[Any, str] = (summary.year, "term")
    plan.put(row, 1, "Standard errors of the percentiles", "title")
    errors = [year, *((summary.percentile_se[:, index], "tiny") for index in range(len(levels)))]
    row = plan_table(plan, row + 1, ["Year", *(f"{level:g} %" for level in levels)], errors) + 2
    labels, columns = ["Year"], [year]
    for index, level in enumerate(levels):
        labels += [f"{level:g} %, from", f"{level:g} %, to"]
        columns += [(summary.percentile_low[:, index], form), (summary.percentile_high[:, index], form)]
    plan.put(row, 1, "95 % intervals of the percentiles", "title")
    row = plan_table(plan, row + 1, labels, columns) + 2
    labels, columns = ["Year"], [year]
    for index, level in enumerate(levels):
        labels += [tail_words(level), f"{level:g} %, standard error"]
        columns += [(summary.tail_mean[:, index], form), (summary.tail_mean_se[:, index], "tiny")]
    plan.put(row, 1, "Means beyond the percentiles", "title")
    return plan_table(plan, row + 1, labels, columns) + 2


def tail_words(level: float) -> str:
    """Which values a tail mean is that of."""
    return f"At and {'below' if level < 50.0 else 'above'} {level:g} %"


def plan_fan(
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
    own = SUMMARY_COLUMNS + 1
    for offset in range(years):
        source = FIRST_ROW + offset
        plan.put(first + offset, 1, float(summary.year[offset]), "reported", "term")
        known = np.isfinite(summary.percentile[offset])
        for index in range(count):
            if not (known[index] and known[index - 1 if index else 0]):
                continue
            letter, before = (column_letter(own + number) for number in (index, index - 1))
            step = f"={letter}{source}" if index == 0 else f"={letter}{source}-{before}{source}"
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
        Column(f"{levels[middle]:g} %", plan.area(own + middle, FIRST_ROW, last), INK),
        plan.area(1, FIRST_ROW, last),
        title=title,
        across="Years from the valuation date",
        upward=upward,
        number_format=number_format,
        skip=max(1, math.ceil(years / 12)),
    )
    return chart, end + 2


def histogram_table(
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
