"""What quoted instruments pay, and what that is worth: the one form in which quotes reach a curve."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.curve_error import CurveError

__all__ = ["QuotedFlows", "flow_yields"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_MOST_STEPS = 100
_LARGEST_STEP_DOWN = 50.0  # in the exponent rate · time: e^50 is far from the largest float
_SMALL_STEP = 1e-9  # in the exponent; the error left after the step is about its square


@dataclass(frozen=True, eq=False)
class QuotedFlows:
    """The payments of m instruments and what each instrument is worth.

    Attributes
    ----------
    instrument : ndarray of int, shape (n,)
        Each payment's instrument, from 0 to m - 1, never falling.
    time : ndarray, shape (n,)
        When it is paid [years], positive and finite.
    amount : ndarray, shape (n,)
        What is paid [currency].
    target : ndarray, shape (m,)
        What each instrument is worth today, accrued interest included [currency].

    Raises
    ------
    ValueError
        If the arrays do not fit together.
    CurveError
        If an instrument pays nothing, or a time, amount or value is no number.
    """

    instrument: IntArray
    time: FloatArray
    amount: FloatArray
    target: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check them."""
        for name, kind in (
            ("instrument", np.int64),
            ("time", np.float64),
            ("amount", np.float64),
            ("target", np.float64),
        ):
            array = np.array(getattr(self, name), dtype=kind)
            array.flags.writeable = False
            object.__setattr__(self, name, array)
        count = self.target.size
        if self.target.ndim != 1 or not count:
            raise CurveError("there is no quote", "Give at least one.")
        if not self.instrument.shape == self.time.shape == self.amount.shape == (self.instrument.size,):
            raise ValueError("`instrument`, `time` and `amount` must be of one length, in one dimension")
        if np.any(np.diff(self.instrument) < 0):
            raise ValueError("`instrument` must not fall")
        if self.instrument.size and (self.instrument[0] < 0 or self.instrument[-1] >= count):
            raise ValueError(f"`instrument` must be from 0 to {count - 1}")
        paid = np.bincount(self.instrument, minlength=count)
        _refuse(paid == 0, "the quote is of an instrument that pays nothing")
        right = np.isfinite(self.time) & (self.time > 0.0) & np.isfinite(self.amount)
        wrong = np.bincount(self.instrument[~right], minlength=count) > 0
        _refuse(wrong, "a payment of the quote is not a finite amount at a finite time ahead")
        _refuse(~np.isfinite(self.target), "the quote is not a number")

    def __len__(self) -> int:
        """The number of instruments m."""
        return self.target.size

    @cached_property
    def first_row(self) -> IntArray:
        """The first payment of each instrument, shape (m,)."""
        return np.asarray(np.flatnonzero(np.diff(self.instrument, prepend=-1)), dtype=np.int64)

    @cached_property
    def term(self) -> FloatArray:
        """When each instrument pays for the last time [years], shape (m,)."""
        return np.asarray(np.maximum.reduceat(self.time, self.first_row))

    def sums(self, per_flow: FloatArray) -> FloatArray:
        """Sums by instrument of numbers by payment, shape (n,) into (m,)."""
        return np.asarray(np.add.reduceat(per_flow, self.first_row))

    def values(self, curve: DiscountCurve) -> FloatArray:
        """What the instruments are worth on a curve [currency], shape (m,)."""
        return self.sums(self.amount * curve.discount(self.time))

    def leading(self, count: int) -> QuotedFlows:
        """The first few instruments alone, at least one."""
        end = self.first_row[count] if count < len(self) else self.instrument.size
        return QuotedFlows(self.instrument[:end], self.time[:end], self.amount[:end], self.target[:count])

    def taken(self, chosen: ArrayLike) -> QuotedFlows:
        """Some of the instruments, at least one, in the order of `chosen`, shape (k,)."""
        rows = np.asarray(chosen, dtype=np.int64)
        ends = np.append(self.first_row[1:], self.instrument.size)
        count = (ends - self.first_row)[rows]
        own = np.repeat(np.arange(rows.size), count)
        place = np.arange(own.size) - np.repeat(np.cumsum(count) - count, count) + self.first_row[rows][own]
        return QuotedFlows(own, self.time[place], self.amount[place], self.target[rows])

    def liquid(self, last_liquid_point: float) -> QuotedFlows:
        """The instruments that end at or before the last liquid point [years].

        Raises
        ------
        CurveError
            If they are out of order, or none is left.
        """
        self.require_rising_terms()
        used = int(np.sum(self.term <= last_liquid_point + 1e-9))
        if not used:
            raise CurveError(
                f"no quote is at or before the last liquid point, {last_liquid_point:g} years",
                "Set it later.",
            )
        return self.leading(used)

    def require_rising_terms(self) -> None:
        """Raise CurveError, naming the quotes, unless each instrument ends after the one before it."""
        falls = np.flatnonzero(np.diff(self.term) <= 0.0)
        if not falls.size:
            return
        row = int(falls[0]) + 1
        before, after = self.term[row - 1], self.term[row]
        if before == after:
            raise CurveError(
                f"two quotes stand at {after:g} years",
                "Keep one of them, or fit a smooth curve through all.",
                rows=(row - 1, row),
            )
        raise CurveError(
            f"the quote at {after:g} years stands after the one at {before:g} years",
            "Put the quotes in the order of their terms.",
            rows=(row,),
        )


def flow_yields(flows: QuotedFlows, *, target: ArrayLike | None = None) -> FloatArray:
    """The continuous rate at which each instrument is worth its value.

    Parameters
    ----------
    flows : QuotedFlows
    target : array_like, shape (m,), optional
        Values to take in the place of the instruments' own [currency].

    Returns
    -------
    ndarray, shape (m,)
        [1/year]; NaN where a payment or the value is not positive, which leaves no single rate.

    Notes
    -----
    The logarithm of the value is convex and falls in the rate, so Newton's method on it reaches the root
    from any start; the one step that may be too long is bounded.
    """
    worth = flows.target if target is None else np.asarray(target, dtype=np.float64)
    usable = (worth > 0.0) & (np.minimum.reduceat(flows.amount, flows.first_row) > 0.0)
    goal = np.where(usable, worth, 1.0)
    amount = np.where(usable[flows.instrument], flows.amount, 1.0)
    rate = np.zeros(len(flows))
    with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
        for _ in range(_MOST_STEPS):
            discounted = amount * np.exp(-rate[flows.instrument] * flows.time)
            total = flows.sums(discounted)
            step = np.log(total / goal) * total / flows.sums(discounted * flows.time)
            step = np.where(usable, np.maximum(step, -_LARGEST_STEP_DOWN / flows.term), 0.0)
            rate = rate + step
            if np.all(np.abs(step) * flows.term <= _SMALL_STEP):
                break
        else:
            usable &= np.abs(step) * flows.term <= _SMALL_STEP
    return np.where(usable & np.isfinite(rate), rate, np.nan)


def _refuse(wrong: NDArray[np.bool_], found: str) -> None:
    if wrong.any():
        raise CurveError(found, "Correct it or leave it out.", rows=np.flatnonzero(wrong).tolist())
