"""The form of the station Standing: the basis, and the basis it is compared with."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from PySide6.QtCore import QObject, Signal

from desk.book import Basis, BondFit, Book, LiabilityMethod
from desk.valuation.records import Standing
from desk.window.document import Document
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField, Field, Form, NumberField, TextField
from desk.window.parts.labels import well_broken
from desk.window.parts.premiums import liability_spread_field, market_risk_premium_field
from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.edits import (
    basis_fault,
    changed_curve,
    held_as_second,
    swapped,
    with_method,
    without_second,
)
from desk.window.standing.spreads import SpreadsTable
from desk.window.standing.wording import basis_words

__all__ = ["BasisForm"]

_METHODS = (
    Choice(LiabilityMethod.CURVE, "The curve", "The curve of the basis, with the liability spread."),
    Choice(
        LiabilityMethod.TERM_SPREADS,
        "The curve and a spread by term",
        "A spread for each term is added to the curve, and the liability spread.",
    ),
    Choice(
        LiabilityMethod.CORPORATE_BONDS,
        "High-quality corporate bonds",
        "A curve of their own through corporate bonds, as for accounting; the liability spread is added.",
    ),
    Choice(
        LiabilityMethod.EXPECTED_RETURN,
        "Expected return on assets",
        "One flat rate: what the assets are expected to earn; the liability spread is added.",
    ),
)
_FITS = (
    Choice(BondFit.EXACT, "Exactly", "Every bond is repriced."),
    Choice(BondFit.NELSON_SIEGEL, "Nelson-Siegel", "The nearest smooth curve with one hump."),
    Choice(BondFit.SVENSSON, "Svensson", "The nearest smooth curve with two humps."),
)
_COMPARED = (
    Choice(False, "Nothing", "Only the first basis is shown."),
    Choice(True, "The second basis", "Each figure is shown with its change against the second basis."),
)


class BasisForm(QObject):
    """Shows the bases of the open book and edits them.

    Attributes
    ----------
    method, liability_spread, market_risk_premium, expected_return, bond_fit, compare, name : Field
    spreads : SpreadsTable
    hold_button, swap_button, drop_button, curve_button : QPushButton

    Signals
    -------
    refused(str)
        An edit that was not taken, and why.
    """

    refused = Signal(str)

    def __init__(
        self, form: Form, document: Document, theme_switch: ThemeSwitch, on_curve: Callable[[], object]
    ) -> None:
        super().__init__(form)
        self._document = document
        self._form = form
        self._make_basis(theme_switch, on_curve)
        self._make_second()
        form.add_heading("In reports")
        self.name = TextField("Title", hint="Stands over reports of this basis.")
        form.add(self.name)
        for field, name, text in (
            (self.liability_spread, "liability_spread", "liability spread"),
            (self.market_risk_premium, "market_risk_premium", "market risk premium"),
            (self.expected_return, "expected_return", "expected return"),
            (self.bond_fit, "liability_fit", "fit of the corporate bonds"),
            (self.name, "title", "title"),
        ):
            field.committed.connect(
                lambda value, name=name, text=text: self._change(f"Change of the {text}", **{name: value})
            )
        self.method.committed.connect(self._change_method)
        self.compare.committed.connect(document.compare)
        self.spreads.edited.connect(
            lambda text, terms, spreads: self._change(text, liability_terms=terms, liability_spreads=spreads)
        )
        self.spreads.refused.connect(self.refused)

    def _make_basis(self, theme_switch: ThemeSwitch, on_curve: Callable[[], object]) -> None:
        form = self._form
        form.add_heading("The basis")
        self.basis_note = form.add_note("")
        self.method = ChoiceField("Liabilities are discounted on", _METHODS)
        self.expected_return = NumberField(
            "Expected return",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=0.5,
            sensible=(0.0, 0.08),
            hint="On the assets, annual effective.",
        )
        self.spreads = SpreadsTable(theme_switch)
        self.bond_fit = ChoiceField("Their curve is drawn", _FITS)
        form.add(self.method)
        form.add(self.expected_return)
        form.add_widget(self.spreads)
        form.add(self.bond_fit)
        self.bonds_note = form.add_note("")
        self.equivalent_note = form.add_note("")
        self.liability_spread = liability_spread_field()
        self.market_risk_premium = market_risk_premium_field()
        form.add(self.liability_spread)
        form.add(self.market_risk_premium)
        self.curve_button = form.add_button("Edit the curve", on_curve)

    def _make_second(self) -> None:
        form = self._form
        form.add_heading("Compared with")
        self.compare = ChoiceField("Compare with", _COMPARED)
        form.add(self.compare)
        self.second_note = form.add_note("")
        self.hold_button = form.add_button("Hold this basis as the second", self.hold)
        self.swap_button = form.add_button("Swap the two", self.swap)
        self.drop_button = form.add_button("Take the second away", self.drop)
        self.hold_button.setToolTip(
            "A copy of this basis is kept to compare with, whatever becomes of this one"
        )
        self.swap_button.setToolTip(
            "The second basis becomes the first, to be edited, and this one the second"
        )

    # Showing

    def show_book(self, book: Book, standing: Standing | None, second: Standing | None) -> None:
        """Show the bases of a book; the standings on them where they are those of the book."""
        basis = book.basis
        self.basis_note.setText(f"Valued at {numbers.day(basis.valuation_date)} in {basis.currency}.")
        _set(self.method, basis.liability_method)
        _set(self.liability_spread, basis.liability_spread)
        _set(self.market_risk_premium, basis.market_risk_premium)
        _set(self.expected_return, basis.expected_return)
        _set(self.bond_fit, basis.liability_fit)
        _set(self.name, basis.title)
        method = basis.liability_method
        self.expected_return.setVisible(method is LiabilityMethod.EXPECTED_RETURN)
        self.spreads.setVisible(method is LiabilityMethod.TERM_SPREADS)
        self.bond_fit.setVisible(method is LiabilityMethod.CORPORATE_BONDS)
        self.bonds_note.setVisible(method is LiabilityMethod.CORPORATE_BONDS)
        if method is LiabilityMethod.TERM_SPREADS:
            self.spreads.show_basis(basis)
        self.bonds_note.setText(_bonds_text(basis))
        self.equivalent_note.setText(_equivalent_text(standing, second))
        self._show_second(book)

    def _show_second(self, book: Book) -> None:
        second = book.second_basis
        there = second is not None
        self.compare.setEnabled(there)
        _set(self.compare, self._document.is_comparing)
        self.swap_button.setVisible(there)
        self.drop_button.setVisible(there)
        if second is None:
            text = (
                "This book has one basis. Hold it as the second and change the first, or put the second in "
                "the sheet Second basis of the workbook."
            )
        else:
            text = f"Second basis: {basis_words(second)}. To change it, swap the two, or use Curve."
        self.second_note.setText(well_broken(text))

    # Editing

    def _change(self, text: str, **changes: Any) -> None:
        book = self._document.book
        if book is not None:
            self._put(text, replace(book.basis, **changes))

    def _change_method(self, method: LiabilityMethod) -> None:
        book = self._document.book
        if book is not None:
            self._put(
                "Change of the liability basis", with_method(book.basis, method, self._document.standing)
            )

    def _put(self, text: str, basis: Basis) -> None:
        """Edit the basis; say why not, where what is changed would give liabilities no value."""
        book = self._document.book
        if book is None:
            return
        # Drawing a curve takes its time: only where the edit has to do with it.
        fault = basis_fault(basis) if changed_curve(book.basis, basis) else ""
        if fault:
            self.show_book(book, self._document.standing, self._document.comparison)
            self.refused.emit(f"{fault} The basis is unchanged.")
            return
        self._document.edit(text, replace(book, basis=basis))

    def hold(self) -> None:
        """Keep the basis as the second one too, and compare with it."""
        book = self._document.book
        if book is not None:
            self._document.compare(True)
            self._document.edit("Basis held as the second", held_as_second(book))

    def swap(self) -> None:
        """Put the two bases in each other's place."""
        book = self._document.book
        if book is not None and book.second_basis is not None:
            self._document.edit("Swap of the two bases", swapped(book))

    def drop(self) -> None:
        """Take the second basis away."""
        book = self._document.book
        if book is not None:
            self._document.edit("Removal of the second basis", without_second(book))


def _set(field: Field, value: Any) -> None:
    """Show a value, but leave an entry alone that the reader has yet to finish."""
    line = getattr(field, "line", None)
    if line is not None and line.hasFocus() and line.isModified():
        return
    set_value = getattr(field, "set_value", None)
    if set_value is not None:
        set_value(value)


def _bonds_text(basis: Basis) -> str:
    count = len(basis.liability_bonds) if basis.liability_bonds is not None else 0
    bonds = "1 bond" if count == 1 else f"{numbers.integer(count)} bonds"
    return (
        f"Through {bonds} of the sheet Liability bonds. They are looked at and changed in Curve, as the "
        "liability curve."
    )


def _equivalent_text(standing: Standing | None, second: Standing | None) -> str:
    """The single rate that the liabilities are worth, on both bases where there are two."""
    if standing is None:
        return ""
    text = f"Single equivalent rate of the liabilities: {_rate(standing)} a year"
    return f"{text}; on the second basis {_rate(second)}." if second is not None else f"{text}."


def _rate(standing: Standing) -> str:
    return numbers.rate(standing.liabilities.equivalent_rate, 3, with_unit=True)
