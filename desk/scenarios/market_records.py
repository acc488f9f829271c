"""Results beside the rates: risky assets, the price index, and what tells whether draws are right."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book.arrays import FloatArray
from desk.rates.correlation import MendedCorrelation
from desk.scenarios.records import ClosedForm, NodeSummary

__all__ = ["NOT_COUNTED", "AssetSummary", "Diagnostics", "IndexSummary", "RiskySummary"]

NOT_COUNTED = (
    "The values of the risky assets are no part of assets, liabilities and surplus: like the standing, these "
    "count holdings and asset flows."
)
"""What a run of a book says of its risky assets."""


@dataclass(frozen=True)
class AssetSummary:
    """One risky asset, held with dividends reinvested, by reported year.

    Attributes
    ----------
    name : str
    value : float
        Today [currency].
    total_return : NodeSummary
        Of ``S_t/S_0``.
    closed_form : ClosedForm or None
        Of ``S_t/S_0`` under the measure of the run; None where rates are not Gaussian.
    mean_excess, mean_excess_se, expected_excess : ndarray, shape (n,)
        Mean of ``S_t/(S_0 R_t)`` over the paths, its standard error, and what it should be: 1 under the
        pricing measure, ``e^{πt}`` under the other.
    """

    name: str
    value: float
    total_return: NodeSummary
    closed_form: ClosedForm | None
    mean_excess: FloatArray
    mean_excess_se: FloatArray
    expected_excess: FloatArray


@dataclass(frozen=True)
class RiskySummary:
    """The risky assets of a run.

    Attributes
    ----------
    assets : tuple of AssetSummary
    total : NodeSummary
        What all of them together are worth [currency].
    covariance : ndarray, shape (m, m)
        ``σσᵀ`` a year, as it was drawn.
    rates_correlation : ndarray, shape (m,)
        With the first rate factor, as it was drawn.
    mended : MendedCorrelation or None
        Of the first rate factor and the assets, in this order, where it was mended.
    counted : str
        What part these values have in the present values of the run.
    """

    assets: tuple[AssetSummary, ...]
    total: NodeSummary
    covariance: FloatArray
    rates_correlation: FloatArray
    mended: MendedCorrelation | None
    counted: str


@dataclass(frozen=True)
class IndexSummary:
    """The price index of a run, by reported year.

    Attributes
    ----------
    index : NodeSummary
        Of ``I(t)/I(0)``.
    closed_form : ClosedForm
        Under the measure of the run.
    expected_index : ndarray, shape (n,)
        On today's curve of expected inflation.
    mean_discounted, mean_discounted_se, expected_discounted : ndarray, shape (n,)
        Mean of ``I(t)/(I(0) R_t)`` over the paths, its standard error, and what it should be: under the
        pricing measure the price of a linked zero bond, ``P(0,t)`` times the expected index.
    revalued : str
        Which flows follow the index along the paths, and how.
    matches_today : bool
        Whether the mean present values of the run should be those on the curve: false where floors and caps
        on the growth are valued with the inflation factor's own volatility.
    """

    index: NodeSummary
    closed_form: ClosedForm
    expected_index: FloatArray
    mean_discounted: FloatArray
    mean_discounted_se: FloatArray
    expected_discounted: FloatArray
    revalued: str
    matches_today: bool


@dataclass(frozen=True)
class Diagnostics:
    """The short rate of a run against its law, each shape (n,), by reported year; NaN where nothing is known.

    The sample's own mean and standard deviation, with their errors, stand in the summary of the short rate.

    Attributes
    ----------
    year : ndarray
    rate_mean, rate_sd : ndarray
        In closed form, under the measure of the run [1/year].
    autoregression, autoregression_se : ndarray
        Slope of the rate, or of its logarithm in the lognormal model, on that of one step before, over the
        paths; the error is that of independent paths. NaN in the first step, before which the rate is
        certain.
    expected_autoregression : ndarray
        ``e^{-aΔ}`` for one factor.
    """

    year: FloatArray
    rate_mean: FloatArray
    rate_sd: FloatArray
    autoregression: FloatArray
    autoregression_se: FloatArray
    expected_autoregression: FloatArray
