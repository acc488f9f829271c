"""A whole run."""

from __future__ import annotations

import math
import threading
import time
from dataclasses import fields, is_dataclass, replace

import numpy as np
import pytest

from desk.book import Book, Measure, ModelName, PricedFlows, RatesModel, Side
from desk.scenarios.draws import BLOCK_PATHS, block_generator
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, affine_model, assets, book, liabilities, priced


def run(
    name: ModelName,
    *,
    paths: int = 2_000,
    horizon_years: int = 10,
    steps_per_year: int = 4,
    measure: Measure = Measure.PRICING,
) -> Simulation:
    settings = book(
        ALL_MODELS[name],
        paths=paths,
        horizon_years=horizon_years,
        steps_per_year=steps_per_year,
        measure=measure,
    )
    return simulate(settings, assets(), liabilities())


def same(first: object, second: object) -> bool:
    """Whether two records hold the same bits."""
    if is_dataclass(first) and is_dataclass(second):
        return all(same(getattr(first, f.name), getattr(second, f.name)) for f in fields(first))
    if isinstance(first, np.ndarray) and isinstance(second, np.ndarray):
        return first.tobytes() == second.tobytes()
    if isinstance(first, tuple) and isinstance(second, tuple):
        return len(first) == len(second) and all(same(a, b) for a, b in zip(first, second, strict=True))
    return first == second or (first != first and second != second)


@pytest.mark.parametrize("measure", Measure)
@pytest.mark.parametrize("steps_per_year", [1, 12])
@pytest.mark.parametrize("name", ALL_MODELS)
def test_sampled_figures_agree_with_what_is_known(
    name: ModelName, steps_per_year: int, measure: Measure
) -> None:
    result = run(name, paths=20_000, steps_per_year=steps_per_year, measure=measure)
    check = result.repricing
    score = (check.mean_discount - check.expected_discount)[1:] / check.mean_discount_se[1:]
    assert np.abs(score).max() < 4.5
    if measure is Measure.PRICING:
        assert check.expected_discount == pytest.approx(check.curve_discount, rel=1e-13)
        for side in result.present_value:
            assert abs(side.mean - side.curve) / side.se < 4.5
    else:
        assert np.abs(check.expected_discount / check.curve_discount - 1.0)[-1] > 1e-3
    law, sample = result.closed_form, result.savings_account
    without = (ModelName.CIR, ModelName.CIR_SHIFTED, ModelName.BLACK_KARASINSKI)
    assert (law is None) == (name in without)
    if law is not None:
        assert np.abs((sample.mean - law.mean)[1:] / sample.mean_se[1:]).max() < 4.5
        assert np.abs((sample.sd - law.sd)[1:] / sample.sd_se[1:]).max() < 4.5


def test_values_on_the_curve_are_plain_sums() -> None:
    result = run(ModelName.HULL_WHITE)
    curve = book(None).basis.curve
    totals = []
    for flows in (assets(), liabilities()):
        total = 0.0
        for amount, due, spread in zip(flows.amount, flows.time, flows.spread, strict=True):
            total += amount * float(curve.discount(due)) * math.exp(-spread * due)
        totals.append(total)
    found = [side.curve for side in result.present_value]
    assert found == pytest.approx([totals[0], totals[1], totals[0] - totals[1]], rel=1e-12)


@pytest.mark.parametrize("horizon", [1, 3])
def test_a_plain_loop_with_the_same_normals(horizon: int) -> None:
    """One path at a time: every flow discounted by its own bond from the last node before it."""
    stated = ALL_MODELS[ModelName.HULL_WHITE]
    due = np.array([0.0, 0.2, 0.5, 0.9, 1.0, 1.7, 2.0, 2.4, 3.0, 3.1, 8.0, 30.0])
    amount = np.linspace(1.0, 3.0, due.size)
    settings = book(stated, paths=5, horizon_years=horizon, steps_per_year=2, seed=9)
    result = simulate(settings, priced(Side.ASSETS, due, amount, 0.01), NO_FLOWS)
    model = affine_model(settings)
    speed, volatility, step = 0.05, 0.009, 0.5
    decay = math.exp(-speed * step)
    length = (1.0 - decay) / speed
    variance = volatility**2 * (1.0 - decay**2) / (2.0 * speed)
    shared = volatility**2 / speed * (length - (1.0 - decay**2) / (2.0 * speed))
    spread = volatility**2 / speed**2 * (step - 2.0 * length + (1.0 - decay**2) / (2.0 * speed))
    normals = block_generator(9, 0).standard_normal((2 * horizon, 2, BLOCK_PATHS))
    values, accounts = [], []
    for path in range(5):
        states, integrals = [0.0], [0.0]
        for number in range(2 * horizon):
            first, second = normals[number, :, path]
            drawn = shared / math.sqrt(variance) * first + math.sqrt(spread - shared**2 / variance) * second
            integrals.append(integrals[-1] + length * states[-1] + drawn)
            states.append(decay * states[-1] + math.sqrt(variance) * first)
        value = 0.0
        for time_due, paid in zip(due, amount, strict=True):
            node = min(int(time_due / step), 2 * horizon)
            bond = float(model.bond_terms(node * step, time_due)[0])
            bond -= float(model.bond_terms(node * step, time_due)[1][0]) * states[node]
            account = integrals[node] + float(model.account_offset(node * step))
            value += paid * math.exp(-0.01 * time_due + bond - account)
        values.append(value)
        accounts.append(math.exp(integrals[-1] + float(model.account_offset(float(horizon)))))
    found = result.present_value[0]
    assert found.mean == pytest.approx(np.mean(values), rel=1e-11)
    assert found.sd == pytest.approx(np.std(values, ddof=1), rel=1e-9)
    assert result.sample_paths[:, -1] == pytest.approx(accounts, rel=1e-12)


@pytest.mark.parametrize("name", [ModelName.GAUSSIAN_2, ModelName.CIR, ModelName.BLACK_KARASINSKI])
def test_the_same_seed_gives_the_same_bits(name: ModelName) -> None:
    settings = book(ALL_MODELS[name], paths=12_345)
    first = simulate(settings, assets(), liabilities(), threads=1)
    for threads in (1, 2, 4):
        assert same(first, simulate(settings, assets(), liabilities(), threads=threads))
    other = simulate(replace(settings, run=replace(settings.run, seed=4)), assets(), liabilities())
    assert not same(first.savings_account, other.savings_account)


def test_year_nought_is_certain() -> None:
    result = run(ModelName.VASICEK, horizon_years=2)
    for summary, value in ((result.savings_account, 1.0), (result.short_rate, 0.02)):
        assert summary.year.tolist() == [0.0, 1.0, 2.0]
        assert summary.mean[0] == pytest.approx(value, abs=1e-15)
        assert summary.mean_se[0] == summary.sd[0] == summary.sd_se[0] == 0.0
        assert np.all(summary.percentile[0] == summary.mean[0])
        assert summary.percentile.shape == summary.percentile_low.shape == (3, 7)
        assert all(bins.counts.sum() == result.paths for bins in summary.histograms)
    assert result.sample_paths.shape == (50, 3)
    assert np.all(result.sample_paths[:, 0] == 1.0)
    assert result.repricing.mean_discount[0] == 1.0


def test_the_run_says_where_it_comes_from() -> None:
    settings = book(ALL_MODELS[ModelName.HO_LEE], paths=100, horizon_years=2)
    result = simulate(settings, assets(), liabilities())
    assert result.model == "ho-lee"
    assert (result.paths, result.horizon_years, result.steps_per_year, result.seed) == (100, 2, 4, 3)
    assert result.provenance.book_digest == settings.digest
    assert result.provenance.seed == 3
    assert dict(result.provenance.settings)["quantile_rule"] == "Hyndman-Fan 7"


def test_share_of_paths_below_nought() -> None:
    even = priced(Side.ASSETS, [0.0], [float(run(ModelName.VASICEK).present_value[1].percentile[3])])
    result = simulate(book(ALL_MODELS[ModelName.VASICEK]), even, liabilities())
    surplus = result.present_value[2]
    assert surplus.below_zero == pytest.approx(0.5, abs=1e-3)
    assert surplus.below_zero_se == pytest.approx(math.sqrt(0.25 / 2000), rel=1e-3)
    assert surplus.percentile[3] == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize("name", ALL_MODELS)
def test_one_path_of_one_step(name: ModelName) -> None:
    result = run(name, paths=1, horizon_years=1, steps_per_year=1)
    assert np.isfinite(result.savings_account.mean).all()
    assert np.isnan(result.savings_account.mean_se[1])
    assert np.isnan(result.repricing.mean_discount_se[1])
    assert math.isnan(result.present_value[2].se)
    assert math.isnan(result.present_value[2].below_zero_se)


def test_no_volatility_is_the_curve() -> None:
    stated = RatesModel(ModelName.HULL_WHITE, mean_reversion=0.1, volatility=0.0)
    result = simulate(book(stated, paths=200), assets(), liabilities())
    assert result.savings_account.mean == pytest.approx(1.0 / result.repricing.curve_discount, rel=1e-12)
    assert result.present_value[0].mean == pytest.approx(result.present_value[0].curve, rel=1e-12)
    assert result.present_value[0].sd == pytest.approx(0.0, abs=1e-9)
    assert all(bins.counts.sum() == 200 for bins in result.savings_account.histograms)


@pytest.mark.parametrize(
    "stated",
    [
        RatesModel(ModelName.HO_LEE, volatility=1.0),
        RatesModel(ModelName.HULL_WHITE, mean_reversion=0.0, volatility=50.0),
        RatesModel(
            ModelName.CIR, mean_reversion=0.1, volatility=20.0, long_run_rate=0.05, starting_rate=0.05
        ),
    ],
)
def test_a_huge_volatility_is_said_and_not_hidden(stated: RatesModel) -> None:
    result = simulate(book(stated, paths=500, horizon_years=40), assets(), liabilities())
    finite = np.isfinite(result.savings_account.mean).all()
    assert finite or any("too large" in fault.found for fault in result.faults)
    assert all(bins.counts.sum() == 500 for bins in result.savings_account.histograms)


def test_rates_below_nought() -> None:
    stated = RatesModel(
        ModelName.VASICEK, mean_reversion=0.2, volatility=0.005, long_run_rate=-0.02, starting_rate=-0.03
    )
    result = simulate(book(stated), assets(), liabilities())
    assert result.savings_account.percentile[-1, -1] < 1.0
    assert abs(result.present_value[1].mean / result.present_value[1].curve - 1.0) < 0.01


def test_no_flows() -> None:
    result = simulate(book(ALL_MODELS[ModelName.CIR], paths=100), NO_FLOWS, NO_FLOWS)
    for side in result.present_value:
        assert (side.mean, side.sd, side.curve, side.below_zero) == (0.0, 0.0, 0.0, 0.0)
    assert result.faults == ()


def test_flows_beyond_a_century() -> None:
    late = priced(Side.LIABILITIES, [5.0, 101.0, 120.5, 150.0, 180.0], [1.0, 10.0, 10.0, 10.0, 10.0])
    result = simulate(book(ALL_MODELS[ModelName.GAUSSIAN_2], paths=20_000), NO_FLOWS, late)
    assert (
        abs(result.present_value[1].mean - result.present_value[1].curve) / result.present_value[1].se < 4.5
    )


def test_a_horizon_beyond_the_flows_is_said() -> None:
    short = priced(Side.ASSETS, [1.0, 4.5], [1.0, 1.0])
    (fault,) = simulate(book(ALL_MODELS[ModelName.CIR], paths=50), short, NO_FLOWS).faults
    assert "horizon of 10 years goes beyond the flows" in fault.found
    near = priced(Side.ASSETS, [9.0], [1.0])
    assert simulate(book(ALL_MODELS[ModelName.CIR], paths=50), near, NO_FLOWS).faults == ()


def test_the_mean_does_not_depend_on_the_horizon_or_the_steps() -> None:
    """The value of flows after the horizon, and between nodes, is taken by bonds: no bias either way."""
    for horizon, steps_per_year in ((1, 4), (30, 4), (10, 1)):
        result = run(ModelName.GAUSSIAN_2, paths=20_000, horizon_years=horizon, steps_per_year=steps_per_year)
        for side in result.present_value:
            assert abs(side.mean - side.curve) / side.se < 4.5


def test_progress_is_told_from_the_calling_thread() -> None:
    told: list[tuple[float, float, int]] = []

    def progress(fraction: float) -> None:
        told.append((fraction, time.monotonic(), threading.get_ident()))

    settings = book(ALL_MODELS[ModelName.CIR], paths=30_000, horizon_years=20, steps_per_year=12)
    simulate(settings, assets(), liabilities(), progress=progress)
    fractions = [fraction for fraction, _, _ in told]
    assert fractions == sorted(fractions)
    assert fractions[0] == 0.0
    assert fractions[-1] == 1.0
    assert max(fractions[:-1]) <= 1.0
    assert {ident for _, _, ident in told} == {threading.get_ident()}
    gaps = np.diff([when for _, when, _ in told])[:-1]
    assert gaps.min() >= 0.0199


class _Stop(Exception):
    pass


@pytest.mark.parametrize("calls", [1, 2, 4])
def test_progress_may_stop_the_run(calls: int) -> None:
    before = set(threading.enumerate())
    count = 0

    def progress(_: float) -> None:
        nonlocal count
        count += 1
        if count == calls:
            raise _Stop

    settings = book(ALL_MODELS[ModelName.CIR], paths=400_000, horizon_years=40, steps_per_year=12)
    with pytest.raises(_Stop):
        simulate(settings, assets(), liabilities(), progress=progress)
    assert count == calls
    assert set(threading.enumerate()) == before


def test_a_book_that_will_not_do() -> None:
    with pytest.raises(ValueError, match="no rates model"):
        simulate(book(None), assets(), liabilities())
    bad = replace(ALL_MODELS[ModelName.HO_LEE], volatility=-1.0)
    with pytest.raises(ValueError, match="Volatility"):
        simulate(book(bad), assets(), liabilities())


def _halved(flows: PricedFlows) -> PricedFlows:
    return replace(flows, amount=flows.amount / 2.0)


def test_values_are_linear_in_the_flows() -> None:
    settings: Book = book(ALL_MODELS[ModelName.CIR_SHIFTED], paths=500)
    whole = simulate(settings, assets(), liabilities())
    half = simulate(settings, _halved(assets()), _halved(liabilities()))
    for one, two in zip(whole.present_value, half.present_value, strict=True):
        assert one.percentile == pytest.approx(2.0 * two.percentile, rel=1e-10, abs=1e-9)
