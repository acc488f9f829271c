"""What is asked of every model that is drawn, and what later flows are worth in it.

Affine models price a bond by the exponential of a linear function of their factors; the lognormal model has
no such form and values flows on a grid of its own; a given set has no bonds at all. All give functions of the
state, and little else of this room tells them apart.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray, IntArray
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.curve import DiscountCurve
from desk.rates.gaussian import GaussianRates
from desk.rates.short_rate import ShortRateModel, Walk
from desk.rates.square_root import SquareRootRates
from desk.scenarios.given import GivenRates
from desk.scenarios.surfaces import fit_surface

__all__ = ["DrawnModel", "Worth", "affine", "paying_steps", "worth_by_step"]


class DrawnModel(Protocol):
    """A model of the short rate; see `desk.rates.short_rate.ShortRateModel` for what its methods give."""

    @property
    def curve(self) -> DiscountCurve:
        """Today's curve."""
        ...

    @property
    def factor_count(self) -> int:
        """Number n of factors."""
        ...

    def walk(self, step: float, size: int, rng: np.random.Generator, *, real_world: bool = False) -> Walk:
        """Paths from time 0."""
        ...

    def rate_offset(self, time: ArrayLike) -> FloatArray:
        """What is added to the factors to give the short rate [1/year]."""
        ...

    def account_offset(self, time: ArrayLike) -> FloatArray:
        """What is added to the integral of the factors to give ``ln R_t``."""
        ...

    def account_law(
        self, time: ArrayLike, *, real_world: bool = False
    ) -> tuple[FloatArray, FloatArray] | None:
        """Mean and variance of ``ln R_t`` where it is normal, else None."""
        ...

    def mean_discount(self, time: ArrayLike, *, real_world: bool = False) -> FloatArray:
        """``E[1/R_t]``."""
        ...

    def state_range(self, time: float, *, real_world: bool = False) -> tuple[FloatArray, FloatArray]:
        """Lowest and highest factors, shape (n,) each."""
        ...


class Worth(Protocol):
    """A value as a function of the state.

    Attributes
    ----------
    error : float
        Of the fit, as a part of the value.
    """

    @property
    def error(self) -> float:
        """Of the fit, as a part of the value."""
        ...

    def __call__(self, state: FloatArray, out: FloatArray | None = None) -> FloatArray:
        """Values at states, shape (n, m), as an array of shape (m,)."""
        ...


def affine(model: DrawnModel) -> ShortRateModel | None:
    """The model, where its bonds are exponentials of linear functions of its factors; else None."""
    return model if isinstance(model, (GaussianRates, SquareRootRates)) else None


def paying_steps(model: DrawnModel, nodes: FloatArray, time: FloatArray) -> IntArray:
    """The step at which each flow is valued.

    A model's own bonds discount a flow to the last node that is not after it. A given set has no bonds, and
    knows the rate of the step the flow is due in only at its end.

    Parameters
    ----------
    model : DrawnModel
    nodes : ndarray, shape (k,)
        Rising from 0 [years].
    time : ndarray, shape (n,)
        [years]
    """
    if isinstance(model, GivenRates):
        return np.asarray(np.minimum(np.searchsorted(nodes, time, side="left"), nodes.size - 1), np.int64)
    return np.asarray(np.searchsorted(nodes, time, side="right") - 1, dtype=np.int64)


def worth_by_step(
    model: DrawnModel,
    nodes: FloatArray,
    steps: IntArray,
    time: FloatArray,
    amount: FloatArray,
    *,
    real_world: bool,
) -> Iterator[tuple[int, Worth]]:
    """What flows are worth at the steps they are given to, as functions of the state there.

    Parameters
    ----------
    model : DrawnModel
    nodes : ndarray, shape (k,)
        Rising from 0 [years].
    steps : ndarray of int, shape (n,)
        See `paying_steps`; they do not fall.
    time, amount : ndarray, shape (n,)
        When each flow is due [years] and what it pays.
    real_world : bool
        Whether the states are those of the real-world measure.
    """
    starts = np.flatnonzero(np.diff(steps, prepend=-1)).tolist()
    parts = [slice(start, end) for start, end in zip(starts, [*starts[1:], steps.size], strict=True)]
    if isinstance(model, BlackKarasinskiRates):
        for part in parts:
            step = int(steps[part.start])
            yield step, model.value_flows_at(float(nodes[step]), time[part], amount[part])
        return
    if isinstance(model, GivenRates):
        level, exposure = model.flow_terms(nodes[steps], time)
    else:
        terms = affine(model)
        if terms is None:
            raise TypeError(f"{type(model).__name__} offers no values of later flows")
        level, exposure = terms.bond_terms(nodes[steps], time)
    weight = amount * np.exp(level)
    for part in parts:
        step = int(steps[part.start])
        low, high = model.state_range(float(nodes[step]), real_world=real_world)
        yield step, fit_surface(weight[part], exposure[part], low, high)
