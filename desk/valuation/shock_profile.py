"""Both sides against a parallel move of all rates."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.valuation.measures import BASIS_POINT
from desk.valuation.shock_base import ShockBase, SideBase
from desk.valuation.shock_records import ParallelProfile

__all__ = ["PROFILE_MOVES", "parallel_profile"]

PROFILE_MOVES = tuple(range(-300, 301, 10))
"""The parallel moves of a profile [basis points]."""


def parallel_profile(base: ShockBase, moves: tuple[float, ...] = PROFILE_MOVES) -> ParallelProfile:
    """Both sides against a parallel move of all continuous zero rates.

    Parameters
    ----------
    base : ShockBase
    moves : tuple of float
        [basis points], rising.

    Returns
    -------
    ParallelProfile
        The duration gap changes its sign where ``Σ t v`` is the same on both sides; each change between two
        neighbouring moves is found to 1e-9 basis points.
    """
    move = np.array(moves, dtype=np.float64)
    worth, first = {}, {}
    for name, side in (("assets", base.assets), ("liabilities", base.liabilities)):
        sums = np.array([_moments(side, size) for size in move])
        worth[name], first[name] = sums[:, 0], sums[:, 1]
    gap = first["assets"] - first["liabilities"]
    slope = -(_moments(base.assets, 0.0)[1] - _moments(base.liabilities, 0.0)[1]) * BASIS_POINT
    with np.errstate(divide="ignore", invalid="ignore"):
        return ParallelProfile(
            move=move,
            assets=worth["assets"],
            liabilities=worth["liabilities"],
            surplus=worth["assets"] - worth["liabilities"],
            tangent=base.position.surplus + slope * move,
            funding_ratio=np.where(
                worth["liabilities"] != 0.0, worth["assets"] / worth["liabilities"], np.nan
            ),
            duration_gap=np.where(worth["assets"] != 0.0, gap / worth["assets"], np.nan),
            gap_turns=_turns(base, move, gap),
        )


def _moments(side: SideBase, move: float) -> tuple[float, float]:
    """Present value and ``Σ t v`` of one side after a parallel move [basis points]."""
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        value = side.value_by_time * np.exp(-BASIS_POINT * move * side.times)
        return float(value.sum()), float((value * side.times).sum())


def _turns(base: ShockBase, move: FloatArray, gap: FloatArray) -> tuple[float, ...]:
    """Where the gap changes its sign."""
    from scipy.optimize import brentq

    def gap_at(size: float) -> float:
        return _moments(base.assets, size)[1] - _moments(base.liabilities, size)[1]

    turns = []
    for number in range(move.size - 1):
        here, following = gap[number], gap[number + 1]
        if here == 0.0 and following != 0.0:
            turns.append(float(move[number]))
        elif here * following < 0.0:
            turns.append(float(brentq(gap_at, move[number], move[number + 1], xtol=1e-9)))
    return tuple(turns)
