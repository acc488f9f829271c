"""The station with a small fund open."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from pytestqt.qtbot import QtBot

from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.station import ScenariosStation
from tests.window.benches import Bench, a_fund, dispose


@pytest.fixture
def bench() -> Iterator[Bench]:
    made = Bench()
    yield made
    made.close()


@pytest.fixture
def station(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[ScenariosStation]:
    made = ScenariosStation(bench.document, bench.jobs, theme_switch)
    made.resize(1130, 586)
    made.show()
    bench.open(a_fund())
    made.refresh_now()
    yield made
    dispose(made)
