"""A curve of a book as the station shows it: the curve itself, its quotes, and where they end."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from desk.book import Basis, CurveKind, LiabilityMethod
from desk.book.arrays import FloatArray
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import Curve, DiscountCurve
from desk.rates.fitting import CurveFit
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.rates.smith_wilson import SmithWilsonCurve
from desk.window.curve.targets import Part

__all__ = ["Dots", "Shown", "SpreadCurve", "pasted_curve", "shown_of"]

_NONE = np.zeros(0)
_BESIDE = 1e-9
"""How far before a knot its limit from the left is taken, as a part of the term."""
_STEP = 1e-4
"""Over which an instantaneous forward rate with a spread is taken [years]."""


class SpreadCurve:
    """What liabilities are discounted on: a curve with the spread of its basis at each term."""

    def __init__(self, basis: Basis) -> None:
        self._curve = basis.curve
        self._basis = basis
        # What gives no spread is told here, before anything is drawn.
        self.zero(1.0)

    def _exponent(self, time: FloatArray) -> FloatArray:
        return self.zero(time) * time

    def discount(self, time: ArrayLike) -> FloatArray:
        """Discount factors; see `DiscountCurve`."""
        return np.asarray(np.exp(-self._exponent(np.asarray(time, dtype=np.float64))))

    def zero(self, time: ArrayLike) -> FloatArray:
        """Continuous zero rates with the spread [1/year]."""
        times = np.asarray(time, dtype=np.float64)
        return np.asarray(self._curve.zero(times) + self._basis.liability_spread_at(times))

    def forward(self, start: ArrayLike, end: ArrayLike) -> FloatArray:
        """Continuous forward rates with the spread [1/year]; see `DiscountCurve`."""
        first, last = (np.asarray(one, dtype=np.float64) for one in np.broadcast_arrays(start, end))
        same = first == last
        end = np.where(same, first + _STEP, last)
        return np.asarray((self._exponent(end) - self._exponent(first)) / (end - first))


@dataclass(frozen=True, eq=False)
class Dots:
    """Quotes in the picture.

    Attributes
    ----------
    name : str
    term : ndarray, shape (q,)
        [years]
    rate : ndarray, shape (q,)
        Continuous [1/year].
    on_curve : ndarray, shape (q,), or None
        Of bonds: the yields at their values on the curve, continuous [1/year].
    spread : float
        In the curve that is shown and not in the yields [1/year].
    """

    name: str
    term: FloatArray
    rate: FloatArray
    on_curve: FloatArray | None = None
    spread: float = 0.0


@dataclass(frozen=True, eq=False)
class Shown:
    """A curve to be shown.

    Attributes
    ----------
    curve : DiscountCurve
    compounding : Compounding
        Its quotes are stated so.
    last_quoted : float
        The last term that was quoted; infinite where nothing is extrapolated [years].
    quotes : Dots
    knots : ndarray, shape (k,)
        Terms at which its forward rate may jump [years].
    fit : CurveFit or None
        Of a curve fitted to bonds.
    alpha : float or None
        Speed of convergence of a Smith-Wilson curve [1/year].
    ultimate : float or None
        Its ultimate forward rate, compounded annually [1/year].
    is_index : bool
        Of prices: it grows where others discount.
    """

    curve: DiscountCurve
    compounding: Compounding
    last_quoted: float
    quotes: Dots
    knots: FloatArray = field(default_factory=lambda: _NONE)
    fit: CurveFit | None = None
    alpha: float | None = None
    ultimate: float | None = None
    is_index: bool = False

    def times(self, until: float, points: int = 400) -> FloatArray:
        """Times to draw it at, up to `until` [years]: both sides of each knot, where the forward may jump."""
        knots = self.knots[self.knots <= until]
        return np.unique(np.concatenate((np.linspace(0.0, until, points), knots, knots * (1.0 - _BESIDE))))

    def zero(self, time: ArrayLike, compounding: Compounding) -> FloatArray:
        """Zero rates in a compounding [1/year]."""
        return from_continuous(self.curve.zero(time), compounding)

    def factor(self, time: ArrayLike) -> FloatArray:
        """Discount factors, or the price index, which is 1 today."""
        return self.curve.discount(time) ** (-1.0 if self.is_index else 1.0)


def shown_of(basis: Basis, part: Part) -> Shown | None:
    """A curve of a basis; None where it has none.

    Raises
    ------
    ValueError
        If what it is made from gives no curve.
    """
    if part is Part.INFLATION:
        inflation = basis.inflation
        if inflation is None:
            return None
        curve = inflation.curve
        return Shown(
            curve,
            Compounding.ANNUAL,
            curve.last_term,
            Dots("Quote", curve.terms, curve.zero_rates),
            curve.terms,
            is_index=True,
        )
    if part is Part.LIABILITIES:
        return _liabilities(basis)
    drawn = basis.curve
    alpha = ultimate = None
    if isinstance(drawn, SmithWilsonCurve):
        alpha, ultimate = drawn.alpha, drawn.ultimate_forward_rate
    last = np.inf if basis.last_quoted_term is None else basis.last_quoted_term
    if basis.curve_kind is CurveKind.BONDS:
        return Shown(
            drawn,
            basis.compounding,
            last,
            _bond_dots(basis.quoted_bonds, basis.curve_fit),
            drawn.terms if isinstance(drawn, Curve) else _NONE,
            basis.curve_fit,
            alpha,
            ultimate,
        )
    if basis.curve_kind in (CurveKind.NELSON_SIEGEL, CurveKind.SVENSSON, CurveKind.FLAT):
        return Shown(drawn, basis.compounding, np.inf, Dots("", _NONE, _NONE))
    knots = drawn.terms if isinstance(drawn, Curve) else basis.terms
    quotes = Dots("Quote", knots, np.asarray(drawn.zero(knots)))
    return Shown(drawn, basis.compounding, last, quotes, knots, None, alpha, ultimate)


def _liabilities(basis: Basis) -> Shown:
    method = basis.liability_method
    curve = SpreadCurve(basis)
    base = shown_of(basis, Part.CURVE)
    if base is None:
        raise ValueError("the basis has no curve")
    if method is LiabilityMethod.CORPORATE_BONDS:
        bonds = basis.liability_bonds_quoted
        own = basis.liability_curve
        return Shown(
            curve,
            basis.compounding,
            float(bonds.term.max()),
            _bond_dots(bonds, basis.liability_curve_fit, basis.liability_spread),
            own.terms if isinstance(own, Curve) else _NONE,
            basis.liability_curve_fit,
        )
    if method is LiabilityMethod.EXPECTED_RETURN:
        return Shown(curve, Compounding.ANNUAL, np.inf, Dots("", _NONE, _NONE))
    knots = base.knots
    if method is LiabilityMethod.TERM_SPREADS:
        knots = np.union1d(knots, basis.liability_terms)
        quotes = Dots("Spread given", basis.liability_terms, curve.zero(basis.liability_terms))
        return Shown(curve, base.compounding, base.last_quoted, quotes, knots)
    return Shown(curve, base.compounding, base.last_quoted, Dots("", _NONE, _NONE), knots)


def _bond_dots(flows: QuotedFlows, fit: CurveFit | None, spread: float = 0.0) -> Dots:
    quoted = flow_yields(flows)
    on_curve = None if fit is None else quoted + 1e-4 * fit.residual_bp
    return Dots("Bond yields", flows.term, quoted, on_curve, spread)


def pasted_curve(terms: FloatArray, rates: FloatArray, like: Shown) -> Shown:
    """A curve from pasted zero rates, stated as those of another are.

    Raises
    ------
    ValueError
        If they give none.
    """
    curve = Curve(terms, to_continuous(rates, like.compounding))
    quotes = Dots("Pasted", curve.terms, curve.zero_rates)
    return Shown(curve, like.compounding, curve.last_term, quotes, curve.terms, is_index=like.is_index)
