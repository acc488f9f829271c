"""Revaluing flows by a fitted surface, against summing them directly.

Run as a script; it prints the ratio and the largest relative difference. 720 monthly flows are revalued at 40
yearly nodes on 10,000 paths of a one-factor Gaussian model, by one thread each way; the fits are included.
"""

from __future__ import annotations

import os

# Before numpy is loaded: matrix products are to run on one thread, as all else here does.
os.environ["OPENBLAS_NUM_THREADS"] = "1"

import statistics
import sys
import time

import numpy as np

from desk.book.arrays import FloatArray
from desk.rates.gaussian import GaussianRates, hull_white, vasicek
from desk.scenarios.draws import block_generator
from desk.scenarios.surfaces import flow_surfaces

PATHS, NODES, REPEATS = 10_000, 40, 15

Flows = tuple[FloatArray, FloatArray]


def direct(model: GaussianRates, flows: Flows, states: list[FloatArray], out: FloatArray) -> None:
    """Every flow on every path: at each node one large exponential, and a sum."""
    times, amounts = flows
    for year, (state, row) in enumerate(zip(states, out, strict=True), start=1):
        later = times >= year
        level, exposure = model.bond_terms(float(year), times[later])
        np.matmul(amounts[later] * np.exp(level), np.exp(-exposure * state), out=row)


def direct_in_cache(model: GaussianRates, flows: Flows, states: list[FloatArray], out: FloatArray) -> None:
    """The same a hundred paths at a time and in place, so that the table stays in a core's cache."""
    times, amounts = flows
    for year, (state, row) in enumerate(zip(states, out, strict=True), start=1):
        later = times >= year
        level, exposure = model.bond_terms(float(year), times[later])
        weights, minus = amounts[later] * np.exp(level), -exposure[:, 0]
        table = np.empty((100, weights.size))
        for start in range(0, row.size, len(table)):
            np.multiply(state[0, start : start + len(table), None], minus, out=table)
            np.exp(table, out=table)
            np.matmul(table, weights, out=row[start : start + len(table)])


def fitted(model: GaussianRates, flows: Flows, states: list[FloatArray], out: FloatArray) -> None:
    """The same by a surface a node over the range of its states."""
    times, amounts = flows
    low, high = [state.min(axis=1) for state in states], [state.max(axis=1) for state in states]
    surfaces = flow_surfaces(model, np.arange(1.0, len(states) + 1.0), times, amounts, low, high)
    for surface, state, row in zip(surfaces, states, out, strict=True):
        surface(state, row)


def main() -> int:
    """Print the times, their ratios and the accuracy."""
    curve = vasicek(mean_reversion=0.1, long_run_rate=0.03, volatility=0.01, starting_rate=0.02).curve
    model = hull_white(curve, mean_reversion=0.1, volatility=0.01)
    times = np.arange(1, 721) / 12.0
    flows = (times, np.linspace(100.0, 300.0, times.size))
    walk = model.walk(1.0, PATHS, block_generator(1, 0))
    states = [walk.state.copy() for _ in walk.run(NODES)]
    ways = (direct, direct_in_cache, fitted)
    seconds: list[list[float]] = []
    values = np.ones((len(ways), NODES, PATHS))
    for _ in range(REPEATS):
        row = []
        for way, out in zip(ways, values, strict=True):
            start = time.perf_counter()
            way(model, flows, states, out)
            row.append(time.perf_counter() - start)
        seconds.append(row)
    worst = float(np.max(np.abs(values[2] / values[0] - 1.0)))
    columns = list(zip(*seconds, strict=True))
    best, median = [min(column) for column in columns], [statistics.median(column) for column in columns]
    print(
        f"direct {best[0] * 1e3:.0f} ms, direct in cache {best[1] * 1e3:.0f} ms, fitted "
        f"{best[2] * 1e3:.2f} ms; ratio {best[0] / best[2]:.0f} (best), "
        f"{median[0] / median[2]:.0f} (median), "
        f"to direct in cache {best[1] / best[2]:.0f}; wanted at least 80. "
        f"Largest relative difference {worst:.1e}, wanted at most 1e-10"
    )
    return 0


if __name__ == "__main__":
    sys.exit(main())
