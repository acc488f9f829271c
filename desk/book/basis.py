"""The basis: the date, the curve and the premiums a book is valued on."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import date
from enum import StrEnum
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from desk.book.arrays import FloatArray, owned_floats, same_fields
from desk.book.bond_curve import bond_curve, bond_quotes, exact_fit
from desk.book.curve_source import BondFit, CurveBonds, CurveParameters
from desk.book.inflation import Inflation
from desk.book.stated_curve import continuous_quotes, formula_curve, require_spreads, stated_flat_curve
from desk.rates.bootstrap import bootstrap
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import Curve, DiscountCurve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.day_count import TIME_COUNTS, DayCount
from desk.rates.fitting import CurveFit
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.quotes import par_flows, swap_flows, zero_flows
from desk.rates.smith_wilson import Extrapolation, smith_wilson

__all__ = ["Basis", "CurveKind", "LiabilityMethod"]

_BONDS, _LIABILITY_BONDS = "bonds", "liability bonds"


class CurveKind(StrEnum):
    """What the quotes of the curve are."""

    ZERO = "zero"
    PAR = "par"
    SWAP = "swap"
    BONDS = "bonds"
    """A sheet of bonds with prices or yields."""
    NELSON_SIEGEL = "nelson-siegel"
    SVENSSON = "svensson"
    """Parameters of the formula of that name."""
    FLAT = "flat"
    """One rate for all terms."""


_QUOTED = (CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP)


class LiabilityMethod(StrEnum):
    """What liabilities are discounted on; the liability spread is added to each."""

    CURVE = "curve"
    """The curve of the basis."""
    TERM_SPREADS = "spread by term"
    """The curve, with a spread for each term."""
    CORPORATE_BONDS = "corporate bonds"
    """A curve of its own, drawn through a sheet of high-quality corporate bonds."""
    EXPECTED_RETURN = "expected return"
    """One flat rate: the return expected on the assets."""


@dataclass(frozen=True, eq=False)
class Basis:
    """What a book is valued on.

    Attributes
    ----------
    valuation_date : datetime.date
    currency : str
        ISO 4217 code.
    terms : ndarray, shape (q,)
        Terms of the quotes [years], rising and positive.
    rates : ndarray, shape (q,)
        The quotes as stated, in `compounding` [1/year].
    curve_kind : CurveKind
    compounding : Compounding
        Of the quotes.
    interpolation : Interpolation
    liability_spread : float
        Added to the continuous zero rates for liabilities [1/year].
    market_risk_premium : float
        Reward for one unit of beta [1/year].
    day_count : DayCount
        Turns dates into years.
    title : str
    payments_per_year : int or None
        Coupons of par yields, payments of the fixed leg of swaps: 1, 2, 4 or 12; None for those of
        `compounding`, once a year if that is continuous.
    ultimate_forward_rate : float or None
        Of a Smith-Wilson curve, compounded once a year [1/year].
    last_liquid_point : float or None
        Quotes beyond it are left out of the curve [years]; None for the last quote.
    convergence_point : float or None
        Where the forward rate of a Smith-Wilson curve has come to the ultimate one [years]; None for 40 years
        after the last liquid point, but no earlier than 60 years.
    convergence_tolerance : float
        How far it may still be from it there [1/year].
    extrapolation : Extrapolation
        How the curve goes on beyond the last liquid point. A Smith-Wilson curve needs
        `ultimate_forward_rate`, and draws its own curve between the quotes in the place of `interpolation`.
    bonds : CurveBonds or None
        Of a curve of bonds; `terms` and `rates` are empty then.
    bond_fit : BondFit
        How the curve is drawn through them.
    parameters : CurveParameters or None
        Of a Nelson-Siegel or Svensson curve; `terms` and `rates` are empty then.
    flat_rate : float or None
        Of a flat curve, in `compounding` [1/year]; `terms` and `rates` are empty then.
    liability_method : LiabilityMethod
    liability_terms, liability_spreads : ndarray, shape (l,)
        Of a spread by term: terms [years] and continuously compounded spreads over the curve [1/year], joined
        by lines and flat outside them.
    liability_bonds : CurveBonds or None
        The high-quality corporate bonds.
    liability_fit : BondFit
        How their curve is drawn.
    expected_return : float or None
        On the assets, annual effective [1/year].
    inflation : Inflation or None
        None where no line follows a price index.
    """

    valuation_date: date
    currency: str
    terms: FloatArray
    rates: FloatArray
    curve_kind: CurveKind = CurveKind.ZERO
    compounding: Compounding = Compounding.ANNUAL
    interpolation: Interpolation = Interpolation.LOG_LINEAR
    liability_spread: float = 0.0
    market_risk_premium: float = 0.0
    day_count: DayCount = DayCount.ACT_365F
    title: str = ""
    payments_per_year: int | None = None
    ultimate_forward_rate: float | None = None
    last_liquid_point: float | None = None
    convergence_point: float | None = None
    convergence_tolerance: float = 1e-4
    extrapolation: Extrapolation = Extrapolation.FLAT_FORWARD
    bonds: CurveBonds | None = None
    bond_fit: BondFit = BondFit.SVENSSON
    parameters: CurveParameters | None = None
    flat_rate: float | None = None
    liability_method: LiabilityMethod = LiabilityMethod.CURVE
    liability_terms: FloatArray = field(default_factory=lambda: np.zeros(0))
    liability_spreads: FloatArray = field(default_factory=lambda: np.zeros(0))
    liability_bonds: CurveBonds | None = None
    liability_fit: BondFit = BondFit.SVENSSON
    expected_return: float | None = None
    inflation: Inflation | None = None

    def __post_init__(self) -> None:
        """Own the quotes."""
        if self.day_count not in TIME_COUNTS:
            raise ValueError(f"`day_count` must be one of {', '.join(TIME_COUNTS)}")
        for name in ("terms", "rates", "liability_terms", "liability_spreads"):
            object.__setattr__(self, name, owned_floats(getattr(self, name)))

    def __eq__(self, other: object) -> bool:
        """Equal when every item is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]

    @property
    def quote_payments(self) -> int:
        """Payments a year of the instruments quoted, where they are par yields or swaps."""
        return self.payments_per_year or self.compounding.per_year or 1

    @cached_property
    def quoted_flows(self) -> QuotedFlows:
        """The instruments quoted: what they pay and what they are worth.

        A par yield is restated with as many compounding periods a year as its bond has coupons; a swap rate
        is a rate of simple interest and stays as it is.

        Raises
        ------
        CurveError
            If a quote is not one, which `rows` names, or the curve is one that has no quotes.
        """
        if self.curve_kind is CurveKind.BONDS:
            return self.quoted_bonds
        if self.curve_kind not in _QUOTED:
            raise CurveError(f"a {self.curve_kind} curve has no quotes", "Choose another kind of curve.")
        if self.curve_kind is CurveKind.ZERO:
            return zero_flows(self.terms, continuous_quotes(self.rates, self.compounding))
        if self.curve_kind is CurveKind.SWAP:
            return swap_flows(self.terms, self.rates, payments_per_year=self.quote_payments)
        rates = self.rates
        if self.quote_payments != self.compounding.per_year:
            rates = continuous_quotes(rates, self.compounding)
            rates = from_continuous(rates, _periods(self.quote_payments))
        return par_flows(self.terms, rates, payments_per_year=self.quote_payments)

    @cached_property
    def quoted_bonds(self) -> QuotedFlows:
        """What the bonds of the curve pay and are worth, per 100 of nominal, in the order of the sheet.

        Raises
        ------
        CurveError
            If a bond is not one; `rows` names the bonds.
        """
        with _rows_of(_BONDS):
            return bond_quotes(self.bonds, valuation_date=self.valuation_date, day_count=self.day_count)

    @cached_property
    def curve(self) -> DiscountCurve:
        """The curve of the basis.

        A curve of bonds or quotes stops at the last liquid point, where there is one, and goes on as
        `extrapolation` says; a fitted or stated formula goes on by itself.

        Raises
        ------
        CurveError
            If what is stated gives no curve: what was found, what would mend it, and which quotes or
            bonds are at fault.
        """
        kind = self.curve_kind
        if kind in (CurveKind.NELSON_SIEGEL, CurveKind.SVENSSON, CurveKind.FLAT):
            if self.extrapolation is Extrapolation.SMITH_WILSON:
                raise CurveError(
                    f"a {kind} curve has no quotes from which it could go on by Smith-Wilson",
                    "Give bonds or rates by term, or take the other extrapolation.",
                )
            if kind is CurveKind.FLAT:
                return stated_flat_curve(self.flat_rate, compounding=self.compounding, name="flat rate")
            second = kind is CurveKind.SVENSSON
            return formula_curve(self.parameters, second_hump=second, compounding=self.compounding)
        if kind is CurveKind.BONDS:
            fit = self.curve_fit
            assert fit is not None
            return fit.curve
        if self.extrapolation is Extrapolation.SMITH_WILSON:
            return self._smith_wilson(self.quoted_flows)
        flows = self.quoted_flows
        used = len(flows) if self.last_liquid_point is None else len(flows.liquid(self.last_liquid_point))
        if kind is not CurveKind.ZERO:
            return bootstrap(flows.leading(used), interpolation=self.interpolation)
        flows.require_rising_terms()
        rates = to_continuous(self.rates[:used], self.compounding)
        return Curve(self.terms[:used], rates, self.interpolation)

    @cached_property
    def curve_fit(self) -> CurveFit | None:
        """The curve of bonds and how far each is from it; None where the curve is not one of bonds.

        Raises
        ------
        CurveError
            If the bonds give no curve; `rows` names them.
        """
        if self.curve_kind is not CurveKind.BONDS:
            return None
        flows = self.quoted_bonds
        assert self.bonds is not None
        with _rows_of(_BONDS):
            if self.extrapolation is Extrapolation.SMITH_WILSON:
                return exact_fit(
                    self.bonds, flows, self._smith_wilson, last_liquid_point=self.last_liquid_point
                )
            return bond_curve(
                self.bonds,
                flows,
                fit=self.bond_fit,
                interpolation=self.interpolation,
                last_liquid_point=self.last_liquid_point,
            )

    def _smith_wilson(self, flows: QuotedFlows) -> Curve:
        if self.ultimate_forward_rate is None:
            raise CurveError(
                "there is no ultimate forward rate", "Give it, or let the last forward rate go on."
            )
        return smith_wilson(
            flows,
            ultimate_forward_rate=self.ultimate_forward_rate,
            last_liquid_point=self.last_liquid_point,
            convergence_point=self.convergence_point,
            tolerance=self.convergence_tolerance,
        )

    @property
    def last_quoted_term(self) -> float | None:
        """The last term for which a quote or bond of the curve speaks [years].

        Beyond it the curve is extrapolated. None for a curve of parameters or one rate, which holds as it is
        stated for every term.

        Raises
        ------
        CurveError
            If the quotes give no curve.
        """
        if self.curve_kind not in (*_QUOTED, CurveKind.BONDS):
            return None
        fit = self.curve_fit
        if fit is not None:
            return float(self.quoted_bonds.term[fit.is_used].max())
        terms = self.quoted_flows.term
        if self.last_liquid_point is not None:
            terms = self.quoted_flows.liquid(self.last_liquid_point).term
        return float(terms.max())

    @cached_property
    def liability_curve(self) -> DiscountCurve:
        """What liabilities are discounted on, before any spread: `curve`, the corporate bonds' or a flat one.

        All the corporate bonds are used: the last liquid point and the extrapolation are those of `curve`.

        Raises
        ------
        CurveError
            If what is stated gives no curve; its words say that it is that of the liabilities.
        """
        if self.liability_method is LiabilityMethod.EXPECTED_RETURN:
            return stated_flat_curve(
                self.expected_return, compounding=Compounding.ANNUAL, name="expected return on the assets"
            )
        fit = self.liability_curve_fit
        return self.curve if fit is None else fit.curve

    @cached_property
    def liability_curve_fit(self) -> CurveFit | None:
        """The corporate bonds' curve and how far each bond is from it; None on any other liability basis.

        Raises
        ------
        CurveError
            If the bonds give no curve; `rows` names them.
        """
        if self.liability_method is not LiabilityMethod.CORPORATE_BONDS:
            return None
        flows = self.liability_bonds_quoted
        assert self.liability_bonds is not None
        with _rows_of(_LIABILITY_BONDS, prefix=True):
            return bond_curve(
                self.liability_bonds, flows, fit=self.liability_fit, interpolation=self.interpolation
            )

    @cached_property
    def liability_bonds_quoted(self) -> QuotedFlows:
        """What the corporate bonds pay and are worth; see `quoted_bonds`."""
        with _rows_of(_LIABILITY_BONDS, prefix=True):
            return bond_quotes(
                self.liability_bonds, valuation_date=self.valuation_date, day_count=self.day_count
            )

    def liability_spread_at(self, time: ArrayLike) -> FloatArray:
        """What liabilities are discounted at over `curve`, `liability_spread` included and before any beta.

        Parameters
        ----------
        time : array_like, shape (n,)
            [years], at least 0.

        Returns
        -------
        ndarray, shape (n,)
            Continuously compounded [1/year].

        Raises
        ------
        CurveError
            If what is stated gives no curve or no spreads.
        """
        times = np.asarray(time, dtype=np.float64)
        if self.liability_method is LiabilityMethod.CURVE:
            return np.full(times.shape, self.liability_spread)
        if self.liability_method is LiabilityMethod.TERM_SPREADS:
            require_spreads(self.liability_terms, self.liability_spreads)
            own = np.interp(times, self.liability_terms, self.liability_spreads)
        else:
            own = self.liability_curve.zero(times) - self.curve.zero(times)
        return np.asarray(own + self.liability_spread)


@contextmanager
def _rows_of(subject: str, *, prefix: bool = False) -> Iterator[None]:
    """Errors say of what their rows are rows; with `prefix` in their words too."""
    try:
        yield
    except CurveError as error:
        found = f"{subject}: {error.found}" if prefix else error.found
        raise CurveError(found, error.mend, rows=error.rows, subject=error.subject or subject) from error


def _periods(per_year: int) -> Compounding:
    """The compounding with so many periods a year."""
    for compounding in Compounding:
        if compounding.per_year == per_year:
            return compounding
    raise CurveError(f"{per_year} payments a year are none that quotes have", "Give 1, 2, 4 or 12.")
