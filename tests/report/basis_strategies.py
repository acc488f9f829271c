"""Random bases with anything that a workbook can hold."""

from __future__ import annotations

from datetime import date
from typing import Any

import numpy as np
from hypothesis import strategies as st

from desk.book import (
    Basis,
    BondFit,
    CurveBonds,
    CurveKind,
    CurveParameters,
    Inflation,
    LiabilityMethod,
)
from desk.intake.basis_items import QUOTED_KINDS
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from desk.report.safe_cells import clean_text

__all__ = ["TODAY", "bases", "maybe", "names", "rates", "rising"]

TODAY = date(2026, 9, 30)

names = st.one_of(
    st.text(min_size=1, max_size=20).filter(lambda text: bool(text.strip()) and clean_text(text) == text),
    st.sampled_from(
        ["=1+1", "+x", "-x", "@x", "#N/A", "_x0041_", " a ", "a\nb", "\u00e9\u4e2d\U0001f600", "12", "TRUE"]
    ),
)
rates = st.floats(-0.4, 0.9)
small = st.floats(-0.02, 0.15)
simple = st.sampled_from([Interpolation.LOG_LINEAR, Interpolation.LINEAR_ZERO])


def maybe(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    """Nothing, or one of these."""
    return st.one_of(st.none(), strategy)


def rising(draw: st.DrawFn, *, least: int = 1, most: int = 8) -> np.ndarray:
    """Years that rise."""
    return np.array(sorted(draw(st.sets(st.floats(0.05, 100.0), min_size=least, max_size=most))))


@st.composite
def bonds(draw: st.DrawFn, *, fit: BondFit) -> CurveBonds:
    """Bonds near one curve, as many as the fit needs, in the order in which they mature or not."""
    least = {BondFit.EXACT: 1, BondFit.NELSON_SIEGEL: 4, BondFit.SVENSSON: 6}[fit]
    apart = st.integers(2027, 2060)
    years = draw(st.lists(apart, min_size=least, max_size=least + 2, unique=fit is BondFit.EXACT))
    count = len(years)
    by_price = np.array([draw(st.booleans()) for _ in years])
    near = st.floats(0.02, 0.04)
    coupon = np.array([draw(near) for _ in years])
    price = np.array([draw(st.floats(97.0, 103.0)) for _ in years])
    bond_yield = np.array([draw(near) for _ in years])
    return CurveBonds(
        tuple(draw(st.one_of(st.just(""), names)) for _ in years),
        np.array([date(year, 11, 15) for year in years], "M8[D]"),
        coupon,
        np.array([draw(st.sampled_from([1, 2, 4, 12])) for _ in years]),
        np.where(by_price, price, np.nan),
        np.where(by_price, np.nan, bond_yield),
        np.array([draw(st.booleans()) for _ in range(count)]),
    )


@st.composite
def inflations(draw: st.DrawFn) -> Inflation:
    """Expected inflation."""
    terms = rising(draw)
    return Inflation(
        terms,
        np.array([draw(small) for _ in terms]),
        interpolation=draw(simple),
        volatility=draw(st.one_of(st.just(0.0), st.floats(1e-4, 0.9))),
        recent=draw(maybe(small)),
    )


@st.composite
def bases(draw: st.DrawFn, day_count: DayCount, *, first: Basis | None = None) -> Basis:
    """A basis of any kind; with `first`, one to stand beside it."""
    kind = draw(st.sampled_from(CurveKind))
    method = draw(st.sampled_from(LiabilityMethod))
    # An exact fit of any bonds there are gives no curve now and then, which is for other tests.
    smooth = st.sampled_from([BondFit.NELSON_SIEGEL, BondFit.SVENSSON])
    fit, liability_fit = draw(smooth), draw(smooth)
    own: dict[str, Any] = {"terms": np.zeros(0), "rates": np.zeros(0)}
    leftover = draw(st.booleans())
    if kind in QUOTED_KINDS:
        terms = rising(draw)
        if kind is not CurveKind.ZERO:
            terms = np.arange(1.0, terms.size + 1.0)
        near = small if kind is CurveKind.ZERO else st.floats(0.02, 0.03)
        own = {"terms": terms, "rates": np.array([draw(near) for _ in terms])}
        own["last_liquid_point"] = draw(maybe(st.floats(terms[0], 100.0)))
    if kind is CurveKind.BONDS or leftover:
        own["bonds"] = draw(bonds(fit=fit))
    if kind in (CurveKind.NELSON_SIEGEL, CurveKind.SVENSSON) or leftover:
        hump = draw(small), draw(st.floats(0.5, 20.0))
        more = hump if kind is CurveKind.SVENSSON else (None, None)
        own["parameters"] = CurveParameters(
            draw(small), draw(small), draw(small), draw(st.floats(0.5, 20.0)), *more
        )
    if kind is CurveKind.FLAT or leftover:
        own["flat_rate"] = draw(small)
    if method is LiabilityMethod.EXPECTED_RETURN or leftover:
        own["expected_return"] = draw(small)
    if method is LiabilityMethod.CORPORATE_BONDS or leftover:
        own["liability_bonds"] = draw(bonds(fit=liability_fit))
    if method is LiabilityMethod.TERM_SPREADS or leftover:
        own["liability_terms"] = rising(draw)
        own["liability_spreads"] = np.array([draw(small) for _ in own["liability_terms"]])
    inherited = st.none() if first is None else st.sampled_from([None, first.inflation])
    return Basis(
        valuation_date=TODAY,
        currency=draw(st.sampled_from(["EUR", "GBP", "USD"])) if first is None else first.currency,
        curve_kind=kind,
        compounding=draw(st.sampled_from(Compounding)),
        interpolation=draw(simple),
        liability_spread=draw(rates),
        market_risk_premium=draw(rates),
        day_count=day_count,
        title=draw(st.one_of(st.just(""), names)),
        payments_per_year=draw(maybe(st.sampled_from([1, 2, 4, 12]))),
        bond_fit=fit,
        liability_method=method,
        liability_fit=liability_fit,
        inflation=draw(st.one_of(inherited, inflations())),
        **own,
    )
