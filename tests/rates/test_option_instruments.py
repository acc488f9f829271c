"""Quoted caps, floors and swaptions: layout, parity, what is wrong with them, models priced and fitted."""

from __future__ import annotations

import math
import pickle
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import integrate

from desk.book.market import Instrument, VolatilityKind
from desk.rates.gaussian import GaussianRates, RateFactor, gaussian_2, hull_white
from desk.rates.option_calibration import FITTED_MODELS, fit_volatilities
from desk.rates.option_formulas import forward_option, forward_option_slope, implied_volatility
from desk.rates.option_instruments import OptionQuotes, OptionQuotesError, option_quotes
from desk.rates.option_models import gaussian_option_prices
from desk.rates.option_square_root import square_root_option_prices
from desk.rates.square_root import SquareRootRates
from tests.rates.flat_curve import flat_curve, humped_curve

FloatArray = NDArray[np.float64]
CURVE = humped_curve()


def _columns(count: int, **given: Any) -> dict[str, Any]:
    columns: dict[str, Any] = {
        "instrument": ["payer swaption"] * count,
        "expiry": np.full(count, 5.0),
        "length": np.full(count, 5.0),
        "strike": np.full(count, np.nan),
        "volatility": np.full(count, 0.008),
        "kind": ["normal"] * count,
        "shift": np.zeros(count),
        "frequency": np.ones(count),
    }
    return columns | given


def _swaptions(volatility: float = 0.008) -> OptionQuotes:
    expiry = np.repeat([1.0, 2.0, 5.0, 10.0], 4)
    return option_quotes(
        CURVE,
        **_columns(
            16, expiry=expiry, length=np.tile([1.0, 2.0, 5.0, 10.0], 4), volatility=np.full(16, volatility)
        ),
    )


def _caps() -> OptionQuotes:
    return option_quotes(
        CURVE,
        **_columns(
            7,
            instrument=["cap"] * 7,
            expiry=np.array([2.0, 3.0, 4.0, 5.0, 7.0, 10.0, 20.0]),
            kind=["lognormal"] * 7,
            volatility=np.full(7, 0.3),
            shift=np.full(7, 0.01),
            frequency=np.full(7, 2.0),
        ),
    )


def _two_factors(tied: float = -0.7) -> GaussianRates:
    return gaussian_2(
        CURVE,
        mean_reversion=0.77,
        volatility=0.022,
        second_mean_reversion=0.08,
        second_volatility=0.0104,
        factor_correlation=tied,
    )


def _square_root() -> SquareRootRates:
    return SquareRootRates(
        mean_reversion=0.2, long_run_rate=0.03, volatility=0.06, starting_rate=0.02, curve=CURVE
    )


def test_enumerations_of_the_book_are_taken_as_they_are() -> None:
    quotes = option_quotes(
        CURVE, **_columns(1, instrument=(Instrument.RECEIVER_SWAPTION,), kind=(VolatilityKind.NORMAL,))
    )
    assert quotes.names == ("receiver swaption 5y into 5y",)


def test_at_the_money_a_swap_is_worth_nothing() -> None:
    """Payer and receiver cost the same, and so do cap and floor: parity."""
    quotes = option_quotes(
        CURVE,
        **_columns(
            4,
            instrument=["payer swaption", "receiver swaption", "cap", "floor"],
            frequency=np.array([2.0, 2.0, 4.0, 4.0]),
        ),
    )
    for prices in (
        quotes.prices(quotes.volatility),
        gaussian_option_prices(_two_factors(), quotes),
        square_root_option_prices(_square_root(), quotes),
    ):
        assert prices[0] == pytest.approx(prices[1], rel=1e-9)
        assert prices[2] == pytest.approx(prices[3], rel=1e-9)
    assert quotes.strike[0] == pytest.approx(
        float(CURVE.discount(5.0) - CURVE.discount(10.0))
        / float(np.sum(0.5 * CURVE.discount(np.arange(5.5, 10.5, 0.5))))
    )


def test_short_first_periods_and_the_period_already_fixed() -> None:
    quotes = option_quotes(
        CURVE,
        **_columns(
            2,
            instrument=["cap", "payer swaption"],
            expiry=np.array([1.25, 1.0]),
            length=np.array([np.nan, 1.25]),
        ),
    )
    assert quotes.start[0, quotes.accrual[0] > 0.0] == pytest.approx([0.25])
    assert quotes.time[0, quotes.accrual[0] > 0.0] == pytest.approx([1.25])
    assert quotes.accrual[1] == pytest.approx([0.25, 1.0])


def test_two_factor_swaption_against_a_double_integral() -> None:
    """The definition: the payoff integrated over both factors under the measure of the expiry bond."""
    quotes = option_quotes(CURVE, **_columns(1, strike=np.array([0.03])))
    model = _two_factors()
    nodes, weights = np.polynomial.hermite_e.hermegauss(120)
    weights = weights / math.sqrt(2.0 * math.pi)
    covariance = np.array(
        [
            [
                model.correlation[i, j] * one.volatility * two.volatility
                * -math.expm1(-5.0 * (one.mean_reversion + two.mean_reversion))
                / (one.mean_reversion + two.mean_reversion)
                for j, two in enumerate(model.factors)
            ]
            for i, one in enumerate(model.factors)
        ]
    )  # fmt: skip
    root = np.linalg.cholesky(covariance)
    x = np.einsum("ij,jab->iab", root, np.array(np.meshgrid(nodes, nodes, indexing="ij")))
    total = np.ones(x.shape[1:])
    for year in range(1, 6):
        exposure = np.array([-math.expm1(-f.mean_reversion * year) / f.mean_reversion for f in model.factors])
        forward = float(CURVE.discount(5.0 + year) / CURVE.discount(5.0))
        bond = forward * np.exp(-np.tensordot(exposure, x, 1) - 0.5 * exposure @ covariance @ exposure)
        total -= (0.03 + (year == 5)) * bond
    value = float(CURVE.discount(5.0)) * float(weights @ np.maximum(total, 0.0) @ weights)
    assert float(gaussian_option_prices(model, quotes)[0]) == pytest.approx(value, rel=2e-4)


@pytest.mark.parametrize("tied", [-1.0, 1.0])
def test_full_correlation_of_equal_speeds_is_one_factor(tied: float) -> None:
    two = gaussian_2(
        CURVE,
        mean_reversion=0.1,
        volatility=0.009,
        second_mean_reversion=0.1,
        second_volatility=0.003,
        factor_correlation=tied,
    )
    one = hull_white(CURVE, mean_reversion=0.1, volatility=0.009 + tied * 0.003)
    for quotes in (_swaptions(), _caps()):
        assert gaussian_option_prices(two, quotes) == pytest.approx(
            gaussian_option_prices(one, quotes), rel=1e-9
        )


def test_negative_strikes_and_rates() -> None:
    quotes = option_quotes(
        flat_curve(-0.005),
        **_columns(2, instrument=["payer swaption", "floor"], strike=np.array([-0.01, -0.01])),
    )
    model = hull_white(quotes.curve, mean_reversion=0.05, volatility=0.008)
    assert np.all(np.isfinite(quotes.volatilities(gaussian_option_prices(model, quotes))))


def test_volatility_of_almost_nothing_is_the_value_of_exercise() -> None:
    quotes = option_quotes(CURVE, **_columns(1, strike=np.array([0.01])))
    exercise = float(quotes.weight[0, 0] * (quotes.forward[0, 0] - 0.01))
    model = hull_white(CURVE, mean_reversion=0.1, volatility=0.0)
    assert float(gaussian_option_prices(model, quotes)[0]) == pytest.approx(exercise, rel=1e-9)


def test_no_swaptions_with_three_factors_but_caps() -> None:
    model = GaussianRates(CURVE, (RateFactor(0.1, 0.005), RateFactor(0.2, 0.004), RateFactor(0.3, 0.003)))
    assert np.all(gaussian_option_prices(model, _caps()) > 0.0)
    with pytest.raises(ValueError, match="at most two factors"):
        gaussian_option_prices(model, _swaptions())


def test_slopes_and_implied_volatilities() -> None:
    """The slope against a difference; what has no volatility gives NaN, what is worth its exercise 0."""
    for normal, level in ((True, 0.01), (False, 0.3)):
        high, low = (
            float(forward_option(0.03, 0.04, level + move, 4.0, normal=normal)) for move in (1e-5, -1e-5)
        )
        slope = float(forward_option_slope(0.03, 0.04, level, 4.0, normal=normal))
        assert slope == pytest.approx((high - low) / 2e-5, rel=1e-6)
    one = np.array([[1.0]])
    found = implied_volatility([-0.001], 0.03 * one, 0.02 * one, one, weight=one, normal=True)
    assert np.isnan(found[0])
    assert implied_volatility([0.01], 0.03 * one, 0.02 * one, one, weight=one, normal=True)[0] == 0.0
    assert math.isnan(float(forward_option(-0.01, 0.02, 0.2, 1.0)))


def test_normal_option_is_its_integral() -> None:
    def payoff(z: float) -> float:
        return max(0.02 + 0.01 * 2.0 * z - 0.025, 0.0) * math.exp(-0.5 * z * z) / math.sqrt(2.0 * math.pi)

    expected = integrate.quad(payoff, -12.0, 12.0, points=[0.25])[0]
    assert float(forward_option(0.02, 0.025, 0.01, 4.0, normal=True)) == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize("quotes", [_swaptions(), _caps()], ids=["swaptions", "caps"])
@pytest.mark.parametrize("model", FITTED_MODELS)
def test_fits_find_what_made_the_quotes(quotes: OptionQuotes, model: str) -> None:
    prices = {
        "ho-lee": lambda: gaussian_option_prices(
            hull_white(CURVE, mean_reversion=0.0, volatility=0.007), quotes
        ),
        "hull-white": lambda: gaussian_option_prices(
            hull_white(CURVE, mean_reversion=0.06, volatility=0.009), quotes
        ),
        "gaussian-2": lambda: gaussian_option_prices(_two_factors(), quotes),
        "cir-shifted": lambda: square_root_option_prices(_square_root(), quotes),
    }[model]()
    fit = fit_volatilities(replace(quotes, volatility=quotes.volatilities(prices)), model=model)
    assert fit.largest_bp < 1e-4
    assert fit.model_price == pytest.approx(prices, rel=1e-7)
    made = {
        "ho-lee": {"volatility": 0.007},
        "hull-white": {"mean_reversion": 0.06, "volatility": 0.009},
        "gaussian-2": {"mean_reversion": 0.77, "second_volatility": 0.0104, "factor_correlation": -0.7},
        "cir-shifted": {
            "mean_reversion": 0.2,
            "long_run_rate": 0.03,
            "volatility": 0.06,
            "starting_rate": 0.02,
        },
    }[model]
    for name, value in made.items():
        assert getattr(fit, name) == pytest.approx(value, rel=1e-4)
    assert not any("poor" in remark for remark in fit.remarks)


def test_standard_errors_hold_in_repeated_samples() -> None:
    """Noise of 2 basis points on the quotes, 60 times: the spread of the estimates is the error stated."""
    quotes, random = _swaptions(), np.random.default_rng(3)
    clean = quotes.volatilities(
        gaussian_option_prices(hull_white(CURVE, mean_reversion=0.06, volatility=0.009), quotes)
    )
    found, stated = [], []
    for _ in range(60):
        noisy = replace(quotes, volatility=clean + 2e-4 * random.standard_normal(clean.size))
        fit = fit_volatilities(noisy)
        found.append([fit.mean_reversion, fit.volatility])
        stated.append(fit.errors)
    ratio = np.std(np.array(found, dtype=np.float64), axis=0) / np.mean(stated, axis=0)
    assert ratio == pytest.approx([1.0, 1.0], abs=0.35)


def test_a_poor_fit_says_so() -> None:
    quotes = _swaptions()
    volatility = np.tile([0.008, 0.012], 8)
    fit = fit_volatilities(replace(quotes, volatility=volatility))
    assert "The fit is poor" in fit.remarks[0]
    assert "payer swaption" in fit.remarks[0]
    assert fit.rmse_bp == pytest.approx(math.sqrt(float(np.mean(fit.residual_bp**2))))
    assert fit.residual_bp == pytest.approx(1e4 * (fit.model_volatility - volatility))


def test_rising_volatilities_put_mean_reversion_at_its_bound() -> None:
    quotes = _caps()
    fit = fit_volatilities(replace(quotes, volatility=np.linspace(0.2, 0.6, 7)))
    assert fit.mean_reversion == 0.0
    assert any("lower bound of 0" in remark for remark in fit.remarks)
    assert math.isnan(fit.errors[0])
    assert fit.errors[1] > 0.0


def test_quotes_that_do_not_determine_two_factors() -> None:
    quotes = _swaptions()
    one = gaussian_option_prices(hull_white(CURVE, mean_reversion=0.05, volatility=0.008), quotes)
    fit = fit_volatilities(replace(quotes, volatility=quotes.volatilities(one)), model="gaussian-2")
    assert any("do not determine" in remark for remark in fit.remarks)
    assert np.isnan(fit.errors).all()


def test_too_few_quotes_and_unknown_models() -> None:
    quotes = option_quotes(CURVE, **_columns(2))
    with pytest.raises(ValueError, match="5 parameters, more than there are quotes"):
        fit_volatilities(quotes, model="gaussian-2")
    with pytest.raises(ValueError, match="`model` must be one of"):
        fit_volatilities(quotes, model="other")


@pytest.mark.parametrize(
    ("given", "row", "said"),
    [
        ({"volatility": np.array([0.01, -0.01, 0.01])}, 1, "must be above 0"),
        ({"volatility": np.array([0.01, 0.01, np.nan])}, 2, "must be above 0"),
        ({"volatility": np.array([70.0, 0.01, 0.01])}, 0, "beyond any sense"),
        ({"expiry": np.array([5.0, 0.0, 5.0])}, 1, "expiry is 0"),
        ({"expiry": np.array([5.0, 5.0, 1e9])}, 2, "at most 100 years"),
        ({"length": np.array([5.0, np.nan, 5.0])}, 1, "length of the swap is nan"),
        ({"frequency": np.array([3.0, 1.0, 1.0])}, 0, "1, 2, 4 or 12"),
        ({"instrument": ["collar", "cap", "floor"]}, 0, "instrument is 'collar'"),
        ({"kind": ["normal", "black", "normal"]}, 1, "normal or lognormal"),
        ({"instrument": ["cap"] * 3, "expiry": np.array([5.0, 1.0, 6.0])}, 1, "already fixed"),
        ({"kind": ["lognormal"] * 3, "strike": np.array([0.02, -0.01, 0.03])}, 1, "strike above 0"),
        ({"shift": np.array([0.0, np.nan, 0.0])}, 1, "shift is not a number"),
        ({"strike": np.array([0.0, np.inf, 0.0])}, 1, "strike is not finite"),
        (
            {
                "instrument": ["cap"] * 3,
                "expiry": np.array([5.0, 3.0, 6.0]),
                "strike": np.full(3, 0.06),
                "volatility": np.array([0.002, 0.02, 0.03]),
            },
            0,
            "though it insures more",
        ),
        (
            {"strike": np.array([0.02, 0.03, 0.025]), "volatility": np.array([0.005, 0.03, 0.005])},
            2,
            "worth less",
        ),
        (
            {"strike": np.array([0.02, 0.025, 0.03]), "volatility": np.array([0.006, 0.0066, 0.006])},
            1,
            "above the straight line between those of quotes",
        ),
        (
            {"strike": np.full(3, 0.02), "volatility": np.array([0.006, 0.006, 0.007])},
            2,
            "quote 1 over again",
        ),
        (
            {
                "instrument": ["payer swaption", "payer swaption", "receiver swaption"],
                "strike": np.array([0.02, 0.03, 0.02]),
                "volatility": np.array([0.006, 0.006, 0.008]),
            },
            2,
            "must have one volatility",
        ),
        (
            {
                "instrument": ["cap", "floor", "cap"],
                "strike": np.array([0.02, 0.02, 0.03]),
                "volatility": np.array([0.006, 0.008, 0.006]),
            },
            1,
            "must have one volatility",
        ),
    ],
)
def test_faulty_quotes(given: dict[str, Any], row: int, said: str) -> None:
    with pytest.raises(OptionQuotesError) as caught:
        option_quotes(CURVE, **_columns(3, **given))
    assert any(at == row and said in text for at, text in caught.value.faults)
    assert f"Quote {row + 1}:" in str(caught.value)
    assert pickle.loads(pickle.dumps(caught.value)).faults == caught.value.faults


def test_call_and_put_of_one_volatility_hold_together() -> None:
    """A volatility that is the same at every strike leaves nothing to be made of nothing (Black, 1976): caps
    beside floors, payers beside receivers, and the same quote twice."""
    names = [*["cap", "floor"] * 5, *["payer swaption", "receiver swaption"] * 5]
    strikes = np.tile(np.repeat(np.linspace(0.005, 0.06, 5), 2), 2)
    for kind, volatility in (("normal", 0.007), ("lognormal", 0.25)):
        given = _columns(
            20, instrument=names, strike=strikes, volatility=np.full(20, volatility), kind=[kind] * 20
        )
        assert option_quotes(CURVE, **given).count == 20


def test_lognormal_quotes_on_negative_rates_ask_for_a_shift() -> None:
    columns = _columns(1, kind=["lognormal"], volatility=np.array([0.3]))
    with pytest.raises(OptionQuotesError, match=r"forward rate above 0, and with its shift it is -0\.4"):
        option_quotes(flat_curve(-0.005), **columns)
    shifted = option_quotes(flat_curve(-0.005), **(columns | {"shift": np.array([0.02])}))
    assert shifted.prices(shifted.volatility)[0] > 0.0


def test_every_fault_is_told_at_once() -> None:
    with pytest.raises(OptionQuotesError) as caught:
        option_quotes(
            CURVE, **_columns(3, volatility=np.array([0.0, 0.01, -1.0]), frequency=np.array([1.0, 5.0, 1.0]))
        )
    assert [row for row, _ in caught.value.faults] == [0, 1, 2]


def test_no_quotes_and_columns_of_unequal_length() -> None:
    with pytest.raises(ValueError, match="there are no quotes"):
        option_quotes(CURVE, **_columns(0))
    with pytest.raises(ValueError, match="`shift` must hold one number"):
        option_quotes(CURVE, **_columns(2, shift=np.zeros(3)))
