"""What the valuation could not do as asked is not hidden."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import pytest
from pytestqt.qtbot import QtBot

from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund, dispose


@pytest.fixture
def bench() -> Iterator[Bench]:
    made = Bench()
    yield made
    made.close()


def test_a_market_value_that_no_spread_gives_is_said(
    bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch
) -> None:
    station = StandingStation(bench.document, bench.jobs, theme_switch)
    station.show()
    document = bench.document
    bond = replace(a_fund().holdings[0], market_value=-5.0)
    bench.open(replace(a_fund(), holdings=(bond,)))
    qtbot.waitUntil(lambda: document.standing is not None and not document.is_valuing)
    station.refresh_now()
    assert document.standing is not None
    (fault,) = document.standing.faults
    assert "no spread gives" in fault.found
    assert document.standing_faults == document.faults == (fault,)
    assert station.stale_text == str(fault)
    with qtbot.waitSignal(station.step_wanted) as wanted:
        station.strip.button.click()
    assert wanted.args == ["intake"]

    document.edit("Mended", replace(bench.book, holdings=a_fund().holdings))
    qtbot.waitUntil(lambda: not document.standing_is_stale and not document.is_valuing)
    station.refresh_now()
    assert len(document.faults) == 0
    assert station.stale_text == ""
    dispose(station)
