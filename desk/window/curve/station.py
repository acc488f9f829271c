"""The station Curve: what a curve is made from, what is drawn through it, and the premiums of the basis."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QResizeEvent
from PySide6.QtWidgets import QWidget

from desk.book import Basis, Book, CurveBonds, CurveKind, LiabilityMethod
from desk.book.arrays import FloatArray
from desk.intake.records import Reading
from desk.rates.compounding import Compounding
from desk.rates.curve import DiscountCurve
from desk.window.curve.bond_cells import added
from desk.window.curve.bond_figures import fit_in_words
from desk.window.curve.building import Builder, must_wait
from desk.window.curve.comparison import (
    PASTED,
    Compared,
    Former,
    choices_of,
    compared,
    read_pasted,
)
from desk.window.curve.editing import Editor
from desk.window.curve.faults import fault_of
from desk.window.curve.fields import CurveFields
from desk.window.curve.pages import CurvePages
from desk.window.curve.picture import CurvePicture, MisfitPicture, reach
from desk.window.curve.shown import Shown, shown_of
from desk.window.curve.starting import new_bond
from desk.window.curve.targets import Part, Target, basis_of, bonds_of, is_exact, targets_of
from desk.window.curve.words import CURVE_KINDS, LIABILITY_METHODS, SHOWN_AS
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField
from desk.window.parts.theme import ThemeSwitch
from desk.window.station import Station

__all__ = ["CurveStation"]

_USUAL_RATE = 0.02
"""Of a first quote, where there is no curve to put it on."""
_LEAST_SEEN = 0.005
"""Misfits below it are not drawn [basis points]."""
_UPRIGHT_FROM = 860
"""From this height on [px] the pictures stand one over the other; in less they stand side by side."""


class CurveStation(Station):
    """A curve of the book, stated in whichever way, editable and pasteable, and compared with another.

    An edit that gives no curve is refused with one line that says why, or kept aside as a draft while bonds
    are gathered; the former curve stays.
    """

    key = "curve"
    title = "Curve"
    purpose = "The curve that everything is discounted on: what it is made from, and what is drawn through it"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self.builder = Builder(jobs, "edited curve")
        self.redrawer = Builder(jobs, "drawn curve")
        self.editor = Editor(document, self.builder)
        self.editor.on_built = self._on_built
        self.former = Former()
        self._source: Reading | None = None
        self._shown_book: Book | None = None
        self._pasted: Shown | None = None
        self._refusal = ""
        self._offered: dict[ChoiceField, tuple[Choice, ...]] = {}
        self.picture = CurvePicture(theme_switch)
        self.misfit = MisfitPicture(theme_switch)
        self.pages = CurvePages(theme_switch)
        self.pages.take_keys_of(self)
        self.quotes, self.bonds, self.rates = self.pages.quotes, self.pages.bonds, self.pages.rates
        for teller in (self.picture, self.misfit, self.quotes, self.bonds, self.rates):
            teller.message.connect(self.message)
        for page in (self.quotes, self.bonds):
            page.refused.connect(self._refuse)
        self.quotes.take = self._take_quotes
        self.quotes.suggest = self._suggest
        self.bonds.take = self._take_bonds
        self.bonds.with_new = self._with_new_bond
        self._make_form()
        self.set_pictures(self.picture, self.misfit)
        self.pictures.setStretchFactor(0, 2)
        self.pictures.setStretchFactor(1, 1)
        self.misfit.hide()
        self.set_table(self.pages, share=46)
        self.set_form_visible()

    def home(self) -> QWidget:
        """The quotes or bonds, or what follows where there are none."""
        return self.pages.table

    def _make_form(self) -> None:
        form = self.form
        form.add_heading("What is looked at")
        self.date_note = form.add_note("")
        self.view = ChoiceField("Show", (Choice(Target(), Target().title),))
        self.compare_with = ChoiceField("Compare with", (Choice(None, "Nothing"),))
        self.shown_as = ChoiceField("Show rates", SHOWN_AS)
        form.add(self.view)
        form.add(self.compare_with)
        self.paste_button = form.add_button("Compare with pasted rates", self.compare_pasted)
        self.paste_button.setToolTip(
            "Terms in years and zero rates in percent from the clipboard, drawn over this curve"
        )
        form.add(self.shown_as)
        self.fields = CurveFields(form)
        form.add_heading("Second basis")
        self.second_button = form.add_button("Add a second basis", self._on_second)
        self.second_note = form.add_note("")
        self.view.committed.connect(self._on_view)
        self.compare_with.committed.connect(lambda _: self.redraw())
        self.shown_as.committed.connect(lambda _: self.redraw())
        fields = self.fields
        fields.changed.connect(self._on_changed)
        fields.kind_chosen.connect(self._on_kind)
        fields.method_chosen.connect(self._on_method)
        fields.inflation_changed.connect(
            lambda name, value, what: self._finish(
                self.editor.put_inflation(f"Change of the {what}", **{name: value})
            )
        )
        fields.day_count_chosen.connect(self.editor.put_day_count)

    # Showing

    @property
    def target(self) -> Target:
        """The curve that is looked at."""
        return self.editor.target

    def look_at(self, target: Target) -> None:
        """Look at another curve of the book."""
        self.editor.target = target
        self._refusal = ""
        self._shown_book = None
        self.compare_with.set_value(None)
        self.picture.stop_reading()
        self.request_refresh()
        self.refresh_now()

    def _on_view(self, target: Target) -> None:
        self.look_at(target)

    def refresh(self) -> None:
        """Show the curve of the open book."""
        book = self.document.book
        if self.document.source is not self._source:
            self._source = self.document.source
            self.editor.clear()
            self.redrawer.stop()
            self.former.clear()
            self._pasted = None
            self._refusal = ""
            self.picture.stop_reading()
        if book is None:
            self._shown_book = None
            self.show_empty(
                "A curve comes with a book. Open one, and what it is made from is here to see and to edit.",
                "Open a book",
                lambda: self.step_wanted.emit("open"),
            )
            return
        self.show_content()
        if book is self._shown_book:
            return
        if basis_of(book, self.target) is None:
            self.editor.target = Target()
        if self._shown_book is not None:
            self._refusal = ""
        self._shown_book = book
        self._show_form(book)
        self.redraw()

    def _show_form(self, book: Book) -> None:
        basis = self.editor.drafted
        self.date_note.setText(
            f"Valuation date {numbers.day(basis.valuation_date)}, currency {basis.currency}."
        )
        self._offer(self.view, tuple(Choice(one, one.title) for one in targets_of(book)), self.target)
        self.fields.show_basis(basis, self.target.part, _note(book, self.target))
        has_second = book.second_basis is not None
        self.second_button.setText("Remove the second basis" if has_second else "Add a second basis")
        self.second_note.setText(
            "Its curves are in the list above, to be changed and compared."
            if has_second
            else "A copy of this one, to be changed and compared."
        )

    def _offer(self, field: ChoiceField, choices: tuple[Choice, ...], value: object) -> None:
        """Offer choices without disturbing those that are there already."""
        if self._offered.get(field) != choices:
            field.set_choices(choices)
            self._offered[field] = choices
        field.set_value(value)

    def redraw(self) -> None:
        """Show the curve and what it is compared with, in the compounding chosen."""
        book = self.document.book
        if book is None:
            return
        target = self.target
        if must_wait(self.editor.basis, target.part):
            self._redraw_later()
            return
        fault = ""
        shown: Shown | None = None
        try:
            shown = shown_of(self.editor.basis, target.part)
        except ValueError as error:
            why = fault_of(self.editor.basis, target.part) or f"{error}."
            fault = f"There is no curve. {why}"
        if shown is not None:
            self.former.note(target, shown)
        other = self._other(book)
        basis = self.editor.drafted
        self.pages.show_source(basis, target.part, shown, is_draft=self.editor.has_draft)
        if shown is None:
            self.picture.clear()
            self.misfit.hide()
            self.rates.show_curve(None, until=1.0, compounding=Compounding.ANNUAL)
            if not fault and target.part is Part.INFLATION:
                self.picture.set_description(
                    "There is no expected inflation yet: paste its terms and rates, or add one."
                )
        else:
            self._draw(book, basis, shown, other)
        self._tell(fault)

    def _redraw_later(self) -> None:
        """Build the curve of the book in the background; what was drawn last stays, marked as stale."""
        basis, part = self.editor.basis, self.target.part

        def again(fault: str) -> None:
            if fault:
                self._not_built(basis, part, fault)
            else:
                self.redraw()

        self.pages.show_source(self.editor.drafted, part, None, is_draft=True)
        self.redrawer.build(basis, part, again, lambda: self._not_built(basis, part, "It was stopped."))
        self._tell("")

    def _not_built(self, basis: Basis, part: Part, fault: str) -> None:
        self.picture.clear()
        self.misfit.hide()
        self.rates.show_curve(None, until=1.0, compounding=Compounding.ANNUAL)
        self.pages.show_source(basis, part, None, is_draft=True)
        self.show_stale("Try again", self.redraw, text=f"There is no curve. {fault}")

    def _on_built(self, reason: str) -> None:
        """After a curve was built in the background for an edit."""
        self._refusal = reason
        self._shown_book = None
        self.refresh()
        if reason:
            self._refuse(reason)

    def _other(self, book: Book) -> Compared | None:
        choices = choices_of(book, self.target, self.former, self._pasted)
        value = self.compare_with.value
        known = any(choice.value == value for choice in choices)
        self._offer(self.compare_with, choices, value if known else None)
        try:
            return compared(book, self.target, self.compare_with.value, self.former, self._pasted)
        except ValueError as error:
            self._refusal = f"The other curve cannot be shown: {error}"
            return None

    def _compounding(self, shown: Shown) -> Compounding:
        return shown.compounding if self.shown_as.value == "quoted" else Compounding.CONTINUOUS

    def _draw(self, book: Book, basis: Basis, shown: Shown, other: Compared | None) -> None:
        ends = [float(flows.time.max()) for flows in (book.liabilities, book.asset_flows) if len(flows)]
        until = reach(shown, max(ends, default=0.0))
        compounding = self._compounding(shown)
        drawn = other.shown if other is not None else None
        name = other.short if other is not None else ""
        self.picture.show_curve(
            shown,
            until=until,
            compounding=compounding,
            title=self.target.picture_title,
            other=drawn,
            other_name=name,
        )
        self.rates.show_curve(shown, until=until, compounding=compounding, other=drawn, other_name=name)
        bonds = bonds_of(basis, self.target.part)
        if other is not None:
            self.misfit.show_difference(
                shown,
                other.shown,
                words=f"{self.target.title} less {other.title}",
                until=until,
                compounding=compounding,
            )
        elif bonds is not None and _has_misfits(shown, len(bonds)) and shown.fit is not None:
            exact = is_exact(basis, self.target.part)
            words = fit_in_words(bonds, shown.fit, is_exact=exact, name_first=True)
            self.misfit.show_misfits(shown.quotes.term, shown.fit, bonds.names, words)
        else:
            self.misfit.hide()
            return
        self.misfit.show()

    def _tell(self, fault: str) -> None:
        """Say what is wrong, or what a draft waits for, where it is seen."""
        if self._refusal:
            self.show_stale("Close", self._close, text=self._refusal)
        elif self.editor.has_draft:
            is_bare = not len(self.bonds.bonds)
            self.show_stale(
                "Paste bonds" if is_bare else "Give it up",
                self.bonds.replace_all if is_bare else self._discard,
                text=f"{self.editor.draft_fault} The former curve stays in use until then.",
            )
        elif fault:
            self.show_stale("Close", self.hide_stale, text=fault)
        elif self.redrawer.words:
            self.show_stale(text=f"{self.redrawer.words} What is shown is of the former one.")
        else:
            self.hide_stale()

    # Editing

    def _close(self) -> None:
        self._refusal = ""
        self.redraw()

    def _discard(self) -> None:
        self.editor.discard_draft()
        self._show_again()

    def _show_again(self) -> None:
        self._shown_book = None
        self.refresh()

    def _refuse(self, reason: str) -> None:
        """Say why an edit was not taken, where it is seen, until the next one is."""
        self._refusal = reason
        self._tell("")

    def _finish(self, reason: str) -> None:
        """After an edit from the form: say why it was not taken, and show what is there."""
        self._refusal = reason
        if reason:
            self._show_form(self.editor.book)
            self._tell("")
        else:
            self._show_again()

    def _taken(self, reason: str) -> str:
        """After an edit from a table: show what is there where it was taken."""
        if not reason:
            self._refusal = ""
            self._show_again()
        return reason

    def _take_quotes(self, text: str, terms: FloatArray, rates: FloatArray) -> str:
        return self._taken(self.editor.put_quotes(text, terms, rates))

    def _take_bonds(self, text: str, bonds: CurveBonds) -> str:
        return self._taken(self.editor.put_bonds(text, bonds))

    def _on_changed(self, name: str, value: Any, what: str) -> None:
        self._finish(self.editor.put(f"Change of the {what}", **{name: value}))

    def _on_kind(self, kind: CurveKind) -> None:
        name = next(choice.text for choice in CURVE_KINDS if choice.value is kind)
        self._finish(self.editor.choose_kind(kind, name[:1].casefold() + name[1:]))

    def _on_method(self, method: LiabilityMethod) -> None:
        name = next(choice.text for choice in LIABILITY_METHODS if choice.value is method)
        self._finish(self.editor.choose_method(method, name[:1].casefold() + name[1:]))

    def _on_second(self) -> None:
        if self.editor.book.second_basis is None:
            self.editor.add_second_basis()
        else:
            self.editor.remove_second_basis()

    def _suggest(self, term: float) -> float:
        """A rate to add at a term: on the curve."""
        basis, part = self.editor.basis, self.target.part
        try:
            shown = shown_of(basis, part)
        except ValueError:
            shown = None
        if shown is None:
            return _USUAL_RATE
        if part is Part.LIABILITIES:
            return float(basis.liability_spread_at([term])[0]) - basis.liability_spread
        return float(shown.zero(term, shown.compounding))

    def _with_new_bond(self, bonds: CurveBonds, after: int) -> CurveBonds:
        basis = self.editor.basis
        curve: DiscountCurve | None = None
        if not fault_of(basis, Part.CURVE):
            curve = basis.curve
        if self.target.part is Part.LIABILITIES and not fault_of(basis, Part.LIABILITIES):
            curve = basis.liability_curve
        name, maturity, coupon, frequency, bond_yield = new_bond(basis, bonds, curve, after)
        cells = {"name": name, "maturity": maturity, "coupon": coupon, "frequency": frequency}
        return added(bonds, after, **cells, **{"yield": bond_yield})

    def compare_pasted(self) -> None:
        """Draw the clipboard's terms and zero rates over the curve."""
        try:
            like = shown_of(self.editor.basis, self.target.part)
        except ValueError:
            like = None
        if like is None:
            self._refuse("There is no curve yet to compare with.")
            return
        pasted, fault = read_pasted(QGuiApplication.clipboard().text(), like)
        if pasted is None:
            self._refuse(fault)
            return
        self._pasted, self._refusal = pasted, ""
        self._offer(self.compare_with, choices_of(self.editor.book, self.target, self.former, pasted), PASTED)
        self.redraw()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Stand the pictures as the height allows."""
        super().resizeEvent(event)
        upright = self.height() >= _UPRIGHT_FROM
        self.pictures.setOrientation(Qt.Orientation.Vertical if upright else Qt.Orientation.Horizontal)


def _has_misfits(shown: Shown, count: int) -> bool:
    """Whether there is a misfit to be seen: an exact fit leaves only rounding."""
    fit = shown.fit
    return fit is not None and fit.residual_bp.size == count and fit.largest_bp >= _LEAST_SEEN


def _note(book: Book, target: Target) -> str:
    """What is to be known of where an edit goes."""
    second = book.second_basis
    if target.part is Part.INFLATION and second is not None:
        if second.inflation == book.basis.inflation:
            if target.is_second:
                return "The second basis has the inflation of the first one; an edit here gives it its own."
            return "The second basis has the same inflation, and follows."
        return "Each of the two bases has its own inflation."
    if target.part is Part.LIABILITIES:
        return "The curve shown has the liability spread in it."
    return ""
