"""A book under shocks: full revaluation of both sides, with an estimate beside it."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

import numpy as np

from desk import __version__
from desk.book import Book, Provenance
from desk.book.arrays import FloatArray
from desk.book.shock import Shock
from desk.valuation.indexing import reindexed
from desk.valuation.moved_curve import CurveMove, MovedCurve
from desk.valuation.shock_base import ShockBase, SideBase, position, shock_base
from desk.valuation.shock_effects import CannotShock, Effects, effects_of, shock_fault
from desk.valuation.shock_profile import parallel_profile
from desk.valuation.shock_records import Position, ShockResult, ShockTable

__all__ = ["band_of", "estimated_change", "position_after", "run_shock", "shock_table", "side_after"]

_MOST_DISCOUNT = 100.0  # of a discount factor: what is worth a hundred times itself makes no sense
_INFLATION_STEP = 1e-3  # part of a move of inflation over which its first derivative is taken


def shock_table(
    book: Book,
    shocks: Sequence[Shock],
    *,
    base: ShockBase | None = None,
    settings: Iterable[tuple[str, str]] = (),
    progress: Callable[[float], None] | None = None,
) -> ShockTable:
    """A book under shocks, each computed from where the book stands.

    Parameters
    ----------
    book : Book
    shocks : sequence of Shock
    base : ShockBase, optional
        Of this book, where it is there already.
    settings : iterable of (str, str)
        For the provenance: what chose the shocks.
    progress : callable, optional
        Called with the part done, from 0 to 1; it may stop the work by raising.

    Returns
    -------
    ShockTable
        A shock that cannot be computed is left out and told in one line.

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    report = progress or (lambda _: None)
    report(0.0)
    base = base or shock_base(book)
    results, faults = [], list(base.faults)
    thresholds = book.shock_settings.thresholds
    for number, shock in enumerate(shocks):
        report(0.1 + 0.8 * number / len(shocks))
        try:
            effects = effects_of(shock, base)
            results.append(run_shock(base, shock, effects=effects, thresholds=thresholds))
            faults.extend(effects.faults)
        except CannotShock as error:
            faults.append(error.fault)
    report(0.9)
    table = ShockTable(
        valuation_date=book.basis.valuation_date,
        currency=book.basis.currency,
        base=base.position,
        results=tuple(results),
        profile=parallel_profile(base),
        thresholds=thresholds,
        faults=tuple(dict.fromkeys(faults)),
        provenance=Provenance(book.digest, __version__, tuple(settings)),
    )
    report(1.0)
    return table


def run_shock(
    base: ShockBase,
    shock: Shock,
    *,
    effects: Effects | None = None,
    thresholds: tuple[float, ...] = (),
) -> ShockResult:
    """One shock.

    Parameters
    ----------
    base : ShockBase
    shock : Shock
    effects : Effects, optional
        Of this shock, where it is resolved already.
    thresholds : tuple of float
        Funding ratios, falling.

    Returns
    -------
    ShockResult

    Raises
    ------
    CannotShock
        If it cannot be computed.
    """
    effects = effects or effects_of(shock, base)
    after = position_after(base, shock, effects)
    estimate = [estimated_change(base, side, effects) for side in (base.assets, base.liabilities)]
    before = base.position
    return ShockResult(
        **vars(after),
        shock=shock,
        change_in_assets=after.assets - before.assets,
        change_in_liabilities=after.liabilities - before.liabilities,
        change_in_surplus=after.surplus - before.surplus,
        change_in_funding_ratio=after.funding_ratio - before.funding_ratio,
        estimated_change_in_assets=estimate[0],
        estimated_change_in_liabilities=estimate[1],
        estimated_change_in_surplus=estimate[0] - estimate[1],
        band=band_of(after.funding_ratio, thresholds),
    )


def position_after(base: ShockBase, shock: Shock, effects: Effects) -> Position:
    """Both sides fully revalued after a shock.

    Raises
    ------
    CannotShock
        If it gives discount factors or values that make no sense.
    """
    after = position(*(side_after(base, side, shock, effects) for side in (base.assets, base.liabilities)))
    if not np.isfinite([after.assets, after.liabilities]).all():
        raise CannotShock(
            shock_fault(shock, "gives present values that are not finite", "smaller moves", "It is left out.")
        )
    return after


def band_of(funding_ratio: float, thresholds: Sequence[float]) -> int:
    """How many thresholds a funding ratio falls short of; none where there are no liabilities."""
    return sum(funding_ratio < threshold for threshold in thresholds)


def side_after(
    base: ShockBase, side: SideBase, shock: Shock, effects: Effects, *, by_row: bool = False
) -> tuple[FloatArray, FloatArray]:
    """One side after a shock.

    Parameters
    ----------
    base : ShockBase
    side : SideBase
        One of its two.
    shock : Shock
        For what is told of it.
    effects : Effects
        Of the shock.
    by_row : bool
        Whether every row is wanted.

    Returns
    -------
    time, value : ndarray, shape (m,)
        Times [years] and present values after the shock [currency]: by row or, where only the curve moves,
        summed by the times of the side.

    Notes
    -----
    Each row is worth ``c' · exp(-(z'(t') + s') t')`` with its amount, time, zero rate and spread after the
    shock. Spreads are those of before but for what the shock adds. A payment that comes earlier than today
    counts as one of today; a payment that comes later keeps its amount and its spread.

    Raises
    ------
    CannotShock
        If discount factors make no sense.
    """
    is_assets = side is base.assets
    lines = (effects.spread, effects.value) if is_assets else (effects.amount, effects.growth, effects.later)
    change = curve_change(side, shock, effects.curve)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        if not by_row and all(array is None for array in lines) and not _has_index(side, effects):
            factor = 1.0 if change is None else np.exp(-change * side.times)
            return side.times, side.value_by_time * factor
        flows = side.flows
        time, line, exponent = flows.time, flows.line, side.exponent
        amount = _amounts_after(base, side, effects)
        if not is_assets and effects.later is not None:
            time = np.maximum(time + effects.later[line], 0.0)
            times, place = np.unique(time, return_inverse=True)
            zero = base.book.basis.curve.zero(times)
            moved = zero if effects.curve is None else zero + effects.curve.change(times, zero)
            _check_sense(shock, times, zero, moved)
            exponent = (moved[place] + flows.spread) * time
        elif change is not None:
            exponent = exponent + (change * side.times)[side.place]
        if is_assets and effects.spread is not None:
            more = effects.spread[line]
            exponent = exponent + more * time
            if side.held.any():
                amount = amount + side.held * np.expm1(-more * side.next_period)
        if is_assets and effects.value is not None:
            amount = amount * np.where(flows.is_flow, 1.0, effects.value[line])
        if not is_assets and effects.amount is not None:
            amount = amount * effects.amount[line]
        if not is_assets and effects.growth is not None:
            amount = amount * np.exp(effects.growth[line] * flows.time)
        return time, amount * np.exp(-exponent)


def curve_change(side: SideBase, shock: Shock, move: CurveMove | None) -> FloatArray | None:
    """What is added to the zero rates at the times of one side, shape (u,) [1/year]; None for nothing.

    Raises
    ------
    CannotShock
        If discount factors make no sense.
    """
    if move is None:
        return None
    change = move.change(side.times, side.zero)
    _check_sense(shock, side.times, side.zero, side.zero + change)
    return change


def _check_sense(shock: Shock, time: FloatArray, before: FloatArray, zero: FloatArray) -> None:
    """Refuse discount factors that make no sense, but for those that made none before the shock."""
    allowed = np.minimum(before * time, 0.0) - np.log(_MOST_DISCOUNT)
    # Written so that a NaN fails too.
    senseless = ~(zero * time >= allowed)
    if senseless.any():
        first = int(np.argmax(senseless))
        raise CannotShock(
            shock_fault(
                shock,
                f"gives a zero rate of {zero[first]:.2%} at {time[first]:g} years",
                f"rates at which no discount factor is above {_MOST_DISCOUNT:g}",
                "It is left out; state smaller moves or a floor.",
            )
        )


def _has_index(side: SideBase, effects: Effects) -> bool:
    """Whether the side has rows that follow an index the shock moves."""
    index_class = side.flows.index_class
    return effects.inflation is not None and index_class is not None and bool((index_class >= 0).any())


def _amounts_after(base: ShockBase, side: SideBase, effects: Effects, *, part: float = 1.0) -> FloatArray:
    """Amounts of the rows with expected inflation moved by a part of the shock's move, shape (n,)."""
    inflation = base.book.basis.inflation
    if inflation is None or not _has_index(side, effects) or effects.inflation is None:
        return side.flows.amount
    move = effects.inflation if part == 1.0 else _PartOf(effects.inflation, part)
    moved = reindexed(side.flows, inflation=inflation, curve=MovedCurve(inflation.curve, move))
    return moved.amount


class _PartOf(CurveMove):
    """A part of a move."""

    def __init__(self, whole: CurveMove, part: float) -> None:
        self._whole = whole
        self._part = part

    def change(self, time: FloatArray, zero: FloatArray) -> FloatArray:
        """See `CurveMove.change`."""
        return np.asarray(self._part * self._whole.change(time, zero))


def estimated_change(base: ShockBase, side: SideBase, effects: Effects) -> float:
    """The change in the value of one side as duration and convexity tell it.

    Parameters
    ----------
    base : ShockBase
    side : SideBase
        One of its two.
    effects : Effects

    Returns
    -------
    float
        ``Σ v (-t Δz(t) + ½ (t Δz(t))²)`` over the rows with their values v today, Δz being what the shock
        adds to the continuous zero rate, floors included: for a parallel move ``PV (-D Δz + ½ C Δz²)`` with
        effective duration and convexity. Added to it are first-order terms for what else moves, each alone:
        spreads ``-t Δs`` with payments as projected, values and amounts by their share, growth of amounts
        ``g t``, later payment ``-(f(t) + s) Δt`` with the forward rate f, and the first derivative in the
        direction of a move of expected inflation [currency].
    """
    flows, value = side.flows, side.value
    total = 0.0
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        if effects.curve is not None:
            moved = side.times * effects.curve.change(side.times, side.zero)
            total += float((side.value_by_time * (-moved + 0.5 * moved**2)).sum())
        if _has_index(side, effects):
            discount = np.exp(-side.exponent)
            up, down = (
                float((_amounts_after(base, side, effects, part=part) * discount).sum())
                for part in (_INFLATION_STEP, -_INFLATION_STEP)
            )
            total += (up - down) / (2.0 * _INFLATION_STEP)
        if side is base.assets:
            if effects.spread is not None:
                worth = flows.paid * np.exp(-side.exponent)
                total -= float((worth * flows.time * effects.spread[flows.line]).sum())
            if effects.value is not None:
                share = np.where(flows.is_flow, 0.0, effects.value[flows.line] - 1.0)
                total += float((value * share).sum())
            return total
        if effects.amount is not None:
            total += float((value * (effects.amount[flows.line] - 1.0)).sum())
        if effects.growth is not None:
            total += float((value * effects.growth[flows.line] * flows.time).sum())
        if effects.later is not None:
            forward = base.book.basis.curve.forward(side.times, side.times)[side.place]
            total -= float((value * (forward + flows.spread) * effects.later[flows.line]).sum())
    return total
