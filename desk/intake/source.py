"""A file into sheets of columns, or into one clear fault."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from desk.intake.columns import Column, SheetColumns
from desk.intake.faults import FaultList
from desk.intake.layout import SourceSheet
from desk.intake.processes import Answer, Limits, ask

__all__ = ["Source", "open_source"]

_MOST_BYTES = 1 << 30
_SIDE_BY_SIDE_BYTES = 1 << 20
"""From this size on, a second process costs less than it saves."""
_SPARSE_CELLS = 20_000_000
"""A sheet that spans more cells than this and is not read has a cell far from the others."""
_SAVE = "Open it in a spreadsheet program and save it again as .xlsx."
_WORKBOOK = "a book workbook (.xlsx)"
_REFUSALS: dict[str, tuple[str, str]] = {
    "empty": ("the file is empty", "Choose another file; this one may not have been copied whole."),
    "unknown": ("the file is no spreadsheet", "Choose a workbook, or save this one as .xlsx first."),
    "corrupt": ("the file is damaged and cannot be read", _SAVE),
    "password": (
        "the file is locked by a password or encrypted",
        "Open it in a spreadsheet program, take the password off and save it.",
    ),
    "bomb": (
        "the file is packed in a way that no honest workbook is",
        "Do not trust it. If you made it yourself, save it again as .xlsx.",
    ),
    "entities": (
        "the file declares a document type of its own, as no honest workbook does",
        "Do not trust it. If you made it yourself, save it again as .xlsx.",
    ),
    "time": (
        "reading the file took too long and was stopped",
        "Remove what does not belong to the book from it.",
    ),
    "crash": ("reading the file ended before its end", _SAVE),
    "memory": (
        "reading the file needs more memory than it may take",
        "Delete the rows and columns around the data (delete, not clear), save the workbook and try again.",
    ),
}


@dataclass(frozen=True)
class Source:
    """What a file holds.

    Attributes
    ----------
    sha256 : str
        Of its bytes; empty where it could not be read.
    sheets : list of SourceSheet
        Empty where the file was refused.
    """

    sha256: str
    sheets: list[SourceSheet]


def open_source(
    path: Path, faults: FaultList, *, limits: Limits, watch: Callable[[float], object] | None = None
) -> Source:
    """Read the sheets of a file; a file that cannot be read adds one fault and gives no sheets.

    Parameters
    ----------
    path : Path
    faults : FaultList
    limits : Limits
    watch : callable, optional
        Called now and then with the part done, from 0 to 1. If it raises, the reading stops at once.
    """
    try:
        if path.is_dir():
            faults.add("this is a folder", _WORKBOOK, "Choose a file.")
            return Source("", [])
        if path.exists() and not path.is_file():
            faults.add("this is no file but a device or a pipe", _WORKBOOK, "Choose a file.")
            return Source("", [])
        size = path.stat().st_size
        if size > _MOST_BYTES:
            faults.add(
                f"the file is {size / 2**30:.1f} GB long", _WORKBOOK, "Leave out what the book does not need."
            )
            return Source("", [])
        sha256 = _digest(path)
    except FileNotFoundError:
        faults.add("there is no such file", _WORKBOOK, "Check the name and the folder.")
        return Source("", [])
    except OSError as error:
        faults.add(
            f"the file cannot be opened: {error.strerror or error}",
            "a file that may be read",
            "Close it in other programs and check its permissions.",
        )
        return Source("", [])
    expected_seconds = 0.2 + size / 8e6

    def look(passed: float) -> None:
        if watch is not None:
            watch(0.9 * passed / (passed + expected_seconds))

    if size > _SIDE_BY_SIDE_BYTES:
        values, scan = ask(("values", "scan"), path, limits, watch=look)
    else:
        (values,) = ask(("both",), path, limits, watch=look)
        scan = Answer.of(values.content.get("scan", {}))
    if values.refused:
        _refuse(path, values, faults, limits, look)
        return Source(sha256, [])
    sheets = [
        SourceSheet(SheetColumns(name, hidden, count, [Column.unpack(packed, count) for packed in columns]))
        for name, hidden, count, columns in values.content["sheets"]
    ]
    faults.order_sheets([sheet.name for sheet in sheets])
    if sheets:
        _take_facts(sheets, scan, faults)
    return Source(sha256, sheets)


def _digest(path: Path) -> str:
    with open(path, "rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _refuse(
    path: Path, answer: Answer, faults: FaultList, limits: Limits, watch: Callable[[float], object]
) -> None:
    """Say in one fault why the file is not read, and where the trouble lies if that can be told."""
    found, mend = _REFUSALS.get(answer.refused, _REFUSALS["corrupt"])
    if answer.detail and answer.refused == "bomb":
        # What a parser says of a broken file is meant for those who write parsers.
        found += f" ({answer.detail[:160]})"
    sheet, row, column = "", -1, -1
    if answer.refused in ("memory", "time", "crash"):
        (extent,) = ask(("extent",), path, limits, watch=watch)
        spans = extent.content.get("extents", {})
        if spans:
            name = max(spans, key=lambda name: spans[name][0] * spans[name][1])
            rows, columns, furthest = spans[name]
            if rows * columns > _SPARSE_CELLS:
                letters = furthest.rstrip("0123456789")
                row = int(furthest[len(letters) :]) - 1
                column = _index(letters)
                sheet = name
                found += (
                    f": a cell stands at {furthest}, so the sheet spans {rows:,} rows by {columns:,} columns"
                )
    faults.add(found, _WORKBOOK, mend, sheet=sheet, row=row, column=column)


def _index(letters: str) -> int:
    number = 0
    for letter in letters:
        number = number * 26 + ord(letter) - 64
    return number - 1


def _take_facts(sheets: list[SourceSheet], scan: Answer, faults: FaultList) -> None:
    """Give each sheet what the scan found in it."""
    if scan.refused:
        unscanned = scan.refused == "unscanned"
        faults.mild(
            "in a file of this format error cells, formulas without a value and hidden rows do not show"
            if unscanned
            else "the search for error cells and hidden rows failed",
            _WORKBOOK,
            "Error cells count as empty. Save it as .xlsx to have them named." if unscanned else _SAVE,
        )
        return
    for sheet in sheets:
        facts = scan.content["facts"].get(sheet.name)
        if facts is None or facts["failed"]:
            faults.mild(
                "the search for error cells and hidden rows failed",
                "a sheet written as the standard says",
                f"Error cells count as empty. {_SAVE}",
                sheet=sheet.name,
            )
            continue
        for row, column, code in facts["errors"]:
            sheet.broken.setdefault(column, {})[row] = f"the cell holds the error {code}".rstrip()
        for row, column in facts["unvalued"]:
            sheet.broken.setdefault(column, {})[row] = (
                "the cell holds a formula whose result was never stored"
            )
        _make_room(sheet)
        sheet.hidden_rows = [tuple(run) for run in facts["hidden_rows"]]
        sheet.hidden_columns = [tuple(run) for run in facts["hidden_columns"]]


def _make_room(sheet: SourceSheet) -> None:
    """Lengthen a sheet whose last rows hold only formulas without a value: the parser leaves them out."""
    data = sheet.data
    width = len(data.columns)
    last = max((row for column, rows in sheet.broken.items() if column < width for row in rows), default=-1)
    if last < data.count or last * width > 50_000_000:
        return
    short = last + 1 - data.count
    columns = [
        Column(
            np.concatenate([column.kinds, np.zeros(short, dtype=np.uint8)]),
            np.concatenate([column.values, np.zeros(short)]),
            column.texts,
        )
        for column in data.columns
    ]
    sheet.data = SheetColumns(data.name, data.hidden, last + 1, columns)
