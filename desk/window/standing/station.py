"""The station Standing: what both sides are worth, how they move, and the gap between them."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from desk.book import Side
from desk.valuation.detail import line_flows
from desk.valuation.records import FlowDetail, Standing
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts import numbers
from desk.window.parts.fields import TextField
from desk.window.parts.premiums import liability_spread_field, market_risk_premium_field
from desk.window.parts.theme import GAP, WIDE, ThemeSwitch
from desk.window.standing.lines import LinesPage
from desk.window.standing.pages import Pages
from desk.window.standing.pictures import FlowPicture, KeyRatePicture
from desk.window.standing.tables import ConditionsPage, KeyRatesTable, PeriodsTable
from desk.window.standing.wording import plain_reading
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
        self._shown: Standing | None = None
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
        self.lines = LinesPage(theme_switch)
        self.lines.open_line = self._flows_of
        self.periods = PeriodsTable(theme_switch)
        self.key_rates = KeyRatesTable(theme_switch)
        self.conditions = ConditionsPage(theme_switch)
        for teller in (
            self.flow_picture,
            self.key_rate_picture,
            self.lines,
            self.periods,
            self.key_rates,
            self.conditions.table,
        ):
            teller.message.connect(self.message)
        self.pages = Pages(theme_switch, name="Tables of the standing")
        self.pages.add("lines", "Lines", self.lines)
        self.pages.add("periods", "Flows by year", self.periods)
        self.pages.add("key_rates", "Key rates", self.key_rates)
        self.pages.add("redington", "Redington's conditions", self.conditions)
        self.pages.add_control(self.lines.finder)
        self.pages.add_control(self.lines.shown_sides)
        self.pages.changed.connect(self._on_page)
        self._make_form()
        self.set_pictures(self.flow_picture, self.key_rate_picture)
        self.set_table(self.pages, share=45)
        self.set_form_visible()

    def _make_form(self) -> None:
        form = self.form
        form.add_heading("The basis")
        self.basis_note = form.add_note("")
        self.liability_spread = liability_spread_field()
        self.market_risk_premium = market_risk_premium_field()
        self.name = TextField("Title", hint="Stands over reports of this basis.")
        for field, name, text in (
            (self.liability_spread, "liability_spread", "liability spread"),
            (self.market_risk_premium, "market_risk_premium", "market risk premium"),
            (self.name, "title", "title"),
        ):
            form.add(field)
            field.committed.connect(lambda value, name=name, text=text: self._change(name, value, text))
        self.curve_button = form.add_button("Edit the curve", lambda: self.step_wanted.emit("curve"))

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
        basis = book.basis
        self.basis_note.setText(f"Valued at {numbers.day(basis.valuation_date)} in {basis.currency}.")
        self.liability_spread.set_value(basis.liability_spread)
        self.market_risk_premium.set_value(basis.market_risk_premium)
        self.name.set_value(basis.title)
        if standing is not self._shown:
            self._shown = standing
            self._show(standing)
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
        elif document.standing_faults:
            first, *others = document.standing_faults
            more = f" ({len(others)} more)" if others else ""
            self.show_stale("See the faults", lambda: self.step_wanted.emit("intake"), text=f"{first}{more}")
        else:
            self.hide_stale()

    def _show_none(self, text: str, button: str = "", act: Any = None) -> None:
        self._shown = None
        self.reading.hide()
        self.hide_stale()
        self.show_empty(text, button, act)

    def _show(self, standing: Standing) -> None:
        self.reading.setText(plain_reading(standing))
        self.flow_picture.show_periods(standing.periods, standing.currency)
        self.key_rate_picture.show_key_rates(standing.key_rates, standing.currency)
        self.lines.show_standing(standing)
        self.periods.show_standing(standing)
        self.key_rates.show_standing(standing)
        self.conditions.show_standing(standing)

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
        for control in (self.lines.finder, self.lines.shown_sides):
            control.setVisible(key == "lines")

    def _flows_of(self, side: Side, number: int) -> FlowDetail:
        book = self.document.book
        if book is None:
            raise ValueError("there is no open book")
        return line_flows(book, side, number)

    def _change(self, name: str, value: Any, what: str) -> None:
        book = self.document.book
        if book is not None:
            changes: dict[str, Any] = {name: value}
            self.document.edit(f"Change of the {what}", replace(book, basis=replace(book.basis, **changes)))

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Stand the pictures as the height allows."""
        super().resizeEvent(event)
        upright = self.height() >= _UPRIGHT_FROM
        self.pictures.setOrientation(Qt.Orientation.Vertical if upright else Qt.Orientation.Horizontal)
