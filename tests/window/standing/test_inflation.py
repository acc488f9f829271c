"""Inflation in the station: its page, its picture beside that of rates, and flows in today's money."""

from __future__ import annotations

import numpy as np
import pytest
from pytestqt.qtbot import QtBot

from desk.window.standing.pictures import FLOWS, FLOWS_IN_REAL
from desk.window.standing.station import StandingStation
from tests.window.benches import Bench, a_fund
from tests.window.standing.books import INFLATION, column, show, with_inflation


def test_without_inflation_nothing_of_it_is_shown(station: StandingStation) -> None:
    assert not station.pages.has_page("inflation")
    assert station.money.isHidden()
    assert station.inflation_picture is None


def test_the_page_has_the_figures_of_the_standing(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, with_inflation())
    standing = bench.document.standing
    assert standing is not None
    inflation = standing.inflation
    assert inflation is not None
    assert inflation.dv01_liabilities > 0.0
    totals = station.inflation.totals.table_model
    assert totals.column_values("inflation_duration").tolist() == [
        inflation.assets_duration,
        inflation.liabilities_duration,
        inflation.real_duration_gap,
    ]
    assert totals.column_values("inflation_dv01")[2] == inflation.dv01_gap
    assert totals.column_values("rate_duration")[2] == standing.duration_gap
    keys = station.inflation.key_rates.table_model
    assert keys.column_values("liabilities").sum() == pytest.approx(inflation.liabilities_duration)
    assert np.isfinite(keys.column_values("rate_gap")).all()
    assert keys.column_values("gap").sum() == pytest.approx(inflation.dv01_gap, rel=1e-3)


def test_its_picture_stands_beside_that_of_rates(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, with_inflation())
    station.pages.show_page("inflation")
    picture = station.inflation_picture
    assert picture is not None
    assert picture.isVisible()
    assert station.key_rate_picture.isVisible()
    assert station.flow_picture.isHidden()
    readings = dict(picture.readings_at(7.0))
    assert readings["Gap"].startswith("−")
    assert "Widest gap" in picture.description
    station.pages.show_page("lines")
    assert picture.isHidden()
    assert station.flow_picture.isVisible()
    widths = station.pictures.sizes()
    assert abs(widths[0] - widths[1]) <= 2


def test_flows_are_shown_in_todays_money(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    show(bench, station, qtbot, with_inflation())
    standing = bench.document.standing
    assert standing is not None
    assert standing.inflation is not None
    assert not station.money.isHidden()
    paid = station.periods.table_model.column_values("liabilities")
    np.testing.assert_allclose(paid, standing.periods.liabilities)
    station.money.setCurrentIndex(1)
    assert station.flow_picture.title == FLOWS_IN_REAL
    assert station.periods.table_model.columns[1].shown_unit == "EUR of today"
    real = station.periods.table_model.column_values("liabilities")
    np.testing.assert_allclose(real, standing.inflation.real_periods.liabilities)
    # 100,000 a year in today's money, and 40,000 that lose what prices rise by.
    factor = float(INFLATION.curve.discount(1.0))
    assert real[0] == pytest.approx(100_000.0 + 40_000.0 * factor, rel=1e-6)
    station.money.setCurrentIndex(0)
    assert station.flow_picture.title == FLOWS


def test_a_book_without_inflation_takes_the_page_away(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, with_inflation())
    station.pages.show_page("inflation")
    station.money.setCurrentIndex(1)
    show(bench, station, qtbot, a_fund())
    assert not station.pages.has_page("inflation")
    assert station.pages.current == "lines"
    assert station.money.isHidden()
    assert station.flow_picture.isVisible()
    assert station.flow_picture.title == FLOWS
    assert column(station.periods, "liabilities")[0] == "140,000"


def test_lines_and_flows_show_what_inflation_does(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    show(bench, station, qtbot, with_inflation())
    standing = bench.document.standing
    assert standing is not None
    assert standing.inflation is not None
    moved = station.lines.table.table_model.column_values("inflation_dv01")
    assert moved.sum() == pytest.approx(standing.inflation.dv01_assets + standing.inflation.dv01_liabilities)
    totals = station.lines.totals.table_model.column_values("inflation_dv01")
    assert totals[1] == standing.inflation.dv01_liabilities
    station.lines.open_row(3)
    flows = station.lines.flows.table_model
    real, growth = flows.column_values("real_amount"), flows.column_values("index_factor")
    assert real.tolist() == [100_000.0] * 10
    np.testing.assert_allclose(real * growth, flows.column_values("amount"))
    assert growth[-1] == pytest.approx(1.02**10)
    station.lines.open_row(4)
    assert "real_amount" not in [each.key for each in station.lines.flows.table_model.columns]


def test_the_order_of_the_lines_stays_when_columns_come_and_go(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    station.lines.show_side("all", by="present_value")
    before = column(station.lines.table, "line")
    assert before[0] == "pensions"
    show(bench, station, qtbot, with_inflation())
    model = station.lines.table.table_model
    values = model.column_values("present_value")
    shown = [values[model.source_row(row)] for row in range(model.rowCount())]
    assert shown == sorted(values, reverse=True)
