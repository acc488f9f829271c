"""Sheets of holdings and of risky assets."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Holding, HoldingKind, RiskyAssets
from desk.intake.cells import Cells
from desk.intake.checks import check_correlations, check_not_negative, check_rates, check_size, plain
from desk.intake.faults import FaultList
from desk.intake.layout import SHEETS, Table, find_known, fold
from desk.rates.day_count import DayCount

__all__ = ["READ_KINDS", "further_columns", "read_holdings", "read_risky_assets"]

BoolArray = NDArray[np.bool_]
FloatArray = NDArray[np.float64]

_FREQUENCIES = (1.0, 2.0, 4.0, 12.0)
_LEAST_EIGENVALUE = -1e-10
"""Of a correlation matrix whose entries are rounded to what a float holds."""
_USED = {
    HoldingKind.BOND: frozenset({"Nominal", "Coupon", "Frequency", "Maturity"}),
    HoldingKind.ZERO: frozenset({"Nominal", "Maturity"}),
    HoldingKind.DEPOSIT: frozenset({"Nominal"}),
    HoldingKind.FUND: frozenset({"Market value"}),
}
READ_KINDS = tuple(_USED)
"""Kinds of holding that the sheet can state."""
_ALWAYS_USED = frozenset({"Name", "Kind", "Day count", "Market value", "Units"})


def read_holdings(table: Table, faults: FaultList, *, valuation_date: date | None) -> tuple[Holding, ...]:
    """The holdings; those with a grave fault are left out."""
    rows = table.rows
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    names = cells["Name"].texts_of("the name of the holding")
    kinds = cells["Kind"].choices(HoldingKind, "a kind", among=READ_KINDS)
    used = {
        name: np.array([kind is not None and name in _USED[kind] for kind in kinds], dtype=np.bool_)
        for name in ("Nominal", "Coupon", "Frequency", "Maturity", "Market value")
    }
    nominal = cells["Nominal"].numbers("an amount", required=used["Nominal"])
    coupon = cells["Coupon"].numbers("a coupon rate a year", required=used["Coupon"])
    frequency = cells["Frequency"].numbers("1, 2, 4 or 12 coupons a year", required=used["Frequency"])
    maturity = cells["Maturity"].dates("the date of maturity", required=used["Maturity"])
    day_count = cells["Day count"].choices(DayCount, "a day count", required=False)
    market_value = cells["Market value"].numbers("a market value", required=used["Market value"])
    units = cells["Units"].numbers("a number of units", required=False)
    duration = cells["Duration"].numbers("a duration in years", required=False)
    _report_missing_columns(table, used, faults)
    check_rates(cells["Coupon"], coupon, "the coupon")
    check_size(cells["Nominal"], nominal, "the nominal")
    check_size(cells["Market value"], market_value, "the market value")
    check_size(cells["Units"], units, "the number of units")
    odd = ~np.isnan(frequency) & ~np.isin(frequency, _FREQUENCIES)
    cells["Frequency"].each(odd, "the frequency is {}", "1, 2, 4 or 12 coupons a year", "Correct the figure.")
    with np.errstate(invalid="ignore"):
        unlikely = (duration < 0.0) | (duration > 100.0)
    cells["Duration"].each(
        unlikely, "the duration is {}", "a duration from 0 to 100 years", "Correct the figure."
    )
    with np.errstate(invalid="ignore"):
        cells["Nominal"].each(
            nominal < 0.0,
            "the nominal is {}",
            "an amount of at least 0",
            "It counts as a debt; correct the sign if it is held.",
            mild=True,
        )
        apart = ~np.isnan(market_value) & (np.sign(nominal) * market_value <= 0.0) & (nominal != 0.0)
    if valuation_date is not None:
        past = ~np.isnat(maturity) & (maturity <= np.datetime64(valuation_date, "D"))
        matured = np.flatnonzero(past & used["Maturity"])
        cells["Maturity"].each_with(
            matured,
            (
                f"the holding matured on {day}, not after the valuation date {valuation_date}"
                for day in np.datetime_as_string(maturity[matured]).tolist()
            ),
            "a date after the valuation date",
            "It is kept and counts for nothing; remove it or correct the date.",
            mild=True,
        )
        apart &= ~past
    cells["Market value"].each(
        apart & used["Maturity"],
        "the market value is {}, which no spread gives for this nominal",
        "a market value above 0 for a holding, below 0 for a debt",
        "Correct it, or leave it empty.",
    )
    _report_unused(cells, kinds, faults)
    _report_twice(cells["Name"], names)
    holdings = []
    spoilt = faults.grave_rows(table.sheet.name)
    for entry, (name, kind) in enumerate(zip(names, kinds, strict=True)):
        if int(rows[entry]) in spoilt or not name or kind is None:
            continue
        day = maturity[entry]
        try:
            holding = Holding(
                name=name,
                kind=kind,
                nominal=_or(nominal[entry], 0.0),
                coupon=_or(coupon[entry], 0.0),
                frequency=int(_or(frequency[entry], 1.0)),
                maturity=None if np.isnat(day) else day.item(),
                day_count=day_count[entry],
                market_value=_or_none(market_value[entry]),
                units=_or_none(units[entry]),
                duration=_or_none(duration[entry]),
            )
        except ValueError as error:
            # Only where a column is missing, which is reported at its place.
            cells["Name"].fault(
                entry, f"the row makes no holding: {plain(error)}", f"a {kind}", "Correct the row."
            )
            continue
        holdings.append(holding)
    return tuple(holdings)


def _or(value: float, default: float) -> float:
    return default if np.isnan(value) else float(value)


def _or_none(value: float) -> float | None:
    return None if np.isnan(value) else float(value)


def _report_missing_columns(table: Table, used: dict[str, BoolArray], faults: FaultList) -> None:
    """A fund needs a column that the sheet may do without."""
    if table.column("Market value") is None and used["Market value"].any():
        for row in table.rows[used["Market value"]].tolist():
            faults.add(
                "the fund has no market value",
                "a market value",
                'Add the column "Market value" and fill it.',
                sheet=table.sheet.name,
                row=row,
                column=table.fields.get("Name", 0),
            )


def _report_unused(cells: dict[str, Cells], kinds: list[HoldingKind | None], faults: FaultList) -> None:
    """Report figures that a holding of its kind does not have."""
    for name in ("Nominal", "Coupon", "Frequency", "Maturity", "Duration"):
        own = HoldingKind.FUND if name == "Duration" else None
        filled = cells[name].filled
        for entry in np.flatnonzero(filled).tolist():
            kind = kinds[entry]
            if kind is None or kind is own or name in _USED[kind]:
                continue
            if cells[name].values[entry] == 0.0 and cells[name].kinds[entry] != 0:
                continue
            cells[name].mild(
                entry,
                f"a {kind} has no {name.lower()}",
                "an empty cell",
                "It is kept and not used; remove it if it is not wanted.",
            )


def _report_twice(cells: Cells, names: list[str]) -> None:
    seen: dict[str, int] = {}
    for entry, name in enumerate(names):
        if name and seen.setdefault(fold(name), entry) != entry:
            cells.mild(
                entry,
                f'the holding "{name[:60]}" stands twice, also in row {cells.rows[seen[fold(name)]] + 1}',
                "each holding under a name of its own",
                "Both count; rename one if they are two, remove one if they are the same.",
            )


def read_risky_assets(table: Table, faults: FaultList) -> RiskyAssets | None:
    """The risky assets; None where a row could not be read or there is none."""
    before = len(faults)
    sheet, rows = table.sheet, table.rows
    if not rows.size:
        faults.mild(
            "the sheet holds no assets",
            "one row an asset",
            "Add rows, or remove the sheet.",
            sheet=sheet.name,
        )
        return None
    cells = {name: Cells(sheet, table.column(name), rows, faults) for name in table.layout.columns}
    names = cells["Name"].texts_of("the name of the asset")
    value = cells["Value"].numbers("a value")
    premium = cells["Premium"].numbers("an excess return a year")
    volatility = cells["Volatility"].numbers("a volatility a year")
    dividend_yield = cells["Dividend yield"].numbers("a dividend yield a year", required=False)
    rates_correlation = cells["Rates"].numbers("a correlation")
    check_not_negative(cells["Value"], value, "the value")
    check_size(cells["Value"], value, "the value")
    check_rates(cells["Premium"], premium, "the premium")
    check_not_negative(cells["Volatility"], volatility, "the volatility")
    check_rates(cells["Volatility"], volatility, "the volatility", most=3.0, least=-np.inf)
    check_rates(cells["Dividend yield"], dividend_yield, "the dividend yield")
    check_correlations(cells["Rates"], rates_correlation, "the correlation with the rates")
    correlation = _read_matrix(table, names, faults)
    dividend_yield = np.where(np.isnan(dividend_yield), 0.0, dividend_yield)
    if correlation is None or not all(names):
        return None
    if any(np.isnan(column).any() for column in (value, premium, volatility, rates_correlation)):
        return None
    joint = np.block(
        [[np.ones((1, 1)), rates_correlation[None, :]], [rates_correlation[:, None], correlation]]
    )
    if len(faults) == before or np.abs(joint).max() <= 1.0:
        least = float(np.linalg.eigvalsh((joint + joint.T) / 2.0)[0])
        if least < _LEAST_EIGENVALUE:
            faults.add(
                f"the correlations contradict each other: the least eigenvalue is {least:.3g}",
                "correlations, those with the rates included, that can hold together",
                "Move the strongest ones towards 0.",
                sheet=sheet.name,
                row=table.heading_row,
                column=table.fields["Rates"],
            )
    return RiskyAssets(
        tuple(names), value, premium, volatility, dividend_yield, correlation, rates_correlation
    )


def _read_matrix(table: Table, names: list[str], faults: FaultList) -> FloatArray | None:
    """The correlation matrix, from one column a name; None where a column is missing or an entry is wrong."""
    sheet, rows = table.sheet, table.rows
    headings = SHEETS["Risky assets"].columns
    columns: dict[str, int] = {}
    for heading, column in table.further:
        if fold(heading) in columns:
            faults.add(
                f'the heading "{heading[:60]}" stands twice',
                "each heading once",
                "Remove or rename one of the two columns.",
                sheet=sheet.name,
                row=table.heading_row,
                column=column,
            )
        columns.setdefault(fold(heading), column)
    matrix = np.full((len(names), len(names)), np.nan)
    places: list[Cells | None] = []
    seen: set[str] = set()
    for entry, name in enumerate(names):
        key = fold(name)
        reserved = find_known(name, headings) is not None
        if name and (reserved or key in seen):
            faults.add(
                f'the name "{name[:60]}" ' + ("is that of a heading" if reserved else "stands twice"),
                "each asset under a name of its own",
                "Rename the asset.",
                sheet=sheet.name,
                row=int(rows[entry]),
                column=table.fields.get("Name", 0),
            )
        elif name and key not in columns:
            faults.add(
                f'the column "{name[:60]}" of the correlation matrix is missing',
                "one column a name",
                f'Add the column "{name[:60]}" with its correlations.',
                sheet=sheet.name,
                row=table.heading_row,
            )
        seen.add(key)
        cells = Cells(sheet, columns[key], rows, faults) if name and key in columns else None
        places.append(cells)
        if cells is not None:
            matrix[:, entry] = cells.numbers("a correlation")
            check_correlations(cells, matrix[:, entry], "the correlation")
    _check_matrix(matrix, places)
    return None if np.isnan(matrix).any() else matrix


def _check_matrix(matrix: FloatArray, places: list[Cells | None]) -> None:
    for entry, cells in enumerate(places):
        if cells is None:
            continue
        own = matrix[entry, entry]
        if not np.isnan(own) and own != 1.0:
            cells.fault(entry, f"the correlation with itself is {own:.12g}", "1", "Write 1.")
        for other in range(entry):
            one, two = matrix[other, entry], matrix[entry, other]
            if np.isfinite(one) and np.isfinite(two) and one != two:
                cells.fault(
                    other,
                    f"the correlation is {one:.12g}, but {two:.12g} in the mirrored cell",
                    "the same on both sides of the diagonal",
                    "Write the same figure in both cells.",
                )


def further_columns(table: Table, names: tuple[str, ...]) -> list[tuple[str, int]]:
    """The further columns of the sheet of risky assets that are no part of the correlation matrix."""
    taken = {fold(name) for name in names}
    return [(heading, column) for heading, column in table.further if fold(heading) not in taken]
