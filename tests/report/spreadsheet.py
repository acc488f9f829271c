"""A small spreadsheet: it evaluates the few formulas that the report uses, written apart from the program."""

from __future__ import annotations

import math
import re
from datetime import datetime
from functools import lru_cache
from pathlib import Path
from statistics import NormalDist
from types import CodeType
from typing import Any

import numpy as np
from openpyxl import load_workbook
from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token
from openpyxl.utils import range_boundaries

__all__ = ["Spreadsheet"]

_DAY_ZERO = datetime(1899, 12, 30)
"""A date is the number of days since then, after February 1900."""


class Spreadsheet:
    """A workbook whose formulas are evaluated when their cells are asked for.

    Attributes
    ----------
    book : openpyxl workbook
        Cells may be changed before the first one is asked for.
    """

    def __init__(self, path: Path) -> None:
        self.book = load_workbook(path)
        self._known: dict[tuple[str, int, int], Any] = {}
        self._areas: dict[str, Any] = {}
        self._used: set[str] = set()

    def value(self, sheet: str, address: str) -> Any:
        """Value of one cell."""
        column, row, _, _ = range_boundaries(address)
        return self._cell(sheet, int(row or 0), int(column or 0))

    def forget(self) -> None:
        """Evaluate everything anew: cells were changed after one was asked for."""
        self._known.clear()
        self._areas.clear()

    def formulas(self) -> list[tuple[str, str, str]]:
        """Sheet, address and text of every formula."""
        return [
            (sheet.title, cell.coordinate, str(cell.value))
            for sheet in self.book.worksheets
            for row in sheet.iter_rows()
            for cell in row
            if cell.data_type == "f"
        ]

    def _cell(self, sheet: str, row: int, column: int) -> Any:
        key = (sheet, row, column)
        if key not in self._known:
            cell = self.book[sheet].cell(row, column)
            self._known[key] = self._evaluate(sheet, cell.value) if cell.data_type == "f" else cell.value
        return self._known[key]

    def _evaluate(self, sheet: str, formula: Any) -> Any:
        expression = _compiled(str(formula))
        try:
            return eval(expression, dict(_FUNCTIONS), {"R": lambda text: self._refer(sheet, text)})
        except (ArithmeticError, TypeError, ValueError):
            return "#VALUE!"

    def _refer(self, sheet: str, text: str) -> Any:
        """What a reference or a name stands for: a value, or an array for a range."""
        if text in self.book.defined_names:
            text = str(self.book.defined_names[text].attr_text)
        if "!" in text:
            sheet, text = text.rsplit("!", 1)
            sheet = sheet.strip("'")
        text = text.replace("$", "")
        left, top, right, bottom = (int(bound or 0) for bound in range_boundaries(text))
        if ":" not in text:
            value = self._cell(sheet, top, left)
            if isinstance(value, datetime):
                return float((value - _DAY_ZERO).total_seconds()) / 86_400.0
            return 0.0 if value is None else value
        key = f"{sheet}!{text}"
        if key not in self._areas:
            assert left == right or top == bottom, "the report uses columns, and rows to choose from"
            self._areas[key] = _column(
                [
                    self._cell(sheet, row, column)
                    for row in range(top, bottom + 1)
                    for column in range(left, right + 1)
                ]
            )
        return self._areas[key]


def _column(values: list[Any]) -> Any:
    if all(value is None or isinstance(value, int | float) for value in values):
        return np.array([0.0 if value is None else float(value) for value in values])
    return np.array(values, dtype=object)


@lru_cache(maxsize=200_000)
def _compiled(formula: str) -> CodeType:
    """A formula, ready to be evaluated: tests open the same workbook again and again."""
    return compile("".join(_python(token) for token in Tokenizer(formula).items), formula, "eval")


def _python(token: Token) -> str:
    """One token of a formula as Python."""
    if token.type == Token.OPERAND:
        if token.subtype == Token.RANGE:
            return f"R({token.value!r})"
        if token.subtype == Token.TEXT:
            return repr(token.value[1:-1].replace('""', '"'))
        return str(token.value)
    if token.type == Token.FUNC:
        return str(token.value) if token.subtype == Token.OPEN else ")"
    if token.type == Token.OP_IN:
        return {"=": "==", "<>": "!=", "&": "+"}.get(str(token.value), str(token.value))
    return str(token.value)


def _total(values: Any) -> float:
    array = np.asarray(values)
    if array.dtype == object:
        return math.fsum(value for value in array.tolist() if isinstance(value, int | float))
    return math.fsum(array.ravel().tolist())


def _sum_product(*arrays: Any) -> float:
    product = np.asarray(1.0)
    for array in arrays:
        product = product * np.asarray(array, dtype=float)
    return math.fsum(product.ravel().tolist())


def _sum_ifs(values: Any, *conditions: Any) -> float:
    kept = np.ones(len(values), dtype=bool)
    for area, wanted in zip(conditions[::2], conditions[1::2], strict=True):
        kept &= np.asarray(area, dtype=float) == float(wanted)
    return math.fsum(np.asarray(values, dtype=float)[kept].tolist())


def _count_if(area: Any, wanted: Any) -> int:
    return sum(1 for value in np.asarray(area, dtype=object).tolist() if value == wanted)


def _index(area: Any, place: float) -> Any:
    assert 1 <= place <= len(area)
    return area[int(place) - 1]


def _match(wanted: float, area: Any, kind: int) -> int:
    assert kind == 1
    return int(np.searchsorted(np.asarray(area, dtype=float), wanted, side="right"))


def _normal(value: float) -> float:
    return 0.5 * math.erfc(-value / math.sqrt(2.0))


_FUNCTIONS: dict[str, Any] = {
    "__builtins__": {},
    "SUM": lambda *parts: math.fsum(_total(part) for part in parts),
    "SUMPRODUCT": _sum_product,
    "SUMIFS": _sum_ifs,
    "COUNTIF": _count_if,
    "ROWS": len,
    "EXP": np.exp,
    "LN": lambda value: math.log(value),
    "ABS": lambda value: np.abs(value),
    "INDEX": _index,
    "INT": lambda value: math.floor(value),
    "MATCH": _match,
    "MIN": lambda *values: min(*values),
    "PI": lambda: math.pi,
    "SQRT": lambda value: math.sqrt(value),
    "MAX": lambda *values: max(values),
    "AND": lambda *values: all(values),
    "IF": lambda condition, one, other: one if condition else other,
    "NORMSDIST": _normal,
    "NORMSINV": lambda share: NormalDist().inv_cdf(share),
}

_FUNCTIONS |= {
    "SLOPE": lambda after, before: float(np.polyfit(before, after, 1)[0]),
    "INTERCEPT": lambda after, before: float(np.polyfit(before, after, 1)[1]),
    "STEYX": lambda after, before: math.sqrt(
        float(np.sum((after - np.polyval(np.polyfit(before, after, 1), before)) ** 2)) / (len(after) - 2)
    ),
}

FUNCTION_NAMES = frozenset(_FUNCTIONS) - {"__builtins__"}
FUNCTION_CALL = re.compile(r"([A-Z][A-Z0-9.]*)\(")
