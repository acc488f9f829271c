"""The sheet of parallel moves: both sides against a parallel move of all rates, with the tangent."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from desk.book import Side
from desk.report.results.charts import Column, lines, money_axis
from desk.report.results.checks import Checks
from desk.report.results.look import LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan
from desk.report.results.shocks_rates import Terms
from desk.valuation.shock_records import ParallelProfile, ShockTable

__all__ = ["PROFILE_SHEET", "gap_turns_text", "plan_profile", "profile_chart"]

PROFILE_SHEET = "Parallel moves"


def gap_turns_text(profile: ParallelProfile) -> str:
    """Where the duration gap changes its sign, in words."""
    low, high = _signed(profile.move[0]), _signed(profile.move[-1])
    if not profile.gap_turns:
        return (
            f"The duration gap keeps its sign for parallel moves from {low} to {high} basis points: the "
            f"surplus {'rises' if profile.surplus[-1] > profile.surplus[0] else 'falls'} with rates all the "
            "way."
        )
    listed = ", ".join(
        f"{_signed(move, 1)} (the surplus is {_extreme(profile, move)} there)" for move in profile.gap_turns
    )
    return f"The duration gap changes its sign at a parallel move in basis points of {listed}."


def _signed(figure: float, digits: int = 0) -> str:
    """A figure with its sign, a true minus."""
    return f"{figure:+,.{digits}f}".replace("-", "−")


def _extreme(profile: ParallelProfile, turn: float) -> str:
    """Whether the surplus is least or greatest where the gap changes its sign.

    The surplus falls with rates while the gap is positive, so it is least where the gap comes from above 0.
    """
    before = profile.duration_gap[profile.move < turn]
    return "least" if before.size and before[-1] > 0.0 else "greatest"


def plan_profile(found: ShockTable, terms: Terms | None, checks: Checks) -> SheetPlan:
    """Plan the sheet.

    Parameters
    ----------
    found : ShockTable
    terms : Terms or None
        None where the sides are not recomputed.
    checks : Checks
        Gains the check of this sheet.
    """
    profile = found.profile
    unit = f"[{found.currency}]"
    plan = SheetPlan(
        PROFILE_SHEET,
        "Parallel moves: the surplus against a move of all rates",
        f"All continuous zero rates move together. {gap_turns_text(profile)}",
    )
    plan.widths = {1: 14.0} | dict.fromkeys(range(2, 14), 16.0) | {6: 10.0, 7: 10.0, 12: 12.0, 13: 9.0}
    plan.headings(
        [
            "Move [basis points]",
            f"Assets {unit}",
            f"Liabilities {unit}",
            f"Surplus {unit}",
            f"Tangent at 0 {unit}",
            "Funding ratio",
            "Duration gap [years]",
            *(
                [
                    f"Assets, recomputed {unit}",
                    f"Liabilities, recomputed {unit}",
                    f"Surplus, recomputed {unit}",
                    f"Tangent, recomputed {unit}",
                    f"Difference {unit}",
                    "Check",
                ]
                if terms is not None
                else []
            ),
        ],
        left=0,
    )
    figures = (profile.assets, profile.liabilities, profile.surplus, profile.tangent)
    for offset, move in enumerate(profile.move.tolist()):
        row = FIRST_ROW + offset
        cells: list[tuple[Any, str, str]] = [
            (move, "reported", "whole"),
            *((float(figure[offset]), "reported", "money") for figure in figures),
            (float(profile.funding_ratio[offset]), "reported", "share"),
            (float(profile.duration_gap[offset]), "reported", "years"),
        ]
        is_live = all(math.isfinite(float(figure[offset])) for figure in figures)
        if terms is not None and is_live:
            cells += _recomputed(row)
        plan.table_row(row, 1, cells)
    last = FIRST_ROW + profile.move.size - 1
    if terms is not None:
        checks.add_column("Parallel moves that differ", plan, plan.mark_checks(13, FIRST_ROW, last))
    plan.charts.append((profile_chart(found), f"A{last + 3}"))
    plan.page_breaks.append(last + 1)
    return plan


def _recomputed(row: int) -> list[tuple[Any, str, str]]:
    """The recomputed cells of one move."""
    after = [
        Formula(f"=SUMPRODUCT(shock_{side.value}*EXP(-A{row}*basis_point*shock_term))")
        for side in (Side.ASSETS, Side.LIABILITIES)
    ]
    slope = "SUMPRODUCT(shock_assets-shock_liabilities,shock_term)"
    away = f"=ABS(B{row}-H{row})+ABS(C{row}-I{row})+ABS(D{row}-J{row})+ABS(E{row}-K{row})"
    size = f"MAX(1,ABS(B{row})+ABS(C{row}),shock_gross_assets+shock_gross_liabilities)"
    return [
        *((formula, "live", "money") for formula in after),
        (Formula(f"=H{row}-I{row}"), "live", "money"),
        (Formula(f"=SUM(shock_assets)-SUM(shock_liabilities)-A{row}*basis_point*{slope}"), "live", "money"),
        (Formula(away), "live", "tiny"),
        (Formula(f'=IF(L{row}<=check_tolerance*{size},"OK","CHECK")'), "check", "text"),
    ]


def profile_chart(found: ShockTable) -> Any:
    """Surplus and tangent by parallel move, drawn from the sheet of parallel moves."""
    profile = found.profile
    last = FIRST_ROW + profile.move.size - 1
    plan = SheetPlan(PROFILE_SHEET, "", "")
    largest = float(np.nanmax(np.abs([profile.surplus, profile.tangent])))
    number_format, unit = money_axis(largest, found.currency)
    chart = lines(
        [
            Column("Surplus, fully revalued", plan.area(4, FIRST_ROW, last), SURPLUS),
            Column("Tangent at 0", plan.area(5, FIRST_ROW, last), LIABILITIES, "sysDash"),
        ],
        plan.area(1, FIRST_ROW, last),
        title="Surplus by parallel move of all rates",
        across="Move [basis points]",
        upward=f"Surplus [{unit}]",
        number_format=number_format,
    )
    chart.x_axis.scaling.min, chart.x_axis.scaling.max = float(profile.move[0]), float(profile.move[-1])
    across: Any = chart.x_axis
    across.majorUnit = 100
    chart.x_axis.number_format = '0;"−"0'
    chart.y_axis.crosses = "min"
    return chart
