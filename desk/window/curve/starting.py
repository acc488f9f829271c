"""What a curve of another kind starts from, so that it lies near the one before."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from desk.book import Basis, Book, CurveBonds, CurveKind, CurveParameters, LiabilityMethod
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import DiscountCurve
from desk.rates.day_count import add_months
from desk.rates.fitting import fit_nelson_siegel, fit_svensson
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quotes import zero_flows
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.bond_cells import no_bonds
from desk.window.curve.faults import QUOTED_KINDS

__all__ = ["liability_start", "mean_time", "new_bond", "source_of", "start"]

_STANDARD_TERMS = np.array([1.0, 2.0, 3.0, 4.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 30.0])
_FIT_TERMS = np.concatenate((np.arange(0.5, 10.0, 0.5), np.arange(10.0, 31.0, 2.5)))
_SECOND_DECAY = 2.5
"""Times the first one, where a second bend of nothing is added."""
_USUAL_TIME = 10.0
_USUAL_RATE = 0.03

_SOURCE = (
    "terms",
    "rates",
    "bonds",
    "bond_fit",
    "parameters",
    "flat_rate",
    "payments_per_year",
    "compounding",
    "extrapolation",
)
_EMPTY: dict[str, Any] = {
    "terms": np.zeros(0),
    "rates": np.zeros(0),
    "bonds": None,
    "parameters": None,
    "flat_rate": None,
}


def source_of(basis: Basis) -> dict[str, Any]:
    """What the curve is made from, by field of `Basis`: to come back to it from another kind."""
    return {name: getattr(basis, name) for name in _SOURCE}


def mean_time(book: Book) -> float:
    """The mean time of what is promised, weighted by amount [years]: where a flat rate is read off."""
    flows = book.liabilities
    size = np.abs(flows.amount)
    if not len(flows) or not size.sum() > 0.0:
        return _USUAL_TIME
    return float(np.clip((flows.time * size).sum() / size.sum(), 0.5, 60.0))


def start(
    basis: Basis, kind: CurveKind, *, kept: dict[str, Any] | None, curve: DiscountCurve | None, middle: float
) -> dict[str, Any]:
    """The fields of a basis with a curve of another kind.

    Parameters
    ----------
    basis : Basis
    kind : CurveKind
    kept : dict or None
        What a curve of that kind was made from before; it is taken up again.
    curve : DiscountCurve or None
        The present curve; None where there is none.
    middle : float
        The time a flat rate is read off at [years].

    Returns
    -------
    dict
        Without bonds where there were none before: they cannot be made up.
    """
    if kept is not None:
        return {**kept, "curve_kind": kind}
    changes: dict[str, Any] = {**_EMPTY, "curve_kind": kind}
    if kind in QUOTED_KINDS:
        if basis.curve_kind in QUOTED_KINDS or curve is None:
            # The figures stay; what they mean changes.
            changes.update(terms=basis.terms, rates=basis.rates)
        else:
            changes.update(_quotes(basis, kind, curve))
    elif kind is CurveKind.BONDS:
        changes["bonds"] = no_bonds()
    elif kind is CurveKind.FLAT:
        changes["extrapolation"] = Extrapolation.FLAT_FORWARD
        rate = _USUAL_RATE if curve is None else float(from_continuous(curve.zero(middle), basis.compounding))
        changes["flat_rate"] = round(rate, 4)
    else:
        changes["extrapolation"] = Extrapolation.FLAT_FORWARD
        changes["parameters"] = _parameters(basis, kind, curve)
    return changes


def liability_start(
    basis: Basis, method: LiabilityMethod, *, curve: DiscountCurve | None, middle: float
) -> dict[str, Any]:
    """The fields of a basis whose liabilities are discounted in another way, from what it has already."""
    changes: dict[str, Any] = {"liability_method": method}
    if method is LiabilityMethod.TERM_SPREADS and not basis.liability_terms.size:
        changes.update(liability_terms=np.array([1.0, 10.0, 30.0]), liability_spreads=np.zeros(3))
    elif method is LiabilityMethod.CORPORATE_BONDS and basis.liability_bonds is None:
        changes["liability_bonds"] = no_bonds()
    elif method is LiabilityMethod.EXPECTED_RETURN and basis.expected_return is None:
        changes["expected_return"] = round(float(np.expm1(curve.zero(middle))), 4) if curve else _USUAL_RATE
    return changes


def _quotes(basis: Basis, kind: CurveKind, curve: DiscountCurve) -> dict[str, Any]:
    """Quotes read off a curve."""
    terms = _STANDARD_TERMS
    if kind is CurveKind.ZERO:
        rates = from_continuous(curve.zero(terms), basis.compounding)
    else:
        each = basis.quote_payments
        rates = np.array([_par_rate(curve, float(term), each) for term in terms])
        if kind is CurveKind.PAR and each != basis.compounding.per_year:
            simple = next(one for one in Compounding if one.per_year == each)
            rates = from_continuous(to_continuous(rates, simple), basis.compounding)
    return {"terms": terms, "rates": np.round(rates, 6)}


def _par_rate(curve: DiscountCurve, term: float, each: int) -> float:
    """The coupon rate at which a bond paying `each` times a year costs its nominal."""
    paid = np.arange(1, round(term * each) + 1) / each
    worth = curve.discount(paid)
    return float(each * (1.0 - worth[-1]) / worth.sum())


def _parameters(basis: Basis, kind: CurveKind, curve: DiscountCurve | None) -> CurveParameters:
    """Parameters whose curve is near the present one, rounded to a hundredth of a basis point."""
    old = basis.parameters
    if kind is CurveKind.SVENSSON and old is not None and old.beta_3 is None:
        # A second bend of nothing leaves the curve as it is.
        return replace(old, beta_3=0.0, tau_2=round(_SECOND_DECAY * old.tau_1, 4))
    if curve is None:
        return CurveParameters(0.03, -0.01, 0.0, 2.0, *((0.0, 5.0) if kind is CurveKind.SVENSSON else ()))
    # The formula is in the compounding of the basis: fitted to the stated rates as if they were continuous.
    stated = from_continuous(curve.zero(_FIT_TERMS), basis.compounding)
    search = fit_svensson if kind is CurveKind.SVENSSON else fit_nelson_siegel
    return _rounded(search(zero_flows(_FIT_TERMS, stated)).curve)


def _rounded(found: object) -> CurveParameters:
    if isinstance(found, Svensson):
        return CurveParameters(
            round(found.level, 6),
            round(found.slope, 6),
            round(found.curvature, 6),
            round(found.decay, 4),
            round(found.second_curvature, 6),
            round(found.second_decay, 4),
        )
    if isinstance(found, NelsonSiegel):
        return CurveParameters(
            round(found.level, 6), round(found.slope, 6), round(found.curvature, 6), round(found.decay, 4)
        )
    raise TypeError("`found` must be a curve of Nelson and Siegel or of Svensson")


def new_bond(
    basis: Basis, bonds: CurveBonds, curve: DiscountCurve | None, after: int
) -> tuple[str, np.datetime64, float, int, float]:
    """A bond to add after another: at par on the present curve, so that it hardly moves it.

    Returns
    -------
    name : str
    maturity : datetime64[D]
        Between those of its neighbours in time where there is room, else two years after the last.
    coupon : float
        [1/year]
    frequency : int
    bond_yield : float
        The coupon: a bond at par has it for its yield [1/year].
    """
    today = np.datetime64(basis.valuation_date, "D")
    maturities = np.sort(bonds.maturity[~np.isnat(bonds.maturity)])
    each = int(bonds.frequency[after]) if 0 <= after < len(bonds) else 1
    maturity = add_months(today, 24)
    if maturities.size:
        own = bonds.maturity[after] if 0 <= after < len(bonds) else maturities[-1]
        later = maturities[maturities > own]
        gap = (later[0] - own) if later.size else None
        maturity = (
            own + gap // 2
            if gap is not None and gap > np.timedelta64(1, "D")
            else add_months(maturities[-1], 24)
        )
    maturity = np.asarray(maturity).astype("datetime64[D]").item()
    term = max(1.0, round((maturity - basis.valuation_date).days / 365.25))
    rate = _USUAL_RATE if curve is None else _par_rate(curve, term, each)
    taken = set(bonds.names)
    number = next(count for count in range(len(bonds) + 1, len(bonds) + 1000) if f"Bond {count}" not in taken)
    coupon = round(rate, 4)
    return f"Bond {number}", np.datetime64(maturity, "D"), coupon, each, coupon
