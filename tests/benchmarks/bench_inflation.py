"""Speed of what follows a price index: 100,000 flow rows in 12 lines, and 20,000 linked bonds.

Prints the time of a standing with key rates of interest and of inflation, and of amounts on a moved curve of
expected inflation, beside the standing of the same rows when nothing follows an index. Run it as
``python tests/benchmarks/bench_inflation.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk.book import (
    Basis,
    Book,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    LineTerms,
    Side,
)
from desk.rates.curve import Curve
from desk.valuation.indexing import reindexed
from desk.valuation.priced import priced_flows
from desk.valuation.standing import stand

ROWS, LINES, HOLDINGS, REPEATS = 100_000, 12, 20_000, 9
TODAY = date(2026, 6, 30)
INFLATION = Inflation(
    np.array([1.0, 2.0, 5.0, 10.0, 20.0, 30.0, 50.0]),
    np.array([0.028, 0.024, 0.022, 0.023, 0.024, 0.024, 0.024]),
    volatility=0.012,
)
MOVED = Curve([1.0, 50.0], [0.03, 0.026])


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
    terms = np.array([0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 20, 30, 50], dtype=float)
    basis = Basis(TODAY, "EUR", terms, 0.02 + 0.01 * np.sin(terms / 6.0), inflation=INFLATION)
    table = FlowTable(
        tuple(f"line {number}" for number in range(LINES)),
        random.integers(0, LINES, ROWS),
        random.uniform(0.01, 60.0, ROWS),
        random.uniform(1.0, 100.0, ROWS),
        np.zeros(ROWS),
        np.full(ROWS, np.datetime64("NaT", "D")),
    )
    return Book(basis, table)


def _kinds(number: int) -> dict[str, Indexation]:
    """The indexation of a line, in each of the cases measured."""
    linked, lagged = Indexation(IndexationKind.LINKED), Indexation(IndexationKind.LINKED, lag=0.25)
    collared = Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.025 + 0.002 * number)
    rising = Indexation(IndexationKind.RISING, rise=0.02)
    return {
        "fully linked": linked,
        "linked with a lag": lagged,
        "collared, each line another collar": collared,
        "linked, collared and rising": (linked, collared, rising)[number % 3],
    }


def _linkers() -> tuple[Holding, ...]:
    random = np.random.default_rng(2)
    return tuple(
        Holding(
            f"linker {number}",
            HoldingKind.LINKED_BOND,
            float(random.uniform(1e3, 1e6)),
            0.0001 * float(random.integers(1, 300)),
            2,
            TODAY + timedelta(days=int(random.integers(40, 30 * 365))),
            price=None if number % 2 else 100.0,
            index_ratio=1.0 + 0.01 * float(random.integers(0, 90)),
            has_principal_floor=number % 4 == 0,
        )
        for number in range(HOLDINGS)
    )


def main() -> None:
    """Print the times."""
    book = _book()
    plain = _best(lambda: stand(replace(book, basis=replace(book.basis, inflation=None))))
    print(f"standing of {ROWS:,} rows without expected inflation: {plain:.1f} ms")
    for name in _kinds(0):
        terms = tuple(
            LineTerms(Side.LIABILITIES, line, _kinds(number)[name])
            for number, line in enumerate(book.liabilities.line_names)
        )
        linked = replace(book, line_terms=terms)
        taken = _best(lambda linked=linked: stand(linked))  # type: ignore[misc]  # bound for this turn
        flows = priced_flows(linked, Side.LIABILITIES).flows
        moved = _best(lambda flows=flows: reindexed(flows, inflation=INFLATION, curve=MOVED))  # type: ignore[misc]
        print(f"{name}: {taken:.1f} ms, {taken / plain:.2f} times; on a moved curve {moved:.1f} ms")
    holdings = _linkers()
    bonds = tuple(replace(linker, kind=HoldingKind.BOND, has_principal_floor=False) for linker in holdings)
    fixed = Book(replace(book.basis, inflation=None), FlowTable.empty(), bonds)
    held = Book(book.basis, FlowTable.empty(), holdings)
    base, taken = _best(lambda: stand(fixed)), _best(lambda: stand(held))
    print(f"standing of {HOLDINGS:,} fixed bonds {base:.0f} ms, of as many linked ones {taken:.0f} ms")


if __name__ == "__main__":
    main()
