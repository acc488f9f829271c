"""The comparison of two bases: every measure and every line on both, and the first less the second."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from typing import Any

from desk.book import Basis, Side
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP, FlowSheet
from desk.report.results.naming import SECOND
from desk.report.results.plan import FIRST_ROW, Block, Formula, SheetPlan
from desk.report.results.standing import LIVE_WORK, size_of_line
from desk.report.wording import MEASURES, SIDE_NAMES, liability_words, within_a_sentence
from desk.valuation.records import LineStanding, Standing

__all__ = ["plan_comparison", "plan_no_comparison"]

_INFLATION = (
    ("assets_duration", "Assets: inflation duration", "years", "years"),
    ("liabilities_duration", "Liabilities: inflation duration", "years", "years"),
    ("real_duration_gap", "Real duration gap", "years", "years"),
    ("dv01_assets", "Assets: inflation DV01", "", "money2"),
    ("dv01_liabilities", "Liabilities: inflation DV01", "", "money2"),
    ("dv01_gap", "Inflation DV01 gap", "", "money2"),
)


def plan_no_comparison(reason: str) -> SheetPlan:
    """The sheet of a second basis that could not be valued."""
    plan = SheetPlan(
        SECOND.sheet("Standing"), "Comparison of two bases", "The second basis could not be valued."
    )
    plan.widths = {1: 100.0}
    plan.put(FIRST_ROW, 1, reason, "note")
    return plan


def plan_comparison(
    first: Standing,
    second: Standing,
    bases: tuple[Basis, Basis],
    sheets: dict[Side, FlowSheet],
    recomputed: tuple[dict[str, str], dict[str, str]],
    checks: Checks,
) -> SheetPlan:
    """Plan the sheet.

    Parameters
    ----------
    first, second : Standing
    bases : (Basis, Basis)
    sheets : dict of Side to FlowSheet
        Of the second basis.
    recomputed : (dict, dict)
        Addresses of the recomputed figures on the first and the second basis.
    checks : Checks
        Gains the checks of this sheet.
    """
    words = [
        f"{name} basis: {basis.curve_kind} curve, liabilities on {liability_words(basis)}."
        for name, basis in zip(("First", "Second"), bases, strict=True)
    ]
    plan = SheetPlan(
        SECOND.sheet("Standing"),
        "Comparison of two bases",
        f"{' '.join(words)} Differences are the first less the second; both are recomputed from their rows.",
        title_rows="1:3",
    )
    plan.widths = (
        {1: 42.0, 2: 13.0} | dict.fromkeys(range(3, 9), 19.0) | {9: 10.0} | dict.fromkeys(range(10, 15), 17.0)
    )
    plan.headings(
        [
            "Figure", "Unit", "First, reported", "Second, reported", "Difference, reported",
            "First, recomputed", "Second, recomputed", "Difference, recomputed", "Check",
        ],
        left=2,
    )  # fmt: skip
    row = FIRST_ROW
    for label, unit, form, values, key in _figures(first, second):
        _figure(plan, row, (label, unit, form), values, [own.get(key, "") for own in recomputed])
        row += 1
    area = plan.mark_checks(9, FIRST_ROW, row - 1)
    checks.add_column("Figures on two bases that differ", plan, area)
    _lines(plan, row + 1, first, second, sheets, checks)
    return plan


def _figures(first: Standing, second: Standing) -> Iterator[tuple[str, str, str, tuple[float, float], str]]:
    """Label, unit, format, both values and the name of each figure."""
    for side in (Side.ASSETS, Side.LIABILITIES):
        for wording in MEASURES:
            unit = first.currency if wording.unit == "currency" else wording.unit.removeprefix("% ")
            form = "money2" if wording.kind == "money" else wording.kind
            values = tuple(
                float(getattr(getattr(standing, side.value), wording.name)) for standing in (first, second)
            )
            yield (
                f"{SIDE_NAMES[side]}: {within_a_sentence(wording.label)}",
                unit,
                form,
                (values[0], values[1]),
                f"{side.value}_{wording.name}",
            )
    for name, label, unit, form in (
        ("surplus", "Surplus", first.currency, "money2"),
        ("funding_ratio", "Funding ratio", "share", "share"),
        ("duration_gap", "Duration gap", "years", "years"),
        ("dv01_gap", "DV01 gap", first.currency, "money2"),
    ):
        yield label, unit, form, (float(getattr(first, name)), float(getattr(second, name))), name
    if first.inflation is not None and second.inflation is not None:
        for name, label, unit, form in _INFLATION:
            pair = float(getattr(first.inflation, name)), float(getattr(second.inflation, name))
            yield label, unit or first.currency, form, pair, f"inflation_{name}"


def _figure(
    plan: SheetPlan,
    row: int,
    words: tuple[str, str, str],
    values: tuple[float, float],
    places: Sequence[str],
) -> None:
    """One figure on both bases."""
    label, unit, form = words
    is_plain = all(math.isfinite(value) for value in values)
    cells: list[tuple[Any, str, str]] = [
        (label, "text", "text"),
        (unit, "text", "text"),
        *((value, "reported", form) for value in values),
        (values[0] - values[1] if is_plain else None, "reported", form),
    ]
    if is_plain and all(places):
        # Each figure has the tolerance of its own check.
        limits = [place.replace("$E$", "$G$") for place in places]
        agree = (
            f"AND(ABS(C{row}-F{row})<={limits[0]},ABS(D{row}-G{row})<={limits[1]},"
            f"ABS(E{row}-H{row})<={limits[0]}+{limits[1]})"
        )
        cells += [
            (Formula(f"={places[0]}"), "live", form),
            (Formula(f"={places[1]}"), "live", form),
            (Formula(f"=F{row}-G{row}"), "live", form),
            (Formula(f'=IF({agree},"OK","CHECK")'), "check", "text"),
        ]
    else:
        live = Formula(f'=IF(ABS(E{row}-(C{row}-D{row}))<=check_tolerance*MAX(1,ABS(C{row})),"OK","CHECK")')
        cells += [(None, "", "")] * 3 + [(live if is_plain else "OK", "check", "text")]
    plan.table_row(row, 1, cells)


def _lines(
    plan: SheetPlan,
    row: int,
    first: Standing,
    second: Standing,
    sheets: dict[Side, FlowSheet],
    checks: Checks,
) -> None:
    """The lines with both values."""
    pairs = list(zip(first.lines, second.lines, strict=True))[:ROW_CAP]
    rows = max((sheet.plan.block.count if sheet.plan.block else 0) for sheet in sheets.values())
    is_live = rows * len(pairs) <= LIVE_WORK
    unit = f"[{first.currency}]"
    title = "Lines on both bases"
    if len(pairs) < len(first.lines):
        title += f": the first {len(pairs):,} of {len(first.lines):,}"
    if not is_live:
        title += ", too many to recompute one by one here"
    plan.put(row, 1, title, "title")
    plan.headings(
        [
            "Line", "Side", "Line number", f"Present value, first {unit}", f"Present value, second {unit}",
            f"Difference {unit}", f"Present value, second, recomputed {unit}", f"Difference {unit}", "Check",
            "Effective duration, first [years]", "Effective duration, second [years]",
            "Spread, first [a year]", "Spread, second [a year]",
        ],
        row=row + 1,
        left=2,
    )  # fmt: skip
    start = row + 2
    sizes = {side: sheet.line_size for side, sheet in sheets.items()}

    def block() -> Iterator[Sequence[Any]]:
        numbers = dict.fromkeys(Side, 0)
        for at, (one, other) in enumerate(pairs, start=start):
            numbers[one.side] += 1
            number = numbers[one.side]
            size = float(sizes[one.side][number - 1])
            yield _line(at, number, one, other, size, sheets[one.side].prefix, is_live=is_live)

    live = ("live", "live", "check") if is_live else ("reported",) * 3
    plan.block = Block(
        start,
        len(pairs),
        ("text", "text", "text", "reported", "reported", "live", *live, *("reported",) * 4),
        (
            *("text", "text", "whole", "money2", "money2", "money2", "money2", "tiny", "text"),
            *("years", "years", "rate", "rate"),
        ),
        block,
    )
    if pairs and is_live:
        area = plan.mark_checks(9, start, start + len(pairs) - 1)
        checks.add_column("Lines on the second basis that differ", plan, area)


def _line(
    row: int,
    number: int,
    first: LineStanding,
    second: LineStanding,
    size: float,
    prefix: str,
    *,
    is_live: bool,
) -> Sequence[Any]:
    """One line."""
    worth = second.measures.present_value
    live: list[Any] = [None, None, None]
    if is_live:
        limit = f"check_tolerance*{size_of_line(f'E{row}', size, worth)}"
        live = [
            Formula(f"=SUMIFS({prefix}_value,{prefix}_line,C{row})"),
            Formula(f"=E{row}-G{row}"),
            Formula(f'=IF(ABS(H{row})<={limit},"OK","CHECK")'),
        ]
    return (
        first.line,
        SIDE_NAMES[first.side],
        number,
        first.measures.present_value,
        worth,
        Formula(f"=D{row}-E{row}"),
        *live,
        first.measures.effective_duration,
        second.measures.effective_duration,
        first.spread,
        second.spread,
    )
