"""The sheet that revalues both sides: of every shock at once, and of one chosen shock term by term."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from desk.book import Side
from desk.report.results.checks import Checks
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan, column_letter
from desk.report.results.shocks_moves import flush_left
from desk.report.results.shocks_rates import FIRST_SHIFT, RATES_SHEET, Terms
from desk.valuation.shock_records import ShockTable

__all__ = ["RECOMPUTED_SHEET", "plan_recomputed"]

RECOMPUTED_SHEET = "Shock recomputed"


def plan_recomputed(
    found: ShockTable,
    terms: Terms,
    *,
    shocks_sheet: str,
    first_result: int,
    reason: str,
    checks: Checks,
) -> tuple[SheetPlan, dict[str, str]]:
    """Plan the sheet that revalues both sides, of every shock at once and of one chosen shock term by term.

    Parameters
    ----------
    found : ShockTable
    terms : Terms
    shocks_sheet : str
        Name of the sheet of reported figures.
    first_result : int
        Its row of the first shock.
    reason : str
        What is left out.
    checks : Checks
        Gains the checks of this sheet.

    Returns
    -------
    plan : SheetPlan
    names : dict of str to str
        Names that the workbook defines.
    """
    unit = f"[{found.currency}]"
    note = (
        "Each side after a shock = sum over the terms of its value before × EXP(−shift × term). A side whose "
        "own values, spreads, amounts or times a shock moves as well is reported and not recomputed."
    )
    plan = SheetPlan(
        RECOMPUTED_SHEET, "Shock recomputed: both sides revalued", f"{reason} {note}" if reason else note
    )
    plan.widths = {1: 11.0, 2: 36.0} | dict.fromkeys(range(3, 10), 18.0) | {10: 9.0}
    plan.headings(
        [
            "Shock number",
            "Shock",
            f"Assets, reported {unit}",
            f"Assets, recomputed {unit}",
            f"Difference {unit}",
            f"Liabilities, reported {unit}",
            f"Liabilities, recomputed {unit}",
            f"Difference {unit}",
            f"Surplus, recomputed {unit}",
            "Check",
        ],
        left=0,
    )
    flush_left(plan, HEADING_ROW, (2,))
    for offset in range(terms.count):
        _recomputed_row(plan, offset, found, terms, f"'{shocks_sheet}'!", first_result + offset)
    last = FIRST_ROW + terms.count - 1
    compared = sum(any(terms.revalued[side][offset] for side in Side) for offset in range(terms.count))
    area = plan.mark_checks(10, FIRST_ROW, last)
    checks.add(
        "Shocks that agree when revalued",
        sheet=plan.name,
        unit="rows",
        form="whole",
        reported=compared,
        formula=f'=COUNTIF({area},"OK")',
    )
    return plan, _chosen(plan, last + 2, found, terms, shocks_sheet, first_result)


def _recomputed_row(
    plan: SheetPlan, offset: int, found: ShockTable, terms: Terms, place: str, reported: int
) -> None:
    """Both sides after one shock."""
    row = FIRST_ROW + offset
    cells: list[tuple[Any, str, str]] = [
        (offset + 1, "text", "whole"),
        (found.results[offset].name, "unit", "text"),
    ]
    letter = column_letter(FIRST_SHIFT + offset)
    area = f"'{RATES_SHEET}'!${letter}${FIRST_ROW}:${letter}${terms.last_row}"
    limits = []
    for side, source, start in ((Side.ASSETS, "D", "C"), (Side.LIABILITIES, "E", "F")):
        cells.append((Formula(f"={place}${source}${reported}"), "live", "money2"))
        if terms.revalued[side][offset]:
            name, away = f"shock_{side.value}", chr(ord(start) + 2)
            cells += [
                (Formula(f"=SUMPRODUCT({name}*EXP(-{area}*shock_term))"), "live", "money2"),
                (Formula(f"={start}{row}-{chr(ord(start) + 1)}{row}"), "live", "tiny"),
            ]
            limits.append(f"ABS({away}{row})<=check_tolerance*MAX(1,ABS({start}{row}),{_gross(side)})")
        else:
            cells += [("not by rates alone", "note", "text"), (None, "text", "text")]
    if len(limits) == len(Side):
        cells.append((Formula(f"=D{row}-G{row}"), "live", "money2"))
    else:
        cells.append((None, "text", "text"))
    if limits:
        cells.append((Formula(f'=IF(AND({",".join(limits)}),"OK","CHECK")'), "check", "text"))
    else:
        cells.append(("none", "note", "text"))
    plan.table_row(row, 1, cells)


def _gross(side: Side) -> str:
    """Size of a side that the tolerance is a part of: little may be left of its rows."""
    return f"shock_gross_{side.value}"


def _chosen(
    plan: SheetPlan, row: int, found: ShockTable, terms: Terms, shocks_sheet: str, first_result: int
) -> dict[str, str]:
    """One chosen shock, term by term; gives the names that the workbook defines."""
    unit = f"[{found.currency}]"
    names: dict[str, str] = {}
    plan.put(row, 1, "One shock, term by term", "title")
    plan.put(row + 1, 1, "Number", "text")
    both = [all(terms.revalued[side][number] for side in Side) for number in range(terms.count)]
    worst = min(
        range(terms.count), key=lambda number: (not both[number], found.results[number].change_in_surplus)
    )
    plan.whole_numbers.append((f"C{row + 1}", 1, terms.count))
    names["shock_chosen"] = plan.put(row + 1, 3, worst + 1, "input", "whole")
    plan.put(row + 1, 2, f"Type a number from 1 to {terms.count}", "unit")
    last = FIRST_ROW + terms.count - 1
    plan.put(row + 2, 2, "Shock", "unit")
    plan.put(row + 2, 3, Formula(f"=INDEX(B{FIRST_ROW}:B{last},shock_chosen)"), "live", "text")
    plan.headings(
        [
            "Side",
            f"After the moves of rates {unit}",
            f"Reported, all moves {unit}",
            f"What other moves do {unit}",
            f"Before, rows without their signs {unit}",
        ],
        row=row + 3,
        column=2,
    )
    flush_left(plan, row + 3, (2,))
    first, after = row + 9, row + 9 + terms.time.size - 1
    for at, side, letter, source in (
        (row + 4, Side.ASSETS, "F", "D"),
        (row + 5, Side.LIABILITIES, "H", "E"),
    ):
        area = f"'{shocks_sheet}'!${source}${first_result}:${source}${first_result + terms.count - 1}"
        plan.table_row(
            at,
            2,
            [
                (side.value.capitalize(), "unit", "text"),
                (Formula(f"=SUM({letter}{first}:{letter}{after})"), "live", "money2"),
                (Formula(f"=INDEX({area},shock_chosen)"), "live", "money2"),
                (Formula(f"=D{at}-C{at}"), "live", "money2"),
            ],
        )
        total = Formula(f"=SUMPRODUCT(ABS({side.value}_value))")
        names[_gross(side)] = plan.put(at, 6, total, "live", "money2")
    plan.table_row(
        row + 6,
        2,
        [
            ("Surplus", "unit", "text"),
            *((Formula(f"={letter}{row + 4}-{letter}{row + 5}"), "live", "money2") for letter in "CDE"),
        ],
    )
    plan.headings(
        [
            "Term [years]",
            "Zero rate before [a year]",
            "Shift [a year]",
            "Zero rate after [a year]",
            f"Assets before {unit}",
            f"Assets after {unit}",
            f"Liabilities before {unit}",
            f"Liabilities after {unit}",
        ],
        row=row + 8,
        left=0,
    )
    end = column_letter(FIRST_SHIFT + terms.count - 1)
    begin = column_letter(FIRST_SHIFT)

    def rows() -> Iterator[Sequence[Any]]:
        for number in range(terms.time.size):
            own, there = first + number, FIRST_ROW + number
            source = f"'{RATES_SHEET}'!"
            yield (
                Formula(f"={source}$A${there}"),
                Formula(f"={source}$D${there}"),
                Formula(f"=INDEX({source}${begin}${there}:${end}${there},shock_chosen)"),
                Formula(f"=B{own}+C{own}"),
                Formula(f"={source}$F${there}"),
                Formula(f"=E{own}*EXP(-C{own}*A{own})"),
                Formula(f"={source}$G${there}"),
                Formula(f"=G{own}*EXP(-C{own}*A{own})"),
            )

    forms = ("years", "rate", "rate", "rate", "money2", "money2", "money2", "money2")
    plan.block = Block(first, terms.time.size, ("live",) * len(forms), forms, rows)
    return names
