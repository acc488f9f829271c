"""Measures where they have no meaning, and key-rate weights."""

from __future__ import annotations

from dataclasses import astuple

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from desk.valuation.measures import (
    KEY_TERMS,
    key_rate_durations,
    key_rate_weights,
    measure,
    measure_groups,
    value_rows,
)
from tests.valuation import plain
from tests.valuation.books import basis, flat_basis

FLAT = flat_basis(0.05).curve


def test_a_single_flow() -> None:
    found = measure(value_rows([7.0], [100.0], curve=FLAT, spread=0.01))
    assert found.present_value == pytest.approx(100.0 * 1.05**-7 * np.exp(-0.07), rel=1e-14)
    assert found.equivalent_rate == pytest.approx(1.05 * np.exp(0.01) - 1.0, rel=1e-13)
    assert found.macaulay_duration == pytest.approx(7.0, rel=1e-14)
    assert found.effective_duration == pytest.approx(7.0, rel=1e-14)
    assert found.convexity == pytest.approx(49.0, rel=1e-14)
    assert found.dispersion == pytest.approx(0.0, abs=1e-12)
    assert found.dv01 == pytest.approx(found.present_value * -np.expm1(-7e-4), rel=1e-13)


def test_worth_nothing_has_no_ratios() -> None:
    # What is received is worth what is paid a year before: what is left is rounding.
    received = np.array([0.3, 0.7, 1.1, 2.3, 9.1])
    times = np.concatenate((np.arange(2.0, 7.0), np.arange(1.0, 6.0)))
    rows = value_rows(times, np.concatenate((received, -received / 1.05)), curve=FLAT)
    found = measure(rows)
    assert abs(found.present_value) < 1e-14
    assert found.dv01 == pytest.approx(rows.value[:5].sum() * 1e-4, rel=1e-3)
    assert np.isnan(astuple(found)[1:-1]).all()
    durations, dv01 = key_rate_durations(rows)
    assert np.isnan(durations).all()
    assert np.isfinite(dv01).all()


def test_both_signs_with_two_rates() -> None:
    # Two rates, the curve's and another, give the value: no equivalent rate, but the rest stands.
    found = measure(value_rows([1.0, 2.0], [230.0, -132.0], curve=FLAT))
    worth = 230.0 / 1.05 - 132.0 / 1.05**2
    assert found.present_value == pytest.approx(worth, rel=1e-13)
    assert np.isnan([found.equivalent_rate, found.macaulay_duration, found.modified_duration]).all()
    expected = (230.0 / 1.05 - 2.0 * 132.0 / 1.05**2) / worth
    assert found.effective_duration == pytest.approx(expected, rel=1e-12)


def test_both_signs_with_one_rate() -> None:
    found = measure(value_rows([1.0, 2.0, 9.0], [-5.0, 10.0, 100.0], curve=FLAT))
    assert found.equivalent_rate == pytest.approx(0.05, rel=1e-12)
    assert found.macaulay_duration == pytest.approx(found.effective_duration, rel=1e-12)


def test_flows_today() -> None:
    found = measure(value_rows([0.0, 0.0], [3.0, 4.0], curve=FLAT))
    assert found.present_value == 7.0
    assert np.isnan(found.equivalent_rate)
    assert astuple(found)[2:] == (0.0, 0.0, 0.0, 0.0, 0.0, 0.0)


def test_flows_today_and_later() -> None:
    found = measure(value_rows([0.0, 2.0], [50.0, 50.0], curve=FLAT))
    assert found.equivalent_rate == pytest.approx(0.05, rel=1e-12)
    later = 50.0 * 1.05**-2
    assert found.macaulay_duration == pytest.approx(2.0 * later / (50.0 + later), rel=1e-12)


def test_groups_are_measured_as_if_alone() -> None:
    random = np.random.default_rng(2)
    count, groups = 4000, 40
    group = random.integers(0, groups - 1, count)  # the last one stays empty
    time, amount = random.uniform(0.0, 60.0, count), random.uniform(-1.0, 9.0, count)
    rows = value_rows(time, amount, curve=basis().curve, spread=0.003)
    together = measure_groups(rows, group, groups)
    for number in range(groups):
        kept = group == number
        alone = measure(value_rows(time[kept], amount[kept], curve=basis().curve, spread=0.003))
        np.testing.assert_allclose(astuple(together[number]), astuple(alone), rtol=1e-10, equal_nan=True)
    assert together[-1].present_value == 0.0
    assert np.isnan(together[-1].effective_duration)


@given(st.lists(st.floats(0.0, 120.0), min_size=1, max_size=20))
def test_key_rate_weights_are_the_triangles(times: list[float]) -> None:
    lower, share = key_rate_weights(np.array(times))
    for time, key, part in zip(times, lower, share, strict=True):
        expected = [plain.triangle(number, time) for number in range(len(KEY_TERMS))]
        found = np.zeros(len(KEY_TERMS))
        found[key] += 1.0 - part
        found[key + 1] += part
        np.testing.assert_allclose(found, expected, atol=1e-15)


def test_key_rates_add_up_to_a_parallel_move() -> None:
    rows = value_rows([0.1, 0.25, 6.0, 49.9, 50.0, 80.0], [1.0, 2.0, 3.0, 4.0, 5.0, 6.0], curve=FLAT)
    durations, dv01 = key_rate_durations(rows)
    whole = measure(rows)
    assert durations.sum() == pytest.approx(whole.effective_duration, rel=1e-14)
    # The key moves are revalued one by one, so their falls add up but for the second order.
    assert dv01.sum() == pytest.approx(whole.dv01, rel=0.5e-4 * 80.0)
    assert dv01[:2] == pytest.approx(
        [0.1 * rows.value[0] * 1e-4 + 0.25 * rows.value[1] * 1e-4, 0.0], rel=1e-4, abs=1e-15
    )
