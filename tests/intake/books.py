"""A sound book workbook as plain rows, to be spoilt one way or another."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any

from openpyxl import Workbook

__all__ = ["Rows", "Sheets", "save", "sound_sheets"]

Rows = list[list[Any]]
Sheets = dict[str, Rows]


def sound_sheets() -> Sheets:
    """Every sheet of a book workbook without a fault."""
    return {
        "Basis": [
            ["Item", "Value"],
            ["Title", "Test book"],
            ["Valuation date", date(2026, 9, 30)],
            ["Currency", "EUR"],
            ["Curve kind", "zero"],
            ["Compounding", "annual"],
            ["Interpolation", "log-linear"],
            ["Liability spread", 0.005],
            ["Market risk premium", 0.03],
            ["Day count", "Act/365F"],
        ],
        "Curve": [["Term", "Rate"], [1, 0.02], [5, 0.025], [10, 0.028], [30, 0.03]],
        "Liabilities": [
            ["Line", "Date", "Amount", "Beta"],
            ["Pensioners", date(2027, 9, 30), 1000.5, None],
            ["Deferred", date(2040, 9, 30), 2000, 0.2],
            ["Pensioners", date(2050, 9, 30), 900, None],
        ],
        "Holdings": [
            [
                *("Name", "Kind", "Nominal", "Coupon", "Frequency", "Maturity"),
                *("Day count", "Market value", "Units", "Duration"),
            ],
            ["State 2% 2036", "bond", 1000, 0.02, 2, date(2036, 5, 15), "30/360", 950.25, None, None],
            ["Strip 2040", "zero", 500, None, None, date(2040, 1, 15), None, None, None, None],
            ["Cash", "deposit", 250, None, None, None, None, None, None, None],
            ["Equity fund", "fund", None, None, None, None, None, 800, 40, 2.5],
        ],
        "Asset flows": [["Line", "Year", "Amount"], ["Rents", 1.5, 60], ["Rents", 2.5, 60]],
        "Rates model": [
            ["Item", "Value"],
            ["Model", "hull-white"],
            ["Mean reversion", 0.05],
            ["Volatility", 0.009],
            ["Risk price", -0.1],
        ],
        "Risky assets": [
            ["Name", "Value", "Premium", "Volatility", "Dividend yield", "Equity", "Property", "Rates"],
            ["Equity", 500, 0.04, 0.16, 0.02, 1, 0.5, 0.1],
            ["Property", 300, 0.03, 0.12, None, 0.5, 1, -0.1],
        ],
        "Run": [
            ["Item", "Value"],
            ["Paths", 2000],
            ["Horizon (years)", 20],
            ["Steps a year", 12],
            ["Seed", 7],
            ["Measure", "real-world"],
            ["Percentiles", "1; 5; 50; 95; 99"],
        ],
        "History": [
            ["Date", "Short rate"],
            [date(2026, 7, 31), 0.021],
            [date(2026, 8, 31), 0.0205],
            [date(2026, 9, 30), 0.02],
        ],
    }


def save(sheets: Sheets, path: Path) -> Path:
    """Write the rows as a workbook."""
    workbook = Workbook()
    workbook.remove(workbook.worksheets[0])
    for name, rows in sheets.items():
        sheet = workbook.create_sheet(name)
        for row in rows:
            sheet.append(row)
    workbook.save(path)
    workbook.close()
    return path
