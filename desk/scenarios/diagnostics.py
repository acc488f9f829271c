"""The short rate along the paths against its law: moments, and how much of it is left after a step."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray, owned_floats
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.gaussian import GaussianRates
from desk.rates.limits import first_integral
from desk.rates.square_root import SquareRootRates
from desk.scenarios.drawn_model import DrawnModel
from desk.scenarios.draws import Paths, Plan
from desk.scenarios.market_records import Diagnostics
from desk.scenarios.sampling import Replicates

__all__ = ["RatePairs", "diagnostics", "expected_autoregression", "rate_law"]

# Below this part of its square mean a variance is what rounding leaves of a constant.
_ROUNDING = 1e-24


def rate_law(
    model: DrawnModel, time: FloatArray, *, real_world: bool = False
) -> tuple[FloatArray, FloatArray]:
    """Mean and variance of the short rate, NaN where they are not known in closed form.

    Parameters
    ----------
    model : DrawnModel
    time : ndarray, shape (n,)
        For the lognormal model nodes of its grid [years].
    real_world : bool

    Returns
    -------
    mean, variance : ndarray, shape (n,)
        [1/year] and [1/year²]
    """
    if isinstance(model, GaussianRates):
        mean = model.rate_offset(time) + model.factor_mean(time, real_world=real_world).sum(axis=0)
        return np.asarray(mean), model.rate_variance(time)
    if isinstance(model, SquareRootRates):
        mean = model.rate_offset(time) + model.factor_mean(time, real_world=real_world)
        return np.asarray(mean), model.factor_variance(time, real_world=real_world)
    if isinstance(model, BlackKarasinskiRates):
        level, variance = model.log_rate_law(time, real_world=real_world)
        mean = np.exp(level + 0.5 * variance)
        return np.asarray(mean), np.asarray(mean**2 * np.expm1(variance))
    return np.full(time.size, np.nan), np.full(time.size, np.nan)


def expected_autoregression(
    model: DrawnModel, time: float, step: float, *, real_world: bool = False
) -> float:
    """Slope of the rate, of its logarithm in the lognormal model, on that of a step before.

    ``Cov(r(t), r(t - Δ))/Var r(t - Δ)``: for one factor ``e^{-aΔ}``, for several the same weighed by what
    each adds to the variance. NaN where it is not known, or where the rate is certain a step before.

    Parameters
    ----------
    model : DrawnModel
    time, step : float
        t and Δ [years].
    real_world : bool
    """
    before = time - step
    if before <= 0.0:
        return math.nan
    if isinstance(model, GaussianRates):
        total = kept = 0.0
        for row, one in enumerate(model.factors):
            for column, two in enumerate(model.factors):
                weight = model.correlation[row, column] * one.volatility * two.volatility
                part = float(weight * first_integral(one.mean_reversion + two.mean_reversion, before))
                total += part
                kept += part * math.exp(-two.mean_reversion * step)
        return kept / total if total > 0.0 else math.nan
    if isinstance(model, SquareRootRates):
        return math.exp(-model.speed(real_world=real_world) * step) if model.volatility > 0.0 else math.nan
    if isinstance(model, BlackKarasinskiRates):
        return math.exp(-model.mean_reversion * step) if model.volatility > 0.0 else math.nan
    return math.nan


@dataclass(frozen=True)
class _Sums:
    """Centred sums over some paths of the rate x a step before and y at a node."""

    count: int
    mean_x: float
    mean_y: float
    xx: float
    xy: float
    yy: float
    robust: float

    def joined(self, other: _Sums) -> _Sums:
        """Over both. Chan, T.F., Golub, G.H. and LeVeque, R.J. (1983), Algorithms for computing the sample
        variance, American Statistician 37."""
        count = self.count + other.count
        weight = self.count * other.count / count
        dx, dy = other.mean_x - self.mean_x, other.mean_y - self.mean_y
        return _Sums(
            count,
            self.mean_x + dx * other.count / count,
            self.mean_y + dy * other.count / count,
            self.xx + other.xx + weight * dx * dx,
            self.xy + other.xy + weight * dx * dy,
            self.yy + other.yy + weight * dy * dy,
            self.robust + other.robust,
        )


class RatePairs:
    """Rates a step apart, gathered at the reported nodes while paths are drawn.

    Parameters
    ----------
    plan : Plan
    """

    def __init__(self, plan: Plan) -> None:
        steps = list(plan.reported_steps)
        self._plan = plan
        self._is_log = isinstance(plan.model, BlackKarasinskiRates)
        self._before = np.empty(plan.paths)
        self._kept = {step - 1 for step in steps if step > 1}
        self._slope = {
            step: expected_autoregression(
                plan.model,
                float(plan.time[step]),
                float(plan.time[step] - plan.time[step - 1]),
                real_world=plan.real_world,
            )
            for step in steps
            if step > 1
        }
        self._sums: dict[int, dict[int, _Sums]] = {step: {} for step in self._slope}

    def visit(self, step: int, paths: Paths) -> None:
        """Take note of the rates at a step; see `desk.scenarios.draws.Block.advance`."""
        pairs = self._sums.get(step)
        if pairs is None and step not in self._kept:
            return
        rate = paths.state[0] if len(paths.state) == 1 else paths.state.sum(axis=0)
        if self._is_log:
            rate = np.log(rate)
        before = self._before[paths.columns]
        if pairs is not None:
            start = paths.columns.start
            for part in self._apart(paths.columns):
                own = slice(part.start - start, part.stop - start)
                pairs[part.start] = _sums_of(before[own], rate[own], self._slope[step])
        if step in self._kept:
            before[:] = rate

    def _apart(self, columns: slice) -> Iterator[slice]:
        """The paths of a block, those of each replicate by themselves."""
        each = self._plan.paths if self._plan.replicates is None else self._plan.replicates.paths
        for replicate in range(columns.start // each, -(-columns.stop // each)):
            yield slice(max(replicate * each, columns.start), min((replicate + 1) * each, columns.stop))

    def slopes(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        """The slope at each reported step, its error and what it should be, shape (n + 1,), from step 0."""
        steps = [0, *self._plan.reported_steps]
        slope, error = np.full(len(steps), np.nan), np.full(len(steps), np.nan)
        expected = np.array([self._slope.get(step, math.nan) for step in steps])
        for row, step in enumerate(steps):
            by_block = self._sums.get(step, {})
            parts = [by_block[start] for start in sorted(by_block)]
            if not parts:
                continue
            whole = parts[0]
            for part in parts[1:]:
                whole = whole.joined(part)
            if whole.count > 2 and whole.xx > _ROUNDING * whole.count * whole.mean_x**2:
                slope[row] = whole.xy / whole.xx
                error[row] = math.sqrt(whole.robust) / whole.xx
                if self._plan.replicates is not None:
                    spread = _replicate_spread(by_block, float(slope[row]), self._plan.replicates)
                    error[row] = spread / whole.xx
        return slope, error, expected


def _replicate_spread(parts: dict[int, _Sums], slope: float, replicates: Replicates) -> float:
    """Standard error of the sum of the products of rate and residual, from the sums of the replicates."""
    products = np.zeros(replicates.count)
    for start, sums in sorted(parts.items()):
        products[start // replicates.paths] += sums.xy - slope * sums.xx
    return math.sqrt(replicates.count) * float(products.std(ddof=1))


def _sums_of(before: FloatArray, rate: FloatArray, slope: float) -> _Sums:
    """The sums of one block.

    The error of the slope is White's, which holds where the noise of a step depends on the rate: White, H.
    (1980), A heteroskedasticity-consistent covariance matrix estimator, Econometrica 48.
    """
    mean_x, mean_y = float(before.mean()), float(rate.mean())
    x, y = before - mean_x, rate - mean_y
    xx, xy, yy = float(x @ x), float(x @ y), float(y @ y)
    if math.isnan(slope):
        slope = xy / xx if xx > 0.0 else 0.0
    y -= slope * x
    y *= x
    return _Sums(before.size, mean_x, mean_y, xx, xy, yy, float(y @ y))


def diagnostics(plan: Plan, pairs: RatePairs, year: FloatArray) -> Diagnostics:
    """The short rate of a run against its law."""
    mean, variance = rate_law(plan.model, year, real_world=plan.real_world)
    slope, error, expected = pairs.slopes()
    return Diagnostics(
        year=owned_floats(year),
        rate_mean=owned_floats(mean),
        rate_sd=owned_floats(np.sqrt(variance)),
        autoregression=owned_floats(slope),
        autoregression_se=owned_floats(error),
        expected_autoregression=owned_floats(expected),
    )
