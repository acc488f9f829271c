"""Drawing paths with their percentiles, against numpy drawing the same number of normals.

Run as a script; it prints the ratio. 10,000 paths × 480 months of the rate and the savings account of a
one-factor Gaussian model, with seven percentiles of both at every month, take two normals a step. The same
paths are also drawn without percentiles: what the percentiles add is measured against that, in the time of
the processor.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from functools import partial

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.gaussian import vasicek
from desk.scenarios.draws import Block, Crew, Plan, block_generator, default_threads
from desk.scenarios.fans import percentile_fan

PATHS, STEPS, REPEATS = 10_000, 480, 15
LEVELS = (1.0, 5.0, 25.0, 50.0, 75.0, 95.0, 99.0)


def normals(threads: int) -> None:
    """The same number of normals from the same kind of generator, in chunks that stay in a core's cache."""

    def fill(part: int) -> None:
        rng = block_generator(1, part)
        chunk = np.empty(24_000)
        for _ in range(2 * PATHS * STEPS // threads // chunk.size):
            rng.standard_normal(out=chunk)

    with ThreadPoolExecutor(threads) as pool:
        list(pool.map(fill, range(threads)))


def paths(threads: int) -> None:
    """The paths and their percentiles."""
    model = vasicek(mean_reversion=0.1, long_run_rate=0.03, volatility=0.01, starting_rate=0.02)
    percentile_fan(model, paths=PATHS, steps_per_year=12, steps=STEPS, seed=1, levels=LEVELS, threads=threads)


def drawing(threads: int) -> None:
    """The paths alone, into the same buffers."""
    model = vasicek(mean_reversion=0.1, long_run_rate=0.03, volatility=0.01, starting_rate=0.02)
    plan = Plan(model, PATHS, 12, STEPS, 1, False)
    with Crew(threads, float(plan.blocks * STEPS)) as crew:
        blocks = [Block(plan, index) for index in range(plan.blocks)]
        groups = list(plan.rounds(range(1, STEPS + 1)))
        buffer = np.empty((2, len(groups[0]), PATHS))
        for group in groups:
            crew.grouped(blocks, partial(_advance, group, buffer, crew))


def _advance(group: Sequence[int], buffer: FloatArray, crew: Crew, block: Block) -> None:
    block.advance(group, buffer[0, : len(group)], buffer[1, : len(group)], crew=crew)


def processor_seconds(action: Callable[[int], None]) -> float:
    """The processor's time for one call on one thread, which a busy machine lengthens less."""
    start = time.process_time()
    action(1)
    return time.process_time() - start


def seconds(action: Callable[[int], None], threads: int) -> float:
    """How long one call takes."""
    start = time.perf_counter()
    action(threads)
    return time.perf_counter() - start


def main() -> int:
    """Print the times and their ratio, taken in turn so that a busy machine slows both alike."""
    for threads in dict.fromkeys((1, default_threads())):
        pairs = [(seconds(normals, threads), seconds(paths, threads)) for _ in range(REPEATS)]
        best = [min(column) for column in zip(*pairs, strict=True)]
        middle = [statistics.median(column) for column in zip(*pairs, strict=True)]
        print(
            f"{threads} thread(s): normals {best[0] * 1e3:.1f} ms, paths with percentiles "
            f"{best[1] * 1e3:.1f} ms; ratio {best[1] / best[0]:.2f} (best), "
            f"{middle[1] / middle[0]:.2f} (median); wanted at most 2"
        )
    alone, whole = (
        statistics.median(processor_seconds(action) for _ in range(REPEATS)) for action in (drawing, paths)
    )
    # Half of what is added is for each of the two quantities.
    print(
        f"drawing {alone * 1e3:.1f} ms, percentiles of rate and account {(whole - alone) * 1e3:.1f} ms; "
        f"of one quantity {0.5 * (whole / alone - 1.0):.2f} of the drawing, wanted under 0.33; of both "
        f"{whole / alone - 1.0:.2f}"
    )
    return 0


if __name__ == "__main__":
    sys.exit(main())
