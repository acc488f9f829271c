"""The report: every figure can be recomputed from its rows, and a wrong one is caught."""

from __future__ import annotations

import re
import zipfile
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pytest
from openpyxl.utils import get_column_letter

from desk import tasks
from desk.book import Book, CurveKind, FlowTable
from desk.rates.smith_wilson import Extrapolation
from desk.report.results import flows
from desk.report.results.workbook import write_report
from desk.report.wording import CAUTION
from tests.report import examples
from tests.report.spreadsheet import FUNCTION_CALL, FUNCTION_NAMES, Spreadsheet

SHEETS = [
    "Summary", "Basis and curve", "Curve by term", "Liabilities", "Holdings", "Asset flows", "Standing",
    "Key rates", "Periods", "Scenario model", "Savings account", "Short rate", "Present values",
    "Scenario diagnostics", "Convergence", "Checks", "Faults", "Provenance",
]  # fmt: skip
RUN_SHEETS = {
    "Scenario model", "Savings account", "Short rate", "Present values", "Scenario diagnostics",
    "Convergence",
}  # fmt: skip
MASTER = ("Summary", "B3")


@pytest.fixture(scope="module")
def report(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report of the example."""
    path = tmp_path_factory.mktemp("report") / "report.xlsx"
    return write_report(
        examples.reading(),
        examples.standing(),
        examples.simulation(),
        path,
        written_at=datetime(2026, 4, 1, 12, 0, tzinfo=UTC),
    )


@pytest.fixture
def sheet(report: Path) -> Spreadsheet:
    """The report, opened."""
    return Spreadsheet(report)


def write(of: Book, path: Path) -> Spreadsheet:
    """The report of a book, opened; without a simulation."""
    return Spreadsheet(write_report(examples.reading(of), tasks.value(of), None, path))


def find_row(sheet: Spreadsheet, name: str, label: str) -> int:
    """The row of a sheet whose first cell holds `label`."""
    for row in sheet.book[name].iter_rows(max_col=1):
        if row[0].value == label:
            return int(row[0].row or 0)
    raise AssertionError(f"{label} is not on {name}")


def test_every_formula_agrees_with_what_was_reported(sheet: Spreadsheet) -> None:
    """All checks say OK, no formula fails, and the sheets stand in their order."""
    assert sheet.book.sheetnames == SHEETS
    values = {(name, at): sheet.value(name, at) for name, at, _ in sheet.formulas()}
    failed = [place for place, value in values.items() if value in ("CHECK", "#VALUE!")]
    assert not failed
    assert sum(value == "OK" for value in values.values()) > 150
    assert sheet.value(*MASTER) == "OK"


def test_reported_figures_are_those_of_the_standing(sheet: Spreadsheet) -> None:
    """The values beside the formulas are the program's own, bit for bit."""
    standing = examples.standing()
    summary = sheet.book["Summary"]
    figures = [summary.cell(row, 3).value for row in range(5, 11)]
    assert figures == [
        standing.assets.present_value, standing.liabilities.present_value, standing.surplus,
        standing.funding_ratio, standing.duration_gap, standing.dv01_gap,
    ]  # fmt: skip
    assert summary["C5"].data_type == "n"
    recomputed = [sheet.value("Summary", f"D{row}") for row in range(5, 11)]
    np.testing.assert_allclose(np.array(recomputed, float), np.array(figures, float), rtol=1e-11)
    checks = {row[0].value: row[3].value for row in sheet.book["Checks"].iter_rows(min_row=7)}
    assert checks["Assets: convexity"] == standing.assets.convexity
    assert checks["Liabilities: equivalent rate, one Newton step on"] == standing.liabilities.equivalent_rate
    assert checks["Liabilities: Macaulay duration"] == standing.liabilities.macaulay_duration


@pytest.mark.parametrize(
    ("name", "address", "own_check"),
    [
        ("Liabilities", "G7", None),
        ("Liabilities", "N9", None),
        ("Asset flows", "D12", None),
        ("Standing", "H6", "N6"),
        ("Standing", "K5", "N5"),
        ("Holdings", "M7", "P7"),
        ("Key rates", "B10", "M10"),
        ("Key rates", "E14", "M14"),
        ("Periods", "B8", "K8"),
        ("Periods", "E20", "K20"),
        ("Basis and curve", "F6", "L6"),
        ("Curve by term", "E30", "H30"),
        ("Summary", "C8", "G8"),
    ],
)
def test_a_wrong_figure_is_caught(sheet: Spreadsheet, name: str, address: str, own_check: str | None) -> None:
    """One part in a hundred thousand on one cell turns its row's check and the workbook's."""
    cell = sheet.book[name][address]
    assert isinstance(cell.value, int | float)
    assert cell.value
    cell.value = cell.value * 1.00001
    if own_check is not None:
        assert sheet.value(name, own_check) == "CHECK"
    if name != "Summary":
        assert sheet.value(*MASTER) == "CHECK"


@pytest.mark.parametrize(
    "label",
    [
        "Assets: equivalent rate, one Newton step on",
        "Liabilities: Macaulay duration",
        "Liabilities: modified duration",
        "Assets: convexity",
        "Liabilities: dispersion",
        "Assets: DV01",
        "Surplus",
        "Funding ratio",
        "Duration gap",
        "DV01 gap",
    ],
)
def test_a_wrong_measure_is_caught(sheet: Spreadsheet, label: str) -> None:
    """Each measure of the standing has a check of its own."""
    row = find_row(sheet, "Checks", label)
    cell = sheet.book["Checks"].cell(row, 4)
    assert isinstance(cell.value, float)
    cell.value = cell.value * 1.00001
    assert sheet.value("Checks", f"H{row}") == "CHECK"
    assert sheet.value(*MASTER) == "CHECK"


def test_text_that_looks_like_a_formula_stays_text(sheet: Spreadsheet) -> None:
    """Names, titles and faults from a source are never evaluated."""
    assert not [text for _, _, text in sheet.formulas() if "HYPERLINK" in text or "Invented" in text]
    for name, address, text in (
        ("Summary", "A1", "=Invented fund"),
        ("Liabilities", "A6", examples.HOSTILE),
        ("Holdings", "A6", "+Bond"),
        ("Faults", "E5", f"{examples.HOSTILE} is no number"),
    ):
        cell = sheet.book[name][address]
        assert (cell.value, cell.data_type) == (text, "s")


def test_formulas_keep_to_a_few_plain_functions(sheet: Spreadsheet) -> None:
    """No nested IF, no volatile or look-up function, nothing that a reviewer cannot follow."""
    for _, _, text in sheet.formulas():
        called = FUNCTION_CALL.findall(text)
        assert set(called) <= FUNCTION_NAMES
        assert called.count("IF") <= 1
        assert len(text) < 220


def test_lines_of_the_same_name_stay_apart(tmp_path: Path) -> None:
    """Formulas add up by line number, so neither equal names nor wildcards mix lines."""
    first = examples.book().holdings[0]
    doubled = replace(examples.book(), holdings=(first, replace(first, coupon=0.05, market_value=None)))
    sheet = write(doubled, tmp_path / "report.xlsx")
    assert sheet.value(*MASTER) == "OK"
    assert sheet.value("Holdings", "N5") != sheet.value("Holdings", "N6")


def test_pages_are_set_up_for_paper(sheet: Spreadsheet) -> None:
    """A4 landscape, one page wide, headings repeated and frozen, pages counted, nothing hidden."""
    assert sheet.book.calculation.fullCalcOnLoad
    for page in sheet.book.worksheets:
        footer: Any = page.oddFooter
        setup: Any = page.page_setup
        properties: Any = page.sheet_properties
        assert page.sheet_state == "visible"
        assert (setup.orientation, int(setup.paperSize)) == ("landscape", 9)
        assert (setup.fitToWidth, properties.pageSetUpPr.fitToPage) == (1, True)
        assert page.print_title_rows in ("$1:$4", "$1:$3")
        assert page.freeze_panes in ("A5", "B5")
        assert footer.right.text == "Page &P of &N"
        assert page.protection.sheet
        assert page.protection.password is None
        assert not any(row.hidden for row in page.row_dimensions.values())
        assert not any(column.hidden for column in page.column_dimensions.values())
    inputs = sheet.book["Liabilities"]["G5"]
    assert inputs.font.color.rgb.endswith("0000FF")
    assert not inputs.protection.locked
    assert sheet.book["Liabilities"]["K5"].protection.locked
    assert "[EUR]" in sheet.book["Liabilities"]["G4"].value
    assert "\N{MINUS SIGN}" in sheet.book["Summary"]["C7"].number_format


def test_the_summary_cautions_and_says_what_was_simulated(sheet: Spreadsheet) -> None:
    """The note stands on the first sheet, with the seed and the method of the percentiles."""
    text = " ".join(str(row[0].value) for row in sheet.book["Summary"].iter_rows(max_col=1))
    assert CAUTION in text
    assert "400 paths of hull-white" in text
    assert "seed 7" in text
    assert "order statistics" in text


def test_provenance_names_the_source_and_the_settings(sheet: Spreadsheet) -> None:
    """Enough to make the same figures again."""
    items = {row[0].value: row[1].value for row in sheet.book["Provenance"].iter_rows(min_row=5, max_col=2)}
    assert items["Source file"] == "invented.xlsx"
    assert items["SHA-256 of the source file"] == "ab" * 32
    assert items["SHA-256 of the book's contents"] == examples.book().digest
    assert items["Simulation: seed"] == "7"
    assert items["Written at, UTC"] == "2026-04-01 12:00:00"
    assert str(items["Program"]).startswith("Gapwright ")


CHART = "{http://schemas.openxmlformats.org/drawingml/2006/chart}"


def charts(path: Path) -> list[Any]:
    """The charts of a workbook as XML."""
    with zipfile.ZipFile(path) as archive:
        names = [name for name in archive.namelist() if re.fullmatch(r"xl/charts/chart\d+\.xml", name)]
        return [ElementTree.fromstring(archive.read(name)) for name in names]


def test_charts_have_titles_axes_and_straight_lines(report: Path) -> None:
    """Each chart shows its axes with titles and units, and no line is bent."""
    found = charts(report)
    assert len(found) == 18
    for chart in found:
        assert chart.findall(f".//{CHART}title")
        axes = [axis for kind in ("catAx", "valAx") for axis in chart.iter(f"{CHART}{kind}")]
        shown = [axis for axis in axes if axis.find(f"{CHART}delete").get("val") == "0"]
        assert len(shown) >= 2
        assert all(axis.find(f"{CHART}title") is not None for axis in shown)
        bent = [node for node in chart.iter(f"{CHART}smooth") if node.get("val") != "0"]
        assert not bent


def test_charts_point_at_figures(report: Path, sheet: Spreadsheet) -> None:
    """Every series of every chart refers to cells that hold numbers."""
    for chart in charts(report):
        references = [node.text for node in chart.iter(f"{CHART}f")]
        assert references
        for reference in references:
            name, area = str(reference).rsplit("!", 1)
            first = area.replace("$", "").split(":")[0]
            assert isinstance(sheet.value(name.strip("'"), first), int | float)


def test_without_a_model_the_sheets_of_a_run_are_left_out(tmp_path: Path) -> None:
    """The summary says so, and all else stands."""
    sheet = write(replace(examples.book(), rates_model=None), tmp_path / "report.xlsx")
    assert sheet.book.sheetnames == [name for name in SHEETS if name not in RUN_SHEETS]
    text = " ".join(str(row[0].value) for row in sheet.book["Summary"].iter_rows(max_col=1))
    assert "no rates model" in text
    assert sheet.value(*MASTER) == "OK"


def test_too_many_rows_are_summed_by_line_and_year(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Above the cap the sheet says what was done, and the totals still agree."""
    monkeypatch.setattr(flows, "ROW_CAP", 60)
    sheet = write(examples.book(), tmp_path / "report.xlsx")
    page = sheet.book["Liabilities"]
    assert "90 flows, more than the 60" in page["A2"].value
    rows = [row for row in page.iter_rows(min_row=5, values_only=True) if row[1] is not None]
    assert len({(row[1], row[4], row[5]) for row in rows}) == len(rows) < 90
    total = examples.standing().liabilities.present_value
    assert sheet.value("Liabilities", "K3") == pytest.approx(total, rel=1e-12)
    labels = [row[0].value for row in sheet.book["Checks"].iter_rows(min_row=7)]
    assert "Liabilities: convexity" in labels
    assert "Liabilities: DV01" not in labels
    assert any("DV01" in str(label) and "90" in str(label) for label in labels)
    assert sheet.value(*MASTER) == "OK"


@pytest.mark.parametrize("kind", [CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP])
@pytest.mark.parametrize("by_method", [False, True])
def test_any_curve_is_recomputed(tmp_path: Path, kind: CurveKind, by_method: bool) -> None:
    """Zero rates of quotes that are solved for together agree with their discount factors."""
    of = replace(examples.book(), rates_model=None)
    basis = replace(of.basis, curve_kind=kind, last_liquid_point=float(of.basis.terms[-2]))
    if by_method:
        basis = replace(basis, extrapolation=Extrapolation.SMITH_WILSON, ultimate_forward_rate=0.04)
    sheet = write(replace(of, basis=basis), tmp_path / "report.xlsx")
    values = [sheet.value(name, at) for name, at, _ in sheet.formulas()]
    assert "CHECK" not in values
    assert "#VALUE!" not in values
    items = {row[0].value: row[1].value for row in sheet.book["Basis and curve"].iter_rows(max_col=2)}
    assert items["Curve kind"] == kind
    assert items["Last liquid point"] == basis.last_liquid_point
    assert items.get("Ultimate forward rate") == (0.04 if by_method else None)


@pytest.mark.parametrize("without", ["liabilities", "assets", "both"])
def test_an_empty_side_is_reported(tmp_path: Path, without: str) -> None:
    """Figures without meaning are left open, and the rest still agrees."""
    of = replace(examples.book(), rates_model=None)
    if without in ("liabilities", "both"):
        of = replace(of, liabilities=FlowTable.empty())
    if without in ("assets", "both"):
        of = replace(of, holdings=(), asset_flows=FlowTable.empty())
    sheet = write(of, tmp_path / "report.xlsx")
    assert sheet.value(*MASTER) == "OK"
    values = [sheet.value(name, at) for name, at, _ in sheet.formulas()]
    assert "CHECK" not in values
    assert "#VALUE!" not in values
    if without in ("liabilities", "both"):
        assert sheet.book["Summary"]["C8"].value == "n/a"


def test_a_flow_in_the_year_9999_fails_no_formula(tmp_path: Path) -> None:
    """A row thousands of years away overflows nothing in the workings of the near keys."""
    book = examples.book()
    far = FlowTable.build(["Far", "Near"], [7978.5, 3.0], [1000.0, 1000.0])
    with np.errstate(over="raise"):
        sheet = write(replace(book, liabilities=far), tmp_path / "far.xlsx")
        values = [sheet.value(name, at) for name, at, _ in sheet.formulas()]
    assert "CHECK" not in values
    assert "#VALUE!" not in values
    assert sheet.value(*MASTER) == "OK"


def test_columns_are_wide_enough_for_large_amounts(tmp_path: Path) -> None:
    """Amounts in a currency of small units leave no column of hashes: a digit takes one of its width."""
    book = examples.book()
    large = FlowTable.build(["Large"], [3.0], [12_345_678_901_234_567.0])
    sheet = write(replace(book, liabilities=large), tmp_path / "large.xlsx")
    checked = 0
    for page in sheet.book.worksheets:
        for row in page.iter_rows():
            for cell in row:
                value = sheet.value(page.title, cell.coordinate)
                if cell.number_format.startswith("#,##0") and isinstance(value, float) and abs(value) > 1e12:
                    shown = f"{value:,.2f}" if "0.00" in cell.number_format else f"{value:,.0f}"
                    # A width counts digits; a comma or a point is half as wide as one.
                    digits = sum(letter.isdigit() for letter in shown)
                    width = page.column_dimensions[get_column_letter(cell.column or 1)].width
                    assert width > digits + 0.5 * (len(shown) - digits), (page.title, cell.coordinate)
                    checked += 1
    assert checked > 30


def test_a_long_title_is_cut_over_the_sheet_alone(tmp_path: Path) -> None:
    """It would make the printed page as wide as itself; among the items of the basis it is whole."""
    book = examples.book()
    title = "A fund of a long name " * 100
    sheet = write(replace(book, basis=replace(book.basis, title=title)), tmp_path / "long.xlsx")
    assert len(sheet.book["Summary"]["A1"].value) == 120
    assert title in [cell.value for row in sheet.book["Basis and curve"].iter_rows() for cell in row]


def test_a_stopped_report_leaves_the_former_file(tmp_path: Path) -> None:
    """Whole or not at all: nothing of a stopped report is left behind."""
    path = tmp_path / "report.xlsx"
    path.write_bytes(b"former")

    def stop(part: float) -> None:
        if part > 0.3:
            raise tasks.Cancelled

    with pytest.raises(tasks.Cancelled):
        write_report(examples.reading(), examples.standing(), None, path, progress=stop)
    assert path.read_bytes() == b"former"
    assert list(tmp_path.iterdir()) == [path]


def test_progress_rises_to_one(tmp_path: Path) -> None:
    """Progress never goes back and ends at 1."""
    parts: list[float] = []
    write_report(
        examples.reading(), examples.standing(), examples.simulation(), tmp_path / "r.xlsx",
        progress=parts.append,
    )  # fmt: skip
    assert parts == sorted(parts)
    assert (parts[0], parts[-1]) == (0.0, 1.0)
    assert len(parts) > 10
