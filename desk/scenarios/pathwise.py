"""Present values along each path.

A side's value on a path is ``Σ c_t e^{-s t}/R_t``. Flows between two nodes are discounted to the earlier node
with the model's own bond price given the state there, and flows after the last node likewise, so that neither
buckets nor a short horizon bring in an error: the mean under the pricing measure is the value on the curve.
"""

from __future__ import annotations

import numpy as np

from desk.book import PricedFlows
from desk.scenarios.drawn_model import Worth, paying_steps, worth_by_step
from desk.scenarios.draws import Paths, Plan

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

    Attributes
    ----------
    value : ndarray, shape (s, paths)
        Complete once every block has gone through its last step [currency].
    surface_error : float
        Largest relative error of a fitted surface.
    """

    def __init__(self, plan: Plan, sides: tuple[PricedFlows, ...]) -> None:
        self._plan = plan
        self._visits: dict[int, list[tuple[int, Worth]]] = {}
        self.value = np.zeros((len(sides), plan.paths))
        self.surface_error = 0.0
        self.revalued = ""
        for side, flows in enumerate(sides):
            self._add(side, flows)

    def _add(self, side: int, flows: PricedFlows) -> None:
        """Give every flow of a side to the last node that is not after it."""
        plan, model = self._plan, self._plan.model
        times, place = np.unique(flows.time, return_inverse=True)
        amounts = np.bincount(place, weights=flows.spread_discounted, minlength=times.size)
        steps = paying_steps(model, plan.time, times)
        # Before the first step the rate is known: these values are those of the curve.
        early = steps == 0
        self.value[side] = float(np.sum(amounts[early] * model.curve.discount(times[early])))
        times, amounts, steps = times[~early], amounts[~early], steps[~early]
        if times.size == 0:
            return
        found = worth_by_step(model, plan.time, steps, times, amounts, real_world=plan.real_world)
        for step, worth in found:
            self.surface_error = max(self.surface_error, worth.error)
            self._visits.setdefault(step, []).append((side, worth))

    def visit(self, step: int, paths: Paths) -> None:
        """Add what falls due from this step to the next; see `desk.scenarios.draws.Block.advance`."""
        due = self._visits.get(step)
        if due is None:
            return
        discount = paths.integral + self._plan.account_offset[step]
        np.negative(discount, out=discount)
        np.exp(discount, out=discount)
        for side, worth in due:
            value = worth(paths.state)
            value *= discount
            self.value[side, paths.columns] += value
