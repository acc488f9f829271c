"""Rates solved for many groups at once."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from desk.valuation.roots import solve_rates


def _worth(time: list[float], amount: list[float], rate: float) -> float:
    return float(np.sum(np.array(amount) * np.exp(-rate * np.array(time))))


def _solve(time: list[float], amount: list[float], target: float, start: float | None = None) -> float:
    found = solve_rates(
        np.zeros(len(time), dtype=np.int64),
        np.array(time),
        np.array(amount),
        target=np.array([target]),
        start=None if start is None else np.array([start]),
    )
    return float(found[0])


@settings(max_examples=150, deadline=None)
@given(
    st.lists(st.tuples(st.floats(0.0, 80.0), st.floats(0.01, 1e5)), min_size=1, max_size=20),
    st.floats(-0.2, 1.5),
    st.floats(-0.5, 0.5),
    st.sampled_from([1.0, -1.0]),
)
def test_finds_the_rate_a_value_was_made_with(
    flows: list[tuple[float, float]], rate: float, start: float, sign: float
) -> None:
    flows = [*flows, (5.0, 100.0)]
    time, amount = [row[0] for row in flows], [sign * row[1] for row in flows]
    # Flows today and flows that have decayed must leave digits for the rest to be found by.
    later = [(t, a) for t, a in zip(time, amount, strict=True) if t > 0.0]
    target = _worth(time, amount, rate)
    found = _solve(time, amount, target, start)
    scale = abs(sum(t * a * np.exp(-rate * t) for t, a in later))
    assert abs(found - rate) <= 1e-14 * (abs(target) + sum(abs(a) for a in amount)) / scale + 1e-12


@pytest.mark.parametrize("rate", [-3.0, -0.5, 0.0, 2.0, 40.0, 900.0])
def test_extreme_rates_are_found_from_far_away(rate: float) -> None:
    time, amount = [0.01, 0.4, 3.0], [1.0, 50.0, 100.0]
    assert _solve(time, amount, _worth(time, amount, rate)) == pytest.approx(rate, rel=1e-12, abs=1e-13)


def test_a_short_and_a_very_long_flow() -> None:
    # From the right the first step is far too long to the left: e^(step · 500) must not overflow.
    time, amount = [0.003, 500.0], [1e6, 1e-3]
    target = 1.5e6
    found = _solve(time, amount, target, start=0.0)
    expected = brentq(lambda rate: _worth(time, amount, rate) - target, -0.2, 0.2, xtol=1e-16, rtol=1e-15)
    assert found == pytest.approx(expected, rel=1e-11)


def test_many_groups_of_all_kinds_at_once() -> None:
    random = np.random.default_rng(11)
    count = 500
    size = random.integers(1, 40, count)
    group = np.repeat(np.arange(count), size)
    time = random.uniform(0.02, 60.0, group.size)
    amount = random.uniform(1.0, 100.0, group.size)
    rate = random.uniform(-0.1, 0.4, count)
    target = np.asarray(np.bincount(group, weights=amount * np.exp(-rate[group] * time)), dtype=np.float64)
    target[::7] = -1.0  # out of reach
    shuffled = random.permutation(group.size)
    found = solve_rates(group[shuffled], time[shuffled], amount[shuffled], target=target)
    np.testing.assert_array_equal(np.isnan(found), np.arange(count) % 7 == 0)
    kept = ~np.isnan(found)
    np.testing.assert_allclose(found[kept], rate[kept], atol=1e-13)


@pytest.mark.parametrize(
    ("time", "amount", "target"),
    [
        ([], [], 1.0),
        ([], [], 0.0),
        ([1.0], [1.0], 0.0),
        ([1.0], [1.0], -1.0),
        ([1.0], [-1.0], 1.0),
        ([1.0], [0.0], 1.0),
        ([0.0], [5.0], 5.0),  # any rate does
        ([0.0], [5.0], 4.0),
        ([0.0, 1.0], [5.0, 1.0], 4.0),  # today alone is worth more
        ([1.0], [1.0], np.nan),
        ([1.0, 2.0], [1.0, -1.0], np.nan),
        ([1.0, 2.0], [1.0, -1.0], 50.0),
        ([1.0], [1.0], np.inf),
    ],
)
def test_no_rate(time: list[float], amount: list[float], target: float) -> None:
    assert np.isnan(_solve(time, amount, target))


class TestBothSigns:
    """Flows of both signs have a rate only where it is the one that can be meant."""

    def test_one_rate(self) -> None:
        # An investment that returns 10 %.
        assert _solve([0.0, 1.0, 2.0], [-100.0, 10.0, 110.0], 0.0) == pytest.approx(np.log(1.1), rel=1e-13)
        assert _solve([1.0, 2.0, 3.0], [-100.0, 10.0, 110.0], 0.0) == pytest.approx(np.log(1.1), rel=1e-13)

    def test_a_rate_of_zero_is_on_the_grid(self) -> None:
        assert _solve([1.0, 2.0], [-100.0, 100.0], 0.0) == pytest.approx(0.0, abs=1e-14)

    def test_two_rates(self) -> None:
        # 10 % and 20 % both do: -1 + 2.3 v - 1.32 v² = -(1 - 1.1 v)(1 - 1.2 v).
        assert np.isnan(_solve([0.0, 1.0, 2.0], [-1.0, 2.3, -1.32], 0.0))

    def test_none(self) -> None:
        assert np.isnan(_solve([1.0, 2.0, 3.0], [1.0, -1.0, 1.0], 0.0))

    def test_groups_keep_apart(self) -> None:
        group = np.array([0, 0, 1, 1, 2, 2])
        time = np.array([1.0, 2.0, 1.0, 2.0, 1.0, 2.0])
        amount = np.array([-100.0, 105.0, 50.0, 50.0, 1.0, -5.0])
        found = solve_rates(group, time, amount, target=np.array([0.0, 95.0, 100.0]))
        assert found[0] == pytest.approx(np.log(1.05), rel=1e-13)
        assert _worth([1.0, 2.0], [50.0, 50.0], float(found[1])) == pytest.approx(95.0, rel=1e-14)
        assert np.isnan(found[2])


def test_what_is_handed_over_stays_as_it_was() -> None:
    time, amount, target = np.array([0.0, 1.0]), np.array([1.0, 2.0]), np.array([2.5])
    kept = [array.copy() for array in (time, amount, target)]
    solve_rates(np.zeros(2, np.int64), time, amount, target=target)
    for before, after in zip(kept, (time, amount, target), strict=True):
        np.testing.assert_array_equal(before, after)
