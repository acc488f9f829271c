"""Speed of shocks: many shocks, a grid, and live frames.

Prints each as a multiple of one bare pass ``sum(c · exp(-z t))`` over the same rows, with z handed over
ready-made, or of one shock. Run it as ``python tests/benchmarks/bench_shocks.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import replace
from datetime import date
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk import tasks
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
from desk.book.arrays import FloatArray
from desk.book.shock import Move, MoveKind, Shock
from desk.places import demo_books
from desk.valuation.shock_base import shock_base
from desk.valuation.shock_grid import shock_grid
from desk.valuation.shocks import run_shock, shock_table
from desk.valuation.what_if import WhatIf, curve_moves

ROWS, LINES, HOLDINGS, REPEATS = 100_000, 12, 400, 15
TODAY = date(2026, 6, 30)


def _best(work: Callable[[], object], repeats: int = REPEATS) -> float:
    """The shortest of several runs [ms]."""
    durations = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        durations.append(time.perf_counter() - begin)
    return 1e3 * min(durations)


def _book(*, linked: bool = False) -> Book:
    random = np.random.default_rng(1)
    terms = np.array([0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 20, 30, 50], dtype=float)
    inflation = Inflation(np.array([1.0, 10.0, 30.0]), np.array([0.02, 0.022, 0.025]), volatility=0.01)
    basis = Basis(TODAY, "EUR", terms, 0.02 + 0.01 * np.sin(terms / 6.0), liability_spread=0.004)
    table = FlowTable(
        tuple(f"line {number}" for number in range(LINES)),
        random.integers(0, LINES, ROWS),
        random.uniform(0.01, 60.0, ROWS),
        random.uniform(1.0, 100.0, ROWS),
        np.zeros(ROWS),
        np.full(ROWS, np.datetime64("NaT", "D")),
    )
    held = tuple(
        Holding(
            f"bond {number}", HoldingKind.BOND, 1e5, 0.02 + 0.0001 * number, 2,
            date(2027 + number % 30, 1 + number % 12, 28), market_value=1e5 * (0.9 + 0.0005 * number),
        )
        for number in range(HOLDINGS)
    )  # fmt: skip
    fund = Holding("fund", HoldingKind.FUND, market_value=1e6)
    if not linked:
        return Book(basis, table, (*held, fund))
    kinds = (IndexationKind.LINKED, IndexationKind.COLLARED)
    line_terms = tuple(
        LineTerms(
            Side.LIABILITIES,
            f"line {number}",
            Indexation(kinds[number % 2], floor=0.0, cap=0.05)
            if number % 2
            else Indexation(IndexationKind.LINKED),
        )
        for number in range(LINES)
    )
    return Book(replace(basis, inflation=inflation), table, (*held, fund), line_terms=line_terms)


def _bare(amounts: FloatArray, exponents: FloatArray) -> float:
    return float(np.sum(amounts * np.exp(-exponents)))


def main() -> None:
    """Print the ratios."""
    for linked in (False, True):
        base = shock_base(_book(linked=linked))
        times, amounts = base.liabilities.flows.time, base.liabilities.flows.amount
        rates = base.book.basis.curve.zero(times)
        bare = _best(partial(_bare, amounts, rates * times))
        print(f"bare pass over {ROWS:,} rows: {bare:.2f} ms")
        what_if = WhatIf(base)
        frames = {
            "the curve": Shock("c", curve_moves(level=20.0, slope=10.0, bend=5.0)),
            "the curve, spreads, funds": Shock(
                "s",
                (*curve_moves(level=20.0), Move(MoveKind.SPREAD, 20.0), Move(MoveKind.VALUE, -0.1)),
            ),
            "amounts of a line and the curve": Shock(
                "a", (*curve_moves(level=20.0), Move(MoveKind.AMOUNT, 0.1, target="line 1"))
            ),
        }
        if linked:
            frames["inflation and the curve"] = Shock(
                "i", (*curve_moves(level=20.0), Move(MoveKind.INFLATION, 20.0))
            )
        for name, shock in frames.items():
            taken = _best(partial(what_if.frame, shock))
            print(f"frame that moves {name}: {taken:.1f} ms, {taken / bare:.1f} times the bare pass")
    book = tasks.read(demo_books() / "life_insurer.xlsx").book
    if book is None:
        raise SystemExit("the demo book cannot be read")
    random = np.random.default_rng(2)
    shocks = [
        Shock(
            f"shock {number}",
            (
                Move(MoveKind.SHORT, float(random.normal(0.0, 80.0))),
                Move(MoveKind.LONG, float(random.normal(0.0, 60.0))),
                Move(MoveKind.SPREAD, float(random.normal(20.0, 20.0))),
                Move(MoveKind.VALUE, float(random.uniform(-0.4, 0.1))),
                Move(MoveKind.AMOUNT, float(random.normal(0.0, 0.02))),
            ),
        )
        for number in range(500)
    ]
    base = shock_base(book)
    rows = len(base.assets.flows) + len(base.liabilities.flows)
    single = _best(lambda: run_shock(base, shocks[0]))
    taken = _best(lambda: shock_table(book, shocks), 3)
    print(
        f"500 shocks of the insurer's demo book ({rows:,} rows): {taken:.0f} ms, {taken / single:.0f} of one"
    )
    scales = np.linspace(-3.0, 3.0, 41)
    down = Shock("rates", (Move(MoveKind.PARALLEL, -50.0),))
    pairs = {
        "rates and funds": Shock("funds", (Move(MoveKind.VALUE, -0.1),)),
        "rates and later payment, cell by cell": Shock("later", (Move(MoveKind.TIME, 0.2),)),
    }
    for name, second in pairs.items():
        taken = _best(
            partial(shock_grid, base, down, second, first_scale=scales, second_scale=scales),
            3,
        )
        print(f"grid of 41 × 41, {name}: {taken:.0f} ms, {taken / single:.0f} of one shock")


if __name__ == "__main__":
    main()
