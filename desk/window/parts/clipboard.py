"""The clipboard, and rows on their way to it."""

from __future__ import annotations

import atexit
import csv
import html
import io
from collections.abc import Callable, Sequence

from PySide6.QtCore import QMimeData, QObject, Qt, QTimer, Signal
from PySide6.QtGui import QGuiApplication

from desk.window.parts import numbers

__all__ = ["RowCopier", "put_table"]

Lines = Sequence[Sequence[str]]

_is_watched = False
_AT_ONCE = 4_000
"""Rows that are copied in one turn of the event loop; more are copied in several."""


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


class RowCopier(QObject):
    """Copies rows of a table, many of them in several turns, so that the window stays awake.

    Signals
    -------
    message(str)
        What is being copied, and what was.
    """

    message = Signal(str)

    def __init__(self, parent: QObject) -> None:
        super().__init__(parent)
        self._timer = QTimer(self, interval=0)
        self._timer.timeout.connect(self._copy_part)
        self._rows: Sequence[int] = ()
        self._place = 0
        self._lines_of: Callable[[Sequence[int]], Lines] = lambda _: ()
        self._tags: Sequence[str] = ()
        self._plain = io.StringIO()
        self._markup: list[str] = []

    @property
    def is_busy(self) -> bool:
        """Whether rows are still on their way."""
        return self._timer.isActive()

    def copy(
        self,
        rows: Sequence[int],
        lines_of: Callable[[Sequence[int]], Lines],
        *,
        tags: Sequence[str],
        headings: Sequence[str] = (),
    ) -> None:
        """Put rows on the clipboard; those of an earlier call that are still on their way are dropped.

        Parameters
        ----------
        rows : sequence of int
        lines_of : callable
            The texts of some of them, a line a row.
        tags : sequence of str
            The opening HTML tag of a cell in each column.
        headings : sequence of str, optional
            Go over the rows.
        """
        self.stop()
        self._rows, self._lines_of, self._tags, self._place = rows, lines_of, tags, 0
        self._plain, self._markup = io.StringIO(), ["<table>"]
        if headings:
            csv.writer(self._plain, dialect="excel-tab", lineterminator="\n").writerow(headings)
            cells = "".join(f"<th>{html.escape(text)}</th>" for text in headings)
            self._markup.append(f"<tr>{cells}</tr>")
        if len(rows) > _AT_ONCE:
            self.message.emit(f"Copying {numbers.integer(len(rows))} rows…")
            QGuiApplication.setOverrideCursor(Qt.CursorShape.BusyCursor)
            self._timer.start()
        else:
            self._copy_part()

    def stop(self) -> None:
        """Drop what is still on its way; the clipboard stays as it is."""
        if self._timer.isActive():
            self._timer.stop()
            QGuiApplication.restoreOverrideCursor()
        self._rows = ()

    def _copy_part(self) -> None:
        rows = self._rows[self._place : self._place + _AT_ONCE]
        self._place += len(rows)
        lines = self._lines_of(rows)
        csv.writer(self._plain, dialect="excel-tab", lineterminator="\n").writerows(lines)
        for line in lines:
            cells = "".join(
                f"{tag}{html.escape(text)}</td>" for tag, text in zip(self._tags, line, strict=True)
            )
            self._markup.append(f"<tr>{cells}</tr>")
        if self._place < len(self._rows):
            return
        count = len(self._rows)
        self.stop()
        put_table(self._plain.getvalue(), "".join((*self._markup, "</table>")))
        self._plain, self._markup = io.StringIO(), []
        self.message.emit(f"Copied {numbers.integer(count)} {'row' if count == 1 else 'rows'}.")
