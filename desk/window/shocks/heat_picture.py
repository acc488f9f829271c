"""Two moves against each other as a heat picture, with a line where a level is reached."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QKeyEvent, QPainter, QPainterPath
from PySide6.QtWidgets import QGraphicsItem, QGraphicsPathItem, QStyleOptionGraphicsItem, QWidget

from desk.book.arrays import FloatArray
from desk.window.parts.plot_parts import pen
from desk.window.parts.plot_series import Series
from desk.window.parts.plots import Picture
from desk.window.parts.theme import Theme, ThemeSwitch, mixed

__all__ = ["HeatPicture", "contour_path", "shade_of"]

_BELOW, _ABOVE = "liabilities", "assets"
_CELLS = "cells"
_TODAY = "today"


def shade_of(theme: Theme, part: float) -> QColor:
    """The colour of a value: -1 for furthest below the level, 0 for at it, 1 for furthest above."""
    if not math.isfinite(part):
        return QColor(theme.raised)
    end = theme.fill(_ABOVE if part > 0.0 else _BELOW)
    return mixed(theme.surface, end, 0.12 + 0.78 * min(abs(part), 1.0) if part else 0.0)


def contour_path(x: FloatArray, y: FloatArray, value: FloatArray, level: float) -> QPainterPath:
    """Where `value`, of shape (x, y), is at `level`, as lines across the cells between four points."""
    path = QPainterPath()
    above = value >= level
    for i in range(x.size - 1):
        for j in range(y.size - 1):
            corners = ((i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1))
            heights = [float(value[corner]) for corner in corners]
            if not all(map(math.isfinite, heights)):
                continue
            signs = [bool(above[corner]) for corner in corners]
            if all(signs) or not any(signs):
                continue
            crossings = []
            for one, two in ((0, 1), (1, 2), (2, 3), (3, 0)):
                if signs[one] != signs[two]:
                    share = (level - heights[one]) / (heights[two] - heights[one])
                    (i1, j1), (i2, j2) = corners[one], corners[two]
                    crossings.append(
                        QPointF(x[i1] + share * (x[i2] - x[i1]), y[j1] + share * (y[j2] - y[j1]))
                    )
            for start, end in zip(crossings[::2], crossings[1::2], strict=True):
                path.moveTo(start)
                path.lineTo(end)
    return path


def _edges(places: FloatArray) -> FloatArray:
    """Edges of cells about places that rise."""
    if places.size == 1:
        return np.array([places[0] - 0.5, places[0] + 0.5])
    middle = (places[1:] + places[:-1]) / 2.0
    return np.concatenate(([2 * places[0] - middle[0]], middle, [2 * places[-1] - middle[-1]]))


class _CellsItem(QGraphicsItem):
    """Rectangles, drawn as such: an SVG file holds no image of them."""

    def __init__(self) -> None:
        super().__init__()
        self._rects: list[tuple[QRectF, QColor]] = []
        self._bounds = QRectF()

    def put(self, rects: list[tuple[QRectF, QColor]]) -> None:
        """Draw others."""
        self.prepareGeometryChange()
        self._rects = rects
        bounds = QRectF()
        for rect, _ in rects:
            bounds = bounds.united(rect)
        self._bounds = bounds
        self.update()

    def boundingRect(self) -> QRectF:
        """All of them."""
        return self._bounds

    def paint(
        self, painter: QPainter, option: QStyleOptionGraphicsItem, widget: QWidget | None = None
    ) -> None:
        """Fill each."""
        del option, widget
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        for rect, colour in self._rects:
            painter.fillRect(rect, colour)


class _Cells(Series):
    """The cells, and the line at the level."""

    def __init__(self) -> None:
        super().__init__(_CELLS, "ink")
        self.x = self.y = np.empty(0)
        self.value = np.empty((0, 0))
        self.level = 0.0
        self.item = _CellsItem()
        self.line = QGraphicsPathItem()
        self.items = [self.item, self.line]

    def set(self, x: FloatArray, y: FloatArray, value: FloatArray, level: float) -> None:
        self.x, self.y, self.value, self.level = x, y, value, level
        self.line.setPath(contour_path(x, y, value, level))

    def parts(self) -> FloatArray:
        """Values about the level, from -1 to 1."""
        away = self.value - self.level
        known = away[np.isfinite(away)]
        most = float(np.abs(known).max()) if known.size else 0.0
        return away / most if most else np.zeros_like(away)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        if not self.value.size:
            self.item.put([])
            return
        across, up, parts = _edges(self.x), _edges(self.y), self.parts()
        self.item.put(
            [
                (
                    QRectF(across[i], up[j], across[i + 1] - across[i], up[j + 1] - up[j]),
                    shade_of(theme, float(parts[i, j])),
                )
                for i in range(self.x.size)
                for j in range(self.y.size)
            ]
        )
        self.line.setPen(pen(theme.ink, 2.0))

    def extent(self) -> tuple[float, float, float, float]:
        """Of all the cells."""
        if not self.value.size:
            return (np.nan,) * 4
        across, up = _edges(self.x), _edges(self.y)
        return (float(across[0]), float(across[-1]), float(up[0]), float(up[-1]))


class HeatPicture(Picture):
    """Values over two moves. The arrows, or the pointer, read them."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        self._cells: _Cells | None = None
        self._at = (0, 0)
        self._text: Callable[[float], str] = str
        self._level_text = ""
        super().__init__("Two moves together", theme_switch)
        self._cross = pg.InfiniteLine(0, angle=0)
        self._cross.setZValue(50)
        self._cross.setVisible(False)
        self._item.addItem(self._cross, ignoreBounds=True)
        self._recolour()

    def show_grid(
        self,
        x: FloatArray,
        y: FloatArray,
        value: FloatArray,
        *,
        axes: tuple[tuple[str, str], tuple[str, str]],
        level: float,
        level_text: str,
        text: Callable[[float], str],
        sentence: str,
    ) -> None:
        """Draw a grid.

        Parameters
        ----------
        x, y : ndarray, shapes (m,) and (k,)
            Rising.
        value : ndarray, shape (m, k)
        axes : pair of (label, unit)
        level : float
            The colours part here, and a line is drawn.
        level_text : str
            What the line says.
        text : callable
            Writes a value.
        sentence : str
        """
        self.clear()
        (x_label, x_unit), (y_label, y_unit) = axes
        self.set_axes(x_label, x_unit, y_label, y_unit)
        self._text = text
        self._level_text = level_text
        self._cells = self._put(_Cells(), 0)
        self._cells.set(x, y, value, level)
        self._cells.line.setZValue(20)
        if x[0] <= 0.0 <= x[-1] and y[0] <= 0.0 <= y[-1]:
            self.add_dots(_TODAY, [0.0], [0.0], "ink", symbol="x")
        up = _edges(y)
        self.set_range(x=(float(_edges(x)[0]), float(_edges(x)[-1])), y=(float(up[0]), float(up[-1])))
        self.set_description(sentence)

    def clear(self) -> None:
        """Take out everything but the axes."""
        super().clear()
        self._cells = None

    def settle(self) -> None:
        """Bring the picture up to date; no line at nothing."""
        super().settle()
        self._zero.setVisible(False)

    def _head(self) -> None:
        super()._head()
        theme = self._theme
        today = f"&nbsp;&nbsp; <b>×</b>&nbsp;{_TODAY}" if _TODAY in self._series else ""
        below, above = (shade_of(theme, part).name() for part in (-0.8, 0.8))
        self._key.setText(
            f'<span style="color:{below}">■</span>&nbsp;below&nbsp;&nbsp; '
            f'<span style="color:{above}">■</span>&nbsp;above&nbsp;&nbsp; '
            f"<b>—</b>&nbsp;{self._level_text}{today}"
        )
        self._key.setVisible(bool(self._level_text) and self._cells is not None)

    def _recolour(self) -> None:
        super()._recolour()
        self.plot.axes["left"].paint_in(self._theme, ruled=False, lined=True)
        if hasattr(self, "_cross"):
            self._cross.setPen(pen(self._theme.ink))
            self._cursor.setPen(pen(self._theme.ink))

    # Reading

    def _places(self) -> FloatArray:
        return self._cells.x if self._cells is not None else np.empty(0)

    def _on_pointed(self, place: QPointF) -> None:
        if self._cells is None:
            return
        self._is_kept = False
        self.read_cell(
            int(np.abs(self._cells.x - place.x()).argmin()), int(np.abs(self._cells.y - place.y()).argmin())
        )

    def _on_key(self, event: QKeyEvent) -> None:
        steps = {
            Qt.Key.Key_Left: (-1, 0),
            Qt.Key.Key_Right: (1, 0),
            Qt.Key.Key_Up: (0, 1),
            Qt.Key.Key_Down: (0, -1),
        }
        if event.key() in steps and self._cells is not None:
            across, up = steps[Qt.Key(event.key())]
            if self._reading_place is None:
                self.read_cell(self._cells.x.size // 2, self._cells.y.size // 2)
            else:
                self.read_cell(self._at[0] + across, self._at[1] + up)
            self._is_kept = True
            event.accept()
            return
        super()._on_key(event)

    def stop_reading(self) -> None:
        """Take the reading lines away."""
        super().stop_reading()
        if hasattr(self, "_cross"):
            self._cross.setVisible(False)

    def read_cell(self, across: int, up: int) -> None:
        """Read a cell; one beyond the edge is the one at it."""
        cells = self._cells
        if cells is None:
            return
        i = min(max(across, 0), cells.x.size - 1)
        j = min(max(up, 0), cells.y.size - 1)
        self._at = (i, j)
        self._reading_place = float(cells.x[i])
        self._cursor.setPos(cells.x[i])
        self._cross.setPos(cells.y[j])
        self._cursor.setVisible(True)
        self._cross.setVisible(True)
        x, y = self._x, self._y
        value = float(cells.value[i, j])
        told = self._text(value) if math.isfinite(value) else "cannot be computed"
        self._say(
            f"{x.label} {self._x_text(float(cells.x[i]))} {x.shown_unit}, "
            f"{y.label} {y.text(float(cells.y[j]))} {y.shown_unit}:  {told}"
        )

    def _read_at(self, x: float) -> None:
        if self._cells is None:
            self.stop_reading()
            return
        self.read_cell(int(np.abs(self._cells.x - x).argmin()), self._at[1])
