"""Which sets of shocks a book asks for, and the thresholds that judge its funding ratio."""

from __future__ import annotations

from dataclasses import replace
from html import escape
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, Qt
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from desk import tasks
from desk.book import Book
from desk.book.shock import ShockSet, ShockSettings
from desk.window.parts import numbers
from desk.window.parts.boxes import TickBox
from desk.window.parts.fields import TextField
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import HALF, keep_look, soft_font
from desk.window.shocks.wording import thresholds_words

if TYPE_CHECKING:
    from desk.window.shocks.mode import Mode

__all__ = ["SettingsForm", "read_thresholds"]

_MOST_THRESHOLDS = 6


def read_thresholds(text: str) -> tuple[float, ...] | str:
    """Funding ratios from text in percent, parted by semicolons or spaces; or what is wrong with it."""
    pieces = [piece for piece in text.replace(";", " ").replace("%", " ").split() if piece]
    found = []
    for piece in pieces:
        value = numbers.parse_rate(piece)
        if value is None:
            return f"“{piece[:24]}” is not a number."
        if not 0.0 < value <= 100.0:
            return f"A threshold must be above 0 %, not {piece[:24]} %."
        found.append(value)
    if len(found) > _MOST_THRESHOLDS:
        return f"At most {_MOST_THRESHOLDS} thresholds."
    if len(set(found)) < len(found):
        return "A threshold stands twice."
    return tuple(sorted(found, reverse=True))


class _SetBox(QWidget):
    """A set to tick, and where it comes from."""

    def __init__(self, own: ShockSet) -> None:
        super().__init__()
        self.own = own
        self.box = TickBox(own.name.replace("&", "&&"))
        count = len(own.shocks)
        number = "1 shock" if count == 1 else f"{numbers.integer(count)} shocks"
        if not count:
            number = "figures only, no shocks" if own.figures else "no sizes for this currency"
        self.note = QLabel(well_broken(f"{_shorter(own.source)} · {number}"))
        self.note.setWordWrap(True)
        self.note.setTextFormat(Qt.TextFormat.PlainText)
        self.note.setFont(soft_font(self.font()))
        keep_look(self.note, "soft")
        self.box.setEnabled(bool(count))
        figures = "; ".join(f"{name} {numbers.ratio(value)}" for name, value in own.figures)
        tip = "\n".join(part for part in (own.source, own.status, figures) if part)
        for widget in (self.box, self.note):
            widget.setToolTip(f"<qt>{_escaped(tip)}</qt>")
        self.box.setAccessibleName(f"{own.name}, {number}")
        self.box.setAccessibleDescription(f"{own.source}. {own.status}")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(HALF)
        column.addWidget(self.box)
        column.addWidget(self.note)


def _shorter(source: str, most: int = 90) -> str:
    source = source[:1].upper() + source[1:]
    return source if len(source) <= most else source[: source.rfind(" ", 0, most)].rstrip(",") + "…"


def _escaped(text: str) -> str:
    return escape(text).replace("\n", "<br>")


class SettingsForm(QObject):
    """The sets and the thresholds.

    Attributes
    ----------
    boxes : dict of str to TickBox
        By name of the set.
    thresholds : TextField
    """

    def __init__(self, mode: Mode) -> None:
        super().__init__(mode)
        self._mode = mode
        self._currency = ""
        self._sets: tuple[ShockSet, ...] = ()
        self._boxes: list[_SetBox] = []
        form = mode.form
        form.add_heading("Judged by")
        self.thresholds = TextField("Funding ratios", hint="", check=self._check)
        self.thresholds.label.setText("Thresholds of the funding ratio, %")
        self.thresholds.editor.setAccessibleName("Thresholds of the funding ratio, percent")
        self.thresholds.committed.connect(self._on_thresholds)
        form.add(self.thresholds)
        form.add_heading("Sets")
        self.sets_note = form.add_note("")
        self.usual_button = form.add_button("The usual ones", self.use_usual)
        self.usual_button.setToolTip("Those usual for the currency of the book")
        self._list = QWidget()
        self._column = QVBoxLayout(self._list)
        self._column.setContentsMargins(0, 0, 0, 0)
        form.add_widget(self._list)

    @property
    def boxes(self) -> dict[str, TickBox]:
        """By name of the set."""
        return {each.own.name: each.box for each in self._boxes}

    # Showing

    def show_book(self, book: Book) -> None:
        """Show what a book asks for."""
        if book.basis.currency != self._currency:
            self._currency = book.basis.currency
            self._make_list()
        settings = book.shock_settings
        asked = {name.strip().casefold() for name in settings.sets}
        for each in self._boxes:
            wanted = each.own.name.casefold() in asked if asked else each.own.is_usual
            each.box.blockSignals(True)
            each.box.setChecked(wanted and bool(each.own.shocks))
            each.box.blockSignals(False)
        self.usual_button.setVisible(bool(asked))
        self.sets_note.setText(
            well_broken("As chosen for this book." if asked else f"Those usual for {self._currency}.")
        )
        if not (self.thresholds.line.hasFocus() and self.thresholds.line.isModified()):
            self.thresholds.set_value(_written(settings.thresholds))
        self.thresholds.set_hint(well_broken(thresholds_words(settings.thresholds)))

    def _make_list(self) -> None:
        for each in self._boxes:
            self._column.removeWidget(each)
            each.hide()
            each.deleteLater()
        self._sets = tasks.shock_sets(self._currency).sets
        self._boxes = [_SetBox(own) for own in self._sets]
        before: QWidget = self.usual_button
        for each in self._boxes:
            self._column.addWidget(each)
            # It is made late: the keyboard comes to it after what stands over it.
            QWidget.setTabOrder(before, each.box)
            before = each.box
            each.box.toggled.connect(lambda _=False: self._on_ticked())

    # Editing

    def _put(self, text: str, settings: ShockSettings) -> None:
        book = self._mode.document.book
        if book is not None:
            self._mode.edit(text, replace(book, shock_settings=settings))

    def _on_ticked(self) -> None:
        book = self._mode.document.book
        if book is None:
            return
        ticked = tuple(each.own.name for each in self._boxes if each.box.isChecked())
        known = {each.own.name.casefold() for each in self._boxes}
        unknown = tuple(name for name in book.shock_settings.sets if name.strip().casefold() not in known)
        if not ticked and not unknown:
            self.show_book(book)
            self._mode.refuse("At least one set stays ticked: without any, the usual ones are meant.")
            return
        self._put("Choice of shock sets", replace(book.shock_settings, sets=(*ticked, *unknown)))

    def use_usual(self) -> None:
        """Ask for the sets usual for the currency."""
        book = self._mode.document.book
        if book is not None:
            self._put("Usual shock sets", replace(book.shock_settings, sets=()))

    @staticmethod
    def _check(text: str) -> str:
        found = read_thresholds(text)
        return found if isinstance(found, str) else ""

    def _on_thresholds(self, text: str) -> None:
        book = self._mode.document.book
        found = read_thresholds(text)
        if book is not None and not isinstance(found, str):
            self._put("Change of the thresholds", replace(book.shock_settings, thresholds=found))
            self.show_book(self._mode.document.book or book)


def _written(thresholds: tuple[float, ...]) -> str:
    return "; ".join(numbers.exact(threshold, percent=True) for threshold in thresholds)
