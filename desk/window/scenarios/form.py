"""The settings of a run: how rates move, under which measure, and how much is drawn."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from PySide6.QtWidgets import QLabel, QPushButton

from desk.book import Book, Measure, ModelName, RatesModel
from desk.book.run import MOST_PATHS
from desk.scenarios.suggestions import MODEL_ITEMS, MODEL_TRAITS, suggested_model
from desk.window.parts.fields import Choice, ChoiceField, Field, Form, IntegerField, NumberField
from desk.window.parts.models import MODEL_TITLES

__all__ = ["RunForm"]

_FITTED = "Reprices the book's curve exactly."
_OWN = "Makes its own curve, which is not the book's: present values are on that one."
_WHAT = {
    ModelName.VASICEK: f"One rate that is pulled back to a long-run level; it may turn negative. {_OWN}",
    ModelName.HO_LEE: f"Rates wander without being pulled back. {_FITTED}",
    ModelName.HULL_WHITE: f"One factor that is pulled back; rates may turn negative. {_FITTED}",
    ModelName.GAUSSIAN_2: f"Two factors, so that short and long rates need not move together. {_FITTED}",
    ModelName.CIR: f"A rate that never turns negative and moves less when it is low. {_OWN}",
    ModelName.CIR_SHIFTED: f"A square-root factor and a shift that varies with time. {_FITTED}",
    ModelName.BLACK_KARASINSKI: "A rate that stays above 0 and moves in proportion to itself. Reprices the "
    "book's curve exactly; forward rates must be above 0.",
    ModelName.OUTSIDE: "The paths in the sheet Scenario set, taken as they are. They need not reprice the "
    "book's curve: see the check.",
}
_MEASURES = (
    Choice(Measure.PRICING, "Pricing", "For values: what flows are worth. It is no forecast of rates."),
    Choice(
        Measure.REAL_WORLD,
        "Real world",
        "For forecasts: what may happen, with the price of risk. Its averages are no prices.",
    ),
)
_LEAST_SQUARE_ROOT_REVERSION = 1e-6


def _item_fields() -> dict[str, NumberField]:
    """A field for each parameter; that of the volatility stands twice, by what it means."""
    speed = "a year"
    return {
        "mean_reversion": NumberField(
            "Mean reversion",
            unit=speed,
            low=0.0,
            high=100.0,
            sensible=(0.01, 1.0),
            hint="The part of the distance to its level that a rate makes up in a year.",
        ),
        "volatility": NumberField(
            "Volatility",
            unit="% a year",
            percent=True,
            low=0.0,
            high=0.5,
            sensible=(0.002, 0.02),
            hint="Standard deviation of a year's move of the short rate.",
        ),
        "root_volatility": NumberField(
            "Volatility",
            unit="on √rate",
            low=0.0,
            high=5.0,
            sensible=(0.02, 0.2),
            hint="Multiplied by the root of the rate: a year's standard deviation.",
        ),
        "long_run_rate": NumberField(
            "Long-run rate",
            unit="% a year",
            percent=True,
            low=-0.2,
            high=1.0,
            sensible=(0.0, 0.08),
            hint="The level the rate is pulled to, continuously compounded.",
        ),
        "starting_rate": NumberField(
            "Starting rate",
            unit="% a year",
            percent=True,
            low=-0.2,
            high=1.0,
            sensible=(-0.01, 0.08),
            hint="The short rate today, continuously compounded.",
        ),
        "second_mean_reversion": NumberField(
            "Second mean reversion",
            unit=speed,
            low=0.0,
            high=100.0,
            sensible=(0.1, 2.0),
            hint="Of the second factor, usually the faster one.",
        ),
        "second_volatility": NumberField(
            "Second volatility",
            unit="% a year",
            percent=True,
            low=0.0,
            high=0.5,
            sensible=(0.002, 0.02),
            hint="Of the second factor.",
        ),
        "factor_correlation": NumberField(
            "Factor correlation",
            low=-1.0,
            high=1.0,
            sensible=(-0.95, 0.5),
            hint="Between the moves of the two factors.",
        ),
    }


class RunForm:
    """Fills a form with the settings of a run, and hands on what is changed in them.

    Attributes
    ----------
    model, measure : ChoiceField
    items : dict of str to NumberField
        By field of `RatesModel`; ``root_volatility`` stands for the volatility of a square-root model.
    risk_price : NumberField
    paths, horizon, steps, seed : IntegerField
    run_button, cancel_button : QPushButton
    state : QLabel
        What the run under way is at.
    """

    def __init__(
        self,
        form: Form,
        *,
        book: Callable[[], Book | None],
        change: Callable[[str, Book], None],
        run: Callable[[], object],
        cancel: Callable[[], object],
    ) -> None:
        # Asked for at every edit: two edits may come before what is shown follows.
        self._book = book
        self._change = change
        self.run_button: QPushButton = form.add_button("Run the scenarios", run, first=True)
        self.run_button.setToolTip("Ctrl+R")
        self.cancel_button: QPushButton = form.add_button("Cancel the run", cancel)
        self.state: QLabel = form.add_note("")
        form.add_heading("How rates move")
        self.model = ChoiceField(
            "Model", [Choice(name, title, _WHAT[name]) for name, title in MODEL_TITLES.items()]
        )
        form.add(self.model)
        self.model.committed.connect(self._on_model)
        self.items = _item_fields()
        for key, field in self.items.items():
            form.add(field)
            field.committed.connect(lambda value, key=key: self._on_item(key, value))
        self.measure = ChoiceField("Measure", _MEASURES)
        self.risk_price = NumberField(
            "Risk price",
            low=-5.0,
            high=5.0,
            sensible=(-0.5, 0.5),
            hint="Extra drift of the first factor for each unit of its volatility.",
        )
        form.add(self.measure)
        form.add(self.risk_price)
        self.risk_price.committed.connect(lambda value: self._on_item("risk_price", value))
        self.measure.committed.connect(lambda value: self._on_run("measure", value, "measure"))
        form.add_heading("How much is drawn")
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
        fields: tuple[tuple[Field, str, str], ...] = (
            (self.paths, "paths", "number of paths"),
            (self.horizon, "horizon_years", "horizon"),
            (self.steps, "steps_per_year", "steps a year"),
            (self.seed, "seed", "seed"),
        )
        for field, name, what in fields:
            form.add(field)
            field.committed.connect(lambda value, name=name, what=what: self._on_run(name, int(value), what))

    # Showing

    def show_book(self, book: Book) -> None:
        """Show the settings of a book."""
        model, run = book.rates_model, book.run
        name = model.name if model is not None else ModelName.HULL_WHITE
        self.model.set_value(name)
        _, square_root = MODEL_TRAITS[name]
        self._set_limits(square_root=square_root)
        for key, field in self.items.items():
            item = "volatility" if key == "root_volatility" else key
            twin = key == ("volatility" if square_root else "root_volatility")
            field.setVisible(item in MODEL_ITEMS[name] and not twin)
            field.set_value(None if model is None else getattr(model, item))
        self.measure.set_value(run.measure)
        self.risk_price.set_value(0.0 if model is None else model.risk_price)
        self.risk_price.setVisible(run.measure is Measure.REAL_WORLD)
        self.paths.set_value(run.paths)
        self.horizon.set_value(run.horizon_years)
        self.steps.set_value(run.steps_per_year)
        self.seed.set_value(run.seed)

    def _set_limits(self, *, square_root: bool) -> None:
        for key in ("long_run_rate", "starting_rate"):
            self.items[key].low = 0.0 if square_root else -0.2
        self.items["mean_reversion"].low = _LEAST_SQUARE_ROOT_REVERSION if square_root else 0.0

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

    def _on_item(self, key: str, value: float) -> None:
        book = self._book()
        if book is None or book.rates_model is None:
            return
        item = "volatility" if key == "root_volatility" else key
        changes: dict[str, Any] = {item: value}
        model: RatesModel = replace(book.rates_model, **changes)
        self._change(f"Change of the {item.replace('_', ' ')}", replace(book, rates_model=model))

    def _on_run(self, name: str, value: Any, what: str) -> None:
        book = self._book()
        if book is not None:
            changes: dict[str, Any] = {name: value}
            self._change(f"Change of the {what}", replace(book, run=replace(book.run, **changes)))
