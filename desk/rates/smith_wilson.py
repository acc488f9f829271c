"""Smith-Wilson: a curve through quotes that goes on to an ultimate forward rate.

References
----------
Smith, A. and Wilson, T. (2001), Fitting yield curves with long term constraints, Bacon & Woodrow research
report. Finanstilsynet (Norway) (2010), A technical note on the Smith-Wilson method. European Insurance and
Occupational Pensions Authority, Technical documentation of the methodology to derive EIOPA's risk-free
interest rate term structures, the section on the Smith-Wilson method.
"""

from __future__ import annotations

import math
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import Curve
from desk.rates.curve_error import CurveError
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.wilson import WilsonProducts, WilsonSums

__all__ = ["CONVERGENCE", "Extrapolation", "SmithWilsonCurve", "smith_wilson"]

CONVERGENCE = "convergence"
"""Subject of the errors that convergence point and tolerance mend."""

FloatArray = NDArray[np.float64]

# The search goes over alphas of six decimals, here in millionths, up to 20: within weeks of the last liquid
# point such a curve is at the ultimate rate.
_LOWEST_ALPHA = 50_000
_HIGHEST_ALPHA = 20_000_000
_COARSE_STEP = 25_000
_MILLIONTH = 1e-6

_CONVERGENCE_YEARS = 40.0
_EARLIEST_CONVERGENCE = 60.0
_GIVEN_BACK = 1e-9  # of a value: what bad conditioning may leave
# Years: closer times have one instantaneous forward but for the square of their distance.
_CLOSE = 1e-5


class Extrapolation(StrEnum):
    """How a curve goes on beyond the last liquid point."""

    FLAT_FORWARD = "flat-forward"
    SMITH_WILSON = "smith-wilson"


class SmithWilsonCurve(Curve):
    """A curve drawn by Wilson functions; `smith_wilson` fits one.

    ``P(t) = e^{-ωt} (1 + Σ c_j H(t, u_j))`` with ω the ultimate forward rate, u the times of the payments
    and H the kernel of `desk.rates.wilson`.

    Attributes
    ----------
    terms, zero_rates : ndarray, shape (q,)
        The last payments of the instruments [years] and the continuous zero rates there [1/year].
    last_term : float
        The last liquid point [years]; beyond it the curve is extrapolated.
    ultimate_forward_rate : float
        Compounded once a year [1/year].
    alpha : float
        Speed of convergence [1/year].
    convergence_point : float
        Where the forward rate has come to the ultimate one [years].
    zeta : ndarray, shape (q,)
        The weight of each instrument's kernel function.

    Notes
    -----
    `interpolation` says nothing of such a curve: it is drawn by Wilson functions between the terms too.
    """

    __slots__ = ("_sums", "_ultimate", "alpha", "convergence_point", "ultimate_forward_rate", "zeta")

    def __init__(
        self,
        terms: ArrayLike,
        *,
        payment_times: ArrayLike,
        weights: ArrayLike,
        zeta: ArrayLike,
        ultimate_forward_rate: float,
        alpha: float,
        convergence_point: float,
    ) -> None:
        self.ultimate_forward_rate = float(ultimate_forward_rate)
        self._ultimate = math.log1p(ultimate_forward_rate)
        self.alpha = float(alpha)
        self.convergence_point = float(convergence_point)
        self.zeta = np.array(zeta, dtype=np.float64)
        self.zeta.flags.writeable = False
        self._sums = WilsonSums.build(
            np.asarray(payment_times, dtype=np.float64), np.asarray(weights, dtype=np.float64), self.alpha
        )
        last = np.array(terms, dtype=np.float64)
        super().__init__(last, self.zero(last))

    def __repr__(self) -> str:
        """What the curve was made of."""
        return (
            f"SmithWilsonCurve(terms={self.terms.tolist()}, alpha={self.alpha:g}, "
            f"ultimate_forward_rate={self.ultimate_forward_rate:g})"
        )

    def _exponent(self, time: FloatArray) -> FloatArray:
        return np.asarray(self._ultimate * time - np.log1p(self._sums.value(time)))

    def discount(self, time: ArrayLike) -> FloatArray:
        """Discount factors ``P(0, time)``; see `Curve.discount`."""
        times = _times("time", time)
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(np.exp(-self._ultimate * times) * (1.0 + self._sums.value(times)))

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuously compounded zero rates [1/year]; see `Curve.zero`."""
        times = _times("time", time)
        today = times == 0.0
        over = self._exponent(times) / np.where(today, 1.0, times)
        return np.asarray(np.where(today, self.instantaneous_forward(0.0), over))

    def instantaneous_forward(self, time: ArrayLike) -> FloatArray:
        """Instantaneous forward rates ``-d ln P(0, t)/dt`` [1/year]; see `Curve.instantaneous_forward`."""
        times = _times("time", time)
        return np.asarray(self._ultimate - self._sums.slope(times) / (1.0 + self._sums.value(times)))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuously compounded forward rates from `start` to `end` [1/year]; see `Curve.forward`."""
        first, last = np.broadcast_arrays(_times("start", start), _times("end", end))
        close = np.abs(last - first) < _CLOSE
        gap = np.where(close, 1.0, last - first)
        over = (self._exponent(last) - self._exponent(first)) / gap
        return np.asarray(np.where(close, self.instantaneous_forward(0.5 * (first + last)), over))


def smith_wilson(
    flows: QuotedFlows,
    *,
    ultimate_forward_rate: float,
    last_liquid_point: float | None = None,
    convergence_point: float | None = None,
    tolerance: float = 1e-4,
    alpha: float | None = None,
) -> SmithWilsonCurve:
    """The Smith-Wilson curve through quoted instruments.

    Parameters
    ----------
    flows : QuotedFlows
        The instruments, in the order of their last payments, no two of which are at one time.
    ultimate_forward_rate : float
        Compounded once a year [1/year], above -1.
    last_liquid_point : float, optional
        Instruments that end later are left out [years]; by default none is.
    convergence_point : float, optional
        Where the forward rate has come to the ultimate one [years]; by default 40 years after the last
        liquid point, but no earlier than 60 years.
    tolerance : float
        How far the instantaneous forward rate may be from the ultimate one there [1/year].
    alpha : float, optional
        Speed of convergence [1/year]. By default the smallest of six decimals, at least 0.05, that keeps the
        tolerance.

    Returns
    -------
    SmithWilsonCurve

    Raises
    ------
    CurveError
        If the instruments are out of order or two end together; if none is liquid; if the convergence point
        is not beyond them; if no alpha up to 20 keeps the tolerance; if a discount factor is not above 0.

    Notes
    -----
    Coarse steps of 0.025 find the first alpha that keeps the tolerance, halving then the smallest between it
    and the step before. The gap at the convergence point T is ``α/|1 - κ e^{αT}|``, as published.
    """
    _require(
        math.isfinite(ultimate_forward_rate) and ultimate_forward_rate > -1.0,
        "the ultimate forward rate is not above -100 %",
        "Give it as a yearly rate.",
    )
    _require(tolerance > 0.0, "the tolerance is not above 0", "One basis point is usual.")
    liquid = float(flows.term[-1]) if last_liquid_point is None else last_liquid_point
    flows = flows.liquid(liquid)
    if convergence_point is None:
        convergence_point = max(liquid + _CONVERGENCE_YEARS, _EARLIEST_CONVERGENCE)
    _require(
        math.isfinite(convergence_point) and convergence_point > max(liquid, flows.term[-1]),
        f"the convergence point, {convergence_point:g} years, is not after the last liquid point, "
        f"{liquid:g} years",
        "Set it later.",
        subject=CONVERGENCE,
    )
    if alpha is not None:
        _require(math.isfinite(alpha) and alpha > 0.0, "alpha is not above 0", "Give a higher one, or none.")
    # With absurd rates numbers overflow; what comes of it then fails the checks below.
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        fit = _Fit(flows, ultimate_forward_rate)
        if alpha is None:
            alpha = fit.smallest_alpha(convergence_point, tolerance)
        weights, zeta = fit.weights(alpha)
        _require_positive(flows, fit.times, weights, alpha, convergence_point)
    curve = SmithWilsonCurve(
        flows.term,
        payment_times=fit.times,
        weights=weights,
        zeta=zeta,
        ultimate_forward_rate=ultimate_forward_rate,
        alpha=alpha,
        convergence_point=convergence_point,
    )
    miss = np.abs(flows.values(curve) - flows.target) / flows.sums(np.abs(flows.amount))
    if not miss.max() <= _GIVEN_BACK:
        raise CurveError(
            "the quotes are too alike for a Smith-Wilson curve to tell them apart",
            "Leave out one of those beside each other.",
            rows=[int(miss.argmax())],
        )
    return curve


class _Fit:
    """The linear equations of the curve, for any alpha."""

    def __init__(self, flows: QuotedFlows, ultimate_forward_rate: float) -> None:
        self.times, place = np.unique(flows.time, return_inverse=True)
        # dimensions: instrument, time
        deflated = np.zeros((len(flows), self.times.size))
        np.add.at(deflated, (flows.instrument, place), flows.amount)
        deflated *= np.exp(-math.log1p(ultimate_forward_rate) * self.times)
        self._deflated = deflated
        self._missing = flows.target - deflated.sum(axis=1)
        self._products = WilsonProducts(self.times, deflated)

    def weights(self, alpha: float) -> tuple[FloatArray, FloatArray]:
        """Weights of the payment times, and zeta."""
        try:
            zeta = np.linalg.solve(self._products.at(alpha), self._missing)
        except np.linalg.LinAlgError as error:
            raise CurveError(
                "the quotes do not determine a Smith-Wilson curve", "Leave out quotes that repeat others."
            ) from error
        return zeta @ self._deflated, zeta

    def gap(self, alpha: float, convergence_point: float) -> float:
        """How far the forward rate at the convergence point is from the ultimate one [1/year]."""
        weights, _ = self.weights(alpha)
        with np.errstate(under="ignore"):
            late = (
                np.exp(-alpha * (convergence_point - self.times)) * -0.5 * np.expm1(-2.0 * alpha * self.times)
            )
        # α/(1 - κ e^{αT}) with κ e^{αT} = (1 + α Σ cu)/(e^{-αT} Σ c sinh(αu)).
        pull = float(weights @ late)
        rest = 1.0 + alpha * float(weights @ self.times) - pull
        return abs(alpha * pull / rest) if rest != 0.0 else math.inf

    def smallest_alpha(self, convergence_point: float, tolerance: float) -> float:
        """The smallest alpha of six decimals that brings the gap within the tolerance."""

        def excess(millionths: int) -> float:
            return self.gap(millionths * _MILLIONTH, convergence_point) - tolerance

        high, at_low = _LOWEST_ALPHA, 0.0
        while not (at_high := excess(high)) <= 0.0:
            high, at_low = high + _COARSE_STEP, at_high
            if high > _HIGHEST_ALPHA:
                raise CurveError(
                    f"no alpha brings the forward rate at {convergence_point:g} years within "
                    f"{1e4 * tolerance:g} basis points of the ultimate one",
                    "Set a later convergence point or a wider tolerance.",
                    subject=CONVERGENCE,
                )
        low = high - (_COARSE_STEP if high > _LOWEST_ALPHA else 1)
        # By the line between the two ends (regula falsi), a little past where it meets 0, so that both ends
        # close in; by halves where that does not get on.
        halve = False
        while high - low > 1:
            middle = (low + high) // 2
            if not halve and math.isfinite(at_low):
                guess = low + (high - low) * at_low / (at_low - at_high)
                aside = max(1.0, 0.002 * (high - low))
                guess += aside if guess < middle else -aside
                middle = min(max(round(guess), low + 1), high - 1)
            width, found = high - low, excess(middle)
            if found <= 0.0:
                high, at_high = middle, found
            else:
                low, at_low = middle, found
            halve = not halve and 2 * (high - low) > width
        return round(high * _MILLIONTH, 6)


def _require_positive(
    flows: QuotedFlows, times: FloatArray, weights: FloatArray, alpha: float, convergence_point: float
) -> None:
    """Raise unless discount factors are above 0 everywhere."""
    sums = WilsonSums.build(times, weights, alpha)
    grid = np.union1d(times, np.linspace(0.0, convergence_point, 1001))
    worth = 1.0 + sums.value(grid)
    wrong = np.flatnonzero(~(worth > 0.0))
    if not wrong.size and 1.0 + sums.limit > 0.0:
        return
    when = float(grid[wrong[0]]) if wrong.size else convergence_point
    row = min(int(np.searchsorted(flows.term, when)), len(flows) - 1)
    raise CurveError(
        f"the discount factor at {when:g} years would not be above 0",
        "Check the quote there and those before it.",
        rows=(row,),
    )


def _require(right: bool | np.bool_, found: str, mend: str, *, subject: str = "") -> None:
    if not right:
        raise CurveError(found, mend, subject=subject)


def _times(name: str, time: ArrayLike) -> FloatArray:
    times = np.asarray(time, dtype=np.float64)
    # Written so that a NaN fails too.
    if times.size and not (times.min() >= 0.0 and times.max() < np.inf):
        raise ValueError(f"`{name}` must be finite and at least 0")
    return times
