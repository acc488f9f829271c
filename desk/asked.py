"""What a command is asked for: the book it names, the places it writes to, and what is wrong with them."""

from __future__ import annotations

import errno
from collections import Counter
from collections.abc import Callable, Iterable
from dataclasses import replace
from pathlib import Path

from desk import tasks
from desk.book import Book, Fault, Severity
from desk.intake.records import Reading
from desk.report import as_text
from desk.terminal import ProgressLine, complain

__all__ = [
    "MOST_LINES",
    "BadRequest",
    "NotWritten",
    "Reported",
    "complain_of",
    "complain_of_reading",
    "insist_on",
    "read_usable",
    "write_to",
]

MOST_LINES = 200
"""Faults of one sheet and severity that are said one by one."""
_NO_PLACE_TO_WRITE = (errno.EACCES, errno.EPERM, errno.EROFS, errno.ENAMETOOLONG, errno.ENOENT)
"""Reasons why a file cannot be written that lie in the place asked for."""


class BadRequest(Exception):
    """The book or the arguments are at fault.

    Attributes
    ----------
    faults : tuple of Fault
    """

    def __init__(self, faults: Iterable[Fault]) -> None:
        """Hold the faults."""
        self.faults = tuple(faults)
        super().__init__("; ".join(str(fault) for fault in self.faults))


class NotWritten(Exception):
    """A file cannot be written, for no reason that lies in its place."""


def read_usable(path: Path) -> tuple[Reading, Book]:
    """Read a book, complain about its faults, and insist that it can be used.

    Raises
    ------
    BadRequest
        If the book has grave faults; its faults are on standard error already.
    """
    with ProgressLine("Reading") as progress:
        reading = tasks.read(path, progress=progress)
    complain_of_reading(reading)
    if reading.book is None or reading.grave:
        raise Reported(reading.faults)
    return reading, reading.book


class Reported(BadRequest):
    """Faults that stand on standard error already."""


def write_to(target: Path, option: str, what: str, write: Callable[[], Path]) -> Path:
    """Where `write` has written; a place that it cannot write to is a fault of the option that names it."""
    try:
        return write()
    except OSError as error:
        reason = error.strerror or str(error)
        if error.errno not in _NO_PLACE_TO_WRITE:
            raise NotWritten(f"{target}: the {what} cannot be written: {reason}.") from error
        fault = Fault(f"{option} is {target}: {reason}", "a place that can be written to", "Name another.")
        raise BadRequest([fault]) from error


def insist_on(book: Book, *, model: bool, sheet: str = "Basis") -> None:
    """Raise BadRequest where the basis gives no curve, or the model, if it is needed, cannot be drawn."""
    from desk.intake.checks import plain
    from desk.intake.items import missing_items
    from desk.scenarios.plans import planned_run

    if model and book.rates_model is not None and (missing := missing_items(book.rates_model)):
        name = book.rates_model.name
        raise BadRequest(
            Fault(
                f'the item "{item}" is missing, which the model {name} needs',
                f'a row with the item "{item}" and its value',
                "Add the row, or name another model.",
                sheet="Rates model",
            )
            for item in missing
        )
    wanted = "a curve"
    try:
        _ = book.basis.curve, book.basis.liability_spread_at([1.0])
        if book.basis.inflation is not None:
            _ = book.basis.inflation.curve
        if model:
            sheet, wanted = "Rates model", "a run that can be drawn"
            planned_run(book)
    except ValueError as error:
        raise BadRequest([Fault(plain(error), wanted, "Mend it in the book.", sheet=sheet)]) from error


def complain_of(faults: Iterable[Fault]) -> None:
    """Say the mild faults of a result, as many as of a reading."""
    _complain((replace(fault, severity=Severity.MILD) for fault in faults), as_text.fault_line)


def complain_of_reading(reading: Reading) -> None:
    """Say the faults of a reading; one that has no place in the book says which file it is of.

    Of each sheet the first 200 of each severity, and in one line how many more there are.
    """

    def line_of(fault: Fault) -> str:
        line = as_text.fault_line(fault)
        return line if fault.place else f"{as_text.printable(str(reading.path))}: {line}"

    _complain(reading.faults, line_of)


def _complain(faults: Iterable[Fault], line_of: Callable[[Fault], str]) -> None:
    """Say faults in one line each; of very many the first, and what is left out."""
    counts: Counter[tuple[str, Severity]] = Counter()
    for fault in faults:
        kind = fault.sheet, fault.severity
        counts[kind] += 1
        if counts[kind] <= MOST_LINES:
            complain(line_of(fault))
    for (sheet, severity), count in counts.items():
        if count > MOST_LINES:
            what = "mild faults" if severity is Severity.MILD else "grave faults"
            where = f" of the sheet {as_text.printable(sheet)}" if sheet else ""
            complain(
                f"{count - MOST_LINES:,} further {what}{where} are left out here, {count:,} in all; "
                "--json lists every one"
            )
