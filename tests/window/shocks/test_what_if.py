"""The live what-if: headline, pictures and table follow, and the book stays as it is."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Move, MoveKind, Shock
from desk.valuation.shock_base import shock_base
from desk.valuation.shocks import run_shock
from desk.valuation.what_if import Frame, curve_moves
from desk.window.figures import figures_of
from desk.window.headline import Headline
from desk.window.parts.theme import ThemeSwitch
from desk.window.shocks.hand import handles_of, places_words, shock_of
from desk.window.shocks.station import ShocksStation
from desk.window.shocks.what_if_mode import WhatIfMode
from desk.window.what_if import MOST_MS
from tests.window.benches import Bench, a_fund, dispose
from tests.window.shocks.books import a_shocked_fund, column, settled


@pytest.fixture
def mode(bench: Bench, station: ShocksStation, qtbot: QtBot) -> WhatIfMode:
    """The mode, with the book ready to be moved."""
    station.show_mode("what_if")
    settled(bench, station, qtbot)
    found = station.mode
    assert isinstance(found, WhatIfMode)
    assert bench.document.what_if.is_ready
    return found


def _pull(mode: WhatIfMode, key: str, value: float) -> None:
    mode.rows[key].box.setValue(value)
    mode.document.what_if.show_now()


def test_moves_by_term_and_bend_are_one_line_between_terms() -> None:
    moves = curve_moves(bend=30.0, by_term={1.0: 10.0, 2.0: 0.0, 30.0: -5.0})
    terms = [move.term for move in moves]
    sizes = [move.size for move in moves]
    assert terms == [0.0, 1.0, 2.0, 10.0, 20.0, 30.0]
    at = np.linspace(0.0, 40.0, 81)
    expected = np.interp(at, [0.0, 10.0, 20.0], [-30.0, 30.0, -30.0])
    expected += np.interp(at, [1.0, 2.0, 30.0], [10.0, 0.0, -5.0])
    np.testing.assert_allclose(np.interp(at, np.array(terms, dtype=float), sizes), expected, atol=1e-12)
    assert curve_moves(by_term={1.0: 0.0, 5.0: 0.0}) == ()


def test_handles_are_those_the_book_has() -> None:
    every = handles_of(a_shocked_fund())
    assert {"inflation", "spread", "fund", "level", "term_30"} <= every
    assert "property" not in every
    assert not {"inflation", "fund"} & handles_of(a_fund())
    assert places_words({"level": -25.0, "fund": 10.0}) == "Level −25 bp, Funds +10 %"
    assert shock_of({}).moves == ()
    assert shock_of({"fund": -20.0}).moves == (Move(MoveKind.VALUE, -0.2, target="fund"),)


def test_a_frame_is_the_full_revaluation(bench: Bench, mode: WhatIfMode) -> None:
    before = bench.book
    for key, value in (("level", -60.0), ("bend", 15.0), ("term_5", 20.0), ("fund", -25.0), ("spread", 40.0)):
        _pull(mode, key, value)
    what_if = bench.document.what_if
    assert what_if.shock is not None
    assert what_if.frame is not None
    result = run_shock(shock_base(before), what_if.shock)
    assert what_if.frame.position.surplus == pytest.approx(result.surplus, rel=1e-12)
    assert what_if.frame.change.assets == pytest.approx(result.change_in_assets, rel=1e-9)
    assert bench.book is before
    assert not bench.document.is_modified


def test_many_moves_of_one_turn_are_one_frame(bench: Bench, mode: WhatIfMode, qtbot: QtBot) -> None:
    what_if = bench.document.what_if
    made = what_if.frames
    for value in range(-50, 0):
        mode.rows["level"].slider.setValue(value)
    assert what_if.frames == made
    qtbot.waitUntil(lambda: what_if.frames > made)
    assert what_if.frames == made + 1
    assert what_if.shock == Shock("What-if", (Move(MoveKind.PARALLEL, -1.0),))


def test_headline_pictures_and_table_follow(
    bench: Bench, mode: WhatIfMode, theme_switch: ThemeSwitch, qtbot: QtBot
) -> None:
    headline = Headline(bench.document, theme_switch)
    standing = bench.document.standing
    assert standing is not None
    _pull(mode, "level", -100.0)
    frame = bench.document.what_if.frame
    assert frame is not None
    shown = {button.figure.key: button.figure for button in headline.buttons}
    assert shown["assets"].change.endswith("what-if")
    assert shown["assets"].change.startswith("+")
    assert shown["assets"].change_role == "what_if"
    assert "more before" not in shown["assets"].change_in_words
    assert shown == {figure.key: figure for figure in figures_of(standing, moved=frame.position)}
    assert headline._state.text() == "With the what-if"
    assert "With the what-if" in mode.gap.names
    qtbot.waitUntil(lambda: bool(mode.lines.table_model.rowCount()) and not mode._filling.isActive())
    change = mode.lines.table_model.column_values("change").astype(float)
    sides = np.array(column(mode.lines, "side"))
    assert change[sides == "Assets"].sum() == pytest.approx(frame.change.assets, rel=1e-9)
    assert change[sides == "Liabilities"].sum() == pytest.approx(frame.change.liabilities, rel=1e-9)
    assert mode.station.words.text().startswith("The surplus ")
    mode.shown.setCurrentIndex(1)
    assert mode.years.isVisible()
    assert "Assets, what-if" in mode.years.names
    mode.put_back()
    assert not any(button.figure.change for button in headline.buttons)
    assert "Assets, what-if" not in mode.years.names
    dispose(headline)


def test_escape_puts_it_back(bench: Bench, mode: WhatIfMode) -> None:
    _pull(mode, "slope", 50.0)
    assert bench.document.what_if.is_on
    QTest.keyClick(mode.rows["slope"].slider, Qt.Key.Key_Escape)
    assert not bench.document.what_if.is_on
    assert mode.rows["slope"].value == 0.0
    assert mode.rows["slope"].slider.value() == 0


def test_the_keyboard_pulls_and_types(bench: Bench, mode: WhatIfMode) -> None:
    row = mode.rows["level"]
    QTest.keyClick(row.slider, Qt.Key.Key_Right)
    assert row.value == 1.0
    QTest.keyClick(row.slider, Qt.Key.Key_PageDown)
    assert row.value == -24.0
    QTest.keyClick(row.slider, Qt.Key.Key_0)
    assert row.value == 0.0
    row.box.setFocus()
    row.box.selectAll()
    QTest.keyClicks(row.box, "-412.5")
    QTest.keyClick(row.box, Qt.Key.Key_Return)
    assert row.value == -412.5
    assert row.slider.value() == row.slider.minimum()
    assert row.box.text() == "−412.5"
    row.box.selectAll()
    QTest.keyClicks(row.box, "abc")
    QTest.keyClick(row.box, Qt.Key.Key_Return)
    assert row.value == -412.5
    row.box.selectAll()
    QTest.keyClicks(row.box, "99999")
    QTest.keyClick(row.box, Qt.Key.Key_Return)
    assert row.value == row.handle.most


def test_the_pointer_drags(bench: Bench, mode: WhatIfMode) -> None:
    slider = mode.rows["level"].slider
    middle = slider.rect().center()
    QTest.mousePress(slider, Qt.MouseButton.LeftButton, pos=slider.rect().topRight())
    QTest.mouseMove(slider, middle)
    QTest.mouseRelease(slider, Qt.MouseButton.LeftButton, pos=middle)
    assert not slider.isSliderDown()
    assert bench.document.what_if.shock is not None
    QTest.mouseDClick(slider, Qt.MouseButton.LeftButton, pos=middle)
    assert slider.value() == 0


def test_it_is_kept_under_a_name_asked_in_place(bench: Bench, mode: WhatIfMode, qtbot: QtBot) -> None:
    _pull(mode, "level", -70.0)
    mode.ask_name()
    assert mode.name.isVisible()
    mode.name.line.setText("Crash")
    mode.name.line.setModified(True)
    QTest.keyClick(mode.name.line, Qt.Key.Key_Return)
    assert "already" in mode.name.problem
    assert len(bench.book.shocks) == 3
    mode.name.line.setText("A fall")
    mode.name.line.setModified(True)
    QTest.keyClick(mode.name.line, Qt.Key.Key_Return)
    assert bench.book.shocks[-1] == Shock("A fall", (Move(MoveKind.PARALLEL, -70.0),))
    assert len(bench.book.shocks) == 4
    assert not mode.name.isVisible()
    assert bench.document.what_if.is_on
    mode.ask_name()
    QTest.keyClick(mode.name.line, Qt.Key.Key_Return)
    assert [shock.name for shock in bench.book.shocks[-2:]] == ["A fall", "My what-if"]
    bench.document.undo()
    bench.document.undo()
    assert len(bench.book.shocks) == 3
    mode.ask_name()
    QTest.keyClick(mode.name.line, Qt.Key.Key_Escape)
    assert not mode.name.isVisible()
    assert bench.document.what_if.is_on
    assert len(bench.book.shocks) == 3


def test_an_edit_elsewhere_is_followed(bench: Bench, mode: WhatIfMode, qtbot: QtBot) -> None:
    _pull(mode, "level", -70.0)
    former = bench.document.what_if.frame
    bench.edit_basis(liability_spread=0.03)
    assert bench.document.what_if.frame is None
    qtbot.waitUntil(lambda: bench.document.what_if.frame is not None and not bench.jobs.running)
    frame = bench.document.what_if.frame
    assert frame is not None
    assert former is not None
    result = run_shock(shock_base(bench.book), bench.document.what_if.shock or Shock("", ()))
    assert frame.position.liabilities == pytest.approx(result.liabilities, rel=1e-12)
    assert frame.position.liabilities < former.position.liabilities


def test_another_book_begins_without_one(
    bench: Bench, mode: WhatIfMode, station: ShocksStation, qtbot: QtBot
) -> None:
    _pull(mode, "level", -70.0)
    settled(bench, station, qtbot, a_fund())
    assert not bench.document.what_if.is_on
    assert all(row.value == 0.0 for row in mode.rows.values())
    assert not mode.rows["fund"].isVisible()


def test_a_move_beyond_sense_is_told_and_the_last_frame_stays(bench: Bench, mode: WhatIfMode) -> None:
    _pull(mode, "level", -70.0)
    frame = bench.document.what_if.frame
    bench.document.what_if.move(Shock("What-if", (Move(MoveKind.PARALLEL, -90_000.0),)))
    bench.document.what_if.show_now()
    assert bench.document.what_if.failure
    assert bench.document.what_if.frame is frame
    assert bench.document.what_if.failure in mode.state.text().replace("\N{NO-BREAK SPACE}", " ")
    _pull(mode, "level", -60.0)
    assert not bench.document.what_if.failure


def test_frames_that_take_long_are_left_to_a_thread(bench: Bench, mode: WhatIfMode, qtbot: QtBot) -> None:
    what_if = bench.document.what_if
    engine = what_if._engine
    assert engine is not None
    assert engine.frame_ms < MOST_MS
    what_if._engine = replace(engine, frame_ms=2 * MOST_MS)
    made = what_if.frames
    for value in (-10, -20, -30):
        mode.rows["level"].slider.setValue(value)
        what_if.show_now()
    assert what_if.frames == made
    qtbot.waitUntil(lambda: not bench.jobs.running and what_if.frame is not None)
    shock = what_if.shock
    assert shock is not None
    expected = run_shock(shock_base(bench.book), shock)
    frame = what_if.frame
    assert frame is not None
    assert frame.position.surplus == pytest.approx(expected.surplus, rel=1e-12)
    assert shock.moves == (Move(MoveKind.PARALLEL, -30.0),)


def test_the_figures_of_a_what_if_are_told_to_a_reader_who_listens(bench: Bench, mode: WhatIfMode) -> None:
    standing = tasks.value(bench.book)
    _pull(mode, "level", 50.0)
    frame = bench.document.what_if.frame
    assert frame is not None
    figures = {figure.key: figure for figure in figures_of(standing, moved=frame.position)}
    assert "less than before the what-if" in figures["assets"].change_in_words
    same = {figure.key: figure for figure in figures_of(standing, moved=shock_base(bench.book).position)}
    assert same["assets"].change == "as before"
    assert same["assets"].change_in_words == "unchanged by the what-if"


def test_making_ready_can_be_cancelled_and_begun_again(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    what_if = bench.document.what_if
    station.show_mode("what_if")
    mode = station.mode
    assert isinstance(mode, WhatIfMode)
    assert what_if.is_preparing
    for job in bench.jobs.running:
        bench.jobs.cancel(job)
    qtbot.waitUntil(lambda: not bench.jobs.running, timeout=10_000)
    assert not what_if.is_preparing
    assert not what_if.is_ready
    assert "cancelled" in mode.state.text()
    mode.rows["level"].box.setValue(-40.0)
    qtbot.waitUntil(lambda: what_if.frame is not None, timeout=10_000)
    assert what_if.failure == ""


def test_figures_of_a_former_move_say_so(bench: Bench, mode: WhatIfMode, theme_switch: ThemeSwitch) -> None:
    headline = Headline(bench.document, theme_switch)
    _pull(mode, "level", -40.0)
    assert headline._state.text() == "With the what-if"
    mode.document.what_if.move(Shock("beyond sense", (Move(MoveKind.PARALLEL, -2e6),)))
    mode.document.what_if.show_now()
    assert "zero rate" in bench.document.what_if.failure
    assert "before the last move" in mode.words()
    assert headline._state.text() == "With the what-if before its last move"
    mode.put_back()
    assert headline._state.text() == "Figures are up to date"
    dispose(headline)


def test_a_document_that_stops_while_frames_wait_begins_no_more(
    bench: Bench, mode: WhatIfMode, qtbot: QtBot, monkeypatch: pytest.MonkeyPatch
) -> None:
    what_if = bench.document.what_if
    assert what_if._engine is not None
    what_if._engine = replace(what_if._engine, frame_ms=2 * MOST_MS)
    for size in (-10.0, -20.0, -30.0):
        _pull(mode, "level", size)
    assert what_if._is_due
    bench.document.stop()
    bench.jobs.shutdown()
    assert not bench.jobs.running


def test_a_machine_that_grows_busy_leaves_the_window_awake(
    bench: Bench, mode: WhatIfMode, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A frame that took too long on the window's thread is the last one there."""
    what_if = bench.document.what_if
    _pull(mode, "level", -10.0)
    assert what_if.engine is not None
    frame = what_if.engine.frame

    def slow(shock: Shock) -> Frame:
        time.sleep(4 * MOST_MS / 1e3)
        return frame(shock)

    monkeypatch.setattr(what_if.engine, "frame", slow)
    _pull(mode, "level", -20.0)
    assert what_if.is_threaded
    made = what_if.frames
    _pull(mode, "level", -30.0)
    assert what_if.frames == made
