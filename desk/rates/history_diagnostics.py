"""Whether what a model leaves unexplained looks as the model says: independent standard normal residuals."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["ResidualTests", "residual_tests"]

FloatArray = NDArray[np.float64]

_LEVEL = 0.01  # a remark is made when chance alone would do worse this seldom


@dataclass(frozen=True, eq=False)
class ResidualTests:
    """Tests of standardised residuals, which under the model are independent standard normal.

    Attributes
    ----------
    residual : ndarray, shape (n,)
        By the exact law of each step: the normal quantile of the distribution function at what came.
    autocorrelation : ndarray, shape (lags,)
        Of the residuals at lags 1, 2, ...
    squared_autocorrelation : ndarray, shape (lags,)
        Of their squares; large ones mean that quiet and wild times come in stretches.
    band : float
        Autocorrelations outside ± this are unusual at 5 %: ``1.96/√n``.
    ljung_box, ljung_box_p : float
        Of all lags together; Ljung and Box (1978), On a measure of lack of fit, Biometrika 65.
    squared_ljung_box, squared_ljung_box_p : float
        The same of the squares; McLeod and Li (1983), J. Time Series Analysis 4.
    skewness, kurtosis : float
        Of the residuals; 0 and 3 under the model.
    jarque_bera, jarque_bera_p : float
        Of normality; Jarque and Bera (1980), Economics Letters 6.
    kolmogorov, kolmogorov_p : float
        Largest distance of the distribution from the normal one (Kolmogorov-Smirnov). The parameters were
        estimated from the same history, so this chance is too large rather than too small.
    remarks : tuple of str
        What is not as the model says, in words.
    """

    residual: FloatArray
    autocorrelation: FloatArray
    squared_autocorrelation: FloatArray
    band: float
    ljung_box: float
    ljung_box_p: float
    squared_ljung_box: float
    squared_ljung_box_p: float
    skewness: float
    kurtosis: float
    jarque_bera: float
    jarque_bera_p: float
    kolmogorov: float
    kolmogorov_p: float
    remarks: tuple[str, ...]


def residual_tests(residual: ArrayLike, *, lags: int | None = None) -> ResidualTests:
    """Tests of residuals that ought to be independent standard normal.

    Parameters
    ----------
    residual : array_like, shape (n,)
        At least 8.
    lags : int, optional
        Lags of the autocorrelations; by default the lesser of 12 and a fifth of n.

    Raises
    ------
    ValueError
        If there are too few residuals or they do not vary.
    """
    from scipy.special import chdtrc, kolmogorov, ndtr

    values = np.array(residual, dtype=np.float64)
    if values.ndim != 1 or values.size < 8 or not np.isfinite(values).all() or np.ptp(values) == 0.0:
        raise ValueError("`residual` must hold at least 8 numbers that are not all equal")
    values.flags.writeable = False
    count = values.size
    chosen = min(12, count // 5) if lags is None else lags
    if not 1 <= chosen < count:
        raise ValueError("`lags` must be at least 1 and below the number of residuals")
    own, squared = _autocorrelation(values, chosen), _autocorrelation(values**2, chosen)
    weight = count * (count + 2.0) / (count - np.arange(1, chosen + 1))
    box, squared_box = float(weight @ own**2), float(weight @ squared**2)
    centred = values - values.mean()
    spread = float(np.mean(centred**2))
    skewness = float(np.mean(centred**3)) / spread**1.5
    kurtosis = float(np.mean(centred**4)) / spread**2
    jarque_bera = count / 6.0 * (skewness**2 + 0.25 * (kurtosis - 3.0) ** 2)
    chance, ranks = ndtr(np.sort(values)), np.arange(count + 1) / count
    distance = float(max(np.max(ranks[1:] - chance), np.max(chance - ranks[:-1])))
    root = math.sqrt(count)
    found = ResidualTests(
        residual=values,
        autocorrelation=own,
        squared_autocorrelation=squared,
        band=1.959963984540054 / math.sqrt(count),
        ljung_box=box,
        ljung_box_p=float(chdtrc(chosen, box)),
        squared_ljung_box=squared_box,
        squared_ljung_box_p=float(chdtrc(chosen, squared_box)),
        skewness=skewness,
        kurtosis=kurtosis,
        jarque_bera=jarque_bera,
        jarque_bera_p=math.exp(-0.5 * jarque_bera),
        kolmogorov=distance,
        # Stephens (1970), Use of the Kolmogorov-Smirnov ... statistics without extensive tables, J. Royal
        # Statistical Society B 32: the limit law with the root of n corrected for small samples.
        kolmogorov_p=float(kolmogorov((root + 0.12 + 0.11 / root) * distance)),
        remarks=(),
    )
    object.__setattr__(found, "remarks", _remarks(found))
    return found


def _autocorrelation(values: FloatArray, lags: int) -> FloatArray:
    centred = values - values.mean()
    total = float(centred @ centred)
    sums = np.array([float(centred[lag:] @ centred[:-lag]) for lag in range(1, lags + 1)])
    return sums / total if total > 0.0 else np.zeros(lags)


def _remarks(found: ResidualTests) -> tuple[str, ...]:
    remarks = []
    if min(found.jarque_bera_p, found.kolmogorov_p) < _LEVEL:
        tails = "extremes are more frequent" if found.kurtosis > 3.0 else "extremes are rarer"
        lean = (
            "" if abs(found.skewness) < 0.3 else f", and they lean {'up' if found.skewness > 0 else 'down'}"
        )
        remarks.append(
            f"The residuals are not normal (skewness {found.skewness:.2f}, kurtosis {found.kurtosis:.1f} "
            f"against 3): {tails} than the model says{lean}."
        )
    if found.ljung_box_p < _LEVEL:
        remarks.append(
            f"The residuals follow one another (autocorrelation {found.autocorrelation[0]:.2f} at the first "
            "lag): the rate remembers more than where it last was, which a model of one factor does not "
            "allow for."
        )
    if found.squared_ljung_box_p < _LEVEL:
        remarks.append(
            "Quiet and wild times come in stretches: the volatility was not the one number the model "
            "takes it for."
        )
    return tuple(remarks)
