"""Speed of the standing: 100,000 flow rows in 12 lines, with key rates and by line.

Prints the time of a standing as a multiple of one bare pass ``sum(c · exp(-z t))`` over the same rows, with
z handed over ready-made. Run it as ``python tests/benchmarks/bench_standing.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind
from desk.rates.curve import Interpolation
from desk.valuation.standing import stand

ROWS, LINES, HOLDINGS, REPEATS = 100_000, 12, 400, 15
TODAY = date(2026, 6, 30)


def _best(work: Callable[[], object]) -> float:
    """The shortest of several runs [ms]."""
    durations = []
    for _ in range(REPEATS):
        begin = time.perf_counter()
        work()
        durations.append(time.perf_counter() - begin)
    return 1e3 * min(durations)


def _book() -> Book:
    random = np.random.default_rng(1)
    terms = np.array([0.25, 0.5, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 12, 15, 20, 25, 30, 40, 50], dtype=float)
    basis = Basis(TODAY, "EUR", terms, 0.02 + 0.01 * np.sin(terms / 6.0), liability_spread=0.004)
    table = FlowTable(
        tuple(f"line {number}" for number in range(LINES)),
        random.integers(0, LINES, ROWS),
        random.uniform(0.01, 60.0, ROWS),
        random.uniform(1.0, 100.0, ROWS),
        np.zeros(ROWS),
        np.full(ROWS, np.datetime64("NaT", "D")),
    )
    return Book(basis, table)


def _holdings() -> tuple[Holding, ...]:
    return tuple(
        Holding(
            f"bond {number}",
            HoldingKind.BOND,
            1e5,
            0.02 + 0.0001 * number,
            2,
            date(2027 + number % 30, 1 + number % 12, 28),
            market_value=1e5 * (0.9 + 0.0005 * number),
        )
        for number in range(HOLDINGS)
    )


def main() -> None:
    """Print the ratios."""
    book = _book()
    times, amounts = book.liabilities.time, book.liabilities.amount
    rates = book.basis.curve.zero(times)
    bare = _best(lambda: float(np.sum(amounts * np.exp(-rates * times))))
    print(f"bare pass over {ROWS:,} rows: {bare:.2f} ms")
    for interpolation in Interpolation:
        other = replace(book, basis=replace(book.basis, interpolation=interpolation))
        taken = _best(lambda other=other: stand(other))  # type: ignore[misc]  # bound for this turn
        print(f"standing, {interpolation.value}: {taken:.1f} ms, {taken / bare:.1f} times the bare pass")
    held = replace(book, holdings=_holdings())
    taken = _best(lambda: stand(held))
    print(f"standing with {HOLDINGS} bonds beside: {taken:.1f} ms, {taken / bare:.1f} times the bare pass")
    taken = _best(lambda: stand(replace(held)))
    print(f"the same of a book just changed (its digest is new): {taken:.1f} ms")


if __name__ == "__main__":
    main()
