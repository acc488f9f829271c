"""Peak memory of a million paths over forty years.

Run as a script; it prints the peak of a process of its own for yearly and for monthly steps of the one-factor
Hull-White model, with both sides valued along every path, and for yearly steps with five risky assets,
inflation, and liabilities that follow it within a collar, beside what was estimated.
"""

from __future__ import annotations

import subprocess
import sys
import time
from dataclasses import replace
from datetime import date

import numpy as np

from desk.book import (
    Basis,
    Book,
    FlowTable,
    Indexation,
    IndexationKind,
    Inflation,
    ModelName,
    PricedFlows,
    RatesModel,
    RiskyAssets,
    Run,
    Side,
)
from desk.scenarios.plans import planned_run, run_bytes
from desk.scenarios.simulation import simulate

PATHS, YEARS = 1_000_000, 40


def flows(side: Side, years: int) -> PricedFlows:
    """A flow of 1 every month."""
    time_due = np.arange(1, 12 * years + 1) / 12.0
    count = time_due.size
    return PricedFlows(
        side, ("line",), np.zeros(count, int), time_due, np.ones(count), np.zeros(count), np.ones(count, bool)
    )


def collared(flows: PricedFlows) -> PricedFlows:
    """The flows as increases held between 0 and 5 % a year."""
    count = len(flows)
    return replace(
        flows,
        real_amount=flows.amount,
        index_class=np.zeros(count, int),
        indexations=(Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.05),),
    )


def with_everything(book: Book) -> Book:
    """The book with five risky assets and inflation beside its rates."""
    assert book.rates_model is not None
    count = 5
    return replace(
        book,
        basis=replace(book.basis, inflation=Inflation(np.array([1.0, 30.0]), np.array([0.02, 0.022]))),
        rates_model=replace(
            book.rates_model,
            inflation_mean_reversion=0.3,
            inflation_volatility=0.01,
            inflation_rate_correlation=0.3,
        ),
        risky_assets=RiskyAssets(
            tuple("ABCDE"),
            np.full(count, 100.0),
            np.full(count, 0.03),
            np.full(count, 0.15),
            np.zeros(count),
            np.full((count, count), 0.4) + 0.6 * np.eye(count),
            np.full(count, 0.1),
        ),
    )


def run(steps_per_year: int, *, everything: bool) -> None:
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
    assets, liabilities = flows(Side.ASSETS, 20), flows(Side.LIABILITIES, 60)
    if everything:
        book, liabilities = with_everything(book), collared(liabilities)
    estimate = run_bytes(planned_run(book, assets, liabilities).plan, collars=int(everything))
    start = time.perf_counter()
    result = simulate(book, assets, liabilities)
    seconds = time.perf_counter() - start
    # Kilobytes on Linux, bytes on macOS.
    unit = 1.0 if sys.platform == "darwin" else 1024.0
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit / 1e9
    check = result.repricing
    score = (check.mean_discount - check.curve_discount)[1:] / check.mean_discount_se[1:]
    # Collared liabilities are not worth what is expected today: see the remark of such a run.
    sides = result.present_value[:1] if everything else result.present_value
    values = [(side.mean - side.curve) / side.se for side in sides]
    print(
        f"{PATHS:,} paths, {YEARS} years, {steps_per_year} step(s) a year"
        f"{' with assets and inflation' if everything else ''}: peak {peak:.2f} GB, wanted "
        f"at most 1.5 GB, estimated {estimate / 1e9:.2f}; {seconds:.1f} s; "
        f"largest z of E[1/R] {np.abs(score).max():.2f}, of present values "
        + ", ".join(f"{value:.2f}" for value in values)
    )


def main() -> int:
    """Run each case in a process of its own."""
    if len(sys.argv) > 1:
        run(int(sys.argv[1]), everything=len(sys.argv) > 2)
        return 0
    for arguments in (["1"], ["12"], ["1", "everything"]):
        subprocess.run([sys.executable, __file__, *arguments], check=True)
    return 0


if __name__ == "__main__":
    sys.exit(main())
