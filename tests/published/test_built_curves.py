"""Curves built from quotes and parameters, against published figures."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.bootstrap import bootstrap
from desk.rates.compounding import Compounding, from_continuous
from desk.rates.curve import Curve, Interpolation
from desk.rates.parametric import Svensson
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.rates.quotes import bond_flows, par_flows
from desk.rates.smith_wilson import smith_wilson

EVERY = pytest.mark.parametrize("interpolation", list(Interpolation))


@EVERY
def test_five_bonds_bootstrapped(interpolation: Interpolation) -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, zero-rate table.

    Every payment falls on a term, so that the zero rates do not depend on what is drawn between them.
    """
    flows = bond_flows(
        [0.25, 0.5, 1.0, 1.5, 2.0], [0.0, 0.0, 0.0, 0.08, 0.12], prices=[97.5, 94.9, 90.0, 96.0, 101.6]
    )
    curve = bootstrap(flows, interpolation=interpolation)
    printed = [0.10127, 0.10469, 0.10536, 0.10681, 0.10808]
    np.testing.assert_allclose(curve.zero_rates, printed, atol=5e-6)
    recomputed = [0.101271231937, 0.104692960744, 0.105360515658, 0.106809263882, 0.108080275497]
    np.testing.assert_allclose(curve.zero_rates, recomputed, atol=5e-13)


def test_bond_price_yield_and_par_yield() -> None:
    """Hull, Options, Futures, and Other Derivatives, chapter 4 (partly from memory): the zero rates of 0.5 to
    2 years give a price, a yield and a par yield; each of the last two gives back what it came from."""
    curve = Curve([0.5, 1.0, 1.5, 2.0], [0.05, 0.058, 0.064, 0.068])
    price = float(bond_flows([2.0], [0.06], prices=[100.0]).values(curve)[0])
    assert price == pytest.approx(98.39, abs=0.005)
    bond = bond_flows([2.0], [0.06], prices=[price])
    stated = float(flow_yields(bond)[0])
    assert stated == pytest.approx(0.0676, abs=5e-5)
    assert stated == pytest.approx(0.0676243871603, abs=5e-13)
    semi_annual = from_continuous([stated], Compounding.SEMI_ANNUAL)
    np.testing.assert_allclose(bond_flows([2.0], [0.06], yields=semi_annual).target, price, rtol=1e-13)

    par_yield = 0.0687287616909
    assert par_yield == pytest.approx(0.0687, abs=5e-5)
    assert par_flows([2.0], [par_yield], payments_per_year=2).values(curve) == pytest.approx(1.0, abs=1e-12)


def test_four_bonds_with_monotone_convex() -> None:
    """TF Quant Finance test suite, bond-curve test, after Hagan, P.S. and West, G., "Interpolation Methods
    for Curve Construction", Applied Mathematical Finance 13(2), 2006."""
    bonds = [
        (4, 1, 12.5, 999.6815522394339),
        (2, 2, 30.0, 1022.322872470043),
        (2, 3, 40.0, 1093.9894418810143),
        (2, 4, 15.0, 934.2088568901568),
    ]
    times = [np.arange(1, frequency * years + 1) / frequency for frequency, years, _, _ in bonds]
    amounts = [np.full(time.size, bond[2]) for time, bond in zip(times, bonds, strict=True)]
    for amount in amounts:
        amount[-1] += 1000.0
    flows = QuotedFlows(
        np.repeat(np.arange(4), [time.size for time in times]),
        np.concatenate(times),
        np.concatenate(amounts),
        np.array([bond[3] for bond in bonds]),
    )
    curve = bootstrap(flows, interpolation=Interpolation.MONOTONE_CONVEX)
    np.testing.assert_allclose(curve.zero_rates, [0.05, 0.0475, 0.0453333333, 0.04775], atol=1e-6)
    np.testing.assert_allclose(flows.values(curve), flows.target, rtol=1e-12)


@pytest.mark.parametrize(
    ("parameters", "times", "printed"),
    [
        (
            (0.05, -0.01, 0.3, 0.02, 1.5, 20.0),
            [5.0, 10.0, 15.0, 20.0],
            [0.12531409, 0.09667101, 0.08360796, 0.0770343],
        ),
        (
            (0.25, -0.4, -0.02, 0.05, 4.5, 10.0),
            [1.0, 2.0, 3.0, 4.0, 5.0, 10.0, 20.0, 30.0, 60.0],
            [
                -0.10825214,
                -0.07188015,
                -0.04012282,
                -0.0123332,
                0.01203921,
                0.09686097,
                0.1716945,
                0.20045316,
                0.22668882,
            ],
        ),
    ],
)
def test_svensson_zero_rates(
    parameters: tuple[float, float, float, float, float, float], times: list[float], printed: list[float]
) -> None:
    """TF Quant Finance test suite, Svensson interpolation."""
    np.testing.assert_allclose(Svensson(*parameters).zero(times), printed, atol=5e-9)


# Gürkaynak, R., Sack, B. and Wright, J. (2007), The U.S. Treasury yield curve: 1961 to the present, Journal
# of Monetary Economics 54; daily data file feds200628 of the Federal Reserve Board, 31 January 2002, percent.
TREASURY = Svensson(
    0.0361515400768789,
    -0.0153275172078452,
    -0.036025165489901,
    0.0797553534931804,
    0.476663944558545,
    10.4204535976878,
)
TREASURY_TERMS = np.array([1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 20.0, 30.0])
TREASURY_PAR = np.array([2.2796, 3.146, 3.7551, 4.4933, 4.9347, 5.3301, 5.7144, 5.6763])


def test_published_svensson_parameters() -> None:
    zero = [2.2689, 3.1381, 3.7572, 4.5244, 4.9995, 5.4431, 5.8685, 5.7]
    forward = [3.195, 4.6279, 5.2921, 5.9825, 6.3519, 6.5467, 5.8609, 4.9054]
    np.testing.assert_allclose(100.0 * TREASURY.zero(TREASURY_TERMS), zero, atol=5.1e-5)
    np.testing.assert_allclose(100.0 * TREASURY.instantaneous_forward(TREASURY_TERMS), forward, atol=5.1e-5)


def test_published_par_yields() -> None:
    """The par yields of the same file are coupon rates at which bonds on the curve are worth par ..."""
    flows = par_flows(TREASURY_TERMS, 0.01 * TREASURY_PAR, payments_per_year=2)
    coupons = flows.amount[flows.first_row] * 2.0
    # One bond's value moves by its annuity for each unit of coupon: a rounding of half a unit of the last
    # printed digit is 5.1e-7 of rate.
    annuity = (flows.values(TREASURY) - TREASURY.discount(TREASURY_TERMS)) / coupons
    np.testing.assert_array_less(np.abs(flows.values(TREASURY) - 1.0), 5.1e-7 * annuity)


def test_published_par_yields_bootstrapped() -> None:
    """... and from every half year of them the bootstrap finds the published zero rates."""
    terms = np.arange(1, 61) / 2.0
    annuity = np.cumsum(TREASURY.discount(terms)) / 2.0
    par = (1.0 - TREASURY.discount(terms)) / annuity
    np.testing.assert_allclose(
        100.0 * par[np.round(2.0 * TREASURY_TERMS).astype(int) - 1], TREASURY_PAR, atol=5.1e-5
    )
    curve = bootstrap(par_flows(terms, par, payments_per_year=2))
    np.testing.assert_allclose(curve.zero_rates, TREASURY.zero(terms), atol=1e-13)


def test_smith_wilson_through_four_par_swaps() -> None:
    """Finanstilsynet (Norway), A Technical Note on the Smith-Wilson Method, July 2010, worked example (from
    memory)."""
    flows = par_flows([1.0, 2.0, 3.0, 5.0], [0.01, 0.02, 0.026, 0.034])
    curve = smith_wilson(flows, ultimate_forward_rate=0.042, alpha=0.1)
    np.testing.assert_allclose(curve.zeta, [57.79, -33.51, 11.4, -5.47], atol=0.005)
    np.testing.assert_allclose(
        curve.zeta, [57.7906882113, -33.5072077522, 11.3964725851, -5.46696784305], atol=1e-9
    )
    found = curve.discount([1.0, 2.0, 3.0, 4.0, 5.0])
    np.testing.assert_allclose(found, [0.99, 0.961, 0.925, 0.885, 0.843], atol=0.0005)
    recomputed = [0.990099009901, 0.960978450786, 0.925216360645, 0.885004133727, 0.843438945385]
    np.testing.assert_allclose(found, recomputed, atol=1e-12)
