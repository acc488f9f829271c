"""The way from the scenarios to the page that fits a model, and back."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtWidgets import QPushButton

from desk.window.scenarios.fitting import FittingPage

if TYPE_CHECKING:
    from desk.window.station import Station

__all__ = ["FittingDoor"]


class FittingDoor:
    """A button in the heading of a station that puts the page in the place of what the station shows.

    Attributes
    ----------
    button : QPushButton
    page : FittingPage or None
        Made when it is first wanted.
    is_open : bool
    """

    def __init__(self, station: Station) -> None:
        self._station = station
        self.page: FittingPage | None = None
        self.is_open = False
        self.button = QPushButton("Fit to data…")
        self.button.setToolTip("Estimate a model from a history, quoted volatilities or yields.")
        self.button.clicked.connect(lambda _=False: self.open())
        station.add_to_heading(self.button)

    def follow(self) -> bool:
        """Bring the page up to date; whether it is what the station shows."""
        has_book = self._station.document.book is not None
        self.button.setVisible(has_book and not self.is_open)
        if self.is_open and not has_book:
            self.close()
        elif self.is_open and self.page is not None:
            self.page.refresh()
        return self.is_open

    def open(self) -> None:
        """Show the page."""
        station = self._station
        if self.is_open or station.document.book is None:
            return
        if self.page is None:
            self.page = FittingPage(station.document, station.jobs, station.theme_switch)
            self.page.message.connect(station.message)
            self.page.closed.connect(self.close)
        self.is_open = True
        station.show_instead(self.page)
        self.page.refresh()
        self.page.focus_home()

    def close(self) -> None:
        """Show the station again."""
        if not self.is_open:
            return
        self.is_open = False
        self._station.show_again()
        self.button.setFocus()
