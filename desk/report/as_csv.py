"""Tables as CSV files: RFC 4180, UTF-8 with a byte order mark so that spreadsheets see the encoding.

Numbers are plain (a point, no grouping, the shortest exact decimal) and dates are ISO 8601. A text that
a spreadsheet would take for a formula is escaped with a leading apostrophe (CWE-1236).
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterable, Sequence
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np

from desk.report.safe_cells import write_whole

__all__ = ["csv_text", "plain_value", "write_csv"]

_FORMULA_STARTS = tuple("=+-@\t\r\n\0＝＋－＠")


def plain_value(value: Any) -> str:
    """One cell as CSV text, before quoting.

    Parameters
    ----------
    value : str, bool, number, date, datetime64 or None
        NaN, NaT and None leave the cell empty.

    Returns
    -------
    str
    """
    if isinstance(value, np.generic):
        value = None if isinstance(value, np.datetime64) and np.isnat(value) else value.item()
    if value is None:
        return ""
    if isinstance(value, str):
        return f"'{value}" if value.startswith(_FORMULA_STARTS) else value
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, int):
        return str(value)
    number = float(value)
    if not math.isfinite(number):
        return ""
    exact = repr(number)
    return exact[:-2] if exact.endswith(".0") else exact


def csv_text(headings: Sequence[str], rows: Iterable[Sequence[Any]]) -> str:
    """A table as CSV text with CRLF line ends.

    Parameters
    ----------
    headings : sequence of str
        One a column, with units.
    rows : iterable of sequences
        Each as long as `headings`.

    Returns
    -------
    str

    Raises
    ------
    ValueError
        If a row is longer or shorter than the headings.
    """
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\r\n")
    writer.writerow([plain_value(heading) for heading in headings])
    for row in rows:
        if len(row) != len(headings):
            raise ValueError(f"`rows` must each have {len(headings)} cells, not {len(row)}")
        writer.writerow([plain_value(value) for value in row])
    return buffer.getvalue()


def write_csv(path: Path, headings: Sequence[str], rows: Iterable[Sequence[Any]]) -> Path:
    """Write a table as a CSV file, whole or not at all.

    Parameters
    ----------
    path : Path
    headings, rows
        See `csv_text`.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    OSError
        If the file cannot be written.
    """
    content = csv_text(headings, rows).encode("utf-8-sig", errors="replace")
    return write_whole(path, lambda neighbour: neighbour.write_bytes(content))
