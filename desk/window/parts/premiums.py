"""The fields of the premiums of a basis, which more than one station offers."""

from __future__ import annotations

from desk.window.parts.fields import NumberField

__all__ = ["liability_spread_field", "market_risk_premium_field"]


def _premium(label: str, hint: str, sensible: tuple[float, float]) -> NumberField:
    return NumberField(label, unit="% a year", percent=True, low=-0.5, high=0.5, sensible=sensible, hint=hint)


def liability_spread_field() -> NumberField:
    """The liability spread [1/year]."""
    hint = "Added to the continuous zero rates where liabilities are discounted."
    return _premium("Liability spread", hint, (-0.01, 0.03))


def market_risk_premium_field() -> NumberField:
    """The market risk premium [1/year]."""
    hint = "Added for each unit of beta, to flows whose risk does not diversify away."
    return _premium("Market risk premium", hint, (0.0, 0.08))
