"""What a curve can be compared with: another one of the book, its own former version, one that is pasted."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from desk.book import Basis, Book
from desk.rates.curve_error import CurveError
from desk.window.curve.edits import quotes_fault, read_cells
from desk.window.curve.shown import Shown, pasted_curve, shown_of
from desk.window.curve.targets import Part, Target, basis_of, targets_of
from desk.window.parts.fields import Choice
from desk.window.parts.tables import parse_grid

__all__ = ["FORMER", "PASTED", "Compared", "Former", "choices_of", "compared", "read_pasted"]


FORMER = "former"
PASTED = "pasted"


class Former:
    """The last version of each curve before the one that is there now."""

    def __init__(self) -> None:
        self._now: dict[Target, Shown] = {}
        self._before: dict[Target, Shown] = {}

    def clear(self) -> None:
        """Forget all: another book is open."""
        self._now.clear()
        self._before.clear()

    def note(self, target: Target, shown: Shown) -> None:
        """Take notice of a curve as it is now."""
        now = self._now.get(target)
        if now is None:
            self._now[target] = shown
        elif now.curve is not shown.curve and not _are_alike(now, shown):
            self._before[target] = now
            self._now[target] = shown

    def of(self, target: Target) -> Shown | None:
        """The version before; None where the curve has not changed since the book was opened."""
        return self._before.get(target)


def _are_alike(one: Shown, other: Shown) -> bool:
    times = np.linspace(0.25, 60.0, 80)
    return bool(np.array_equal(one.curve.zero(times), other.curve.zero(times)))


@dataclass(frozen=True, eq=False)
class Compared:
    """The other curve, and what to call it: in full, and before the names of its lines."""

    shown: Shown
    title: str
    short: str


def choices_of(book: Book, target: Target, former: Former, pasted: Shown | None) -> tuple[Choice, ...]:
    """What a curve can be compared with now."""
    found = [Choice(None, "Nothing")]
    found += [
        Choice(other, other.title) for other in targets_of(book) if other != target and _is_there(book, other)
    ]
    if former.of(target) is not None:
        found.append(Choice(FORMER, "Before the last change", "As this curve was before it changed last."))
    if pasted is not None:
        found.append(
            Choice(PASTED, "The pasted rates", "Zero rates from the clipboard; not part of the book.")
        )
    return tuple(found)


def _is_there(book: Book, other: Target) -> bool:
    basis = basis_of(book, other)
    return basis is not None and (other.part is not Part.INFLATION or basis.inflation is not None)


def compared(
    book: Book, target: Target, choice: object, former: Former, pasted: Shown | None
) -> Compared | None:
    """The curve chosen to compare with; None for none.

    Raises
    ------
    ValueError
        If the basis of the other one gives no curve.
    """
    if choice == FORMER:
        before = former.of(target)
        return None if before is None else Compared(before, "the curve before", "Before")
    if choice == PASTED:
        return None if pasted is None else Compared(pasted, "the pasted rates", "Pasted")
    if not isinstance(choice, Target):
        return None
    basis: Basis | None = basis_of(book, choice)
    shown = None if basis is None else shown_of(basis, choice.part)
    if shown is None:
        return None
    title = choice.title[:1].casefold() + choice.title[1:]
    return Compared(shown, title, choice.short)


def read_pasted(text: str, like: Shown) -> tuple[Shown | None, str]:
    """A curve from cells on the clipboard: terms in years and zero rates in percent, stated as another's are.

    Returns
    -------
    shown : Shown or None
    fault : str
        Why there is none; empty where there is.
    """
    grid = parse_grid(text)
    if not grid:
        return (
            None,
            "There is nothing to compare with: copy two columns, terms in years and zero rates in percent.",
        )
    pasted = read_cells(grid, "term")
    fault = pasted.fault
    if not fault and "rate" not in pasted.columns:
        fault = "A curve needs two columns: terms in years and zero rates in percent."
    if fault:
        return None, f"Nothing was taken. {fault}"
    terms, rates = np.array(pasted.columns["term"]), np.array(pasted.columns["rate"])
    fault = quotes_fault(terms, rates)
    if fault:
        return None, f"Nothing was taken. {fault}"
    try:
        return pasted_curve(terms, rates, like), ""
    except (CurveError, ValueError) as error:
        return None, f"Nothing was taken. {error}"
