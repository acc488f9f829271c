"""What the tests of the station share: a run that comes to its end, and its parts."""

from __future__ import annotations

from pytestqt.qtbot import QtBot

from desk.scenarios.records import Simulation
from desk.window.parts.tables import Table
from desk.window.scenarios.paths_part import PathsPart
from desk.window.scenarios.station import ScenariosStation
from tests.window.benches import Bench

__all__ = ["column", "keys", "paths_part", "run", "settle"]


def run(station: ScenariosStation, bench: Bench, qtbot: QtBot) -> Simulation:
    """Run the scenarios and wait until all is drawn."""
    station.run()
    qtbot.waitUntil(lambda: not bench.document.is_simulating, timeout=20_000)
    station.refresh_now()
    settle(station, qtbot)
    simulation = bench.document.simulation
    assert simulation is not None
    return simulation


def settle(station: ScenariosStation, qtbot: QtBot) -> None:
    """Wait until the part that is shown has drawn what it was asked to."""
    qtbot.waitUntil(lambda: not station.is_busy)


def paths_part(station: ScenariosStation) -> PathsPart:
    """The part with the fan and the histogram."""
    part = station.part_of("paths")
    assert isinstance(part, PathsPart)
    return part


def column(table: Table, key: str) -> list[str]:
    """The texts of a column."""
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]


def keys(table: Table) -> list[str]:
    """The keys of the columns."""
    return [each.key for each in table.table_model.columns]
