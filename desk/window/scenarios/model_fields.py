"""The fields of a model's parameters, of inflation beside it, and of risky assets."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QWidget

from desk.book import Book, Measure, ModelName
from desk.scenarios.suggestions import MODEL_ITEMS, VolatilityKind, volatility_kind
from desk.window.parts.fields import Choice, ChoiceField, Form, NumberField

__all__ = ["AssetFields", "item_fields", "items_shown", "volatility_key"]

_A_YEAR = "a year"
_LEAST_SQUARE_ROOT_REVERSION = 1e-6
_VOLATILITY_KEYS = {
    VolatilityKind.ABSOLUTE: "volatility",
    VolatilityKind.ROOT: "root_volatility",
    VolatilityKind.RELATIVE: "relative_volatility",
}
_PRICE_HINT = "Extra drift of the {what} for each unit of its volatility, in the real world."


def volatility_key(name: ModelName) -> str:
    """The field in which the volatility of a model stands; empty for none."""
    return _VOLATILITY_KEYS.get(volatility_kind(name), "")


def _rate(label: str, hint: str, low: float, high: float, sensible: tuple[float, float]) -> NumberField:
    return NumberField(label, unit="% a year", percent=True, low=low, high=high, sensible=sensible, hint=hint)


def _speed(label: str, hint: str, sensible: tuple[float, float]) -> NumberField:
    return NumberField(label, unit=_A_YEAR, low=0.0, high=100.0, sensible=sensible, hint=hint)


def _price(label: str, what: str) -> NumberField:
    return NumberField(label, low=-5.0, high=5.0, sensible=(-0.5, 0.5), hint=_PRICE_HINT.format(what=what))


def item_fields() -> dict[str, NumberField]:
    """A field for each parameter; that of the volatility stands three times, by what it means."""
    return {
        "mean_reversion": _speed(
            "Mean reversion",
            "The part of the distance to its level that a rate makes up in a year.",
            (0.01, 1.0),
        ),
        "volatility": _rate(
            "Volatility", "Standard deviation of a year's move of the short rate.", 0.0, 0.5, (0.002, 0.02)
        ),
        "root_volatility": NumberField(
            "Volatility",
            unit="on √rate",
            low=0.0,
            high=5.0,
            sensible=(0.02, 0.2),
            hint="Multiplied by the root of the rate: a year's standard deviation.",
        ),
        "relative_volatility": NumberField(
            "Volatility",
            unit="% of the rate",
            percent=True,
            low=0.0,
            high=5.0,
            sensible=(0.05, 0.5),
            hint="Standard deviation of a year's move, as a part of the rate.",
        ),
        "long_run_rate": _rate(
            "Long-run rate",
            "The level the rate is pulled to, continuously compounded.",
            -0.2,
            1.0,
            (0.0, 0.08),
        ),
        "starting_rate": _rate(
            "Starting rate", "The short rate today, continuously compounded.", -0.2, 1.0, (-0.01, 0.08)
        ),
        "second_mean_reversion": _speed(
            "Second mean reversion", "Of the second factor, usually the faster one.", (0.1, 2.0)
        ),
        "second_volatility": _rate("Second volatility", "Of the second factor.", 0.0, 0.5, (0.002, 0.02)),
        "factor_correlation": NumberField(
            "Factor correlation",
            low=-1.0,
            high=1.0,
            sensible=(-0.95, 0.5),
            hint="Between the moves of the two factors.",
        ),
        "risk_price": _price("Risk price", "first factor"),
        "second_risk_price": _price("Second risk price", "second factor"),
        "inflation_volatility": NumberField(
            "Inflation factor volatility",
            unit="% a year",
            percent=True,
            low=0.0,
            high=0.5,
            sensible=(0.002, 0.03),
            optional=True,
            hint="Standard deviation of a year's move of inflation; empty: inflation is not drawn.",
        ),
        "inflation_mean_reversion": _speed(
            "Inflation mean reversion",
            "The part of its distance that inflation makes up in a year.",
            (0.05, 2.0),
        ),
        "inflation_rate_correlation": NumberField(
            "Inflation rate correlation",
            low=-1.0,
            high=1.0,
            sensible=(-0.5, 0.9),
            optional=True,
            hint="Between inflation and the first rate factor; empty counts as 0.",
        ),
        "inflation_risk_price": _price("Inflation risk price", "inflation factor"),
    }


def items_shown(book: Book) -> set[str]:
    """The fields that count for the model of a book, by key."""
    model = book.rates_model
    if model is None:
        return set()
    real_world = book.run.measure is Measure.REAL_WORLD
    shown = {item for item in MODEL_ITEMS[model.name] if item != "volatility"}
    shown.add(volatility_key(model.name))
    outside = model.name is ModelName.OUTSIDE
    if real_world and not outside:
        shown.add("risk_price")
        if model.name is ModelName.GAUSSIAN_2:
            shown.add("second_risk_price")
    if book.basis.inflation is not None and not outside:
        shown.add("inflation_volatility")
        if model.inflation_volatility is not None:
            shown |= {"inflation_mean_reversion", "inflation_rate_correlation"}
            if real_world:
                shown.add("inflation_risk_price")
    return shown - {""}


def set_limits(items: dict[str, NumberField], name: ModelName) -> None:
    """Take only what a model can be drawn with."""
    is_root = volatility_kind(name) is VolatilityKind.ROOT
    for key in ("long_run_rate", "starting_rate"):
        items[key].low = 0.0 if is_root else -0.2
    items["mean_reversion"].low = _LEAST_SQUARE_ROOT_REVERSION if is_root else 0.0


class AssetFields:
    """Volatility and premium of every risky asset; made anew where the assets are others.

    Parameters
    ----------
    form : Form
        Of the station.
    book, change : callable
        See `desk.window.scenarios.form.RunForm`.
    """

    def __init__(
        self, form: Form, *, book: Callable[[], Book | None], change: Callable[[str, Book], None]
    ) -> None:
        self._book, self._change = book, change
        self.heading = form.add_heading("Risky assets")
        self.note = form.add_note(
            "Held with dividends reinvested. Their values are no part of assets and surplus. Their "
            "correlations are in the sheet Risky assets."
        )
        self._inner = Form()
        layout = self._inner.layout()
        if layout is not None:
            layout.setContentsMargins(0, 0, 0, 0)
        form.add_widget(self._inner)
        self.mend = ChoiceField(
            "Correlations that contradict one another",
            (
                Choice(False, "Refuse", "The run says which they are, and how far the nearest ones are."),
                Choice(True, "Mend", "The nearest correlation matrix is taken; what changes is told."),
            ),
        )
        form.add(self.mend)
        self.mend.committed.connect(self._on_mend)
        self.fields: dict[tuple[str, int], NumberField] = {}
        self._names: tuple[str, ...] = ()

    def show_book(self, book: Book) -> None:
        """Show the assets of a book."""
        assets = book.risky_assets
        names = () if assets is None else assets.names
        if names != self._names:
            self._make(names)
        there = bool(names)
        for part in (self.heading, self.note, self._inner, self.mend):
            part.setVisible(there)
        if assets is None:
            return
        real_world = book.run.measure is Measure.REAL_WORLD
        for (column, place), field in self.fields.items():
            value = float(getattr(assets, column)[place])
            field.set_value(value if np.isfinite(value) else None)
            field.setVisible(column == "volatility" or real_world)
        self.mend.set_value(bool(book.rates_model is not None and book.rates_model.mend_correlation))

    def _make(self, names: tuple[str, ...]) -> None:
        for field in self.fields.values():
            field.hide()
            field.setParent(None)
            field.deleteLater()
        self.fields, self._names = {}, names
        before = self.mend.editor.previousInFocusChain() or self.mend.editor
        while before.focusPolicy() == Qt.FocusPolicy.NoFocus and before is not self.mend.editor:
            before = before.previousInFocusChain() or self.mend.editor
        for place, name in enumerate(names):
            made = {
                "volatility": NumberField(
                    f"Volatility of {name}",
                    unit="% a year",
                    percent=True,
                    low=0.0,
                    high=5.0,
                    sensible=(0.05, 0.4),
                    hint="Standard deviation of a year's return.",
                ),
                "premium": NumberField(
                    f"Premium of {name}",
                    unit="% a year",
                    percent=True,
                    low=-1.0,
                    high=1.0,
                    sensible=(0.0, 0.08),
                    hint="What it earns beyond the short rate, in the real world.",
                ),
            }
            for column, field in made.items():
                self._inner.add(field)
                self.fields[column, place] = field
                # Made later than what stands below, the keyboard would come to them last.
                QWidget.setTabOrder(before, field.editor)
                before = field.editor
                field.committed.connect(
                    lambda value, column=column, place=place: self._on_value(column, place, value)
                )

    def _on_value(self, column: str, place: int, value: float) -> None:
        book = self._book()
        if book is None or book.risky_assets is None or place >= len(book.risky_assets.names):
            return
        values = np.array(getattr(book.risky_assets, column))
        values[place] = value
        changes: dict[str, Any] = {column: values}
        assets = replace(book.risky_assets, **changes)
        name = book.risky_assets.names[place]
        self._change(f"Change of the {column} of {name}", replace(book, risky_assets=assets))

    def _on_mend(self, wanted: bool) -> None:
        book = self._book()
        if book is not None and book.rates_model is not None:
            model = replace(book.rates_model, mend_correlation=wanted)
            text = "Mending of correlations" if wanted else "No mending of correlations"
            self._change(text, replace(book, rates_model=model))
