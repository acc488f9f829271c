"""What a shock does to the rows of both sides: its moves, resolved against the lines of a book."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from desk.book import Fault, Severity
from desk.book.arrays import FloatArray
from desk.book.shock import RATE_MOVES, Move, MoveKind, Shock
from desk.valuation.measures import BASIS_POINT
from desk.valuation.moved_curve import CurveMove, Knots
from desk.valuation.shock_base import ShockBase, SideBase, folded

__all__ = ["CannotShock", "Effects", "effects_of", "shock_fault"]

_ALL = ""


class CannotShock(ValueError):
    """A shock that cannot be computed.

    Attributes
    ----------
    fault : Fault
        Why, in one line.
    """

    def __init__(self, fault: Fault) -> None:
        super().__init__(str(fault))
        self.fault = fault


def shock_fault(shock: Shock, found: str, expected: str, mend: str) -> Fault:
    """A mild fault that names the shock."""
    whole = f"{shock.set_name}: {shock.name}" if shock.set_name else shock.name
    return Fault(f"the shock {whole!r} {found}", expected, mend, sheet="Shocks", severity=Severity.MILD)


@dataclass(frozen=True, eq=False)
class Effects:
    """A shock, resolved; each array has one number a line of its side and is None where nothing moves.

    Attributes
    ----------
    curve : CurveMove or None
    inflation : CurveMove or None
        Of the expected-inflation curve.
    spread : ndarray or None
        Of the assets, added [1/year].
    value : ndarray or None
        Of the assets, a factor.
    amount : ndarray or None
        Of the liabilities, a factor.
    growth : ndarray or None
        Of the liabilities: amounts are multiplied by ``exp(growth · t)`` [1/year].
    later : ndarray or None
        Of the liabilities [years].
    faults : tuple of Fault
        Moves that were left out, and what else is worth telling.
    """

    curve: CurveMove | None = None
    inflation: CurveMove | None = None
    spread: FloatArray | None = None
    value: FloatArray | None = None
    amount: FloatArray | None = None
    growth: FloatArray | None = None
    later: FloatArray | None = None
    faults: tuple[Fault, ...] = ()


def effects_of(shock: Shock, base: ShockBase) -> Effects:
    """Resolve a shock against a book.

    Parameters
    ----------
    shock : Shock
    base : ShockBase

    Returns
    -------
    Effects
        A move whose target the book does not hold is left out and told.

    Raises
    ------
    CannotShock
        If the moves do not go together, or none is left.
    """
    faults: list[Fault] = []
    left_out = 0

    def tell(found: str, expected: str, mend: str) -> None:
        faults.append(shock_fault(shock, found, expected, mend))

    def hit(move: Move, lines: NDArray[np.bool_], what: str) -> NDArray[np.bool_]:
        nonlocal left_out
        if not lines.any():
            left_out += 1
            if move.target == _ALL:
                tell(f"moves {what}, of which the book has none", what, "The move is left out.")
            else:
                tell(
                    f"applies to {move.target!r}, which is none of the {what}",
                    f"the name or kind of one of the {what}",
                    "The move is left out; correct what it applies to.",
                )
        return lines

    assets, liabilities = base.assets, base.liabilities
    of_kind = _by_kind(shock.moves)
    arrays: dict[str, FloatArray] = {}

    for move in of_kind(MoveKind.SPREAD):
        may = assets.has_spread
        by_default = may & ~assets.is_ready_made
        lines = hit(move, _targets(move, assets, may, by_default), "holdings with a spread")
        spread = arrays.setdefault("spread", np.zeros(may.size))
        spread[lines] += BASIS_POINT * move.size
    for move in of_kind(MoveKind.VALUE):
        may = assets.has_value
        lines = hit(move, _targets(move, assets, may, may), "funds and property")
        share = move.size
        if share < -1.0:
            tell("brings funds below zero", "a fall of at most 100 %", "They count as worth nothing.")
            share = -1.0
        arrays.setdefault("value", np.ones(may.size))[lines] *= 1.0 + share

    every = np.ones(len(liabilities.flows.line_names), dtype=np.bool_)
    for move in of_kind(MoveKind.AMOUNT, MoveKind.TIME, MoveKind.DECLINE):
        lines = hit(move, _targets(move, liabilities, every, every), "lines of liabilities")
        if move.kind is MoveKind.AMOUNT:
            arrays.setdefault("amount", np.ones(every.size))[lines] *= 1.0 + move.size
        elif move.kind is MoveKind.TIME:
            arrays.setdefault("later", np.zeros(every.size))[lines] += move.size
        elif move.size <= -1.0:
            left_out += 1
            tell("lets amounts decline by 100 % a year or more", "a share above -100 %", "It is left out.")
        else:
            arrays.setdefault("growth", np.zeros(every.size))[lines] += math.log1p(move.size)

    inflation_moves = of_kind(MoveKind.INFLATION)
    inflation = None
    if inflation_moves and base.book.basis.inflation is None:
        left_out += len(inflation_moves)
        tell(
            "moves expected inflation, of which the basis has none",
            "a sheet 'Inflation'",
            "The move is left out; add the sheet.",
        )
    elif inflation_moves:
        inflation = _inflation_move(shock, inflation_moves)
    curve = _curve_move(shock)
    if not shock.moves or left_out == len(shock.moves):
        told = faults[0] if faults else shock_fault(shock, "has no moves", "at least one", "State a move.")
        raise CannotShock(told)
    if curve is not None and not curve.in_order:
        tell("has terms out of order", "terms that rise", "They are put in order.")
    return Effects(curve=curve, inflation=inflation, faults=tuple(faults), **arrays)


def _by_kind(moves: Sequence[Move]) -> Callable[..., list[Move]]:
    """Picks the moves of some kinds, in order."""
    return lambda *kinds: [move for move in moves if move.kind in kinds]


def _targets(
    move: Move, side: SideBase, may: NDArray[np.bool_], by_default: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """The lines that a move applies to: those of the name, else those of the kind, among those it may."""
    wanted = folded(move.target)
    if wanted == _ALL:
        return by_default
    named = np.asarray(side.folded_names == wanted, dtype=np.bool_) & may
    if named.any():
        return named
    return np.asarray(side.kind_names == wanted, dtype=np.bool_) & by_default


def _curve_move(shock: Shock) -> CurveMove | None:
    """The moves of rates of a shock."""
    try:
        if any(move.kind in RATE_MOVES for move in shock.moves):
            return CurveMove(shock.moves, shock.compounding)
    except ValueError as error:
        raise CannotShock(
            shock_fault(shock, f"cannot be computed: {error}", "moves that go together", "Mend its moves.")
        ) from error
    return None


def _inflation_move(shock: Shock, moves: Sequence[Move]) -> CurveMove:
    """The moves of expected inflation of a shock, as moves of a curve."""
    everywhere = [Move(MoveKind.PARALLEL, move.size) for move in moves if move.term is None]
    at_terms = [Move(MoveKind.RATE, move.size, move.term) for move in moves if move.term is not None]
    try:
        if at_terms:
            Knots(at_terms)
        return CurveMove((*everywhere, *at_terms), shock.compounding)
    except ValueError as error:
        raise CannotShock(
            shock_fault(shock, f"cannot be computed: {error}", "one size a term", "Mend its moves.")
        ) from error
