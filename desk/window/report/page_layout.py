"""A planned sheet of the report laid out on pages, as a spreadsheet program prints it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from itertools import islice
from typing import Any

from desk.report.results.plan import Formula, PlannedCell, SheetPlan
from desk.window.parts import numbers

__all__ = ["FORMULA_SIGN", "MARGINS", "PAGE", "LaidOutSheet", "Place", "planned_text"]

PAGE = (842.0, 595.0)
"""A4 on its side: width and height [pt]."""
MARGINS = (36.0, 43.0, 36.0, 54.0)
"""Left, top, right, bottom [pt], as the report sets its pages up."""
FORMULA_SIGN = "ƒ"

_ROW = 15.0
_TITLE_ROW = 22.0
_DEFAULT_WIDTH = 8.43
_CHARACTER = 5.25
_PADDING = 3.75
_PER_CM = 72.0 / 2.54
_DIGITS = {
    "whole": 0,
    "money": 0,
    "money2": 2,
    "years": 4,
    "years2": 3,
    "factor": 8,
    "ratio": 3,
}
_PERCENT = {"rate": 4, "share": 2}


def planned_text(value: Any, form: str) -> str:
    """A planned cell as a spreadsheet program shows it; the sign for a formula where one stands."""
    if value is None:
        return ""
    if isinstance(value, Formula):
        return FORMULA_SIGN
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, date | datetime):
        return value.isoformat()[:10]
    if isinstance(value, int | float):
        number = float(value)
        if not math.isfinite(number):
            return "n/a"
        if form in _PERCENT:
            return numbers.number(100 * number, _PERCENT[form]) + "%"
        if form in _DIGITS:
            return numbers.number(number, _DIGITS[form])
        if form == "tiny":
            return f"{number:.1E}".replace("-", numbers.MINUS) if number else "0"
        return numbers.exact(number).replace("-", numbers.MINUS, 1)
    return str(value)


@dataclass(frozen=True)
class Place:
    """A rectangle on a page [pt, before the page's scale]."""

    x: float
    y: float
    width: float
    height: float


class LaidOutSheet:
    """One sheet on its pages.

    Attributes
    ----------
    plan : SheetPlan
    scale : float
        At which the sheet fits the width of a page, and one page where it is set up so.
    row_count : int
    """

    def __init__(self, plan: SheetPlan) -> None:
        self.plan = plan
        self._cells = dict(plan.cells)
        # Title and note are added to a sheet as it is written.
        self._cells[1] = {1: PlannedCell(plan.title, "title"), **self._cells.get(1, {})}
        self._cells[2] = {1: PlannedCell(plan.note, "note"), **self._cells.get(2, {})}
        block = plan.block
        self._block_rows: list[Sequence[Any]] = []
        self._block_source: Iterator[Sequence[Any]] = iter(()) if block is None else iter(block.rows())
        last = max(self._cells)
        if block is not None and block.count:
            last = max(last, block.first + block.count - 1)
        self.row_count = last
        columns = max((max(row) for row in self._cells.values() if row), default=1)
        if block is not None:
            columns = max(columns, len(block.roles))
        self.column_count = max(columns, *plan.widths) if plan.widths else columns
        self._edges = [0.0]
        for column in range(1, self.column_count + 1):
            width = plan.widths.get(column, _DEFAULT_WIDTH)
            self._edges.append(self._edges[-1] + width * _CHARACTER + _PADDING)
        self._repeated = int(plan.title_rows.split(":")[1]) if plan.title_rows else 0
        self.charts = tuple(self._chart_place(chart, anchor) for chart, anchor in plan.charts)
        self._paginate()

    def _chart_place(self, chart: Any, anchor: str) -> tuple[str, Place]:
        column, row = _split(anchor)
        x = self.left_of(column)
        y = sum(self.height_of(before) for before in range(1, row))
        return _chart_title(chart), Place(x, y, chart.width * _PER_CM, chart.height * _PER_CM)

    def left_of(self, column: int) -> float:
        """Where a column (from 1) begins [pt]."""
        if column - 1 < len(self._edges):
            return self._edges[column - 1]
        further = column - len(self._edges)
        return self._edges[-1] + further * (_DEFAULT_WIDTH * _CHARACTER + _PADDING)

    def width_of(self, column: int) -> float:
        """Of a column, from 1 [pt]."""
        return self.left_of(column + 1) - self.left_of(column)

    def height_of(self, row: int) -> float:
        """Of a row, from 1 [pt]."""
        if row == 1:
            return _TITLE_ROW
        cells = self._cells.get(row, {})
        lines = 1
        for column, cell in cells.items():
            if cell.role.startswith("heading"):
                room = max(self.plan.widths.get(column, _DEFAULT_WIDTH) - 1, 1)
                lines = max(lines, _wrapped_lines(str(cell.value), room))
        return 13.5 * lines + 4 if lines > 1 else _ROW

    def _paginate(self) -> None:
        room_x = PAGE[0] - MARGINS[0] - MARGINS[2]
        room_y = PAGE[1] - MARGINS[1] - MARGINS[3]
        width = max([self._edges[-1], *(place.x + place.width for _, place in self.charts)])
        irregular = max(self._cells)
        height = sum(self.height_of(row) for row in range(1, irregular + 1))
        height += _ROW * max(0, self.row_count - irregular)
        height = max([height, *(place.y + place.height for _, place in self.charts)])
        self.scale = min(1.0, room_x / width)
        if self.plan.is_one_page:
            self.scale = min(self.scale, room_y / height)
            self._starts = [1]
            return
        self._starts = [1]
        repeated = sum(self.height_of(row) for row in range(1, self._repeated + 1))
        room = room_y / self.scale
        used = 0.0
        last_row = self.row_count
        for _, place in self.charts:
            # A picture below the last row takes pages too.
            beyond = place.y + place.height - height
            if beyond > 0:
                last_row += math.ceil(beyond / _ROW)
        row = 1
        while row <= last_row:
            tall = self.height_of(row) if row <= irregular else _ROW
            if used + tall > room and used > 0:
                self._starts.append(row)
                used = repeated
            used += tall
            row += 1

    @property
    def page_count(self) -> int:
        """Pages that the sheet takes."""
        return len(self._starts)

    def rows_on(self, page: int) -> list[int]:
        """The rows on a page (from 0), the repeated headings first."""
        start = self._starts[page]
        end = self._starts[page + 1] if page + 1 < len(self._starts) else self.row_count + 1
        rows = list(range(start, max(end, start)))
        if page:
            rows = [*range(1, self._repeated + 1), *rows]
        return [row for row in rows if row <= self.row_count]

    def first_row(self, page: int) -> int:
        """The row a page begins with, the repeated ones apart."""
        return self._starts[page]

    def cells_in(self, row: int) -> dict[int, PlannedCell]:
        """The cells of a row by their columns, from 1."""
        planned = self._cells.get(row)
        if planned is not None:
            return planned
        block = self.plan.block
        if block is None or not block.first <= row < block.first + block.count:
            return {}
        place = row - block.first
        if place >= len(self._block_rows):
            self._block_rows.extend(islice(self._block_source, place + 1 - len(self._block_rows)))
        if place >= len(self._block_rows):
            return {}
        values = self._block_rows[place]
        return {
            column: PlannedCell(value, role, form)
            for column, (value, role, form) in enumerate(
                zip(values, block.roles, block.forms, strict=False), start=1
            )
            if value is not None
        }


def _split(anchor: str) -> tuple[int, int]:
    """Column and row, from 1, of an address such as ``I4``."""
    letters = anchor.rstrip("0123456789")
    column = 0
    for letter in letters:
        column = 26 * column + ord(letter) - ord("A") + 1
    return column, int(anchor[len(letters) :])


def _wrapped_lines(text: str, room: float) -> int:
    """Lines that a text takes when it is broken at spaces."""
    count = 0
    for paragraph in text.split("\n"):
        left = room
        count += 1
        for word in paragraph.split(" "):
            if len(word) > left and left < room:
                left = room
                count += 1
            left -= len(word) + 1
    return count


def _chart_title(chart: Any) -> str:
    """The words of a chart's title; empty where it has none."""
    rich = getattr(getattr(getattr(chart, "title", None), "tx", None), "rich", None)
    paragraphs = getattr(rich, "p", None) or ()
    return " ".join(run.t for paragraph in paragraphs for run in (paragraph.r or ()) if run.t)
