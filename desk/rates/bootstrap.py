"""Zero rates at which every quoted instrument is worth what it is quoted at."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import Curve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.one_by_one import in_turn
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.rates.sensitivity import exponents
from desk.rates.small_products import small_product

__all__ = ["MENDS", "bootstrap"]

FloatArray = NDArray[np.float64]

_CHECK = "Check this quote and those beside it."
_LOCAL_ONE = "Take the interpolation log-linear or linear-zero."
MENDS = (_CHECK, _LOCAL_ONE)
"""What would mend instruments that no curve gives back, whatever they are."""
_MOST_STEPS = 60
_MOST_HALVINGS = 25
_REACHED = 1e-15  # of what an instrument is worth
_ALLOWED = 1e-13  # likewise, where rounding bars the way to less
_LONGEST_STEP = 3.0  # in the exponent zero rate · time
_LOCAL = (Interpolation.LOG_LINEAR, Interpolation.LINEAR_ZERO)
_MOST_TOGETHER = 1000  # quotes whose zero rates are found together
_MOST_WORK, _MOST_TRIALS = 4e7, 200  # of one search among many: derivatives of values by rates, trials
_MOST_TRIED = 100  # quotes among which the first that does not fit is looked for


def bootstrap(flows: QuotedFlows, *, interpolation: Interpolation = Interpolation.LOG_LINEAR) -> Curve:
    """The curve on which every instrument is worth its value.

    Parameters
    ----------
    flows : QuotedFlows
        The instruments, in the order of their last payments, no two of which are at one time.
    interpolation : Interpolation
        What is drawn between the last payments, which are the terms of the curve.

    Returns
    -------
    Curve
        It gives back the values within 1e-12 of each.

    Raises
    ------
    CurveError
        If the instruments are out of order or two end together, or no curve gives back their values; `rows`
        names the instruments. If there are more than 1,000 of them, with a `cubic-zero` or `monotone-convex`
        interpolation.

    Notes
    -----
    With `log-linear` and `linear-zero` interpolation each instrument tells the one zero rate at its end,
    given those before it, so they are found one after the other; the time taken grows with the number of
    payments. With the others a later rate moves the curve before it, and all zero rates are found together by
    Newton's method. Each begins at the yield of its own instrument; a step that leads away from the values is
    halved.
    """
    flows.require_rising_terms()
    interpolation = Interpolation(interpolation)
    start = flow_yields(flows)
    start = np.where(np.isfinite(start), start, 0.0)
    if interpolation in _LOCAL and flows.amount.min() > 0.0:
        rates, row = in_turn(flows, interpolation, start)
        if row is not None:
            raise _misfit(flows, row, _known_worth(flows, interpolation, row, rates))
        return Curve(flows.term, rates, interpolation)
    if len(flows) > _MOST_TOGETHER:
        raise CurveError(
            f"there are {len(flows):,} quotes, and a curve that gives all of them back can be found for at "
            f"most {_MOST_TOGETHER:,} with the interpolation {interpolation.value}",
            _LOCAL_ONE,
        )
    together = _solved(flows, interpolation, start)
    if together is None:
        raise _diagnosis(flows, interpolation, start)
    return Curve(flows.term, together, interpolation)


class _Equations:
    """Values less targets by zero rates, each divided by what the instrument is worth."""

    def __init__(self, flows: QuotedFlows, interpolation: Interpolation) -> None:
        self._flows = flows
        self._scale = np.maximum(np.abs(flows.target), 1e-3 * flows.sums(np.abs(flows.amount)))
        # Many instruments pay on the same days.
        times, self._time_of = np.unique(flows.time, return_inverse=True)
        self._exponents = exponents(flows.term, times, interpolation)

    def at(self, rates: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Relative differences, shape (m,), and their derivatives by the rates, shape (m, m)."""
        flows, count = self._flows, rates.size
        found = self._exponents(rates)
        worth = flows.amount * np.exp(-found.value)[self._time_of]
        # dimensions: instrument, number that tells the curve
        by_number = np.zeros(count * len(found.by_rate))
        for place, factor in zip(found.place, found.factor, strict=True):
            cell = flows.instrument * len(found.by_rate) + place[self._time_of]
            by_number += np.bincount(cell, worth * factor[self._time_of], by_number.size)
        slope = -small_product(by_number.reshape(count, -1), found.by_rate)
        return (flows.sums(worth) - flows.target) / self._scale, slope / self._scale[:, None]


def _solved(flows: QuotedFlows, interpolation: Interpolation, start: FloatArray) -> FloatArray | None:
    """The zero rates at the terms; None where none are found."""
    # Where the search strays numbers may overflow; it then ends without a curve.
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        equations = _Equations(flows, interpolation)
        rates = start
        miss, slope = equations.at(rates)
        left = _MOST_STEPS * _MOST_HALVINGS
        if len(flows) > _MOST_TRIED:
            left = min(_MOST_TRIALS, int(_MOST_WORK / len(flows) ** 2))
        for _ in range(_MOST_STEPS):
            largest = float(np.abs(miss).max())
            if largest <= _REACHED:
                return rates
            try:
                step = np.linalg.solve(slope, -miss)
            except np.linalg.LinAlgError:
                break
            longest = float((np.abs(step) * flows.term).max())
            if not np.isfinite(longest):
                break
            step *= min(1.0, _LONGEST_STEP / longest) if longest > 0.0 else 1.0
            size = float(np.linalg.norm(miss))
            for _ in range(_MOST_HALVINGS):
                left -= 1
                if left < 0:
                    return None
                ahead, ahead_slope = equations.at(rates + step)
                if np.linalg.norm(ahead) < size:
                    break
                if largest <= _ALLOWED:
                    return rates  # what is left is rounding
                step = 0.5 * step
            else:
                return None
            rates, miss, slope = rates + step, ahead, ahead_slope
        return rates if float(np.abs(miss).max()) <= _ALLOWED else None


def _diagnosis(flows: QuotedFlows, interpolation: Interpolation, start: FloatArray) -> CurveError:
    """The first instrument with which the ones before it give no curve."""
    works, fails = 0, len(flows)
    if fails > _MOST_TRIED:
        if flows.amount.min() > 0.0:
            rates, first = in_turn(flows, Interpolation.LOG_LINEAR, start)
            if first is not None:
                return _misfit(flows, first, _known_worth(flows, Interpolation.LOG_LINEAR, first, rates))
        return CurveError(
            f"no curve with the interpolation {interpolation.value} was found that gives all {fails:,} "
            "quotes what they are quoted at",
            _LOCAL_ONE,
        )
    while fails - works > 1:
        middle = (works + fails) // 2
        if _solved(flows.leading(middle), interpolation, start[:middle]) is None:
            fails = middle
        else:
            works = middle
    row = fails - 1
    known = 0.0
    if works:
        earlier = _solved(flows.leading(works), interpolation, start[:works])
        if earlier is not None:
            known = _known_worth(flows, interpolation, row, earlier)
    return _misfit(flows, row, known)


def _misfit(flows: QuotedFlows, row: int, known: float) -> CurveError:
    """That a quote does not fit those before it, on which a part of its payments is worth `known`."""
    why = ""
    if row and known >= flows.target[row]:
        why = ", because what it pays up to the quote before it is already worth as much"
    return CurveError(
        f"no curve gives the quote at {float(flows.term[row]):g} years what it is quoted at{why}",
        _CHECK,
        rows=(row,),
    )


def _known_worth(flows: QuotedFlows, interpolation: Interpolation, row: int, rates: FloatArray) -> float:
    """What a quote pays up to the one before it, valued on the curve through those before it."""
    if not row:
        return 0.0
    earlier = Curve(flows.term[:row], rates[:row], interpolation)
    own = flows.instrument == row
    time, amount = flows.time[own], flows.amount[own]
    known = time <= earlier.last_term
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        return float(amount[known] @ earlier.discount(time[known]))
