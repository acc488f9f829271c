"""What a run of a book draws: its model, what stands beside it, its nodes, and whether it fits in memory."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from desk.book import Book, Fault, IndexationKind, Measure, PricedFlows, Severity
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.correlation import MendedCorrelation
from desk.scenarios.draws import BLOCK_PATHS, Plan
from desk.scenarios.given import GivenRates
from desk.scenarios.market import beside_rates
from desk.scenarios.models import rate_model
from desk.scenarios.records import Repricing
from desk.scenarios.sampling import replicates_of, sampling_faults

__all__ = ["MOST_BYTES", "PlannedRun", "check_fits", "planned_run", "run_bytes", "set_repricing_faults"]

MOST_BYTES = 2_000_000_000
"""What a run may take of an office machine's memory."""

# Numbers a path: present values of both sides and the surplus, and what summing up a node takes beside the
# samples themselves, as measured.
_SUMMED = 8
# Bytes that a run takes whatever its paths: samples of a group of nodes, tables of surfaces.
_FIXED = 40_000_000
_SLACK = 1e-9
# Standard errors by which the mean of 1/R may be off the curve before it is said.
_MOST_OFF = 4.0


@dataclass(frozen=True, eq=False)
class PlannedRun:
    """A run that is to be drawn.

    Attributes
    ----------
    plan : Plan
    mended : MendedCorrelation or None
        See `desk.scenarios.market.Beside`.
    faults : tuple of Fault
        What cannot be drawn as stated, all mild.
    """

    plan: Plan
    mended: MendedCorrelation | None
    faults: tuple[Fault, ...]


def planned_run(book: Book, *sides: PricedFlows) -> PlannedRun:
    """What a run of a book draws.

    Parameters
    ----------
    book : Book
    sides : PricedFlows
        The flows that are to be valued: some models must know how far they reach.

    Raises
    ------
    ValueError
        If the book has no rates model, an item of it, of the basis or of the risky assets will not do, or
        the run would not fit into memory.
    """
    run = book.run
    last = max((float(flows.time.max()) for flows in sides if len(flows)), default=0.0)
    model = rate_model(book, last_flow=last)
    beside = beside_rates(book, model)
    faults = list(beside.faults)
    if isinstance(model, GivenRates):
        reported = _reported(model, run.horizon_years)
        plan = Plan(
            model=model,
            paths=min(run.paths, model.paths),
            steps_per_year=model.mean_steps_per_year,
            steps=model.nodes.size - 1,
            seed=run.seed,
            real_world=run.measure is Measure.REAL_WORLD,
            market=beside.market,
            nodes=model.nodes,
            reported=reported,
        )
        faults += _set_faults(model, book, float(model.nodes[reported[-1]]))
    else:
        plan = Plan(
            model=model,
            paths=run.drawn_paths,
            steps_per_year=run.steps_per_year,
            steps=run.horizon_years * run.steps_per_year,
            seed=run.seed,
            real_world=run.measure is Measure.REAL_WORLD,
            replicates=replicates_of(run, block_paths=BLOCK_PATHS),
            market=beside.market,
        )
        faults += sampling_faults(run, model)
    check_fits(plan, collars=_collars(plan, sides))
    return PlannedRun(plan, beside.mended, tuple(faults))


def _reported(model: GivenRates, horizon: int) -> tuple[int, ...]:
    """The steps of a set that are reported: whole years where it has them all, else every node."""
    end = min(float(horizon), float(model.nodes[-1]))
    years = np.arange(1.0, math.floor(end + _SLACK) + 1.0)
    near = np.minimum(np.searchsorted(model.nodes, years - _SLACK), model.nodes.size - 1)
    if years.size and np.all(np.abs(model.nodes[near] - years) <= _SLACK):
        return tuple(near.tolist())
    inside = np.flatnonzero(model.nodes <= horizon + _SLACK)[1:]
    return tuple(inside.tolist()) or (1,)


def _set_faults(model: GivenRates, book: Book, end: float) -> list[Fault]:
    """Where a set does not reach as far as the run asks, whose last reported node is at `end` years."""
    faults = []
    if model.paths < book.run.paths:
        held = "1 path" if model.paths == 1 else f"{model.paths:,} paths"
        faults.append(
            Fault(
                found=f"the set holds {held}, fewer than the {book.run.paths:,} of the run",
                expected="as many paths as the run takes",
                mend="Set Paths to those of the set, or leave it: all paths of the set are taken.",
                sheet="Scenario set",
                severity=Severity.MILD,
            )
        )
    if model.nodes[-1] < book.run.horizon_years - _SLACK:
        faults.append(
            Fault(
                found=f"the set ends after {model.nodes[-1]:g} years, before the horizon of "
                f"{book.run.horizon_years} years",
                expected="nodes up to the horizon",
                mend="Add nodes, or leave it: later flows are discounted from the last node on by the "
                "book's curve.",
                sheet="Scenario set",
                severity=Severity.MILD,
            )
        )
    elif abs(end - book.run.horizon_years) > _SLACK:
        faults.append(
            Fault(
                found=f"the set has no node at the horizon of {book.run.horizon_years} years; the last one "
                f"reported is at {end:g} years",
                expected="a node at the horizon",
                mend="Set the horizon to a node of the set, or leave it: values go on to the end of the set.",
                sheet="Scenario set",
                severity=Severity.MILD,
            )
        )
    return faults


def set_repricing_faults(plan: Plan, repricing: Repricing) -> tuple[Fault, ...]:
    """Says so where a set from outside does not reprice today's curve, as a model would."""
    if not isinstance(plan.model, GivenRates):
        return ()
    known = repricing.mean_discount_se > 0.0
    off = np.abs(repricing.mean_discount - repricing.curve_discount)
    score = np.where(known, off, 0.0) / np.where(known, repricing.mean_discount_se, 1.0)
    row = int(np.argmax(score))
    if not score[row] > _MOST_OFF:
        return ()
    return (
        Fault(
            found=f"the set does not reprice the curve: at {repricing.year[row]:g} years the mean of 1/R is "
            f"{repricing.mean_discount[row]:.6f}, on the curve {repricing.curve_discount[row]:.6f}, "
            f"{score[row]:.1f} standard errors apart",
            expected="a mean of 1/R on the curve, where the set is to give values",
            mend="Take a set made for this curve, or read its present values as forecasts, not as values.",
            sheet="Scenario set",
            severity=Severity.MILD,
        ),
    )


def _collars(plan: Plan, sides: Sequence[PricedFlows]) -> int:
    """Collared growths that are kept along the paths."""
    if plan.market is None or plan.market.index is None:
        return 0
    return sum(
        len(
            {
                (each.lag, each.floor, each.cap)
                for each in flows.indexations
                if each.kind is IndexationKind.COLLARED
            }
        )
        for flows in sides
    )


def run_bytes(plan: Plan, *, collars: int = 0) -> int:
    """About how much memory a run takes beside the book [bytes].

    All paths are kept where they are, with the samples of one node and the present values; horizon and steps
    a year do not count.

    Parameters
    ----------
    plan : Plan
    collars : int
        Kinds of collared growth that are followed along the paths.
    """
    return plan.paths * 8 * _numbers(plan, collars) + _FIXED


def _numbers(plan: Plan, collars: int) -> int:
    """Numbers a path."""
    beside = 0
    if plan.market is not None:
        inflates = plan.market.index is not None
        # Where each is, and its sample; the total of the assets; the growth of a collar in the last years.
        beside = 2 * plan.market.asset_count + 1 + 4 * inflates + 6 * collars
        # The normals and the noise of half a block's paths are kept beside it.
        drawn = plan.market.asset_count + 2 * inflates
        beside += drawn + (plan.model.factor_count + 1) // 2 + 1
    walked = plan.model.factor_count + 1 + 2 * isinstance(plan.model, BlackKarasinskiRates)
    sobol = 0
    if plan.replicates is not None:
        rows = plan.model.factor_count + 1
        if plan.market is not None:
            rows += plan.market.asset_count + 2 * (plan.market.index is not None)
        sobol = plan.replicates.kept_numbers(plan.steps, rows)
    return walked + 2 + _SUMMED + beside + sobol


def check_fits(plan: Plan, *, collars: int = 0, most: int = MOST_BYTES) -> None:
    """Raise ValueError, saying what would fit, where a run would take more memory than `most` bytes."""
    needed = run_bytes(plan, collars=collars)
    if needed <= most:
        return
    fits = max(0, most - _FIXED) // (8 * _numbers(plan, collars))
    digits = 10 ** max(0, len(str(fits)) - 2)
    assets = 0 if plan.market is None else plan.market.asset_count
    beside = f" with {assets} risky assets" if assets > 1 else " with a risky asset" if assets else ""
    raise ValueError(
        f"{plan.paths:,} paths{beside} would take about {needed / 1e9:.1f} GB of memory, more than the "
        f"{most / 1e9:.1f} GB that a run may take: set Paths to at most {fits // digits * digits:,}"
    )
