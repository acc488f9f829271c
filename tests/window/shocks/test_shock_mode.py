"""One shock: its moves by term, and the user's own edited."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Move, MoveKind, Shock
from desk.rates.compounding import Compounding
from desk.window.shocks.moved import moved_rates
from desk.window.shocks.shock_mode import ShockMode
from desk.window.shocks.station import ShocksStation
from tests.window.benches import Bench
from tests.window.shocks.books import CRASH, FALL, a_shocked_fund, column, settled

TERMS = Shock("By terms", (Move(MoveKind.RATE, 50.0, 2.0), Move(MoveKind.RATE, -20.0, 10.0)))


def _open(station: ShocksStation, shock: Shock) -> ShockMode:
    station.open_shock(shock)
    mode = station.mode
    assert isinstance(mode, ShockMode)
    return mode


def _type(mode: ShockMode, row: int, key: str, text: str) -> bool:
    model = mode.moves.table_model
    return model.setData(model.index(row, model.column_of(key)), text, Qt.ItemDataRole.EditRole)


def test_moves_by_term_are_those_of_the_moved_curve(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    settled(bench, station, qtbot, a_shocked_fund(TERMS))
    mode = _open(station, TERMS)
    terms = mode.terms.table_model.column_values("term").astype(float)
    move = mode.terms.table_model.column_values("move").astype(float)
    np.testing.assert_allclose(move, np.interp(terms, [2.0, 10.0], [50.0, -20.0]), atol=1e-8)
    assert {"Before", "After"} <= set(mode.curve.names)
    assert "“By terms”" in station.words.text()


def test_a_shock_without_moves_of_rates_leaves_the_curve(bench: Bench, station: ShocksStation) -> None:
    rates = moved_rates(bench.book, Shock("x", (Move(MoveKind.VALUE, -0.1),)))
    assert not rates.move_bp.any()
    bad = moved_rates(bench.book, Shock("x", (Move(MoveKind.RATE, 1.0, 5.0), Move(MoveKind.RATE, 2.0, 5.0))))
    assert "twice" in bad.fault


def test_what_a_prescribed_shock_moves_is_shown_and_copied_to_be_changed(
    bench: Bench, station: ShocksStation, qtbot: QtBot
) -> None:
    prescribed = next(
        each.shock for each in tasks.shock(bench.book).results if each.set_name == "EU 2024/856"
    )
    mode = _open(station, prescribed)
    assert not mode.name.isVisible()
    assert "copy it" in mode.source_note.text()
    assert mode.moves.table_model.commit is None
    mode.moves.add_move()
    assert "make a copy" in station.stale_text
    mode.copy()
    settled(bench, station, qtbot)
    assert bench.book.shocks[-1].moves == prescribed.moves
    assert mode.name.isVisible()
    assert mode.name.value == bench.book.shocks[-1].name


def test_size_term_and_target_are_typed_over_and_undone(bench: Bench, station: ShocksStation) -> None:
    mode = _open(station, CRASH)
    assert column(mode.moves, "size") == ["−50.0", "−30.0", "+100.0"]
    assert not mode.moves.isColumnHidden(mode.moves.table_model.column_of("unit"))
    assert _type(mode, 1, "size", "-45")
    assert bench.book.shocks[1].moves[1] == Move(MoveKind.VALUE, -0.45)
    assert _type(mode, 2, "target", "bond")
    assert bench.book.shocks[1].moves[2].target == "bond"
    assert not _type(mode, 0, "term", "5")
    assert "takes no term" in station.stale_text
    bench.document.undo()
    bench.document.undo()
    assert bench.book.shocks[1] == CRASH


def test_the_unit_stands_in_the_heading_where_there_is_one(bench: Bench, station: ShocksStation) -> None:
    mode = _open(station, FALL)
    model = mode.moves.table_model
    assert model.columns[model.column_of("size")].unit == "bp"
    assert mode.moves.isColumnHidden(model.column_of("unit"))


def test_the_kind_is_chosen_or_typed(bench: Bench, station: ShocksStation) -> None:
    mode = _open(station, FALL)
    mode.kind.combo.setCurrentIndex(mode.kind.combo.findText("Rate at a term"))
    mode.kind.combo.activated.emit(mode.kind.combo.currentIndex())
    assert bench.book.shocks[0].moves == (Move(MoveKind.RATE, -80.0, 10.0),)
    assert _type(mode, 0, "kind", "funds and property")
    assert bench.book.shocks[0].moves == (Move(MoveKind.VALUE, -0.1),)
    assert mode.target.isVisible()
    assert not _type(mode, 0, "kind", "sideways")
    assert "There are:" in station.stale_text


def test_moves_are_added_removed_and_pasted(bench: Bench, station: ShocksStation) -> None:
    mode = _open(station, FALL)
    mode.moves.add_move()
    # Two moves of all rates add up: nothing is wrong with them.
    assert len(bench.book.shocks[0].moves) == 2
    mode.moves.go_to(1)
    mode.moves.remove_moves()
    assert bench.book.shocks[0] == FALL
    QGuiApplication.clipboard().setText("Rate at a term\t10\t1\nRate at a term\t30\t10\n")
    mode.moves.selectAll()
    mode.moves.paste()
    assert bench.book.shocks[0].moves == (Move(MoveKind.RATE, 10.0, 1.0), Move(MoveKind.RATE, 30.0, 10.0))
    QGuiApplication.clipboard().setText("Rate at a term\t30\t10\n")
    mode.moves.go_to(0)
    mode.moves.paste()
    assert "twice" in station.stale_text
    assert len(bench.book.shocks[0].moves) == 2


def test_name_source_and_compounding_are_edited(bench: Bench, station: ShocksStation, qtbot: QtBot) -> None:
    mode = _open(station, FALL)
    for field, text in ((mode.name, "Sinking rates"), (mode.source_field, "board, 2031")):
        field.line.setText(text)
        field.line.setModified(True)
        field.line.editingFinished.emit()
    mode.compounding.committed.emit(Compounding.ANNUAL)
    assert bench.book.shocks[0] == replace(
        FALL, name="Sinking rates", source="board, 2031", compounding=Compounding.ANNUAL
    )
    mode.name.line.setText("Crash")
    mode.name.line.setModified(True)
    mode.name.line.editingFinished.emit()
    assert "already" in mode.name.problem
    for _ in range(3):
        bench.document.undo()
    settled(bench, station, qtbot)
    assert bench.book.shocks[0] == FALL
    assert mode.name.value == "Rates fall"


def test_a_shock_is_deleted_and_the_table_shown(bench: Bench, station: ShocksStation) -> None:
    mode = _open(station, CRASH)
    mode.delete()
    assert [shock.name for shock in bench.book.shocks] == ["Rates fall", "Longer lives"]
    assert station.mode is not None
    assert station.mode.key == "table"


@pytest.mark.parametrize("step", [1, -1])
def test_the_tabs_are_stepped_through(station: ShocksStation, step: int) -> None:
    keys = []
    for _ in range(station.tabs.count()):
        station._step(step)
        assert station.mode is not None
        keys.append(station.mode.key)
    assert sorted(keys) == ["grid", "reverse", "shock", "table", "what_if"]
    with pytest.raises(ValueError, match="must be one of"):
        station.mode_of("none")
