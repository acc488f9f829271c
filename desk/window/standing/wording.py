"""The standing in words."""

from __future__ import annotations

import math

from desk.book import Basis, LiabilityMethod
from desk.valuation.estimates import surplus_change
from desk.valuation.records import Condition, Standing
from desk.window.parts import numbers

__all__ = ["amount", "basis_words", "condition_name", "plain_reading", "verdict"]

_FALL = -0.01

_METHODS = {
    LiabilityMethod.CURVE: "the curve",
    LiabilityMethod.TERM_SPREADS: "the curve with a spread by term",
    LiabilityMethod.CORPORATE_BONDS: "corporate bonds",
    LiabilityMethod.EXPECTED_RETURN: "the expected return",
}

_CONDITIONS = {
    "present_value": "Present value",
    "duration": "Present value × duration",
    "convexity": "Present value × convexity",
}


def amount(value: float, currency: str) -> str:
    """An amount in a sentence, with its currency and scale: ``EUR 31.2 million``."""
    scaled = numbers.money_scaled(abs(value), currency)
    word = f" {scaled.scale.word}" if scaled.scale.word else ""
    return f"{numbers.MINUS if value < 0.0 else ''}{currency} {scaled.text}{word}"


def plain_reading(standing: Standing) -> str:
    """What the standing says, in a sentence or two."""
    currency, surplus = standing.currency, standing.surplus
    owed = standing.liabilities.present_value
    if not math.isfinite(standing.funding_ratio):
        if standing.assets.present_value:
            return "Nothing is promised: the assets stand against no liabilities."
        return "The book holds neither assets nor liabilities after the valuation date."
    if not standing.assets.present_value:
        return f"No assets are held against promises worth {amount(owed, currency)}."
    cover = f"The assets cover {numbers.ratio(standing.funding_ratio)} of the promises"
    if surplus < 0.0:
        head = f"{cover}, a shortfall of {amount(abs(surplus), currency)}."
    else:
        head = f"{cover}, a surplus of {amount(abs(surplus), currency)}."
    return f"{head} {_move_text(standing)}"


def _move_text(standing: Standing) -> str:
    change = surplus_change(standing, _FALL)
    if not math.isfinite(change):
        return ""
    if change == 0.0:
        return "A small move of all rates leaves that as it is."
    size = amount(abs(change), standing.currency)
    what, grows = ("shortfall", change < 0.0) if standing.surplus < 0.0 else ("surplus", change > 0.0)
    tail = ""
    if not grows and abs(change) > abs(standing.surplus):
        tail = ", more than there is of it"
    return (
        f"If all rates fall by 1 percentage point, the {what} {'grows' if grows else 'shrinks'} by about "
        f"{size}{tail}: a first estimate from the DV01 gap."
    )


def condition_name(condition: Condition) -> str:
    """The name of one of Redington's conditions."""
    return _CONDITIONS.get(condition.name, condition.name)


def verdict(holds: bool) -> str:
    """Whether a condition holds, by mark and by word."""
    return "✓ holds" if holds else "✗ does not hold"


def basis_words(basis: Basis) -> str:
    """What a basis is, in a few words: its title, what liabilities are discounted on, and its spread."""
    method = basis.liability_method
    if method is LiabilityMethod.EXPECTED_RETURN and basis.expected_return is not None:
        on = f"an expected return of {numbers.rate(basis.expected_return, with_unit=True)}"
    else:
        on = _METHODS[method]
    parts = [f"“{basis.title}”" if basis.title else "", f"liabilities on {on}"]
    if basis.liability_spread:
        parts.append(f"spread {numbers.rate(basis.liability_spread, with_unit=True)}")
    return ", ".join(part for part in parts if part)
