"""Paths drawn in blocks, the same bits for any number of threads.

Block i holds a fixed number of paths and draws from its own generator, seeded by (seed, i); its last paths
are thrown away where a run wants fewer. So a path depends on the seed, its own number and the steps before
it, and on nothing else: not on how many paths, threads or reported times a run has.
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
from typing import TypeVar

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.short_rate import ShortRateModel, Walk

__all__ = ["BLOCK_PATHS", "GENERATOR", "Block", "Crew", "Plan", "block_generator", "default_threads"]

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
    model : ShortRateModel
    paths, steps_per_year, steps, seed : int
        `steps` is the length of every path.
    real_world : bool
        Whether factors earn their price of risk.
    """

    model: ShortRateModel
    paths: int
    steps_per_year: int
    steps: int
    seed: int
    real_world: bool

    @cached_property
    def time(self) -> FloatArray:
        """The nodes [years], shape (steps + 1,)."""
        return np.arange(self.steps + 1) / self.steps_per_year

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
        return -(-self.paths // BLOCK_PATHS)

    def rounds(self, nodes: Sequence[int]) -> Iterator[Sequence[int]]:
        """The nodes in groups whose samples fit into a modest memory."""
        rows = max(1, _SAMPLE_BYTES // (16 * self.paths))
        for start in range(0, len(nodes), rows):
            yield nodes[start : start + rows]


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
        self.columns = slice(index * BLOCK_PATHS, min((index + 1) * BLOCK_PATHS, plan.paths))
        self._width = self.columns.stop - self.columns.start
        self._walk: Walk = plan.model.walk(
            1.0 / plan.steps_per_year,
            BLOCK_PATHS,
            block_generator(plan.seed, index),
            real_world=plan.real_world,
        )
        self._step = 0

    def advance(
        self,
        nodes: Sequence[int],
        log_account: FloatArray,
        rate: FloatArray,
        *,
        visit: Callable[[int, FloatArray, FloatArray, slice], None] | None = None,
        crew: Crew,
    ) -> None:
        """Go on to the last of `nodes`, and write down what is found at each.

        Parameters
        ----------
        nodes : sequence of int, length k
            Step numbers, rising.
        log_account, rate : ndarray, shape (k, paths)
            Receive ``ln R_t`` and ``r(t)`` in this block's columns.
        visit : callable, optional
            Called at every step with its number, the factors, the integral of their sum, and the columns.
        crew : Crew
            Told of the steps made, and asked whether to stop.
        """
        plan, width = self._plan, self._width
        rows = {step: row for row, step in enumerate(nodes)}
        state, integral = self._walk.state[:, :width], self._walk.integral[:width]
        reported = self._step
        for _ in self._walk.run(nodes[-1] - self._step):
            self._step += 1
            row = rows.get(self._step)
            if row is not None:
                np.add(integral, plan.account_offset[self._step], out=log_account[row, self.columns])
                short = rate[row, self.columns]
                np.add(state[0], plan.rate_offset[self._step], out=short)
                for factor in state[1:]:
                    short += factor
            if visit is not None:
                visit(self._step, state, integral, self.columns)
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
