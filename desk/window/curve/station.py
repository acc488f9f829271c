"""The station Curve: quotes, what is drawn between them, and the premiums of the basis."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QKeySequence, QShortcut
from PySide6.QtWidgets import QHBoxLayout, QLabel, QPushButton, QVBoxLayout, QWidget

from desk.book import Basis, CurveKind
from desk.book.arrays import FloatArray
from desk.rates.compounding import Compounding
from desk.rates.day_count import DayCount
from desk.rates.sampling import QuoteDetail, quote_details
from desk.rates.smith_wilson import Extrapolation
from desk.valuation.restating import with_day_count
from desk.window.curve.edits import merged, new_quote, quotes_fault, read_cells
from desk.window.curve.picture import CurvePicture
from desk.window.curve.words import (
    COMPOUNDINGS,
    CURVE_KINDS,
    DAY_COUNTS,
    EXTRAPOLATIONS,
    HOW_TO_EDIT,
    INTERPOLATIONS,
    PAYMENTS,
    QUOTE_COLUMNS,
)
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField, Form, NumberField
from desk.window.parts.premiums import liability_spread_field, market_risk_premium_field
from desk.window.parts.tables import Table, parse_grid
from desk.window.parts.theme import GAP, WIDE, ThemeSwitch, keep_look, soft_font
from desk.window.station import Station

__all__ = ["CurveStation"]


class CurveStation(Station):
    """Quotes, editable and pasteable, and the curve they give.

    An edit that gives no curve is refused with one line that says why, and the former curve stays.
    """

    key = "curve"
    title = "Curve"
    purpose = "The curve that everything is discounted on: its quotes, and what is drawn between them"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self.picture = CurvePicture(theme_switch)
        self.picture.message.connect(self.message)
        self.table = Table(
            QUOTE_COLUMNS,
            theme_switch,
            name="Quotes of the curve",
            description="Term and rate can be edited and pasted over. Insert adds a quote, Delete removes "
            "those selected.",
            empty_text="No quotes.",
        )
        self.table.table_model.commit = self._commit
        self.table.paste_callback = self._on_paste
        self.table.table_model.refused.connect(self._refuse)
        self.table.message.connect(self.message)
        self._shown: Basis | None = None
        self._make_form()
        self.set_pictures(self.picture)
        self.set_table(self._make_table_page(), share=46)
        self.set_form_visible()

    def home(self) -> QWidget:
        """The quotes."""
        return self.table

    # Making it

    def _make_table_page(self) -> QWidget:
        page = QWidget()
        self.add_button = QPushButton("Add a quote")
        self.add_button.setToolTip("After the selected one, on the curve (Insert)")
        self.remove_button = QPushButton("Remove")
        self.remove_button.setToolTip("The selected quotes (Delete)")
        self.replace_button = QPushButton("Paste a whole curve")
        self.replace_button.setToolTip("What is on the clipboard takes the place of all quotes")
        how = QLabel(HOW_TO_EDIT)
        how.setWordWrap(True)
        how.setFont(soft_font(self.font()))
        keep_look(how, "soft")
        side = QVBoxLayout()
        side.setContentsMargins(WIDE, GAP, WIDE, GAP)
        side.setSpacing(GAP)
        for button, act in (
            (self.add_button, self.add_quote),
            (self.remove_button, self.remove_quotes),
            (self.replace_button, self.replace_curve),
        ):
            button.clicked.connect(lambda _=False, act=act: act())
            side.addWidget(button)
        side.addWidget(how)
        side.addStretch(1)
        across = QHBoxLayout(page)
        across.setContentsMargins(0, 0, 0, 0)
        across.setSpacing(0)
        across.addWidget(self.table, 3)
        across.addLayout(side, 1)
        for keys, act in ((Qt.Key.Key_Insert, self.add_quote), (Qt.Key.Key_Delete, self.remove_quotes)):
            shortcut = QShortcut(QKeySequence(keys), self.table)
            shortcut.setContext(Qt.ShortcutContext.WidgetShortcut)
            shortcut.activated.connect(act)
        return page

    def _make_form(self) -> None:
        form = self.form
        form.add_heading("The curve")
        self.date_note = form.add_note("")
        self.compounding = ChoiceField(
            "Quotes are stated", COMPOUNDINGS, hint="The figures stay; what they mean changes."
        )
        self.interpolation = ChoiceField("Between the quotes", INTERPOLATIONS)
        self.shown_as = ChoiceField("Show rates", (Choice("quoted", "As quoted"),))
        self.shown_as.set_choices(
            (
                Choice("quoted", "As quoted", "Of the picture only: as the quotes are stated."),
                Choice("continuous", "Continuous", "Of the picture only: compounded continuously."),
            )
        )
        self.shown_as.committed.connect(lambda _: self.redraw())
        self.curve_kind = ChoiceField("Quotes are", CURVE_KINDS)
        self.payments = ChoiceField("Payments a year", PAYMENTS)
        form.add(self.shown_as)
        form.add(self.curve_kind)
        form.add(self.payments)
        form.add(self.compounding)
        form.add(self.interpolation)
        form.add_heading("Beyond the last quote")
        self._make_beyond(form)
        form.add_heading("Added to the curve")
        self.liability_spread = liability_spread_field()
        self.market_risk_premium = market_risk_premium_field()
        form.add(self.liability_spread)
        form.add(self.market_risk_premium)
        form.add_heading("Time")
        self.day_count = ChoiceField("Day count", DAY_COUNTS, hint="Turns dates into years.")
        form.add(self.day_count)
        for field, name, text in (
            (self.curve_kind, "curve_kind", "kind of the quotes"),
            (self.payments, "payments_per_year", "payments a year"),
            (self.extrapolation, "extrapolation", "curve beyond the last quote"),
            (self.ultimate_forward_rate, "ultimate_forward_rate", "ultimate forward rate"),
            (self.last_liquid_point, "last_liquid_point", "last liquid point"),
            (self.convergence_point, "convergence_point", "convergence point"),
            (self.compounding, "compounding", "compounding of the quotes"),
            (self.interpolation, "interpolation", "interpolation"),
            (self.liability_spread, "liability_spread", "liability spread"),
            (self.market_risk_premium, "market_risk_premium", "market risk premium"),
        ):
            field.committed.connect(lambda value, name=name, text=text: self._change(name, value, text))
        self.day_count.committed.connect(self._change_day_count)

    def _make_beyond(self, form: Form) -> None:
        self.extrapolation = ChoiceField("How the curve goes on", EXTRAPOLATIONS)
        self.last_liquid_point = NumberField(
            "Last liquid point",
            unit="years",
            low=0.01,
            high=150.0,
            sensible=(10.0, 50.0),
            hint="Quotes beyond it are left out; empty for the last quote.",
            optional=True,
        )
        self.ultimate_forward_rate = NumberField(
            "Ultimate forward rate",
            unit="% a year",
            percent=True,
            low=-0.05,
            high=0.2,
            sensible=(0.02, 0.06),
            hint="Compounded once a year; for Smith-Wilson.",
            optional=True,
        )
        self.convergence_point = NumberField(
            "Convergence point",
            unit="years",
            low=1.0,
            high=300.0,
            sensible=(40.0, 100.0),
            hint="Where the forward rate has come to it; empty for 40 years after the last liquid point, "
            "but no earlier than 60 years.",
            optional=True,
        )
        for field in (
            self.extrapolation,
            self.last_liquid_point,
            self.ultimate_forward_rate,
            self.convergence_point,
        ):
            form.add(field)

    def _show_form(self, basis: Basis) -> None:
        self.curve_kind.set_value(basis.curve_kind)
        self.payments.set_value(basis.payments_per_year)
        self.compounding.set_value(basis.compounding)
        self.interpolation.set_value(basis.interpolation)
        self.extrapolation.set_value(basis.extrapolation)
        self.last_liquid_point.set_value(basis.last_liquid_point)
        self.ultimate_forward_rate.set_value(basis.ultimate_forward_rate)
        self.convergence_point.set_value(basis.convergence_point)
        self.liability_spread.set_value(basis.liability_spread)
        self.market_risk_premium.set_value(basis.market_risk_premium)
        self.day_count.set_value(basis.day_count)
        by_method = basis.extrapolation is Extrapolation.SMITH_WILSON
        self.payments.setVisible(basis.curve_kind is not CurveKind.ZERO)
        self.interpolation.setVisible(not by_method)
        self.convergence_point.setVisible(by_method)

    # Showing

    def refresh(self) -> None:
        """Show the basis of the open book."""
        book = self.document.book
        if book is None:
            self._shown = None
            self.show_empty(
                "A curve comes with a book. Open one, and its quotes are here to look at and to edit.",
                "Open a book",
                lambda: self.step_wanted.emit("open"),
            )
            return
        self.show_content()
        basis = book.basis
        if basis is self._shown:
            return
        self._shown = basis
        self.hide_stale()
        self.date_note.setText(
            f"Valuation date {numbers.day(basis.valuation_date)}, currency {basis.currency}."
        )
        self._show_form(basis)
        try:
            detail = quote_details(basis.curve, terms=basis.terms)
        except ValueError as error:
            # Its own edits give a curve or are refused; a book may still come from elsewhere.
            none = np.full(basis.terms.shape, np.nan)
            detail = QuoteDetail(basis.terms, none, none, none)
            self._refuse(f"These quotes give no curve: {error}.")
        self.table.set_rows(
            {
                "term": basis.terms,
                "rate": basis.rates,
                "zero": detail.zero,
                "discount": detail.discount,
                "forward": detail.forward_to_next,
            }
        )
        self.redraw()

    def redraw(self) -> None:
        """Draw the curve in the compounding chosen."""
        book = self.document.book
        if book is None:
            return
        as_quoted = self.shown_as.value == "quoted"
        compounding = book.basis.compounding if as_quoted else Compounding.CONTINUOUS
        ends = [float(flows.time.max()) for flows in (book.liabilities, book.asset_flows) if len(flows)]
        try:
            self.picture.show_basis(book.basis, max(ends, default=0.0), compounding)
        except ValueError:
            self.picture.clear()

    # Editing

    def _refuse(self, reason: str) -> None:
        """Say why an edit was not taken, where it is seen, until the next one is."""
        self.show_stale("Close", self.hide_stale, text=reason)

    def _basis(self) -> Basis:
        book = self.document.book
        if book is None:
            raise RuntimeError("there is no open book to edit")
        return book.basis

    def _put(self, text: str, **changes: Any) -> str:
        """Edit the basis; why not, where the quotes would give no curve."""
        book = self.document.book
        if book is None:
            return "There is no open book."
        basis = replace(book.basis, **changes)
        fault = quotes_fault(basis.terms, basis.rates, basis.compounding)
        if fault:
            return f"{fault} The curve is unchanged."
        try:
            _ = basis.curve
        except ValueError as error:
            return f"{str(error).rstrip('.')}. The curve is unchanged."
        self.document.edit(text, replace(book, basis=basis))
        self.hide_stale()
        return ""

    def _change(self, name: str, value: Any, what: str) -> None:
        reason = self._put(f"Change of the {what}", **{name: value})
        if reason:
            self._refuse(reason)
            self._show_form(self._basis())

    def _change_day_count(self, value: DayCount) -> None:
        book = self.document.book
        if book is not None:
            self.document.edit("Change of the day count", with_day_count(book, value))

    def _commit(self, row: int, key: str, value: float | None) -> str | None:
        basis = self._basis()
        if value is None:
            return f"A quote needs a {key}. The curve is unchanged."
        columns = {"term": basis.terms.copy(), "rate": basis.rates.copy()}
        columns[key][row] = value
        if key == "rate":
            what = f"Change of the rate at {numbers.exact(float(basis.terms[row]))} years"
        else:
            what = f"Change of the term {numbers.exact(float(basis.terms[row]))} years"
        return self._put(what, terms=columns["term"], rates=columns["rate"]) or None

    def add_quote(self) -> None:
        """Add a quote after the current one, on the curve, and begin to edit its rate."""
        basis = self._basis()
        row = self.table.current_source_row()
        after = row if row >= 0 else basis.terms.size - 1
        term, rate = new_quote(basis.curve, basis.compounding, after)
        reason = self._put(
            f"New quote at {numbers.exact(term)} years",
            terms=np.insert(basis.terms, after + 1, term),
            rates=np.insert(basis.rates, after + 1, round(rate, 6)),
        )
        if reason:
            self._refuse(reason)
            return
        self.refresh_now()
        self.table.go_to(after + 1)
        self.table.setFocus()

    def _selected(self) -> list[int]:
        rows = {index.row() for index in self.table.selectionModel().selectedIndexes()}
        return sorted(self.table.table_model.source_row(row) for row in rows)

    def remove_quotes(self) -> None:
        """Remove the quotes that are selected."""
        basis = self._basis()
        chosen = self._selected()
        if not chosen:
            self._refuse("Select the quotes to remove.")
            return
        one = len(chosen) == 1
        what = f"quote at {numbers.exact(float(basis.terms[chosen[0]]))} years" if one else "quotes"
        reason = self._put(
            f"Removal of the {what}",
            terms=np.delete(basis.terms, chosen),
            rates=np.delete(basis.rates, chosen),
        )
        if reason:
            self._refuse(reason)

    def replace_curve(self) -> None:
        """Put the clipboard's terms and rates in the place of all quotes."""
        grid = parse_grid(QGuiApplication.clipboard().text())
        if not grid:
            self._refuse("There is nothing to paste: copy two columns, terms in years and rates in percent.")
            return
        pasted = read_cells(grid, "term")
        fault = pasted.fault
        if not fault and "rate" not in pasted.columns:
            fault = "A whole curve needs two columns: terms in years and rates in percent."
        if fault:
            self._refuse(f"Nothing was pasted. {fault}")
            return
        self._take(np.array(pasted.columns["term"]), np.array(pasted.columns["rate"]), "Pasted curve")

    def _on_paste(self, row: int, key: str, grid: list[list[str]]) -> str | None:
        basis = self._basis()
        if key not in ("term", "rate"):
            self._refuse("Paste on a term or a rate: the other columns follow from them.")
            return None
        if len(self._selected()) == basis.terms.size > 1 and max(map(len, grid)) > 1:
            self.replace_curve()
            return None
        pasted = read_cells(grid, key)
        if pasted.faults:
            self._refuse(f"Nothing was pasted. {pasted.fault}")
            return None
        terms, rates, fault = merged(basis.terms, basis.rates, pasted, max(row, 0))
        if fault:
            self._refuse(f"Nothing was pasted. {fault}")
            return None
        self._take(terms, rates, "Pasted quotes")
        return None

    def _take(self, terms: FloatArray, rates: FloatArray, text: str) -> None:
        reason = self._put(text, terms=terms, rates=rates)
        if reason:
            self._refuse(f"Nothing was pasted. {reason}")
            return
        low, high = numbers.rate(float(rates.min()), 3), numbers.rate(float(rates.max()), 3, with_unit=True)
        self.message.emit(
            f"Pasted. {numbers.integer(rates.size)} quotes from {low} to {high}, read as percent a year."
        )
