"""Bases stated by published parameters and bonds, against the figures printed beside them."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from desk.book import Basis, BondFit, CurveBonds, CurveKind, CurveParameters
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.quotes import par_flows

TODAY = date(2002, 1, 31)
NONE = np.zeros(0)


def _svensson(
    beta_0: float, beta_1: float, beta_2: float, beta_3: float, tau_1: float, tau_2: float
) -> Basis:
    return Basis(
        TODAY,
        "USD",
        NONE,
        NONE,
        curve_kind=CurveKind.SVENSSON,
        compounding=Compounding.CONTINUOUS,
        parameters=CurveParameters(beta_0, beta_1, beta_2, tau_1, beta_3, tau_2),
    )


@pytest.mark.parametrize(
    ("numbers", "times", "printed"),
    [
        (
            (0.05, -0.01, 0.3, 0.02, 1.5, 20.0),
            [5.0, 10.0, 15.0, 20.0],
            [0.12531409, 0.09667101, 0.08360796, 0.0770343],
        ),
        (
            (0.25, -0.4, -0.02, 0.05, 4.5, 10.0),
            [1.0, 5.0, 10.0, 20.0, 60.0],
            [-0.10825214, 0.01203921, 0.09686097, 0.1716945, 0.22668882],
        ),
    ],
)
def test_zero_rates_of_stated_parameters(
    numbers: tuple[float, float, float, float, float, float], times: list[float], printed: list[float]
) -> None:
    """TF Quant Finance test suite, Svensson interpolation."""
    np.testing.assert_allclose(_svensson(*numbers).curve.zero(times), printed, atol=5e-9)


# Gürkaynak, R., Sack, B. and Wright, J. (2007), The U.S. Treasury yield curve: 1961 to the present, Journal
# of Monetary Economics 54; daily data file feds200628 of the Federal Reserve Board, 31 January 2002.
TREASURY = _svensson(
    0.0361515400768789,
    -0.0153275172078452,
    -0.036025165489901,
    0.0797553534931804,
    0.476663944558545,
    10.4204535976878,
)
TERMS = np.array([1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 20.0, 30.0])


def test_published_treasury_curve() -> None:
    zero = [2.2689, 3.1381, 3.7572, 4.5244, 4.9995, 5.4431, 5.8685, 5.7]
    forward = [3.195, 4.6279, 5.2921, 5.9825, 6.3519, 6.5467, 5.8609, 4.9054]
    np.testing.assert_allclose(100.0 * TREASURY.curve.zero(TERMS), zero, atol=5.1e-5)
    np.testing.assert_allclose(100.0 * TREASURY.curve.forward(TERMS, TERMS), forward, atol=5.1e-5)


def test_bonds_at_published_par_yields_are_fitted_back() -> None:
    """Bonds of every half year with the par coupons of the published curve, at par, give back the published
    zero rates and par yields."""
    first = np.arange("2002-07", "2032-02", 6, dtype="datetime64[M]").astype("datetime64[D]")
    maturity = first + np.full(first.size, 30)
    curve = TREASURY.curve
    count = maturity.size

    def sheet(coupon: np.ndarray[tuple[int], np.dtype[np.float64]]) -> Basis:
        bonds = CurveBonds(
            tuple(str(day) for day in maturity),
            maturity,
            coupon,
            np.full(count, 2),
            np.full(count, 100.0),
            np.full(count, np.nan),
            np.ones(count, dtype=np.bool_),
        )
        return Basis(TODAY, "USD", NONE, NONE, curve_kind=CurveKind.BONDS, bonds=bonds)

    # The value less the price of 100 is linear in the coupon.
    at_none, at_one = (
        flows.values(curve) - flows.target
        for flows in (sheet(np.full(count, coupon)).quoted_bonds for coupon in (0.0, 1.0))
    )
    basis = sheet(at_none / (at_none - at_one))
    fit = basis.curve_fit
    assert fit is not None
    assert fit.largest_bp < 0.01
    zero = [2.2689, 3.1381, 3.7572, 4.5244, 4.9995, 5.4431, 5.8685, 5.7]
    np.testing.assert_allclose(100.0 * basis.curve.zero(TERMS), zero, atol=1e-4)
    par = np.array([2.2796, 3.146, 3.7551, 4.4933, 4.9347, 5.3301, 5.7144, 5.6763])
    worth = par_flows(TERMS, 0.01 * par, payments_per_year=2).values(basis.curve)
    np.testing.assert_allclose(worth, 1.0, atol=2e-5)


@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_five_bonds_of_a_sheet(interpolation: Interpolation) -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, zero-rate table: bonds of three months
    to two years, shuffled. Dates are counted in half years of 182 and 183 days, so that the printed zero
    rates hold to the days of a year's 365."""
    today = date(2025, 1, 1)
    maturity = np.array(
        ["2026-07-01", "2025-04-01", "2027-01-01", "2025-07-01", "2026-01-01"], dtype="datetime64[D]"
    )
    bonds = CurveBonds(
        ("1.5 years", "3 months", "2 years", "6 months", "1 year"),
        maturity,
        np.array([0.08, 0.0, 0.12, 0.0, 0.0]),
        np.full(5, 2),
        np.array([96.0, 97.5, 101.6, 94.9, 90.0]),
        np.full(5, np.nan),
        np.zeros(5, dtype=np.bool_),
    )
    basis = Basis(
        today,
        "USD",
        NONE,
        NONE,
        curve_kind=CurveKind.BONDS,
        bonds=bonds,
        bond_fit=BondFit.EXACT,
        interpolation=interpolation,
    )
    days = np.array([90.0, 181.0, 365.0, 546.0, 730.0])
    times = np.array([0.25, 0.5, 1.0, 1.5, 2.0])
    printed = np.array([0.10127, 0.10469, 0.10536, 0.10681, 0.10808])
    # Prices fix the discount factors, whatever the count of days.
    np.testing.assert_allclose(basis.curve.discount(days / 365.0), np.exp(-printed * times), atol=1e-5)
