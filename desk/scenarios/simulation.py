"""A run: the book's rates model drawn, and both sides valued along the paths."""

from __future__ import annotations

import math
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from desk import __version__
from desk.book import Book, Fault, PricedFlows, Provenance, RiskyAssets, Run, Sampling, Severity
from desk.book.arrays import FloatArray, owned_floats
from desk.scenarios.convergence import converging, headline_figures, sampling_gain
from desk.scenarios.diagnostics import RatePairs, diagnostics
from desk.scenarios.draws import BLOCK_PATHS, GENERATOR, Block, Crew, Paths, Plan, default_threads
from desk.scenarios.market_samples import MarketSamples
from desk.scenarios.node_summaries import lognormal_form, node_summary
from desk.scenarios.pathwise import PathValues, curve_value
from desk.scenarios.plans import planned_run, set_repricing_faults
from desk.scenarios.records import (
    ClosedForm,
    Distribution,
    Repricing,
    Simulation,
)
from desk.scenarios.replicates import Sample, Summing
from desk.scenarios.sampling_records import Convergence, SamplingGain
from desk.scenarios.summaries import QUANTILE_RULE, Moments

__all__ = ["simulate"]

# Paths kept for pictures.
_SHOWN = 50
# Part of the work that goes into summing up, for the progress only.
_SUMMING = 0.1
# Seconds between two looks at whether to go on while surfaces are fitted.
_PAUSE = 0.1


def simulate(
    book: Book,
    assets: PricedFlows,
    liabilities: PricedFlows,
    *,
    progress: Callable[[float], None] | None = None,
    threads: int | None = None,
) -> Simulation:
    """Draw the book's rates model as its run says, and value both sides along the paths.

    The same book, flows and seed give the same bits whatever the number of threads.

    Parameters
    ----------
    book : Book
        Its rates model, basis and run are used.
    assets, liabilities : PricedFlows
        The flows of both sides with their spreads. Under either measure bonds seen from a node are priced
        under the pricing measure.
    progress : callable, optional
        Called with the part done, from 0 to 1, from the calling thread. An exception it raises stops the run
        and comes out of this function, after all its threads have ended.
    threads : int, optional
        Number of threads; two, or as many as there are processors if fewer, when left out.

    Raises
    ------
    ValueError
        If the book has no rates model, or an item of it or of the basis will not do.
    """
    run = book.run
    planned = planned_run(book, assets, liabilities)
    plan = planned.plan
    # Values too large for a float are reported as a fault, not as a warning.
    with np.errstate(over="ignore", invalid="ignore", under="ignore", divide="ignore"):
        values = PathValues(plan, (assets, liabilities), book.basis.inflation, poll=_polled(progress))
        collected = _collect(
            plan, book.risky_assets, values, run.percentiles, progress, threads or default_threads()
        )
        year = plan.time[[0, *plan.reported_steps]]
        present_value = _present_values(plan, (assets, liabilities), collected.sides, run.percentiles)
        repricing = _repricing(plan, year, collected.discounts)
        result = Simulation(
            model=str(book.rates_model.name) if book.rates_model is not None else "",
            measure=run.measure,
            paths=plan.paths,
            steps_per_year=plan.steps_per_year,
            horizon_years=math.ceil(year[-1]),
            seed=run.seed,
            savings_account=node_summary(year, collected.accounts, run.percentiles),
            short_rate=node_summary(year, collected.rates, run.percentiles),
            closed_form=_closed_form(plan, year, run.percentiles),
            repricing=repricing,
            present_value=present_value,
            sample_paths=owned_floats(np.exp(collected.shown)),
            faults=(
                *planned.faults,
                *set_repricing_faults(plan, repricing),
                *_faults(run.horizon_years, (assets, liabilities), collected),
            ),
            provenance=Provenance(
                book_digest=book.digest,
                program_version=__version__,
                settings=_settings(book, values.surface_error),
                seed=run.seed,
            ),
            convergence=tuple(collected.convergence),
            gains=tuple(collected.gains),
            replicates=1 if plan.replicates is None else plan.replicates.count,
            risky=collected.beside.risky(year, planned.mended),
            index=collected.beside.index(year, values.revalued, matches_today=values.held_rows == 0),
            diagnostics=diagnostics(plan, collected.pairs, year),
        )
    if progress is not None:
        progress(1.0)
    return result


def _polled(progress: Callable[[float], None] | None) -> Callable[[], None]:
    """Lets `progress` stop the work before anything is drawn, without calling it all the time."""
    last = time.monotonic()

    def poll() -> None:
        nonlocal last
        if progress is not None and time.monotonic() - last >= _PAUSE:
            last = time.monotonic()
            progress(0.0)

    return poll


@dataclass(frozen=True)
class _Collected:
    """Everything the paths are drawn for, by year from 0; `sides` holds assets, liabilities, surplus."""

    accounts: list[Sample]
    rates: list[Sample]
    discounts: list[Moments]
    sides: list[Sample]
    shown: FloatArray
    convergence: list[Convergence]
    gains: list[SamplingGain]
    beside: MarketSamples
    pairs: RatePairs


def _collect(
    plan: Plan,
    assets: RiskyAssets | None,
    values: PathValues,
    levels: Sequence[float],
    progress: Callable[[float], None] | None,
    threads: int,
) -> _Collected:
    """Draw all paths, a few years at a time, and sum up each year before the next are drawn.

    Only the samples of the years in hand are kept, and the present values: memory does not grow with the
    horizon.
    """
    nodes = plan.reported_steps
    years = len(nodes)
    groups = list(plan.rounds(nodes, quantities=MarketSamples.quantities(plan)))
    today = float(plan.model.curve.forward(0.0, 0.0))
    replicates = 1 if plan.replicates is None else plan.replicates.count
    summing_up = Summing(levels, plan.paths, replicates)
    beside, pairs = MarketSamples(plan, assets, summing_up, len(groups[0])), RatePairs(plan)
    visit = partial(_visit, (values, pairs))
    accounts, rates = [summing_up.certain(1.0)], [summing_up.certain(today)]
    discounts = [Moments(1.0, 0.0, 0.0, 0.0)]
    shown = np.zeros((min(_SHOWN, plan.paths), years + 1))
    account_at_end = np.empty(plan.paths)
    drawing = float(plan.blocks * plan.steps)
    summing = _SUMMING * drawing / (years + 1)
    with Crew(threads, drawing * (1.0 + _SUMMING), progress) as crew:
        blocks = [Block(plan, index) for index in range(plan.blocks)]
        buffer = np.empty((2, len(groups[0]), plan.paths))
        for group in groups:
            log_account, rate = buffer[0, : len(group)], buffer[1, : len(group)]
            crew.grouped(blocks, partial(_advance, group, log_account, rate, beside, visit, crew))
            beside.gather(log_account, crew)
            shown[:, len(accounts) : len(accounts) + len(group)] = log_account[:, : len(shown)].T
            if group is groups[-1]:
                np.exp(log_account[-1], out=account_at_end)
            found = crew.run([partial(summing_up.account, row) for row in log_account])
            accounts += [sample for sample, _ in found]
            discounts += [discount for _, discount in found]
            rates += crew.run([partial(summing_up.sample, row) for row in rate])
            crew.add(summing * len(group))
        if nodes[-1] < plan.steps:
            # A set may go on beyond what is reported: its rates discount flows until its end.
            crew.grouped(blocks, partial(_finish, plan.steps, visit, crew))
        surplus = values.value[0] - values.value[1]
        figures = headline_figures(account_at_end, (*values.value, surplus))
        matched = plan.replicates is not None and plan.replicates.matching
        part = partial(converging, replicates=replicates, is_matched=matched)
        convergence = crew.run([partial(part, figure) for figure in figures])
        gain = partial(sampling_gain, replicates=replicates)
        found_gains = crew.run([partial(gain, figure) for figure in figures]) if replicates > 1 else []
        # A figure that is the same on every path has no variance to lessen.
        gains = [found for found in found_gains if found.plain_se > 0.0]
        sides = crew.run([partial(summing_up.sample, row) for row in (*values.value, surplus)])
    return _Collected(accounts, rates, discounts, sides, shown, convergence, gains, beside, pairs)


def _visit(observers: Sequence[PathValues | RatePairs], step: int, paths: Paths) -> None:
    for observer in observers:
        observer.visit(step, paths)


def _advance(
    group: Sequence[int],
    log_account: FloatArray,
    rate: FloatArray,
    beside: MarketSamples,
    visit: Callable[[int, Paths], None],
    crew: Crew,
    block: Block,
) -> None:
    block.advance(
        group,
        log_account,
        rate,
        visit=visit,
        crew=crew,
        excess=beside.excess,
        log_index=beside.log_index,
    )


def _finish(step: int, visit: Callable[[int, Paths], None], crew: Crew, block: Block) -> None:
    nothing = np.empty((0, 0))
    block.advance((), nothing, nothing, visit=visit, crew=crew, until=step)


def _closed_form(plan: Plan, year: FloatArray, levels: tuple[float, ...]) -> ClosedForm | None:
    law = plan.model.account_law(year, real_world=plan.real_world)
    return None if law is None else lognormal_form(*law, levels)


def _repricing(plan: Plan, year: FloatArray, discounts: list[Moments]) -> Repricing:
    return Repricing(
        year=owned_floats(year),
        mean_discount=owned_floats([found.mean for found in discounts]),
        mean_discount_se=owned_floats([found.mean_se for found in discounts]),
        curve_discount=owned_floats(plan.model.curve.discount(year)),
        expected_discount=owned_floats(plan.model.mean_discount(year, real_world=plan.real_world)),
    )


def _present_values(
    plan: Plan, sides: tuple[PricedFlows, PricedFlows], samples: list[Sample], levels: tuple[float, ...]
) -> tuple[Distribution, ...]:
    assets, liabilities = (curve_value(plan, flows) for flows in sides)
    names = ("assets", "liabilities", "surplus")
    return tuple(
        Distribution(
            name=name,
            mean=sample.moments.mean,
            se=sample.moments.mean_se,
            sd=sample.moments.sd,
            levels=levels,
            percentile=owned_floats(sample.percentile),
            percentile_low=owned_floats([low for low, _ in sample.interval]),
            percentile_high=owned_floats([high for _, high in sample.interval]),
            curve=curve,
            below_zero=sample.below_zero,
            below_zero_se=sample.below_zero_se,
            histogram=sample.histogram,
            percentile_se=owned_floats(sample.percentile_se),
            tail_mean=owned_floats(sample.tail_mean),
            tail_mean_se=owned_floats(sample.tail_mean_se),
        )
        for name, sample, curve in zip(
            names, samples, (assets, liabilities, assets - liabilities), strict=True
        )
    )


def _faults(horizon: int, sides: tuple[PricedFlows, PricedFlows], collected: _Collected) -> tuple[Fault, ...]:
    faults = []
    last = max((float(flows.time.max()) for flows in sides if len(flows)), default=math.inf)
    if horizon > last + 1.0:
        faults.append(
            Fault(
                found=f"the horizon of {horizon} years goes beyond the flows, the last of which is due "
                f"in {last:.1f} years",
                expected="a horizon at most a year beyond the last flow",
                mend=f"Set Horizon to {math.ceil(last)} years, or leave it: the values are right.",
                sheet="Run",
                severity=Severity.MILD,
            )
        )
    samples = (*collected.accounts, *collected.rates, *collected.sides)
    if not all(math.isfinite(sample.moments.mean) for sample in samples) or not collected.beside.is_finite:
        faults.append(
            Fault(
                found="some values along the paths are too large for the computer's numbers",
                expected="rates that stay within reason over the horizon",
                mend="Lower Volatility or Horizon, or raise Mean reversion.",
                sheet="Rates model",
                severity=Severity.MILD,
            )
        )
    return tuple(faults)


def _settings(book: Book, surface_error: float) -> tuple[tuple[str, str], ...]:
    """What the bits of the run depend on beside the book and the seed."""
    run = book.run
    return (
        ("paths", str(run.paths)),
        ("horizon_years", str(run.horizon_years)),
        ("steps_per_year", str(run.steps_per_year)),
        ("measure", str(run.measure)),
        ("percentiles", " ".join(f"{level:g}" for level in run.percentiles)),
        *_sampling_settings(run),
        ("generator", GENERATOR),
        ("block_paths", str(BLOCK_PATHS)),
        ("quantile_rule", f"Hyndman-Fan {QUANTILE_RULE}"),
        ("surface_error", f"{surface_error:.1e}"),
    )


def _sampling_settings(run: Run) -> tuple[tuple[str, str], ...]:
    """How a variance-reduced run is drawn."""
    if not run.is_reduced:
        return ()
    stated = [("sampling", str(run.sampling)), ("replicates", str(run.replicates))]
    if run.sampling is Sampling.SOBOL:
        stated.append(("bridge", str(run.bridge)))
    if run.matching:
        stated.append(("moment_matching", "by row of normals, within a replicate and block"))
    return tuple(stated)
