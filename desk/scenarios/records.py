"""Results of a simulation: immutable records."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from desk.book import Fault, Measure, Provenance
from desk.book.arrays import FloatArray, IntArray
from desk.scenarios.sampling_records import Convergence, SamplingGain

if TYPE_CHECKING:
    from desk.scenarios.market_records import Diagnostics, IndexSummary, RiskySummary

__all__ = ["ClosedForm", "Distribution", "Histogram", "NodeSummary", "Repricing", "Simulation"]


@dataclass(frozen=True)
class Histogram:
    """Counts in bins.

    Attributes
    ----------
    edges : ndarray, shape (b + 1,)
    counts : ndarray of int, shape (b,)
        They sum to the number of paths.
    """

    edges: FloatArray
    counts: IntArray


@dataclass(frozen=True)
class NodeSummary:
    """A quantity summed up over the paths at each reported year; row 0 is year 0.

    Attributes
    ----------
    year : ndarray, shape (n,)
    mean, mean_se, sd, sd_se : ndarray, shape (n,)
        With standard errors.
    levels : tuple of float, length m
        Percentiles.
    percentile, percentile_low, percentile_high : ndarray, shape (n, m)
        Order statistics, and the 95 % interval of each: from order statistics, or from the replicates of a
        variance-reduced run.
    histograms : tuple of Histogram, length n
        One a year.
    percentile_se : ndarray, shape (n, m)
    tail_mean, tail_mean_se : ndarray, shape (n, m)
        Mean of the values at and below each percentile under 50, at and above each other one.
    """

    year: FloatArray
    mean: FloatArray
    mean_se: FloatArray
    sd: FloatArray
    sd_se: FloatArray
    levels: tuple[float, ...]
    percentile: FloatArray
    percentile_low: FloatArray
    percentile_high: FloatArray
    histograms: tuple[Histogram, ...]
    percentile_se: FloatArray
    tail_mean: FloatArray
    tail_mean_se: FloatArray


@dataclass(frozen=True)
class ClosedForm:
    """The law of ``ln R_t`` where it is normal, each shape (n,), by reported year.

    Attributes
    ----------
    log_mean, log_variance : ndarray
        Under the measure of the run.
    mean, sd : ndarray
        Of ``R_t``.
    percentile : ndarray, shape (n, m)
    tail_mean : ndarray, shape (n, m)
        As in `NodeSummary`.
    """

    log_mean: FloatArray
    log_variance: FloatArray
    mean: FloatArray
    sd: FloatArray
    percentile: FloatArray
    tail_mean: FloatArray


@dataclass(frozen=True)
class Repricing:
    """The check of ``E[1/R_t]`` against the curve, each shape (n,), by reported year.

    Attributes
    ----------
    year : ndarray
    mean_discount, mean_discount_se : ndarray
        Mean of ``1/R_t`` over the paths and its standard error.
    curve_discount : ndarray
        ``P(0, t)`` on the model's curve.
    expected_discount : ndarray
        What the mean should be under the measure of the run: `curve_discount` under the pricing measure;
        NaN where no closed form is known.
    """

    year: FloatArray
    mean_discount: FloatArray
    mean_discount_se: FloatArray
    curve_discount: FloatArray
    expected_discount: FloatArray


@dataclass(frozen=True)
class Distribution:
    """The pathwise present value of one side, or of the surplus, over the paths [currency].

    Attributes
    ----------
    name : str
        ``assets``, ``liabilities`` or ``surplus``.
    mean, se, sd : float
    levels : tuple of float, length m
    percentile, percentile_low, percentile_high : ndarray, shape (m,)
    curve : float
        The present value on the model's curve with the spreads of the basis.
    below_zero, below_zero_se : float
        Share of paths with a value below 0.
    histogram : Histogram
    percentile_se, tail_mean, tail_mean_se : ndarray, shape (m,)
        As in `NodeSummary`.
    """

    name: str
    mean: float
    se: float
    sd: float
    levels: tuple[float, ...]
    percentile: FloatArray
    percentile_low: FloatArray
    percentile_high: FloatArray
    curve: float
    below_zero: float
    below_zero_se: float
    histogram: Histogram
    percentile_se: FloatArray
    tail_mean: FloatArray
    tail_mean_se: FloatArray


@dataclass(frozen=True)
class Simulation:
    """A run.

    Attributes
    ----------
    model : str
        Name of the model.
    measure : Measure
    paths, steps_per_year, horizon_years, seed : int
    savings_account : NodeSummary
        Of ``R_t``.
    short_rate : NodeSummary
        Of ``r(t)`` [1/year].
    closed_form : ClosedForm or None
        None where the law is not lognormal.
    repricing : Repricing
    present_value : tuple of Distribution
        Assets, liabilities, surplus.
    sample_paths : ndarray, shape (s, n)
        ``R_t`` of the first paths at the reported years, for pictures.
    faults : tuple of Fault
    provenance : Provenance
    convergence : tuple of Convergence
        The headline figures after part of the paths.
    gains : tuple of SamplingGain
        Of a variance-reduced run, for the same figures; empty for a plain one.
    replicates : int
        Independent ones among which the paths are shared equally; 1 for a plain run.
    risky : RiskySummary or None
        None where the book has no risky assets.
    index : IndexSummary or None
        None where inflation is not drawn.
    diagnostics : Diagnostics or None
    """

    model: str
    measure: Measure
    paths: int
    steps_per_year: int
    horizon_years: int
    seed: int
    savings_account: NodeSummary
    short_rate: NodeSummary
    closed_form: ClosedForm | None
    repricing: Repricing
    present_value: tuple[Distribution, ...]
    sample_paths: FloatArray
    faults: tuple[Fault, ...]
    provenance: Provenance
    convergence: tuple[Convergence, ...] = ()
    gains: tuple[SamplingGain, ...] = ()
    replicates: int = 1
    risky: RiskySummary | None = None
    index: IndexSummary | None = None
    diagnostics: Diagnostics | None = None
