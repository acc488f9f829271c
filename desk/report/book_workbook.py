"""A book written as a book workbook that reads in again the same."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

import numpy as np

from desk.book import (
    Amortisation,
    Basis,
    Book,
    FlowTable,
    History,
    Holding,
    HoldingKind,
    Notes,
    PriceKind,
    RatesModel,
    RiskyAssets,
    Run,
)
from desk.book.holding import SWAP_KINDS
from desk.intake.layout import SHEETS, find_known, fold
from desk.rates.day_count import DayCount
from desk.report.plain_workbook import PlainSheet, Style, Value, date_serials, write_sheets
from desk.report.safe_cells import LONGEST_TEXT, clean_text, write_whole
from desk.valuation.holdings import STATED_KINDS

__all__ = ["write_book"]

_STYLES = {
    **dict.fromkeys(
        ("Rate", "Coupon", "Premium", "Volatility", "Dividend yield", "Short rate"), Style.PERCENT
    ),
    **dict.fromkeys(
        ("Discount rate", "Current rate", "Margin", "Default rate", "Recovery rate"), Style.PERCENT
    ),
    **dict.fromkeys(("Amount", "Nominal", "Market value", "Value", "Units"), Style.MONEY),
    **dict.fromkeys(("Term", "Year", "Duration"), Style.YEARS),
    **dict.fromkeys(("Date", "Maturity", "Start date", "First coupon"), Style.DATE),
}
_ITEM_STYLES = {
    **dict.fromkeys(("Liability spread", "Market risk premium", "Volatility"), Style.PERCENT),
    **dict.fromkeys(("Long-run rate", "Starting rate", "Second volatility"), Style.PERCENT),
    "Paths": Style.WHOLE,
}
_WIDTHS = {"Line": 30.0, "Name": 34.0, "Item": 24.0}
_WIDTH = 16.0
_VALUE_WIDTH = 28.0
_NOTE_WIDTH = 24.0
_WITH_COUPON = (HoldingKind.BOND, *SWAP_KINDS)
_WITH_FREQUENCY = (*_WITH_COUPON, HoldingKind.FLOATER)
_LAST_ROW = 1_048_576
_LARGEST_WHOLE = 2**53
"""Beyond this a cell, which holds a float, does not hold every whole number."""


def write_book(book: Book, path: Path) -> Path:
    """Write a book as a book workbook.

    The workbook reads in again as an equal book with an equal digest. The time of a flow that has a date
    is derived from it again; a text of blanks alone counts as none; a sheet without rows counts as absent.

    Parameters
    ----------
    book : Book
    path : Path
        Written whole or not at all.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    ValueError
        If the book holds what the workbook cannot: more rows than a sheet has, a name that is blank,
        too long or that of a heading, a date before March 1900, a number that is not finite.
    OSError
        If the file cannot be written.
    """
    _check_names(book)
    basis, run = book.basis, book.run
    notes = {note.sheet: note for note in book.notes}
    curve = list(zip(basis.terms.tolist(), basis.rates.tolist(), strict=True))
    sheets = [
        _items("Basis", _basis(book), notes.get("Basis")),
        _table("Curve", curve, notes.get("Curve")),
        _flows("Liabilities", book.liabilities, notes.get("Liabilities")),
    ]
    if book.holdings or "Holdings" in notes:
        sheets.append(_table("Holdings", list(map(_holding, book.holdings)), notes.get("Holdings")))
    if len(book.asset_flows) or "Asset flows" in notes:
        sheets.append(_flows("Asset flows", book.asset_flows, notes.get("Asset flows")))
    if book.rates_model is not None:
        sheets.append(_items("Rates model", _rates_model(book.rates_model), notes.get("Rates model")))
    assets = book.risky_assets
    if (assets is not None and assets.names) or "Risky assets" in notes:
        sheets.append(_risky_assets(assets, notes.get("Risky assets")))
    sheets.append(_items("Run", _run(run), notes.get("Run")))
    history = [] if book.history is None else _history(book.history)
    if history or "History" in notes:
        sheets.append(_table("History", history, notes.get("History")))
    return write_whole(path, lambda neighbour: write_sheets(neighbour, sheets))


def _check_names(book: Book) -> None:
    """Refuse names that would not come back as they are."""
    for what, names in (
        ("line", book.liabilities.line_names),
        ("line", book.asset_flows.line_names),
        ("holding", [holding.name for holding in book.holdings]),
        ("asset", () if book.risky_assets is None else book.risky_assets.names),
    ):
        for name in names:
            if not name.strip():
                raise ValueError(f"a workbook holds no {what} without a name")
            if clean_text(name) != name:
                raise ValueError(f"a workbook does not hold the name of the {what} {name[:40]!r} as it is")
    assets = () if book.risky_assets is None else book.risky_assets.names
    for name in assets:
        if find_known(name, SHEETS["Risky assets"].columns) is not None:
            raise ValueError(f"no asset can be called {name!r}: the sheet has a heading of that name")
    if len(set(map(fold, assets))) != len(assets):
        raise ValueError("the names of the assets must differ by more than case and blanks")
    for notes in book.notes:
        _check_notes(notes, assets)
    if book.run.seed > _LARGEST_WHOLE:
        raise ValueError(f"a workbook holds no seed above {_LARGEST_WHOLE}")


def _check_notes(notes: Notes, assets: Sequence[str]) -> None:
    """Refuse notes that would be taken for something else."""
    layout = SHEETS.get(notes.sheet)
    if layout is None:
        raise ValueError(f"a book workbook has no sheet {notes.sheet!r} for notes")
    for heading in notes.headings[1:] if layout.items else notes.headings:
        if not heading or heading.strip() != heading or clean_text(heading) != heading:
            raise ValueError(f"a workbook does not hold the heading {heading[:40]!r} as it is")
        taken = layout.more and fold(heading) in map(fold, assets)
        if taken or find_known(heading, layout.columns) is not None:
            raise ValueError(
                f"no note can have the heading {heading[:40]!r}: the sheet has a column of that name"
            )


def _basis(book: Book) -> dict[str, Value]:
    basis = book.basis
    return {
        "Title": basis.title or None,
        "Valuation date": basis.valuation_date,
        "Currency": basis.currency,
        "Curve kind": str(basis.curve_kind),
        "Compounding": str(basis.compounding),
        "Interpolation": str(basis.interpolation),
        "Liability spread": basis.liability_spread,
        "Market risk premium": basis.market_risk_premium,
        "Day count": str(basis.day_count),
        **_curve_items(basis),
    }


def _curve_items(basis: Basis) -> dict[str, Value]:
    """How the curve is built and goes on, where that is not as for a basis that says nothing of it."""
    beyond = basis.extrapolation
    usual = Basis.convergence_tolerance
    tolerance = basis.convergence_tolerance
    return {
        "Payments a year": basis.payments_per_year,
        "Beyond the last quote": None if beyond is Basis.extrapolation else str(beyond),
        "Ultimate forward rate": basis.ultimate_forward_rate,
        "Last liquid point": basis.last_liquid_point,
        "Convergence point": basis.convergence_point,
        "Convergence tolerance": None if tolerance == usual else tolerance,
    }


def _rates_model(model: RatesModel) -> dict[str, Value]:
    return {
        "Model": str(model.name),
        "Mean reversion": model.mean_reversion,
        "Volatility": model.volatility,
        "Long-run rate": model.long_run_rate,
        "Starting rate": model.starting_rate,
        "Second mean reversion": model.second_mean_reversion,
        "Second volatility": model.second_volatility,
        "Factor correlation": model.factor_correlation,
        "Risk price": model.risk_price,
    }


def _run(run: Run) -> dict[str, Value]:
    return {
        "Paths": run.paths,
        "Horizon (years)": run.horizon_years,
        "Steps a year": run.steps_per_year,
        "Seed": run.seed,
        "Measure": str(run.measure),
        "Percentiles": "; ".join(repr(float(level)).removesuffix(".0") for level in run.percentiles),
    }


def _holding(holding: Holding) -> tuple[Value, ...]:
    """A holding's row; what a kind does not have is left empty unless it is stated."""
    kind = holding.kind
    return (
        holding.name,
        str(kind),
        _unless_zero(holding.nominal) if kind in STATED_KINDS else holding.nominal,
        holding.coupon if kind in _WITH_COUPON else _unless_zero(holding.coupon),
        holding.frequency if kind in _WITH_FREQUENCY or holding.frequency != 1 else None,
        holding.maturity,
        _word(holding.day_count),
        holding.market_value,
        holding.units,
        holding.duration,
        holding.start_date,
        holding.first_coupon,
        holding.ex_dividend_days or None,
        "yes" if holding.bought_ex_dividend else None,
        None if holding.amortisation is Amortisation.BULLET else str(holding.amortisation),
        holding.price,
        None if holding.price is None and holding.price_kind is PriceKind.CLEAN else str(holding.price_kind),
        holding.discount_rate,
        holding.current_rate,
        _unless_zero(holding.margin),
        holding.floating_frequency,
        _word(holding.floating_day_count),
        _unless_zero(holding.default_rate),
        _unless_zero(holding.recovery_rate),
    )


def _word(day_count: DayCount | None) -> str | None:
    return None if day_count is None else str(day_count)


def _unless_zero(value: float) -> float | None:
    """A number; None for a plain 0, which an empty cell states as well."""
    return value if value != 0.0 or np.signbit(value) else None


def _history(history: History) -> list[tuple[Value, ...]]:
    return list(zip(date_serials(history.date), history.rate.tolist(), strict=True))


def _flows(sheet: str, flows: FlowTable, notes: Notes | None) -> PlainSheet:
    """Flows with the columns they use: a date where one is stated, the years where not."""
    dated = ~np.isnat(flows.date)
    columns: dict[str, Iterable[Value]] = {"Line": (flows.line_names[line] for line in flows.line.tolist())}
    if dated.any() or not len(flows):
        columns["Date"] = date_serials(flows.date)
    if not dated.all():
        columns["Year"] = (
            None if has_date else time
            for has_date, time in zip(dated.tolist(), flows.time.tolist(), strict=True)
        )
    columns["Amount"] = flows.amount.tolist()
    if "Beta" in SHEETS[sheet].columns and (flows.beta.any() or np.signbit(flows.beta).any()):
        columns["Beta"] = flows.beta.tolist()
    return _sheet(sheet, list(columns), zip(*columns.values(), strict=True), notes, len(flows))


def _table(sheet: str, rows: Sequence[Sequence[Value]], notes: Notes | None) -> PlainSheet:
    """A table whose optional columns are left out where no row fills them."""
    layout = SHEETS[sheet]
    used = [
        number
        for number, heading in enumerate(layout.columns)
        if heading not in layout.optional or any(row[number] is not None for row in rows)
    ]
    headings = [layout.columns[number] for number in used]
    return _sheet(sheet, headings, ([row[number] for number in used] for row in rows), notes, len(rows))


def _risky_assets(assets: RiskyAssets | None, notes: Notes | None) -> PlainSheet:
    if assets is None or not assets.names:
        return _sheet("Risky assets", list(SHEETS["Risky assets"].columns), (), notes, 0)
    own = zip(
        assets.names,
        *(
            column.tolist()
            for column in (assets.value, assets.premium, assets.volatility, assets.dividend_yield)
        ),
        assets.correlation.tolist(),
        assets.rates_correlation.tolist(),
        strict=True,
    )
    rows = ([*stated, *correlations, with_rates] for *stated, correlations, with_rates in own)
    headings = ["Name", "Value", "Premium", "Volatility", "Dividend yield", *assets.names, "Rates"]
    styles = [Style.PLAIN, Style.MONEY, *[Style.PERCENT] * 3, *[Style.PLAIN] * (len(assets.names) + 1)]
    return _sheet("Risky assets", headings, rows, notes, len(assets.names), styles=styles)


def _items(sheet: str, items: dict[str, Value], notes: Notes | None) -> PlainSheet:
    """A sheet of items and values, each item beside its notes; an item with neither is left out."""
    beside: dict[str, tuple[Value, ...]] = {}
    further: tuple[str, ...] = ()
    if notes is not None:
        further = notes.headings[1:]
        for row in notes.rows:
            item = find_known(str(row[0]), tuple(items))
            if item is None:
                raise ValueError(
                    f"the notes of the sheet {sheet} name an item {row[0]!r} that it does not have"
                )
            beside[item] = row[1:]
    empty = (None,) * len(further)
    plain = [Style.PLAIN] * len(further)
    rows = [
        (
            [item, _checked(value), *beside.get(item, empty)],
            [Style.PLAIN, _ITEM_STYLES.get(item, Style.PLAIN), *plain],
        )
        for item, value in items.items()
        if value is not None or item in beside
    ]
    widths = [_WIDTHS["Item"], _VALUE_WIDTH, *[_NOTE_WIDTH] * len(further)]
    return PlainSheet(sheet, ["Item", "Value", *further], widths, rows)


def _sheet(
    sheet: str,
    headings: list[str],
    rows: Iterable[Sequence[Value]],
    notes: Notes | None,
    count: int,
    *,
    styles: list[Style] | None = None,
) -> PlainSheet:
    """A sheet of rows with their notes beside them."""
    if count >= _LAST_ROW:
        raise ValueError(f"the sheet {sheet} would need {count + 1:,} rows; a sheet has {_LAST_ROW:,}")
    own = styles or [_STYLES.get(heading, Style.PLAIN) for heading in headings]
    widths = [_WIDTHS.get(heading, _WIDTH) for heading in headings]
    if notes is None:
        return PlainSheet(sheet, headings, widths, ((row, own) for row in rows))
    if len(notes.rows) != count:
        raise ValueError(f"the notes of the sheet {sheet} have {len(notes.rows)} rows for {count} of data")
    further = [Style.PLAIN] * len(notes.headings)
    return PlainSheet(
        sheet,
        [*headings, *notes.headings],
        [*widths, *[_NOTE_WIDTH] * len(further)],
        (
            ([*row, *map(_checked, beside)], [*own, *further])
            for row, beside in zip(rows, notes.rows, strict=True)
        ),
    )


def _checked(value: Value) -> Value:
    """A value that is no name: a text too long for a cell is refused rather than cut."""
    if isinstance(value, str) and len(value) > LONGEST_TEXT:
        raise ValueError(f"a workbook holds no text of {len(value):,} characters")
    return value
