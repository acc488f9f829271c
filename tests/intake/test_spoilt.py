"""Workbooks spoilt at random: the reading ends with faults, or with a book that can be used."""

from __future__ import annotations

import random
from datetime import date, datetime, time, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from desk.intake import workbook
from desk.intake.columns import Column, SheetColumns, pack_column
from desk.intake.faults import FaultList
from desk.intake.layout import SourceSheet
from desk.intake.source import Source
from desk.intake.workbook import read_workbook
from desk.scenarios.models import rate_model
from desk.valuation.standing import stand
from tests.intake.books import Rows, Sheets, sound_sheets

_VALUES: list[Any] = [
    *(None, 0, -1, 1, 1e308, -1e308, 5e-324, 2**60, float("inf"), "", " ", "x", "=1", "12,5", "1.234", " 7 "),
    *("TRUE", True, False, date(1900, 3, 1), date(9999, 12, 31), datetime(2030, 1, 1, 12), time(1)),
    *(timedelta(days=3), "2030-01-01", "2030-13-01", "fund", "bond", "zero", "deposit", "Rates", "Equity"),
    *("Name", "Item", "Value", "Seed", "gaussian-2", "cir", "cir-shifted", "vasicek", "ho-lee", "par"),
    *("cubic-zero", "monotone-convex", "continuous", "Beta", "Year", "x" * 50_000, "\x00", "50;5", "1 2"),
    *("1,,2", "nan", "inf", "1e400"),
]


def _spoil(rng: random.Random, sheets: Sheets) -> None:
    """Change one thing."""
    name = rng.choice(list(sheets))
    rows = sheets[name]
    way = rng.random()
    if way < 0.65 or not rows:
        row, column = rng.randrange(len(rows) + 1), rng.randrange(10)
        if row == len(rows):
            rows.append([])
        rows[row].extend([None] * (column + 1 - len(rows[row])))
        rows[row][column] = rng.choice(_VALUES)
    elif way < 0.75:
        rows.pop(rng.randrange(len(rows)))
    elif way < 0.83:
        rows.insert(rng.randrange(len(rows)), list(rng.choice(rows)))
    elif way < 0.87 and len(sheets) > 1:
        sheets.pop(name)
    elif way < 0.96:
        place = rng.randrange(10)
        for cells in rows:
            del cells[place : place + 1]
    else:
        rng.shuffle(rows)


def _source(rng: random.Random, name: str, rows: Rows) -> SourceSheet:
    width = max(map(len, rows), default=0)
    columns = [[row[place] if place < len(row) else None for row in rows] for place in range(width)]
    sheet = SourceSheet(
        SheetColumns(
            name,
            rng.random() < 0.05,
            len(rows),
            [Column.unpack(pack_column(cells), len(rows)) for cells in columns],
        )
    )
    if rng.random() < 0.2:
        sheet.broken = {rng.randrange(6): {rng.randrange(8): "the cell holds the error #N/A"}}
    if rng.random() < 0.1:
        sheet.hidden_rows, sheet.hidden_columns = [(0, 3)], [(0, 100)]
    return sheet


@pytest.mark.parametrize("seed", range(6))
def test_a_reading_ends_in_faults_or_in_a_usable_book(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    rng = random.Random(seed)
    usable = 0
    for _ in range(60):
        sheets = sound_sheets()
        for _ in range(rng.choice([1, 1, 2, 3, 6, 20])):
            _spoil(rng, sheets)
        sources = [_source(rng, name, rows) for name, rows in sheets.items()]

        def give(path: Path, faults: FaultList, sources: list[SourceSheet] = sources, **_: object) -> Source:
            faults.order_sheets([sheet.name for sheet in sources])
            return Source("0" * 64, sources)

        monkeypatch.setattr(workbook, "open_source", give)
        reading = read_workbook(Path("book.xlsx"))
        assert (reading.book is None) == bool(reading.grave), [str(fault) for fault in reading.faults]
        assert all(fault.found and fault.expected and fault.mend for fault in reading.faults)
        if reading.book is not None:
            usable += 1
            assert np.isfinite(stand(reading.book).liabilities.present_value)
            if reading.book.rates_model is not None:
                rate_model(reading.book)
    assert 0 < usable < 60
