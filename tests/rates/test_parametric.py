"""Nelson-Siegel and Svensson: the laws every curve keeps, and the limits of the formulas."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from desk.rates.compounding import Compounding, to_continuous
from desk.rates.parametric import NelsonSiegel, Svensson, loadings

EVERY = pytest.mark.parametrize(
    "curve",
    [
        NelsonSiegel(0.04, -0.02, 0.015, 1.8),
        Svensson(0.03, -0.035, -0.02, 0.04, 0.6, 9.0),
        NelsonSiegel(0.04, -0.02, 0.015, 1.8, Compounding.ANNUAL),
        Svensson(0.03, -0.035, -0.02, 0.04, 0.6, 9.0, Compounding.SEMI_ANNUAL),
    ],
    ids=["Nelson-Siegel", "Svensson", "Nelson-Siegel, annual", "Svensson, semi-annual"],
)


@EVERY
class TestEveryFormula:
    """What holds for both, whatever the compounding."""

    def test_starts_at_one(self, curve: NelsonSiegel | Svensson) -> None:
        assert curve.discount(0.0) == 1.0
        short = to_continuous(curve.level + curve.slope, curve.compounding)
        assert curve.zero(0.0) == pytest.approx(short, rel=1e-14)
        assert curve.instantaneous_forward(0.0) == pytest.approx(short, rel=1e-14)
        np.testing.assert_allclose(curve.zero(1e-9), curve.zero(0.0), atol=1e-9)

    def test_ends_at_the_level(self, curve: NelsonSiegel | Svensson) -> None:
        level = to_continuous(curve.level, curve.compounding)
        assert curve.instantaneous_forward(1e4) == pytest.approx(level, rel=2e-3)
        assert curve.zero(1e7) == pytest.approx(level, rel=1e-5)

    def test_forward_is_the_slope_of_the_logarithm(self, curve: NelsonSiegel | Svensson) -> None:
        time, step = np.linspace(0.01, 60.0, 500), 1e-5
        slope = -(np.log(curve.discount(time + step)) - np.log(curve.discount(time - step))) / (2 * step)
        np.testing.assert_allclose(curve.instantaneous_forward(time), slope, atol=1e-9)

    def test_forwards_chain(self, curve: NelsonSiegel | Svensson) -> None:
        random = np.random.default_rng(1)
        start, end = random.uniform(0.0, 60.0, (2, 300))
        growth = np.exp(-curve.forward(start, end) * (end - start))
        np.testing.assert_allclose(curve.discount(start) * growth, curve.discount(end), rtol=1e-13)
        close = curve.forward(start, start + 1e-7)
        np.testing.assert_allclose(close, curve.instantaneous_forward(start), atol=1e-8)
        same = curve.forward(start, start)
        np.testing.assert_array_equal(same, curve.instantaneous_forward(start))

    def test_any_shape(self, curve: NelsonSiegel | Svensson) -> None:
        grid = np.linspace(0.0, 60.0, 24).reshape(2, 3, 4)
        for method in (curve.discount, curve.zero, curve.instantaneous_forward):
            np.testing.assert_allclose(method(grid).ravel(), [method(t) for t in grid.ravel()], rtol=1e-14)
            assert method([]).shape == (0,)
        assert curve.forward(grid[0], 70.0).shape == (3, 4)

    @pytest.mark.parametrize("time", [-1.0, np.nan, np.inf])
    def test_refuses_what_is_no_time(self, curve: NelsonSiegel | Svensson, time: float) -> None:
        for method in (curve.discount, curve.zero, curve.instantaneous_forward):
            with pytest.raises(ValueError, match="time"):
                method([1.0, time])
        with pytest.raises(ValueError, match="end"):
            curve.forward(1.0, time)


@given(st.floats(0.0, 200.0), st.floats(0.01, 50.0))
def test_loadings_are_means_of_the_forward_parts(time: float, decay: float) -> None:
    """``∫₀ᵗ e^{-s/τ} ds / t`` and ``∫₀ᵗ (s/τ) e^{-s/τ} ds / t`` by Gauss-Legendre quadrature."""
    nodes, weights = np.polynomial.legendre.leggauss(60)
    # Beyond forty decays nothing is left to integrate.
    reach = min(time, 40.0 * decay)
    moments = 0.5 * (nodes + 1.0) * reach / decay
    share = 0.5 * weights * (reach / time if time > 0.0 else 1.0)
    slope, curvature = loadings(time, decay)
    assert slope == pytest.approx(share @ np.exp(-moments), rel=1e-11, abs=1e-13)
    assert curvature == pytest.approx(share @ (moments * np.exp(-moments)), rel=1e-9, abs=1e-13)


def test_svensson_without_its_second_curvature_is_nelson_siegel() -> None:
    time = np.linspace(0.0, 40.0, 100)
    short, long = NelsonSiegel(0.04, -0.02, 0.015, 1.8), Svensson(0.04, -0.02, 0.015, 0.0, 1.8, 7.0)
    np.testing.assert_array_equal(short.zero(time), long.zero(time))


@pytest.mark.parametrize(
    ("parameters", "words"),
    [
        ((0.04, -0.02, 0.015, 0.0), "`decay` must be above 0"),
        ((0.04, -0.02, 0.015, -1.0), "`decay` must be above 0"),
        ((np.nan, -0.02, 0.015, 1.0), "`level` must be finite"),
        ((0.04, np.inf, 0.015, 1.0), "`slope` must be finite"),
    ],
)
def test_refuses_parameters(parameters: tuple[float, float, float, float], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        NelsonSiegel(*parameters)
    with pytest.raises(ValueError, match="second_decay"):
        Svensson(0.03, -0.035, -0.02, 0.04, 0.6, 0.0)


def test_a_rate_that_leaves_nothing_is_refused() -> None:
    with pytest.raises(ValueError, match="must be above"):
        NelsonSiegel(-1.5, 0.0, 0.0, 1.0, Compounding.ANNUAL).discount(1.0)
