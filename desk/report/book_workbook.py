"""A book written as a book workbook that reads in again the same."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import numpy as np

from desk.book import (
    Amortisation,
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
    Sampling,
)
from desk.book.holding import SWAP_KINDS
from desk.intake.basis import FIRST, SECOND
from desk.intake.sheets import SHEETS
from desk.rates.day_count import DayCount
from desk.report.book_basis import basis_sheets
from desk.report.book_checks import check_book
from desk.report.book_market import scenario_sheet, volatility_rows, yield_history_sheet
from desk.report.book_sheets import items_sheet, rows_sheet, table_sheet, unless_zero
from desk.report.book_terms import line_terms_row, shock_rows, shock_settings
from desk.report.plain_workbook import PlainSheet, Style, Value, date_serials, write_sheets
from desk.report.safe_cells import write_whole
from desk.valuation.holdings import STATED_KINDS

__all__ = ["write_book"]

_WITH_COUPON = (HoldingKind.BOND, HoldingKind.LINKED_BOND, *SWAP_KINDS)
_WITH_FREQUENCY = (*_WITH_COUPON, HoldingKind.FLOATER)


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
    check_book(book)
    notes = {note.sheet: note for note in book.notes}
    sheets = basis_sheets(book.basis, FIRST, notes)
    if book.second_basis is not None:
        sheets |= basis_sheets(book.second_basis, SECOND, notes, first=book.basis)
    sheets["Liabilities"] = _flows("Liabilities", book.liabilities, notes.get("Liabilities"))
    if len(book.asset_flows) or "Asset flows" in notes:
        sheets["Asset flows"] = _flows("Asset flows", book.asset_flows, notes.get("Asset flows"))
    if book.rates_model is not None:
        model = _rates_model(book.rates_model)
        sheets["Rates model"] = items_sheet("Rates model", model, notes.get("Rates model"))
    assets = book.risky_assets
    if (assets is not None and assets.names) or "Risky assets" in notes:
        sheets["Risky assets"] = _risky_assets(assets, notes.get("Risky assets"))
    sheets["Run"] = items_sheet("Run", _run(book.run), notes.get("Run"))
    settings = shock_settings(book.shock_settings)
    if any(value is not None for value in settings.values()) or "Shock settings" in notes:
        sheets["Shock settings"] = items_sheet("Shock settings", settings, notes.get("Shock settings"))
    for sheet, rows in (
        ("Holdings", list(map(_holding, book.holdings))),
        ("Line terms", list(map(line_terms_row, book.line_terms))),
        ("Shocks", shock_rows(book.shocks)),
        ("History", [] if book.history is None else _history(book.history)),
        ("Volatilities", volatility_rows(book.volatilities)),
    ):
        if rows or sheet in notes:
            sheets[sheet] = table_sheet(sheet, rows, notes.get(sheet))
    if book.yield_history is not None:
        sheets["Yield history"] = yield_history_sheet(book.yield_history, notes.get("Yield history"))
    if book.scenario_set is not None:
        sheets["Scenario set"] = scenario_sheet(book.scenario_set, notes.get("Scenario set"))
    in_order = [sheets[name] for name in SHEETS if name in sheets]
    return write_whole(path, lambda neighbour: write_sheets(neighbour, in_order))


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
        "Second risk price": unless_zero(model.second_risk_price),
        "Inflation mean reversion": model.inflation_mean_reversion,
        "Inflation factor volatility": model.inflation_volatility,
        "Inflation rate correlation": model.inflation_rate_correlation,
        "Inflation risk price": unless_zero(model.inflation_risk_price),
        "Mend correlation": "yes" if model.mend_correlation else None,
    }


def _run(run: Run) -> dict[str, Value]:
    return {
        "Paths": run.paths,
        "Horizon (years)": run.horizon_years,
        "Steps a year": run.steps_per_year,
        "Seed": run.seed,
        "Measure": str(run.measure),
        "Percentiles": "; ".join(repr(float(level)).removesuffix(".0") for level in run.percentiles),
        "Sampling": None if run.sampling is Sampling.PLAIN else str(run.sampling),
        "Bridge": None if run.bridge is Run().bridge else str(run.bridge),
        "Moment matching": "yes" if run.matching else None,
        "Replicates": None if run.replicates == Run().replicates else run.replicates,
    }


def _holding(holding: Holding) -> tuple[Value, ...]:
    """A holding's row; what a kind does not have is left empty unless it is stated."""
    kind = holding.kind
    is_linked = kind is HoldingKind.LINKED_BOND
    return (
        holding.name,
        str(kind),
        unless_zero(holding.nominal) if kind in STATED_KINDS else holding.nominal,
        holding.coupon if kind in _WITH_COUPON else unless_zero(holding.coupon),
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
        unless_zero(holding.margin),
        holding.floating_frequency,
        _word(holding.floating_day_count),
        unless_zero(holding.default_rate),
        unless_zero(holding.recovery_rate),
        holding.index_lag_months if is_linked or holding.index_lag_months != 3 else None,
        holding.index_ratio if is_linked or holding.index_ratio != 1.0 else None,
        "yes" if holding.has_principal_floor else None,
    )


def _word(day_count: DayCount | None) -> str | None:
    return None if day_count is None else str(day_count)


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
    return rows_sheet(sheet, list(columns), zip(*columns.values(), strict=True), notes, len(flows))


def _risky_assets(assets: RiskyAssets | None, notes: Notes | None) -> PlainSheet:
    if assets is None or not assets.names:
        return rows_sheet("Risky assets", list(SHEETS["Risky assets"].columns), (), notes, 0)
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
    return rows_sheet("Risky assets", headings, rows, notes, len(assets.names), styles=styles)
