"""Shocks in reverse, two against each other, and while the hand moves."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import fmin_slsqp

from desk.book import Book, FlowTable, YieldHistory
from desk.book.shock import Move, MoveKind, Shock
from desk.rates.compounding import Compounding
from desk.rates.gaussian import GaussianRates, RateFactor
from desk.valuation.measures import KEY_TERMS, key_rate_durations, value_flows
from desk.valuation.moved_curve import CurveMove
from desk.valuation.reverse import Goal, reverse_along, reverse_parallel
from desk.valuation.reverse_rates import (
    KeyRateCovariance,
    covariance_of_history,
    covariance_of_model,
    least_move,
)
from desk.valuation.shock_base import ShockBase, shock_base
from desk.valuation.shock_effects import CannotShock
from desk.valuation.shock_grid import shock_grid
from desk.valuation.shocks import run_shock
from desk.valuation.what_if import WhatIf, curve_moves
from tests.valuation.books import basis, small_book

FALL = Shock("funds fall", (Move(MoveKind.VALUE, -0.1),))
NOBODY = Shock("x", (Move(MoveKind.SPREAD, 1.0, target="nobody"),))
UP = Shock("up", (Move(MoveKind.PARALLEL, 100.0),))


@pytest.fixture(scope="module")
def tight() -> ShockBase:
    """A book whose liabilities are longer than its assets and nearly as large."""
    book = small_book()
    liabilities = replace(book.liabilities, amount=1.9 * book.liabilities.amount)
    return shock_base(replace(book, liabilities=liabilities))


@pytest.mark.parametrize("level", [0.9, 1.0, 1.1, 1.2])
def test_a_parallel_move_reaches_the_ratio(tight: ShockBase, level: float) -> None:
    """Fully revalued, the ratio is the level; the first scale is the smallest."""
    found = reverse_parallel(tight, goal=Goal.FUNDING_RATIO, level=level)
    assert found.result is not None
    assert found.shock is not None
    assert found.fault is None
    assert found.result.funding_ratio == pytest.approx(level, rel=1e-10)
    assert abs(found.scales[0]) == min(abs(scale) for scale in found.scales)
    assert found.shock.moves[0].size == pytest.approx(found.scales[0], rel=1e-15)


def test_any_shape_reaches_a_surplus(tight: ShockBase) -> None:
    """Funds and spreads together, scaled."""
    shape = Shock("bad year", (*FALL.moves, Move(MoveKind.SPREAD, 60.0), Move(MoveKind.SHORT, -30.0)))
    level = tight.position.surplus - 30.0
    found = reverse_along(tight, shape, goal=Goal.SURPLUS, level=level)
    assert found.result is not None
    assert found.result.surplus == pytest.approx(level, abs=1e-8)
    here = reverse_along(tight, shape, goal=Goal.SURPLUS, level=tight.position.surplus)
    assert here.scales == (0.0,)


def test_no_solution_is_told_in_one_line(tight: ShockBase) -> None:
    """And nothing is made up."""
    for found in (
        reverse_parallel(tight, goal=Goal.FUNDING_RATIO, level=50.0),
        reverse_along(tight, FALL, goal=Goal.SURPLUS, level=-1e9),
        reverse_parallel(shock_base(Book(basis(), FlowTable.empty())), goal=Goal.FUNDING_RATIO, level=1.0),
    ):
        assert (found.shock, found.result, found.scales) == (None, None, ())
        assert found.fault is not None
        assert "\n" not in str(found.fault)
    with pytest.raises(ValueError, match="`level` must be finite"):
        reverse_parallel(tight, goal=Goal.SURPLUS, level=float("nan"))
    with pytest.raises(ValueError, match="0 between them"):
        reverse_along(tight, FALL, goal=Goal.SURPLUS, level=0.0, least=1.0, most=2.0)
    with pytest.raises(CannotShock, match="nobody"):
        reverse_along(tight, NOBODY, goal=Goal.SURPLUS, level=0.0)


def two_factors() -> GaussianRates:
    """A model with two factors."""
    factors = [RateFactor(0.05, 0.009), RateFactor(0.6, 0.011)]
    return GaussianRates(basis().curve, factors, [[1.0, -0.4], [-0.4, 1.0]])


def history(random: np.random.Generator) -> YieldHistory:
    """Ten years of weekly rates at eight terms that move together."""
    terms = np.array([0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 30.0, 50.0])
    closeness = np.exp(-np.abs(np.subtract.outer(np.log(terms), np.log(terms))) / 2.0)
    steps = random.standard_normal((520, 8)) @ np.linalg.cholesky(closeness).T
    rates = 0.03 + np.cumsum(steps * 0.009 * np.sqrt(7.0 / 365.25), axis=0)
    rates[::50, 3] = np.nan
    return YieldHistory(np.datetime64("2016-01-01") + 7 * np.arange(520), terms, rates)


def test_covariance_of_a_model_is_that_of_its_bond_prices() -> None:
    """Zero rates a year on, drawn through the model's own bond prices: sample moments within 3 %."""
    model = two_factors()
    found = covariance_of_model(model, horizon=1.0)
    random = np.random.default_rng(3)
    speed, volatility = np.array([0.05, 0.6]), np.array([0.009, 0.011])
    both = np.add.outer(speed, speed)
    state = model.correlation * np.outer(volatility, volatility) * -np.expm1(-both) / both
    draws = random.multivariate_normal(np.zeros(2), state, 200_000)
    loading = -np.expm1(-np.outer(KEY_TERMS, speed)) / np.outer(KEY_TERMS, speed)
    np.testing.assert_allclose(found.matrix, np.cov(loading @ draws.T), rtol=0.03, atol=1e-7)


def test_covariance_of_a_history() -> None:
    """By numpy's own covariance where all steps are equal."""
    own = history(np.random.default_rng(5))
    whole = replace(own, rates=np.where(np.isnan(own.rates), 0.03, own.rates))
    found = covariance_of_history(whole, terms=own.terms)
    wanted = np.cov(np.diff(whole.rates, axis=0).T) * 365.25 / 7.0
    np.testing.assert_allclose(found.matrix, wanted, rtol=1e-10)
    gappy = covariance_of_history(own, terms=own.terms)
    assert np.isfinite(gappy.matrix).all()
    twice = covariance_of_history(whole, terms=own.terms, horizon=2.0)
    np.testing.assert_allclose(twice.matrix, 2.0 * wanted, rtol=1e-10)


def test_histories_and_covariances_that_will_not_do() -> None:
    """Each says what it must be."""
    own = history(np.random.default_rng(5))
    short = YieldHistory(own.date[:2], own.terms, own.rates[:2])
    still = YieldHistory(own.date, own.terms, np.full(own.rates.shape, 0.02))
    with pytest.raises(ValueError, match="at least three dates"):
        covariance_of_history(short)
    with pytest.raises(ValueError, match="must not be 0"):
        covariance_of_history(still)
    with pytest.raises(ValueError, match="`horizon` must be above 0"):
        covariance_of_model(two_factors(), horizon=0.0)
    with pytest.raises(ValueError, match="negative eigenvalue"):
        KeyRateCovariance(np.array([1.0, 2.0]), np.array([[1.0, 2.0], [2.0, 1.0]]), "made up")


@pytest.mark.parametrize("source", ["model", "history"])
@pytest.mark.parametrize("level", [0.93, 1.0, 1.12])
def test_the_least_move_against_scipy(tight: ShockBase, source: str, level: float) -> None:
    """`scipy.optimize.fmin_slsqp` from several starts finds none nearer; ours meets the level."""
    covariance = (
        covariance_of_model(two_factors())
        if source == "model"
        else covariance_of_history(history(np.random.default_rng(5)))
    )
    found = least_move(tight, covariance, goal=Goal.FUNDING_RATIO, level=level)
    assert found.result is not None
    assert found.result.funding_ratio == pytest.approx(level, rel=1e-10)
    factor = covariance.factor
    sides = [(side.times, side.value_by_time) for side in (tight.assets, tight.liabilities)]

    def squared_length(y: np.ndarray[tuple[int], np.dtype[np.float64]]) -> float:
        return float((y * y).sum())

    def ratio_gap(y: np.ndarray[tuple[int], np.dtype[np.float64]]) -> float:
        move = factor @ y
        worth = [
            float((value * np.exp(-np.interp(time, covariance.terms, move) * time)).sum())
            for time, value in sides
        ]
        return worth[0] / worth[1] - level

    distances = []
    for start in (0.1, 1.0, -1.0):
        y, squared, _, status, _ = fmin_slsqp(
            squared_length,
            [start] * factor.shape[1],
            eqcons=[ratio_gap],
            iter=500,
            acc=1e-14,
            iprint=0,
            full_output=True,
        )
        if status == 0 and abs(ratio_gap(y)) < 1e-8:
            distances.append(float(np.sqrt(squared)))
    assert distances
    assert found.distance == pytest.approx(min(distances), rel=1e-5)
    move = found.move * 1e-4
    inverse = np.linalg.pinv(covariance.matrix, rcond=1e-11, hermitian=True)
    assert float(move @ inverse @ move) == pytest.approx(found.distance**2, rel=1e-5)


def test_a_least_move_that_is_not_there(tight: ShockBase) -> None:
    """Told in one line; at the level already, no move is the least."""
    covariance = covariance_of_model(two_factors())
    none = least_move(tight, covariance, goal=Goal.FUNDING_RATIO, level=1e6)
    assert none.shock is None
    assert np.isnan(none.distance)
    assert none.fault is not None
    assert "\n" not in str(none.fault)
    here = least_move(tight, covariance, goal=Goal.SURPLUS, level=tight.position.surplus)
    assert here.distance == 0.0


PAIRS = {
    "rates and funds": (UP, FALL, True),
    "short and long": (
        Shock("s", (Move(MoveKind.SHORT, 50.0),)), Shock("l", (Move(MoveKind.LONG, 40.0),)), True
    ),
    "spreads and amounts": (
        Shock("s", (Move(MoveKind.SPREAD, 30.0),)),
        Shock("a", (Move(MoveKind.AMOUNT, 0.02, target="mixed"), Move(MoveKind.DECLINE, 0.001))),
        True,
    ),
    "relative after parallel": (UP, Shock("r", (Move(MoveKind.RELATIVE, 0.2),)), False),
    "later and parallel": (UP, Shock("t", (Move(MoveKind.TIME, 0.4),)), False),
}  # fmt: skip


@pytest.mark.parametrize("name", sorted(PAIRS))
def test_a_grid_is_each_cell_by_itself(name: str, tight: ShockBase) -> None:
    """Against shocks of the moves of both; the middle is where the book stands."""
    first, second, plain = PAIRS[name]
    scales = np.array([-2.0, -0.5, 0.0, 1.0, 3.0])
    grid = shock_grid(tight, first, second, first_scale=scales, second_scale=scales[1:])
    assert grid.faults == ()
    assert grid.surplus[2, 1] == pytest.approx(tight.position.surplus, rel=1e-12)
    for row, one in enumerate(scales.tolist()):
        for column, two in enumerate(scales[1:].tolist()):
            moves = (*first.scaled(one).moves, *second.scaled(two).moves)
            if not plain and name == "relative after parallel":
                # The second is of the rate that the first one leaves.
                zero = tight.assets.zero
                curve = zero + 0.01 * one
                change = 0.01 * one + CurveMove(second.scaled(two).moves).change(tight.assets.times, curve)
                worth = tight.assets.value_by_time * np.exp(-change * tight.assets.times)
                assert grid.assets[row, column] == pytest.approx(worth.sum(), rel=1e-12)
                continue
            result = run_shock(tight, Shock("both", moves))
            assert grid.assets[row, column] == pytest.approx(result.assets, rel=1e-12)
            assert grid.liabilities[row, column] == pytest.approx(result.liabilities, rel=1e-12)
            assert grid.funding_ratio[row, column] == pytest.approx(result.funding_ratio, rel=1e-12)


def test_a_grid_tells_what_it_cannot_compute(tight: ShockBase) -> None:
    """Cells stay empty; a grid that is too large, or of a shock that is none, is refused."""
    wild = shock_grid(tight, UP, FALL, first_scale=[-40.0, 0.0, 1.0], second_scale=[0.0, 1.0])
    assert np.isnan(wild.liabilities[0]).all()
    assert np.isfinite(wild.liabilities[1:]).all()
    seen: list[float] = []
    shock_grid(tight, UP, FALL, first_scale=[0.0, 1.0], second_scale=[1.0], progress=seen.append)
    assert seen[-1] == 1.0
    with pytest.raises(ValueError, match="at most"):
        shock_grid(tight, UP, FALL, first_scale=np.ones(1000), second_scale=np.ones(1000))
    with pytest.raises(ValueError, match="must be finite"):
        shock_grid(tight, UP, FALL, first_scale=[np.nan], second_scale=[1.0])
    with pytest.raises(CannotShock, match="nobody"):
        shock_grid(tight, UP, NOBODY, first_scale=[1.0], second_scale=[1.0])


FRAMES = [
    Shock("nothing", ()),
    Shock("pulled", curve_moves(level=20.0, slope=-30.0, bend=15.0)),
    Shock("all", (*curve_moves(level=-40.0), *FALL.moves, Move(MoveKind.SPREAD, 25.0))),
    Shock("later", (Move(MoveKind.TIME, 0.75), Move(MoveKind.PARALLEL, 10.0))),
]


@pytest.mark.parametrize("shock", FRAMES, ids=[shock.name for shock in FRAMES])
def test_a_frame_is_a_full_revaluation(shock: Shock, tight: ShockBase) -> None:
    """Headline as the shock gives it, key rates and years as the rows give them."""
    what_if = WhatIf(tight)
    frame = what_if.frame(shock)
    wanted = run_shock(tight, shock) if shock.moves else tight.position
    for name, figure in vars(frame.position).items():
        assert figure == pytest.approx(getattr(wanted, name), rel=1e-9, abs=1e-10)
        assert getattr(frame.change, name) == pytest.approx(
            getattr(wanted, name) - getattr(tight.position, name), rel=1e-6, abs=1e-9
        )
    assert frame.assets.sum() == pytest.approx(frame.position.assets, rel=1e-12)
    assert frame.liabilities.sum() == pytest.approx(frame.position.liabilities, rel=1e-12)
    before, after = what_if.lines(shock)[1]
    assert before.sum() == pytest.approx(tight.position.liabilities, rel=1e-12)
    assert after.sum() == pytest.approx(frame.position.liabilities, rel=1e-12)
    if shock.name in ("nothing", "pulled"):
        curve = what_if.curve(shock)
        for side, dv01 in ((tight.assets, frame.dv01_assets), (tight.liabilities, frame.dv01_liabilities)):
            rows = value_flows(side.flows, curve)
            np.testing.assert_allclose(dv01, key_rate_durations(rows)[1], rtol=1e-9, atol=1e-12)
            years = np.maximum(np.ceil(side.flows.time - 1e-9), 1.0)
            first = frame.assets if side is tight.assets else frame.liabilities
            assert first[3] == pytest.approx(rows.value[years == 4.0].sum(), rel=1e-12)


def test_pulls_of_a_curve() -> None:
    """Level everywhere; slope about the term; bend up at it and down on both sides."""
    time, zero = np.array([0.0, 10.0, 20.0, 50.0]), np.zeros(4)
    bent = CurveMove(curve_moves(bend=10.0)).change(time, zero)
    np.testing.assert_allclose(bent, [-0.001, 0.001, -0.001, -0.001], atol=1e-18)
    sloped = CurveMove(curve_moves(slope=10.0, term=20.0)).change(time, zero)
    np.testing.assert_allclose(sloped, [-0.001, -0.0005, 0.0, 0.001], atol=1e-18)
    assert curve_moves() == ()
    with pytest.raises(ValueError, match="`term` must be above 0"):
        curve_moves(level=1.0, term=0.0)
    annual = CurveMove((Move(MoveKind.PARALLEL, 50.0),), Compounding.ANNUAL)
    assert not annual.is_additive
