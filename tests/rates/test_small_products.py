"""Products of matrices in parts."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.small_products import small_product


@pytest.mark.parametrize(
    ("rows", "inner", "columns"),
    [(1, 1, 1), (193, 64, 60), (60, 2000, 60), (3, 0, 4), (0, 3, 4), (400, 300, 200)],
)
def test_it_is_the_product(rows: int, inner: int, columns: int) -> None:
    random = np.random.default_rng(1)
    first, second = random.normal(size=(rows, inner)), random.normal(size=(inner, columns))
    expected = np.einsum("ik,kj->ij", first, second)
    np.testing.assert_allclose(small_product(first, second), expected, atol=1e-11)
