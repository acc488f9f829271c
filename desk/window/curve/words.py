"""What the station Curve says: choices with their explanations, headings of its table."""

from __future__ import annotations

from desk.book import CurveKind
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import DayCount
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.picture import stated_as
from desk.window.parts.columns import Column
from desk.window.parts.fields import Choice

__all__ = [
    "COMPOUNDINGS",
    "CURVE_KINDS",
    "DAY_COUNTS",
    "EXTRAPOLATIONS",
    "HOW_TO_EDIT",
    "INTERPOLATIONS",
    "PAYMENTS",
    "QUOTE_COLUMNS",
]

CURVE_KINDS = (
    Choice(CurveKind.ZERO, "Zero rates", "Each quote is the rate of a single payment at its term."),
    Choice(CurveKind.PAR, "Par yields", "Each quote is the coupon at which a bond costs its nominal."),
    Choice(CurveKind.SWAP, "Swap rates", "Each quote is the fixed rate of a swap that is worth nothing."),
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
    Choice(compounding, str(compounding).capitalize(), f"The quotes are {stated_as(compounding)}.")
    for compounding in Compounding
)
DAY_COUNTS = (
    Choice(DayCount.ACT_365F, "Act/365 Fixed", "Actual days over 365."),
    Choice(DayCount.ACT_360, "Act/360", "Actual days over 360."),
    Choice(DayCount.ACT_ACT_ISDA, "Act/Act ISDA", "Actual days over those of each calendar year."),
    Choice(DayCount.THIRTY_360, "30/360", "Months of 30 days over 360, bond basis."),
    Choice(DayCount.THIRTY_E_360, "30E/360", "Months of 30 days over 360, European."),
)
QUOTE_COLUMNS = (
    Column("term", "Term", "years", "years", digits=None, tooltip="Time to maturity.", editable=True),
    Column(
        "rate",
        "Quoted rate",
        "% a year",
        "rate",
        digits=3,
        tooltip="The rate as the source states it.",
        editable=True,
    ),
    Column(
        "zero",
        "Continuous rate",
        "% a year",
        "rate",
        digits=4,
        tooltip="The zero rate at the term, compounded continuously.",
    ),
    Column(
        "discount",
        "Discount factor",
        "",
        "number",
        digits=6,
        tooltip="Value today of one unit due at the term.",
    ),
    Column(
        "forward",
        "Forward to next",
        "% a year",
        "rate",
        digits=4,
        tooltip="Continuous rate from this term to the next; at the last, the rate that goes on beyond it.",
    ),
)
HOW_TO_EDIT = (
    "Terms and rates can be typed over, and pasted over from a spreadsheet: terms in years, rates in "
    "percent. The curve follows at once."
)
