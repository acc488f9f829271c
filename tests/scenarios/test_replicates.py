"""Samples summed up with and without replicates: the errors told are the errors made."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy.special import ndtri

from desk.book.arrays import FloatArray
from desk.scenarios.convergence import Headline, Statistic, converging, headline_figures, sampling_gain
from desk.scenarios.replicates import Sample, Summing
from desk.scenarios.summaries import quantile_error, tail_mean, tail_mean_error

LEVELS = (5.0, 40.0, 90.0)
REPLICATES, PATHS = 16, 64


def antithetic(seed: int) -> FloatArray:
    """Lognormal values in mirrored pairs, the paths of each replicate side by side."""
    half = np.random.default_rng(seed).standard_normal((REPLICATES, PATHS // 2))
    return np.exp(0.4 * np.stack([half, -half], axis=-1)).reshape(-1)


def stratified(seed: int) -> FloatArray:
    """Lognormal values, one in each of as many strata as a replicate has paths, shuffled."""
    rng = np.random.default_rng(seed)
    cell = rng.permuted(np.tile(np.arange(PATHS), (REPLICATES, 1)), axis=1)
    return np.exp(0.4 * ndtri((cell + rng.uniform(size=cell.shape)) / PATHS)).reshape(-1)


def figures(sample: Sample) -> list[float]:
    return [
        sample.moments.mean,
        sample.moments.sd,
        *sample.percentile.tolist(),
        *sample.tail_mean.tolist(),
        sample.below_zero,
    ]


def errors(sample: Sample) -> list[float]:
    return [
        sample.moments.mean_se,
        sample.moments.sd_se,
        *sample.percentile_se.tolist(),
        *sample.tail_mean_se.tolist(),
        sample.below_zero_se,
    ]


Draw = Callable[[int], FloatArray]


@pytest.mark.parametrize("draw", [antithetic, stratified])
def test_errors_from_replicates_are_the_spread_over_many_runs(draw: Draw) -> None:
    summing = Summing(LEVELS, REPLICATES * PATHS, REPLICATES)
    found = [summing.sample(draw(seed) - 0.8) for seed in range(600)]
    made = np.std([figures(sample) for sample in found], axis=0)
    told = np.sqrt(np.mean(np.square([errors(sample) for sample in found]), axis=0))
    assert told == pytest.approx(made, rel=0.2)


@pytest.mark.parametrize("draw", [antithetic, stratified])
def test_intervals_from_replicates_hold_the_truth_as_often_as_they_say(draw: Draw) -> None:
    """95 of 100 times, within the binomial bounds of 600 runs; quantiles of strata are held oftener."""
    summing = Summing(LEVELS, REPLICATES * PATHS, REPLICATES)
    runs = 600
    held, held_mean = np.zeros(len(LEVELS)), 0
    truth = np.exp(0.4 * ndtri(np.array(LEVELS) / 100.0))
    for seed in range(runs):
        row = draw(seed)
        settled = converging(Headline("", row, Statistic.MEAN, False), replicates=REPLICATES)
        held_mean += bool(settled.low[-1] <= math.exp(0.08) <= settled.high[-1])
        interval = np.array(summing.sample(row).interval)
        held += (interval[:, 0] <= truth) & (truth <= interval[:, 1])
    bound = 3.5 * math.sqrt(0.95 * 0.05 / runs)
    assert abs(held_mean / runs - 0.95) < bound
    assert draw is stratified or np.all(held / runs < 0.95 + bound)
    assert np.all(held / runs > 0.95 - bound)


def test_errors_of_independent_values_are_the_spread_over_many_samples() -> None:
    """Quantiles (Woodruff 1952) and tail means (Manistre and Hancock 2005) of 2,000 samples of 400."""
    ordered = np.sort(np.exp(0.4 * np.random.default_rng(7).standard_normal((2000, 400))), axis=1)
    for share in (0.05, 0.5, 0.9):
        quantiles = np.quantile(ordered, share, axis=1)
        told = [float(quantile_error(row, [share])[0]) for row in ordered]
        assert np.mean(told) == pytest.approx(np.std(quantiles), rel=0.1)
        told = [tail_mean_error(row, share) for row in ordered]
        assert np.mean(told) == pytest.approx(np.std(tail_mean(ordered, share)), rel=0.1)


def test_tail_means_against_plain_sums() -> None:
    ordered = np.array([1.0, 2.0, 4.0, 8.0, 16.0, 32.0, 64.0, 128.0, 256.0, 512.0])
    assert float(tail_mean(ordered, 0.2)) == pytest.approx(1.5)
    assert float(tail_mean(ordered, 0.25)) == pytest.approx((1.0 + 2.0 + 0.5 * 4.0) / 2.5)
    assert float(tail_mean(ordered, 0.01)) == 1.0
    assert float(tail_mean(ordered, 0.99)) == 512.0
    assert float(tail_mean(ordered, 0.5)) == pytest.approx(np.mean(ordered[5:]))
    assert float(tail_mean(ordered, 0.85)) == pytest.approx((512.0 + 0.5 * 256.0) / 1.5)
    assert tail_mean(np.stack([ordered, 2.0 * ordered]), 0.3) == pytest.approx([7.0 / 3.0, 14.0 / 3.0])
    assert math.isnan(tail_mean_error(ordered, 0.1))
    assert tail_mean_error(np.full(100, 3.0), 0.1) == 0.0


def test_a_large_sample_of_large_values_has_finite_errors() -> None:
    ordered = np.sort(np.random.default_rng(1).uniform(size=1000)) * 1e300
    small = ordered * 1e-300
    assert tail_mean_error(ordered, 0.1) == pytest.approx(1e300 * tail_mean_error(small, 0.1))


def test_what_is_certain_has_no_error() -> None:
    for replicates in (1, 4):
        summing = Summing(LEVELS, 200, replicates)
        found, known = summing.sample(np.full(200, 3.0)), summing.certain(3.0)
        assert figures(found) == pytest.approx(figures(known))
        assert errors(known) == [0.0] * 9
        assert errors(found) == pytest.approx([0.0] * 9, abs=1e-15, nan_ok=True)


def test_every_replicate_has_as_many_paths() -> None:
    with pytest.raises(ValueError, match="as many"):
        Summing(LEVELS, 101, 4)


@pytest.mark.parametrize("replicates", [1, REPLICATES])
@pytest.mark.parametrize("is_matched", [False, True])
def test_figures_settle(replicates: int, is_matched: bool) -> None:
    row = antithetic(4) if replicates > 1 else np.exp(0.4 * np.random.default_rng(1).standard_normal(1024))
    for headline in headline_figures(row, (row, row, row - 0.8)):
        settled = converging(headline, replicates=replicates, is_matched=is_matched)
        assert settled.paths[-1] == 1024
        assert np.all(np.diff(settled.paths) > 0)
        assert settled.se[-1] < settled.se[-3]
        # A handful of values gives no lower bound of a low quantile.
        assert not np.any((settled.value < settled.low) | (settled.value > settled.high))
    assert settled.value[-1] == np.mean(row < 0.8)


@pytest.mark.parametrize("paths", [1, 2, 3, 17])
def test_a_few_paths_settle_too(paths: int) -> None:
    settled = converging(Headline("", np.arange(float(paths)), Statistic.MEAN, False))
    assert settled.paths[-1] == paths
    assert settled.value[-1] == (paths - 1) / 2
    assert math.isnan(settled.se[-1]) == (paths == 1)


def test_the_gain_is_the_ratio_of_the_variances_over_many_runs() -> None:
    """Antithetic against independent values: the variance of a pair's mean over that of two values is
    ``½(1 + corr(e^{sz}, e^{-sz}))·2/2``, here known in closed form."""
    share = 0.16
    correlation = -math.expm1(-share) * math.exp(share) / (math.exp(2 * share) - math.exp(share))
    correlation = (1.0 - math.exp(share)) / (math.exp(2.0 * share) - math.exp(share))
    known = 1.0 / (1.0 + correlation)
    gains = [
        sampling_gain(Headline("", antithetic(seed), Statistic.MEAN, False), replicates=REPLICATES)
        for seed in range(400)
    ]
    ratio = np.mean([gain.plain_se**2 for gain in gains]) / np.mean([gain.se**2 for gain in gains])
    assert ratio == pytest.approx(known, rel=0.1)
    held = np.mean([gain.low <= known <= gain.high for gain in gains])
    assert abs(held - 0.95) < 0.04


def test_a_run_without_any_error_left_has_an_infinite_gain() -> None:
    pairs = np.tile([1.0, 3.0], 32)
    gain = sampling_gain(Headline("", pairs, Statistic.MEAN, False), replicates=4)
    assert gain.se == 0.0
    assert gain.gain == math.inf
    nothing = sampling_gain(Headline("", np.ones(64), Statistic.MEAN, False), replicates=4)
    assert math.isnan(nothing.gain)


def test_a_chance_is_never_certain() -> None:
    """Of 1,024 paths none is below 0: Wilson's interval, ``z²/(n + z²)`` above."""
    for replicates in (1, REPLICATES):
        headline = Headline("", np.abs(antithetic(1)), Statistic.BELOW_ZERO, False)
        settled = converging(headline, replicates=replicates)
        square = float(ndtri(0.975)) ** 2
        assert (settled.value[-1], settled.low[-1]) == (0.0, pytest.approx(0.0, abs=1e-15))
        assert settled.high[-1] == pytest.approx(square / (1024 + square))
