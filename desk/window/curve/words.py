"""What the station Curve says: the choices of its form, each with its explanation."""

from __future__ import annotations

from desk.book import BondFit, CurveKind, LiabilityMethod
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from desk.rates.smith_wilson import Extrapolation
from desk.window.parts.fields import Choice

__all__ = [
    "BOND_FITS",
    "COMPOUNDINGS",
    "CURVE_KINDS",
    "DAY_COUNTS",
    "EXTRAPOLATIONS",
    "INTERPOLATIONS",
    "LIABILITY_METHODS",
    "PAYMENTS",
    "SHOWN_AS",
    "stated_as",
]


def stated_as(compounding: Compounding) -> str:
    """How rates are stated, after a unit: ``compounded annually``, ``compounded continuously``."""
    return {
        Compounding.ANNUAL: "compounded annually",
        Compounding.SEMI_ANNUAL: "compounded semi-annually",
        Compounding.QUARTERLY: "compounded quarterly",
        Compounding.MONTHLY: "compounded monthly",
        Compounding.CONTINUOUS: "compounded continuously",
    }[compounding]


SHOWN_AS = (
    Choice("quoted", "As quoted", "Of pictures and tables only: as the quotes are stated."),
    Choice("continuous", "Continuous", "Of pictures and tables only: compounded continuously."),
)
CURVE_KINDS = (
    Choice(CurveKind.ZERO, "Zero rates", "Each quote is the rate of a single payment at its term."),
    Choice(CurveKind.PAR, "Par yields", "Each quote is the coupon at which a bond costs its nominal."),
    Choice(CurveKind.SWAP, "Swap rates", "Each quote is the fixed rate of a swap worth nothing today."),
    Choice(CurveKind.BONDS, "Bonds", "A sheet of bonds with their prices or yields."),
    Choice(
        CurveKind.NELSON_SIEGEL,
        "Nelson-Siegel parameters",
        "A level, a slope and one bend, as central banks publish them.",
    ),
    Choice(CurveKind.SVENSSON, "Svensson parameters", "A level, a slope and two bends."),
    Choice(CurveKind.FLAT, "One flat rate", "The same rate for every term."),
)
BOND_FITS = (
    Choice(
        BondFit.EXACT,
        "Exact",
        "Every bond is repriced: each needs its own maturity, and noise in prices shows in the forwards.",
    ),
    Choice(
        BondFit.NELSON_SIEGEL,
        "Smooth: Nelson-Siegel",
        "The nearest curve of four parameters, each bond weighted by the inverse of its duration.",
    ),
    Choice(
        BondFit.SVENSSON,
        "Smooth: Svensson",
        "The nearest curve of six parameters, each bond weighted by the inverse of its duration.",
    ),
)
LIABILITY_METHODS = (
    Choice(LiabilityMethod.CURVE, "The curve of the basis", "With the liability spread below."),
    Choice(
        LiabilityMethod.TERM_SPREADS,
        "The curve and a spread by term",
        "Spreads are joined by lines and flat outside their terms; the liability spread is added.",
    ),
    Choice(
        LiabilityMethod.CORPORATE_BONDS,
        "High-quality corporate bonds",
        "A curve of its own through a sheet of bonds, as accounting standards ask; the liability spread is "
        "added.",
    ),
    Choice(
        LiabilityMethod.EXPECTED_RETURN,
        "The expected return on assets",
        "One flat rate; the liability spread is added.",
    ),
)
PAYMENTS = (
    Choice(None, "As compounded", "As often as the quotes are compounded; once a year if continuously."),
    Choice(1, "Once a year", "Coupons or fixed payments once a year."),
    Choice(2, "Twice a year", "Coupons or fixed payments twice a year."),
    Choice(4, "Four times a year", "Coupons or fixed payments four times a year."),
    Choice(12, "Twelve times a year", "Coupons or fixed payments every month."),
)
EXTRAPOLATIONS = (
    Choice(Extrapolation.FLAT_FORWARD, "The last forward rate goes on", "The forward rate stays as it is."),
    Choice(
        Extrapolation.SMITH_WILSON,
        "Smith-Wilson",
        "The forward rate comes to the ultimate one at the convergence point. The same method draws the "
        "curve between the quotes.",
    ),
)
INTERPOLATIONS = (
    Choice(
        Interpolation.LOG_LINEAR,
        "Log-linear on discount factors",
        "Between two terms the forward rate is flat: it moves in steps, and never swings.",
    ),
    Choice(
        Interpolation.LINEAR_ZERO,
        "Linear on zero rates",
        "Straight lines between the zero rates: simple, but the forward rate jumps at the terms.",
    ),
    Choice(
        Interpolation.CUBIC_ZERO,
        "Cubic spline on zero rates",
        "A smooth line through the zero rates: the forward rate is smooth too, but it can swing.",
    ),
    Choice(
        Interpolation.MONOTONE_CONVEX,
        "Monotone convex",
        "Forward rates without jumps that stay positive where the quotes allow it.",
    ),
)
COMPOUNDINGS = tuple(
    Choice(compounding, str(compounding).capitalize(), f"The rates are {stated_as(compounding)}.")
    for compounding in Compounding
)
DAY_COUNTS = (
    Choice(DayCount.ACT_365F, "Act/365 Fixed", "Actual days over 365."),
    Choice(DayCount.ACT_360, "Act/360", "Actual days over 360."),
    Choice(DayCount.ACT_ACT_ISDA, "Act/Act ISDA", "Actual days over those of each calendar year."),
    Choice(DayCount.THIRTY_360, "30/360", "Months of 30 days over 360, bond basis."),
    Choice(DayCount.THIRTY_E_360, "30E/360", "Months of 30 days over 360, European."),
)
