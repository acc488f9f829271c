"""Edits of the basis a curve belongs to: taken when they give a curve, else kept aside as a draft."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from desk.book import Basis, Book, CurveBonds, CurveKind, Inflation, LiabilityMethod
from desk.book.arrays import FloatArray
from desk.rates.curve import DiscountCurve
from desk.valuation.restating import with_day_count
from desk.window.curve.building import Builder, must_wait
from desk.window.curve.faults import QUOTED_KINDS, fault_of
from desk.window.curve.starting import liability_start, mean_time, source_of, start
from desk.window.curve.targets import Part, Target, basis_of, with_basis
from desk.window.document import Document

__all__ = ["Editor"]


class Editor:
    """Puts edits of one curve into the open book.

    An edit that gives no curve is not taken. What a curve of another kind lacks at first, its bonds, is
    gathered in a *draft* beside the book, until it gives a curve and goes into the book as one step. What a
    curve was made from before it became one of another kind is kept, to come back to. A curve of many bonds
    is built in the background; until it is there its changes are a draft too.

    Attributes
    ----------
    builder : Builder or None
        Without one every curve is built at once.
    on_built : callable
        Is told, after a curve was built in the background, why it was not taken, or nothing.
    """

    def __init__(self, document: Document, builder: Builder | None = None) -> None:
        self.document = document
        self.builder = builder
        self.on_built: Callable[[str], None] = lambda reason: None
        self._found: tuple[Basis, Part, str] | None = None
        self._waiting: Target | None = None
        self.target = Target()
        self._drafts: dict[Target, dict[str, Any]] = {}
        self._kept: dict[tuple[bool, CurveKind], dict[str, Any]] = {}

    def clear(self) -> None:
        """Forget drafts and what was kept: another book is open."""
        self.target = Target()
        self._stop()
        self._drafts.clear()
        self._kept.clear()

    # What there is

    @property
    def book(self) -> Book:
        """The open book."""
        book = self.document.book
        if book is None:
            raise RuntimeError("there is no open book to edit")
        return book

    @property
    def basis(self) -> Basis:
        """The basis the curve belongs to, as it is in the book."""
        basis = basis_of(self.book, self.target)
        if basis is None:
            raise RuntimeError("the book has no such basis")
        return basis

    @property
    def has_draft(self) -> bool:
        """Whether there are changes that give no curve yet."""
        return self.target in self._drafts

    @property
    def drafted(self) -> Basis:
        """The basis with the draft's changes."""
        return replace(self.basis, **self._drafts.get(self.target, {}))

    @property
    def draft_fault(self) -> str:
        """Why the draft gives no curve yet; empty where there is none."""
        if not self.has_draft:
            return ""
        if self.builder is not None and self._waiting == self.target and self.builder.words:
            return self.builder.words
        basis, part = self.drafted, self.target.part
        if self._found is not None and self._found[:2] == (basis, part):
            return self._found[2]
        if self.builder is not None and must_wait(basis, part):
            return "The curve of these bonds was not drawn to its end: change a bond, or give them up."
        return fault_of(basis, part)

    def discard_draft(self) -> None:
        """Leave the curve as it is in the book."""
        if self._waiting == self.target:
            self._stop()
        self._drafts.pop(self.target, None)

    def _stop(self) -> None:
        """Build no more of what is built in the background."""
        self._waiting = None
        if self.builder is not None:
            self.builder.stop()

    # Edits

    def put(self, text: str, *, may_wait: bool = False, **changes: Any) -> str:
        """Change fields of the basis; why not, where they would give no curve.

        Changes of a draft are taken into it; `may_wait` makes a draft of those that give no curve.
        """
        draft = self._drafts.get(self.target, {})
        former, target = self.basis, self.target
        basis = replace(former, **{**draft, **changes})
        self._stop()
        if self.builder is not None and must_wait(basis, target.part):
            self._waiting = target
            self._drafts[target] = {**draft, **changes}

            def built(fault: str) -> None:
                if basis_of(self.book, target) is not former:
                    # Something else was edited meanwhile: it is built once more, with that.
                    again = self._drafts.pop(target)
                    now, self.target = self.target, target
                    reason = self.put(text, may_wait=may_wait, **again)
                    self.target = now
                    self.on_built(reason)
                elif fault and (draft or may_wait):
                    self._found = (basis, target.part, fault)
                    self.on_built("")
                elif fault:
                    self._drafts.pop(target)
                    self.on_built(f"{fault} The curve is unchanged.")
                else:
                    self._drafts.pop(target)
                    self.document.edit(text, with_basis(self.book, target, basis))
                    self.on_built("")

            def stopped() -> None:
                self._drafts.pop(target, None)
                self.on_built("The curve was not drawn to its end, and is unchanged.")

            self.builder.build(basis, target.part, built, stopped)
            return ""
        fault = fault_of(basis, target.part)
        if fault and (draft or may_wait):
            self._drafts[self.target] = {**draft, **changes}
            return ""
        if fault:
            return f"{fault} The curve is unchanged."
        self._drafts.pop(self.target, None)
        self.document.edit(text, with_basis(self.book, self.target, basis))
        return ""

    @property
    def _curve(self) -> DiscountCurve | None:
        """The curve of the basis as it is in the book; None where it has none."""
        return None if fault_of(self.basis, Part.CURVE) else self.basis.curve

    def choose_kind(self, kind: CurveKind, name: str) -> str:
        """State the curve in another way, near the present one or as it was when it was last stated so."""
        basis = self.basis
        self.discard_draft()
        if kind is basis.curve_kind:
            return ""
        curve = self._curve
        if curve is not None:
            self._kept[(self.target.is_second, basis.curve_kind)] = source_of(basis)
        same = kind in QUOTED_KINDS and basis.curve_kind in QUOTED_KINDS
        kept = None if same else self._kept.get((self.target.is_second, kind))
        changes = start(basis, kind, kept=kept, curve=curve, middle=mean_time(self.book))
        return self.put(f"Curve stated by {name}", may_wait=kind is CurveKind.BONDS, **changes)

    def choose_method(self, method: LiabilityMethod, name: str) -> str:
        """Discount liabilities in another way."""
        self.discard_draft()
        changes = liability_start(self.basis, method, curve=self._curve, middle=mean_time(self.book))
        return self.put(
            f"Liabilities discounted on {name}",
            may_wait=method is LiabilityMethod.CORPORATE_BONDS,
            **changes,
        )

    def put_quotes(self, text: str, terms: FloatArray, rates: FloatArray) -> str:
        """Put quotes of the curve, spreads or expected inflation."""
        if self.target.part is Part.LIABILITIES:
            return self.put(text, liability_terms=terms, liability_spreads=rates)
        if self.target.part is Part.CURVE:
            return self.put(text, terms=terms, rates=rates)
        inflation = self.basis.inflation
        if inflation is None:
            return self.put(text, inflation=Inflation(terms, rates))
        return self.put(text, inflation=replace(inflation, terms=terms, rates=rates))

    def put_bonds(self, text: str, bonds: CurveBonds) -> str:
        """Put bonds of the curve or of the liabilities."""
        if self.target.part is Part.LIABILITIES:
            return self.put(text, liability_bonds=bonds)
        return self.put(text, bonds=bonds)

    def put_inflation(self, text: str, **changes: Any) -> str:
        """Change fields of the expected inflation."""
        inflation = self.basis.inflation
        if inflation is None:
            return "There is no expected inflation yet: give its rates first."
        try:
            return self.put(text, inflation=replace(inflation, **changes))
        except ValueError as error:
            return f"{error}. Expected inflation is unchanged."

    def put_day_count(self, value: Any) -> None:
        """Count days in another way, on both bases."""
        book = with_day_count(self.book, value)
        if book.second_basis is not None:
            book = replace(book, second_basis=replace(book.second_basis, day_count=value))
        self.document.edit("Change of the day count", book)

    def add_second_basis(self) -> None:
        """Give the book a second basis: a copy of the first, to be changed."""
        self.document.edit("Second basis", replace(self.book, second_basis=self.book.basis))

    def remove_second_basis(self) -> None:
        """Take the second basis out of the book."""
        self.document.edit("Removal of the second basis", replace(self.book, second_basis=None))
