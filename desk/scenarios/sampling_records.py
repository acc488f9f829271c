"""What sampling comes to: how results settle with the number of paths, and what a method of drawing gains."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book.arrays import FloatArray, IntArray

__all__ = ["Convergence", "SamplingGain"]


@dataclass(frozen=True)
class Convergence:
    """A headline figure after part of the paths, each array shape (k,).

    Attributes
    ----------
    figure : str
        What it is, in words.
    is_money : bool
        Whether it is an amount [currency]; otherwise it is a plain number.
    paths : ndarray of int
        Rising; the last are all.
    value, se : ndarray
        With standard error.
    low, high : ndarray
        95 % interval.
    """

    figure: str
    is_money: bool
    paths: IntArray
    value: FloatArray
    se: FloatArray
    low: FloatArray
    high: FloatArray


@dataclass(frozen=True)
class SamplingGain:
    """How much smaller the variance of a headline figure is than plain sampling with as many paths gives.

    The plain variance is estimated from the paths of the same run.

    Attributes
    ----------
    figure : str
    plain_se, se : float
        Standard error that plain sampling would have, and that of the run.
    gain : float
        ``(plain_se/se)²``: as many times more paths plain sampling would need; infinite where the run has no
        sampling error left.
    low, high : float
        95 % interval of the gain, by the chi-square law of the variance between replicates.
    """

    figure: str
    plain_se: float
    se: float
    gain: float
    low: float
    high: float
