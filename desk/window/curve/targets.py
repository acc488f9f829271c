"""Which curve of a book is looked at, and where an edit of it goes."""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

from desk.book import Basis, BondFit, Book, CurveBonds, CurveKind, LiabilityMethod
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.bond_cells import no_bonds

__all__ = ["Part", "Target", "basis_of", "bonds_of", "is_exact", "targets_of", "with_basis"]


class Part(StrEnum):
    """A curve of a basis."""

    CURVE = "curve"
    LIABILITIES = "liabilities"
    INFLATION = "inflation"


_TITLES = {
    Part.CURVE: "Curve of the basis",
    Part.LIABILITIES: "Liability curve",
    Part.INFLATION: "Expected inflation",
}
_SECOND_TITLES = {
    Part.CURVE: "Second basis: curve",
    Part.LIABILITIES: "Second basis: liability curve",
    Part.INFLATION: "Second basis: inflation",
}
_SHORT = {Part.CURVE: "Curve", Part.LIABILITIES: "Liability", Part.INFLATION: "Inflation"}


@dataclass(frozen=True)
class Target:
    """One curve of one of the two bases of a book."""

    part: Part = Part.CURVE
    is_second: bool = False

    @property
    def title(self) -> str:
        """Its name in a list."""
        return (_SECOND_TITLES if self.is_second else _TITLES)[self.part]

    @property
    def picture_title(self) -> str:
        """The heading of its picture."""
        if self.part is Part.INFLATION:
            lines = "expected inflation and price index"
        else:
            lines = "zero rates, forward rates and discount factors"
        if self == Target() or (self.part is Part.INFLATION and not self.is_second):
            return lines[:1].upper() + lines[1:]
        head = self.title.removesuffix(": inflation")
        return f"{head}: {lines}"

    @property
    def short(self) -> str:
        """Its name before that of a line in a picture."""
        name = _SHORT[self.part]
        return f"2nd {name.casefold()}" if self.is_second else name


def targets_of(book: Book) -> tuple[Target, ...]:
    """The curves that can be looked at: those of the second basis only where there is one."""
    seconds = (False, True) if book.second_basis is not None else (False,)
    return tuple(Target(part, is_second) for is_second in seconds for part in Part)


def basis_of(book: Book, target: Target) -> Basis | None:
    """The basis the curve belongs to; None where the book has no second one."""
    return book.second_basis if target.is_second else book.basis


def with_basis(book: Book, target: Target, basis: Basis) -> Book:
    """The book with another basis in the place of the one the curve belongs to.

    A second basis with the same inflation as the first one goes on having it.
    """
    if target.is_second:
        return replace(book, second_basis=basis)
    second = book.second_basis
    if second is not None and second.inflation == book.basis.inflation:
        second = replace(second, inflation=basis.inflation)
    return replace(book, basis=basis, second_basis=second)


def bonds_of(basis: Basis, part: Part) -> CurveBonds | None:
    """The bonds the curve is drawn through; None where it is made from something else."""
    if part is Part.CURVE and basis.curve_kind is CurveKind.BONDS:
        return basis.bonds if basis.bonds is not None else no_bonds()
    if part is Part.LIABILITIES and basis.liability_method is LiabilityMethod.CORPORATE_BONDS:
        return basis.liability_bonds if basis.liability_bonds is not None else no_bonds()
    return None


def is_exact(basis: Basis, part: Part) -> bool:
    """Whether the curve reprices each of its bonds."""
    if part is Part.LIABILITIES:
        return basis.liability_fit is BondFit.EXACT
    return basis.bond_fit is BondFit.EXACT or basis.extrapolation is Extrapolation.SMITH_WILSON
