"""Zero rates before and after a shock, at the terms that pictures and tables show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from desk.book import Book, Shock
from desk.book.arrays import FloatArray
from desk.book.shock import RATE_MOVES
from desk.valuation.measures import BASIS_POINT, KEY_TERMS
from desk.valuation.moved_curve import CurveMove, MovedCurve

__all__ = ["MovedRates", "moved_rates"]

_LEAST_TERM = 1.0 / 12.0
_POINTS = 121


@dataclass(frozen=True, eq=False)
class MovedRates:
    """Continuous zero rates before and after.

    Attributes
    ----------
    time, before, after : ndarray, shape (m,)
        [years], [1/year].
    term, term_before, term_after : ndarray, shape (k,)
        The same at the key terms.
    fault : str
        Why the curve cannot be moved so; empty where it can.
    """

    time: FloatArray
    before: FloatArray
    after: FloatArray
    term: FloatArray
    term_before: FloatArray
    term_after: FloatArray
    fault: str = ""

    @property
    def move_bp(self) -> FloatArray:
        """After less before [basis points]."""
        return np.asarray((self.after - self.before) / BASIS_POINT)

    @property
    def term_move_bp(self) -> FloatArray:
        """The same at the key terms."""
        return np.asarray((self.term_after - self.term_before) / BASIS_POINT)


def moved_rates(book: Book, shock: Shock | None) -> MovedRates:
    """Zero rates of a book before and after a shock; without one, twice the same.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    before = book.basis.curve
    own = [float(term) for term in book.basis.terms if np.isfinite(term)]
    last = float(np.clip(max(own, default=30.0), 10.0, 60.0))
    stated = [] if shock is None else [move.term for move in shock.moves if move.term]
    last = max(last, *(min(term, 60.0) for term in stated)) if stated else last
    time = np.unique(np.concatenate(([_LEAST_TERM], np.linspace(0.0, last, _POINTS)[1:])))
    term = np.array(KEY_TERMS)
    after, fault = before, ""
    if shock is not None and any(move.kind in RATE_MOVES for move in shock.moves):
        try:
            after = MovedCurve(before, CurveMove(shock.moves, shock.compounding))
        except ValueError as error:
            fault = f"The curve cannot be moved so: {error}."
    return MovedRates(
        time, before.zero(time), after.zero(time), term, before.zero(term), after.zero(term), fault
    )
