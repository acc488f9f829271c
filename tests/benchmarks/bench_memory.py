"""Peak memory of a million paths over forty years.

Run as a script; it prints the peak of a process of its own for yearly and for monthly steps of the one-factor
Hull-White model, with both sides valued along every path.
"""

from __future__ import annotations

import subprocess
import sys
import time
from datetime import date

import numpy as np

from desk.book import Basis, Book, FlowTable, ModelName, PricedFlows, RatesModel, Run, Side
from desk.scenarios.simulation import simulate

PATHS, YEARS = 1_000_000, 40


def flows(side: Side, years: int) -> PricedFlows:
    """A flow of 1 every month."""
    time_due = np.arange(1, 12 * years + 1) / 12.0
    count = time_due.size
    return PricedFlows(
        side, ("line",), np.zeros(count, int), time_due, np.ones(count), np.zeros(count), np.ones(count, bool)
    )


def run(steps_per_year: int) -> None:
    """One run, and what it took."""
    import resource

    terms = np.array([1.0, 5.0, 10.0, 30.0])
    basis = Basis(date(2026, 1, 1), "EUR", terms, np.array([0.02, 0.025, 0.03, 0.031]))
    book = Book(
        basis,
        FlowTable.empty(),
        rates_model=RatesModel(ModelName.HULL_WHITE, mean_reversion=0.05, volatility=0.009),
        run=Run(paths=PATHS, horizon_years=YEARS, steps_per_year=steps_per_year),
    )
    start = time.perf_counter()
    result = simulate(book, flows(Side.ASSETS, 20), flows(Side.LIABILITIES, 60))
    seconds = time.perf_counter() - start
    # Kilobytes on Linux, bytes on macOS.
    unit = 1.0 if sys.platform == "darwin" else 1024.0
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit / 1e9
    check = result.repricing
    score = (check.mean_discount - check.curve_discount)[1:] / check.mean_discount_se[1:]
    values = [(side.mean - side.curve) / side.se for side in result.present_value]
    print(
        f"{PATHS:,} paths, {YEARS} years, {steps_per_year} step(s) a year: peak {peak:.2f} GB, wanted "
        f"at most 1.5 GB; {seconds:.1f} s; largest z of E[1/R] {np.abs(score).max():.2f}, of present values "
        + ", ".join(f"{value:.2f}" for value in values)
    )


def main() -> int:
    """Run each case in a process of its own."""
    if len(sys.argv) > 1:
        run(int(sys.argv[1]))
        return 0
    for steps_per_year in (1, 12):
        subprocess.run([sys.executable, __file__, str(steps_per_year)], check=True)
    return 0


if __name__ == "__main__":
    sys.exit(main())
