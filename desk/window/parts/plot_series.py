"""What a picture can show: lines, bands, bars, dots, bundles of paths."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pyqtgraph as pg
from numpy.typing import ArrayLike, NDArray
from PySide6.QtCore import QPointF
from PySide6.QtGui import QColor, QPainterPath, QPolygonF
from PySide6.QtWidgets import QGraphicsItem, QGraphicsPathItem

from desk.book.arrays import FloatArray
from desk.window.parts.plot_parts import pen
from desk.window.parts.theme import Theme

__all__ = ["Band", "Bars", "Dots", "Line", "Paths", "Series"]

_SHORT = 1_000
"""Lines up to this many points are drawn two pixels wide and smoothed; longer ones would be slow so."""
_MOST_PATHS = 200


def _floats(values: ArrayLike) -> FloatArray:
    return np.array(values, dtype=np.float64).ravel()


def _extent(values: FloatArray) -> tuple[float, float]:
    finite = values[np.isfinite(values)]
    return (float(finite.min()), float(finite.max())) if finite.size else (np.nan, np.nan)


class Series:
    """One thing in a picture, with a name and a role in the theme.

    Attributes
    ----------
    name : str
    role : str
    on_right : bool
        Measured on the right-hand axis.
    items : list of QGraphicsItem
    """

    def __init__(self, name: str, role: str, *, on_right: bool = False) -> None:
        self.name = name
        self.role = role
        self.on_right = on_right
        self.items: list[QGraphicsItem] = []

    @property
    def make(self) -> tuple[object, ...]:
        """What cannot be changed in it: another needs another series."""
        return (self.role, self.on_right)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        raise NotImplementedError

    def extent(self) -> tuple[float, float, float, float]:
        """Least and greatest x, least and greatest y; NaN where there is nothing."""
        raise NotImplementedError

    def places(self) -> FloatArray:
        """The x at which it has something to read."""
        return np.empty(0)

    def readings(self, x: float) -> list[tuple[str, float]]:
        """Names and values at `x`; nothing outside of what it covers."""
        return []

    def ends(self, low: float, high: float) -> list[tuple[str, float, float]]:
        """Names with the last place, from `low` to `high`, beside which each can stand."""
        return []


def _last_between(x: FloatArray, y: FloatArray, low: float, high: float) -> tuple[float, float] | None:
    """The last point of a line between `low` and `high`, cut at `high`."""
    known = np.isfinite(x) & np.isfinite(y)
    x, y = x[known], y[known]
    if not x.size or x[0] > high or x[-1] < low:
        return None
    end = min(float(x[-1]), high)
    return end, float(np.interp(end, x, y))


def _at(x: FloatArray, y: FloatArray, place: float) -> float | None:
    known = np.isfinite(x) & np.isfinite(y)
    x, y = x[known], y[known]
    if not x.size:
        return None
    slack = 1e-9 * max(1.0, abs(place))
    if place < x[0] - slack or place > x[-1] + slack:
        return None
    return float(np.interp(place, x, y))


class Line(Series):
    """A line through points of rising x, or steps that hold their value up to the next x."""

    def __init__(
        self, name: str, role: str, *, dashed: bool, stepped: bool, strong: bool, on_right: bool
    ) -> None:
        super().__init__(name, role, on_right=on_right)
        self.dashed, self.stepped, self.strong = dashed, stepped, strong
        self.x = self.y = np.empty(0)
        self.item = pg.PlotDataItem(connect="finite")
        self.items = [self.item]

    @property
    def make(self) -> tuple[object, ...]:
        """Its role and manner."""
        return (*super().make, self.dashed, self.stepped, self.strong)

    def set(self, x: ArrayLike, y: ArrayLike) -> None:
        """Show other points."""
        self.x, self.y = _floats(x), _floats(y)
        shown_x, shown_y = self.x, self.y
        if self.stepped:
            shown_x, shown_y = np.repeat(self.x, 2)[1:], np.repeat(self.y, 2)[:-1]
        self.item.setData(shown_x, shown_y, antialias=len(shown_x) <= _SHORT)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        wide = self.strong and len(self.x) <= _SHORT
        self.item.setPen(pen(theme.line(self.role), 2.0 if wide else 1.0, dashed=self.dashed))

    def extent(self) -> tuple[float, float, float, float]:
        """Of the points."""
        return (*_extent(self.x), *_extent(self.y))

    def places(self) -> FloatArray:
        """Of the points."""
        return self.x[np.isfinite(self.x) & np.isfinite(self.y)]

    def readings(self, x: float) -> list[tuple[str, float]]:
        """The value on the line."""
        if self.stepped:
            place = int(np.searchsorted(self.x, x, side="right")) - 1
            inside = 0 <= place < len(self.x) and x <= self.x[-1] and np.isfinite(self.y[place])
            return [(self.name, float(self.y[place]))] if inside else []
        value = _at(self.x, self.y, x)
        return [] if value is None else [(self.name, value)]

    def ends(self, low: float, high: float) -> list[tuple[str, float, float]]:
        """The name beside the last point that can be seen."""
        end = _last_between(self.x, self.y, low, high)
        return [(self.name, *end)] if end else []


class Band(Series):
    """The area between two lines."""

    def __init__(self, name: str, role: str, *, strength: float, edge_names: tuple[str, str]) -> None:
        super().__init__(name, role)
        self.strength = strength
        self.edge_names = edge_names
        self.x = self.low = self.high = np.empty(0)
        self.item = QGraphicsPathItem()
        self.items = [self.item]

    @property
    def make(self) -> tuple[object, ...]:
        """Its role and manner."""
        return (*super().make, self.strength, self.edge_names)

    def set(self, x: ArrayLike, low: ArrayLike, high: ArrayLike) -> None:
        """Show other edges."""
        x, low, high = _floats(x), _floats(low), _floats(high)
        known = np.isfinite(x) & np.isfinite(low) & np.isfinite(high)
        self.x, self.low, self.high = x[known], low[known], high[known]
        upper = [QPointF(*point) for point in zip(self.x, self.high, strict=True)]
        lower = [QPointF(*point) for point in zip(self.x[::-1], self.low[::-1], strict=True)]
        path = QPainterPath()
        if upper:
            path.addPolygon(QPolygonF([*upper, *lower]))
            path.closeSubpath()
        self.item.setPath(path)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        colour = theme.fill(self.role)
        colour.setAlphaF(self.strength)
        self.item.setPen(pg.mkPen(None))
        self.item.setBrush(pg.mkBrush(colour))

    def extent(self) -> tuple[float, float, float, float]:
        """Of both edges."""
        return (*_extent(self.x), *_extent(np.concatenate((self.low, self.high))))

    def places(self) -> FloatArray:
        """Of the edges' points."""
        return self.x

    def readings(self, x: float) -> list[tuple[str, float]]:
        """Both edges."""
        pairs = zip(self._names(), (self.low, self.high), strict=True)
        found = [(name, _at(self.x, edge, x)) for name, edge in pairs]
        return [(name, value) for name, value in found if value is not None]

    def ends(self, low: float, high: float) -> list[tuple[str, float, float]]:
        """The names of the edges beside their last points."""
        result = []
        for name, edge in zip(self.edge_names, (self.low, self.high), strict=True):
            end = _last_between(self.x, edge, low, high) if name else None
            if end:
                result.append((name, *end))
        return result

    def _names(self) -> tuple[str, str]:
        low, high = self.edge_names
        return low or f"{self.name} from", high or f"{self.name} to"


class Bars(Series):
    """Bars from a base; `offset` sets several side by side about one x."""

    def __init__(self, name: str, role: str, *, offset: float) -> None:
        super().__init__(name, role)
        self.offset = offset
        self.x = self.heights = self.base = np.empty(0)
        self.width = 1.0
        self.item = pg.BarGraphItem(x=[0.0], height=[0.0], width=1.0, pen=None)
        self.items = [self.item]

    @property
    def make(self) -> tuple[object, ...]:
        """Its role and manner."""
        return (*super().make, self.offset)

    def set(self, x: ArrayLike, heights: ArrayLike, width: float, base: ArrayLike) -> None:
        """Show other bars."""
        self.x, self.heights, self.width = _floats(x), np.nan_to_num(_floats(heights)), width
        self.base = np.broadcast_to(_floats(base), self.x.shape)
        self.item.setVisible(self.x.size > 0)
        if self.x.size:
            self.item.setOpts(
                x=self.x + self.offset, height=self.heights, width=width, y0=np.array(self.base)
            )

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        self.item.setOpts(brush=pg.mkBrush(theme.fill(self.role)), pen=pg.mkPen(None))

    def extent(self) -> tuple[float, float, float, float]:
        """With the width of the outer bars."""
        left, right = _extent(self.x + self.offset)
        return (
            left - self.width / 2,
            right + self.width / 2,
            *_extent(np.concatenate((self.base, self.base + self.heights))),
        )

    def places(self) -> FloatArray:
        """The middle of each group."""
        return self.x

    def readings(self, x: float) -> list[tuple[str, float]]:
        """The height of the bar at `x`."""
        if not self.x.size:
            return []
        nearest = int(np.abs(self.x - x).argmin())
        if abs(self.x[nearest] - x) > self.width / 2 + abs(self.offset):
            return []
        return [(self.name, float(self.heights[nearest]))]


class Dots(Series):
    """Single points: quotes."""

    def __init__(self, name: str, role: str, *, symbol: str) -> None:
        super().__init__(name, role)
        self.x = self.y = np.empty(0)
        self.symbol = symbol
        # Without its cache of images it draws outlines, which an SVG file can hold.
        self.item = pg.ScatterPlotItem(size=8, symbol=symbol, antialias=True, useCache=False)
        self.items = [self.item]

    @property
    def make(self) -> tuple[object, ...]:
        """Its role and manner."""
        return (*super().make, self.symbol)

    def set(self, x: ArrayLike, y: ArrayLike) -> None:
        """Show other points."""
        self.x, self.y = _floats(x), _floats(y)
        known = np.isfinite(self.x) & np.isfinite(self.y)
        self.item.setData(self.x[known], self.y[known])

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        self.item.setPen(pen(theme.line(self.role), 1.5))
        self.item.setBrush(pg.mkBrush(theme.surface))

    def extent(self) -> tuple[float, float, float, float]:
        """Of the points."""
        return (*_extent(self.x), *_extent(self.y))

    def places(self) -> FloatArray:
        """Of the points."""
        return self.x[np.isfinite(self.x) & np.isfinite(self.y)]

    def readings(self, x: float) -> list[tuple[str, float]]:
        """The value of the point at `x` itself."""
        found = np.flatnonzero(np.isclose(self.x, x, rtol=1e-9, atol=1e-12) & np.isfinite(self.y))
        return [(self.name, float(self.y[found[0]]))] if found.size else []


class Paths(Series):
    """A bundle of thin lines, drawn as one."""

    def __init__(self, name: str, role: str, *, strength: float) -> None:
        super().__init__(name, role)
        self.strength = strength
        self.x = np.empty(0)
        self.y: NDArray[np.float64] = np.empty((0, 0))
        self.item = pg.PlotCurveItem()
        self.items = [self.item]

    @property
    def make(self) -> tuple[object, ...]:
        """Its role and manner."""
        return (*super().make, self.strength)

    def set(self, x: ArrayLike, y: ArrayLike) -> None:
        """Show other paths: `y` has shape (paths, points); the first 200 are drawn."""
        self.x, self.y = _floats(x), np.array(y, dtype=np.float64)[:_MOST_PATHS]
        connect = np.isfinite(self.y)
        connect[:, -1:] = False
        flat: dict[str, Any] = {
            "x": np.tile(self.x, len(self.y)),
            "y": np.nan_to_num(self.y).ravel(),
            "connect": connect.ravel(),
        }
        self.item.setData(**flat)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        colour: QColor = theme.fill(self.role)
        colour.setAlphaF(self.strength)
        self.item.setPen(pen(colour))

    def extent(self) -> tuple[float, float, float, float]:
        """Of all the paths."""
        return (*_extent(self.x), *_extent(self.y.ravel()))


def together(series: Sequence[Series], *, on_right: bool) -> tuple[float, float, float, float] | None:
    """The extent of several; None where there is nothing."""
    extents = np.array([each.extent() for each in series if each.on_right == on_right])
    if not extents.size or not np.isfinite(extents).any(axis=0).all():
        return None
    low, high = np.nanmin(extents, axis=0), np.nanmax(extents, axis=0)
    return float(low[0]), float(high[1]), float(low[2]), float(high[3])
