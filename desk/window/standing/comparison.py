"""Two bases side by side: each measure on the first, on the second, and the first less the second."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from desk.valuation.records import Measures, Standing
from desk.window.parts import numbers
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import GAP, ThemeSwitch, keep_look, soft_font

__all__ = ["ComparedMeasure", "ComparisonPage", "compared_measures"]


@dataclass(frozen=True)
class ComparedMeasure:
    """One measure on both bases.

    Attributes
    ----------
    group : str
        Assets, liabilities, or what the two come to.
    name : str
    unit : str
        Of `first`, `second` and their difference, its scale included.
    first, second : float
        NaN where there is none.
    """

    group: str
    name: str
    unit: str
    first: float
    second: float

    @property
    def difference(self) -> float:
        """The first less the second."""
        return self.first - self.second


_SIDE_ROWS = (
    ("present_value", "Present value", "money"),
    ("equivalent_rate", "Equivalent rate", "rate"),
    ("effective_duration", "Effective duration", "years"),
    ("macaulay_duration", "Macaulay duration", "years"),
    ("modified_duration", "Modified duration", "years"),
    ("convexity", "Convexity", "years²"),
    ("dispersion", "Dispersion", "years²"),
    ("dv01", "DV01", "money"),
)
_GAP_ROWS = (
    ("surplus", "Surplus", "money"),
    ("funding_ratio", "Funding ratio", "share"),
    ("duration_gap", "Duration gap", "years"),
    ("dv01_gap", "DV01 gap", "money"),
)
_INFLATION_ROWS = (
    ("Assets", "assets_duration", "Inflation duration", "years"),
    ("Assets", "dv01_assets", "Inflation DV01", "money"),
    ("Liabilities", "liabilities_duration", "Inflation duration", "years"),
    ("Liabilities", "dv01_liabilities", "Inflation DV01", "money"),
    ("Both sides", "real_duration_gap", "Real duration gap", "years"),
    ("Both sides", "dv01_gap", "Inflation DV01 gap", "money"),
)


def compared_measures(first: Standing, second: Standing) -> tuple[ComparedMeasure, ...]:
    """Every measure of two standings of one book, by group; those of inflation where either has them."""
    made = list(_measures(first, second))
    groups = ("Both sides", "Assets", "Liabilities")
    return tuple(row for group in groups for row in made if row.group == group)


def _measures(first: Standing, second: Standing) -> Iterator[ComparedMeasure]:
    currency = first.currency
    for key, name, kind in _GAP_ROWS:
        yield _row("Both sides", name, kind, currency, getattr(first, key), getattr(second, key))
    sides: tuple[tuple[str, Measures, Measures], ...] = (
        ("Assets", first.assets, second.assets),
        ("Liabilities", first.liabilities, second.liabilities),
    )
    for group, one, other in sides:
        for key, name, kind in _SIDE_ROWS:
            yield _row(group, name, kind, currency, getattr(one, key), getattr(other, key))
    if first.inflation is None and second.inflation is None:
        return
    for group, key, name, kind in _INFLATION_ROWS:
        values = [
            np.nan if standing.inflation is None else float(getattr(standing.inflation, key))
            for standing in (first, second)
        ]
        yield _row(group, name, kind, currency, values[0], values[1])


def _row(group: str, name: str, kind: str, currency: str, one: float, other: float) -> ComparedMeasure:
    if kind in ("rate", "share"):
        unit = "% a year" if kind == "rate" else "%"
        return ComparedMeasure(group, name, unit, 100.0 * one, 100.0 * other)
    if kind != "money":
        return ComparedMeasure(group, name, kind, one, other)
    # One scale for both, so that they can be subtracted by eye, with four figures at least.
    scale = numbers.scale_for([one / 10.0, other / 10.0])
    unit = numbers.unit_with_scale(currency, scale)
    return ComparedMeasure(group, name, unit, one / scale.factor, other / scale.factor)


_COLUMNS = (
    Column("group", "Side"),
    Column("name", "Measure"),
    Column("first", "First basis", "in the unit", "number", digits=3),
    Column("second", "Second basis", "in the unit", "number", digits=3),
    Column(
        "difference",
        "Difference",
        "first less second",
        "number",
        digits=3,
        tooltip="What the first basis gives less what the second gives.",
        is_change=True,
    ),
    Column("unit", "Unit"),
)


class ComparisonPage(QWidget):
    """The table of both bases, and a sentence on what they are.

    Attributes
    ----------
    table : Table
    words : QLabel
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.table = Table(
            _COLUMNS,
            theme_switch,
            name="The two bases side by side",
            description="Each measure on the first basis, on the second, and the difference.",
            empty_text="The second basis has no figures yet.",
        )
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setTextFormat(Qt.TextFormat.PlainText)
        self.words.setContentsMargins(GAP, GAP, GAP, GAP)
        self.words.setFont(soft_font(self.font()))
        keep_look(self.words, "soft")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.words)
        column.addWidget(self.table, 1)

    def show_standings(self, first: Standing, second: Standing | None, words: str) -> None:
        """Show two standings of one book; `words` say what each basis is."""
        self.words.setText(words)
        rows = () if second is None else compared_measures(first, second)
        self.table.set_rows(
            {
                column.key: (
                    np.array([getattr(row, column.key) for row in rows], dtype=np.float64)
                    if column.is_numeric
                    else [getattr(row, column.key) for row in rows]
                )
                for column in _COLUMNS
            }
        )
        self.table.fit_columns()
