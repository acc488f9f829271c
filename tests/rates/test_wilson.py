"""Products of Wilson functions against the kernel written out."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.wilson import WilsonProducts


@pytest.mark.parametrize(
    ("count", "times", "filled"), [(2, 5, 1.0), (40, 40, 1.0), (20, 300, 0.1), (3, 500, 1.0)]
)
@pytest.mark.parametrize("latest", [10.0, 60.0, 900.0])
@pytest.mark.parametrize("alpha", [0.05, 0.13, 2.0, 20.0])
def test_products_are_those_of_the_kernel(
    count: int, times: int, filled: float, latest: float, alpha: float
) -> None:
    """``α min(t, u) - ½ e^{-α|t - u|} + ½ e^{-α(t + u)}``, which cannot overflow; gaps of any length."""
    random = np.random.default_rng(times)
    time = np.sort(random.uniform(0.01, latest, times))
    amounts = random.normal(size=(count, times)) * (random.random((count, times)) < filled)
    amounts[:, -1] = 1.0
    lesser = np.minimum.outer(time, time)
    apart, together = np.abs(np.subtract.outer(time, time)), np.add.outer(time, time)
    kernel = alpha * lesser - 0.5 * np.exp(-alpha * apart) + 0.5 * np.exp(-alpha * together)
    expected = amounts @ kernel @ amounts.T
    found = WilsonProducts(time, amounts).at(alpha)
    np.testing.assert_allclose(found, expected, atol=1e-11 * np.abs(expected).max())
