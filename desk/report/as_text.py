"""Results as plain-text tables for a terminal: units in the headings, thousands grouped, a true minus."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from desk.book import Book, Fault, Severity
from desk.intake.records import Reading
from desk.report.as_sampling import sampling_text
from desk.report.as_scenarios import beside_text, checks_text
from desk.report.basis_text import basis_text, comparison_text, inflation_text
from desk.report.scenario_wording import measure_use, own_curve, run_label
from desk.report.text_tables import (
    LINE_WIDTH,
    MISSING,
    grouped,
    percent,
    printable,
    table,
    wrapped,
)
from desk.report.wording import CAUTION, MEASURES, QUANTILE_METHOD, SIDE_NAMES
from desk.scenarios.records import NodeSummary, Simulation
from desk.valuation.records import LineStanding, Periods, Standing

__all__ = [
    "LINE_WIDTH",
    "check_text",
    "fault_line",
    "grouped",
    "percent",
    "printable",
    "simulation_text",
    "standing_text",
    "table",
]

LINES_SHOWN = 20
LONGEST_NAME = 32


def fault_line(fault: Fault) -> str:
    """One fault in one line; a mild one is marked so."""
    mark = "mild: " if fault.severity is Severity.MILD else ""
    return printable(f"{mark}{fault}")


def check_text(reading: Reading) -> str:
    """What reading a book gave, in a few lines; its faults go elsewhere."""
    name = printable(reading.path.name)
    grave = len(reading.grave)
    mild = len(reading.faults) - grave
    counts = f"{_count(grave, 'grave fault')}, {_count(mild, 'mild fault')}"
    if reading.book is None:
        return f"{name}: {counts}. The book cannot be used until the grave ones are mended."
    book = reading.book
    holds = ", ".join(
        [
            _count(len(book.liabilities), "liability flow"),
            _count(len(book.holdings), "holding"),
            _count(len(book.asset_flows), "ready-made asset flow"),
        ]
    )
    return f"{name}: {counts}. It holds {holds}.\nContents {book.digest}"


def standing_text(
    standing: Standing, *, title: str = "", book: Book | None = None, second: Standing | None = None
) -> str:
    """A standing as tables.

    Parameters
    ----------
    standing : Standing
    title : str
    book : Book, optional
        That was valued: its curve and the basis of its liabilities are told then.
    second : Standing, optional
        On the second basis of the book, told beside the first.
    """
    currency = printable(standing.currency)
    head = f"Standing at {standing.valuation_date.isoformat()}, amounts in {currency}"
    blocks = [
        f"{printable(title)}\n{head}" if title else head,
        _headline(standing, currency),
        *([] if book is None else [basis_text(book, standing)]),
        _sides(standing, currency),
    ]
    if second is not None:
        other = None if book is None else book.on_second_basis
        blocks.append(comparison_text(standing, second, other, currency))
    blocks += [_redington(standing), _key_rates(standing, currency)]
    if standing.inflation is not None:
        blocks.append(inflation_text(standing.inflation, currency))
    blocks += [_lines(standing, currency), _periods(standing.periods, currency), wrapped(CAUTION)]
    return "\n\n".join(blocks)


def simulation_text(simulation: Simulation, *, currency: str, title: str = "") -> str:
    """A run as tables."""
    account = simulation.savings_account
    shown = _years_shown(account.year)
    head = run_label(simulation, horizon=_count(simulation.horizon_years, "year"))
    blocks = [
        f"{printable(title)}\n{wrapped(head)}" if title else wrapped(head),
        wrapped(f"{measure_use(simulation)} {own_curve(simulation)}"),
        "Savings account: one unit rolled over\n" + _summary(account, shown, lambda value: grouped(value, 4)),
        "Check of the mean of 1/R against the curve\n" + _repricing(simulation, shown),
        "Short rate, continuously compounded [% a year]\n" + _summary(simulation.short_rate, shown, percent),
        *beside_text(simulation, currency=currency),
        checks_text(simulation),
        "Present values along the paths\n" + _distributions(simulation, printable(currency)),
        sampling_text(simulation, currency=currency),
        wrapped(QUANTILE_METHOD),
        wrapped(CAUTION),
    ]
    return "\n\n".join(blocks)


def _headline(standing: Standing, currency: str) -> str:
    """The key figures."""
    rows = [
        ("Assets", currency, grouped(standing.assets.present_value)),
        ("Liabilities", currency, grouped(standing.liabilities.present_value)),
        ("Surplus", currency, grouped(standing.surplus)),
        ("Funding ratio", "%", percent(standing.funding_ratio, 2)),
        ("Duration gap", "years", grouped(standing.duration_gap, 3)),
        ("DV01 gap", currency, grouped(standing.dv01_gap)),
    ]
    return table(("Headline", "Unit", "Figure"), rows, left=2)


def _sides(standing: Standing, currency: str) -> str:
    """Every measure of both sides."""
    rows = []
    for wording in MEASURES:
        unit = currency if wording.unit == "currency" else wording.unit
        show = percent if wording.kind == "rate" else grouped
        places = 0 if wording.kind == "money" else 3
        figures = [
            show(getattr(side, wording.name), places) for side in (standing.assets, standing.liabilities)
        ]
        rows.append((wording.label, unit, *figures))
    return table(("Measure", "Unit", "Assets", "Liabilities"), rows, left=2)


def _redington(standing: Standing) -> str:
    """Redington's conditions."""
    rows = [
        (
            condition.name.replace("_", " ").capitalize(),
            grouped(condition.assets),
            grouped(condition.liabilities),
            "holds" if condition.holds else "does not hold",
        )
        for condition in standing.redington
    ]
    statements = [wrapped(condition.statement) for condition in standing.redington]
    return "\n".join([table(("Redington's conditions", "Assets", "Liabilities", ""), rows), *statements])


def _key_rates(standing: Standing, currency: str) -> str:
    """Key-rate durations and DV01."""
    keys = standing.key_rates
    gap = keys.dv01_assets - keys.dv01_liabilities
    rows = [
        (
            f"{term:g}",
            grouped(keys.assets[row], 3),
            grouped(keys.liabilities[row], 3),
            grouped(keys.dv01_assets[row]),
            grouped(keys.dv01_liabilities[row]),
            grouped(gap[row]),
        )
        for row, term in enumerate(keys.term.tolist())
    ]
    rows.append(
        (
            "all",
            grouped(float(keys.assets.sum()), 3),
            grouped(float(keys.liabilities.sum()), 3),
            grouped(float(keys.dv01_assets.sum())),
            grouped(float(keys.dv01_liabilities.sum())),
            grouped(float(gap.sum())),
        )
    )
    headings = (
        "Key rate\n[years]",
        "Assets\n[years]",
        "Liabilities\n[years]",
        f"DV01 assets\n[{currency}]",
        f"DV01 liabilities\n[{currency}]",
        f"DV01 gap\n[{currency}]",
    )
    return table(headings, rows, left=0)


def _lines(standing: Standing, currency: str) -> str:
    """The largest lines of both sides, the others together."""
    rows = []
    for side, side_name in SIDE_NAMES.items():
        lines = [line for line in standing.lines if line.side is side]
        shown = _largest(lines)
        for line in shown:
            name = printable(line.line)
            cut = name if len(name) <= LONGEST_NAME else f"{name[: LONGEST_NAME - 1]}…"
            spread = MISSING if line.spread is None else grouped(10_000.0 * line.spread, 1)
            rows.append(
                (
                    side_name,
                    cut,
                    line.kind,
                    grouped(line.measures.present_value),
                    grouped(line.measures.effective_duration, 3),
                    spread,
                )
            )
        if len(shown) < len(lines):
            kept = {id(line) for line in shown}
            rest = sum(line.measures.present_value for line in lines if id(line) not in kept)
            rows.append((side_name, f"{len(lines) - len(shown):,} others", "", grouped(rest), "", ""))
    headings = (
        "Side",
        "Line",
        "Kind",
        f"Present value\n[{currency}]",
        "Effective duration\n[years]",
        "Spread\n[basis points]",
    )
    return table(headings, rows, left=3)


def _largest(lines: Sequence[LineStanding]) -> list[LineStanding]:
    """The largest lines by present value, in the order of the book."""
    if len(lines) <= LINES_SHOWN:
        return list(lines)
    sizes = np.array([abs(line.measures.present_value) for line in lines])
    chosen = np.sort(np.argsort(-np.nan_to_num(sizes), kind="stable")[: LINES_SHOWN - 1])
    return [lines[number] for number in chosen.tolist()]


def _periods(periods: Periods, currency: str) -> str:
    """Undiscounted flows: ten years one by one, then five years at a time."""
    rows = []
    years = periods.year.tolist()
    start = 0
    while start < len(years):
        end = start + 1 if years[start] <= 10 else min(start + 5, len(years))
        label = f"{years[start]}" if end == start + 1 else f"{years[start]} to {years[end - 1]}"
        sums = [
            float(column[start:end].sum()) for column in (periods.assets, periods.liabilities, periods.net)
        ]
        rows.append((label, *(grouped(value) for value in sums), grouped(float(periods.cumulative[end - 1]))))
        start = end
    unit = f"\n[{currency}]"
    headings = ("Flows in year", f"Assets{unit}", f"Liabilities{unit}", f"Net{unit}", f"Cumulative net{unit}")
    return table(headings, rows)


def _years_shown(year: np.ndarray) -> list[int]:
    """The rows of a summary that a terminal shows: the first five years, every fifth, the last."""
    last = len(year) - 1
    return [
        row
        for row, value in enumerate(year.tolist())
        if value <= 5 or row == last or abs(value / 5 - round(value / 5)) < 1e-9
    ]


def _summary(summary: NodeSummary, shown: Sequence[int], show: Callable[[float], str]) -> str:
    """A quantity by year."""
    headings = (
        "Year",
        "Mean",
        "Standard\nerror",
        "Standard\ndeviation",
        *(f"{level:g} %" for level in summary.levels),
    )
    rows = [
        (
            f"{summary.year[row]:g}",
            show(summary.mean[row]),
            show(summary.mean_se[row]),
            show(summary.sd[row]),
            *(show(value) for value in summary.percentile[row].tolist()),
        )
        for row in shown
    ]
    return table(headings, rows, left=0)


def _repricing(simulation: Simulation, shown: Sequence[int]) -> str:
    """The check of the draws against the curve."""
    check = simulation.repricing
    rows = []
    for row in shown:
        error = float(check.mean_discount_se[row])
        away = float(check.mean_discount[row] - check.expected_discount[row])
        rows.append(
            (
                f"{check.year[row]:g}",
                grouped(check.mean_discount[row], 6),
                grouped(error, 6),
                grouped(check.expected_discount[row], 6),
                grouped(check.curve_discount[row], 6),
                grouped(away / error, 2) if error > 0.0 else MISSING,
            )
        )
    headings = (
        "Year",
        "Mean of 1/R",
        "Standard\nerror",
        "Expected",
        "Curve",
        "Difference\n[standard errors]",
    )
    return table(headings, rows, left=0)


def _distributions(simulation: Simulation, currency: str) -> str:
    """The pathwise present values of both sides and the surplus."""
    sides = simulation.present_value
    rows = [
        ("Mean", *(grouped(side.mean) for side in sides)),
        ("Standard error", *(grouped(side.se) for side in sides)),
        ("Standard deviation", *(grouped(side.sd) for side in sides)),
    ]
    for number, level in enumerate(sides[0].levels if sides else ()):
        rows.append((f"{level:g} %", *(grouped(float(side.percentile[number])) for side in sides)))
    rows.append(("On the model's curve", *(grouped(side.curve) for side in sides)))
    rows.append(("Share below 0 [%]", *(percent(side.below_zero, 2) for side in sides)))
    rows.append(("Its standard error [%]", *(percent(side.below_zero_se, 2) for side in sides)))
    return table((f"Present value [{currency}]", *(side.name.capitalize() for side in sides)), rows)


def _count(number: int, thing: str) -> str:
    """A number of things in words."""
    return f"{number:,} {thing}" if number == 1 else f"{number:,} {thing}s"
