"""The sheets of inputs: the basis with its curve, and the holdings."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from desk.book import Basis, Book, Holding
from desk.rates.compounding import to_continuous
from desk.report.results.charts import Column, lines
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP
from desk.report.results.look import ASSETS, LIABILITIES, SURPLUS
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan
from desk.valuation.records import LineStanding

__all__ = ["plan_basis", "plan_curve", "plan_holdings"]

SHORTEST_GRID, LONGEST_GRID = 10, 100


def plan_basis(book: Book, curve_plan: SheetPlan, checks: Checks) -> SheetPlan:
    """The basis, the model and the run, the quotes, and pictures of the curve.

    Parameters
    ----------
    book : Book
    curve_plan : SheetPlan
        The sheet that the pictures are drawn from, see `plan_curve`.
    checks : Checks
        Gains the check of this sheet.
    """
    basis = book.basis
    plan = SheetPlan(
        "Basis and curve",
        "Basis and curve",
        f"Beyond the last quote, at {basis.terms[-1]:g} years, the curve goes on as its interpolation says. "
        "Rates inside the program are continuously compounded.",
        title_rows="1:3",
    )
    plan.widths = {1: 27.0, 2: 38.0, 3: 17.0, 4: 3.0} | dict.fromkeys(range(5, 13), 12.5)
    plan.headings(["Item", "Value", "Unit"], left=1)
    plan.put(HEADING_ROW, 3, "Unit", "heading_unit")
    periods = ""
    row = FIRST_ROW
    for label, value, unit, form in _items(book):
        plan.put(row, 1, label, "text")
        place = plan.put(row, 2, value, "input", form)
        plan.put(row, 3, unit or None, "unit")
        if label == "Compounding periods a year":
            periods = place.split("!")[1]
        row += 1
    _quotes(plan, basis, periods, checks)
    below = max(row, FIRST_ROW + basis.terms.size) + 1
    plan.put(below, 1, "Curve", "title")
    first, last = FIRST_ROW + 1, max(curve_plan.cells)
    along = curve_plan.area(1, first, last)
    zero = Column("Zero rate", curve_plan.area(2, first, last), ASSETS)
    forward = Column("Forward rate, half a year", curve_plan.area(3, first, last), LIABILITIES, "sysDash")
    factor = Column("Discount factor", curve_plan.area(5, first, last), SURPLUS)
    rates = lines(
        [zero, forward], along, title="Zero and forward rates", across="Term [years]",
        upward="Continuously compounded [a year]", number_format='0.0%;"−"0.0%',
    )  # fmt: skip
    discount = lines(
        [factor], along, title="Discount factor", across="Term [years]", upward="Value today of 1",
        number_format="0.00",
    )  # fmt: skip
    rates.width = discount.width = 16
    plan.charts = [(rates, f"A{below + 1}"), (discount, f"F{below + 1}")]
    return plan


def _items(book: Book) -> list[tuple[str, Any, str, str]]:
    """Label, value, unit and format of each item of the basis, the model and the run."""
    basis, model, run = book.basis, book.rates_model, book.run
    items: list[tuple[str, Any, str, str]] = [
        ("Title", basis.title, "", "word"),
        ("Valuation date", basis.valuation_date, "", "date"),
        ("Currency", basis.currency, "", "word"),
        ("Curve kind", basis.curve_kind.value, "", "word"),
        ("Compounding", basis.compounding.value, "", "word"),
        ("Compounding periods a year", basis.compounding.per_year, "0 = continuous", "whole"),
        ("Interpolation", basis.interpolation.value, "", "word"),
        ("Day count", basis.day_count.value, "", "word"),
        ("Liability spread", basis.liability_spread, "a year, continuous", "rate"),
        ("Market risk premium", basis.market_risk_premium, "a year, per beta", "rate"),
    ]
    if model is not None:
        items.append(("Rates model", model.name.value, "", "word"))
        for label, value in (
            ("Mean reversion", model.mean_reversion),
            ("Volatility", model.volatility),
            ("Long-run rate", model.long_run_rate),
            ("Starting rate", model.starting_rate),
            ("Second mean reversion", model.second_mean_reversion),
            ("Second volatility", model.second_volatility),
            ("Factor correlation", model.factor_correlation),
        ):
            if value is not None:
                is_plain = label in ("Factor correlation", "Mean reversion", "Second mean reversion")
                items.append((label, value, "" if is_plain else "a year", "years" if is_plain else "rate"))
        items.append(("Risk price", model.risk_price, "", "years"))
        items += [
            ("Paths", run.paths, "", "whole"),
            ("Horizon", run.horizon_years, "years", "whole"),
            ("Steps a year", run.steps_per_year, "", "whole"),
            ("Seed", str(run.seed), "", "word"),
            ("Measure", run.measure.value, "", "word"),
        ]
    return items


def _quotes(plan: SheetPlan, basis: Basis, periods: str, checks: Checks) -> None:
    """The quotes with their conversion to continuous rates and discount factors."""
    plan.headings(
        [
            "Quotes: term [years]",
            "Rate as stated [a year]",
            "Continuous, reported [a year]",
            "Continuous, recomputed [a year]",
            "Discount factor, reported",
            "Discount factor, recomputed",
            "Difference",
            "Check",
        ],
        column=5,
        left=0,
    )
    continuous = to_continuous(basis.rates, basis.compounding)
    discount = basis.curve.discount(basis.terms)
    for offset in range(basis.terms.size):
        row = FIRST_ROW + offset
        live = f"=IF({periods}=0,F{row},{periods}*LN(1+F{row}/MAX(1,{periods})))"
        plan.table_row(
            row,
            5,
            [
                (float(basis.terms[offset]), "input", "term"),
                (float(basis.rates[offset]), "input", "rate"),
                (float(continuous[offset]), "reported", "rate"),
                (Formula(live), "live", "rate"),
                (float(discount[offset]), "reported", "factor"),
                (Formula(f"=EXP(-H{row}*E{row})"), "live", "factor"),
                (Formula(f"=ABS(G{row}-H{row})+ABS(I{row}-J{row})"), "live", "tiny"),
                (Formula(f'=IF(K{row}<=check_tolerance,"OK","CHECK")'), "check", "text"),
            ],
        )
    area = plan.mark_checks(12, FIRST_ROW, FIRST_ROW + basis.terms.size - 1)
    checks.add_column("Quotes whose discount factor differs", plan, area)


def plan_curve(basis: Basis, *, last_time: float, checks: Checks) -> SheetPlan:
    """The curve by half-years.

    Parameters
    ----------
    basis : Basis
    last_time : float
        Of the last flow of either side [years].
    checks : Checks
        Gains the check of this sheet.
    """
    plan = SheetPlan(
        "Curve by term",
        "Curve by term",
        "Zero and forward rates are continuously compounded; a forward rate is that of the half-year before "
        "the term.",
    )
    plan.widths = dict.fromkeys(range(1, 9), 16.0)
    plan.headings(
        [
            "Term [years]",
            "Zero rate, reported [a year]",
            "Forward rate, reported [a year]",
            "Forward rate, recomputed [a year]",
            "Discount factor, reported",
            "Discount factor, recomputed",
            "Difference",
            "Check",
        ],
        left=0,
    )
    end = int(np.clip(np.ceil(max(last_time, float(basis.terms[-1]))), SHORTEST_GRID, LONGEST_GRID))
    terms = np.arange(0.0, end + 0.25, 0.5)
    zero, discount = basis.curve.zero(terms), basis.curve.discount(terms)
    forward = basis.curve.forward(np.maximum(terms - 0.5, 0.0), terms)
    for offset in range(terms.size):
        row = FIRST_ROW + offset
        ahead: list[tuple[Any, str, str]] = [(None, "", ""), (None, "", "")]
        away = f"=ABS(E{row}-F{row})"
        if offset:
            live = Formula(f"=LN(F{row - 1}/F{row})/(A{row}-A{row - 1})")
            ahead = [(float(forward[offset]), "reported", "rate"), (live, "live", "rate")]
            away += f"+ABS(C{row}-D{row})"
        plan.table_row(
            row,
            1,
            [
                (float(terms[offset]), "reported", "term"),
                (float(zero[offset]), "reported", "rate"),
                *ahead,
                (float(discount[offset]), "reported", "factor"),
                (Formula(f"=EXP(-B{row}*A{row})"), "live", "factor"),
                (Formula(away), "live", "tiny"),
                (Formula(f'=IF(G{row}<=check_tolerance,"OK","CHECK")'), "check", "text"),
            ],
        )
    area = plan.mark_checks(8, FIRST_ROW, FIRST_ROW + terms.size - 1)
    checks.add_column("Terms of the curve that differ", plan, area)
    return plan


def plan_holdings(
    holdings: Sequence[Holding], standing_lines: Sequence[LineStanding], *, currency: str, checks: Checks
) -> SheetPlan:
    """What is held, with the spread and the value of each holding.

    Parameters
    ----------
    holdings : sequence of Holding
    standing_lines : sequence of LineStanding
        The lines of the assets: the holdings come first, in their order.
    currency : str
    checks : Checks
        Gains the check of this sheet.
    """
    shown = min(len(holdings), ROW_CAP)
    note = "The spread is the one at which the flows of a bond or zero are worth its market value."
    if shown < len(holdings):
        note = f"The first {shown:,} of {len(holdings):,} holdings. {note}"
    plan = SheetPlan("Holdings", "Holdings", note)
    plan.widths = dict(enumerate((28, 9, 12, 9, 15, 10, 11, 12, 15, 11, 11, 11, 15, 15, 11, 9, 15), start=1))
    unit = f"[{currency}]"
    plan.headings(
        [
            "Name",
            "Kind",
            "Day count",
            "Line number",
            f"Nominal {unit}",
            "Coupon [a year]",
            "Frequency [a year]",
            "Maturity",
            f"Market value {unit}",
            "Units",
            "Stated duration [years]",
            "Spread, solved [a year]",
            f"Present value, reported {unit}",
            f"Present value, recomputed {unit}",
            f"Difference {unit}",
            "Check",
            f"Market value less present value {unit}",
        ],
        left=3,
    )

    def rows() -> Iterator[Sequence[Any]]:
        for number in range(shown):
            holding, line, row = holdings[number], standing_lines[number], FIRST_ROW + number
            limit = f"check_tolerance*MAX(1,ABS(M{row}))"
            yield (
                holding.name,
                holding.kind.value,
                None if holding.day_count is None else holding.day_count.value,
                number + 1,
                holding.nominal,
                holding.coupon,
                holding.frequency,
                holding.maturity,
                holding.market_value,
                holding.units,
                holding.duration,
                line.spread,
                line.measures.present_value,
                Formula(f"=SUMIFS(assets_value,assets_line,D{row})"),
                Formula(f"=M{row}-N{row}"),
                Formula(f'=IF(ABS(O{row})<={limit},"OK","CHECK")'),
                None if holding.market_value is None else Formula(f"=I{row}-M{row}"),
            )

    source = ("input",)
    roles = (
        *(*source * 3, "text", *source * 7),
        *("reported", "reported", "live", "live", "check", "live"),
    )
    forms = (
        *("text", "text", "text", "whole", "money", "rate", "whole", "date", "money2", "money", "years"),
        *("rate", "money2", "money2", "tiny", "text", "money2"),
    )
    plan.block = Block(FIRST_ROW, shown, roles, forms, rows)
    if shown:
        checks.add_column(
            "Holdings whose present value differs",
            plan,
            plan.mark_checks(16, FIRST_ROW, FIRST_ROW + shown - 1),
        )
    else:
        plan.put(FIRST_ROW, 1, "The book has no holdings.", "note")
    return plan
