"""Bases, expected inflation and the comparison of two bases as plain-text tables."""

from __future__ import annotations

import numpy as np

from desk.book import Basis, Book
from desk.book.curve_source import CurveBonds
from desk.rates.fitting import CurveFit
from desk.report.text_tables import grouped, percent, printable, table, wrapped
from desk.report.wording import MEASURES, SIDE_NAMES, liability_words, within_a_sentence
from desk.valuation.records import InflationStanding, Standing

__all__ = ["basis_text", "comparison_text", "inflation_text"]

WORST_SHOWN = 5
LONGEST_NAME = 32


def basis_text(book: Book, standing: Standing) -> str:
    """The curve and what liabilities are discounted on."""
    basis = book.basis
    lines = [
        wrapped(f"Curve: {basis.curve_kind}. Liabilities are discounted on {liability_words(basis)}."),
        "Single equivalent rate of the liabilities: "
        f"{percent(standing.liabilities.equivalent_rate)} % a year.",
    ]
    for name, fit, bonds in _fits(basis):
        lines.append(
            f"{name}: {len(bonds):,} bonds, root mean square {grouped(fit.rmse_bp, 2)} and largest "
            f"{grouped(fit.largest_bp, 2)} basis points away; the farthest:"
        )
        worst = np.argsort(-np.abs(fit.residual_bp), kind="stable")[:WORST_SHOWN].tolist()
        rows = [
            (
                printable(bonds.names[row])[:LONGEST_NAME] or f"bond {row + 1}",
                grouped(float(fit.residual_bp[row]), 2),
                "yes" if fit.is_used[row] else "no",
            )
            for row in worst
        ]
        lines.append(table(("Bond", "Residual\n[basis points]", "Used"), rows))
    return "\n".join(lines)


def _fits(basis: Basis) -> list[tuple[str, CurveFit, CurveBonds]]:
    """The curves of bonds."""
    found = []
    for name, fit, bonds in (
        ("Curve", basis.curve_fit, basis.bonds),
        ("Corporate bonds", basis.liability_curve_fit, basis.liability_bonds),
    ):
        if fit is not None and bonds is not None:
            found.append((name, fit, bonds))
    return found


def inflation_text(inflation: InflationStanding, currency: str) -> str:
    """How both sides follow expected inflation."""
    rows = [
        (
            "Inflation duration",
            "years",
            grouped(inflation.assets_duration, 3),
            grouped(inflation.liabilities_duration, 3),
            grouped(inflation.real_duration_gap, 3),
        ),
        (
            "Inflation DV01, the rise for +1 bp",
            currency,
            grouped(inflation.dv01_assets),
            grouped(inflation.dv01_liabilities),
            grouped(inflation.dv01_gap),
        ),
    ]
    head = table(("Expected inflation", "Unit", "Assets", "Liabilities", "Gap"), rows, left=2)
    gap = inflation.key_dv01_assets - inflation.key_dv01_liabilities
    keys = [
        (
            f"{term:g}",
            grouped(float(inflation.key_dv01_assets[row])),
            grouped(float(inflation.key_dv01_liabilities[row])),
            grouped(float(gap[row])),
        )
        for row, term in enumerate(inflation.term.tolist())
    ]
    unit = f"\n[{currency}]"
    headings = ("Key rate\n[years]", f"Inflation DV01 assets{unit}", f"liabilities{unit}", f"gap{unit}")
    return f"{head}\n\n{table(headings, keys, left=0)}"


def comparison_text(first: Standing, second: Standing, second_book: Book | None, currency: str) -> str:
    """The main figures on both bases, and the first less the second."""
    rows = []

    def add(label: str, unit: str, one: float, other: float, places: int) -> None:
        show = percent if unit.startswith("%") else grouped
        rows.append((label, unit, show(one, places), show(other, places), show(one - other, places)))

    for side, of_first, of_second in (
        ("assets", first.assets, second.assets),
        ("liabilities", first.liabilities, second.liabilities),
    ):
        name = next(words for key, words in SIDE_NAMES.items() if key.value == side)
        for wording in MEASURES:
            unit = currency if wording.unit == "currency" else wording.unit
            add(
                f"{name}: {within_a_sentence(wording.label)}",
                unit,
                getattr(of_first, wording.name),
                getattr(of_second, wording.name),
                0 if wording.kind == "money" else 3,
            )
    add("Surplus", currency, first.surplus, second.surplus, 0)
    add("Funding ratio", "%", first.funding_ratio, second.funding_ratio, 2)
    add("Duration gap", "years", first.duration_gap, second.duration_gap, 3)
    add("DV01 gap", currency, first.dv01_gap, second.dv01_gap, 0)
    headings = ("Two bases", "Unit", "First", "Second", "First less second")
    words = ""
    if second_book is not None:
        words = "\n" + wrapped(
            f"On the second basis liabilities are discounted on {liability_words(second_book.basis)}; "
            f"curve: {second_book.basis.curve_kind}."
        )
    return table(headings, rows, left=2) + words
