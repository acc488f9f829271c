"""The parameters of a Nelson-Siegel or Svensson curve and the flat rate, each in plain words."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QObject, Signal

from desk.book import CurveParameters
from desk.window.parts.fields import NumberField

__all__ = ["ParameterFields", "flat_rate_field"]


def _rate(label: str, hint: str, sensible: tuple[float, float]) -> NumberField:
    return NumberField(label, unit="% a year", percent=True, low=-1.0, high=1.0, sensible=sensible, hint=hint)


def _years(label: str, hint: str, sensible: tuple[float, float]) -> NumberField:
    return NumberField(label, unit="years", low=0.01, high=200.0, sensible=sensible, hint=hint)


def flat_rate_field() -> NumberField:
    """One rate for every term [1/year]."""
    return _rate("Flat rate", "For every term, in the compounding above.", (-0.01, 0.08))


class ParameterFields(QObject):
    """Six fields, of which Nelson-Siegel has the first four.

    Signals
    -------
    changed(object, str)
        The parameters after an edit, and what was edited.
    """

    changed = Signal(object, str)

    def __init__(self) -> None:
        super().__init__()
        self._parameters = CurveParameters(0.0, 0.0, 0.0, 1.0)
        self.fields = {
            "beta_0": _rate("Level β₀", "Where rates tend to for long terms.", (0.0, 0.08)),
            "beta_1": _rate(
                "Slope β₁",
                "What today's rate has over the level; it fades with the term. Below 0 the curve rises.",
                (-0.06, 0.04),
            ),
            "beta_2": _rate("Bend β₂", "Height of the first bend; below 0 it is a trough.", (-0.1, 0.1)),
            "tau_1": _years(
                "Decay τ₁",
                "How slowly slope and bend fade: the bend is greatest at 1.8 times this term.",
                (0.5, 5.0),
            ),
            "beta_3": _rate("Second bend β₃", "Height of the second bend.", (-0.1, 0.1)),
            "tau_2": _years(
                "Second decay τ₂", "The second bend is greatest at 1.8 times this term.", (1.0, 20.0)
            ),
        }
        for name, field in self.fields.items():
            what = field.label.text().casefold()
            field.committed.connect(lambda value, name=name, what=what: self._on_committed(name, value, what))

    def show_parameters(self, parameters: CurveParameters) -> None:
        """Show parameters."""
        self._parameters = parameters
        for name, field in self.fields.items():
            field.set_value(getattr(parameters, name))

    def _on_committed(self, name: str, value: float, what: str) -> None:
        changed: dict[str, float] = {name: value}
        self.changed.emit(replace(self._parameters, **changed), what)
