"""The sheet of the liability basis, the terms of lines, and the spreads of liabilities as live formulas."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from desk.book import Basis, Book, IndexationKind, LiabilityMethod, LineTerms, PricedFlows, Side
from desk.report.results.further_columns import FurtherColumn, FurtherColumns
from desk.report.results.naming import FIRST, Naming
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan
from desk.report.wording import LIABILITY_METHODS, SIDE_NAMES
from desk.valuation.records import Standing

__all__ = ["LiabilityPages", "add_spreads", "plan_liability_basis", "plan_line_terms"]

LINE_TERMS_SHEET = "Line terms"
MOST_LINE_TERMS = 20_000


@dataclass
class LiabilityPages:
    """The sheet of a liability basis.

    Attributes
    ----------
    plan : SheetPlan or None
        None where liabilities are discounted on the curve.
    names : dict of str to str
        Names that the workbook defines.
    """

    plan: SheetPlan | None = None
    names: dict[str, str] = field(default_factory=dict)


def plan_liability_basis(
    basis: Basis, standing: Standing, naming: Naming, *, rate_address: str
) -> LiabilityPages:
    """Plan the sheet.

    Parameters
    ----------
    basis : Basis
    standing : Standing
    naming : Naming
    rate_address : str
        Of the single equivalent rate as the checks recompute it; empty for none.
    """
    method = basis.liability_method
    if method is LiabilityMethod.CURVE:
        return LiabilityPages()
    plan = SheetPlan(
        naming.sheet("Liability basis"),
        naming.title("Liability basis"),
        f"Liabilities are discounted on {LIABILITY_METHODS[method]}. The single equivalent rate is the one "
        "annual effective rate at which they are worth the same.",
        title_rows="1:3",
    )
    plan.widths = {1: 40.0, 2: 22.0, 3: 20.0, 4: 16.0, 5: 16.0}
    plan.headings(["Item", "Value", "Unit"])
    pages = LiabilityPages(plan)
    row = FIRST_ROW
    plan.table_row(row, 1, [("Liability basis", "text", "text"), (method.value, "input", "word")])
    row += 1
    rate = standing.liabilities.equivalent_rate
    plan.table_row(
        row,
        1,
        [
            ("Single equivalent rate, reported", "text", "text"),
            (float(rate), "reported", "rate"),
            ("a year, annual effective", "unit", "text"),
        ],
    )
    if rate_address:
        row += 1
        plan.table_row(
            row,
            1,
            [
                ("Single equivalent rate, recomputed", "text", "text"),
                (Formula(f"={rate_address}"), "live", "rate"),
                ("a year, annual effective", "unit", "text"),
            ],
        )
    if basis.liability_fit is not None and method is LiabilityMethod.CORPORATE_BONDS:
        row += 1
        plan.table_row(
            row, 1, [("Corporate bonds fitted", "text", "text"), (basis.liability_fit.value, "input", "word")]
        )
    if method is LiabilityMethod.EXPECTED_RETURN:
        row += 1
        plan.put(row, 1, "Expected return on the assets", "text")
        pages.names[naming.name("expected_return")] = plan.put(row, 2, basis.expected_return, "input", "rate")
        plan.put(row, 3, "a year, annual effective", "unit")
    if method is LiabilityMethod.TERM_SPREADS:
        row += 2
        plan.put(row, 1, "Spreads by term, joined by lines and flat outside them", "title")
        plan.headings(["Term [years]", "Spread, continuous [a year]"], row=row + 1, left=0)
        first = row + 2
        for offset, (term, spread) in enumerate(
            zip(basis.liability_terms.tolist(), basis.liability_spreads.tolist(), strict=True)
        ):
            plan.put(first + offset, 1, term, "input", "term")
            plan.put(first + offset, 2, spread, "input", "rate")
        last = first + basis.liability_terms.size - 1
        pages.names[naming.name("spread_terms")] = plan.area(1, first, last)
        pages.names[naming.name("spread_rates")] = plan.area(2, first, last)
    return pages


def add_spreads(further: FurtherColumns, flows: PricedFlows, book: Book, naming: Naming) -> None:
    """Recompute the spread of each row of the liabilities, where more than one spread makes it up.

    Parameters
    ----------
    further : FurtherColumns
        Gains the columns.
    flows : PricedFlows
        Of the liabilities.
    book : Book
        On the basis that `naming` names.
    naming : Naming
    """
    basis, method = book.basis, book.basis.liability_method
    own = _addresses(book.line_terms, flows.line_names)
    if method is LiabilityMethod.CURVE and not own:
        return
    table = book.liabilities
    beta = table.beta[table.future].tolist()
    line = flows.line.tolist()
    beta_letter = further.add(
        FurtherColumn("beta", "Beta", "input", "years", lambda row, number: beta[number], width=9.0)
    )
    plain, premium = naming.name("liability_spread"), naming.name("market_risk_premium")
    body = plain
    if method is LiabilityMethod.EXPECTED_RETURN:
        body = f"{plain}+LN(1+{naming.name('expected_return')})-H{{row}}"
    elif method is LiabilityMethod.CORPORATE_BONDS:
        zero = basis.liability_curve.zero(flows.time).tolist()
        letter = further.add(
            FurtherColumn(
                "", "Zero rate of the liabilities' curve [a year]", "input", "rate",
                lambda row, number: zero[number],
            )
        )  # fmt: skip
        body = f"{plain}+{letter}{{row}}-H{{row}}"
    elif method is LiabilityMethod.TERM_SPREADS:
        body = f"{plain}+{_interpolated(further, basis, naming)}"

    def spread(row: int, number: int) -> object:
        start = own.get(line[number])
        text = body if start is None else start
        return Formula("=" + text.format(row=row) + f"+{beta_letter}{row}*{premium}")

    further.spread = spread


def _interpolated(further: FurtherColumns, basis: Basis, naming: Naming) -> str:
    """Formula of the spread at the term of a row, straight between the terms stated."""
    terms, rates = naming.name("spread_terms"), naming.name("spread_rates")
    count = basis.liability_terms.size
    if count == 1:
        return f"INDEX({rates},1)"
    inside = f"MIN(MAX(D{{row}},INDEX({terms},1)),INDEX({terms},{count}))"
    place = further.add(
        FurtherColumn(
            "", "Spread by term: row before", "live", "whole",
            lambda row, number: Formula(
                f"=MIN(MATCH({inside.format(row=row)},{terms},1),{count - 1})"
            ),
            width=11.0,
        )
    )  # fmt: skip
    low, after = f"{place}{{row}}", f"{place}{{row}}+1"
    share = f"({inside}-INDEX({terms},{low}))/(INDEX({terms},{after})-INDEX({terms},{low}))"
    return f"INDEX({rates},{low})+{share}*(INDEX({rates},{after})-INDEX({rates},{low}))"


def _addresses(line_terms: Sequence[LineTerms], names: Sequence[str]) -> dict[int, str]:
    """What stands in the place of the spread of the basis, by number of the line."""
    numbers = {name: number for number, name in enumerate(names)}
    found: dict[int, str] = {}
    told: set[str] = set()
    for place, own in enumerate(line_terms[:MOST_LINE_TERMS]):
        if own.side is not Side.LIABILITIES or own.line not in numbers or own.line in told:
            continue
        told.add(own.line)
        row = FIRST_ROW + place
        if own.spread is not None:
            found[numbers[own.line]] = f"'{LINE_TERMS_SHEET}'!$I${row}"
        elif own.rate is not None:
            found[numbers[own.line]] = f"LN(1+'{LINE_TERMS_SHEET}'!$J${row})-H{{row}}"
    return found


def plan_line_terms(book: Book, standing: Standing) -> SheetPlan | None:
    """What holds for single lines and not for the others; None where the book has none of it."""
    if not book.line_terms:
        return None
    shown = book.line_terms[:MOST_LINE_TERMS]
    note = (
        "Terms of a line stand in the place of what the basis says; beta counts on top. How a line grows is "
        f"recomputed from the sheet {FIRST.sheet('Expected inflation')}."
    )
    if len(shown) < len(book.line_terms):
        note = f"The first {len(shown):,} of {len(book.line_terms):,} rows. {note}"
    plan = SheetPlan(LINE_TERMS_SHEET, "Line terms", note)
    plan.widths = (
        {1: 11.0, 2: 30.0, 3: 12.0} | dict.fromkeys(range(4, 11), 13.0) | {11: 18.0, 12: 18.0, 13: 14.0}
    )
    unit = f"[{standing.currency}]"
    plan.headings(
        [
            "Side", "Line", "Indexation", "Rise [a year]", "Floor [a year]", "Cap [a year]", "Lag [years]",
            "Least growth", "Discount spread, continuous [a year]", "Discount rate, annual [a year]",
            f"Present value {unit}", f"Inflation DV01 {unit}", "Used",
        ],
        left=3,
    )  # fmt: skip
    lines = {(line.side, line.line): line for line in reversed(standing.lines) if line.kind == "flows"}
    told: set[tuple[Side, str]] = set()
    for row, own in enumerate(shown, start=FIRST_ROW):
        key = (own.side, own.line)
        line = None if key in told else lines.get(key)
        told.add(key)
        grows = own.indexation
        cells: list[tuple[Any, str, str]] = [
            (SIDE_NAMES[own.side], "text", "text"),
            (own.line, "text", "text"),
            (grows.kind.value, "text", "text"),
            (grows.rise if grows.kind is IndexationKind.RISING else None, "reported", "rate"),
            (grows.floor, "reported", "rate"),
            (grows.cap, "reported", "rate"),
            (grows.lag or None, "reported", "years"),
            (grows.least, "reported", "factor"),
            (own.spread, "input", "rate"),
            (own.rate, "input", "rate"),
            (None if line is None else line.measures.present_value, "reported", "money2"),
            (None if line is None else line.inflation_dv01, "reported", "money2"),
            ("no" if line is None else "yes", "text", "text"),
        ]
        plan.table_row(row, 1, cells)
    plan.frozen = f"C{HEADING_ROW + 1}"
    return plan
