"""Present values along each path.

A side's value on a path is ``Σ c_t e^{-s t}/R_t``. Flows between two nodes are discounted to the earlier node
with the model's own bond price given the state there, and flows after the last node likewise, so that neither
buckets nor a short horizon bring in an error: the mean under the pricing measure is the value on the curve.
Flows that follow the price index do so along the paths where inflation is drawn; see `desk.scenarios.linked`.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from desk.book import IndexationKind, Inflation, PricedFlows
from desk.book.arrays import FloatArray
from desk.scenarios.collars import CollaredFlows
from desk.scenarios.drawn_model import Worth, paying_steps, worth_by_step
from desk.scenarios.draws import Paths, Plan
from desk.scenarios.linked import FlooredFlows, LinkedFlows, RealRows

__all__ = ["PathValues", "curve_value"]


def curve_value(plan: Plan, flows: PricedFlows) -> float:
    """The present value of a side on the model's curve with its spreads [currency]."""
    return float(np.sum(flows.spread_discounted * plan.model.curve.discount(flows.time)))


class PathValues:
    """Present values of several sides, gathered while paths are drawn.

    Parameters
    ----------
    plan : Plan
    sides : sequence of PricedFlows, length s
    inflation : Inflation, optional
        Of the basis; needed where the plan has inflation.
    poll : callable, optional
        Called now and then while surfaces are fitted; it may stop the work by raising.

    Attributes
    ----------
    value : ndarray, shape (s, paths)
        Complete once every block has gone through its last step [currency].
    surface_error : float
        Largest relative error of a fitted surface.
    linked_rows, held_rows : int
        Rows that follow the index along the paths, without and with a floor or a cap.
    """

    def __init__(
        self,
        plan: Plan,
        sides: tuple[PricedFlows, ...],
        inflation: Inflation | None = None,
        *,
        poll: Callable[[], None] = lambda: None,
    ) -> None:
        self._plan = plan
        self._poll = poll
        self._inflation = inflation
        self._following: list[tuple[int, LinkedFlows | FlooredFlows | CollaredFlows]] = []
        self._visits: dict[int, list[tuple[int, Worth]]] = {}
        self.value = np.zeros((len(sides), plan.paths))
        self.surface_error = 0.0
        self.linked_rows = self.held_rows = 0
        for side, flows in enumerate(sides):
            follows = self._follows(flows)
            if not follows.any():
                self._add(side, flows.time, flows.spread_discounted)
                continue
            self._add(side, flows.time[~follows], flows.spread_discounted[~follows])
            self._add_following(side, flows, follows)
        self._collars = [rows for _, rows in self._following if isinstance(rows, CollaredFlows)]
        self._index_steps = {step for _, rows in self._following for step in rows.steps}

    def _follows(self, flows: PricedFlows) -> NDArray[np.bool_]:
        """Which rows follow the index along the paths."""
        market = self._plan.market
        if market is None or market.index is None or flows.index_class is None or self._inflation is None:
            return np.zeros(len(flows), dtype=np.bool_)
        by_class = np.array([each.follows_index for each in flows.indexations] + [False])
        return np.asarray(by_class[flows.index_class])

    def _add_following(self, side: int, flows: PricedFlows, follows: NDArray[np.bool_]) -> None:
        """Give every flow that follows the index to those of its kind of growth."""
        if flows.index_class is None or self._inflation is None:
            return
        classes = flows.index_class
        alike: dict[object, list[int]] = {}
        for number in np.unique(classes[follows]).tolist():
            each = flows.indexations[number]
            if each.kind is IndexationKind.COLLARED:
                alike.setdefault(("collared", each.lag, each.floor, each.cap), []).append(number)
            else:
                alike.setdefault(("linked", each.lag, each.least), []).append(number)
        for numbers in alike.values():
            each = flows.indexations[numbers[0]]
            rows = RealRows.of(flows, np.flatnonzero(np.isin(classes, numbers)), each.lag)
            found: LinkedFlows | FlooredFlows | CollaredFlows
            if each.kind is IndexationKind.COLLARED:
                found = CollaredFlows(self._plan, rows, each, self._inflation, self._poll)
            elif each.least is not None:
                found = FlooredFlows(self._plan, rows, each.least, self._inflation, self._poll)
            else:
                found = LinkedFlows(self._plan, rows, self._poll)
            if isinstance(found, LinkedFlows):
                self.linked_rows += rows.time.size
            else:
                self.held_rows += rows.time.size
            self.value[side] += found.certain
            self.surface_error = max(self.surface_error, found.error)
            self._following.append((side, found))

    @property
    def revalued(self) -> str:
        """Which flows follow the index along the paths, and how, in words."""
        if not self._following:
            return "No flow follows the index."
        parts = [
            f"{self.linked_rows:,} linked flows are revalued along the paths with the index as it is drawn; "
            "their mean is today's value."
        ]
        if self.held_rows:
            parts.append(
                f"{self.held_rows:,} flows with a floor or a cap are too: these are valued with the "
                "volatility of the inflation factor, not with that of the basis, year by year as if later "
                "years were independent, so that their mean need not be today's value."
            )
        return " ".join(parts)

    def _add(self, side: int, time: FloatArray, amount: FloatArray) -> None:
        """Give every flow of a side to the last node that is not after it."""
        plan, model = self._plan, self._plan.model
        times, place = np.unique(time, return_inverse=True)
        amounts = np.bincount(place, weights=amount, minlength=times.size)
        steps = paying_steps(model, plan.time, times)
        # Before the first step the rate is known: these values are those of the curve.
        early = steps == 0
        self.value[side] = float(np.sum(amounts[early] * model.curve.discount(times[early])))
        times, amounts, steps = times[~early], amounts[~early], steps[~early]
        if times.size == 0:
            return
        found = worth_by_step(model, plan.time, steps, times, amounts, real_world=plan.real_world)
        for step, worth in found:
            self._poll()
            self.surface_error = max(self.surface_error, worth.error)
            self._visits.setdefault(step, []).append((side, worth))

    def visit(self, step: int, paths: Paths) -> None:
        """Add what falls due from this step to the next; see `desk.scenarios.draws.Block.advance`."""
        for collar in self._collars:
            collar.visit(step, paths)
        due = self._visits.get(step)
        if due is not None:
            discount = paths.integral + self._plan.account_offset[step]
            np.negative(discount, out=discount)
            np.exp(discount, out=discount)
            for side, worth in due:
                value = worth(paths.state)
                value *= discount
                self.value[side, paths.columns] += value
        if step in self._index_steps:
            log_weight = paths.index_integral + self._plan.index_offset[step]
            log_weight -= paths.integral
            log_weight -= self._plan.account_offset[step]
            for side, rows in self._following:
                rows.add(step, paths, log_weight, self.value[side, paths.columns])
