"""What a curve says term by term, whatever it is made from."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.compounding import Compounding, from_continuous
from desk.window.curve.headings import rates_columns
from desk.window.curve.page import TablePage
from desk.window.curve.shown import Shown
from desk.window.curve.words import stated_as
from desk.window.parts.theme import ThemeSwitch

__all__ = ["RatesPage", "terms_until"]

_FIRST = np.array([0.25, 0.5, 0.75])
_MOST_YEARS = 150


def terms_until(until: float) -> FloatArray:
    """The quarters of the first year and every year up to `until` [years]."""
    return np.concatenate((_FIRST, np.arange(1.0, min(np.floor(until), _MOST_YEARS) + 0.5)))


class RatesPage(TablePage):
    """Zero and forward rates and discount factors by year, beside those of another curve."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            rates_columns(Compounding.ANNUAL, is_index=False, compared=""),
            theme_switch,
            name="Rates by term",
            description="What the curve says at each term, to be read and copied.",
        )

    def show_curve(
        self,
        shown: Shown | None,
        *,
        until: float,
        compounding: Compounding,
        other: Shown | None = None,
        other_name: str = "",
    ) -> None:
        """Show a curve up to `until` [years], beside another; None for none."""
        is_index = shown is not None and shown.is_index
        compared = other_name if other is not None and shown is not None else ""
        columns = rates_columns(compounding, is_index=is_index, compared=compared)
        if columns != self.table.table_model.columns:
            self.table.set_columns(columns)
        if shown is None:
            self.table.set_rows({column.key: [] for column in columns})
            self.say("")
            return
        term = terms_until(until)
        zero = shown.zero(term, compounding)
        data: dict[str, Any] = {
            "term": term,
            "zero": zero,
            "continuous": shown.curve.zero(term),
            "forward": from_continuous(shown.curve.forward(np.append(0.0, term[:-1]), term), compounding),
            "discount": shown.factor(term),
            "beyond": term > shown.last_quoted + 1e-9,
        }
        if compared and other is not None:
            data["other"] = other.zero(term, compounding)
            data["difference"] = 1e4 * (zero - data["other"])
        self.table.set_rows(data)
        self.say(f"Rates are {stated_as(compounding)}.")
