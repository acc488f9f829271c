"""Settings with their types, and the books opened lately."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from PySide6.QtCore import QByteArray
from pytestqt.qtbot import QtBot

from desk.window.jobs import Jobs
from desk.window.recent import MOST_RECENT, RecentBooks
from desk.window.settings import Settings


@pytest.fixture
def jobs(qtbot: QtBot) -> Iterator[Jobs]:
    made = Jobs(workers=1)
    yield made
    made.shutdown()


def test_settings_come_back_with_their_types(tmp_path: Path) -> None:
    settings = Settings(tmp_path / "one.ini")
    assert (settings.theme_mode, settings.station, settings.recent) == ("system", "", ())
    assert settings.book_folder is None
    assert settings.geometry.isEmpty()
    settings.theme_mode = "dark"
    settings.station = "curve"
    settings.recent = (Path("a, b.xlsx"),)
    settings.report_folder = tmp_path
    settings.geometry = QByteArray(b"\x00\x01geometry")
    settings.flush()
    again = Settings(tmp_path / "one.ini")
    assert (again.theme_mode, again.station) == ("dark", "curve")
    assert again.recent == (Path("a, b.xlsx"),)
    assert again.report_folder == tmp_path
    assert again.geometry == QByteArray(b"\x00\x01geometry")


@pytest.mark.parametrize("text", ["{}", "not json", "[1, null]", '"word"'])
def test_settings_that_somebody_spoilt_are_as_none(tmp_path: Path, text: str) -> None:
    path = tmp_path / "spoilt.ini"
    quoted = text.replace('"', '\\"')
    path.write_text(
        f'[books]\nrecent="{quoted}"\n[look]\ntheme=pink\n[window]\nlayout_version=many\n', encoding="utf-8"
    )
    settings = Settings(path)
    assert settings.recent == ()
    assert settings.theme_mode == "system"
    assert settings.geometry.isEmpty()


def test_the_latest_is_first_once_and_ten_are_kept(tmp_path: Path, jobs: Jobs) -> None:
    settings = Settings(tmp_path / "s.ini")
    recent = RecentBooks(settings, jobs)
    for number in range(12):
        recent.add(tmp_path / f"{number}.xlsx")
    recent.add(tmp_path / "sub" / ".." / "5.xlsx")
    names = [path.name for path in recent.paths]
    assert names == ["5.xlsx", "11.xlsx", "10.xlsx", *(f"{n}.xlsx" for n in (9, 8, 7, 6, 4, 3, 2))]
    assert len(names) == MOST_RECENT
    assert RecentBooks(settings, jobs).paths == recent.paths


def test_books_that_are_gone_are_dropped(tmp_path: Path, jobs: Jobs, qtbot: QtBot) -> None:
    settings = Settings(tmp_path / "s.ini")
    recent = RecentBooks(settings, jobs)
    there = tmp_path / "there.xlsx"
    there.write_text("a book", encoding="utf-8")
    recent.add(tmp_path / "gone.xlsx")
    recent.add(there)
    with qtbot.waitSignal(recent.changed):
        recent.look()
    assert recent.paths == (there,)
    assert settings.recent == (there,)
    recent.clear()
    assert len(recent.paths) == 0
