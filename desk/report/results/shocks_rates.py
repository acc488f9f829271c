"""The sheet of shifts by term, at the terms at which both sides are revalued."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import PricedFlows, Side
from desk.book.arrays import FloatArray
from desk.book.shock import MoveKind, Shock
from desk.rates.curve import DiscountCurve
from desk.report.results.checks import Checks
from desk.report.results.flows import FlowSheet
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan, column_letter
from desk.report.results.shocks_moves import (
    MoveRows,
    joined_formula,
    joined_kinds,
    shift_formula,
    size_unit,
)
from desk.report.results.standing import LIVE_WORK
from desk.valuation.moved_curve import CurveMove
from desk.valuation.shock_records import ShockTable

__all__ = ["FIRST_SHIFT", "RATES_SHEET", "Terms", "plan_rates", "terms_of"]

RATES_SHEET = "Shock rates"
SHIFT_CAP = 120_000
"""Shifts that are listed: terms times shocks."""
_NEAR = 1e-9
"""Times nearer to each other than this are one term [years]."""
FIRST_SHIFT = 8
"""Column of the first shock's shift."""
_OF_SIDE = {
    Side.ASSETS: (MoveKind.SPREAD, MoveKind.VALUE),
    Side.LIABILITIES: (MoveKind.AMOUNT, MoveKind.TIME, MoveKind.DECLINE),
}


@dataclass(frozen=True, eq=False)
class Terms:
    """The terms at which either side has flows, u of them, and the shocks that are revalued there.

    Attributes
    ----------
    time : ndarray, shape (u,)
        Rising [years].
    zero : ndarray, shape (u,)
        Continuous zero rates before any shock [1/year].
    has_flows : dict of Side to ndarray of bool, shape (u,)
    count : int
        How many of the shocks are revalued, from the first.
    revalued : dict of Side to tuple of bool
        Whether the moves of each of these shocks, as far as they touch a side, are moves of rates alone.
    """

    time: FloatArray
    zero: FloatArray
    has_flows: dict[Side, NDArray[np.bool_]]
    count: int
    revalued: dict[Side, tuple[bool, ...]]

    @property
    def last_row(self) -> int:
        """Of the terms on the sheet of rates."""
        return FIRST_ROW + self.time.size - 1


def terms_of(
    found: ShockTable, flows: dict[Side, PricedFlows], sheets: dict[Side, FlowSheet], curve: DiscountCurve
) -> tuple[Terms | None, str]:
    """The terms at which shocks are revalued.

    Parameters
    ----------
    found : ShockTable
    flows : dict of Side to PricedFlows
    sheets : dict of Side to FlowSheet
    curve : DiscountCurve

    Returns
    -------
    terms : Terms or None
        None where too much would have to be recomputed.
    reason : str
        What is left out, and why; empty for nothing.
    """
    summed = [sheet for sheet in sheets.values() if not sheet.is_by_row]
    if summed:
        return None, (
            f"Shocks are not recomputed: {max(sheet.rows_before for sheet in summed):,} flows of one side "
            "are too many to show one by one."
        )
    every = np.sort(np.concatenate([flows[side].time for side in Side]))
    if not every.size:
        return None, "Shocks are not recomputed: the book has no flows."
    time = every[np.concatenate(([True], np.diff(every) > _NEAR))]
    has_flows: dict[Side, NDArray[np.bool_]] = {}
    work = 0
    for side in Side:
        place = np.searchsorted(time, flows[side].time, side="right") - 1
        own = np.zeros(time.size, dtype=np.bool_)
        own[place] = True
        has_flows[side] = own
        work += int(own.sum()) * len(flows[side])
    if work > LIVE_WORK:
        return None, (
            f"Shocks are not recomputed: {time.size:,} different terms with {every.size:,} flows would cost "
            "a spreadsheet too much."
        )
    count = min(len(found.results), SHIFT_CAP // time.size)
    if not count:
        return None, f"Shocks are not recomputed: {time.size:,} different terms are too many to list."
    reason = ""
    if count < len(found.results):
        reason = (
            f"The first {count:,} of {len(found.results):,} shocks are recomputed: a shift at each of "
            f"{time.size:,} terms is listed for no more than {SHIFT_CAP:,} in all."
        )
    shocks = [result.shock for result in found.results[:count]]
    revalued = {side: tuple(_by_rates(shock, flows[side]) for shock in shocks) for side in Side}
    return Terms(time, curve.zero(time), has_flows, count, revalued), reason


def _by_rates(shock: Shock, flows: PricedFlows) -> bool:
    """Whether a side is moved by rates alone."""
    other = _OF_SIDE[flows.side]
    if flows.index_class is not None and bool((flows.index_class >= 0).any()):
        other = (*other, MoveKind.INFLATION)
    return not any(move.kind in other for move in shock.moves)


@dataclass(frozen=True)
class _Shifts:
    """How the columns of shifts are made.

    Attributes
    ----------
    shocks : list of Shock
    places : sequence of MoveRows
        Of these shocks, and maybe of more.
    workings : list of dict of MoveKind to str
        Of each shock, the columns that hold what its moves at several terms come to.
    is_live : list of bool
        Whether the shift is a formula.
    """

    shocks: list[Shock]
    places: Sequence[MoveRows]
    workings: list[dict[MoveKind, str]]
    is_live: list[bool]

    @property
    def columns(self) -> list[tuple[int, MoveKind]]:
        """The columns of workings in their order: which shock, from 0, and of what kind of move."""
        return [(number, kind) for number, own in enumerate(self.workings) for kind in own]


def _shifts(found: ShockTable, terms: Terms, places: Sequence[MoveRows]) -> _Shifts:
    """Give every kind of move that stands at several terms a column, after those of the shifts."""
    shocks = [result.shock for result in found.results[: terms.count]]
    column = FIRST_SHIFT + terms.count
    workings: list[dict[MoveKind, str]] = []
    for place, _ in zip(places, shocks, strict=False):
        own = {}
        for kind in joined_kinds(place):
            own[kind] = column_letter(column)
            column += 1
        workings.append(own)
    is_live = [
        shift_formula(shock, place, FIRST_ROW, own) is not None
        for shock, place, own in zip(shocks, places, workings, strict=False)
    ]
    return _Shifts(shocks, places, workings, is_live)


def plan_rates(
    found: ShockTable,
    terms: Terms,
    sheets: dict[Side, FlowSheet],
    places: Sequence[MoveRows],
    checks: Checks,
) -> tuple[SheetPlan, dict[str, str]]:
    """Plan the sheet of shifts by term; also gives the names that the workbook defines.

    The values of both sides by term are sums over the sheets of flows.
    """
    last = terms.last_row
    shifts = _shifts(found, terms, places)
    columns = shifts.columns
    note = (
        "What each shock adds to the continuous zero rate at every term at which there are flows, and what "
        "the flows of that term are worth before. A shock's number stands above its column."
    )
    if not all(shifts.is_live):
        listed = ", ".join(str(number) for number, live in enumerate(shifts.is_live, start=1) if not live)
        note += f" The shifts of these shocks are values, not formulas: {listed}."
    plan = SheetPlan(RATES_SHEET, "Shock rates: shifts by term", note)
    unit = f"[{found.currency}]"
    plan.widths = {1: 11.0, 2: 11.0, 3: 11.0, 4: 12.0, 5: 11.0, 6: 17.0, 7: 17.0}
    plan.widths |= dict.fromkeys(range(FIRST_SHIFT, FIRST_SHIFT + terms.count + len(columns)), 15.0)
    plan.headings(
        [
            "Term [years]",
            "Flows from [years]",
            "To, not included [years]",
            "Zero rate before [a year]",
            "Fading of short moves",
            f"Assets of the term {unit}",
            f"Liabilities of the term {unit}",
            *(f"{shock.name} [a year]" for shock in shifts.shocks),
            *(f"Workings of {number + 1}: {kind.value} [{size_unit(kind)}]" for number, kind in columns),
        ],
        left=0,
    )
    plan.put(HEADING_ROW - 1, 5, "Sum", "text")
    for column in (6, 7):
        letter = column_letter(column)
        total = Formula(f"=SUM({letter}{FIRST_ROW}:{letter}{last})")
        plan.put(HEADING_ROW - 1, column, total, "live", "money")
    for number in range(1, terms.count + 1):
        plan.put(HEADING_ROW - 1, FIRST_SHIFT + number - 1, number, "text", "whole")
    plan.frozen = f"B{FIRST_ROW}"
    roles = (
        *("reported", "reported", "reported", "reported", "live", "live", "live"),
        *("live" if live else "reported" for live in shifts.is_live),
        *("live",) * len(columns),
    )
    forms = (
        *("years", "years", "years", "rate", "factor", "money2", "money2"),
        *("rate",) * terms.count,
        *("share" if kind is MoveKind.RELATIVE else "years" for _, kind in columns),
    )
    plan.block = Block(
        FIRST_ROW, terms.time.size, roles, forms, lambda: _rate_rows(terms, sheets, shifts, columns)
    )
    for side, letter in ((Side.ASSETS, "F"), (Side.LIABILITIES, "G")):
        name = side.value
        checks.add(
            f"{name.capitalize()}: values by term add up to the present value",
            sheet=plan.name,
            unit=found.currency,
            form="money2",
            reported=sheets[side].reported_value,
            formula=f"='{plan.name}'!${letter}${HEADING_ROW - 1}",
            scale=f"SUMPRODUCT(ABS({name}_value))",
        )
    return plan, {
        "shock_term": plan.area(1, FIRST_ROW, last),
        "shock_assets": plan.area(6, FIRST_ROW, last),
        "shock_liabilities": plan.area(7, FIRST_ROW, last),
    }


def _rate_rows(
    terms: Terms, sheets: dict[Side, FlowSheet], shifts: _Shifts, columns: Sequence[tuple[int, MoveKind]]
) -> Iterator[Sequence[Any]]:
    """One row a term."""
    each = list(zip(shifts.shocks, shifts.places, shifts.workings, strict=False))
    given = [
        None if live else _shift_at(shock, terms)
        for shock, live in zip(shifts.shocks, shifts.is_live, strict=True)
    ]
    middle = 0.5 * (terms.time[:-1] + terms.time[1:])
    start = np.concatenate(([0.0], middle))
    end = np.concatenate((middle, [terms.time[-1] + 1.0]))
    for number in range(terms.time.size):
        row = FIRST_ROW + number
        worth = [
            Formula(
                f"=SUMPRODUCT(({prefix}_time>=B{row})*({prefix}_time<C{row})*{prefix}_value)"
                if terms.has_flows[side][number]
                else "=0"
            )
            for side, prefix in ((side, sheets[side].prefix) for side in (Side.ASSETS, Side.LIABILITIES))
        ]
        yield (
            float(terms.time[number]),
            float(start[number]),
            float(end[number]),
            float(terms.zero[number]),
            Formula(f"=EXP(-A{row}/shock_decay)"),
            *worth,
            *(
                shift_formula(shock, place, row, own) if values is None else float(values[number])
                for (shock, place, own), values in zip(each, given, strict=True)
            ),
            *(joined_formula(shifts.places[at], kind, row) for at, kind in columns),
        )


def _shift_at(shock: Shock, terms: Terms) -> FloatArray:
    """What a shock adds to the continuous zero rates at the terms."""
    move = CurveMove.of_shock(shock)
    return np.zeros(terms.time.size) if move is None else move.change(terms.time, terms.zero)
