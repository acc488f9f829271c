"""Marks of bonds in a picture: rings and ticks, drawn at once however many there are."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyqtgraph as pg
from numpy.typing import ArrayLike
from PySide6.QtGui import QPaintEngine, QPainter, QPainterPath
from PySide6.QtWidgets import QWidget

from desk.window.parts.plot_series import Dots

__all__ = ["Marks"]

_FEW = 60
"""So many are drawn one by one, and look best so."""
_MANY = 150
"""More than so many are drawn smaller."""
_SIZES = {"tick": (14, 8)}
_USUAL_SIZES = (8, 5)
"""Of few and of many [px]."""


def _tick() -> QPainterPath:
    path = QPainterPath()
    path.moveTo(-0.5, 0.0)
    path.lineTo(0.5, 0.0)
    return path


class _Stamps(pg.ScatterPlotItem):  # type: ignore[misc]  # pyqtgraph carries no types
    """Symbols that are drawn once and stamped on the screen, and drawn as outlines into a file."""

    def paint(self, painter: QPainter, option: Any, widget: QWidget | None = None) -> None:
        """Draw them all."""
        stamped = self.opts["useCache"]
        # An SVG file can hold outlines alone, and a larger image would blur what was drawn for the screen.
        engine = painter.paintEngine()
        is_screen = (
            widget is not None
            and engine.type() is QPaintEngine.Type.Raster
            and engine.paintDevice().devicePixelRatioF() == widget.devicePixelRatioF()
        )
        self.opts["useCache"] = stamped and is_screen
        try:
            super().paint(painter, option, widget)
        finally:
            self.opts["useCache"] = stamped


class Marks(Dots):
    """Single points of many bonds, with a name in the picture where a place is given for it.

    Parameters
    ----------
    name, role : str
    symbol : str
        One of `Dots`, or ``tick``: a short level line.
    """

    def __init__(self, name: str, role: str, *, symbol: str) -> None:
        super().__init__(name, role, symbol="o")
        self.symbol = symbol
        self._place: tuple[float, float] | None = None
        self.item = _Stamps(symbol=_tick() if symbol == "tick" else symbol, antialias=True)
        self.items = [self.item]

    def set(self, x: ArrayLike, y: ArrayLike, *, name_at: tuple[float, float] | None = None) -> None:
        """Show other points; `name_at` is where the name begins."""
        self._place = name_at
        count = np.size(x)
        few, many = _SIZES.get(self.symbol, _USUAL_SIZES)
        self.item.setSize(many if count > _MANY else few, update=False)
        self.item.opts["useCache"] = count > _FEW
        super().set(x, y)

    def extent(self) -> tuple[float, float, float, float]:
        """Of the points, and of the place of the name."""
        left, right, low, high = super().extent()
        if self._place is None:
            return left, right, low, high
        return left, right, float(np.fmin(low, self._place[1])), float(np.fmax(high, self._place[1]))

    def ends(self, low: float, high: float) -> list[tuple[str, float, float]]:
        """The name, at its place."""
        if self._place is None or not low <= self._place[0] <= high:
            return []
        return [(self.name, *self._place)]
