"""Speed of building curves: 60 quotes bootstrapped, fitted and extrapolated.

Prints each time in milliseconds, and as a multiple of one discounting of all the flows quoted, on the curve
that comes out. Run it as ``python tests/benchmarks/bench_curve.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk.rates.bootstrap import bootstrap
from desk.rates.curve import DiscountCurve, Interpolation
from desk.rates.fitting import fit_nelson_siegel, fit_svensson
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.quotes import bond_flows, par_flows
from desk.rates.smith_wilson import smith_wilson

QUOTES, REPEATS = 60, 15


def _best(work: Callable[[], object]) -> float:
    """The shortest of several runs [ms]."""
    durations = []
    for _ in range(REPEATS):
        begin = time.perf_counter()
        work()
        durations.append(time.perf_counter() - begin)
    return 1e3 * min(durations)


def _say(what: str, flows: QuotedFlows, build: Callable[[], DiscountCurve]) -> None:
    curve = build()
    taken, once = _best(build), _best(lambda: flows.values(curve))
    size = f"{flows.time.size:,} flows"
    print(f"{what}: {taken:.2f} ms for {size}, {taken / once:.0f} times one discounting of them")


def main() -> None:
    """Print the times and ratios."""
    random = np.random.default_rng(1)
    terms = np.arange(1.0, QUOTES + 1.0)
    rates = 0.02 + 0.015 * -np.expm1(-terms / 8.0) - 0.004 * np.exp(-terms / 2.0)
    par = {count: par_flows(terms, rates, payments_per_year=count) for count in (1, 2, 12)}
    odd = bond_flows(terms - 0.9 * random.random(QUOTES), rates + 0.01, yields=rates)
    for interpolation in Interpolation:
        for count, flows in par.items():
            what = f"{QUOTES} par yields, {count} coupons a year, {interpolation.value}"
            _say(what, flows, lambda f=flows, i=interpolation: bootstrap(f, interpolation=i))  # type: ignore[misc]  # bound for this turn
        what = f"{QUOTES} bonds of odd terms, {interpolation.value}"
        _say(what, odd, lambda i=interpolation: bootstrap(odd, interpolation=i))  # type: ignore[misc]  # bound for this turn
    annual = par[1]
    _say(
        f"{QUOTES} par yields, Smith-Wilson with its search for alpha",
        annual,
        lambda: smith_wilson(annual, ultimate_forward_rate=0.0345),
    )
    noisy = replace(odd, target=odd.target + random.normal(0.0, 0.05, QUOTES))
    _say(f"{QUOTES} bonds, Svensson fitted", noisy, lambda: fit_svensson(noisy).curve)
    _say(f"{QUOTES} bonds, Nelson-Siegel fitted", noisy, lambda: fit_nelson_siegel(noisy).curve)


if __name__ == "__main__":
    main()
