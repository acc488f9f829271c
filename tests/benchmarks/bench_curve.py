"""Speed of building curves: 60 quotes bootstrapped, fitted and extrapolated.

Prints each time in milliseconds, and as a multiple of one discounting of all the flows quoted, on the curve
that comes out. Run it as ``python tests/benchmarks/bench_curve.py``.
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

from desk.book import Basis, BondFit, CurveBonds, CurveKind
from desk.rates.bootstrap import bootstrap
from desk.rates.curve import DiscountCurve, Interpolation
from desk.rates.fitting import fit_nelson_siegel, fit_svensson
from desk.rates.parametric import Svensson
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.quotes import bond_flows, par_flows
from desk.rates.smith_wilson import Extrapolation, smith_wilson

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


def _say_bases(random: np.random.Generator) -> None:
    """Whole bases of a sheet of bonds: flows, curve and the error of each bond."""
    today, none = date(2026, 6, 30), np.zeros(0)
    blank = CurveBonds(
        names=tuple(f"Bond {number}" for number in range(QUOTES)),
        maturity=np.datetime64(today) + np.sort(random.choice(np.arange(100, 11_000), QUOTES, replace=False)),
        coupon=random.uniform(0.0, 0.06, QUOTES),
        frequency=np.full(QUOTES, 2),
        price=np.full(QUOTES, 100.0),
        bond_yield=np.full(QUOTES, np.nan),
        is_clean=np.ones(QUOTES, dtype=np.bool_),
    )
    basis = Basis(today, "EUR", none, none, curve_kind=CurveKind.BONDS, bonds=blank)
    known = Svensson(0.036, -0.015, -0.036, 0.08, 0.48, 10.4)
    flows = basis.quoted_bonds
    exact = blank.price + flows.values(known) - flows.target
    noisy = exact + random.normal(0.0, 0.05, QUOTES)
    bases = {fit.value: replace(basis, bonds=replace(blank, price=noisy), bond_fit=fit) for fit in BondFit}
    # Through noise between bonds that are close it would have discount factors below 0, which is refused.
    bases["Smith-Wilson"] = replace(
        basis,
        bonds=replace(blank, price=exact),
        extrapolation=Extrapolation.SMITH_WILSON,
        ultimate_forward_rate=0.0345,
    )
    for name, each in bases.items():
        _say(f"basis of {QUOTES} bonds, {name}", flows, lambda one=each: replace(one).curve)  # type: ignore[misc]  # bound for this turn


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
    _say_bases(random)


if __name__ == "__main__":
    main()
