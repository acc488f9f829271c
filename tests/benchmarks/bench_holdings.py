"""Speed of 20,000 holdings of every kind: into flows, and into a standing with key rates, line by line.

Prints times, and the standing as a multiple of one bare pass ``sum(c · exp(-z t))`` over the rows they make,
with z handed over ready-made. Run it as ``python tests/benchmarks/bench_holdings.py``.
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

from desk.book import Amortisation, Basis, Book, FlowTable, Holding, HoldingKind, Side
from desk.book.schedule import holding_flows
from desk.rates.day_count import DayCount
from desk.valuation.priced import priced_flows
from desk.valuation.prices import holding_prices
from desk.valuation.standing import stand

HOLDINGS, REPEATS = 20_000, 7
TODAY = date(2026, 6, 30)
KINDS = (
    *((HoldingKind.BOND,) * 9),
    *((HoldingKind.FLOATER,) * 3),
    HoldingKind.ZERO,
    HoldingKind.BILL,
    HoldingKind.DEPOSIT,
    HoldingKind.TERM_DEPOSIT,
    HoldingKind.PAYER_SWAP,
    HoldingKind.RECEIVER_SWAP,
    HoldingKind.FUND,
    HoldingKind.PROPERTY,
)


def _best(work: Callable[[], object]) -> float:
    """The shortest of several runs [ms]."""
    durations = []
    for _ in range(REPEATS):
        begin = time.perf_counter()
        work()
        durations.append(time.perf_counter() - begin)
    return 1e3 * min(durations)


def _holding(number: int, random: np.random.Generator) -> Holding:
    """A holding of a kind that goes by the number."""
    kind = KINDS[number % len(KINDS)]
    name, nominal = f"{kind} {number}", float(random.uniform(1e3, 1e6))
    end = TODAY + timedelta(days=int(random.integers(40, 30 * 365)))
    frequency = int(random.choice([1, 2, 2, 4]))
    if kind in (HoldingKind.FUND, HoldingKind.PROPERTY):
        return Holding(name, kind, market_value=nominal, duration=float(number % 9))
    if kind is HoldingKind.DEPOSIT:
        return Holding(name, kind, nominal)
    if kind in (HoldingKind.PAYER_SWAP, HoldingKind.RECEIVER_SWAP):
        start = TODAY + timedelta(days=int(random.integers(-900, 900)))
        return Holding(
            name,
            kind,
            nominal,
            0.025,
            1,
            max(end, start + timedelta(days=400)),
            start_date=start,
            current_rate=0.02,
            floating_frequency=2,
            floating_day_count=DayCount.ACT_360,
        )
    if kind in (HoldingKind.BILL, HoldingKind.TERM_DEPOSIT):
        soon = TODAY + timedelta(days=20 + number % 300)
        rate = 0.021 if kind is HoldingKind.BILL else None
        begun = None if rate else TODAY - timedelta(days=30)
        coupon = 0.0 if rate else 0.02
        return Holding(name, kind, nominal, coupon, 1, soon, start_date=begun, discount_rate=rate)
    is_floater = kind is HoldingKind.FLOATER
    return Holding(
        name,
        kind,
        nominal,
        float(random.uniform(0.005, 0.05)) if kind is HoldingKind.BOND else 0.0,
        4 if is_floater else frequency,
        end,
        DayCount.ACT_360 if is_floater else None,
        price=None if number % 3 else float(random.uniform(80.0, 110.0)),
        ex_dividend_days=7 if number % 5 == 0 and kind is HoldingKind.BOND else 0,
        amortisation=tuple(Amortisation)[number % 3] if kind is HoldingKind.BOND else Amortisation.BULLET,
        current_rate=0.03 if is_floater else None,
        margin=0.01 if is_floater else 0.0,
        default_rate=0.002 if number % 4 == 0 else 0.0,
        recovery_rate=0.4,
    )


def main() -> None:
    """Print the times and the ratio."""
    random = np.random.default_rng(1)
    terms = np.array([0.25, 0.5, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 12, 15, 20, 25, 30, 40, 50], dtype=float)
    basis = Basis(TODAY, "EUR", terms, 0.02 + 0.01 * np.sin(terms / 6.0), liability_spread=0.004)
    holdings = tuple(_holding(number, random) for number in range(HOLDINGS))
    book = Book(basis, FlowTable.empty(), holdings)
    flows = priced_flows(book, Side.ASSETS).flows
    rates = basis.curve.zero(flows.time)
    bare = _best(lambda: float(np.sum(flows.amount * np.exp(-rates * flows.time))))
    print(f"{HOLDINGS:,} holdings make {len(flows):,} rows; a bare pass over them takes {bare:.1f} ms")
    print(f"into flows: {_best(lambda: holding_flows(holdings, valuation_date=TODAY)):.0f} ms")
    print(f"into priced flows: {_best(lambda: priced_flows(book, Side.ASSETS)):.0f} ms")
    taken = _best(lambda: stand(replace(book)))
    print(
        f"into a standing, its digest and flows included: {taken:.0f} ms, {taken / bare:.0f} times the bare"
    )
    print(f"into quoted prices: {_best(lambda: holding_prices(book)):.0f} ms")


if __name__ == "__main__":
    main()
