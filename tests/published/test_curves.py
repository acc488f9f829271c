"""Curves against published figures."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.curve import Curve, Interpolation
from desk.valuation.measures import measure, value_rows


@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_one_year_forwards(interpolation: Interpolation) -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, forward-rate table (from memory).

    Forwards between the terms do not depend on what is drawn between them.
    """
    curve = Curve([1.0, 2.0, 3.0, 4.0, 5.0], [0.03, 0.04, 0.046, 0.05, 0.053], interpolation)
    forwards = curve.forward([1.0, 2.0, 3.0, 4.0], [2.0, 3.0, 4.0, 5.0])
    np.testing.assert_allclose(forwards, [0.05, 0.058, 0.062, 0.065], atol=1e-12)


def test_monotone_convex_forwards() -> None:
    """TF Quant Finance test suite, after Hagan, P.S. and West, G., "Interpolation Methods for Curve
    Construction", Applied Mathematical Finance 13(2), 2006."""
    terms = np.array([0.25, 0.5, 1.0, 2.0, 3.0])
    discrete = np.array([0.05, 0.051, 0.052, 0.053, 0.055])
    zero_rates = np.cumsum(discrete * np.diff(terms, prepend=0.0)) / terms
    curve = Curve(terms, zero_rates, Interpolation.MONOTONE_CONVEX)
    forwards = curve.instantaneous_forward([0.25, 0.5, 1.0, 2.0, 3.0, 1.1])
    printed = [0.0505, 0.05133333, 0.05233333, 0.054, 0.0555, 0.05241]
    np.testing.assert_allclose(forwards, printed, atol=5e-9)


def test_monotone_convex_reprices_four_bonds() -> None:
    """TF Quant Finance test suite, bond-curve test, after Hagan and West 2006: zero rates at 1, 2, 3 and
    4 years that give back the present values of four coupon bonds."""
    curve = Curve(
        [1.0, 2.0, 3.0, 4.0], [0.05, 0.0475, 0.0453333333333, 0.04775], Interpolation.MONOTONE_CONVEX
    )
    bonds = [
        (4, 1, 12.5, 999.6815522394339),
        (2, 2, 30.0, 1022.322872470043),
        (2, 3, 40.0, 1093.9894418810143),
        (2, 4, 15.0, 934.2088568901568),
    ]
    for frequency, years, coupon, worth in bonds:
        times = np.arange(1, frequency * years + 1) / frequency
        amounts = np.full(times.size, coupon)
        amounts[-1] += 1000.0
        found = measure(value_rows(times, amounts, curve=curve))
        assert found.present_value == pytest.approx(worth, abs=1e-6)
