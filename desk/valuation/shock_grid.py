"""Two shocks against each other, each in many sizes."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from desk.book import Fault
from desk.book.arrays import FloatArray
from desk.book.shock import Shock
from desk.valuation.moved_curve import CurveMove
from desk.valuation.shock_base import ShockBase, SideBase
from desk.valuation.shock_effects import CannotShock, Effects, effects_of, shock_fault
from desk.valuation.shock_records import Position
from desk.valuation.shocks import side_after

__all__ = ["MOST_CELLS", "ShockGrid", "shock_grid"]

MOST_CELLS = 250_000
"""Cells of the largest grid."""

_HELD_AT_ONCE = 64  # scales of the second shock: the memory is that many times the rows


@dataclass(frozen=True, eq=False)
class ShockGrid:
    """Both sides under two shocks together, by the size of each.

    Attributes
    ----------
    first, second : Shock
        At scale 1.
    first_scale : ndarray, shape (m,)
    second_scale : ndarray, shape (k,)
    assets, liabilities : ndarray, shape (m, k)
        Fully revalued [currency]; NaN where the two together cannot be computed.
    faults : tuple of Fault
        What could not be done as asked.
    before : Position
        Both sides before either of the two.
    """

    first: Shock
    second: Shock
    first_scale: FloatArray
    second_scale: FloatArray
    assets: FloatArray
    liabilities: FloatArray
    faults: tuple[Fault, ...]
    before: Position

    @property
    def surplus(self) -> FloatArray:
        """Shape (m, k) [currency]."""
        return np.asarray(self.assets - self.liabilities)

    @property
    def funding_ratio(self) -> FloatArray:
        """Shape (m, k)."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(self.liabilities != 0.0, self.assets / self.liabilities, np.nan)


class _AfterAnother(CurveMove):
    """A move that happens to the curve another one leaves."""

    def __init__(self, first: CurveMove, second: CurveMove) -> None:
        self._first = first
        self._second = second
        self.is_additive = first.is_additive and second.is_additive

    def change(self, time: FloatArray, zero: FloatArray) -> FloatArray:
        """See `CurveMove.change`."""
        before = self._first.change(time, zero)
        return np.asarray(before + self._second.change(time, zero + before))


def shock_grid(
    base: ShockBase,
    first: Shock,
    second: Shock,
    *,
    first_scale: ArrayLike,
    second_scale: ArrayLike,
    progress: Callable[[float], None] | None = None,
) -> ShockGrid:
    """Both sides under two shocks together, by the size of each.

    Parameters
    ----------
    base : ShockBase
    first, second : Shock
        The second happens to what the first one leaves.
    first_scale : array_like, shape (m,)
        What each size of the first shock is multiplied by.
    second_scale : array_like, shape (k,)
        Likewise.
    progress : callable, optional
        Called with the part done, from 0 to 1; it may stop the work by raising.

    Returns
    -------
    ShockGrid

    Raises
    ------
    ValueError
        If there are more than `MOST_CELLS` cells, or a scale is not finite.
    CannotShock
        If one of the shocks can be computed at none of its scales.

    Notes
    -----
    Where each shock multiplies what a row is worth by a factor of its own, whatever the other does, all cells
    are sums of products, ``Σ f(i, row) v(row) g(j, row)``; otherwise each cell is revalued by itself.
    """
    report = progress or (lambda _: None)
    scales = [np.asarray(scale, dtype=np.float64).ravel() for scale in (first_scale, second_scale)]
    if not all(np.isfinite(scale).all() for scale in scales):
        raise ValueError("`first_scale` and `second_scale` must be finite")
    if scales[0].size * scales[1].size > MOST_CELLS:
        raise ValueError(f"`first_scale` and `second_scale` must give at most {MOST_CELLS:,} cells")
    faults: list[Fault] = []
    effects = [_at_scales(base, *pair, faults) for pair in zip((first, second), scales, strict=True)]
    values = []
    for number, side in enumerate((base.assets, base.liabilities)):

        def part(done: float, begin: float = 0.5 * number) -> None:
            report(begin + 0.5 * done)

        found = (
            _separable(base, side, (first, second), effects, part) if _is_separable(side, effects) else None
        )
        values.append(
            _by_cell(base, side, (first, second), effects, faults, part) if found is None else found
        )
    report(1.0)
    told = tuple(dict.fromkeys(faults))
    return ShockGrid(first, second, scales[0], scales[1], values[0], values[1], told, base.position)


def _at_scales(base: ShockBase, shock: Shock, scale: FloatArray, faults: list[Fault]) -> list[Effects | None]:
    """A shock at every scale; None where it cannot be computed. At scale 0 nothing moves."""
    found: list[Effects | None] = []
    last: CannotShock | None = None
    for size in scale.tolist():
        if size == 0.0:
            found.append(Effects())
            continue
        try:
            effects = effects_of(shock.scaled(size), base)
            faults.extend(effects.faults)
            found.append(effects)
        except CannotShock as error:
            last = error
            found.append(None)
    if last is not None:
        if not any(own is not None and size != 0.0 for own, size in zip(found, scale.tolist(), strict=True)):
            raise last
        faults.append(last.fault)
    return found


def _together(first: Effects, second: Effects) -> Effects:
    """Both, the second happening to what the first one leaves."""

    def joined(one: FloatArray | None, two: FloatArray | None, *, times: bool) -> FloatArray | None:
        if one is None or two is None:
            return one if two is None else two
        return one * two if times else one + two

    def moved(one: CurveMove | None, two: CurveMove | None) -> CurveMove | None:
        if one is None or two is None:
            return one or two
        return _AfterAnother(one, two)

    return replace(
        first,
        curve=moved(first.curve, second.curve),
        inflation=moved(first.inflation, second.inflation),
        spread=joined(first.spread, second.spread, times=False),
        value=joined(first.value, second.value, times=True),
        amount=joined(first.amount, second.amount, times=True),
        growth=joined(first.growth, second.growth, times=False),
        later=joined(first.later, second.later, times=False),
    )


def _is_separable(side: SideBase, effects: Sequence[Sequence[Effects | None]]) -> bool:
    """Whether each shock multiplies every row by a factor that the other has no part in."""
    first, second = ([own for own in of_shock if own is not None] for of_shock in effects)
    for one in first:
        for two in second:
            if one.curve is not None and two.curve is not None and not two.curve.is_additive:
                return False
            if one.inflation is not None and two.inflation is not None:
                return False
            if one.spread is not None and two.spread is not None and side.held.any():
                return False
            for own, other in ((one, two), (two, one)):
                if own.later is not None and (other.later is not None or other.curve is not None):
                    return False
    return True


def _separable(
    base: ShockBase,
    side: SideBase,
    shocks: tuple[Shock, Shock],
    effects: Sequence[Sequence[Effects | None]],
    progress: Callable[[float], None],
) -> FloatArray | None:
    """All cells of one side as sums of products; None where a row of no value gains some."""
    is_worth = side.value != 0.0
    found = np.full((len(effects[0]), len(effects[1])), np.nan)

    def after(number: int, own: Effects | None) -> FloatArray | None:
        if own is None:
            return None
        try:
            return side_after(base, side, shocks[number], own, by_row=True)[1]
        except CannotShock:
            return None

    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        for begin in range(0, found.shape[1], _HELD_AT_ONCE):
            columns = slice(begin, begin + _HELD_AT_ONCE)
            factor = np.full((found[:, columns].shape[1], side.value.size), np.nan)
            for number, own in enumerate(effects[1][columns]):
                values = after(1, own)
                if values is not None:
                    if values[~is_worth].any():
                        return None
                    factor[number] = np.where(is_worth, values / side.value, 1.0)
            for row, own in enumerate(effects[0]):
                progress((begin + factor.shape[0] * row / found.shape[0]) / found.shape[1])
                values = after(0, own)
                if values is not None:
                    if values[~is_worth].any():
                        return None
                    # Not by a matrix product, whose bits may depend on the number of threads.
                    found[row, columns] = np.einsum("n,jn->j", values, factor)
    return found


def _by_cell(
    base: ShockBase,
    side: SideBase,
    shocks: tuple[Shock, Shock],
    effects: Sequence[Sequence[Effects | None]],
    faults: list[Fault],
    progress: Callable[[float], None],
) -> FloatArray:
    """Each cell of one side revalued by itself."""
    name = f"{shocks[0].name} with {shocks[1].name}"
    both = replace(shocks[0], name=name, moves=(*shocks[0].moves, *shocks[1].moves))
    found = np.full((len(effects[0]), len(effects[1])), np.nan)
    refused = 0
    for row, first in enumerate(effects[0]):
        progress(row / len(effects[0]))
        for column, second in enumerate(effects[1]):
            if first is None or second is None:
                continue
            try:
                found[row, column] = side_after(base, side, both, _together(first, second))[1].sum()
            except CannotShock:
                refused += 1
    if refused:
        faults.append(
            shock_fault(both, f"cannot be computed in {refused:,} cells", "smaller sizes", "They stay empty.")
        )
    return found
