"""What follows from the bonds of a curve: price from yield, yield from price, and the misfit of each."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from desk.book import Basis, CurveBonds
from desk.book.arrays import FloatArray
from desk.book.bond_curve import bond_quotes
from desk.rates.fitting import CurveFit
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.window.parts import numbers

__all__ = ["BondFigures", "bond_figures", "fit_in_words"]

_ROUNDS = 4
_REST = 1e-13
_POOR = 100.0
"""A root mean square misfit above it is none that the same issuer's bonds have [basis points]."""


@dataclass(frozen=True, eq=False)
class BondFigures:
    """Figures of m bonds, each array shape (m,), NaN where there are none.

    Attributes
    ----------
    price : ndarray
        As quoted, or as it follows from the yield, clean or dirty as the bond says [per 100].
    bond_yield : ndarray
        As quoted, or as it follows from the price, compounded as often as coupons are paid [1/year].
    fitted_yield : ndarray
        At the bond's value on the curve [1/year].
    misfit_bp : ndarray
        Fitted less quoted yield, continuous [basis points].
    misfit_price : ndarray
        Value on the curve less the quoted one [per 100].
    """

    price: FloatArray
    bond_yield: FloatArray
    fitted_yield: FloatArray
    misfit_bp: FloatArray
    misfit_price: FloatArray


def bond_figures(basis: Basis, bonds: CurveBonds, fit: CurveFit | None) -> BondFigures:
    """What follows from bonds, and from a curve that was fitted to them.

    Bonds that cannot be valued as they stand have what is given, and nothing more.
    """
    none = np.full(len(bonds), np.nan)
    plain = BondFigures(bonds.price, bonds.bond_yield, none, none, none)
    try:
        flows = _quotes(basis, bonds)
        periods = _periods(basis, bonds)
    except ValueError:
        return plain
    accrued = 100.0 * bonds.coupon * (1.0 - periods.left) / bonds.frequency
    price = np.where(np.isnan(bonds.price), flows.target - accrued * bonds.is_clean, bonds.price)
    bond_yield = bonds.bond_yield
    if np.isnan(bond_yield).any():
        bond_yield = np.where(np.isnan(bond_yield), _street(periods, flows, flows.target), bond_yield)
    if fit is None or fit.residual_price.shape != (len(bonds),):
        return BondFigures(price, bond_yield, none, none, none)
    fitted = _street(periods, flows, flows.target + fit.residual_price)
    return BondFigures(price, bond_yield, fitted, fit.residual_bp, fit.residual_price)


def _quotes(basis: Basis, bonds: CurveBonds) -> QuotedFlows:
    return bond_quotes(bonds, valuation_date=basis.valuation_date, day_count=basis.day_count)


@dataclass(frozen=True, eq=False)
class _Periods:
    """Payments of m bonds by coupon periods from the valuation date.

    Attributes
    ----------
    left : ndarray, shape (m,)
        The part of the running period that is left.
    each : ndarray, shape (m,)
        Periods a year.
    instrument, time, amount : ndarray, shape (n,)
        Of each payment its bond, when it is due [periods], and how much it is [per 100].
    first : ndarray, shape (m,)
        The first payment of each bond.
    """

    left: FloatArray
    each: FloatArray
    instrument: NDArray[np.intp]
    time: FloatArray
    amount: FloatArray
    first: NDArray[np.intp]


def _periods(basis: Basis, bonds: CurveBonds) -> _Periods:
    count = len(bonds)
    # Coupons of 100 % at a clean price of 100 have all the dates, and accrue what has passed of the period.
    alike = replace(
        bonds,
        coupon=np.ones(count),
        price=np.full(count, 100.0),
        bond_yield=np.full(count, np.nan),
        is_clean=np.ones(count, dtype=bool),
    )
    flows = _quotes(basis, alike)
    each = bonds.frequency.astype(np.float64)
    left = 1.0 - (flows.target / 100.0 - 1.0) * each
    own = np.asarray(flows.instrument, dtype=np.intp)
    first = np.flatnonzero(np.diff(own, prepend=-1))
    amount = (100.0 * bonds.coupon / each)[own]
    amount[np.append(first[1:], own.size) - 1] += 100.0
    return _Periods(left, each, own, left[own] + np.arange(own.size) - first[own], amount, first)


def _street(periods: _Periods, flows: QuotedFlows, target: FloatArray) -> FloatArray:
    """Yields over coupon periods at which the bonds are worth `target`; NaN where none is found."""
    own, each = periods.instrument, periods.each
    with np.errstate(all="ignore"):
        growth = flow_yields(flows, target=target) / each
        if np.isnan(growth).any():
            return np.full(each.size, np.nan)
        for _ in range(_ROUNDS):
            worth = periods.amount * np.exp(-growth[own] * periods.time)
            slope = np.add.reduceat(worth * periods.time, periods.first)
            step = (np.add.reduceat(worth, periods.first) - target) / slope
            growth = growth + step
            if np.abs(step).max(initial=0.0) < _REST:
                break
        return np.asarray(each * np.expm1(growth))


def fit_in_words(bonds: CurveBonds, fit: CurveFit, *, is_exact: bool, name_first: bool = False) -> str:
    """How near a curve comes to its bonds, in a sentence or two.

    With `name_first` the bond furthest off comes before the rest, for a narrow place that may cut its end.
    """
    known = np.isfinite(fit.residual_bp) & fit.is_used
    if not known.any():
        return ""
    row = int(np.where(known, np.abs(fit.residual_bp), -1.0).argmax())
    name = bonds.names[row] or f"bond {row + 1}"
    used = int(known.sum())
    count = numbers.integer(used)
    plural = "bond" if used == 1 else "bonds"
    if is_exact and fit.largest_bp < 5e-7:
        return f"The curve reprices {'the' if used == 1 else 'all'} {count} {plural} exactly."
    largest = numbers.signed(float(fit.residual_bp[row]), 1)
    whole = f"oot mean square misfit {numbers.number(fit.rmse_bp, 1)} bp over {count} {plural}"
    if name_first:
        text = f"{name}: {largest} bp, the largest; r{whole}."
    else:
        text = f"R{whole}; the largest {largest} bp, {name}."
    if fit.rmse_bp > _POOR:
        text += " That is no fit: check the bonds furthest off."
    parameters = {NelsonSiegel: 4, Svensson: 6}.get(type(fit.curve), 0)
    if used < 2 * parameters - 2:
        text += f" {count} {plural} are few for {parameters} parameters: the curve may swing beside them."
    if not fit.converged:
        text += " The search did not come to rest: look at the bonds furthest off."
    return text
