"""Texts that stay text, numbers that stay exact, files that are whole or not there."""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from datetime import date, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from openpyxl import Workbook, load_workbook
from openpyxl.cell import WriteOnlyCell
from python_calamine import CalamineWorkbook

from desk.report.safe_cells import (
    CUT_MARK,
    LONGEST_TEXT,
    clean_text,
    put,
    put_date,
    put_number,
    put_text,
    write_whole,
)

_SUSPECTS = [
    *(
        "=1+1",
        "+1",
        "-1",
        "@SUM(A1)",
        "#N/A",
        "#REF!",
        "\t=1",
        "'x",
        "＝1",
        "=cmd|' /C calc'!A0",
        "TRUE",
        "12",
        "1e5",
    ),
    *(
        "2026-09-30",
        "_x0041_",
        "a_x000D_b",
        "&amp;<b>",
        " both ends ",
        "line\nfeed",
        "\U0001f600",
        "a" * LONGEST_TEXT,
    ),
]


def _read_back(path: Path) -> list[Any]:
    rows = CalamineWorkbook.from_path(path).get_sheet_by_index(0).to_python(skip_empty_area=False)
    return [row[0] for row in rows]


def _column(path: Path, values: list[Any], writer: Callable[..., Any], *, write_only: bool = True) -> Path:
    workbook = Workbook(write_only=write_only)
    sheet: Any = workbook.create_sheet() if write_only else workbook.worksheets[0]
    for number, value in enumerate(values, start=1):
        if write_only:
            sheet.append([writer(WriteOnlyCell(sheet), value)])
        else:
            writer(sheet.cell(number, 1), value)
    workbook.save(path)
    return path


@pytest.mark.parametrize("write_only", [True, False])
def test_texts_stay_texts(write_only: bool, tmp_path: Path) -> None:
    path = _column(tmp_path / "a.xlsx", _SUSPECTS, put_text, write_only=write_only)
    assert _read_back(path) == _SUSPECTS
    sheet = load_workbook(path).worksheets[0]
    # openpyxl reads any text that looks like an error as one; what is in the file is a string.
    kinds = {sheet.cell(row, 1).data_type for row, text in enumerate(_SUSPECTS, 1) if text[0] != "#"}
    assert kinds == {"s"}
    quoted = [row for row in range(1, len(_SUSPECTS) + 1) if sheet.cell(row, 1).quotePrefix]
    assert [_SUSPECTS[row - 1] for row in quoted] == _SUSPECTS[:10]


def test_texts_that_no_cell_can_hold(tmp_path: Path) -> None:
    texts = ["a\x00b\x1b", "\ud800", "a\r\nb\rc", "x" * 40_000, "\U0001f600" * 20_000, "_x0041_" * 6_000]
    cleaned = [clean_text(text) for text in texts]
    assert cleaned[:3] == ["a\ufffdb\ufffd", "\ufffd", "a\nb\nc"]
    assert all(text.endswith(CUT_MARK) for text in cleaned[3:])
    assert len(cleaned[3]) == LONGEST_TEXT
    assert _read_back(_column(tmp_path / "a.xlsx", texts, put_text)) == cleaned


def test_only_a_text_is_a_text() -> None:
    with pytest.raises(TypeError, match="`text` must be a str"):
        put_text(Workbook().worksheets[0]["A1"], 1)  # type: ignore[arg-type]


@settings(max_examples=20, deadline=None)
@given(numbers=st.lists(st.floats(allow_nan=False, allow_infinity=False), min_size=1, max_size=300))
def test_numbers_come_back_bit_for_bit(
    numbers: list[float], tmp_path_factory: pytest.TempPathFactory
) -> None:
    path = _column(tmp_path_factory.mktemp("numbers") / "a.xlsx", numbers, put_number)
    assert np.array(_read_back(path), dtype=np.float64).tobytes() == np.array(numbers).tobytes()


def test_what_is_no_number_is_said_to_be_none(tmp_path: Path) -> None:
    values = [np.nan, np.inf, -np.inf, np.float64(0.5), 3, np.int64(4), True]
    assert _read_back(_column(tmp_path / "a.xlsx", values, put)) == ["n/a", "n/a", "n/a", 0.5, 3.0, 4.0, True]


def test_dates(tmp_path: Path) -> None:
    values = [date(1900, 3, 1), np.datetime64("2026-09-30"), datetime(2030, 1, 2, 3), date(9999, 12, 31)]
    days = [date(1900, 3, 1), date(2026, 9, 30), date(2030, 1, 2), date(9999, 12, 31)]
    assert _read_back(_column(tmp_path / "a.xlsx", values, put)) == days
    cell = Workbook().worksheets[0]["A1"]
    assert put_date(cell, np.datetime64("NaT", "D")).value is None
    with pytest.raises(ValueError, match="before 1900-03-01"):
        put_date(cell, date(1900, 2, 28))


def test_a_file_is_written_whole(tmp_path: Path) -> None:
    target = tmp_path / "a.txt"
    assert write_whole(target, lambda path: path.write_text("one")) == target
    assert target.read_text() == "one"
    target.chmod(0o640)
    write_whole(target, lambda path: path.write_text("two"))
    assert target.read_text() == "two"
    assert stat.S_IMODE(target.stat().st_mode) == 0o640
    assert list(tmp_path.iterdir()) == [target]


@pytest.mark.parametrize(
    "error", [OSError(28, "No space left on device"), KeyboardInterrupt(), ValueError("bad")]
)
def test_a_failure_leaves_the_former_file(error: BaseException, tmp_path: Path) -> None:
    target = tmp_path / "a.txt"
    target.write_text("former")

    def fail(path: Path) -> None:
        path.write_text("half")
        raise error

    with pytest.raises(type(error)):
        write_whole(target, fail)
    assert target.read_text() == "former"
    assert list(tmp_path.iterdir()) == [target]


def test_a_failing_swap_leaves_the_former_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    target = tmp_path / "a.txt"
    target.write_text("former")

    def refuse(source: Path, to: Path) -> None:
        raise PermissionError(13, "in use")

    monkeypatch.setattr(os, "replace", refuse)
    with pytest.raises(PermissionError):
        write_whole(target, lambda path: path.write_text("new"))
    assert target.read_text() == "former"
    assert list(tmp_path.iterdir()) == [target]


def test_where_nothing_can_be_written(tmp_path: Path) -> None:
    with pytest.raises(IsADirectoryError):
        write_whole(tmp_path, lambda path: path.write_text("x"))
    with pytest.raises(FileNotFoundError):
        write_whole(tmp_path / "no" / "a.txt", lambda path: path.write_text("x"))


def test_a_link_is_followed(tmp_path: Path) -> None:
    real, link = tmp_path / "real.txt", tmp_path / "link.txt"
    real.write_text("former")
    link.symlink_to(real)
    write_whole(link, lambda path: path.write_text("new"))
    assert real.read_text() == "new"
    assert link.is_symlink()
