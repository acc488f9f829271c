"""Axes and drawing area of a picture."""

from __future__ import annotations

import math
from collections.abc import Sequence

import pyqtgraph as pg
from PySide6.QtCore import QEvent, QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QColor, QKeyEvent, QMouseEvent, QPen, QWheelEvent
from PySide6.QtWidgets import QWidget

from desk.window.parts import numbers
from desk.window.parts.theme import Theme, mixed, soft_font

__all__ = ["Axis", "Plot", "clear_store", "pen", "plain_digits", "plot_from_store", "store_plot"]


_OVER = 12
"""Figures at the ends of an axis may stand this far out [px]."""


def plain_digits(step: float) -> int:
    """Decimals that tell figures apart which lie `step` from each other."""
    if not math.isfinite(step) or step <= 0:
        return 0
    for digits in range(12):
        if abs(round(step, digits) - step) <= step * 1e-6:
            return digits
    return 12


class Axis(pg.AxisItem):
    """An axis whose figures are in the reader's locale and in a stated unit.

    Attributes
    ----------
    factor : float
        What is shown is the value times this.
    names : dict of float to str
        Words in the place of figures, for an axis of categories.
    """

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.factor = 1.0
        self.names: dict[float, str] = {}
        self.enableAutoSIPrefix(False)
        self.setStyle(
            tickLength=0 if orientation != "bottom" else 4,
            tickTextOffset=6,
            maxTickLevel=0,
            hideOverlappingLabels=False,
        )

    def set_names(self, names: dict[float, str]) -> None:
        """Show words at the places given."""
        self.names = dict(names)
        self.setTicks([list(self.names.items())] if self.names else None)

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:
        """Figures for the ticks."""
        digits = plain_digits(spacing * self.factor)
        return [numbers.number(value * self.factor, digits) for value in values]

    def resizeEvent(self, event: object = None) -> None:
        """Keep the heading under the axis whole: it would hang out by the depth of its letters."""
        super().resizeEvent(event)
        if self.orientation == "bottom" and self.label is not None:
            lowest = self.size().height() - self.label.boundingRect().height() + 2
            self.label.setY(min(self.label.y(), lowest))

    def boundingRect(self) -> QRectF:
        """With room for the figures at its ends, which a ruled axis would leave out."""
        rect: QRectF = super().boundingRect()
        return rect.adjusted(0, -_OVER, 0, _OVER) if self.grid is not False else rect

    def paint_in(self, theme: Theme, *, ruled: bool, lined: bool) -> None:
        """Take the colours of `theme`, with lines across the area or along the axis."""
        line = mixed(theme.hairline, theme.ink_soft, 0.5)
        self.setPen(pg.mkPen(line) if lined else pg.mkPen(None))
        self.setTickPen(pg.mkPen(mixed(theme.surface, theme.hairline, 0.8) if ruled else line))
        self.setTextPen(pg.mkPen(theme.ink_soft))
        self.setGrid(255 if ruled else False)


class Plot(pg.PlotWidget):
    """The drawing area: the wheel scrolls the page unless the area has the keyboard or Ctrl is held.

    Signals
    -------
    pointed(QPointF)
        The pointer is at this place of the view.
    left()
        The pointer went away.
    key_pressed(QKeyEvent)
    """

    pointed = Signal(object)
    left = Signal()
    key_pressed = Signal(object)

    def __init__(self, parent: QWidget | None = None) -> None:
        self.axes = {place: Axis(place) for place in ("left", "right", "bottom")}
        super().__init__(parent, axisItems=self.axes, enableMenu=False)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setFrameShape(self.Shape.NoFrame)
        self.setMinimumSize(160, 96)
        # A cached ground would come into an SVG file as an image.
        self.setCacheMode(self.CacheModeFlag.CacheNone)
        self.hideButtons()
        item = self.getPlotItem()
        item.hideAxis("right")
        item.getViewBox().disableAutoRange()
        for axis in self.axes.values():
            axis.setTickFont(soft_font(self.font()))
            # Beneath the box of the series, so that the rules do not cross its bars.
            axis.setZValue(item.getViewBox().zValue() - 1)

    def paint_in(self, theme: Theme) -> None:
        """Take the colours of `theme`."""
        self.setBackground(theme.surface)
        self.axes["left"].paint_in(theme, ruled=True, lined=False)
        self.axes["right"].paint_in(theme, ruled=False, lined=False)
        self.axes["bottom"].paint_in(theme, ruled=False, lined=True)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Zoom, or leave the wheel to the page."""
        if self.hasFocus() or event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            super().wheelEvent(event)
        else:
            event.ignore()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Tell where the pointer is."""
        super().mouseMoveEvent(event)
        box = self.getPlotItem().getViewBox()
        scene = self.mapToScene(event.position().toPoint())
        if box.sceneBoundingRect().contains(scene):
            self.pointed.emit(QPointF(box.mapSceneToView(scene)))
        else:
            self.left.emit()

    def leaveEvent(self, event: QEvent) -> None:
        """Tell that the pointer went away."""
        super().leaveEvent(event)
        self.left.emit()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Hand the keys on; those nobody takes go to the page."""
        event.ignore()
        self.key_pressed.emit(event)


_store: list[Plot] = []
"""Areas made while there was time."""


def store_plot() -> None:
    """Make an area ahead: it takes longer than anything else in a station."""
    _store.append(Plot())


def plot_from_store() -> Plot:
    """An area, one made ahead where there is one."""
    return _store.pop() if _store else Plot()


def clear_store() -> None:
    """Let go of what was made ahead."""
    _store.clear()


def pen(colour: QColor, width: float = 1.0, *, dashed: bool = False) -> QPen:
    """A pen whose width does not grow with the view."""
    made: QPen = pg.mkPen(colour, width=width, cosmetic=True)
    if dashed:
        made.setStyle(Qt.PenStyle.DashLine)
    return made
