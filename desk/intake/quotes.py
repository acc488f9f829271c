"""Sheets of what curves are made from: rates by term, and bonds."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import CurveBonds, PriceKind
from desk.book.holding import COUPON_FREQUENCIES
from desk.intake.cells import Cells
from desk.intake.checks import check_not_negative, check_rates, check_size
from desk.intake.faults import FaultList
from desk.intake.layout import Table

__all__ = ["check_frequencies", "check_terms", "read_bonds", "read_by_term"]

FloatArray = NDArray[np.float64]

_CALENDAR_YEAR = 200.0
"""Years from the valuation date beyond which a figure is taken for a slip."""
_LOW_PRICE = 2.0
"""A price per 100 below this is rather a price per 1."""


def read_by_term(
    table: Table, faults: FaultList, *, value: str = "Rate", from_zero: bool = False
) -> tuple[FloatArray, FloatArray]:
    """Terms and rates of a sheet with one rate a term, shape (q,).

    Parameters
    ----------
    table : Table
    faults : FaultList
    value : str
        Heading over the rates.
    from_zero : bool
        Whether a term of 0 is allowed.
    """
    what = f"the {value.lower()}"
    term_cells = Cells(table.sheet, table.column("Term"), table.rows, faults)
    rate_cells = Cells(table.sheet, table.column(value), table.rows, faults)
    terms = term_cells.numbers("a term in years")
    rates = rate_cells.numbers(f"a {value.lower()} a year")
    if not table.rows.size:
        faults.add(
            "the sheet holds no quotes",
            "one row a term",
            f"Add the curve's terms and {value.lower()}s.",
            sheet=table.sheet.name,
        )
    check_terms(term_cells, terms, from_zero=from_zero)
    with np.errstate(invalid="ignore"):
        step = np.diff(terms, prepend=np.nan)
        term_cells.each(
            step == 0.0, "the term {} stands twice", "each term once", "Remove one of the two rows."
        )
        term_cells.each(
            step < 0.0,
            "the term {} is shorter than the one above it",
            "terms that rise",
            "Sort the rows by their term.",
        )
    check_rates(rate_cells, rates, what)
    return terms, rates


def check_terms(cells: Cells, terms: FloatArray, *, what: str = "term", from_zero: bool = False) -> None:
    """Report terms that are none."""
    with np.errstate(invalid="ignore"):
        if from_zero:
            cells.each(terms < 0.0, f"the {what} is {{}}", f"a {what} of at least 0 years", "Correct it.")
        else:
            mend = "Correct or remove the row."
            cells.each(terms <= 0.0, f"the {what} is {{}}", f"a {what} above 0 years", mend)
        cells.each(
            terms > _CALENDAR_YEAR,
            f"the {what} is {{}}",
            f"a {what} in years, at most 200",
            "Correct or remove the row.",
        )


def read_bonds(
    table: Table, faults: FaultList, *, valuation_date: date | None, distinct: bool
) -> CurveBonds | None:
    """The bonds of a sheet; None where a row could not be read or there is none.

    Parameters
    ----------
    table : Table
    faults : FaultList
    valuation_date : datetime.date or None
        None where it is not known: bonds past their maturity are then not looked for.
    distinct : bool
        Whether each bond must have a maturity of its own, as it must for an exact fit.
    """
    rows = table.rows
    before = faults.grave_count
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    if not rows.size:
        faults.add("the sheet holds no bonds", "one row a bond", "Add the bonds.", sheet=table.sheet.name)
        return None
    names = cells["Name"].texts_of("the name of the bond", required=False)
    maturity = cells["Maturity"].dates("the date of maturity")
    coupon = cells["Coupon"].numbers("a coupon rate a year")
    frequency = cells["Frequency"].numbers("1, 2, 4 or 12 coupons a year", required=False)
    price = cells["Price"].numbers("a price per 100 of nominal", required=False)
    bond_yield = cells["Yield"].numbers("a yield a year", required=False)
    kinds = cells["Price kind"].choices(PriceKind, "a price kind", required=False)

    check_rates(cells["Coupon"], coupon, "the coupon")
    check_not_negative(cells["Coupon"], coupon, "the coupon")
    check_rates(cells["Yield"], bond_yield, "the yield")
    matters = np.nan_to_num(coupon) != 0.0
    frequency = check_frequencies(table, cells["Frequency"], frequency, matters, "coupon", faults)
    _check_maturities(cells["Maturity"], maturity, valuation_date, distinct)
    _check_prices(table, cells, price, faults)
    if faults.grave_count > before or np.isnat(maturity).any() or np.isnan(coupon).any():
        return None
    is_clean = np.array([kind is not PriceKind.DIRTY for kind in kinds], dtype=np.bool_)
    return CurveBonds(tuple(names), maturity, coupon, frequency.astype(np.int64), price, bond_yield, is_clean)


def check_frequencies(
    table: Table,
    cells: Cells,
    frequency: FloatArray,
    matters: NDArray[np.bool_],
    what: str,
    faults: FaultList,
) -> FloatArray:
    """Report frequencies that are none; those missing are taken as 1, which is said where it matters."""
    odd = ~np.isnan(frequency) & ~np.isin(frequency, COUPON_FREQUENCIES)
    expected = f"1, 2, 4 or 12 {what}s a year"
    cells.each(odd, "the frequency is {}", expected, "Correct the figure.")
    if cells.column is None:
        if matters.any():
            faults.mild(
                f'the heading "Frequency" is missing; 1 {what} a year is taken',
                f'a column "Frequency": {expected}',
                f'Add the column "Frequency" in row {table.heading_row + 1}.',
                sheet=table.sheet.name,
                row=table.heading_row,
            )
    else:
        cells.each(
            ~cells.filled & matters,
            f"the cell is empty; 1 {what} a year is taken",
            expected,
            "Write the frequency.",
            mild=True,
        )
    return np.where(np.isnan(frequency) | odd, 1.0, frequency)


def _check_maturities(
    cells: Cells, maturity: NDArray[np.datetime64], valuation_date: date | None, distinct: bool
) -> None:
    """Report bonds that have matured, that never do, and those that mature together."""
    if valuation_date is not None:
        today = np.datetime64(valuation_date, "D")
        past = np.flatnonzero(maturity <= today)
        cells.each_with(
            past,
            (f"the bond matured on {day}, by the valuation date {valuation_date}" for day in maturity[past]),
            "a date after the valuation date",
            "Remove the row, or correct the date.",
        )
        far = (maturity - today) > np.timedelta64(int(_CALENDAR_YEAR * 365.25), "D")
        cells.each(far, "{} is more than 200 years away", "a date within 200 years", "Correct the date.")
    if not distinct:
        return
    first: dict[np.datetime64, int] = {}
    for entry, day in enumerate(maturity.tolist()):
        if day is not None and first.setdefault(day, entry) != entry:
            cells.fault(
                entry,
                f"a bond with the maturity {day} stands in row {cells.rows[first[day]] + 1} already",
                "each maturity once, as an exact fit needs it",
                "Keep one of them, or fit a smooth curve through all.",
            )


def _check_prices(table: Table, cells: dict[str, Cells], price: FloatArray, faults: FaultList) -> None:
    """Report bonds with neither or both of price and yield, and prices that are none."""
    price_cells, yield_cells = cells["Price"], cells["Yield"]
    with np.errstate(invalid="ignore"):
        none = price <= 0.0
        low = (price > 0.0) & (price < _LOW_PRICE)
    price_cells.each(none, "the price is {}", "a price above 0 per 100 of nominal", "Correct the figure.")
    check_size(price_cells, price, "the price", most=1e6)
    price_cells.each(
        low,
        "the price is {} per 100 of nominal",
        "a price per 100 of nominal",
        "It counts as it stands; multiply it by 100 if it is per 1.",
        mild=True,
    )
    yield_cells.each(
        price_cells.filled & yield_cells.filled,
        "the yield {} stands beside a price",
        "either a price or a yield",
        "Remove one of the two.",
    )
    own = price_cells if price_cells.column is not None else yield_cells
    if own.column is None:
        faults.add(
            'neither "Price" nor "Yield" is among the headings',
            "a column with the price of each bond, or with its yield",
            f'Add the column "Price" or "Yield" in row {table.heading_row + 1}.',
            sheet=table.sheet.name,
            row=table.heading_row,
        )
        return
    own.each(
        ~price_cells.filled & ~yield_cells.filled,
        "the bond has neither a price nor a yield",
        "a price per 100 of nominal, or a yield",
        "Write one of the two.",
    )
