"""The key figures of a standing as they are shown, and how far each is from what it is compared with."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

from desk.valuation.records import Standing
from desk.valuation.shock_records import Position
from desk.window.parts import numbers
from desk.window.parts.numbers import Scale

__all__ = ["UNKNOWN", "Figure", "figures_of"]

UNKNOWN = "n/a"


@dataclass(frozen=True)
class Figure:
    """One key figure as it is shown.

    Attributes
    ----------
    key : str
        Names it, and the rows that make it up.
    label, value, unit : str
    note : str
        What it means, in a few words.
    series : str
        Role of its mark in the theme; empty for none.
    change : str
        How far it is from what it is compared with, short, with its sign; empty while it is compared with
        nothing.
    change_in_words : str
        The same for a reader who listens.
    change_role : str
        Of the change in the theme.
    """

    key: str
    label: str
    value: str
    unit: str
    note: str
    series: str = ""
    change: str = ""
    change_in_words: str = ""
    change_role: str = "ink"


def _shared_scale(values: Sequence[float]) -> tuple[Scale, int]:
    """A scale and decimals in which amounts of several sizes can be added up by eye."""
    largest = max((abs(value) for value in values if math.isfinite(value)), default=0.0)
    scale = numbers.scale_for(largest)
    if largest < 10 * scale.factor:
        scale = numbers.scale_for(largest / 10)
    return scale, 1 if largest >= 1_000 * scale.factor else 2


def _money(value: float, currency: str, scale: Scale, digits: int) -> tuple[str, str]:
    if not math.isfinite(value):
        return UNKNOWN, currency
    scaled = numbers.money_scaled(value, currency, scale=scale, digits=digits)
    return scaled.text, scaled.unit


def _counted(count: int, one: str, more: str) -> str:
    return f"{numbers.integer(count)} {one if count == 1 else more}"


def _sign_note(value: float, below: str, none: str, above: str) -> str:
    if not math.isfinite(value):
        return "not defined here"
    return below if value < 0 else above if value > 0 else none


@dataclass(frozen=True)
class _Against:
    """What a change is against, in words."""

    short: str
    long: str
    same: str
    same_in_words: str
    role: str


_SECOND = _Against(
    "vs second", "on the second basis", "as on the second", "the same as on the second basis", "ink"
)
_WHAT_IF = _Against("what-if", "before the what-if", "as before", "unchanged by the what-if", "what_if")

_KEYS = ("assets", "liabilities", "surplus", "funding_ratio", "duration_gap", "dv01_gap")
_LABELS = ("Assets", "Liabilities", "Surplus", "Funding ratio", "Duration gap", "DV01 gap")
_MARKS = ("assets", "liabilities", "surplus", "", "", "")


def _raw(standing: Standing) -> tuple[float, ...]:
    """The six figures as numbers, in the order of `_KEYS`."""
    return (
        standing.assets.present_value,
        standing.liabilities.present_value,
        standing.surplus,
        standing.funding_ratio,
        standing.duration_gap,
        standing.dv01_gap,
    )


def _raw_moved(position: Position) -> tuple[float, ...]:
    """The same of a book that is moved."""
    return tuple(getattr(position, key) for key in _KEYS)


def _compared(
    figure: Figure, now: float, other: float, factor: float, digits: int, unit: str, against: _Against
) -> Figure:
    """A figure with how far it is from `other`, both divided by `factor`."""
    change = (now - other) / factor
    if not math.isfinite(change):
        return figure
    text = numbers.signed(change, digits)
    more = "more than" if change > 0 else "less than"
    words = f"{numbers.number(abs(change), digits)} {unit}".strip()
    is_none = not text.startswith((numbers.MINUS, "+"))
    return replace(
        figure,
        change=against.same if is_none else f"{text} {against.short}",
        change_in_words=against.same_in_words if is_none else f"{words} {more} {against.long}",
        change_role=against.role,
    )


def figures_of(
    standing: Standing | None,
    currency: str = "",
    *,
    compared_with: Standing | None = None,
    moved: Position | None = None,
) -> tuple[Figure, ...]:
    """The six key figures of a standing; without one, what they will be.

    Parameters
    ----------
    standing : Standing or None
    currency : str, optional
        Of the book, where there is no standing yet.
    compared_with : Standing, optional
        On the second basis: each figure is told with how far it is above or below that one's.
    moved : Position, optional
        What a what-if makes of the book: its figures are shown, with how far they are from those before it.
    """
    if standing is None:
        units = (currency, currency, currency, "", "years", currency)
        return tuple(
            Figure(key, label, numbers.NOT_AVAILABLE, unit, "", mark)
            for key, label, unit, mark in zip(_KEYS, _LABELS, units, _MARKS, strict=True)
        )
    before = _raw(standing)
    raw = before if moved is None else _raw_moved(moved)
    scale, digits = _shared_scale(before[:2])
    # While the hand moves, the scale stays.
    gap_scale = numbers.scale_for(standing.dv01_gap)
    shown = [_money(value, standing.currency, scale, digits) for value in raw[:3]]
    ratio, gap = raw[3], raw[4]
    shown.append((numbers.number(100 * ratio, 1) if math.isfinite(ratio) else UNKNOWN, "%"))
    shown.append((numbers.years(gap) if math.isfinite(gap) else UNKNOWN, "years"))
    dv01, dv01_unit = _money(raw[5], standing.currency, gap_scale, 2)
    shown.append((dv01, f"{dv01_unit} a bp"))
    made = tuple(
        Figure(key, label, value, unit, note, mark)
        for key, label, (value, unit), note, mark in zip(
            _KEYS, _LABELS, shown, _notes(standing), _MARKS, strict=True
        )
    )
    if moved is not None:
        other, against = before, _WHAT_IF
    elif compared_with is not None:
        other, against = _raw(compared_with), _SECOND
    else:
        return made
    factors = (scale.factor,) * 3 + (0.01, 1.0, gap_scale.factor)
    places = (digits if scale.word else 0,) * 3 + (1, 2, 2 if gap_scale.word else 0)
    told_units = (*(figure.unit for figure in made[:3]), "percentage points", "years", made[5].unit)
    return tuple(
        _compared(figure, now, then, factor, place, unit, against)
        for figure, now, then, factor, place, unit in zip(
            made, raw, other, factors, places, told_units, strict=True
        )
    )


def _notes(standing: Standing) -> tuple[str, ...]:
    """What each figure means, in a few words."""
    counts = [sum(line.side.value == side for line in standing.lines) for side in ("assets", "liabilities")]
    return (
        *(_counted(count, "line", "lines") for count in counts),
        _sign_note(standing.surplus, "in deficit", "in balance", "in surplus"),
        "of liabilities" if math.isfinite(standing.funding_ratio) else "no liabilities",
        _sign_note(standing.duration_gap, "assets shorter", "matched", "assets longer"),
        _sign_note(standing.dv01_gap, "gains when rates rise", "unmoved by rates", "loses when rates rise"),
    )
