"""The curve of a basis: from zero rates, par yields and swap rates, with either continuation."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Basis, CurveKind
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.quotes import par_flows, swap_flows
from desk.rates.smith_wilson import Extrapolation, SmithWilsonCurve

TERMS = np.array([0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 30.0])
RATES = np.array([0.021, 0.022, 0.024, 0.027, 0.03, 0.032, 0.031])
BASIS = Basis(date(2026, 6, 30), "EUR", TERMS, RATES)


def _drawn(basis: Basis) -> Curve:
    """The curve of a basis, one through terms."""
    curve = basis.curve
    assert isinstance(curve, Curve)
    return curve


def test_zero_rates_make_the_curve_themselves() -> None:
    np.testing.assert_array_equal(_drawn(BASIS).zero_rates, to_continuous(RATES, Compounding.ANNUAL))
    np.testing.assert_allclose(BASIS.quoted_flows.values(BASIS.curve), BASIS.quoted_flows.target, rtol=1e-14)


@pytest.mark.parametrize("interpolation", list(Interpolation))
@pytest.mark.parametrize(
    ("compounding", "per_year"),
    [
        (Compounding.ANNUAL, 1),
        (Compounding.SEMI_ANNUAL, 2),
        (Compounding.QUARTERLY, 4),
        (Compounding.MONTHLY, 12),
    ],
)
def test_coupons_go_by_the_compounding(
    interpolation: Interpolation, compounding: Compounding, per_year: int
) -> None:
    stated = replace(BASIS, compounding=compounding, interpolation=interpolation)
    for kind, make in ((CurveKind.PAR, par_flows), (CurveKind.SWAP, swap_flows)):
        curve = _drawn(replace(stated, curve_kind=kind))
        np.testing.assert_array_equal(curve.terms, TERMS)
        assert curve.interpolation is interpolation
        worth = make(TERMS, RATES, payments_per_year=per_year).values(curve)
        np.testing.assert_allclose(worth, 1.0, rtol=1e-12)


def test_par_yields_are_restated_where_coupons_are_paid_otherwise() -> None:
    """On a flat curve the par yield of any frequency is the flat rate restated: nothing changes."""
    flat = replace(BASIS, rates=np.full(TERMS.size, 0.03), curve_kind=CurveKind.PAR)
    for payments in (1, 2, 4, 12):
        curve = replace(flat, payments_per_year=payments, terms=np.arange(1.0, 8.0)).curve
        np.testing.assert_allclose(curve.zero([1.0, 3.0, 7.0]), np.log(1.03), rtol=1e-12)
    continuous = replace(flat, compounding=Compounding.CONTINUOUS, terms=np.arange(1.0, 8.0))
    assert continuous.quote_payments == 1
    np.testing.assert_allclose(continuous.curve.zero([1.0, 7.0]), 0.03, rtol=1e-12)


def test_swap_rates_are_simple_interest() -> None:
    swaps = replace(BASIS, curve_kind=CurveKind.SWAP, payments_per_year=2)
    worth = swap_flows(TERMS, RATES, payments_per_year=2).values(swaps.curve)
    np.testing.assert_allclose(worth, 1.0, rtol=1e-12)


@pytest.mark.parametrize("kind", [CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP])
def test_smith_wilson_goes_on_to_the_ultimate_rate(kind: CurveKind) -> None:
    basis = replace(
        BASIS,
        curve_kind=kind,
        extrapolation=Extrapolation.SMITH_WILSON,
        ultimate_forward_rate=0.0345,
        last_liquid_point=20.0,
    )
    curve = basis.curve
    assert isinstance(curve, SmithWilsonCurve)
    assert curve.last_term == 20.0
    assert curve.convergence_point == 60.0
    assert abs(float(curve.instantaneous_forward(60.0)) - np.log(1.0345)) <= 1e-4
    liquid = basis.quoted_flows.liquid(20.0)
    np.testing.assert_allclose(liquid.values(curve), liquid.target, rtol=1e-12)
    other = _drawn(replace(basis, convergence_point=40.0, convergence_tolerance=1e-5))
    assert abs(float(other.instantaneous_forward(40.0)) - np.log(1.0345)) <= 1e-5


@pytest.mark.parametrize("kind", [CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP])
def test_quotes_beyond_the_last_liquid_point_are_left_out(kind: CurveKind) -> None:
    basis = replace(BASIS, curve_kind=kind)
    cut = _drawn(replace(basis, last_liquid_point=10.0))
    short = _drawn(replace(basis, terms=TERMS[:5], rates=RATES[:5]))
    np.testing.assert_array_equal(cut.zero_rates, short.zero_rates)
    assert cut.last_term == 10.0
    whole = _drawn(replace(basis, last_liquid_point=30.0))
    np.testing.assert_array_equal(whole.zero_rates, _drawn(basis).zero_rates)


@pytest.mark.parametrize(
    ("changes", "words", "rows"),
    [
        ({"curve_kind": CurveKind.PAR, "terms": TERMS[[0, 2, 1, 3, 4, 5, 6]]}, "stands after", (2,)),
        ({"curve_kind": CurveKind.SWAP, "terms": TERMS[[0, 1, 1, 3, 4, 5, 6]]}, "two quotes", (1, 2)),
        ({"curve_kind": CurveKind.PAR, "rates": np.append(RATES[:6], 0.9)}, "no curve gives", (6,)),
        ({"curve_kind": CurveKind.PAR, "payments_per_year": 5}, "payments", ()),
        ({"extrapolation": Extrapolation.SMITH_WILSON}, "no ultimate forward rate", ()),
        ({"last_liquid_point": 0.1}, "no quote is at or before", ()),
        (
            {
                "extrapolation": Extrapolation.SMITH_WILSON,
                "ultimate_forward_rate": 0.03,
                "convergence_point": 20.0,
            },
            "not after the last liquid point",
            (),
        ),
    ],
)
def test_quotes_that_give_no_curve(changes: dict[str, object], words: str, rows: tuple[int, ...]) -> None:
    basis = replace(BASIS, **changes)  # type: ignore[arg-type]  # any field
    with pytest.raises(CurveError, match=words) as caught:
        _ = basis.curve
    assert caught.value.rows == rows
    assert caught.value.mend
