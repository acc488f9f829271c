"""The sheet of holdings."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Amortisation, Holding, HoldingKind, PriceKind
from desk.intake.cells import Cells
from desk.intake.checks import plain
from desk.intake.faults import FaultList
from desk.intake.holding_checks import (
    check_annuities,
    check_dates,
    check_ex_dividend,
    check_indexation,
    check_numbers,
    check_prices,
    check_worth,
    report_missing_columns,
    report_past,
    report_twice,
    report_unused,
)
from desk.intake.holding_columns import NEEDED, USED, KindMasks, YesNo
from desk.intake.layout import Table
from desk.rates.day_count import DayCount

__all__ = ["read_holdings"]

FloatArray = NDArray[np.float64]


def read_holdings(
    table: Table, faults: FaultList, *, valuation_date: date | None, has_inflation: bool
) -> tuple[Holding, ...]:
    """The holdings; those with a grave fault are left out."""
    rows = table.rows
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    names = cells["Name"].texts_of("the name of the holding")
    stated_kinds = cells["Kind"].choices(HoldingKind, "a kind")
    kinds = KindMasks(stated_kinds)
    needed = {name: kinds.among(own) for name, own in NEEDED.items()}
    used = {name: kinds.among(own) for name, own in USED.items()}

    numbers = {
        name: cells[name].numbers(expected, required=needed.get(name, False))
        for name, expected in (
            ("Nominal", "an amount"),
            ("Coupon", "a coupon rate a year"),
            ("Frequency", "1, 2, 4 or 12 coupons a year"),
            ("Market value", "a market value"),
            ("Units", "a number of units"),
            ("Duration", "a duration in years"),
            ("Ex-dividend days", "a number of days"),
            ("Price", "a price per 100 of nominal"),
            ("Discount rate", "a discount rate a year"),
            ("Current rate", "a rate a year"),
            ("Margin", "a margin a year"),
            ("Floating frequency", "1, 2, 4 or 12 payments a year"),
            ("Default rate", "a default rate a year"),
            ("Recovery rate", "a recovery rate"),
            ("Index lag (months)", "a number of months"),
            ("Index ratio", "an index ratio"),
        )
    }
    with np.errstate(invalid="ignore"):
        bears_interest = kinds.among([HoldingKind.TERM_DEPOSIT]) & (np.abs(numbers["Coupon"]) > 0.0)
    needed["Start date"] = bears_interest
    maturity = cells["Maturity"].dates("the date of maturity", required=needed["Maturity"])
    start = cells["Start date"].dates("the date from which interest runs", required=bears_interest)
    first = cells["First coupon"].dates("the date of the first coupon", required=False)
    day_counts = cells["Day count"].choices(DayCount, "a day count", required=False)
    floating_day_counts = cells["Floating day count"].choices(DayCount, "a day count", required=False)
    amortisations = cells["Amortisation"].choices(Amortisation, "an amortisation", required=False)
    price_kinds = cells["Price kind"].choices(PriceKind, "a price kind", required=False)
    floored = cells["Principal floor"].choices(YesNo, "an answer", required=False)
    bought_ex = cells["Bought ex-dividend"].choices(YesNo, "an answer", required=False)

    report_missing_columns(table, stated_kinds, needed, faults)
    check_numbers(cells, numbers, kinds)
    past = report_past(cells, maturity, needed["Maturity"], valuation_date)
    check_worth(cells, numbers, kinds, past)
    check_prices(cells, numbers, used)
    check_dates(cells, numbers["Frequency"], start=start, first=first, maturity=maturity, used=used)
    check_ex_dividend(cells, numbers, bought_ex)
    check_indexation(cells, numbers, kinds, has_inflation=has_inflation)
    check_annuities(cells, amortisations, kinds)
    report_unused(cells, stated_kinds, used)
    report_twice(cells["Name"], names)

    for name in ("Price", "Discount rate", "Default rate"):
        numbers[name] = np.where(used[name], numbers[name], np.nan)
    first[~used["First coupon"]] = np.datetime64("NaT", "D")
    amortises, is_linked = used["Amortisation"].tolist(), used["Principal floor"].tolist()
    listed = {name: _or_none(column) for name, column in numbers.items()}
    days: dict[str, list[date | None]] = {
        name: column.astype(object).tolist()
        for name, column in (("maturity", maturity), ("start", start), ("first", first))
    }
    holdings = []
    spoilt = faults.grave_rows(table.sheet.name)
    for entry, (name, kind) in enumerate(zip(names, stated_kinds, strict=True)):
        if int(rows[entry]) in spoilt or not name or kind is None:
            continue
        floating_frequency = listed["Floating frequency"][entry]
        amortisation = amortisations[entry] if amortises[entry] else None
        try:
            holding = Holding(
                name=name,
                kind=kind,
                nominal=_or(listed["Nominal"][entry], 0.0),
                coupon=_or(listed["Coupon"][entry], 0.0),
                frequency=int(_or(listed["Frequency"][entry], 1.0)),
                maturity=days["maturity"][entry],
                day_count=day_counts[entry],
                market_value=listed["Market value"][entry],
                units=listed["Units"][entry],
                duration=listed["Duration"][entry],
                start_date=days["start"][entry],
                first_coupon=days["first"][entry],
                ex_dividend_days=int(_or(listed["Ex-dividend days"][entry], 0.0)),
                bought_ex_dividend=bought_ex[entry] is YesNo.YES,
                amortisation=amortisation or Amortisation.BULLET,
                price=listed["Price"][entry],
                price_kind=price_kinds[entry] or PriceKind.CLEAN,
                discount_rate=listed["Discount rate"][entry],
                current_rate=listed["Current rate"][entry],
                margin=_or(listed["Margin"][entry], 0.0),
                floating_frequency=None if floating_frequency is None else int(floating_frequency),
                floating_day_count=floating_day_counts[entry],
                default_rate=_or(listed["Default rate"][entry], 0.0),
                recovery_rate=_or(listed["Recovery rate"][entry], 0.0),
                index_lag_months=int(_or(listed["Index lag (months)"][entry], 3.0)),
                index_ratio=_or(listed["Index ratio"][entry], 1.0),
                has_principal_floor=is_linked[entry] and floored[entry] is YesNo.YES,
            )
        except ValueError as error:
            # Where a column is missing, which is reported at its place, or what no check above foresaw.
            cells["Name"].fault(
                entry, f"the row makes no holding: {plain(error)}", f"a {kind}", "Correct the row."
            )
            continue
        holdings.append(holding)
    return tuple(holdings)


def _or(value: float | None, default: float) -> float:
    return default if value is None else value


def _or_none(values: FloatArray) -> list[float | None]:
    return [
        None if missing else value
        for value, missing in zip(values.tolist(), np.isnan(values).tolist(), strict=True)
    ]
