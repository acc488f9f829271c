"""Widgets as picture files."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QPoint, QRect, QSaveFile
from PySide6.QtGui import QImage, QPainter
from PySide6.QtSvg import QSvgGenerator
from PySide6.QtWidgets import QWidget

__all__ = ["picture_image", "write_picture"]


def picture_image(widget: QWidget, *, ratio: float = 2.0) -> QImage:
    """`widget` at `ratio` times its size on screen."""
    image = QImage(widget.size() * ratio, QImage.Format.Format_RGB32)
    image.setDevicePixelRatio(ratio)
    image.fill(widget.palette().base().color())
    painter = QPainter(image)
    widget.render(painter, QPoint())
    painter.end()
    return image


def write_picture(widget: QWidget, path: Path, *, title: str = "", description: str = "") -> None:
    """Write `widget` to a ``.png`` or ``.svg`` file, whole or not at all.

    Raises
    ------
    ValueError
        If the name ends in neither.
    OSError
        If it cannot be written.
    """
    content = QByteArray()
    buffer = QBuffer(content)
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    kind = path.suffix.casefold()
    if kind == ".png":
        picture_image(widget).save(buffer, "PNG")  # type: ignore[call-overload]  # the stubs want bytes
    elif kind == ".svg":
        generator = QSvgGenerator()
        generator.setOutputDevice(buffer)
        # Without the resolution of the widget its texts come out of size and out of place.
        generator.setResolution(widget.logicalDpiX())
        generator.setSize(widget.size())
        generator.setViewBox(QRect(QPoint(), widget.size()))
        generator.setTitle(title)
        generator.setDescription(description)
        painter = QPainter(generator)
        painter.fillRect(widget.rect(), widget.palette().base())
        widget.render(painter, QPoint())
        painter.end()
    else:
        raise ValueError(f"`path` must end in .png or .svg, not {path.suffix or 'nothing'}")
    buffer.close()
    file = QSaveFile(str(path))
    if not file.open(QIODevice.OpenModeFlag.WriteOnly):
        raise OSError(f"{path.name}: {file.errorString()}")
    file.write(content)
    if not file.commit():
        raise OSError(f"{path.name}: {file.errorString()}")
