"""CSV: quoting, encoding, and text that no spreadsheet takes for a formula."""

from __future__ import annotations

import csv
import io
from datetime import date
from pathlib import Path

import numpy as np
import pytest

from desk.report.as_csv import csv_text, plain_value, write_csv


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r", "＝", "＋", "－", "＠"])
def test_text_that_looks_like_a_formula_is_escaped(start: str) -> None:
    """The characters named by OWASP ASVS 5, 1.2.10 (CWE-1236)."""
    assert plain_value(f"{start}1+1") == f"'{start}1+1"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (-1.5, "-1.5"),
        (np.float64(-2.0), "-2"),
        (0.1 + 0.2, "0.30000000000000004"),
        (np.int64(-7), "-7"),
        (1e22, "1e+22"),
        (np.nan, ""),
        (np.inf, ""),
        (None, ""),
        (True, "true"),
        (date(2026, 3, 31), "2026-03-31"),
        (np.datetime64("2026-03-31"), "2026-03-31"),
        (np.datetime64("NaT", "D"), ""),
        ("plain", "plain"),
        ("", ""),
    ],
)
def test_numbers_and_dates_are_plain(value: object, text: str) -> None:
    """A negative number is a number: it is not escaped."""
    assert plain_value(value) == text


def test_rows_come_back_as_they_were(tmp_path: Path) -> None:
    """RFC 4180: quotes doubled, line feeds kept, CRLF between rows; UTF-8 with its mark."""
    rows = [["a,b", 'say "x"', "two\nlines"], ["Zürich 年", "−", " space "]]
    path = write_csv(tmp_path / "table.csv", ["one", "two", "three"], rows)
    raw = path.read_bytes()
    assert raw.startswith(b"\xef\xbb\xbf")
    assert raw.count(b"\r\n") == 3
    back = list(csv.reader(io.StringIO(raw.decode("utf-8-sig"), newline="")))
    assert back == [["one", "two", "three"], *rows]


def test_a_ragged_row_is_refused() -> None:
    """A row that does not fit its headings is a mistake of the caller."""
    with pytest.raises(ValueError, match="must each have 2 cells, not 1"):
        csv_text(["one", "two"], [["alone"]])
