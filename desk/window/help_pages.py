"""What the window says of itself: what the program does, its keys, its versions."""

from __future__ import annotations

from html import escape

from PySide6.QtCore import Qt
from PySide6.QtGui import QFontMetrics
from PySide6.QtWidgets import QDialog, QDialogButtonBox, QTextBrowser, QVBoxLayout, QWidget

from desk.report.wording import CAUTION
from desk.window.errors import versions
from desk.window.parts.theme import GAP, WIDE
from desk.window.stations import StationEntry

__all__ = ["HelpPage", "about", "keys", "what_it_does"]


def what_it_does(stations: tuple[StationEntry, ...]) -> str:
    """What the program does, station by station, as HTML."""
    rows = "".join(
        f"<tr><td><b>{escape(entry.title)}</b>&nbsp;&nbsp;</td><td>{escape(entry.purpose)}.</td></tr>"
        for entry in stations
    )
    return (
        "<h2>What this program does</h2>"
        "<p>It values promised payments and the assets held for them at one date and on one basis, shows "
        "how both "
        "sides move with interest rates, draws rate scenarios, and writes all of it into a workbook in "
        "which every "
        "figure can be checked.</p>"
        f"<table cellspacing='0' cellpadding='2'>{rows}</table>"
        "<p>The figures along the top are those of the open book. Press one to see the rows that make it up. "
        "Where a figure does not belong to the book as it stands, the headline says so.</p>"
        f"<p>{escape(CAUTION)}</p>"
    )


def keys(stations: tuple[StationEntry, ...]) -> str:
    """The keys, as HTML."""
    pairs = [(f"Alt+{entry.number}", f"Station {entry.title}") for entry in stations]
    pairs += [
        ("F6, Shift+F6", "Next and former part of the window: rail, headline, station, foot"),
        ("Ctrl+O", "Open a workbook"),
        ("F5", "Read the workbook again"),
        ("Ctrl+S", "Save; the first time, asks where"),
        ("Ctrl+Shift+S", "Save a copy somewhere else"),
        ("Ctrl+R", "In Scenarios: run"),
        ("Ctrl+E", "Export the report"),
        ("Ctrl+Z, Ctrl+Shift+Z", "Undo and redo"),
        ("Ctrl+C, Ctrl+Shift+C", "In a table: copy as shown, or with full precision"),
        ("Ctrl+V", "In a table that takes it: paste from a spreadsheet"),
        ("Ctrl+Return", "In the lines of Standing: the terms of the line"),
        (
            "Insert, Delete",
            "In quotes of the curve, spreads by term, shocks of your own and their moves: add and remove",
        ),
        ("Ctrl+Tab", "In Standing and Shocks: the next of the tabs"),
        ("↑ ↓", "In the picture of shocks: from one to the next; in that of two moves: along the second"),
        ("0", "In a slider of the what-if: back to nothing"),
        ("Return", "In a table: open the row, or edit the cell"),
        ("← →", "In a picture: read the values along the axis"),
        ("+ − 0", "In a picture: closer, further, the whole"),
        (
            "Escape",
            "In a field: take the entry back; in the flows of a line: back to the lines; in Shocks: put the "
            "what-if back",
        ),
        ("Ctrl+Q", "Quit"),
    ]
    rows = "".join(
        f"<tr><td><b>{escape(key)}</b>&nbsp;&nbsp;&nbsp;</td><td>{escape(what)}</td></tr>"
        for key, what in pairs
    )
    return f"<h2>Keyboard</h2><table cellspacing='0' cellpadding='2'>{rows}</table>"


def about() -> str:
    """Versions and the caution, as HTML."""
    lines = "<br>".join(escape(line) for line in versions().splitlines())
    return f"<h2>Gapwright</h2><p>{lines}</p><p>{escape(CAUTION)}</p>"


class HelpPage(QDialog):
    """A page of text over the window; it does not stand in the way of the work."""

    def __init__(self, title: str, page: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle(title)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.text = QTextBrowser()
        self.text.setHtml(page)
        self.text.setAccessibleName(title)
        self.text.setTabChangesFocus(True)
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
        buttons.rejected.connect(self.reject)
        rows = QVBoxLayout(self)
        rows.setContentsMargins(WIDE, WIDE, WIDE, WIDE)
        rows.setSpacing(GAP)
        rows.addWidget(self.text)
        rows.addWidget(buttons)
        line = QFontMetrics(self.font())
        self.resize(90 * line.averageCharWidth(), 32 * line.lineSpacing())
