"""The columns of the tables of the station Curve."""

from __future__ import annotations

from desk.rates.compounding import Compounding
from desk.window.curve.words import stated_as
from desk.window.parts.columns import Column

__all__ = [
    "BOND_COLUMNS",
    "HOW_BONDS",
    "HOW_INFLATION",
    "HOW_QUOTES",
    "HOW_SPREADS",
    "INFLATION_COLUMNS",
    "QUOTE_COLUMNS",
    "SPREAD_COLUMNS",
    "rates_columns",
]

_TERM = Column("term", "Term", "years", "years", digits=None, tooltip="Time to maturity.", editable=True)
_DISCOUNT = Column(
    "discount", "Discount factor", kind="number", digits=6, tooltip="Value today of one unit due at the term."
)
QUOTE_COLUMNS = (
    _TERM,
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
    _DISCOUNT,
    Column(
        "forward",
        "Forward to next",
        "% a year",
        "rate",
        digits=4,
        tooltip="Continuous rate from this term to the next; at the last, the rate that goes on beyond it.",
    ),
)
SPREAD_COLUMNS = (
    _TERM,
    Column(
        "rate",
        "Spread",
        "% a year",
        "rate",
        digits=3,
        tooltip="Over the curve of the basis, compounded continuously.",
        editable=True,
    ),
    Column(
        "zero",
        "Rate with it",
        "% a year",
        "rate",
        digits=4,
        tooltip="Continuous zero rate at which liabilities are discounted, with the liability spread.",
    ),
    _DISCOUNT,
    Column(
        "forward",
        "Forward to next",
        "% a year",
        "rate",
        digits=4,
        tooltip="Continuous rate from this term to the next, with the spreads.",
    ),
)
INFLATION_COLUMNS = (
    _TERM,
    Column(
        "rate",
        "Expected inflation",
        "% a year",
        "rate",
        digits=3,
        tooltip="Zero-coupon inflation swap or break-even rate, compounded once a year.",
        editable=True,
    ),
    Column(
        "zero",
        "Continuous rate",
        "% a year",
        "rate",
        digits=4,
        tooltip="The same, compounded continuously.",
    ),
    Column("discount", "Price index", "today 1", "number", digits=4, tooltip="Expected at the term."),
    Column(
        "forward",
        "Forward to next",
        "% a year",
        "rate",
        digits=4,
        tooltip="Continuous inflation expected from this term to the next; at the last, beyond it.",
    ),
)
BOND_COLUMNS = (
    Column("name", "Bond", tooltip="Any name; a fault is told by it.", editable=True),
    Column("maturity", "Maturity", kind="date", tooltip="Day of the last payment.", editable=True),
    Column("coupon", "Coupon", "% a year", "rate", digits=3, tooltip="0 for none.", editable=True),
    Column(
        "frequency",
        "Times",
        "a year",
        "integer",
        tooltip="1, 2, 4 or 12; without coupons, the compounding of the yield.",
        editable=True,
    ),
    Column(
        "price",
        "Price",
        "per 100",
        "number",
        digits=3,
        tooltip="As quoted, or as it follows from the yield. A price typed in takes the place of the yield.",
        editable=True,
    ),
    Column(
        "price_kind",
        "Price is",
        tooltip="clean: without accrued interest (Act/Act ICMA); dirty: with it.",
        editable=True,
    ),
    Column(
        "yield",
        "Yield",
        "% a year",
        "rate",
        digits=3,
        tooltip="As quoted, or as it follows from the price; compounded as often as coupons are paid. A "
        "yield typed in takes the place of the price.",
        editable=True,
    ),
    Column(
        "fitted",
        "Fitted",
        "% a year",
        "rate",
        digits=3,
        tooltip="The yield at the bond's value on the curve.",
    ),
    Column(
        "misfit_bp",
        "Misfit",
        "bp",
        "number",
        digits=2,
        tooltip="Fitted yield less quoted yield, both continuous: above 0 the curve finds the bond dear.",
        is_change=True,
    ),
    Column(
        "misfit_price",
        "Misfit",
        "per 100",
        "number",
        digits=3,
        tooltip="Value on the curve less the quoted value.",
        is_change=True,
    ),
    Column("given", "Given", tooltip="Which of price and yield the source states; the other follows."),
)
HOW_QUOTES = "Terms in years and rates in percent can be typed over and pasted; the curve follows at once."
HOW_SPREADS = "Terms in years and spreads in percent can be typed over and pasted; the curve follows at once."
HOW_INFLATION = (
    "Terms in years and rates in percent can be typed over and pasted; indexed lines follow at once."
)
HOW_BONDS = (
    "Paste rows of name, maturity, coupon, coupons a year, price, clean or dirty, yield; with headings in "
    "any order."
)


def rates_columns(compounding: Compounding, *, is_index: bool, compared: str) -> tuple[Column, ...]:
    """Of the table of rates by term; `compared` names the other curve, empty for none."""
    unit = f"%, {stated_as(compounding).removeprefix('compounded ')}"
    columns = [
        Column("term", "Term", "years", "years", digits=2),
        Column("zero", "Zero rate", unit, "rate", digits=4, tooltip="From today to the term."),
        Column("continuous", "Continuous", "% a year", "rate", digits=4, tooltip="The same, continuous."),
        Column(
            "forward",
            "Forward",
            unit,
            "rate",
            digits=4,
            tooltip="From the term before this one, or today, to this one.",
        ),
        Column("discount", "Price index" if is_index else "Discount factor", kind="number", digits=6),
        Column(
            "beyond",
            "Extrapolated",
            kind="flag",
            tooltip="Whether the term lies beyond the last quote.",
        ),
    ]
    if compared:
        columns += [
            Column(
                "other", compared, unit, "rate", digits=4, tooltip="Zero rate of the curve compared with."
            ),
            Column(
                "difference",
                "Difference",
                "bp",
                "number",
                digits=2,
                tooltip="This curve's zero rate less the other's.",
                is_change=True,
            ),
        ]
    return tuple(columns)
