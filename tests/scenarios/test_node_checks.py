"""Checks by node, readings of tails, and looking ahead at a run."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy import integrate, stats

from desk.book import Measure, ModelName, RatesModel, Sampling
from desk.scenarios.node_checks import FAR, CheckResult, check_result, node_checks
from desk.scenarios.outlook import run_outlook
from desk.scenarios.plans import planned_run, run_bytes
from desk.scenarios.records import Histogram
from desk.scenarios.simulation import simulate
from desk.scenarios.summaries import histogram
from desk.scenarios.tail_readings import (
    Law,
    LawKind,
    histogram_reading,
    law_of_account,
    law_of_rate,
)
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, book
from tests.scenarios.test_drawn_paths import FUNDS

# Checks


@pytest.mark.parametrize("measure", list(Measure))
def test_a_sound_run_passes_every_check(measure: Measure) -> None:
    drawn = replace(book(ALL_MODELS[ModelName.HULL_WHITE], paths=5_000, measure=measure), risky_assets=FUNDS)
    checks = node_checks(simulate(drawn, NO_FLOWS, NO_FLOWS))
    assert [check.key for check in checks] == ["account", "asset 0", "asset 1"]
    assert "shares" in checks[1].title
    for check in checks:
        found = check_result(check)
        # Year 0 is certain: there is nothing to check.
        assert found.nodes == 10
        assert found.far == 0
        assert 0.0 < found.worst < 4.0
        assert math.isnan(check.in_standard_errors[0])


def test_what_is_too_far_off_is_counted_and_found() -> None:
    run = simulate(book(ALL_MODELS[ModelName.HO_LEE]), NO_FLOWS, NO_FLOWS)
    repricing = run.repricing
    moved = repricing.mean_discount.copy()
    moved[[4, 7]] += np.array([5.0, -9.0]) * repricing.mean_discount_se[[4, 7]]
    wrong = replace(run, repricing=replace(repricing, mean_discount=moved))
    check = node_checks(wrong)[0]
    found = check_result(check)
    assert (found.nodes, found.far, found.worst_year) == (10, 2, 7.0)
    assert found.worst == pytest.approx(abs(check.in_standard_errors[7]))
    assert found.worst > FAR


def test_where_nothing_is_known_nothing_is_checked() -> None:
    one = simulate(book(ALL_MODELS[ModelName.HO_LEE], paths=1), NO_FLOWS, NO_FLOWS)
    found = check_result(node_checks(one)[0])
    assert (found.nodes, found.far) == (0, 0)
    assert math.isnan(found.worst)
    assert found != CheckResult(0, 0, 0.0, 0.0)


# Readings


def test_shares_are_exact_at_the_edges_of_bins() -> None:
    sample = np.sort(np.random.default_rng(3).lognormal(0.0, 0.5, 20_000))
    found = histogram(sample)
    for edge in found.edges[1:-1:7]:
        reading = histogram_reading(found, float(edge))
        assert reading.share == np.count_nonzero(sample < edge) / sample.size
        below = sample[sample < edge]
        width = float(np.median(np.diff(found.edges)))
        # Every bin counts as evenly filled, those at the ends too.
        assert reading.mean == pytest.approx(float(below.mean()), abs=0.25 * width)
        assert reading.share_se == pytest.approx(
            math.sqrt(reading.share * (1.0 - reading.share) / sample.size)
        )


def test_beyond_the_sample_there_is_nothing_or_all_of_it() -> None:
    found = Histogram(np.array([1.0, 2.0, 4.0]), np.array([3, 1]))
    below = histogram_reading(found, 0.5)
    assert below.share == 0.0
    assert math.isnan(below.mean)
    above = histogram_reading(found, 9.0)
    assert above.share == 1.0
    assert above.mean == (3.0 * 1.5 + 3.0) / 4.0
    assert histogram_reading(found, 1.5).share == 1.5 / 4.0
    empty = histogram_reading(Histogram(np.array([0.0, 1.0]), np.array([0])), 0.5)
    assert empty.share == 0.0
    assert histogram_reading(found, 1.0).share == 0.0


@pytest.mark.parametrize("kind", list(LawKind))
@pytest.mark.parametrize("place", [-3.0, -1.0, 0.0, 2.0])
def test_laws_agree_with_integration(kind: LawKind, place: float) -> None:
    """scipy.stats and scipy.integrate.quad as the other way to the same figures."""
    law = Law(kind, 0.3, 0.4)
    if kind is LawKind.NORMAL:
        other: Any = stats.norm(0.3, 0.4)
        value = 0.3 + 0.4 * place
        low = -6.0
    else:
        other = stats.lognorm(0.4, scale=math.exp(0.3))
        value = math.exp(0.3 + 0.4 * place)
        low = 0.0
    reading = law.reading(value)
    assert reading.share == pytest.approx(float(other.cdf(value)), rel=1e-12)
    assert float(law.density(value)) == pytest.approx(float(other.pdf(value)), rel=1e-12)
    part, _ = integrate.quad(lambda x: x * other.pdf(x), low, value, epsabs=1e-14, epsrel=1e-11)
    assert reading.mean == pytest.approx(part / other.cdf(value), rel=1e-7)


def test_laws_hold_far_out() -> None:
    law = Law(LawKind.LOGNORMAL, 0.0, 0.2)
    far = law.reading(math.exp(-6.0))
    assert 0.0 < far.share < 1e-190
    # Far out nearly all of what is below lies near the edge.
    assert 0.9 * math.exp(-6.0) < far.mean < math.exp(-6.0)
    assert law.reading(-1.0).share == 0.0
    assert float(law.density(-1.0)) == 0.0
    assert Law(LawKind.NORMAL, 0.0, 1.0).reading(-30.0).mean == pytest.approx(-30.0333, rel=1e-4)


@pytest.mark.parametrize("name", ALL_MODELS)
def test_the_law_of_the_rate_is_that_of_the_paths(name: ModelName) -> None:
    run = simulate(book(ALL_MODELS[name], paths=20_000), NO_FLOWS, NO_FLOWS)
    law = law_of_rate(run, 10)
    if name in (ModelName.CIR, ModelName.CIR_SHIFTED):
        assert law is None
        return
    assert law is not None
    assert law_of_rate(run, 0) is None
    for level, value in zip(run.short_rate.levels, run.short_rate.percentile[10], strict=True):
        share = level / 100.0
        reading = law.reading(float(value))
        assert abs(reading.share - share) < 4.5 * math.sqrt(share * (1.0 - share) / 20_000)
    closed = law_of_account(run.closed_form, 10)
    assert (closed is None) == (name is ModelName.BLACK_KARASINSKI)
    assert law_of_account(run.closed_form, 0) is None


# Looking ahead


def test_looking_ahead_draws_nothing_and_says_what_it_takes() -> None:
    drawn = book(ALL_MODELS[ModelName.GAUSSIAN_2], paths=1_000, horizon_years=7)
    found = run_outlook(drawn)
    assert (found.obstacle, found.paths, found.steps) == ("", 1_000, 28)
    assert found.memory == run_bytes(planned_run(drawn).plan)
    odd = replace(drawn, run=replace(drawn.run, sampling=Sampling.ANTITHETIC, replicates=7))
    ahead = run_outlook(odd)
    assert ahead.paths == odd.run.drawn_paths > 1_000
    assert ahead.faults


def test_what_stands_in_the_way_is_in_the_answer() -> None:
    lacking = run_outlook(book(RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1)))
    assert "Volatility is missing" in lacking.obstacle
    assert (lacking.paths, lacking.memory) == (0, 0)
    assert "no rates model" in run_outlook(book(None)).obstacle
    huge = book(ALL_MODELS[ModelName.HULL_WHITE], paths=20_000_000, horizon_years=100)
    sobol = replace(huge, run=replace(huge.run, sampling=Sampling.SOBOL))
    assert "set Paths to at most" in run_outlook(sobol).obstacle
