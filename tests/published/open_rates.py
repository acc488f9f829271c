"""Histories of rates that come with open packages of statistics; nothing is fetched.

``arch`` (Sheppard, K.) carries US one-month Treasury bills from the research factors of Fama and French, 1926
to 2018, and Moody's seasoned corporate yields, 1919 to 2018; ``statsmodels`` carries US macroeconomic data,
1959 to 2009, with the three-month Treasury bill rate (Federal Reserve Bank of St. Louis), which it states to
be in the public domain.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

__all__ = ["bill_rates", "bill_returns", "corporate_yields"]

FloatArray = NDArray[np.float64]


@cache
def bill_rates() -> FloatArray:
    """Three-month bills by quarter, 1959 to the third quarter of 2009, shape (203,) [per cent a year]."""
    from statsmodels.datasets import macrodata

    return np.asarray(macrodata.load_pandas().data["tbilrate"], dtype=np.float64)


@cache
def bill_returns() -> FloatArray:
    """One-month bills by month, July 1926 to November 2018, shape (1109,) [per cent a month]."""
    from arch.data import frenchdata

    return np.asarray(frenchdata.load()["RF"], dtype=np.float64)


@cache
def corporate_yields() -> FloatArray:
    """Corporate bonds rated Aaa by month, 1919 to 2018, shape (1200,) [per cent a year]."""
    from arch.data import default

    return np.asarray(default.load()["AAA"], dtype=np.float64)
