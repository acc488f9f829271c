"""The sheets of the book workbook: their headings and items."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["SHEETS", "SheetLayout", "find_known", "fold", "heading_years", "looks_like_years"]

_UNITS = re.compile(r"\s*\((?:years?|a year|months?)\)\s*$", re.IGNORECASE)
_YEARS = re.compile(r"\s*(\d{1,12}(?:\.\d{1,25})?(?:e-?\d{1,2})?)\s*(?:y|years?|\(years?\))?\s*", re.I | re.A)
_LIKE_YEARS = re.compile(r"[^A-Za-z]*\d|\s*(?:t|y|term|node|year|tenor)\s*[=:._-]?\s*\d", re.I | re.A)


def fold(text: str) -> str:
    """`text` as headings, items and names of sheets are compared: without case and extra blanks."""
    return " ".join(text.split()).casefold()


def by_fold(names: Sequence[str]) -> dict[str, str]:
    """Names by what they are compared as."""
    return {fold(_UNITS.sub("", name)): name for name in names}


def known_heading(text: str, known: dict[str, str]) -> str | None:
    """The one of `known` (see `by_fold`) that `text` is."""
    return known.get(fold(_UNITS.sub("", text)))


def find_known(text: str, names: Sequence[str]) -> str | None:
    """The heading or item that `text` is, with or without its unit in brackets after it; None if none."""
    return known_heading(text, by_fold(names))


def heading_years(text: str) -> float | None:
    """The years that a heading states, as ``5``, ``0.25``, ``5Y`` or ``5 years``; None where it is no number.

    Examples
    --------
    >>> heading_years("10 years"), heading_years("Source")
    (10.0, None)
    """
    match = _YEARS.fullmatch(text)
    return None if match is None else float(match.group(1))


def looks_like_years(text: str) -> bool:
    """Whether a heading that states no years seems meant to: ``6M``, ``1,5``, ``t=3``."""
    return _LIKE_YEARS.match(text) is not None


@dataclass(frozen=True)
class SheetLayout:
    """What one sheet holds.

    Attributes
    ----------
    name : str
    columns : tuple of str
        Headings, in the order in which they are written.
    optional : frozenset of str
        Those that may be missing.
    items : tuple of str
        For a sheet of items and values, the items.
    needed : bool
        Whether the sheet must be there.
    more : bool
        Whether further columns may belong to the sheet (the correlation matrix).
    spread : bool
        Whether a value may go on in the columns without a heading (the percentiles).
    years : str
        Where further columns have years as their headings, what these are: "term" or "node"; else empty.
    """

    name: str
    columns: tuple[str, ...]
    optional: frozenset[str] = frozenset()
    items: tuple[str, ...] = ()
    needed: bool = False
    more: bool = False
    spread: bool = False
    years: str = ""

    @property
    def wanted(self) -> tuple[str, ...]:
        """What must be there, in words."""
        needed = [heading for heading in self.columns if heading not in self.optional]
        if "Year" in self.columns:
            needed.insert(1, "Date or Year")
        return (*needed, *self._of_years)

    @property
    def allowed(self) -> tuple[str, ...]:
        """What may be there, in words."""
        return (*self.columns, *self._of_years)

    @property
    def _of_years(self) -> tuple[str, ...]:
        return (f"one column a {self.years} with its years",) if self.years else ()


_PAIR = ("Item", "Value")
_BASIS = (
    *("Title", "Valuation date", "Currency", "Curve kind", "Compounding", "Interpolation"),
    *("Liability spread", "Market risk premium", "Day count", "Payments a year"),
    *("Beyond the last quote", "Ultimate forward rate", "Last liquid point"),
    *("Convergence point", "Convergence tolerance", "Bond fit"),
    *("Beta 0", "Beta 1", "Beta 2", "Beta 3", "Tau 1 (years)", "Tau 2 (years)", "Flat rate"),
    *("Liability basis", "Liability bond fit", "Expected return"),
    *("Inflation volatility", "Recent inflation", "Inflation interpolation"),
)
_BONDS = ("Name", "Maturity", "Coupon", "Frequency", "Price", "Price kind", "Yield")
_BOND_TERMS = frozenset({"Name", "Frequency", "Price", "Price kind", "Yield"})
_HOLDING_TERMS = (
    *("Day count", "Market value", "Units", "Duration"),
    *("Start date", "First coupon", "Ex-dividend days", "Bought ex-dividend", "Amortisation"),
    *("Price", "Price kind", "Discount rate", "Current rate", "Margin"),
    *("Floating frequency", "Floating day count", "Default rate", "Recovery rate"),
    *("Index lag (months)", "Index ratio", "Principal floor"),
)
"""Columns of the holdings that may be missing."""


def _basis_sheets(prefix: str) -> tuple[SheetLayout, ...]:
    """The sheets of one basis: "Curve" is "Second curve" for the second."""

    def name(text: str) -> str:
        return f"{prefix} {text.lower()}" if prefix else text

    return (
        SheetLayout(name("Basis"), _PAIR, items=_BASIS, needed=not prefix),
        SheetLayout(name("Curve"), ("Term", "Rate")),
        SheetLayout(name("Curve bonds"), _BONDS, _BOND_TERMS),
        SheetLayout(name("Liability bonds"), _BONDS, _BOND_TERMS),
        SheetLayout(name("Liability spreads"), ("Term", "Spread")),
        SheetLayout(name("Inflation"), ("Term", "Rate")),
    )


_LINE_TERMS = ("Indexation", "Rise", "Floor", "Cap", "Discount spread", "Discount rate")
_SHOCK_TERMS = ("Term", "Applies to", "Source", "Compounding", "Set")
_QUOTED = ("Instrument", "Expiry", "Length", "Strike", "Volatility", "Kind", "Shift", "Frequency")

SHEETS: dict[str, SheetLayout] = {
    layout.name: layout
    for layout in (
        *_basis_sheets(""),
        *_basis_sheets("Second"),
        SheetLayout(
            "Liabilities",
            ("Line", "Date", "Year", "Amount", "Beta"),
            frozenset({"Date", "Year", "Beta"}),
            needed=True,
        ),
        SheetLayout(
            "Holdings",
            (
                *("Name", "Kind", "Nominal", "Coupon", "Frequency", "Maturity"),
                *_HOLDING_TERMS,
            ),
            frozenset(_HOLDING_TERMS),
        ),
        SheetLayout("Asset flows", ("Line", "Date", "Year", "Amount"), frozenset({"Date", "Year"})),
        SheetLayout("Line terms", ("Side", "Line", *_LINE_TERMS), frozenset({"Side", *_LINE_TERMS})),
        SheetLayout(
            "Shocks",
            ("Shock", "Move", "Size", *_SHOCK_TERMS),
            frozenset(_SHOCK_TERMS),
        ),
        SheetLayout("Shock settings", _PAIR, items=("Sets", "Thresholds"), spread=True),
        SheetLayout(
            "Rates model",
            _PAIR,
            items=(
                *("Model", "Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
                *("Second mean reversion", "Second volatility", "Factor correlation", "Risk price"),
                *("Second risk price", "Inflation mean reversion", "Inflation factor volatility"),
                *("Inflation rate correlation", "Inflation risk price", "Mend correlation"),
            ),
        ),
        SheetLayout(
            "Risky assets",
            ("Name", "Value", "Premium", "Volatility", "Dividend yield", "Rates"),
            frozenset({"Dividend yield"}),
            more=True,
        ),
        SheetLayout(
            "Run",
            _PAIR,
            items=(
                *("Paths", "Horizon (years)", "Steps a year", "Seed", "Measure", "Percentiles"),
                *("Sampling", "Bridge", "Moment matching", "Replicates"),
            ),
            spread=True,
        ),
        SheetLayout("History", ("Date", "Short rate")),
        SheetLayout("Yield history", ("Date",), years="term"),
        SheetLayout("Volatilities", _QUOTED, frozenset({"Length", "Strike", "Kind", "Shift", "Frequency"})),
        SheetLayout("Scenario set", ("Path",), frozenset({"Path"}), years="node"),
    )
}
