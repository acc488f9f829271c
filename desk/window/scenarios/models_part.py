"""Several models on the same book, side by side."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QMenu, QPushButton, QWidget

from desk import tasks
from desk.book import Book, Measure, ModelName, RatesModel
from desk.scenarios.compare import ModelRun
from desk.scenarios.node_checks import FAR, check_result, node_checks
from desk.scenarios.records import Simulation
from desk.scenarios.suggestions import suggested_model
from desk.window.jobs import Job
from desk.window.parts import numbers
from desk.window.parts.boxes import TickBox
from desk.window.parts.models import MODEL_TITLES
from desk.window.parts.plots import Picture
from desk.window.parts.tables import Column, Mark
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.part import Part, ShownRun
from desk.window.scenarios.pictures import level_name
from desk.window.scenarios.tables import RunTable

if TYPE_CHECKING:
    from desk.window.scenarios.station import ScenariosStation

__all__ = ["ModelsPart"]

_FIRST = (ModelName.HULL_WHITE, ModelName.GAUSSIAN_2, ModelName.CIR_SHIFTED)
_SE = "standard error"
_SHORT = {
    ModelName.GAUSSIAN_2: "Two factors",
    ModelName.CIR: "CIR",
    ModelName.CIR_SHIFTED: "CIR, shifted",
    ModelName.BLACK_KARASINSKI: "Black-Karasinski",
    ModelName.OUTSIDE: "From outside",
}

Compared = Sequence[tuple[Measure, ModelRun]]


def _drawn(runs: Compared) -> list[tuple[str, Simulation]]:
    """Names and runs of those that were drawn."""
    both = len({measure for measure, _ in runs}) > 1
    found = []
    for measure, run in runs:
        if run.simulation is not None:
            name = _SHORT.get(run.model, MODEL_TITLES[run.model])
            ending = "" if not both else ", real" if measure is Measure.REAL_WORLD else ", pricing"
            found.append((f"{name}{ending}", run.simulation))
    return found


class IntervalsPicture(Picture):
    """A quantity of several models: the outer percentiles as bars, mean and median as dots."""

    def __init__(self, theme_switch: ThemeSwitch, title: str) -> None:
        super().__init__(title, theme_switch)

    def show_surplus(self, runs: Compared, currency: str) -> None:
        """Draw the present value of surplus."""
        drawn = _drawn(runs)
        found = [next(each for each in run.present_value if each.name == "surplus") for _, run in drawn]
        self._show(
            "Present value of surplus",
            ("Surplus", currency, "money"),
            [name for name, _ in drawn],
            found[0].levels if found else (),
            np.array([each.percentile for each in found]),
            [each.mean for each in found],
            "surplus",
        )

    def show_rate(self, runs: Compared) -> None:
        """Draw the short rate at the horizon."""
        drawn = _drawn(runs)
        found = [run.short_rate for _, run in drawn]
        year = numbers.exact(float(found[0].year[-1])) if found else ""
        self._show(
            f"Short rate at year {year}",
            ("Rate", "% a year, continuous", "rate"),
            [name for name, _ in drawn],
            found[0].levels if found else (),
            np.array([each.percentile[-1] for each in found]),
            [float(each.mean[-1]) for each in found],
            "rates",
        )

    def _show(
        self,
        title: str,
        axis: tuple[str, str, str],
        names: Sequence[str],
        levels: Sequence[float],
        values: Any,
        means: Sequence[float],
        role: str,
    ) -> None:
        self.clear()
        self.set_title(title)
        label, unit, kind = axis
        self.set_axes("Model", "", label, unit, y_kind=kind, y_digits=2 if kind == "rate" else None)
        if not names:
            self.set_description("None of the models could be drawn.")
            return
        place = np.arange(1.0, len(names) + 1.0)
        low = 1 if len(levels) > 3 else 0
        ends = f"{level_name(levels[low])} to {level_name(levels[-1 - low])}"
        bottom, top = values[:, low], values[:, -1 - low]
        self.add_bars(ends, place, top - bottom, role, width=0.5, base=bottom)
        self.add_dots(level_name(levels[low]), place, bottom, role, symbol="t")
        self.add_dots(level_name(levels[-1 - low]), place, top, role, symbol="t")
        self.add_dots("Mean", place, means, "ink", symbol="d")
        self.set_x_names(dict(zip(place.tolist(), names, strict=True)))
        self.set_range(x=(0.4, len(names) + 0.6))
        self.set_description("Bars: from percentile to percentile. Diamonds: means.")
        self.reset_view()


class ModelsTable(RunTable):
    """Headline figures, one row a model."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Models side by side",
            description="Headline figures of each model on the same book, with standard errors.",
            empty="Choose models and compare them: they are drawn on this book with the same settings.",
        )

    def show_runs(self, runs: Compared, currency: str) -> None:
        """Show a comparison."""
        first = next((run.simulation for _, run in runs if run.simulation is not None), None)
        levels = () if first is None else first.present_value[-1].levels
        low = next((place for place, level in enumerate(levels) if level >= 5.0), 0)
        named = level_name(levels[low]) if levels else ""
        columns = [
            Column("model", "Model"),
            Column("measure", "Measure"),
            Column("account", "Savings account", "mean at the horizon", "number", digits=4),
            Column("account_se", "Savings account", _SE, "number", digits=4),
            Column("rate_sd", "Short rate", "std deviation, %", "rate", digits=3),
            Column("assets", "Assets", f"mean, {currency}", "money"),
            Column("assets_se", "Assets", _SE, "money"),
            Column("liabilities", "Liabilities", f"mean, {currency}", "money"),
            Column("liabilities_se", "Liabilities", _SE, "money"),
            Column("surplus", "Surplus", f"mean, {currency}", "money"),
            Column("surplus_se", "Surplus", _SE, "money"),
            Column("surplus_sd", "Surplus", "std deviation", "money"),
            Column("low", f"Surplus {named}", currency, "money"),
            Column("low_se", f"Surplus {named}", _SE, "money"),
            Column("tail", f"Surplus {named}", "tail mean", "money"),
            Column("tail_se", f"Surplus {named}", "its error", "money"),
            Column("below", "Surplus below zero", "% of paths", "rate"),
            Column("below_se", "Surplus below zero", "standard error, %", "rate"),
            Column("check", "Farthest check", "standard errors", "number", digits=1),
            Column("note", "Note"),
        ]
        rows: list[dict[str, Any]] = []
        marks: dict[tuple[int, str], Mark] = {}
        for number, (measure, run) in enumerate(runs):
            row: dict[str, Any] = {column.key: float("nan") for column in columns}
            row |= {"model": MODEL_TITLES[run.model], "measure": str(measure), "note": run.problem}
            if run.simulation is not None:
                row |= _figures(run.simulation, low)
                if row["check"] > FAR:
                    marks[number, "check"] = Mark(f"More than {FAR:g} standard errors off.", grave=True)
            elif run.problem:
                marks[number, "note"] = Mark(run.problem, grave=True)
            rows.append(row)
        self.put(columns, {column.key: [row[column.key] for row in rows] for column in columns}, marks)


def _figures(simulation: Simulation, low: int) -> dict[str, Any]:
    """The figures of one row."""
    by_name = {each.name: each for each in simulation.present_value}
    surplus, account = by_name["surplus"], simulation.savings_account
    found: dict[str, Any] = {
        "account": float(account.mean[-1]),
        "account_se": float(account.mean_se[-1]),
        "rate_sd": float(simulation.short_rate.sd[-1]),
        "surplus_sd": surplus.sd,
        "low": float(surplus.percentile[low]),
        "low_se": float(surplus.percentile_se[low]),
        "tail": float(surplus.tail_mean[low]),
        "tail_se": float(surplus.tail_mean_se[low]),
        "below": surplus.below_zero,
        "below_se": surplus.below_zero_se,
        "check": check_result(node_checks(simulation)[0]).worst,
    }
    for name, each in by_name.items():
        found |= {name: each.mean, f"{name}_se": each.se}
    return found


class ModelsPart(Part):
    """A comparison of models.

    Attributes
    ----------
    runs : tuple
        What is shown.
    actions : dict of ModelName to QAction
        The choice of models.
    """

    key = "models"
    title = "Models"
    share = 32
    purpose = "Several models, or both measures, on the same book with the same settings"

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.runs: tuple[tuple[Measure, ModelRun], ...] = ()
        self._of_book: Book | None = None
        self._job: Job | None = None
        self.surplus = IntervalsPicture(self.theme_switch, "Present value of surplus")
        self.rate = IntervalsPicture(self.theme_switch, "Short rate")
        self.pictures = (self.surplus, self.rate)
        self.table = self.models = ModelsTable(self.theme_switch)
        self.choice = QPushButton()
        menu = QMenu(self.choice)
        self.actions: dict[ModelName, QAction] = {}
        for name, title in MODEL_TITLES.items():
            action = menu.addAction(title)
            action.setCheckable(True)
            action.setChecked(name in _FIRST)
            action.toggled.connect(lambda _: self._say_choice())
            self.actions[name] = action
        self.choice.setMenu(menu)
        self.both = TickBox("Both measures")
        self.button = QPushButton("Compare")
        self.button.clicked.connect(lambda _=False: self.compare())
        self.controls = (self.choice, self.both, self.button)
        for teller in (*self.pictures, self.models):
            teller.message.connect(station.message)
        station.jobs.ended.connect(self._on_ended)
        self._say_choice()

    def home(self) -> QWidget:
        """The button that compares."""
        return self.button

    @property
    def chosen(self) -> tuple[ModelName, ...]:
        """The models that are to be compared."""
        return tuple(name for name, action in self.actions.items() if action.isChecked())

    @property
    def is_comparing(self) -> bool:
        """Whether a comparison runs."""
        return self._job is not None and self._job.is_running

    def _say_choice(self) -> None:
        count = len(self.chosen)
        self.choice.setText(f"{count} model{'' if count == 1 else 's'} chosen")
        self.choice.setAccessibleName(f"Models to compare: {count} chosen")
        # It stays enabled while it compares: the keyboard would leave it for the rail.
        self.button.setEnabled(count > 0)
        self.button.setText("Comparing…" if self.is_comparing else "Compare")

    def take_run(self, run: ShownRun) -> None:
        """Another run of the station: a comparison made of this book stays."""
        book = run.book
        name = None if book is None or book.rates_model is None else book.rates_model.name
        if name is not None:
            self.actions[name].setChecked(True)
        has_set = book is not None and book.scenario_set is not None
        self.actions[ModelName.OUTSIDE].setEnabled(has_set)
        if not has_set:
            self.actions[ModelName.OUTSIDE].setChecked(False)
        if self.runs and self._of_book is not book:
            self.runs = ()
        self.soon(self._draw_surplus, self._draw_rate, self._fill)

    def forget(self) -> None:
        """Another book."""
        super().forget()
        self.runs = ()
        if self._job is not None:
            self.station.jobs.cancel(self._job)

    def compare(self) -> None:
        """Draw the models chosen on the book of the run."""
        run = self.run
        if run is None or run.book is None or self.is_comparing:
            return
        models = [self._model(run.book, name) for name in self.chosen]
        measures = tuple(Measure) if self.both.isChecked() else ()
        self._of_book = run.book
        self._job = self.start(
            "Comparing models",
            partial(tasks.compare_models, run.book, models, measures=measures),
            self._take,
            failed="The models could not be compared",
        )
        self._say_choice()

    def _model(self, book: Book, name: ModelName) -> RatesModel:
        own = book.rates_model
        if own is not None and own.name is name:
            return own
        try:
            return suggested_model(name, book.basis, own)
        except ValueError:
            # A basis that gives no curve: the run of the model says so.
            return RatesModel(name)

    def _take(self, runs: tuple[tuple[Measure, ModelRun], ...]) -> None:
        self.runs = runs
        self.soon(self._draw_surplus, self._draw_rate, self._fill)

    def _on_ended(self, job: Job) -> None:
        if job is self._job:
            self._job = None
            self._say_choice()

    def _draw_surplus(self) -> None:
        for picture in self.pictures:
            picture.plot.setVisible(bool(self.runs))
        if self.run is not None and self.runs:
            self.surplus.show_surplus(self.runs, self.run.currency)
        elif not self.runs:
            self.surplus.clear()
            self.surplus.set_title("Present value of surplus")
            self.surplus.set_description("Nothing is compared yet. Choose models and press Compare.")

    def _draw_rate(self) -> None:
        if self.runs:
            self.rate.show_rate(self.runs)
        else:
            self.rate.clear()
            self.rate.set_title("Short rate")
            self.rate.set_description("What the book does not state is a usual figure, not calibrated.")

    def _fill(self) -> None:
        if self.run is not None and self.runs:
            self.models.show_runs(self.runs, self.run.currency)
        else:
            self.models.put([Column("model", "Model")], {"model": []})
