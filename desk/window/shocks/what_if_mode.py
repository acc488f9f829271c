"""The mode What-if: pull the curve and the markets by hand, and see both sides follow."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from PySide6.QtCore import Qt, QTimer
from PySide6.QtWidgets import QHBoxLayout, QLabel, QPushButton, QWidget

from desk.book import Book
from desk.valuation.shock_effects import CannotShock
from desk.window.parts import numbers
from desk.window.parts.fields import Combo, TextField
from desk.window.parts.labels import well_broken
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import GAP
from desk.window.shocks.curve_pictures import MovedCurvePicture
from desk.window.shocks.edits import free_name, name_fault, with_added
from desk.window.shocks.frame_pictures import GapPicture, YearsPicture
from desk.window.shocks.hand import HANDLES, handles_of, places_words, shock_of
from desk.window.shocks.mode import Mode
from desk.window.shocks.moved import moved_rates
from desk.window.shocks.sliders import HandleRow
from desk.window.standing.wording import amount

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["LinesTable", "WhatIfMode"]

_TABLE_MS = 60
"""The table follows at most this often."""


class LinesTable(Table):
    """What each line is worth before and with the what-if."""

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(
            self._make(""),
            station.theme_switch,
            name="Lines with the what-if",
            description="Present value of each line as the book stands and with the what-if.",
            empty_text="The book is being made ready.",
        )
        self._currency = ""
        self._digits = 0

    @staticmethod
    def _make(currency: str) -> tuple[Column, ...]:
        return (
            Column("line", "Line"),
            Column("side", "Side"),
            Column("before", "Before", currency, "money", tooltip="Present value as the book stands."),
            Column("after", "With the what-if", currency, "money", tooltip="Present value."),
            Column("change", "Change", currency, "money", is_change=True, tooltip="With it less before."),
            Column("share", "Change", "%", "rate", is_change=True, tooltip="Of the present value before."),
        )

    def show_lines(self, rows: dict[str, Any], currency: str) -> None:
        """Show lines."""
        if currency != self._currency:
            self._currency = currency
            self.set_columns(self._make(currency))
        self.set_rows(rows)
        # Widths follow only when figures grow by a digit: they stand still under the hand.
        largest = float(np.nanmax(np.abs(rows["change"]), initial=0.0))
        digits = len(f"{largest:.0f}")
        if digits > self._digits:
            self._digits = digits
            self.fit_columns()


class WhatIfMode(Mode):
    """The live what-if."""

    key = "what_if"
    title = "What-if"
    purpose = "Pull rates and markets by hand; the book is never changed"
    share = 40

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self.curve = MovedCurvePicture(self.theme_switch)
        self.gap = GapPicture(self.theme_switch)
        self.years = YearsPicture(self.theme_switch)
        self.pictures = (self.curve, self.gap, self.years)
        self.lines = LinesTable(station)
        self.table = self.lines
        self.shown = Combo()
        self.shown.addItems(["Gap by key rate", "Values by year"])
        self.shown.setAccessibleName("Picture beside the curve")
        self.shown.currentIndexChanged.connect(lambda _: self._choose_picture())
        self.controls = (self.shown,)
        for teller in (*self.pictures, self.lines):
            teller.message.connect(station.message)
        self._curve_of: tuple[object, object] = (None, None)
        self._lines_of: tuple[object, object] = (None, None)
        self._filling = QTimer(self, singleShot=True, interval=_TABLE_MS)
        self._filling.timeout.connect(self._fill_lines)
        self._make_form()

    def _make_form(self) -> None:
        form = self.form
        self.back_button = QPushButton("Put it back")
        self.back_button.setToolTip("Nothing is moved any more (Escape)")
        self.keep_button = QPushButton("Keep…")
        self.keep_button.setAccessibleName("Keep as a shock")
        buttons = QWidget()
        row = QHBoxLayout(buttons)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GAP)
        for button, act in ((self.back_button, self.put_back), (self.keep_button, self.ask_name)):
            button.clicked.connect(lambda _=False, act=act: act())
            row.addWidget(button, 1)
        form.add_widget(buttons)
        self.keep_button.setToolTip("As a shock of your own; the book's shocks are all that changes")
        self.name = TextField("Name of the shock", hint="Return keeps it.", check=self._check_name)
        self.name.line.returnPressed.connect(self._on_return)
        form.add(self.name)
        self.name.hide()
        self.state = form.add_note("")
        self.state.setTextFormat(Qt.TextFormat.PlainText)
        self.rows: dict[str, HandleRow] = {}
        self._headings: dict[str, QLabel] = {}
        for handle in HANDLES:
            if handle.group not in self._headings:
                self._headings[handle.group] = form.add_heading(handle.group)
            made = HandleRow(handle)
            made.moved.connect(lambda _: self._on_moved())
            form.add_widget(made)
            self.rows[handle.key] = made

    # Showing

    def show_book(self, book: Book) -> None:
        """Show the handles that the book has, and where the what-if stands."""
        what_if = self.document.what_if
        what_if.want(book)
        there = handles_of(book)
        for key, row in self.rows.items():
            if row.isHidden() == (key in there):
                row.setVisible(key in there)
        others = self.rows["fund"].handle.group
        any_other = any(key in there for key, row in self.rows.items() if row.handle.group == others)
        self._headings[others].setVisible(any_other)
        if not what_if.is_on and not self._is_moving():
            for row in self.rows.values():
                if row.value:
                    row.set_value(0.0)
        self.back_button.setEnabled(what_if.is_on)
        self.keep_button.setEnabled(what_if.is_on)
        if not what_if.is_on:
            self.name.hide()
            self.keep_button.show()
        self._show_state()
        self._choose_picture()
        self._draw(book)
        if not self._filling.isActive():
            self._filling.start()

    def _is_moving(self) -> bool:
        return any(row.slider.isSliderDown() for row in self.rows.values())

    def _show_state(self) -> None:
        what_if = self.document.what_if
        if what_if.failure:
            text = f"{what_if.failure}"
        elif what_if.is_preparing:
            text = "The book is being made ready."
        elif what_if.is_on and what_if.shock is not None:
            text = f"{places_words(self.places)}."
        else:
            text = "Pull a slider or type a number. The book stays as it is."
        self.state.setText(well_broken(text))

    def _choose_picture(self) -> None:
        by_year = self.shown.currentIndex() == 1
        if self.is_shown and self.years.isHidden() == by_year:
            self.years.setVisible(by_year)
            self.gap.setVisible(not by_year)
            self.station.share_pictures()
            book = self.document.book
            if book is not None:
                self._draw(book)

    def _draw(self, book: Book) -> None:
        what_if = self.document.what_if
        shock = what_if.shock if what_if.frame is not None else None
        if self._curve_of[0] is not book.basis or self._curve_of[1] is not shock:
            self._curve_of = (book.basis, shock)
            self.curve.show_rates(moved_rates(book, shock))
        before = what_if.before
        if before is None:
            return
        picture = self.years if self.shown.currentIndex() == 1 else self.gap
        picture.show_frames(before, what_if.frame, book.basis.currency)

    def _fill_lines(self) -> None:
        """Show the lines as the last frame has them."""
        what_if, book = self.document.what_if, self.document.book
        engine = what_if.engine
        if book is None or engine is None or not self.is_shown:
            return
        if self._lines_of[0] is engine and self._lines_of[1] is what_if.frame and what_if.is_on:
            return
        shock = what_if.shock if what_if.frame is not None and what_if.shock else shock_of({})
        try:
            sides = engine.lines(shock)
        except (CannotShock, ValueError):
            return
        self._lines_of = (engine, what_if.frame)
        names = [side.flows.line_names for side in (engine.base.assets, engine.base.liabilities)]
        before = np.concatenate([side[0] for side in sides])
        after = np.concatenate([side[1] for side in sides])
        with np.errstate(divide="ignore", invalid="ignore"):
            share = np.where(before != 0.0, (after - before) / before, np.nan)
        self.lines.show_lines(
            {
                "line": [*names[0], *names[1]],
                "side": [*["Assets"] * len(names[0]), *["Liabilities"] * len(names[1])],
                "before": before,
                "after": after,
                "change": after - before,
                "share": share,
            },
            book.basis.currency,
        )

    def words(self) -> str:
        """What the what-if does to the surplus."""
        what_if, book = self.document.what_if, self.document.book
        frame = what_if.frame
        if book is None or frame is None:
            return "Pull the curve or a market: headline, pictures and table follow. Escape puts it back."
        currency = book.basis.currency
        change = frame.change.surplus
        size = amount(abs(change), currency)
        ratio = frame.position.funding_ratio
        tail = f", at a funding ratio of {numbers.ratio(ratio)}" if np.isfinite(ratio) else ""
        if not change:
            return f"The surplus stays at {amount(frame.position.surplus, currency)}{tail}."
        verb = "rises" if change > 0.0 else "falls"
        if what_if.failure:
            verb = f"before the last move {verb}"
        return f"The surplus {verb} by {size} to {amount(frame.position.surplus, currency)}{tail}."

    def home(self) -> QWidget:
        """The first handle."""
        return self.rows["level"].slider

    # What the hand does

    @property
    def places(self) -> dict[str, float]:
        """Where the handles stand; one that the book does not have counts for nothing."""
        return {key: row.value for key, row in self.rows.items() if not row.isHidden()}

    def _on_moved(self) -> None:
        self.document.what_if.move(shock_of(self.places))

    def put_back(self) -> None:
        """Put the what-if back."""
        for row in self.rows.values():
            row.set_value(0.0)
        self.document.what_if.put_back()

    def ask_name(self) -> None:
        """Ask in place for the name to keep it under."""
        book = self.document.book
        if book is None or not self.document.what_if.is_on:
            return
        self.name.set_value(free_name(book, "My what-if"))
        self.keep_button.hide()
        self.name.show()
        self.name.setFocus(Qt.FocusReason.OtherFocusReason)
        self.name.line.selectAll()

    def _check_name(self, text: str) -> str:
        book = self.document.book
        return "" if book is None else name_fault(book, text)

    def _on_return(self) -> None:
        """Keep it under the name that stands there; leaving the field keeps nothing."""
        book, shock = self.document.book, self.document.what_if.shock
        if book is None or shock is None or self.name.isHidden():
            return
        name = self.name.line.text()
        self.name.line.setModified(False)
        fault = name_fault(book, name)
        self.name.set_problem(fault)
        if fault:
            return
        self.name.hide()
        self.keep_button.show()
        self.keep_button.setFocus(Qt.FocusReason.OtherFocusReason)
        kept = shock_of(self.places, name=name.strip())
        self.edit(f"What-if kept as {kept.name}", with_added(book, kept))
        self.message(f"Kept as the shock {kept.name}; it stands among all shocks.")

    def take_back(self) -> bool:
        """Stop asking for a name; whether one was asked for."""
        if self.name.isHidden():
            return False
        self.name.hide()
        self.keep_button.show()
        self.keep_button.setFocus(Qt.FocusReason.OtherFocusReason)
        return True
