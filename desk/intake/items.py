"""Sheets of items and values: the basis, the rates model and the run."""

from __future__ import annotations

import difflib
import re
from collections.abc import Callable
from datetime import date
from enum import StrEnum
from functools import partial
from itertools import pairwise
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from desk.book import CurveKind, Measure, ModelName, RatesModel, Run
from desk.book.run import MOST_PATHS
from desk.intake.cells import Cells
from desk.intake.checks import (
    check_correlations,
    check_not_negative,
    check_rates,
    check_size,
    some,
)
from desk.intake.columns import Kind
from desk.intake.faults import FaultList
from desk.intake.layout import Table, find_known, fold
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import TIME_COUNTS, DayCount
from desk.rates.smith_wilson import Extrapolation

__all__ = ["MODEL_ITEMS", "ItemSheet", "missing_items", "read_basis_items", "read_rates_model", "read_run"]

Choice = TypeVar("Choice", bound=StrEnum)
Check = Callable[[Cells, NDArray[np.float64], str], None]

MODEL_ITEMS: dict[ModelName, tuple[str, ...]] = {
    ModelName.VASICEK: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
    ModelName.HO_LEE: ("Volatility",),
    ModelName.HULL_WHITE: ("Mean reversion", "Volatility"),
    ModelName.GAUSSIAN_2: (
        *("Mean reversion", "Volatility"),
        *("Second mean reversion", "Second volatility", "Factor correlation"),
    ),
    ModelName.CIR: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
    ModelName.CIR_SHIFTED: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
}
"""The items that each model needs."""
_SQUARE_ROOT = (ModelName.CIR, ModelName.CIR_SHIFTED)


class ItemSheet:
    """A sheet of items and values.

    Parameters
    ----------
    table : Table
    faults : FaultList
        Unknown and repeated items are added at once.
    """

    def __init__(self, table: Table, faults: FaultList) -> None:
        self._table = table
        self._faults = faults
        self.rows: dict[str, int] = {}
        items = Cells(table.sheet, table.column("Item"), table.rows, faults)
        for row, text in zip(table.rows.tolist(), items.texts_of("the name of an item"), strict=True):
            if text:
                self._place(text, row)

    def _place(self, text: str, row: int) -> None:
        table, known = self._table, self._table.layout.items
        sheet, column = table.sheet.name, table.fields["Item"]
        item = find_known(text, known)
        if item is None:
            close = difflib.get_close_matches(fold(text), [fold(name) for name in known], 1, 0.8)
            found, expected = f'the item "{text[:60]}" is not known', f"one of {', '.join(known)}"
            if close:
                name = next(name for name in known if fold(name) == close[0])
                self._faults.add(
                    found, expected, f'Did you mean "{name}"?', sheet=sheet, row=row, column=column
                )
            else:
                self._faults.mild(
                    found, expected, "It is not used; remove the row.", sheet=sheet, row=row, column=column
                )
        elif item in self.rows:
            self._faults.add(
                f'the item "{item}" stands twice, also in row {self.rows[item] + 1}',
                "each item once",
                "Remove one of the two rows.",
                sheet=sheet,
                row=row,
                column=column,
            )
        else:
            self.rows[item] = row

    def _cells(self, item: str) -> Cells:
        rows = np.array([self.rows[item]], dtype=np.int64)
        return Cells(self._table.sheet, self._table.column("Value"), rows, self._faults)

    def _absent(self, item: str, required: bool, instead: str = "") -> bool:
        if item in self.rows:
            return False
        sheet = self._table.sheet.name
        if required:
            self._faults.add(
                f'the item "{item}" is missing',
                f'a row with the item "{item}" and its value',
                "Add the row.",
                sheet=sheet,
            )
        elif instead:
            self._faults.mild(
                f'the item "{item}" is missing; {instead} is taken',
                f'a row with the item "{item}" and its value',
                "Add the row.",
                sheet=sheet,
            )
        return True

    def number(
        self, item: str, expected: str, *checks: Check, required: bool = False, instead: str = ""
    ) -> float | None:
        """A number, None where there is none or it is wrong."""
        if self._absent(item, required, instead):
            return None
        cells = self._cells(item)
        values = cells.numbers(expected, required=required)
        for check in checks:
            check(cells, values, f"the {item.lower()}")
        if instead and not cells.filled[0]:
            cells.mild(0, f"the cell is empty; {instead} is taken", expected, f"Write {expected} into it.")
        return None if np.isnan(values[0]) else float(values[0])

    def whole(self, item: str, what: str, *, least: int, most: int, instead: int) -> int:
        """A whole number, `instead` where there is none; `what` is its name in a sentence."""
        expected = f"a whole number from {least:,} to {most:,}"
        value = self.number(item, expected, instead=f"{instead:,}")
        if value is None:
            return instead
        if not value.is_integer() or not least <= value <= most:
            self._cells(item).fault(0, f"the {what} is {value:.12g}", expected, "Correct the figure.")
            return instead
        return int(value)

    def choice(
        self, item: str, choices: type[Choice], expected: str, *, required: bool = False, instead: str = ""
    ) -> Choice | None:
        """One of a few words."""
        if self._absent(item, required, instead):
            return None
        cells = self._cells(item)
        if instead and not cells.filled[0]:
            cells.mild(0, f"the cell is empty; {instead} is taken", expected, f"Write {expected} into it.")
        return cells.choices(choices, expected, required=required)[0]

    def date(self, item: str, expected: str) -> date | None:
        """A date that must be there."""
        if self._absent(item, True):
            return None
        day = self._cells(item).dates(expected)[0]
        return None if np.isnat(day) else day.item()

    def text(self, item: str, expected: str, *, required: bool = False) -> str:
        """A text, "" where there is none."""
        if self._absent(item, required):
            return ""
        return self._cells(item).texts_of(expected, required=required)[0]

    def fault(self, item: str, found: str, expected: str, mend: str, *, mild: bool = False) -> None:
        """Add a fault at the value of an item that is there."""
        cells = self._cells(item)
        (cells.mild if mild else cells.fault)(0, found, expected, mend)

    def stated(self, item: str) -> str:
        """The value of an item that is there, as a fault quotes it."""
        return self._cells(item).stated(0)

    def spread_out(self, item: str) -> list[Cells]:
        """The cells of an item: its value, and what follows in columns without a heading."""
        table = self._table
        taken = {column for _, column in table.further} | set(table.fields.values())
        start = table.fields["Value"]
        rows = np.array([self.rows[item]], dtype=np.int64)
        columns = range(start, len(table.sheet.data.columns))
        cells = [
            Cells(table.sheet, column, rows, self._faults)
            for column in columns
            if column == start or column not in taken
        ]
        return [cell for number, cell in enumerate(cells) if number == 0 or cell.filled[0]]


def read_basis_items(sheet: ItemSheet) -> dict[str, Any]:
    """The items of the basis by the name of the field of `Basis`; None stands for what is wrong."""
    currency = sheet.text("Currency", "a currency's three letters", required=True)
    code = currency.strip().upper()
    if currency and not (len(code) == 3 and code.isascii() and code.isalpha()):
        sheet.fault(
            "Currency",
            f'"{currency[:40]}" is no currency',
            "the three letters of ISO 4217",
            "Write for example EUR.",
        )
    elif currency != code:
        sheet.fault(
            "Currency",
            f'"{currency}" is taken as {code}',
            "three capital letters",
            f"Write {code}.",
            mild=True,
        )
    kind = sheet.choice("Curve kind", CurveKind, "a curve kind", required=True)
    return {
        "title": sheet.text("Title", "a title"),
        "valuation_date": sheet.date("Valuation date", "the valuation date"),
        "currency": code,
        "curve_kind": kind,
        "compounding": sheet.choice("Compounding", Compounding, "a compounding", required=True),
        "interpolation": sheet.choice("Interpolation", Interpolation, "an interpolation", required=True),
        "liability_spread": sheet.number("Liability spread", "a rate a year", check_rates, required=True),
        "market_risk_premium": _or_zero(sheet.number("Market risk premium", "a rate a year", check_rates)),
        "day_count": _time_count(sheet),
        **_curve_items(sheet, kind),
    }


_PAYMENTS = (1.0, 2.0, 4.0, 12.0)


def _time_count(sheet: ItemSheet) -> DayCount:
    """The day count of the basis, which needs the two dates only."""
    count = sheet.choice("Day count", DayCount, "a day count") or DayCount.ACT_365F
    if count in TIME_COUNTS:
        return count
    sheet.fault(
        "Day count",
        f"the day count {count} needs the periods of a bond",
        f"one of {', '.join(TIME_COUNTS)}",
        "Write one of these words.",
    )
    return DayCount.ACT_365F


def _curve_items(sheet: ItemSheet, kind: CurveKind | None) -> dict[str, Any]:
    """What is stated of how the curve is built and how it goes on, by the name of the field of `Basis`."""

    def years(item: str) -> float | None:
        value = sheet.number(item, "years above 0", partial(check_not_negative, zero_allowed=False))
        return value if value is not None and value > 0.0 else None

    payments = sheet.number("Payments a year", "1, 2, 4 or 12", _check_payments)
    found = {
        "payments_per_year": int(payments) if payments in _PAYMENTS else None,
        "extrapolation": sheet.choice("Beyond the last quote", Extrapolation, "a way to go on"),
        "ultimate_forward_rate": sheet.number("Ultimate forward rate", "a rate a year", check_rates),
        "last_liquid_point": years("Last liquid point"),
        "convergence_point": years("Convergence point"),
        "convergence_tolerance": sheet.number("Convergence tolerance", "a rate a year", check_rates),
    }
    if kind is CurveKind.ZERO and payments is not None:
        _tell_unused(sheet, "Payments a year", "par yields and swap rates use it")
    if found["extrapolation"] is not Extrapolation.SMITH_WILSON:
        for item in ("Ultimate forward rate", "Convergence point", "Convergence tolerance"):
            if item in sheet.rows:
                _tell_unused(sheet, item, f"a curve that goes on by {Extrapolation.SMITH_WILSON} uses it")
    elif "Ultimate forward rate" not in sheet.rows:
        sheet.fault(
            "Beyond the last quote",
            "there is no ultimate forward rate for the curve to come to",
            'a row with the item "Ultimate forward rate" and its value',
            "Add the row.",
        )
        found["extrapolation"] = None
    return {name: value for name, value in found.items() if value is not None}


def _tell_unused(sheet: ItemSheet, item: str, use: str) -> None:
    sheet.fault(item, f"{item} is not used", f"nothing here: {use}", "Remove the row.", mild=True)


def _check_payments(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    known = np.isin(values, _PAYMENTS) | np.isnan(values)
    cells.each(~known, f"{what} are {{}}", "1, 2, 4 or 12", "Correct the figure.")


def _or_zero(value: float | None) -> float:
    return 0.0 if value is None else value


def _check_reversion(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    check_not_negative(cells, values, what)
    cells.each(
        values > 100.0, f"{what} is {{}}", f"{some(what)} of at most 100 a year", "Correct the figure."
    )


def _check_price(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    check_size(cells, values, what, most=100.0)


def read_rates_model(sheet: ItemSheet) -> RatesModel | None:
    """The rates model; None where what it is cannot be told."""
    name = sheet.choice("Model", ModelName, "a model", required=True)
    needs = MODEL_ITEMS[name] if name is not None else ()

    def number(item: str, expected: str, *checks: Check) -> float | None:
        return sheet.number(item, expected, *checks, required=item in needs)

    reversion, volatility = "a speed of reversion a year", "a volatility a year"
    model = {
        "mean_reversion": number("Mean reversion", reversion, _check_reversion),
        "volatility": number("Volatility", volatility, check_not_negative, check_rates_above),
        "long_run_rate": number("Long-run rate", "a rate a year", check_rates),
        "starting_rate": number("Starting rate", "a rate a year", check_rates),
        "second_mean_reversion": number("Second mean reversion", reversion, _check_reversion),
        "second_volatility": number("Second volatility", volatility, check_not_negative, check_rates_above),
        "factor_correlation": number("Factor correlation", "a correlation", check_correlations),
    }
    risk_price = _or_zero(sheet.number("Risk price", "a price of risk", _check_price))
    if name is None:
        return None
    if name in _SQUARE_ROOT:
        if model["mean_reversion"] == 0.0:
            sheet.fault(
                "Mean reversion",
                "the mean reversion is 0",
                f"a speed above 0 for the model {name}",
                "Correct the figure.",
            )
        for item, value in (
            ("Long-run rate", model["long_run_rate"]),
            ("Starting rate", model["starting_rate"]),
        ):
            if value is not None and value < 0.0:
                sheet.fault(
                    item,
                    f"the {item.lower()} is {value:.12g}",
                    f"a rate of at least 0 for the model {name}",
                    "Correct the figure.",
                )
    for item, value in zip(sheet_parameters(), model.values(), strict=True):
        if value is not None and item not in needs:
            sheet.fault(
                item,
                f"the model {name} has no {item.lower()}",
                "no value",
                "It is kept and not used; remove it if it is not wanted.",
                mild=True,
            )
    return RatesModel(name=name, risk_price=risk_price, **model)


def missing_items(model: RatesModel) -> tuple[str, ...]:
    """The items that a model needs and does not have."""
    return tuple(
        item
        for item in MODEL_ITEMS[model.name]
        if getattr(model, item.lower().replace(" ", "_").replace("-", "_")) is None
    )


def sheet_parameters() -> tuple[str, ...]:
    """The items of a model's parameters, in the order of the fields of `RatesModel`."""
    return (
        *("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
        *("Second mean reversion", "Second volatility", "Factor correlation"),
    )


def check_rates_above(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    """Report rates that are plainly meant in per cent; negative ones are reported elsewhere."""
    check_rates(cells, values, what, least=-np.inf)


def read_run(sheet: ItemSheet) -> Run:
    """The run; what is wrong or missing is as in `Run`'s defaults."""
    default = Run()
    measure = sheet.choice("Measure", Measure, "a measure", instead=str(default.measure))
    return Run(
        paths=sheet.whole("Paths", "number of paths", least=1, most=MOST_PATHS, instead=default.paths),
        horizon_years=sheet.whole(
            "Horizon (years)", "horizon", least=1, most=200, instead=default.horizon_years
        ),
        steps_per_year=sheet.whole(
            "Steps a year", "number of steps a year", least=1, most=366, instead=default.steps_per_year
        ),
        seed=sheet.whole("Seed", "seed", least=0, most=2**53, instead=default.seed),
        measure=measure or default.measure,
        percentiles=_percentiles(sheet, default.percentiles),
    )


def _percentiles(sheet: ItemSheet, default: tuple[float, ...]) -> tuple[float, ...]:
    """Percentiles in one cell, as "1; 5; 25", or in several of the row."""
    item, expected = "Percentiles", "percentiles that rise, each above 0 and below 100"
    shown = ", ".join(f"{level:g}" for level in default)
    if item not in sheet.rows:
        sheet.number(item, expected, instead=shown)
        return default
    levels: list[float] = []
    cells = sheet.spread_out(item)
    if len(cells) == 1 and not cells[0].filled[0]:
        cells[0].mild(0, f"the cell is empty; {shown} is taken", expected, "Write them, as 5; 50; 95.")
        return default
    for cell in cells:
        if cell.kinds[0] != Kind.TEXT:
            levels += cell.numbers(expected).tolist()
            continue
        text = cell.texts[int(cell.values[0])].strip().rstrip(";,")
        for word in re.split(r"\s*;\s*" if ";" in text else r"\s*,\s*|\s+", text):
            try:
                levels.append(float(word))
            except ValueError:
                cell.fault(
                    0, f"{cell.stated(0)} holds what is no number", expected, "Write for example 5; 50; 95."
                )
                return default
    if any(np.isnan(level) for level in levels):
        return default
    if not all(0.0 < level < 100.0 for level in levels):
        wrong = ", ".join(f"{level:g}" for level in levels if not 0.0 < level < 100.0)
        sheet.fault(item, f"{wrong} is no percentile", expected, "Correct or remove it.")
        return default
    if any(first >= second for first, second in pairwise(levels)):
        sheet.fault(item, "the percentiles do not rise", expected, "Sort them and remove repeated ones.")
        return default
    return tuple(levels)
