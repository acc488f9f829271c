"""The demo books as their cells have them, and what the commands print for them."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from dataclasses import dataclass
from datetime import date, datetime
from functools import cache
from pathlib import Path
from typing import Any

from openpyxl import load_workbook

__all__ = ["BOOKS", "ROOT", "SECOND", "Workbook", "as_date", "opened", "printed"]

ROOT = Path(__file__).resolve().parents[1]
SECOND = " on its second basis"
BOOKS = ("pension_fund", "life_insurer", "small_endowment")


@cache
def printed(book: str, command: str) -> dict[str, Any]:
    """What a command prints with ``--json``."""
    done = subprocess.run(
        [sys.executable, "-m", "desk", command, str(ROOT / "demo_books" / f"{book}.xlsx"), "--json"],
        cwd=ROOT,
        env={**os.environ, "PYTHONWARNINGS": "error"},
        capture_output=True,
        check=False,
        text=True,
        encoding="utf-8",
    )
    assert (done.returncode, done.stderr) == (0, "")
    found: dict[str, Any] = json.loads(done.stdout)
    return found


@dataclass(frozen=True)
class Workbook:
    """The cells of a book that a valuation needs."""

    basis: dict[str, Any]
    model: dict[str, Any]
    run: dict[str, Any]
    quotes: list[tuple[float, float]]
    liabilities: list[dict[str, Any]]
    holdings: list[dict[str, Any]]
    flows: list[dict[str, Any]]
    spreads: list[tuple[float, float]]
    inflation: list[tuple[float, float]]
    terms: list[dict[str, Any]]

    @property
    def today(self) -> date:
        """The valuation date."""
        return as_date(self.basis["Valuation date"])


@cache
def opened(book: str) -> Workbook:
    """The cells of a demo book, or of one at a path; with `SECOND` after it, those of its second basis."""
    path, is_second = book.removesuffix(SECOND), book.endswith(SECOND)
    file = load_workbook(ROOT / "demo_books" / f"{path}.xlsx", read_only=True, data_only=True)
    sheets = {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in file.worksheets}
    file.close()

    def table(name: str) -> list[dict[str, Any]]:
        headings, *rows = sheets.get(name, [()])
        names = [str(heading) for heading in headings]
        return [
            dict(zip(names, row, strict=False)) for row in rows if any(value is not None for value in row)
        ]

    def items(name: str) -> dict[str, Any]:
        return {row["Item"]: row["Value"] for row in table(name)}

    def pairs(name: str, second: str = "Rate") -> list[tuple[float, float]]:
        return [(float(row["Term"]), float(row[second])) for row in table(name)]

    def of_basis(name: str) -> str:
        return f"Second {name[0].lower()}{name[1:]}" if is_second else name

    basis = items("Basis")
    inflation = "Inflation"
    if is_second:
        # Date, currency and day count are those of the first basis; so is inflation, unless it is stated.
        shared = ["Valuation date", "Currency", "Day count"]
        if "Second inflation" in sheets:
            inflation = "Second inflation"
        else:
            shared += ["Inflation volatility", "Recent inflation"]
        basis = {item: basis[item] for item in shared if item in basis} | items("Second basis")
    return Workbook(
        basis=basis,
        model=items("Rates model"),
        run=items("Run"),
        quotes=pairs(of_basis("Curve")),
        liabilities=table("Liabilities"),
        holdings=table("Holdings"),
        flows=table("Asset flows"),
        spreads=pairs(of_basis("Liability spreads"), "Spread"),
        inflation=pairs(inflation),
        terms=table("Line terms"),
    )


def as_date(value: Any) -> date:
    """A date out of a cell."""
    assert isinstance(value, datetime)
    return value.date()
