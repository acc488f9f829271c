"""The canvas of a picture: axes, series, their names, and moving about."""

from __future__ import annotations

import html
import math
from collections.abc import Mapping
from typing import TypeVar

import pyqtgraph as pg
from numpy.typing import ArrayLike
from PySide6.QtCore import QPointF, Qt, QTimer
from PySide6.QtGui import QBrush, QFontMetricsF, QShowEvent
from PySide6.QtWidgets import QGraphicsSimpleTextItem, QHBoxLayout, QLabel, QVBoxLayout, QWidget

from desk.window.parts.plot_names import SIDE, Name, boxes_of
from desk.window.parts.plot_parts import pen, plot_from_store
from desk.window.parts.plot_scale import Scale, with_room
from desk.window.parts.plot_series import Band, Bars, Dots, Line, Paths, Series, together
from desk.window.parts.theme import GAP, HALF, Theme, ThemeSwitch, keep_look, mixed, soft_font

__all__ = ["Canvas"]

AnySeries = TypeVar("AnySeries", bound=Series)

_SHADE_ROOM = 0.1
"""Part of the height kept free at the top for the words over a tinted part."""


class Canvas(QWidget):
    """Series over one x axis, with one y axis or two.

    Adding under a name that is there already changes what is shown under it. Roles are those of `Theme`.
    """

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._theme: Theme = theme_switch.theme
        self._series: dict[str, Series] = {}
        self._verticals: dict[str, tuple[float, pg.InfiniteLine]] = {}
        self._shade: tuple[float, str, pg.LinearRegionItem] | None = None
        self._x, self._y, self._right = Scale(), Scale(), Scale()
        self._has_right = self._right_is_alike = False
        self._zero_wanted = False
        self._fixed: dict[str, tuple[float, float]] = {}
        self._home: tuple[float, float, float, float] | None = None
        self._home_right: tuple[float, float] | None = None
        self._is_home = True
        self._room = 0.0
        self._names: list[QGraphicsSimpleTextItem] = []

        self._y_heading, self._key, self._right_heading = QLabel(), QLabel(), QLabel()
        for label in (self._y_heading, self._key, self._right_heading):
            keep_look(label, "soft")
            label.setFont(soft_font(self.font()))
        self._key.setTextFormat(Qt.TextFormat.RichText)
        headings = QHBoxLayout()
        headings.setSpacing(2 * GAP)
        headings.addWidget(self._y_heading)
        headings.addStretch(1)
        headings.addWidget(self._key)
        headings.addWidget(self._right_heading)
        self.plot = plot_from_store()
        self.setFocusProxy(self.plot)
        self._column = QVBoxLayout()
        self._column.setSpacing(HALF)
        self._column.addLayout(headings)
        self._column.addWidget(self.plot, 1)

        self._item = self.plot.getPlotItem()
        self._box = self._item.getViewBox()
        self._right_box = pg.ViewBox(enableMenu=False)
        # It stands beside the whole plot in the scene, not in it as the left box does.
        self._right_box.setZValue(self._item.zValue() + 1)
        self._right_box.setMouseEnabled(x=False, y=False)
        # The box over the plot only draws: the pointer belongs to the box beneath.
        self._right_box.setAcceptedMouseButtons(Qt.MouseButton.NoButton)
        self._right_box.setAcceptHoverEvents(False)
        self._right_box.disableAutoRange()
        self._zero = pg.InfiniteLine(0, angle=0)
        self._cursor = pg.InfiniteLine(0, angle=90)
        for line, height in ((self._zero, 8), (self._cursor, 50)):
            line.setZValue(height)
            line.setVisible(False)
            self._item.addItem(line, ignoreBounds=True)

        self._settling = QTimer(self, singleShot=True, interval=0)
        self._settling.timeout.connect(self.settle)
        self._naming = QTimer(self, singleShot=True, interval=0)
        self._naming.timeout.connect(self._place_names)
        self._box.sigRangeChangedManually.connect(self._on_zoomed)
        self._box.sigRangeChanged.connect(lambda *_: self._naming.start())
        # It can move and keep its size, where one axis gets wider by what the other one gives up.
        self._box.geometryChanged.connect(self._on_resized)
        theme_switch.changed.connect(self._on_theme)
        self._recolour()

    # Axes

    def set_axes(
        self,
        x_label: str,
        x_unit: str,
        y_label: str,
        y_unit: str,
        *,
        y_kind: str = "number",
        y_digits: int | None = None,
        x_kind: str = "number",
        x_digits: int | None = None,
        with_zero: bool = False,
    ) -> None:
        """Name the axes.

        Parameters
        ----------
        x_label, y_label : str
        x_unit, y_unit : str
            The unit of the values as they are handed over.
        y_kind, x_kind : str
            ``number``; ``money``, shown in thousands, millions or more, as its unit then says; or ``rate``, a
            fraction shown in percent.
        y_digits, x_digits : int, optional
            Decimals in the reading; the ticks have what they need.
        with_zero : bool
            Whether the y axis always reaches zero.
        """
        for scale, label, unit, kind, digits in (
            (self._x, x_label, x_unit, x_kind, x_digits),
            (self._y, y_label, y_unit, y_kind, y_digits),
        ):
            scale.label, scale.unit, scale.kind, scale.digits = label, unit, kind, digits
        self._zero_wanted = with_zero
        self._changed()

    def set_right_axis(
        self,
        label: str,
        unit: str,
        *,
        kind: str = "number",
        digits: int | None = None,
        alike: bool = False,
    ) -> None:
        """Have a second y axis, for the lines that ask for it.

        With `alike` it is in thousands, millions or more as the left-hand axis is, whose heading says so.
        """
        right = self._right
        self._right_is_alike = alike
        right.label, right.unit, right.kind, right.digits = label, unit, kind, digits
        if not self._has_right:
            self._has_right = True
            self._item.showAxis("right")
            self._item.scene().addItem(self._right_box)
            self.plot.axes["right"].linkToView(self._right_box)
            self._right_box.setXLink(self._box)
            self._on_resized()
        self._recolour()
        self._changed()

    def set_x_names(self, names: Mapping[float, str]) -> None:
        """Show words at the places given instead of figures: an axis of categories."""
        self.plot.axes["bottom"].set_names(dict(names))
        self._changed()

    def set_range(
        self, *, x: tuple[float, float] | None = None, y: tuple[float, float] | None = None
    ) -> None:
        """Show this range at first; None for all there is."""
        self._fixed = {name: span for name, span in (("x", x), ("y", y)) if span is not None}
        self._is_home = True
        self._changed()

    # Series

    def add_line(
        self,
        name: str,
        x: ArrayLike,
        y: ArrayLike,
        role: str,
        *,
        dashed: bool = False,
        stepped: bool = False,
        strong: bool = True,
        right: bool = False,
    ) -> None:
        """A line; `stepped` holds each value up to the next x, `right` measures it on the right-hand axis."""
        made = Line(name, role, dashed=dashed, stepped=stepped, strong=strong, on_right=right)
        self._put(made, 20).set(x, y)

    def add_band(
        self,
        name: str,
        x: ArrayLike,
        low: ArrayLike,
        high: ArrayLike,
        role: str,
        strength: float = 0.2,
        *,
        edge_names: tuple[str, str] = ("", ""),
    ) -> None:
        """The area between `low` and `high`; laid over each other, bands of one role make a fan.

        `edge_names` stand beside the ends of the two edges and before their values in the reading.
        """
        self._put(Band(name, role, strength=strength, edge_names=edge_names), 0).set(x, low, high)

    def add_bars(
        self,
        name: str,
        x: ArrayLike,
        heights: ArrayLike,
        role: str,
        *,
        width: float = 0.8,
        base: ArrayLike = 0.0,
        offset: float = 0.0,
    ) -> None:
        """Bars about `x` + `offset`; read at `x`."""
        self._put(Bars(name, role, offset=offset), 5).set(x, heights, width, base)

    def add_dots(self, name: str, x: ArrayLike, y: ArrayLike, role: str, *, symbol: str = "o") -> None:
        """Single points; `symbol` is ``o``, ``s``, ``t``, ``d`` or ``x``."""
        self._put(Dots(name, role, symbol=symbol), 30).set(x, y)

    def add_paths(
        self, name: str, x: ArrayLike, paths: ArrayLike, role: str, *, strength: float = 0.35
    ) -> None:
        """Up to 200 thin lines, `paths` of shape (paths, points), which have no reading."""
        self._put(Paths(name, role, strength=strength), 10).set(x, paths)

    def add_vertical(self, x: float, label: str) -> None:
        """A dashed line at `x` with a name at its top."""
        if label in self._verticals:
            self._item.removeItem(self._verticals[label][1])
        line = pg.InfiniteLine(x, angle=90)
        line.setZValue(15)
        self._item.addItem(line, ignoreBounds=True)
        self._verticals[label] = (x, line)
        self._recolour()
        self._changed()

    def shade_from(self, x: float | None, label: str = "") -> None:
        """Tint what lies beyond `x`; None for nothing."""
        if self._shade is not None:
            self._item.removeItem(self._shade[2])
            self._shade = None
        if x is not None:
            region = pg.LinearRegionItem((x, x + 1), movable=False)
            region.setZValue(-10)
            for line in region.lines:
                line.setPen(pg.mkPen(None))
            self._item.addItem(region, ignoreBounds=True)
            self._shade = (x, label, region)
        self._recolour()
        self._changed()

    def remove(self, name: str) -> None:
        """Take out the series or the vertical line of this name, if it is there."""
        series = self._series.pop(name, None)
        if series is not None:
            for item in series.items:
                (self._right_box if series.on_right else self._item).removeItem(item)
        vertical = self._verticals.pop(name, None)
        if vertical is not None:
            self._item.removeItem(vertical[1])
        self._changed()

    def clear(self) -> None:
        """Take out everything but the axes."""
        for name in (*self._series, *self._verticals):
            self.remove(name)
        self.shade_from(None)
        self._is_home = True

    @property
    def names(self) -> tuple[str, ...]:
        """The names of the series shown."""
        return tuple(self._series)

    def _put(self, made: AnySeries, height: int) -> AnySeries:
        """The series to fill: the one of that name if it is of the same make, otherwise the new one."""
        there = self._series.get(made.name)
        self._changed()
        same = {
            key: value for key, value in vars(made).items() if isinstance(value, bool | float | str | tuple)
        }
        if isinstance(there, type(made)) and all(
            vars(there).get(key) == value for key, value in same.items() if key != "width"
        ):
            return there
        if there is not None:
            self.remove(made.name)
        self._series[made.name] = made
        for item in made.items:
            item.setZValue(height)
            if made.on_right:
                self._right_box.addItem(item, ignoreBounds=True)
            else:
                self._item.addItem(item, ignoreBounds=True)
        return made

    # Drawing

    def _changed(self) -> None:
        self._settling.start()

    def settle(self) -> None:
        """Bring scales, ranges, names and colours up to date with the series; done by itself when idle."""
        self._settling.stop()
        series = list(self._series.values())
        extent = together(series, on_right=False)
        right = together(series, on_right=True) if self._has_right else None
        if extent is None and right is not None:
            extent = (right[0], right[1], 0.0, 1.0)
        if extent is not None:
            left, stop, low, high = extent
            if right is not None:
                left, stop = min(left, right[0]), max(stop, right[1])
            if self._zero_wanted:
                low, high = min(low, 0.0), max(high, 0.0)
            self._y.fit(low, high)
            self._x.fit(left, stop)
            low, high = with_room(low, high)
            if self._shade is not None and self._shade[1]:
                high += _SHADE_ROOM * (high - low)
            low, high = self._fixed.get("y", (low, high))
            left, stop = self._fixed.get("x", (left, stop) if stop > left else (left - 0.5, stop + 0.5))
            self._home = (left, stop, low, high)
            self._zero.setVisible(low < 0 < high)
            if self._shade is not None:
                self._shade[2].setRegion((self._shade[0], max(stop, self._shade[0]) + 2 * (stop - left)))
        if right is not None:
            if self._right_is_alike:
                self._right.scale = self._y.scale
            else:
                self._right.fit(right[2], right[3])
            self._home_right = with_room(min(right[2], 0.0), right[3])
            self._right_box.setYRange(*self._home_right, padding=0)
        self._head()
        self._recolour()
        self._make_room()
        if self._is_home:
            self._go_home()
        self._place_names()

    def _head(self) -> None:
        axes = self.plot.axes
        axes["left"].factor, axes["right"].factor = self._y.factor, self._right.factor
        axes["bottom"].factor = self._x.factor
        for axis in axes.values():
            axis.picture = None
            axis.update()
        axes["bottom"].setLabel(self._x.heading)
        self._y_heading.setText(self._y.heading)
        beside = self._right.label if self._right_is_alike else self._right.heading
        self._right_heading.setText(beside if self._has_right else "")
        self._right_heading.setVisible(self._has_right)
        bars = [series for series in self._series.values() if isinstance(series, Bars)]
        self._key.setText(
            "&nbsp;&nbsp; ".join(
                f'<span style="color:{self._theme.fill(series.role).name()}">■</span>'
                f"&nbsp;{html.escape(series.name)}"
                for series in bars
            )
        )
        self._key.setVisible(bool(bars))

    def _recolour(self) -> None:
        theme = self._theme
        self.plot.paint_in(theme)
        for series in self._series.values():
            series.paint_in(theme)
        self._zero.setPen(pen(theme.ink_soft))
        self._cursor.setPen(pen(theme.ink_soft))
        for _, line in self._verticals.values():
            line.setPen(pen(theme.ink_soft, dashed=True))
        if self._shade is not None:
            # A tint and no hatching: an SVG file holds a hatch only as an image.
            tint = QBrush(mixed(theme.surface, theme.ink_soft, 0.09))
            self._shade[2].setBrush(tint)
            self._shade[2].setHoverBrush(tint)

    def _on_theme(self, theme: Theme) -> None:
        self._theme = theme
        self.settle()

    def _on_resized(self) -> None:
        self._right_box.setGeometry(self._box.sceneBoundingRect())
        if self._is_home and self._has_right:
            self._go_home()
        self._naming.start()

    def _view(self) -> tuple[float, float, float, float]:
        (left, stop), (low, high) = self._box.viewRange()
        return left, stop, low, high

    def _wanted_names(self, left: float, stop: float, low: float, high: float) -> list[Name]:
        """The names that belong into a view from `left` to `stop` and `low` to `high`."""
        result = []
        for series in self._series.values():
            for text, x, y in series.ends(left, stop):
                if series.on_right and self._home_right is not None:
                    bottom, top = self._home_right
                    y = low + (y - bottom) / (top - bottom) * (high - low)
                if low <= y <= high:
                    result.append(Name(text, series.role, x, y))
        for label, (x, _) in self._verticals.items():
            if left <= x <= stop:
                result.append(Name(label, "ink_soft", x, high, at_top=True))
        if self._shade is not None and self._shade[1] and self._shade[0] < stop:
            result.append(Name(self._shade[1], "ink_soft", max(self._shade[0], left), high, at_top=True))
        return result

    def _place_names(self) -> None:
        """Write the names beside the ends of their series."""
        self._naming.stop()
        for item in self._names:
            self._item.scene().removeItem(item)
        self._names = []
        names = self._wanted_names(*self._view())
        area = self._box.mapRectToItem(self._item, self._box.boundingRect())
        ends = [self._item.mapFromScene(self._box.mapViewToScene(QPointF(name.x, name.y))) for name in names]
        font = soft_font(self.font())
        for name, box in zip(names, boxes_of(names, ends, area, QFontMetricsF(font)), strict=True):
            item = QGraphicsSimpleTextItem(name.text, self._item)
            item.setFont(font)
            item.setBrush(self._theme.text(name.role))
            item.setPos(box.topLeft())
            item.setZValue(60)
            self._names.append(item)

    def _make_room(self) -> None:
        """Keep room for the names: beside the drawing area, or in it if the right-hand axis stands there."""
        if self._home is None:
            return
        metrics = QFontMetricsF(soft_font(self.font()))
        names = self._wanted_names(*self._home)
        widest = max((metrics.horizontalAdvance(name.text) for name in names if not name.at_top), default=0.0)
        self._room = math.ceil(widest + SIDE + HALF) if widest else GAP + HALF
        self._item.layout.setContentsMargins(0, GAP, HALF if self._has_right else self._room, 0)
        self._item.layout.activate()

    # Moving about

    def reset_view(self) -> None:
        """Show the whole picture again."""
        self._is_home = True
        self.settle()

    def zoom(self, factor: float, *, about: float | None = None) -> None:
        """Show `factor` times as much of the x axis, about a place or the middle."""
        self._is_home = False
        left, stop, _, _ = self._view()
        middle = (left + stop) / 2 if about is None else about
        self._box.setXRange(middle - (middle - left) * factor, middle + (stop - middle) * factor, padding=0)

    def _go_home(self) -> None:
        if self._home is None:
            return
        left, stop, low, high = self._home
        across = self._box.boundingRect().width()
        if self._has_right and across > 2 * self._room:
            stop += (stop - left) * self._room / (across - self._room)
        wide, tall = stop - left, high - low
        self._box.setLimits(
            xMin=left - wide, xMax=stop + wide, yMin=low - tall, yMax=high + tall, minXRange=wide / 1e4
        )
        self._box.setRange(xRange=(left, stop), yRange=(low, high), padding=0)

    def _on_zoomed(self) -> None:
        self._is_home = False

    def showEvent(self, event: QShowEvent) -> None:
        """Have everything in its place from the first sight on."""
        super().showEvent(event)
        self.settle()
