"""Sheets of market data beside the curve: volatilities, yields, scenarios."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Instrument, ScenarioSet, Volatilities, VolatilityKind, YieldHistory
from desk.intake.cells import Cells
from desk.intake.checks import check_not_negative, check_rates
from desk.intake.columns import Kind, column_letters
from desk.intake.faults import FaultList
from desk.intake.flows import check_history_dates
from desk.intake.layout import Table
from desk.intake.quotes import check_frequencies, check_terms

__all__ = ["read_scenario_set", "read_volatilities", "read_yield_history"]

BoolArray = NDArray[np.bool_]
FloatArray = NDArray[np.float64]

_HIGH_NORMAL = 0.1
"""A normal volatility above this is rather a lognormal one, or stated in another unit."""
_MOST_TOLD = 100
"""Faults of one column of a table of rates that are told cell by cell; a wrong unit has millions."""


def read_volatilities(table: Table, faults: FaultList) -> Volatilities | None:
    """The quoted volatilities; None where a row could not be read or there is none."""
    rows = table.rows
    before = faults.grave_count
    if not rows.size:
        _tell_empty(table, faults, "quotes", "one row an instrument")
        return None
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    instruments = cells["Instrument"].choices(Instrument, "an instrument")
    swaption = np.array(
        [own in (Instrument.PAYER_SWAPTION, Instrument.RECEIVER_SWAPTION) for own in instruments],
        dtype=np.bool_,
    )
    known = np.array([own is not None for own in instruments], dtype=np.bool_)
    expiry = cells["Expiry"].numbers("an expiry in years")
    length = cells["Length"].numbers("the length of the swap in years", required=swaption)
    strike = cells["Strike"].numbers("a strike a year", required=False)
    volatility = cells["Volatility"].numbers("a volatility")
    kinds = cells["Kind"].choices(VolatilityKind, "a kind of volatility", required=False)
    shift = cells["Shift"].numbers("a shift a year", required=False)
    frequency = cells["Frequency"].numbers("1, 2, 4 or 12 payments a year", required=False)

    check_terms(cells["Expiry"], expiry, what="expiry")
    check_terms(cells["Length"], length, what="length")
    if cells["Length"].column is None:
        cells["Instrument"].each(
            swaption, "{} has no length", "the length of the swap in years", 'Add the column "Length".'
        )
    unused = cells["Length"].filled & known & ~swaption
    mend = "It is left out; remove it."
    cells["Length"].each(unused, "a cap or floor has no length", "an empty cell", mend, mild=True)
    length = np.where(unused, np.nan, length)
    check_rates(cells["Strike"], strike, "the strike")
    check_rates(cells["Shift"], shift, "the shift")
    check_not_negative(cells["Shift"], shift, "the shift")
    lognormal = np.array([kind is VolatilityKind.LOGNORMAL for kind in kinds], dtype=np.bool_)
    _check_volatilities(cells, volatility, shift, lognormal)
    every = np.ones(rows.size, dtype=np.bool_)
    frequency = check_frequencies(table, cells["Frequency"], frequency, every, "payment", faults)
    shift = np.where(np.isnan(shift), 0.0, shift)
    _check_twice(cells["Instrument"], list(zip(instruments, expiry, length, strike, kinds, strict=True)))
    unread = np.isnan(expiry) | np.isnan(volatility) | ~known
    if faults.grave_count > before or unread.any():
        return None
    return Volatilities(
        tuple(own for own in instruments if own is not None),
        expiry,
        length,
        strike,
        volatility,
        tuple(kind or VolatilityKind.NORMAL for kind in kinds),
        shift,
        frequency,
    )


def _check_volatilities(
    cells: dict[str, Cells], volatility: FloatArray, shift: FloatArray, lognormal: BoolArray
) -> None:
    own = cells["Volatility"]
    check_not_negative(own, volatility, "the volatility", zero_allowed=False)
    with np.errstate(invalid="ignore"):
        in_points = np.flatnonzero(~lognormal & (volatility > 1.0))
        in_cents = np.flatnonzero(lognormal & (volatility > 5.0))
        high = ~lognormal & (volatility > _HIGH_NORMAL) & (volatility <= 1.0)
        odd = ~lognormal & (shift > 0.0)
    own.each_with(
        in_points,
        (f"the normal volatility is {100.0 * volatility[entry]:,.6g} % a year" for entry in in_points),
        "a normal volatility as a fraction: 0.0065 for 65 basis points",
        "Divide it by 10,000 if it is in basis points, by 100 if it is in per cent.",
    )
    own.each_with(
        in_cents,
        (f"the lognormal volatility is {100.0 * volatility[entry]:,.6g} %" for entry in in_cents),
        "a lognormal volatility as a fraction: 0.25 for 25 %",
        "Divide it by 100 if it is in per cent.",
    )
    own.each(
        high,
        "the normal volatility {} is high",
        "a normal volatility, rarely above 0.02",
        f"It counts as it stands; write {VolatilityKind.LOGNORMAL} under Kind if it is one.",
        mild=True,
    )
    cells["Shift"].each(
        odd,
        "a normal volatility has no shift",
        "an empty cell",
        "It is kept and not used; remove it if it is not wanted.",
        mild=True,
    )


def _check_twice(cells: Cells, quotes: list[tuple[object, ...]]) -> None:
    first: dict[tuple[object, ...], int] = {}
    for entry, quote in enumerate(quotes):
        key = tuple(None if own != own else own for own in quote)
        if key[0] is not None and first.setdefault(key, entry) != entry:
            cells.mild(
                entry,
                f"the same instrument stands in row {cells.rows[first[key]] + 1}",
                "each instrument once",
                "Both count; remove one of the two rows.",
            )


def read_yield_history(
    table: Table, faults: FaultList, *, valuation_date: date | None
) -> YieldHistory | None:
    """The history of yields; None where a cell could not be read or there is none."""
    before = faults.grave_count
    if not table.rows.size:
        _tell_empty(table, faults, "history", "one row a date")
        return None
    cells = Cells(table.sheet, table.column("Date"), table.rows, faults)
    dates = cells.dates("a date")
    check_history_dates(cells, dates, valuation_date)
    columns = sorted(table.years)
    rates = _rates(table, columns, faults, required=False)
    if faults.grave_count > before or not columns or np.isnat(dates).any():
        return None
    _tell_gaps(table, columns, rates, faults)
    return YieldHistory(dates, np.array([term for term, _ in columns]), rates)


def _tell_gaps(table: Table, columns: list[tuple[float, int]], rates: FloatArray, faults: FaultList) -> None:
    """Report each run of dates for which a term has no quote."""
    for number, (_, column) in enumerate(columns):
        missing = np.concatenate(([False], np.isnan(rates[:, number]), [False]))
        starts = np.flatnonzero(~missing[:-1] & missing[1:])
        ends = np.flatnonzero(missing[:-1] & ~missing[1:])
        for start, end in zip(starts[:_MOST_TOLD].tolist(), ends[:_MOST_TOLD].tolist(), strict=True):
            count = end - start
            last = f"{column_letters(column)}{table.rows[end - 1] + 1}"
            faults.mild(
                "there is no quote"
                if count == 1
                else f"there are no quotes in {count:,} cells down to {last}",
                "a continuously compounded rate a year",
                "It counts as no quote; fill it if there is one.",
                sheet=table.sheet.name,
                row=int(table.rows[start]),
                column=column,
            )
        rest = starts[_MOST_TOLD:]
        _tell_rest(Cells(table.sheet, column, table.rows, faults), rest, "begin a gap", mild=True)


def read_scenario_set(table: Table, faults: FaultList) -> ScenarioSet | None:
    """The scenarios from outside; None where a cell could not be read or there is none."""
    before = faults.grave_count
    if not table.rows.size:
        _tell_empty(table, faults, "paths", "one row a path")
        return None
    _check_paths(Cells(table.sheet, table.column("Path"), table.rows, faults))
    columns = sorted(table.years)
    rates = _rates(table, columns, faults, required=True)
    if faults.grave_count > before or not columns or np.isnan(rates).any():
        return None
    return ScenarioSet(np.array([node for node, _ in columns]), rates)


def _check_paths(cells: Cells) -> None:
    """Report names of paths that stand twice."""
    number = cells.kinds == Kind.NUMBER
    key = np.where(cells.kinds == Kind.TEXT, -1.0 - cells.values, cells.values)
    entries = np.flatnonzero(number | (cells.kinds == Kind.TEXT))
    _, first, back = np.unique(key[entries], return_index=True, return_inverse=True)
    twice = entries[first[back] != np.arange(entries.size)]
    cells.each_with(
        twice[:_MOST_TOLD],
        (f"the path {cells.stated(entry)} stands twice" for entry in twice[:_MOST_TOLD].tolist()),
        "each path once",
        "Both count; remove one if it is a copy.",
        mild=True,
    )
    _tell_rest(cells, twice[_MOST_TOLD:], "stand twice", mild=True)


def _rates(
    table: Table, columns: list[tuple[float, int]], faults: FaultList, *, required: bool
) -> FloatArray:
    """The rates under headings of years, shape (rows, columns); NaN where there is none."""
    rates = np.empty((table.rows.size, len(columns)))
    for number, (_, column) in enumerate(columns):
        cells = Cells(table.sheet, column, table.rows, faults)
        good = (cells.kinds == Kind.NUMBER) & np.isfinite(cells.values)
        odd = np.flatnonzero(~good & (cells.filled | required))
        left_out = odd[_MOST_TOLD:]
        if left_out.size:
            told = np.setdiff1d(np.arange(table.rows.size), left_out, assume_unique=True)
            rates[:, number] = np.nan
            some = Cells(table.sheet, column, table.rows[told], faults)
            rates[told, number] = some.numbers("a continuously compounded rate a year", required=required)
            _tell_rest(cells, left_out, "hold no number either")
        else:
            rates[:, number] = cells.numbers("a continuously compounded rate a year", required=required)
        _check_rates(cells, rates[:, number])
    return rates


def _check_rates(cells: Cells, rates: FloatArray) -> None:
    """Report rates that are plainly in per cent."""
    with np.errstate(invalid="ignore"):
        wrong = np.flatnonzero((rates > 1.0) | (rates < -0.5))
    if wrong.size:
        told = np.full(rates.size, np.nan)
        told[wrong[:_MOST_TOLD]] = rates[wrong[:_MOST_TOLD]]
        check_rates(cells, told, "the rate")
        _tell_rest(cells, wrong[_MOST_TOLD:], "are out of range likewise")


def _tell_rest(cells: Cells, entries: NDArray[np.int64], what: str, *, mild: bool = False) -> None:
    """One fault for what is left of a column that is wrong over and over."""
    if entries.size:
        text = f"{entries.size:,} further cells of this column {what}, the last in row "
        cells.each_with(
            entries[:1],
            [f"{text}{cells.rows[entries[-1]] + 1}"],
            "a column of one kind",
            "Mend the whole column.",
            mild=mild,
        )


def _tell_empty(table: Table, faults: FaultList, what: str, expected: str) -> None:
    faults.mild(
        f"the sheet holds no {what}", expected, "Add rows, or remove the sheet.", sheet=table.sheet.name
    )
