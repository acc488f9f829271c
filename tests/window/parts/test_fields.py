"""Form fields take what is right, keep what they had, and say why."""

from __future__ import annotations

from datetime import date

import pytest
from PySide6.QtCore import QLocale, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QLineEdit
from pytestqt.qtbot import QtBot

from desk.window.parts.fields import (
    Choice,
    ChoiceField,
    DateField,
    Field,
    Form,
    IntegerField,
    NumberField,
    TextField,
)
from desk.window.parts.theme import ThemeSwitch


def heard(field: Field) -> list[object]:
    values: list[object] = []
    field.committed.connect(values.append)
    return values


def enter(line: QLineEdit, text: str) -> None:
    line.selectAll()
    QTest.keyClicks(line, text)
    if not text:
        QTest.keyClick(line, Qt.Key.Key_Delete)
    QTest.keyClick(line, Qt.Key.Key_Return)


@pytest.fixture
def spread(qtbot: QtBot, theme_switch: ThemeSwitch) -> NumberField:
    field = NumberField(
        "Liability spread",
        unit="% a year",
        percent=True,
        low=-0.1,
        high=0.5,
        sensible=(0.0, 0.02),
        hint="Added to the zero rates.",
    )
    qtbot.addWidget(field)
    field.set_value(0.0123456789)
    return field


def test_a_number_is_shown_whole_and_committed_once(spread: NumberField) -> None:
    values = heard(spread)
    assert spread.line.text() == "1.23456789"
    assert spread.hint == "Added to the zero rates. Usual: 0 to 2 % a year."
    assert spread.line.accessibleName() == "Liability spread, % a year"
    assert spread.label.buddy() is spread.line
    QTest.keyClick(spread.line, Qt.Key.Key_Return)
    enter(spread.line, "1.23456789")
    assert values == []
    enter(spread.line, "1.5")
    enter(spread.line, "1.50 %")
    assert values == [0.015]
    assert spread.value == 0.015
    assert spread.line.text() == "1.5"


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("lots", "“lots” is not a number."),
        ("", "Enter a number."),
        ("51", "It must be at most 50."),
        ("-11", "It must be at least −10."),
    ],
)
def test_a_wrong_entry_keeps_the_former_value_and_says_so(
    spread: NumberField, text: str, reason: str
) -> None:
    values = heard(spread)
    enter(spread.line, text)
    assert values == []
    assert spread.value == 0.0123456789
    assert spread.problem == f"{reason} It stays at 1.23456789."
    assert spread.line.property("fault") is True
    assert reason in spread.line.accessibleDescription()
    enter(spread.line, "1")
    assert values == [0.01]
    assert spread.problem == ""
    assert spread.line.property("fault") is False


def test_an_unusual_value_is_taken_with_a_remark(spread: NumberField) -> None:
    values = heard(spread)
    enter(spread.line, "30")
    assert values == [0.3]
    assert "outside the usual range" in spread.problem
    assert spread.line.property("fault") is False


def test_escape_takes_an_entry_back(spread: NumberField) -> None:
    values = heard(spread)
    QTest.keyClicks(spread.line, "9")
    QTest.keyClick(spread.line, Qt.Key.Key_Escape)
    assert spread.line.text() == "1.23456789"
    QTest.keyClick(spread.line, Qt.Key.Key_Return)
    assert values == []


def test_setting_a_value_tells_nobody(spread: NumberField) -> None:
    values = heard(spread)
    spread.set_value(0.005)
    assert values == []
    assert spread.line.text() == "0.5"


def test_a_number_is_read_in_the_locale(qtbot: QtBot) -> None:
    QLocale.setDefault(QLocale("de_DE"))
    field = NumberField("Amount")
    qtbot.addWidget(field)
    values = heard(field)
    enter(field.line, "1.234,5")
    assert values == [1234.5]
    enter(field.line, "1.5")
    assert "is not a number" in field.problem


def test_an_optional_number_may_be_emptied(qtbot: QtBot) -> None:
    field = NumberField("Mean reversion", low=0.0, optional=True)
    qtbot.addWidget(field)
    values = heard(field)
    assert field.hint == "Allowed: at least 0."
    field.set_value(0.1)
    enter(field.line, "")
    assert values == [None]
    assert field.value is None


def test_a_whole_number_stays_one(qtbot: QtBot) -> None:
    field = IntegerField("Paths", low=1, high=1_000_000)
    qtbot.addWidget(field)
    values = heard(field)
    field.set_value(10_000)
    assert field.line.text() == "10,000"
    assert field.hint == "Allowed: 1 to 1,000,000."
    enter(field.line, "20000")
    enter(field.line, "2.5")
    enter(field.line, "0")
    assert values == [20_000]
    assert isinstance(values[0], int)
    assert field.problem == "It must be at least 1. It stays at 20,000."


def test_a_text_can_be_checked(qtbot: QtBot) -> None:
    field = TextField(
        "Currency", most=3, check=lambda text: "" if len(text) == 3 else "It needs three letters."
    )
    qtbot.addWidget(field)
    values = heard(field)
    enter(field.line, "EU")
    assert field.problem == "It needs three letters. Nothing is changed."
    enter(field.line, "EURO")
    assert values == ["EUR"]
    assert field.value == "EUR"


def test_a_date_is_read_in_both_forms(qtbot: QtBot) -> None:
    field = DateField("Valuation date")
    qtbot.addWidget(field)
    values = heard(field)
    enter(field.line, "2031-03-31")
    assert field.line.text() == "31/03/2031"
    enter(field.line, "30/06/2031")
    enter(field.line, "31/02/2031")
    assert values == [date(2031, 3, 31), date(2031, 6, 30)]
    assert field.problem == "“31/02/2031” is not a date. It stays at 30/06/2031."


def test_a_choice_explains_the_one_chosen(qtbot: QtBot) -> None:
    choices = (Choice("a", "First", "It is plain."), Choice("b", "Second", "It is fine."))
    field = ChoiceField("Kind", choices, hint="How it works.")
    qtbot.addWidget(field)
    values = heard(field)
    assert field.value == "a"
    assert field.hint == "How it works. It is plain."
    QTest.keyClick(field.combo, Qt.Key.Key_Down)
    assert values == ["b"]
    assert field.hint == "How it works. It is fine."
    field.combo.activated.emit(1)
    assert values == ["b"]
    field.set_value("a")
    assert values == ["b"]
    with pytest.raises(ValueError, match="one of the choices"):
        field.set_value("c")
    assert field.value == "a"
    assert field.combo.accessibleName() == "Kind"


def test_a_form_holds_fields_and_buttons(qtbot: QtBot) -> None:
    form, title = Form(), TextField("Title")
    qtbot.addWidget(form)
    pressed: list[str] = []
    form.add_heading("Basis")
    form.add(title)
    form.add_note("A remark.")
    button = form.add_button("Run", lambda: pressed.append("run"), first=True)
    button.click()
    assert pressed == ["run"]
    assert title.parent() is form
