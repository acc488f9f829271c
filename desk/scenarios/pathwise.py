"""Present values along each path.

A side's value on a path is ``Σ c_t e^{-s t}/R_t``. Flows between two nodes are discounted to the earlier node
with the model's own bond price given the state there, and flows after the last node likewise, so that neither
buckets nor a short horizon bring in an error: the mean under the pricing measure is the value on the curve.
"""

from __future__ import annotations

import numpy as np

from desk.book import PricedFlows
from desk.book.arrays import FloatArray
from desk.scenarios.draws import Plan
from desk.scenarios.surfaces import Surface, fit_surface

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
        self._visits: dict[int, list[tuple[int, Surface]]] = {}
        self.value = np.zeros((len(sides), plan.paths))
        self.surface_error = 0.0
        for side, flows in enumerate(sides):
            self._add(side, flows)

    def _add(self, side: int, flows: PricedFlows) -> None:
        """Give every flow of a side to the last node that is not after it."""
        plan, model = self._plan, self._plan.model
        times, place = np.unique(flows.time, return_inverse=True)
        amounts = np.bincount(place, weights=flows.spread_discounted, minlength=times.size)
        steps = np.searchsorted(plan.time, times, side="right") - 1
        # Before the first step the rate is known: these values are those of the curve.
        early = steps == 0
        self.value[side] = float(np.sum(amounts[early] * model.curve.discount(times[early])))
        times, amounts, steps = times[~early], amounts[~early], steps[~early]
        if times.size == 0:
            return
        level, exposure = model.bond_terms(plan.time[steps], times)
        weight = amounts * np.exp(level)
        starts = np.flatnonzero(np.diff(steps, prepend=-1))
        for start, end in zip(starts, [*starts[1:], steps.size], strict=True):
            step = int(steps[start])
            low, high = model.state_range(float(plan.time[step]), real_world=plan.real_world)
            surface = fit_surface(weight[start:end], exposure[start:end], low, high)
            self.surface_error = max(self.surface_error, surface.error)
            self._visits.setdefault(step, []).append((side, surface))

    def visit(self, step: int, state: FloatArray, integral: FloatArray, columns: slice) -> None:
        """Add what falls due from this step to the next; see `desk.scenarios.draws.Block.advance`."""
        due = self._visits.get(step)
        if due is None:
            return
        discount = integral + self._plan.account_offset[step]
        np.negative(discount, out=discount)
        np.exp(discount, out=discount)
        for side, surface in due:
            worth = surface(state)
            worth *= discount
            self.value[side, columns] += worth
