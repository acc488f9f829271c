"""The sheet of expected inflation: quotes, index factors, how lines grow, and the years of collared growth.

The columns by which rows of flows grow stand with `desk.report.results.growth_columns`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.book import IndexationKind, Inflation, PricedFlows, Side
from desk.rates.compounding import Compounding, to_continuous
from desk.report.results.checks import Checks
from desk.report.results.collars import ClassPlace, plan_collars
from desk.report.results.naming import Naming
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan
from desk.report.wording import SIDE_NAMES

__all__ = ["Growth", "plan_growth"]

_GRID_YEARS = 100


@dataclass(frozen=True)
class Growth:
    """The sheet and what rows of flows need of it.

    Attributes
    ----------
    plan : SheetPlan
    naming : Naming
    inflation : Inflation or None
    classes : dict of Side to tuple of ClassPlace
        In the order of the classes of the side.
    names : dict of str to str
        Names that the workbook defines.
    is_live : bool
        Whether all growth is recomputed.
    is_smooth : bool
        Whether the durations have one value: without deviation they jump where a floor or cap is met.
    """

    plan: SheetPlan
    naming: Naming
    inflation: Inflation | None
    classes: Mapping[Side, tuple[ClassPlace, ...]]
    names: Mapping[str, str]
    is_live: bool
    is_smooth: bool

    @property
    def is_plain(self) -> bool:
        """Whether every class follows the index up and down or rises: no floor and no cap."""
        return all(
            place.indexation.kind is not IndexationKind.COLLARED and place.indexation.least is None
            for places in self.classes.values()
            for place in places
        )


def plan_growth(
    inflation: Inflation | None, flows: Mapping[Side, PricedFlows], naming: Naming, checks: Checks
) -> Growth | None:
    """Plan the sheet; None where nothing grows and no inflation is expected.

    Parameters
    ----------
    inflation : Inflation or None
    flows : mapping of Side to PricedFlows
    naming : Naming
    checks : Checks
        Gains the checks of this sheet.
    """
    if inflation is None and not any(side.indexations for side in flows.values()):
        return None
    note = (
        "The index expected at a term is today's times (1 + rate) to the power of the term. A lagged index "
        "is known until it has taken notice of today."
        if inflation is not None
        else "The basis states no expected inflation: only fixed rises count."
    )
    plan = SheetPlan(
        naming.sheet("Expected inflation"), naming.title("Expected inflation"), note, title_rows="1:3"
    )
    plan.widths = (
        {1: 17.0} | dict.fromkeys(range(2, 9), 14.0) | {9: 16.0} | dict.fromkeys(range(10, 18), 14.0)
    )
    names: dict[str, str] = {}
    row = FIRST_ROW
    if inflation is not None:
        row = _quotes(plan, inflation, naming, names, checks)
    classes, row = _classes(plan, flows, row)
    is_live, is_smooth = True, True
    if inflation is not None:
        classes, is_live, is_smooth = plan_collars(plan, inflation, flows, classes, naming, checks, row)
    return Growth(plan, naming, inflation, classes, names, is_live, is_smooth)


def _quotes(
    plan: SheetPlan, inflation: Inflation, naming: Naming, names: dict[str, str], checks: Checks
) -> int:
    """Quotes, index factors and what else is stated; returns the row after them."""
    plan.headings(
        [
            "Quotes: term [years]",
            "Rate as stated [a year]",
            "Continuous, reported [a year]",
            "Continuous, recomputed [a year]",
            "Index expected, reported [today = 1]",
            "Index expected, recomputed [today = 1]",
            "Difference",
            "Check",
        ],
        left=0,
    )
    plan.headings(["Item", "Value", "Unit"], column=10)
    stated = inflation.recent is not None
    items: list[tuple[str, Any, str, str]] = [
        ("Interpolation", inflation.interpolation.value, "", "word"),
        ("Volatility", inflation.volatility, "a year", "rate"),
        ("Recent inflation", inflation.recent if stated else "start of the curve", "a year", "rate"),
    ]
    for offset, (label, value, unit, form) in enumerate(items):
        plan.put(FIRST_ROW + offset, 10, label, "text")
        place = plan.put(FIRST_ROW + offset, 11, value, "input", form)
        plan.put(FIRST_ROW + offset, 12, unit or None, "unit")
        if label == "Volatility":
            names[naming.name("inflation_volatility")] = place
    at = FIRST_ROW + len(items)
    plan.put(at, 10, "Recent, continuous", "text")
    live = Formula(f"=LN(1+K{at - 1})") if stated else None
    value = live if live is not None else inflation.recent_rate
    names[naming.name("inflation_recent")] = plan.put(at, 11, value, "live" if stated else "input", "rate")
    plan.put(at, 12, "a year", "unit")
    continuous = to_continuous(inflation.rates, Compounding.ANNUAL)
    with np.errstate(over="ignore", divide="ignore"):
        index = 1.0 / inflation.curve.discount(inflation.terms)
    for offset in range(inflation.terms.size):
        row = FIRST_ROW + offset
        plan.table_row(
            row,
            1,
            [
                (float(inflation.terms[offset]), "input", "term"),
                (float(inflation.rates[offset]), "input", "rate"),
                (float(continuous[offset]), "reported", "rate"),
                (Formula(f"=LN(1+B{row})"), "live", "rate"),
                (float(index[offset]), "reported", "factor"),
                (Formula(f"=EXP(D{row}*A{row})"), "live", "factor"),
                (Formula(f"=ABS(C{row}-D{row})+ABS(E{row}-F{row})"), "live", "tiny"),
                (
                    Formula(f'=IF(G{row}<=check_tolerance*MAX(1,ABS(E{row})),"OK","CHECK")'),
                    "check",
                    "text",
                ),
            ],
        )
    last = FIRST_ROW + inflation.terms.size - 1
    area = plan.mark_checks(8, FIRST_ROW, last)
    checks.add_column(naming.figure("Quotes of inflation that differ"), plan, area)
    row = _grid(plan, inflation, max(last, at) + 2, naming, checks)
    return row + 1


def _grid(plan: SheetPlan, inflation: Inflation, row: int, naming: Naming, checks: Checks) -> int:
    """The index expected by whole years; returns the row after it."""
    end = int(np.clip(np.ceil(inflation.terms[-1]), 10, _GRID_YEARS))
    years = np.arange(0.0, end + 1.0)
    zero = inflation.curve.zero(years)
    with np.errstate(over="ignore", divide="ignore"):
        index = 1.0 / inflation.curve.discount(years)
    plan.put(row, 1, "Index by year", "title")
    plan.headings(
        [
            "Term [years]",
            "Expected inflation to then, continuous [a year]",
            "Index expected, reported [today = 1]",
            "Index expected, recomputed [today = 1]",
            "Inflation of the year, recomputed",
            "Difference",
            "Check",
        ],
        row=row + 1,
        left=0,
    )
    first = row + 2
    for offset in range(years.size):
        at = first + offset
        over_year = Formula(f"=D{at}/D{at - 1}-1") if offset else None
        plan.table_row(
            at,
            1,
            [
                (float(years[offset]), "reported", "term"),
                (float(zero[offset]), "input", "rate"),
                (float(index[offset]), "reported", "factor"),
                (Formula(f"=EXP(B{at}*A{at})"), "live", "factor"),
                (over_year, "live", "rate"),
                (Formula(f"=ABS(C{at}-D{at})"), "live", "tiny"),
                (
                    Formula(f'=IF(F{at}<=check_tolerance*MAX(1,ABS(C{at})),"OK","CHECK")'),
                    "check",
                    "text",
                ),
            ],
        )
    last = first + years.size - 1
    area = plan.mark_checks(7, first, last)
    checks.add_column(naming.figure("Years of the index that differ"), plan, area)
    return last + 1


def _classes(
    plan: SheetPlan, flows: Mapping[Side, PricedFlows], row: int
) -> tuple[dict[Side, tuple[ClassPlace, ...]], int]:
    """Every way to grow with its terms; returns the row after them."""
    found: dict[Side, tuple[ClassPlace, ...]] = dict.fromkeys(flows, ())
    if not any(side.indexations for side in flows.values()):
        return found, row
    # The headings of the sheet stand at the top where there are no quotes.
    at = row + 1 if row > FIRST_ROW else HEADING_ROW
    if row > FIRST_ROW:
        plan.put(row, 1, "How amounts in today's money grow", "title")
    plan.headings(
        ["Number", "Kind", "Rise [a year]", "Floor [a year]", "Cap [a year]", "Lag [years]", "Least growth",
         "Side"],
        row=at,
    )  # fmt: skip
    number = 0
    for side, own in flows.items():
        places = []
        for indexation in own.indexations:
            number += 1
            line = at + number
            plan.table_row(
                line,
                1,
                [
                    (number, "reported", "whole"),
                    (indexation.kind.value, "text", "text"),
                    (indexation.rise if indexation.kind is IndexationKind.RISING else None, "input", "rate"),
                    (indexation.floor, "input", "rate"),
                    (indexation.cap, "input", "rate"),
                    (indexation.lag if indexation.follows_index else None, "input", "years"),
                    (indexation.least, "input", "factor"),
                    (SIDE_NAMES[side], "text", "text"),
                ],
            )
            rise, lag, least = (plan.address(line, column) for column in (3, 6, 7))
            places.append(ClassPlace(number, indexation, rise, lag, least))
        found[side] = tuple(places)
    return found, at + number + 2
