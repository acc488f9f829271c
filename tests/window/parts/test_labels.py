"""Labels that fit where they are put."""

from __future__ import annotations

from pytestqt.qtbot import QtBot

from desk.window.parts.labels import ElidedLabel, well_broken

FIRM = "\N{NO-BREAK SPACE}"


def test_a_range_stays_whole_and_no_word_stands_alone() -> None:
    text = "Added to the zero rates. Usual: −1 to 3 % a year."
    assert well_broken(text) == f"Added to the zero rates. {'Usual: −1 to 3 % a year.'.replace(' ', FIRM)}"
    assert well_broken("The curve follows at once.") == f"The curve follows at{FIRM}once."
    assert well_broken("Two words") == "Two words"
    assert well_broken("") == ""
    long = "One sentence that ends in incomprehensibilities, antidisestablishmentarianism."
    assert well_broken(long) == long
    assert well_broken(text).replace(FIRM, " ") == text


def test_one_line_gives_way_and_tells_all_in_its_tooltip(qtbot: QtBot) -> None:
    label = ElidedLabel("A sentence that is far too long for the room there is")
    qtbot.addWidget(label)
    label.resize(120, 20)
    label.show()
    assert len(label.shown) == 1
    assert label.shown[0].endswith("…")
    assert label.toolTip() == label.text()
    label.resize(2_000, 20)
    assert list(label.shown) == [label.text()]
    assert not label.toolTip()


def test_two_lines_break_between_words_and_take_the_height_they_need(qtbot: QtBot) -> None:
    label = ElidedLabel("Harrowmere Staff Pension Fund (invented)", lines=2)
    qtbot.addWidget(label)
    label.show()
    line = label.fontMetrics().height()
    label.resize(label.fontMetrics().horizontalAdvance("Harrowmere Staff Pension") + 4, line)
    assert list(label.shown) == ["Harrowmere Staff Pension", "Fund (invented)"]
    assert label.height() == 2 * line
    assert not label.toolTip()
    label.resize(2_000, 2 * line)
    assert list(label.shown) == [label.text()]
    assert label.height() == line
    label.set_text("Uninterrupted" * 40)
    assert len(label.shown) == 1
    assert label.toolTip() == label.text()
