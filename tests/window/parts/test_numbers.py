"""Figures shown and read back."""

from __future__ import annotations

import math
from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from PySide6.QtCore import QLocale

from desk.window.parts import numbers
from desk.window.parts.numbers import (
    exact,
    money,
    money_scaled,
    number,
    parse_number,
    parse_rate,
    rate,
    signed,
)

ENGLISH = QLocale("en_GB")
GERMAN = QLocale("de_DE")
FRENCH = QLocale("fr_FR")
SWISS = QLocale("de_CH")
INDIAN = QLocale("en_IN")
EGYPTIAN = QLocale("ar_EG")
LOCALES = [ENGLISH, GERMAN, FRENCH, SWISS, INDIAN, EGYPTIAN]


def test_figures_are_grouped_with_a_true_minus() -> None:
    assert money(-1234567.6, locale=ENGLISH) == "−1,234,568"
    assert money(-1234567.6, digits=1, locale=GERMAN) == "−1.234.567,6"
    assert "\N{NARROW NO-BREAK SPACE}" in money(1234567, locale=FRENCH)
    assert rate(0.0375, locale=ENGLISH) == "3.75"
    assert rate(0.03754, digits=3, locale=GERMAN) == "3,754"
    assert numbers.ratio(0.9234, locale=ENGLISH) == "92.3\N{NARROW NO-BREAK SPACE}%"
    assert numbers.years(12.345, locale=ENGLISH) in ("12.35", "12.34")
    assert numbers.integer(15000, locale=ENGLISH) == "15,000"


def test_no_value_is_an_en_dash_and_nothing_has_no_sign() -> None:
    for shown in (money(None), money(math.nan), rate(math.nan), numbers.day(None)):
        assert shown == "–"
    assert numbers.day(np.datetime64("NaT", "D")) == "–"
    assert number(math.inf) == "∞"
    assert number(-math.inf) == "−∞"
    assert number(-0.001, 2, locale=ENGLISH) == "0.00"
    assert signed(-0.001, 2, locale=ENGLISH) == "0.00"
    assert signed(1.5, 1, locale=ENGLISH) == "+1.5"
    assert signed(-1.5, 1, locale=ENGLISH) == "−1.5"


def test_scaled_money_names_its_unit_apart() -> None:
    scaled = money_scaled(-812_345_678.0, "EUR", locale=ENGLISH)
    assert (scaled.text, scaled.unit) == ("−812.3", "EUR million")
    assert money_scaled(812.4, "EUR", locale=ENGLISH).text == "812"
    assert money_scaled(45_000.0, "EUR", locale=ENGLISH).unit == "EUR thousand"
    assert money_scaled(None, "EUR").text == "–"
    assert numbers.scale_for([math.nan, -2.5e9, 3]).word == "billion"
    assert numbers.scale_for([]).factor == 1


def test_a_locale_without_grouping_is_shown_in_international_english() -> None:
    QLocale.setDefault(QLocale.c())
    assert money(1234567) == "1,234,567"


def test_dates_carry_the_whole_year() -> None:
    assert numbers.day(date(2031, 3, 9), locale=ENGLISH) == "09/03/2031"
    assert numbers.day(np.datetime64("2031-03-09"), locale=GERMAN) == "09.03.2031"


@pytest.mark.parametrize(
    ("text", "locale", "value"),
    [
        ("1,234.56", ENGLISH, 1234.56),
        ("1.234,56", GERMAN, 1234.56),
        ("1\u202f234,56", FRENCH, 1234.56),
        ("1\u00a0234,56", FRENCH, 1234.56),
        ("1 234 567", GERMAN, 1234567.0),
        ("1’234.5", SWISS, 1234.5),
        ("12,34,567", INDIAN, 1234567.0),
        ("١٬٢٣٤", EGYPTIAN, 1234.0),
        ("(1,234.56)", ENGLISH, -1234.56),
        ("−5", ENGLISH, -5.0),
        ("- 5", ENGLISH, -5.0),
        ("+5", ENGLISH, 5.0),
        ("3.75%", ENGLISH, 0.0375),
        ("3,75 %", GERMAN, 0.0375),
        ("(3.75%)", ENGLISH, -0.0375),
        ("1e-5", ENGLISH, 1e-5),
        ("1,5E+07", GERMAN, 1.5e7),
        (".5", ENGLISH, 0.5),
        ("7.", ENGLISH, 7.0),
        ("  42\t", ENGLISH, 42.0),
    ],
)
def test_reads_what_people_paste(text: str, locale: QLocale, value: float) -> None:
    assert parse_number(text, locale) == value


@pytest.mark.parametrize(
    ("text", "locale"),
    [
        ("", ENGLISH),
        ("   ", ENGLISH),
        ("–", ENGLISH),
        ("n/a", ENGLISH),
        ("nan", ENGLISH),
        ("inf", ENGLISH),
        ("1e999", ENGLISH),
        ("1.5", GERMAN),
        ("1,234.56", GERMAN),
        ("1.234,56", ENGLISH),
        ("12,34", ENGLISH),
        ("1,,234", ENGLISH),
        ("1,234 567", ENGLISH),
        ("--5", ENGLISH),
        ("(-5)", ENGLISH),
        ("5-", ENGLISH),
        ("%", ENGLISH),
        ("e5", ENGLISH),
        ("=1+1", ENGLISH),
        ("²", ENGLISH),
        ("1_000", ENGLISH),
        ("9" * 5000, ENGLISH),
        ("1.2.3", ENGLISH),
    ],
)
def test_refuses_what_it_cannot_be_sure_of(text: str, locale: QLocale) -> None:
    assert parse_number(text, locale) is None


def test_a_rate_is_read_in_percent_with_or_without_the_sign() -> None:
    assert parse_rate("3.75", ENGLISH) == 0.0375
    assert parse_rate("3.75 %", ENGLISH) == 0.0375
    assert parse_rate("(0.5)", ENGLISH) == -0.005
    assert parse_rate("", ENGLISH) is None


FINITE = st.floats(allow_nan=False, allow_infinity=False)


@given(value=FINITE, index=st.integers(0, len(LOCALES) - 1))
def test_the_exact_text_gives_the_number_back(value: float, index: int) -> None:
    locale = LOCALES[index]
    text = exact(value, locale=locale)
    assert parse_number(text, locale) == value
    assert locale.groupSeparator() not in text


@given(value=st.floats(-1e6, 1e6), index=st.integers(0, len(LOCALES) - 1))
def test_the_exact_percentage_gives_the_rate_back(value: float, index: int) -> None:
    locale = LOCALES[index]
    assert parse_rate(exact(value, locale=locale, percent=True), locale) == value


@given(value=st.floats(-1e12, 1e12), digits=st.integers(0, 6), index=st.integers(0, len(LOCALES) - 1))
def test_the_shown_text_reads_back_rounded(value: float, digits: int, index: int) -> None:
    locale = LOCALES[index]
    read = parse_number(number(value, digits, locale=locale), locale)
    assert read is not None
    assert abs(read - value) <= 0.5 * 10.0**-digits + abs(value) * 1e-15


@given(text=st.text(max_size=40))
def test_no_text_breaks_the_parser(text: str) -> None:
    for locale in LOCALES:
        value = parse_number(text, locale)
        assert value is None or math.isfinite(value)


def test_exact_text_of_no_value_is_empty() -> None:
    assert exact(None) == ""
    assert exact(math.nan) == ""
    assert exact(0.0375, locale=ENGLISH, percent=True) == "3.75"
    assert exact(1234567.0, locale=ENGLISH) == "1234567"
    assert exact(-2.5e-7, locale=GERMAN) == "-0,00000025"
