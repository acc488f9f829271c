"""Colours, spacing and typeface of the window, light and dark."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import lru_cache

from PySide6.QtCore import QObject, Qt, Signal
from PySide6.QtGui import QColor, QFont, QPalette
from PySide6.QtWidgets import QApplication, QWidget

from desk.places import resources

__all__ = [
    "DARK",
    "GAP",
    "HALF",
    "LIGHT",
    "STEP",
    "WIDE",
    "Theme",
    "ThemeSwitch",
    "apply_theme",
    "contrast",
    "keep_look",
    "legible",
    "mixed",
    "soft_font",
    "strong_font",
    "system_theme",
    "tabular",
]

STEP = 4
"""All spacing is a multiple of this [px]."""
HALF = STEP
GAP = 2 * STEP
WIDE = 4 * STEP

TEXT_CONTRAST = 7.0
LINE_CONTRAST = 3.0

STYLE_SHEET = resources() / "style" / "gapwright.qss"


def _luminance(colour: QColor) -> float:
    def linear(part: float) -> float:
        return part / 12.92 if part <= 0.04045 else float(((part + 0.055) / 1.055) ** 2.4)

    red, green, blue = linear(colour.redF()), linear(colour.greenF()), linear(colour.blueF())
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(one: QColor, other: QColor) -> float:
    """Contrast ratio of two opaque colours, from 1 to 21.

    Notes
    -----
    W3C, Web Content Accessibility Guidelines 2.2, definitions of contrast ratio and relative luminance.
    """
    low, high = sorted((_luminance(one), _luminance(other)))
    return (high + 0.05) / (low + 0.05)


def mixed(one: QColor, other: QColor, part: float) -> QColor:
    """`one` with `part` (0 to 1) of `other` in it."""
    return QColor.fromRgbF(
        one.redF() + (other.redF() - one.redF()) * part,
        one.greenF() + (other.greenF() - one.greenF()) * part,
        one.blueF() + (other.blueF() - one.blueF()) * part,
    )


def legible(colour: QColor, ground: QColor, ratio: float) -> QColor:
    """The tint or shade of `colour` nearest to it whose contrast with `ground` is at least `ratio`."""
    parts = ((each.redF(), each.greenF(), each.blueF()) for each in (colour, ground))
    return QColor.fromRgbF(*_legible(*parts, ratio))


_Parts = tuple[float, float, float]


@lru_cache(maxsize=512)
def _legible(colour_parts: _Parts, ground_parts: _Parts, ratio: float) -> _Parts:
    """Asked for with every frame of a what-if."""
    colour, ground = QColor.fromRgbF(*colour_parts), QColor.fromRgbF(*ground_parts)
    end = QColor("white") if _luminance(ground) < 0.18 else QColor("black")
    steps = (mixed(colour, end, step / 100) for step in range(101))
    found = next((each for each in steps if contrast(each, ground) >= ratio), end)
    return found.redF(), found.greenF(), found.blueF()


@dataclass(frozen=True, eq=False)
class Theme:
    """The colours of one look, by what they are for.

    Attributes
    ----------
    name : str
    dark : bool
    ground : QColor
        Behind everything.
    surface : QColor
        Tables, pictures, fields.
    raised : QColor
        The rail, headings and buttons.
    ink, ink_soft : QColor
        The two levels of text.
    hairline : QColor
        Between rows and panes.
    accent : QColor
        What is chosen.
    focus : QColor
        The frame of what has the keyboard.
    grave, mild : QColor
        Faults.
    series : dict of str to QColor
        ``assets``, ``liabilities``, ``surplus``, ``what_if`` (Okabe and Ito 2008, as are the hues of all
        of them), ``rates`` for what belongs to neither side, and ``neutral``.
    """

    name: str
    dark: bool
    ground: QColor
    surface: QColor
    raised: QColor
    ink: QColor
    ink_soft: QColor
    hairline: QColor
    accent: QColor
    focus: QColor
    grave: QColor
    mild: QColor
    series: dict[str, QColor] = field(repr=False)

    def fill(self, role: str) -> QColor:
        """The colour of a series as it stands, for areas. Roles are those of `series` and the attributes."""
        if role in self.series:
            return QColor(self.series[role])
        return QColor(getattr(self, role))

    def line(self, role: str) -> QColor:
        """The colour of a series for lines and dots: contrast with the surface at least 3 : 1."""
        return legible(self.fill(role), self.surface, LINE_CONTRAST)

    def text(self, role: str) -> QColor:
        """The colour of a series for text: contrast with the surface at least 7 : 1."""
        return legible(self.fill(role), self.surface, TEXT_CONTRAST)


def _series(neutral: str) -> dict[str, QColor]:
    # Okabe, M. and Ito, K. (2008), Color Universal Design, figure 16.
    return {
        "assets": QColor("#0072B2"),
        "liabilities": QColor("#D55E00"),
        "surplus": QColor("#009E73"),
        "what_if": QColor("#CC79A7"),
        "rates": QColor("#E69F00"),
        "neutral": QColor(neutral),
    }


LIGHT = Theme(
    name="light",
    dark=False,
    ground=QColor("#F7F4EE"),
    surface=QColor("#FDFBF7"),
    raised=QColor("#EFEBE2"),
    ink=QColor("#1F2326"),
    ink_soft=QColor("#484D50"),
    hairline=QColor("#DBD5C8"),
    accent=QColor("#35506B"),
    focus=QColor("#35506B"),
    grave=QColor("#A3201A"),
    mild=QColor("#775200"),
    series=_series("#3A4045"),
)

DARK = Theme(
    name="dark",
    dark=True,
    ground=QColor("#12161B"),
    surface=QColor("#171C22"),
    raised=QColor("#1F262E"),
    ink=QColor("#E9E6DF"),
    ink_soft=QColor("#B9BDBF"),
    hairline=QColor("#303842"),
    accent=QColor("#A9C4DE"),
    focus=QColor("#A9C4DE"),
    grave=QColor("#FF9F94"),
    mild=QColor("#E9C46A"),
    series=_series("#C9CDCF"),
)


def tabular(font: QFont) -> QFont:
    """A copy of `font` whose figures are all of one width, where the typeface has them."""
    copy = QFont(font)
    copy.setFeature(QFont.Tag("tnum"), 1)
    return copy


def strong_font(font: QFont) -> QFont:
    """The first level of emphasis."""
    copy = tabular(font)
    copy.setWeight(QFont.Weight.DemiBold)
    return copy


def soft_font(font: QFont) -> QFont:
    """The lower level: units, hints, notes."""
    copy = tabular(font)
    if font.pointSizeF() > 0:
        copy.setPointSizeF(font.pointSizeF() * 0.9)
    return copy


def _palette(theme: Theme) -> QPalette:
    palette = QPalette()
    role = QPalette.ColorRole
    chosen_ink = theme.ground if theme.dark else QColor("white")
    for place, colour in (
        (role.Window, theme.ground),
        (role.WindowText, theme.ink),
        (role.Base, theme.surface),
        (role.AlternateBase, theme.raised),
        (role.Text, theme.ink),
        (role.PlaceholderText, theme.ink_soft),
        (role.Button, theme.raised),
        (role.ButtonText, theme.ink),
        (role.BrightText, theme.grave),
        (role.ToolTipBase, theme.raised),
        (role.ToolTipText, theme.ink),
        (role.Highlight, theme.accent),
        (role.HighlightedText, chosen_ink),
        (role.Accent, theme.accent),
        (role.Link, theme.text("assets")),
        (role.LinkVisited, theme.text("what_if")),
        (role.Light, theme.surface),
        (role.Midlight, theme.raised),
        (role.Mid, theme.hairline),
        (role.Dark, theme.hairline),
        (role.Shadow, mixed(theme.ground, QColor("black"), 0.6)),
    ):
        palette.setColor(place, colour)
    # What is switched off is still read, but seen to be off.
    faint = mixed(theme.ink_soft, theme.ground, 0.4)
    for place in (role.WindowText, role.Text, role.ButtonText):
        palette.setColor(QPalette.ColorGroup.Disabled, place, faint)
    palette.setColor(QPalette.ColorGroup.Disabled, role.Highlight, theme.hairline)
    return palette


def _style_sheet(theme: Theme) -> str:
    if not STYLE_SHEET.is_file():
        # Installed without its resources: the palette alone is complete, only the finish is missing.
        return ""
    text = STYLE_SHEET.read_text(encoding="utf-8")
    colours = (
        "ground",
        "surface",
        "raised",
        "ink_soft",
        "ink",
        "hairline",
        "accent",
        "focus",
        "grave",
        "mild",
    )
    for name in colours:
        text = text.replace(f"@{name};", f"{theme.fill(name).name()};")
    chosen_ink = theme.ground if theme.dark else QColor("white")
    text = text.replace("@chosen_ink;", f"{chosen_ink.name()};")
    return text.replace("@chosen;", f"{mixed(theme.surface, theme.accent, 0.16).name()};")


def apply_theme(app: QApplication, theme: Theme) -> None:
    """Give the application the look of `theme`: style, palette, finish and tabular figures."""
    if app.style().objectName().casefold() != "fusion":
        app.setStyle("Fusion")
    app.setFont(tabular(app.font()))
    app.setPalette(_palette(theme))
    app.setStyleSheet(_style_sheet(theme))


def system_theme(app: QApplication) -> Theme:
    """The theme the system asks for; light where it asks for none."""
    return DARK if app.styleHints().colorScheme() is Qt.ColorScheme.Dark else LIGHT


class ThemeSwitch(QObject):
    """Holds the theme in use and follows the system.

    Signals
    -------
    changed(Theme)
        Sent after the application has the new look.
    """

    changed = Signal(object)

    def __init__(self, app: QApplication, mode: str = "system", parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._app = app
        self._mode = ""
        self._theme = LIGHT
        app.styleHints().colorSchemeChanged.connect(self._on_scheme_changed)
        self.set_mode(mode)

    @property
    def theme(self) -> Theme:
        """The theme in use."""
        return self._theme

    @property
    def mode(self) -> str:
        """``system``, ``light`` or ``dark``."""
        return self._mode

    def set_mode(self, mode: str) -> None:
        """Follow the system, or keep to one theme."""
        if mode not in ("system", "light", "dark"):
            raise ValueError(f"`mode` must be system, light or dark, not {mode}")
        self._mode = mode
        self._use(self._wanted())

    def _wanted(self) -> Theme:
        if self._mode == "system":
            return system_theme(self._app)
        return DARK if self._mode == "dark" else LIGHT

    def _on_scheme_changed(self) -> None:
        if self._mode == "system" and self._wanted() is not self._theme:
            self._use(self._wanted())

    def _use(self, theme: Theme) -> None:
        self._theme = theme
        apply_theme(self._app, theme)
        self.changed.emit(theme)


def keep_look(widget: QWidget, name: str) -> None:
    """Give `widget` the role the style sheet knows as `name`."""
    if widget.property("look") != name:
        widget.setProperty("look", name)
        widget.style().unpolish(widget)
        widget.style().polish(widget)
