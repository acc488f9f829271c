"""Risky assets beside rates, against numpy drawing the further normals; the lognormal model against its own.

Run as a script; it prints the ratios. Adding five correlated assets may cost at most twice the normals they
take.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable

import numpy as np

from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.correlation import joined_correlation
from desk.rates.curve import Curve
from desk.rates.gaussian import hull_white
from desk.rates.risky import RiskyMarket
from desk.rates.risky_inflation import InflationFactor
from desk.rates.risky_walk import DrawnRates
from desk.scenarios.draws import BLOCK_PATHS, block_generator

STEPS, REPEATS, ASSETS = 480, 15, 5
FLAT = Curve([10.0], [0.03])


def normals(rows: int) -> None:
    """Rows of normals at every step, each from its own generator as the assets take them."""
    generators = [block_generator(1, row) for row in range(rows)]
    drawn = np.empty((rows, BLOCK_PATHS))
    for _ in range(STEPS):
        for row, generator in zip(drawn, generators, strict=True):
            generator.standard_normal(out=row)


def paths(model: DrawnRates | RiskyMarket) -> None:
    """One block of paths, monthly over 40 years."""
    for _ in model.walk(1.0 / 12.0, BLOCK_PATHS, block_generator(1, 0)).run(STEPS):
        pass


def seconds(action: Callable[[], None]) -> float:
    """How long one call takes."""
    start = time.perf_counter()
    action()
    return time.perf_counter() - start


def main() -> int:
    """Print the times and their ratios, taken in turn so that a busy machine slows all alike."""
    rates = hull_white(FLAT, mean_reversion=0.1, volatility=0.01)
    assets = np.full((ASSETS, ASSETS), 0.4) + 0.6 * np.eye(ASSETS)
    links = [0.1, 0.2, 0.3, -0.1, -0.2]
    beside = RiskyMarket(
        rates, volatility=np.full(ASSETS, 0.2), correlation=joined_correlation([[1.0]], assets, links)
    )
    linked = RiskyMarket(
        rates,
        volatility=np.full(ASSETS, 0.2),
        inflation=InflationFactor(FLAT, 0.3, 0.01),
        correlation=joined_correlation(joined_correlation([[1.0]], [[1.0]], [0.5]), assets, links),
    )
    lognormal = BlackKarasinskiRates(FLAT, mean_reversion=0.1, volatility=0.2, horizon=40.0)
    rounds = [
        [
            seconds(lambda: normals(ASSETS)),
            seconds(lambda: paths(rates)),
            seconds(lambda: paths(beside)),
            seconds(lambda: paths(linked)),
            seconds(lambda: normals(1)),
            seconds(lambda: paths(lognormal)),
        ]
        for _ in range(REPEATS)
    ]
    for name, pick in (("best", min), ("median", statistics.median)):
        drawn, alone, risky, inflating, one, logs = (pick(column) for column in zip(*rounds, strict=True))
        print(
            f"{name}: {ASSETS} rows of normals {drawn * 1e3:.1f} ms, adding {ASSETS} assets "
            f"{(risky - alone) * 1e3:.1f} ms; ratio {(risky - alone) / drawn:.2f}, wanted at most 2; "
            f"with inflation as well {(inflating - alone) / (drawn * (ASSETS + 2) / ASSETS):.2f}; "
            f"lognormal rates over their normals {logs / one:.2f}"
        )
    start = time.perf_counter()
    model = BlackKarasinskiRates(FLAT, mean_reversion=0.05, volatility=0.2, horizon=60.0)
    fit = time.perf_counter() - start
    times = np.arange(1.0, 721.0) / 12.0
    surfaces = seconds(lambda: _surfaces(model, times))
    print(f"lognormal fit over 60 years, 12 steps a year: {fit * 1e3:.0f} ms; error {model.fit_error:.1e}")
    print(f"surfaces of 720 flows at 40 nodes: {surfaces * 1e3:.0f} ms")
    return 0


def _surfaces(model: BlackKarasinskiRates, times: np.ndarray) -> None:
    model.value_flows(np.arange(1.0, 41.0), times, np.ones(times.size))


if __name__ == "__main__":
    sys.exit(main())
