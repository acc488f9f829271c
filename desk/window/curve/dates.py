"""Dates as spreadsheets write them, a column at a time: whether day or month comes first must agree."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import date

from desk.window.parts import numbers

__all__ = ["read_dates"]

_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_YEAR_FIRST = re.compile(r"(\d{4})[-/.](\d{1,2})[-/.](\d{1,2})(?:[T ]00:00(?::00)?(?:\.0+)?)?")
_YEAR_LAST = re.compile(r"(\d{1,2})[-/. ](\d{1,2})[-/. ](\d{4})(?: 00:00(?::00)?)?")
_WORDED = re.compile(r"(\d{1,2})\.?[-/ ]([A-Za-z]{3,9})\.?,?[-/ ](\d{4})")
_WORD_FIRST = re.compile(r"([A-Za-z]{3,9})\.? (\d{1,2}),? (\d{4})")
_SHORT_YEAR = re.compile(r"\d{1,2}[-/. ](?:\d{1,2}|[A-Za-z]{3,9})[-/. ]\d{2}")
_SERIAL = re.compile(r"\d{5}(?:\.0+)?")
_LONGEST = 24


def read_dates(texts: Sequence[str]) -> tuple[list[date | None], list[str]]:
    """The dates that the cells of one column write.

    ``2036-03-31``, ``31 March 2036`` and ``31/03/2036`` are known. Where neither figure is above 12, the
    order of day and month is the one that other cells of the column show, or that of the reader's locale.

    Returns
    -------
    dates : list of date or None
    faults : list of str
        For each cell, what is wrong with it; empty where nothing is, or where the cell is.
    """
    pairs = [_figures(text.strip()) for text in texts]
    day_first = any(pair is not None and pair[1] <= 12 < pair[0] <= 31 for pair in pairs)
    month_first = any(pair is not None and pair[0] <= 12 < pair[1] <= 31 for pair in pairs)
    dates: list[date | None] = []
    faults: list[str] = []
    for text, pair in zip(texts, pairs, strict=True):
        body = text.strip()
        found, fault = None, ""
        if body and pair is not None and day_first and month_first:
            fault = "the column writes days before months and months before days: write 2036-03-31"
        elif body:
            by_day = day_first or (not month_first and _locale_puts_day_first())
            found = _read(body, pair, by_day)
            if found is None:
                fault = _why(body)
        dates.append(found)
        faults.append(fault)
    return dates, faults


def _figures(text: str) -> tuple[int, int, int] | None:
    match = _YEAR_LAST.fullmatch(text)
    return None if match is None else (int(match[1]), int(match[2]), int(match[3]))


def _read(text: str, pair: tuple[int, int, int] | None, by_day: bool) -> date | None:
    if pair is not None:
        first, second, year = pair
        return _date(year, second, first) if by_day else _date(year, first, second)
    match = _YEAR_FIRST.fullmatch(text)
    if match is not None:
        return _date(int(match[1]), int(match[2]), int(match[3]))
    match = _WORDED.fullmatch(text)
    if match is not None:
        return _date(int(match[3]), _month(match[2]), int(match[1]))
    match = _WORD_FIRST.fullmatch(text)
    if match is not None:
        return _date(int(match[3]), _month(match[1]), int(match[2]))
    return numbers.parse_day(text)


def _month(word: str) -> int:
    start = word.casefold()[:3]
    return _MONTHS.index(start) + 1 if start in _MONTHS else 0


def _date(year: int, month: int, day: int) -> date | None:
    try:
        return date(year, month, day)
    except ValueError:
        return None


def _why(text: str) -> str:
    shown = f"“{text[:_LONGEST]}” is no date"
    if _SHORT_YEAR.fullmatch(text):
        return f"{shown} with a four-figure year"
    if _SERIAL.fullmatch(text):
        return f"{shown}: format the cells as dates, and copy again"
    return shown


def _locale_puts_day_first() -> bool:
    form = numbers.shown_locale().dateFormat(numbers.shown_locale().FormatType.ShortFormat)
    return form.find("d") < form.find("M")
