"""The sheet of key rates: durations and DV01, recomputed from the rows between each two keys."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.book import Side
from desk.report.results.charts import Column, bars, money_axis
from desk.report.results.checks import Checks
from desk.report.results.flows import FlowSheet
from desk.report.results.look import ASSETS, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan
from desk.report.wording import SIDE_NAMES
from desk.valuation.records import KeyRates, Standing

__all__ = ["key_rate_chart", "plan_inflation_key_rates", "plan_key_rates"]


_SUMMED = [(letter, "years" if letter in "BCGH" else "money2") for letter in "BCDEFGHIJ"]
_SEGMENT_HEADINGS = (
    "time × value, to the key before",
    "time × value, to the key after",
    "DV01, to the key before",
    "DV01, to the key after",
)


@dataclass(frozen=True)
class _Rates:
    """Whose key rates a sheet shows.

    Attributes
    ----------
    sheet, note, chart : str
        Name of the sheet, its note, title of its picture.
    figure : str
        What the durations add up to.
    keys : KeyRates
    durations : dict of Side to float
        Of both sides [years].
    times : dict of str to str
        By side, the name of the column of times at which its rows are moved; empty where none is.
    rises : bool
        Whether a DV01 is a rise in value and not a fall.
    is_live : bool
    """

    sheet: str
    note: str
    chart: str
    figure: str
    keys: KeyRates
    durations: dict[Side, float]
    times: dict[str, str]
    rises: bool
    is_live: bool


def plan_key_rates(
    standing: Standing, sheets: dict[Side, FlowSheet], recomputed: dict[str, str], checks: Checks
) -> SheetPlan:
    """Key-rate durations and DV01 of both sides, recomputed from the rows between each two keys."""
    rates = _Rates(
        sheet="Key rates",
        note="A key rate moves the zero rates about its term by a triangle, flat before the first and after "
        "the last key. Durations add up to the effective duration.",
        chart="DV01 by key rate",
        figure="effective duration",
        keys=standing.key_rates,
        durations={
            Side.ASSETS: standing.assets.effective_duration,
            Side.LIABILITIES: standing.liabilities.effective_duration,
        },
        times={side.value: f"{side.value}_time" for side in Side},
        rises=False,
        is_live=all(sheet.is_by_row for sheet in sheets.values()),
    )
    return _plan(rates, standing, recomputed, checks)


def plan_inflation_key_rates(
    standing: Standing,
    sheets: dict[Side, FlowSheet],
    recomputed: dict[str, str],
    checks: Checks,
    *,
    is_plain: bool,
) -> SheetPlan:
    """Key rates of expected inflation, recomputed where every row follows the index up and down.

    Parameters
    ----------
    standing : Standing
        That follows expected inflation.
    sheets : dict of Side to FlowSheet
    recomputed : dict of str to str
        Addresses of the recomputed present values.
    checks : Checks
        Gains the checks of this sheet.
    is_plain : bool
        Whether no row has a floor or a cap.
    """
    inflation = standing.inflation
    assert inflation is not None
    note = (
        "A key rate moves expected inflation about its term by a triangle, nominal rates unchanged. DV01 is "
        "the rise in value for +1 basis point. Durations add up to the inflation duration."
    )
    if not is_plain:
        note += " Rows have floors or caps, so single keys are values here."
    rates = _Rates(
        sheet="Inflation key rates",
        note=note,
        chart="Inflation DV01 by key rate",
        figure="inflation duration",
        keys=KeyRates(
            inflation.term,
            inflation.key_assets,
            inflation.key_liabilities,
            inflation.key_dv01_assets,
            inflation.key_dv01_liabilities,
        ),
        durations={
            Side.ASSETS: inflation.assets_duration,
            Side.LIABILITIES: inflation.liabilities_duration,
        },
        times={
            side.value: f"{side.value}_inflation_years" if sheet.follows_inflation else ""
            for side, sheet in sheets.items()
        },
        rises=True,
        is_live=is_plain and all(sheet.is_by_row for sheet in sheets.values()),
    )
    return _plan(rates, standing, recomputed, checks)


def _plan(rates: _Rates, standing: Standing, recomputed: dict[str, str], checks: Checks) -> SheetPlan:
    """The sheet."""
    keys, is_live = rates.keys, rates.is_live
    count = keys.term.size
    unit = f"[{standing.currency}]"
    plan = SheetPlan(rates.sheet, rates.sheet, rates.note)
    plan.widths = dict.fromkeys(range(1, 15), 15.0)
    plan.headings(
        [
            "Key rate [years]",
            "Duration, assets [years]",
            "Duration, liabilities [years]",
            f"DV01, assets {unit}",
            f"DV01, liabilities {unit}",
            f"DV01 gap {unit}",
            "Duration, assets, recomputed [years]",
            "Duration, liabilities, recomputed [years]",
            f"DV01, assets, recomputed {unit}",
            f"DV01, liabilities, recomputed {unit}",
            "Difference, durations [years]",
            f"Difference, DV01 {unit}",
            "Check",
        ],
        left=0,
    )
    first, last = FIRST_ROW, FIRST_ROW + count - 1
    work = last + 26
    for offset in range(count):
        row = first + offset
        plan.table_row(
            row,
            1,
            [
                (float(keys.term[offset]), "reported", "term"),
                (float(keys.assets[offset]), "reported", "years"),
                (float(keys.liabilities[offset]), "reported", "years"),
                (float(keys.dv01_assets[offset]), "reported", "money2"),
                (float(keys.dv01_liabilities[offset]), "reported", "money2"),
                (Formula(f"=D{row}-E{row}"), "live", "money2"),
            ],
        )
        if is_live:
            _recompute_key(plan, row, work + 1 + offset, rates, recomputed)
    sums = [(Formula(f"=SUM({letter}{first}:{letter}{last})"), "live", form) for letter, form in _SUMMED]
    plan.table_row(last + 1, 1, [("Sum", "text", "text"), *sums[: 9 if is_live else 5]])
    for side, letter in ((Side.ASSETS, "B"), (Side.LIABILITIES, "C")):
        checks.add(
            f"{SIDE_NAMES[side]}: key-rate durations add up to the {rates.figure}",
            sheet=plan.name,
            unit="years",
            form="years",
            reported=rates.durations[side],
            formula=f"='{plan.name}'!${letter}${last + 1}",
        )
    if is_live:
        figure = "Inflation key rates that differ" if rates.rises else "Key rates that differ"
        checks.add_column(figure, plan, plan.mark_checks(13, first, last))
        _segments(plan, work, rates)
    chart = key_rate_chart(plan, keys, standing.currency, title=rates.chart)
    plan.charts.append((chart, f"A{last + 4}"))
    return plan


def _recompute_key(
    plan: SheetPlan, row: int, segment: int, rates: _Rates, recomputed: dict[str, str]
) -> None:
    """The recomputed figures of one key: what the rows before it and after it give to it."""
    cells: list[tuple[Any, str, str]] = []
    durations, dv01s = [], []
    for side, columns, reported in (
        (Side.ASSETS, ("C", "D", "E", "F"), ("B", "D")),
        (Side.LIABILITIES, ("G", "H", "I", "J"), ("C", "E")),
    ):
        before, after, dv01_before, dv01_after = columns
        is_plain = math.isfinite(rates.durations[side])
        worth = recomputed[f"{side.value}_present_value"]
        formula = Formula(f"=({after}{segment}+{before}{segment + 1})/{worth}")
        durations.append((formula if is_plain else None, reported[0]))
        dv01s.append((Formula(f"={dv01_after}{segment}+{dv01_before}{segment + 1}"), reported[1]))
    cells += [(formula, "live", "years") for formula, _ in durations]
    cells += [(formula, "live", "money2") for formula, _ in dv01s]
    away = [
        f"ABS({letter}{row}-{own}{row})"
        for own, (formula, letter) in zip("GH", durations, strict=True)
        if formula is not None
    ]
    cells.append((Formula("=" + ("+".join(away) or "0")), "live", "tiny"))
    cells.append((Formula(f"=ABS(D{row}-I{row})+ABS(E{row}-J{row})"), "live", "tiny"))
    size = "+".join(f"ABS({letter}{row})" for formula, letter in durations if formula is not None) or "0"
    durations_agree = f"K{row}<=check_tolerance*MAX(1,{size})"
    dv01s_agree = f"L{row}<=check_tolerance*MAX(1,ABS(D{row})+ABS(E{row}))"
    cells.append((Formula(f'=IF(AND({durations_agree},{dv01s_agree}),"OK","CHECK")'), "check", "text"))
    plan.table_row(row, 7, cells)


def _segments(plan: SheetPlan, work: int, rates: _Rates) -> None:
    """Workings: the rows between each two keys, shared out to the key before and the key after."""
    terms: Sequence[float] = rates.keys.term.tolist()
    headings = ["From [years]", "To, not included [years]"]
    headings += [f"{side}: {heading}" for side in SIDE_NAMES.values() for heading in _SEGMENT_HEADINGS]
    plan.put(work - 1, 1, "Workings: rows between two keys", "title")
    plan.page_breaks.append(work - 2)
    plan.headings(headings, row=work, left=0)
    count = len(terms)
    for segment in range(count + 1):
        row = work + 1 + segment
        is_first, is_last = segment == 0, segment == count
        start = 0.0 if is_first else terms[segment - 1]
        cells: list[tuple[Any, str, str]] = [(start, "reported", "term")]
        cells.append(("and later", "reported", "word") if is_last else (terms[segment], "reported", "term"))
        for side in SIDE_NAMES:
            time, value = rates.times[side.value], f"{side.value}_value"
            if not time:
                cells += [(0.0, "reported", "money2")] * 4
                continue
            inside = f"({time}>=A{row})" if is_last else f"({time}>=A{row})*({time}<B{row})"
            # Share of the move of the key after and of the key before that reaches each row.
            after, before = f"({time}-A{row})/(B{row}-A{row})", f"(B{row}-{time})/(B{row}-A{row})"
            if is_first:
                after, before = "1", ""
            elif is_last:
                after, before = "", "1"
            shares = (before, after)
            for share in shares:
                text = f"=SUMPRODUCT({inside}*{time}*{value}*{share})" if share else "=0"
                cells.append((Formula(text), "live", "money2"))
            for share in shares:
                # Within the exponent, because the share of a row far outside would carry EXP over its end.
                move = f"basis_point*{inside}*{time}*{share}"
                change = f"(EXP({move})-1)" if rates.rises else f"(1-EXP(-{move}))"
                text = f"=SUMPRODUCT({value}*{change})" if share else "=0"
                cells.append((Formula(text), "live", "money2"))
        plan.table_row(row, 1, cells)


def key_rate_chart(plan: SheetPlan, keys: KeyRates, currency: str, *, title: str = "DV01 by key rate") -> Any:
    """DV01 of both sides and the gap by key rate, drawn from a sheet of key rates."""
    first, last = FIRST_ROW, FIRST_ROW + keys.term.size - 1
    largest = float(np.nanmax(np.abs([keys.dv01_assets, keys.dv01_liabilities])))
    number_format, unit = money_axis(largest, currency)
    return bars(
        [
            Column("Assets", plan.area(4, first, last), ASSETS),
            Column("Liabilities", plan.area(5, first, last), LIABILITIES),
            Column("Gap", plan.area(6, first, last), SURPLUS),
        ],
        plan.area(1, first, last),
        title=title,
        across="Key rate [years]",
        upward=f"DV01 [{unit}]",
        number_format=number_format,
    )
