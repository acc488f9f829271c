"""Smooth curves of few parameters through many bonds, each weighted by the inverse of its duration."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import combinations, product

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.curve_error import CurveError
from desk.rates.parametric import NelsonSiegel, Svensson, loadings
from desk.rates.quoted_flows import QuotedFlows, flow_yields

__all__ = ["CurveFit", "fit_nelson_siegel", "fit_svensson", "measured_fit"]

FloatArray = NDArray[np.float64]

_SHORTEST_DECAY, _LONGEST_DECAY = 0.05, 50.0  # years
_DECAYS = np.geomspace(0.1, 30.0, 18)
_STARTS = 5
_ROUNDS = 4
_BETTER = 0.999  # of the sum of squares: with less gained, another round is not worth its while
_FEW_EVALUATIONS, _MOST_EVALUATIONS = 30, 600
_FINALISTS = 2
_LARGEST_EXPONENT = 50.0
_LARGEST_RATE = 10.0  # 1000 % a year: no path of the search goes past it


@dataclass(frozen=True, eq=False)
class CurveFit:
    """A fitted curve and how far it is from what it was fitted to.

    Attributes
    ----------
    curve : DiscountCurve
        A NelsonSiegel or Svensson where one was fitted.
    residual_price : ndarray, shape (m,)
        Value on the curve less the value quoted, bond by bond, in the unit of the quotes.
    residual_bp : ndarray, shape (m,)
        Yield at the value on the curve less yield at the value quoted, both continuous [basis points].
    rmse_bp : float
        Root of the mean square of `residual_bp` over the bonds used [basis points].
    largest_bp : float
        The largest absolute value of `residual_bp` among them [basis points].
    converged : bool
        Whether the search came to rest.
    evaluations : int
        How often the bonds were valued in the last part of the search.
    is_used : ndarray of bool, shape (m,)
        Whether the curve was fitted to the bond: not to those beyond a last liquid point.
    """

    curve: DiscountCurve
    residual_price: FloatArray
    residual_bp: FloatArray
    rmse_bp: float
    largest_bp: float
    converged: bool = True
    evaluations: int = 0
    is_used: NDArray[np.bool_] = field(default_factory=lambda: np.ones(0, dtype=np.bool_))

    def __post_init__(self) -> None:
        """Every bond is used where nothing else is said."""
        if self.is_used.shape != self.residual_bp.shape:
            object.__setattr__(self, "is_used", np.ones(self.residual_bp.shape, dtype=np.bool_))
        self.is_used.flags.writeable = False


def measured_fit(
    curve: DiscountCurve,
    flows: QuotedFlows,
    *,
    is_used: NDArray[np.bool_] | None = None,
    converged: bool = True,
    evaluations: int = 0,
) -> CurveFit:
    """How far any curve is from bonds.

    Parameters
    ----------
    curve : DiscountCurve
    flows : QuotedFlows
    is_used : ndarray of bool, shape (m,), optional
        The bonds it was fitted to, at least one; all of them when left out.
    converged : bool
    evaluations : int
    """
    used = np.ones(len(flows), dtype=np.bool_) if is_used is None else is_used.copy()
    worth = flows.values(curve)
    residual_price = worth - flows.target
    residual_bp = 1e4 * (flow_yields(flows, target=worth) - flow_yields(flows))
    for array in (residual_price, residual_bp):
        array.flags.writeable = False
    return CurveFit(
        curve=curve,
        residual_price=residual_price,
        residual_bp=residual_bp,
        rmse_bp=float(np.sqrt(np.mean(residual_bp[used] ** 2))),
        largest_bp=float(np.abs(residual_bp[used]).max()),
        converged=converged,
        evaluations=evaluations,
        is_used=used,
    )


def fit_nelson_siegel(flows: QuotedFlows) -> CurveFit:
    """The curve of Nelson and Siegel nearest to the bonds; see `fit_svensson`."""
    return _fitted(flows, 1, _nelson_siegel)


def fit_svensson(flows: QuotedFlows) -> CurveFit:
    """The curve of Svensson nearest to the bonds.

    Parameters
    ----------
    flows : QuotedFlows
        Bonds in any order, any number of them maturing together; payments and values above 0.

    Returns
    -------
    CurveFit

    Raises
    ------
    CurveError
        If there are fewer bonds than parameters (6; 4 for Nelson-Siegel) or a bond has no yield.

    Notes
    -----
    The sum of squares of price errors, each divided by price times duration, is made least: to first order
    these are errors of yield (Gürkaynak, R., Sack, B. and Wright, J. (2007), The U.S. Treasury yield curve:
    1961 to the present, J. Monetary Economics 54, section 3).

    Given the decays, and to first order about known zero rates, the other parameters are a linear least
    squares problem (variable projection; Golub, G.H. and Pereyra, V. (1973), SIAM J. Numerical Analysis 10).
    It is solved for all pairs of a grid of decays, at first about each bond's own yield; from the lowest
    points of that landscape all parameters are improved together within bounds for the decays. The best curve
    then takes the place of the yields, until a round gains nothing: a landscape about flat yields alone leads
    to lesser minima where the curve is steep.
    """
    return _fitted(flows, 2, _svensson)


def _nelson_siegel(numbers: FloatArray) -> NelsonSiegel:
    level, slope, curvature, decay = numbers.tolist()
    return NelsonSiegel(level, slope, curvature, decay)


def _svensson(numbers: FloatArray) -> Svensson:
    return Svensson(*numbers.tolist())


def _fitted(
    flows: QuotedFlows, humps: int, make: Callable[[FloatArray], NelsonSiegel | Svensson]
) -> CurveFit:
    count = 2 + 2 * humps
    if len(flows) < count:
        raise CurveError(
            f"there are {len(flows)} quotes for a curve of {count} parameters",
            "Give more, or take a curve of fewer parameters.",
        )
    yields = flow_yields(flows)
    if np.isnan(yields).any():
        raise CurveError(
            "the quote has no yield",
            "Correct its price or leave it out.",
            rows=np.flatnonzero(np.isnan(yields)).tolist(),
        )
    problem = _Problem(flows, yields, humps)
    best = problem.solved()
    curve = make(best.numbers)
    return measured_fit(curve, flows, converged=best.converged, evaluations=best.evaluations)


@dataclass(frozen=True, eq=False)
class _Found:
    numbers: FloatArray
    cost: float
    converged: bool
    evaluations: int


class _Problem:
    """Errors of yield, by the rates β and then the logarithms of the decays τ."""

    def __init__(self, flows: QuotedFlows, yields: FloatArray, humps: int) -> None:
        self._flows, self._yields, self._humps = flows, yields, humps
        self._times, self._time_of = np.unique(flows.time, return_inverse=True)
        worth = flows.amount * np.exp(-yields[flows.instrument] * flows.time)
        self._scale = flows.sums(worth * flows.time)  # price times duration

    def solved(self) -> _Found:
        """The best parameters found, decays themselves in the place of their logarithms."""
        best: _Found | None = None
        known = self._yields[self._flows.instrument]
        for _ in range(_ROUNDS):
            tried = [self._improved(start, _FEW_EVALUATIONS) for start in self._starts(known)]
            tried.sort(key=lambda one: one.cost)
            finalists = [
                one if one.converged else self._improved(one.numbers, _MOST_EVALUATIONS)
                for one in tried[:_FINALISTS]
            ]
            found = min(finalists, key=lambda one: one.cost)
            if best is not None and found.cost >= _BETTER * best.cost:
                best = min(best, found, key=lambda one: one.cost)
                break
            best = found
            known = self._zero(best.numbers)[self._time_of]
        assert best is not None
        rates = 2 + self._humps
        numbers = np.concatenate((best.numbers[:rates], np.exp(best.numbers[rates:])))
        return _Found(numbers, best.cost, best.converged, best.evaluations)

    def _zero(self, numbers: FloatArray) -> FloatArray:
        """Zero rates at the times of payments."""
        rates, decays = numbers[: 2 + self._humps], np.exp(numbers[2 + self._humps :])
        parts = [loadings(self._times, decay) for decay in decays]
        shapes = [np.ones(self._times.size), parts[0][0], *(hump for _, hump in parts)]
        return np.asarray(rates @ np.stack(shapes))

    def _starts(self, known: FloatArray) -> list[FloatArray]:
        """The lowest points of the grid of decays, the rates solved for about zero rates at each payment."""
        flows = self._flows
        with np.errstate(over="ignore", under="ignore"):
            worth = flows.amount * np.exp(-known * flows.time)
        exposure = worth * flows.time
        total = flows.sums(exposure)
        # What a zero rate at each payment weighs in the yield, to first order.
        share = exposure / total[flows.instrument]
        goal = flows.sums(share * known) + (flows.sums(worth) - flows.target) / total
        flat = np.ones(len(flows))
        columns = [
            [flows.sums(share * part[self._time_of]) for part in loadings(self._times, decay)]
            for decay in _DECAYS
        ]
        landscape: dict[tuple[int, ...], tuple[float, FloatArray]] = {}
        for chosen in combinations(range(_DECAYS.size), self._humps):
            slope = columns[chosen[0]][0]
            matrix = np.stack([flat, slope, *(columns[one][1] for one in chosen)], axis=1)
            rates, *_ = np.linalg.lstsq(matrix, goal, rcond=1e-10)
            miss = float(np.sum((matrix @ rates - goal) ** 2))
            landscape[chosen] = miss, np.concatenate((rates, np.log(_DECAYS[list(chosen)])))
        steps = list(product((-1, 0, 1), repeat=self._humps))
        lowest = [
            pair
            for chosen, pair in landscape.items()
            if all(pair[0] <= landscape.get(tuple(np.add(chosen, step).tolist()), pair)[0] for step in steps)
        ]
        lowest.sort(key=lambda pair: pair[0])
        return [numbers for _, numbers in lowest[:_STARTS]]

    def _improved(self, start: FloatArray, most_evaluations: int) -> _Found:
        """From one start towards the nearest least sum of squares."""
        from scipy.optimize import least_squares

        rates = 2 + self._humps
        lowest = np.full(start.size, -_LARGEST_RATE)
        highest = -lowest
        lowest[rates:], highest[rates:] = np.log(_SHORTEST_DECAY), np.log(_LONGEST_DECAY)
        begin = np.clip(start, lowest + 1e-9, highest - 1e-9)

        known: dict[bytes, FloatArray] = {}

        def errors(numbers: FloatArray) -> FloatArray:
            miss, slope = self._errors(numbers)
            # Slopes are asked for where errors were last found to be lower, or just now.
            if len(known) > _FEW_EVALUATIONS:
                known.clear()
            known[numbers.tobytes()] = slope
            return miss

        def slopes(numbers: FloatArray) -> FloatArray:
            slope = known.get(numbers.tobytes())
            return self._errors(numbers)[1] if slope is None else slope

        found = least_squares(
            errors,
            begin,
            jac=slopes,
            bounds=(lowest, highest),
            x_scale="jac",
            ftol=1e-15,
            xtol=1e-10,
            gtol=1e-15,
            max_nfev=most_evaluations,
        )
        return _Found(np.array(found.x), float(found.cost), bool(found.status > 0), int(found.nfev))

    def _errors(self, numbers: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Errors of yield, shape (m,) [percent], and their derivatives, shape (m, parameters)."""
        humps, times = self._humps, self._times
        rates, decays = numbers[: 2 + humps], np.exp(numbers[2 + humps :])
        tilt, hump = loadings(times, decays[0])
        shapes = [np.ones(times.size), tilt, hump]
        bends = [rates[1] * _tilt_by_log_decay(hump) + rates[2] * _hump_by_log_decay(times, decays[0], hump)]
        if humps == 2:
            _, second = loadings(times, decays[1])
            shapes.append(second)
            bends.append(rates[3] * _hump_by_log_decay(times, decays[1], second))
        # dimensions: parameter, time
        by_number = np.stack([*shapes, *bends])
        zero = rates @ by_number[: 2 + humps]
        with np.errstate(over="ignore", under="ignore"):
            # Bounded, so that a stray step meets large errors and not infinite ones.
            worth = self._flows.amount * np.exp(np.minimum(-zero * times, _LARGEST_EXPONENT)[self._time_of])
        miss = (self._flows.sums(worth) - self._flows.target) / self._scale
        exposure = worth * self._flows.time
        slope = np.stack([self._flows.sums(exposure * part[self._time_of]) for part in by_number], axis=1)
        return 100.0 * miss, -100.0 * slope / self._scale[:, None]


def _tilt_by_log_decay(hump: FloatArray) -> FloatArray:
    """With x = t/τ, ``d/d ln τ (1 - e^{-x})/x = (1 - e^{-x})/x - e^{-x}``, the curvature's loading."""
    return hump


def _hump_by_log_decay(time: FloatArray, decay: float, hump: FloatArray) -> FloatArray:
    """``d/d ln τ`` of the curvature's loading: itself less ``x e^{-x}``."""
    ratio = time / decay
    with np.errstate(under="ignore"):
        return np.asarray(hump - ratio * np.exp(-ratio))
