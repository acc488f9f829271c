"""What a column of a table holds, and its text on screen, for a spreadsheet and for editing."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from desk.window.parts import numbers

__all__ = ["Column", "Kind", "Mark"]

Kind = Literal["text", "money", "rate", "years", "number", "integer", "date", "flag"]

_DIGITS = {"money": 0, "rate": 2, "years": 2, "number": 2, "integer": 0}
_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "＝", "＋", "－", "＠")


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    key : str
        Names the column in the data.
    heading : str
    unit : str
        Shown under the heading, never in a cell; a rate's is ``%`` unless said otherwise.
    kind : str
        ``text``, ``money``, ``rate`` (a fraction, shown in percent), ``years``, ``number``, ``integer``,
        ``date`` or ``flag``.
    digits : int or None
        Decimals; None for what is usual for the kind.
    tooltip : str
        What the column holds, in one sentence.
    editable : bool
    is_change : bool
        Figures carry a plus or a minus.
    holds_figures : bool
        A text holds a figure, and stands as one: on the right.
    """

    key: str
    heading: str
    unit: str = ""
    kind: Kind = "text"
    digits: int | None = None
    tooltip: str = ""
    editable: bool = False
    is_change: bool = False
    holds_figures: bool = False

    @property
    def is_numeric(self) -> bool:
        """Whether it holds figures."""
        return self.kind in _DIGITS

    @property
    def stands_right(self) -> bool:
        """Whether heading and cells stand on the right."""
        return self.is_numeric or self.holds_figures

    @property
    def shown_unit(self) -> str:
        """The unit in the heading."""
        return self.unit or ("%" if self.kind == "rate" else "")

    def shown(self, value: Any) -> str:
        """A cell's text on screen."""
        if self.is_numeric:
            places = _DIGITS[self.kind] if self.digits is None else self.digits
            if value is not None and self.kind == "rate":
                value = 100 * value
            return numbers.number(value, places, always_sign=self.is_change)
        if self.kind == "date":
            return numbers.day(value)
        if self.kind == "flag":
            return numbers.NOT_AVAILABLE if value is None else "yes" if value else "no"
        return "" if value is None else str(value)

    def copied(self, values: NDArray[Any], *, exactly: bool = False) -> list[str]:
        """The texts of cells for a spreadsheet: figures arrive there as numbers, dates as dates.

        They are as exact as on screen, or have every figure the number has. A rate keeps its percent sign, so
        that it arrives as the fraction that it is.
        """
        if self.is_numeric:
            return self._copied_figures(values.astype(np.float64), exactly)
        if self.kind == "date":
            return ["" if text == "NaT" else text for text in values.astype("datetime64[D]").astype(str)]
        texts = [self.shown(value) for value in values]
        if self.kind == "flag":
            return ["" if text == numbers.NOT_AVAILABLE else text for text in texts]
        # OWASP, CSV injection (CWE-1236): a spreadsheet would take such a text for a formula.
        return [f"'{text}" if text.startswith(_FORMULA_STARTS) else text for text in texts]

    def _copied_figures(self, values: NDArray[np.float64], exactly: bool) -> list[str]:
        locale = numbers.shown_locale()
        end = "%" if self.kind == "rate" else ""
        present = np.isfinite(values).tolist()
        if exactly:
            percent = self.kind == "rate"
            texts = [numbers.exact(value, locale=locale, percent=percent) for value in values.tolist()]
        else:
            places = _DIGITS[self.kind] if self.digits is None else self.digits
            shown = np.round(100 * values if self.kind == "rate" else values, places)
            # Adding nothing takes the minus from a zero.
            form = f"%.{places}f"
            texts = [form % value for value in (shown + 0.0).tolist()]
            mark = locale.decimalPoint()
            if mark != ".":
                texts = [text.replace(".", mark) for text in texts]
        return [text + end if known else "" for text, known in zip(texts, present, strict=True)]

    def edited(self, value: Any) -> str:
        """A cell's text for editing."""
        if self.is_numeric:
            return numbers.exact(value, percent=self.kind == "rate")
        if self.kind == "date":
            text = "" if value is None else str(value)[:10]
            return "" if text == "NaT" else text
        return "" if value is None else str(value)

    def parsed(self, text: str) -> Any:
        """The value that `text` writes in this column; None where it writes none."""
        text = text.strip()
        if self.kind == "rate":
            return numbers.parse_rate(text)
        if self.is_numeric:
            value = numbers.parse_number(text)
            if self.kind == "integer" and value is not None:
                return int(value) if value == int(value) else None
            return value
        if self.kind == "date":
            return numbers.parse_day(text)
        if self.kind == "flag":
            return {"yes": True, "true": True, "1": True, "no": False, "false": False, "0": False}.get(
                text.casefold()
            )
        return text[1:] if text[:1] == "'" and text[1:].startswith(_FORMULA_STARTS) else text


@dataclass(frozen=True)
class Mark:
    """What is wrong with a cell: grave or mild, and in words."""

    text: str
    grave: bool = True
