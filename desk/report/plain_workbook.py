"""Workbooks of plain tables, streamed: exact numbers, bounded memory, the same bytes each time.

For large books: a general writing library takes a hundred times as long as packing the result does.

References
----------
ECMA-376 part 1, Office Open XML File Formats: 18.3.1 (worksheets), 18.8 (styles); part 2 (the package).
"""

from __future__ import annotations

import zipfile
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date
from enum import IntEnum
from functools import lru_cache
from pathlib import Path
from typing import IO
from xml.sax.saxutils import escape, quoteattr

import numpy as np
from numpy.typing import NDArray

from desk.report.safe_cells import exact_number, looks_like_formula, stored_text

__all__ = ["PlainSheet", "Style", "Value", "date_serial", "date_serials", "write_sheets"]


Value = str | float | date | None


class Style(IntEnum):
    """How a cell looks, as an index into the workbook's formats."""

    PLAIN = 0
    HEADING = 1
    QUOTED = 2
    DATE = 3
    PERCENT = 4
    MONEY = 5
    YEARS = 6
    WHOLE = 7


_FORMATS = {Style.DATE: "yyyy-mm-dd", Style.PERCENT: "0.0000%", Style.YEARS: "0.0000"}
_BUILT_IN = {Style.MONEY: 4, Style.WHOLE: 3}
_FIRST_OWN = 164
_ZERO_DAY = date(1899, 12, 30).toordinal()
_SOUND_FROM = 61
"""1 March 1900: before that day a spreadsheet's calendar has a day too many."""
_ROWS_AT_ONCE = 2_000
_HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006"
_KIND = "application/vnd.openxmlformats-officedocument.spreadsheetml."


@dataclass(frozen=True)
class PlainSheet:
    """One sheet.

    Attributes
    ----------
    name : str
    headings : sequence of values
        First row, bold and frozen.
    widths : sequence of float
        Of the columns [characters].
    rows : iterable of (values, styles)
        Each row's values and their styles, of one length.
    """

    name: str
    headings: Sequence[Value]
    widths: Sequence[float]
    rows: Iterable[tuple[Sequence[Value], Sequence[Style]]]


def date_serial(day: date) -> int:
    """A date as a spreadsheet counts it. Raises ValueError before 1 March 1900."""
    serial = day.toordinal() - _ZERO_DAY
    if serial < _SOUND_FROM:
        raise ValueError(f"a workbook holds no date before 1900-03-01: {day}")
    return serial


def date_serials(days: NDArray[np.datetime64]) -> list[int | None]:
    """Dates as a spreadsheet counts them; None for NaT. Raises ValueError before March 1900."""
    serials = (days - np.datetime64("1899-12-30", "D")).astype(np.int64)
    missing = np.isnat(days)
    if (~missing & (serials < _SOUND_FROM)).any():
        raise ValueError(f"a workbook holds no date before 1900-03-01: {days[~missing].min()}")
    if (~missing & (days > np.datetime64("9999-12-31", "D"))).any():
        raise ValueError(f"a workbook holds no date after 9999-12-31: {days[~missing].max()}")
    return [None if gone else serial for gone, serial in zip(missing.tolist(), serials.tolist(), strict=True)]


def write_sheets(path: Path, sheets: Sequence[PlainSheet]) -> None:
    """Write the sheets as a workbook at `path`, row by row.

    Raises
    ------
    ValueError
        If a number is not finite.
    """
    with zipfile.ZipFile(path, "w") as package:
        for name, text in _small_parts(sheets).items():
            with package.open(_part(name), "w") as part:
                part.write(text.encode("utf-8"))
        for number, sheet in enumerate(sheets, start=1):
            with package.open(_part(f"xl/worksheets/sheet{number}.xml"), "w") as part:
                _write_sheet(part, sheet)


def _part(name: str) -> zipfile.ZipInfo:
    """A part of the package without a clock."""
    part = zipfile.ZipInfo(name, (1980, 1, 1, 0, 0, 0))
    part.compress_type = zipfile.ZIP_DEFLATED
    return part


def _write_sheet(part: IO[bytes], sheet: PlainSheet) -> None:
    columns = "".join(
        f'<col min="{number}" max="{number}" width="{width:g}" customWidth="1"/>'
        for number, width in enumerate(sheet.widths, start=1)
    )
    head = (
        f'{_HEAD}<worksheet xmlns="{_MAIN}"><sheetViews><sheetView workbookViewId="0">'
        '<pane ySplit="1" topLeftCell="A2" activePane="bottomLeft" state="frozen"/></sheetView></sheetViews>'
        f"<cols>{columns}</cols><sheetData>"
    )
    part.write(head.encode("utf-8"))
    letters = [_letters(number) for number in range(len(sheet.headings))]
    pieces = [_row(1, letters, sheet.headings, [Style.HEADING] * len(letters))]
    for number, (values, styles) in enumerate(sheet.rows, start=2):
        pieces.append(_row(number, letters, values, styles))
        if len(pieces) >= _ROWS_AT_ONCE:
            part.write("".join(pieces).encode("utf-8"))
            pieces.clear()
    pieces.append("</sheetData></worksheet>")
    part.write("".join(pieces).encode("utf-8"))


_OPENED = tuple(f'" s="{style:d}"><v>' for style in Style)
"""By `Style`: a cell of a number from after its address to its value. A large sheet has millions."""


def _row(number: int, letters: Sequence[str], values: Sequence[Value], styles: Sequence[Style]) -> str:
    row = str(number)
    cells = ['<row r="', row, '">']
    for letter, value, style in zip(letters, values, styles, strict=True):
        if value is None:
            continue
        if isinstance(value, str):
            inner = _text(value, style)
            if inner:
                cells += ('<c r="', letter, row, '"', inner, "</c>")
        elif isinstance(value, date):
            cells += ('<c r="', letter, row, _OPENED[Style.DATE], str(date_serial(value)), "</v></c>")
        else:
            cells += ('<c r="', letter, row, _OPENED[style], exact_number(value), "</v></c>")
    cells.append("</row>")
    return "".join(cells)


@lru_cache(maxsize=4096)
def _text(text: str, style: Style) -> str:
    """The inside of a cell of text; "" for one of blanks alone, which counts as none."""
    if not text.strip():
        return ""
    if looks_like_formula(text) and style is not Style.HEADING:
        style = Style.QUOTED
    kept = escape(stored_text(text))
    return f' s="{style:d}" t="inlineStr"><is><t xml:space="preserve">{kept}</t></is>'


def _letters(column: int) -> str:
    letters = ""
    column += 1
    while column:
        column, digit = divmod(column - 1, 26)
        letters = chr(65 + digit) + letters
    return letters


def _small_parts(sheets: Sequence[PlainSheet]) -> dict[str, str]:
    """Everything but the sheets."""
    numbers = range(1, len(sheets) + 1)
    overrides = "".join(
        f'<Override PartName="/xl/worksheets/sheet{number}.xml" ContentType="{_KIND}worksheet+xml"/>'
        for number in numbers
    )
    listed = "".join(
        f'<sheet name={quoteattr(sheet.name)} sheetId="{number}" r:id="rId{number}"/>'
        for number, sheet in zip(numbers, sheets, strict=True)
    )
    targets = "".join(
        f'<Relationship Id="rId{number}" Type="{_OFFICE}/worksheet" Target="worksheets/sheet{number}.xml"/>'
        for number in numbers
    )
    return {
        "[Content_Types].xml": f'{_HEAD}<Types xmlns="{_PACKAGE}/content-types">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        '<Default Extension="xml" ContentType="application/xml"/>'
        f'<Override PartName="/xl/workbook.xml" ContentType="{_KIND}sheet.main+xml"/>'
        f'<Override PartName="/xl/styles.xml" ContentType="{_KIND}styles+xml"/>{overrides}</Types>',
        "_rels/.rels": f'{_HEAD}<Relationships xmlns="{_PACKAGE}/relationships">'
        f'<Relationship Id="rId1" Type="{_OFFICE}/officeDocument" Target="xl/workbook.xml"/></Relationships>',
        "xl/workbook.xml": f'{_HEAD}<workbook xmlns="{_MAIN}" xmlns:r="{_OFFICE}">'
        f"<bookViews><workbookView/></bookViews><sheets>{listed}</sheets></workbook>",
        "xl/_rels/workbook.xml.rels": f'{_HEAD}<Relationships xmlns="{_PACKAGE}/relationships">{targets}'
        f'<Relationship Id="rId{len(sheets) + 1}" Type="{_OFFICE}/styles" Target="styles.xml"/>'
        "</Relationships>",
        "xl/styles.xml": _styles(),
    }


def _styles() -> str:
    own = {style: _FIRST_OWN + number for number, style in enumerate(_FORMATS)}
    formats = "".join(
        f'<numFmt numFmtId="{own[style]}" formatCode={quoteattr(code)}/>' for style, code in _FORMATS.items()
    )
    cells = "".join(
        f'<xf numFmtId="{own.get(style) or _BUILT_IN.get(style, 0)}" fontId="{int(style is Style.HEADING)}"'
        ' fillId="0" borderId="0" xfId="0"'
        + (' applyNumberFormat="1"' if style in own or style in _BUILT_IN else "")
        + (' applyFont="1"' if style is Style.HEADING else "")
        + (' quotePrefix="1"' if style is Style.QUOTED else "")
        + "/>"
        for style in Style
    )
    font = '<sz val="11"/><name val="Calibri"/><family val="2"/>'
    return (
        f'{_HEAD}<styleSheet xmlns="{_MAIN}"><numFmts count="{len(own)}">{formats}</numFmts>'
        f'<fonts count="2"><font>{font}</font><font><b/>{font}</font></fonts>'
        '<fills count="2"><fill><patternFill patternType="none"/></fill>'
        '<fill><patternFill patternType="gray125"/></fill></fills>'
        '<borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
        '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
        f'<cellXfs count="{len(Style)}">{cells}</cellXfs>'
        '<cellStyles count="1"><cellStyle name="Normal" xfId="0" builtinId="0"/></cellStyles></styleSheet>'
    )
