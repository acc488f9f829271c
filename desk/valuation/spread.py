"""The spread at which a holding's flows are worth its market value."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray, IntArray
from desk.rates.curve import DiscountCurve
from desk.valuation.roots import solve_rates

__all__ = ["solve_spreads"]


def solve_spreads(
    holding: IntArray,
    time: FloatArray,
    amount: FloatArray,
    *,
    market_value: FloatArray,
    curve: DiscountCurve,
) -> FloatArray:
    """Spreads over the curve at which each holding is worth its market value.

    Parameters
    ----------
    holding : ndarray of int, shape (n,)
        Each flow's holding, from 0 to m - 1.
    time : ndarray, shape (n,)
        [years], at least 0.
    amount : ndarray, shape (n,)
        [currency]
    market_value : ndarray, shape (m,)
        With accrued interest [currency].
    curve : DiscountCurve

    Returns
    -------
    ndarray, shape (m,)
        s with ``Σ amount · P(0, time) · exp(-s · time) = market_value`` [1/year, continuously compounded];
        NaN where no spread does it.

    Notes
    -----
    The definition is common practice (a static spread over the zero curve); how it is solved stands with
    `desk.valuation.roots.solve_rates`.
    """
    return solve_rates(holding, time, np.asarray(amount * curve.discount(time)), target=market_value)
