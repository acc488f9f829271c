"""Both themes can be read, and the switch tells whoever listens."""

from __future__ import annotations

import pytest
from PySide6.QtGui import QColor, QPalette
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from desk.window.parts.theme import (
    DARK,
    LIGHT,
    STYLE_SHEET,
    Theme,
    ThemeSwitch,
    apply_theme,
    contrast,
    legible,
)

THEMES = pytest.mark.parametrize("theme", [LIGHT, DARK], ids=["light", "dark"])


def test_contrast_is_the_published_ratio() -> None:
    # W3C, WCAG 2.2: black on white is 21 : 1; technique G18 computes #767676 on white as 4.54 : 1.
    assert contrast(QColor("black"), QColor("white")) == pytest.approx(21)
    assert contrast(QColor("white"), QColor("black")) == pytest.approx(21)
    assert contrast(QColor("#767676"), QColor("white")) == pytest.approx(4.54, abs=0.005)
    assert contrast(QColor("#123456"), QColor("#123456")) == pytest.approx(1)


@THEMES
@pytest.mark.parametrize("ground", ["ground", "surface", "raised"])
def test_text_stands_out_seven_to_one(theme: Theme, ground: str) -> None:
    for role in ("ink", "ink_soft"):
        assert contrast(theme.fill(role), theme.fill(ground)) >= 7, role
    for role in ("grave", "mild"):
        assert contrast(theme.fill(role), theme.fill(ground)) >= 4.5, role


@THEMES
def test_series_stand_out_in_lines_and_in_text(theme: Theme) -> None:
    for role in theme.series:
        assert contrast(theme.line(role), theme.surface) >= 3, role
        assert contrast(theme.text(role), theme.surface) >= 7, role
    assert contrast(theme.focus, theme.surface) >= 3


@THEMES
def test_series_colours_are_the_published_ones(theme: Theme) -> None:
    # Okabe, M. and Ito, K. (2008), Color Universal Design, figure 16.
    assert theme.fill("assets").name().upper() == "#0072B2"
    assert theme.fill("liabilities").name().upper() == "#D55E00"
    assert theme.fill("surplus").name().upper() == "#009E73"
    assert theme.fill("what_if").name().upper() == "#CC79A7"


def test_a_colour_that_stands_out_already_is_left_alone() -> None:
    assert LIGHT.line("assets") == LIGHT.fill("assets")
    assert legible(QColor("#010203"), QColor("white"), 7).name() == "#010203"


@THEMES
def test_text_on_what_is_chosen_can_be_read(qapp: QApplication, theme: Theme) -> None:
    apply_theme(qapp, theme)
    palette = qapp.palette()
    chosen = palette.color(QPalette.ColorRole.Highlight)
    assert contrast(palette.color(QPalette.ColorRole.HighlightedText), chosen) >= 7
    assert palette.color(QPalette.ColorRole.Window) == theme.ground
    assert qapp.style().objectName() == "fusion" or qapp.styleSheet()


@THEMES
def test_the_style_sheet_is_short_and_leaves_no_placeholder(qapp: QApplication, theme: Theme) -> None:
    assert len(STYLE_SHEET.read_text(encoding="utf-8").splitlines()) < 100
    apply_theme(qapp, theme)
    body = qapp.styleSheet().split("*/", 1)[1]
    assert "@" not in body
    assert theme.ink_soft.name() in body


def test_the_switch_tells_its_listeners(qtbot: QtBot, theme_switch: ThemeSwitch) -> None:
    with qtbot.waitSignal(theme_switch.changed) as heard:
        theme_switch.set_mode("dark")
    assert heard.args == [DARK]
    assert theme_switch.theme is DARK
    with pytest.raises(ValueError, match="`mode`"):
        theme_switch.set_mode("sepia")
    assert theme_switch.mode == "dark"
