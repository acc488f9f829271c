"""Change in surplus by shock: a row a shock, with a bar a side and a mark for the surplus."""

from __future__ import annotations

import html
from collections.abc import Sequence

import numpy as np
import pyqtgraph as pg
from numpy.typing import ArrayLike
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QFontMetrics, QKeyEvent, QResizeEvent

from desk.book.arrays import FloatArray
from desk.valuation.shock_records import ShockTable
from desk.window.parts import numbers
from desk.window.parts.plot_parts import pen
from desk.window.parts.plot_series import Bars
from desk.window.parts.plots import Picture
from desk.window.parts.theme import STEP, ThemeSwitch, soft_font
from desk.window.shocks.wording import short
from desk.window.standing.wording import amount

__all__ = ["ChangePicture", "RowBars"]

_ROW = 5 * STEP
"""Least height of a row [px]."""
_THICK = 0.34
_NAMES = 0.42
"""Part of the width that names may take."""
_MARK = "Surplus"


class RowBars(Bars):
    """Bars that lie: `x` are rows from the top, heights are lengths."""

    def set(self, x: ArrayLike, heights: ArrayLike, width: float, base: ArrayLike) -> None:
        """Show other bars."""
        del base
        self.x = np.array(x, dtype=np.float64).ravel()
        self.heights = np.nan_to_num(np.array(heights, dtype=np.float64).ravel())
        self.width = width
        self.base = np.zeros(self.x.size)
        self.item.setVisible(self.x.size > 0)
        if self.x.size:
            self.item.setOpts(
                x=None,
                x0=np.minimum(self.heights, 0.0),
                width=np.abs(self.heights),
                y0=None,
                y=-self.x + self.offset,
                height=width,
            )

    def extent(self) -> tuple[float, float, float, float]:
        """Lengths across, rows down."""
        if not self.x.size:
            return (np.nan,) * 4
        return (
            min(0.0, float(self.heights.min())),
            max(0.0, float(self.heights.max())),
            -float(self.x.max()) - 0.5,
            0.5,
        )

    def readings(self, x: float) -> list[tuple[str, float]]:
        """The length of the bar in row `x`."""
        found = np.flatnonzero(self.x == round(x))
        return [(self.name, float(self.heights[found[0]]))] if found.size else []


class ChangePicture(Picture):
    """What each shock does to the surplus, split by side.

    Up and Down, or Left and Right, go from row to row; rows that do not fit are scrolled to.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        self._rows: tuple[str, ...] = ()
        self._first = 0
        super().__init__("Change in surplus by shock", theme_switch)
        self._box.setMouseEnabled(x=False, y=True)
        self._row_line = pg.InfiniteLine(0, angle=0)
        self._row_line.setZValue(50)
        self._row_line.setVisible(False)
        self._upright = pg.InfiniteLine(0, angle=90)
        self._upright.setZValue(8)
        for line in (self._row_line, self._upright):
            self._item.addItem(line, ignoreBounds=True)
        self._recolour()

    def show_changes(
        self,
        names: Sequence[str],
        assets: FloatArray,
        liabilities: FloatArray,
        currency: str,
        sentence: str,
    ) -> None:
        """Draw changes of both sides by row; a rise in liabilities counts against the surplus."""
        self._rows = tuple(names)
        self._first = min(self._first, max(len(names) - 1, 0))
        place = np.arange(len(names), dtype=float)
        self.set_axes("Change in surplus", currency, "", "", x_kind="money")
        bars: tuple[tuple[str, FloatArray, str, float], ...] = (
            ("From assets", assets, "assets", 0.18),
            ("From liabilities", -liabilities, "liabilities", -0.18),
        )
        for name, lengths, role, offset in bars:
            self._put(RowBars(name, role, offset=offset), 5).set(place, lengths, _THICK, 0.0)
        self.add_dots(_MARK, assets - liabilities, -place, "surplus", symbol="d")
        self.set_description(sentence)
        self._fit_rows()

    def show_table(self, table: ShockTable) -> None:
        """Draw a book under its shocks."""
        results = table.results
        self.show_changes(
            [result.name for result in results],
            np.array([result.change_in_assets for result in results]),
            np.array([result.change_in_liabilities for result in results]),
            table.currency,
            _sentence(table),
        )

    # Rows

    @property
    def rows_seen(self) -> int:
        """How many rows fit."""
        room = int(self._box.boundingRect().height() // _ROW)
        return min(max(room, 3), max(len(self._rows), 1))

    def _fit_rows(self) -> None:
        """Show as many rows as fit, from the first one wanted."""
        count = self.rows_seen
        self._first = min(self._first, max(len(self._rows) - count, 0))
        lengths = [series.extent() for series in self._series.values() if isinstance(series, RowBars)]
        dots = self._series.get(_MARK)
        if dots is not None:
            lengths.append(dots.extent())
        low = min((extent[0] for extent in lengths if np.isfinite(extent[0])), default=0.0)
        high = max((extent[1] for extent in lengths if np.isfinite(extent[1])), default=0.0)
        low, high = min(low, 0.0), max(high, 0.0)
        room = 0.05 * (high - low) or 1.0
        top = -self._first + 0.5
        self.set_range(x=(low - room, high + room), y=(top - count, top))
        self._name_rows()
        self._count_rows()

    def _count_rows(self) -> None:
        """Say which rows are seen, where they are not all."""
        count, every = self.rows_seen, len(self._rows)
        seen = f"{self._first + 1} to {self._first + count} of {every:,}" if count < every else ""
        if self._y.label != seen:
            self._y.label = seen
            self._y_heading.setText(self._y.heading)

    def _name_rows(self) -> None:
        metrics = QFontMetrics(soft_font(self.font()))
        room = int(_NAMES * self.width())
        last = min(self._first + self.rows_seen, len(self._rows))
        self.plot.axes["left"].set_names(
            {
                -float(place): metrics.elidedText(self._rows[place], Qt.TextElideMode.ElideRight, room)
                for place in range(self._first, last)
            }
        )

    def show_row(self, place: int) -> None:
        """Bring a row into view and read it."""
        if 0 <= place < len(self._rows):
            self._read_at(float(place))
            self._is_kept = True

    def scroll_to(self, place: int) -> None:
        """Bring a row into view."""
        count = self.rows_seen
        first = min(max(self._first, place - count + 1), place)
        if first != self._first:
            self._first = first
            self._fit_rows()

    # What the canvas does

    def settle(self) -> None:
        """Bring the picture up to date; the line at nothing stands upright."""
        super().settle()
        self._zero.setVisible(False)

    def _head(self) -> None:
        super()._head()
        if _MARK in self._series:
            colour = self._theme.line("surplus").name()
            mark = f'<span style="color:{colour}">◆</span>&nbsp;{html.escape(_MARK)}'
            self._key.setText(f"{self._key.text()}&nbsp;&nbsp; {mark}")

    def _recolour(self) -> None:
        super()._recolour()
        axes = self.plot.axes
        axes["left"].paint_in(self._theme, ruled=False, lined=False)
        axes["bottom"].paint_in(self._theme, ruled=True, lined=False)
        if hasattr(self, "_row_line"):
            self._row_line.setPen(pen(self._theme.ink_soft))
            self._upright.setPen(pen(self._theme.ink_soft))

    def _on_resized(self) -> None:
        super()._on_resized()
        if self._rows:
            self._fit_rows()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Give names the room there is."""
        super().resizeEvent(event)
        if self._rows:
            self._name_rows()

    def zoom(self, factor: float, *, about: float | None = None) -> None:
        """Closer to nothing, or further from it."""
        del about
        super().zoom(factor, about=0.0)

    # Reading

    def _places(self) -> FloatArray:
        return np.arange(len(self._rows), dtype=float)

    def _on_pointed(self, place: QPointF) -> None:
        row = round(-place.y())
        if self._first <= row < self._first + self.rows_seen:
            self._is_kept = False
            self._read_at(float(row))

    def _on_key(self, event: QKeyEvent) -> None:
        steps = {
            Qt.Key.Key_Up: -1,
            Qt.Key.Key_Down: 1,
            Qt.Key.Key_PageUp: -self.rows_seen,
            Qt.Key.Key_PageDown: self.rows_seen,
        }
        if event.key() in steps:
            self.step_reading(steps[Qt.Key(event.key())])
            event.accept()
            return
        super()._on_key(event)

    def step_reading(self, steps: int) -> None:
        """Move the reading by so many rows."""
        if self._reading_place is None and self._rows:
            self._read_at(0.0 if steps > 0 else float(len(self._rows) - 1))
            self._is_kept = True
            return
        super().step_reading(steps)

    def stop_reading(self) -> None:
        """Take the reading line away."""
        super().stop_reading()
        if hasattr(self, "_row_line"):
            self._row_line.setVisible(False)

    def _read_at(self, x: float) -> None:
        if not self._rows:
            self.stop_reading()
            return
        row = int(min(max(round(x), 0), len(self._rows) - 1))
        self.scroll_to(row)
        self._reading_place = float(row)
        self._row_line.setPos(-float(row))
        self._row_line.setVisible(True)
        dots = self._series.get(_MARK)
        values = [
            (name, value)
            for series in self._series.values()
            if isinstance(series, RowBars)
            for name, value in series.readings(row)
        ]
        if dots is not None:
            values.append(("Surplus", sum(value for _, value in values)))
        scale = self._x
        told = "  ·  ".join(
            f"{name} {numbers.signed(value * scale.factor, 1 if scale.scale is not numbers.ONE else 0)}"
            for name, value in values
        )
        self._say(f"{self._rows[row]}:  {told}  ({scale.shown_unit})")


def _sentence(table: ShockTable) -> str:
    if not table.results:
        return "There is no shock to show."
    worst = min(table.results, key=lambda result: result.change_in_surplus)
    if worst.change_in_surplus >= 0.0:
        return "No shock takes anything off the surplus."
    return f"Largest loss: {short(worst.name)}, {amount(worst.change_in_surplus, table.currency)}."
