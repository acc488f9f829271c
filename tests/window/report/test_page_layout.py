"""Pages of the report: what is on which, and how a planned cell reads."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import pytest
from pytestqt.qtbot import QtBot

from desk.report.results.plan import Block, Formula, SheetPlan
from desk.window.parts.theme import ThemeSwitch
from desk.window.report.page_layout import FORMULA_SIGN, LaidOutSheet, planned_text
from desk.window.report.page_preview import PagePreview


def a_plan(name: str = "Flows", count: int = 200, *, one_page: bool = False) -> SheetPlan:
    """Headings in row 4 and a block of numbered rows below."""

    def rows() -> Iterator[Sequence[Any]]:
        for number in range(count):
            yield (f"line {number}", float(number), Formula("=A1"))

    plan = SheetPlan(name, f"Title of {name}", "A note")
    plan.widths = {1: 20.0, 2: 12.0, 3: 12.0}
    plan.headings(["Line", "Amount", "Check"])
    plan.block = Block(5, count, ("text", "reported", "live"), ("text", "money", "money"), rows)
    plan.is_one_page = one_page
    return plan


@pytest.mark.parametrize(
    ("value", "form", "text"),
    [
        (None, "text", ""),
        (Formula("=1+1"), "money", FORMULA_SIGN),
        ("=1+1", "text", "=1+1"),
        (-1234.5, "money2", "−1,234.50"),
        (0.0375, "rate", "3.7500%"),
        (0.92, "share", "92.00%"),
        (float("nan"), "money", "n/a"),
        (1.5e-12, "tiny", "1.5E−12"),
        (0.25, "term", "0.25"),
        (True, "text", "TRUE"),
    ],
)
def test_a_planned_cell_reads_as_in_a_spreadsheet(value: object, form: str, text: str) -> None:
    assert planned_text(value, form) == text


def test_every_row_is_on_one_page_and_headings_on_all() -> None:
    sheet = LaidOutSheet(a_plan())
    assert sheet.page_count > 3
    seen: list[int] = []
    for page in range(sheet.page_count):
        rows = sheet.rows_on(page)
        assert rows[:4] == [1, 2, 3, 4]
        seen += rows if page == 0 else rows[4:]
    assert seen == list(range(1, 205))


def test_a_page_is_not_taller_than_its_paper() -> None:
    sheet = LaidOutSheet(a_plan())
    for page in range(sheet.page_count):
        height = sum(sheet.height_of(row) for row in sheet.rows_on(page))
        assert height * sheet.scale <= 595 - 43 - 54


def test_a_sheet_on_one_page_is_made_to_fit() -> None:
    sheet = LaidOutSheet(a_plan(one_page=True))
    assert sheet.page_count == 1
    assert sheet.scale < 0.2


def test_rows_of_a_block_come_in_any_order() -> None:
    sheet = LaidOutSheet(a_plan(count=50))
    assert sheet.cells_in(54)[1].value == "line 49"
    assert sheet.cells_in(5)[1].value == "line 0"
    assert sheet.cells_in(55) == {}


def test_an_empty_block_leaves_one_page() -> None:
    sheet = LaidOutSheet(a_plan(count=0))
    assert sheet.page_count == 1
    assert sheet.row_count == 4


def test_pages_are_turned_and_the_sheet_stays(qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    preview = PagePreview(theme_switch)
    qtbot.addWidget(preview)
    preview.resize(700, 500)
    preview.show()
    preview.show_plans([a_plan("One"), a_plan("Two")], "file.xlsx", "")
    assert preview.shown[:2] == ("One", 1)
    assert not preview.back.isEnabled()
    preview.show_sheet("Two")
    preview.on.click()
    preview.on.click()
    assert preview.shown[:2] == ("Two", 3)
    preview.turn(-99)
    assert preview.shown[:2] == ("Two", 1)
    preview.turn(2)
    preview.show_plans([a_plan("Two"), a_plan("Three")], "file.xlsx", "")
    assert preview.shown[:2] == ("Two", 3)
    preview.show_plans([], "", "nothing")
    assert preview.shown == ("", 0, 0)
