"""Speed of estimating models: from histories, from option quotes and from panels of yields.

Prints each time, and as a multiple of one evaluation of the likelihood or of the prices. Run it as
``python tests/benchmarks/bench_calibration.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.stats import ncx2

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk.book.arrays import FloatArray
from desk.rates.gaussian import gaussian_2, hull_white
from desk.rates.history_series import rate_history
from desk.rates.history_square_root import (
    fit_square_root,
    square_root_log_density,
    square_root_log_likelihood,
)
from desk.rates.history_vasicek import fit_vasicek, vasicek_log_likelihood
from desk.rates.kalman_fit import fit_yield_panel
from desk.rates.kalman_panel import PanelModel, YieldPanel, kalman_filter, panel_log_likelihood
from desk.rates.limits import first_integral
from desk.rates.option_calibration import fit_volatilities
from desk.rates.option_instruments import option_quotes
from desk.rates.option_models import gaussian_option_prices
from desk.rates.square_root import SquareRootRates
from tests.rates.flat_curve import humped_curve

MONTHS, REPEATS = 1200, 5


def _best(work: Callable[[], object], repeats: int = REPEATS) -> float:
    """The shortest of several runs [ms]."""
    durations = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        durations.append(time.perf_counter() - begin)
    return 1e3 * min(durations)


def _say(what: str, whole: float, once: float) -> None:
    print(f"{what}: {whole:.1f} ms, {whole / once:.0f} times one evaluation of {once:.3f} ms")


def _histories() -> None:
    model = SquareRootRates(mean_reversion=0.3, long_run_rate=0.04, volatility=0.06, starting_rate=0.04)
    walk = model.walk(1.0 / 12.0, 1, np.random.default_rng(1))
    rates = np.array([float(walk.state[0, 0]) for _ in walk.run(MONTHS)])
    times = np.arange(MONTHS) / 12.0
    history = rate_history(times, rates)
    pulls = {"mean_reversion": 0.3, "pull": 0.012}
    once = _best(lambda: vasicek_log_likelihood(history, mean_reversion=0.3, pull=0.012, volatility=0.012))
    _say(f"Vasicek, {MONTHS} months", _best(lambda: fit_vasicek(times, rates)), once)
    once = _best(lambda: square_root_log_likelihood(history, volatility=0.06, **pulls))
    _say(f"square root, {MONTHS} months", _best(lambda: fit_square_root(times, rates)), once)
    before, after, step = history.before, history.after, history.step

    def library() -> FloatArray:
        unit = 0.25 * 0.06**2 * first_integral(0.3, step)
        far = before * np.exp(-0.3 * step) / unit
        return np.asarray(ncx2.logpdf(after / unit, 4.0 * 0.012 / 0.06**2, far) - np.log(unit))

    ours = _best(lambda: square_root_log_density(before, after, step, volatility=0.06, **pulls))
    print(f"square-root density: {ours:.3f} ms, scipy's {_best(library) / ours:.1f} times that")


def _options() -> None:
    curve = humped_curve()
    expiry = np.repeat([1.0, 2.0, 3.0, 5.0, 7.0, 10.0], 5)
    count = expiry.size
    quotes = option_quotes(
        curve,
        instrument=["payer swaption"] * count,
        expiry=expiry,
        length=np.tile([1.0, 2.0, 5.0, 10.0, 20.0], 6),
        strike=np.full(count, np.nan),
        volatility=np.full(count, 0.008),
        kind=["normal"] * count,
        shift=np.zeros(count),
        frequency=np.ones(count),
    )
    one = hull_white(curve, mean_reversion=0.05, volatility=0.008)
    two = gaussian_2(
        curve,
        mean_reversion=0.77,
        volatility=0.022,
        second_mean_reversion=0.08,
        second_volatility=0.0104,
        factor_correlation=-0.7,
    )
    noise = 1.0 + 0.02 * np.random.default_rng(2).standard_normal(count)
    quoted = replace(quotes, volatility=quotes.volatilities(gaussian_option_prices(two, quotes)) * noise)
    for name, model in (("hull-white", one), ("gaussian-2", two)):
        once = _best(lambda model=model: gaussian_option_prices(model, quoted))  # type: ignore[misc]  # bound for this turn
        whole = _best(lambda name=name: fit_volatilities(quoted, model=name), 2)  # type: ignore[misc]  # bound for this turn
        _say(f"{name} to {count} swaptions", whole, once)


def _panels() -> None:
    terms = np.array([0.25, 1.0, 2.0, 5.0, 10.0, 20.0])
    model = PanelModel((0.8, 0.06), (0.012, 0.009), (0.1, 0.2), 0.03, 5e-4, -0.6)
    random, months = np.random.default_rng(3), 480
    step = np.full(months - 1, 1.0 / 12.0)
    states = [np.zeros(2)]
    for spread, left in zip(model.covariance(step), model.decay(step), strict=True):
        states.append(left * states[-1] + np.linalg.cholesky(spread) @ random.standard_normal(2))
    constant, loading = model.loadings(terms)
    rates = constant + np.array(states) @ loading.T + 5e-4 * random.standard_normal((months, terms.size))
    panel = YieldPanel(np.arange(months) / 12.0, terms, rates)
    once = _best(lambda: panel_log_likelihood(panel, model))
    filtered = _best(lambda: kalman_filter(panel, model))
    print(f"filter date by date: {filtered / once:.0f} times the band likelihood")
    for factors in (1, 2):
        whole = _best(lambda f=factors: fit_yield_panel(panel.time, terms, rates, factors=f), 2)  # type: ignore[misc]  # bound for this turn
        _say(f"{factors} factors to {months} months of {terms.size} yields", whole, once)


def main() -> None:
    """Print the times and ratios."""
    _histories()
    _options()
    _panels()


if __name__ == "__main__":
    main()
