"""The settings of a run: how rates move, under which measure, and how much is drawn, and how."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from PySide6.QtWidgets import QLabel, QPushButton

from desk.book import Book, ModelName, RatesModel, Run, Sampling
from desk.book.run import MOST_PATHS, MOST_REPLICATES
from desk.scenarios.suggestions import suggested_model
from desk.window.parts.fields import Choice, ChoiceField, Field, Form, IntegerField
from desk.window.parts.models import MODEL_TITLES
from desk.window.scenarios.model_fields import AssetFields, item_fields, items_shown, set_limits
from desk.window.scenarios.model_words import BRIDGES, MEASURES, MODELS, SAMPLINGS, set_sentence

__all__ = ["RunForm"]

_OF_INFLATION = "inflation_"
_VOLATILITIES = ("volatility", "root_volatility", "relative_volatility")
_FIRST_INFLATION_SPEED = 0.3
"""A speed to begin with where inflation begins to be drawn [1/year]; not calibrated."""


def _item(key: str) -> str:
    """The field of the model that a field of the form is for."""
    return "volatility" if key in _VOLATILITIES else key


class RunForm:
    """Fills a form with the settings of a run, and hands on what is changed in them.

    Attributes
    ----------
    model, measure, sampling, bridge, matching : ChoiceField
    items : dict of str to NumberField
        By field of `RatesModel`; ``root_volatility`` and ``relative_volatility`` stand for the volatility of
        models in which it means that.
    paths, horizon, steps, seed, replicates : IntegerField
    assets : AssetFields
    run_button, cancel_button, export_button : QPushButton
    state, memory, of_set : QLabel
        What the run under way is at, what it takes, and what the set of scenarios holds.
    """

    def __init__(
        self,
        form: Form,
        *,
        book: Callable[[], Book | None],
        change: Callable[[str, Book], None],
        run: Callable[[], object],
        cancel: Callable[[], object],
        export: Callable[[], object],
    ) -> None:
        # Asked for at every edit: two edits may come before what is shown follows.
        self._book = book
        self._change = change
        self.run_button: QPushButton = form.add_button("Run the scenarios", run, first=True)
        self.run_button.setToolTip("Ctrl+R")
        self.cancel_button: QPushButton = form.add_button("Cancel the run", cancel)
        self.state: QLabel = form.add_note("")
        self.memory: QLabel = form.add_note("")
        self.export_button: QPushButton = form.add_button("Export the paths…", export)
        self.export_button.setToolTip("Every path by year, as a workbook or as compressed CSV.")
        form.add_heading("How rates move")
        self.model = ChoiceField("Model", MODELS)
        form.add(self.model)
        self.of_set: QLabel = form.add_note("")
        self.model.committed.connect(self._on_model)
        self.measure = ChoiceField("Measure", MEASURES)
        form.add(self.measure)
        self.measure.committed.connect(lambda value: self._on_run("measure", value, "measure"))
        self.items = item_fields()
        self._inflation_heading: QLabel | None = None
        for key, field in self.items.items():
            if key.startswith(_OF_INFLATION) and self._inflation_heading is None:
                self._inflation_heading = form.add_heading("Inflation beside the rates")
            form.add(field)
            field.committed.connect(lambda value, key=key: self._on_item(key, value))
        self.assets = AssetFields(form, book=book, change=change)
        form.add_heading("How much is drawn, and how")
        self._make_run_fields(form)

    def _make_run_fields(self, form: Form) -> None:
        self.paths = IntegerField(
            "Paths",
            low=1,
            high=MOST_PATHS,
            sensible=(1_000, 1_000_000),
            hint="Four times as many halve every standard error.",
        )
        self.horizon = IntegerField(
            "Horizon", unit="years", low=1, high=200, sensible=(10, 100), hint="How long every path is."
        )
        self.steps = IntegerField(
            "Steps a year",
            low=1,
            high=366,
            sensible=(1, 12),
            hint="Gaussian models are exact in steps of any length.",
        )
        self.seed = IntegerField(
            "Seed", low=0, high=2**53, hint="The same seed draws the same paths, to the last bit."
        )
        self.sampling = ChoiceField("Sampling", SAMPLINGS)
        self.bridge = ChoiceField("Order of the directions", BRIDGES)
        self.matching = ChoiceField(
            "Moments",
            (
                Choice(False, "As drawn", "The normal numbers are left as they are."),
                Choice(
                    True,
                    "Matched",
                    "The normal numbers of every step are moved and stretched to mean 0 and variance 1.",
                ),
            ),
        )
        self.replicates = IntegerField(
            "Replicates",
            low=2,
            high=MOST_REPLICATES,
            sensible=(8, 64),
            hint="Independent repetitions that share the paths: their spread tells the errors.",
        )
        fields: tuple[tuple[Field, str, str], ...] = (
            (self.paths, "paths", "number of paths"),
            (self.horizon, "horizon_years", "horizon"),
            (self.steps, "steps_per_year", "steps a year"),
            (self.seed, "seed", "seed"),
            (self.sampling, "sampling", "sampling"),
            (self.bridge, "bridge", "order of the directions"),
            (self.matching, "matching", "matching of moments"),
            (self.replicates, "replicates", "number of replicates"),
        )
        for field, name, what in fields:
            form.add(field)
            whole = isinstance(field, IntegerField)
            field.committed.connect(
                lambda value, name=name, what=what, whole=whole: self._on_run(
                    name, int(value) if whole else value, what
                )
            )

    # Showing

    def show_book(self, book: Book) -> None:
        """Show the settings of a book."""
        model, run = book.rates_model, book.run
        name = model.name if model is not None else ModelName.HULL_WHITE
        outside = name is ModelName.OUTSIDE
        self.model.set_value(name)
        self.of_set.setText(set_sentence(book) if outside else "")
        self.of_set.setVisible(outside)
        set_limits(self.items, name)
        shown = items_shown(book)
        for key, field in self.items.items():
            field.setVisible(key in shown)
            field.set_value(None if model is None else getattr(model, _item(key)))
        if self._inflation_heading is not None:
            self._inflation_heading.setVisible(any(key.startswith(_OF_INFLATION) for key in shown))
        self.assets.show_book(book)
        self.measure.set_value(run.measure)
        # The paths of a set are what they are: only what is drawn beside them has a measure and a seed.
        beside = book.risky_assets is not None and bool(book.risky_assets.names)
        self.measure.setVisible(not outside or beside)
        self.seed.setVisible(not outside or beside)
        self._show_run(run, outside=outside)

    def _show_run(self, run: Run, *, outside: bool) -> None:
        self.paths.set_value(run.paths)
        self.horizon.set_value(run.horizon_years)
        self.steps.set_value(run.steps_per_year)
        self.seed.set_value(run.seed)
        self.sampling.set_value(run.sampling)
        self.bridge.set_value(run.bridge)
        self.matching.set_value(run.matching)
        self.replicates.set_value(run.replicates)
        self.steps.setVisible(not outside)
        self.sampling.setVisible(not outside)
        self.matching.setVisible(not outside)
        self.bridge.setVisible(not outside and run.sampling is Sampling.SOBOL)
        self.replicates.setVisible(not outside and run.is_reduced)

    # Editing

    def _on_model(self, name: ModelName) -> None:
        book = self._book()
        if book is not None:
            try:
                model = suggested_model(name, book.basis, book.rates_model)
            except ValueError as error:
                # Only a basis that gives no curve has no rate to begin with.
                self.model.set_problem(f"{error}.")
                return
            self._change(f"Model {MODEL_TITLES[name]}", replace(book, rates_model=model))

    def _on_item(self, key: str, value: float | None) -> None:
        book = self._book()
        if book is None or book.rates_model is None:
            return
        item = _item(key)
        changes: dict[str, Any] = {item: value}
        begins = item == "inflation_volatility" and value is not None
        if begins and book.rates_model.inflation_mean_reversion is None:
            changes["inflation_mean_reversion"] = _FIRST_INFLATION_SPEED
        model: RatesModel = replace(book.rates_model, **changes)
        self._change(f"Change of the {item.replace('_', ' ')}", replace(book, rates_model=model))

    def _on_run(self, name: str, value: Any, what: str) -> None:
        book = self._book()
        if book is not None:
            changes: dict[str, Any] = {name: value}
            self._change(f"Change of the {what}", replace(book, run=replace(book.run, **changes)))
