"""Cells into numbers, dates, names and choices, with every fault on the way."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from enum import StrEnum
from itertools import repeat
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from desk.book import Severity
from desk.intake.columns import Kind, column_letters
from desk.intake.faults import FaultList
from desk.intake.layout import IntArray, SourceSheet

__all__ = ["Cells", "match_choice"]

BoolArray = NDArray[np.bool_]
FloatArray = NDArray[np.float64]
Choice = TypeVar("Choice", bound=StrEnum)

_PLAIN_NUMBER = re.compile(r"\s*[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?\s*", re.ASCII)
_GROUPED_NUMBER = re.compile(r"\s*[+-]?[1-9]\d{0,2}(?:\.\d{3})+\s*", re.ASCII)
_ISO_DATE = re.compile(r"\s*(\d{4})-(\d{2})-(\d{2})\s*", re.ASCII)
_EMPTY_DATE = np.datetime64("NaT", "D")
_EPOCH = np.datetime64("1970-01-01", "D")


def _plain_number(text: str) -> float | None:
    """The number that `text` states beyond doubt; None where there is doubt."""
    if _PLAIN_NUMBER.fullmatch(text) and not _GROUPED_NUMBER.fullmatch(text):
        number = float(text)
        return number if np.isfinite(number) else None
    return None


def _iso_date(text: str) -> np.datetime64:
    """The date that `text` states as yyyy-mm-dd; NaT otherwise."""
    match = _ISO_DATE.fullmatch(text)
    if match is None:
        return _EMPTY_DATE
    try:
        return np.datetime64(date(*map(int, match.groups())), "D")
    except ValueError:
        return _EMPTY_DATE


def match_choice(text: str, choices: type[Choice]) -> Choice | None:
    """The choice that `text` names, without regard to case, blanks, hyphens and underlines."""
    key = re.sub(r"[\s_-]+", "", text).casefold()
    for choice in choices:
        if key == re.sub(r"[\s_-]+", "", choice.value).casefold():
            return choice
    return None


@dataclass(eq=False)
class Cells:
    """Some cells of one column.

    Attributes
    ----------
    sheet : SourceSheet
    column : int or None
        None where the source has no such column: every cell is then blank and no fault is added.
    rows : ndarray of int, shape (n,)
    faults : FaultList
    """

    sheet: SourceSheet
    column: int | None
    rows: IntArray
    faults: FaultList

    def __post_init__(self) -> None:
        """Take the cells out of their column."""
        count = self.rows.size
        if self.column is None or self.column >= len(self.sheet.data.columns):
            self.kinds = np.zeros(count, dtype=np.uint8)
            self.values = np.zeros(count)
            self.texts: list[str] = []
            self.broken: Mapping[int, str] = {}
            return
        column = self.sheet.data.columns[self.column]
        self.kinds = column.kinds[self.rows]
        self.values = column.values[self.rows]
        self.texts = column.texts
        self.broken = self.sheet.broken.get(self.column, {})

    @property
    def filled(self) -> BoolArray:
        """Which cells hold something, an error counting as something, shape (n,)."""
        filled = np.asarray(self.kinds != Kind.BLANK)
        if self.broken:
            filled |= np.isin(self.rows, list(self.broken))
        return filled

    def fault(
        self, entry: int, found: str, expected: str, mend: str, *, severity: Severity = Severity.GRAVE
    ) -> None:
        """Add a fault at one of the cells."""
        column = -1 if self.column is None else self.column
        self.faults.add(
            found,
            expected,
            mend,
            sheet=self.sheet.name,
            row=int(self.rows[entry]),
            column=column,
            severity=severity,
        )

    def mild(self, entry: int, found: str, expected: str, mend: str) -> None:
        """Add a mild fault at one of the cells."""
        self.fault(entry, found, expected, mend, severity=Severity.MILD)

    def each(self, flagged: BoolArray, found: str, expected: str, mend: str, *, mild: bool = False) -> None:
        """Add a fault at each flagged cell; ``{}`` in `found` stands for what the cell holds."""
        entries = np.flatnonzero(flagged)
        texts: Iterable[str] = repeat(found, entries.size)
        if "{}" in found:
            texts = (found.replace("{}", stated) for stated in self._all_stated(entries))
        self.each_with(entries, texts, expected, mend, mild=mild)

    def each_with(
        self, entries: IntArray, found: Iterable[str], expected: str, mend: str, *, mild: bool = False
    ) -> None:
        """Add a fault at each entry, each with a text of its own."""
        self.faults.add_rows(
            found,
            expected,
            mend,
            sheet=self.sheet.name,
            rows=self.rows[entries].tolist(),
            column=-1 if self.column is None else self.column,
            severity=Severity.MILD if mild else Severity.GRAVE,
        )

    def stated(self, entry: int) -> str:
        """What a cell holds, as a fault quotes it."""
        if self.column is None:
            return "nothing"
        return self.sheet.data.columns[self.column].stated(int(self.rows[entry]))

    def _all_stated(self, entries: IntArray) -> Iterator[str]:
        """What each of some cells holds, as a fault quotes it."""
        if self.column is None:
            return repeat("nothing", entries.size)
        stated = self.sheet.data.columns[self.column].stated
        return map(stated, self.rows[entries].tolist())

    def _odd(self, entries: IntArray, expected: str, required: BoolArray) -> None:
        """Add the faults of cells that hold nothing, or an error."""
        if self.broken and entries.size:
            rows = self.rows[entries]
            wrong = entries[np.isin(rows, list(self.broken))]
            self.each_with(
                wrong,
                [self.broken[row] for row in self.rows[wrong].tolist()],
                expected,
                "Mend the formula, or write the value itself.",
            )
            entries = np.setdiff1d(entries, wrong, assume_unique=True)
        empty = entries[required[entries]]
        self.each_with(empty, repeat("the cell is empty", empty.size), expected, f"Write {expected} into it.")

    def _required(self, required: bool | BoolArray) -> BoolArray:
        if self.column is None:
            return np.zeros(self.rows.size, dtype=np.bool_)
        return np.broadcast_to(np.asarray(required, dtype=np.bool_), self.rows.shape)

    def numbers(self, expected: str, *, required: bool | BoolArray = True) -> FloatArray:
        """The cells as numbers; NaN where there is none.

        Parameters
        ----------
        expected : str
            What each cell should hold, for the faults: "an amount".
        required : bool or ndarray of bool, shape (n,)
            Which cells must hold one.

        Returns
        -------
        ndarray, shape (n,)
        """
        good = (self.kinds == Kind.NUMBER) & np.isfinite(self.values)
        if good.all():
            return self.values
        numbers = np.where(good, self.values, np.nan)
        if self.column is None:
            return numbers
        must = self._required(required)
        blank = self.kinds == Kind.BLANK
        self._odd(np.flatnonzero(blank), expected, must)
        odd = np.flatnonzero(~good & ~blank)
        parsed = [_plain_number(text) for text in self.texts]
        as_texts = np.array([np.nan if number is None else number for number in parsed], dtype=np.float64)
        is_text = self.kinds[odd] == Kind.TEXT
        texts = odd[is_text]
        numbers[texts] = as_texts[self.values[texts].astype(np.int64)]
        taken = np.isfinite(numbers[odd])
        self.each_with(
            odd[taken],
            (
                f"{stated} stands where a number belongs; {number:.12g} is taken"
                for stated, number in zip(
                    self._all_stated(odd[taken]), numbers[odd[taken]].tolist(), strict=True
                )
            ),
            expected,
            "Turn the text into a number.",
            mild=True,
        )
        self.each_with(
            odd[~taken],
            (f"{stated} stands where a number belongs" for stated in self._all_stated(odd[~taken])),
            expected,
            "Write it as a plain number, without signs of grouping, units or words.",
        )
        return numbers

    def dates(self, expected: str, *, required: bool | BoolArray = True) -> NDArray[np.datetime64]:
        """The cells as dates, datetime64[D]; NaT where there is none."""
        good = self.kinds == Kind.DATE
        dates = np.full(self.rows.size, _EMPTY_DATE)
        dates[good] = _EPOCH + self.values[good].astype(np.int64)
        if good.all() or self.column is None:
            return dates
        blank = self.kinds == Kind.BLANK
        self._odd(np.flatnonzero(blank), expected, self._required(required))
        odd = np.flatnonzero(~good & ~blank)
        kinds = self.kinds[odd]
        self._take_moments(odd[kinds == Kind.MOMENT], dates, expected)
        texts = odd[kinds == Kind.TEXT]
        if texts.size:
            parsed = np.array([_iso_date(text) for text in self.texts], dtype="datetime64[D]")
            dates[texts] = parsed[self.values[texts].astype(np.int64)]
        taken = texts[~np.isnat(dates[texts])]
        self.each_with(
            taken,
            (
                f"{stated} stands where a date belongs; {day} is taken"
                for stated, day in zip(
                    self._all_stated(taken), dates[taken].astype(str).tolist(), strict=True
                )
            ),
            expected,
            "Turn the text into a date.",
            mild=True,
        )
        numbers = odd[kinds == Kind.NUMBER]
        self.each_with(
            numbers,
            (f"the number {stated} stands where a date belongs" for stated in self._all_stated(numbers)),
            expected,
            "Format the cell as a date, or write the date.",
        )
        rest = odd[np.isnat(dates[odd]) & (kinds != Kind.NUMBER)]
        self.each_with(
            rest,
            (f"{stated} stands where a date belongs" for stated in self._all_stated(rest)),
            expected,
            "Write it as a date of the spreadsheet, or as yyyy-mm-dd.",
        )
        return dates

    def _take_moments(self, entries: IntArray, dates: NDArray[np.datetime64], expected: str) -> None:
        """Take the day of each date with a time of day; a time that is not midnight is a mild fault."""
        if not entries.size:
            return
        days, rest = np.divmod(self.values[entries], 86_400.0)
        dates[entries] = _EPOCH + days.astype(np.int64)
        late = entries[rest != 0.0]
        self.each_with(
            late,
            (f"{stated} holds a time of day, which is left out" for stated in self._all_stated(late)),
            expected,
            "Write the date alone.",
            mild=True,
        )

    def names(self, expected: str) -> tuple[list[str], IntArray]:
        """The cells as names.

        Returns
        -------
        names : list of str
            In order of first appearance.
        number : ndarray of int, shape (n,)
            Each cell's name, as an index into `names`; -1 where there is none.
        """
        count = self.rows.size
        number = np.full(count, -1, dtype=np.int64)
        index: dict[str, int] = {}
        is_text = self.kinds == Kind.TEXT
        blank = self.kinds == Kind.BLANK
        spelt = int(np.count_nonzero(~is_text & ~blank))
        self._odd(np.flatnonzero(blank), expected, self._required(True))
        if not spelt:
            code = self.values[is_text].astype(np.int64)
            first = np.full(len(self.texts), count, dtype=np.int64)
            # Of several writes to one place the last stands: backwards, that is the first appearance.
            first[code[::-1]] = np.arange(code.size - 1, -1, -1)
            table = np.full(len(self.texts), -1, dtype=np.int64)
            for place in np.argsort(first, kind="stable").tolist():
                if first[place] < count:
                    table[place] = index.setdefault(self.texts[place], len(index))
            number[is_text] = table[code]
            return list(index), number
        for entry in np.flatnonzero(~blank).tolist():
            text = self.sheet.data.text(int(self.rows[entry]), self.column or 0)
            number[entry] = index.setdefault(text, len(index))
        first_spelt = int(np.flatnonzero(~is_text & ~blank)[0])
        letters = column_letters(self.column or 0)
        stated = self.stated(first_spelt)
        self.mild(
            first_spelt,
            (
                f"{stated} is no text; it is taken as a name"
                if spelt == 1
                else f"{spelt:,} cells of column {letters} hold no text, the first {stated}; "
                "they are taken as names"
            ),
            expected,
            "Nothing needs to be done if that is meant.",
        )
        return list(index), number

    def texts_of(self, expected: str, *, required: bool | BoolArray = True) -> list[str]:
        """The cells as texts, each as it stands; "" where there is none."""
        blank = self.kinds == Kind.BLANK
        self._odd(np.flatnonzero(blank), expected, self._required(required))
        return [
            "" if is_blank else self.sheet.data.text(row, self.column or 0)
            for row, is_blank in zip(self.rows.tolist(), blank.tolist(), strict=True)
        ]

    def choices(
        self,
        choices: type[Choice],
        expected: str,
        *,
        required: bool | BoolArray = True,
    ) -> list[Choice | None]:
        """The cells as one of a few words; None where there is none."""
        result: list[Choice | None] = []
        words = ", ".join(choice.value for choice in choices)
        known: dict[str, Choice | None] = {"": None}
        for entry, text in enumerate(self.texts_of(f"{expected}: one of {words}", required=required)):
            if text not in known:
                known[text] = match_choice(text, choices)
            choice = known[text]
            if text and choice is None:
                self.fault(
                    entry,
                    f"{self.stated(entry)} is no known {expected.removeprefix('a ').removeprefix('an ')}",
                    f"one of {words}",
                    _suggestion(text, [choice.value for choice in choices]),
                )
            result.append(choice)
        return result


def _suggestion(text: str, words: Sequence[str]) -> str:
    import difflib

    close = difflib.get_close_matches(text.casefold(), [word.casefold() for word in words], 1, 0.6)
    if close:
        return f'Did you mean "{next(word for word in words if word.casefold() == close[0])}"?'
    return "Write one of these words."
