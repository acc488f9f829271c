"""The pictures of a run by year: the fan of a quantity, and its histogram at one year."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QKeyEvent

from desk.book.arrays import FloatArray
from desk.scenarios.records import Histogram, NodeSummary, Simulation
from desk.scenarios.shapes import histogram_density, middle_range
from desk.scenarios.tail_readings import Law, histogram_reading
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.quantities import Quantity

__all__ = ["FanPicture", "HistogramPicture", "draw_bands", "drawn_bins", "level_name", "nice_width"]

_ROLE = "rates"
_CLOSED = "Closed form"
_PATHS = "Paths"
_STEPS = (1.0, 2.0, 5.0)
_POINTS = 240
_NEAR = 10.0
"""A click this near to a path picks it [px]."""
_FEW = 4
"""Marked percentiles of a histogram: at most this many, so that their names stay apart."""


def level_name(level: float) -> str:
    """A percentile's name: ``5 %``."""
    return f"{numbers.exact(level)}\N{NARROW NO-BREAK SPACE}%"


def _ticks(low: float, high: float) -> dict[float, str]:
    """Round figures from `low` to `high` at their logarithms."""
    powers = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    # Over many powers of ten only so many have room.
    steps = _STEPS if len(powers) < 6 else (1.0,)
    every = [step * 10.0**power for power in powers[:: 1 + len(powers) // 12] for step in steps]
    return {math.log10(value): numbers.exact(float(f"{value:g}")) for value in every if low <= value <= high}


def draw_bands(
    picture: Picture, places: FloatArray, levels: Sequence[float], values: FloatArray, mean: FloatArray
) -> None:
    """Percentiles as nested bands of one hue, the middle one and the mean as lines.

    Parameters
    ----------
    picture : Picture
    places : ndarray, shape (n,)
    levels : sequence of float, length m
    values : ndarray, shape (n, m)
    mean : ndarray, shape (n,)
    """
    for place in range(len(levels) // 2):
        low, high = levels[place], levels[-1 - place]
        picture.add_band(
            f"{level_name(low)} to {level_name(high)}",
            places,
            values[:, place],
            values[:, -1 - place],
            _ROLE,
            strength=0.2,
            edge_names=(level_name(low), level_name(high)),
        )
    if len(levels) % 2:
        middle = len(levels) // 2
        picture.add_line(level_name(levels[middle]), places, values[:, middle], _ROLE)
    picture.add_line("Mean", places, mean, "ink", dashed=True)


class FanPicture(Picture):
    """A quantity over the years as nested bands.

    A click, or Return at the reading line, chooses a year; a click near a path picks it, and Page Up and
    Page Down go to the path before and after.

    Signals
    -------
    year_chosen(float)
    path_chosen(int)
        By its number from 1.
    path_stepped(int)
        The path so many numbers further on is wanted.
    """

    year_chosen = Signal(float)
    path_chosen = Signal(int)
    path_stepped = Signal(int)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Savings account", theme_switch)
        self._is_logarithmic = False
        self._marked = self._picked = ""
        self._digits = 3
        self._paths: FloatArray = np.empty((0, 0))
        self._year: FloatArray = np.empty(0)
        self.plot.scene().sigMouseClicked.connect(self._on_clicked)

    def show_run(
        self,
        simulation: Simulation,
        quantity: Quantity,
        *,
        logarithmic: bool = False,
        paths: FloatArray | None = None,
        picked: tuple[int, FloatArray] | None = None,
    ) -> None:
        """Draw a run.

        Parameters
        ----------
        simulation : Simulation
        quantity : Quantity
        logarithmic : bool
            Where the quantity can be.
        paths : ndarray, shape (m, n), optional
            Its values on the first m paths.
        picked : (int, ndarray), optional
            The number of a path, from 1, and its values.
        """
        summary = quantity.summary
        self._is_logarithmic = logarithmic and quantity.can_be_logarithmic
        self._digits = quantity.digits
        self.clear()
        self._marked = self._picked = ""
        self.set_title(quantity.heading)
        scale = ", logarithmic" if self._is_logarithmic else ""
        kind = "number" if self._is_logarithmic else str(quantity.kind)
        self.set_axes(
            "Year", "", f"{quantity.axis}{scale}", quantity.unit, y_kind=kind, y_digits=quantity.digits
        )
        self._year = summary.year
        draw_bands(
            self, summary.year, summary.levels, self._shown(summary.percentile), self._shown(summary.mean)
        )
        self._paths = np.empty((0, 0)) if paths is None else self._shown(paths)
        if paths is not None:
            self.add_paths(_PATHS, summary.year, self._paths, "ink")
        closed = quantity.closed
        if closed is not None:
            self.add_paths(_CLOSED, summary.year, self._shown(closed.percentile.T), "ink_soft", strength=0.9)
        if picked is not None:
            self._picked = f"Path {numbers.integer(picked[0])}"
            self.add_line(self._picked, summary.year, self._shown(picked[1]), "assets")
        axis = self.plot.axes["left"]
        values = summary.percentile
        axis.set_names(_ticks(float(values.min()), float(values.max())) if self._is_logarithmic else {})
        self.set_description(_fan_sentence(quantity))
        self.reset_view()

    def _shown(self, values: FloatArray) -> FloatArray:
        """Values as they are drawn."""
        if not self._is_logarithmic:
            return values
        # What a path holds beyond the numbers has no place on the axis.
        with np.errstate(divide="ignore", invalid="ignore"):
            logarithm = np.log10(values)
        return np.where(np.isfinite(logarithm), logarithm, np.nan)

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Names and values at `x`; those of a logarithmic axis as they are."""
        if not self._is_logarithmic:
            return super().readings_at(x)
        return [
            (name, numbers.number(10.0**value, self._digits))
            for series in self._series.values()
            for name, value in series.readings(x)
        ]

    def mark_year(self, year: float) -> None:
        """Mark the year whose histogram is shown."""
        if self._marked:
            self.remove(self._marked)
        self._marked = f"year {numbers.exact(year)}"
        self.add_vertical(year, self._marked)

    def path_at(self, x: float, y: float) -> int:
        """The number, from 1, of the path shown that comes nearest to a place; 0 where none comes near."""
        if not self._paths.size:
            return 0
        left, stop, low, high = self._view()
        if not left <= x <= stop:
            return 0
        heights = np.array([np.interp(x, self._year, path) for path in self._paths])
        distance = np.abs(heights - y) / (high - low) * self._box.boundingRect().height()
        if not np.isfinite(distance).any():
            return 0
        nearest = int(np.nanargmin(distance))
        return nearest + 1 if distance[nearest] <= _NEAR else 0

    def _on_clicked(self, event: Any) -> None:
        if event.button() is not Qt.MouseButton.LeftButton:
            return
        place: QPointF = self._box.mapSceneToView(event.scenePos())
        left, stop, low, high = self._view()
        if left <= place.x() <= stop and low <= place.y() <= high:
            near = self.path_at(place.x(), place.y())
            if near:
                self.path_chosen.emit(near)
            else:
                self.year_chosen.emit(place.x())

    def _on_key(self, event: QKeyEvent) -> None:
        key = event.key()
        if key in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._reading_place is not None:
            self.year_chosen.emit(self._reading_place)
        elif key in (Qt.Key.Key_PageUp, Qt.Key.Key_PageDown):
            self.path_stepped.emit(1 if key == Qt.Key.Key_PageDown else -1)
        else:
            super()._on_key(event)
            return
        event.accept()


def _fan_sentence(quantity: Quantity) -> str:
    summary = quantity.summary
    digits = 2 if quantity.kind == "rate" else 3
    mean, error = float(summary.mean[-1]), float(summary.mean_se[-1])
    year = numbers.exact(float(summary.year[-1]))
    text = f"Mean at year {year}: {quantity.shown(mean, digits)} ± {quantity.shown_error(error)}."
    if quantity.key == "rate":
        return text
    if quantity.closed is None:
        return f"{text} There is no closed form."
    return f"{text} Thin lines: closed form."


def nice_width(histogram: Histogram) -> float:
    """A round width near that of the bins: the power of ten below twice theirs."""
    width = float(np.median(np.diff(histogram.edges)))
    return float(10.0 ** math.floor(math.log10(2.0 * width))) if width > 0.0 else 1.0


def drawn_bins(histogram: Histogram, per: float) -> tuple[FloatArray, FloatArray, float]:
    """Middles, heights and width of the bins of equal width."""
    low, high = middle_range(histogram)
    edges = histogram.edges
    inner = (edges[:-1] >= low) & (edges[1:] <= high)
    middles = (0.5 * (edges[:-1] + edges[1:]))[inner]
    width = float(np.median(np.diff(edges)))
    return middles, histogram_density(histogram)[inner] * per, width


class HistogramPicture(Picture):
    """A quantity at one year.

    The reading line gives the share of the paths at and below a value, and the mean of those.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Distribution", theme_switch)
        self._histogram: Histogram | None = None
        self._quantity: Quantity | None = None
        self._law: Law | None = None

    def show_year(self, simulation: Simulation, quantity: Quantity, row: int) -> None:
        """Draw the reported year at `row`."""
        summary = quantity.summary
        histogram = summary.histograms[row]
        year = numbers.exact(float(summary.year[row]))
        per = nice_width(histogram)
        self.clear()
        self._histogram, self._quantity = histogram, quantity
        self._law = law = quantity.law(simulation, row)
        self.set_title(f"{quantity.short_title} at year {year}")
        shown = numbers.exact(per) if quantity.kind != "rate" else numbers.rate(per, 2, with_unit=True)
        if quantity.kind == "money":
            scaled = numbers.money_scaled(per, quantity.unit, digits=0)
            shown = " ".join(part for part in (quantity.unit, scaled.text, scaled.scale.word) if part)
        self.set_axes(
            quantity.axis,
            quantity.unit,
            "Share of paths",
            f"% per {shown}",
            x_kind=str(quantity.kind),
            x_digits=None if quantity.kind == "money" else quantity.digits,
            y_kind="rate",
            with_zero=True,
        )
        middles, heights, width = drawn_bins(histogram, per)
        self.add_bars("Paths", middles, heights, _ROLE, width=width)
        low, high = middle_range(histogram)
        self.set_range(x=(low, high))
        if law is not None:
            place = np.linspace(low, high, _POINTS)
            self.add_line(_CLOSED, place, law.density(place) * per, "ink")
        self._mark_percentiles(summary, row, low, high)
        self.set_description(_year_sentence(quantity, row))
        self.reset_view()

    def _mark_percentiles(self, summary: NodeSummary, row: int, low: float, high: float) -> None:
        levels = summary.levels
        wanted: Sequence[float] = [level for level in (5.0, 50.0, 95.0) if level in levels] or levels[:_FEW]
        for level in wanted:
            value = float(summary.percentile[row, levels.index(level)])
            if low <= value <= high:
                self.add_vertical(value, level_name(level))

    def clear(self) -> None:
        """Take out everything but the axes."""
        self._histogram = None
        super().clear()

    def _places(self) -> FloatArray:
        """The edges of the bins, at which shares are exact."""
        if self._histogram is None:
            return super()._places()
        left, stop, _, _ = self._view()
        edges = self._histogram.edges
        slack = 1e-9 * (stop - left)
        return edges[(edges >= left - slack) & (edges <= stop + slack)]

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Share and mean of what lies at and below `x`: of the paths, and by the law in closed form."""
        histogram, quantity = self._histogram, self._quantity
        if histogram is None or quantity is None:
            return super().readings_at(x)
        found = histogram_reading(histogram, x)
        share = numbers.rate(found.share, 2)
        error = numbers.rate(found.share_se, 2, with_unit=True)
        shares, mean = f"{share} ± {error}", quantity.shown(found.mean, quantity.digits)
        if self._law is not None:
            exact = self._law.reading(x)
            shares += f", law {numbers.rate(exact.share, 2, with_unit=True)}"
            mean += f", law {quantity.shown(exact.mean, quantity.digits)}"
        return [("P(X ≤ x)", shares), ("mean to x", mean)]

    def _read_at(self, x: float) -> None:
        """As every picture, but each value has its own unit."""
        places = self._places()
        quantity = self._quantity
        if not places.size or quantity is None or self._histogram is None:
            super()._read_at(x)
            return
        place = float(places[np.abs(places - x).argmin()])
        self._reading_place = place
        self._cursor.setPos(place)
        self._cursor.setVisible(True)
        # Short, for the picture may be narrow: what lies at or below the place, and its mean.
        share, mean = (text for _, text in self.readings_at(place))
        self._say(f"≤ {quantity.shown(place)}:  {share}; mean {mean}")


def _year_sentence(quantity: Quantity, row: int) -> str:
    summary = quantity.summary
    mean = quantity.shown(float(summary.mean[row]), 3)
    error = quantity.shown_error(float(summary.mean_se[row]))
    return f"Mean {mean} ± {error}, standard deviation {quantity.shown(float(summary.sd[row]), 3)}."
