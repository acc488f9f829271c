r"""The least move of the key rates, under their covariance, that brings a goal to a level.

Of all moves m of the key rates with :math:`h(m) = 0`, where h is how far the goal is from its level, the one
with the least :math:`m^\top \Sigma^{-1} m` is the likeliest. With :math:`m = F y` and
:math:`\Sigma = F F^\top` it is the point of the surface :math:`h(F y) = 0` that is nearest to 0. It is found
by Newton's method on the conditions of Karush, Kuhn and Tucker,
:math:`y + \lambda \nabla h = 0, \ h = 0`, with exact second derivatives, after some steps that each go to the
nearest point of the tangent plane.

References
----------
Mahalanobis, P.C., On the generalised distance in statistics, Proceedings of the National Institute of
Sciences of India 2(1), 1936. Hasofer, A.M. and Lind, N.C., Exact and invariant second-moment code format,
Journal of the Engineering Mechanics Division 100, 1974; Rackwitz, R. and Fiessler, B., Structural reliability
under combined random load sequences, Computers and Structures 9, 1978. Nocedal, J. and Wright, S.J.,
Numerical Optimization (2nd edition, 2006), chapter 18.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from desk.book import Fault
from desk.book.arrays import FloatArray, IntArray
from desk.book.market import YieldHistory
from desk.book.shock import Move, MoveKind, Shock
from desk.rates.gaussian import GaussianRates
from desk.rates.limits import first_integral
from desk.valuation.measures import BASIS_POINT, KEY_TERMS, key_rate_weights
from desk.valuation.reverse import Goal, goal_gap, in_words
from desk.valuation.shock_base import ShockBase, SideBase
from desk.valuation.shock_records import ShockResult
from desk.valuation.shocks import run_shock

__all__ = ["KeyRateCovariance", "LeastMove", "covariance_of_history", "covariance_of_model", "least_move"]

_LEAST_VARIANCE = 1e-12  # part of the greatest below which a direction does not move at all
_FIRST_STEPS, _NEWTON_STEPS = 15, 40
_DIRECTIONS = 4  # those with the greatest variance, in which a search begins
_FARTHEST = 60.0  # standard deviations
_SETTLED = 1e-11
_DAYS_A_YEAR = 365.25


@dataclass(frozen=True, eq=False)
class KeyRateCovariance:
    """How key rates move together over a horizon.

    Attributes
    ----------
    terms : ndarray, shape (k,)
        [years], rising.
    matrix : ndarray, shape (k, k)
        Covariance of the moves of the continuous zero rates over the horizon [1/year²].
    source : str
        What it comes from.
    """

    terms: FloatArray
    matrix: FloatArray
    source: str

    def __post_init__(self) -> None:
        """Check that it is a covariance."""
        count = self.terms.size
        if count < 2 or not (np.diff(self.terms) > 0.0).all():
            raise ValueError("`terms` must hold at least two terms that rise")
        if self.matrix.shape != (count, count) or not np.isfinite(self.matrix).all():
            raise ValueError(f"`matrix` must be finite and {count} by {count}")
        size = float(np.abs(self.matrix).max())
        if size == 0.0:
            raise ValueError("`matrix` must not be 0: rates that do not move reach no level")
        if not np.allclose(self.matrix, self.matrix.T, atol=1e-12 * size, rtol=0.0):
            raise ValueError("`matrix` must be symmetric")
        if np.linalg.eigvalsh(self.matrix)[0] < -1e-10 * size:
            raise ValueError("`matrix` must be a covariance: it has a negative eigenvalue")

    @property
    def factor(self) -> FloatArray:
        """F with ``matrix = F Fᵀ``, shape (k, r): one column a direction that moves."""
        variance, vector = np.linalg.eigh(0.5 * (self.matrix + self.matrix.T))
        kept = variance > _LEAST_VARIANCE * variance[-1]
        return np.asarray(vector[:, kept] * np.sqrt(variance[kept]))


@dataclass(frozen=True, eq=False)
class LeastMove:
    """The least move that brings the goal to its level.

    Attributes
    ----------
    goal : Goal
    level : float
    terms : ndarray, shape (k,)
        Of the key rates [years].
    move : ndarray, shape (k,)
        [basis points]; NaN where there is none.
    distance : float
        ``√(mᵀ Σ⁻¹ m)``: how many standard deviations away it is; NaN where there is none.
    shock : Shock or None
        The move as a shock.
    result : ShockResult or None
        Both sides after it, fully revalued.
    source : str
        What the covariance comes from.
    fault : Fault or None
        Why there is none, in one line.
    """

    goal: Goal
    level: float
    terms: FloatArray
    move: FloatArray
    distance: float
    shock: Shock | None
    result: ShockResult | None
    source: str
    fault: Fault | None = None


def covariance_of_model(
    model: GaussianRates, *, horizon: float = 1.0, terms: ArrayLike = KEY_TERMS
) -> KeyRateCovariance:
    """Covariance of the moves of zero rates under a Gaussian model.

    Parameters
    ----------
    model : GaussianRates
    horizon : float
        [years], above 0.
    terms : array_like, shape (k,)
        [years]

    Returns
    -------
    KeyRateCovariance
        The zero rate of a term T moves by ``Σ B(aᵢ, T)/T xᵢ``, and the factors x have the covariance
        ``ρᵢⱼ σᵢ σⱼ B(aᵢ + aⱼ, horizon)`` under either measure.

    Raises
    ------
    ValueError
        If the horizon is not above 0, or the model does not move rates.
    """
    if not (np.isfinite(horizon) and horizon > 0.0):
        raise ValueError("`horizon` must be above 0")
    term = np.array(terms, dtype=np.float64)
    loading = np.stack([first_integral(own.mean_reversion, term) / term for own in model.factors], axis=1)
    volatility = np.array([own.volatility for own in model.factors])
    speed = np.array([own.mean_reversion for own in model.factors])
    growth = np.array([[float(first_integral(one + two, horizon)) for two in speed] for one in speed])
    state = model.correlation * np.outer(volatility, volatility) * growth
    matrix = loading @ state @ loading.T
    return KeyRateCovariance(term, 0.5 * (matrix + matrix.T), f"the rates model, over {_years(horizon)}")


def covariance_of_history(
    history: YieldHistory, *, horizon: float = 1.0, terms: ArrayLike = KEY_TERMS
) -> KeyRateCovariance:
    """Covariance of the moves of zero rates in a history.

    Parameters
    ----------
    history : YieldHistory
    horizon : float
        [years], above 0.
    terms : array_like, shape (k,)
        [years]

    Returns
    -------
    KeyRateCovariance
        Moves from date to date, less their mean drift, each over the root of its years: their mean product a
        year times the horizon. Rates between the terms of a date are joined by lines, flat outside them.

    Raises
    ------
    ValueError
        If the horizon is not above 0, there are fewer than three dates with rates, or their rates stay put.
    """
    if not (np.isfinite(horizon) and horizon > 0.0):
        raise ValueError("`horizon` must be above 0")
    term = np.array(terms, dtype=np.float64)
    known = ~np.isnan(history.rates)
    rows = np.flatnonzero(known.any(axis=1) & ~np.isnat(history.date))
    rows = rows[np.argsort(history.date[rows], kind="stable")]
    if rows.size < 3:
        raise ValueError("`history` must hold at least three dates with rates")
    own = np.argsort(history.terms)
    rates = np.stack(
        [
            np.interp(term, history.terms[own][known[row][own]], history.rates[row][own][known[row][own]])
            for row in rows
        ]
    )
    years = np.diff(history.date[rows]).astype(np.float64) / _DAYS_A_YEAR
    kept = years > 0.0
    moves, years = np.diff(rates, axis=0)[kept], years[kept]
    if years.size < 2:
        raise ValueError("`history` must hold at least three different dates")
    drift = moves.sum(axis=0) / years.sum()
    scaled = (moves - np.outer(years, drift)) / np.sqrt(years)[:, None]
    matrix = scaled.T @ scaled / (years.size - 1) * horizon
    source = f"{rows.size:,} dates of the yield history, over {_years(horizon)}"
    return KeyRateCovariance(term, 0.5 * (matrix + matrix.T), source)


def _years(horizon: float) -> str:
    return "a year" if horizon == 1.0 else f"{horizon:g} years"


class _Surface:
    """How far the goal is from its level as a function of y, as a part of the greater side."""

    def __init__(self, base: ShockBase, goal: Goal, level: float, covariance: KeyRateCovariance) -> None:
        self.factor = covariance.factor
        weight = 1.0 if goal is Goal.SURPLUS else level
        self._sides = [
            (sign, side, *_weights(side, covariance.terms))
            for sign, side in ((1.0, base.assets), (-weight, base.liabilities))
        ]
        self._offset = level if goal is Goal.SURPLUS else 0.0
        self._unit = max(abs(base.position.assets), abs(base.position.liabilities), abs(self._offset), 1e-300)

    def at(self, y: FloatArray) -> tuple[float, FloatArray, FloatArray]:
        """Value, gradient, shape (r,), and second derivatives, shape (r, r)."""
        move = self.factor @ y
        count = move.size
        value, slope, bend = -self._offset, np.zeros(count), np.zeros((count, count))
        diagonal = np.arange(count)
        for sign, side, lower, share in self._sides:
            shift = (1.0 - share) * move[lower] + share * move[lower + 1]
            worth = sign * side.value_by_time * np.exp(-shift * side.times)
            value += float(worth.sum())
            first = worth * side.times
            second = first * side.times
            below, above = (1.0 - share), share

            def by_key(figure: FloatArray, place: IntArray) -> FloatArray:
                return np.bincount(place, weights=figure, minlength=count).astype(np.float64)

            slope -= by_key(first * below, lower) + by_key(first * above, lower + 1)
            bend[diagonal, diagonal] += by_key(second * below**2, lower) + by_key(
                second * above**2, lower + 1
            )
            across = by_key(second * below * above, lower)[:-1]
            bend[diagonal[:-1], diagonal[1:]] += across
            bend[diagonal[1:], diagonal[:-1]] += across
        return (
            value / self._unit,
            self.factor.T @ slope / self._unit,
            self.factor.T @ bend @ self.factor / self._unit,
        )


def _weights(side: SideBase, terms: FloatArray) -> tuple[IntArray, FloatArray]:
    """How the key rates reach the times of a side."""
    return key_rate_weights(side.times, terms=terms)


def least_move(base: ShockBase, covariance: KeyRateCovariance, *, goal: Goal, level: float) -> LeastMove:
    """The least move of the key rates that brings the goal to a level.

    Parameters
    ----------
    base : ShockBase
    covariance : KeyRateCovariance
        Between the key rates a move is joined by lines, and is flat outside them.
    goal : Goal
    level : float
        As a ratio, or [currency].

    Returns
    -------
    LeastMove
        The nearest of the points found from several starts, each a local minimum.

    Raises
    ------
    ValueError
        If the level is not finite.
    """
    if not np.isfinite(level):
        raise ValueError("`level` must be finite")
    here = goal_gap(base.position, goal, level)
    if goal is Goal.FUNDING_RATIO and not base.position.liabilities:
        return _none(covariance, goal, level, "there are no liabilities, so there is no funding ratio")
    surface = _Surface(base, goal, level, covariance)
    best: FloatArray | None = np.zeros(surface.factor.shape[1]) if here == 0.0 else None
    if best is None:
        with np.errstate(all="ignore"):
            for start in _starts(surface):
                found = _nearest(surface, start)
                if found is not None and (best is None or found @ found < best @ best - 1e-12):
                    best = found
    if best is None:
        what = f"no move within {_FARTHEST:g} standard deviations brings {in_words(goal, level)}"
        return _none(covariance, goal, level, what)
    move = surface.factor @ best / BASIS_POINT
    moves = tuple(
        Move(MoveKind.RATE, size, term)
        for size, term in zip(move.tolist(), covariance.terms.tolist(), strict=True)
    )
    shock = Shock(f"Least move, {float(np.linalg.norm(best)):.2f} standard deviations", moves)
    result = run_shock(base, shock, thresholds=base.book.shock_settings.thresholds)
    distance = float(np.linalg.norm(best))
    return LeastMove(goal, level, covariance.terms, move, distance, shock, result, covariance.source)


def _starts(surface: _Surface) -> Iterator[FloatArray]:
    """Where the search begins: at no move, and along each direction either way."""
    count = surface.factor.shape[1]
    yield np.zeros(count)
    slope = surface.at(np.zeros(count))[1]
    length = float(np.linalg.norm(slope))
    if length > 0.0:
        for size in (-6.0, -2.0, 2.0, 6.0):
            yield size * slope / length
    for direction in np.eye(count)[-_DIRECTIONS:]:
        for size in (-3.0, 3.0):
            yield size * direction


def _nearest(surface: _Surface, start: FloatArray) -> FloatArray | None:
    """A point of the surface that is nearest to 0 among those around it; None where none is found."""
    y = start
    for _ in range(_FIRST_STEPS):
        value, slope, _ = surface.at(y)
        squared = float(slope @ slope)
        if not (np.isfinite(value) and squared > 0.0):
            return None
        step = (slope @ y - value) / squared * slope - y
        length = float(np.linalg.norm(step))
        y = y + step * min(1.0, 3.0 / length if length > 0.0 else 1.0)
        if length < 1e-4:
            break
    value, slope, bend = surface.at(y)
    multiplier = -float(slope @ y) / max(float(slope @ slope), 1e-300)
    count = y.size
    for _ in range(_NEWTON_STEPS):
        system = np.zeros((count + 1, count + 1))
        system[:count, :count] = np.eye(count) + multiplier * bend
        system[:count, count] = system[count, :count] = slope
        try:
            step = np.linalg.solve(system, -np.append(y + multiplier * slope, value))
        except np.linalg.LinAlgError:
            return None
        if not np.isfinite(step).all():
            return None
        size = min(1.0, 3.0 / max(float(np.linalg.norm(step[:count])), 1e-300))
        y = y + size * step[:count]
        multiplier += size * float(step[count])
        if np.linalg.norm(y) > _FARTHEST:
            return None
        value, slope, bend = surface.at(y)
        if size == 1.0 and np.linalg.norm(step[:count]) <= _SETTLED * (1.0 + np.linalg.norm(y)):
            return y if abs(value) < 1e-9 else None
    return None


def _none(covariance: KeyRateCovariance, goal: Goal, level: float, found: str) -> LeastMove:
    """No move does it."""
    fault = Fault(found, "a level that can be reached", "Choose another level, or let rates move more.")
    nothing = np.full(covariance.terms.size, np.nan)
    return LeastMove(goal, level, covariance.terms, nothing, np.nan, None, None, covariance.source, fault)
