"""The scan of the XML, on parts written in every way that the standard allows."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path

import pytest

from desk.book import Severity
from desk.intake.scan import extents, scan_workbook
from desk.intake.scan_events import Facts, ScanFailed, elements, scan_by_events
from desk.intake.workbook import read_workbook
from tests.intake.books import save, sound_sheets
from tests.intake.raw_workbook import DATE_STYLE, MAIN, raw_workbook, sheet_xml

_ROWS = (
    '<row r="1"><c r="A1" t="str"><f>1</f><v></v></c><c r="B1"><f>2</f><v>2</v></c>'
    '<c r="C1"><f>3</f></c></row>'
    '<row r="3" hidden="1"><c r="A3" t="e"><v>#N/A</v></c><c r="AB3" t="e"><f>1/0</f><v>#DIV/0!</v></c></row>'
    '<row r="4" hidden="true"><c r="B4"><f t="shared" si="0"/><v/></c><c r="C4" t="inlineStr">'
    '<is><t>t="e" &lt;f hidden="1"</t></is></c></row>'
    '<row r="9" hidden="0"><c r="A9"><f t="shared" si="0"/><v>4</v></c></row>'
)
_COLUMNS = '<cols><col min="2" max="3" width="9" hidden="1"/><col min="5" max="5" width="9"/></cols>'
_FACTS = {
    "errors": [(2, 0, "#N/A"), (2, 27, "#DIV/0!")],
    "unvalued": [(0, 2), (3, 1)],
    "hidden_rows": [(2, 3)],
    "hidden_columns": [(1, 2)],
    "failed": "",
}


def _prefixed(xml: str) -> str:
    names = ("worksheet", "sheetData", "cols", "col", "row", "c", "f", "v", "is", "t")
    for name in names:
        for end in (" ", ">", "/"):
            xml = xml.replace(f"<{name}{end}", f"<x:{name}{end}").replace(
                f"</{name}{end}", f"</x:{name}{end}"
            )
    return xml.replace("xmlns=", "xmlns:x=")


_PLAIN = sheet_xml(_ROWS, before=_COLUMNS)
_WAYS = {
    "plain": _PLAIN,
    "single quotes": _PLAIN.replace('="', "='")
    .replace('"', "'")
    .replace("&lt;f hidden='1'", '&lt;f hidden="1"'),
    "prefix": _prefixed(_PLAIN),
    "comment": _PLAIN.replace("<sheetData>", '<sheetData><!-- <row r="7" hidden="1"> -->'),
    "strict": _PLAIN.replace(MAIN, "http://purl.oclc.org/ooxml/spreadsheetml/main"),
}


@pytest.mark.parametrize("way", _WAYS)
def test_the_facts_of_a_sheet_in_every_way_of_writing(way: str, tmp_path: Path) -> None:
    path = raw_workbook(tmp_path / "book.xlsx", {"One": _WAYS[way]})
    assert scan_workbook(path) == {"One": _FACTS}
    facts = Facts()
    scan_by_events(io.BytesIO(_WAYS[way].encode()), facts)
    assert facts.as_dict() == _FACTS


def test_cells_without_addresses(tmp_path: Path) -> None:
    rows = '<row><c><v>1</v></c><c t="e"><v>#REF!</v></c></row><row hidden="1"><c><f>1</f></c></row>'
    found = scan_workbook(raw_workbook(tmp_path / "book.xlsx", {"One": sheet_xml(rows)}))["One"]
    assert found["errors"] == [(0, 1, "#REF!")]
    assert found["unvalued"] == [(1, 0)]
    assert found["hidden_rows"] == [(1, 1)]


def test_facts_beyond_the_first_piece_of_a_long_sheet(tmp_path: Path) -> None:
    wrong = dict.fromkeys(range(9973, 90000, 9973), ' t="e"')
    rows = "".join(
        f'<row r="{row}"><c r="A{row}"{wrong.get(row, "")}><v>1</v></c></row>' for row in range(1, 90_001)
    )
    found = scan_workbook(raw_workbook(tmp_path / "book.xlsx", {"One": sheet_xml(rows)}))["One"]
    assert [row for row, *_ in found["errors"]] == [9973 * number - 1 for number in range(1, 10)]


def test_a_document_type_is_refused() -> None:
    with pytest.raises(ScanFailed, match="document type"):
        elements(b'<!DOCTYPE a [<!ENTITY b "c">]><a>&b;</a>')


def test_extents(tmp_path: Path) -> None:
    rows = '<row r="2"><c r="B2"/></row><row r="40"><c r="AA40"><v>1</v></c></row>'
    assert extents(raw_workbook(tmp_path / "book.xlsx", {"One": sheet_xml(rows)})) == {
        "One": (40, 27, "AA40")
    }


def test_a_failed_scan_leaves_the_values_standing(tmp_path: Path) -> None:
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    spoilt = tmp_path / "spoilt.xlsx"
    with zipfile.ZipFile(path) as source, zipfile.ZipFile(spoilt, "w") as target:
        for name in source.namelist():
            data = source.read(name)
            if name == "xl/worksheets/sheet2.xml":
                # Too far in for the first look, and nothing to the parser of the values.
                data = b"<!--" + b"x" * 70_000 + b"--><!DOCTYPE worksheet>" + data
            target.writestr(name, data)
    reading = read_workbook(spoilt)
    failed = [fault for fault in reading.faults if "search for error cells" in fault.found]
    assert [(fault.sheet, fault.severity) for fault in failed] == [("Curve", Severity.MILD)]
    assert reading.book is not None


def test_hidden_parts_are_said_and_read(tmp_path: Path) -> None:
    from openpyxl import load_workbook

    path = save(sound_sheets(), tmp_path / "book.xlsx")
    workbook = load_workbook(path)
    workbook["History"].sheet_state = "hidden"
    workbook["Curve"].row_dimensions[3].hidden = True
    workbook["Curve"].row_dimensions[4].hidden = True
    workbook["Liabilities"].column_dimensions["C"].hidden = True
    workbook.save(path)
    reading = read_workbook(path)
    assert [(fault.place, fault.found) for fault in reading.faults] == [
        ("Curve!A3", "rows 3 to 4 are hidden and were read"),
        ("Liabilities!C1", 'the column "Amount" is hidden and was read'),
        ("History", "the sheet is hidden and was read"),
    ]
    assert reading.book is not None
    assert reading.book.basis.terms.tolist() == [1.0, 5.0, 10.0, 30.0]


@pytest.mark.parametrize("way", ["1904", "strict"])
def test_other_calendars_and_namespaces(way: str, tmp_path: Path) -> None:
    def text(cell: str, words: str) -> str:
        return f'<c r="{cell}" t="inlineStr"><is><t>{words}</t></is></c>'

    serial = 46_295 - (1462 if way == "1904" else 0)
    items = [
        ("Currency", "GBP"),
        ("Curve kind", "zero"),
        ("Compounding", "annual"),
        ("Interpolation", "linear-zero"),
    ]
    basis = f'<row r="1">{text("A1", "Item")}{text("B1", "Value")}</row>'
    basis += "".join(
        f'<row r="{row}">{text(f"A{row}", item)}{text(f"B{row}", value)}</row>'
        for row, (item, value) in enumerate(items, start=2)
    )
    basis += f'<row r="6">{text("A6", "Valuation date")}<c r="B6" s="{DATE_STYLE}"><v>{serial}</v></c></row>'
    basis += f'<row r="7">{text("A7", "Liability spread")}<c r="B7"><v>0</v></c></row>'
    curve = f'<row r="1">{text("A1", "Term")}{text("B1", "Rate")}</row>'
    curve += '<row r="2"><c r="A2"><v>1</v></c><c r="B2"><v>0.03</v></c></row>'
    flows = f'<row r="1">{text("A1", "Line")}{text("B1", "Year")}{text("C1", "Amount")}</row>'
    flows += f'<row r="2">{text("A2", "A")}<c r="B2"><v>2</v></c><c r="C2"><v>5</v></c></row>'
    main = "http://purl.oclc.org/ooxml/spreadsheetml/main"
    office = "http://purl.oclc.org/ooxml/officeDocument/relationships"
    parts = {"Basis": sheet_xml(basis), "Curve": sheet_xml(curve), "Liabilities": sheet_xml(flows)}
    if way == "strict":
        parts = {name: part.replace(MAIN, main) for name, part in parts.items()}
        path = raw_workbook(tmp_path / "book.xlsx", parts, main=main, office=office)
    else:
        path = raw_workbook(tmp_path / "book.xlsx", parts, date1904=True)
    reading = read_workbook(path)
    assert reading.faults == ()
    assert reading.book is not None
    assert reading.book.basis.valuation_date.isoformat() == "2026-09-30"
    assert reading.book.liabilities.time.tolist() == [2.0]
