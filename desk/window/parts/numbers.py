"""Figures as the reader writes them: shown in a locale, and read back from text.

Nothing here changes a stored number: rounding happens in the text alone.
"""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date

import numpy as np
from PySide6.QtCore import QDate, QLocale

__all__ = [
    "MINUS",
    "NOT_AVAILABLE",
    "Scale",
    "Scaled",
    "day",
    "exact",
    "integer",
    "money",
    "money_scaled",
    "number",
    "parse_day",
    "parse_number",
    "parse_rate",
    "rate",
    "ratio",
    "scale_for",
    "shown_locale",
    "signed",
    "unit_with_scale",
    "years",
]

MINUS = "\N{MINUS SIGN}"
NOT_AVAILABLE = "\N{EN DASH}"

_MINUSES = "-\N{MINUS SIGN}\N{HYPHEN}\N{NON-BREAKING HYPHEN}\N{SMALL HYPHEN-MINUS}\N{FULLWIDTH HYPHEN-MINUS}"
_SPACES = " \N{NO-BREAK SPACE}\N{NARROW NO-BREAK SPACE}\N{THIN SPACE}\N{FIGURE SPACE}"
_LONGEST = 64
_UNSIGNED = re.compile(r"(?P<whole>\d*)(?:\.(?P<part>\d*))?(?:[eE](?P<power>[+-]?\d{1,4}))?")


def shown_locale() -> QLocale:
    """The locale figures are shown in: the default one, and international English where that is none."""
    locale = QLocale()
    if locale.language() == QLocale.Language.C:
        # The locale named C does not group its figures.
        return QLocale(QLocale.Language.English, QLocale.Country.World)
    return locale


def number(
    value: float | None,
    digits: int = 2,
    *,
    locale: QLocale | None = None,
    grouped: bool = True,
    always_sign: bool = False,
) -> str:
    """`value` with `digits` decimals, grouped, with a true minus sign; an en dash for no value."""
    if value is None or math.isnan(value):
        return NOT_AVAILABLE
    if math.isinf(value):
        return "∞" if value > 0 else f"{MINUS}∞"
    locale = locale or shown_locale()
    size = abs(float(value))
    text = locale.toString(size, "f", digits)
    if not grouped:
        text = text.replace(locale.groupSeparator(), "")
    if float(f"{size:.{digits}f}") == 0:
        # Never a minus before nothing.
        return text
    if value < 0:
        return MINUS + text
    return f"+{text}" if always_sign else text


def money(value: float | None, digits: int = 0, *, locale: QLocale | None = None) -> str:
    """An amount in units of its currency; the unit stands in the heading."""
    return number(value, digits, locale=locale)


def rate(
    value: float | None, digits: int = 2, *, locale: QLocale | None = None, with_unit: bool = False
) -> str:
    """A rate [1/year] or share in percent, without the percent sign unless asked for."""
    if value is None or math.isnan(value):
        return NOT_AVAILABLE
    text = number(100 * value, digits, locale=locale)
    return f"{text}\N{NARROW NO-BREAK SPACE}%" if with_unit else text


def years(value: float | None, digits: int = 2, *, locale: QLocale | None = None) -> str:
    """A time or a duration in years."""
    return number(value, digits, locale=locale)


def ratio(value: float | None, digits: int = 1, *, locale: QLocale | None = None) -> str:
    """A ratio of two amounts in percent, with the sign: a headline figure carries its unit."""
    return rate(value, digits, locale=locale, with_unit=True)


def integer(value: float | None, *, locale: QLocale | None = None) -> str:
    """A count."""
    return number(value, 0, locale=locale)


def signed(value: float | None, digits: int = 2, *, locale: QLocale | None = None) -> str:
    """A change: with a plus or a true minus before it, nothing before zero."""
    return number(value, digits, locale=locale, always_sign=True)


def day(value: date | np.datetime64 | None, *, locale: QLocale | None = None) -> str:
    """A date, short, with a four-figure year; an en dash for none."""
    if value is None or (isinstance(value, np.datetime64) and np.isnat(value)):
        return NOT_AVAILABLE
    plain = value.astype("datetime64[D]").item() if isinstance(value, np.datetime64) else value
    if not isinstance(plain, date):
        return NOT_AVAILABLE
    locale = locale or shown_locale()
    form = locale.dateFormat(QLocale.FormatType.ShortFormat)
    if "yyyy" not in form:
        form = form.replace("yy", "yyyy")
    return locale.toString(QDate(plain.year, plain.month, plain.day), form)


def exact(value: float | None, *, locale: QLocale | None = None, percent: bool = False) -> str:
    """The shortest text that gives `value` back: no grouping, a plain minus; empty for no value.

    With `percent`, in percent: ``0.0375`` becomes ``3.75``, by moving the mark and not by multiplying.
    """
    if value is None or not math.isfinite(value):
        return ""
    locale = locale or shown_locale()
    text = repr(float(value))
    if not percent and "e" not in text:
        return text.removesuffix(".0").replace(".", locale.decimalPoint()) if value else "0"
    mantissa, _, power = text.partition("e")
    exponent = int(power or 0) + (2 if percent else 0)
    sign = "-" if mantissa.startswith("-") else ""
    whole, _, part = mantissa.lstrip("-").partition(".")
    part = "" if part == "0" else part
    if -18 <= exponent <= 18 and exponent:
        if exponent > 0:
            part = part.ljust(exponent, "0")
            whole, part = whole + part[:exponent], part[exponent:]
        else:
            whole = whole.rjust(1 - exponent, "0")
            whole, part = whole[:exponent], whole[exponent:] + part
        exponent = 0
    whole = whole.lstrip("0") or "0"
    part = part.rstrip("0")
    text = whole + (locale.decimalPoint() + part if part else "")
    return sign + text + (f"E{exponent:+d}" if exponent else "")


@dataclass(frozen=True)
class Scale:
    """A power of ten that figures are shown in.

    Attributes
    ----------
    factor : float
        One unit shown stands for this many.
    word : str
        Its name, put after the unit; empty for 1.
    """

    factor: float
    word: str


@dataclass(frozen=True)
class Scaled:
    """A figure shown in a scale, and the unit that belongs in the heading."""

    text: str
    unit: str
    scale: Scale


SCALES = (Scale(1e12, "trillion"), Scale(1e9, "billion"), Scale(1e6, "million"), Scale(1e3, "thousand"))
ONE = Scale(1.0, "")


def scale_for(values: Iterable[float] | float | None) -> Scale:
    """The scale in which the largest of `values` has one to four figures before its decimal mark."""
    array = np.atleast_1d(np.asarray(np.nan if values is None else values, dtype=float))
    sizes = np.abs(array[np.isfinite(array)])
    largest = float(sizes.max()) if sizes.size else 0.0
    for scale in SCALES:
        if largest >= 10 * scale.factor or (largest >= scale.factor and scale.factor > 1e3):
            return scale
    return ONE


def unit_with_scale(unit: str, scale: Scale) -> str:
    """``EUR`` in millions is ``EUR million``."""
    return f"{unit} {scale.word}".strip()


def money_scaled(
    value: float | None,
    unit: str = "",
    *,
    digits: int = 1,
    scale: Scale | None = None,
    locale: QLocale | None = None,
    always_sign: bool = False,
) -> Scaled:
    """An amount in thousands, millions or more, with its unit apart."""
    scale = scale or scale_for(value)
    shown = None if value is None else value / scale.factor
    places = digits if scale is not ONE else 0
    text = number(shown, places, locale=locale, always_sign=always_sign)
    return Scaled(text, unit_with_scale(unit, scale), scale)


def _plain_figures(text: str) -> str:
    """Figures of any script as 0-9."""
    return "".join(str(unicodedata.decimal(mark, mark)) for mark in text)


def _without_groups(text: str, locale: QLocale) -> str | None:
    """`text` with a full stop as the decimal mark and no grouping; None where the grouping is wrong.

    A mark that groups where no group can be (``1.5`` where a full stop groups thousands) is refused: it may
    have come from another locale, and to guess would be to change the figure a thousandfold.
    """
    decimal = locale.decimalPoint()
    if text.count(decimal) > 1:
        return None
    head, mark, tail = text.partition(decimal)
    groups = set(_SPACES) | {"'", "\N{RIGHT SINGLE QUOTATION MARK}"}
    groups.add(locale.groupSeparator())
    groups.discard(decimal)
    used = {character for character in head if character in groups}
    if len(used) > 1 or any(character in groups for character in tail):
        return None
    if used:
        pieces = head.split(used.pop())
        sizes = [len(piece) for piece in pieces]
        # Indian figures group by two after the first three.
        if sizes[-1] != 3 or not 1 <= sizes[0] <= 3 or any(size not in (2, 3) for size in sizes[1:-1]):
            return None
        if sizes[0] == 3 and 2 in sizes[1:-1]:
            return None
        head = "".join(pieces)
    return head + ("." + tail if mark else "")


def parse_number(text: str, locale: QLocale | None = None) -> float | None:
    """The number that `text` writes, as shown in a locale or pasted from a spreadsheet.

    Takes grouping by the locale's mark or by any space, a percent sign (the hundredth), an accountant's
    parentheses (a negative), and any minus sign. None where it is no finite number, or where its grouping is
    not that of the locale.
    """
    locale = locale or shown_locale()
    body = text.strip()
    if not body or len(body) > _LONGEST:
        return None
    negative = False
    if body.startswith("(") and body.endswith(")"):
        negative, body = True, body[1:-1].strip()
    shift = 0
    for sign, power in (("%", -2), ("٪", -2), ("‰", -3)):
        if body.endswith(sign):
            shift, body = power, body[: -len(sign)].strip()
            break
    body = _plain_figures(body)
    if body[:1] and body[0] in _MINUSES:
        if negative:
            return None
        negative, body = True, body[1:].strip()
    elif body[:1] == "+" and not negative:
        body = body[1:].strip()
    mantissa, letter, power_text = body, "", ""
    for mark in "eE":
        if mark in body:
            mantissa, letter, power_text = body.partition(mark)
            break
    for minus in _MINUSES:
        power_text = power_text.replace(minus, "-")
    plain = _without_groups(mantissa, locale)
    if plain is None:
        return None
    match = _UNSIGNED.fullmatch(plain + letter + power_text)
    if match is None or not (match["whole"] or match["part"]):
        return None
    # The power goes into the text: 3.75 % is the number nearest to 0.0375, not 3.75 times one hundredth.
    exponent = int(match["power"] or 0) + shift
    value = float(f"{match['whole'] or '0'}.{match['part'] or '0'}e{exponent}")
    if not math.isfinite(value):
        return None
    return -value if negative else value


def parse_rate(text: str, locale: QLocale | None = None) -> float | None:
    """A rate from text under a heading in percent: ``3.75`` and ``3.75 %`` are both 0.0375."""
    body = text.strip()
    closing = ")" if body.endswith(")") else ""
    body = body.removesuffix(")").rstrip()
    if not body.endswith(("%", "٪", "‰")):
        body += "%"
    return parse_number(body + closing, locale)


def parse_day(text: str) -> date | None:
    """A date in ISO form or in the short form of the locale."""
    try:
        return date.fromisoformat(text)
    except ValueError:
        pass
    locale = shown_locale()
    form = locale.dateFormat(locale.FormatType.ShortFormat)
    for pattern in (form, form if "yyyy" in form else form.replace("yy", "yyyy")):
        if "yyyy" not in pattern:
            # Two figures do not say which century.
            continue
        found = locale.toDate(text, pattern)
        if found.isValid():
            return date(found.year(), found.month(), found.day())
    return None
