"""Headline figures after part of the paths, and the gain of a method of drawing over plain sampling."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import Enum, auto

import numpy as np

from desk.book.arrays import FloatArray, owned_floats, owned_integers
from desk.scenarios.replicates import replicate_error, replicate_quantile, student_reach
from desk.scenarios.sampling_records import Convergence, SamplingGain
from desk.scenarios.summaries import quantile_error, quantile_interval, rank_interval, sorted_quantile

__all__ = ["Headline", "Statistic", "converging", "headline_figures", "sampling_gain"]

PARTS = (16, 8, 4, 2, 1)
"""A figure is shown after one part of so many of the paths."""

_LOW_SHARE = 0.05


class Statistic(Enum):
    """What is made of the values of all paths."""

    MEAN = auto()
    LOW_QUANTILE = auto()
    BELOW_ZERO = auto()


@dataclass(frozen=True)
class Headline:
    """A figure that a run is made for.

    Attributes
    ----------
    figure : str
        In words.
    values : ndarray, shape (paths,)
        In the order of the paths.
    statistic : Statistic
    is_money : bool
        Whether the figure is an amount [currency].
    """

    figure: str
    values: FloatArray
    statistic: Statistic
    is_money: bool


def headline_figures(account: FloatArray, sides: Sequence[FloatArray]) -> tuple[Headline, ...]:
    """The headline figures of a run.

    Parameters
    ----------
    account : ndarray, shape (paths,)
        ``R_T`` at the horizon.
    sides : sequence of ndarray, shape (paths,), length 3
        Present values of assets, liabilities and surplus.
    """
    assets, liabilities, surplus = sides
    return (
        Headline("mean of the savings account at the horizon", account, Statistic.MEAN, False),
        Headline("mean present value of assets", assets, Statistic.MEAN, True),
        Headline("mean present value of liabilities", liabilities, Statistic.MEAN, True),
        Headline("mean present value of surplus", surplus, Statistic.MEAN, True),
        Headline("5 % quantile of surplus", surplus, Statistic.LOW_QUANTILE, True),
        Headline("chance of a surplus below 0", surplus, Statistic.BELOW_ZERO, False),
    )


def converging(headline: Headline, *, replicates: int = 1, is_matched: bool = False) -> Convergence:
    """A figure after a sixteenth, an eighth and so on of the paths.

    Of independent paths the first are taken. Of replicates the first paths of each are, so that the interval
    rests on as many replicates at each number of paths; but where moments are matched, which they are over
    whole replicates only, it is the first replicates that are.

    Parameters
    ----------
    headline : Headline
    replicates : int
        1 where the paths are independent of each other.
    is_matched : bool
        Whether moments are matched.
    """
    rows: list[tuple[int, float, float, float, float]] = []
    for part in PARTS:
        chosen = _first_part(headline.values, part, replicates, is_matched)
        if chosen.size > 1 and (not rows or chosen.size > rows[-1][0]):
            rows.append((chosen.size, *_estimate(chosen, headline.statistic, is_plain=replicates == 1)))
    if not rows:
        (only,) = headline.values
        value = float(only < 0.0) if headline.statistic is Statistic.BELOW_ZERO else float(only)
        rows.append((1, value, math.nan, math.nan, math.nan))
    columns = list(zip(*rows, strict=True))
    return Convergence(
        headline.figure, headline.is_money, owned_integers(columns[0]), *map(owned_floats, columns[1:])
    )


def _first_part(values: FloatArray, part: int, replicates: int, is_matched: bool) -> FloatArray:
    """Values of part of the paths, shape (n,), or (replicates, n) where there are any."""
    if replicates == 1:
        return values[: values.size // part]
    apart = values.reshape(replicates, -1)
    if is_matched:
        count = replicates // part
        return apart[: count if count > 1 else 0]
    # Even, so that no pair is parted.
    return apart[:, : 2 * (apart.shape[1] // (2 * part))]


def _mean(values: FloatArray, statistic: Statistic) -> FloatArray:
    """Of the values, or of what is 1 below 0 and 0 otherwise, along the last axis."""
    if statistic is Statistic.MEAN:
        return np.asarray(values.mean(axis=-1))
    return np.asarray(np.count_nonzero(values < 0.0, axis=-1) / values.shape[-1])


def _estimate(
    values: FloatArray, statistic: Statistic, *, is_plain: bool
) -> tuple[float, float, float, float]:
    """A figure, its standard error and its interval."""
    if is_plain:
        return _plain_estimate(values, statistic)
    if statistic is Statistic.LOW_QUANTILE:
        return replicate_quantile(values, np.sort(values, axis=None), _LOW_SHARE)
    means = _mean(values, statistic)
    value, error = float(means.mean()), float(replicate_error(means))
    reach = student_reach(len(values)) * error
    low, high = value - reach, value + reach
    if statistic is Statistic.BELOW_ZERO:
        # Replicates that are all alike do not make a chance certain.
        low, high = (max(low, 0.0), min(high, 1.0)) if error > 0.0 else _share_interval(value, values.size)
    return value, error, low, high


def _plain_estimate(values: FloatArray, statistic: Statistic) -> tuple[float, float, float, float]:
    """As `_estimate`, for independent values."""
    count = values.size
    match statistic:
        case Statistic.MEAN:
            value, error = float(values.mean()), float(values.std(ddof=1)) / math.sqrt(count)
            reach = student_reach(count) * error
            return value, error, value - reach, value + reach
        case Statistic.LOW_QUANTILE:
            ordered = np.sort(values)
            value, error = _quantile_and_error(ordered)
            return value, error, *quantile_interval(ordered, rank_interval(count, _LOW_SHARE))
        case Statistic.BELOW_ZERO:
            share = float(_mean(values, statistic))
            return share, math.sqrt(share * (1.0 - share) / count), *_share_interval(share, count)


def _quantile_and_error(ordered: FloatArray) -> tuple[float, float]:
    value = float(sorted_quantile(ordered, [_LOW_SHARE])[0])
    return value, float(quantile_error(ordered, [_LOW_SHARE])[0])


def _share_interval(share: float, count: int) -> tuple[float, float]:
    """Wilson, E.B. (1927), Probable inference, J. American Statistical Association 22."""
    from scipy.special import ndtri

    square = float(ndtri(0.975)) ** 2 / count
    middle = (share + 0.5 * square) / (1.0 + square)
    reach = math.sqrt(square * (share * (1.0 - share) + 0.25 * square)) / (1.0 + square)
    return max(middle - reach, 0.0), min(middle + reach, 1.0)


def sampling_gain(headline: Headline, *, replicates: int) -> SamplingGain:
    """The gain of a variance-reduced run for one figure.

    Parameters
    ----------
    headline : Headline
    replicates : int
        At least 2; the paths of each stand side by side.
    """
    from scipy.special import chdtri

    values, statistic = headline.values, headline.statistic
    _, plain, _, _ = _plain_estimate(values, statistic)
    _, error, _, _ = _estimate(values.reshape(replicates, -1), statistic, is_plain=False)
    nothing_left = math.inf if plain > 0.0 else math.nan
    gain = (plain / error) ** 2 if error > 0.0 else nothing_left
    freedom = replicates - 1.0
    return SamplingGain(
        figure=headline.figure,
        plain_se=plain,
        se=error,
        gain=gain,
        # The variance between replicates over its mean is a chi-square number over its freedom.
        low=gain * float(chdtri(freedom, 0.975)) / freedom,
        high=gain * float(chdtri(freedom, 0.025)) / freedom,
    )
