"""Percentiles of the short rate and the savings account at every step, for fans."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from desk.book.arrays import FloatArray, owned_floats
from desk.scenarios.drawn_model import DrawnModel
from desk.scenarios.draws import Block, Crew, Plan, default_threads
from desk.scenarios.given import GivenRates
from desk.scenarios.summaries import sorted_quantile

__all__ = ["Fan", "percentile_fan"]


@dataclass(frozen=True, eq=False)
class Fan:
    """Percentiles at every step.

    Attributes
    ----------
    time : ndarray, shape (n,)
        From the first step to the horizon [years].
    levels : tuple of float, length m
        Percentiles.
    savings_account : ndarray, shape (n, m)
    short_rate : ndarray, shape (n, m)
        [1/year]
    """

    time: FloatArray
    levels: tuple[float, ...]
    savings_account: FloatArray
    short_rate: FloatArray


def percentile_fan(
    model: DrawnModel,
    *,
    paths: int,
    steps_per_year: int,
    steps: int,
    seed: int,
    levels: Sequence[float],
    real_world: bool = False,
    progress: Callable[[float], None] | None = None,
    threads: int | None = None,
) -> Fan:
    """Draw a model and give percentiles of its rate and savings account at every step.

    The paths are those of a run of the same model, seed and steps a year; see `desk.scenarios.draws`.

    Parameters
    ----------
    model : DrawnModel
    paths, steps_per_year, steps, seed : int
    levels : sequence of float
        Between 0 and 100.
    real_world : bool
    progress, threads : as in `desk.scenarios.simulation.simulate`

    Raises
    ------
    ValueError
        If `model` is a set of scenarios from outside.
    """
    if isinstance(model, GivenRates):
        raise ValueError("a set of scenarios has nodes of its own: a run reports on them")
    plan = Plan(model, paths, steps_per_year, steps, seed, real_world)
    shares = np.asarray(levels, dtype=np.float64) / 100.0
    account, short = np.empty((steps, shares.size)), np.empty((steps, shares.size))
    with Crew(threads or default_threads(), float(plan.blocks * steps), progress) as crew:
        blocks = [Block(plan, index) for index in range(plan.blocks)]
        groups = list(plan.rounds(range(1, steps + 1)))
        buffer = np.empty((2, len(groups[0]), paths))
        for group in groups:
            log_account, rate = buffer[0, : len(group)], buffer[1, : len(group)]
            crew.grouped(blocks, partial(_advance, group, log_account, rate, crew))
            found = slice(group[0] - 1, group[-1])
            rows = partial(_percentiles, shares=shares)
            crew.run(
                [
                    partial(rows, rate, out=short[found], transform=None),
                    partial(rows, log_account, out=account[found], transform=np.exp),
                ]
            )
    return Fan(plan.time[1:], tuple(levels), owned_floats(account), owned_floats(short))


def _advance(
    group: Sequence[int], log_account: FloatArray, rate: FloatArray, crew: Crew, block: Block
) -> None:
    block.advance(group, log_account, rate, crew=crew)


def _percentiles(
    samples: FloatArray,
    *,
    shares: FloatArray,
    out: FloatArray,
    transform: Callable[[FloatArray], FloatArray] | None,
) -> None:
    samples.sort(axis=-1)
    out[:] = sorted_quantile(samples, shares, transform=transform)
