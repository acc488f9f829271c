"""The moves that a grid is made of, and the fields in which they are chosen."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QWidget

from desk.book import Book, Move, MoveKind, Shock
from desk.book.arrays import FloatArray
from desk.window.parts.fields import Choice, ChoiceField, IntegerField, NumberField
from desk.window.parts.theme import GAP
from desk.window.shocks.hand import handles_of
from desk.window.shocks.wording import short

if TYPE_CHECKING:
    from desk.window.shocks.mode import Mode

__all__ = ["MOST_STEPS", "Axis", "AxisFields", "axes_of"]

MOST_STEPS = 41
_STANDARD = "standard"
_ROOM = 28


@dataclass(frozen=True)
class Axis:
    """One of the two moves.

    Attributes
    ----------
    shock : Shock
        At scale 1.
    label, unit : str
        Of its scale.
    low, high : float
        To begin with.
    """

    shock: Shock
    label: str
    unit: str
    low: float
    high: float

    @property
    def key(self) -> tuple[str, str]:
        """Tells it from others."""
        return (self.shock.name, self.shock.set_name)

    @property
    def short_label(self) -> str:
        """The label, cut where it is longer than an axis has room for."""
        return short(self.label, _ROOM)

    @property
    def is_standard(self) -> bool:
        """Whether it is none of the shocks of a book."""
        return self.shock.set_name == _STANDARD


def _one(name: str, move: Move, unit: str, low: float, high: float) -> Axis:
    return Axis(Shock(name, (move,), set_name=_STANDARD), name, unit, low, high)


def axes_of(book: Book, shocks: tuple[Shock, ...]) -> tuple[Axis, ...]:
    """The moves that a grid of a book may have: standard ones, then its shocks."""
    there = handles_of(book)
    axes = [
        _one("All rates", Move(MoveKind.PARALLEL, 1.0), "bp", -200.0, 200.0),
        _one("Slope", Move(MoveKind.TWIST, 1.0, 10.0), "bp", -100.0, 100.0),
    ]
    for key, axis in (
        ("fund", _one("Funds", Move(MoveKind.VALUE, 0.01, target="fund"), "%", -50.0, 50.0)),
        ("property", _one("Property", Move(MoveKind.VALUE, 0.01, target="property"), "%", -50.0, 50.0)),
        ("spread", _one("Credit spreads", Move(MoveKind.SPREAD, 1.0), "bp", -100.0, 300.0)),
        ("inflation", _one("Inflation", Move(MoveKind.INFLATION, 1.0), "bp", -100.0, 100.0)),
    ):
        if key in there:
            axes.append(axis)
    axes.append(_one("Amounts promised", Move(MoveKind.AMOUNT, 0.01), "%", -20.0, 20.0))
    return (*axes, *(Axis(shock, shock.name, "times", -2.0, 2.0) for shock in shocks))


class AxisFields:
    """The fields of one of the two moves."""

    def __init__(self, mode: Mode, heading: str) -> None:
        form = mode.form
        form.add_heading(heading)
        self.which = ChoiceField(heading, ())
        self.which.label.hide()
        combo = self.which.combo
        combo.setSizeAdjustPolicy(combo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(12)
        self.low = NumberField("From", low=-10_000.0, high=10_000.0)
        self.high = NumberField("To", low=-10_000.0, high=10_000.0)
        self.steps = IntegerField("Sizes", low=2, high=MOST_STEPS)
        self.steps.set_value(21)
        form.add(self.which)
        range_row = QWidget()
        across = QHBoxLayout(range_row)
        across.setContentsMargins(0, 0, 0, 0)
        across.setSpacing(GAP)
        for field, share in ((self.low, 3), (self.high, 3), (self.steps, 2)):
            across.addWidget(field, share, Qt.AlignmentFlag.AlignTop)
        form.add_widget(range_row)
        for field, what in ((self.low, "from"), (self.high, "to"), (self.steps, "sizes")):
            field.set_hint("")
            field.editor.setAccessibleName(f"{heading}, {what}")
        self.which.committed.connect(lambda _: self.suggest())

    @property
    def axis(self) -> Axis | None:
        """The move chosen."""
        value = self.which.value
        return value if isinstance(value, Axis) else None

    def offer(self, axes: tuple[Axis, ...], wanted: int) -> None:
        """Offer moves; the one chosen stays, where it is still there."""
        former = self.axis
        self.which.set_choices([Choice(axis, _titled(axis)) for axis in axes])
        same = [axis for axis in axes if former is not None and axis.key == former.key]
        if same:
            self.which.set_value(same[0])
        else:
            self.which.set_value(axes[min(wanted, len(axes) - 1)])
            self.suggest()
        self._say()

    def suggest(self) -> None:
        """The range to begin with."""
        if self.axis is not None:
            self.low.set_value(self.axis.low)
            self.high.set_value(self.axis.high)
        self._say()

    def _say(self) -> None:
        axis = self.axis
        unit = axis.unit if axis is not None else ""
        self.which.set_hint(f"Its size is in {unit}." if unit != "times" else "Its size is in times itself.")

    def scale(self) -> FloatArray | str:
        """The sizes, or what is wrong with them."""
        low, high, steps = self.low.value, self.high.value, self.steps.value
        if low is None or high is None or steps is None or self.axis is None:
            return "A range needs where it begins, where it ends and how many sizes."
        if not low < high:
            return f"{self.axis.label}: the range must rise."
        if self.axis.unit == "%" and low < -100.0:
            return f"{self.axis.label}: a fall is at most 100 %."
        scale = np.linspace(low, high, int(steps))
        # Nothing at all is nothing, whatever the rounding.
        scale[np.abs(scale) < 1e-9 * (high - low)] = 0.0
        return scale


def _titled(axis: Axis) -> str:
    set_name = "" if axis.is_standard else axis.shock.set_name
    text = f"{axis.label} ({set_name})" if set_name else axis.label
    return text if len(text) <= 48 else f"{text[:47]}…"
