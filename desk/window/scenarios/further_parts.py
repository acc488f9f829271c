"""The yield curve at a horizon, the present values, and how the figures settle."""

from __future__ import annotations

from functools import partial
from typing import TYPE_CHECKING

from PySide6.QtCore import QSignalBlocker, Qt, QTimer
from PySide6.QtWidgets import QLabel, QSlider, QWidget

from desk import tasks
from desk.book import ModelName
from desk.scenarios.curve_fan import CurveFan
from desk.window.parts import numbers
from desk.window.parts.boxes import TickBox
from desk.window.parts.fields import Combo
from desk.window.parts.pages import Pages
from desk.window.parts.plots import Picture
from desk.window.parts.theme import STEP, ThemeSwitch
from desk.window.scenarios.part import Part, ShownRun
from desk.window.scenarios.pictures import draw_bands
from desk.window.scenarios.quantities import year_name
from desk.window.scenarios.result_tables import (
    ConvergenceTable,
    CurveTable,
    GainsTable,
    ValuesTable,
)
from desk.window.scenarios.value_pictures import ConvergencePicture, ValuesPicture

if TYPE_CHECKING:
    from desk.window.scenarios.station import ScenariosStation

__all__ = ["ConvergencePart", "CurvePart", "ValuesPart"]

_SETTLES_MS = 150
"""So long the slider must rest before a curve is drawn: it takes the paths up to its year [ms]."""


class CurvePicture(Picture):
    """Zero rates by term at a horizon, with today's forward rates for the same spans."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Yield curve", theme_switch)

    def show_fan(self, fan: CurveFan) -> None:
        """Draw a fan of curves."""
        self.clear()
        year = numbers.exact(fan.year)
        self.set_title(f"Yield curve in year {year}")
        self.set_axes("Term", "years", "Zero rate", "% a year, continuous", y_kind="rate", y_digits=2)
        draw_bands(self, fan.term, fan.levels, fan.percentile, fan.mean)
        self.add_line("Forward today", fan.term, fan.forward, "assets")
        self.add_line("Curve today", fan.term, fan.today, "neutral", dashed=True)
        left_out = ""
        if fan.left_out:
            left_out = (
                f" The model is worked out up to {numbers.exact(fan.year + float(fan.term[-1]))} years: "
                "longer terms are left out."
            )
        self.set_description(
            f"Over {numbers.integer(fan.paths)} paths; at the term 0 stands the short rate.{left_out}"
        )
        self.reset_view()


class CurvePart(Part):
    """The yield curve at a chosen year.

    Attributes
    ----------
    row : int
        Of the reported year.
    fan : CurveFan or None
        What is shown.
    """

    key = "curve"
    title = "Yield curve"
    purpose = "Zero rates by term at a chosen year, over the paths"

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.row = 0
        self.fan: CurveFan | None = None
        self._kept: dict[int, CurveFan] = {}
        self.picture = CurvePicture(self.theme_switch)
        self.pictures = (self.picture,)
        self.table = self.curve_table = CurveTable(self.theme_switch)
        self.slider = QSlider(Qt.Orientation.Horizontal)
        self.slider.setFixedWidth(32 * STEP)
        self.slider.setAccessibleName("Year of the yield curve")
        self.year_label = QLabel()
        self.year_label.setBuddy(self.slider)
        self.year_label.setMinimumWidth(self.year_label.fontMetrics().horizontalAdvance("Year 200 "))
        self.year_label.setAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        self.controls = (self.year_label, self.slider)
        for teller in (self.picture, self.curve_table):
            teller.message.connect(station.message)
        self._resting = QTimer(self, singleShot=True, interval=_SETTLES_MS)
        self._resting.timeout.connect(self._load)
        self.slider.valueChanged.connect(self.set_row)

    def home(self) -> QWidget:
        """The slider."""
        return self.slider

    def take_run(self, run: ShownRun) -> None:
        """Another run: the same year of it, where there is one."""
        self._kept.clear()
        self.fan = None
        last = run.simulation.savings_account.year.size - 1
        if not 1 <= self.row <= last:
            self.row = min(10, max(1, last // 2))
        with QSignalBlocker(self.slider):
            self.slider.setRange(1, last)
            self.slider.setValue(self.row)
        self._say_year()
        self._show_none("")
        self._load()

    def set_row(self, row: int) -> None:
        """Show the curve of another reported year, once the slider rests."""
        self.row = row
        self._say_year()
        kept = self._kept.get(row)
        if kept is not None:
            self._show(kept)
        else:
            self._resting.start()

    def _say_year(self) -> None:
        if self.run is not None:
            self.year_label.setText(year_name(float(self.run.simulation.savings_account.year[self.row])))

    def _load(self) -> None:
        self._resting.stop()
        if self.run is None:
            return
        if self.run.simulation.model == ModelName.OUTSIDE:
            self._show_none(
                "A set of scenarios from outside states short rates alone: it has no bonds, and so no curve."
            )
            return
        if self.run.book is None:
            self._show_none("Run the scenarios again: the book has changed since.")
            return
        if self.row in self._kept:
            self._show(self._kept[self.row])
            return
        row = self.row
        year = float(self.run.simulation.savings_account.year[row])

        def take(fan: CurveFan) -> None:
            self._kept[row] = fan
            if row == self.row:
                self._show(fan)

        task = partial(tasks.curve_at, self.run.book, year=year)
        self.start("Drawing the curve", task, take, failed="The curve could not be drawn")

    def _show_none(self, why: str) -> None:
        self.picture.clear()
        self.picture.plot.hide()
        self.picture.set_title("Yield curve")
        self.picture.set_description(why or "The paths are drawn up to the year chosen.")
        self.curve_table.empty_text = why or "The paths are drawn up to the year chosen."
        self.curve_table.show_fan(None)

    def _show(self, fan: CurveFan) -> None:
        self.fan = fan
        self.picture.plot.show()
        self.soon(self._draw, self._fill)

    def _draw(self) -> None:
        if self.fan is not None:
            self.picture.show_fan(self.fan)

    def _fill(self) -> None:
        self.curve_table.show_fan(self.fan)


class ValuesPart(Part):
    """Present values of both sides and of the surplus along the paths."""

    key = "values"
    title = "Present values"
    purpose = "Both sides and the surplus discounted along every path, with tails"
    share = 27

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.both = ValuesPicture(self.theme_switch)
        self.surplus = ValuesPicture(self.theme_switch)
        self.pictures = (self.both, self.surplus)
        self.table = self.values = ValuesTable(self.theme_switch)
        self.in_full = TickBox("Intervals")
        self.controls = (self.in_full,)
        for teller in (*self.pictures, self.values):
            teller.message.connect(station.message)
        self.in_full.toggled.connect(lambda _: self.soon(self._fill))

    def take_run(self, run: ShownRun) -> None:
        """Another run."""
        self.soon(self._draw_both, self._draw_surplus, self._fill)

    def _draw_both(self) -> None:
        if self.run is not None:
            by_name = {each.name: each for each in self.run.simulation.present_value}
            sides = [by_name[name] for name in ("assets", "liabilities") if name in by_name]
            settings = dict(self.run.simulation.provenance.settings)
            self.both.show_values(
                "Assets and liabilities",
                sides,
                self.run.currency,
                fit_error=float(settings.get("surface_error", 0.0)),
            )

    def _draw_surplus(self) -> None:
        if self.run is not None:
            by_name = {each.name: each for each in self.run.simulation.present_value}
            if "surplus" in by_name:
                self.surplus.show_values("Surplus", [by_name["surplus"]], self.run.currency)

    def _fill(self) -> None:
        if self.run is not None:
            self.values.show_run(self.run.simulation, self.run.currency, in_full=self.in_full.isChecked())


class ConvergencePart(Part):
    """How the headline figures settle with the number of paths, and what the sampling gains."""

    key = "convergence"
    title = "Convergence"
    purpose = "How the headline figures settle with the number of paths, and what the sampling gains"

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.picture = ConvergencePicture(self.theme_switch)
        self.pictures = (self.picture,)
        self.convergence = ConvergenceTable(self.theme_switch)
        self.gains = GainsTable(self.theme_switch)
        self.pages = Pages(self.theme_switch, name="Tables of convergence")
        self.pages.add("convergence", "By number of paths", self.convergence)
        self.pages.add("gains", "Gain of the sampling", self.gains)
        self.table = self.pages
        self.figure = Combo()
        self.figure.setAccessibleName("Figure shown")
        self.controls = (self.figure,)
        for teller in (self.picture, self.convergence, self.gains):
            teller.message.connect(station.message)
        self.figure.currentIndexChanged.connect(lambda _: self.soon(self._draw))
        self.convergence.activated_row.connect(self.figure.setCurrentIndex)

    def home(self) -> QWidget:
        """The choice of the figure."""
        return self.figure

    def take_run(self, run: ShownRun) -> None:
        """Another run: the figure chosen stays."""
        place = max(self.figure.currentIndex(), 0)
        found = run.simulation.convergence
        with QSignalBlocker(self.figure):
            self.figure.clear()
            self.figure.addItems([each.figure[:1].upper() + each.figure[1:] for each in found])
            self.figure.setCurrentIndex(min(place, len(found) - 1))
        self.soon(self._draw, self._fill)

    def _draw(self) -> None:
        place = self.figure.currentIndex()
        if self.run is not None and 0 <= place < len(self.run.simulation.convergence):
            self.picture.show_figure(self.run.simulation.convergence[place], self.run.currency)

    def _fill(self) -> None:
        if self.run is not None:
            self.convergence.show_run(self.run.simulation, self.run.currency)
            self.gains.show_run(self.run.simulation)
