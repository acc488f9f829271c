"""The sheet of the standing: the lines of both sides."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Any

from desk.book import Side
from desk.book.arrays import FloatArray
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP, FlowSheet
from desk.report.results.plan import FIRST_ROW, Block, Formula, SheetPlan
from desk.report.wording import SIDE_NAMES
from desk.valuation.records import LineStanding, Standing

__all__ = [
    "LIVE_WORK",
    "plan_lines",
    "size_of_line",
]

_THIN = 100.0
LIVE_WORK = 50_000_000
"""Comparisons that the formulas by line may cost a spreadsheet; above it they are left out."""


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
    has_inflation = standing.inflation is not None
    follows = {side for side, sheet in sheets.items() if sheet.follows_inflation and is_live}
    unit = f"[{standing.currency}]"
    plan = SheetPlan("Standing", "Standing: the lines of both sides", note)
    plan.widths = dict(
        enumerate(
            (28, 11, 9, 8, 7, 15, 10, 15, 15, 11, 11, 11, 10, 8, 11, 10, 10, 11, 11, 13, 13, 13), start=1
        )
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
            *([f"Inflation DV01, reported {unit}"] if has_inflation else []),
            *([f"Inflation DV01, recomputed {unit}"] if follows else []),
        ],
        left=3,
    )
    roles = (
        *("text", "text", "text", "text", "reported", "input", "reported", "reported", "live", "live"),
        *("reported", "live", "live", "check", *("reported",) * (7 if has_inflation else 6)),
        *(("live",) if follows else ()),
    )
    forms = (
        *("text", "text", "text", "whole", "whole", "money2", "rate", "money2", "money2", "tiny"),
        *("years", "years", "tiny", "text", "rate", "years", "years", "years2", "years2", "money2"),
        *(("money2",) if has_inflation else ()),
        *(("money2",) if follows else ()),
    )
    plan.block = Block(
        FIRST_ROW,
        len(lines),
        roles,
        forms,
        lambda: _line_rows(lines, sizes, is_live=is_live, has_inflation=has_inflation, follows=follows),
    )
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
    lines: Sequence[LineStanding],
    sizes: dict[Side, FloatArray],
    *,
    is_live: bool,
    has_inflation: bool,
    follows: set[Side],
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
        further: list[Any] = [line.inflation_dv01] if has_inflation else []
        if follows:
            text = f"=SUMIFS({side}_inflation_rise,{side}_line,D{row})" if line.side in follows else "=0"
            further.append(Formula(text))
            near = f"ABS(U{row}-V{row})<={limit}"
            live[5] = Formula(f'=IF({near},{str(live[5]).removeprefix("=")},"CHECK")')
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
            *further,
        )
