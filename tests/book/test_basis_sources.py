"""The curve of a basis from bonds, parameters and one rate, and what is wrong with them."""

from __future__ import annotations

import pickle
from dataclasses import replace
from datetime import date
from typing import Any

import numpy as np
import pytest

from desk.book import Basis, BondFit, CurveBonds, CurveKind, CurveParameters
from desk.rates.compounding import Compounding, from_continuous
from desk.rates.curve import Curve, DiscountCurve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quoted_flows import flow_yields
from desk.rates.smith_wilson import Extrapolation, SmithWilsonCurve

TODAY = date(2026, 6, 30)
KNOWN = Svensson(0.036, -0.015, -0.036, 0.08, 0.48, 10.4)
PARAMETERS = CurveParameters(0.036, -0.015, -0.036, 0.48, 0.08, 10.4)


def _bonds(curve: DiscountCurve, count: int = 12) -> CurveBonds:
    """Bonds in no order, half of them with clean prices, two with yields, priced on a curve."""
    random = np.random.default_rng(count)
    days = np.sort(random.choice(np.arange(120, 11_000), count, replace=False))
    days[0] = 150  # the first decay, 0.48 years, is told by a bond of less than twice that
    random.shuffle(days)
    blank = CurveBonds(
        names=tuple(f"Bond {number}" for number in range(count)),
        maturity=np.datetime64(TODAY) + days,
        coupon=np.where(np.arange(count) % 4 == 1, 0.0, random.uniform(0.0, 0.06, count)),
        frequency=random.choice([1, 2, 4, 12], count),
        price=np.full(count, 100.0),
        bond_yield=np.full(count, np.nan),
        is_clean=np.arange(count) % 2 == 0,
    )
    flows = _basis(blank).quoted_bonds
    # A price of 100 came out as the target, with the accrued interest where it is clean.
    priced = replace(blank, price=blank.price + flows.values(curve) - flows.target)
    by_yield = np.arange(count) % 5 == 3
    stated = np.full(count, np.nan)
    for row in np.flatnonzero(by_yield):
        stated[row] = _stated_yield(priced, int(row), curve)
    return replace(priced, price=np.where(by_yield, np.nan, priced.price), bond_yield=stated)


def _stated_yield(bonds: CurveBonds, row: int, curve: DiscountCurve) -> float:
    """By bisection: the yield at which a bond is worth what the curve says."""
    low, high = -0.5, 2.0
    for _ in range(80):
        middle = 0.5 * (low + high)
        alone = replace(bonds, price=bonds.price.copy(), bond_yield=bonds.bond_yield.copy())
        price, stated = alone.price.copy(), alone.bond_yield.copy()
        price[row], stated[row] = np.nan, middle
        flows = _basis(replace(bonds, price=price, bond_yield=stated)).quoted_bonds
        low, high = (middle, high) if flows.target[row] > flows.values(curve)[row] else (low, middle)
    return 0.5 * (low + high)


def _basis(bonds: CurveBonds | None, **changes: Any) -> Basis:
    none = np.zeros(0)
    return Basis(TODAY, "EUR", none, none, curve_kind=CurveKind.BONDS, bonds=bonds, **changes)


BONDS = _bonds(KNOWN)
TERM = _basis(BONDS).quoted_bonds.term


def test_a_known_curve_is_fitted_back() -> None:
    """Clean prices, dirty ones and yields of bonds on a Svensson curve give it back."""
    basis = _basis(BONDS, bond_fit=BondFit.SVENSSON)
    fit = basis.curve_fit
    assert fit is not None
    assert fit.largest_bp < 0.01
    assert fit.is_used.all()
    assert basis.curve is fit.curve
    time = np.linspace(float(TERM.min()), float(TERM.max()), 100)
    np.testing.assert_allclose(basis.curve.zero(time), KNOWN.zero(time), atol=1e-7)


def test_a_price_follows_from_a_yield_by_whole_periods_and_the_part_of_one() -> None:
    """The standard formula between coupon dates, for example Fabozzi, Bond Markets, yield measures."""
    bonds = CurveBonds(
        names=("half-yearly", "yearly", "strip"),
        maturity=np.array(["2030-03-15", "2030-03-15", "2030-03-15"], "datetime64[D]"),
        coupon=np.array([0.05, 0.03, 0.0]),
        frequency=np.array([2, 1, 1]),
        price=np.full(3, np.nan),
        bond_yield=np.array([0.041, 0.0365, 0.04]),
        is_clean=np.ones(3, dtype=np.bool_),
    )
    expected = []
    for coupon, frequency, rate in ((5.0, 2, 0.041), (3.0, 1, 0.0365), (0.0, 1, 0.04)):
        days = [date(year, month, 15) for year in range(2025, 2031) for month in (3, 9)[:frequency]]
        dates = [day for day in days if day <= date(2030, 3, 15)]
        due = [day for day in dates if day > TODAY]
        before = dates[dates.index(due[0]) - 1]
        part = (due[0] - TODAY).days / (due[0] - before).days
        growth = 1.0 + rate / frequency
        value = sum(coupon / frequency / growth ** (part + place) for place in range(len(due)))
        expected.append(value + 100.0 / growth ** (part + len(due) - 1))
    np.testing.assert_allclose(_basis(bonds).quoted_bonds.target, expected, rtol=1e-12)


def test_nelson_siegel_is_fitted_back() -> None:
    known = NelsonSiegel(0.04, -0.02, 0.015, 1.8)
    fit = _basis(_bonds(known), bond_fit=BondFit.NELSON_SIEGEL).curve_fit
    assert fit is not None
    assert fit.largest_bp < 0.01
    assert isinstance(fit.curve, NelsonSiegel)
    assert fit.curve.decay == pytest.approx(1.8, rel=1e-5)


@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_an_exact_fit_reprices_bonds_in_any_order(interpolation: Interpolation) -> None:
    basis = _basis(BONDS, bond_fit=BondFit.EXACT, interpolation=interpolation)
    flows, fit = basis.quoted_bonds, basis.curve_fit
    assert fit is not None
    np.testing.assert_allclose(flows.values(basis.curve), flows.target, rtol=1e-12)
    assert fit.largest_bp < 1e-7
    assert isinstance(basis.curve, Curve)
    np.testing.assert_array_equal(basis.curve.terms, np.sort(TERM))
    order = np.argsort(TERM)
    assert not np.array_equal(order, np.arange(order.size))
    rising = CurveBonds(
        tuple(BONDS.names[row] for row in order),
        *(
            getattr(BONDS, name)[order]
            for name in ("maturity", "coupon", "frequency", "price", "bond_yield", "is_clean")
        ),
    )
    sorted_first = _basis(rising, bond_fit=BondFit.EXACT, interpolation=interpolation)
    np.testing.assert_allclose(
        sorted_first.curve.zero(np.linspace(0.0, 40.0, 50)), basis.curve.zero(np.linspace(0.0, 40.0, 50))
    )


def test_residuals_stand_in_the_order_of_the_sheet() -> None:
    bonds = _bonds(KNOWN, 40)
    price = np.array(bonds.price)
    row = int(np.flatnonzero(np.isfinite(price))[13])
    price[row] += 2.0
    fit = _basis(replace(bonds, price=price), bond_fit=BondFit.SVENSSON).curve_fit
    assert fit is not None
    assert int(np.argmax(np.abs(fit.residual_bp))) == row
    assert fit.residual_price[row] < 0.0 < fit.residual_bp[row]


def test_smith_wilson_goes_through_the_bonds() -> None:
    basis = _basis(
        BONDS,
        extrapolation=Extrapolation.SMITH_WILSON,
        ultimate_forward_rate=0.0345,
        last_liquid_point=20.0,
    )
    curve, fit, flows = basis.curve, basis.curve_fit, basis.quoted_bonds
    assert isinstance(curve, SmithWilsonCurve)
    assert fit is not None
    np.testing.assert_array_equal(fit.is_used, TERM <= 20.0)
    assert 0 < fit.is_used.sum() < len(flows)
    assert fit.largest_bp < 1e-6
    assert np.abs(fit.residual_bp[~fit.is_used]).min() > 1e-3
    assert abs(float(curve.instantaneous_forward(60.0)) - np.log(1.0345)) <= 1e-4
    assert basis.last_quoted_term == TERM[TERM <= 20.0].max()


@pytest.mark.parametrize("fit", list(BondFit))
def test_bonds_beyond_the_last_liquid_point_are_left_out(fit: BondFit) -> None:
    bonds = _bonds(NelsonSiegel(0.03, -0.02, 0.04, 3.0), 30)
    price = np.array(bonds.price)
    whole = _basis(bonds, bond_fit=fit, last_liquid_point=12.0)
    term = whole.quoted_bonds.term
    far = term > 12.0
    price[far] *= 1.05
    moved = _basis(replace(bonds, price=price), bond_fit=fit, last_liquid_point=12.0)
    time = np.linspace(0.0, 50.0, 30)
    np.testing.assert_array_equal(whole.curve.zero(time), moved.curve.zero(time))
    found = moved.curve_fit
    assert found is not None
    np.testing.assert_array_equal(found.is_used, ~far)
    assert found.largest_bp == np.abs(found.residual_bp[~far]).max() < 0.01
    assert np.nanmax(np.abs(found.residual_bp[far])) > 10.0
    assert moved.last_quoted_term == term[~far].max()


@pytest.mark.parametrize("compounding", list(Compounding))
def test_parameters_are_stated_in_the_compounding_of_the_basis(compounding: Compounding) -> None:
    none = np.zeros(0)
    time = np.linspace(0.01, 60.0, 50)
    short = (1.0 - np.exp(-time / 0.48)) / (time / 0.48)
    long = (1.0 - np.exp(-time / 10.4)) / (time / 10.4)
    stated = 0.036 - 0.015 * short - 0.036 * (short - np.exp(-time / 0.48))
    basis = Basis(TODAY, "EUR", none, none, compounding=compounding, parameters=PARAMETERS)
    first = replace(basis, curve_kind=CurveKind.NELSON_SIEGEL)
    np.testing.assert_allclose(from_continuous(first.curve.zero(time), compounding), stated, rtol=1e-12)
    second = replace(basis, curve_kind=CurveKind.SVENSSON)
    stated += 0.08 * (long - np.exp(-time / 10.4))
    np.testing.assert_allclose(from_continuous(second.curve.zero(time), compounding), stated, rtol=1e-12)
    flat = replace(basis, curve_kind=CurveKind.FLAT, flat_rate=0.031)
    np.testing.assert_allclose(from_continuous(flat.curve.zero(time), compounding), 0.031, rtol=1e-12)
    for each in (first, second, flat):
        assert each.last_quoted_term is None
        assert each.curve_fit is None
        with pytest.raises(CurveError, match="has no quotes"):
            _ = each.quoted_flows


def test_the_last_quoted_term() -> None:
    terms, rates = np.array([1.0, 5.0, 10.0, 30.0]), np.array([0.02, 0.025, 0.03, 0.03])
    for kind in (CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP):
        basis = Basis(TODAY, "EUR", terms, rates, curve_kind=kind)
        assert basis.last_quoted_term == 30.0
        assert replace(basis, last_liquid_point=20.0).last_quoted_term == 10.0
    assert _basis(BONDS).last_quoted_term == TERM.max()
    assert _basis(BONDS).quoted_flows is not None


def _with(name: str, row: int, value: Any) -> CurveBonds:
    column = np.array(getattr(BONDS, name))
    column[row] = value
    return replace(BONDS, **{name: column})  # type: ignore[arg-type]  # any column


PRICED = int(np.flatnonzero(np.isfinite(BONDS.price))[0])
SAME_DAY = np.array(BONDS.maturity)
SAME_DAY[[2, 7, 9]] = SAME_DAY[5]


class TestFaults:
    """What a user can get wrong with a curve, told when it is asked for."""

    @pytest.mark.parametrize(
        ("bonds", "words", "rows"),
        [
            (None, "there is no bond", ()),
            (_with("maturity", 3, "2026-06-30"), "has matured", (3,)),
            (_with("maturity", 3, "NaT"), "is no date", (3,)),
            (_with("maturity", 3, "9000-01-01"), "more than 1000 years", (3,)),
            (_with("price", PRICED, np.nan), "neither a price nor a yield", (PRICED,)),
            (_with("bond_yield", PRICED, 0.03), "both a price and a yield", (PRICED,)),
            (_with("price", PRICED, -5.0), "the price is not above 0", (PRICED,)),
            (_with("coupon", 4, np.nan), "the coupon is not a number", (4,)),
            (_with("coupon", 4, -0.01), "the coupon is below 0", (4,)),
            (_with("frequency", 4, 5), "payments a year", (4,)),
            (_with("bond_yield", 3, -20.0), "leaves nothing of the principal", (3,)),
        ],
    )
    @pytest.mark.parametrize("fit", list(BondFit))
    def test_bonds(self, fit: BondFit, bonds: CurveBonds | None, words: str, rows: tuple[int, ...]) -> None:
        for asked in ("curve", "curve_fit", "last_quoted_term"):
            with pytest.raises(CurveError, match=words) as caught:
                getattr(_basis(bonds, bond_fit=fit), asked)
            assert caught.value.rows == rows
            assert caught.value.subject == "bonds"
            assert caught.value.mend

    def test_bonds_that_mature_together(self) -> None:
        together = replace(BONDS, maturity=SAME_DAY)
        for changes in (
            {"bond_fit": BondFit.EXACT},
            {"extrapolation": Extrapolation.SMITH_WILSON, "ultimate_forward_rate": 0.03},
        ):
            with pytest.raises(
                CurveError, match=f"same day, {SAME_DAY[5]} \\(Bond 2 and Bond 5\\)"
            ) as caught:
                _ = _basis(together, **changes).curve
            assert caught.value.rows == (2, 5, 7, 9)
            assert "smooth" in caught.value.mend
        fit = _basis(together, bond_fit=BondFit.NELSON_SIEGEL).curve_fit
        assert fit is not None
        assert np.isfinite(fit.residual_bp).all()

    def test_bonds_that_no_curve_reprices(self) -> None:
        """The row is that of the sheet, not that of the sorted bonds."""
        row = int(np.argsort(TERM)[8])
        wild = replace(_with("price", row, 1000.0), bond_yield=_with("bond_yield", row, np.nan).bond_yield)
        low = replace(wild, coupon=_with("coupon", row, 0.5).coupon, price=_with("price", row, 1.0).price)
        with pytest.raises(CurveError, match="no curve gives the quote") as caught:
            _ = _basis(low, bond_fit=BondFit.EXACT).curve
        assert caught.value.rows == (row,)

    @pytest.mark.parametrize(
        ("changes", "words"),
        [
            ({"last_liquid_point": 0.01}, "no bond matures at or before"),
            ({"last_liquid_point": 4.0, "bond_fit": BondFit.SVENSSON}, "quotes for a curve of 6 parameters"),
            ({"extrapolation": Extrapolation.SMITH_WILSON}, "no ultimate forward rate"),
        ],
    )
    def test_bonds_that_are_too_few(self, changes: dict[str, Any], words: str) -> None:
        with pytest.raises(CurveError, match=words) as caught:
            _ = _basis(BONDS, **changes).curve
        assert caught.value.rows == ()

    @pytest.mark.parametrize(
        ("kind", "changes", "words"),
        [
            (CurveKind.SVENSSON, {"parameters": None}, "no parameters"),
            (CurveKind.SVENSSON, {"parameters": replace(PARAMETERS, beta_3=None)}, "no beta 3"),
            (CurveKind.SVENSSON, {"parameters": replace(PARAMETERS, tau_2=None)}, "no tau 2"),
            (CurveKind.SVENSSON, {"parameters": replace(PARAMETERS, tau_2=0.0)}, "tau 2, 0 years, is not"),
            (CurveKind.NELSON_SIEGEL, {"parameters": replace(PARAMETERS, tau_1=-1.0)}, "tau 1, -1 years"),
            (CurveKind.NELSON_SIEGEL, {"parameters": replace(PARAMETERS, beta_2=np.inf)}, "beta 2 is not a"),
            (CurveKind.NELSON_SIEGEL, {"parameters": replace(PARAMETERS, beta_0=-1.2)}, "above -100 %"),
            (CurveKind.FLAT, {}, "there is no flat rate"),
            (CurveKind.FLAT, {"flat_rate": np.nan}, "the flat rate is not a number"),
            (CurveKind.FLAT, {"flat_rate": -1.0}, "leaves nothing of the principal"),
            (
                CurveKind.FLAT,
                {"flat_rate": 0.03, "extrapolation": Extrapolation.SMITH_WILSON},
                "no quotes from which",
            ),
            (CurveKind.ZERO, {}, "there is no quote"),
            (CurveKind.PAR, {}, "there is no quote"),
            (CurveKind.ZERO, {"terms": [1.0, 2.0], "rates": [0.02, -1.5]}, "not above -100 %"),
            (CurveKind.ZERO, {"terms": [1.0, 2.0], "rates": [0.02, np.nan]}, "not a number"),
            (CurveKind.ZERO, {"terms": [1.0, 1.0], "rates": [0.02, 0.03]}, "two quotes stand at 1 years"),
        ],
    )
    def test_what_is_stated(self, kind: CurveKind, changes: dict[str, Any], words: str) -> None:
        none = np.zeros(0)
        basis = Basis(TODAY, "EUR", none, none, curve_kind=kind, parameters=PARAMETERS)
        with pytest.raises(CurveError, match=words) as caught:
            _ = replace(basis, **changes).curve
        assert caught.value.mend

    def test_errors_cross_processes_whole(self) -> None:
        error = CurveError("one", "Two.", rows=(1, 4), subject="bonds")
        again = pickle.loads(pickle.dumps(error))
        assert (again.found, again.mend, again.rows, again.subject) == ("one", "Two.", (1, 4), "bonds")


def test_yields_of_the_sheet_are_those_of_the_flows() -> None:
    flows = _basis(BONDS).quoted_bonds
    stated = np.isfinite(BONDS.bond_yield)
    per_year = BONDS.frequency[stated]
    restated = per_year * np.expm1(flow_yields(flows)[stated] / per_year)
    # Periods counted by days and by months differ a little.
    np.testing.assert_allclose(restated, BONDS.bond_yield[stated], atol=2e-4)
