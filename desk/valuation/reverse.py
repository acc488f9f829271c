"""Shocks in reverse: the size at which the funding ratio or the surplus comes to a stated level."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from desk.book import Fault
from desk.book.shock import Move, MoveKind, Shock
from desk.valuation.shock_base import ShockBase
from desk.valuation.shock_effects import CannotShock, effects_of
from desk.valuation.shock_records import Position, ShockResult
from desk.valuation.shocks import position_after, run_shock

__all__ = ["Goal", "ReverseResult", "goal_gap", "in_words", "reverse_along", "reverse_parallel"]

_STEPS = 60  # of the search on each side of no move
_MOST_PARALLEL = 1000.0  # basis points


class Goal(StrEnum):
    """What is to come to a level."""

    FUNDING_RATIO = "funding ratio"
    SURPLUS = "surplus"


@dataclass(frozen=True, eq=False)
class ReverseResult:
    """The shock that brings the goal to a level.

    Attributes
    ----------
    goal : Goal
    level : float
        As a ratio, or [currency].
    shock : Shock or None
        The one with the smallest scale; None where no scale does it.
    result : ShockResult or None
        Both sides after it, fully revalued.
    scales : tuple of float
        All scales found in the range searched, the smallest first.
    fault : Fault or None
        Why there is none, in one line.
    """

    goal: Goal
    level: float
    shock: Shock | None
    result: ShockResult | None
    scales: tuple[float, ...]
    fault: Fault | None = None


def goal_gap(position: Position, goal: Goal, level: float) -> float:
    """How far the goal is from its level, in money: ``A - level · L``, or ``A - L - level``."""
    if goal is Goal.SURPLUS:
        return position.surplus - level
    return position.assets - level * position.liabilities


def in_words(goal: Goal, level: float) -> str:
    """A goal and its level."""
    return f"the {goal} to {level:,.2f}" if goal is Goal.SURPLUS else f"the {goal} to {level:.2%}"


def reverse_parallel(
    base: ShockBase, *, goal: Goal, level: float, most: float = _MOST_PARALLEL
) -> ReverseResult:
    """The parallel move of all continuous zero rates that brings the goal to a level.

    Parameters
    ----------
    base : ShockBase
    goal : Goal
    level : float
    most : float
        How far is searched either way [basis points].

    Returns
    -------
    ReverseResult
        Scales are in basis points.
    """
    one = Shock("Parallel move", (Move(MoveKind.PARALLEL, 1.0),))
    return reverse_along(base, one, goal=goal, level=level, least=-most, most=most, unit=" basis points")


def reverse_along(
    base: ShockBase,
    shock: Shock,
    *,
    goal: Goal,
    level: float,
    least: float = -10.0,
    most: float = 10.0,
    unit: str = " times",
) -> ReverseResult:
    """The scale of a shock that brings the goal to a level.

    Parameters
    ----------
    base : ShockBase
    shock : Shock
        Its shape; see `Shock.scaled`.
    goal : Goal
    level : float
        As a ratio, or [currency].
    least, most : float
        The range of scales searched; 0 lies in it.
    unit : str
        Of the scale, for the wording.

    Returns
    -------
    ReverseResult
        Each way from no move, the range is walked in steps that grow, until the goal has passed the level;
        the place is then found by Brent's method to 1e-12 of the range. A scale at which the shock cannot be
        computed ends the walk. More than one crossing within one step is not seen.

    Raises
    ------
    ValueError
        If the level is not finite, or 0 lies outside the range.
    CannotShock
        If the shock can be computed at no scale.
    """
    if not np.isfinite(level):
        raise ValueError("`level` must be finite")
    if not (np.isfinite([least, most]).all() and least <= 0.0 <= most and least < most):
        raise ValueError("`least` and `most` must be finite, with 0 between them")
    effects_of(shock, base)
    if goal is Goal.FUNDING_RATIO and not base.position.liabilities:
        return _none(shock, goal, level, "there are no liabilities", "A funding ratio needs liabilities.")

    def gap(scale: float) -> float:
        if scale == 0.0:
            return goal_gap(base.position, goal, level)
        moved = shock.scaled(scale)
        return goal_gap(position_after(base, moved, effects_of(moved, base)), goal, level)

    here = gap(0.0)
    found = [0.0] if here == 0.0 else []
    reached = {0.0: here}
    if here != 0.0:
        for end in (most, least):
            scale = _walk(gap, here, end, reached)
            if scale is not None:
                found.append(scale)
    scales = tuple(sorted(found, key=abs))
    if not scales:
        span = f"between {min(reached):,g} and {max(reached):,g}{unit}"
        offsets = list(reached.values())
        side = "below" if here < 0.0 else "above"
        return _none(
            shock,
            goal,
            level,
            f"no scale {span} brings {in_words(goal, level)}",
            f"It stays {side} it, by at least {min(abs(offset) for offset in offsets):,.0f} in money.",
        )
    name = f"{shock.name}, {scales[0]:,.6g}{unit}"
    moved = shock.scaled(scales[0], name=name)
    result = run_shock(base, moved, thresholds=base.book.shock_settings.thresholds)
    return ReverseResult(goal, level, moved, result, scales)


def _walk(
    gap: Callable[[float], float], here: float, end: float, reached: dict[float, float]
) -> float | None:
    """The first scale on the way from 0 to `end` at which the gap changes its sign."""
    from scipy.optimize import brentq

    before, value = 0.0, here
    for step in (np.arange(1, _STEPS + 1) / _STEPS) ** 1.5:
        scale = float(end * step)
        try:
            following = gap(scale)
        except CannotShock:
            return None
        reached[scale] = following
        if following == 0.0:
            return scale
        if following * value < 0.0:
            return float(brentq(gap, before, scale, xtol=1e-12 * abs(end), rtol=1e-14))
        before, value = scale, following
    return None


def _none(shock: Shock, goal: Goal, level: float, found: str, mend: str) -> ReverseResult:
    """No shock does it."""
    fault = Fault(f"{shock.name}: {found}", "a level that can be reached", mend)
    return ReverseResult(goal, level, None, None, (), fault)
