"""How far an axis of a picture reaches and how its figures are shown."""

from __future__ import annotations

from desk.window.parts import numbers

__all__ = ["Scale", "with_room"]

_ROOM = 0.06
"""Empty room above and below what is shown, as a part of its height."""


class Scale:
    """How the figures of one axis are shown.

    Attributes
    ----------
    label, unit : str
        The unit is that of the values.
    kind : str
        ``number``, ``money`` or ``rate``.
    digits : int or None
        Decimals in a reading; None for what is usual.
    scale : numbers.Scale
        Of an axis of money.
    """

    def __init__(self) -> None:
        self.label = ""
        self.unit = ""
        self.kind = "number"
        self.digits: int | None = None
        self.scale = numbers.ONE

    @property
    def factor(self) -> float:
        """What is shown is the value times this."""
        return 100.0 if self.kind == "rate" else 1 / self.scale.factor

    @property
    def shown_unit(self) -> str:
        """The unit of what is shown."""
        if self.kind == "rate":
            return self.unit or "%"
        return numbers.unit_with_scale(self.unit, self.scale)

    @property
    def heading(self) -> str:
        """What stands at the axis."""
        return ", ".join(part for part in (self.label, self.shown_unit) if part)

    def fit(self, low: float, high: float) -> None:
        """Choose thousands, millions or more for an axis of money."""
        self.scale = numbers.scale_for([low, high]) if self.kind == "money" else numbers.ONE

    def text(self, value: float) -> str:
        """A value as it stands in a reading."""
        digits = self.digits
        if digits is None:
            digits = {"rate": 2, "money": 0 if self.scale is numbers.ONE else 1}.get(self.kind, 2)
        return numbers.number(value * self.factor, digits)


def with_room(low: float, high: float) -> tuple[float, float]:
    """A little more than from `low` to `high`, but not across zero."""
    if high <= low:
        room = abs(low) * 0.1 or 1.0
        return low - room, high + room
    room = (high - low) * _ROOM
    return (
        max(low - room, 0.0) if low >= 0 else low - room,
        min(high + room, 0.0) if high <= 0 else high + room,
    )
