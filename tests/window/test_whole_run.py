"""The whole run, from opening a book to the written report: the window and the commands give one answer."""

from __future__ import annotations

import json
from pathlib import Path

import openpyxl
import pytest
from pytestqt.qtbot import QtBot

from desk.batch import main
from desk.places import demo_books
from desk.report.as_json import simulation_object, standing_object
from desk.window.main_window import MainWindow
from desk.window.report.station import ReportStation
from desk.window.stations import all_stations

DEMO_BOOKS = sorted(path.name for path in demo_books().glob("*.xlsx"))
PATIENCE = 60_000


def cells_of(path: Path) -> dict[str, list[object]]:
    """Every sheet's cells but those of the provenance, which tell when and from where."""
    workbook = openpyxl.load_workbook(path)
    sheets: dict[str, list[object]] = {
        sheet.title: [tuple(row) for row in sheet.iter_rows(values_only=True)]
        for sheet in workbook.worksheets
        if sheet.title != "Provenance"
    }
    workbook.close()
    return sheets


@pytest.mark.parametrize("name", DEMO_BOOKS)
def test_window_and_commands_give_the_same_figures(
    window: MainWindow, qtbot: QtBot, tmp_path: Path, name: str, capsys: pytest.CaptureFixture[str]
) -> None:
    book = tmp_path / name
    book.write_bytes((demo_books() / name).read_bytes())
    document = window.document

    window.files.open(book)
    qtbot.waitUntil(lambda: document.standing is not None, timeout=PATIENCE)
    with qtbot.waitSignal(document.simulation_changed, timeout=PATIENCE):
        document.run_simulation()
    qtbot.waitUntil(lambda: document.simulation is not None, timeout=PATIENCE)
    for entry in all_stations():
        window.show_station(entry.key)
        window.station(entry.key).refresh_now()
    station = window.station("report")
    assert isinstance(station, ReportStation)
    by_window, by_command = tmp_path / "by_window.xlsx", tmp_path / "by_command.xlsx"
    station.target.set_value(str(by_window))
    station.write()
    qtbot.waitUntil(lambda: bool(station.written) and not document.is_simulating, timeout=PATIENCE)

    assert document.standing is not None
    assert document.simulation is not None
    assert document.reading is not None
    assert main(["value", str(book), "--json"]) == 0
    valued = json.loads(capsys.readouterr().out)
    assert main(["simulate", str(book), "--json"]) == 0
    simulated = json.loads(capsys.readouterr().out)
    faults = document.reading.faults
    shown = (
        standing_object(document.standing, faults, book=document.book, second=document.second_standing),
        simulation_object(document.simulation, faults),
    )
    assert json.loads(json.dumps(shown)) == [valued, simulated]

    assert main(["report", str(book), "--out", str(by_command)]) == 0
    assert cells_of(by_window) == cells_of(by_command)
