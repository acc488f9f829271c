"""Cases of spoilt workbooks: what is done to a sound one, and the fault it must give."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from desk.book import Severity
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from tests.intake.books import Sheets, save
from tests.intake.further_books import wide_sheets

__all__ = ["GRAVE", "MILD", "Spoilt", "add", "check_spoilt", "drop", "read_spoilt"]

GRAVE, MILD = Severity.GRAVE, Severity.MILD


@dataclass(frozen=True)
class Spoilt:
    """A way of spoiling a sound workbook, and the fault it must give."""

    name: str
    spoil: Callable[[Sheets], object]
    place: str
    words: str
    severity: Severity = GRAVE
    start: Callable[[], Sheets] = field(default=wide_sheets)


def add(sheet: str, *row: Any) -> Callable[[Sheets], object]:
    """Add a row."""
    return lambda sheets: sheets[sheet].append(list(row))


def drop(sheet: str) -> Callable[[Sheets], object]:
    """Remove a sheet."""
    return lambda sheets: sheets.pop(sheet)


def read_spoilt(cases: Sequence[Spoilt], folder: Path) -> dict[str, Reading]:
    """What each case gives, read two at a time: most of it is waiting for a process to start."""

    def read(numbered: tuple[int, Spoilt]) -> tuple[str, Reading]:
        number, case = numbered
        sheets = case.start()
        case.spoil(sheets)
        return case.name, read_workbook(save(sheets, folder / f"{number}.xlsx"))

    with ThreadPoolExecutor(2) as pool:
        found = dict(pool.map(read, enumerate(cases)))
    assert len(found) == len(cases)
    return found


def check_spoilt(case: Spoilt, reading: Reading) -> None:
    """The fault stands at its place, once, and no grave one on another sheet."""
    listed = [str(fault) for fault in reading.faults]
    found = [fault for fault in reading.faults if fault.place == case.place and case.words in fault.found]
    assert len(found) == 1, listed
    assert found[0].severity is case.severity
    assert found[0].expected
    assert found[0].mend
    assert "\n" not in str(found[0])
    assert (reading.book is None) == (case.severity is GRAVE), listed
    assert all(fault.sheet == found[0].sheet for fault in reading.grave), listed
