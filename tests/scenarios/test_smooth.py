"""Series of one factor, and of the rates beside one, against the function they stand for."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book.arrays import FloatArray
from desk.scenarios.smooth import fit_function, joined_worth
from desk.scenarios.surfaces import fit_surface, series_degree

EXPOSURE = np.linspace(0.5, 9.0, 40)
GROWTH = np.linspace(0.0, 12.0, 40)


def amounts(places: FloatArray) -> FloatArray:
    return np.asarray(np.exp(np.multiply.outer(places, GROWTH)))


def worth(row: FloatArray) -> object:
    return fit_surface(row, EXPOSURE[:, None], [-0.1], [0.1])


def test_error_of_a_series_is_that_between_its_points() -> None:
    """A kink cannot be fitted, and the error says so."""
    smooth = fit_function(np.exp, -1.0, 2.0)
    place = np.linspace(-1.0, 2.0, 4001)
    assert smooth.error < 1e-12
    assert float(np.abs(smooth(place) - np.exp(place)).max()) < 1e-11
    kinked = fit_function(lambda place: np.abs(place - 0.1), -1.0, 1.0)
    assert kinked.error > 1e-6


@pytest.mark.parametrize("tilt", [0.0, 3.0, -2.0])
@pytest.mark.parametrize(("too_few", "least", "most"), [(0, 0.0, 1e-10), (8, 1e-9, 1.0)])
def test_error_of_rates_beside_a_factor(too_few: int, least: float, most: float, tilt: float) -> None:
    """The error that is said is that of the worst amount: 1e-11 with the degree that is taken, and where the
    degree is too low no less than the value is missed by. What is left out of the amounts comes back."""
    joined = joined_worth(
        worth,  # type: ignore[arg-type]  # a Surface is a Worth
        amounts,
        steepest=12.0 * 0.1,
        low=-0.1,
        high=0.1,
        degree=lambda slope, tolerance: series_degree(slope, tolerance) - too_few,
        tilt=tilt,
    )
    rates, factor = np.random.default_rng(5).uniform(-0.1, 0.1, (2, 500))
    exponents = np.multiply.outer(factor, GROWTH) - np.multiply.outer(rates, EXPOSURE)
    summed = np.exp(-tilt * factor) * np.exp(exponents).sum(axis=1)
    missed = float(np.abs(joined(np.array([rates, factor])) / summed - 1.0).max())
    assert least <= joined.error < most
    assert missed < max(2.0 * joined.error, 1e-11)
