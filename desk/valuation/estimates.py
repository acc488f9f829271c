"""First estimates from a standing: what a small move of all rates would do."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.valuation.records import KeyRates, Standing

__all__ = ["BASIS_POINT", "key_rate_gap", "surplus_change"]

BASIS_POINT = 1e-4


def surplus_change(standing: Standing, rate_move: float) -> float:
    """First estimate of the change in surplus when all zero rates move together.

    Parameters
    ----------
    standing : Standing
    rate_move : float
        Move of the continuous zero rates [1/year]; negative for a fall.

    Returns
    -------
    float
        ``-G · rate_move / 0.0001`` [currency], with G the DV01 gap. Convexity is left out, so for a large
        move it is a first estimate only.
    """
    return -standing.dv01_gap * rate_move / BASIS_POINT


def key_rate_gap(key_rates: KeyRates) -> FloatArray:
    """DV01 of the assets less that of the liabilities at each key rate, shape (k,) [currency]."""
    return np.asarray(key_rates.dv01_assets - key_rates.dv01_liabilities)
