"""A station Curve with the small fund in it."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from desk.window.curve.station import CurveStation
from desk.window.parts.theme import ThemeSwitch
from tests.window.benches import Bench, a_fund, dispose


@pytest.fixture
def bench() -> Iterator[Bench]:
    made = Bench()
    yield made
    made.close()


@pytest.fixture
def station(bench: Bench, theme_switch: ThemeSwitch) -> Iterator[CurveStation]:
    made = CurveStation(bench.document, bench.jobs, theme_switch)
    made.resize(1130, 586)
    made.show()
    bench.open(a_fund())
    made.refresh_now()
    yield made
    dispose(made)
