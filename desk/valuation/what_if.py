"""Shocks while the hand moves: figures of both sides, quick enough for every frame."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray, IntArray
from desk.book.shock import Move, MoveKind, Shock
from desk.rates.curve import DiscountCurve
from desk.valuation.measures import BASIS_POINT, KEY_TERMS, key_rate_weights
from desk.valuation.moved_curve import CurveMove, MovedCurve
from desk.valuation.shock_base import ShockBase, SideBase
from desk.valuation.shock_effects import effects_of
from desk.valuation.shock_records import Position
from desk.valuation.shocks import side_after

__all__ = ["Frame", "WhatIf", "curve_moves"]

_YEAR_SLACK = 1e-9  # a twelfth added twelve times is still the first year
_LAST_YEAR = 200


@dataclass(frozen=True, eq=False)
class Frame:
    """Both sides after a what-if.

    Attributes
    ----------
    position : Position
    change : Position
        Each figure less that before.
    term : ndarray, shape (k,)
        Of the key rates [years].
    dv01_assets, dv01_liabilities : ndarray, shape (k,)
        Fall in present value for +1 basis point at each key rate [currency].
    year : ndarray of int, shape (y,)
        From 1; the last one holds all later flows too.
    assets, liabilities : ndarray, shape (y,)
        Present value of the flows by year [currency]; year 1 holds those of today.
    """

    position: Position
    change: Position
    term: FloatArray
    dv01_assets: FloatArray
    dv01_liabilities: FloatArray
    year: IntArray
    assets: FloatArray
    liabilities: FloatArray


class _Times:
    """What of a frame depends on times alone."""

    def __init__(self, times: FloatArray, last_year: int) -> None:
        self.times = times
        self.fall = -np.expm1(-BASIS_POINT * times)
        self.lower, share = key_rate_weights(times)
        self.above = -np.expm1(-BASIS_POINT * times * share)
        self.below = -np.expm1(-BASIS_POINT * times * (1.0 - share))
        self.year = np.clip(np.ceil(times - _YEAR_SLACK), 1.0, last_year).astype(np.int64) - 1
        self.last_year = last_year

    def figures(self, value: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Present value, ``Σ t v`` and DV01; DV01 by key rate; present value by year."""
        count = len(KEY_TERMS)
        keys = np.bincount(self.lower, weights=value * self.below, minlength=count)
        keys[1:] += np.bincount(self.lower, weights=value * self.above, minlength=count)[:-1]
        years = np.bincount(self.year, weights=value, minlength=self.last_year)
        sums = np.array([value.sum(), (self.times * value).sum(), (self.fall * value).sum()])
        return sums, keys.astype(np.float64), years.astype(np.float64)


class WhatIf:
    """A book ready to be moved.

    Parameters
    ----------
    base : ShockBase

    Notes
    -----
    What depends on times alone is worked out once. A frame that moves nothing but the curve costs one
    exponential a different time; one that moves spreads, values or lines, one a row.
    """

    def __init__(self, base: ShockBase) -> None:
        self.base = base
        last = max(
            (float(side.times[-1]) for side in (base.assets, base.liabilities) if side.times.size),
            default=1.0,
        )
        self._last_year = int(np.clip(np.ceil(last - _YEAR_SLACK), 1, _LAST_YEAR))
        self._times = {
            id(side): _Times(side.times, self._last_year) for side in (base.assets, base.liabilities)
        }
        for side in (base.assets, base.liabilities):
            _ = side.zero, side.value_by_time, side.held

    def frame(self, shock: Shock) -> Frame:
        """Both sides after a shock, fully revalued.

        Parameters
        ----------
        shock : Shock
            One without moves shows where the book stands.

        Raises
        ------
        CannotShock
            If it cannot be computed.
        """
        base = self.base
        effects = effects_of(shock, base) if shock.moves else None
        parts = []
        for side in (base.assets, base.liabilities):
            if effects is None:
                parts.append(self._times[id(side)].figures(side.value_by_time))
                continue
            time, value = side_after(base, side, shock, effects)
            parts.append(self._figures(side, time, value))
        (sums_a, keys_a, years_a), (sums_l, keys_l, years_l) = parts
        after = _position(sums_a, sums_l)
        before = base.position
        change = {name: figure - getattr(before, name) for name, figure in vars(after).items()}
        return Frame(
            after,
            Position(**change),
            np.array(KEY_TERMS),
            keys_a,
            keys_l,
            np.arange(1, self._last_year + 1),
            years_a,
            years_l,
        )

    def _figures(
        self, side: SideBase, time: FloatArray, value: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """The figures of one side after a shock."""
        if time is side.times:
            return self._times[id(side)].figures(value)
        if time is side.flows.time:
            return self._times[id(side)].figures(side.summed(value))
        return _Times(time, self._last_year).figures(value)

    def curve(self, shock: Shock) -> DiscountCurve:
        """The curve after a shock.

        Raises
        ------
        CannotShock
            If the shock cannot be computed.
        """
        before = self.base.book.basis.curve
        move: CurveMove | None = effects_of(shock, self.base).curve if shock.moves else None
        return before if move is None else MovedCurve(before, move)

    def lines(self, shock: Shock) -> tuple[tuple[FloatArray, FloatArray], tuple[FloatArray, FloatArray]]:
        """Present values by line before and after a shock: of the assets, then of the liabilities.

        Raises
        ------
        CannotShock
            If the shock cannot be computed.
        """
        base = self.base
        effects = effects_of(shock, base) if shock.moves else None
        found = []
        for side in (base.assets, base.liabilities):
            after = side.value if effects is None else side_after(base, side, shock, effects, by_row=True)[1]
            count = len(side.flows.line_names)
            found.append(
                (
                    np.bincount(side.flows.line, weights=side.value, minlength=count).astype(np.float64),
                    np.bincount(side.flows.line, weights=after, minlength=count).astype(np.float64),
                )
            )
        return found[0], found[1]


def _position(assets: FloatArray, liabilities: FloatArray) -> Position:
    """The balance sheet in six figures, from the sums of both sides."""
    worth_a, first_a, fall_a = assets.tolist()
    worth_l, first_l, fall_l = liabilities.tolist()
    return Position(
        assets=worth_a,
        liabilities=worth_l,
        surplus=worth_a - worth_l,
        funding_ratio=worth_a / worth_l if worth_l else np.nan,
        duration_gap=(first_a - first_l) / worth_a if worth_a else np.nan,
        dv01_gap=fall_a - fall_l,
    )


def curve_moves(
    *,
    level: float = 0.0,
    slope: float = 0.0,
    bend: float = 0.0,
    term: float = 10.0,
    by_term: Mapping[float, float] | None = None,
) -> tuple[Move, ...]:
    """Moves of a curve by its level, slope and bend about a term, and by the rates at single terms.

    Parameters
    ----------
    level : float
        All rates up by it [basis points].
    slope : float
        Rates at 0 down by it and at twice the term and beyond up by it, on a line [basis points].
    bend : float
        The rate at the term up by it; at 0 and at twice the term and beyond down by it [basis points].
    term : float
        Above 0 [years].
    by_term : mapping of float to float, optional
        Terms [years] and moves there [basis points], joined by lines, flat outside them.

    Returns
    -------
    tuple of Move
        Those that are not 0. Bend and moves by term are both lines between terms: their sum is one between
        the terms of both.

    Raises
    ------
    ValueError
        If the term is not above 0.
    """
    if not term > 0.0:
        raise ValueError("`term` must be above 0")
    moves = []
    if level:
        moves.append(Move(MoveKind.PARALLEL, level))
    if slope:
        moves.append(Move(MoveKind.TWIST, slope, term))
    bent = {0.0: -bend, term: bend, 2 * term: -bend} if bend else {}
    parts = [part for part in (bent, dict(by_term or {})) if any(part.values())]
    terms = sorted({at for part in parts for at in part})
    sizes = np.zeros(len(terms))
    for part in parts:
        known = sorted(part)
        sizes += np.interp(terms, known, [part[at] for at in known])
    moves.extend(Move(MoveKind.RATE, size, at) for size, at in zip(sizes.tolist(), terms, strict=True))
    return tuple(moves)
