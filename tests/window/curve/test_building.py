"""Curves of many bonds: built in the background, with the former one kept until then."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from pytestqt.qtbot import QtBot

from desk.book import BondFit, CurveBonds
from desk.window.curve import building
from desk.window.curve.station import CurveStation
from tests.window.benches import Bench
from tests.window.curve.books import edit, some_bonds, with_bonds


def _many(count: int = 90) -> CurveBonds:
    terms = np.linspace(1.0, 28.0, count)
    bonds = some_bonds(terms, 0.02 + 0.01 * terms / 30.0)
    days = (365.25 * np.linspace(1.0, 28.0, count)).astype(int)
    return replace(bonds, maturity=np.datetime64("2031-03-31") + days)


def _settled(station: CurveStation, qtbot: QtBot) -> None:
    qtbot.waitUntil(lambda: not (station.builder.words or station.redrawer.words), timeout=10_000)


@pytest.fixture
def fitted_here(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The threads on which sheets of many bonds were fitted."""
    import threading

    from desk.book import bond_curve

    found: list[str] = []
    for name in ("fit_svensson", "fit_nelson_siegel", "bootstrap"):
        real = getattr(bond_curve, name)

        def noted(flows: object, *, _real: object = real, **more: object) -> object:
            if len(flows) > 60:  # type: ignore[arg-type]  # whatever has a length
                found.append(threading.current_thread().name)
            return _real(flows, **more)  # type: ignore[operator]  # one of the three above

        monkeypatch.setattr(bond_curve, name, noted)
    return found


@pytest.fixture
def crowded(station: CurveStation, bench: Bench, qtbot: QtBot, fitted_here: list[str]) -> CurveStation:
    """With a curve of ninety bonds."""
    bench.open(with_bonds(bonds=_many(), bond_fit=BondFit.NELSON_SIEGEL))
    station.refresh_now()
    _settled(station, qtbot)
    return station


def test_an_opened_book_is_drawn_when_its_curve_is_there(
    crowded: CurveStation, fitted_here: list[str]
) -> None:
    assert not crowded.stale_text
    assert crowded.picture.description
    assert fitted_here
    assert all(name.startswith("gapwright") for name in fitted_here)


def test_an_edit_waits_with_the_former_curve_in_use(
    crowded: CurveStation, bench: Bench, qtbot: QtBot, fitted_here: list[str]
) -> None:
    before, drawn = bench.book, crowded.picture.description
    assert edit(crowded.bonds.table, 40, "yield", "5")
    assert bench.book is before
    assert crowded.picture.description == drawn
    assert "drawn through 90 bonds" in crowded.stale_text
    assert "The former curve stays in use until then." in crowded.stale_text
    _settled(crowded, qtbot)
    bonds = bench.book.basis.bonds
    assert bonds is not None
    assert bonds.bond_yield[40] == pytest.approx(0.05)
    assert not crowded.stale_text
    assert all(name.startswith("gapwright") for name in fitted_here)
    bench.document.undo()
    assert bench.book == before


def test_the_latest_edit_wins_and_has_the_ones_before_in_it(
    crowded: CurveStation, bench: Bench, qtbot: QtBot
) -> None:
    edits = len(crowded.bonds.bonds)
    for row in range(3):
        assert edit(crowded.bonds.table, row, "yield", f"{row + 1}")
    assert len(crowded.bonds.bonds) == edits
    _settled(crowded, qtbot)
    bonds = bench.book.basis.bonds
    assert bonds is not None
    np.testing.assert_allclose(bonds.bond_yield[:3], [0.01, 0.02, 0.03])


def test_giving_up_leaves_the_former_curve(crowded: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    before = bench.book
    edit(crowded.bonds.table, 40, "yield", "5")
    crowded._discard()
    qtbot.waitUntil(lambda: not bench.jobs.running, timeout=10_000)
    assert bench.book is before
    assert not crowded.stale_text
    assert crowded.bonds.bonds == before.basis.bonds


def test_bonds_that_give_no_curve_are_told(crowded: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    before = bench.book
    bonds = crowded.bonds.bonds
    maturity = bonds.maturity.copy()
    maturity[3] = np.datetime64("2001-01-01")
    assert not crowded.bonds.take("A bond that has matured", replace(bonds, maturity=maturity))
    _settled(crowded, qtbot)
    assert bench.book is before
    assert "matur" in crowded.stale_text
    assert "The curve is unchanged." in crowded.stale_text


def test_another_edit_meanwhile_is_kept(crowded: CurveStation, bench: Bench, qtbot: QtBot) -> None:
    edit(crowded.bonds.table, 40, "yield", "5")
    book = bench.book
    bench.document.edit("Title", replace(book, basis=replace(book.basis, title="Another")))
    crowded.refresh_now()
    qtbot.waitUntil(
        lambda: bench.book.basis.bonds is not None and bench.book.basis.bonds.bond_yield[40] == 0.05,
        timeout=10_000,
    )
    assert bench.book.basis.title == "Another"
    _settled(crowded, qtbot)


def test_few_bonds_are_drawn_at_once(station: CurveStation, bench: Bench) -> None:
    bench.open(with_bonds())
    station.refresh_now()
    assert not station.redrawer.words
    assert not building.must_wait(bench.book.basis, station.target.part)
