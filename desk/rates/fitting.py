"""Smooth curves of few parameters through many bonds, each weighted by the inverse of its duration."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.curve_error import CurveError
from desk.rates.decay_search import nearest
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quoted_flows import QuotedFlows, flow_yields

__all__ = ["CurveFit", "fit_nelson_siegel", "fit_svensson", "measured_fit"]

FloatArray = NDArray[np.float64]

_LARGEST_YIELD = 20.0  # 2000 % a year: beyond it numbers overflow before anything fits


@dataclass(frozen=True, eq=False)
class CurveFit:
    """A fitted curve and how far it is from what it was fitted to.

    Attributes
    ----------
    curve : DiscountCurve
        A NelsonSiegel or Svensson where one was fitted.
    residual_price : ndarray, shape (m,)
        Value on the curve less the value quoted, bond by bond, in the unit of the quotes.
    residual_bp : ndarray, shape (m,)
        Yield at the value on the curve less yield at the value quoted, both continuous [basis points].
    rmse_bp : float
        Root of the mean square of `residual_bp` over the bonds used [basis points].
    largest_bp : float
        The largest absolute value of `residual_bp` among them [basis points].
    converged : bool
        Whether the search came to rest.
    evaluations : int
        How often the bonds were valued in the last part of the search.
    is_used : ndarray of bool, shape (m,)
        Whether the curve was fitted to the bond: not to those beyond a last liquid point.
    """

    curve: DiscountCurve
    residual_price: FloatArray
    residual_bp: FloatArray
    rmse_bp: float
    largest_bp: float
    converged: bool = True
    evaluations: int = 0
    is_used: NDArray[np.bool_] = field(default_factory=lambda: np.ones(0, dtype=np.bool_))

    def __post_init__(self) -> None:
        """Every bond is used where nothing else is said."""
        if self.is_used.shape != self.residual_bp.shape:
            object.__setattr__(self, "is_used", np.ones(self.residual_bp.shape, dtype=np.bool_))
        self.is_used.flags.writeable = False


def measured_fit(
    curve: DiscountCurve,
    flows: QuotedFlows,
    *,
    is_used: NDArray[np.bool_] | None = None,
    converged: bool = True,
    evaluations: int = 0,
) -> CurveFit:
    """How far any curve is from bonds.

    Parameters
    ----------
    curve : DiscountCurve
    flows : QuotedFlows
    is_used : ndarray of bool, shape (m,), optional
        The bonds it was fitted to, at least one; all of them when left out.
    converged : bool
    evaluations : int
    """
    used = np.ones(len(flows), dtype=np.bool_) if is_used is None else is_used.copy()
    worth = flows.values(curve)
    residual_price = worth - flows.target
    residual_bp = 1e4 * (flow_yields(flows, target=worth) - flow_yields(flows))
    for array in (residual_price, residual_bp):
        array.flags.writeable = False
    return CurveFit(
        curve=curve,
        residual_price=residual_price,
        residual_bp=residual_bp,
        rmse_bp=float(np.sqrt(np.mean(residual_bp[used] ** 2))),
        largest_bp=float(np.abs(residual_bp[used]).max()),
        converged=converged,
        evaluations=evaluations,
        is_used=used,
    )


def fit_nelson_siegel(flows: QuotedFlows) -> CurveFit:
    """The curve of Nelson and Siegel nearest to the bonds; see `fit_svensson`."""
    return _fitted(flows, 1, _nelson_siegel)


def fit_svensson(flows: QuotedFlows) -> CurveFit:
    """The curve of Svensson nearest to the bonds.

    Parameters
    ----------
    flows : QuotedFlows
        Bonds in any order, any number of them maturing together; payments and values above 0.

    Returns
    -------
    CurveFit

    Raises
    ------
    CurveError
        If there are fewer bonds than parameters (6; 4 for Nelson-Siegel), or a bond has no yield or one of
        more than 2000 % a year.

    Notes
    -----
    The sum of squares of price errors, each divided by price times duration, is made least: to first order
    these are errors of yield (Gürkaynak, R., Sack, B. and Wright, J. (2007), The U.S. Treasury yield curve:
    1961 to the present, J. Monetary Economics 54, section 3).

    Given the decays, and to first order about known zero rates, the other parameters are a linear least
    squares problem (variable projection; Golub, G.H. and Pereyra, V. (1973), SIAM J. Numerical Analysis 10).
    It is solved for all pairs of a grid of decays at once; from the lowest points of that landscape all
    parameters are improved together, at first on payments shared out among a few times, at last on the
    payments as they are. The best curve then takes the place of the yields, until a round gains nothing.

    Noise can be fitted by a curve that runs off to hundreds of percent where there is no bond. Therefore:

    - decays are at least half the term of the first bond to mature (and 0.05 years) and at most the term of
      the last, so that no hump lies before or beyond all bonds;
    - the rate at time 0, β₀ + β₁, is within five percentage points of the yields quoted, the level β₀,
      which is the forward rate at the far end, within ten, and the curvatures within 1000 % a year;
    - four differences are added to the errors of yield, as if they were observed to be 0: the zero rates at
      time 0 and at a third and two thirds of the first term less that at the first term, with a standard
      error of one percentage point each, and the level less the zero rate at the last term, with one of
      two. The bonds themselves have the standard error that their own residuals show. What the bonds tell
      of the ends outweighs this; where they tell nothing, the curve stays near them. Bonds that a curve of
      the family within these bounds reprices exactly are repriced exactly: without residuals the differences
      weigh nothing. (Least squares with prior observations, each weighted by the inverse of its variance:
      Theil, H. and Goldberger, A.S. (1961), On pure and mixed statistical estimation in economics,
      International Economic Review 2(1); the citation is from memory, the sizes of the standard errors are
      a choice of ours);
    - with no more bonds than parameters there are no residuals to tell the noise; it is then taken to be one
      basis point at least, and with each bond more that least variance is a tenth.
    """
    return _fitted(flows, 2, _svensson)


def _nelson_siegel(numbers: FloatArray) -> NelsonSiegel:
    level, slope, curvature, decay = numbers.tolist()
    return NelsonSiegel(level, slope, curvature, decay)


def _svensson(numbers: FloatArray) -> Svensson:
    return Svensson(*numbers.tolist())


def _fitted(
    flows: QuotedFlows, humps: int, make: Callable[[FloatArray], NelsonSiegel | Svensson]
) -> CurveFit:
    count = 2 + 2 * humps
    if len(flows) < count:
        raise CurveError(
            f"there are {len(flows)} quotes for a curve of {count} parameters",
            "Give more, or take a curve of fewer parameters.",
        )
    yields = flow_yields(flows)
    if np.isnan(yields).any():
        raise CurveError(
            "the quote has no yield",
            "Correct its price or leave it out.",
            rows=np.flatnonzero(np.isnan(yields)).tolist(),
        )
    far = np.abs(yields) > _LARGEST_YIELD
    if far.any():
        raise CurveError(
            f"the quote has a yield of {100.0 * yields[far][0]:,.0f} % a year",
            "Correct its price or leave it out; a bond that is about to mature tells little of the curve.",
            rows=np.flatnonzero(far).tolist(),
        )
    best = nearest(flows, yields, humps)
    curve = make(best.numbers)
    return measured_fit(curve, flows, converged=best.converged, evaluations=best.evaluations)
