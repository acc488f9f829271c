"""Collared flows along the paths: each year's increase of the index held between a floor and a cap.

The increases of the years that are over multiply as they were drawn. That of the year in hand, and those of
later years, count by what they are expected to be as seen from the node: each is lognormal about the forward
of the index over the year, and floor and cap are taken by Black's formula with the variance the inflation
factor gives it. The years to come are taken one by one, as if, given the state of inflation at the node, they
were independent; without floor and cap their product is then the expected index, as for a linked flow. The
factor's own volatility counts here, not the yearly one that the basis states, so that the mean over the paths
need not be the value of today.

A collar holds for each whole year from today, and within a year an amount grows at the root of the year's
factor, as in `desk.rates.inflation`. An index observed between two nodes lies on the cubic through the
integral and the inflation of both.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from desk.book import Indexation, Inflation
from desk.book.arrays import FloatArray
from desk.rates.risky_inflation import IndexLaw
from desk.scenarios.drawn_model import Worth, affine
from desk.scenarios.draws import Paths, Plan
from desk.scenarios.linked import RealRows, held_growth, index_law, worth_of_rates
from desk.scenarios.smooth import Series, fit_function, joined_worth
from desk.scenarios.surfaces import fit_surface, series_degree

__all__ = ["CollaredFlows"]

_SLACK = 1e-9
_FEW = 4
_LEAST = 1e-300  # of a year's factor; its logarithm is finite


@dataclass(frozen=True, eq=False)
class _Bucket:
    """Flows due at a step within one year of growth.

    Attributes
    ----------
    year : int
        Whole years of growth, w.
    paid : float
        When they are due on average [years].
    worth : Worth or None
        Of the rates and of the logarithm of the next year's factor, which comes last; None where `bonds` are.
    bonds : tuple of (Worth, float)
        Of the rates alone, each with its part of the next year.
    later : Series or None
        Logarithm of the factors of the years from the one after that in hand to w, by inflation.
    following : Series or None
        That of the year w + 1, where it is after the one in hand.
    """

    year: int
    paid: float
    worth: Worth | None
    bonds: tuple[tuple[Worth, float], ...]
    later: Series | None
    following: Series | None


class CollaredFlows:
    """Collared flows of one side with one floor, cap and lag.

    Parameters
    ----------
    plan : Plan
        With inflation.
    rows : RealRows
    indexation : Indexation
    inflation : Inflation
        What is known of the months just passed.
    poll : callable
        As in `desk.scenarios.linked.LinkedFlows`.

    Attributes
    ----------
    certain, error : float
        As in `desk.scenarios.linked.LinkedFlows`.
    """

    def __init__(
        self,
        plan: Plan,
        rows: RealRows,
        indexation: Indexation,
        inflation: Inflation,
        poll: Callable[[], None],
    ) -> None:
        self._plan, self._lag = plan, rows.lag
        self._index = index_law(plan)
        self._recent = inflation.recent_rate
        floor = -1.0 if indexation.floor is None else max(indexation.floor, -1.0)
        self._low = 1.0 + floor
        self._high = math.inf if indexation.cap is None else 1.0 + max(indexation.cap, -1.0)
        self.error = 0.0
        steps = np.searchsorted(plan.time, rows.time, side="right") - 1
        early = steps == 0
        self.certain = float(np.sum(rows.expected[early] * plan.model.curve.discount(rows.time[early])))
        self._buckets: dict[int, list[_Bucket]] = {}
        whole = np.floor(rows.time + _SLACK).astype(np.int64)
        for step in np.unique(steps[~early]).tolist():
            poll()
            here = steps == step
            self._buckets[step] = [
                self._bucket(step, year, rows, np.flatnonzero(here & (whole == year)))
                for year in np.unique(whole[here]).tolist()
            ]
        self.last_step = max(self._buckets, default=0)
        self._progress: dict[int, _Progress] = {}

    @property
    def steps(self) -> set[int]:
        """The steps at which something is due."""
        return set(self._buckets)

    def _known(self, step: int) -> int:
        """Years whose increase is known at a node."""
        return max(0, math.floor(float(self._plan.time[step]) + self._lag + _SLACK))

    def _bucket(self, step: int, year: int, rows: RealRows, chosen: np.ndarray) -> _Bucket:
        plan, node, known = self._plan, float(self._plan.time[step]), self._known(step)
        time, real = rows.time[chosen], rows.real[chosen]
        paid = float(time.mean())
        part = np.maximum(time - year, 0.0)
        low, high = self._index.state_range(node, real_world=plan.real_world)
        # The year in hand is number known + 1; all after it depend on inflation at the node alone.
        later = following = None
        if year > known + 1:
            later = fit_function(self._log_factors(node, known + 2, year, paid), low, high)
        if part.any() and year > known:
            following = fit_function(self._log_factors(node, year + 1, year + 1, paid), low, high)
        self.error = max([self.error, *(fit.error for fit in (later, following) if fit is not None)])
        terms = affine(plan.model)
        # Between these lies the logarithm of any year's factor that a collar of both kinds lets pass.
        reach = 1.0
        lowest_year = math.log(self._low) if self._low > 0.0 else -reach
        highest_year = reach if math.isinf(self._high) else math.log(max(self._high, _LEAST))
        if terms is None and time.size > _FEW and highest_year - lowest_year <= 2.0 * reach:
            order = np.argsort(time, kind="stable")
            joined = joined_worth(
                lambda amounts: worth_of_rates(plan, step, time[order], amounts[order]),
                lambda places: real * np.exp(np.multiply.outer(places, part)),
                steepest=float(part.max()) * 0.5 * (highest_year - lowest_year),
                low=lowest_year,
                high=highest_year,
                degree=series_degree,
            )
            self.error = max(self.error, joined.error)
            return _Bucket(year, paid, joined, (), later, following)
        if terms is None:
            bonds = tuple(
                (worth_of_rates(plan, step, np.array([one]), np.array([amount])), share)
                for one, amount, share in zip(time.tolist(), real.tolist(), part.tolist(), strict=True)
            )
            return _Bucket(year, paid, None, bonds, later, following)
        level, exposure = terms.bond_terms(np.full(time.size, node), time)
        lowest, highest = plan.model.state_range(node, real_world=plan.real_world)
        worth = fit_surface(
            real * np.exp(level),
            np.column_stack([exposure, -part]),
            np.append(lowest, lowest_year),
            np.append(highest, highest_year),
        )
        self.error = max(self.error, worth.error)
        return _Bucket(year, paid, worth, (), later, following)

    def _log_factors(
        self, node: float, first: int, last: int, paid: float
    ) -> Callable[[FloatArray], FloatArray]:
        """Logarithm of the expected factors of some years after that in hand, by inflation at the node."""
        end = np.arange(first, last + 1) - self._lag
        start = end - 1.0
        paying = np.maximum(paid, end)
        level, own = self._index.growth_terms(node, paying, end)
        before, own_before = self._index.growth_terms(node, paying, start)
        _, _, variance = self._index.increase_law(node, start, end, paying)
        level, own = (level - before)[:, None], (own - own_before)[:, None]

        def summed(x: FloatArray) -> FloatArray:
            return np.asarray(self._log_held(level - own * x, variance[:, None]).sum(axis=0))

        return summed

    def _log_held(self, log_mean: FloatArray, variance: FloatArray | float) -> FloatArray:
        held = held_growth(np.exp(log_mean), variance, self._low, self._high)
        return np.asarray(np.log(np.maximum(held, _LEAST)))

    def visit(self, step: int, paths: Paths) -> None:
        """Take note of the index at a step; every step up to the last at which something is due."""
        if step > self.last_step:
            return
        start = paths.columns.start
        progress = self._progress.get(start)
        if progress is None:
            progress = self._progress[start] = _Progress(self._lag, self._recent, paths.integral.size)
        progress.advance(step, paths, self._plan, self._index, self._log_held)

    def add(self, step: int, paths: Paths, log_weight: FloatArray, value: FloatArray) -> None:
        """Add what is due from a step; see `desk.scenarios.linked.LinkedFlows.add`.

        `visit` must have been called for the step.
        """
        buckets = self._buckets.get(step)
        if buckets is None:
            return
        progress = self._progress[paths.columns.start]
        log_index = paths.index_integral + self._plan.index_offset[step]
        discount = log_weight - log_index
        for bucket in buckets:
            log_growth, following = self._growth(step, bucket, progress, paths, log_index)
            log_growth += discount
            np.exp(log_growth, out=log_growth)
            if bucket.worth is not None:
                log_growth *= bucket.worth(np.vstack([paths.state, following]))
                value += log_growth
                continue
            for bond, part in bucket.bonds:
                value += bond(paths.state) * np.exp(part * following) * log_growth
        if step == self.last_step:
            # Nothing is due later: what was kept of these paths may go.
            del self._progress[paths.columns.start]

    def _growth(
        self, step: int, bucket: _Bucket, progress: _Progress, paths: Paths, log_index: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Logarithm of the growth over the whole years of a bucket, and of the next year's factor."""
        known, year = progress.known, bucket.year
        if year + 1 <= known:
            grown = progress.grown(year)
            return grown.copy(), progress.grown(year + 1) - grown
        node, x = float(self._plan.time[step]), paths.factors[-1]
        in_hand = self._in_hand(node, known + 1, bucket.paid, log_index - progress.last_index, x)
        grown = progress.grown(known)
        if year == known:
            return grown.copy(), in_hand
        total = grown + in_hand
        if bucket.later is not None:
            total += bucket.later(x)
        following = np.zeros(x.size) if bucket.following is None else bucket.following(x)
        return total, following

    def _in_hand(self, node: float, year: int, paid: float, so_far: FloatArray, x: FloatArray) -> FloatArray:
        """Logarithm of the expected factor of the year that has begun, given the increase so far."""
        end = max(year - self._lag, node)
        level, own = self._index.growth_terms(node, max(paid, end), end)
        return self._log_held(so_far + float(level) - float(own) * x, float(self._index.variance(end - node)))


class _Progress:
    """The collared growth of the paths of one block so far.

    Attributes
    ----------
    known : int
        Years that are over.
    last_index : ndarray, shape (m,)
        Logarithm of the index at the end of the last of them, over today's.
    """

    def __init__(self, lag: float, recent: float, size: int) -> None:
        self._lag, self._recent = lag, recent
        self.known = 0
        self.last_index: FloatArray = np.full(size, -recent * lag)
        # Growth to the end of the last few years: amounts may lag behind the index.
        self._grown: dict[int, FloatArray] = {0: np.zeros(size)}
        self._integral, self._factor = np.zeros(size), np.zeros(size)

    def grown(self, year: int) -> FloatArray:
        """Logarithm of the growth to the end of a year that is over."""
        return self._grown[year]

    def advance(
        self,
        step: int,
        paths: Paths,
        plan: Plan,
        index: IndexLaw,
        log_held: Callable[[FloatArray, FloatArray | float], FloatArray],
    ) -> None:
        """Go on to a step, the one after the last."""
        now, before = float(plan.time[step]), float(plan.time[step - 1])
        while self.known + 1 - self._lag <= now + _SLACK:
            end = self.known + 1 - self._lag
            log_index = (
                np.full(self.last_index.size, self._recent * end)
                if end <= 0.0
                else self._between(paths, before, now, end) + float(index.offset(end))
            )
            self._grown[self.known + 1] = self._grown[self.known] + log_held(log_index - self.last_index, 0.0)
            self.last_index = log_index
            self.known += 1
        for year in [year for year in self._grown if year < math.floor(now) - 1 and year < self.known]:
            del self._grown[year]
        self._integral[:] = paths.index_integral
        self._factor[:] = paths.factors[-1]

    def _between(self, paths: Paths, before: float, now: float, at: float) -> FloatArray:
        """Integral of the inflation factor between two nodes, by the cubic of Hermite."""
        length = now - before
        s = min(max((at - before) / length, 0.0), 1.0)
        if s == 1.0:
            return paths.index_integral.copy()
        return np.asarray(
            (1.0 + 2.0 * s) * (1.0 - s) ** 2 * self._integral
            + s * (1.0 - s) ** 2 * length * self._factor
            + s * s * (3.0 - 2.0 * s) * paths.index_integral
            + s * s * (s - 1.0) * length * paths.factors[-1]
        )
