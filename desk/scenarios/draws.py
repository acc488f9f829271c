"""Paths drawn in blocks, the same bits for any number of threads.

Block i holds a fixed number of paths and draws from its own generator, seeded by (seed, i); its last paths
are thrown away where a run wants fewer. So a path depends on the seed, its own number and the steps before
it, and on nothing else: not on how many paths, threads or reported times a run has. Paths of a
variance-reduced run depend on its settings too, and still not on the number of threads; see
`desk.scenarios.sampling`.
"""

from __future__ import annotations

import math
import os
import threading
import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor, wait
from dataclasses import dataclass
from functools import cached_property, partial
from typing import TypeVar, cast

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.risky import RiskyMarket
from desk.rates.risky_walk import GaussianMarketWalk, IndependentMarketWalk
from desk.rates.short_rate import Walk
from desk.scenarios.drawn_model import DrawnModel
from desk.scenarios.given import GivenMarketWalk, GivenRates
from desk.scenarios.normals import NormalSource
from desk.scenarios.sampling import Replicates

__all__ = ["BLOCK_PATHS", "GENERATOR", "Block", "Crew", "Paths", "Plan", "block_generator", "default_threads"]

Result = TypeVar("Result")

BLOCK_PATHS = 5000
"""Paths of a block. Part of what fixes the bits of a run, like the seed."""

GENERATOR = "SFC64"
"""The bit generator, the fastest of numpy's at normal numbers."""

# Seconds between two looks at how far the work is, and the least between two reports of it.
_LOOK = 0.03
_PAUSE = 0.02
# Blocks are handed to threads in groups: more groups than this would cost more in handing over.
_MOST_TASKS = 64
# Bytes of samples that are kept at a time; about what the last level of cache holds.
_SAMPLE_BYTES = 16_000_000


def block_generator(seed: int, block: int) -> np.random.Generator:
    """The generator of one block."""
    return np.random.Generator(np.random.SFC64(np.random.SeedSequence(seed, spawn_key=(block,))))


def default_threads() -> int:
    """Threads used where none are asked for: two, or one on a machine with one processor."""
    return min(2, os.cpu_count() or 1)


@dataclass(frozen=True, eq=False)
class Plan:
    """What is drawn.

    Attributes
    ----------
    model : DrawnModel
    paths, steps_per_year, steps, seed : int
        `steps` is the length of every path.
    real_world : bool
        Whether factors earn their price of risk.
    replicates : Replicates or None
        None where paths are drawn independently of each other. Otherwise they hold `paths` paths in all.
    market : RiskyMarket or None
        The model with what is drawn beside it; its paths of rates are those of the model alone.
    nodes : ndarray, shape (steps + 1,), optional
        Where they are not evenly spaced [years].
    reported : tuple of int, optional
        The steps a run reports; the whole years when left out.
    """

    model: DrawnModel
    paths: int
    steps_per_year: int
    steps: int
    seed: int
    real_world: bool
    replicates: Replicates | None = None
    market: RiskyMarket | None = None
    nodes: FloatArray | None = None
    reported: tuple[int, ...] | None = None

    @cached_property
    def time(self) -> FloatArray:
        """The nodes [years], shape (steps + 1,)."""
        return np.arange(self.steps + 1) / self.steps_per_year if self.nodes is None else self.nodes

    @property
    def reported_steps(self) -> Sequence[int]:
        """The steps a run reports, without step 0."""
        if self.reported is not None:
            return self.reported
        return range(self.steps_per_year, self.steps + 1, self.steps_per_year)

    @cached_property
    def index_offset(self) -> FloatArray:
        """What is added to the integral of the inflation factor to give ``ln I/I(0)``, shape (steps + 1,)."""
        law = None if self.market is None else self.market.index
        return np.zeros(self.steps + 1) if law is None else law.offset(self.time)

    @cached_property
    def account_offset(self) -> FloatArray:
        """What is added to the integral of the factors to give ``ln R_t``, shape (steps + 1,)."""
        return self.model.account_offset(self.time)

    @cached_property
    def rate_offset(self) -> FloatArray:
        """What is added to the factors to give the short rate [1/year], shape (steps + 1,)."""
        return self.model.rate_offset(self.time)

    @property
    def blocks(self) -> int:
        """Number of blocks."""
        return -(-self.paths // BLOCK_PATHS) if self.replicates is None else self.replicates.blocks

    def columns(self, index: int) -> slice:
        """The paths of a block."""
        if self.replicates is not None:
            return self.replicates.columns(index)
        return slice(index * BLOCK_PATHS, min((index + 1) * BLOCK_PATHS, self.paths))

    def generator(self, index: int) -> np.random.Generator | NormalSource:
        """What a block draws from; either offers what walks ask of a generator, by which they are typed."""
        if self.replicates is None:
            return block_generator(self.seed, index)
        return self.replicates.source(index, self.model, steps_per_year=self.steps_per_year, steps=self.steps)

    def walk(self, index: int) -> Walk | GaussianMarketWalk | IndependentMarketWalk:
        """The paths of a block, at time 0."""
        if isinstance(self.model, GivenRates):
            columns = self.columns(index)
            if self.market is None:
                return self.model.walk_of(columns)
            generators = block_generator(self.seed, index).spawn(1 + self.market.asset_count)[1:]
            return GivenMarketWalk(
                self.model.walk_of(columns),
                self.market,
                np.diff(self.time),
                real_world=self.real_world,
                generators=generators,
            )
        step = 1.0 / self.steps_per_year
        # Whole blocks are drawn, whatever part of the last is wanted: fewer numbers would be other numbers.
        columns = self.columns(index)
        size = BLOCK_PATHS if self.replicates is None else columns.stop - columns.start
        if self.market is None:
            generator = cast(np.random.Generator, self.generator(index))
            return self.model.walk(step, size, generator, real_world=self.real_world)
        source, others = self.generator(index), None
        if isinstance(source, NormalSource):
            sources = source.beside(self.market.asset_count, inflates=self.market.index is not None)
            others = cast(list[np.random.Generator], sources)
        return self.market.walk(
            step, size, cast(np.random.Generator, source), real_world=self.real_world, others=others
        )

    def rounds(self, nodes: Sequence[int], *, quantities: int = 2) -> Iterator[Sequence[int]]:
        """The nodes in groups whose samples, of so many quantities, fit into a modest memory."""
        rows = max(1, _SAMPLE_BYTES // (8 * quantities * self.paths))
        for start in range(0, len(nodes), rows):
            yield nodes[start : start + rows]


@dataclass(frozen=True, eq=False)
class Paths:
    """Where the paths of a block are; every array is overwritten by the next step.

    Attributes
    ----------
    columns : slice
        Their place among the paths of the run.
    state : ndarray, shape (n, m)
        The rate factors.
    integral : ndarray, shape (m,)
        Of their sum.
    factors : ndarray, shape (n, m) or (n + 1, m)
        The rate factors, and after them that of inflation where it is drawn.
    excess : ndarray, shape (k, m)
        ``ln(S_t/(S_0 R_t))`` of every risky asset.
    index_integral : ndarray, shape (m,) or (0,)
        Of the inflation factor; empty where it is not drawn.
    """

    columns: slice
    state: FloatArray
    integral: FloatArray
    factors: FloatArray
    excess: FloatArray
    index_integral: FloatArray


class Block:
    """One block of paths on its way.

    Parameters
    ----------
    plan : Plan
    index : int
        Its number, from 0.

    Attributes
    ----------
    columns : slice
        Its place among the paths of the run.
    """

    def __init__(self, plan: Plan, index: int) -> None:
        self._plan = plan
        self.columns = plan.columns(index)
        self._walk = walk = plan.walk(index)
        width: int = self.columns.stop - self.columns.start
        state = walk.state[:, :width]
        factors: FloatArray = state
        excess: FloatArray = np.empty((0, width))
        integral: FloatArray = np.empty(0)
        if isinstance(walk, (GaussianMarketWalk, IndependentMarketWalk, GivenMarketWalk)):
            factors, excess = walk.factors[:, :width], walk.excess[:, :width]
            if plan.market is not None and plan.market.index is not None:
                integral = walk.inflation_integral[:width]
        self._paths = Paths(self.columns, state, walk.integral[:width], factors, excess, integral)
        self._step = 0

    def advance(
        self,
        nodes: Sequence[int],
        log_account: FloatArray,
        rate: FloatArray,
        *,
        visit: Callable[[int, Paths], None] | None = None,
        crew: Crew,
        excess: FloatArray | None = None,
        log_index: FloatArray | None = None,
        until: int | None = None,
    ) -> None:
        """Go on to the last of `nodes`, and write down what is found at each.

        Parameters
        ----------
        nodes : sequence of int, length k
            Step numbers, rising.
        log_account, rate : ndarray, shape (k, paths)
            Receive ``ln R_t`` and ``r(t)`` in this block's columns.
        visit : callable, optional
            Called at every step with its number and the paths.
        crew : Crew
            Told of the steps made, and asked whether to stop.
        excess : ndarray, shape (k, assets, paths), optional
            Receives ``ln(S_t/(S_0 R_t))``.
        log_index : ndarray, shape (k, paths), optional
            Receives ``ln I(t)/I(0)``.
        until : int, optional
            The step to go on to, where it is not the last of `nodes`.
        """
        plan, paths = self._plan, self._paths
        rows = {step: row for row, step in enumerate(nodes)}
        reported = self._step
        last = nodes[-1] if until is None else until
        for _ in self._walk.run(last - self._step):
            self._step += 1
            row = rows.get(self._step)
            if row is not None:
                np.add(paths.integral, plan.account_offset[self._step], out=log_account[row, self.columns])
                short = rate[row, self.columns]
                np.add(paths.state[0], plan.rate_offset[self._step], out=short)
                for factor in paths.state[1:]:
                    short += factor
                if excess is not None:
                    excess[row, :, self.columns] = paths.excess
                if log_index is not None:
                    np.add(
                        paths.index_integral, plan.index_offset[self._step], out=log_index[row, self.columns]
                    )
            if visit is not None:
                visit(self._step, paths)
            if self._step - reported >= plan.steps_per_year:
                crew.add(self._step - reported)
                reported = self._step
        crew.add(self._step - reported)


class _Stopped(Exception):
    """Raised inside a thread that has been asked to stop."""


class Crew:
    """A few threads that work through lists of tasks, report how far they are, and can be stopped.

    Used as a context: when it is left, its threads have ended.

    Parameters
    ----------
    threads : int
    total : float
        The amount of work that `add` will have been told of in the end.
    progress : callable, optional
        Called with the part done from the thread that calls `run`, a few dozen times a second at most. An
        exception it raises stops the work and comes out of `run`.
    """

    def __init__(self, threads: int, total: float, progress: Callable[[float], None] | None = None) -> None:
        if threads < 1:
            raise ValueError("`threads` must be at least 1")
        self._pool = ThreadPoolExecutor(threads, thread_name_prefix="paths")
        self._total = total
        self._progress = progress
        self._done = 0.0
        self._lock = threading.Lock()
        self._stop = threading.Event()
        self._told = -math.inf

    def __enter__(self) -> Crew:
        """Begin."""
        self._tell(0.0)
        return self

    def __exit__(self, *_: object) -> None:
        """End: nothing more is begun, and the threads are waited for."""
        self._stop.set()
        self._pool.shutdown(wait=True, cancel_futures=True)

    def add(self, amount: float) -> None:
        """Take note of work done, from a task; raises to end the task where the crew is to stop."""
        with self._lock:
            self._done += amount
        if self._stop.is_set():
            raise _Stopped

    def run(self, tasks: Sequence[Callable[[], Result]]) -> list[Result]:
        """Do all tasks; their results in order. The first exception of a task or of `progress` comes out."""
        futures: list[Future[Result]] = [self._pool.submit(_quietly, task) for task in tasks]
        try:
            waiting: set[Future[Result]] = set(futures)
            while waiting:
                done, waiting = wait(waiting, timeout=_LOOK)
                for future in done:
                    future.result()
                self._tell(min(self._done / self._total, 1.0) if self._total > 0.0 else 1.0)
        except BaseException:
            self._stop.set()
            for future in futures:
                future.cancel()
            wait(futures)
            raise
        return [future.result() for future in futures]

    def grouped(self, items: Sequence[Result], action: Callable[[Result], None]) -> None:
        """Do `action` with every item, several items to a task."""
        size = -(-len(items) // _MOST_TASKS)
        groups = [items[start : start + size] for start in range(0, len(items), size)]
        self.run([partial(_each, action, group) for group in groups])

    def _tell(self, fraction: float) -> None:
        now = time.monotonic()
        if self._progress is not None and now - self._told >= _PAUSE:
            self._told = now
            self._progress(fraction)


def _each(action: Callable[[Result], None], items: Sequence[Result]) -> None:
    for item in items:
        action(item)


def _quietly(task: Callable[[], Result]) -> Result:
    """Run a task with numpy's warnings off: values too large for a float are reported as faults instead."""
    with np.errstate(over="ignore", invalid="ignore", under="ignore", divide="ignore"):
        return task()
