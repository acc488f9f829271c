"""Names and values in two columns, to be read and copied."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QGridLayout, QLabel, QWidget

from desk.window.parts.theme import HALF, WIDE, keep_look, soft_font

__all__ = ["Facts"]

_NAMES = 100
"""Room for the names, so that several lists line up [px]."""


class _Value(QLabel):
    """A value that may be broken anywhere: paths and digests have no spaces."""

    def __init__(self) -> None:
        super().__init__()
        self.setWordWrap(True)
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.setAlignment(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop)

    def put(self, text: str) -> None:
        """Show a value."""
        self.setToolTip(text if len(text) > 24 else "")
        # A zero-width space after each separator lets a long path go over several lines.
        self.setText(text.replace("/", "/\u200b").replace("\\", "\\\u200b").replace("_", "_\u200b"))


class Facts(QWidget):
    """A short list of facts."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._grid = QGridLayout(self)
        self._grid.setContentsMargins(0, 0, 0, 0)
        self._grid.setHorizontalSpacing(WIDE - HALF)
        self._grid.setVerticalSpacing(HALF)
        self._grid.setColumnMinimumWidth(0, _NAMES)
        self._grid.setColumnStretch(1, 1)
        self._rows: list[tuple[QLabel, _Value]] = []
        self._texts: tuple[tuple[str, str], ...] = ()

    @property
    def rows(self) -> tuple[tuple[str, str], ...]:
        """The names and values shown."""
        return self._texts

    def set_rows(self, rows: Sequence[tuple[str, str]]) -> None:
        """Show other facts."""
        while len(self._rows) < len(rows):
            place = len(self._rows)
            name, value = QLabel(), _Value()
            name.setFont(soft_font(self.font()))
            name.setTextFormat(Qt.TextFormat.PlainText)
            keep_look(name, "soft")
            self._grid.addWidget(name, place, 0, Qt.AlignmentFlag.AlignTop)
            self._grid.addWidget(value, place, 1)
            self._rows.append((name, value))
        self._texts = tuple(rows)
        for place, (name, value) in enumerate(self._rows):
            shown = place < len(rows)
            name.setVisible(shown)
            value.setVisible(shown)
            if shown:
                name.setText(rows[place][0])
                value.put(rows[place][1])
                value.setAccessibleName(": ".join(part for part in rows[place] if part))
