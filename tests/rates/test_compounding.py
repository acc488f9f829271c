"""Compounding: conversions there and back, and what they mean."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from desk.rates.compounding import Compounding, from_continuous, to_continuous

EVERY = list(Compounding)


@given(st.floats(-0.5, 2.0), st.sampled_from(EVERY))
def test_there_and_back(rate: float, compounding: Compounding) -> None:
    there = to_continuous(rate, compounding)
    np.testing.assert_allclose(from_continuous(there, compounding), rate, rtol=1e-14, atol=1e-16)


@pytest.mark.parametrize("compounding", [kind for kind in EVERY if kind is not Compounding.CONTINUOUS])
def test_a_year_grows_to_the_same_sum(compounding: Compounding) -> None:
    rates = np.array([-0.02, 0.0, 1e-9, 0.05, 0.2])
    periods = {"annual": 1, "semi-annual": 2, "quarterly": 4, "monthly": 12}[compounding.value]
    grown = np.ones_like(rates)
    for _ in range(periods):
        grown = grown * (1.0 + rates / periods)
    np.testing.assert_allclose(np.exp(to_continuous(rates, compounding)), grown, rtol=1e-14)


def test_continuous_stays_and_is_a_copy() -> None:
    rates = np.array([0.01, -0.01])
    for convert in (to_continuous, from_continuous):
        converted = convert(rates, Compounding.CONTINUOUS)
        np.testing.assert_array_equal(converted, rates)
        assert not np.shares_memory(converted, rates)


def test_small_rates_lose_no_digits() -> None:
    # ln(1 + x) = x - x²/2 + ...: the second term is all that differs at this size.
    np.testing.assert_allclose(to_continuous(1e-12, Compounding.ANNUAL), 1e-12 - 0.5e-24, rtol=1e-15)


def test_keeps_the_shape() -> None:
    assert to_continuous(np.zeros((2, 3)), Compounding.MONTHLY).shape == (2, 3)
    assert from_continuous(0.03, Compounding.QUARTERLY).shape == ()


@pytest.mark.parametrize(
    ("rate", "compounding"), [(-1.0, Compounding.ANNUAL), ([0.01, -4.5], Compounding.QUARTERLY)]
)
def test_refuses_rates_that_leave_nothing(rate: float, compounding: Compounding) -> None:
    with pytest.raises(ValueError, match=f"`rate` must be above .* when compounded {compounding}"):
        to_continuous(rate, compounding)
