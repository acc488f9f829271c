"""Opening and saving: what takes the open book's place, and what becomes of unsaved changes."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from pytestqt.qtbot import QtBot

from desk import places
from desk.window.dialogs import Choice
from tests.window.frame import GRAVE, Frame, a_book, a_reading


def _idle(frame: Frame, qtbot: QtBot) -> None:
    qtbot.waitUntil(lambda: not frame.jobs.running)


def test_a_book_that_is_read_is_opened_and_remembered(opened: Frame) -> None:
    path = opened.folder / "fund.xlsx"
    assert opened.document.path == path
    assert opened.window.recent.paths == (path,)
    assert opened.settings.book_folder == opened.folder
    assert opened.window.shown == "standing"


def test_a_workbook_with_grave_faults_leaves_the_open_book(opened: Frame, qtbot: QtBot) -> None:
    before = opened.document.book
    opened.edit()
    edited = opened.document.book
    bad = opened.folder / "bad.xlsx"
    opened.read.readings["bad.xlsx"] = a_reading(None, bad, faults=[GRAVE])
    opened.window.files.open(bad)
    _idle(opened, qtbot)
    assert opened.document.book is edited is not before
    assert opened.document.is_modified
    assert opened.dialogs.asked == [], "nothing was to be replaced, so nothing was asked"
    assert opened.window.shown == "intake"
    assert "fund.xlsx stays open, unchanged" in opened.window.foot.text
    assert bad not in opened.window.recent.paths


@pytest.mark.parametrize("choice", list(Choice))
def test_unsaved_changes_are_asked_about_before_another_book_comes(
    opened: Frame, qtbot: QtBot, choice: Choice
) -> None:
    opened.edit()
    edited = opened.document.book
    opened.dialogs.choice = choice
    opened.dialogs.save_path = opened.folder / "kept.xlsx"
    opened.window.files.open(opened.folder / "other.xlsx")
    _idle(opened, qtbot)
    assert opened.dialogs.asked[0] == "unsaved fund.xlsx before other.xlsx is opened"
    book = opened.document.book
    assert book is not None
    if choice is Choice.CANCEL:
        assert book is edited
        assert opened.document.is_modified
    else:
        assert book.basis.title == "other"
        assert not opened.document.is_modified
    assert [path.name for _, path in opened.save.saved] == (["kept.xlsx"] if choice is Choice.SAVE else [])
    if choice is Choice.SAVE:
        assert opened.save.saved[0][0] is edited


def test_a_save_that_fails_keeps_the_book_and_opens_nothing(opened: Frame, qtbot: QtBot) -> None:
    opened.edit()
    opened.dialogs.choice = Choice.SAVE
    opened.dialogs.save_path = opened.folder / "kept.xlsx"
    opened.save.error = OSError(28, "No space left on device")
    opened.window.files.open(opened.folder / "other.xlsx")
    _idle(opened, qtbot)
    assert opened.document.is_modified
    assert opened.document.path == opened.folder / "fund.xlsx"
    assert "No space left on device" in opened.window.foot.text


def test_saving_asks_where_to_once_and_never_suggests_the_source(opened: Frame, qtbot: QtBot) -> None:
    opened.edit()
    target = opened.folder / "mine.xlsx"
    opened.dialogs.save_path = target
    opened.window.files.save()
    _idle(opened, qtbot)
    assert opened.dialogs.suggested == [opened.folder / "fund (copy).xlsx"]
    assert not opened.document.is_modified
    assert opened.document.path == target
    opened.edit(0.02)
    opened.window.files.save()
    _idle(opened, qtbot)
    assert opened.dialogs.asked == ["save"]
    assert [path for _, path in opened.save.saved] == [target, target]
    assert not opened.document.is_modified


def test_a_demo_book_is_saved_among_the_readers_own_files(opened: Frame, qtbot: QtBot) -> None:
    demo = places.demo_books() / "pension_fund.xlsx"
    opened.window.files.open(demo)
    _idle(opened, qtbot)
    opened.window.files.save()
    assert opened.dialogs.suggested[-1].parent == opened.folder
    assert opened.settings.book_folder == opened.folder


@pytest.mark.parametrize("agreed", [False, True])
def test_the_source_is_replaced_only_when_the_reader_says_so(
    opened: Frame, qtbot: QtBot, agreed: bool
) -> None:
    opened.edit()
    opened.dialogs.save_path = opened.folder / "fund.xlsx"
    opened.dialogs.overwrite = agreed
    opened.window.files.save()
    _idle(opened, qtbot)
    assert "formulas" in opened.dialogs.asked[-1]
    assert (opened.folder / "fund.xlsx").read_text() == ("copy 1" if agreed else "a workbook")
    assert opened.document.is_modified is not agreed


def test_a_file_that_changed_since_it_was_saved_is_asked_about(opened: Frame, qtbot: QtBot) -> None:
    target = opened.folder / "mine.xlsx"
    opened.dialogs.save_path = target
    opened.window.files.save()
    _idle(opened, qtbot)
    target.write_text("from a colleague", encoding="utf-8")
    os.utime(target, ns=(1, 1))
    opened.edit()
    opened.window.files.save()
    _idle(opened, qtbot)
    assert "Somebody changed the file" in opened.dialogs.asked[-1]
    assert target.read_text() == "from a colleague"


def test_an_edit_while_saving_stays_unsaved(opened: Frame, qtbot: QtBot) -> None:
    opened.edit(0.01)
    opened.dialogs.save_path = opened.folder / "mine.xlsx"
    opened.save.let_go.clear()
    opened.window.files.save()
    opened.edit(0.02, "Another change")
    opened.save.let_go.set()
    _idle(opened, qtbot)
    assert opened.document.is_modified
    opened.document.undo()
    assert not opened.document.is_modified


def test_two_saves_are_written_one_after_the_other(opened: Frame, qtbot: QtBot) -> None:
    opened.edit(0.01)
    opened.dialogs.save_path = opened.folder / "mine.xlsx"
    opened.save.let_go.clear()
    opened.window.files.save()
    opened.edit(0.02)
    opened.window.files.save()
    opened.save.let_go.set()
    qtbot.waitUntil(lambda: len(opened.save.saved) == 2 and not opened.jobs.running)
    assert [book.basis.liability_spread for book, _ in opened.save.saved] == [0.01, 0.02]
    assert not opened.document.is_modified


def test_a_file_that_is_gone_is_said_and_forgotten(opened: Frame, qtbot: QtBot) -> None:
    gone = opened.folder / "gone.xlsx"
    opened.window.recent.add(gone)
    opened.read.error = FileNotFoundError(2, "No such file or directory")
    opened.window.files.open(gone)
    _idle(opened, qtbot)
    assert "gone.xlsx could not be read: No such file" in opened.window.foot.text
    assert gone not in opened.window.recent.paths
    assert opened.document.path == opened.folder / "fund.xlsx"


def test_reading_again_takes_the_file_of_the_last_reading(opened: Frame, qtbot: QtBot) -> None:
    bad = opened.folder / "bad.xlsx"
    opened.read.readings["bad.xlsx"] = a_reading(None, bad, faults=[GRAVE])
    opened.window.files.open(bad)
    _idle(opened, qtbot)
    opened.read.readings["bad.xlsx"] = a_reading(a_book(title="mended"), bad)
    opened.window.files.read_again()
    _idle(opened, qtbot)
    assert opened.read.paths[-1] == bad
    assert opened.document.book is not None
    assert opened.document.book.basis.title == "mended"


def test_opening_another_while_one_is_read_drops_the_first(frame: Frame, qtbot: QtBot) -> None:
    frame.read.let_go.clear()
    frame.window.files.open(Path("first.xlsx"))
    frame.window.files.open(Path("second.xlsx"))
    frame.read.let_go.set()
    _idle(frame, qtbot)
    assert frame.document.path == Path("second.xlsx")
