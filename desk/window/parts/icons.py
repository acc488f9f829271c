"""The program's own icons: drawings of one colour, tinted to the theme."""

from __future__ import annotations

from functools import lru_cache

from PySide6.QtCore import QByteArray, QRectF, Qt
from PySide6.QtGui import QColor, QIcon, QPainter, QPixmap
from PySide6.QtSvg import QSvgRenderer

from desk.places import resources
from desk.window.parts.theme import Theme, mixed

__all__ = ["app_icon", "icon", "paint_icon"]

_SIZES = (16, 20, 24, 32, 48)


@lru_cache(maxsize=64)
def _drawing(name: str) -> str:
    path = resources() / "icons" / f"{name}.svg"
    # Installed without its resources: the words beside each icon say the same.
    return path.read_text(encoding="utf-8") if path.is_file() else ""


@lru_cache(maxsize=256)
def _renderer(name: str, colour: str) -> QSvgRenderer:
    drawing = _drawing(name).replace("currentColor", colour)
    return QSvgRenderer(QByteArray(drawing.encode())) if drawing else QSvgRenderer()


def paint_icon(painter: QPainter, name: str, place: QRectF, colour: QColor) -> None:
    """Draw an icon in one colour."""
    renderer = _renderer(name, colour.name())
    if renderer.isValid():
        renderer.render(painter, place)


def _pixmap(name: str, side: int, colour: QColor) -> QPixmap:
    pixmap = QPixmap(side, side)
    pixmap.fill(Qt.GlobalColor.transparent)
    painter = QPainter(pixmap)
    paint_icon(painter, name, QRectF(0, 0, side, side), colour)
    painter.end()
    return pixmap


def icon(name: str, theme: Theme) -> QIcon:
    """An icon for menus and buttons, fainter where they are switched off."""
    made = QIcon()
    for side in (*_SIZES, *(2 * side for side in _SIZES)):
        made.addPixmap(_pixmap(name, side, theme.ink_soft), QIcon.Mode.Normal)
        made.addPixmap(_pixmap(name, side, mixed(theme.ink_soft, theme.ground, 0.4)), QIcon.Mode.Disabled)
    return made


def app_icon() -> QIcon:
    """The program's sign."""
    made = QIcon()
    for side in (16, 24, 32, 48, 64, 128, 256):
        made.addPixmap(_pixmap("gapwright", side, QColor("black")))
    return made
