"""Workbooks put together from raw XML: for what no writing library would write."""

from __future__ import annotations

import zipfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

__all__ = ["DATE_STYLE", "MAIN", "raw_workbook", "sheet_xml"]

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
DATE_STYLE = 1
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006"
_HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'


def sheet_xml(
    rows: str, *, before: str = "", after: str = "", root: str = f'worksheet xmlns="{MAIN}"'
) -> str:
    """A sheet part: `before` and `after` stand on either side of the rows."""
    name = root.split()[0]
    return f"{_HEAD}<{root}>{before}<sheetData>{rows}</sheetData>{after}</{name}>"


def raw_workbook(
    path: Path,
    sheets: Mapping[str, str],
    *,
    shared: Sequence[str] = (),
    states: Mapping[str, str] | None = None,
    date1904: bool = False,
    main: str = MAIN,
    office: str = _OFFICE,
) -> Path:
    """Write a workbook of ready-made sheet parts; style `DATE_STYLE` is a date."""
    numbered = list(enumerate(sheets, start=1))
    overrides = "".join(
        f'<Override PartName="/xl/worksheets/sheet{number}.xml" '
        'ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.worksheet+xml"/>'
        for number, _ in numbered
    )
    parts = {
        "[Content_Types].xml": f'{_HEAD}<Types xmlns="{_PACKAGE}/content-types">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        '<Default Extension="xml" ContentType="application/xml"/>'
        '<Override PartName="/xl/workbook.xml" ContentType='
        '"application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/>'
        '<Override PartName="/xl/styles.xml" ContentType='
        '"application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"/>'
        '<Override PartName="/xl/sharedStrings.xml" ContentType='
        '"application/vnd.openxmlformats-officedocument.spreadsheetml.sharedStrings+xml"/>'
        f"{overrides}</Types>",
        "_rels/.rels": f'{_HEAD}<Relationships xmlns="{_PACKAGE}/relationships">'
        f'<Relationship Id="rId1" Type="{office}/officeDocument" Target="xl/workbook.xml"/></Relationships>',
        "xl/workbook.xml": f'{_HEAD}<workbook xmlns="{main}" xmlns:r="{office}">'
        + ('<workbookPr date1904="1"/>' if date1904 else "")
        + "<sheets>"
        + "".join(
            f'<sheet name={quoteattr(name)} sheetId="{number}"'
            f' state="{(states or {}).get(name, "visible")}" r:id="rId{number}"/>'
            for number, name in numbered
        )
        + "</sheets></workbook>",
        "xl/_rels/workbook.xml.rels": f'{_HEAD}<Relationships xmlns="{_PACKAGE}/relationships">'
        + "".join(
            f'<Relationship Id="rId{number}" Type="{office}/worksheet" '
            f'Target="worksheets/sheet{number}.xml"/>'
            for number, _ in numbered
        )
        + f'<Relationship Id="rId{len(sheets) + 1}" Type="{office}/styles" Target="styles.xml"/>'
        f'<Relationship Id="rId{len(sheets) + 2}" Type="{office}/sharedStrings" '
        'Target="sharedStrings.xml"/></Relationships>',
        "xl/styles.xml": f'{_HEAD}<styleSheet xmlns="{main}"><fonts count="1"><font/></fonts>'
        '<fills count="1"><fill/></fills><borders count="1"><border/></borders>'
        '<cellStyleXfs count="1"><xf/></cellStyleXfs><cellXfs count="2"><xf numFmtId="0"/>'
        '<xf numFmtId="14" applyNumberFormat="1"/></cellXfs></styleSheet>',
        "xl/sharedStrings.xml": f'{_HEAD}<sst xmlns="{main}">'
        + "".join(f"<si><t>{escape(text)}</t></si>" for text in shared)
        + "</sst>",
    }
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as package:
        for name, text in parts.items():
            package.writestr(name, text)
        for number, name in numbered:
            package.writestr(f"xl/worksheets/sheet{number}.xml", sheets[name])
    return path
