"""Smooth curves fitted to bonds: recovery of known curves, residuals, and sheets that give none."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize

from desk.rates.curve_error import CurveError
from desk.rates.fitting import fit_nelson_siegel, fit_svensson, measured_fit
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.rates.quotes import bond_flows

# Gürkaynak, R., Sack, B. and Wright, J. (2007), daily data file feds200628, 31 January 2002.
TREASURY = Svensson(
    0.0361515400768789,
    -0.0153275172078452,
    -0.036025165489901,
    0.0797553534931804,
    0.476663944558545,
    10.4204535976878,
)


def _sheet(curve: NelsonSiegel | Svensson, count: int, random: np.random.Generator) -> QuotedFlows:
    """Random bonds, the first of them short, with their prices on a curve."""
    terms = np.append(random.uniform(0.3, 0.8), random.uniform(0.3, 30.0, count - 1))
    blank = bond_flows(terms, random.uniform(0.0, 0.08, count), prices=np.full(count, 100.0))
    return replace(blank, target=blank.values(curve))


def _noisy(flows: QuotedFlows, random: np.random.Generator) -> QuotedFlows:
    return replace(flows, target=np.round(flows.target + random.normal(0.0, 0.05, len(flows)), 2))


@pytest.mark.parametrize("count", [12, 30, 120])
def test_published_parameters_are_recovered(count: int) -> None:
    """Prices on the published curve give back its yields within 0.1 basis points, over the terms it was
    fitted to."""
    random = np.random.default_rng(count)
    flows = _sheet(TREASURY, count, random)
    found = fit_svensson(flows)
    time = np.linspace(float(flows.term.min()), float(flows.term.max()), 300)
    assert found.converged
    assert np.abs(1e4 * (found.curve.zero(time) - TREASURY.zero(time))).max() < 0.1
    assert found.largest_bp < 0.01
    assert np.abs(found.residual_price).max() < 1e-3


def test_random_curves_are_recovered() -> None:
    random = np.random.default_rng(5)
    for _ in range(25):
        level = random.uniform(0.0, 0.06)
        slope, curvature, second = random.uniform(-0.03, 0.03, 3)
        decay = random.uniform(0.4, 3.0)
        curve = Svensson(level, slope, curvature, second, decay, decay * random.uniform(2.5, 8.0))
        flows = _sheet(curve, 40, random)
        found = fit_svensson(flows)
        time = np.linspace(float(flows.term.min()), float(flows.term.max()), 100)
        assert np.abs(1e4 * (found.curve.zero(time) - curve.zero(time))).max() < 0.1


def test_nelson_siegel_is_recovered() -> None:
    curve = NelsonSiegel(0.042, -0.025, 0.01, 2.1)
    found = fit_nelson_siegel(_sheet(curve, 12, np.random.default_rng(3)))
    assert isinstance(found.curve, NelsonSiegel)
    for name in ("level", "slope", "curvature", "decay"):
        assert getattr(found.curve, name) == pytest.approx(getattr(curve, name), rel=1e-6)


def test_residuals_are_what_they_say() -> None:
    random = np.random.default_rng(7)
    flows = _noisy(_sheet(TREASURY, 40, random), random)
    found = fit_svensson(flows)
    worth = flows.values(found.curve)
    np.testing.assert_allclose(found.residual_price, worth - flows.target, atol=1e-12)
    in_points = 1e4 * (flow_yields(flows, target=worth) - flow_yields(flows))
    np.testing.assert_allclose(found.residual_bp, in_points, atol=1e-9)
    assert found.rmse_bp == pytest.approx(np.sqrt(np.mean(in_points**2)))
    assert found.largest_bp == np.abs(in_points).max()
    # A fifth of a unit of price over a duration of some years is a few basis points of yield.
    assert 0.1 < found.rmse_bp < 10.0


def test_no_direction_leads_lower() -> None:
    """A search that knows nothing of derivatives, from the curve found, finds nothing better."""
    random = np.random.default_rng(8)
    flows = _noisy(_sheet(TREASURY, 40, random), random)
    found = fit_svensson(flows).curve
    assert isinstance(found, Svensson)
    yields = flow_yields(flows)
    discounted = flows.amount * np.exp(-yields[flows.instrument] * flows.time)
    scale = flows.sums(discounted * flows.time)
    first, last = float(flows.term.min()), float(flows.term.max())

    def squares(curve: Svensson) -> float:
        return float(np.sum((1e4 * (flows.values(curve) - flows.target) / scale) ** 2))

    noise = np.sqrt(squares(found) / 34)

    def cost(numbers: np.ndarray[tuple[int], np.dtype[np.float64]]) -> float:
        curve = Svensson(*numbers[:4].tolist(), *np.exp(numbers[4:]).tolist())
        before = (curve.zero([0.0, first / 3.0, first / 1.5]) - curve.zero(first)) / 0.01
        beyond = (curve.level - curve.zero(last)) / 0.02
        return squares(curve) + float(noise**2 * (before @ before + beyond**2))

    begin = np.array([
        found.level, found.slope, found.curvature, found.second_curvature,
        np.log(found.decay), np.log(found.second_decay),
    ])  # fmt: skip
    searched = minimize(cost, begin, method="Nelder-Mead", options={"maxfev": 3000})
    assert cost(begin) <= searched.fun * (1.0 + 1e-5)
    # And the bonds themselves hardly suffer.

    def squares_at(numbers: np.ndarray[tuple[int], np.dtype[np.float64]]) -> float:
        return squares(Svensson(*numbers[:4].tolist(), *np.exp(numbers[4:]).tolist()))

    free = minimize(squares_at, begin, method="Nelder-Mead", options={"maxfev": 3000})
    assert squares(found) < free.fun * 1.002


def _corporate(
    curve: NelsonSiegel | Svensson, seed: int, terms: np.ndarray[tuple[int], np.dtype[np.float64]]
) -> QuotedFlows:
    """Bonds whose yields miss a curve by three basis points."""
    random = np.random.default_rng(seed)
    count = terms.size
    blank = bond_flows(terms, random.uniform(0.01, 0.06, count), yields=np.full(count, 0.04))
    duration = blank.sums(blank.amount * curve.discount(blank.time) * blank.time)
    return replace(blank, target=blank.values(curve) - duration * random.normal(0.0, 3e-4, count))


SHAPES: dict[str, NelsonSiegel | Svensson] = {
    "humped": Svensson(0.045, -0.012, -0.01, 0.02, 1.6, 8.0),
    "rising": NelsonSiegel(0.045, -0.015, -0.01, 2.0),
    "treasury": TREASURY,
    "flat": NelsonSiegel(0.04, 0.0, 0.0, 2.0),
}


class TestBeforeTheFirstBond:
    """Where no bond holds it, the curve stays near the bonds."""

    @pytest.mark.parametrize("shape", SHAPES)
    def test_short_rates_from_bonds_of_more_than_a_year(self, shape: str) -> None:
        """The rate for three months from 32 bonds of 1.2 to 30 years is within a point of the true one, with
        at least 95 % of the seeds."""
        curve = SHAPES[shape]
        seeds = 50
        right = {fit_nelson_siegel: 0, fit_svensson: 0}
        for seed in range(seeds):
            inner = np.random.default_rng(1000 + seed).uniform(1.2, 30.0, 30)
            flows = _corporate(curve, seed, np.sort(np.append(inner, [1.2, 30.0])))
            for fit in right:
                found = fit(flows)
                right[fit] += abs(float(found.curve.zero(0.25) - curve.zero(0.25))) < 0.01
                assert found.converged
                if fit is fit_svensson:
                    assert found.rmse_bp < 5.0
        assert min(right.values()) >= 0.95 * seeds

    @pytest.mark.parametrize("curve", SHAPES.values(), ids=SHAPES)
    @pytest.mark.parametrize(
        ("count", "low", "high"),
        [(20, 10.0, 30.0), (20, 0.25, 3.0), (7, 1.0, 20.0), (6, 2.0, 10.0), (60, 0.3, 30.0), (8, 0.02, 0.3)],
        ids=["long", "short", "few", "as many as parameters", "usual", "bills"],
    )
    def test_bounds_hold_for_bonds_of_all_terms(
        self, curve: NelsonSiegel | Svensson, count: int, low: float, high: float
    ) -> None:
        for seed in range(5):
            terms = np.random.default_rng(seed).uniform(low, high, count)
            flows = _corporate(curve, seed, terms)
            yields = flow_yields(flows)
            for fit in (fit_nelson_siegel, fit_svensson):
                found = fit(flows)
                made = found.curve
                assert isinstance(made, (NelsonSiegel, Svensson))
                short = made.level + made.slope
                assert yields.min() - 0.0501 <= short <= yields.max() + 0.0501
                decays = [made.decay] if isinstance(made, NelsonSiegel) else [made.decay, made.second_decay]
                assert min(decays) >= 0.999 * max(0.5 * float(flows.term.min()), 0.05)
                assert max(decays) <= 1.001 * max(float(flows.term.max()), 0.1)
                # Up to the first bond it goes no further than by a few points.
                early = made.zero(np.linspace(0.0, float(flows.term.min()), 50))
                assert np.ptp(early) < 0.04

    def test_what_the_bonds_tell_outweighs_the_bounds(self) -> None:
        """A steep fall towards time 0 is found where short bonds show it."""
        curve = NelsonSiegel(0.05, -0.06, 0.0, 0.5)
        flows = _corporate(curve, 3, np.geomspace(0.1, 30.0, 40))
        assert float(fit_svensson(flows).curve.zero(0.0)) == pytest.approx(-0.01, abs=0.004)


def test_one_bond_that_is_wrong_stands_out() -> None:
    random = np.random.default_rng(9)
    flows = _sheet(TREASURY, 60, random)
    target = flows.target.copy()
    target[17] += 3.0
    found = fit_svensson(replace(flows, target=target))
    assert int(np.argmax(np.abs(found.residual_bp))) == 17


def test_the_level_stays_near_the_yields() -> None:
    """Waves that no curve of the family has are not bought by one that runs off beyond the bonds."""
    for seed in range(6):
        random = np.random.default_rng(seed)
        flows = _sheet(TREASURY, 60, random)
        zero = TREASURY.zero(flows.time) + 0.002 * np.sin(flows.time / random.uniform(1.0, 4.0))
        waved = replace(flows, target=flows.sums(flows.amount * np.exp(-zero * flows.time)))
        yields = flow_yields(waved)
        found = fit_svensson(waved)
        assert isinstance(found.curve, Svensson)
        assert yields.min() - 0.1 <= found.curve.level <= yields.max() + 0.1
        assert np.abs(found.curve.zero([40.0, 100.0])).max() < 0.2
        assert found.rmse_bp < 20.0


def test_order_of_the_bonds_does_not_matter() -> None:
    random = np.random.default_rng(12)
    flows = _noisy(_sheet(TREASURY, 40, random), random)
    order = random.permutation(40)
    first, second = fit_svensson(flows), fit_svensson(flows.taken(order))
    np.testing.assert_allclose(second.residual_bp, first.residual_bp[order], atol=1e-3)


def test_any_curve_is_measured() -> None:
    random = np.random.default_rng(13)
    flows = _noisy(_sheet(TREASURY, 20, random), random)
    used = np.arange(20) % 3 > 0
    found = measured_fit(TREASURY, flows, is_used=used)
    assert found.rmse_bp == pytest.approx(np.sqrt(np.mean(found.residual_bp[used] ** 2)))
    assert found.largest_bp == np.abs(found.residual_bp[used]).max()
    assert measured_fit(TREASURY, flows).is_used.all()


class TestFaults:
    """Sheets that give no curve."""

    def test_fewer_bonds_than_parameters(self) -> None:
        flows = _sheet(TREASURY, 5, np.random.default_rng(1))
        with pytest.raises(CurveError, match="5 quotes for a curve of 6 parameters"):
            fit_svensson(flows)
        assert fit_nelson_siegel(flows).converged
        with pytest.raises(CurveError, match="3 quotes for a curve of 4 parameters"):
            fit_nelson_siegel(flows.leading(3))

    def test_a_bond_without_a_yield(self) -> None:
        flows = _sheet(TREASURY, 8, np.random.default_rng(1))
        target = flows.target.copy()
        target[2] = -1.0
        with pytest.raises(CurveError, match="no yield") as caught:
            fit_svensson(replace(flows, target=target))
        assert caught.value.rows == (2,)

    def test_a_yield_beyond_any_sense(self) -> None:
        flows = _sheet(TREASURY, 12, np.random.default_rng(1))
        target = flows.target.copy()
        near = int(flows.term.argmin())
        target[near] = 1e-6
        for fit in (fit_nelson_siegel, fit_svensson):
            with pytest.raises(CurveError, match="% a year") as caught:
                fit(replace(flows, target=target))
            assert caught.value.rows == (near,)

    def test_absurd_prices_end_in_a_curve_with_its_errors(self) -> None:
        random = np.random.default_rng(10)
        for _ in range(10):
            flows = _sheet(TREASURY, 12, random)
            wild = replace(flows, target=flows.target * np.exp(random.uniform(-4.0, 4.0, 12)))
            found = fit_svensson(wild)
            assert np.isfinite(found.residual_bp).all()
            assert found.rmse_bp > 100.0

    def test_bonds_without_coupons(self) -> None:
        terms = np.linspace(0.5, 30.0, 20)
        flows = bond_flows(terms, np.zeros(20), yields=np.full(20, 0.03), frequency=1)
        found = fit_svensson(flows)
        assert found.largest_bp < 1e-3
        np.testing.assert_allclose(found.curve.zero(terms), np.log(1.03), atol=1e-8)

    def test_a_thousand_bonds(self) -> None:
        random = np.random.default_rng(14)
        flows = _noisy(_sheet(TREASURY, 1000, random), random)
        found = fit_svensson(flows)
        # Nearer to the prices than the curve they were drawn about.
        assert found.rmse_bp < measured_fit(TREASURY, flows).rmse_bp * 1.001

    def test_bonds_that_all_mature_together(self) -> None:
        flows = bond_flows(np.full(7, 5.0), np.linspace(0.0, 0.06, 7), yields=np.full(7, 0.03))
        found = fit_svensson(flows)
        assert found.largest_bp < 0.01
