"""The tables of the station Curve, of which only those that belong to the curve are offered."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QStackedWidget, QWidget

from desk.book import Basis, LiabilityMethod
from desk.rates.fitting import CurveFit
from desk.window.curve.bond_figures import bond_figures, fit_in_words
from desk.window.curve.bonds_page import BondsPage
from desk.window.curve.faults import QUOTED_KINDS
from desk.window.curve.headings import (
    HOW_INFLATION,
    HOW_QUOTES,
    HOW_SPREADS,
    INFLATION_COLUMNS,
    QUOTE_COLUMNS,
    SPREAD_COLUMNS,
)
from desk.window.curve.quotes_page import QuotesPage
from desk.window.curve.rates_page import RatesPage
from desk.window.curve.shown import Shown
from desk.window.curve.targets import Part, bonds_of, is_exact
from desk.window.parts.pages import Pages
from desk.window.parts.tables import Table
from desk.window.parts.theme import ThemeSwitch

__all__ = ["CurvePages"]

_SOURCE = 0
"""The place of its tab."""


class CurvePages(Pages):
    """What a curve is made from, where that is a table, and what it says term by term.

    Attributes
    ----------
    quotes : QuotesPage
    bonds : BondsPage
    rates : RatesPage
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(theme_switch, name="Tables of the curve")
        self.quotes = QuotesPage(theme_switch)
        self.bonds = BondsPage(theme_switch)
        self.rates = RatesPage(theme_switch)
        self._source = QStackedWidget()
        self._source.addWidget(self.quotes)
        self._source.addWidget(self.bonds)
        self.add("source", "Quotes", self._source)
        self.add("rates", "Rates by term", self.rates)

    @property
    def table(self) -> Table:
        """The table that is seen."""
        if self.current == "rates":
            return self.rates.table
        return self.bonds.table if self._source.currentWidget() is self.bonds else self.quotes.table

    def show_source(self, basis: Basis, part: Part, shown: Shown | None, *, is_draft: bool) -> None:
        """Show what a curve of a basis is made from.

        Parameters
        ----------
        basis : Basis
        part : Part
        shown : Shown or None
            The curve as it is in the book; None where it has none.
        is_draft : bool
            Whether the basis is a draft, from which that curve does not follow.
        """
        curve = None if shown is None else shown.curve
        bonds = bonds_of(basis, part)
        if bonds is not None:
            fit: CurveFit | None = None if shown is None or is_draft else shown.fit
            words = "" if fit is None else fit_in_words(bonds, fit, is_exact=is_exact(basis, part))
            self.bonds.show_bonds(bonds, bond_figures(basis, bonds, fit), words)
            self._offer(self.bonds, "Bonds")
        elif part is Part.INFLATION:
            self.quotes.set_kind(INFLATION_COLUMNS, "quote", "Expected inflation", HOW_INFLATION)
            inflation, none = basis.inflation, np.zeros(0)
            terms, rates = (none, none) if inflation is None else (inflation.terms, inflation.rates)
            self.quotes.show_quotes(terms, rates, curve, is_index=True)
            self._offer(self.quotes, "Quotes")
        elif part is Part.LIABILITIES and basis.liability_method is LiabilityMethod.TERM_SPREADS:
            self.quotes.set_kind(SPREAD_COLUMNS, "spread", "Spreads of the liabilities", HOW_SPREADS)
            self.quotes.show_quotes(basis.liability_terms, basis.liability_spreads, curve)
            self._offer(self.quotes, "Spreads")
        elif part is Part.CURVE and basis.curve_kind in QUOTED_KINDS:
            self.quotes.set_kind(QUOTE_COLUMNS, "quote", "Quotes of the curve", HOW_QUOTES)
            self.quotes.show_quotes(basis.terms, basis.rates, curve)
            self._offer(self.quotes, "Quotes")
        else:
            self._offer(None, "")

    def _offer(self, source: QWidget | None, title: str) -> None:
        """Offer the table of what the curve is made from; show it where it is another one than before."""
        before = self.tabs.isTabVisible(_SOURCE), self._source.currentWidget()
        self.tabs.setTabVisible(_SOURCE, source is not None)
        if source is not None:
            self.tabs.setTabText(_SOURCE, title)
            self._source.setCurrentWidget(source)
        if (self.tabs.isTabVisible(_SOURCE), self._source.currentWidget()) != before:
            self.show_page("rates" if source is None else "source")
