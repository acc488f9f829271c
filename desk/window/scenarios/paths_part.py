"""Account, rate, assets and prices by year: the fan, the histogram, the tables, and single paths."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import QSignalBlocker, Qt
from PySide6.QtWidgets import QLabel, QSlider, QVBoxLayout, QWidget

from desk import tasks
from desk.book.arrays import FloatArray
from desk.scenarios.drawn_paths import DrawnPaths
from desk.scenarios.node_checks import node_checks
from desk.window.parts.boxes import TickBox
from desk.window.parts.fields import Combo
from desk.window.parts.pages import Pages
from desk.window.parts.theme import GAP, HALF, STEP, WIDE
from desk.window.scenarios.part import Part, ShownRun
from desk.window.scenarios.path_box import PathBox
from desk.window.scenarios.pictures import FanPicture, HistogramPicture
from desk.window.scenarios.quantities import Quantity, quantities_of, year_name
from desk.window.scenarios.result_tables import CovarianceTable
from desk.window.scenarios.tables import (
    ChecksTable,
    MomentsTable,
    PathTable,
    PercentilesTable,
    check_sentence,
)

if TYPE_CHECKING:
    from desk.window.scenarios.station import ScenariosStation

__all__ = ["PathsPart"]

_SHOWN_PATHS = 25


class _Said(QWidget):
    """A table under a sentence."""

    def __init__(self, table: QWidget, *, name: str) -> None:
        super().__init__()
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setTextFormat(Qt.TextFormat.PlainText)
        self.words.setAccessibleName(name)
        self.words.setContentsMargins(GAP, HALF, WIDE, HALF)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.words)
        column.addWidget(table, 1)
        self.setFocusProxy(table)


class PathsPart(Part):
    """What a run sums up by year.

    Attributes
    ----------
    row : int
        Of the reported year whose histogram is shown.
    quantities : tuple of Quantity
    chosen_path : int
        From 1; 0 for none.
    """

    key = "paths"
    title = "By year"
    purpose = "Savings account, short rate, assets and prices by year, and single paths"
    shares = (3, 2)

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.row = 0
        self.chosen_path = 0
        self.quantities: tuple[Quantity, ...] = ()
        self._first_paths: DrawnPaths | None = None
        self._path: DrawnPaths | None = None
        theme = self.theme_switch
        self.fan = FanPicture(theme)
        self.histogram = HistogramPicture(theme)
        self.pictures = (self.fan, self.histogram)
        self.percentiles = PercentilesTable(theme)
        self.checks = ChecksTable(theme)
        self.moments = MomentsTable(theme)
        self.path_table = PathTable(theme)
        self.covariance = CovarianceTable(theme)
        self.verdict = _Said(self.checks, name="Verdict of the check")
        self.pages = Pages(theme, name="Tables of the run")
        for key, title, page in (
            ("percentiles", "Percentiles", self.percentiles),
            ("checks", "Checks", self.verdict),
            ("moments", "Moments", self.moments),
            ("path", "One path", self.path_table),
            ("assets", "Covariance", self.covariance),
        ):
            self.pages.add(key, title, page)
        self.in_full = TickBox("Intervals, tails, closed form")
        self.in_full.setChecked(True)
        self.table = self.pages
        self._make_controls()
        self.pages.add_control(self.in_full)
        self.pages.add_control(self.path_label)
        self.pages.add_control(self.path_number)
        for teller in (
            *self.pictures,
            self.percentiles,
            self.checks,
            self.moments,
            self.path_table,
            self.covariance,
        ):
            teller.message.connect(station.message)
        self._connect()

    def _make_controls(self) -> None:
        self.quantity = Combo()
        self.quantity.setAccessibleName("Shown")
        self.quantity.setMinimumContentsLength(14)
        self.logarithmic = TickBox("Log scale")
        self.with_paths = TickBox("Some paths")
        self.path_label = QLabel("Path")
        self.path_number = PathBox()
        self.path_label.setBuddy(self.path_number)
        self.path_number.setAccessibleName("Number of a single path")
        self.path_number.setAccessibleDescription("Up and Down go to the next; empty for none.")
        self.path_number.setToolTip(
            "Shows one path in the picture, and node by node in a table. Up and Down go to the next; in the "
            "picture Page Up and Page Down do."
        )
        self.slider = QSlider(Qt.Orientation.Horizontal)
        self.slider.setFixedWidth(24 * STEP)
        self.slider.setAccessibleName("Year of the histogram")
        self.year_label = QLabel()
        self.year_label.setBuddy(self.slider)
        width = self.year_label.fontMetrics().horizontalAdvance("Year 200 ")
        self.year_label.setMinimumWidth(width)
        self.year_label.setAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        self.controls = (
            self.quantity,
            self.logarithmic,
            self.with_paths,
            self.year_label,
            self.slider,
        )

    def _connect(self) -> None:
        self.quantity.currentIndexChanged.connect(lambda _: self._on_quantity())
        self.logarithmic.toggled.connect(lambda _: self.soon(self._draw_fan))
        self.with_paths.toggled.connect(lambda _: self._on_with_paths())
        self.path_number.valueChanged.connect(self.choose_path)
        self.in_full.toggled.connect(lambda _: self.soon(self._fill_table))
        self.pages.changed.connect(lambda _: self.soon(self._fill_table))
        self.slider.valueChanged.connect(self.set_row)
        self.fan.year_chosen.connect(self._on_year)
        self.fan.path_chosen.connect(self.path_number.setValue)
        self.fan.path_stepped.connect(lambda step: self.path_number.setValue(self.path_number.value() + step))

    # What is shown

    @property
    def shown(self) -> Quantity:
        """The quantity that is shown."""
        return self.quantities[max(self.quantity.currentIndex(), 0)]

    def show_quantity(self, key: str) -> None:
        """Show the quantity of this key, where the run has it."""
        keys = [each.key for each in self.quantities]
        if key in keys:
            self.quantity.setCurrentIndex(keys.index(key))

    def views(self) -> tuple[Callable[[], object], ...]:
        """Each quantity after the first, and the savings account on a logarithmic axis."""
        return tuple(partial(self.show_quantity, each.key) for each in self.quantities[1:])

    def home(self) -> QWidget:
        """The picture, in which years and paths are chosen."""
        return self.fan.plot

    def take_run(self, run: ShownRun) -> None:
        """Another run: the quantity, year and path chosen stay where it has them."""
        former = self.shown.key if self.quantities else "account"
        self.quantities = quantities_of(run.simulation, run.currency)
        keys = [each.key for each in self.quantities]
        with QSignalBlocker(self.quantity):
            self.quantity.clear()
            self.quantity.addItems([each.title for each in self.quantities])
            self.quantity.setCurrentIndex(keys.index(former) if former in keys else 0)
        last = run.simulation.savings_account.year.size - 1
        if not 1 <= self.row <= last:
            self.row = max(1, last // 2)
        with QSignalBlocker(self.slider):
            self.slider.setRange(1, last)
        self._first_paths = self._path = None
        self.path_number.set_most(run.simulation.paths)
        self.chosen_path = self.path_number.value()
        self.path_number.setEnabled(run.book is not None)
        self.pages.set_page_visible("assets", run.simulation.risky is not None)
        self.covariance.show_risky(run.simulation.risky)
        self._show_year_chosen()
        self._draw()
        if self.with_paths.isChecked():
            self._load_first()
        if self.chosen_path:
            self._load_path()

    def forget(self) -> None:
        """No run, no paths."""
        super().forget()
        self._first_paths = self._path = None

    def _draw(self) -> None:
        self.soon(self._draw_fan, self._draw_year, self._fill_table)

    def _on_quantity(self) -> None:
        if self.run is not None:
            self.logarithmic.setEnabled(self.shown.can_be_logarithmic)
            self._draw()

    # The year

    def _on_year(self, year: float) -> None:
        if self.run is not None:
            years = self.run.simulation.savings_account.year
            self.set_row(int(np.abs(years - year).argmin()))

    def set_row(self, row: int) -> None:
        """Show the histogram of another reported year."""
        if self.run is None:
            return
        row = min(max(row, 1), self.run.simulation.savings_account.year.size - 1)
        if row != self.row:
            self.row = row
            self._show_year_chosen()
            self._draw_year()

    def _show_year_chosen(self) -> None:
        if self.run is None:
            return
        with QSignalBlocker(self.slider):
            self.slider.setValue(self.row)
        self.year_label.setText(year_name(float(self.run.simulation.savings_account.year[self.row])))

    # Single paths

    def choose_path(self, number: int) -> None:
        """Show a path by its number from 1; 0 for none."""
        self.chosen_path = number
        if number == 0:
            self._path = None
            self.soon(self._draw_fan, self._fill_table)
            return
        if self.pages.current != "path":
            self.pages.show_page("path")
        self._load_path()

    def _on_with_paths(self) -> None:
        if self.with_paths.isChecked():
            self._load_first()
        self.soon(self._draw_fan)

    def _load_first(self) -> None:
        """Draw the first paths once more, for the picture."""
        if self.run is None or self.run.book is None or self._first_paths is not None:
            return
        task = partial(tasks.paths_of, self.run.book, first=0, count=_SHOWN_PATHS)
        self.start("Drawing some paths", task, self._take_first, failed="The paths could not be drawn")

    def _take_first(self, parts: Sequence[DrawnPaths]) -> None:
        self._first_paths = parts[0]
        self.soon(self._draw_fan)

    def _load_path(self) -> None:
        if self.run is None or self.run.book is None:
            return
        wanted = self.chosen_path
        task = partial(tasks.paths_of, self.run.book, first=wanted - 1, count=1)
        self.start("Drawing a path", task, self._take_path, failed="The path could not be drawn")

    def _take_path(self, parts: Sequence[DrawnPaths]) -> None:
        if parts[0].first + 1 == self.chosen_path:
            self._path = parts[0]
            self.soon(self._draw_fan, self._fill_table)

    @property
    def path(self) -> DrawnPaths | None:
        """The path that is shown."""
        return self._path

    # Drawing

    def _draw_fan(self) -> None:
        if self.run is None:
            return
        quantity, picked = self.shown, None
        self.logarithmic.setEnabled(quantity.can_be_logarithmic)
        if self._path is not None and self.chosen_path:
            values = quantity.of_paths(self._path)
            picked = None if values is None else (self.chosen_path, values[:, 0])
        self.fan.show_run(
            self.run.simulation,
            quantity,
            logarithmic=self.logarithmic.isChecked(),
            paths=self._paths_shown(quantity),
            picked=picked,
        )
        self._mark_year()

    def _paths_shown(self, quantity: Quantity) -> FloatArray | None:
        """Some paths, shape (m, n); those of the account are there with the run."""
        if not self.with_paths.isChecked() or self.run is None:
            return None
        if quantity.key == "account":
            return self.run.simulation.sample_paths[:_SHOWN_PATHS]
        if self._first_paths is None:
            return None
        values = quantity.of_paths(self._first_paths)
        return None if values is None else np.ascontiguousarray(values.T)

    def _draw_year(self) -> None:
        if self.run is not None:
            self.histogram.show_year(self.run.simulation, self.shown, self.row)
            self._mark_year()

    def _mark_year(self) -> None:
        if self.run is not None:
            self.fan.mark_year(float(self.run.simulation.savings_account.year[self.row]))

    def _fill_table(self) -> None:
        """Fill the table that is shown."""
        if self.run is None:
            return
        simulation, page = self.run.simulation, self.pages.current
        self.in_full.setVisible(page == "percentiles")
        if page == "percentiles":
            self.percentiles.show_run(self.shown, in_full=self.in_full.isChecked())
        elif page == "checks":
            checks = node_checks(simulation)
            check = next((each for each in checks if each.key == self.shown.key), checks[0])
            curve = simulation.repricing.curve_discount if check.key == "account" else None
            self.checks.show_check(check, curve)
            self.verdict.words.setText(check_sentence(check, simulation))
        elif page == "moments":
            self.moments.show_run(simulation)
        elif page == "path":
            self.path_table.show_path(self._path if self.chosen_path else None)
