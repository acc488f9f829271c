"""Samples of risky assets and of the price index, summed up node by node while paths are drawn."""

from __future__ import annotations

from functools import partial

import numpy as np

from desk.book import RiskyAssets
from desk.book.arrays import FloatArray, owned_floats
from desk.rates.correlation import MendedCorrelation
from desk.rates.limits import second_integral
from desk.rates.risky_inflation import InflationFactor
from desk.scenarios.draws import Crew, Plan
from desk.scenarios.market_records import NOT_COUNTED, AssetSummary, IndexSummary, RiskySummary
from desk.scenarios.node_summaries import lognormal_form, node_summary
from desk.scenarios.replicates import Sample, Summing
from desk.scenarios.summaries import Moments

__all__ = ["MarketSamples"]

_ONE = Moments(1.0, 0.0, 0.0, 0.0)


class MarketSamples:
    """What is drawn beside the rates of a run, summed up.

    Parameters
    ----------
    plan : Plan
    assets : RiskyAssets or None
        Those of the plan's market.
    summing : Summing
    rows : int
        Most nodes gathered at a time.

    Attributes
    ----------
    excess : ndarray, shape (rows, m, paths), or None
        Receives ``ln(S_t/(S_0 R_t))`` of a group of nodes; None where there are no assets.
    log_index : ndarray, shape (rows, paths), or None
        Receives ``ln I(t)/I(0)``; None where inflation is not drawn.
    """

    def __init__(self, plan: Plan, assets: RiskyAssets | None, summing: Summing, rows: int) -> None:
        market = plan.market
        self._plan, self._assets, self._summing = plan, assets, summing
        count = 0 if market is None else market.asset_count
        self.excess: FloatArray | None = None
        self.log_index: FloatArray | None = None
        self._total_row: FloatArray | None = None
        if count and assets is not None:
            self.excess = np.empty((rows, count, plan.paths))
            self._total_row = np.empty((rows, plan.paths))
            self._totals = [summing.certain(float(assets.value.sum()))]
        if market is not None and market.index is not None:
            self.log_index = np.empty((rows, plan.paths))
        self._returns: list[list[Sample]] = [[summing.certain(1.0)] for _ in range(count)]
        self._excesses: list[list[Moments]] = [[_ONE] for _ in range(count)]
        self._indices: list[Sample] = [summing.certain(1.0)]
        self._discounted: list[Moments] = [_ONE]

    @staticmethod
    def quantities(plan: Plan) -> int:
        """Samples that are held of a node, those of the rates included."""
        market = plan.market
        if market is None:
            return 2
        return 2 + market.asset_count + (market.asset_count > 0) + (market.index is not None)

    def gather(self, log_account: FloatArray, crew: Crew) -> None:
        """Sum up a group of nodes, whose ``ln R_t``, shape (k, paths), is left as it is."""
        nodes = range(len(log_account))
        if self.excess is not None and self._assets is not None and self._total_row is not None:
            excess, totals = self.excess, self._total_row
            places = [(node, asset) for node in nodes for asset in range(excess.shape[1])]
            found = crew.run(
                [partial(self._to_returns, excess[node, asset], log_account[node]) for node, asset in places]
            )
            for (_, asset), moments in zip(places, found, strict=True):
                self._excesses[asset].append(moments)
            crew.run([partial(_total, excess[node], self._assets.value, totals[node]) for node in nodes])
            samples = crew.run([partial(self._summing.sample, excess[place]) for place in places])
            for (_, asset), sample in zip(places, samples, strict=True):
                self._returns[asset].append(sample)
            self._totals += crew.run([partial(self._summing.sample, totals[node]) for node in nodes])
        if self.log_index is not None:
            found = crew.run(
                [partial(self._to_index, self.log_index[node], log_account[node]) for node in nodes]
            )
            self._discounted += found
            self._indices += crew.run([partial(self._summing.sample, self.log_index[node]) for node in nodes])

    def _to_returns(self, excess: FloatArray, log_account: FloatArray) -> Moments:
        """Moments of ``S/(S₀R)``; `excess` becomes ``S/S₀``."""
        found = self._summing.moments(np.exp(excess))
        excess += log_account
        np.exp(excess, out=excess)
        return found

    def _to_index(self, log_index: FloatArray, log_account: FloatArray) -> Moments:
        """Moments of ``I/(I₀R)``; `log_index` becomes ``I/I₀``."""
        found = self._summing.moments(np.exp(log_index - log_account))
        np.exp(log_index, out=log_index)
        return found

    @property
    def is_finite(self) -> bool:
        """Whether no value was too large for a number."""
        samples = [sample for column in (*self._returns, self._indices) for sample in column]
        return all(np.isfinite(sample.moments.mean) for sample in samples)

    def risky(self, year: FloatArray, mended: MendedCorrelation | None) -> RiskySummary | None:
        """The risky assets; None where there are none."""
        assets, market, levels = self._assets, self._plan.market, self._summing.levels
        if self.excess is None or assets is None or market is None:
            return None
        real_world = self._plan.real_world
        law = market.asset_law(year, real_world=real_world)
        expected = market.mean_excess(year, real_world=real_world)
        first = len(market.correlation) - market.asset_count
        return RiskySummary(
            assets=tuple(
                AssetSummary(
                    name=name,
                    value=value,
                    total_return=node_summary(year, self._returns[place], levels),
                    closed_form=None if law is None else lognormal_form(law[0][place], law[1][place], levels),
                    mean_excess=owned_floats([found.mean for found in self._excesses[place]]),
                    mean_excess_se=owned_floats([found.mean_se for found in self._excesses[place]]),
                    expected_excess=owned_floats(expected[place]),
                )
                for place, (name, value) in enumerate(zip(assets.names, assets.value.tolist(), strict=True))
            ),
            total=node_summary(year, self._totals, levels),
            covariance=owned_floats(market.covariance),
            rates_correlation=owned_floats(market.correlation[0, first:]),
            mended=mended,
            counted=NOT_COUNTED,
        )

    def index(self, year: FloatArray, revalued: str, *, matches_today: bool) -> IndexSummary | None:
        """The price index; None where inflation is not drawn."""
        market, levels = self._plan.market, self._summing.levels
        if self.log_index is None or market is None or market.index is None or market.inflation is None:
            return None
        real_world = self._plan.real_world
        curve = market.inflation.curve
        mean, variance = market.index.law(year, real_world=real_world)
        grown = np.exp(curve.zero(year) * year)
        return IndexSummary(
            index=node_summary(year, self._indices, levels),
            closed_form=lognormal_form(mean, variance, levels),
            expected_index=owned_floats(grown),
            mean_discounted=owned_floats([found.mean for found in self._discounted]),
            mean_discounted_se=owned_floats([found.mean_se for found in self._discounted]),
            expected_discounted=owned_floats(_linked_bond(self._plan, market.inflation, year, grown)),
            revalued=revalued,
            matches_today=matches_today,
        )


def _total(returns: FloatArray, value: FloatArray, out: FloatArray) -> None:
    """What all assets are worth together."""
    out.fill(0.0)
    part = np.empty_like(out)
    for row, today in zip(returns, value.tolist(), strict=True):
        np.multiply(row, today, out=part)
        out += part


def _linked_bond(plan: Plan, inflation: InflationFactor, year: FloatArray, grown: FloatArray) -> FloatArray:
    """``E[I(t)/(I(0) R_t)]`` under the measure of the run.

    With Gaussian rates both logarithms are normal and the measure moves their means only; other rates are
    independent of the index.
    """
    drift = np.zeros(year.size)
    if plan.real_world:
        drift = inflation.volatility * inflation.risk_price * second_integral(inflation.mean_reversion, year)
    mean_discount = plan.model.mean_discount(year, real_world=plan.real_world)
    return np.asarray(mean_discount * grown * np.exp(drift))
