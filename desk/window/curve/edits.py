"""Edits of the quotes of a curve: what is wrong with them, and what a spreadsheet's cells make of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.window.parts import numbers

__all__ = ["LEAST_RATE", "MOST_RATE", "Pasted", "merged", "next_term", "quotes_fault", "read_cells"]

_MOST_SHOWN = 6
_MOST_ROWS = 10_000
_LONGEST = 24
_MOST_YEARS = 200
LEAST_RATE, MOST_RATE = -0.5, 1.0
"""As in a workbook: what is edited can be saved and read back [1/year]."""


def quotes_fault(terms: FloatArray, rates: FloatArray, *, what: str = "rate", from_zero: bool = False) -> str:
    """Why these quotes make no curve, in one line for the reader; empty where they make one.

    `what` is the name of a quote's figure, and `from_zero` says whether a term may be 0.
    """
    if not terms.size:
        return "A curve needs at least one quote."
    if not (np.isfinite(terms).all() and np.isfinite(rates).all()):
        return f"Every quote needs a term and a {what}."
    early = terms < 0.0 if from_zero else terms <= 0.0
    if early.any():
        least = "at least" if from_zero else "above"
        return f"A term must be {least} 0 years, not {numbers.exact(float(terms[early][0]))}."
    steps = np.diff(terms)
    if (steps == 0.0).any():
        twice = float(terms[:-1][steps == 0.0][0])
        return f"The term {numbers.exact(twice)} years would stand twice."
    if (steps < 0.0).any():
        place = int(np.flatnonzero(steps < 0.0)[0])
        after, before = float(terms[place + 1]), float(terms[place])
        return (
            f"Terms must rise: {numbers.exact(after)} years would come after {numbers.exact(before)} years."
        )
    if terms[-1] > _MOST_YEARS:
        return f"A term must be at most {_MOST_YEARS} years, not {numbers.exact(float(terms[-1]))}."
    far = (rates > MOST_RATE) | (rates < LEAST_RATE)
    if far.any():
        return (
            f"A {what} must be from {numbers.rate(LEAST_RATE, 0)} to "
            f"{numbers.rate(MOST_RATE, 0, with_unit=True)} a year, "
            f"not {numbers.rate(float(rates[far][0]), 0, with_unit=True)}."
        )
    return ""


@dataclass(frozen=True)
class Pasted:
    """What pasted cells hold.

    Attributes
    ----------
    columns : dict of str to list of float
        ``term`` or ``rate`` or both, of one length.
    faults : tuple of str
        Each cell that holds no number, with its place among the pasted ones.
    """

    columns: dict[str, list[float]]
    faults: tuple[str, ...]

    @property
    def fault(self) -> str:
        """All the faults in one text; empty where there is none."""
        if not self.faults:
            return ""
        more = len(self.faults) - _MOST_SHOWN
        tail = f" And {more} more." if more > 0 else ""
        return " ".join(self.faults[:_MOST_SHOWN]) + tail


def read_cells(grid: Sequence[Sequence[str]], first: str) -> Pasted:
    """Read cells that were copied from a spreadsheet.

    Parameters
    ----------
    grid : sequence of rows of texts
        A first row of words is taken for headings. Empty rows are left out.
    first : str
        ``term`` or ``rate``: where the first column goes. Terms are in years, rates in percent, with or
        without its sign.
    """
    keys: tuple[str, ...] = ("term", "rate") if first == "term" else ("rate",)
    wide = max((len(row) for row in grid), default=0)
    keys = keys[:wide]
    columns: dict[str, list[float]] = {key: [] for key in keys}
    faults = []
    if wide > len(keys):
        what = "a term and a rate" if len(keys) == 2 else "a rate"
        faults.append(f"There are {wide} columns where a row needs {what}.")
    if len(grid) > _MOST_ROWS:
        faults.append(f"There are {numbers.integer(len(grid))} rows: too many for a curve.")
        return Pasted({}, tuple(faults))
    for place, row in enumerate(grid):
        cells = [(row[column] if column < len(row) else "").strip() for column in range(len(keys))]
        if not any(cells) or (place == 0 and _are_words(cells)):
            continue
        for key, text in zip(keys, cells, strict=True):
            value = numbers.parse_number(text) if key == "term" else numbers.parse_rate(text)
            if value is None:
                found = f"“{text[:_LONGEST]}” is no {key}" if text else f"the {key} is missing"
                faults.append(f"Row {place + 1}: {found}.")
            columns[key].append(np.nan if value is None else value)
    if not faults and not any(columns.values()):
        faults.append("There is no quote among what was pasted.")
    return Pasted(columns, tuple(faults))


def _are_words(cells: Sequence[str]) -> bool:
    return all(text and not any(mark.isdigit() for mark in text) for text in cells)


def merged(
    terms: FloatArray, rates: FloatArray, pasted: Pasted, start: int
) -> tuple[FloatArray, FloatArray, str]:
    """The quotes with pasted ones over them from row `start` on, and further ones after the last.

    Returns
    -------
    terms, rates : ndarray
    fault : str
        Why they do not go in; empty where they do.
    """
    count = max((len(values) for values in pasted.columns.values()), default=0)
    beyond = start + count - terms.size
    if beyond > 0 and len(pasted.columns) < 2:
        return terms, rates, f"There are {numbers.integer(count)} figures for fewer rows from here on."
    grown = [np.append(values, np.full(max(beyond, 0), np.nan)) for values in (terms, rates)]
    for values, key in zip(grown, ("term", "rate"), strict=True):
        if key in pasted.columns:
            values[start : start + count] = pasted.columns[key]
    return grown[0], grown[1], ""


def next_term(terms: FloatArray, after: int) -> float:
    """A term to add after a quote [years].

    Between two terms it is the middle, to hundredths of a year where there is room; after the last one it is
    as far beyond as that is beyond the one before; the first of all is 1 year.
    """
    if not terms.size:
        return 1.0
    if after < terms.size - 1:
        low, high = float(terms[after]), float(terms[after + 1])
        term = (low + high) / 2
        rounded = round(term, 2)
        return rounded if low < rounded < high else term
    step = float(terms[-1] - terms[-2]) if terms.size > 1 else float(terms[-1])
    return float(terms[-1]) + step
