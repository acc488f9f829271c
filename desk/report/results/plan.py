"""A plan of a sheet: which cell stands where, known before anything is written.

Formulas may then point at any cell of any sheet, and the sheets are written in one pass from top to bottom,
so that memory stays bounded.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, cast

from desk.report.results.look import Styles, set_up_page
from desk.report.safe_cells import put

if TYPE_CHECKING:
    from openpyxl import Workbook
    from openpyxl.cell import Cell
    from openpyxl.chart._chart import ChartBase
    from openpyxl.worksheet.worksheet import Worksheet

__all__ = [
    "FIRST_ROW",
    "HEADING_ROW",
    "LONGEST_TITLE",
    "Block",
    "Formula",
    "PlannedCell",
    "SheetPlan",
    "column_letter",
    "widen",
    "write_sheet",
]

TITLE_ROW, NOTE_ROW, CHECK_ROW, HEADING_ROW, FIRST_ROW = 1, 2, 3, 4, 5
MASTER_CHECK = "workbook_check"


LONGEST_TITLE = 120
"""Characters of a title over a sheet: a longer one would make the printed page as wide as itself."""
_DIGITS_PLANNED = "9,999,999,999"
"""The longest amount that the widths of the columns are made for."""
_LARGEST_SHOWN = 1e24
_UNIT = re.compile(r"\[[^\]]*\]")


class Formula(str):
    """A live formula, which begins with ``=``: made by the program, never from a source."""

    __slots__ = ()


@dataclass(frozen=True)
class PlannedCell:
    """What one cell holds and how it looks.

    Attributes
    ----------
    value : str, Formula, number, date, bool or None
    role : str
        See `desk.report.results.look.ROLES`.
    form : str
        See `desk.report.results.look.FORMATS`.
    """

    value: Any
    role: str = "reported"
    form: str = "text"


@dataclass(frozen=True)
class Block:
    """Many rows of one pattern, made as they are written.

    Attributes
    ----------
    first : int
        Row of the sheet, from 1.
    count : int
    roles, forms : tuple of str
        One a column, from column A on.
    rows : callable
        Called once; gives each row's values.
    """

    first: int
    count: int
    roles: tuple[str, ...]
    forms: tuple[str, ...]
    rows: Callable[[], Iterator[Sequence[Any]]]


@dataclass
class SheetPlan:
    """A sheet to be written.

    Attributes
    ----------
    name : str
    title, note : str
        First and second row.
    widths : dict of int to float
        Column (from 1) to width in characters.
    cells : dict
        Row to column to cell.
    block : Block or None
        Rows below the planned cells.
    charts : list of (chart, str)
        With the address of the top left corner.
    frozen : str
        The first cell that scrolls.
    title_rows : str
        Rows that every printed page repeats.
    is_one_page : bool
        Whether the sheet is printed on one page.
    check_columns : list of str
        Addresses of cells that hold the word of a check.
    page_breaks : list of int
        Rows after which a new page begins.
    whole_numbers : list of (str, int, int)
        Addresses of cells that take a whole number alone, with the least and the most.
    """

    name: str
    title: str
    note: str
    widths: dict[int, float] = field(default_factory=dict)
    cells: dict[int, dict[int, PlannedCell]] = field(default_factory=dict)
    block: Block | None = None
    charts: list[tuple[ChartBase, str]] = field(default_factory=list)
    frozen: str = f"A{FIRST_ROW}"
    title_rows: str = f"1:{HEADING_ROW}"
    is_one_page: bool = False
    check_columns: list[str] = field(default_factory=list)
    page_breaks: list[int] = field(default_factory=list)
    whole_numbers: list[tuple[str, int, int]] = field(default_factory=list)

    def put(self, row: int, column: int, value: Any, role: str = "reported", form: str = "text") -> str:
        """Plan a cell and return its absolute address, with the sheet's name."""
        self.cells.setdefault(row, {})[column] = PlannedCell(value, role, form)
        return self.address(row, column)

    def address(self, row: int, column: int) -> str:
        """Absolute address of a cell, for formulas on any sheet."""
        return f"'{self.name}'!${column_letter(column)}${row}"

    def area(self, column: int, first: int, last: int) -> str:
        """Absolute address of a part of a column; at least one row."""
        letter = column_letter(column)
        return f"'{self.name}'!${letter}${first}:${letter}${max(first, last)}"

    def headings(
        self, labels: Iterable[str], *, row: int = HEADING_ROW, column: int = 1, left: int = 1
    ) -> None:
        """Plan a row of headings; the first `left` stand flush left."""
        for offset, label in enumerate(labels):
            role = "heading_left" if offset < left else "heading"
            if label in ("Check", "Holds"):
                role = "heading_centre"
            # A unit is not broken over two lines.
            text = _UNIT.sub(lambda found: found[0].replace(" ", "\u00a0"), label)
            self.put(row, column + offset, text, role)

    def table_row(self, row: int, column: int, cells: Iterable[tuple[Any, str, str]]) -> None:
        """Plan one row of (value, role, format) from `column` on."""
        for offset, (value, role, form) in enumerate(cells):
            if value is not None:
                self.put(row, column + offset, value, role, form)

    def mark_checks(self, column: int, first: int, last: int) -> str:
        """Show failed checks of a column in colour; returns its address for formulas."""
        letter = column_letter(column)
        self.check_columns.append(f"{letter}{first}:{letter}{max(first, last)}")
        return self.area(column, first, last)


def widen(plans: Iterable[SheetPlan], largest: float) -> None:
    """Make room in all columns of money for amounts of more digits than the widths are made for.

    Parameters
    ----------
    plans : iterable of SheetPlan
        Their widths are changed.
    largest : float
        Size of the largest amount.
    """
    extra = len(f"{min(abs(largest), _LARGEST_SHOWN):,.0f}") - len(_DIGITS_PLANNED)
    if not extra > 0:
        return
    for plan in plans:
        columns = {
            column for row in plan.cells.values() for column, cell in row.items() if "money" in cell.form
        }
        if plan.block is not None:
            columns |= {number for number, form in enumerate(plan.block.forms, start=1) if "money" in form}
        for column in columns:
            plan.widths[column] = plan.widths.get(column, 10.0) + extra


def column_letter(column: int) -> str:
    """``A`` for 1."""
    from openpyxl.utils import get_column_letter

    return get_column_letter(column)


def write_sheet(
    workbook: Workbook, plan: SheetPlan, styles: Styles, progress: Callable[[float], None]
) -> None:
    """Write one sheet of a write-only workbook from its plan."""
    from openpyxl.worksheet.pagebreak import Break

    # A write-only sheet has whatever is used of it here.
    sheet = cast("Worksheet", workbook.create_sheet(plan.name))
    sheet.sheet_view.showGridLines = False
    sheet.freeze_panes = plan.frozen
    for column, width in plan.widths.items():
        sheet.column_dimensions[column_letter(column)].width = width
    set_up_page(sheet, title_rows=plan.title_rows, is_one_page=plan.is_one_page)
    title = plan.title if len(plan.title) <= LONGEST_TITLE else plan.title[: LONGEST_TITLE - 1] + "…"
    plan.put(TITLE_ROW, 1, title, "title")
    plan.put(NOTE_ROW, 1, plan.note, "note")
    if CHECK_ROW not in plan.cells or 1 not in plan.cells[CHECK_ROW]:
        plan.put(CHECK_ROW, 1, Formula(f'="Workbook check: "&{MASTER_CHECK}'), "note")
    sheet.row_dimensions[TITLE_ROW].height = 22
    for row, cells in plan.cells.items():
        tall = [
            _lines(cell.value, plan.widths.get(column, 10.0))
            for column, cell in cells.items()
            if cell.role.startswith("heading")
        ]
        if tall:
            sheet.row_dimensions[row].height = 13.5 * max(tall) + 4
    last = max(plan.cells)
    for row in range(1, last + 1):
        sheet.append(_row_cells(sheet, plan.cells.get(row, {}), styles))
    if plan.block is not None:
        _write_block(sheet, plan.block, styles, last, progress)
    _mark_failures(sheet, plan.check_columns)
    _hold_to_whole_numbers(sheet, plan.whole_numbers)
    for row in plan.page_breaks:
        sheet.row_breaks.append(Break(id=row))
    for chart, anchor in plan.charts:
        sheet.add_chart(chart, anchor)
    protection = sheet.protection
    protection.sheet = True
    protection.formatColumns = protection.formatRows = protection.sort = protection.autoFilter = False
    protection.objects = protection.scenarios = False


def _lines(text: Any, width: float) -> int:
    """Lines that a heading takes when it is wrapped at spaces."""
    count = 0
    for paragraph in str(text).split("\n"):
        room, count = width - 1.0, count + 1
        for word in paragraph.split(" "):
            if len(word) > room and room < width - 1.0:
                room, count = width - 1.0, count + 1
            room -= len(word) + 1
    return count


def _row_cells(sheet: Worksheet, cells: dict[int, PlannedCell], styles: Styles) -> list[Cell | None]:
    """The cells of one row."""
    from openpyxl.cell import WriteOnlyCell

    row: list[Cell | None] = [None] * max(cells, default=0)
    for column, planned in cells.items():
        cell = WriteOnlyCell(sheet)
        cell.style = styles.name(planned.role, planned.form)
        if isinstance(planned.value, Formula):
            cell.value = str(planned.value)
        else:
            put(cell, planned.value)
            if planned.form == "date":
                cell.number_format = "yyyy-mm-dd"
        row[column - 1] = cell
    return row


def _write_block(
    sheet: Worksheet, block: Block, styles: Styles, last: int, progress: Callable[[float], None]
) -> None:
    """Write the rows of a block with one cell a column, made once."""
    from openpyxl.cell import WriteOnlyCell

    for _ in range(last + 1, block.first):
        sheet.append([])
    names = [styles.name(role, form) for role, form in zip(block.roles, block.forms, strict=True)]
    reused = [WriteOnlyCell(sheet) for _ in names]
    for cell, name in zip(reused, names, strict=True):
        cell.style = name
    blank = [WriteOnlyCell(sheet) for _ in names]
    for cell, name in zip(blank, names, strict=True):
        cell.style = name
    texts: dict[tuple[int, str], Cell] = {}
    for number, values in enumerate(block.rows()):
        row: list[Cell | None] = []
        for column, value in enumerate(values):
            if value is None:
                row.append(blank[column])
                continue
            if isinstance(value, str) and not isinstance(value, Formula):
                key = (column, value)
                if key not in texts:
                    texts[key] = WriteOnlyCell(sheet)
                    texts[key].style = names[column]
                    put(texts[key], value)
                row.append(texts[key])
                continue
            cell = reused[column]
            if isinstance(value, Formula):
                cell.value = str(value)
            else:
                put(cell, value)
            row.append(cell)
        sheet.append(row)
        if number % 500 == 0:
            progress(number / block.count)


def _hold_to_whole_numbers(sheet: Worksheet, cells: Iterable[tuple[str, int, int]]) -> None:
    """Refuse whatever else is typed into cells that choose by number."""
    from openpyxl.worksheet.datavalidation import DataValidation

    for address, least, most in cells:
        rule = DataValidation(
            type="whole", operator="between", formula1=str(least), formula2=str(most), allow_blank=False
        )
        rule.errorTitle, rule.error = "No such number", f"A whole number from {least} to {most}."
        rule.showErrorMessage = True
        rule.add(address)
        # A write-only sheet has the list and not the method.
        sheet.data_validations.append(rule)


def _mark_failures(sheet: Worksheet, areas: Iterable[str]) -> None:
    """Colour whatever in a column of checks is not OK; the word says it too."""
    from openpyxl.formatting.rule import Rule
    from openpyxl.styles import Font, PatternFill
    from openpyxl.styles.differential import DifferentialStyle

    looks = DifferentialStyle(
        font=Font(bold=True, color="FFFFFF"), fill=PatternFill("solid", bgColor="A61C1C")
    )
    for area in areas:
        failed = f'{area.split(":")[0]}="CHECK"'
        sheet.conditional_formatting.add(area, Rule(type="expression", dxf=looks, formula=[failed]))
