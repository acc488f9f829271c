"""The station Standing: what both sides are worth, how they move, and the gap between them."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from desk.book import Book, LineTerms, Side
from desk.valuation.detail import line_flows
from desk.valuation.records import FlowDetail, LineStanding, Standing
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.fields import Combo
from desk.window.parts.pages import Pages
from desk.window.parts.theme import GAP, WIDE, ThemeSwitch
from desk.window.standing.basis_form import BasisForm
from desk.window.standing.comparison import ComparisonPage
from desk.window.standing.edits import terms_of, with_terms
from desk.window.standing.inflation import InflationPage, InflationPicture
from desk.window.standing.lines import LinesPage
from desk.window.standing.pictures import FLOWS, FLOWS_IN_REAL, FlowPicture, KeyRatePicture
from desk.window.standing.tables import ConditionsPage, KeyRatesTable, PeriodsTable
from desk.window.standing.terms_dialog import TermsDialog
from desk.window.standing.wording import basis_words, plain_reading
from desk.window.station import Station

__all__ = ["StandingStation"]

_UPRIGHT_FROM = 860
"""From this height on [px] the pictures stand one over the other; in less they stand side by side."""

_ROWS_OF = {
    "assets": ("assets", "present_value"),
    "liabilities": ("liabilities", "present_value"),
    "surplus": ("all", "present_value"),
    "funding_ratio": ("all", "present_value"),
    "duration_gap": ("all", "effective_duration"),
    "dv01_gap": ("all", "dv01"),
}
"""For each figure of the headline, whose lines make it up and by what they are ordered."""


class StandingStation(Station):
    """The balance sheet at one date on one basis."""

    key = "standing"
    title = "Standing"
    purpose = "What both sides are worth, how they move when rates move, and the gap between them"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self._shown: tuple[object, ...] = ()
        self.reading = QLabel()
        self.reading.setWordWrap(True)
        self.reading.setTextFormat(Qt.TextFormat.PlainText)
        self.reading.setAccessibleName("What the standing says")
        self.reading.setContentsMargins(WIDE, 0, WIDE, GAP)
        column = self.layout()
        if isinstance(column, QVBoxLayout):
            column.insertWidget(1, self.reading)
        self.flow_picture = FlowPicture(theme_switch)
        self.key_rate_picture = KeyRatePicture(theme_switch)
        self.inflation_picture: InflationPicture | None = None
        self.terms_dialog: TermsDialog | None = None
        self.lines = LinesPage(theme_switch)
        self.lines.open_line = self._flows_of
        self.periods = PeriodsTable(theme_switch)
        self.key_rates = KeyRatesTable(theme_switch)
        self.inflation = InflationPage(theme_switch)
        self.conditions = ConditionsPage(theme_switch)
        self.comparison = ComparisonPage(theme_switch)
        for teller in (
            self.flow_picture,
            self.key_rate_picture,
            self.lines,
            self.periods,
            self.key_rates,
            self.inflation.totals,
            self.inflation.key_rates,
            self.conditions.table,
            self.comparison.table,
        ):
            teller.message.connect(self.message)
        self.pages = Pages(theme_switch, name="Tables of the standing")
        self.pages.add("lines", "Lines", self.lines)
        self.pages.add("comparison", "Bases", self.comparison)
        self.pages.add("periods", "By year", self.periods)
        self.pages.add("key_rates", "Key rates", self.key_rates)
        self.pages.add("inflation", "Inflation", self.inflation)
        self.pages.add("redington", "Redington", self.conditions)
        for control in self._line_controls():
            self.pages.add_control(control)
        self.pages.set_page_visible("comparison", False)
        self.pages.set_page_visible("inflation", False)
        self.pages.changed.connect(self._on_page)
        self.pages.take_keys_of(self)
        self.lines.terms_wanted.connect(self._ask_terms)
        self.money = Combo()
        self.money.addItems(["Flows in money", "Flows in today's money"])
        self.money.setAccessibleName("Flows shown in")
        self.money.setToolTip("Of the picture of flows and their table: today's money is without inflation")
        self.money.currentIndexChanged.connect(lambda _: self._show_flows())
        self.money.hide()
        self.add_to_heading(self.money)
        QWidget.setTabOrder(self.next_button, self.money)
        # In this order the keyboard comes to them.
        self.set_pictures(self.flow_picture, self.key_rate_picture)
        self.set_table(self.pages, share=45)
        self.set_form_visible()
        self.basis_form = BasisForm(self.form, document, theme_switch, lambda: self.step_wanted.emit("curve"))
        self.basis_form.refused.connect(self._refuse)
        self.basis_form.spreads.table.message.connect(self.message)
        self.liability_spread = self.basis_form.liability_spread

    def _line_controls(self) -> tuple[QWidget, ...]:
        """What belongs to the page of lines alone."""
        return (self.lines.finder, self.lines.shown_sides, self.lines.terms_button)

    # Showing

    def home(self) -> QWidget:
        """The lines."""
        return self.lines.table

    def refresh(self) -> None:
        """Show the standing of the open book, and say where it is stale."""
        document = self.document
        book, standing = document.book, document.standing
        if book is None:
            self._show_none(
                "The standing needs a book: promised payments, what is held, and a curve.",
                "Open a book",
                lambda: self.step_wanted.emit("open"),
            )
            return
        if standing is None:
            if document.standing_failure:
                self._show_none(
                    f"The book could not be valued: {document.standing_failure}",
                    "Try again",
                    document.revalue,
                )
            else:
                self._show_none("The book is being valued.")
            return
        self.show_content()
        self.reading.show()
        second = document.comparison
        self.basis_form.show_book(book, standing, second)
        self._show_what_is_there(book, standing, second)
        self._say_what_is_stale()

    def _show_what_is_there(self, book: Book, standing: Standing, second: Standing | None) -> None:
        """Show the standing, where anything of it is another than what is shown."""
        shown = (standing, second, self.document.is_comparing, book.line_terms)
        if len(self._shown) == len(shown) and all(map(_is_same, self._shown, shown)):
            return
        self._shown = shown
        self.pages.set_page_visible("comparison", self.document.is_comparing)
        self.pages.set_page_visible("inflation", standing.inflation is not None)
        self._show(book, standing, second)

    def _say_what_is_stale(self) -> None:
        document = self.document
        if document.standing_failure:
            self.show_stale(
                "Try again",
                document.revalue,
                text="These figures are from before your last change: the book as it stands could not be "
                f"valued. {document.standing_failure}",
            )
        elif document.standing_is_stale and not document.is_valuing:
            self.show_stale("Value again", document.revalue)
        elif document.standing_is_stale:
            self.show_stale()
        elif document.is_comparing and document.second_failure:
            former = " Its figures are from before your last change." if document.second_standing else ""
            self.show_stale(
                "Try again",
                document.revalue,
                text=f"The second basis could not be valued: {document.second_failure}{former}",
            )
        elif faults := self._faults():
            more = f" ({len(faults) - 1} more)" if len(faults) > 1 else ""
            self.show_stale(
                "See the faults", lambda: self.step_wanted.emit("intake"), text=f"{faults[0]}{more}"
            )
        else:
            self.hide_stale()

    def _faults(self) -> list[str]:
        """What the valuations shown could not do as asked."""
        document = self.document
        of_second = document.second_faults if document.comparison is not None else ()
        return [
            *(str(fault) for fault in document.standing_faults),
            *(f"On the second basis: {fault}" for fault in of_second),
        ]

    def _show_none(self, text: str, button: str = "", act: Any = None) -> None:
        self._shown = ()
        self.reading.hide()
        self.money.hide()
        self.hide_stale()
        self.show_empty(text, button, act)

    def _show(self, book: Book, standing: Standing, second: Standing | None) -> None:
        self.reading.setText(plain_reading(standing))
        self.money.setVisible(standing.inflation is not None)
        self._show_flows()
        self.key_rate_picture.show_key_rates(standing.key_rates, standing.currency)
        self.lines.show_standing(standing, terms=book.line_terms, second=second)
        self.key_rates.show_standing(standing)
        self.conditions.show_standing(standing)
        self.inflation.show_standing(standing)
        self._show_inflation()
        if book.second_basis is not None:
            words = f"First: {basis_words(book.basis)}. Second: {basis_words(book.second_basis)}."
            self.comparison.show_standings(standing, second, words)

    def _show_flows(self) -> None:
        """Show the flows by year in the money chosen."""
        standing = self.document.standing
        if standing is None:
            return
        inflation = standing.inflation
        in_real = inflation is not None and self.money.currentIndex() == 1
        periods = inflation.real_periods if inflation is not None and in_real else standing.periods
        self.flow_picture.show_periods(periods, standing.currency)
        self.flow_picture.set_title(FLOWS_IN_REAL if in_real else FLOWS)
        self.periods.show_periods(periods, f"{standing.currency} of today" if in_real else standing.currency)

    def _show_inflation(self) -> None:
        """On the page of inflation, its key rates stand beside those of rates, in the place of the flows."""
        standing = self.document.standing
        wanted = self.pages.current == "inflation" and standing is not None
        inflation = standing.inflation if standing is not None else None
        if wanted and standing is not None and inflation is not None:
            if self.inflation_picture is None:
                self.inflation_picture = InflationPicture(self.theme_switch)
                self.inflation_picture.message.connect(self.message)
                self.pictures.addWidget(self.inflation_picture)
                # It is made late: the keyboard comes to it after the picture that it stands beside.
                made: tuple[QWidget, ...] = (self.inflation_picture.plot, self.inflation_picture.button)
                if self.key_rate_picture.window() is self.window():
                    for before, after in pairwise((self.key_rate_picture.button, *made)):
                        QWidget.setTabOrder(before, after)
            self.inflation_picture.show_inflation(inflation, standing.currency)
        shows_inflation = wanted and self.inflation_picture is not None
        if self.flow_picture.isHidden() == shows_inflation:
            return
        if self.inflation_picture is not None:
            self.inflation_picture.setVisible(shows_inflation)
        self.flow_picture.setVisible(not shows_inflation)
        # Equal shares for the two that are seen, unless the reader chose others.
        self.pictures.setSizes([self.pictures.width()] * self.pictures.count())
        self.choose_sizes(self.chosen_sizes)

    def views(self) -> tuple[Callable[[], object], ...]:
        """Inflation, where the book has it."""
        if not self.pages.has_page("inflation"):
            return ()
        return (lambda: self.pages.show_page("inflation"),)

    def show_rows(self, key: str) -> None:
        """Show the rows that make up a figure of the headline.

        Raises
        ------
        ValueError
            If `key` is none of ``assets``, ``liabilities``, ``surplus``, ``funding_ratio``, ``duration_gap``
            and ``dv01_gap``.
        """
        if key not in _ROWS_OF:
            raise ValueError(f"`key` must be one of {', '.join(_ROWS_OF)}, not {key}")
        self.refresh_now()
        side, by = _ROWS_OF[key]
        self.pages.show_page("lines")
        self.lines.show_side(side, by=by)

    def _on_page(self, key: str) -> None:
        for control in self._line_controls():
            control.setVisible(key == "lines")
        self._show_inflation()

    def _flows_of(self, side: Side, number: int) -> FlowDetail:
        book = self.document.book
        if book is None:
            raise ValueError("there is no open book")
        return line_flows(book, side, number)

    def _refuse(self, reason: str) -> None:
        """Say why an edit was not taken, where it is seen, until the next one is."""
        self.show_stale("Close", self.hide_stale, text=reason)

    def _ask_terms(self, line: LineStanding) -> None:
        """Ask for the terms of a line."""
        book = self.document.book
        if book is None:
            return
        terms = terms_of(book, line.side, line.line)
        dialog = TermsDialog(terms, has_inflation=book.basis.inflation is not None, parent=self.window())
        dialog.chosen.connect(self._take_terms)
        dialog.finished.connect(self._forget_dialog)
        self.terms_dialog = dialog
        dialog.open()

    def _forget_dialog(self, _result: int) -> None:
        self.terms_dialog = None

    def _take_terms(self, terms: LineTerms) -> None:
        book = self.document.book
        if book is not None:
            self.document.edit(f"Change of the terms of {terms.line}", with_terms(book, terms))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Stand the pictures as the height allows."""
        super().resizeEvent(event)
        upright = self.height() >= _UPRIGHT_FROM
        self.pictures.setOrientation(Qt.Orientation.Vertical if upright else Qt.Orientation.Horizontal)


def _is_same(one: object, other: object) -> bool:
    return one is other or (isinstance(one, bool) and one == other)
