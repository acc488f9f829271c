"""What liabilities are discounted on: the curve, spreads by term, corporate bonds, an expected return."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
import pytest

from desk.book import Basis, BondFit, CurveBonds, LiabilityMethod
from desk.rates.compounding import Compounding
from desk.rates.curve_error import CurveError
from desk.rates.parametric import NelsonSiegel
from desk.rates.smith_wilson import Extrapolation

TODAY = date(2026, 6, 30)
TIME = np.array([0.0, 0.5, 3.0, 7.0, 20.0, 60.0])
BASIS = Basis(
    TODAY,
    "EUR",
    np.array([1.0, 5.0, 10.0, 20.0]),
    np.array([0.02, 0.024, 0.028, 0.03]),
    liability_spread=0.002,
)
CORPORATE = NelsonSiegel(0.05, -0.02, 0.01, 2.0)


def _corporate(count: int = 15) -> CurveBonds:
    none = np.full(count, np.nan)
    blank = CurveBonds(
        tuple(f"Note {row}" for row in range(count)),
        np.datetime64(TODAY) + np.arange(1, count + 1) * 640,
        np.full(count, 0.04),
        np.full(count, 2),
        np.full(count, 100.0),
        none,
        np.zeros(count, dtype=np.bool_),
    )
    flows = replace(
        BASIS, liability_method=LiabilityMethod.CORPORATE_BONDS, liability_bonds=blank
    ).liability_bonds_quoted
    return replace(blank, price=flows.values(CORPORATE))


BONDS = _corporate()


def test_on_the_curve_the_spread_is_flat() -> None:
    np.testing.assert_array_equal(BASIS.liability_spread_at(TIME), np.full(6, 0.002))
    assert BASIS.liability_curve is BASIS.curve
    assert BASIS.liability_curve_fit is None


def test_spreads_by_term_are_joined_by_lines() -> None:
    basis = replace(
        BASIS,
        liability_method=LiabilityMethod.TERM_SPREADS,
        liability_terms=np.array([1.0, 5.0, 10.0]),
        liability_spreads=np.array([0.01, 0.02, 0.015]),
    )
    expected = [0.012, 0.012, 0.017, 0.02, 0.017, 0.017]
    np.testing.assert_allclose(basis.liability_spread_at(TIME), expected, rtol=1e-12)
    assert basis.liability_curve is basis.curve
    one = replace(basis, liability_terms=np.array([3.0]), liability_spreads=np.array([0.01]))
    np.testing.assert_allclose(one.liability_spread_at(TIME), 0.012, rtol=1e-12)


def test_an_expected_return_is_one_rate() -> None:
    basis = replace(BASIS, liability_method=LiabilityMethod.EXPECTED_RETURN, expected_return=0.06)
    np.testing.assert_allclose(basis.liability_curve.zero(TIME), np.log(1.06), rtol=1e-14)
    rate = basis.liability_spread_at(TIME) + basis.curve.zero(TIME)
    np.testing.assert_allclose(rate, np.log(1.06) + 0.002, rtol=1e-14)
    # Annual whatever the compounding of the curve.
    other = replace(basis, compounding=Compounding.CONTINUOUS)
    np.testing.assert_allclose(other.liability_curve.zero(5.0), np.log(1.06), rtol=1e-14)


@pytest.mark.parametrize("fit", [BondFit.NELSON_SIEGEL, BondFit.SVENSSON])
def test_corporate_bonds_make_a_curve_of_their_own(fit: BondFit) -> None:
    basis = replace(
        BASIS,
        liability_method=LiabilityMethod.CORPORATE_BONDS,
        liability_bonds=BONDS,
        liability_fit=fit,
        last_liquid_point=10.0,
        extrapolation=Extrapolation.SMITH_WILSON,
        ultimate_forward_rate=0.03,
    )
    found = basis.liability_curve_fit
    assert found is not None
    assert found.largest_bp < 0.01
    # The last liquid point is that of the curve: all corporate bonds are used.
    assert found.is_used.all()
    assert basis.liability_curve is found.curve
    time = np.linspace(1.8, 26.0, 40)
    np.testing.assert_allclose(found.curve.zero(time), CORPORATE.zero(time), atol=1e-7)
    worth = basis.curve.discount(time) * np.exp(-basis.liability_spread_at(time) * time)
    np.testing.assert_allclose(worth, CORPORATE.discount(time) * np.exp(-0.002 * time), rtol=2e-6)


def test_corporate_bonds_repriced_exactly() -> None:
    basis = replace(
        BASIS,
        liability_method=LiabilityMethod.CORPORATE_BONDS,
        liability_bonds=BONDS,
        liability_fit=BondFit.EXACT,
    )
    flows = basis.liability_bonds_quoted
    np.testing.assert_allclose(flows.values(basis.liability_curve), flows.target, rtol=1e-12)


@pytest.mark.parametrize(
    ("method", "changes", "words", "rows", "subject"),
    [
        (LiabilityMethod.TERM_SPREADS, {}, "no spread by term", (), "liability spreads"),
        (
            LiabilityMethod.TERM_SPREADS,
            {"liability_terms": [1.0, 2.0], "liability_spreads": [0.01]},
            "no spread by term",
            (),
            "liability spreads",
        ),
        (
            LiabilityMethod.TERM_SPREADS,
            {"liability_terms": [1.0, 5.0, 3.0], "liability_spreads": [0.01, 0.01, 0.01]},
            "liability spreads: 3 years stands after 5 years",
            (2,),
            "liability spreads",
        ),
        (
            LiabilityMethod.TERM_SPREADS,
            {"liability_terms": [1.0, 2.0], "liability_spreads": [0.01, np.nan]},
            "liability spreads: the row",
            (1,),
            "liability spreads",
        ),
        (LiabilityMethod.CORPORATE_BONDS, {}, "liability bonds: there is no bond", (), "liability bonds"),
        (
            LiabilityMethod.CORPORATE_BONDS,
            {"liability_bonds": replace(BONDS, price=np.where(np.arange(15) == 4, np.nan, BONDS.price))},
            "liability bonds: the bond has neither",
            (4,),
            "liability bonds",
        ),
        (
            LiabilityMethod.CORPORATE_BONDS,
            {
                "liability_bonds": replace(BONDS, maturity=np.full(15, np.datetime64("2030-01-01"))),
                "liability_fit": BondFit.EXACT,
            },
            "liability bonds: bonds mature on the same day",
            tuple(range(15)),
            "liability bonds",
        ),
        (LiabilityMethod.EXPECTED_RETURN, {}, "there is no expected return", (), ""),
        (LiabilityMethod.EXPECTED_RETURN, {"expected_return": -1.0}, "leaves nothing", (), ""),
    ],
)
def test_faults(
    method: LiabilityMethod, changes: dict[str, Any], words: str, rows: tuple[int, ...], subject: str
) -> None:
    basis = replace(BASIS, liability_method=method, **changes)
    with pytest.raises(CurveError, match=words) as caught:
        basis.liability_spread_at(TIME)
    assert caught.value.rows == rows
    assert caught.value.subject == subject
    assert caught.value.mend
    # The curve itself is not concerned.
    assert basis.curve.discount(1.0) == pytest.approx(1.0 / 1.02)
