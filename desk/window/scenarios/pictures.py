"""The pictures of a run: the fan over the years, the histogram of a year, and present values."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QKeyEvent

from desk.book.arrays import FloatArray
from desk.scenarios.records import Distribution, Histogram, NodeSummary, Simulation
from desk.scenarios.shapes import account_density, histogram_density, middle_range
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch

__all__ = ["FanPicture", "HistogramPicture", "ValuesPicture", "level_name"]

_ROLE = "rates"
_CLOSED = "Closed form"
_PATHS = "Paths"
_SHOWN_PATHS = 25
_STEPS = (1.0, 2.0, 5.0)
_POINTS = 240
_FEW = 4
"""Marked percentiles of a histogram: at most this many, so that their names stay apart."""


def level_name(level: float) -> str:
    """A percentile's name: ``5 %``."""
    return f"{numbers.exact(level)}\N{NARROW NO-BREAK SPACE}%"


def _ticks(low: float, high: float) -> dict[float, str]:
    """Round figures from `low` to `high` at their logarithms."""
    powers = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    every = [step * 10.0**power for power in powers for step in _STEPS]
    return {math.log10(value): numbers.exact(float(f"{value:g}")) for value in every if low <= value <= high}


class FanPicture(Picture):
    """The savings account or the short rate over the years, as nested bands.

    A click, or Return at the reading line, chooses a year.

    Signals
    -------
    year_chosen(float)
    """

    year_chosen = Signal(float)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Savings account", theme_switch)
        self._is_logarithmic = False
        self._marked = ""
        self.plot.scene().sigMouseClicked.connect(self._on_clicked)

    def show_run(
        self, simulation: Simulation, quantity: str, *, logarithmic: bool = False, with_paths: bool = False
    ) -> None:
        """Draw a run.

        Parameters
        ----------
        simulation : Simulation
        quantity : str
            ``account`` or ``rate``.
        logarithmic : bool
            Of the savings account alone: rates may be negative.
        with_paths : bool
            Draw some of the paths; only those of the savings account are kept.
        """
        is_account = quantity == "account"
        summary = simulation.savings_account if is_account else simulation.short_rate
        shown = summary.percentile
        can_be = is_account and bool(((shown > 0.0) & np.isfinite(shown)).all())
        self._is_logarithmic = logarithmic and can_be
        self.clear()
        self._marked = ""
        if is_account:
            self.set_title("Savings account: one unit rolled over")
            scale = ", logarithmic" if self._is_logarithmic else ""
            self.set_axes("Year", "", f"Value of 1 unit{scale}", "", y_digits=3)
        else:
            self.set_title("Short rate")
            self.set_axes("Year", "", "Rate", "% a year, continuous", y_kind="rate", y_digits=2)
        self._draw_bands(summary)
        closed = simulation.closed_form if is_account else None
        if with_paths and is_account:
            self.add_paths(_PATHS, summary.year, self._shown(simulation.sample_paths[:_SHOWN_PATHS]), "ink")
        if closed is not None:
            self.add_paths(_CLOSED, summary.year, self._shown(closed.percentile.T), "ink_soft", strength=0.9)
        axis = self.plot.axes["left"]
        values = summary.percentile
        axis.set_names(_ticks(float(values.min()), float(values.max())) if self._is_logarithmic else {})
        self.set_description(_fan_sentence(simulation, summary, is_account=is_account))
        self.reset_view()

    def _draw_bands(self, summary: NodeSummary) -> None:
        levels, year = summary.levels, summary.year
        values = self._shown(summary.percentile)
        for place in range(len(levels) // 2):
            low, high = levels[place], levels[-1 - place]
            self.add_band(
                f"{level_name(low)} to {level_name(high)}",
                year,
                values[:, place],
                values[:, -1 - place],
                _ROLE,
                strength=0.2,
                edge_names=(level_name(low), level_name(high)),
            )
        if len(levels) % 2:
            middle = len(levels) // 2
            self.add_line(level_name(levels[middle]), year, values[:, middle], _ROLE)
        self.add_line("Mean", year, self._shown(summary.mean), "ink", dashed=True)

    def _shown(self, values: FloatArray) -> FloatArray:
        """Values as they are drawn."""
        return np.log10(values) if self._is_logarithmic else values

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Names and values at `x`; those of a logarithmic axis as they are."""
        if not self._is_logarithmic:
            return super().readings_at(x)
        return [
            (name, numbers.number(10.0**value, 3))
            for series in self._series.values()
            for name, value in series.readings(x)
        ]

    def mark_year(self, year: float) -> None:
        """Mark the year whose histogram is shown."""
        if self._marked:
            self.remove(self._marked)
        self._marked = f"year {numbers.exact(year)}"
        self.add_vertical(year, self._marked)

    def _on_clicked(self, event: Any) -> None:
        if event.button() is not Qt.MouseButton.LeftButton:
            return
        place: QPointF = self._box.mapSceneToView(event.scenePos())
        left, stop, low, high = self._view()
        if left <= place.x() <= stop and low <= place.y() <= high:
            self.year_chosen.emit(place.x())

    def _on_key(self, event: QKeyEvent) -> None:
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._reading_place is not None:
            self.year_chosen.emit(self._reading_place)
            event.accept()
            return
        super()._on_key(event)


def _fan_sentence(simulation: Simulation, summary: NodeSummary, *, is_account: bool) -> str:
    mean, error = float(summary.mean[-1]), float(summary.mean_se[-1])
    year = numbers.exact(float(summary.year[-1]))
    if not is_account:
        text = (
            f"{numbers.rate(mean, with_unit=True)}, standard error {numbers.rate(error, 3, with_unit=True)}"
        )
        return f"Mean at year {year}: {text}."
    text = f"Mean at year {year}: {numbers.number(mean, 3)}, standard error {numbers.number(error, 3)}."
    if simulation.closed_form is None:
        return f"{text} There is no closed form."
    return f"{text} Thin lines: closed form."


def _nice_width(histogram: Histogram) -> float:
    """A round width near that of the bins: the power of ten below twice theirs."""
    width = float(np.median(np.diff(histogram.edges)))
    return float(10.0 ** math.floor(math.log10(2.0 * width))) if width > 0.0 else 1.0


def _drawn_bins(histogram: Histogram, per: float) -> tuple[FloatArray, FloatArray, float]:
    """Middles, heights and width of the bins of equal width."""
    low, high = middle_range(histogram)
    edges = histogram.edges
    inner = (edges[:-1] >= low) & (edges[1:] <= high)
    middles = (0.5 * (edges[:-1] + edges[1:]))[inner]
    width = float(np.median(np.diff(edges)))
    return middles, histogram_density(histogram)[inner] * per, width


class HistogramPicture(Picture):
    """The savings account or the short rate at one year."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Distribution", theme_switch)

    def show_year(self, simulation: Simulation, quantity: str, row: int) -> None:
        """Draw the reported year at `row`."""
        is_account = quantity == "account"
        summary = simulation.savings_account if is_account else simulation.short_rate
        histogram = summary.histograms[row]
        year = numbers.exact(float(summary.year[row]))
        per = _nice_width(histogram)
        self.clear()
        name = "Savings account" if is_account else "Short rate"
        self.set_title(f"{name} at year {year}")
        shown = numbers.exact(per) if is_account else numbers.rate(per, 2, with_unit=True)
        heading = ("Value of 1 unit", "") if is_account else ("Rate", "% a year, continuous")
        self.set_axes(
            *heading,
            "Share of paths",
            f"% per {shown}",
            x_kind="number" if is_account else "rate",
            x_digits=3 if is_account else 2,
            y_kind="rate",
            with_zero=True,
        )
        middles, heights, width = _drawn_bins(histogram, per)
        self.add_bars("Paths", middles, heights, _ROLE, width=width)
        low, high = middle_range(histogram)
        self.set_range(x=(low, high))
        closed = simulation.closed_form if is_account else None
        if closed is not None and closed.log_variance[row] > 0.0:
            place = np.linspace(max(low, 1e-12), high, _POINTS)
            self.add_line(_CLOSED, place, account_density(closed, row, place) * per, "ink")
        self._mark_percentiles(summary, row, low, high)
        self.set_description(_year_sentence(summary, row, is_account=is_account))
        self.reset_view()

    def _mark_percentiles(self, summary: NodeSummary, row: int, low: float, high: float) -> None:
        levels = summary.levels
        wanted: Sequence[float] = [level for level in (5.0, 50.0, 95.0) if level in levels] or levels[:_FEW]
        for level in wanted:
            value = float(summary.percentile[row, levels.index(level)])
            if low <= value <= high:
                self.add_vertical(value, level_name(level))


def _year_sentence(summary: NodeSummary, row: int, *, is_account: bool) -> str:
    digits = 3

    def shown(value: float) -> str:
        return numbers.number(value, digits) if is_account else numbers.rate(value, digits, with_unit=True)

    mean, error = shown(float(summary.mean[row])), shown(float(summary.mean_se[row]))
    return f"Mean {mean} ± {error}, standard deviation {shown(float(summary.sd[row]))}."


class ValuesPicture(Picture):
    """Pathwise present values of one side or of several, with their values on the curve."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Present values along the paths", theme_switch)

    def show_values(self, title: str, distributions: Sequence[Distribution], currency: str) -> None:
        """Draw distributions; one alone as bars, several as outlines."""
        self.clear()
        self.set_title(title)
        ranges = [middle_range(each.histogram) for each in distributions]
        per = max(_nice_width(each.histogram) for each in distributions)
        scaled = numbers.money_scaled(per, currency, digits=0)
        width = " ".join(part for part in (currency, scaled.text, scaled.scale.word) if part)
        self.set_axes(
            "Present value",
            currency,
            "Share of paths",
            f"% per {width}",
            x_kind="money",
            y_kind="rate",
            with_zero=True,
        )
        alone = len(distributions) == 1
        for each in distributions:
            name = each.name.capitalize()
            if alone:
                middles, heights, wide = _drawn_bins(each.histogram, per)
                self.add_bars(name, middles, heights, each.name, width=wide)
            else:
                density = np.append(histogram_density(each.histogram) * per, 0.0)
                self.add_line(name, each.histogram.edges, density, each.name, stepped=True)
            self.add_vertical(each.curve, "on the curve" if alone else f"{each.name} on the curve")
        if alone and ranges[0][0] < 0.0 < ranges[0][1]:
            self.add_vertical(0.0, "0")
        self.set_range(x=(min(low for low, _ in ranges), max(high for _, high in ranges)))
        self.set_description(_value_sentence(distributions))
        self.reset_view()


def _value_sentence(distributions: Sequence[Distribution]) -> str:
    if len(distributions) != 1 or distributions[0].name != "surplus":
        return "The flows discounted along each path."
    chance = numbers.rate(distributions[0].below_zero, 1, with_unit=True)
    error = numbers.rate(distributions[0].below_zero_se, 1, with_unit=True)
    return f"Below zero on {chance} ± {error} of the paths."
