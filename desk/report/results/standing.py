"""The sheets of the standing: lines, key rates, periods, and the checks of every measure."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from desk.book import Side
from desk.book.arrays import FloatArray
from desk.report.results.charts import Column, bars_with_line, money_axis
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP, FlowSheet
from desk.report.results.look import ASSETS, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, Block, Formula, SheetPlan
from desk.report.wording import SIDE_NAMES
from desk.valuation.records import LineStanding, Measures, Standing

__all__ = [
    "LIVE_WORK",
    "check_measures",
    "flow_chart",
    "plan_lines",
    "plan_periods",
    "size_of_line",
]

_THIN = 100.0
LIVE_WORK = 50_000_000
"""Comparisons that the formulas by line may cost a spreadsheet; above it they are left out."""


def check_measures(standing: Standing, sheets: dict[Side, FlowSheet], checks: Checks) -> dict[str, str]:
    """Plan the checks of every measure of both sides and of the gaps between them.

    Parameters
    ----------
    standing : Standing
    sheets : dict of Side to FlowSheet
    checks : Checks

    Returns
    -------
    dict of str to str
        Addresses of recomputed figures: ``surplus``, ``funding_ratio``, ``duration_gap``, ``dv01_gap``, and
        for each side ``assets_present_value`` and so on; empty where a figure has no meaning.
    """
    found: dict[str, str] = {}
    for side, measures in ((Side.ASSETS, standing.assets), (Side.LIABILITIES, standing.liabilities)):
        found |= _check_side(side, measures, sheets[side], checks, standing.currency)
    worth_a, worth_l = found["assets_present_value"], found["liabilities_present_value"]
    if not (worth_a and worth_l):
        return found
    money = {"sheet": "Standing", "unit": standing.currency, "form": "money2"}
    found["surplus"] = checks.add(
        "Surplus",
        reported=standing.surplus,
        formula=f"={worth_a}-{worth_l}",
        scale=f"ABS({worth_a})+ABS({worth_l})",
        **money,
    )
    found["funding_ratio"] = checks.add(
        "Funding ratio",
        sheet="Standing",
        unit="share",
        form="share",
        reported=standing.funding_ratio,
        formula=f"={worth_a}/{worth_l}",
    )
    found["duration_gap"] = checks.add(
        "Duration gap",
        sheet="Standing",
        unit="years",
        form="years",
        reported=standing.duration_gap,
        formula=f"=(SUM(assets_timed)-SUM(liabilities_timed))/{worth_a}",
    )
    if found.get("assets_dv01") and found.get("liabilities_dv01"):
        found["dv01_gap"] = checks.add(
            "DV01 gap",
            reported=standing.dv01_gap,
            formula=f"={found['assets_dv01']}-{found['liabilities_dv01']}",
            scale=f"ABS({found['assets_dv01']})+ABS({found['liabilities_dv01']})",
            **money,
        )
    return found


def _check_side(
    side: Side, measures: Measures, sheet: FlowSheet, checks: Checks, currency: str
) -> dict[str, str]:
    """The checks of one side."""
    prefix, name, place = side.value, SIDE_NAMES[side], sheet.plan.name
    found: dict[str, str] = {}

    def add(key: str, label: str, unit: str, form: str, formula: str, scale: str = "") -> None:
        found[f"{prefix}_{key}"] = checks.add(
            f"{name}: {label}",
            sheet=place,
            unit=unit,
            form=form,
            reported=getattr(measures, key),
            formula=formula,
            scale=scale,
        )

    add("present_value", "present value", currency, "money2", f"=SUM({prefix}_value)")
    worth = found[f"{prefix}_present_value"]
    if not worth:
        return found
    checks.add(
        f"{name}: rows' present values, sum of differences",
        sheet=place,
        unit=currency,
        form="tiny",
        reported=0.0,
        formula=f"=SUMPRODUCT(ABS({prefix}_difference))",
        scale=worth,
    )
    if sheet.has_paid and sheet.is_by_row:
        checks.add(
            f"{name}: present value of what is paid, as projected",
            sheet=place,
            unit=currency,
            form="money2",
            reported=measures.present_value,
            formula=f"=SUMPRODUCT({prefix}_paid,{prefix}_discount)",
            scale=f"SUMPRODUCT(ABS({prefix}_value))",
        )
    if math.isfinite(measures.effective_duration):
        add("effective_duration", "effective duration", "years", "years", f"=SUM({prefix}_timed)/{worth}")
        add("convexity", "convexity", "years²", "years2", f"=SUM({prefix}_timed_twice)/{worth}")
        duration, convexity = found[f"{prefix}_effective_duration"], found[f"{prefix}_convexity"]
        add("dispersion", "dispersion", "years²", "years2", f"={convexity}-{duration}*{duration}", convexity)
    if not sheet.is_by_row:
        checks.left_out.append(
            f"{name}: DV01, equivalent rate and the durations at it need every flow; {sheet.rows_before:,} "
            "are too many to show one by one, so they are not recomputed here."
        )
        return found
    add(
        "dv01", "DV01", currency, "money2",
        f"=SUMPRODUCT({prefix}_value,1-EXP(-basis_point*{prefix}_time))",
    )  # fmt: skip
    if math.isfinite(measures.equivalent_rate):
        rate = checks.reported_address(ahead=3)
        at_rate = f"{prefix}_amount*EXP(-LN(1+{rate})*{prefix}_time)"
        worth_at_rate = checks.add(
            f"{name}: present value at the equivalent rate",
            sheet=place,
            unit=currency,
            form="money2",
            reported=measures.present_value,
            formula=f"=SUMPRODUCT({at_rate})",
        )
        add("macaulay_duration", "Macaulay duration", "years", "years",
            f"=SUMPRODUCT({prefix}_time*{at_rate})/{worth_at_rate}")  # fmt: skip
        macaulay = found[f"{prefix}_macaulay_duration"]
        add("modified_duration", "modified duration", "years", "years", f"={macaulay}/(1+{rate})")
        # One Newton step from the reported rate: it stays where it is only if it is the root.
        add("equivalent_rate", "equivalent rate, one Newton step on", "a year", "rate",
            f"=(1+{rate})*EXP(({worth_at_rate}-{worth})/({worth_at_rate}*{macaulay}))-1")  # fmt: skip
    return found


def plan_lines(standing: Standing, sheets: dict[Side, FlowSheet], checks: Checks) -> SheetPlan:
    """The lines of both sides with their measures."""
    lines = standing.lines[:ROW_CAP]
    note = "Present value and effective duration are recomputed from the rows on the sheets of flows."
    rows = max(sheet.plan.block.count if sheet.plan.block else 0 for sheet in sheets.values())
    is_live = rows * len(lines) <= LIVE_WORK
    if len(lines) < len(standing.lines):
        note = f"The first {len(lines):,} of {len(standing.lines):,} lines. {note}"
    if not is_live:
        note = f"{len(standing.lines):,} lines, too many to recompute one by one here."
    sizes = {side: sheet.line_size for side, sheet in sheets.items()}
    unit = f"[{standing.currency}]"
    plan = SheetPlan("Standing", "Standing: the lines of both sides", note)
    plan.widths = dict(
        enumerate((28, 11, 9, 8, 7, 15, 10, 15, 15, 11, 11, 11, 10, 8, 11, 10, 10, 11, 11, 13), start=1)
    )
    plan.headings(
        [
            "Line",
            "Side",
            "Kind",
            "Line number",
            "Flows",
            f"Market value {unit}",
            "Spread [a year]",
            f"Present value, reported {unit}",
            f"Present value, recomputed {unit}",
            f"Difference {unit}",
            "Effective duration, reported [years]",
            "Effective duration, recomputed [years]",
            "Difference [years]",
            "Check",
            "Equivalent rate [a year]",
            "Macaulay duration [years]",
            "Modified duration [years]",
            "Convexity [years²]",
            "Dispersion [years²]",
            f"DV01 {unit}",
        ],
        left=3,
    )
    roles = (
        *("text", "text", "text", "text", "reported", "input", "reported", "reported", "live", "live"),
        *("reported", "live", "live", "check", *("reported",) * 6),
    )
    forms = (
        *("text", "text", "text", "whole", "whole", "money2", "rate", "money2", "money2", "tiny"),
        *("years", "years", "tiny", "text", "rate", "years", "years", "years2", "years2", "money2"),
    )
    plan.block = Block(FIRST_ROW, len(lines), roles, forms, lambda: _line_rows(lines, sizes, is_live=is_live))
    if lines and is_live:
        last = FIRST_ROW + len(lines) - 1
        checks.add_column("Lines that differ", plan, plan.mark_checks(14, FIRST_ROW, last))
    return plan


def size_of_line(address: str, size: float, present_value: float) -> str:
    """Expression of the size that the tolerance of a line's present value is a part of.

    Parameters
    ----------
    address : str
        Of the present value.
    size : float
        Sum of the rows' present values without their signs [currency].
    present_value : float
        [currency]

    Returns
    -------
    str
        The size stands in it where little is left of the rows, as of the two legs of a swap: no sum is more
        exact than its parts.
    """
    further = f",{size:.0f}" if _is_thin(size, present_value) else ""
    return f"MAX(1,ABS({address}){further})"


def _is_thin(size: float, present_value: float) -> bool:
    """Whether a line's rows all but cancel."""
    return math.isfinite(size) and size > _THIN * abs(present_value)


def _line_rows(
    lines: Sequence[LineStanding], sizes: dict[Side, FloatArray], *, is_live: bool
) -> Iterator[Sequence[Any]]:
    """One row a line."""
    numbers = dict.fromkeys(Side, 0)
    for row, line in enumerate(lines, start=FIRST_ROW):
        numbers[line.side] += 1
        side, measures = line.side.value, line.measures
        live: list[Any] = [None] * 6
        if is_live:
            size, worth = float(sizes[line.side][numbers[line.side] - 1]), measures.present_value
            limit = f"check_tolerance*{size_of_line(f'H{row}', size, worth)}"
            live = [
                Formula(f"=SUMIFS({side}_value,{side}_line,D{row})"),
                Formula(f"=H{row}-I{row}"),
                None,
                None,
                None,
                Formula(f'=IF(ABS(J{row})<={limit},"OK","CHECK")'),
            ]
            if math.isfinite(measures.effective_duration):
                live[3] = Formula(f"=SUMIFS({side}_timed,{side}_line,D{row})/I{row}")
                live[4] = Formula(f"=K{row}-L{row}")
                times = f"*{size / abs(worth):.0f}" if worth and _is_thin(size, worth) else ""
                both = f"AND(ABS(J{row})<={limit},ABS(M{row})<=check_tolerance*MAX(1,ABS(K{row})){times})"
                live[5] = Formula(f'=IF({both},"OK","CHECK")')
        live[2] = measures.effective_duration
        yield (
            line.line,
            SIDE_NAMES[line.side],
            line.kind,
            numbers[line.side],
            line.flow_count,
            line.market_value,
            line.spread,
            measures.present_value,
            *live,
            measures.equivalent_rate,
            measures.macaulay_duration,
            measures.modified_duration,
            measures.convexity,
            measures.dispersion,
            measures.dv01,
        )


def plan_periods(standing: Standing, checks: Checks) -> SheetPlan:
    """Undiscounted flows of both sides by year."""
    periods = standing.periods
    unit = f"[{standing.currency}]"
    count = min(periods.year.size, ROW_CAP)
    plan = SheetPlan(
        "Periods",
        "Periods: undiscounted flows by year",
        "Year k holds the flows after k − 1 and up to k years from the valuation date; a flow today is in "
        "year 1.",
    )
    plan.widths = {1: 8.0} | dict.fromkeys(range(2, 13), 15.0) | {11: 9.0, 10: 11.0}
    plan.headings(
        [
            "Year",
            f"Assets {unit}",
            f"Liabilities {unit}",
            f"Net {unit}",
            f"Cumulative net {unit}",
            f"Assets, recomputed {unit}",
            f"Liabilities, recomputed {unit}",
            f"Net, recomputed {unit}",
            f"Cumulative net, recomputed {unit}",
            f"Difference {unit}",
            "Check",
            f"Liabilities, downward, for the chart {unit}",
        ],
        left=0,
    )
    for offset in range(count):
        row = FIRST_ROW + offset
        before = f"I{row - 1}+" if offset else ""
        scale = f"MAX(1,ABS(B{row})+ABS(C{row})+ABS(E{row}))"
        plan.table_row(
            row,
            1,
            [
                (int(periods.year[offset]), "reported", "whole"),
                (float(periods.assets[offset]), "reported", "money"),
                (float(periods.liabilities[offset]), "reported", "money"),
                (float(periods.net[offset]), "reported", "money"),
                (float(periods.cumulative[offset]), "reported", "money"),
                (Formula(f"=SUMIFS(assets_paid,assets_year,A{row},assets_payment,1)"), "live", "money"),
                (
                    Formula(f"=SUMIFS(liabilities_paid,liabilities_year,A{row},liabilities_payment,1)"),
                    "live",
                    "money",
                ),
                (Formula(f"=F{row}-G{row}"), "live", "money"),
                (Formula(f"={before}H{row}"), "live", "money"),
                (
                    Formula(f"=ABS(B{row}-F{row})+ABS(C{row}-G{row})+ABS(D{row}-H{row})+ABS(E{row}-I{row})"),
                    "live",
                    "tiny",
                ),
                (Formula(f'=IF(J{row}<=check_tolerance*{scale},"OK","CHECK")'), "check", "text"),
                (Formula(f"=-C{row}"), "live", "money"),
            ],
        )
    if not count:
        plan.put(FIRST_ROW, 1, "The book has no flows.", "note")
        return plan
    last = FIRST_ROW + count - 1
    checks.add_column("Years whose flows differ", plan, plan.mark_checks(11, FIRST_ROW, last))
    plan.charts.append((flow_chart(plan, standing), f"A{last + 3}"))
    plan.page_breaks.append(last + 1)
    return plan


def flow_chart(plan: SheetPlan, standing: Standing) -> Any:
    """Flows of both sides about the axis with the cumulative net, drawn from the sheet of periods."""
    periods = standing.periods
    count = min(periods.year.size, ROW_CAP)
    first, last = FIRST_ROW, FIRST_ROW + count - 1
    largest = float(np.abs([periods.assets, periods.liabilities]).max(initial=0.0))
    number_format, unit = money_axis(largest, standing.currency)
    line_format, line_unit = money_axis(float(np.abs(periods.cumulative).max(initial=0.0)), standing.currency)
    return bars_with_line(
        [
            Column("Assets", plan.area(2, first, last), ASSETS),
            Column("Liabilities, downward", plan.area(12, first, last), LIABILITIES),
        ],
        Column("Cumulative net (right axis)", plan.area(5, first, last), SURPLUS),
        plan.area(1, first, last),
        title="Flows of both sides by year",
        across="Years from the valuation date",
        upward=f"Flows in the year [{unit}]",
        line_upward=f"Cumulative net [{line_unit}]",
        number_format=number_format,
        line_format=line_format,
        skip=max(1, int(np.ceil(count / 15))),
    )
