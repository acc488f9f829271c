"""A curve after a shock.

A shock moves zero rates: its moves of rates are added up, relative moves are taken of the rate that was, and
floors hold what comes of it. The curve that was is asked for nothing but its zero rates, so any curve serves.

References
----------
Short, long, steepening and flattening moves: Basel Committee on Banking Supervision, Interest rate risk in
the banking book (April 2016, d368), Annex 2. Relative moves with a least size: Commission Delegated
Regulation (EU) 2015/35, Articles 166 and 167. Floors by term: Commission Delegated Regulation (EU) 2024/856.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray
from desk.book.shock import RATE_MOVES, Move, MoveKind, Shock
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import DiscountCurve
from desk.valuation.measures import BASIS_POINT

__all__ = ["DECAY", "CurveMove", "Knots", "MovedCurve", "PlainMoves"]

DECAY = 4.0  # years: how fast short moves fade and long ones grow, d368 Annex 2
_STEP = 1e-6  # years, over which an instantaneous forward rate is taken


class Knots:
    """A function of the term: lines between stated terms, flat outside them.

    Parameters
    ----------
    moves : sequence of Move
        With a term each, or one alone without, which holds for all terms.
    unit : float
        Their sizes are multiplied by it.

    Raises
    ------
    ValueError
        If a term is missing or stands twice; the message is one clause.
    """

    __slots__ = ("in_order", "size", "term")

    def __init__(self, moves: Sequence[Move], *, unit: float = 1.0) -> None:
        without = [move for move in moves if move.term is None]
        if without and len(moves) > 1:
            raise ValueError(f"a {without[0].kind} move without a term stands beside others")
        stated = np.array([move.term or 0.0 for move in moves], dtype=np.float64)
        order = np.argsort(stated, kind="stable")
        self.in_order = bool((np.diff(stated) > 0.0).all())
        self.term = stated[order]
        twice = np.flatnonzero(np.diff(self.term) == 0.0)
        if twice.size:
            raise ValueError(f"the term {self.term[twice[0]]:g} stands twice among its {moves[0].kind} moves")
        self.size = unit * np.array([move.size for move in moves], dtype=np.float64)[order]

    def at(self, time: FloatArray) -> FloatArray:
        """The sizes at times."""
        if self.term.size == 1:
            return np.full(np.shape(time), self.size[0])
        return np.asarray(np.interp(time, self.term, self.size))


class PlainMoves:
    """Moves whose size depends on the term alone.

    Parameters
    ----------
    moves : sequence of Move
        Of one shock; those of other kinds are passed over.

    Raises
    ------
    ValueError
        If they do not go together; the message is one clause.
    """

    __slots__ = ("knots", "long", "parallel", "short", "twists")

    def __init__(self, moves: Sequence[Move]) -> None:
        def total(kind: MoveKind) -> float:
            return BASIS_POINT * sum(move.size for move in moves if move.kind is kind)

        self.parallel = total(MoveKind.PARALLEL)
        self.short = total(MoveKind.SHORT)
        self.long = total(MoveKind.LONG)
        twists = [move for move in moves if move.kind is MoveKind.TWIST]
        if any(not move.term for move in twists):
            raise ValueError("a twist has no term above 0 to turn about")
        self.twists = tuple((move.term or 0.0, BASIS_POINT * move.size) for move in twists)
        rates = [move for move in moves if move.kind is MoveKind.RATE]
        if any(move.term is None for move in rates):
            raise ValueError("a move of the rate at a term has no term")
        self.knots = Knots(rates, unit=BASIS_POINT) if rates else None

    def at(self, time: FloatArray) -> FloatArray:
        """The moves at times [1/year]."""
        size = np.full(np.shape(time), self.parallel)
        if self.short or self.long:
            fading = np.exp(-time / DECAY)
            size += self.short * fading + self.long * (1.0 - fading)
        for term, most in self.twists:
            size += most * (np.minimum(time / term, 2.0) - 1.0)
        if self.knots is not None:
            size += self.knots.at(time)
        return size


class CurveMove:
    """How a shock moves zero rates.

    Parameters
    ----------
    moves : sequence of Move
        Those that move no rates are passed over.
    compounding : Compounding
        Of the rates that are moved.

    Attributes
    ----------
    is_additive : bool
        Whether the move of a continuous zero rate depends on the term alone and not on the rate.
    in_order : bool
        Whether the terms of moves that are joined by lines were stated in rising order.

    Raises
    ------
    ValueError
        If the moves do not go together; the message is one clause.
    """

    def __init__(self, moves: Sequence[Move], compounding: Compounding = Compounding.CONTINUOUS) -> None:
        def of(kind: MoveKind, unit: float) -> Knots | None:
            own = [move for move in moves if move.kind is kind]
            return Knots(own, unit=unit) if own else None

        self._plain = PlainMoves(moves)
        self._relative = of(MoveKind.RELATIVE, 1.0)
        self._least = of(MoveKind.LEAST, BASIS_POINT)
        self._floor = of(MoveKind.FLOOR, BASIS_POINT)
        self._compounding = compounding
        if self._least is not None and self._relative is None:
            raise ValueError("a least size has no relative move whose size it could be")
        self.is_additive = compounding is Compounding.CONTINUOUS and not (self._relative or self._floor)
        joined = (self._plain.knots, self._relative, self._least, self._floor)
        self.in_order = all(knots is None or knots.in_order for knots in joined)

    @classmethod
    def of_shock(cls, shock: Shock) -> CurveMove | None:
        """The moves of rates of a shock; None where it has none."""
        if not any(move.kind in RATE_MOVES for move in shock.moves):
            return None
        return cls(shock.moves, shock.compounding)

    def change(self, time: FloatArray, zero: FloatArray) -> FloatArray:
        """What is added to continuous zero rates.

        Parameters
        ----------
        time : ndarray, any shape
            [years]
        zero : ndarray, the shape of `time`
            Continuous zero rates before the shock [1/year].

        Returns
        -------
        ndarray, the shape of `time`
            [1/year]; NaN where a rate would leave nothing of the principal.
        """
        if self.is_additive:
            return self._plain.at(time)
        before = from_continuous(zero, self._compounding)
        size = self._plain.at(time)
        if self._relative is not None:
            own = self._relative.at(time) * np.maximum(before, 0.0)
            if self._least is not None:
                least = self._least.at(time)
                own = np.where(least >= 0.0, np.maximum(own, least), np.minimum(own, least))
            size = size + own
        after = before + size
        if self._floor is not None:
            after = np.maximum(after, np.minimum(self._floor.at(time), before))
        moved = after > -(self._compounding.per_year or np.inf)
        changed = to_continuous(np.where(moved, after, 0.0), self._compounding) - zero
        return np.asarray(np.where(moved, changed, np.nan))


class MovedCurve:
    """A curve whose zero rates are moved.

    Parameters
    ----------
    base : DiscountCurve
    move : CurveMove
    """

    def __init__(self, base: DiscountCurve, move: CurveMove) -> None:
        self.base = base
        self.move = move

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year]; at time 0 their limit."""
        times = np.asarray(time, dtype=np.float64)
        before = self.base.zero(times)
        return np.asarray(before + self.move.change(times, before))

    def discount(self, time: ArrayLike) -> FloatArray:
        """``P(0, time)``; times in years, any shape; ``P(0, 0) = 1``."""
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(np.exp(-self._exponent(np.asarray(time, dtype=np.float64))))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year].

        Where the two are equal, the instantaneous forward rate: the mean over the next millionth of a year,
        which is within about 1e-9 of it.
        """
        first, last = np.broadcast_arrays(
            np.asarray(start, dtype=np.float64), np.asarray(end, dtype=np.float64)
        )
        last = np.where(first == last, first + _STEP * np.maximum(first, 1.0), last)
        return np.asarray((self._exponent(last) - self._exponent(first)) / (last - first))

    def _exponent(self, time: FloatArray) -> FloatArray:
        """``-ln P(0, time)``."""
        return self.zero(time) * time
