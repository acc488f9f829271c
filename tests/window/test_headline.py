"""The key figures: what they say, in what unit, and when they are not to be relied on."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from pytestqt.qtbot import QtBot

from desk import tasks
from desk.book import Book
from desk.valuation.records import Standing
from desk.window.figures import Figure, figures_of
from tests.window.frame import Frame, a_book


@pytest.fixture(scope="module")
def standing() -> Standing:
    return tasks.value(a_book())


def _by_key(standing: Standing | None) -> dict[str, Figure]:
    return {figure.key: figure for figure in figures_of(standing, "EUR")}


def _resized(standing: Standing, assets: float, owed: float) -> Standing:
    return replace(
        standing,
        assets=replace(standing.assets, present_value=assets),
        liabilities=replace(standing.liabilities, present_value=owed),
        surplus=assets - owed,
    )


def test_amounts_share_a_unit_in_which_they_add_up(standing: Standing) -> None:
    figures = _by_key(_resized(standing, 2_130_295_866.0, 2_315_538_985.0))
    shown = [(figures[key].value, figures[key].unit) for key in ("assets", "liabilities", "surplus")]
    assert shown == [
        ("2,130.3", "EUR million"),
        ("2,315.5", "EUR million"),
        ("−185.2", "EUR million"),
    ]
    figures = _by_key(_resized(standing, 51_200_000.0, 50_000_000.0))
    assert (figures["surplus"].value, figures["surplus"].unit) == ("1.20", "EUR million")


def test_signs_are_said_in_words(standing: Standing) -> None:
    figures = _by_key(replace(standing, surplus=-1.0, duration_gap=-3.0, dv01_gap=-2.0))
    assert figures["surplus"].note == "in deficit"
    assert figures["duration_gap"].note == "assets shorter"
    assert figures["dv01_gap"].note == "gains when rates rise"
    figures = _by_key(replace(standing, surplus=1.0, duration_gap=3.0, dv01_gap=2.0))
    assert figures["surplus"].note == "in surplus"
    assert figures["dv01_gap"].note == "loses when rates rise"


def test_what_has_no_meaning_is_not_available(standing: Standing) -> None:
    figures = _by_key(replace(standing, funding_ratio=math.nan, duration_gap=math.nan))
    assert figures["funding_ratio"].value == "n/a"
    assert figures["funding_ratio"].note == "no liabilities"
    assert figures["duration_gap"].value == "n/a"
    assert {figure.value for figure in figures_of(None, "EUR")} == {"–"}


def test_the_headline_shows_the_open_book(opened: Frame) -> None:
    headline = opened.window.headline
    assert headline.state == ""
    ratio = next(button for button in headline.buttons if button.figure.key == "funding_ratio")
    standing = opened.document.standing
    assert standing is not None
    assert ratio.figure.value == f"{100 * standing.funding_ratio:.1f}"
    assert ratio.accessibleName().startswith("Funding ratio: ")
    assert ratio.accessibleName().endswith("%, of liabilities")


def test_a_figure_of_a_former_book_says_that_it_is(opened: Frame, qtbot: QtBot) -> None:
    headline = opened.window.headline
    opened.edit()
    assert headline.state == "out of date"
    assert {button.note for button in headline.buttons} == {"out of date"}
    assert "out of date" in headline.buttons[0].accessibleName()
    qtbot.waitUntil(lambda: headline.state == "")
    assert headline.buttons[2].note == "in deficit"


def test_a_book_that_cannot_be_valued_says_so(opened: Frame, qtbot: QtBot) -> None:
    def fail(book: Book, **_: object) -> Standing:
        raise ValueError("no curve")

    opened.document._value = fail
    opened.edit()
    qtbot.waitUntil(lambda: opened.document.standing_failure == "no curve")
    assert opened.window.headline.state == "could not be valued"


def test_return_opens_a_figure(opened: Frame, qtbot: QtBot) -> None:
    with qtbot.waitSignal(opened.window.headline.opened) as caught:
        QTest.keyClick(opened.window.headline.buttons[3], Qt.Key.Key_Return)
    assert caught.args == ["funding_ratio"]


def test_each_figure_is_told_with_its_distance_from_the_second_basis(standing: Standing) -> None:
    now = replace(
        _resized(standing, 2_130_295_866.0, 2_315_538_985.0),
        funding_ratio=0.92,
        duration_gap=-3.25,
        dv01_gap=-1_500_000.0,
    )
    other = replace(
        _resized(standing, 2_130_295_866.0, 2_400_000_000.0),
        funding_ratio=0.8876,
        duration_gap=-3.0,
        dv01_gap=-1_250_000.0,
    )
    figures = {figure.key: figure for figure in figures_of(now, compared_with=other)}
    assert figures["assets"].change == "as on the second"
    assert figures["assets"].change_in_words == "the same as on the second basis"
    assert figures["liabilities"].change == "−84.5 vs second"
    assert figures["liabilities"].change_in_words == "84.5 EUR million less than on the second basis"
    assert figures["surplus"].change == "+84.5 vs second"
    assert figures["surplus"].change_in_words == "84.5 EUR million more than on the second basis"
    assert figures["funding_ratio"].change == "+3.2 vs second"
    assert figures["funding_ratio"].change_in_words == "3.2 percentage points more than on the second basis"
    assert figures["duration_gap"].change == "−0.25 vs second"
    assert figures["dv01_gap"].change_in_words.endswith("less than on the second basis")
    none = replace(other, funding_ratio=math.nan)
    figures = {figure.key: figure for figure in figures_of(now, compared_with=none)}
    assert figures["funding_ratio"].change == figures["funding_ratio"].change_in_words == ""


def test_the_headline_compares_while_a_comparison_is_on(opened: Frame, qtbot: QtBot) -> None:
    headline, document = opened.window.headline, opened.document
    book = document.book
    assert book is not None
    document.edit("Held", replace(book, second_basis=a_book(spread=0.01).basis))
    qtbot.waitUntil(lambda: document.comparison_is_current and not opened.jobs.running)
    owed = headline.buttons[1]
    assert owed.note.startswith("+")
    assert owed.note.endswith(" vs second")
    assert "more than on the second basis" in owed.accessibleName()
    assert "1 line" in owed.accessibleName()
    assert headline.buttons[0].note == "as on the second"
    assert headline._state.text() == "Against the second basis"
    document.compare(False)
    assert owed.note == "1 line"
    assert "second" not in owed.accessibleName()
    document.compare(True)
    opened.window.resize(1280, 720)
    for button in headline.buttons:
        assert button.fontMetrics().horizontalAdvance(button.note) <= button.width()


def test_the_headline_says_that_the_second_basis_failed(opened: Frame, qtbot: QtBot) -> None:
    headline, document = opened.window.headline, opened.document
    value = document._value

    def picky(book: Book, **tools: Any) -> Standing:
        if book.basis.liability_spread > 0.1:
            raise ValueError("no curve")
        return value(book, **tools)

    document._value = picky
    book = document.book
    assert book is not None
    document.edit("Held", replace(book, second_basis=a_book(spread=0.2).basis))
    qtbot.waitUntil(lambda: bool(document.second_failure) and not opened.jobs.running)
    assert headline.state == ""
    assert headline.buttons[1].note == "1 line"
    assert headline._state.text() == "The second basis could not be valued: no curve"


def test_no_figure_is_cut_at_the_least_width(opened: Frame) -> None:
    opened.window.resize(1280, 720)
    for button in opened.window.headline.buttons:
        assert button.width() >= button.minimumSizeHint().width()
