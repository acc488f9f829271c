"""Faults that the reading has told by cell are not told again for the whole."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest

from desk.book import Fault, Severity
from desk.intake.workbook import read_workbook
from desk.report.said_once import further_faults
from desk.valuation.standing import stand
from tests.intake.books import save


def _book(path: Path, terms: list[list[object]]) -> Path:
    return save(
        {
            "Basis": [
                ["Item", "Value"],
                ["Valuation date", date(2026, 6, 30)],
                ["Currency", "EUR"],
                ["Curve kind", "flat"],
                ["Flat rate", 0.03],
                ["Compounding", "annual"],
                ["Liability spread", 0.0],
            ],
            "Liabilities": [["Line", "Year", "Amount"], ["Pensions", 5.0, 100.0], ["It's", 6.0, 100.0]],
            "Line terms": [["Line", "Indexation"], *terms],
        },
        path,
    )


@pytest.mark.parametrize(
    "terms",
    [[["Pension", "fixed"]], [["Pensions", "linked"]], [["It's", "collared"], ["Nobody's", "fixed"]]],
)
def test_terms_of_lines_are_told_once(tmp_path: Path, terms: list[list[object]]) -> None:
    """What the cells of the sheet were told for, the standing does not say again."""
    reading = read_workbook(_book(tmp_path / "book.xlsx", terms))
    assert reading.book is not None
    found = stand(reading.book).faults
    assert found
    assert further_faults(reading.faults, found) == ()


def test_what_the_cells_did_not_say_is_kept() -> None:
    """A book that was edited has faults of its own."""
    new = Fault(
        "terms for a line 'Other'",
        "a line of the sheet Liabilities",
        "Mend it.",
        "Line terms",
        "",
        Severity.MILD,
    )
    told = Fault(
        'no flows of the liabilities are of the line "Pension"',
        "a name",
        "Mend.",
        "Line terms",
        "A2",
        Severity.MILD,
    )
    assert further_faults([told], [new]) == (new,)
