"""What each way of drawing gains in variance and costs in time, on the demo books.

Run as a script: ``python tests/benchmarks/bench_sampling.py [BOOK ...]``. Every run has 16 replicates of
1,024 paths. Gains are variances of plain sampling over those of the run, for as many paths; "a second"
divides by how much longer the run takes than a plain one, in turn with which it is timed.
"""

from __future__ import annotations

import statistics
import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import Any

from desk.book import Book, Bridge, Run, Sampling, Side
from desk.intake.workbook import read_workbook
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate
from desk.valuation.priced import priced_flows

REPEATS = 3
WAYS: dict[str, dict[str, Any]] = {
    "plain": {},
    "antithetic": {"sampling": Sampling.ANTITHETIC},
    "matched": {"matching": True},
    "antithetic, matched": {"sampling": Sampling.ANTITHETIC, "matching": True},
    "Sobol, components": {"sampling": Sampling.SOBOL, "bridge": Bridge.COMPONENTS},
    "Sobol, bridge": {"sampling": Sampling.SOBOL, "bridge": Bridge.BROWNIAN},
    "Sobol, components, matched": {"sampling": Sampling.SOBOL, "matching": True},
}
FIGURES = {
    "mean of the savings account at the horizon": "R_T",
    "mean present value of surplus": "surplus",
    "5 % quantile of surplus": "5 % of surplus",
}


def runs_of(book: Book) -> dict[str, Simulation]:
    """A run each way, with its time and its gains printed."""
    assets, liabilities = (priced_flows(book, side).flows for side in (Side.ASSETS, Side.LIABILITIES))
    stated = Run(
        paths=16 * 1024,
        horizon_years=book.run.horizon_years,
        steps_per_year=book.run.steps_per_year,
        seed=book.run.seed,
    )
    seconds: dict[str, list[float]] = {way: [] for way in WAYS}
    found: dict[str, Simulation] = {}
    for _ in range(REPEATS):
        for way, settings in WAYS.items():
            start = time.perf_counter()
            found[way] = simulate(replace(book, run=replace(stated, **settings)), assets, liabilities)
            seconds[way].append(time.perf_counter() - start)
    plain = statistics.median(seconds["plain"])
    for way, simulation in found.items():
        spent = statistics.median(seconds[way])
        gains = {gain.figure: gain for gain in simulation.gains}
        told = ", ".join(
            f"{short} {gains[figure].gain:.3g} [{gains[figure].low:.2g}, {gains[figure].high:.2g}]"
            f" ({gains[figure].gain * plain / spent:.3g} a second)"
            for figure, short in FIGURES.items()
            if figure in gains
        )
        print(f"  {way:27s} {spent:5.2f} s, {spent / plain:4.2f} times plain  {told}")
    return found


def main(paths: list[str]) -> int:
    """The demo books, or those named."""
    folder = Path(__file__).parents[2] / "demo_books"
    for path in [Path(path) for path in paths] or sorted(folder.glob("*.xlsx")):
        book = read_workbook(path).book
        if book is None or book.rates_model is None:
            print(f"{path.name}: no book with a rates model")
            continue
        model, run = book.rates_model.name, book.run
        print(f"{path.name}: {model}, {run.horizon_years} years of {run.steps_per_year} steps")
        runs_of(book)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
