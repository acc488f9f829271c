"""Sound workbooks with the sheets that a book may have beside the usual ones."""

from __future__ import annotations

from datetime import date
from typing import Any

from tests.intake.books import Rows, Sheets, sound_sheets

__all__ = ["bond_rows", "by_bonds", "by_formula", "wide_sheets", "with_items"]


def bond_rows() -> Rows:
    """Bonds near one curve."""
    return [
        ["Name", "Maturity", "Coupon", "Frequency", "Price", "Price kind", "Yield"],
        *(
            [f"State {year}", date(year, 5, 15), 0.02 + 0.001 * place, 2, 99.0 + place, "clean", None]
            for place, year in enumerate((2028, 2030, 2032, 2036, 2041, 2046))
        ),
        ["Strip 2051", date(2051, 5, 15), 0, 1, None, None, 0.03],
    ]


def with_items(rows: Rows, **items: Any) -> Rows:
    """Rows of items with some set, added or, if None, taken away; `_` stands for a blank."""
    stated = {name.replace("_", " "): value for name, value in items.items()}
    kept = [[row[0], stated.get(row[0], row[1])] for row in rows]
    kept += [[name, value] for name, value in stated.items() if name not in {row[0] for row in rows}]
    return [row for row in kept if row[1] is not None]


def wide_sheets() -> Sheets:
    """A book with two bases, expected inflation, terms of lines, shocks and market data."""
    sheets = sound_sheets()
    sheets["Basis"] = with_items(sheets["Basis"], Liability_basis="spread by term", Inflation_volatility=0.01)
    sheets |= {
        "Liability spreads": [["Term", "Spread"], [0, 0.004], [10, 0.006]],
        "Inflation": [["Term", "Rate"], [1, 0.025], [30, 0.02]],
        "Second basis": [
            ["Item", "Value"],
            ["Curve kind", "flat"],
            ["Compounding", "annual"],
            ["Flat rate", 0.03],
            ["Liability spread", 0],
            ["Liability basis", "corporate bonds"],
            ["Liability bond fit", "nelson-siegel"],
        ],
        "Second liability bonds": bond_rows(),
        "Line terms": [
            ["Side", "Line", "Indexation", "Rise", "Floor", "Cap", "Discount spread", "Discount rate"],
            [None, "Pensioners", "collared", None, 0, 0.05, 0.001, None],
            ["liabilities", "Deferred", "rising", 0.02, None, None, None, 0.03],
            ["assets", "Rents", "linked", None, None, None, None, None],
        ],
        "Shocks": [
            ["Shock", "Move", "Size", "Term", "Applies to", "Source"],
            ["Steeper", "rate", -50, 1, None, "own"],
            ["Steeper", "rate", 50, 20, None, None],
            ["Crash", "value", -0.39, None, "fund", None],
            ["Crash", "spread", 100, None, "State 2% 2036", None],
            ["Longer lives", "amount", 0.05, None, "Pensioners", None],
        ],
        "Shock settings": [["Item", "Value"], ["Sets", "one; two"], ["Thresholds", "1.1; 1.0"]],
        "Volatilities": [
            ["Instrument", "Expiry", "Length", "Strike", "Volatility", "Kind", "Shift", "Frequency"],
            ["payer swaption", 5, 10, None, 0.0065, "normal", None, 1],
            ["cap", 7, None, 0.03, 0.25, "lognormal", 0.01, 4],
        ],
        "Yield history": [
            ["Date", 1, "5Y", "10 years"],
            [date(2026, 7, 31), 0.02, 0.025, 0.03],
            [date(2026, 8, 31), 0.021, 0.026, 0.031],
        ],
        "Scenario set": [["Path", 1, 2, 5], [1, 0.02, 0.021, 0.03], [2, 0.01, 0.015, 0.02]],
    }
    return sheets


def by_bonds(**items: Any) -> Sheets:
    """A book whose curve is drawn through bonds."""
    sheets = sound_sheets()
    del sheets["Curve"]
    sheets["Basis"] = with_items(sheets["Basis"], Curve_kind="bonds", **items)
    return sheets | {"Curve bonds": bond_rows()}


def by_formula(kind: str, **items: Any) -> Sheets:
    """A book whose curve is a formula with its parameters, or one rate."""
    sheets = sound_sheets()
    del sheets["Curve"]
    stated: dict[str, Any] = {"Beta 0": 0.03, "Beta 1": -0.01, "Beta 2": 0.005, "Tau 1 (years)": 2}
    if kind == "svensson":
        stated |= {"Beta 3": 0.004, "Tau 2 (years)": 9}
    if kind == "flat":
        stated = {"Flat rate": 0.03}
    sheets["Basis"] = with_items(sheets["Basis"], Curve_kind=kind, **(stated | items))
    return sheets
