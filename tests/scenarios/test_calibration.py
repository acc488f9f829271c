"""Models fitted to the book's data: the records, their intervals, verdicts and refusals."""

from __future__ import annotations

import math
import pickle
from dataclasses import replace

import numpy as np
import pytest

from desk.book import Book, ModelName, RatesModel
from desk.book.market import CalibrationSource
from desk.book.model import History
from desk.rates.history_fit import HistoryFit
from desk.rates.history_square_root import fit_square_root
from desk.rates.history_vasicek import fit_vasicek
from desk.scenarios.calibration import (
    CALIBRATED_MODELS,
    calibrate,
    calibration_sources,
    calibrations,
    usual_model,
)
from desk.scenarios.calibration_band import history_band
from desk.scenarios.calibration_records import Calibration, CalibrationError
from desk.scenarios.models import rate_model
from tests.scenarios.fitted_books import LEVEL, SIGMA, SPEED, bare_book, history, quoted, with_all, yields

HISTORY, VOLATILITIES, YIELDS = CalibrationSource


@pytest.fixture(scope="module")
def full() -> Book:
    return with_all()


def fault_of(book: Book, source: CalibrationSource, model: ModelName | None = None) -> tuple[str, ...]:
    with pytest.raises(CalibrationError) as told:
        calibrate(book, source=source, model=model)
    return tuple(str(fault) for fault in told.value.faults)


def test_the_sources_are_those_that_the_book_holds(full: Book) -> None:
    assert calibration_sources(bare_book()) == ()
    assert calibration_sources(full) == (HISTORY, VOLATILITIES, YIELDS)
    assert calibration_sources(replace(full, volatilities=None)) == (HISTORY, YIELDS)


def test_the_usual_model_is_the_books_own_where_it_can_be_fitted(full: Book) -> None:
    assert usual_model(full, HISTORY) is ModelName.VASICEK
    own = replace(full, rates_model=RatesModel(ModelName.GAUSSIAN_2))
    assert usual_model(own, HISTORY) is ModelName.VASICEK
    assert usual_model(own, VOLATILITIES) is ModelName.GAUSSIAN_2
    assert usual_model(own, YIELDS) is ModelName.GAUSSIAN_2


@pytest.mark.parametrize("model", CALIBRATED_MODELS[HISTORY])
def test_a_history_gives_the_estimates_of_its_likelihood(model: ModelName) -> None:
    book = replace(bare_book(), history=replace(history(), rate=history().rate + 0.03))
    found = calibrate(book, source=HISTORY, model=model)
    data = book.history
    assert data is not None
    fit = (fit_vasicek if model is ModelName.VASICEK else fit_square_root)(data.date, data.rate)
    assert found.model is not None
    assert found.model.name is model
    assert found.model.mean_reversion == fit.mean_reversion == found.figure("mean_reversion").value
    assert found.model.long_run_rate == fit.long_run_rate
    assert found.model.volatility == fit.volatility
    assert found.model.starting_rate == data.rate[-1]
    assert found.model.risk_price == 0.0
    assert found.log_likelihood == fit.log_likelihood
    assert found.observations == data.rate.size - 1
    assert "real world" in found.measure


def test_figures_carry_errors_and_intervals() -> None:
    found = calibrate(replace(bare_book(), history=history()), source=HISTORY)
    for name, truth in (("mean_reversion", SPEED), ("long_run_rate", LEVEL), ("volatility", SIGMA)):
        figure = found.figure(name)
        assert figure.low < truth < figure.high
        assert figure.error > 0.0
        assert not figure.is_derived
    volatility = found.figure("volatility")
    assert volatility.high - volatility.value == pytest.approx(1.959964 * volatility.error, rel=1e-6)
    speed, half = found.figure("mean_reversion"), found.figure("half_life")
    assert half.is_derived
    assert (half.low, half.high) == pytest.approx((math.log(2.0) / speed.high, math.log(2.0) / speed.low))
    with pytest.raises(KeyError):
        found.figure("no such figure")


def test_the_profile_crosses_its_cut_at_the_ends_of_the_interval() -> None:
    found = calibrate(replace(bare_book(), history=history()), source=HISTORY)
    profile, speed = found.profile, found.figure("mean_reversion")
    assert profile is not None
    assert float(profile.log_likelihood.max()) == pytest.approx(found.log_likelihood, abs=1e-6)
    for end in (speed.low, speed.high):
        height = float(np.interp(end, profile.mean_reversion, profile.log_likelihood))
        assert height == pytest.approx(profile.cut, abs=0.05)


def test_residuals_are_what_the_forecasts_leave() -> None:
    data = history(weeks=300)
    found = calibrate(replace(bare_book(), history=data), source=HISTORY)
    band = found.band
    assert band is not None
    left = (data.rate[1:] - band.forecast) / band.deviation
    np.testing.assert_allclose(left, found.residual, rtol=1e-9, atol=1e-9)
    assert band.mean[0] == band.low[0] == band.high[0] == data.rate[0]


def test_the_band_of_a_square_root_model_holds_its_share_of_drawn_paths() -> None:
    """20,000 rates of the fitted law, drawn as noncentral chi-square numbers by numpy: the share between the
    edges is 95 % within four standard errors (0.0015 each), where the normal band would hold more or less."""
    data = history(weeks=200, step_days=30)
    data = replace(data, rate=np.abs(data.rate - 0.01) * 0.4 + 1e-3)
    fit = fit_square_root(data.date, data.rate)
    band = history_band(fit, data)
    row, time = 60, 60 * 30 / 365.0
    unit = 0.25 * fit.volatility**2 * -math.expm1(-fit.mean_reversion * time) / fit.mean_reversion
    freedom = 4.0 * fit.mean_reversion * fit.long_run_rate / fit.volatility**2
    distance = float(data.rate[0]) * math.exp(-fit.mean_reversion * time) / unit
    drawn = unit * np.random.default_rng(1).noncentral_chisquare(freedom, distance, 20_000)
    inside = float(np.mean((drawn > band.low[row]) & (drawn < band.high[row])))
    assert inside == pytest.approx(0.95, abs=4 * 0.00154)
    assert float(drawn.mean()) == pytest.approx(float(band.mean[row]), rel=0.02)
    assert (band.low >= 0.0).all()


def test_a_history_without_mean_reversion_gives_no_model() -> None:
    rate = 0.01 + 0.0005 * np.arange(120) + 1e-5 * np.cos(np.arange(120.0))
    day = np.datetime64("2021-01-04") + 7 * np.arange(120)
    found = calibrate(replace(bare_book(), history=History(day, rate)), source=HISTORY)
    assert found.is_poor
    assert "no mean reversion" in found.verdict
    assert found.model is None
    assert "long run rate" in found.obstacle
    band = found.band
    assert band is not None
    # The drift that is left is that from the first rate to the last.
    assert float(band.mean[-1]) == pytest.approx(float(rate[-1]), rel=1e-9)
    assert math.isnan(found.figure("long_run_rate").value)


def test_what_is_not_of_the_short_rate_stays_as_the_book_has_it() -> None:
    own = RatesModel(
        ModelName.HULL_WHITE, 0.05, 0.01, inflation_mean_reversion=0.3, inflation_volatility=0.006
    )
    found = calibrate(replace(bare_book(), history=history(), rates_model=own), source=HISTORY)
    assert found.model is not None
    assert found.model.inflation_volatility == 0.006
    assert found.model.inflation_mean_reversion == 0.3


def test_quotes_of_a_known_model_give_it_back() -> None:
    book = bare_book()
    book = replace(book, volatilities=quoted(book))
    found = calibrate(book, source=VOLATILITIES, model=ModelName.HULL_WHITE)
    assert found.model is not None
    assert found.model.mean_reversion == pytest.approx(0.1, rel=1e-4)
    assert found.model.volatility == pytest.approx(0.009, rel=1e-5)
    assert not found.is_poor
    assert found.verdict.startswith("The fit is close")
    assert "pricing measure" in found.measure
    assert np.abs(found.residual).max() < 0.05
    drawn = rate_model(replace(book, rates_model=found.model))
    assert float(drawn.curve.zero(7.0)) == pytest.approx(float(book.basis.curve.zero(7.0)), abs=1e-14)


def test_a_model_that_cannot_follow_the_quotes_is_called_poor() -> None:
    book = bare_book()
    book = replace(book, volatilities=quoted(book, noise=0.4))
    found = calibrate(book, source=VOLATILITIES, model=ModelName.HO_LEE)
    assert found.is_poor
    assert found.verdict.startswith("The fit is poor")
    worst = int(np.argmax(np.abs(found.residual)))
    assert abs(found.residual[worst]) > 10.0


def test_yields_give_both_measures(full: Book) -> None:
    found = calibrate(full, source=YIELDS)
    assert isinstance(found.data, type(full.yield_history))
    assert found.model is not None
    for name in ("mean_reversion", "volatility", "long_run_rate", "risk_price", "starting_rate"):
        assert getattr(found.model, name) == found.figure(name).value
    level, lasting = found.figure("long_run_rate").value, found.figure("real_world_rate")
    model = found.model
    assert model.volatility is not None
    assert model.mean_reversion is not None
    shift = model.volatility * model.risk_price / model.mean_reversion
    assert lasting.value == pytest.approx(level + shift, abs=1e-9)
    assert lasting.is_derived


def test_all_sources_at_once_with_those_that_are_refused(full: Book) -> None:
    short = replace(full, history=history(weeks=5))
    told: list[float] = []
    found, faults = calibrations(short, progress=told.append)
    assert [each.source for each in found] == [VOLATILITIES, YIELDS]
    assert len(faults) == 1
    assert faults[0].sheet == "History"
    assert "too short" in faults[0].found
    assert told == sorted(told)
    assert calibrations(bare_book()) == ((), ())


# What is refused


def test_without_data_the_sheet_is_named() -> None:
    for source, sheet in ((HISTORY, "History"), (VOLATILITIES, "Volatilities"), (YIELDS, "Yield history")):
        (line,) = fault_of(bare_book(), source)
        assert line.startswith(f"{sheet}: ")
        assert f"Add a sheet '{sheet}'" in line


def test_a_model_that_does_not_go_with_the_data(full: Book) -> None:
    (line,) = fault_of(full, VOLATILITIES, ModelName.VASICEK)
    assert "vasicek cannot be fitted to the quoted volatilities" in line
    assert "hull-white" in line


def test_negative_rates_under_the_square_root_model() -> None:
    data = history(weeks=60)
    rate = data.rate.copy()
    rate[3] = -0.001
    book = replace(bare_book(), history=History(data.date, rate))
    (line,) = fault_of(book, HISTORY, ModelName.CIR)
    assert "row 4" in line
    assert calibrate(book, source=HISTORY).name is ModelName.VASICEK


@pytest.mark.parametrize(
    ("rates", "words"),
    [([0.02] * 30, "never moves"), ([0.02, math.nan, *[0.03] * 28], "row 2"), ([5e4, *[1.0] * 29], "sense")],
)
def test_odd_histories(rates: list[float], words: str) -> None:
    day = np.datetime64("2021-01-04") + np.arange(30)
    (line,) = fault_of(replace(bare_book(), history=History(day, np.array(rates))), HISTORY)
    assert words in line


def test_a_gap_is_told_and_allowed_for() -> None:
    data = history(weeks=300)
    kept = np.r_[0:100, 160:300]
    book = replace(bare_book(), history=History(data.date[kept], data.rate[kept]))
    found = calibrate(book, source=HISTORY)
    assert any("gap" in remark for remark in found.remarks)


def test_quotes_that_cannot_hold_together_are_refused_by_row() -> None:
    book = bare_book()
    data = quoted(book)
    volatility = data.volatility.copy()
    volatility[0] = -0.01
    volatility[5] = 3.0
    lines = fault_of(replace(book, volatilities=replace(data, volatility=volatility)), VOLATILITIES)
    assert [line.split(":")[1].strip() for line in lines] == ["quote 1", "quote 6"]
    assert all(line.startswith("Volatilities") for line in lines)


def test_fewer_quotes_than_parameters() -> None:
    book = bare_book()
    data = quoted(book)
    few = replace(
        data,
        **{
            name: getattr(data, name)[:2]
            for name in (
                "instrument",
                "expiry",
                "length",
                "strike",
                "volatility",
                "kind",
                "shift",
                "frequency",
            )
        },
    )
    (line,) = fault_of(replace(book, volatilities=few), VOLATILITIES, ModelName.GAUSSIAN_2)
    assert "5 parameters" in line


def test_a_basis_without_a_curve() -> None:
    book = bare_book()
    data = quoted(book)
    broken = replace(book.basis, rates=np.array([0.02, -5.0, 0.03]))
    lines = fault_of(replace(book, basis=broken, volatilities=data), VOLATILITIES)
    assert lines[0].startswith("Basis: ")


def test_too_few_terms_for_two_factors() -> None:
    data = yields()
    two = replace(data, terms=data.terms[:2], rates=data.rates[:, :2])
    (line,) = fault_of(replace(bare_book(), yield_history=two), YIELDS, ModelName.GAUSSIAN_2)
    assert "at least 3 terms" in line


def test_an_error_survives_the_way_between_processes() -> None:
    with pytest.raises(CalibrationError) as told:
        calibrate(bare_book(), source=HISTORY)
    again = pickle.loads(pickle.dumps(told.value))
    assert again.faults == told.value.faults
    assert str(again) == str(told.value)


def test_a_calibration_stays_what_it_is(full: Book) -> None:
    found: Calibration = calibrate(full, source=HISTORY)
    assert isinstance(found.fit, HistoryFit)
    with pytest.raises(AttributeError):
        found.verdict = "The fit is good."  # type: ignore[misc]  # that it is refused is the point
