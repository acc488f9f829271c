"""The yield curve at a chosen horizon: zero rates by term over the paths of a run.

The states at the horizon are those of the run, drawn once more from the same seed; on each path the model's
own bond prices give the zero rates. Seen from a state the prices are those of the pricing measure, whatever
measure the paths are drawn under.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from desk import __version__
from desk.book import Book, Measure, PricedFlows, Provenance
from desk.book.arrays import FloatArray, owned_floats
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.scenarios.drawn_model import affine
from desk.scenarios.draws import Block, Crew, Paths, Plan, default_threads
from desk.scenarios.given import GivenRates
from desk.scenarios.plans import planned_run
from desk.scenarios.replicates import Sample, Summing

__all__ = ["CURVE_TERMS", "CurveFan", "curve_fan"]

CURVE_TERMS = (
    0.0,
    0.25,
    0.5,
    1.0,
    2.0,
    3.0,
    4.0,
    5.0,
    6.0,
    7.0,
    8.0,
    9.0,
    10.0,
    12.0,
    15.0,
    20.0,
    25.0,
    30.0,
)
"""Usual terms of a curve [years]; the term 0 is the short rate."""

_SLACK = 1e-9


@dataclass(frozen=True, eq=False)
class CurveFan:
    """Zero rates at a horizon, continuously compounded [1/year]; each array shape (n,) by term, or (n, m).

    Attributes
    ----------
    year : float
        The horizon [years].
    term : ndarray, shape (n,)
        From the horizon on [years]; the term 0 is the short rate.
    levels : tuple of float, length m
        Percentiles.
    mean, mean_se, sd : ndarray, shape (n,)
    percentile, percentile_se, percentile_low, percentile_high : ndarray, shape (n, m)
        With the 95 % interval of each.
    forward : ndarray, shape (n,)
        What today's curve of the model says of the same spans: forward zero rates.
    today : ndarray, shape (n,)
        Zero rates of today's curve for these terms.
    model : str
    measure : Measure
    paths : int
    left_out : tuple of float
        Terms asked for that the model does not reach.
    provenance : Provenance
    """

    year: float
    term: FloatArray
    levels: tuple[float, ...]
    mean: FloatArray
    mean_se: FloatArray
    sd: FloatArray
    percentile: FloatArray
    percentile_se: FloatArray
    percentile_low: FloatArray
    percentile_high: FloatArray
    forward: FloatArray
    today: FloatArray
    model: str
    measure: Measure
    paths: int
    left_out: tuple[float, ...]
    provenance: Provenance


def curve_fan(
    book: Book,
    *sides: PricedFlows,
    year: float,
    terms: Sequence[float] = CURVE_TERMS,
    progress: Callable[[float], None] | None = None,
    threads: int | None = None,
) -> CurveFan:
    """Zero rates by term over the paths of a book's run, at one of its nodes.

    Parameters
    ----------
    book : Book
    sides : PricedFlows
        The flows the run values: the lognormal model is worked out as far as they reach, and so is its
        yield curve.
    year : float
        A node of the run [years].
    terms : sequence of float
        At least 0, rising [years].
    progress, threads : as in `desk.scenarios.simulation.simulate`

    Raises
    ------
    ValueError
        If `year` is no node of the run, a term is negative or they do not rise, the run cannot be drawn, or
        the model is a set from outside, which holds no bonds.
    """
    plan = planned_run(book, *sides).plan
    if isinstance(plan.model, GivenRates):
        raise ValueError(
            "a set of scenarios from outside states short rates alone: it has no bonds, and so no yield curve"
        )
    asked = np.asarray(terms, dtype=np.float64)
    if asked.size == 0 or asked[0] < 0.0 or not (np.diff(asked) > 0.0).all():
        raise ValueError("`terms` must be at least 0 and rise")
    step = int(np.argmin(np.abs(plan.time - year)))
    node = float(plan.time[step])
    if abs(node - year) > _SLACK or step == 0:
        raise ValueError(f"`year` must be a node of the run after today, not {year:g}")
    reached = asked <= _reach(plan) - node + _SLACK
    term = asked[reached]
    levels = book.run.percentiles
    replicates = 1 if plan.replicates is None else plan.replicates.count
    with np.errstate(over="ignore", invalid="ignore", under="ignore", divide="ignore"):
        samples = _samples(plan, step, term, Summing(levels, plan.paths, replicates), progress, threads)
    curve = plan.model.curve
    ends = np.full(term.size, node)
    interval = np.array([sample.interval for sample in samples])
    if progress is not None:
        progress(1.0)
    return CurveFan(
        year=node,
        term=owned_floats(term),
        levels=levels,
        mean=owned_floats([sample.moments.mean for sample in samples]),
        mean_se=owned_floats([sample.moments.mean_se for sample in samples]),
        sd=owned_floats([sample.moments.sd for sample in samples]),
        percentile=owned_floats([sample.percentile for sample in samples]),
        percentile_se=owned_floats([sample.percentile_se for sample in samples]),
        percentile_low=owned_floats(interval[:, :, 0]),
        percentile_high=owned_floats(interval[:, :, 1]),
        forward=owned_floats(curve.forward(ends, node + term)),
        today=owned_floats(np.where(term == 0.0, curve.forward(0.0, 0.0), curve.zero(term))),
        model="" if book.rates_model is None else str(book.rates_model.name),
        measure=book.run.measure,
        paths=plan.paths,
        left_out=tuple(asked[~reached].tolist()),
        provenance=Provenance(
            book_digest=book.digest,
            program_version=__version__,
            settings=(("year", f"{node:g}"), ("terms", " ".join(f"{one:g}" for one in term))),
            seed=book.run.seed,
        ),
    )


def _reach(plan: Plan) -> float:
    """Up to when the model's bonds are known [years]."""
    return plan.model.horizon if isinstance(plan.model, BlackKarasinskiRates) else np.inf


def _samples(
    plan: Plan,
    step: int,
    term: FloatArray,
    summing_up: Summing,
    progress: Callable[[float], None] | None,
    threads: int | None,
) -> list[Sample]:
    """The zero rates of every term, summed up over the paths."""
    state = np.empty((plan.model.factor_count, plan.paths))
    drawing = float(plan.blocks * step)
    # Of about the same size as the drawing: sorting a term costs as much as drawing a few steps.
    share = max(drawing, 1.0) / term.size
    with Crew(threads or default_threads(), drawing + share * term.size, progress) as crew:
        blocks = [Block(plan, index) for index in range(plan.blocks)]
        crew.grouped(blocks, partial(_draw, step, state, crew))
        zero_rate = _zero_rates(plan, step, state)
        samples: list[Sample] = []
        # As many at a time as there are threads: each takes a row of all paths.
        size = threads or default_threads()
        for start in range(0, term.size, size):
            part = term[start : start + size].tolist()
            samples += crew.run([partial(_sum_up, summing_up, zero_rate, one) for one in part])
            crew.add(share * len(part))
    return samples


def _draw(step: int, state: FloatArray, crew: Crew, block: Block) -> None:
    def keep(number: int, paths: Paths) -> None:
        if number == step:
            state[:, paths.columns] = paths.state

    nothing = np.empty((0, 0))
    block.advance((), nothing, nothing, visit=keep, crew=crew, until=step)


def _sum_up(summing_up: Summing, zero_rate: Callable[[float], FloatArray], term: float) -> Sample:
    return summing_up.sample(zero_rate(term))


def _zero_rates(plan: Plan, step: int, state: FloatArray) -> Callable[[float], FloatArray]:
    """Gives the zero rates of a term on all paths, shape (paths,)."""
    model, node = plan.model, float(plan.time[step])

    def short_rate() -> FloatArray:
        rate = state[0] + plan.rate_offset[step]
        for factor in state[1:]:
            rate += factor
        return np.asarray(rate)

    def zero_rate(term: float) -> FloatArray:
        if term == 0.0:
            return short_rate()
        if isinstance(model, BlackKarasinskiRates):
            price = model.value_flows_at(node, np.array([node + term]), np.ones(1))(state)
            return np.asarray(-np.log(price) / term)
        bonds = affine(model)
        if bonds is None:
            raise TypeError(f"{type(model).__name__} offers no bond prices")
        level, exposure = bonds.bond_terms(node, node + term)
        rate = np.full(state.shape[1], -float(level) / term)
        for weight, factor in zip(np.ravel(exposure) / term, state, strict=True):
            rate += weight * factor
        return rate

    return zero_rate
