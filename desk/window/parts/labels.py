"""Labels that fit where they are put."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QLabel, QSizePolicy, QWidget

__all__ = ["ElidedLabel", "well_broken"]

_FIRM = "\N{NO-BREAK SPACE}"
_SHORT = 24
"""The last words of a text stay together up to this many characters."""
_RANGES = ("Usual: ", "Allowed: ")


def well_broken(text: str) -> str:
    """`text` for a narrow column: a range stays whole, and no line holds a single short word.

    Parameters
    ----------
    text : str
        In plain sentences.

    Returns
    -------
    str
        The same with spaces that do not break in some places.
    """
    start = max(text.rfind(word) for word in _RANGES)
    if start >= 0 and len(text) - start <= 2 * _SHORT:
        return text[:start] + text[start:].replace(" ", _FIRM)
    words = text.split(" ")
    if len(words) > 3 and len(words[-2]) + len(words[-1]) < _SHORT:
        return " ".join((*words[:-2], f"{words[-2]}{_FIRM}{words[-1]}"))
    return text


class ElidedLabel(QLabel):
    """A line or two that give way: what does not fit is left out and stands in the tooltip.

    Parameters
    ----------
    text : str, optional
    parent : QWidget, optional
    lines : int, optional
        At most so many.
    """

    def __init__(self, text: str = "", parent: QWidget | None = None, *, lines: int = 1) -> None:
        super().__init__(parent)
        self._most = lines
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Fixed)
        self.set_text(text)

    def set_text(self, text: str) -> None:
        """Show `text`."""
        # A space keeps the height of the line.
        self.setText(text or " ")
        self.setAccessibleName(text)
        self._fit()

    @property
    def shown(self) -> tuple[str, ...]:
        """The lines as they are seen."""
        metrics, wide = self.fontMetrics(), self.contentsRect().width()
        rest = self.text()
        lines: list[str] = []
        while len(lines) < self._most - 1 and metrics.horizontalAdvance(rest) > wide:
            words = rest.split(" ")
            count = len(words) - 1
            while count > 0 and metrics.horizontalAdvance(" ".join(words[:count])) > wide:
                count -= 1
            if count == 0:
                break
            lines.append(" ".join(words[:count]))
            rest = " ".join(words[count:])
        lines.append(metrics.elidedText(rest, Qt.TextElideMode.ElideRight, wide))
        return tuple(lines)

    def _fit(self) -> None:
        shown = self.shown
        self.setToolTip("" if " ".join(shown) == self.text() else self.text())
        if self._most > 1:
            self.setFixedHeight(len(shown) * self.fontMetrics().height())

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Have the lines that the width asks for."""
        super().resizeEvent(event)
        self._fit()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw as much as fits."""
        painter = QPainter(self)
        painter.setFont(self.font())
        painter.setPen(self.palette().windowText().color())
        flags = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter
        painter.drawText(self.contentsRect(), int(flags), "\n".join(self.shown))
