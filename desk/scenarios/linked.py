"""Flows that follow the price index, revalued along the paths with the index as it is drawn.

A linked flow pays a real amount times the growth of the index up to the time it is observed, the due date
less the lag. It is valued at the last node before that time: there it is worth the index so far times a bond
that is linked from the node on, which rates and inflation price together. Every real amount is such that the
flow is worth today what the basis has it worth: what is known of the months just passed, and how a lag goes
together with discounting, are those of the basis.

A floor on the growth makes the same flow an option, valued there by Black's formula with the variance that
the factor gives the index from the node on.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from desk.book import Inflation, PricedFlows
from desk.book.arrays import FloatArray, IntArray
from desk.rates.inflation import growth_factors, log_growth
from desk.rates.risky_inflation import IndexLaw
from desk.scenarios.drawn_model import Worth, affine, worth_by_step
from desk.scenarios.draws import Paths, Plan
from desk.scenarios.smooth import joined_worth
from desk.scenarios.surfaces import fit_surface, series_degree

__all__ = ["FlooredFlows", "LinkedFlows", "RealRows", "held_growth", "index_law", "worth_of_rates"]


@dataclass(frozen=True, eq=False)
class RealRows:
    """Rows that follow the index, all with one lag.

    Attributes
    ----------
    time : ndarray, shape (k,)
        When each is due [years].
    real : ndarray, shape (k,)
        In today's money, spread taken off [currency].
    expected : ndarray, shape (k,)
        As expected today, spread taken off [currency].
    lag : float
        [years]
    """

    time: FloatArray
    real: FloatArray
    expected: FloatArray
    lag: float

    @classmethod
    def of(cls, flows: PricedFlows, rows: IntArray, lag: float) -> RealRows:
        """Some rows of a side."""
        if flows.real_amount is None:
            raise ValueError("`flows` must have real amounts")
        time = flows.time[rows]
        taken = np.exp(-flows.spread[rows] * time)
        return cls(time, flows.real_amount[rows] * taken, flows.amount[rows] * taken, lag)

    @property
    def observed(self) -> FloatArray:
        """When the index that a row pays is observed, at the earliest today [years]."""
        return np.asarray(np.maximum(self.time - self.lag, 0.0))


class LinkedFlows:
    """Linked flows of one side without a floor.

    Parameters
    ----------
    plan : Plan
        With inflation.
    rows : RealRows
    poll : callable
        Called now and then; it may stop the work by raising.

    Attributes
    ----------
    certain : float
        What is worth the same on every path: the index is observed before the first node [currency].
    error : float
        Largest relative error of a fitted surface.
    """

    def __init__(self, plan: Plan, rows: RealRows, poll: Callable[[], None]) -> None:
        self._plan = plan
        self.error = 0.0
        self._visits: dict[int, Worth] = {}
        observed = rows.observed
        steps = np.searchsorted(plan.time, observed, side="right") - 1
        early = steps == 0
        curve = plan.model.curve
        self.certain = float(np.sum(rows.expected[early] * curve.discount(rows.time[early])))
        order = np.argsort(steps[~early], kind="stable")
        step, time = steps[~early][order], rows.time[~early][order]
        seen, amount = observed[~early][order], rows.expected[~early][order]
        for number in np.unique(step).tolist():
            poll()
            part = slice(*np.searchsorted(step, [number, number + 1]).tolist())
            worth = self._worth(number, time[part], seen[part], amount[part])
            self.error = max(self.error, worth.error)
            self._visits[number] = worth

    def _worth(self, step: int, time: FloatArray, seen: FloatArray, amount: FloatArray) -> Worth:
        """What flows are worth at a node per unit of the index there, as a function of all factors."""
        plan, node = self._plan, float(self._plan.time[step])
        index = index_law(plan)
        growth, own = index.growth_terms(np.full(time.size, node), time, seen)
        growth = growth - index.growth_terms(np.zeros(time.size), time, seen)[0]
        low, high = index.state_range(node, real_world=plan.real_world)
        terms = affine(plan.model)
        if terms is not None:
            level, exposure = terms.bond_terms(np.full(time.size, node), time)
            lowest, highest = plan.model.state_range(node, real_world=plan.real_world)
            return fit_surface(
                amount * np.exp(level + growth),
                np.column_stack([exposure, own]),
                np.append(lowest, low),
                np.append(highest, high),
            )
        order = np.argsort(time, kind="stable")
        # What all flows have in common need not be fitted: flows of one month differ little.
        tilt = float(np.mean(own))
        apart = own - tilt
        return joined_worth(
            lambda amounts: worth_of_rates(plan, step, time[order], amounts[order]),
            lambda places: amount * np.exp(growth - np.multiply.outer(places, apart)),
            steepest=float(np.abs(apart).max()) * 0.5 * (high - low),
            low=low,
            high=high,
            degree=series_degree,
            tilt=tilt,
        )

    def add(self, step: int, paths: Paths, log_weight: FloatArray, value: FloatArray) -> None:
        """Add what is due from a step.

        Parameters
        ----------
        step : int
        paths : Paths
        log_weight : ndarray, shape (m,)
            ``ln I(t)/(I(0) R_t)`` of every path.
        value : ndarray, shape (m,)
            Receives it.
        """
        worth = self._visits.get(step)
        if worth is not None:
            value += worth(paths.factors) * np.exp(log_weight)

    @property
    def steps(self) -> set[int]:
        """The steps at which something is due."""
        return set(self._visits)


class FlooredFlows:
    """Linked flows of one side whose growth has a floor, each valued by itself.

    Parameters
    ----------
    plan : Plan
        With inflation.
    rows : RealRows
    least : float
        The least growth from today to the payment.
    inflation : Inflation
        What is known of the months just passed.
    poll : callable
        As in `LinkedFlows`.

    Attributes
    ----------
    certain, error : float
        As in `LinkedFlows`.
    """

    def __init__(
        self, plan: Plan, rows: RealRows, least: float, inflation: Inflation, poll: Callable[[], None]
    ) -> None:
        self._plan, self._least = plan, least
        self.error = 0.0
        self.certain = 0.0
        self._visits: dict[int, list[tuple[float, float, float, Worth]]] = {}
        index = index_law(plan)
        observed = rows.observed
        growth = growth_factors(
            log_growth(rows.time, curve=inflation.curve, recent_rate=inflation.recent_rate, lag=rows.lag)
        )
        for time, seen, real, expected, grown in zip(
            *(column.tolist() for column in (rows.time, observed, rows.real, rows.expected, growth)),
            strict=True,
        ):
            poll()
            step = int(np.searchsorted(plan.time, seen, side="right")) - 1
            if step == 0:
                self.certain += expected * float(plan.model.curve.discount(time))
                continue
            node = float(plan.time[step])
            level, own = index.growth_terms(node, time, seen)
            log_mean = float(np.log(grown)) + float(level - index.growth_terms(0.0, time, seen)[0])
            bond = worth_of_rates(plan, step, np.array([time]), np.array([real]))
            self.error = max(self.error, bond.error)
            variance = float(index.variance(seen - node))
            self._visits.setdefault(step, []).append((log_mean, float(own), variance, bond))

    def add(self, step: int, paths: Paths, log_weight: FloatArray, value: FloatArray) -> None:
        """Add what is due from a step; see `LinkedFlows.add`."""
        due = self._visits.get(step)
        if due is None:
            return
        log_index = paths.index_integral + self._plan.index_offset[step]
        discount = np.exp(log_weight - log_index)
        for log_mean, own, variance, bond in due:
            mean = np.exp(log_index + log_mean - own * paths.factors[-1])
            value += bond(paths.state) * held_growth(mean, variance, self._least, np.inf) * discount

    @property
    def steps(self) -> set[int]:
        """The steps at which something is due."""
        return set(self._visits)


def index_law(plan: Plan) -> IndexLaw:
    """The law of the index of a plan that has one."""
    if plan.market is None or plan.market.index is None:
        raise ValueError("`plan` must have inflation beside its rates")
    return plan.market.index


def worth_of_rates(plan: Plan, step: int, time: FloatArray, amount: FloatArray) -> Worth:
    """What amounts due at rising times are worth at a node, as a function of the rates there."""
    steps = np.full(time.size, step)
    found = worth_by_step(plan.model, plan.time, steps, time, amount, real_world=plan.real_world)
    return next(iter(found))[1]


def held_growth(mean: FloatArray, variance: FloatArray | float, least: float, most: float) -> FloatArray:
    """Expected value of a lognormal number held between two bounds.

    ``K₁ + C(K₁) - C(K₂)`` with Black's formula for the calls: Black, F. (1976), The pricing of commodity
    contracts, Journal of Financial Economics 3.

    Parameters
    ----------
    mean : ndarray, any shape
        Above 0.
    variance : ndarray or float
        Of the logarithm; broadcasts against `mean`.
    least, most : float
        At least 0; `most` may be infinite.
    """
    deviation = np.sqrt(np.maximum(variance, 0.0))
    held = mean if least <= 0.0 else least + _call(mean, deviation, least)
    if most < np.inf:
        held = held - _call(mean, deviation, most)
    return np.asarray(np.clip(held, least, most))


def _call(mean: FloatArray, deviation: FloatArray, strike: float) -> FloatArray:
    """Black's formula without discounting."""
    from scipy.special import ndtr

    if strike <= 0.0:
        return mean - strike
    # Where there is no deviation the chance is 0 or 1.
    some = np.maximum(deviation, 1e-150)
    upper = np.log(mean / strike)
    upper /= some
    upper += 0.5 * deviation
    return np.asarray(mean * ndtr(upper) - strike * ndtr(upper - deviation))
