"""The clipboard."""

from __future__ import annotations

import atexit

from PySide6.QtCore import QMimeData
from PySide6.QtGui import QGuiApplication

__all__ = ["put_table"]

_is_watched = False


def put_table(text: str, markup: str) -> None:
    """Put a table on the clipboard, as plain text and as HTML."""
    global _is_watched
    data = QMimeData()
    data.setText(text)
    data.setHtml(markup)
    QGuiApplication.clipboard().setMimeData(data)
    if not _is_watched:
        atexit.register(_leave_plain_text)
        _is_watched = True


def _leave_plain_text() -> None:
    """Leave nothing on the clipboard that Python made.

    WORKAROUND, seen with PySide6 6.11.3 on the offscreen platform: Qt deletes such data after the
    interpreter is gone, and the process ends in a segmentation fault.
    """
    if QGuiApplication.instance() is not None:
        clipboard = QGuiApplication.clipboard()
        clipboard.setText(clipboard.text())
