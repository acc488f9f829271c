"""One mode of the station: its pictures, its table and its part of the form."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject
from PySide6.QtWidgets import QWidget

from desk.book import Book, Shock
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.fields import Form
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["Mode"]


class Mode(QObject):
    """A mode; it is made when it is first shown.

    Attributes
    ----------
    key, title, purpose : str
        Of the class: a plain name, what its tab says, and one sentence.
    form : Form
    pictures : tuple of Picture
    table : QWidget
    controls : tuple of QWidget
        Beside the tabs while the mode is shown.
    share : int
        Part of the height that the table takes, in percent.
    """

    key = ""
    title = ""
    purpose = ""
    share = 44

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self.station = station
        self.form = Form()
        layout = self.form.layout()
        if layout is not None:
            layout.setContentsMargins(0, 0, 0, 0)
        self.pictures: tuple[Picture, ...] = ()
        self.table: QWidget = QWidget()
        self.controls: tuple[QWidget, ...] = ()

    @property
    def document(self) -> Document:
        """The open document."""
        return self.station.document

    @property
    def jobs(self) -> Jobs:
        """Background work."""
        return self.station.jobs

    @property
    def theme_switch(self) -> ThemeSwitch:
        """The theme in use."""
        return self.station.theme_switch

    @property
    def is_shown(self) -> bool:
        """Whether it is the mode that the station shows."""
        return self.station.mode is self

    @property
    def message(self) -> Callable[[str], object]:
        """Tells the reader something in the foot."""
        return self.station.message.emit

    def refuse(self, reason: str) -> None:
        """Say why an edit was not taken, where it is seen, until the next one is."""
        self.station.refuse(reason)

    def edit(self, text: str, book: Book) -> None:
        """Put another book in the place of the open one, as one step of undo."""
        self.station.accept_edit()
        self.document.edit(text, book)

    def show_book(self, book: Book) -> None:
        """Bring everything shown up to date."""
        raise NotImplementedError

    def words(self) -> str:
        """What the mode has to say, in a sentence or two; it stands over the pictures."""
        return ""

    def home(self) -> QWidget:
        """What matters most."""
        return self.table

    def leave(self) -> None:
        """Another mode is shown, or the book was closed: then there is no table of shocks either."""

    def take_back(self) -> bool:
        """Escape: take back what was begun here; whether anything was."""
        return False

    def still_stands(self, shock: Shock) -> bool:
        """Whether a shock is one of those of the book, as it was."""
        table = self.document.shocks.result
        return table is None or any(result.shock == shock for result in table.results)
