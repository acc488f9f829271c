"""The sheets of inputs: the basis with its curve, and the holdings."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from desk.book import Basis, BondFit, Book, CurveKind, Holding, HoldingKind, Sampling
from desk.book.arrays import FloatArray
from desk.rates.compounding import to_continuous
from desk.rates.smith_wilson import Extrapolation
from desk.report.results.charts import Column, lines
from desk.report.results.checks import Checks
from desk.report.results.flows import ROW_CAP
from desk.report.results.look import ASSETS, LIABILITIES, SURPLUS
from desk.report.results.naming import FIRST, Naming
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan
from desk.report.results.standing import size_of_line
from desk.valuation.prices import HoldingPrice
from desk.valuation.records import LineStanding

__all__ = ["plan_basis", "plan_holdings"]


def plan_basis(
    book: Book,
    curve_plan: SheetPlan,
    checks: Checks,
    *,
    naming: Naming = FIRST,
    names: dict[str, str] | None = None,
) -> SheetPlan:
    """The basis, the model and the run, the quotes, and pictures of the curve.

    Parameters
    ----------
    book : Book
    curve_plan : SheetPlan
        The sheet that the pictures are drawn from, see `plan_curve`.
    checks : Checks
        Gains the check of this sheet.
    naming : Naming
    names : dict of str to str, optional
        Gains the names of the liability spread and the market risk premium.
    """
    basis = book.basis
    plan = SheetPlan(
        naming.sheet("Basis and curve"),
        naming.title("Basis and curve"),
        f"{_goes_on(basis)} Rates inside the program are continuously compounded.",
        title_rows="1:3",
    )
    plan.widths = {1: 27.0, 2: 38.0, 3: 17.0, 4: 3.0} | dict.fromkeys(range(5, 13), 12.5)
    plan.headings(["Item", "Value", "Unit"], left=1)
    plan.put(HEADING_ROW, 3, "Unit", "heading_unit")
    periods = ""
    row = FIRST_ROW
    for label, value, unit, form in _items(book, with_model=not naming.is_second):
        plan.put(row, 1, label, "text")
        place = plan.put(row, 2, value, "input", form)
        plan.put(row, 3, unit or None, "unit")
        if label == "Compounding periods a year":
            periods = place.split("!")[1]
        name = {"Liability spread": "liability_spread", "Market risk premium": "market_risk_premium"}
        if names is not None and label in name:
            names[naming.name(name[label])] = place
        row += 1
    if basis.terms.size:
        _quotes(plan, basis, periods, checks, naming)
    below = max(row, FIRST_ROW + basis.terms.size) + 1
    plan.put(below, 1, "Curve", "title")
    first, last = FIRST_ROW + 1, max(row for row, cells in curve_plan.cells.items() if 1 in cells)
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


def _goes_on(basis: Basis) -> str:
    """How the curve goes on beyond its last term, in words."""
    if basis.last_quoted_term is None:
        return "The curve holds as it is stated for every term."
    how = "as its interpolation says"
    if basis.extrapolation is Extrapolation.SMITH_WILSON:
        how = "by Smith and Wilson's method to the ultimate forward rate"
    elif basis.curve_kind is CurveKind.BONDS and basis.bond_fit is not BondFit.EXACT:
        how = "by its formula"
    return f"Beyond {basis.last_quoted_term:g} years the curve goes on {how}."


def _items(book: Book, *, with_model: bool) -> list[tuple[str, Any, str, str]]:
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
        ("Liability basis", basis.liability_method.value, "", "word"),
        ("Liability spread", basis.liability_spread, "a year, continuous", "rate"),
        ("Market risk premium", basis.market_risk_premium, "a year, per beta", "rate"),
        *_curve_items(basis),
    ]
    if model is not None and with_model:
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
        if run.is_reduced:
            items.append(("Sampling", run.sampling.value, "", "word"))
            if run.sampling is Sampling.SOBOL:
                items.append(("Bridge", run.bridge.value, "", "word"))
            items.append(("Moment matching", "yes" if run.matching else "no", "", "word"))
            items.append(("Replicates", run.replicates, "", "whole"))
    return items


def _curve_items(basis: Basis) -> Iterator[tuple[str, Any, str, str]]:
    """How the curve is built and goes on, where the basis says something of it."""
    if basis.curve_kind in (CurveKind.PAR, CurveKind.SWAP):
        yield "Payments a year", basis.quote_payments, "", "whole"
    if basis.curve_kind is CurveKind.BONDS:
        yield "Bond fit", basis.bond_fit.value, "", "word"
    if basis.curve_kind is CurveKind.FLAT:
        yield "Flat rate", basis.flat_rate, "a year", "rate"
    if basis.expected_return is not None:
        yield "Expected return", basis.expected_return, "a year", "rate"
    if basis.inflation is not None:
        yield "Inflation volatility", basis.inflation.volatility, "a year", "rate"
    if basis.last_liquid_point is not None:
        yield "Last liquid point", basis.last_liquid_point, "years", "years"
    if basis.extrapolation is Extrapolation.SMITH_WILSON:
        yield "Beyond the last quote", basis.extrapolation.value, "", "word"
        yield "Ultimate forward rate", basis.ultimate_forward_rate, "a year", "rate"
        if basis.convergence_point is not None:
            yield "Convergence point", basis.convergence_point, "years", "years"
        yield "Convergence tolerance", basis.convergence_tolerance, "a year", "rate"


def _quotes(plan: SheetPlan, basis: Basis, periods: str, checks: Checks, naming: Naming) -> None:
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
    discount = basis.curve.discount(basis.terms)
    # Zero rates are restated one by one; other quotes are solved for together, and the zero rate is that of
    # the discount factor that came out.
    is_restated = basis.curve_kind is CurveKind.ZERO and basis.last_quoted_term == basis.terms[-1]
    continuous = (
        to_continuous(basis.rates, basis.compounding) if is_restated else basis.curve.zero(basis.terms)
    )
    for offset in range(basis.terms.size):
        row = FIRST_ROW + offset
        live = f"=IF({periods}=0,F{row},{periods}*LN(1+F{row}/MAX(1,{periods})))"
        if not is_restated:
            live = f"=-LN(I{row})/E{row}"
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
    checks.add_column(naming.figure("Quotes whose discount factor differs"), plan, area)


def plan_holdings(
    holdings: Sequence[Holding],
    standing_lines: Sequence[LineStanding],
    *,
    line_size: FloatArray,
    currency: str,
    checks: Checks,
    prices: Sequence[HoldingPrice] = (),
) -> SheetPlan:
    """What is held, with the spread and the value of each holding.

    Parameters
    ----------
    holdings : sequence of Holding
    standing_lines : sequence of LineStanding
        The lines of the assets: the holdings come first, in their order.
    line_size : ndarray
        Of each line, the sum of its rows' present values without their signs [currency].
    currency : str
    checks : Checks
        Gains the check of this sheet.
    prices : sequence of HoldingPrice
        Of the holdings, where prices in real terms are to be shown.
    """
    shown = min(len(holdings), ROW_CAP)
    note = (
        "The spread is the one at which the payments expected of a holding are worth its market value, or "
        "what its price comes to. Swaps are valued on the curve."
    )
    if shown < len(holdings):
        note = f"The first {shown:,} of {len(holdings):,} holdings. {note}"
    plan = SheetPlan("Holdings", "Holdings", note)
    terms = [*_terms(holdings[:shown]), *_real_terms(holdings[:shown], prices)]
    widths = (28, 13, 14, 9, 15, 10, 11, 12, 15, 11, 11, 11, 15, 15, 11, 9, 15, 11, 15)
    plan.widths = dict(enumerate((*widths, *[12] * len(terms)), start=1))
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
            "Spread duration [years]",
            f"Expected credit loss {unit}",
            *(heading for heading, *_ in terms),
        ],
        left=3,
    )

    def rows() -> Iterator[Sequence[Any]]:
        for number in range(shown):
            holding, line, row = holdings[number], standing_lines[number], FIRST_ROW + number
            size = size_of_line(f"M{row}", float(line_size[number]), line.measures.present_value)
            limit = f"check_tolerance*{size}"
            yield (
                holding.name,
                holding.kind.value,
                None if holding.day_count is None else holding.day_count.value,
                number + 1,
                holding.nominal,
                holding.coupon,
                holding.frequency,
                holding.maturity,
                line.market_value,
                holding.units,
                holding.duration,
                line.spread,
                line.measures.present_value,
                Formula(f"=SUMIFS(assets_value,assets_line,D{row})"),
                Formula(f"=M{row}-N{row}"),
                Formula(f'=IF(ABS(O{row})<={limit},"OK","CHECK")'),
                None if line.market_value is None else Formula(f"=I{row}-M{row}"),
                line.spread_duration,
                line.expected_credit_loss,
                *(values[number] for *_, values in terms),
            )

    source = ("input",)
    roles = (
        *(*source * 3, "text", *source * 7),
        *("reported", "reported", "live", "live", "check", "live"),
        *("reported", "reported", *source * len(terms)),
    )
    forms = (
        *("text", "text", "text", "whole", "money", "rate", "whole", "date", "money2", "money", "years"),
        *("rate", "money2", "money2", "tiny", "text", "money2"),
        *("years", "money2", *(form for _, form, _ in terms)),
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


def _terms(holdings: Sequence[Holding]) -> list[tuple[str, str, list[Any]]]:
    """Heading, format and values of the further terms that some holding states."""
    usual = Holding("", HoldingKind.DEPOSIT)
    terms = []
    for heading, form, name in (
        ("Price [per 100 of nominal]", "money2", "price"),
        ("Price kind", "text", "price_kind"),
        ("Discount rate [a year]", "rate", "discount_rate"),
        ("Start date", "date", "start_date"),
        ("First coupon", "date", "first_coupon"),
        ("Ex-dividend [days]", "whole", "ex_dividend_days"),
        ("Amortisation", "text", "amortisation"),
        ("Current rate [a year]", "rate", "current_rate"),
        ("Margin [a year]", "rate", "margin"),
        ("Floating frequency [a year]", "whole", "floating_frequency"),
        ("Floating day count", "text", "floating_day_count"),
        ("Default rate [a year]", "rate", "default_rate"),
        ("Recovery rate [share]", "share", "recovery_rate"),
        ("Index ratio", "factor", "index_ratio"),
        ("Index lag [months]", "whole", "index_lag_months"),
        ("Principal floor", "text", "has_principal_floor"),
    ):
        values = [getattr(holding, name) for holding in holdings]
        if name == "price_kind":
            stated = [holding.price is not None for holding in holdings]
        elif name in ("index_ratio", "index_lag_months", "has_principal_floor"):
            stated = [holding.kind is HoldingKind.LINKED_BOND for holding in holdings]
            if name == "has_principal_floor":
                values = ["yes" if value else "no" for value in values]
        else:
            stated = [value != getattr(usual, name) for value in values]
        if any(stated):
            shown = [
                (str(value) if form == "text" else value) if is_stated else None
                for value, is_stated in zip(values, stated, strict=True)
            ]
            terms.append((heading, form, shown))
    return terms


def _real_terms(
    holdings: Sequence[Holding], prices: Sequence[HoldingPrice]
) -> list[tuple[str, str, list[Any]]]:
    """Heading, format and values of what linked bonds are in real terms."""
    if not prices:
        return []
    linked = [holding.kind is HoldingKind.LINKED_BOND for holding in holdings]
    terms: list[tuple[str, str, list[Any]]] = []
    for heading, form, name in (
        ("Clean price in real terms [per 100]", "years", "clean_price"),
        ("Real yield [a year]", "rate", "real_yield"),
        ("Real modified duration [years]", "years", "real_modified_duration"),
    ):
        values = [
            float(getattr(price, name)) if is_own else None
            for price, is_own in zip(prices[: len(holdings)], linked, strict=True)
        ]
        terms.append((heading, form, values))
    return terms
