"""The station Standing: sentence, pictures, tables, lines opened, rows of a headline figure, stale marks."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from datetime import date

import numpy as np
import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk.book import Book, FlowTable, Holding, HoldingKind, Side
from desk.valuation.records import FlowDetail, Periods, Standing
from desk.valuation.standing import stand
from desk.window.parts.tables import Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.pictures import FlowPicture
from desk.window.standing.station import StandingStation
from desk.window.standing.wording import amount, plain_reading, verdict
from tests.window.benches import Bench, a_fund, dispose


@pytest.fixture
def bench() -> Iterator[Bench]:
    made = Bench()
    yield made
    made.close()


def wait_for_standing(bench: Bench, qtbot: QtBot) -> Standing:
    qtbot.waitUntil(lambda: not bench.document.is_valuing)
    standing = bench.document.standing
    assert standing is not None
    return standing


@pytest.fixture
def station(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[StandingStation]:
    made = StandingStation(bench.document, bench.jobs, theme_switch)
    made.resize(1130, 586)
    made.show()
    bench.open(a_fund())
    wait_for_standing(bench, qtbot)
    made.refresh_now()
    yield made
    dispose(made)


def column(table: Table, key: str) -> list[str]:
    """One column as shown."""
    model = table.table_model
    place = model.column_of(key)
    return [str(model.data(model.index(row, place))) for row in range(model.rowCount())]


# What is shown


def test_without_a_book_it_asks_for_one(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    station = StandingStation(bench.document, bench.jobs, theme_switch)
    station.show()
    assert station.is_empty
    assert station.reading.isHidden()
    with qtbot.waitSignal(station.step_wanted) as wanted:
        station.empty.button.click()
    assert wanted.args == ["open"]
    dispose(station)


def test_the_lines_are_those_of_the_standing(station: StandingStation, bench: Bench) -> None:
    standing = bench.document.standing
    assert standing is not None
    assert column(station.lines.table, "line") == ["bond", "zero", "rent", "pensions", "spouses"]
    assert column(station.lines.table, "side") == ["Assets"] * 3 + ["Liabilities"] * 2
    values = station.lines.table.table_model.column_values("present_value")
    assert values.tolist() == [line.measures.present_value for line in standing.lines]
    # The zero with a market value is worth that, at the spread that makes it so.
    assert column(station.lines.table, "present_value")[1] == "230,000"
    assert column(station.lines.table, "market_value")[:2] == ["–", "230,000"]


def test_totals_stay_in_view_and_are_the_sides(station: StandingStation, bench: Bench) -> None:
    standing = bench.document.standing
    assert standing is not None
    totals = station.lines.totals.table_model
    assert totals.column_values("present_value").tolist() == [
        standing.assets.present_value,
        standing.liabilities.present_value,
    ]
    assert totals.column_values("flow_count").tolist() == [14.0, 20.0]
    assert not station.lines.totals.isHidden()
    places = range(len(totals.columns))
    widths = [station.lines.table.columnWidth(place) for place in places]
    assert widths == [station.lines.totals.columnWidth(place) for place in places]


def test_spread_durations_credit_losses_and_what_a_floater_pays(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    end = date(2041, 3, 31)
    floater = Holding("floater", HoldingKind.FLOATER, 1e6, frequency=1, maturity=end, current_rate=0.03)
    risky = Holding("risky", HoldingKind.ZERO, 1e6, maturity=end, default_rate=0.02, recovery_rate=0.4)
    fund = Holding("fund", HoldingKind.FUND, market_value=5e5, duration=4.0)
    book = replace(a_fund(), holdings=(floater, risky, fund))
    bench.open(book)
    standing = wait_for_standing(bench, qtbot)
    station.refresh_now()
    durations = column(station.lines.table, "spread_duration")
    assert durations[1:3] == ["10.01", "–"]
    assert 8.0 < float(durations[0]) < 9.5
    loss = standing.lines[1].expected_credit_loss
    assert loss is not None
    losses = station.lines.table.table_model.column_values("expected_credit_loss")
    assert losses[1] == loss
    assert column(station.lines.table, "expected_credit_loss")[::2] == ["–"] * 3
    assert station.lines.totals.table_model.column_values("expected_credit_loss")[0] == loss
    station.lines.open_row(0)
    paid = station.lines.flows.table_model.column_values("amount")
    assert paid.size == 10
    assert paid[0] == pytest.approx(3e4)
    assert paid[-1] > 1e6


def test_the_flows_are_mirrored_and_both_zeros_stand_on_one_line(
    station: StandingStation, bench: Bench
) -> None:
    standing = bench.document.standing
    assert standing is not None
    picture = station.flow_picture
    readings = dict(picture.readings_at(1.0))
    assert readings["Assets"].endswith("EUR thousand")
    assert readings["Liabilities"] == "−140.0 EUR thousand"
    assert set(picture.names) == {"Assets", "Liabilities", "Cumulative net"}
    picture.settle()
    home, right = picture._home, picture._home_right
    assert home is not None
    assert right is not None
    assert home[2] / home[3] == pytest.approx(right[0] / right[1])
    assert right[0] <= standing.periods.cumulative.min()
    assert right[1] >= standing.periods.cumulative.max()
    assert home[2] <= -140_000.0
    assert picture._y_heading.text() == "A year, EUR thousand"
    assert picture._right_heading.text() == "Cumulative"
    assert picture._right.shown_unit == "EUR thousand"


def test_a_line_far_below_zero_does_not_press_the_bars(qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    year = np.arange(1, 41)
    assets, owed = np.where(year < 10, 130.0, 0.0), np.full(40, 150.0)
    net = assets - owed
    picture = FlowPicture(theme_switch)
    qtbot.addWidget(picture)
    picture.resize(500, 400)
    picture.show_periods(Periods(year, assets, owed, net, np.cumsum(net)), "EUR")
    picture.settle()
    home, right = picture._home, picture._home_right
    assert home is not None
    assert right is not None
    assert 280.0 / (home[3] - home[2]) > 0.9
    assert home[2] / home[3] == pytest.approx(right[0] / right[1])
    assert right[0] <= np.cumsum(net).min()


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_line_has_room_where_there_are_no_bars(
    qtbot: QtBot, theme_switch: ThemeSwitch, sign: float
) -> None:
    year, flow, none = np.arange(1, 4), np.full(3, 10.0), np.zeros(3)
    picture = FlowPicture(theme_switch)
    qtbot.addWidget(picture)
    cumulative = sign * np.array([-5.0, -9.0, -20.0])
    picture.show_periods(
        Periods(year, flow if sign > 0 else none, none if sign > 0 else flow, flow, cumulative), "EUR"
    )
    picture.settle()
    right = picture._home_right
    assert right is not None
    assert right[0] <= cumulative.min()
    assert right[1] >= cumulative.max()


def test_key_rates_show_both_sides_and_the_gap(station: StandingStation, bench: Bench) -> None:
    standing = bench.document.standing
    assert standing is not None
    readings = dict(station.key_rate_picture.readings_at(6.0))
    gap = standing.key_rates.dv01_assets[6] - standing.key_rates.dv01_liabilities[6]
    assert readings["Gap"].replace("−", "-") == f"{gap:.0f}"
    assert station.key_rates.table_model.rowCount() == standing.key_rates.term.size


def test_periods_and_conditions_have_their_tables(station: StandingStation) -> None:
    assert column(station.periods, "liabilities")[0] == "140,000"
    table = station.conditions.table
    assert column(table, "name")[0] == "Present value"
    assert set(column(table, "verdict")) <= {"✓ holds", "✗ does not hold"}
    assert column(table, "unit") == ["EUR", "EUR × years", "EUR × years²"]
    assert "Present value times duration is the same" in station.conditions.words.text()


def test_the_tabs_show_one_table_at_a_time(station: StandingStation) -> None:
    station.pages.show_page("redington")
    assert station.pages.current == "redington"
    assert station.conditions.isVisible()
    assert not station.lines.isVisible()
    assert not station.lines.finder.isVisible()


def test_the_pictures_stand_as_the_height_allows(station: StandingStation) -> None:
    station.resize(1130, 586)
    assert station.pictures.orientation() is Qt.Orientation.Horizontal
    station.resize(1290, 1000)
    assert station.pictures.orientation() is Qt.Orientation.Vertical


# The sentence


def test_a_shortfall_is_said_with_what_a_fall_of_rates_does_to_it(bench: Bench) -> None:
    standing = replace(
        stand(a_fund()), surplus=-185_243_118.8, funding_ratio=0.92, dv01_gap=-2_436_657.0, currency="EUR"
    )
    assert plain_reading(standing) == (
        "The assets cover 92.0\u202f% of the promises, a shortfall of EUR 185.2 million. If all rates fall "
        "by 1 percentage point, the shortfall grows by about EUR 243.7 million: a first estimate from the "
        "DV01 gap."
    )


@pytest.mark.parametrize(
    ("surplus", "gap", "part"),
    [
        (-5e6, 1e4, "the shortfall shrinks by about EUR 1.0 million:"),
        (5e6, -1e4, "the surplus shrinks by about EUR 1.0 million:"),
        (5e6, -1e5, "shrinks by about EUR 10.0 million, more than there is of it:"),
        (5e6, 1e4, "the surplus grows by about EUR 1.0 million:"),
        (5e6, 0.0, "leaves that as it is"),
    ],
)
def test_every_direction_has_its_words(surplus: float, gap: float, part: str) -> None:
    standing = replace(stand(a_fund()), surplus=surplus, funding_ratio=1.0, dv01_gap=gap)
    assert part in plain_reading(standing)


def test_a_side_that_is_empty_is_said() -> None:
    book = a_fund()
    nothing = FlowTable.empty()
    assert "against no liabilities" in plain_reading(stand(replace(book, liabilities=nothing)))
    unbacked = replace(book, holdings=(), asset_flows=nothing)
    assert "No assets are held against promises worth EUR" in plain_reading(stand(unbacked))
    assert "neither" in plain_reading(stand(replace(unbacked, liabilities=nothing)))


def test_amounts_and_verdicts_in_words() -> None:
    assert amount(-31_200_000.0, "EUR") == "−EUR 31.2 million"
    assert amount(950.0, "EUR") == "EUR 950"
    assert verdict(True) != verdict(False)


# Lines opened


def test_return_opens_a_line_and_escape_goes_back(
    station: StandingStation, bench: Bench, qtbot: QtBot
) -> None:
    standing = bench.document.standing
    assert standing is not None
    lines = station.lines
    lines.table.go_to(3)
    QTest.keyClick(lines.table, Qt.Key.Key_Return)
    assert lines.is_open
    assert lines.heading.text() == "pensions"
    assert lines.flows.table_model.rowCount() == 10
    worth = lines.flows.table_model.column_values("present_value").sum()
    assert worth == pytest.approx(standing.lines[3].measures.present_value)
    # Flows stated by year have no date.
    assert lines.flows.isColumnHidden(0)
    station.activateWindow()
    qtbot.waitUntil(lines.flows.hasFocus)
    QTest.keyClick(lines.flows, Qt.Key.Key_Escape)
    assert not lines.is_open
    assert lines.table.current_source_row() == 3


def test_a_holding_shows_its_dates(station: StandingStation) -> None:
    station.lines.open_row(0)
    assert not station.lines.flows.isColumnHidden(0)
    assert column(station.lines.flows, "date")[-1] == "31/03/2036"


def test_an_opened_line_follows_an_edit(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    station.lines.open_row(3)
    before = station.lines.flows.table_model.column_values("present_value").sum()
    bench.edit_basis(liability_spread=0.03)
    wait_for_standing(bench, qtbot)
    station.refresh_now()
    assert station.lines.is_open
    assert station.lines.flows.table_model.column_values("present_value").sum() < before


def test_a_line_that_cannot_be_opened_is_said(station: StandingStation, qtbot: QtBot) -> None:
    def refuse(side: Side, number: int) -> FlowDetail:
        raise ValueError(f"no curve for {side} {number}")

    station.lines.open_line = refuse
    with qtbot.waitSignal(station.message) as told:
        station.lines.open_row(4)
    assert told.args == ["The flows of spouses cannot be shown: no curve for liabilities 1"]
    assert not station.lines.is_open


# The rows of a figure


@pytest.mark.parametrize(
    ("key", "first", "count"),
    [
        ("assets", "bond", 3),
        ("liabilities", "pensions", 2),
        ("surplus", "pensions", 5),
        ("funding_ratio", "pensions", 5),
        ("duration_gap", "zero", 5),
        ("dv01_gap", "pensions", 5),
    ],
)
def test_a_headline_figure_leads_to_its_rows(
    station: StandingStation, key: str, first: str, count: int
) -> None:
    station.pages.show_page("periods")
    station.lines.finder.setText("no such line")
    station.show_rows(key)
    assert station.pages.current == "lines"
    shown = column(station.lines.table, "line")
    assert (shown[0], len(shown)) == (first, count)
    assert station.lines.table.currentIndex().row() == 0


def test_a_figure_that_is_none_is_refused(station: StandingStation) -> None:
    with pytest.raises(ValueError, match="`key`"):
        station.show_rows("weather")


def test_a_line_is_found_by_a_part_of_its_name(station: StandingStation) -> None:
    station.lines.finder.setText("PENS")
    assert column(station.lines.table, "line") == ["pensions"]
    station.lines.finder.clear()
    assert station.lines.table.table_model.rowCount() == 5


def test_the_table_copies(station: StandingStation) -> None:
    station.lines.table.selectAll()
    station.lines.table.copy()
    text = QGuiApplication.clipboard().text()
    assert text.startswith("Side\tLine\tKind\tPresent value (EUR)")
    assert len(text.splitlines()) == 6


# Edits, and what is stale


def test_the_form_edits_the_basis(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    station.basis_form.liability_spread.committed.emit(0.02)
    station.basis_form.name.committed.emit("Another title")
    assert bench.book.basis.liability_spread == 0.02
    assert bench.document.undo_text == "Change of the title"
    bench.document.undo()
    bench.document.undo()
    station.refresh_now()
    assert station.basis_form.liability_spread.value == 0.005


def test_figures_are_marked_until_they_follow(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    former = station.reading.text()
    bench.edit_basis(liability_spread=0.02)
    station.refresh_now()
    assert "from before your last change" in station.stale_text
    assert station.reading.text() == former
    wait_for_standing(bench, qtbot)
    station.refresh_now()
    assert not station.stale_text
    assert station.reading.text() != former


def test_a_book_that_cannot_be_valued_says_why(station: StandingStation, bench: Bench, qtbot: QtBot) -> None:
    bench.edit_basis(terms=np.array([2.0, 1.0]), rates=np.array([0.02, 0.02]))
    qtbot.waitUntil(lambda: bool(bench.document.standing_failure))
    station.refresh_now()
    assert "could not be valued" in station.stale_text
    assert "order of their terms" in station.stale_text
    assert column(station.lines.table, "line")[0] == "bond"


def test_an_empty_book_is_shown_as_it_is(bench: Bench, qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    station = StandingStation(bench.document, bench.jobs, theme_switch)
    station.show()
    bench.open(Book(a_fund().basis, FlowTable.empty()))
    wait_for_standing(bench, qtbot)
    station.refresh_now()
    assert not station.is_empty
    assert "neither" in station.reading.text()
    assert station.lines.table.table_model.rowCount() == 0
    dispose(station)
