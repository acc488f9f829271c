"""Pictures: what they show, what can be read from them, and how they are saved."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree
from collections.abc import Iterator
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from PySide6.QtCore import QLocale, QPoint, QPointF, Qt
from PySide6.QtGui import QGuiApplication, QImage, QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from desk.window.parts.plot_names import packed
from desk.window.parts.plot_parts import plain_digits
from desk.window.parts.plot_scale import with_room
from desk.window.parts.plots import Picture
from desk.window.parts.theme import DARK, ThemeSwitch

YEARS = np.arange(0, 41)


@pytest.fixture
def picture(qtbot: QtBot, theme_switch: ThemeSwitch) -> Iterator[Picture]:
    picture = Picture("Flows by year", theme_switch, description="What comes in and what goes out.")
    qtbot.addWidget(picture)
    picture.resize(640, 360)
    picture.set_axes("Year", "", "Flows", "EUR", y_kind="money")
    picture.show()
    yield picture
    picture.close()


def filled(picture: Picture) -> Picture:
    picture.add_bars("Assets", YEARS, 2.5e6 - 5e4 * YEARS, "assets")
    picture.add_bars("Liabilities", YEARS, -3.0e6 + 2e4 * YEARS, "liabilities")
    picture.add_line("Net", YEARS, -5e5 - 3e4 * YEARS, "surplus")
    picture.settle()
    return picture


def view(picture: Picture) -> tuple[tuple[float, float], tuple[float, float]]:
    (left, right), (low, high) = picture.plot.getPlotItem().getViewBox().viewRange()
    return (left, right), (low, high)


def labels(picture: Picture) -> list[tuple[str, float, float, float, float]]:
    return [
        (
            item.text(),
            item.pos().x(),
            item.pos().y(),
            item.boundingRect().width(),
            item.boundingRect().height(),
        )
        for item in picture._names
    ]


def test_money_is_shown_in_millions_and_the_unit_says_so(picture: Picture) -> None:
    filled(picture)
    assert picture._y_heading.text() == "Flows, EUR million"
    axis = picture.plot.axes["left"]
    assert axis.tickStrings([-2e6, 0.0, 2e6], 1.0, 2e6) == ["−2", "0", "2"]
    assert axis.tickStrings([-5e5, 0.0], 1.0, 5e5) == ["−0.5", "0.0"]
    QLocale.setDefault(QLocale("de_DE"))
    assert axis.tickStrings([-5e5], 1.0, 5e5) == ["−0,5"]


def test_rates_are_shown_in_percent(picture: Picture) -> None:
    picture.set_axes("Term", "years", "Rate", "% a year", y_kind="rate")
    picture.add_line("Zero", [1, 10], [0.02, 0.03], "neutral")
    picture.settle()
    assert picture._y_heading.text() == "Rate, % a year"
    assert picture.plot.axes["left"].tickStrings([0.02, 0.025], 1.0, 0.005) == ["2.0", "2.5"]
    assert picture.readings_at(10) == [("Zero", "3.00")]


def test_the_view_holds_everything_that_is_shown(picture: Picture) -> None:
    filled(picture)
    (left, right), (low, high) = view(picture)
    assert left <= -0.4
    assert right >= 40.4
    assert low <= -3.0e6
    assert high >= 2.5e6
    picture.add_line("Net", YEARS, np.full(41, -9e6), "surplus")
    picture.settle()
    assert view(picture)[1][0] <= -9e6


def test_an_axis_of_amounts_above_zero_does_not_go_below() -> None:
    assert with_room(1.0, 14.0)[0] >= 0
    assert with_room(0.0, 10.0)[0] == 0
    assert with_room(-5.0, -1.0)[1] <= 0
    low, high = with_room(-1.0, 1.0)
    assert low < -1
    assert high > 1
    assert with_room(3.0, 3.0)[0] < 3.0 < with_room(3.0, 3.0)[1]


def test_the_keyboard_reads_every_value_at_a_place(qtbot: QtBot, picture: Picture) -> None:
    filled(picture)
    heard: list[str] = []
    picture.reading_changed.connect(heard.append)
    QTest.keyClick(picture.plot, Qt.Key.Key_Home)
    assert picture.reading == "Year 0:  Assets 2.5  ·  Liabilities −3.0  ·  Net −0.5  (EUR million)"
    QTest.keyClick(picture.plot, Qt.Key.Key_Right)
    QTest.keyClick(picture.plot, Qt.Key.Key_Right, Qt.KeyboardModifier.ShiftModifier)
    assert picture.reading.startswith("Year 11:")
    QTest.keyClick(picture.plot, Qt.Key.Key_Left)
    assert picture.reading.startswith("Year 10:  Assets 2.0")
    QTest.keyClick(picture.plot, Qt.Key.Key_End)
    assert picture.reading.startswith("Year 40:")
    QTest.keyClick(picture.plot, Qt.Key.Key_Right)
    assert picture.reading.startswith("Year 40:")
    QTest.keyClick(picture.plot, Qt.Key.Key_Escape)
    assert picture.reading == ""
    assert heard[-1] == ""
    assert picture._strip.text() == "What comes in and what goes out."


def test_the_pointer_reads_the_nearest_place(picture: Picture) -> None:
    filled(picture)
    picture.plot.pointed.emit(QPointF(11.7, 0.0))
    assert picture.reading.startswith("Year 12:")
    picture.add_line("Net", YEARS, np.full(41, 1e6), "surplus")
    picture.settle()
    assert "Net 1.0" in picture.reading
    picture.plot.left.emit()
    assert picture.reading == ""


def test_lines_are_read_between_their_points_and_not_beyond(picture: Picture) -> None:
    picture.set_axes("Term", "years", "Value", "")
    picture.add_line("Straight", [0.0, 10.0], [0.0, 100.0], "neutral")
    picture.add_line("Steps", [0.0, 5.0, 10.0], [1.0, 2.0, 3.0], "rates", stepped=True)
    picture.add_dots("Quotes", [5.0], [7.0], "neutral")
    assert picture.readings_at(5.0) == [("Straight", "50.00"), ("Steps", "2.00"), ("Quotes", "7.00")]
    assert picture.readings_at(4.0) == [("Straight", "40.00"), ("Steps", "1.00")]
    assert picture.readings_at(10.5) == []


def test_a_band_names_both_edges(picture: Picture) -> None:
    picture.set_axes("Year", "", "Value", "")
    picture.add_band("90 %", [0, 1], [1.0, 0.5], [1.0, 2.0], "rates", edge_names=("5 %", "95 %"))
    picture.add_band("all", [0, 1], [1.0, 0.1], [1.0, 9.0], "rates")
    assert picture.readings_at(1) == [
        ("5 %", "0.50"),
        ("95 %", "2.00"),
        ("all from", "0.10"),
        ("all to", "9.00"),
    ]
    picture.settle()
    assert {text for text, *_ in labels(picture)} == {"5 %", "95 %"}


def test_bars_side_by_side_are_read_together(picture: Picture) -> None:
    picture.set_axes("Key rate", "years", "DV01", "EUR", y_kind="money")
    picture.set_x_names({0: "0.25", 1: "0.5", 2: "50"})
    picture.add_bars("Assets", [0, 1, 2], [1.0, 2.0, 3.0], "assets", width=0.3, offset=-0.3)
    picture.add_bars("Gap", [0, 1, 2], [-1.0, -2.0, -3.0], "surplus", width=0.3, offset=0.3)
    picture.settle()
    QTest.keyClick(picture.plot, Qt.Key.Key_End)
    assert picture.reading == "Key rate 50:  Assets 3  ·  Gap −3  (EUR)"
    assert "Assets" in picture._key.text()


def test_the_right_hand_axis_has_a_scale_of_its_own(picture: Picture) -> None:
    picture.set_axes("Term", "years", "Rate", "% a year", y_kind="rate")
    picture.set_right_axis("Discount factor", "", digits=4)
    picture.add_line("Zero", [0, 30], [0.02, 0.03], "neutral")
    picture.add_line("Discount", [0, 30], [1.0, 0.4], "rates", right=True)
    picture.settle()
    assert view(picture)[1][1] < 0.05
    assert picture.readings_at(30) == [("Zero", "3.00"), ("Discount", "0.4000")]
    assert picture._right_heading.text() == "Discount factor"
    low, high = picture._right_box.viewRange()[1]
    assert low <= 0
    assert high >= 1
    assert [text for text, *_ in labels(picture)] == ["Zero", "Discount"]


def test_the_right_hand_axis_follows_a_drawing_area_that_moves_and_keeps_its_size(picture: Picture) -> None:
    picture.set_right_axis("Discount factor", "", digits=4)
    picture.add_line("Zero", [0, 30], [0.02, 0.03], "neutral")
    picture.add_line("Discount", [0, 30], [1.0, 0.4], "rates", right=True)
    picture.settle()
    picture._box.setGeometry(picture._box.geometry().translated(10.0, 0.0))
    assert picture._right_box.geometry() == picture._box.sceneBoundingRect()


def test_names_stand_beside_the_ends_and_do_not_overlap(picture: Picture) -> None:
    picture.set_axes("Year", "", "Value", "")
    for place in range(8):
        picture.add_line(f"Line {place}", [0, 10], [0.0, 1.0 + place / 1000], "neutral")
    picture.settle()
    found = sorted(labels(picture), key=lambda label: label[2])
    assert len(found) == 8
    for upper, lower in pairwise(found):
        assert upper[2] + upper[4] <= lower[2] + 0.5
    assert all(x + width <= picture.plot.width() for _, x, _, width, _ in found)
    assert [text for text, *_ in found] == [f"Line {place}" for place in reversed(range(8))]


def test_names_follow_the_view(picture: Picture) -> None:
    picture.set_axes("Year", "", "Value", "")
    picture.add_line("Rising", [0, 10], [0.0, 10.0], "neutral")
    picture.add_line("Early", [0, 2], [5.0, 5.0], "rates")
    picture.add_vertical(8, "horizon")
    picture.settle()
    assert {text for text, *_ in labels(picture)} == {"Rising", "Early", "horizon"}
    picture._box.setXRange(5, 7, padding=0)
    picture._place_names()
    assert {text for text, *_ in labels(picture)} == {"Rising"}


@given(
    pieces=st.lists(st.tuples(st.floats(0, 100), st.floats(1, 8)), min_size=1, max_size=12),
)
def test_packing_keeps_pieces_apart_inside_and_in_order(pieces: list[tuple[float, float]]) -> None:
    centres, heights = [piece[0] for piece in pieces], [piece[1] for piece in pieces]
    placed = packed(centres, heights, 0.0, 100.0)
    order = sorted(range(len(pieces)), key=lambda place: centres[place])
    for one, other in pairwise(order):
        assert placed[one] + heights[one] / 2 <= placed[other] - heights[other] / 2 + 1e-9
    for centre, height in zip(placed, heights, strict=True):
        assert centre - height / 2 >= -1e-9
        assert centre + height / 2 <= 100 + 1e-9


def test_packing_moves_nothing_that_has_room() -> None:
    assert packed([10.0, 50.0, 30.0], [5.0, 5.0, 5.0], 0.0, 100.0) == [10.0, 50.0, 30.0]
    assert packed([10.0, 10.0], [4.0, 4.0], 0.0, 100.0) == [8.0, 12.0]


@pytest.mark.parametrize(("step", "digits"), [(1, 0), (0.5, 1), (0.25, 2), (20, 0), (0.001, 3), (0, 0)])
def test_ticks_have_the_decimals_they_need(step: float, digits: int) -> None:
    assert plain_digits(step) == digits


def test_adding_again_changes_what_is_there(picture: Picture) -> None:
    filled(picture)
    before = picture._series["Net"]
    picture.add_line("Net", [0, 1], [3.0, 4.0], "surplus")
    assert picture._series["Net"] is before
    assert picture.readings_at(1)[-1] == ("Net", "0.0")
    picture.add_line("Net", [0, 1], [3.0, 4.0], "what_if")
    assert picture._series["Net"] is not before
    assert list(picture.names) == ["Assets", "Liabilities", "Net"]
    picture.remove("Net")
    picture.remove("never there")
    assert list(picture.names) == ["Assets", "Liabilities"]
    picture.clear()
    assert list(picture.names) == []
    picture.settle()


def test_zooming_by_keys_and_back(picture: Picture) -> None:
    filled(picture)
    home = view(picture)
    QTest.keyClick(picture.plot, Qt.Key.Key_Plus)
    assert view(picture)[0][1] - view(picture)[0][0] < home[0][1] - home[0][0]
    picture.add_line("Net", YEARS, np.zeros(41), "surplus")
    picture.settle()
    assert view(picture)[0] != home[0]
    QTest.keyClick(picture.plot, Qt.Key.Key_0)
    assert view(picture)[0] == pytest.approx(home[0])


def wheel(picture: Picture, modifiers: Qt.KeyboardModifier) -> bool:
    spot = QPointF(picture.plot.rect().center())
    event = QWheelEvent(
        spot,
        picture.plot.mapToGlobal(spot),
        QPoint(),
        QPoint(0, 240),
        Qt.MouseButton.NoButton,
        modifiers,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    QApplication.sendEvent(picture.plot.viewport(), event)
    return event.isAccepted()


def test_the_wheel_scrolls_the_page_unless_it_is_meant_for_the_picture(picture: Picture) -> None:
    filled(picture)
    home = view(picture)
    picture.plot.clearFocus()
    wheel(picture, Qt.KeyboardModifier.NoModifier)
    assert view(picture) == home
    wheel(picture, Qt.KeyboardModifier.ControlModifier)
    assert view(picture) != home


def test_what_is_not_finite_breaks_nothing(picture: Picture) -> None:
    nan = float("nan")
    picture.add_line("Gap", [0, 1, 2, 3], [1.0, nan, 2.0, nan], "neutral")
    picture.add_line("None", [], [], "neutral")
    picture.add_line("Lost", [nan, nan], [1.0, 2.0], "neutral")
    picture.add_band("Band", [0, 1, 2], [0.0, nan, 1.0], [1.0, 2.0, float("inf")], "rates")
    picture.add_bars("Bars", [0, 1], [nan, 3.0], "assets")
    picture.add_bars("No bars", [], [], "assets")
    picture.add_dots("Dots", [nan, 1], [1.0, nan], "neutral")
    picture.add_paths("Paths", [0, 1], [[1.0, nan], [2.0, 3.0]], "rates")
    picture.settle()
    assert all(np.isfinite(view(picture)).ravel())
    QTest.keyClick(picture.plot, Qt.Key.Key_End)
    assert picture.reading.startswith("Year 2:  Gap 2")
    assert not picture.grab().isNull()


def test_a_picture_of_nothing_can_be_read_and_saved(picture: Picture, tmp_path: Path) -> None:
    QTest.keyClick(picture.plot, Qt.Key.Key_Right)
    assert picture.reading == ""
    picture.save(tmp_path / "empty.svg")
    assert (tmp_path / "empty.svg").stat().st_size > 0


def test_a_million_points_are_thinned_not_smoothed(picture: Picture) -> None:
    x = np.linspace(0, 1, 100_000)
    picture.add_line("Long", x, np.sin(x), "neutral")
    picture.settle()
    assert picture._series["Long"].item.opts["antialias"] is False  # type: ignore[attr-defined]
    assert picture._series["Long"].item.opts["pen"].widthF() == 1  # type: ignore[attr-defined]


def test_saving_as_png_is_at_twice_the_size(picture: Picture, tmp_path: Path) -> None:
    filled(picture).save(tmp_path / "flows.png")
    image = QImage(str(tmp_path / "flows.png"))
    assert image.width() == 2 * picture.page.width()
    assert image.height() == 2 * picture.page.height()
    colours = {
        image.pixelColor(x, y).name() for x in range(0, image.width(), 3) for y in range(0, image.height(), 3)
    }
    assert {"#0072b2", "#d55e00"} <= colours


def test_saving_as_svg_keeps_texts_and_shapes(picture: Picture, tmp_path: Path) -> None:
    filled(picture)
    picture.add_dots("Quotes", [1, 2], [1e6, 2e6], "neutral")
    picture.shade_from(30, "beyond")
    QTest.keyClick(picture.plot, Qt.Key.Key_Home)
    picture.save(tmp_path / "flows.svg")
    root = ElementTree.parse(tmp_path / "flows.svg").getroot()
    texts = {(element.text or "").strip() for element in root.iter("{http://www.w3.org/2000/svg}text")}
    assert {"Flows by year", "What comes in and what goes out.", "Net", "beyond", "Year"} <= texts
    assert root.attrib["viewBox"].split()[2:] == [str(picture.page.width()), str(picture.page.height())]
    assert not list(root.iter("{http://www.w3.org/2000/svg}image"))
    assert picture.reading.startswith("Year 0:")


def test_a_picture_is_written_whole_or_not_at_all(picture: Picture, tmp_path: Path) -> None:
    filled(picture)
    with pytest.raises(ValueError, match="must end in"):
        picture.save(tmp_path / "flows.gif")
    with pytest.raises(OSError, match=r"flows\.png"):
        picture.save(tmp_path / "no such folder" / "flows.png")
    assert list(tmp_path.iterdir()) == []


def test_a_picture_is_copied_as_an_image(picture: Picture) -> None:
    filled(picture).copy()
    image = QGuiApplication.clipboard().image()
    assert image.size() == picture.page.size() * 2
    QGuiApplication.clipboard().clear()


def test_a_picture_follows_the_theme(picture: Picture, theme_switch: ThemeSwitch) -> None:
    filled(picture)
    light = picture.image()
    theme_switch.set_mode("dark")
    dark = picture.image()
    assert dark != light
    assert dark.pixelColor(3, dark.height() - 3) == DARK.surface


def test_a_picture_can_be_listened_to(picture: Picture) -> None:
    assert picture.plot.accessibleName() == "Picture: Flows by year"
    assert picture.plot.accessibleDescription() == "What comes in and what goes out."
    assert picture.button.accessibleName() == "Save or copy the picture Flows by year"
    texts = [action.text() for action in picture._menu.actions()]
    assert not any("Export" in text for text in texts)
