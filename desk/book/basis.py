"""The basis: the date, the curve and the premiums a book is valued on."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date
from enum import StrEnum
from functools import cached_property

import numpy as np

from desk.book.arrays import FloatArray, owned_floats, same_fields
from desk.book.curve_source import BondFit, CurveBonds, CurveParameters
from desk.book.inflation import Inflation
from desk.rates.bootstrap import bootstrap
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.curve import Curve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.day_count import TIME_COUNTS, DayCount
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.quotes import par_flows, swap_flows, zero_flows
from desk.rates.smith_wilson import Extrapolation, smith_wilson

__all__ = ["Basis", "CurveKind", "LiabilityMethod"]


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
        ValueError
            If a quote is not one: a `desk.rates.curve_error.CurveError`, which names the quotes.
        """
        if self.curve_kind is CurveKind.ZERO:
            return zero_flows(self.terms, to_continuous(self.rates, self.compounding))
        if self.curve_kind is CurveKind.SWAP:
            return swap_flows(self.terms, self.rates, payments_per_year=self.quote_payments)
        rates = self.rates
        if self.quote_payments != self.compounding.per_year:
            rates = from_continuous(to_continuous(rates, self.compounding), _periods(self.quote_payments))
        return par_flows(self.terms, rates, payments_per_year=self.quote_payments)

    @cached_property
    def curve(self) -> Curve:
        """The curve the quotes give.

        Raises
        ------
        ValueError
            If the quotes give no curve: the message says which and why. A `desk.rates.curve_error.CurveError`
            also numbers them.
        """
        if self.extrapolation is Extrapolation.SMITH_WILSON:
            if self.ultimate_forward_rate is None:
                raise CurveError(
                    "there is no ultimate forward rate", "Give it, or let the last forward rate go on."
                )
            return smith_wilson(
                self.quoted_flows,
                ultimate_forward_rate=self.ultimate_forward_rate,
                last_liquid_point=self.last_liquid_point,
                convergence_point=self.convergence_point,
                tolerance=self.convergence_tolerance,
            )
        used = self.terms.size
        if self.last_liquid_point is not None:
            used = len(self.quoted_flows.liquid(self.last_liquid_point))
        if self.curve_kind is CurveKind.ZERO:
            rates = to_continuous(self.rates[:used], self.compounding)
            return Curve(self.terms[:used], rates, self.interpolation)
        return bootstrap(self.quoted_flows.leading(used), interpolation=self.interpolation)


def _periods(per_year: int) -> Compounding:
    """The compounding with so many periods a year."""
    for compounding in Compounding:
        if compounding.per_year == per_year:
            return compounding
    raise CurveError(f"{per_year} payments a year are none that quotes have", "Give 1, 2, 4 or 12.")
