"""What follows from the bonds of a curve: price from yield, yield from price, and the misfit of each."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

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
        # A price of 100 without accrued interest is worth 100 and that interest.
        at_par = replace(
            bonds,
            price=np.full(len(bonds), 100.0),
            bond_yield=none,
            is_clean=np.ones(len(bonds), dtype=bool),
        )
        accrued = _quotes(basis, at_par).target - 100.0
    except ValueError:
        return plain
    price = np.where(np.isnan(bonds.price), flows.target - accrued * bonds.is_clean, bonds.price)
    found = np.where(np.isnan(bonds.bond_yield), _street(basis, bonds, flows, flows.target), bonds.bond_yield)
    if fit is None or fit.residual_price.shape != (len(bonds),):
        return BondFigures(price, found, none, none, none)
    fitted = _street(basis, bonds, flows, flows.target + fit.residual_price)
    return BondFigures(price, found, fitted, fit.residual_bp, fit.residual_price)


def _quotes(basis: Basis, bonds: CurveBonds) -> QuotedFlows:
    return bond_quotes(bonds, valuation_date=basis.valuation_date, day_count=basis.day_count)


def _street(basis: Basis, bonds: CurveBonds, flows: QuotedFlows, target: FloatArray) -> FloatArray:
    """Yields over coupon periods at which the bonds are worth `target`; NaN where none is found."""
    each = bonds.frequency.astype(np.float64)
    with np.errstate(all="ignore"):
        continuous = flow_yields(flows, target=target)
        if np.isnan(continuous).any():
            return np.full(len(bonds), np.nan)
        rate = each * np.expm1(continuous / each)
        duration = flows.sums(flows.amount * flows.time * np.exp(-continuous[flows.instrument] * flows.time))
        for _ in range(_ROUNDS):
            priced = replace(bonds, price=np.full(len(bonds), np.nan), bond_yield=rate)
            gap = _quotes(basis, priced).target - target
            step = gap / duration * (1.0 + rate / each)
            rate = rate + step
            if np.abs(step).max(initial=0.0) < _REST:
                break
    return np.asarray(rate)


def fit_in_words(bonds: CurveBonds, fit: CurveFit, *, is_exact: bool) -> str:
    """How near a curve comes to its bonds, in a sentence or two."""
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
    text = (
        f"Root mean square misfit {numbers.number(fit.rmse_bp, 1)} bp over {count} {plural}; the largest "
        f"{largest} bp, {name}."
    )
    if fit.rmse_bp > _POOR:
        text += " That is no fit: check the bonds furthest off."
    parameters = {NelsonSiegel: 4, Svensson: 6}.get(type(fit.curve), 0)
    if used < 2 * parameters - 2:
        text += f" {count} {plural} are few for {parameters} parameters: the curve may swing beside them."
    if not fit.converged:
        text += " The search did not come to rest: look at the bonds furthest off."
    return text
